//! Places in the picture: whole pixels, and points between them.

use egui::Pos2;
use egui::Rect;

/// Steps in a pixel for corners of shapes. Eight bits, as graphics hardware has it, so that both runners cover the same
/// pixels.
pub(super) const STEPS: i64 = 256;

/// Farther out than this (in pixels) a corner is pulled in, so that products of three corners fit into 64 bits. egui's
/// own numbers have no fractions of a pixel left there.
const FAR: f32 = 2_097_152.0;

/// A corner of a shape, in steps of 1/256 pixel from the top left corner of the picture.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Corner {
    pub(super) x: i64,
    pub(super) y: i64,
}

impl Corner {
    /// From egui's points. `None` where the shape has no place (not a number, or infinite).
    pub(super) fn new(pos: Pos2, pixels_per_point: f32) -> Option<Self> {
        let snap = |points: f32| ((points * pixels_per_point).clamp(-FAR, FAR) * STEPS as f32).round() as i64;
        pos.is_finite().then(|| Self { x: snap(pos.x), y: snap(pos.y) })
    }
}

/// The first pixel whose centre lies at or after a place given in steps.
pub(super) fn first_pixel(steps: i64) -> i64 {
    (steps + STEPS / 2 - 1) >> 8
}

/// Whole pixels: `left` and `top` belong to the area, `right` and `bottom` do not.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Area {
    pub(super) left: i64,
    pub(super) top: i64,
    pub(super) right: i64,
    pub(super) bottom: i64,
}

impl Area {
    /// The pixels egui lets a mesh touch, inside a picture of the given size. Rounded as egui's own renderers do.
    pub(super) fn clip(rect: Rect, pixels_per_point: f32, width: usize, height: usize) -> Self {
        let round =
            |points: f32, end: usize| ((pixels_per_point * points).round() as i64).clamp(0, end as i64);
        let left = round(rect.min.x, width);
        let top = round(rect.min.y, height);
        Self {
            left,
            top,
            right: round(rect.max.x, width).max(left),
            bottom: round(rect.max.y, height).max(top),
        }
    }

    pub(super) fn intersect(self, other: Self) -> Self {
        Self {
            left: self.left.max(other.left),
            top: self.top.max(other.top),
            right: self.right.min(other.right),
            bottom: self.bottom.min(other.bottom),
        }
    }

    pub(super) fn is_empty(self) -> bool {
        self.left >= self.right || self.top >= self.bottom
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_pixel_belongs_to_what_covers_its_centre() {
        assert_eq!(first_pixel(0), 0);
        assert_eq!(first_pixel(128), 0);
        assert_eq!(first_pixel(129), 1);
        assert_eq!(first_pixel(-128), -1);
        assert_eq!(first_pixel(-127), 0);
    }

    #[test]
    fn corners_without_a_place_are_refused_and_far_ones_pulled_in() {
        assert_eq!(Corner::new(Pos2::new(f32::NAN, 0.0), 1.0), None);
        assert_eq!(Corner::new(Pos2::new(0.0, f32::INFINITY), 1.0), None);
        assert_eq!(Corner::new(Pos2::new(1.5, -1e30), 2.0), Some(Corner { x: 768, y: -536_870_912 }));
    }
}

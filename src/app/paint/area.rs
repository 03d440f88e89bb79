//! Places in the picture: whole pixels, and points between them.

use egui::Pos2;
use egui::Rect;

/// Steps in a pixel for corners of shapes. Eight bits, as graphics hardware has it, so that both runners cover the same
/// pixels.
pub(super) const STEPS: i64 = 256;

/// Farther out than this (in pixels) a corner is pulled in, so that products of three corners fit into 64 bits. egui's
/// own numbers have no fractions of a pixel left there.
const FAR: f32 = 2_097_152.0;

/// Added before cutting off, so that this rounds to nearest below zero too.
const ROUNDING: f64 = FAR as f64 * STEPS as f64;

/// A corner of a shape, in steps of 1/256 pixel from the top left corner of the picture.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Corner {
    x_steps: i32,
    y_steps: i32,
}

impl Corner {
    /// Stands for a corner without a place (not a number, or infinite).
    const NOWHERE: Self = Self { x_steps: i32::MIN, y_steps: i32::MIN };

    /// From egui's points.
    pub(super) fn new(pos: Pos2, pixels_per_point: f32) -> Self {
        let snap = |points: f32| {
            let steps = f64::from((points * pixels_per_point).clamp(-FAR, FAR)) * STEPS as f64;
            // Both casts are exact; `round` would be a call on processors without an instruction for it.
            ((steps + ROUNDING + 0.5) as i64 - ROUNDING as i64) as i32
        };
        if pos.is_finite() { Self { x_steps: snap(pos.x), y_steps: snap(pos.y) } } else { Self::NOWHERE }
    }

    pub(super) fn has_place(self) -> bool {
        self != Self::NOWHERE
    }

    /// Whether one neighbour lies straight above or below, and the other straight to the left or right.
    pub(super) fn is_beside(self, vertical: Self, horizontal: Self) -> bool {
        self.x_steps == vertical.x_steps && self.y_steps == horizontal.y_steps
    }

    /// The place in one number.
    pub(super) fn bits(self) -> u64 {
        u64::from(self.x_steps.cast_unsigned()) << 32 | u64::from(self.y_steps.cast_unsigned())
    }

    pub(super) fn x(self) -> i64 {
        i64::from(self.x_steps)
    }

    pub(super) fn y(self) -> i64 {
        i64::from(self.y_steps)
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

    /// The pixels whose centres the box around some corners covers, its right and lower side included.
    pub(super) fn around(corners: [Corner; 3]) -> Self {
        let [a, b, c] = corners;
        Self {
            left: first_pixel(a.x().min(b.x()).min(c.x())),
            top: first_pixel(a.y().min(b.y()).min(c.y())),
            right: first_pixel(a.x().max(b.x()).max(c.x()) + 1),
            bottom: first_pixel(a.y().max(b.y()).max(c.y()) + 1),
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
        assert!(!Corner::new(Pos2::new(f32::NAN, 0.0), 1.0).has_place());
        assert!(!Corner::new(Pos2::new(0.0, f32::INFINITY), 1.0).has_place());
        let far = Corner::new(Pos2::new(1.5, -1e30), 2.0);
        assert_eq!((far.x(), far.y()), (768, -536_870_912));
    }

    #[test]
    fn corners_go_to_the_nearest_step() {
        let corner = Corner::new(Pos2::new(0.6 / 256.0, -0.6 / 256.0), 1.0);
        assert_eq!((corner.x(), corner.y()), (1, -1));
        let corner = Corner::new(Pos2::new(0.4 / 256.0, -0.4 / 256.0), 1.0);
        assert_eq!((corner.x(), corner.y()), (0, 0));
    }
}

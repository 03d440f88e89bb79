//! Names beside points, as far as there is room: none lies over another.

use glam::Vec2;

use crate::raster::camera::View;
use crate::raster::canvas::{Canvas, Spot};
use crate::raster::palette::Theme;
use crate::raster::scene_view::Label;
use crate::raster::text::{Align, TextStyle, draw_text_centered, text_width};

/// A name with its place in the picture.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Placed {
    /// Index of the label.
    label: usize,
    /// The middle of the words, pixels.
    middle: Vec2,
    /// Half the room they take.
    half: Vec2,
}

/// Size of the letters, points.
const LETTERS: f32 = 12.0;

/// Places names from the first to the last: to the right of their point, else to the left, above or below; a name for which no
/// room is left goes without.
fn placed(view: &View, names: &[Label], size: Vec2, scale: f32) -> Vec<Placed> {
    let mut all: Vec<Placed> = Vec::new();
    let style = TextStyle::words(LETTERS * scale, crate::raster::palette::Color::TRANSPARENT);
    for (label, name) in names.iter().enumerate() {
        let Some(spot) = Spot::of(view, name.at) else { continue };
        let half = Vec2::new(text_width(&name.text, &style) / 2.0 + 2.0 * scale, 0.62 * LETTERS * scale);
        let gap = 5.0 * scale;
        let offsets = [
            Vec2::new(half.x + gap, 0.0),
            Vec2::new(-half.x - gap, 0.0),
            Vec2::new(0.0, -half.y - gap),
            Vec2::new(0.0, half.y + gap),
        ];
        let middles = offsets.into_iter().map(|offset| spot.pixel + offset);
        let is_inside =
            |middle: Vec2| (middle - half).min_element() >= 0.0 && (middle + half).cmple(size).all();
        let is_free = |middle: Vec2| {
            all.iter().all(|other| {
                let apart = (middle - other.middle).abs();
                let room = half + other.half;
                apart.x >= room.x || apart.y >= room.y
            })
        };
        let found = middles.into_iter().find(|&middle| is_inside(middle) && is_free(middle));
        all.extend(found.map(|middle| Placed { label, middle, half }));
    }
    all
}

/// Writes names, each with a dark or light edge that keeps it legible over limbs.
pub(super) fn draw_names(canvas: &mut Canvas, view: &View, names: &[Label], theme: &Theme, scale: f32) {
    let size = Vec2::new(canvas.width() as f32, canvas.height() as f32);
    let style = TextStyle::words(LETTERS * scale, theme.text).aligned(Align::Center);
    let shade = TextStyle { color: theme.background.with_alpha(0.75), ..style };
    for own in placed(view, names, size, scale) {
        let text = &names[own.label].text;
        for (x, y) in [(-1.0, 0.0), (1.0, 0.0), (0.0, -1.0), (0.0, 1.0)] {
            draw_text_centered(&mut canvas.image, text, own.middle + Vec2::new(x, y) * scale, &shade);
        }
        draw_text_centered(&mut canvas.image, text, own.middle, &style);
    }
}

#[cfg(test)]
mod tests {
    use glam::DVec3;

    use super::*;
    use crate::raster::camera::Camera;

    #[test]
    fn names_never_lie_over_each_other_or_leave_the_picture_and_the_first_comes_first() {
        let camera = Camera { yaw_rad: 0.0, pitch_rad: 0.0, ..Camera::default() };
        let view = camera.view(400, 300);
        let names: Vec<Label> = (0..40)
            .map(|i| {
                let at =
                    camera.target + DVec3::new(f64::from(i % 8) * 0.09 - 0.3, f64::from(i / 8) * 0.05, 0.0);
                Label { at, text: format!("joint number {i}") }
            })
            .collect();
        let size = Vec2::new(400.0, 300.0);
        let found = placed(&view, &names, size, 1.0);
        assert_eq!(found[0].label, 0);
        assert!(found.len() > 5 && found.len() < 40, "{}", found.len());
        for (i, a) in found.iter().enumerate() {
            assert!((a.middle - a.half).min_element() >= 0.0 && (a.middle + a.half).cmple(size).all());
            for b in &found[..i] {
                let apart = (a.middle - b.middle).abs() - (a.half + b.half);
                assert!(apart.max_element() >= 0.0, "{} and {}", names[a.label].text, names[b.label].text);
            }
        }
    }
}

//! Words beside points, and who stands where: none lies over another.

use glam::Vec2;

use crate::raster::camera::View;
use crate::raster::canvas::{Canvas, Spot};
use crate::raster::palette::Theme;
use crate::raster::scene_view::Label;
use crate::raster::text::{Align, TextStyle, draw_text_centered, text_width};

/// The room that words take.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Words {
    /// Their middle, pixels.
    pub middle: Vec2,
    /// Half the room they take, pixels.
    pub half: Vec2,
}

impl Words {
    fn is_clear_of(&self, other: &Self) -> bool {
        let apart = (self.middle - other.middle).abs();
        let room = self.half + other.half;
        apart.x >= room.x || apart.y >= room.y
    }
}

/// Where words stand already.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Taken(pub Vec<Words>);

impl Taken {
    fn is_free(&self, words: &Words) -> bool {
        self.0.iter().all(|other| words.is_clear_of(other))
    }

    /// The first of some places that is free, else the first of all; it is taken from now on.
    pub(super) fn take_first(&mut self, places: impl IntoIterator<Item = Words>) -> Option<Words> {
        let mut places = places.into_iter();
        let first = places.next()?;
        let found =
            if self.is_free(&first) { first } else { places.find(|own| self.is_free(own)).unwrap_or(first) };
        self.0.push(found);
        Some(found)
    }
}

/// Size of the letters, points.
const LETTERS: f32 = 12.0;

/// Places names from the first to the last: to the right of their point, else to the left, above or below; a name for which no
/// room is left goes without. Gives each name that found room by its index.
fn placed(view: &View, names: &[Label], size: Vec2, scale: f32, taken: &mut Taken) -> Vec<(usize, Words)> {
    let mut all = Vec::new();
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
        let places = offsets.into_iter().map(|offset| Words { middle: spot.pixel + offset, half });
        let is_inside =
            |own: &Words| (own.middle - half).min_element() >= 0.0 && (own.middle + half).cmple(size).all();
        if let Some(own) = places.into_iter().find(|own| is_inside(own) && taken.is_free(own)) {
            taken.0.push(own);
            all.push((label, own));
        }
    }
    all
}

/// Writes names, each with a dark or light edge that keeps it legible over limbs, where nothing stands yet.
pub(super) fn draw_names(
    canvas: &mut Canvas,
    view: &View,
    names: &[Label],
    theme: &Theme,
    scale: f32,
    taken: &mut Taken,
) {
    let size = Vec2::new(canvas.width() as f32, canvas.height() as f32);
    let style = TextStyle::words(LETTERS * scale, theme.text).aligned(Align::Center);
    let shade = TextStyle { color: theme.background.with_alpha(0.75), ..style };
    for (label, own) in placed(view, names, size, scale, taken) {
        let text = &names[label].text;
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
        let found = placed(&view, &names, size, 1.0, &mut Taken::default());
        assert_eq!(found[0].0, 0);
        assert!(found.len() > 5 && found.len() < 40, "{}", found.len());
        for (i, (name, a)) in found.iter().enumerate() {
            assert!((a.middle - a.half).min_element() >= 0.0 && (a.middle + a.half).cmple(size).all());
            for (other, b) in &found[..i] {
                let apart = (a.middle - b.middle).abs() - (a.half + b.half);
                assert!(apart.max_element() >= 0.0, "{} and {}", names[*name].text, names[*other].text);
            }
        }
        // What stands there already stays clear.
        let letters = Words { middle: found[0].1.middle, half: Vec2::splat(6.0) };
        let mut taken = Taken(vec![letters]);
        let around = placed(&view, &names, size, 1.0, &mut taken);
        assert!(!around.is_empty() && around.iter().all(|(_, own)| own.is_clear_of(&letters)));
    }

    #[test]
    fn words_that_are_always_shown_go_where_there_is_room() {
        let at = |x: f32, y: f32| Words { middle: Vec2::new(x, y), half: Vec2::new(10.0, 8.0) };
        let mut taken = Taken::default();
        let places = [at(50.0, 50.0), at(75.0, 50.0), at(25.0, 50.0)];
        let found: Vec<f32> =
            (0..4).filter_map(|_| taken.take_first(places)).map(|own| own.middle.x).collect();
        assert_eq!(found, [50.0, 75.0, 25.0, 50.0], "with no room left they keep their own place");
    }
}

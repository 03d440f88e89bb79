//! Words and numbers in pictures made without a window.
//!
//! The typefaces are the ones the window uses, so a picture from the command line looks like it.

use std::sync::LazyLock;

use ab_glyph::{Font as _, FontRef, GlyphId, PxScale, ScaleFont as _, point};
use glam::Vec2;

use crate::raster::image::Image;
use crate::raster::palette::Color;

/// A typeface.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Face {
    /// For words: Ubuntu Light.
    Words,
    /// For columns of numbers: Hack, every character as wide as every other.
    Numbers,
}

/// Which end of the text stands at the given place.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Align {
    /// The text starts there.
    Left,
    /// It is centred there.
    Center,
    /// It ends there.
    Right,
}

/// How text looks.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TextStyle {
    /// Pixels from the top of the tallest letters to the foot of the lowest.
    pub size: f32,
    /// Ink.
    pub color: Color,
    /// Typeface.
    pub face: Face,
    /// Where the given place is in the text.
    pub align: Align,
}

impl TextStyle {
    /// Words of `size` pixels that start at the given place.
    pub fn words(size: f32, color: Color) -> Self {
        Self { size, color, face: Face::Words, align: Align::Left }
    }

    /// Numbers of `size` pixels that start at the given place.
    pub fn numbers(size: f32, color: Color) -> Self {
        Self { face: Face::Numbers, ..Self::words(size, color) }
    }

    /// The same with another alignment.
    #[must_use]
    pub fn aligned(self, align: Align) -> Self {
        Self { align, ..self }
    }
}

static WORDS: LazyLock<Option<FontRef<'static>>> = LazyLock::new(|| load(epaint_default_fonts::UBUNTU_LIGHT));
static NUMBERS: LazyLock<Option<FontRef<'static>>> =
    LazyLock::new(|| load(epaint_default_fonts::HACK_REGULAR));

/// The typefaces are compiled in, so this fails only if the package that brings them is broken; then pictures have no
/// words, and a test here says so.
fn load(bytes: &'static [u8]) -> Option<FontRef<'static>> {
    FontRef::try_from_slice(bytes).ok()
}

/// The typeface and glyph for a letter: the wished one, else the other, else a question mark.
fn glyph(face: Face, letter: char) -> Option<(&'static FontRef<'static>, GlyphId)> {
    let wished = match face {
        Face::Words => [&*WORDS, &*NUMBERS],
        Face::Numbers => [&*NUMBERS, &*WORDS],
    };
    let letter = if letter.is_control() { ' ' } else { letter };
    let find = |letter| {
        wished.into_iter().flatten().map(|font| (font, font.glyph_id(letter))).find(|(_, id)| id.0 != 0)
    };
    find(letter).or_else(|| find('?'))
}

/// Walks over the text: each glyph with its place from the start, and the whole width.
fn layout(
    text: &str,
    face: Face,
    size: f32,
    mut visit: impl FnMut(&'static FontRef<'static>, GlyphId, f32),
) -> f32 {
    let mut x = 0.0;
    let mut last: Option<(&FontRef<'_>, GlyphId)> = None;
    for (font, id) in text.chars().filter_map(|letter| glyph(face, letter)) {
        let scaled = font.as_scaled(PxScale::from(size));
        if let Some((last_font, last_id)) = last
            && std::ptr::eq(last_font, font)
        {
            x += scaled.kern(last_id, id);
        }
        visit(font, id, x);
        x += scaled.h_advance(id);
        last = Some((font, id));
    }
    x
}

/// The width of a line of text, pixels.
pub fn text_width(text: &str, style: &TextStyle) -> f32 {
    layout(text, style.face, style.size, |_, _, _| {})
}

/// The text, cut with "…" so that it is no wider than `width` pixels. Empty when not even that fits.
pub fn elide(text: &str, style: &TextStyle, width: f32) -> String {
    if text_width(text, style) <= width {
        return text.to_owned();
    }
    // Names come from files: one of a million letters must not take a million squared steps.
    let mut kept: Vec<char> = text.chars().take(256).collect();
    while kept.pop().is_some() {
        let cut: String = kept.iter().collect::<String>().trim_end().to_owned() + "…";
        if text_width(&cut, style) <= width {
            return cut;
        }
    }
    String::new()
}

/// Writes one line. `at` is its place (pixels): left, middle or right by the style's alignment, and the top of the
/// line. Returns the width in pixels.
pub fn draw_text(image: &mut Image, text: &str, at: Vec2, style: &TextStyle) -> f32 {
    let width = text_width(text, style);
    let left = match style.align {
        Align::Left => at.x,
        Align::Center => at.x - width / 2.0,
        Align::Right => at.x - width,
    };
    // All letters of a line stand on one whole pixel, or their feet would be blurred.
    let ascent = glyph(style.face, 'x').map_or(0.0, |(font, _)| font.as_scaled(style.size).ascent());
    let baseline = (at.y + ascent).round();
    layout(text, style.face, style.size, |font, id, x| {
        let placed = id.with_scale_and_position(style.size, point(left + x, baseline));
        if let Some(outline) = font.outline_glyph(placed) {
            let corner = outline.px_bounds().min;
            outline.draw(|x, y, coverage| {
                // Thin strokes at small sizes come out paler than drawn; a mild curve gives them their weight back.
                let weight = coverage.clamp(0.0, 1.0).powf(0.8);
                image.blend(corner.x as i32 + x as i32, corner.y as i32 + y as i32, style.color, weight);
            });
        }
    });
    width
}

/// Writes one line with the middle of its small letters at height `at.y`.
pub fn draw_text_centered(image: &mut Image, text: &str, at: Vec2, style: &TextStyle) -> f32 {
    draw_text(image, text, Vec2::new(at.x, at.y - style.size / 2.0), style)
}

/// Degrees with as many decimals as are useful: `0.25°`, `7.5°`, `48°`, and never `-0°`.
pub fn format_degrees(degrees: f64) -> String {
    let decimals = match degrees.abs() {
        size if size < 1.0 => 2,
        size if size < 10.0 => 1,
        _ => 0,
    };
    let text = format!("{degrees:.decimals$}");
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
    format!("{}°", if text == "-0" { "0" } else { text })
}

#[cfg(test)]
mod tests {
    use super::*;

    const INK: Color = Color::rgb(0);

    #[test]
    fn both_typefaces_load_and_have_what_we_write() {
        for face in [&*WORDS, &*NUMBERS] {
            let font = face.as_ref().unwrap();
            for letter in "AZaz09°Δ×θ–-+.…".chars() {
                assert_ne!(font.glyph_id(letter).0, 0, "{letter}");
            }
        }
    }

    #[test]
    fn alignment_places_the_text_and_ink_stays_in_its_line() {
        let inked = |align| {
            let mut image = Image::new(120, 40, Color::rgb(0xFF_FF_FF));
            draw_text(
                &mut image,
                "Hips gH",
                Vec2::new(60.0, 10.0),
                &TextStyle::words(16.0, INK).aligned(align),
            );
            let dark: Vec<usize> =
                (0..image.pixels().len()).filter(|&i| image.pixels()[i][0] < 128).collect();
            let columns = || dark.iter().map(|i| i % 120);
            let rows = || dark.iter().map(|i| i / 120);
            assert!(rows().min().unwrap() >= 10 && rows().max().unwrap() < 27);
            (columns().min().unwrap(), columns().max().unwrap())
        };
        assert!(inked(Align::Left).0 >= 60);
        assert!(inked(Align::Right).1 <= 60);
        let (left, right) = inked(Align::Center);
        assert!((left + right).abs_diff(120) < 4);
    }

    #[test]
    fn long_names_are_cut_to_fit() {
        let style = TextStyle::words(14.0, INK);
        let cut = elide("LeftHandMiddleFinger3", &style, 70.0);
        assert!(cut.starts_with("Left") && cut.ends_with('…'), "{cut}");
        assert!(text_width(&cut, &style) <= 70.0);
        assert_eq!(elide("Hips", &style, 70.0), "Hips");
        assert_eq!(elide("Hips", &style, 1.0), "");
    }

    #[test]
    fn letters_without_a_glyph_still_take_room() {
        let style = TextStyle::words(14.0, INK);
        assert_eq!(text_width("腰", &style), text_width("?", &style));
        assert_eq!(text_width("\n", &style), text_width(" ", &style));
    }

    #[test]
    fn degrees_read_well() {
        for (degrees, expected) in [
            (0.0, "0°"),
            (-0.001, "0°"),
            (0.254, "0.25°"),
            (7.5, "7.5°"),
            (-48.2, "-48°"),
            (180.0, "180°"),
            (9.99, "10°"),
        ] {
            assert_eq!(format_degrees(degrees), expected);
        }
    }
}

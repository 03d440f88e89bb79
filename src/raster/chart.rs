//! What charts share: their area, round tick values, the time axis, snag marks and the playhead.

use glam::Vec2;

use crate::raster::canvas::{Canvas, Stroke};
use crate::raster::palette::{Color, Theme};
use crate::raster::text::{Align, TextStyle, draw_text, draw_text_centered, text_width};

/// A rectangle of a picture, pixels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Area {
    /// Left border.
    pub left: f32,
    /// Upper border.
    pub top: f32,
    /// To the right border.
    pub width: f32,
    /// To the lower border.
    pub height: f32,
}

impl Area {
    /// The whole of a canvas.
    pub fn of(canvas: &Canvas) -> Self {
        Self { left: 0.0, top: 0.0, width: canvas.width() as f32, height: canvas.height() as f32 }
    }

    /// Right border.
    pub fn right(&self) -> f32 {
        self.left + self.width
    }

    /// Lower border.
    pub fn bottom(&self) -> f32 {
        self.top + self.height
    }

    /// The area without a strip at each side; never less than one pixel wide and high.
    #[must_use]
    pub fn inset(&self, left: f32, top: f32, right: f32, bottom: f32) -> Self {
        Self {
            left: self.left + left,
            top: self.top + top,
            width: (self.width - left - right).max(1.0),
            height: (self.height - top - bottom).max(1.0),
        }
    }

    pub(super) fn fill(&self, canvas: &mut Canvas, color: Color) {
        let (left, top) = (self.left.round() as i32, self.top.round() as i32);
        let (right, bottom) = (self.right().round() as i32, self.bottom().round() as i32);
        canvas.image.fill_rect(left, top, right - left, bottom - top, color);
    }

    /// A frame of `line` pixels just inside the border.
    pub(super) fn outline(&self, canvas: &mut Canvas, line: f32, color: Color) {
        for side in [
            Self { height: line, ..*self },
            Self { top: self.bottom() - line, height: line, ..*self },
            Self { top: self.top + line, width: line, height: self.height - 2.0 * line, ..*self },
            Self {
                left: self.right() - line,
                top: self.top + line,
                width: line,
                height: self.height - 2.0 * line,
            },
        ] {
            side.fill(canvas, color);
        }
    }
}

/// A span of time with a fault in it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SnagMark {
    /// First time it touches, seconds.
    pub first_secs: f64,
    /// Last time it touches, seconds.
    pub last_secs: f64,
    /// The letter of its kind.
    pub letter: char,
}

/// A value axis laid on pixels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scale {
    /// The value at `pixels[0]`.
    pub low: f64,
    /// The value at `pixels[1]`.
    pub high: f64,
    /// Where the two values stand.
    pub pixels: [f32; 2],
}

impl Scale {
    /// Values from `low` to `high`; an empty or broken span is widened to one unit.
    pub fn new(low: f64, high: f64, pixels: [f32; 2]) -> Self {
        let low = if low.is_finite() { low } else { 0.0 };
        let high = if high.is_finite() && high > low { high } else { low + 1.0 };
        Self { low, high, pixels }
    }

    /// The pixel of a value.
    pub fn pixel(&self, value: f64) -> f32 {
        let share = (value - self.low) / (self.high - self.low);
        (f64::from(self.pixels[0]) + share * f64::from(self.pixels[1] - self.pixels[0])) as f32
    }

    /// The value at a pixel.
    pub fn value(&self, pixel: f32) -> f64 {
        let share = f64::from(pixel - self.pixels[0]) / f64::from(self.pixels[1] - self.pixels[0]);
        self.low + share * (self.high - self.low)
    }

    /// Multiples of `step` on the axis.
    pub fn multiples(&self, step: f64) -> impl Iterator<Item = f64> + use<> {
        let (first, last) = ((self.low / step - 1e-9).ceil(), (self.high / step + 1e-9).floor());
        // A broken span must not count to infinity.
        let count = if step > 0.0 { (last - first + 1.0).clamp(0.0, 1000.0) as u32 } else { 0 };
        (0..count).map(move |i| (first + f64::from(i)) * step)
    }
}

/// A round step of at least `least`: 1, 2 or 5 times a power of ten.
pub fn decimal_step(least: f64) -> f64 {
    let power = 10_f64.powf(least.max(1e-9).log10().floor());
    let lead = least / power;
    power * [1.0, 2.0, 5.0].into_iter().find(|&step| step >= lead * (1.0 - 1e-9)).unwrap_or(10.0)
}

/// A step of degrees of at least `least`: decimal below 5°, then parts and multiples of a whole turn.
pub fn degree_step(least: f64) -> f64 {
    const TURNS: [f64; 8] = [5.0, 10.0, 15.0, 30.0, 45.0, 90.0, 180.0, 360.0];
    match TURNS.into_iter().find(|&step| step >= least) {
        Some(step) if least > 2.0 => step,
        Some(_) => decimal_step(least),
        None => 360.0 * decimal_step(least / 360.0),
    }
}

/// Seconds with the decimals that `step` needs.
pub fn format_secs(secs: f64, step: f64) -> String {
    let decimals = (-(step * (1.0 + 1e-9)).log10().floor()).clamp(0.0, 4.0) as usize;
    // No minus sign before a zero.
    let secs = if secs.abs() < step * 1e-6 { 0.0 } else { secs };
    format!("{secs:.decimals$} s")
}

/// Size of small letters in charts, points.
pub(super) const SMALL: f32 = 12.0;

/// Draws the time axis under `area`: light lines through it and times below, none of them running into the next.
pub(super) fn draw_time_axis(canvas: &mut Canvas, area: &Area, time: &Scale, theme: &Theme, scale: f32) {
    let style = TextStyle::words(SMALL * scale, theme.text_faint).aligned(Align::Center);
    let widest = text_width("00.00 s", &style) + 14.0 * scale;
    let px_per_sec = f64::from(area.width) / (time.high - time.low);
    let step = decimal_step(f64::from(widest) / px_per_sec);
    for secs in time.multiples(step) {
        let x = time.pixel(secs).round();
        Area { left: x, width: scale.round().max(1.0), ..*area }.fill(canvas, theme.grid.with_alpha(0.6));
        let tick = Area { left: x, top: area.bottom(), width: scale.round().max(1.0), height: 4.0 * scale };
        tick.fill(canvas, theme.axis);
        let text = format_secs(secs, step);
        let half = text_width(&text, &style) / 2.0;
        let x = x.min(canvas.width() as f32 - half - 1.0).max(half + 1.0);
        draw_text(&mut canvas.image, &text, Vec2::new(x, area.bottom() + 5.0 * scale), &style);
    }
}

/// Draws the letter of a snag in a small filled box centred at `at`. Vermillion alone would not do: the letter says it.
pub(super) fn draw_letter(canvas: &mut Canvas, letter: char, at: Vec2, size: f32, color: Color) {
    let half = size / 2.0;
    let plate = Area {
        left: (at.x - half).round(),
        top: (at.y - half).round(),
        width: size.round(),
        height: size.round(),
    };
    plate.fill(canvas, color);
    let style = TextStyle::numbers(size * 0.92, color.readable_ink()).aligned(Align::Center);
    let middle = Vec2::new(plate.left + plate.width / 2.0, plate.top + plate.height / 2.0);
    draw_text_centered(&mut canvas.image, &letter.to_string(), middle, &style);
}

/// Draws the playhead: a firm line with a flat foot and head, drawn over everything.
pub(super) fn draw_playhead(canvas: &mut Canvas, area: &Area, x: f32, theme: &Theme, scale: f32) {
    let line = Stroke::over(theme.text, 1.5 * scale);
    let rim = Stroke::over(theme.background.with_alpha(0.6), 3.5 * scale);
    canvas.flat_polyline(&[Vec2::new(x, area.top), Vec2::new(x, area.bottom())], &rim);
    canvas.flat_polyline(&[Vec2::new(x, area.top), Vec2::new(x, area.bottom())], &line);
    let half = 4.0 * scale;
    let head = [
        Vec2::new(x - half, area.top - half),
        Vec2::new(x + half, area.top - half),
        Vec2::new(x, area.top + half),
    ];
    canvas.flat_polygon(&head, theme.text);
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_are_round_numbers_of_their_unit() {
        for (least, expected) in [(0.03, 0.05), (0.1, 0.1), (0.11, 0.2), (3.0, 5.0), (7.0, 10.0)] {
            assert!((decimal_step(least) - expected).abs() < 1e-9, "{least}");
        }
        for (least, expected) in
            [(0.3, 0.5), (1.4, 2.0), (2.5, 5.0), (12.0, 15.0), (31.0, 45.0), (200.0, 360.0), (500.0, 720.0)]
        {
            assert!((degree_step(least) - expected).abs() < 1e-9, "{least}: {}", degree_step(least));
        }
    }

    #[test]
    fn times_have_the_decimals_of_their_step() {
        for (secs, step, expected) in
            [(2.0, 1.0, "2 s"), (0.25, 0.05, "0.25 s"), (-1e-12, 0.5, "0.0 s"), (120.0, 20.0, "120 s")]
        {
            assert_eq!(format_secs(secs, step), expected);
        }
    }

    #[test]
    fn a_scale_maps_both_ways_and_survives_empty_spans() {
        let scale = Scale::new(1.0, 3.0, [100.0, 300.0]);
        assert_eq!(scale.pixel(2.0), 200.0);
        assert_eq!(scale.value(250.0), 2.5);
        assert_eq!(scale.multiples(0.5).collect::<Vec<_>>(), [1.0, 1.5, 2.0, 2.5, 3.0]);
        assert_eq!(Scale::new(5.0, 5.0, [0.0, 1.0]).high, 6.0);
        assert_eq!(Scale::new(f64::NAN, f64::INFINITY, [0.0, 1.0]).pixel(0.5), 0.5);
        assert!(Scale::new(0.0, 1e12, [0.0, 1.0]).multiples(1e-9).count() <= 1000);
    }
}

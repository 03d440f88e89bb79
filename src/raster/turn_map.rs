//! The turn map: a row for each joint, time across, heat for the turn rate or whatever else is measured.

use glam::Vec2;

use crate::raster::canvas::Canvas;
use crate::raster::chart::{Area, SMALL, Scale, SnagMark, draw_letter, draw_playhead, draw_time_axis};
use crate::raster::image::Image;
use crate::raster::palette::{Color, Theme, cividis};
use crate::raster::text::{Align, TextStyle, draw_text, draw_text_centered, elide, text_width};

/// A row of a turn map.
#[derive(Clone, Debug, PartialEq)]
pub struct MapRow {
    /// The joint's label.
    pub name: String,
    /// One value for each frame, 0 or more. What is not a number was not measured and is grey.
    pub values: Vec<f32>,
    /// Snags of this joint, in order of time.
    pub marks: Vec<SnagMark>,
}

/// A turn map.
#[derive(Clone, Debug, PartialEq)]
pub struct TurnMap {
    /// Written above; no line for it when empty.
    pub title: String,
    /// From top to bottom.
    pub rows: Vec<MapRow>,
    /// Time of the first and the last frame, seconds.
    pub time_secs: [f64; 2],
    /// The value with the brightest colour; larger ones look the same. See [`full_scale`].
    pub full_scale: f32,
    /// Written behind the numbers of the colour key, such as "°/s".
    pub unit: String,
    /// The time shown elsewhere, seconds.
    pub playhead_secs: Option<f64>,
    /// The chosen row.
    pub chosen: Option<usize>,
}

/// A round value that all but the fastest one in fifty of the values stay below: one broken joint must not make
/// all others look still. At least 1.
pub fn full_scale<'a>(rows: impl IntoIterator<Item = &'a [f32]>) -> f32 {
    let mut values: Vec<f32> =
        rows.into_iter().flatten().copied().filter(|value| value.is_finite()).collect();
    if values.is_empty() {
        return 1.0;
    }
    let place = (values.len() - 1) * 98 / 100;
    let (_, value, _) = values.select_nth_unstable_by(place, f32::total_cmp);
    let (value, power) = (value.max(1.0), 10_f32.powf(value.max(1.0).log10().floor()));
    let round = [1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 6.0, 8.0].into_iter().map(|lead| lead * power);
    round.into_iter().find(|&round| round >= value * 0.999).unwrap_or(10.0 * power)
}

/// The heat alone: rows from the top, spread evenly over the height; frames from the left, spread evenly over the
/// width. Where several frames or rows share a pixel the largest value shows, so that no short fault is lost.
///
/// Colour goes with the square root of the value, so that slow motion can be told from stillness.
pub fn heat_image(rows: &[&[f32]], full_scale: f32, width: usize, height: usize) -> Image {
    let mut image = Image::new(width, height, cividis(0.0));
    let (width, height) = (image.width(), image.height());
    if rows.is_empty() || width == 0 {
        return image;
    }
    // Each row of joints is worked out once, however many pixels high it is.
    let mut last: Option<((usize, usize), usize)> = None;
    for y in 0..height {
        let shown = cell_span(y, height, rows.len());
        let start = y * width;
        if let Some((_, line)) = last.filter(|(span, _)| *span == shown) {
            image.pixels_mut().copy_within(line * width..(line + 1) * width, start);
            continue;
        }
        for x in 0..width {
            let mut largest = f32::NAN;
            for row in &rows[shown.0..shown.1] {
                let (first, end) = cell_span(x, width, row.len());
                // `max` prefers a number to what is none.
                largest = row[first..end].iter().fold(largest, |largest, value| largest.max(*value));
            }
            let share = (largest.max(0.0) / full_scale.max(f32::MIN_POSITIVE)).sqrt();
            let share = if largest.is_nan() { f32::NAN } else { share };
            image.pixels_mut()[start + x] = cividis(share).premultiplied();
        }
        last = Some((shown, y));
    }
    image
}

/// Which of `cells` fall on pixel `at` of `pixels`: first and one past the last; at least one unless there are none.
fn cell_span(at: usize, pixels: usize, cells: usize) -> (usize, usize) {
    let first = (at * cells / pixels).min(cells.saturating_sub(1));
    let end = ((at + 1) * cells).div_ceil(pixels).clamp(first, cells);
    // Stretched cells begin where the last one ended: take the one under the pixel's start alone.
    let end = if cells <= pixels { (first + 1).min(cells) } else { end };
    (first, end)
}

/// The height that shows every row with a legible name, pixels.
pub fn turn_map_height(map: &TurnMap, scale: f32) -> f32 {
    let title = if map.title.is_empty() { 0.0 } else { 22.0 };
    (title + map.rows.len() as f32 * 16.0 + BELOW) * scale
}

/// Draws a turn map with names, times, snags and its colour key into an area. `scale` is pixels per point.
pub fn draw_turn_map(canvas: &mut Canvas, area: Area, map: &TurnMap, theme: &Theme, scale: f32) {
    let mut inner = area;
    if !map.title.is_empty() {
        let style = TextStyle::words(15.0 * scale, theme.text);
        let title = elide(&map.title, &style, area.width);
        draw_text(&mut canvas.image, &title, Vec2::new(area.left, area.top), &style);
        inner = inner.inset(0.0, 22.0 * scale, 0.0, 0.0);
    }
    let name_style = TextStyle::words(SMALL * scale, theme.text);
    let widest = map.rows.iter().map(|row| text_width(&row.name, &name_style)).fold(0.0, f32::max);
    let names_width = widest.min(area.width * 0.25) + 14.0 * scale;
    let inner = inner.inset(names_width, 0.0, 8.0 * scale, BELOW * scale);
    let inner = Area {
        left: inner.left.round(),
        top: inner.top.round(),
        width: inner.width.round(),
        height: inner.height.round(),
    };
    let values: Vec<&[f32]> = map.rows.iter().map(|row| &row.values[..]).collect();
    let heat = heat_image(&values, map.full_scale, inner.width as usize, inner.height as usize);
    canvas.image.blit(&heat, inner.left as i32, inner.top as i32);

    let time = Scale::new(map.time_secs[0], map.time_secs[1], [inner.left, inner.right()]);
    let row_height = inner.height / map.rows.len().max(1) as f32;
    // Names that would touch each other are left out: every second, third … is written.
    let every = ((SMALL * scale + 1.0) / row_height).ceil().max(1.0) as usize;
    for (i, row) in map.rows.iter().enumerate() {
        let strip = Area { top: inner.top + i as f32 * row_height, height: row_height, ..inner };
        if i > 0 && row_height >= 4.0 {
            Area { top: strip.top.round(), height: 1.0, ..strip }
                .fill(canvas, Color::rgb(0).with_alpha(0.35));
        }
        let is_chosen = map.chosen == Some(i);
        if i % every == 0 || is_chosen {
            let middle = strip.top + row_height / 2.0;
            let name = elide(&row.name, &name_style, names_width - 12.0 * scale);
            let at = Vec2::new(inner.left - 8.0 * scale, middle);
            draw_text_centered(&mut canvas.image, &name, at, &name_style.aligned(Align::Right));
            if is_chosen {
                canvas.flat_dot(Vec2::new(inner.left - 4.0 * scale, middle), 2.5 * scale, theme.text);
            }
        }
        if is_chosen {
            Area { top: strip.top.round(), height: row_height.round(), ..strip }.outline(
                canvas,
                1.0,
                Color::rgb(0xFF_FF_FF),
            );
        }
        draw_row_marks(canvas, &strip, row, &time, theme, scale);
    }
    draw_time_ticks(canvas, &inner, &time, theme, scale);
    draw_key(canvas, &inner, map, theme, scale);
    if let Some(secs) = map.playhead_secs.filter(|secs| (time.low..=time.high).contains(secs)) {
        draw_playhead(canvas, &inner, time.pixel(secs), theme, scale);
    }
}

/// The time axis without lines through the heat, which has its own pattern.
fn draw_time_ticks(canvas: &mut Canvas, area: &Area, time: &Scale, theme: &Theme, scale: f32) {
    let below = Area { top: area.bottom(), height: 0.0, ..*area };
    draw_time_axis(canvas, &below, time, theme, scale);
}

/// Frames and letters of one row's snags. A frame is vermillion between dark lines, so it shows on any heat.
fn draw_row_marks(canvas: &mut Canvas, strip: &Area, row: &MapRow, time: &Scale, theme: &Theme, scale: f32) {
    let line = (1.5 * scale).round().max(1.0);
    let mut last: Option<(f32, char)> = None;
    for mark in &row.marks {
        let (left, right) = (time.pixel(mark.first_secs), time.pixel(mark.last_secs));
        if right < strip.left || left > strip.right() {
            continue;
        }
        let size = (13.0 * scale).min(strip.height.max(9.0)).round();
        let x = left
            .midpoint(right)
            .clamp(strip.left + size / 2.0, (strip.right() - size / 2.0).max(strip.left + size / 2.0));
        let (left, right) = (left.max(strip.left), right.min(strip.right()));
        if right - left > size {
            let frame =
                Area { left, width: right - left, top: strip.top.round(), height: strip.height.round() };
            frame.outline(canvas, line, theme.snag);
            frame.inset(line, line, line, line).outline(canvas, 1.0, Color::rgb(0).with_alpha(0.6));
        }
        let is_repeated = last.is_some_and(|(before, letter)| x < before + size && letter == mark.letter);
        if !is_repeated {
            let at = Vec2::new(x, strip.top + strip.height / 2.0);
            let rim = Area {
                left: x - size / 2.0 - 1.0,
                top: at.y - size / 2.0 - 1.0,
                width: size + 2.0,
                height: size + 2.0,
            };
            rim.fill(canvas, Color::rgb(0).with_alpha(0.7));
            draw_letter(canvas, mark.letter, at, size, theme.snag);
            last = Some((x, mark.letter));
        }
    }
}

/// Room below the heat for times and the colour key, points.
const BELOW: f32 = 52.0;
/// The height of the colour key's middle above the lower border of the whole map, points.
pub(super) const KEY_MIDDLE: f32 = 17.5;
/// The colour key's own height, points.
const KEY_HEIGHT: f32 = 9.0;

/// The colour key below the times: the heat from 0 to full scale, with numbers.
fn draw_key(canvas: &mut Canvas, area: &Area, map: &TurnMap, theme: &Theme, scale: f32) {
    let style = TextStyle::words(SMALL * scale, theme.text_faint);
    let width = (180.0 * scale).min(area.width * 0.5).round();
    let key = Area {
        left: area.left,
        top: (area.bottom() + (BELOW - KEY_MIDDLE - KEY_HEIGHT / 2.0) * scale).round(),
        width,
        height: (KEY_HEIGHT * scale).round(),
    };
    for x in 0..width as usize {
        let color = cividis(((x as f32 + 0.5) / width).sqrt());
        Area { left: key.left + x as f32, width: 1.0, ..key }.fill(canvas, color);
    }
    key.outline(canvas, 1.0, theme.axis);
    let middle = key.top + key.height / 2.0;
    let zero = Vec2::new(key.left - 6.0 * scale, middle);
    draw_text_centered(&mut canvas.image, "0", zero, &style.aligned(Align::Right));
    let text = format!("{}{} and more", map.full_scale, map.unit);
    draw_text_centered(&mut canvas.image, &text, Vec2::new(key.right() + 6.0 * scale, middle), &style);
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_fault_of_one_frame_shows_in_a_map_far_narrower_than_the_clip() {
        let mut values = vec![0.0; 36_000];
        values[17_777] = 100.0;
        let still = vec![0.0; 36_000];
        let image = heat_image(&[&still, &values], 100.0, 50, 8);
        let bright = cividis(1.0).premultiplied();
        let found: Vec<usize> = (0..400).filter(|&i| image.pixels()[i] == bright).collect();
        assert_eq!(found, [4, 5, 6, 7].map(|y| y * 50 + 17_777 * 50 / 36_000));
    }

    #[test]
    fn stretched_maps_show_each_frame_and_row_evenly() {
        let image = heat_image(&[&[0.0, 1.0], &[1.0, f32::NAN]], 1.0, 6, 4);
        let (cold, hot, none) = (cividis(0.0), cividis(1.0), cividis(f32::NAN));
        for (x, y, expected) in [(2, 0, cold), (3, 0, hot), (0, 2, hot), (2, 3, hot), (3, 3, none)] {
            assert_eq!(image.pixel(x, y), Some(expected.premultiplied()), "{x} {y}");
        }
    }

    #[test]
    fn one_broken_joint_does_not_set_the_scale() {
        let calm: Vec<f32> = (0..990).map(|i| i as f32 / 10.0).collect();
        let broken = [1e6, f32::NAN, f32::INFINITY];
        assert_eq!(full_scale([&calm[..], &broken[..]]), 100.0);
        assert_eq!(full_scale([&[130.0_f32; 9][..]]), 150.0);
        assert_eq!(full_scale([&[0.2_f32; 9][..]]), 1.0);
        assert_eq!(full_scale([&[999.0_f32; 9][..]]), 1000.0);
        assert_eq!(full_scale([]), 1.0);
    }

    #[test]
    fn empty_maps_draw_nothing_wrong() {
        assert_eq!(heat_image(&[], 1.0, 3, 2).pixels().len(), 6);
        assert_eq!(heat_image(&[&[]], 1.0, 3, 2).pixel(0, 0), Some(cividis(f32::NAN).premultiplied()));
        assert_eq!(heat_image(&[&[1.0]], 1.0, 0, 2).pixels().len(), 0);
    }
}

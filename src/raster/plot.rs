//! Curves over time: grey for the source, colour for the result.

use glam::Vec2;

use crate::raster::canvas::{Canvas, Dash, Stroke};
use crate::raster::chart::{
    Area, SMALL, Scale, SnagMark, decimal_step, degree_step, draw_letter, draw_playhead, draw_time_axis,
};
use crate::raster::palette::{Color, Theme};
use crate::raster::text::{Align, TextStyle, draw_text, draw_text_centered, elide, text_width};

/// One curve.
#[derive(Clone, Debug, PartialEq)]
pub struct Curve {
    /// Seconds and value, in order of time. Values that are not finite leave a gap.
    pub points: Vec<[f64; 2]>,
    /// Ink.
    pub color: Color,
    /// Line width, points.
    pub width: f32,
    /// Solid when absent, points.
    pub dash: Option<Dash>,
    /// Written at the curve's end; nothing when empty.
    pub name: String,
}

impl Curve {
    /// A curve of the source: thin and grey, without a name.
    pub fn before(points: Vec<[f64; 2]>, theme: &Theme) -> Self {
        Self { points, color: theme.before, width: 1.2, dash: None, name: String::new() }
    }

    /// A curve of the result.
    pub fn after(points: Vec<[f64; 2]>, color: Color, name: &str) -> Self {
        Self { points, color, width: 2.0, dash: None, name: name.to_owned() }
    }
}

/// What the values are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ValueUnit {
    /// Angles in degrees.
    Degrees,
    /// Turn rates in degrees per second.
    DegreesPerSecond,
}

impl ValueUnit {
    /// The sign behind a number.
    pub fn sign(self) -> &'static str {
        match self {
            Self::Degrees => "°",
            Self::DegreesPerSecond => "°/s",
        }
    }

    fn step(self, least: f64) -> f64 {
        match self {
            Self::Degrees => degree_step(least),
            Self::DegreesPerSecond => decimal_step(least),
        }
    }
}

/// A plot of curves over time.
#[derive(Clone, Debug, PartialEq)]
pub struct Plot {
    /// Written above; no line for it when empty.
    pub title: String,
    /// First and last time shown, seconds.
    pub time_secs: [f64; 2],
    /// What the values are.
    pub unit: ValueUnit,
    /// Later ones lie over earlier ones.
    pub curves: Vec<Curve>,
    /// Snags on the way.
    pub marks: Vec<SnagMark>,
    /// The time shown elsewhere, seconds.
    pub playhead_secs: Option<f64>,
}

/// Draws a plot into an area of the canvas. `scale` is pixels per point.
pub fn draw_plot(canvas: &mut Canvas, area: Area, plot: &Plot, theme: &Theme, scale: f32) {
    let label_style = TextStyle::words(SMALL * scale, theme.text_faint).aligned(Align::Right);
    let mut inner = area;
    if !plot.title.is_empty() {
        let style = TextStyle::words(15.0 * scale, theme.text);
        let title = elide(&plot.title, &style, area.width);
        draw_text(&mut canvas.image, &title, Vec2::new(area.left, area.top), &style);
        inner = inner.inset(0.0, 22.0 * scale, 0.0, 0.0);
    }
    // Room for the letters of snags above, for times below.
    inner = inner.inset(0.0, 16.0 * scale, 0.0, 22.0 * scale);
    let (low, high) = value_span(plot);
    let step = plot.unit.step((high - low) * f64::from(26.0 * scale / inner.height));
    let text_of = |value: f64| format_value(value, step, plot.unit);
    let values = Scale::new(low, high, [inner.bottom(), inner.top]);
    let widest =
        values.multiples(step).map(|value| text_width(&text_of(value), &label_style)).fold(0.0, f32::max);
    let names_width =
        plot.curves.iter().map(|curve| text_width(&curve.name, &label_style)).fold(0.0, f32::max);
    let names_room = if names_width > 0.0 { names_width + 18.0 * scale } else { 6.0 * scale };
    let inner = inner.inset(widest + 8.0 * scale, 0.0, names_room, 0.0);
    let time = Scale::new(plot.time_secs[0], plot.time_secs[1], [inner.left, inner.right()]);

    inner.fill(canvas, theme.panel);
    let line = scale.round().max(1.0);
    for value in values.multiples(step) {
        let y = values.pixel(value).round();
        let is_zero = value.abs() < step * 1e-6;
        let color = if is_zero { theme.axis } else { theme.grid };
        Area { top: y, height: line, ..inner }.fill(canvas, color);
        let at = Vec2::new(inner.left - 6.0 * scale, y + line / 2.0);
        draw_text_centered(&mut canvas.image, &text_of(value), at, &label_style);
    }
    draw_time_axis(canvas, &inner, &time, theme, scale);
    for mark in &plot.marks {
        let (left, right) = (time.pixel(mark.first_secs), time.pixel(mark.last_secs));
        let middle = left.midpoint(right);
        let half = ((right - left) / 2.0).max(1.5 * scale);
        let band = Area { left: middle - half, width: 2.0 * half, ..inner };
        let band = clip_across(&band, &inner);
        band.fill(canvas, theme.snag.with_alpha(0.28));
        Area { height: 2.0 * line, top: inner.top - 2.0 * line, ..band }.fill(canvas, theme.snag);
    }
    for curve in &plot.curves {
        let points = pixel_points(curve, &time, &values);
        let dash = curve.dash.map(|dash| Dash { on: dash.on * scale, off: dash.off * scale });
        let stroke = Stroke { dash, ..Stroke::over(curve.color, curve.width * scale) };
        canvas.flat_polyline(&points, &stroke);
        // A value alone between gaps is no line, but must be seen.
        for (i, &point) in points.iter().enumerate() {
            let is_alone = |j: Option<&Vec2>| j.is_none_or(|neighbour| !neighbour.is_finite());
            if point.is_finite()
                && is_alone(i.checked_sub(1).and_then(|j| points.get(j)))
                && is_alone(points.get(i + 1))
            {
                canvas.flat_dot(point, 1.5 * curve.width * scale, curve.color);
            }
        }
    }
    draw_mark_letters(canvas, &plot.marks, &inner, &time, theme, scale);
    draw_names(canvas, plot, &inner, &time, &values, theme, scale);
    if let Some(secs) = plot.playhead_secs.filter(|secs| (time.low..=time.high).contains(secs)) {
        draw_playhead(canvas, &inner, time.pixel(secs), theme, scale);
    }
}

/// The smallest and largest value shown, with some air; never less than a degree apart, so that noise does not look
/// like motion.
fn value_span(plot: &Plot) -> (f64, f64) {
    let [from, to] = plot.time_secs;
    let values = plot.curves.iter().flat_map(|curve| &curve.points);
    let values = values.filter(|[secs, value]| (from..=to).contains(secs) && value.is_finite());
    let (low, high) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), [_, value]| {
        (low.min(*value), high.max(*value))
    });
    if low > high {
        return (-1.0, 1.0);
    }
    let air = ((high - low) * 0.06).max((1.0 - (high - low)) / 2.0).max(0.0);
    (low - air, high + air)
}

fn format_value(value: f64, step: f64, unit: ValueUnit) -> String {
    let decimals = (-(step * (1.0 + 1e-9)).log10().floor()).clamp(0.0, 4.0) as usize;
    let value = if value.abs() < step * 1e-6 { 0.0 } else { value };
    format!("{value:.decimals$}{}", unit.sign())
}

/// The curve's points in the picture, cut at the ends of the time axis. Where many fall on one column of pixels, only
/// the first, lowest, highest and last are kept, so that a peak of one frame is never lost and a long clip costs no
/// more than a short one.
fn pixel_points(curve: &Curve, time: &Scale, values: &Scale) -> Vec<Vec2> {
    let to_pixel = |[secs, value]: [f64; 2]| {
        if value.is_finite() { Vec2::new(time.pixel(secs), values.pixel(value)) } else { Vec2::NAN }
    };
    let is_before = |point: &[f64; 2]| point[0] < time.low;
    let start = curve.points.partition_point(is_before);
    let end = curve.points.partition_point(|point| point[0] <= time.high);
    let cut = |before: usize, after: usize, secs: f64| {
        let (a, b) = (curve.points.get(before)?, curve.points.get(after)?);
        if a[0] == secs || b[0] == secs {
            return None;
        }
        let share = (secs - a[0]) / (b[0] - a[0]);
        Some([secs, a[1] + (b[1] - a[1]) * share])
    };
    let first = start.checked_sub(1).and_then(|before| cut(before, start, time.low));
    let last = end.checked_sub(1).and_then(|before| cut(before, end, time.high));
    let inside = curve.points.get(start..end.max(start)).unwrap_or_default();

    let mut kept: Vec<Vec2> = Vec::new();
    let mut column: Vec<Vec2> = Vec::new();
    let flush = |column: &mut Vec<Vec2>, kept: &mut Vec<Vec2>| {
        if column.len() <= 4 {
            kept.append(column);
            return;
        }
        let low = (0..column.len()).min_by(|&a, &b| column[a].y.total_cmp(&column[b].y)).unwrap_or(0);
        let high = (0..column.len()).max_by(|&a, &b| column[a].y.total_cmp(&column[b].y)).unwrap_or(0);
        let mut chosen = [0, low.min(high), low.max(high), column.len() - 1].map(|i| column[i]).to_vec();
        chosen.dedup();
        kept.append(&mut chosen);
        column.clear();
    };
    for point in first.iter().chain(inside).chain(&last).copied().map(to_pixel) {
        let starts_column = column.last().is_some_and(|last| last.x.floor() != point.x.floor());
        if starts_column || !point.is_finite() {
            flush(&mut column, &mut kept);
        }
        if point.is_finite() {
            column.push(point);
        } else if kept.last().is_some_and(|last| last.is_finite()) {
            kept.push(Vec2::NAN);
        }
    }
    flush(&mut column, &mut kept);
    kept
}

/// The part of `band` inside `area`, across.
fn clip_across(band: &Area, area: &Area) -> Area {
    let left = band.left.clamp(area.left, area.right());
    let right = band.right().clamp(area.left, area.right());
    Area { left, width: right - left, ..*band }
}

/// Letters of snags above the plot, each once where the same letter would be written over itself.
fn draw_mark_letters(
    canvas: &mut Canvas,
    marks: &[SnagMark],
    area: &Area,
    time: &Scale,
    theme: &Theme,
    scale: f32,
) {
    let size = 13.0 * scale;
    let mut last: Option<(f32, char)> = None;
    for mark in marks {
        let mut x = time.pixel(mark.first_secs.midpoint(mark.last_secs));
        if !(area.left - 1.0..=area.right() + 1.0).contains(&x) {
            continue;
        }
        if let Some((before, letter)) = last
            && x < before + size
        {
            if letter == mark.letter {
                continue;
            }
            x = before + size + scale;
        }
        draw_letter(canvas, mark.letter, Vec2::new(x, area.top - size / 2.0 - 2.0 * scale), size, theme.snag);
        last = Some((x, mark.letter));
    }
}

/// Names to the right of the plot, each at its curve's end, moved apart where they would meet.
fn draw_names(
    canvas: &mut Canvas,
    plot: &Plot,
    area: &Area,
    time: &Scale,
    values: &Scale,
    theme: &Theme,
    scale: f32,
) {
    let mut names: Vec<(f32, &Curve)> = plot
        .curves
        .iter()
        .filter(|curve| !curve.name.is_empty())
        .filter_map(|curve| {
            let shown =
                curve.points.iter().rev().find(|[secs, value]| *secs <= time.high && value.is_finite())?;
            Some((values.pixel(shown[1]).clamp(area.top, area.bottom()), curve))
        })
        .collect();
    names.sort_by(|a, b| a.0.total_cmp(&b.0));
    let gap = 14.0 * scale;
    // Push down from the top, then, where that ran out at the bottom, back up.
    for i in 1..names.len() {
        names[i].0 = names[i].0.max(names[i - 1].0 + gap);
    }
    let mut floor = area.bottom();
    for name in names.iter_mut().rev() {
        name.0 = name.0.min(floor);
        floor = name.0 - gap;
    }
    let style = TextStyle::words(SMALL * scale, theme.text);
    for (y, curve) in names {
        let start = Vec2::new(area.right() + 3.0 * scale, y);
        let end = start + Vec2::new(9.0 * scale, 0.0);
        canvas.flat_polyline(&[start, end], &Stroke::over(curve.color, 3.0 * scale));
        draw_text_centered(&mut canvas.image, &curve.name, end + Vec2::new(5.0 * scale, 0.0), &style);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn curve(points: Vec<[f64; 2]>) -> Curve {
        Curve::after(points, Color::rgb(0xFF_00_00), "")
    }

    fn scales() -> [Scale; 2] {
        [Scale::new(0.0, 10.0, [0.0, 100.0]), Scale::new(0.0, 100.0, [100.0, 0.0])]
    }

    #[test]
    fn a_peak_of_one_frame_survives_thinning() {
        let mut points: Vec<[f64; 2]> = (0..100_000).map(|i| [f64::from(i) * 1e-4, 10.0]).collect();
        points[54_321][1] = 90.0;
        let [time, values] = scales();
        let kept = pixel_points(&curve(points), &time, &values);
        assert!(kept.len() <= 404, "{}", kept.len());
        let top = kept.iter().map(|point| point.y).fold(f32::INFINITY, f32::min);
        assert!((top - 10.0).abs() < 1e-3);
    }

    #[test]
    fn curves_are_cut_at_the_ends_and_broken_values_leave_gaps() {
        let [time, values] = scales();
        let kept = pixel_points(&curve(vec![[-10.0, 0.0], [10.0, 100.0], [30.0, 0.0]]), &time, &values);
        assert_eq!(kept, [Vec2::new(0.0, 50.0), Vec2::new(100.0, 0.0)]);
        let kept = pixel_points(
            &curve(vec![[1.0, 0.0], [2.0, f64::NAN], [3.0, f64::INFINITY], [4.0, 0.0]]),
            &time,
            &values,
        );
        assert_eq!(kept.iter().filter(|point| !point.is_finite()).count(), 1);
        assert_eq!(kept.len(), 3);
        assert!(pixel_points(&curve(vec![]), &time, &values).is_empty());
    }

    #[test]
    fn values_that_hardly_move_are_not_blown_up() {
        let plot = |values: [f64; 2]| Plot {
            title: String::new(),
            time_secs: [0.0, 1.0],
            unit: ValueUnit::Degrees,
            curves: vec![curve(vec![[0.0, values[0]], [1.0, values[1]]])],
            marks: Vec::new(),
            playhead_secs: None,
        };
        assert_eq!(value_span(&plot([5.0, 5.0])), (4.5, 5.5));
        assert_eq!(value_span(&plot([f64::NAN, f64::NAN])), (-1.0, 1.0));
        let (low, high) = value_span(&plot([0.0, 100.0]));
        assert!((low + 6.0).abs() < 1e-9 && (high - 106.0).abs() < 1e-9);
    }
}

//! What is drawn on the chart beside its keys: limits, snags, lines, names and numbers.

use egui::{Align2, Color32, FontId, Painter, Pos2, Rangef, Rect, Shape, Stroke, Ui, pos2, vec2};

use super::super::super::theme::{INSET, Look};
use super::super::super::view_models::{
    Ceiling, CurveLine, CurveSet, Pyramid, SnagState, degrees_fixed, seconds,
};
use super::super::super::widgets::{TimeAxis, letter_plate, read_out};
use super::super::Scope;
use super::chart::Chart;
use super::columns::{Columns, Curve};
use super::draw::draw_curve;
use super::short;

/// The share of its ink that the line of a further joint keeps.
const FURTHER_INK: f32 = 0.62;

/// Beyond the limits of the chosen joint the ground is shaded, with a line along the limit.
pub(super) fn bands_ui(painter: &Painter, look: &Look, chart: &Chart<'_>) {
    let Some(set) = chart.sets.first() else { return };
    let plot = chart.plot;
    for band in &set.bands {
        let color = set.lines.get(band.line).map_or(look.axis, |line| look.curve(line.color));
        let (fill, stroke) = (color.gamma_multiply(0.13), Stroke::new(1.2, color.gamma_multiply(0.7)));
        let name = set.lines.get(band.line).map_or("", |line| line.name.as_str());
        let label =
            |y: f32, align: Align2| limit_words(painter, look, plot, &format!("limit of {name}"), y, align);
        let level = |value: f64, is_top: bool| {
            let y = chart.values.y(value);
            let rows =
                if is_top { Rangef::new(plot.top() - 8.0, y) } else { Rangef::new(y, plot.bottom() + 4.0) };
            if rows.span() > 0.0 {
                painter.rect_filled(Rect::from_x_y_ranges(plot.x_range(), rows), 0.0, fill);
                painter.hline(plot.x_range(), y, stroke);
                let align = if is_top { Align2::LEFT_BOTTOM } else { Align2::LEFT_TOP };
                label(y, align);
            }
        };
        if let Some(low) = band.low {
            level(low, false);
        }
        match &band.high {
            Ceiling::Level(high) => level(*high, true),
            Ceiling::Moving(row) => {
                let mut mesh = egui::Mesh::default();
                let top = plot.top() - 8.0;
                let mut last: Option<Pos2> = None;
                let columns = (plot.width() / 2.0).max(1.0) as usize;
                for column in 0..=columns {
                    let x = plot.left() + column as f32 * 2.0;
                    let value = set.times.value(row.values(), chart.axis.time(x));
                    let Some(value) = value.filter(|value| value.is_finite()) else { continue };
                    let at = pos2(x, chart.values.y(value).max(top));
                    if let Some(before) = last {
                        let cell =
                            Rect::from_min_max(pos2(before.x, top), pos2(x, f32::midpoint(before.y, at.y)));
                        mesh.add_colored_rect(cell, fill);
                        painter.line_segment([before, at], stroke);
                    } else if at.y > top + 12.0 {
                        label(at.y, Align2::LEFT_BOTTOM);
                    }
                    last = Some(at);
                }
                painter.add(Shape::mesh(mesh));
            }
        }
    }
}

/// Says what a shaded band stands for, at its edge at the left end of the chart: below the marks of snags, on a ground of its own so that
/// curves don't strike it out. A low chart has no room for it; its curves are told by their colour.
pub(super) fn limit_words(painter: &Painter, look: &Look, plot: Rect, words: &str, y: f32, align: Align2) {
    const LEAST_HEIGHT: f32 = 90.0;
    if plot.height() < LEAST_HEIGHT {
        return;
    }
    let galley = painter.layout_no_wrap(words.to_owned(), FontId::proportional(11.0), look.faint);
    let plate = align.anchor_size(pos2(plot.left() + 6.0, y), galley.size());
    let below_marks = plot.top() + 15.0;
    let down = (below_marks - plate.top()).max(0.0) - (plate.bottom() - plot.bottom()).max(0.0);
    let plate = plate.translate(vec2(0.0, down));
    painter.rect_filled(plate.expand2(vec2(2.0, 0.0)), 2.0, look.background.gamma_multiply(0.7));
    painter.galley(plate.min, galley, look.faint);
}

/// The curves: the source in grey, the result in colour, and in front of it what is being done by hand.
pub(super) fn lines_ui(
    painter: &Painter,
    look: &Look,
    chart: &Chart<'_>,
    shows_before: bool,
    kept: &mut Columns,
) {
    kept.begin();
    let alone = chart.is_source_alone;
    let (axis, values) = (&chart.axis, &chart.values);
    for set in chart.sets {
        for (index, line) in set.lines.iter().enumerate().filter(|_| shows_before || alone) {
            let local = chart.local(set.joint).is_some();
            if line.after.is_some() || local {
                let width = if alone { 1.6 } else { 1.2 };
                let curve = Curve { set, line: index, is_source: true };
                draw_curve(painter, &curve, axis, values, Stroke::new(width, look.before), kept);
            }
        }
    }
    if alone {
        for set in chart.sets {
            for (index, line) in set.lines.iter().enumerate().filter(|(_, line)| line.after.is_none()) {
                let stroke = Stroke::new(1.6, look.curve(line.color));
                let curve = Curve { set, line: index, is_source: true };
                draw_curve(painter, &curve, axis, values, stroke, kept);
            }
        }
        return;
    }
    // The chosen joint's last, so that they lie on top.
    for (place, set) in chart.sets.iter().enumerate().rev() {
        for (index, line) in set.lines.iter().enumerate() {
            let color = look.curve(line.color);
            let stroke = if place == 0 {
                Stroke::new(1.7, color)
            } else {
                Stroke::new(1.2, color.gamma_multiply(FURTHER_INK))
            };
            let curve = Curve { set, line: index, is_source: false };
            let Some(local) = chart.local(set.joint) else {
                draw_curve(painter, &curve, axis, values, stroke, kept);
                continue;
            };
            let [start, end] = local.span().map(|secs| axis.x(secs));
            let clip = painter.clip_rect();
            for part in [Rangef::new(clip.left(), start), Rangef::new(end, clip.right())] {
                let part = Rect::from_x_y_ranges(part, clip.y_range()).intersect(clip);
                if part.width() > 0.0 {
                    draw_curve(&painter.with_clip_rect(part), &curve, axis, values, stroke, kept);
                }
            }
            let Some(row) = local.rows.get(index) else { continue };
            let points = local.times.iter().zip(row).filter(|(_, value)| value.is_finite());
            let points =
                points.map(|(&secs, &value)| pos2(axis.x(secs), values.y(value.into()))).collect::<Vec<_>>();
            painter.add(Shape::line(points, stroke));
        }
    }
}

/// The chosen segment is drawn thick, between two edges.
pub(super) fn segment_ui(painter: &Painter, look: &Look, chart: &Chart<'_>, segment: Option<(usize, f64)>) {
    let Some((joint, secs)) = segment else { return };
    let Some(set) = chart.sets.iter().find(|set| set.joint == joint) else { return };
    let Some([start, end]) = chart.segment(joint, secs) else { return };
    let span = Rangef::new(chart.axis.x(start), chart.axis.x(end));
    let ground = Rect::from_x_y_ranges(span, chart.plot.y_range());
    painter.rect_filled(ground, 0.0, look.selection.gamma_multiply(0.10));
    for x in [span.min, span.max] {
        painter.vline(x, chart.plot.y_range(), (1.0, look.selection.gamma_multiply(0.7)));
    }
    for (line, own) in set.lines.iter().enumerate() {
        let steps = 64;
        let at = |step: usize| {
            chart.place(set, line, start + (end - start) * f64::from(step as u32) / f64::from(steps as u32))
        };
        let points: Vec<Pos2> = (0..=steps).filter_map(at).collect();
        painter.add(Shape::line(points, Stroke::new(3.0, look.curve(own.color))));
    }
}

/// The letters of snags on a chart.
pub(super) struct SnagPlates(Vec<(Pos2, char, SnagState)>);

impl SnagPlates {
    /// Draws them.
    pub(super) fn show(&self, painter: &Painter, look: &Look) {
        for &(at, letter, state) in &self.0 {
            letter_plate(painter, look, at, 13.0, letter, state);
        }
    }
}

/// Where the joints' snags lie: a bar along the top, and faint edges down the chart. The letters of their kinds, which lie in front of all
/// else, are given.
pub(super) fn snag_spans_ui(
    painter: &Painter,
    axis: &TimeAxis,
    plot: Rect,
    joints: &[usize],
    scope: &Scope<'_>,
) -> SnagPlates {
    let look = &scope.look;
    let chosen = scope.bench.session.snag;
    let shown: Vec<bool> = scope
        .bench
        .shown_joints()
        .iter()
        .map(|shown| shown.is_some_and(|joint| joints.contains(&joint)))
        .collect();
    let mut plates: Vec<(f32, char, SnagState, bool)> = Vec::new();
    for (snag, &state) in scope.bench.snags().iter().zip(scope.states.iter()) {
        if !shown.get(snag.joint).is_some_and(|&is_shown| is_shown) {
            continue;
        }
        let (left, right) = (axis.x(snag.first_secs), axis.x(snag.last_secs));
        if right < axis.span.min || left > axis.span.max {
            continue;
        }
        let color = if state == SnagState::Open { look.snag } else { look.axis };
        let is_chosen = chosen == Some(crate::scene::SnagMark::of(snag));
        if is_chosen {
            let span = Rect::from_x_y_ranges(Rangef::new(left - 1.5, right + 1.5), plot.y_range());
            painter.rect_filled(span, 0.0, look.selection.gamma_multiply(0.10));
            for x in [left, right] {
                painter.vline(x, plot.y_range(), (1.0, color.gamma_multiply(0.8)));
            }
        }
        let y = plot.top() - 2.0;
        painter.hline(left - 1.5..=right + 1.5, y, (3.0, color));
        let middle = f32::midpoint(left.max(axis.span.min), right.min(axis.span.max));
        plates.push((middle, snag.kind.letter(), state, is_chosen));
    }
    // Snags come by their starts: the middle of a long one may lie behind many that start later.
    plates.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut last_x = f32::NEG_INFINITY;
    let mut shown = Vec::new();
    for (x, letter, state, is_chosen) in plates {
        if x > last_x + 14.0 || is_chosen {
            shown.push((pos2(x, plot.top() + 7.0), letter, state));
            last_x = x;
        }
    }
    SnagPlates(shown)
}

/// Names of curves lie at least so far apart, one below another.
const APART: f32 = 14.0;

/// A name's place on its row, moved to the left until it lies on none of those `taken`.
fn clear_of(taken: &[Rect], mut plate: Rect) -> Rect {
    let is_on = |plate: Rect, other: &Rect| {
        (other.center().y - plate.center().y).abs() < APART - 0.5
            && other.x_range().intersects(plate.x_range())
    };
    while let Some(other) = taken.iter().find(|other| is_on(plate, other)) {
        plate = plate.translate(vec2(other.left() - 1.0 - plate.right(), 0.0));
    }
    plate
}

/// The name of each curve at its right end: colour alone must not tell them apart. In a chart too low for all of them one below another
/// they stand side by side.
pub(super) fn names_ui(painter: &Painter, look: &Look, chart: &Chart<'_>) {
    let several = chart.sets.len() > 1;
    if !several && chart.sets.iter().all(|set| set.lines.len() < 2) {
        return;
    }
    let font = FontId::proportional(12.0);
    let mut places: Vec<(f32, String, Color32)> = Vec::new();
    let mut of_chosen = 0;
    for (place, set) in chart.sets.iter().enumerate() {
        let joint =
            if several { format!("{} ", short(chart.clip.skeleton.label(set.joint))) } else { String::new() };
        for (index, line) in set.lines.iter().enumerate() {
            let value = chart.value(set, index, chart.axis.window.end_secs);
            let y = value.map(|value| chart.values.y(value)).filter(|y| y.is_finite());
            if let Some(y) = y.filter(|y| chart.plot.y_range().expand(6.0).contains(*y)) {
                places.push((y, format!("{joint}{}", line.name), legible(look, line.color)));
            }
        }
        if place == 0 {
            of_chosen = places.len();
        }
    }
    let rows = chart.values.rows;
    // Names of several joints side by side would hide a low chart: there the chosen joint's stay, the pointer tells the others.
    if several && APART * places.len() as f32 > rows.span() {
        places.truncate(of_chosen);
    }
    places.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut lowest = f32::NEG_INFINITY;
    let count = places.len();
    let mut taken: Vec<Rect> = Vec::new();
    for (place, (y, words, color)) in places.into_iter().enumerate() {
        // Above its curve, below the name before it, and with room for those still to come.
        let room = rows.max - APART * (count - place) as f32;
        let top = rows.min + 0.5 * APART;
        let y = (y - 9.0).max(lowest + APART).clamp(top, room.max(top));
        lowest = y;
        let galley = painter.layout_no_wrap(words, font.clone(), color);
        let at = pos2(chart.axis.span.max - galley.size().x - 4.0, y - galley.size().y / 2.0);
        let plate = clear_of(&taken, Rect::from_min_size(at, galley.size()).expand2(vec2(3.0, 0.0)));
        if plate.left() < chart.axis.span.min {
            continue;
        }
        // A bit of curve that shows between the last name and the end of the chart would be read as part of the name.
        let is_last = plate.right() + 4.0 > chart.axis.span.max;
        let ground = if is_last { plate.with_max_x(chart.axis.span.max + 1.0) } else { plate };
        taken.push(plate);
        painter.rect_filled(ground, 3.0, look.background.gamma_multiply(0.85));
        painter.galley(plate.min + vec2(3.0, 0.0), galley, look.text);
    }
}

/// Names and values of the chosen joint at the playhead, left of the numbers of the axis. The curve that the keyboard moves has a
/// dot.
pub(super) fn legend_ui(painter: &Painter, look: &Look, chart: &Chart<'_>, now: f64, chosen: usize) {
    let Some(set) = chart.sets.first() else { return };
    let area = chart.area;
    // In a low chart name and value stand in one line, so that all find room.
    let is_low = area.height() < 34.0 * set.lines.len() as f32 + 16.0;
    let mut y = area.top() + if is_low { 10.0 } else { 16.0 };
    let left = area.left() + INSET;
    for (index, line) in set.lines.iter().enumerate() {
        let is_source = chart.is_source_alone && line.after.is_some();
        let color = if is_source { look.before } else { look.curve(line.color) };
        painter.hline(left..=left + 12.0, y, (2.5, color));
        if index == chosen && set.lines.len() > 1 {
            painter.circle_filled(pos2(left + 6.0, y), 3.6, color);
        }
        let at = pos2(left + 17.0, y);
        let mono = FontId::monospace(11.5);
        let words = |value: Option<f64>| value.map_or(String::new(), |value| number(value, set.unit));
        let value = words(chart.value(set, index, now));
        // Beside its value a name in brackets would lie on the numbers of the axis: its order is told at the curve's end.
        let name = if is_low { line.name.split(" (").next().unwrap_or(&line.name) } else { &line.name };
        let name = painter.text(at, Align2::LEFT_CENTER, name, FontId::proportional(12.5), look.text);
        let before = words(set.times.value(line.before.values(), now));
        if is_low {
            painter.text(pos2(name.right() + 7.0, y), Align2::LEFT_CENTER, &value, mono, look.text);
            y += 16.0;
            if y > area.bottom() {
                break;
            }
            continue;
        }
        y += 15.0;
        let end = painter.text(pos2(left + 17.0, y), Align2::LEFT_CENTER, &value, mono.clone(), look.text);
        if before != value && !chart.is_source_alone && area.height() > 50.0 * set.lines.len() as f32 {
            y += 14.0;
            // With all its digits a long one would lie on the numbers of the axis.
            let long = set.times.value(line.before.values(), now).filter(|value| value.abs() >= 100.0);
            let before = match long.filter(|_| set.unit == "°") {
                Some(value) => format!("{value:.1}°"),
                None => before,
            };
            let words = format!("was {before}");
            painter.text(pos2(end.left(), y), Align2::LEFT_CENTER, words, mono, look.before);
        }
        y += 19.0;
        if y > area.bottom() - 20.0 {
            break;
        }
    }
}

/// A value as it is written.
pub(super) fn number(value: f64, unit: &str) -> String {
    if !value.is_finite() {
        return "not a number".to_owned();
    }
    match unit {
        "" => format!("{value:.4}"),
        "°/s" => format!("{value:.0}°/s"),
        _ => degrees_fixed(value),
    }
}

/// The frame under the pointer.
fn frame_at(pointer: Pos2, chart: &Chart<'_>) -> usize {
    let time = chart.axis.time(pointer.x).clamp(0.0, chart.clip.duration_secs);
    chart.clip.grid.frame(time)
}

/// All numbers at the frame under the pointer.
pub(super) fn hover_lines(look: &Look, pointer: Pos2, chart: &Chart<'_>) -> Vec<(String, Color32)> {
    let clip = chart.clip;
    let frame = frame_at(pointer, chart);
    let at = clip.grid.time(frame);
    let mut lines = vec![(format!("{}  frame {frame}", seconds(at)), look.faint)];
    for set in chart.sets {
        if chart.sets.len() > 1 {
            lines.push((short(clip.skeleton.label(set.joint)), look.text));
        }
        for (index, line) in set.lines.iter().enumerate() {
            let Some(value) = chart.value(set, index, at) else { continue };
            let mut words = format!("{:<5} {:>10}", line.name, number(value, set.unit));
            if let Some(before) = before_at(set, line, at)
                && (before - value).abs() > 5e-3
            {
                words = format!("{words}  was {}", number(before, set.unit));
            }
            lines.push((words, legible(look, line.color)));
        }
    }
    lines
}

/// Shows them beside the pointer, and the frame as a line.
pub(super) fn hover_ui(ui: &Ui, look: &Look, pointer: Pos2, chart: &Chart<'_>, lines: &[(String, Color32)]) {
    let x = chart.axis.x(chart.clip.grid.time(frame_at(pointer, chart)));
    ui.painter_at(chart.plot.expand(4.0)).vline(x, chart.plot.y_range(), (1.0, look.axis));
    let layer =
        ui.ctx().layer_painter(egui::LayerId::new(egui::Order::Tooltip, ui.scope_id().with("read-out")));
    read_out(&layer, look, pointer + vec2(0.0, 6.0), ui.ctx().content_rect(), lines);
}

fn before_at(set: &CurveSet, line: &CurveLine, secs: f64) -> Option<f64> {
    let row: &Pyramid = &line.before;
    set.times.value(row.values(), secs)
}

fn legible(look: &Look, color: usize) -> Color32 {
    if look.palette.is_dark() { look.curve(color) } else { look.text }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_on_one_row_stand_side_by_side() {
        let plate = |x: f32, y: f32| Rect::from_min_size(pos2(x, y), vec2(20.0, 15.0));
        let mut taken = vec![plate(80.0, 0.0), plate(80.0, 14.0)];
        // As far below as names lie apart there is room; on the rows of others there is room beside them, one after another.
        assert_eq!(clear_of(&taken, plate(80.0, 28.0)), plate(80.0, 28.0));
        assert_eq!(clear_of(&taken, plate(80.0, 20.0)), plate(59.0, 20.0));
        taken.push(plate(59.0, 20.0));
        assert_eq!(clear_of(&taken, plate(80.0, 24.0)), plate(38.0, 24.0));
    }
}

//! The rotation curves of the chosen joint: the source in grey, the result in colour, the keys as round pips.

use egui::{
    Align2, Color32, FontId, Painter, Pos2, Rangef, Rect, Role, Sense, Shape, Stroke, Ui, WidgetInfo, pos2,
    vec2,
};

use super::super::bench::FromClips;
use super::super::commands::Action;
use super::super::theme::{GUTTER_WIDTH, INSET, Look, TIME_MARGIN};
use super::super::view_models::{CurveLine, CurveSet, CurveView, Pyramid, SampleTimes, SnagState, seconds};
use super::super::widgets::{
    TimeAxis, hint, letter_plate, playhead, read_out, scrub_and_zoom, segment, strip, vertical_grid,
};
use super::Scope;
use crate::clip::Clip;

/// The panel.
pub(crate) fn curves_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let clip = scope.bench.result().cloned();
    let joint = scope.bench.session.joint;
    let name = clip.as_ref().zip(joint).map(|(clip, joint)| clip.skeleton.label(joint).to_owned());
    let title = name
        .map_or_else(|| "Rotation curves".to_owned(), |name| format!("Rotation curves: {}", short(&name)));
    strip(ui, &title, |ui| {
        segment(ui, CurveView::TurnRate.label(), Action::TurnRate, scope.now, scope.out);
        segment(ui, CurveView::FileNumbers.label(), Action::FileNumbers, scope.now, scope.out);
        segment(ui, CurveView::SwingTwist.label(), Action::SwingTwist, scope.now, scope.out);
        segment(ui, CurveView::PlaneAngles.label(), Action::PlaneAngles, scope.now, scope.out);
    });
    let Some(clip) = clip else {
        hint(ui, "No clip");
        return;
    };
    let Some(joint) = joint else {
        hint(ui, "Choose a joint to see how it turns: in the figure, on the map or in the tree");
        return;
    };
    let session = &scope.bench.session;
    let wanted = (joint, session.curve_view);
    let set = scope.bench.curves.as_ref().filter(|curves: &&FromClips<_, _>| curves.parameters == wanted);
    let Some(set) = set.map(|curves| std::sync::Arc::clone(&curves.value)) else {
        hint(ui, "Sampling…");
        return;
    };
    if set.lines.is_empty() {
        hint(ui, "The file turns this joint nowhere: it stays at its rest pose");
        return;
    }
    let area = ui.available_rect_before_wrap();
    if area.width() < GUTTER_WIDTH + 60.0 || area.height() < 40.0 {
        return;
    }
    let axis = TimeAxis {
        span: Rangef::new(area.left() + GUTTER_WIDTH, area.right() - TIME_MARGIN),
        window: session.window,
    };
    let plot = Rect::from_x_y_ranges(axis.span, Rangef::new(area.top() + 8.0, area.bottom() - 8.0));
    let response = ui.allocate_rect(area, Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Rotation curves chart"));
    scrub_and_zoom(ui, &response, area, &axis, &clip, true, scope.out);
    let look = scope.look;
    let values = ValueAxis::new(&set, &axis, plot.y_range());
    let painter = ui.painter_at(area);
    values.grid_ui(&painter, &look, &axis, set.unit);
    vertical_grid(&painter, &axis, &clip, plot.y_range(), look.grid);
    let inside = ui.painter_at(Rect::from_x_y_ranges(axis.span.expand(1.0), area.y_range()));
    let (source_alone, shows_before) = (session.shows_source_alone(), session.shows_before);
    snag_spans_ui(&inside, &axis, plot, joint, scope);
    for line in &set.lines {
        if line.after.is_some() && (shows_before || source_alone) {
            let width = if source_alone { 1.6 } else { 1.2 };
            draw_curve(&inside, &line.before, &set.times, &axis, &values, Stroke::new(width, look.before));
        }
    }
    for line in &set.lines {
        let color = look.curve(line.color);
        match &line.after {
            Some(_) if source_alone => {}
            Some(after) => draw_curve(&inside, after, &set.times, &axis, &values, Stroke::new(1.6, color)),
            None => draw_curve(&inside, &line.before, &set.times, &axis, &values, Stroke::new(1.6, color)),
        }
    }
    keys_ui(&inside, &look, &clip, joint, &set, &axis, &values);
    names_ui(&inside, &look, &set, &axis, &values);
    let now = session.playback.playhead_secs;
    playhead(&inside, &look, &axis, now, area.y_range());
    legend_ui(&painter, &look, area, &set, now, source_alone);
    if let Some(pointer) = response.hover_pos().filter(|pointer| plot.expand(4.0).contains(*pointer)) {
        hover_ui(ui, &look, pointer, &axis, plot, &clip, &set);
    }
}

/// Long names keep their end, which tells left from right and first from second.
fn short(name: &str) -> String {
    const MOST: usize = 28;
    let count = name.chars().count();
    if count <= MOST {
        name.to_owned()
    } else {
        format!("…{}", name.chars().skip(count - MOST).collect::<String>())
    }
}

/// From values to points on screen.
struct ValueAxis {
    low: f64,
    high: f64,
    rows: Rangef,
}

impl ValueAxis {
    /// Fits the curves within the stretch of time on screen, with some air.
    fn new(set: &CurveSet, axis: &TimeAxis, rows: Rangef) -> Self {
        let [low, high] = set.range(axis.window.start_secs, axis.window.end_secs).unwrap_or([-1.0, 1.0]);
        let (low, high) = (f64::from(low), f64::from(high));
        // Noise on a joint that stands still must not look like motion.
        let least = if set.unit.is_empty() { 0.05 } else { 6.0 };
        let span = (high - low).max(least);
        if set.unit == "°/s" {
            // A rate is never below zero: its axis stands on the ground.
            let top = high.max(least);
            return Self { low: -0.05 * top, high: 1.1 * top, rows };
        }
        let middle = f64::midpoint(low, high);
        Self { low: middle - span * 0.56, high: middle + span * 0.56, rows }
    }

    fn y(&self, value: f64) -> f32 {
        let share = (value - self.low) / (self.high - self.low);
        self.rows.max - (share * f64::from(self.rows.span())) as f32
    }

    /// Round values about 34 points apart.
    fn ticks(&self) -> Vec<f64> {
        let wanted = (self.high - self.low) / (f64::from(self.rows.span()) / 34.0).max(1.0);
        let power = 10.0_f64.powf(wanted.log10().floor());
        // 45 and 90 divide the circle: they come before the plain decimal steps where they fit.
        let circle = [15.0, 30.0, 45.0, 90.0, 180.0, 360.0, 720.0];
        let decimal = [1.0, 2.0, 5.0, 10.0].map(|step| step * power);
        let step = if wanted > 10.0 && wanted <= 720.0 {
            circle.into_iter().find(|step| *step >= wanted)
        } else {
            decimal.into_iter().find(|step| *step >= wanted)
        };
        let step = step.unwrap_or(10.0 * power);
        let first = (self.low / step).ceil() as i64;
        let last = (self.high / step).floor() as i64;
        (first..=last).take(64).map(|index| index as f64 * step).collect()
    }

    fn grid_ui(&self, painter: &Painter, look: &Look, axis: &TimeAxis, unit: &str) {
        let font = FontId::proportional(11.5);
        let ticks = self.ticks();
        let step = ticks.windows(2).map(|pair| pair[1] - pair[0]).next().unwrap_or(1.0);
        let decimals = (-(step.log10() + 1e-9).floor()).clamp(0.0, 4.0) as usize;
        for value in ticks {
            let y = self.y(value);
            let color = if value == 0.0 { look.axis } else { look.grid };
            painter.hline(axis.span, y, (1.0, color));
            let words = format!("{value:.decimals$}{unit}");
            painter.text(pos2(axis.span.min - 6.0, y), Align2::RIGHT_CENTER, words, font.clone(), look.faint);
        }
    }
}

/// Draws a curve with at most a few points for each pixel across, however long it is.
fn draw_curve(
    painter: &Painter,
    row: &Pyramid,
    times: &SampleTimes,
    axis: &TimeAxis,
    values: &ValueAxis,
    stroke: Stroke,
) {
    let first = times.place(axis.window.start_secs).floor() as usize;
    let last = (times.place(axis.window.end_secs).ceil() as usize).min(row.len().saturating_sub(1));
    let columns = axis.span.span().max(1.0);
    let mut points: Vec<Pos2> = Vec::new();
    let flush = |points: &mut Vec<Pos2>| {
        if points.len() > 1 {
            painter.add(Shape::line(std::mem::take(points), stroke));
        } else {
            points.clear();
        }
    };
    if (last.saturating_sub(first)) as f32 <= 1.5 * columns {
        for index in first..=last {
            let Some(&value) = row.values().get(index) else { break };
            if value.is_finite() {
                points.push(pos2(axis.x(times.time(index)), values.y(value.into())));
            } else {
                flush(&mut points);
            }
        }
        flush(&mut points);
        return;
    }
    // More samples than pixels: for each column of pixels the span from its smallest to its largest value.
    let columns = columns as usize;
    let mut spans: Vec<Option<[f32; 2]>> = Vec::with_capacity(columns);
    let mut from = first;
    for column in 0..columns {
        let right = axis.span.min + column as f32 + 1.0;
        let to = (times.place(axis.time(right)).ceil() as usize).clamp(from, last + 1);
        // One sample more, so that neighbouring columns meet.
        let found = row.min_max(from.saturating_sub(1)..to);
        spans.push(found.map(|[low, high]| [values.y(high.into()), values.y(low.into())]));
        from = to.max(from);
    }
    let total: f32 = spans.iter().flatten().map(|[top, bottom]| bottom - top).sum();
    if total < 3.0 * columns as f32 {
        for (column, span) in spans.iter().enumerate() {
            match span {
                Some([top, bottom]) => {
                    points.push(pos2(axis.span.min + column as f32 + 0.5, f32::midpoint(*top, *bottom)));
                }
                None => flush(&mut points),
            }
        }
        flush(&mut points);
        return;
    }
    // A curve that goes up and down within a pixel is a band: upright boxes are drawn much faster than a line.
    let mut mesh = egui::Mesh::default();
    for (column, span) in spans.iter().enumerate() {
        let Some([top, bottom]) = *span else { continue };
        let left = axis.span.min + column as f32;
        let spare = ((stroke.width - (bottom - top)) / 2.0).max(0.0);
        let bounds = Rect::from_min_max(pos2(left, top - spare), pos2(left + 1.0, bottom + spare));
        mesh.add_colored_rect(bounds, stroke.color);
    }
    painter.add(Shape::mesh(mesh));
}

/// Keys as round pips, where they lie far enough apart to be told.
fn keys_ui(
    painter: &Painter,
    look: &Look,
    clip: &Clip,
    joint: usize,
    set: &CurveSet,
    axis: &TimeAxis,
    values: &ValueAxis,
) {
    const LEAST_APART: f64 = 7.0;
    let Some(track) = clip.rotation(joint) else { return };
    let shown = |time: f64| axis.window.contains(time);
    let first = track.times.nearest(axis.window.start_secs);
    let last = track.times.nearest(axis.window.end_secs);
    let count = last.saturating_sub(first) + 1;
    if f64::from(axis.span.span()) < LEAST_APART * count as f64 {
        return;
    }
    for key in (first..=last).filter(|&key| key < track.times.len()) {
        let time = track.times.at(key);
        if !shown(time) {
            continue;
        }
        for line in &set.lines {
            let Some(value) = set.times.value(line.shown().values(), time) else { continue };
            let middle = pos2(axis.x(time), values.y(value));
            if middle.y.is_finite() {
                painter.circle(middle, 2.8, look.background, Stroke::new(1.3, look.curve(line.color)));
            }
        }
    }
}

/// Where the joint's snags lie: a bar along the top with the kind's letter, and faint edges down the chart.
fn snag_spans_ui(painter: &Painter, axis: &TimeAxis, plot: Rect, joint: usize, scope: &Scope<'_>) {
    let look = &scope.look;
    let chosen = scope.bench.session.snag;
    let mut last_x = f32::NEG_INFINITY;
    for (snag, &state) in scope.bench.snags().iter().zip(scope.states.iter()) {
        if scope.bench.shown_joint(snag.joint) != Some(joint) {
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
        if middle > last_x + 14.0 || is_chosen {
            letter_plate(painter, look, pos2(middle, y + 9.0), 13.0, snag.kind.letter(), state);
            last_x = middle;
        }
    }
}

/// The name of each curve at its right end: colour alone must not tell them apart.
fn names_ui(painter: &Painter, look: &Look, set: &CurveSet, axis: &TimeAxis, values: &ValueAxis) {
    const APART: f32 = 14.0;
    if set.lines.len() < 2 {
        return;
    }
    let font = FontId::proportional(12.0);
    let mut places: Vec<(f32, &CurveLine)> = set
        .lines
        .iter()
        .filter_map(|line| {
            Some((values.y(set.times.value(line.shown().values(), axis.window.end_secs)?), line))
        })
        .filter(|(y, _)| y.is_finite())
        .collect();
    places.sort_by(|(a, _), (b, _)| a.total_cmp(b));
    let mut lowest = f32::NEG_INFINITY;
    let count = places.len();
    for (place, (y, line)) in places.into_iter().enumerate() {
        // Above its curve, below the name before it, and with room for those still to come.
        let room = values.rows.max - APART * (count - place) as f32;
        let y = (y - 9.0).max(lowest + APART).clamp(values.rows.min, room.max(values.rows.min));
        lowest = y;
        let galley = painter.layout_no_wrap(line.name.clone(), font.clone(), legible(look, line.color));
        let at = pos2(axis.span.max - galley.size().x - 4.0, y - galley.size().y / 2.0);
        let plate = Rect::from_min_size(at, galley.size()).expand2(vec2(3.0, 0.0));
        painter.rect_filled(plate, 3.0, look.background.gamma_multiply(0.85));
        painter.galley(at, galley, look.text);
    }
}

/// Names and values at the playhead, left of the numbers of the axis.
fn legend_ui(painter: &Painter, look: &Look, area: Rect, set: &CurveSet, now: f64, source_alone: bool) {
    let mut y = area.top() + 16.0;
    let left = area.left() + INSET;
    for line in &set.lines {
        let color = if source_alone && line.after.is_some() { look.before } else { look.curve(line.color) };
        let value =
            |row: &Pyramid| set.times.value(row.values(), now).map_or(String::new(), |v| number(v, set.unit));
        painter.hline(left..=left + 12.0, y, (2.5, color));
        painter.text(
            pos2(left + 17.0, y),
            Align2::LEFT_CENTER,
            &line.name,
            FontId::proportional(12.5),
            look.text,
        );
        y += 15.0;
        let mono = FontId::monospace(11.5);
        let shown = if source_alone { &line.before } else { line.shown() };
        let ink = look.text;
        let end = painter.text(pos2(left + 17.0, y), Align2::LEFT_CENTER, value(shown), mono.clone(), ink);
        let words = format!("was {}", value(&line.before));
        let differs = value(&line.before) != value(shown);
        if differs && !source_alone && area.height() > 50.0 * set.lines.len() as f32 {
            y += 14.0;
            painter.text(pos2(end.left(), y), Align2::LEFT_CENTER, words, mono, look.before);
        }
        y += 19.0;
        if y > area.bottom() - 20.0 {
            break;
        }
    }
}

fn number(value: f64, unit: &str) -> String {
    if !value.is_finite() {
        return "not a number".to_owned();
    }
    match unit {
        "" => format!("{value:.4}"),
        "°/s" => format!("{value:.0}°/s"),
        _ => super::super::view_models::degrees_fixed(value),
    }
}

fn hover_ui(ui: &Ui, look: &Look, pointer: Pos2, axis: &TimeAxis, plot: Rect, clip: &Clip, set: &CurveSet) {
    let time = axis.time(pointer.x).clamp(0.0, clip.duration_secs);
    let frame = clip.grid.frame(time);
    let at = clip.grid.time(frame);
    let painter = ui.painter_at(plot.expand(4.0));
    painter.vline(axis.x(at), plot.y_range(), (1.0, look.axis));
    let mut lines = vec![(format!("{}  frame {frame}", seconds(at)), look.faint)];
    let row = |line: &CurveLine, values: &Pyramid| {
        set.times.value(values.values(), at).map(|v| (line.name.clone(), v))
    };
    for line in &set.lines {
        let Some((name, value)) = row(line, line.shown()) else { continue };
        let mut words = format!("{name:<5} {:>10}", number(value, set.unit));
        if line.after.is_some()
            && let Some((_, before)) = row(line, &line.before)
            && (before - value).abs() > 5e-3
        {
            words = format!("{words}  was {}", number(before, set.unit));
        }
        lines.push((words, legible(look, line.color)));
    }
    let layer =
        ui.ctx().layer_painter(egui::LayerId::new(egui::Order::Tooltip, ui.scope_id().with("read-out")));
    read_out(&layer, look, pointer + vec2(0.0, 6.0), ui.ctx().content_rect(), &lines);
}

fn legible(look: &Look, color: usize) -> Color32 {
    if look.palette.is_dark() { look.curve(color) } else { look.text }
}

//! The spacing of the chosen segment, or of the chosen stretch of rows once it was shaped, as a small curve with two handles: time across,
//! way up.

use egui::{Align2, FontId, Key, Rect, Role, Sense, Shape, Stroke, StrokeKind, Ui, WidgetInfo, pos2, vec2};

use super::super::super::commands::{Command, CurveCommand};
use super::super::super::view_models::KeyDrag;
use super::super::super::view_models::{Stretch, Stroke as HandStroke, key_at, shaped_rows};
use super::super::Scope;
use super::chart::Chart;
use crate::clip::{KeyChange, Spacing};

/// A step of a handle by an arrow key.
const STEP: f64 = 0.02;

/// The inset, while a segment is chosen.
pub(super) fn spacing_ui(ui: &Ui, chart: &Chart<'_>, scope: &mut Scope<'_>) {
    let Some(meant) = meant(chart, scope) else { return };
    let Meant { joint, span_secs: [start_secs, end_secs], spacing } = meant;
    let size = vec2(128.0, 92.0);
    if chart.plot.height() < size.y + 6.0 || chart.plot.width() < 2.0 * size.x {
        return;
    }
    let look = scope.look;
    // On the side of the chart where the segment is not.
    let middle = chart.axis.x(start_secs.midpoint(end_secs));
    let left = if middle < chart.plot.center().x {
        chart.plot.right() - size.x - 92.0
    } else {
        chart.plot.left() + 6.0
    };
    let bounds = Rect::from_min_size(pos2(left, chart.plot.top() + 2.0), size);
    // Presses beside the handles stay here: they must not scrub.
    ui.interact(bounds, ui.scope_id().with("spacing"), Sense::click_and_drag())
        .widget_info(|| WidgetInfo::labeled(Role::Group, true, "Spacing of the chosen segment"));
    let own = shown_spacing(scope).unwrap_or(spacing);
    let painter = ui.painter_at(bounds);
    painter.rect(bounds, 4.0, look.panel, Stroke::new(1.0, look.line), StrokeKind::Inside);
    let inner = Rect::from_min_max(bounds.min + vec2(9.0, 9.0), bounds.max - vec2(9.0, 17.0));
    let place = |[time, way]: [f64; 2]| {
        pos2(inner.left() + inner.width() * time as f32, inner.bottom() - inner.height() * way as f32)
    };
    painter.line_segment([place([0.0, 0.0]), place([1.0, 1.0])], Stroke::new(1.0, look.grid));
    painter.rect_stroke(inner, 0.0, Stroke::new(1.0, look.grid), StrokeKind::Inside);
    let points = own.points();
    for (end, point) in [([0.0, 0.0], points[0]), ([1.0, 1.0], points[1])] {
        painter.line_segment([place(end), place(point)], Stroke::new(1.0, look.axis));
    }
    let curve = (0..=48).map(|step| f64::from(step) / 48.0).map(|time| place([time, own.pace(time).share]));
    painter.add(Shape::line(curve.collect(), Stroke::new(1.8, look.text)));
    painter.text(
        pos2(inner.left(), bounds.bottom() - 8.0),
        Align2::LEFT_CENTER,
        "time across, way up",
        FontId::proportional(10.5),
        look.faint,
    );
    for (index, point) in points.into_iter().enumerate() {
        let at = place(point);
        let id = ui.scope_id().with(("spacing handle", index));
        let response = ui.interact(Rect::from_center_size(at, vec2(15.0, 15.0)), id, Sense::click_and_drag());
        let words = format!("Spacing handle {}: {:.2}, {:.2}", index + 1, point[0], point[1]);
        response.widget_info(|| WidgetInfo::labeled(Role::Slider, true, &words));
        let is_lit = response.hovered() || response.dragged() || response.has_focus();
        painter.circle(at, if is_lit { 5.4 } else { 4.2 }, look.selection, Stroke::new(1.2, look.panel));
        if response.has_focus() {
            painter.circle_stroke(at, 7.6, Stroke::new(1.3, look.text));
        }
        let changed = |to: [f64; 2]| {
            let mut points = points;
            points[index] = to;
            KeyDrag::Space { joint, start_secs, spacing: Spacing::nearest(points) }
        };
        if let Some(pointer) = response.interact_pointer_pos()
            && (response.dragged() || response.drag_stopped())
        {
            let to = [
                f64::from((pointer.x - inner.left()) / inner.width()),
                f64::from((inner.bottom() - pointer.y) / inner.height()),
            ];
            let drag = changed(to);
            let command =
                if response.drag_stopped() { CurveCommand::Settle(drag) } else { CurveCommand::Try(drag) };
            scope.out.push(Command::Curve(command));
        }
        if response.has_focus() {
            let filter = egui::EventFilter {
                horizontal_arrows: true,
                vertical_arrows: true,
                ..egui::EventFilter::default()
            };
            ui.memory_mut(|memory| memory.set_focus_lock_filter(id, filter));
            let count = |key| ui.input(|input| f64::from(input.num_presses(key) as u32));
            let step =
                [count(Key::ArrowRight) - count(Key::ArrowLeft), count(Key::ArrowUp) - count(Key::ArrowDown)];
            if step != [0.0, 0.0] {
                let drag = changed([point[0] + step[0] * STEP, point[1] + step[1] * STEP]);
                scope.out.push(Command::Curve(CurveCommand::Settle(drag)));
            }
        }
    }
}

/// What the handles are of.
struct Meant {
    joint: usize,
    span_secs: [f64; 2],
    spacing: Spacing,
}

fn meant(chart: &Chart<'_>, scope: &Scope<'_>) -> Option<Meant> {
    let curves = &scope.bench.session.curves;
    if let Some((joint, start_secs)) = curves.segment {
        let track = chart.track(joint)?;
        let segment = key_at(track, start_secs).filter(|key| key + 1 < track.keys.len())?;
        let span_secs = [start_secs, track.times.at(segment + 1)];
        return Some(Meant { joint, span_secs, spacing: track.segments.of(segment).spacing });
    }
    let edits = scope.bench.last_key_edits();
    let rows = if curves.keys.is_empty() { Vec::new() } else { shaped_rows(chart.clip, edits) };
    let chosen = |own: &Stretch| {
        let track = chart.track(own.joint).filter(|track| own.keys(track) == curves.keys)?;
        let span_secs = [own.start_secs, own.end_secs(track)];
        Some(Meant { joint: own.joint, span_secs, spacing: own.spacing(edits) })
    };
    rows.iter().find_map(chosen)
}

/// The spacing that is being given by hand.
fn shown_spacing(scope: &Scope<'_>) -> Option<Spacing> {
    let HandStroke::Keys(edits) = &scope.bench.curve_hand.shown.as_ref()?.stroke else { return None };
    edits.iter().find_map(|edit| match edit.change {
        KeyChange::Space(_, spacing) => Some(spacing),
        _ => None,
    })
}

//! Keys: round pips on the curves where they can be told apart, and marks in the lane below wherever they are.

use egui::{Painter, Rangef, Rect, Role, Sense, Stroke, Ui, WidgetInfo, pos2, vec2};

use super::super::super::theme::Look;
use super::super::super::view_models::seconds;
use super::chart::{Chart, keys_between};

/// More pips than these get no label of their own: nobody could read through them.
const MOST_LABELS: usize = 150;

/// The pips. Chosen ones are larger, full, and have a ring.
pub(super) fn pips_ui(ui: &Ui, painter: &Painter, look: &Look, chart: &Chart<'_>) {
    for (place, set) in chart.sets.iter().enumerate() {
        let Some(keys) = chart.keys(set.joint) else { continue };
        let has_labels = keys.len() * set.lines.len() <= MOST_LABELS;
        let name = chart.clip.skeleton.label(set.joint);
        for secs in keys {
            let is_chosen = chart.choice.has(set.joint, secs);
            for (line, own) in set.lines.iter().enumerate() {
                let Some(middle) = chart.place(set, line, secs) else { continue };
                let color = look.curve(own.color);
                if is_chosen {
                    painter.circle(middle, 4.4, color, Stroke::new(1.0, look.background));
                    painter.circle_stroke(middle, 6.4, Stroke::new(1.6, look.selection));
                } else {
                    let radius = if place == 0 { 3.0 } else { 2.4 };
                    painter.circle(middle, radius, look.background, Stroke::new(1.4, color));
                }
                if has_labels && chart.plot.expand(2.0).contains(middle) {
                    let id = ui.scope_id().with(("pip", set.joint, secs.to_bits(), line));
                    let bounds = Rect::from_center_size(middle, vec2(8.0, 8.0));
                    let words = format!("Key of {name} at {}, {}", seconds(secs), own.name);
                    ui.interact(bounds, id, Sense::hover())
                        .widget_info(|| WidgetInfo::selected(Role::Label, true, is_chosen, &words));
                }
            }
        }
    }
}

/// The lane: a stroke for each key of the chosen joint, a bar where they lie side by side; chosen keys are higher, and between
/// brackets that can be dragged.
pub(super) fn lane_ui(ui: &Ui, look: &Look, chart: &Chart<'_>) {
    let lane = chart.lane;
    let painter = ui.painter_at(lane.expand2(vec2(5.0, 0.0)));
    painter.hline(lane.x_range(), lane.top(), (1.0, look.grid));
    if let Some(track) = chart.sets.first().and_then(|set| chart.track(set.joint)) {
        let window = chart.axis.window;
        let count = track.times.nearest(window.end_secs) - track.times.nearest(window.start_secs) + 1;
        let rows = Rangef::new(lane.top() + 5.0, lane.bottom() - 3.0);
        if (count as f32) * 3.0 <= lane.width() {
            for key in keys_between(track, window.start_secs, window.end_secs) {
                painter.vline(chart.axis.x(track.times.at(key)), rows, (1.0, look.faint));
            }
        } else if let Some((first, last)) = track.times.span() {
            let span = Rangef::new(chart.axis.x(first), chart.axis.x(last)).intersection(lane.x_range());
            let bar = Rect::from_x_y_ranges(span, rows.shrink(1.5));
            painter.rect_filled(bar, 1.0, look.axis.gamma_multiply(0.6));
        }
    }
    let rows = Rangef::new(lane.top() + 2.0, lane.bottom() - 1.0);
    for set in chart.sets {
        let times = chart.choice.times(set.joint);
        if times.is_empty() {
            continue;
        }
        // A column of pixels at a time, however many keys there are.
        let mut x = lane.left();
        while x < lane.right() {
            let (from, to) = (chart.axis.time(x - 0.5), chart.axis.time(x + 0.5));
            let first = times.partition_point(|&secs| secs < from);
            match times.get(first) {
                Some(&secs) if secs < to => {
                    painter.vline(x, rows, (1.5, look.selection));
                    x += 1.0;
                }
                Some(&secs) => x = chart.axis.x(secs).round().max(x + 1.0),
                None => break,
            }
        }
    }
    let Some([first, last]) = chart.choice.span().filter(|[first, last]| last > first) else { return };
    for (secs, inward, words) in [(first, 1.0, "First chosen key"), (last, -1.0, "Last chosen key")] {
        let x = chart.axis.x(secs);
        if !lane.x_range().expand(4.0).contains(x) {
            continue;
        }
        let points = vec![
            pos2(x + 5.0 * inward, lane.top() + 1.0),
            pos2(x, lane.top() + 1.0),
            pos2(x, lane.bottom() - 1.0),
            pos2(x + 5.0 * inward, lane.bottom() - 1.0),
        ];
        painter.add(egui::Shape::line(points, Stroke::new(2.2, look.text)));
        let bounds = Rect::from_center_size(pos2(x, lane.center().y), vec2(10.0, lane.height()));
        let id = ui.scope_id().with(words);
        let words = format!("{words}: {}", seconds(secs));
        ui.interact(bounds, id, Sense::hover())
            .widget_info(|| WidgetInfo::labeled(Role::Slider, true, &words));
    }
}

//! How far the curve with the dot may go, in views where limits have no level of their own.

use egui::{Align2, FontId, Painter, Pos2, Rangef, Rect, Shape, Stroke, pos2};

use super::super::super::view_models::RoomKey;
use super::super::Scope;
use super::chart::Chart;
use super::marks::limit_words;

/// So many points lie between two moments.
const APART: f32 = 4.0;

/// Shades the values that would lead the chosen joint past its limit while its other numbers stay as they are.
pub(super) fn room_ui(painter: &Painter, chart: &Chart<'_>, scope: &mut Scope<'_>) {
    let Some(set) = chart.sets.first().filter(|set| set.unit == "°" && !chart.is_source_alone) else {
        return;
    };
    let Some(limit) = scope.bench.curve_key(set.joint).limit else { return };
    let line = scope.bench.session.curves.line.min(set.lines.len().saturating_sub(1));
    let key = RoomKey {
        set: set.clone(),
        clip: chart.clip.clone(),
        limit,
        line,
        window: chart.axis.window,
        columns: (chart.plot.width() / APART).ceil().max(2.0) as usize + 1,
    };
    let columns = key.columns;
    let rooms = scope.pictures.room.of(key);
    let (Some(own), false) = (set.lines.get(line), rooms.is_empty()) else { return };
    let look = scope.look;
    let color = look.curve(own.color);
    let (fill, stroke) = (color.gamma_multiply(0.13), Stroke::new(1.2, color.gamma_multiply(0.7)));
    let plot = chart.plot;
    let rows = Rangef::new(plot.top() - 8.0, plot.bottom() + 4.0);
    let x = |column: usize| plot.left() + plot.width() * column as f32 / (columns - 1) as f32;
    // Heights of the lowest and the highest value; where nothing is inside, all of the chart is beyond.
    let heights = |column: usize| {
        rooms[column].map_or([rows.min, rows.min], |room| {
            room.map(|value| {
                rows.clamp(if value.is_finite() {
                    chart.values.y(value)
                } else {
                    f32::INFINITY * -value.signum() as f32
                })
            })
        })
    };
    let mut mesh = egui::Mesh::default();
    for column in 0..columns - 1 {
        let (from, to) = (heights(column), heights(column + 1));
        let [low, high] = [0, 1].map(|end| f32::midpoint(from[end], to[end]));
        let (left, right) = (x(column), x(column + 1));
        for part in [Rangef::new(rows.min, high), Rangef::new(low, rows.max)] {
            if part.span() > 0.5 {
                let cell = Rect::from_x_y_ranges(Rangef::new(left, right), part);
                mesh.add_colored_rect(cell, fill);
            }
        }
    }
    painter.add(mesh);
    // An edge is one line for as long as it is on the chart: a shape for each column would take longer to draw than the curves.
    let is_on_chart = |y: f32| y > rows.min + 0.5 && y < rows.max - 0.5;
    for end in [0, 1] {
        let points: Vec<Pos2> = (0..columns).map(|column| pos2(x(column), heights(column)[end])).collect();
        for run in points.split(|point| !is_on_chart(point.y)).filter(|run| run.len() > 1) {
            painter.add(Shape::line(run.to_vec(), stroke));
        }
    }
    let others: Vec<&str> = set
        .lines
        .iter()
        .enumerate()
        .filter(|(other, _)| *other != line)
        .map(|(_, own)| own.name.as_str())
        .collect();
    let words = format!("limit of {} while {} stay", own.name, others.join(" and "));
    let size = painter.layout_no_wrap(words.clone(), FontId::proportional(11.0), look.faint).size();
    // Clear of the edge for as long as the words are.
    let beside = ((size.x / APART).ceil() as usize + 3).min(columns);
    let [low, high] = (0..beside)
        .map(heights)
        .fold([rows.min, rows.max], |[low, high], own| [low.max(own[0]), high.min(own[1])]);
    // Below rather than above: marks of snags lie along the top.
    if low < rows.max - size.y {
        limit_words(painter, &look, plot, &words, low, Align2::LEFT_TOP);
    } else if high > rows.min + size.y {
        limit_words(painter, &look, plot, &words, high, Align2::LEFT_BOTTOM);
    }
}

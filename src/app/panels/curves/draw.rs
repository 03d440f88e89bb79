//! Curves as lines, at any length in the time of a short one.

use egui::{Painter, Pos2, Rect, Shape, Stroke, pos2};

use super::super::super::widgets::TimeAxis;
use super::axis::ValueAxis;
use super::columns::{Columns, Curve};

/// Draws a curve with at most a few points for each pixel across, however long it is.
pub(super) fn draw_curve(
    painter: &Painter,
    curve: &Curve<'_>,
    axis: &TimeAxis,
    values: &ValueAxis,
    stroke: Stroke,
    kept: &mut Columns,
) {
    let (row, times) = (curve.row(), &curve.set.times);
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
    let spans: Vec<Option<[f32; 2]>> = kept
        .of(curve, axis)
        .iter()
        .map(|found| found.map(|[low, high]| [values.y(high.into()), values.y(low.into())]))
        .collect();
    let total: f32 = spans.iter().flatten().map(|[top, bottom]| bottom - top).sum();
    if total < 3.0 * spans.len() as f32 {
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

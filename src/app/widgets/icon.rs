//! Icons as shapes: the fonts have no arrows, triangles or check marks.

use egui::epaint::PathShape;
use egui::{Color32, Painter, Pos2, Rect, Shape, Stroke, Vec2, vec2};

/// A small picture on a button.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Icon {
    Play,
    Pause,
    StepBack,
    StepForward,
    First,
    Last,
    Loop,
    Close,
    Back,
    Check,
    ChevronRight,
    ChevronDown,
    Up,
    Down,
    Warning,
    Info,
    Fit,
    Follow,
    Marker,
}

/// Draws an icon into the middle of a box.
pub(crate) fn paint_icon(painter: &Painter, bounds: Rect, icon: Icon, color: Color32) {
    let size = bounds.size().min_elem().min(16.0);
    let middle = bounds.center();
    let unit = size / 16.0;
    let at = |x: f32, y: f32| middle + vec2(x, y) * unit;
    let filled = |points: Vec<Pos2>| Shape::convex_polygon(points, color, Stroke::NONE);
    let thin = Stroke::new(1.5 * unit.max(0.8), color);
    let bar = |x: f32, width: f32| {
        Shape::rect_filled(Rect::from_min_max(at(x, -5.0), at(x + width, 5.0)), 0.5, color)
    };
    let line = |points: Vec<Pos2>| Shape::Path(PathShape::line(points, thin));
    let shapes = match icon {
        Icon::Play => vec![filled(vec![at(-4.0, -6.0), at(6.0, 0.0), at(-4.0, 6.0)])],
        Icon::Pause => vec![bar(-5.0, 3.5), bar(1.5, 3.5)],
        Icon::StepBack => vec![filled(vec![at(5.0, -5.0), at(5.0, 5.0), at(-2.5, 0.0)]), bar(-5.5, 2.0)],
        Icon::StepForward => vec![filled(vec![at(-5.0, -5.0), at(2.5, 0.0), at(-5.0, 5.0)]), bar(3.5, 2.0)],
        Icon::First => vec![
            filled(vec![at(0.5, -5.0), at(0.5, 5.0), at(-5.0, 0.0)]),
            filled(vec![at(6.5, -5.0), at(6.5, 5.0), at(1.0, 0.0)]),
            bar(-7.0, 1.6),
        ],
        Icon::Last => vec![
            filled(vec![at(-6.5, -5.0), at(-1.0, 0.0), at(-6.5, 5.0)]),
            filled(vec![at(-0.5, -5.0), at(5.0, 0.0), at(-0.5, 5.0)]),
            bar(5.4, 1.6),
        ],
        Icon::Loop => {
            let round = Rect::from_min_max(at(-7.0, -4.0), at(7.0, 5.0));
            vec![
                Shape::rect_stroke(round, 4.0 * unit, thin, egui::StrokeKind::Middle),
                filled(vec![at(-1.5, -7.5), at(3.5, -4.0), at(-1.5, -0.5)]),
            ]
        }
        Icon::Close => vec![
            Shape::line_segment([at(-4.0, -4.0), at(4.0, 4.0)], thin),
            Shape::line_segment([at(-4.0, 4.0), at(4.0, -4.0)], thin),
        ],
        Icon::Back => vec![
            line(vec![at(-2.0, -2.5), at(3.0, -2.5), at(5.5, 0.5), at(3.0, 4.5), at(-3.0, 4.5)]),
            filled(vec![at(-2.0, -6.5), at(-2.0, 1.5), at(-6.5, -2.5)]),
        ],
        Icon::Check => vec![line(vec![at(-5.0, 0.0), at(-1.5, 4.0), at(5.5, -4.5)])],
        Icon::ChevronRight => vec![line(vec![at(-2.0, -4.0), at(2.0, 0.0), at(-2.0, 4.0)])],
        Icon::ChevronDown => vec![line(vec![at(-4.0, -2.0), at(0.0, 2.0), at(4.0, -2.0)])],
        Icon::Up => vec![line(vec![at(-4.0, 2.0), at(0.0, -2.5), at(4.0, 2.0)])],
        Icon::Down => vec![line(vec![at(-4.0, -2.0), at(0.0, 2.5), at(4.0, -2.0)])],
        Icon::Warning => vec![
            Shape::closed_line(vec![at(0.0, -6.5), at(7.0, 6.0), at(-7.0, 6.0)], thin),
            Shape::line_segment([at(0.0, -2.0), at(0.0, 2.0)], thin),
            Shape::circle_filled(at(0.0, 4.2), unit, color),
        ],
        Icon::Info => vec![
            Shape::circle_stroke(middle, 6.5 * unit, thin),
            Shape::line_segment([at(0.0, -0.5), at(0.0, 3.5)], thin),
            Shape::circle_filled(at(0.0, -3.0), unit, color),
        ],
        Icon::Fit => {
            let corner = |x: f32, y: f32| {
                let (inner_x, inner_y) = (x - 3.5 * x.signum(), y - 3.5 * y.signum());
                line(vec![at(inner_x, y), at(x, y), at(x, inner_y)])
            };
            vec![corner(-6.0, -6.0), corner(6.0, -6.0), corner(6.0, 6.0), corner(-6.0, 6.0)]
        }
        Icon::Marker => vec![bar(-4.0, 1.5), filled(vec![at(-2.5, -5.0), at(5.0, -2.0), at(-2.5, 1.0)])],
        Icon::Follow => vec![
            Shape::circle_filled(at(-3.5, 0.0), 2.6 * unit, color),
            line(vec![at(1.0, -4.0), at(5.0, 0.0), at(1.0, 4.0)]),
        ],
    };
    painter.extend(shapes);
}

/// The space an icon takes.
pub(super) const ICON_SIZE: Vec2 = Vec2::new(16.0, 16.0);

//! The rotation curves of the chosen joints: the source in grey, the result in colour, keys and segments to be worked on.

mod axis;
mod bar;
mod chart;
mod columns;
mod draw;
mod hand;
mod keys;
mod marks;
mod room;
mod spacing;

use egui::{Rangef, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use super::super::commands::Action;
use super::super::theme::{GUTTER_WIDTH, TIME_MARGIN};
use super::super::view_models::{CurveView, fitted_values};
use super::super::widgets::{TimeAxis, hint, playhead, segments, spoken, strip, vertical_grid};
use super::Scope;
use axis::ValueAxis;
use chart::Chart;

pub(crate) use columns::Columns;
pub(crate) use hand::CurvePress;

/// Height of the lane of keys below the chart.
const LANE_HEIGHT: f32 = 15.0;
/// Height of the bar of numbers below the lane.
const BAR_HEIGHT: f32 = 29.0;

/// The panel.
pub(crate) fn curves_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let clip = scope.bench.result().cloned();
    let joints = scope.bench.session.joints();
    let name = |joint: usize| {
        let clip = clip.as_ref().filter(|clip| joint < clip.skeleton.len());
        clip.map_or(String::new(), |clip| short(clip.skeleton.label(joint)))
    };
    let title = match joints.as_slice() {
        [] => "Rotation curves".to_owned(),
        [only] => format!("Rotation curves: {}", name(*only)),
        [first, more @ ..] => format!("Rotation curves: {} and {} more", name(*first), more.len()),
    };
    strip(ui, &title, |ui| {
        let views = [
            (CurveView::PlaneAngles, Action::PlaneAngles),
            (CurveView::SwingTwist, Action::SwingTwist),
            (CurveView::FileNumbers, Action::FileNumbers),
            (CurveView::TurnRate, Action::TurnRate),
        ];
        let views = views.map(|(view, action)| (view.label(), action));
        segments(ui, "What curves show", &views, scope.now, scope.out);
    });
    let Some(clip) = clip else {
        hint(ui, "No clip");
        return;
    };
    if joints.is_empty() {
        hint(ui, "Choose a joint to see how it turns: in the figure, on the map or in the tree");
        return;
    }
    let sets = scope.bench.curve_sets();
    if sets.is_empty() {
        hint(ui, "Sampling…");
        return;
    }
    if sets.iter().all(|set| set.lines.is_empty()) {
        hint(
            ui,
            "The file turns this joint nowhere: it stays at its rest pose. Insert puts a key at the playhead",
        );
        return;
    }
    let whole = ui.available_rect_before_wrap();
    if whole.width() < GUTTER_WIDTH + 60.0 || whole.height() < 40.0 {
        return;
    }
    let has_bar = whole.height() > 110.0;
    let bar_top = if has_bar { whole.bottom() - BAR_HEIGHT } else { whole.bottom() };
    let area = Rect::from_min_max(whole.min, pos2(whole.right(), bar_top));
    let session = &scope.bench.session;
    let axis = TimeAxis {
        span: Rangef::new(area.left() + GUTTER_WIDTH, area.right() - TIME_MARGIN),
        window: session.window,
    };
    let lane_top = area.bottom() - LANE_HEIGHT;
    let plot = Rect::from_x_y_ranges(axis.span, Rangef::new(area.top() + 8.0, lane_top - 5.0));
    let lane = Rect::from_x_y_ranges(axis.span, Rangef::new(lane_top, area.bottom()));
    let response = ui.allocate_rect(area, Sense::click_and_drag());
    let held = scope.pictures.curve_press.and_then(|press| press.held_values());
    let bounds = held.or(session.curves.values).or_else(|| fitted_values(&sets, session.window));
    let chart = Chart {
        area,
        plot,
        lane,
        axis,
        values: ValueAxis::new(bounds.unwrap_or([-1.0, 1.0]), plot.y_range()),
        clip: &clip,
        shown: scope.bench.curve_hand.shown.as_ref(),
        choice: scope.bench.curve_hand.shown.as_ref().map_or(&session.curves.keys, |shown| &shown.choice),
        sets: &sets,
        is_source_alone: session.shows_source_alone(),
    };
    let look = scope.look;
    let pointer = response.hover_pos().filter(|pointer| plot.expand(4.0).contains(*pointer));
    let told = pointer.map(|pointer| (pointer, marks::hover_lines(&look, pointer, &chart)));
    response.widget_info(|| {
        let mut info = WidgetInfo::labeled(Role::Canvas, true, "Rotation curves chart");
        info.current_text_value = told.as_ref().map(|(_, lines)| spoken(lines));
        info
    });
    let hover = hand::hand_ui(ui, &response, &chart, scope);

    let painter = ui.painter_at(area);
    chart.values.grid_ui(&painter, &look, &axis, sets[0].unit);
    vertical_grid(&painter, &axis, &clip, plot.y_range(), look.grid);
    let inside = ui.painter_at(Rect::from_x_y_ranges(
        axis.span.expand(1.0),
        Rangef::new(area.top(), plot.bottom() + 4.0),
    ));
    marks::bands_ui(&inside, &look, &chart);
    room::room_ui(&inside, &chart, scope);
    let plates = marks::snag_spans_ui(&inside, &axis, plot, &joints, scope);
    marks::lines_ui(&inside, &look, &chart, session.shows_before, &mut scope.pictures.columns);
    marks::segment_ui(&inside, &look, &chart, session.curves.segment);
    // Pips at the ends of the clip are whole.
    let around = inside.with_clip_rect(inside.clip_rect().expand2(vec2(7.0, 0.0)));
    keys::pips_ui(ui, &around, &look, &chart);
    keys::lane_ui(ui, &look, &chart);
    marks::names_ui(&inside, &look, &chart);
    let now = session.playback.playhead_secs;
    playhead(&painter, &look, &axis, now, area.y_range());
    // On the playhead, which stands on a snag as soon as it is chosen.
    plates.show(&inside, &look);
    marks::legend_ui(&painter, &look, &chart, now, session.curves.line);
    hand::gesture_ui(ui, &chart, scope, &hover);
    if let Some((pointer, lines)) = &told {
        marks::hover_ui(ui, &look, *pointer, &chart, lines);
    }
    spacing::spacing_ui(ui, &chart, scope);
    if has_bar {
        let bounds = Rect::from_min_max(pos2(whole.left(), bar_top), whole.max);
        bar::bar_ui(ui, bounds, &chart, scope);
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

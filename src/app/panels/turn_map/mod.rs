//! The turn map: a row for each joint, time across, heat for how much it turns, and the snags where they are.

mod draw;
mod labels;
mod legend;
mod marks;
mod pointer;

use std::sync::Arc;

use egui::containers::scroll_area::ScrollSource;
use egui::{Align2, FontId, Rangef, Rect, Role, ScrollArea, Sense, Ui, UiBuilder, WidgetInfo, pos2, vec2};

use super::super::commands::Action;
use super::super::pictures::RowsKey;
use super::super::theme::{GUTTER_WIDTH, INSET, RULER_HEIGHT, TIME_MARGIN};
use super::super::view_models::{HeatMap, MapRow, map_rows, ticks};
use super::super::widgets::{
    TimeAxis, bring_into_view, hint, playhead, scrub_and_zoom, segment, segments, strip,
};
use super::Scope;
use crate::clip::Clip;

const ROW_HEIGHTS: [f32; 2] = [16.0, 24.0];
/// A map lower than this has rows of the least height that letters fit into, and times alone above them: else it would show three joints.
const LOW: f32 = 130.0;
const LOW_ROW: f32 = 14.0;
const LOW_RULER: f32 = 18.0;

/// Folding and the order of rows, and a list of what colours may show, need so many points in the strip.
const ROOM_FOR_SWITCHES: f32 = 250.0;

/// The panel.
pub(crate) fn turn_map_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let heat = scope.bench.heat.as_ref().map(|heat| Arc::clone(&heat.value));
    strip(ui, "Turn map", |ui| {
        if let Some(heat) = &heat {
            legend::legend(ui, &scope.look, heat);
            ui.add_space(12.0);
        }
        // Where there is little room these two are left to the menu.
        if ui.available_width() > ROOM_FOR_SWITCHES {
            segment(ui, "Worst first", Action::WorstFirst, scope.now, scope.out);
            fold_switch(ui, scope);
            ui.add_space(8.0);
        }
        let colours = [
            ("Turn rate", Action::HeatTurnRate),
            ("Change", Action::HeatChange),
            ("Limits", Action::HeatLimitUse),
        ];
        segments(ui, "What colours show", &colours, scope.now, scope.out);
    });
    let Some(clip) = scope.bench.result().cloned() else {
        hint(ui, "No clip");
        return;
    };
    let area = ui.available_rect_before_wrap();
    if area.width() < GUTTER_WIDTH + 60.0 || area.height() < RULER_HEIGHT + 20.0 {
        return;
    }
    let axis = TimeAxis {
        span: Rangef::new(area.left() + GUTTER_WIDTH, area.right() - TIME_MARGIN),
        window: scope.bench.session.window,
    };
    let ruler_height = if area.height() < LOW { LOW_RULER } else { RULER_HEIGHT };
    let ruler = Rect::from_min_size(area.min, vec2(area.width(), ruler_height));
    ruler_ui(ui, ruler, &axis, &clip, scope);
    let body = Rect::from_min_max(pos2(area.left(), ruler.bottom()), area.max);
    let mut child = ui.new_child(UiBuilder::new().max_rect(body));
    match heat {
        Some(heat) if heat.joints.len() == clip.skeleton.listed().count() => {
            rows_ui(&mut child, body, &axis, &clip, &heat, scope);
        }
        _ => hint(&mut child, "The turn map is being drawn…"),
    }
    ui.allocate_rect(area, Sense::hover());
}

/// Folds all limbs, or unfolds all, whichever is not so yet.
fn fold_switch(ui: &mut Ui, scope: &mut Scope<'_>) {
    let folds = scope.bench.session.folded.is_empty();
    let action = if folds { Action::FoldLimbs } else { Action::UnfoldLimbs };
    segment(ui, if folds { "Fold" } else { "Unfold" }, action, scope.now, scope.out);
}

/// Seconds and frames along the top; dragging there scrubs.
fn ruler_ui(ui: &mut Ui, ruler: Rect, axis: &TimeAxis, clip: &Clip, scope: &mut Scope<'_>) {
    let look = scope.look;
    let over_time = Rect::from_x_y_ranges(axis.span.expand(6.0), ruler.y_range());
    let response = ui.interact(over_time, ui.scope_id().with("ruler"), Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Ruler"));
    if !pointer::choosing(ui, &response, axis, None, scope) {
        scrub_and_zoom(ui, &response, over_time, axis, clip, true, scope.out);
    }
    let painter = ui.painter_at(ruler);
    if let Some([from, to]) = scope.bench.session.choice.span_secs {
        let x = Rangef::new(axis.x(from).max(axis.span.min), axis.x(to).min(axis.span.max));
        if x.span() > 0.0 {
            painter.rect_filled(Rect::from_x_y_ranges(x, ruler.y_range()), 0.0, look.chosen);
        }
    }
    let font = FontId::proportional(11.5);
    let left = ruler.left() + INSET;
    let has_frames = ruler.height() > LOW_RULER;
    painter.text(pos2(left, ruler.top() + 9.0), Align2::LEFT_CENTER, "time", font.clone(), look.faint);
    if has_frames {
        painter.text(pos2(left, ruler.top() + 21.0), Align2::LEFT_CENTER, "frame", font.clone(), look.faint);
    }
    // Where one frame takes several marks it is written once.
    let mut last_frame = String::new();
    for tick in ticks(axis.window, &clip.grid, f64::from(axis.span.span())) {
        let x = axis.x(tick.secs);
        match tick.label {
            Some([secs, frame]) => {
                painter.vline(x, ruler.top() + 4.0..=ruler.bottom(), (1.0, look.axis));
                let own = painter.layout_no_wrap(secs, font.clone(), look.text);
                // At the right end words stand before their mark, so that they are whole.
                let is_before = x + 4.0 + own.size().x > ruler.right();
                let (side, align) =
                    if is_before { (x - 4.0, Align2::RIGHT_CENTER) } else { (x + 4.0, Align2::LEFT_CENTER) };
                let at = align.anchor_size(pos2(side, ruler.top() + 9.0), own.size());
                painter.galley(at.min, own, look.text);
                if has_frames && frame != last_frame {
                    let at = pos2(side, ruler.top() + 21.0);
                    painter.text(at, align, &frame, font.clone(), look.faint);
                    last_frame = frame;
                }
            }
            None => {
                painter.vline(x, ruler.bottom() - 5.0..=ruler.bottom(), (1.0, look.line));
            }
        }
    }
    let now = scope.bench.session.playback.playhead_secs;
    if axis.window.contains(now) {
        let x = axis.x(now);
        let flag = vec![
            pos2(x - 5.0, ruler.bottom() - 9.0),
            pos2(x + 5.0, ruler.bottom() - 9.0),
            pos2(x, ruler.bottom()),
        ];
        painter.add(egui::Shape::convex_polygon(flag, look.text, (1.0, look.background)));
    }
}

fn rows_ui(
    ui: &mut Ui,
    body: Rect,
    axis: &TimeAxis,
    clip: &Arc<Clip>,
    heat: &Arc<HeatMap>,
    scope: &mut Scope<'_>,
) {
    let key = RowsKey {
        map: Arc::clone(heat),
        clip: Arc::clone(clip),
        folded: scope.bench.session.folded.clone(),
        worst_first: scope.bench.session.worst_first,
    };
    let order = Arc::clone(scope.pictures.map_rows.get_or_compute(key, |key| {
        Arc::new(map_rows(&key.clip.skeleton, &key.map, &key.folded, key.worst_first))
    }));
    if order.is_empty() {
        hint(ui, "This skeleton has no joints");
        return;
    }
    let least = if body.height() < LOW - LOW_RULER { LOW_ROW } else { ROW_HEIGHTS[0] };
    let row_height = (body.height() / order.len() as f32).clamp(least, ROW_HEIGHTS[1]).floor();
    let seen_before = std::mem::replace(&mut scope.pictures.map_height, body.height());
    ScrollArea::vertical()
        .id_salt(("turn map rows", scope.bench.document_serial()))
        .auto_shrink(false)
        .scroll_source(ScrollSource {
            drag: egui::containers::scroll_area::DragScroll::Never,
            ..ScrollSource::ALL
        })
        .show_viewport(ui, |ui, viewport| {
            let height = row_height * order.len() as f32;
            ui.set_height(height.max(viewport.height()));
            let top = ui.max_rect().top();
            let first = (viewport.top() / row_height).floor().max(0.0) as usize;
            let last = ((viewport.bottom() / row_height).ceil() as usize).min(order.len());
            let visible = &order[first.min(last)..last];
            let deepest = order.iter().map(|row| row.depth).max().unwrap_or(0);
            let top_row = top + first as f32 * row_height;
            let rows = Rows { top: top_row, height: row_height, visible, deepest, heat };
            if let Some(joint) = scope.bench.session.joint
                && (scope.pictures.scroll_to_joint == Some(joint) || body.height() < seen_before)
                && let Some(place) =
                    order.iter().position(|row| row.members.iter().any(|&own| heat.joints[own] == joint))
            {
                let row = Rangef::new(place as f32, place as f32 + 1.0) * row_height;
                let is_asked = scope.pictures.scroll_to_joint == Some(joint);
                bring_into_view(ui, top, row, [viewport.top(), seen_before], is_asked);
            }
            draw_rows(ui, body, axis, clip, &rows, scope);
        });
}

struct Rows<'a> {
    /// Where the first visible row begins on screen.
    top: f32,
    height: f32,
    visible: &'a [MapRow],
    /// How far the deepest of all rows is moved in, those out of sight among them.
    deepest: usize,
    heat: &'a Arc<HeatMap>,
}

impl Rows<'_> {
    fn bounds(&self, place: usize, x: Rangef) -> Rect {
        let top = self.top + place as f32 * self.height;
        Rect::from_x_y_ranges(x, Rangef::new(top, top + self.height))
    }

    fn at(&self, y: f32) -> Option<usize> {
        let place = ((y - self.top) / self.height).floor();
        (place >= 0.0).then_some(place as usize).filter(|&place| place < self.visible.len())
    }
}

fn draw_rows(
    ui: &mut Ui,
    body: Rect,
    axis: &TimeAxis,
    clip: &Arc<Clip>,
    rows: &Rows<'_>,
    scope: &mut Scope<'_>,
) {
    let look = scope.look;
    let painter = ui.painter().clone();
    draw::heat_ui(ui, axis, clip, rows, scope);
    labels::labels_ui(ui, body, axis, clip, rows, scope);
    draw::choice_ui(&painter, body, axis, rows, scope);
    // The letters lie on the playhead, which stands on a snag as soon as it is chosen.
    playhead(&painter, &look, axis, scope.bench.session.playback.playhead_secs, body.y_range());
    marks::marks_ui(ui, axis, rows, scope);
    pointer::pointer_ui(ui, body, axis, clip, rows, scope);
}

//! The turn map: a row for each joint, time across, heat for how much it turns, and the snags where they are.

use std::sync::Arc;

use egui::containers::scroll_area::ScrollSource;
use egui::{
    Align2, Color32, ColorImage, FontId, Rangef, Rect, Role, ScrollArea, Sense, Ui, UiBuilder, WidgetInfo,
    pos2, vec2,
};

use super::super::commands::{Action, Command};
use super::super::pictures::{MapKey, on_pixels};
use super::super::theme::{GUTTER_WIDTH, INSET, Look, RULER_HEIGHT, TIME_MARGIN, color32};
use super::super::view_models::{
    HeatKind, HeatMap, SnagState, degrees, rotation_at, seconds, ticks, worst_first,
};
use super::super::widgets::{
    TimeAxis, focus_ring, hint, letter_plate, playhead, read_out, scrub_and_zoom, segment, strip,
};
use super::Scope;
use crate::clip::Clip;
use crate::raster::cividis;

const ROW_HEIGHTS: [f32; 2] = [16.0, 24.0];

/// The panel.
pub(crate) fn turn_map_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let heat = scope.bench.heat.as_ref().map(|heat| Arc::clone(&heat.value));
    strip(ui, "Turn map", |ui| {
        if let Some(heat) = &heat {
            legend(ui, &scope.look, heat);
            ui.add_space(14.0);
        }
        segment(ui, "Worst first", Action::WorstFirst, scope.now, scope.out);
        ui.add_space(10.0);
        segment(ui, "Change", Action::HeatChange, scope.now, scope.out);
        segment(ui, "Turn rate", Action::HeatTurnRate, scope.now, scope.out);
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
    let ruler = Rect::from_min_size(area.min, vec2(area.width(), RULER_HEIGHT));
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

/// From cold to hot, with numbers.
fn legend(ui: &mut Ui, look: &Look, heat: &HeatMap) {
    let font = FontId::proportional(11.5);
    let unit = heat.kind.unit();
    let top = format!("{}{unit}", heat.scale.top);
    let size = ui.painter().layout_no_wrap(top.clone(), font.clone(), look.faint).size();
    let (bounds, response) = ui.allocate_exact_size(vec2(86.0 + size.x, 18.0), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("Colours from 0 to {top}")));
    let painter = ui.painter();
    painter.text(bounds.left_center(), Align2::LEFT_CENTER, "0", font.clone(), look.faint);
    let bar = Rect::from_min_size(bounds.left_center() + vec2(11.0, -4.0), vec2(68.0, 8.0));
    let steps = 17;
    for step in 0..steps {
        let share = step as f32 / (steps - 1) as f32;
        let left = bar.left() + step as f32 * bar.width() / steps as f32;
        let cell = Rect::from_min_size(pos2(left, bar.top()), vec2(bar.width() / steps as f32, bar.height()));
        painter.rect_filled(cell, 0.0, Look::heat(share));
    }
    painter.text(pos2(bar.right() + 5.0, bounds.center().y), Align2::LEFT_CENTER, &top, font, look.faint);
    response.on_hover_text(match heat.kind {
        HeatKind::TurnRate => {
            "Colour = how fast the joint turns. The scale is a square root, so slow motion shows"
        }
        HeatKind::Change => "Colour = the turn between source and result. The scale is a square root",
    });
}

/// Seconds and frames along the top; dragging there scrubs.
fn ruler_ui(ui: &mut Ui, ruler: Rect, axis: &TimeAxis, clip: &Clip, scope: &mut Scope<'_>) {
    let look = scope.look;
    let over_time = Rect::from_x_y_ranges(axis.span.expand(6.0), ruler.y_range());
    let response = ui.interact(over_time, ui.scope_id().with("ruler"), Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Ruler"));
    scrub_and_zoom(ui, &response, over_time, axis, clip, true, scope.out);
    let painter = ui.painter_at(ruler);
    let font = FontId::proportional(11.5);
    let left = ruler.left() + INSET;
    painter.text(pos2(left, ruler.top() + 9.0), Align2::LEFT_CENTER, "time", font.clone(), look.faint);
    painter.text(pos2(left, ruler.top() + 21.0), Align2::LEFT_CENTER, "frame", font.clone(), look.faint);
    for tick in ticks(axis.window, &clip.grid, f64::from(axis.span.span())) {
        let x = axis.x(tick.secs);
        match &tick.label {
            Some([secs, frame]) => {
                painter.vline(x, ruler.top() + 4.0..=ruler.bottom(), (1.0, look.axis));
                let at = |y: f32| pos2(x + 4.0, ruler.top() + y);
                painter.text(at(9.0), Align2::LEFT_CENTER, secs, font.clone(), look.text);
                painter.text(at(21.0), Align2::LEFT_CENTER, frame, font.clone(), look.faint);
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
    let order: Vec<usize> =
        if scope.bench.session.worst_first { worst_first(heat) } else { (0..heat.len()).collect() };
    if order.is_empty() {
        hint(ui, "This skeleton has no joints");
        return;
    }
    let row_height = (body.height() / order.len() as f32).clamp(ROW_HEIGHTS[0], ROW_HEIGHTS[1]).floor();
    ScrollArea::vertical()
        .id_salt("turn map rows")
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
            let rows = Rows { top: top + first as f32 * row_height, height: row_height, visible, heat };
            if let Some(joint) = scope.bench.session.joint
                && scope.pictures.scroll_to_joint == Some(joint)
                && let Some(place) = order.iter().position(|&row| heat.joints[row] == joint)
            {
                let row = Rect::from_min_size(
                    pos2(body.left(), top + place as f32 * row_height),
                    vec2(1.0, row_height),
                );
                ui.scroll_to_rect(row, None);
            }
            draw_rows(ui, body, axis, clip, &rows, scope);
        });
}

struct Rows<'a> {
    /// Where the first visible row begins on screen.
    top: f32,
    height: f32,
    visible: &'a [usize],
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
    let scale = ui.pixels_per_point();
    let n_rows = rows.visible.len();
    let wanted =
        Rect::from_x_y_ranges(axis.span, Rangef::new(rows.top, rows.top + rows.height * n_rows as f32));
    let (bounds, [width, height]) = on_pixels(wanted, scale);
    let key = MapKey {
        map: Arc::clone(rows.heat),
        rows: rows.visible.to_vec(),
        window: axis.window,
        size_px: [width, height / n_rows.max(1)],
        is_dark: ui.visuals().dark_mode,
    };
    let texture = scope
        .pictures
        .map
        .show(ui.ctx(), "turn map", key, |key| heat_image(key, clip, &look, [width, height]));
    let painter = ui.painter().clone();
    painter.image(texture, bounds, Rect::from_min_max(pos2(0.0, 0.0), pos2(1.0, 1.0)), Color32::WHITE);

    let chosen = scope.bench.session.joint;
    let labels = Rangef::new(body.left(), axis.span.min);
    for (place, &row) in rows.visible.iter().enumerate() {
        let joint = rows.heat.joints[row];
        let cell = rows.bounds(place, labels);
        let is_chosen = chosen == Some(joint);
        let response = ui.interact(cell, ui.scope_id().with(("map row", joint)), Sense::click());
        let name = clip.skeleton.label(joint);
        response.widget_info(|| WidgetInfo::selected(Role::Row, true, is_chosen, format!("Map row {name}")));
        if response.clicked() {
            scope.out.push(Command::ChooseJoint(Some(joint)));
        }
        focus_ring(ui, &response);
        if is_chosen {
            painter.rect_filled(cell, 0.0, look.chosen);
            painter.rect_filled(Rect::from_min_size(cell.min, vec2(3.0, cell.height())), 0.0, look.selection);
        } else if response.hovered() || scope.pictures.hovered == Some(joint) {
            painter.rect_filled(cell, 0.0, look.hover);
        }
        let ink = if is_chosen { look.text } else { look.faint };
        elided(&painter, cell.shrink2(vec2(INSET, 0.0)), name, ink);
        if is_chosen {
            let across = rows.bounds(place, axis.span);
            painter.rect_stroke(across, 0.0, (1.0, look.selection), egui::StrokeKind::Outside);
        }
    }
    marks_ui(ui, axis, rows, scope);
    playhead(&painter, &look, axis, scope.bench.session.playback.playhead_secs, body.y_range());

    let over_time = Rect::from_x_y_ranges(axis.span, body.y_range()).intersect(ui.clip_rect());
    let response = ui.interact(over_time, ui.scope_id().with("turn map"), Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Turn map rows"));
    let pressed = ui.input(|input| input.pointer.primary_pressed());
    if (response.is_pointer_button_down_on() || response.clicked())
        && pressed
        && let Some(pointer) = response.interact_pointer_pos()
    {
        let mark = mark_at(pointer, axis, rows, scope);
        scope.pictures.press_is_on_mark = mark.is_some();
        if let Some(index) = mark {
            scope.out.push(Command::ChooseSnag(index));
        } else {
            let joint = rows.at(pointer.y).map(|place| rows.heat.joints[rows.visible[place]]);
            scope.out.extend(joint.map(|joint| Command::ChooseJoint(Some(joint))));
        }
    }
    // Going to a snag moves time under the pointer: the press that chose it must not scrub as well.
    let is_press = response.is_pointer_button_down_on() || response.clicked();
    if !(scope.pictures.press_is_on_mark && is_press) {
        scrub_and_zoom(ui, &response, over_time, axis, clip, false, scope.out);
    }
    if let Some(pointer) = response.hover_pos() {
        hover_read_out(ui, pointer, axis, clip, rows, scope);
    }
}

/// The picture of the visible rows, at the size of the screen.
fn heat_image(key: &MapKey, clip: &Clip, look: &Look, [width, height]: [usize; 2]) -> ColorImage {
    let colors = key.map.shares().map(|share| color32(cividis(share)));
    // On a light ground bright lines between dark rows would shout.
    let parting = color32(look.palette.background.mix(cividis(0.0), if key.is_dark { 0.0 } else { 0.72 }));
    let mut image = ColorImage::filled([width, height], parting);
    let frames: Vec<usize> =
        (0..=width).map(|column| clip.grid.frame(key.window.time(column as f64 / width as f64))).collect();
    let n_rows = key.rows.len().max(1);
    for (place, &row) in key.rows.iter().enumerate() {
        let (top, bottom) = (place * height / n_rows, (place + 1) * height / n_rows);
        let line: Vec<Color32> = (0..width)
            .map(|column| {
                let range = frames[column]..frames[column + 1].max(frames[column] + 1);
                colors[usize::from(key.map.code(row, range))]
            })
            .collect();
        // The last line stays background: it parts the rows.
        for y in top..bottom.saturating_sub(1) {
            image.pixels[y * width..(y + 1) * width].copy_from_slice(&line);
        }
    }
    image
}

/// Words cut with … where they are too long.
fn elided(painter: &egui::Painter, bounds: Rect, words: &str, color: Color32) {
    let mut job =
        egui::text::LayoutJob::simple_singleline(words.to_owned(), FontId::proportional(12.5), color);
    job.wrap = egui::text::TextWrapping::truncate_at_width(bounds.width());
    let galley = painter.layout_job(job);
    painter.galley(pos2(bounds.left(), bounds.center().y - galley.size().y / 2.0), galley, color);
}

const MARK: f32 = 13.0;

/// The snags of the visible rows, those that would lie on each other as one.
struct Mark {
    index: usize,
    place: usize,
    x: f32,
    letter: char,
    state: SnagState,
    span: Rangef,
}

fn marks(axis: &TimeAxis, rows: &Rows<'_>, scope: &Scope<'_>) -> Vec<Mark> {
    let mut place_of = vec![None; rows.heat.joints.iter().max().map_or(0, |last| last + 1)];
    for (place, &row) in rows.visible.iter().enumerate() {
        place_of[rows.heat.joints[row]] = Some(place);
    }
    let chosen = scope.bench.chosen_snag();
    let mut last: Vec<Option<usize>> = vec![None; rows.visible.len()];
    let mut found: Vec<Mark> = Vec::new();
    for (index, (snag, &state)) in scope.bench.snags().iter().zip(scope.states.iter()).enumerate() {
        let shown = scope.bench.shown_joint(snag.joint);
        let Some(place) = shown.and_then(|joint| place_of.get(joint).copied().flatten()) else { continue };
        let span = Rangef::new(axis.x(snag.first_secs), axis.x(snag.last_secs));
        if span.max < axis.span.min - MARK || span.min > axis.span.max + MARK {
            continue;
        }
        let visible = Rangef::new(span.min.max(axis.span.min), span.max.min(axis.span.max));
        let mark = Mark { index, place, x: visible.center(), letter: snag.kind.letter(), state, span };
        let is_chosen = chosen.is_some_and(|chosen| std::ptr::eq(chosen, snag));
        match last[place] {
            // Open ones go before mended ones, and the chosen one before all.
            Some(before) if found[before].x > mark.x - MARK - 1.0 => {
                if is_chosen || (mark.state < found[before].state) {
                    let at = found[before].x;
                    found[before] = Mark { x: if is_chosen { mark.x } else { at }, ..mark };
                }
            }
            _ => {
                last[place] = Some(found.len());
                found.push(mark);
            }
        }
    }
    found
}

fn marks_ui(ui: &Ui, axis: &TimeAxis, rows: &Rows<'_>, scope: &Scope<'_>) {
    let look = &scope.look;
    let painter = ui.painter_at(
        ui.clip_rect().intersect(Rect::from_x_y_ranges(axis.span.expand(8.0), Rangef::EVERYTHING)),
    );
    let chosen = scope.bench.chosen_snag().map(std::ptr::from_ref);
    for mark in marks(axis, rows, scope) {
        let row = rows.bounds(mark.place, axis.span);
        let middle = pos2(mark.x, row.center().y);
        if mark.span.span() > MARK {
            let color = if mark.state == SnagState::Open { look.snag } else { look.faint };
            let left = mark.span.min.max(axis.span.min);
            painter.hline(left..=mark.span.max.min(axis.span.max), row.bottom() - 2.5, (2.0, color));
        }
        let size = MARK.min(rows.height - 2.0);
        letter_plate(&painter, look, middle, size, mark.letter, mark.state);
        if chosen == Some(std::ptr::from_ref(&scope.bench.snags()[mark.index])) {
            let ring = Rect::from_center_size(middle, vec2(size + 4.0, size + 4.0));
            painter.rect_stroke(ring, 3.5, (2.0, look.selection), egui::StrokeKind::Middle);
        }
    }
}

fn mark_at(pointer: egui::Pos2, axis: &TimeAxis, rows: &Rows<'_>, scope: &Scope<'_>) -> Option<usize> {
    let place = rows.at(pointer.y)?;
    let hit = |mark: &&Mark| mark.place == place && (mark.x - pointer.x).abs() <= MARK / 2.0 + 1.0;
    marks(axis, rows, scope).iter().find(hit).map(|mark| mark.index)
}

fn hover_read_out(
    ui: &Ui,
    pointer: egui::Pos2,
    axis: &TimeAxis,
    clip: &Clip,
    rows: &Rows<'_>,
    scope: &mut Scope<'_>,
) {
    let Some(place) = rows.at(pointer.y) else { return };
    let look = scope.look;
    let joint = rows.heat.joints[rows.visible[place]];
    scope.out.push(Command::HoverJoint(joint));
    let time = axis.time(pointer.x).clamp(0.0, clip.duration_secs);
    let frame = clip.grid.frame(time);
    let at = clip.grid.time(frame);
    let value = match rows.heat.kind {
        HeatKind::TurnRate => {
            let before = clip.grid.time(frame.saturating_sub(1));
            let secs = at - before;
            let turn = rotation_at(clip, joint, before).turn_to(rotation_at(clip, joint, at)).to_degrees();
            format!("{:.0} °/s", if secs > 0.0 { turn / secs } else { 0.0 })
        }
        HeatKind::Change => {
            let change = scope.bench.before().map_or(0.0, |source| {
                rotation_at(source, joint, at).turn_to(rotation_at(clip, joint, at)).to_degrees()
            });
            format!("{} from the source", degrees(change))
        }
    };
    let mut lines = vec![
        (clip.skeleton.label(joint).to_owned(), look.text),
        (format!("{}  frame {frame}", seconds(at)), look.faint),
        (value, look.text),
    ];
    if let Some(index) = mark_at(pointer, axis, rows, scope) {
        let (snag, state) = (&scope.bench.snags()[index], scope.states[index]);
        let words = format!("{} {}, {}", snag.kind.letter(), snag.kind, state.word());
        lines.push((words, if state == SnagState::Open { look.error } else { look.faint }));
    }
    let layer =
        ui.ctx().layer_painter(egui::LayerId::new(egui::Order::Tooltip, ui.scope_id().with("read-out")));
    read_out(&layer, &look, pointer, ui.ctx().content_rect(), &lines);
}

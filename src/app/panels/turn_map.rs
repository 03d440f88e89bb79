//! The turn map: a row for each joint, time across, heat for how much it turns, and the snags where they are.

use std::sync::Arc;

use egui::containers::scroll_area::ScrollSource;
use egui::{
    Align2, Color32, ColorImage, FontId, Rangef, Rect, Role, ScrollArea, Sense, Ui, UiBuilder, WidgetInfo,
    pos2, vec2,
};

use super::super::commands::{Action, Command, TimeCommand};
use super::super::pictures::{MapKey, RowsKey, on_pixels};
use super::super::theme::{GUTTER_WIDTH, INSET, Look, RULER_HEIGHT, TIME_MARGIN, color32};
use super::super::view_models::{
    HeatKind, HeatMap, MapRow, Shared, SnagState, TimeChoice, counted, degrees, map_rows, rotation_at,
    seconds, ticks,
};
use super::super::widgets::{
    Icon, TimeAxis, focus_ring, hint, letter_plate, name_ui, paint_icon, playhead, read_out, scrub_and_zoom,
    segment, spoken, strip,
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
            ui.add_space(12.0);
        }
        segment(ui, "Worst first", Action::WorstFirst, scope.now, scope.out);
        fold_switch(ui, scope);
        ui.add_space(8.0);
        segment(ui, "Limits", Action::HeatLimitUse, scope.now, scope.out);
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

/// Folds all limbs, or unfolds all, whichever is not so yet.
fn fold_switch(ui: &mut Ui, scope: &mut Scope<'_>) {
    let folds = scope.bench.session.folded.is_empty();
    let action = if folds { Action::FoldLimbs } else { Action::UnfoldLimbs };
    segment(ui, if folds { "Fold" } else { "Unfold" }, action, scope.now, scope.out);
}

/// From cold to hot, with numbers at both ends and in the middle.
fn legend(ui: &mut Ui, look: &Look, heat: &HeatMap) {
    let font = FontId::proportional(11.5);
    let unit = heat.kind.unit();
    let stands_in = heat.limits.as_ref().is_some_and(|(_, is_preset)| *is_preset);
    if heat.trouble.is_some() || stands_in {
        let words = if stands_in { "adult preset, none set" } else { "no limits to show" };
        let label = egui::Label::new(egui::RichText::new(words).size(11.5).color(look.faint)).truncate();
        ui.add(label).on_hover_text(limits_words(heat));
        ui.add_space(6.0);
        if !stands_in {
            return;
        }
    }
    let value = |share: f32| {
        let value = heat.scale.value(share);
        if value < 10.0 { format!("{}", (value * 10.0).round() / 10.0) } else { format!("{value:.0}") }
    };
    let words = ["0".to_owned(), value(0.5), format!("{}{unit}", value(1.0))];
    let widths = words
        .each_ref()
        .map(|words| ui.painter().layout_no_wrap(words.clone(), font.clone(), look.faint).size().x);
    let half = 30.0;
    let (bounds, response) =
        ui.allocate_exact_size(vec2(widths.iter().sum::<f32>() + 2.0 * half + 16.0, 18.0), Sense::hover());
    let said = format!("Colours from 0 over {} to {}", words[1], words[2]);
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &said));
    let painter = ui.painter();
    let mut at = bounds.left();
    let steps = 9;
    for (place, words) in words.iter().enumerate() {
        let middle = pos2(at, bounds.center().y);
        painter.text(middle, Align2::LEFT_CENTER, words, font.clone(), look.faint);
        at += widths[place] + 4.0;
        if place == 2 {
            break;
        }
        for step in 0..steps {
            let share = 0.5 * (place as f32 + (step as f32 + 0.5) / steps as f32);
            let width = half / steps as f32;
            let left = at + step as f32 * width;
            let cell = Rect::from_min_size(pos2(left, bounds.center().y - 4.0), vec2(width + 0.5, 8.0));
            painter.rect_filled(cell, 0.0, Look::heat(share));
        }
        at += half + 4.0;
    }
    response.on_hover_text(match heat.kind {
        HeatKind::TurnRate => {
            "Colour = how fast the joint turns. The scale is a square root, so slow motion shows".to_owned()
        }
        HeatKind::Change => {
            "Colour = the turn between source and result. The scale is a square root".to_owned()
        }
        HeatKind::LimitUse => format!(
            "Colour = how much of its limit the joint uses; 100 % is at the limit. {}",
            limits_words(heat)
        ),
    });
}

/// Which limits the colours stand for.
fn limits_words(heat: &HeatMap) -> String {
    match (&heat.limits, &heat.trouble) {
        (Some((limits, is_preset)), _) => {
            let count = counted(limits.joints.len(), "joint");
            let title = if limits.title.is_empty() { "no title" } else { &limits.title };
            if *is_preset {
                format!("No limits are set for this clip: the preset {title} is shown ({count})")
            } else {
                format!("Limits: {title} ({count})")
            }
        }
        (None, Some(trouble)) => trouble.clone(),
        (None, None) => String::new(),
    }
}

/// Seconds and frames along the top; dragging there scrubs.
fn ruler_ui(ui: &mut Ui, ruler: Rect, axis: &TimeAxis, clip: &Clip, scope: &mut Scope<'_>) {
    let look = scope.look;
    let over_time = Rect::from_x_y_ranges(axis.span.expand(6.0), ruler.y_range());
    let response = ui.interact(over_time, ui.scope_id().with("ruler"), Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Ruler"));
    if !choosing(ui, &response, axis, None, scope) {
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
            let deepest = order.iter().map(|row| row.depth).max().unwrap_or(0);
            let top_row = top + first as f32 * row_height;
            let rows = Rows { top: top_row, height: row_height, visible, deepest, heat };
            if let Some(joint) = scope.bench.session.joint
                && scope.pictures.scroll_to_joint == Some(joint)
                && let Some(place) =
                    order.iter().position(|row| row.members.iter().any(|&own| heat.joints[own] == joint))
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

    labels_ui(ui, body, axis, clip, rows, scope);
    choice_ui(&painter, body, axis, rows, scope);
    marks_ui(ui, axis, rows, scope);
    playhead(&painter, &look, axis, scope.bench.session.playback.playhead_secs, body.y_range());

    let over_time = Rect::from_x_y_ranges(axis.span, body.y_range()).intersect(ui.clip_rect());
    let response = ui.interact(over_time, ui.scope_id().with("turn map"), Sense::click_and_drag());
    let hovered = response.hover_pos().and_then(|pointer| hover_lines(pointer, axis, clip, rows, scope));
    response.widget_info(|| {
        let mut info = WidgetInfo::labeled(Role::Canvas, true, "Turn map rows");
        info.current_text_value = hovered.as_ref().map(|(_, lines)| spoken(lines));
        info
    });
    let is_choosing = choosing(ui, &response, axis, Some(rows), scope);
    let pressed = !is_choosing && ui.input(|input| input.pointer.primary_pressed());
    if (response.is_pointer_button_down_on() || response.clicked())
        && pressed
        && let Some(pointer) = response.interact_pointer_pos()
    {
        let mark = mark_at(pointer, axis, rows, scope);
        scope.pictures.press_is_on_mark = mark.is_some();
        if let Some(index) = mark {
            scope.out.push(Command::ChooseSnag(index));
        } else {
            let joint = rows.at(pointer.y).map(|place| rows.visible[place].joint);
            scope.out.extend(joint.map(|joint| Command::ChooseJoint(Some(joint))));
        }
    }
    // Going to a snag moves time under the pointer: the press that chose it must not scrub as well.
    let is_press = response.is_pointer_button_down_on() || response.clicked();
    let chose_mark = scope.pictures.press_is_on_mark && is_press;
    if !is_choosing && !chose_mark {
        scrub_and_zoom(ui, &response, over_time, axis, clip, false, scope.out);
    }
    if let (Some(pointer), Some((joint, lines))) = (response.hover_pos(), hovered) {
        scope.out.push(Command::HoverJoint(joint));
        let layer =
            ui.ctx().layer_painter(egui::LayerId::new(egui::Order::Tooltip, ui.scope_id().with("read-out")));
        read_out(&layer, &look, pointer, ui.ctx().content_rect(), &lines);
    }
}

/// The names on the left: a click chooses the joint, the chevron folds what hangs on it.
fn labels_ui(ui: &Ui, body: Rect, axis: &TimeAxis, clip: &Clip, rows: &Rows<'_>, scope: &mut Scope<'_>) {
    let look = scope.look;
    let painter = ui.painter().clone();
    let chosen = scope.bench.session.joints();
    let choice = scope.bench.session.choice.clone();
    let labels = Rangef::new(body.left(), axis.span.min);
    // Deep hierarchies must leave room for the names.
    let step = (0.22 * labels.span() / rows.deepest.max(1) as f32).min(6.0);
    let shared = Shared::of(clip.skeleton.listed().map(|joint| clip.skeleton.label(joint)));
    for (place, row) in rows.visible.iter().enumerate() {
        let joint = row.joint;
        let cell = rows.bounds(place, labels);
        let stands_for = |joint: usize| row.members.iter().any(|&own| rows.heat.joints[own] == joint);
        let is_chosen = chosen.iter().any(|&joint| stands_for(joint));
        let response = ui.interact(cell, ui.scope_id().with(("map row", joint)), Sense::click());
        let name = clip.skeleton.label(joint);
        response.widget_info(|| WidgetInfo::selected(Role::Row, true, is_chosen, format!("Map row {name}")));
        if response.clicked() {
            let (adds, also) = ui.input(|input| (input.modifiers.command, input.modifiers.shift));
            scope.out.push(if adds {
                Command::Time(TimeCommand::Choose(toggled(&choice, row, rows)))
            } else if also {
                Command::ChooseAlso(joint)
            } else {
                Command::ChooseJoint(Some(joint))
            });
        }
        focus_ring(ui, &response);
        if is_chosen {
            painter.rect_filled(cell, 0.0, look.chosen);
            painter.rect_filled(Rect::from_min_size(cell.min, vec2(3.0, cell.height())), 0.0, look.selection);
        } else if response.hovered() || scope.pictures.hovered.is_some_and(stands_for) {
            painter.rect_filled(cell, 0.0, look.hover);
        }
        let ink = if is_chosen { look.text } else { look.faint };
        let left = cell.left() + 5.0 + row.depth as f32 * step;
        let chevron = Rect::from_min_size(pos2(left, cell.top()), vec2(14.0, cell.height()));
        if row.has_children {
            let response = ui.interact(chevron, ui.scope_id().with(("map fold", joint)), Sense::click());
            let verb = if row.is_open { "Fold" } else { "Unfold" };
            response
                .widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("{verb} {name} in the map")));
            let icon = if row.is_open { Icon::ChevronDown } else { Icon::ChevronRight };
            let ink = if response.hovered() { look.text } else { look.axis };
            paint_icon(&painter, chevron.shrink2(vec2(2.0, 0.0)), icon, ink);
            focus_ring(ui, &response);
            if response.clicked() {
                scope.out.push(Command::Fold(joint));
            }
        }
        let mut words =
            Rect::from_min_max(pos2(chevron.right() + 2.0, cell.top()), cell.max - vec2(4.0, 0.0));
        let is_in_choice =
            choice.joints.is_some() && row.members.iter().any(|&own| choice.has_joint(rows.heat.joints[own]));
        if is_in_choice {
            // A dot besides the undimmed row.
            painter.circle_filled(pos2(cell.right() - INSET - 1.0, cell.center().y), 3.0, look.selection);
            words.max.x -= 10.0;
        }
        let font = FontId::proportional(12.5);
        let shown = if row.is_open || row.members.len() < 2 {
            name.to_owned()
        } else {
            format!("{name} +{}", row.members.len() - 1)
        };
        if name_ui(&painter, words, &shown, shared, &font, ink) {
            response.on_hover_text(shown);
        }
        if is_chosen {
            let across = rows.bounds(place, axis.span);
            painter.rect_stroke(across, 0.0, (1.0, look.selection), egui::StrokeKind::Outside);
        }
    }
}

/// The choice with a row taken in, or out where it was in.
fn toggled(choice: &TimeChoice, row: &MapRow, rows: &Rows<'_>) -> TimeChoice {
    let own: Vec<usize> = row.members.iter().map(|&member| rows.heat.joints[member]).collect();
    let was_in = choice.joints.is_some() && own.iter().all(|&joint| choice.has_joint(joint));
    let mut joints = choice.joints.clone().unwrap_or_default();
    joints.retain(|joint| !own.contains(joint));
    if !was_in {
        joints.extend(own);
    }
    TimeChoice { span_secs: choice.span_secs, ..TimeChoice::of_joints(joints) }
}

/// Dragging with the command key held chooses a stretch of time, on rows their joints too; a mere click there takes a row in
/// or out. Gives whether that is what the pointer does.
fn choosing(
    ui: &Ui,
    response: &egui::Response,
    axis: &TimeAxis,
    rows: Option<&Rows<'_>>,
    scope: &mut Scope<'_>,
) -> bool {
    let (has_key, pressed, released) = ui.input(|input| {
        (input.modifiers.command, input.pointer.primary_pressed(), input.pointer.primary_released())
    });
    let Some(pointer) = response.interact_pointer_pos() else { return false };
    let joint_at = |y: f32| {
        rows.and_then(|rows| rows.at(y)).map(|place| rows.map_or(0, |rows| rows.visible[place].joint))
    };
    let is_own = response.is_pointer_button_down_on() || response.clicked();
    if pressed && has_key && is_own {
        scope.pictures.choosing = Some((axis.time(pointer.x), joint_at(pointer.y), pointer));
    } else if pressed && is_own {
        // The release of an older one was not seen.
        scope.pictures.choosing = None;
    }
    let Some((secs, joint, start)) = scope.pictures.choosing else { return false };
    let is_drag = start.distance(pointer) > 4.0;
    let choice = scope.bench.session.choice.clone();
    if is_drag && (is_own || response.drag_stopped()) {
        let mut joints = choice.joints.clone();
        if let (Some(rows), Some(first)) = (rows, joint) {
            let from = rows.visible.iter().position(|row| row.joint == first);
            let to =
                ((pointer.y - rows.top) / rows.height).floor().clamp(0.0, rows.visible.len() as f32 - 1.0);
            // The row of the press may have been scrolled away.
            let from = from.unwrap_or(to as usize);
            let span = from.min(to as usize)..=from.max(to as usize);
            let members = rows.visible[span].iter().flat_map(|row| &row.members);
            joints = TimeChoice::of_joints(members.map(|&own| rows.heat.joints[own])).joints;
        }
        let next = TimeChoice { joints, span_secs: None }.between(secs, axis.time(pointer.x));
        scope.out.push(Command::Time(TimeCommand::Choose(next)));
    } else if released && is_own {
        let row = rows.and_then(|rows| rows.at(start.y).map(|place| (rows, &rows.visible[place])));
        scope.out.push(Command::Time(TimeCommand::Choose(match row {
            Some((rows, row)) => toggled(&choice, row, rows),
            None => TimeChoice { span_secs: None, ..choice },
        })));
    }
    if released {
        scope.pictures.choosing = None;
    }
    true
}

/// What is not chosen is dimmed; the ends of the stretch are lines with hooks inward.
fn choice_ui(painter: &egui::Painter, body: Rect, axis: &TimeAxis, rows: &Rows<'_>, scope: &Scope<'_>) {
    let (look, choice) = (&scope.look, &scope.bench.session.choice);
    if choice.is_everything() {
        return;
    }
    let veil = look.background.gamma_multiply(0.62);
    let [from, to] = choice.span_secs.map_or([axis.span.min, axis.span.max], |[from, to]| {
        [from, to].map(|secs| axis.x(secs).clamp(axis.span.min, axis.span.max))
    });
    for (place, row) in rows.visible.iter().enumerate() {
        let is_in = row.members.iter().any(|&own| choice.has_joint(rows.heat.joints[own]));
        let spans: &[Rangef] = if is_in {
            &[Rangef::new(axis.span.min, from), Rangef::new(to, axis.span.max)]
        } else {
            &[axis.span]
        };
        for span in spans.iter().filter(|span| span.span() > 0.0) {
            painter.rect_filled(rows.bounds(place, *span), 0.0, veil);
        }
    }
    let Some(span) = choice.span_secs else { return };
    for (secs, inward) in span.into_iter().zip([1.0_f32, -1.0]) {
        if !axis.window.contains(secs) {
            continue;
        }
        let x = axis.x(secs);
        painter.vline(x, body.y_range(), (1.5, look.selection));
        for y in [body.top() + 1.0, body.bottom() - 1.0] {
            painter.hline(x.min(x + 5.0 * inward)..=x.max(x + 5.0 * inward), y, (2.0, look.selection));
        }
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
    for (place, row) in key.rows.iter().enumerate() {
        let (top, bottom) = (place * height / n_rows, (place + 1) * height / n_rows);
        let line: Vec<Color32> = (0..width)
            .map(|column| {
                let range = frames[column]..frames[column + 1].max(frames[column] + 1);
                colors[usize::from(row.code(&key.map, &range))]
            })
            .collect();
        // The last line stays background: it parts the rows.
        for y in top..bottom.saturating_sub(1) {
            image.pixels[y * width..(y + 1) * width].copy_from_slice(&line);
        }
    }
    image
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
    /// Its row has too many for letters: it is a stroke.
    is_stroke: bool,
}

/// Strokes of a crowded row that would lie nearer to each other than this are one.
const STROKE_APART: f32 = 5.0;

fn marks(axis: &TimeAxis, rows: &Rows<'_>, scope: &Scope<'_>) -> Vec<Mark> {
    let mut place_of = vec![None; rows.heat.joints.iter().max().map_or(0, |last| last + 1)];
    for (place, row) in rows.visible.iter().enumerate() {
        for &member in &row.members {
            place_of[rows.heat.joints[member]] = Some(place);
        }
    }
    let chosen = scope.bench.chosen_snag();
    // Plates shoulder to shoulder tell nothing, and an hour of them would take as long to draw as all the rest.
    let mut counts = vec![0_usize; rows.visible.len()];
    let in_sight = |span: Rangef| span.max >= axis.span.min - MARK && span.min <= axis.span.max + MARK;
    for snag in scope.bench.snags() {
        let shown = scope.bench.shown_joint(snag.joint);
        let Some(place) = shown.and_then(|joint| place_of.get(joint).copied().flatten()) else { continue };
        counts[place] += usize::from(in_sight(Rangef::new(axis.x(snag.first_secs), axis.x(snag.last_secs))));
    }
    let most = (axis.span.span() / (3.0 * MARK)) as usize;
    let mut last: Vec<Option<usize>> = vec![None; rows.visible.len()];
    let mut found: Vec<Mark> = Vec::new();
    for (index, (snag, &state)) in scope.bench.snags().iter().zip(scope.states.iter()).enumerate() {
        let shown = scope.bench.shown_joint(snag.joint);
        let Some(place) = shown.and_then(|joint| place_of.get(joint).copied().flatten()) else { continue };
        let span = Rangef::new(axis.x(snag.first_secs), axis.x(snag.last_secs));
        if !in_sight(span) {
            continue;
        }
        let is_stroke = counts[place] > most;
        let apart = if is_stroke { STROKE_APART } else { MARK + 1.0 };
        let visible = Rangef::new(span.min.max(axis.span.min), span.max.min(axis.span.max));
        let mark =
            Mark { index, place, x: visible.center(), letter: snag.kind.letter(), state, span, is_stroke };
        let is_chosen = chosen.is_some_and(|chosen| std::ptr::eq(chosen, snag));
        match last[place] {
            // Open ones go before mended ones, and the chosen one before all.
            Some(before) if found[before].x > mark.x - apart => {
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
    let (mut strokes, mut plates) = (egui::Mesh::default(), Vec::new());
    for mark in marks(axis, rows, scope) {
        let is_chosen = chosen == Some(std::ptr::from_ref(&scope.bench.snags()[mark.index]));
        if !mark.is_stroke || is_chosen {
            plates.push((mark, is_chosen));
            continue;
        }
        // What is dealt with is told by its height, not by colour alone.
        let row = rows.bounds(mark.place, axis.span);
        let (height, color) =
            if mark.state == SnagState::Open { (row.height() - 4.0, look.snag) } else { (5.0, look.faint) };
        let stroke = Rect::from_center_size(pos2(mark.x, row.center().y), vec2(2.0, height));
        strokes.add_colored_rect(stroke, color);
    }
    painter.add(egui::Shape::mesh(strokes));
    for (mark, is_chosen) in plates {
        let row = rows.bounds(mark.place, axis.span);
        let middle = pos2(mark.x, row.center().y);
        if mark.span.span() > MARK {
            let color = if mark.state == SnagState::Open { look.snag } else { look.faint };
            let left = mark.span.min.max(axis.span.min);
            painter.hline(left..=mark.span.max.min(axis.span.max), row.bottom() - 2.5, (2.0, color));
        }
        let size = MARK.min(rows.height - 2.0);
        letter_plate(&painter, look, middle, size, mark.letter, mark.state);
        if is_chosen {
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

/// What the pointer is on: the joint, and what is told about it there.
fn hover_lines(
    pointer: egui::Pos2,
    axis: &TimeAxis,
    clip: &Clip,
    rows: &Rows<'_>,
    scope: &Scope<'_>,
) -> Option<(usize, Vec<(String, Color32)>)> {
    let place = rows.at(pointer.y)?;
    let look = scope.look;
    let row = &rows.visible[place];
    let time = axis.time(pointer.x).clamp(0.0, clip.duration_secs);
    let frame = clip.grid.frame(time);
    let at = clip.grid.time(frame);
    // Of a folded limb the hottest joint is told.
    let joint = row.hottest(rows.heat, &(frame..frame + 1));
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
        HeatKind::LimitUse => match &rows.heat.limits {
            Some((limits, _)) if limits.get(joint).is_some() => {
                let own = rows.heat.joints.iter().position(|&own| own == joint).unwrap_or(0);
                format!("{:.0} % of its limit", rows.heat.value(own, frame))
            }
            _ => "no limit".to_owned(),
        },
    };
    let mut name = clip.skeleton.label(joint).to_owned();
    if row.members.len() > 1 {
        name = format!("{name} (hottest of {})", row.members.len());
    }
    let mut lines =
        vec![(name, look.text), (format!("{}  frame {frame}", seconds(at)), look.faint), (value, look.text)];
    if let Some(index) = mark_at(pointer, axis, rows, scope) {
        let (snag, state) = (&scope.bench.snags()[index], scope.states[index]);
        let words = format!("{} {}, {}", snag.kind.letter(), snag.kind, state.word());
        lines.push((words, if state == SnagState::Open { look.error } else { look.faint }));
    }
    Some((joint, lines))
}

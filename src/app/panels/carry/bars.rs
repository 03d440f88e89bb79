//! Contacts as bars over time: drag a bar to move it, its ends to make it longer or shorter.

use egui::{
    Align2, CursorIcon, FontId, Key, Rangef, Rect, Role, Sense, Stroke, StrokeKind, Ui, WidgetInfo, pos2,
    vec2,
};
use glam::DVec3;

use super::super::super::commands::{CarryCommand, Command};
use super::super::super::theme::{GUTTER_WIDTH, INSET, STRIP_HEIGHT, TIME_MARGIN};
use super::super::super::view_models::{
    BarMark, CarryBar, Lane, carry_bars, with_bar, with_bar_at, with_hold, without_bar,
};
use super::super::super::widgets::{TimeAxis, focus_ring, playhead, scrub_and_zoom, strip, vertical_grid};
use super::super::Scope;
use super::{Sheet, change};
use crate::retarget::HoldAt;
use crate::scene::RetargetPass;

/// Height of a lane, points.
const LANE: f32 = 17.0;
/// Height of the whole, its strip included.
pub(super) const HEIGHT: f32 = STRIP_HEIGHT + 6.0 * LANE + 12.0;
/// So near the end of a bar its end is meant and not the bar, points.
const END: f32 = 6.0;
/// A new contact lasts so long before and after the playhead, seconds.
const NEW_SECS: f64 = 0.2;

/// Which part of a bar is dragged.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Grip {
    First,
    Whole,
    Last,
}

/// A drag in progress.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Drag {
    mark: BarMark,
    grip: Grip,
    from_secs: [f64; 2],
    at_secs: f64,
}

pub(super) fn bars_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let found = sheet.facts.map_or(&[][..], |facts| facts.found.as_slice());
    let bars = carry_bars(sheet.pass.1, found);
    let chosen = sheet.habits.bar.and_then(|mark| bars.iter().find(|bar| bar.mark == mark));
    let title = if sheet.pass.1.plant_feet || !sheet.pass.1.hands.is_empty() {
        "Contacts"
    } else {
        "Contacts (feet are not held)"
    };
    strip(ui, title, |ui| strip_ui(ui, sheet, scope, chosen));
    let Some(clip) = scope.bench.carry.as_ref().map(|work| work.key.clip.clone()) else { return };
    let area = ui.available_rect_before_wrap();
    let rows = Rect::from_min_max(area.min + vec2(0.0, 3.0), area.max);
    let axis = TimeAxis {
        span: Rangef::new(area.left() + GUTTER_WIDTH, area.right() - TIME_MARGIN),
        window: scope.bench.session.window,
    };
    let chart = Rect::from_min_max(pos2(axis.span.min, rows.top()), pos2(axis.span.max, rows.bottom()));
    let back = ui.interact(chart, ui.scope_id().with("carry chart"), Sense::click_and_drag());
    back.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Contacts over time"));
    scrub_and_zoom(ui, &back, chart, &axis, &clip, true, scope.out);
    vertical_grid(ui.painter(), &axis, &clip, rows.y_range(), scope.look.grid);
    for (place, lane) in Lane::ALL.into_iter().enumerate() {
        let top = rows.top() + place as f32 * LANE;
        lane_ui(
            ui,
            lane,
            Rect::from_min_size(pos2(area.left(), top), vec2(area.width(), LANE)),
            sheet,
            scope,
        );
    }
    let painter = ui.painter().with_clip_rect(chart);
    for bar in &bars {
        let place = Lane::ALL.iter().position(|lane| *lane == bar.mark.lane).unwrap_or(0);
        let top = rows.top() + place as f32 * LANE;
        let [x, end] = bar.span_secs.map(|secs| axis.x(secs));
        let bounds = Rect::from_min_max(pos2(x, top + 2.5), pos2(end.max(x + 3.0), top + LANE - 2.5));
        if bounds.right() < chart.left() || bounds.left() > chart.right() {
            continue;
        }
        bar_ui(
            ui,
            &painter,
            bar,
            bounds.intersect(chart.expand2(vec2(0.0, 4.0))),
            &axis,
            &clip.grid,
            sheet,
            scope,
        );
    }
    playhead(ui.painter(), &scope.look, &axis, scope.bench.session.playback.playhead_secs, rows.y_range());
}

/// The name of a lane: a click makes it the one that a new contact goes to.
fn lane_ui(ui: &mut Ui, lane: Lane, bounds: Rect, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let look = scope.look;
    let is_chosen = chosen_lane(sheet) == lane;
    let name = Rect::from_min_max(bounds.min, pos2(bounds.left() + GUTTER_WIDTH - 6.0, bounds.bottom()));
    let words = lane.words();
    let response = ui.interact(name, ui.scope_id().with(("carry lane", &words)), Sense::click());
    response
        .widget_info(|| WidgetInfo::selected(Role::RadioButton, true, is_chosen, format!("Lane {words}")));
    if response.hovered() {
        ui.painter().rect_filled(name, 3.0, look.hover);
    }
    let ink = if is_chosen { look.text } else { look.faint };
    let at = pos2(bounds.left() + INSET + 10.0, bounds.center().y);
    ui.painter().text(at, Align2::LEFT_CENTER, words, FontId::proportional(12.0), ink);
    if is_chosen {
        ui.painter().circle_filled(pos2(bounds.left() + INSET + 3.0, bounds.center().y), 2.5, look.selection);
    }
    ui.painter().hline(bounds.x_range(), bounds.bottom(), (1.0, look.grid));
    focus_ring(ui, &response);
    if response.on_hover_text("New contacts go here").clicked() {
        scope.out.push(Command::Carry(CarryCommand::ChooseLane(lane)));
    }
}

fn chosen_lane(sheet: &Sheet<'_>) -> Lane {
    sheet.habits.lane.or(sheet.habits.bar.map(|mark| mark.lane)).unwrap_or(Lane::ALL[0])
}

#[expect(clippy::too_many_arguments, reason = "one bar, told where it is")]
fn bar_ui(
    ui: &mut Ui,
    painter: &egui::Painter,
    bar: &CarryBar,
    bounds: Rect,
    axis: &TimeAxis,
    grid: &crate::clip::FrameGrid,
    sheet: &Sheet<'_>,
    scope: &mut Scope<'_>,
) {
    let look = scope.look;
    let id = ui.scope_id().with(("carry bar", bar.mark.lane.words(), bar.mark.index));
    let response = ui.interact(bounds.expand2(vec2(2.0, 1.0)), id, Sense::click_and_drag());
    let is_chosen = sheet.habits.bar == Some(bar.mark);
    response.widget_info(|| WidgetInfo::selected(Role::Button, true, is_chosen, bar.sentence()));
    let fill = if bar.is_found { look.after.gamma_multiply(0.28) } else { look.after.gamma_multiply(0.75) };
    let is_held = sheet.pass.1.plant_feet || matches!(bar.mark.lane, Lane::Hand(_));
    painter.rect_filled(bounds, 3.0, if is_held { fill } else { look.faint.gamma_multiply(0.25) });
    // What was found has an outline only; what was said is full.
    let edge = if is_chosen { Stroke::new(2.0, look.selection) } else { Stroke::new(1.0, look.after) };
    painter.rect_stroke(bounds, 3.0, edge, StrokeKind::Inside);
    if let Some(at) = bar.at {
        let letter = match at {
            HoldAt::Still => "still",
            HoldAt::Place(_) => "at a point",
            HoldAt::OtherHand => "other hand",
        };
        let font = FontId::proportional(10.5);
        let clipped = painter.with_clip_rect(bounds.intersect(painter.clip_rect()));
        // Dark on the full bar, in either window.
        let ink = if ui.visuals().dark_mode { look.background } else { look.text };
        clipped.text(bounds.left_center() + vec2(4.0, 0.0), Align2::LEFT_CENTER, letter, font, ink);
    }
    focus_ring(ui, &response);
    let found = sheet.facts.map_or(&[][..], |facts| facts.found.as_slice());
    let on_frame = |secs: f64| grid.time(grid.frame(secs));
    let grip_at = |x: f32| {
        if x < bounds.left() + END && bounds.width() > 3.0 * END {
            Grip::First
        } else if x > bounds.right() - END && bounds.width() > 3.0 * END {
            Grip::Last
        } else {
            Grip::Whole
        }
    };
    if let Some(pointer) = response.hover_pos() {
        let icon =
            if grip_at(pointer.x) == Grip::Whole { CursorIcon::Grab } else { CursorIcon::ResizeHorizontal };
        ui.ctx().set_cursor_icon(icon);
    }
    if response.clicked() || response.drag_started() {
        scope.out.push(Command::Carry(CarryCommand::ChooseBar(Some(bar.mark))));
    }
    let drag_id = id.with("drag");
    if response.drag_started()
        && let Some(origin) = ui.input(|input| input.pointer.press_origin())
    {
        let drag = Drag {
            mark: bar.mark,
            grip: grip_at(origin.x),
            from_secs: bar.span_secs,
            at_secs: axis.time(origin.x),
        };
        ui.data_mut(|data| data.insert_temp(drag_id, drag));
    }
    let drag: Option<Drag> = ui.data(|data| data.get_temp(drag_id));
    if let (Some(drag), Some(pointer)) = (drag, response.interact_pointer_pos()) {
        let by = axis.time(pointer.x) - drag.at_secs;
        let [first, last] = drag.from_secs;
        let span = match drag.grip {
            Grip::First => [on_frame((first + by).min(last)), last],
            Grip::Last => [first, on_frame((last + by).max(first))],
            Grip::Whole => {
                let start = on_frame((first + by).max(0.0));
                [start, on_frame(start + last - first)]
            }
        };
        if let Some(pass) = with_bar_at(sheet.pass.1, found, drag.mark, span) {
            if response.drag_stopped() {
                change(scope, sheet, pass);
            } else if response.dragged() {
                scope.out.push(Command::Carry(CarryCommand::Preview(sheet.pass.0, Box::new(pass))));
            }
        }
    }
    if response.drag_stopped() {
        ui.data_mut(|data| data.remove::<Drag>(drag_id));
    }
    keys(ui, &response, bar, grid, found, sheet, scope);
    response.on_hover_text(format!(
        "{}. Arrows move it by a frame, with Shift its end; Delete takes it away",
        bar.sentence()
    ));
}

/// A bar that has the keyboard moves by frames.
fn keys(
    ui: &Ui,
    response: &egui::Response,
    bar: &CarryBar,
    grid: &crate::clip::FrameGrid,
    found: &[crate::retarget::FootContact],
    sheet: &Sheet<'_>,
    scope: &mut Scope<'_>,
) {
    if !response.has_focus() {
        return;
    }
    ui.memory_mut(|memory| {
        let filter = egui::EventFilter { horizontal_arrows: true, ..egui::EventFilter::default() };
        memory.set_focus_lock_filter(response.id, filter);
    });
    let (step, shift, delete) = ui.input(|input| {
        let step =
            i32::from(input.key_pressed(Key::ArrowRight)) - i32::from(input.key_pressed(Key::ArrowLeft));
        (step, input.modifiers.shift, input.key_pressed(Key::Delete) && input.modifiers.is_none())
    });
    if delete {
        scope.out.push(Command::Carry(CarryCommand::ChooseBar(None)));
        change(scope, sheet, without_bar(sheet.pass.1, found, bar.mark));
    } else if step != 0 {
        let last_frame = grid.count().saturating_sub(1);
        let moved =
            |secs: f64| grid.time(grid.frame(secs).saturating_add_signed(step as isize).min(last_frame));
        let [first, last] = bar.span_secs;
        let span = if shift { [first, moved(last).max(first)] } else { [moved(first), moved(last)] };
        if let Some(pass) = with_bar_at(sheet.pass.1, found, bar.mark, span) {
            scope.out.push(Command::Carry(CarryCommand::ChooseBar(Some(bar.mark))));
            change(scope, sheet, pass);
        }
    }
}

/// Buttons in the strip: new, away, where a hand is held, as found. From right to left.
fn strip_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>, chosen: Option<&CarryBar>) {
    let found = sheet.facts.map_or(&[][..], |facts| facts.found.as_slice());
    let pass = sheet.pass.1;
    ui.spacing_mut().button_padding = vec2(8.0, 2.0);
    ui.spacing_mut().item_spacing.x = 5.0;
    let as_found = ui.add_enabled(pass.feet.is_some(), egui::Button::new("Feet as found"));
    if as_found.on_hover_text("Forget what was said of feet: the clip is asked again").clicked() {
        scope.out.push(Command::Carry(CarryCommand::ChooseBar(None)));
        change(scope, sheet, RetargetPass { feet: None, ..pass.clone() });
    }
    let away = ui.add_enabled(chosen.is_some(), egui::Button::new("Take away"));
    if let (true, Some(bar)) = (away.on_hover_text("Take the chosen contact away").clicked(), chosen) {
        scope.out.push(Command::Carry(CarryCommand::ChooseBar(None)));
        change(scope, sheet, without_bar(pass, found, bar.mark));
    }
    let lane = chosen_lane(sheet);
    let words = format!("New: {}", lane.words());
    let missing = sheet.facts.and_then(|facts| facts.missing_for(lane));
    let new = ui.add_enabled(sheet.facts.is_some() && missing.is_none(), egui::Button::new(&words));
    let new = new.on_hover_text("A contact around the playhead in the chosen lane");
    let new = match &missing {
        Some(missing) => new.on_disabled_hover_text(missing.as_str()),
        None => new,
    };
    if new.clicked() {
        let at = scope.bench.session.playback.playhead_secs;
        let end = scope.bench.carry.as_ref().map_or(at, |work| work.key.clip.duration_secs);
        let (changed, mark) =
            with_bar(pass, found, lane, [(at - NEW_SECS).max(0.0), (at + NEW_SECS).min(end)]);
        change(scope, sheet, changed);
        scope.out.push(Command::Carry(CarryCommand::ChooseBar(Some(mark))));
    }
    let Some(bar) = chosen.filter(|bar| bar.at.is_some()) else { return };
    hold_ui(ui, bar, sheet, scope);
}

/// Where the chosen hand is held.
fn hold_ui(ui: &mut Ui, bar: &CarryBar, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let pass = sheet.pass.1;
    let mut set = |at: HoldAt| change(scope, sheet, with_hold(pass, bar.mark, at));
    if let Some(HoldAt::Place(place)) = bar.at {
        // From right to left: z, y, x.
        for axis in [2, 1, 0] {
            if let Some(own) = number_ui(ui, place[axis], ["x", "y", "z"][axis]) {
                let mut place = place;
                place[axis] = own;
                set(HoldAt::Place(place));
            }
        }
    }
    let options = [
        ("at the other hand", HoldAt::OtherHand),
        ("at a point", HoldAt::Place(DVec3::ZERO)),
        ("still", HoldAt::Still),
    ];
    for (words, at) in options {
        let is_on = bar.at.is_some_and(|own| std::mem::discriminant(&own) == std::mem::discriminant(&at));
        let response = ui.selectable_label(is_on, words);
        response
            .widget_info(|| WidgetInfo::selected(Role::RadioButton, true, is_on, format!("Hold {words}")));
        if response.clicked() && !is_on {
            scope.out.push(Command::Carry(CarryCommand::Hold(bar.mark, at)));
        }
    }
}

/// A number to type; given once it is done.
fn number_ui(ui: &mut Ui, value: f64, name: &'static str) -> Option<f64> {
    let mut value = value;
    let drag = egui::DragValue::new(&mut value).speed(0.0).max_decimals(4).prefix(format!("{name} "));
    let response = ui.add(drag.update_while_editing(false));
    response.widget_info(|| WidgetInfo::labeled(Role::SpinButton, true, format!("Hand at {name}")));
    response.changed().then_some(value)
}

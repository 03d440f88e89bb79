//! The areas of the window: left is space, right is time. The lines between them can be moved.

use egui::{CursorIcon, Key, Rect, RichText, Role, Sense, Ui, UiBuilder, WidgetInfo, vec2};

use super::super::commands::{Command, SettingsCommand};
use super::super::settings::{Divider, Hint, Layout};
use super::{Scope, blend_lane, carry, curves, joint_sheet, passes, skeleton, snags, turn_map};

/// The whole bench.
pub(crate) fn bench_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    if scope.bench.session.carry.is_open {
        carry::carry_ui(ui, scope);
        return;
    }
    let bounds = ui.available_rect_before_wrap();
    let layout = scope.settings.layout;
    let has_lane = scope.now.has_blend && scope.now.shows_blend_lane;
    let areas = if has_lane { layout.areas_with_lane(bounds) } else { layout.areas(bounds) };
    area(ui, areas.skeleton, Hint::Skeleton, scope, skeleton::skeleton_ui);
    area(ui, areas.joint_sheet, Hint::JointSheet, scope, joint_sheet::joint_sheet_ui);
    area(ui, areas.map, Hint::TurnMap, scope, turn_map::turn_map_ui);
    if has_lane {
        part(ui, areas.lane, "blend lane", scope, blend_lane::blend_lane_ui);
    }
    area(ui, areas.curves, Hint::Curves, scope, curves::curves_ui);
    area(ui, areas.snags, Hint::Snags, scope, snags::snags_ui);
    area(ui, areas.passes, Hint::Passes, scope, passes::passes_ui);
    for divider in Divider::ALL.into_iter().filter(|&divider| has_lane || divider != Divider::Lane) {
        divider_ui(ui, bounds, &layout, Layout::line(&areas, divider), divider, scope);
    }
    ui.advance_cursor_after_rect(bounds);
}

/// One area inside exactly the room there is: content that is too wide is cut and can't push its area wider.
fn area<'s>(
    ui: &mut Ui,
    bounds: Rect,
    hint: Hint,
    scope: &mut Scope<'s>,
    content: impl FnOnce(&mut Ui, &mut Scope<'s>),
) {
    let mut bounds = bounds;
    if !scope.settings.hints_read.contains(&hint) && bounds.height() > 3.0 * HINT_HEIGHT {
        let words = Rect::from_min_max(bounds.left_bottom() - vec2(0.0, HINT_HEIGHT), bounds.max);
        bounds.max.y = words.top();
        hint_ui(ui, words, hint, scope);
    }
    part(ui, bounds, hint.area(), scope, content);
}

/// Lays out exactly inside `bounds`.
fn part<'s>(
    ui: &mut Ui,
    bounds: Rect,
    name: &str,
    scope: &mut Scope<'s>,
    content: impl FnOnce(&mut Ui, &mut Scope<'s>),
) {
    let mut child = ui.new_child(UiBuilder::new().max_rect(bounds).id_salt(name));
    child.shrink_clip_rect(bounds);
    content(&mut child, scope);
}

const HINT_HEIGHT: f32 = 40.0;

/// What to know first of an area, and the button that puts it away.
fn hint_ui(ui: &mut Ui, bounds: Rect, hint: Hint, scope: &mut Scope<'_>) {
    let look = scope.look;
    ui.painter().rect_filled(bounds, 0.0, look.chosen);
    ui.painter().hline(bounds.x_range(), bounds.top(), (1.0, look.line));
    let layout = egui::Layout::right_to_left(egui::Align::Center);
    let inner = bounds.shrink2(vec2(8.0, 2.0));
    let mut child =
        ui.new_child(UiBuilder::new().max_rect(inner).layout(layout).id_salt(("hint", hint.area())));
    child.shrink_clip_rect(bounds);
    let response = child.button("Got it");
    response
        .widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("Got it: hint of {}", hint.area())));
    if response.clicked() {
        scope.out.push(Command::Settings(SettingsCommand::ReadHint(hint)));
    }
    let words = RichText::new(hint.words()).size(12.5).color(look.text);
    let room = child.available_size();
    child.allocate_ui_with_layout(room, egui::Layout::left_to_right(egui::Align::Center), |ui| {
        ui.add(egui::Label::new(words).wrap()).on_hover_text(hint.words());
    });
}

/// The hint of the bar along the bottom, above it.
pub(crate) fn transport_hint_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    if scope.settings.hints_read.contains(&Hint::Transport) || ui.available_height() < 300.0 {
        return;
    }
    egui::Panel::bottom("transport hint").frame(egui::Frame::NONE).exact_size(HINT_HEIGHT - 8.0).show(
        ui,
        |ui| {
            let bounds = ui.available_rect_before_wrap();
            hint_ui(ui, bounds, Hint::Transport, scope);
        },
    );
}

/// How far an arrow key moves a divider, points.
const STEP: f32 = 16.0;

/// A line between two areas: dragged, moved with the arrow keys while it has the keyboard, set back with a double click.
fn divider_ui(ui: &Ui, bounds: Rect, layout: &Layout, line: Rect, divider: Divider, scope: &mut Scope<'_>) {
    let look = scope.look;
    let is_upright = divider.is_upright();
    let grip = if is_upright { line.expand2(vec2(3.0, 0.0)) } else { line.expand2(vec2(0.0, 3.0)) };
    let response =
        ui.interact(grip, ui.scope_id().with(("divider", divider.label())), Sense::click_and_drag());
    let size = layout.size_of(divider, bounds.size());
    response.widget_info(|| WidgetInfo::slider(true, f64::from(size), divider.label()));
    let (lesser, greater) =
        if is_upright { (Key::ArrowLeft, Key::ArrowRight) } else { (Key::ArrowUp, Key::ArrowDown) };
    if response.has_focus() {
        let filter = egui::EventFilter {
            horizontal_arrows: is_upright,
            vertical_arrows: !is_upright,
            ..egui::EventFilter::default()
        };
        ui.memory_mut(|memory| memory.set_focus_lock_filter(response.id, filter));
        let steps = ui.input_mut(|input| {
            let plain = egui::Modifiers::NONE;
            input.count_and_consume_key(plain, greater) as f32
                - input.count_and_consume_key(plain, lesser) as f32
        });
        if steps != 0.0 {
            let by = vec2(STEP, STEP) * steps;
            let share = layout.share_at(bounds, divider, line.center() + by);
            scope.out.push(Command::Settings(SettingsCommand::Divide(divider, Some(share))));
        }
    }
    if response.double_clicked() {
        scope.out.push(Command::Settings(SettingsCommand::Divide(divider, None)));
    } else if let Some(pointer) = response.interact_pointer_pos().filter(|_| response.dragged()) {
        let share = layout.share_at(bounds, divider, pointer);
        scope.out.push(Command::Settings(SettingsCommand::Divide(divider, Some(share))));
    }
    let is_held = response.hovered() || response.dragged() || response.has_focus();
    let stroke = if is_held { (2.0, look.text) } else { (1.0, look.line) };
    if is_upright {
        ui.painter().vline(line.center().x, line.y_range(), stroke);
    } else {
        ui.painter().hline(line.x_range(), line.center().y, stroke);
    }
    let icon = if is_upright { CursorIcon::ResizeHorizontal } else { CursorIcon::ResizeVertical };
    response.on_hover_cursor(icon);
}

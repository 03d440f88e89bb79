//! Buttons that take their words, tooltips, keys and availability from the command table.

use egui::{Response, Role, Sense, Ui, WidgetInfo, vec2};

use super::super::commands::{Action, Command, Situation};
use super::super::settings::Keymap;
use super::super::theme::Look;
use super::icon::{ICON_SIZE, Icon, paint_icon};

/// What a tooltip says about an action: its sentence and its keys.
pub(crate) fn tooltip_text(ui: &Ui, action: Action) -> String {
    let entry = action.entry();
    match Keymap::of(ui.ctx()).keys_of(action) {
        Some(shortcut) => format!("{} ({})", entry.tooltip, ui.ctx().format_shortcut(&shortcut)),
        None => entry.tooltip.to_owned(),
    }
}

/// A button with the action's words.
pub(crate) fn action_button(
    ui: &mut Ui,
    action: Action,
    now: &Situation,
    out: &mut Vec<Command>,
) -> Response {
    let entry = action.entry();
    let label = match entry.is_on {
        Some(is_on) if is_on(now) => on_words(action),
        _ => entry.label,
    };
    let tooltip = tooltip_text(ui, action);
    let enabled = (entry.is_available)(now);
    let response = ui.add_enabled(enabled, egui::Button::new(label));
    let response = response.on_hover_text(&tooltip).on_disabled_hover_text(&tooltip);
    if response.clicked() {
        out.push(Command::Do(action));
    }
    response
}

/// The words of a switch while it is on, where other words are clearer.
fn on_words(action: Action) -> &'static str {
    match action {
        Action::Leave => "Look at again",
        other => other.entry().label,
    }
}

/// The same, larger: for the few places where it is the one thing to do.
pub(crate) fn wide_action_button(
    ui: &mut Ui,
    action: Action,
    now: &Situation,
    out: &mut Vec<Command>,
) -> Response {
    ui.scope(|ui| {
        ui.spacing_mut().button_padding = vec2(16.0, 7.0);
        action_button(ui, action, now, out)
    })
    .inner
}

/// A button with an icon. Its accessible label is the action's words.
pub(crate) fn icon_button(
    ui: &mut Ui,
    icon: Icon,
    action: Action,
    now: &Situation,
    out: &mut Vec<Command>,
) -> Response {
    let entry = action.entry();
    let enabled = (entry.is_available)(now);
    let is_on = entry.is_on.is_some_and(|is_on| is_on(now));
    let size = ICON_SIZE + vec2(12.0, 8.0);
    let sense = if enabled { Sense::click() } else { Sense::hover() };
    let (bounds, response) = ui.allocate_exact_size(size, sense);
    response.widget_info(|| match entry.is_on {
        Some(_) => WidgetInfo::selected(Role::Button, enabled, is_on, entry.label),
        None => WidgetInfo::labeled(Role::Button, enabled, entry.label),
    });
    if ui.is_rect_visible(bounds) {
        let look = Look::of(ui);
        let visuals = ui.style().interact(&response);
        if enabled && (response.hovered() || response.has_focus()) {
            ui.painter().rect_filled(bounds, 4.0, visuals.weak_bg_fill);
        } else if is_on && action != Action::Play {
            ui.painter().rect_filled(bounds, 4.0, look.chosen);
        }
        let color = if enabled { look.text } else { look.axis };
        paint_icon(ui.painter(), bounds, icon, color);
        if is_on && action != Action::Play {
            // A mark besides the lighter ground.
            let bottom = bounds.center_bottom() - vec2(0.0, 1.0);
            ui.painter().hline(bottom.x - 6.0..=bottom.x + 6.0, bottom.y, (1.5, look.selection));
        }
    }
    let tooltip = format!("{}: {}", entry.label, tooltip_text(ui, action));
    let response = response.on_hover_text(tooltip);
    if response.clicked() && enabled {
        out.push(Command::Do(action));
    }
    response
}

/// Several words of which one is chosen, side by side from the right end of a strip, the first at the left; where they find no room, a list
/// to choose from.
pub(crate) fn segments(
    ui: &mut Ui,
    what: &str,
    choices: &[(&str, Action)],
    now: &Situation,
    out: &mut Vec<Command>,
) {
    let font = egui::TextStyle::Button.resolve(ui.style());
    let width = |words: &str| {
        let galley = ui.painter().layout_no_wrap(words.to_owned(), font.clone(), egui::Color32::WHITE);
        galley.size().x + 12.0 + ui.spacing().item_spacing.x
    };
    if choices.iter().map(|(words, _)| width(words)).sum::<f32>() <= ui.available_width() {
        for (words, action) in choices.iter().rev() {
            segment(ui, words, *action, now, out);
        }
        return;
    }
    let is_on = |action: Action| action.entry().is_on.is_some_and(|is_on| is_on(now));
    let chosen = choices.iter().find(|(_, action)| is_on(*action)).map_or("", |(words, _)| words);
    // Its arrow and its edges take the rest.
    let room = (ui.available_width() - 8.0).max(20.0);
    let own = (width(chosen) + 22.0).min(room);
    let combo = egui::ComboBox::from_id_salt(what).selected_text(chosen).width(own).truncate();
    let response = combo.show_ui(ui, |ui| {
        for (words, action) in choices {
            let response = ui.selectable_label(is_on(*action), *words);
            let label = action.entry().label;
            response.widget_info(|| WidgetInfo::selected(Role::RadioButton, true, is_on(*action), label));
            if response.on_hover_text(tooltip_text(ui, *action)).clicked() {
                out.push(Command::Do(*action));
            }
        }
    });
    response.response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, what));
}

/// One of several words of which one is chosen, underlined.
pub(crate) fn segment(ui: &mut Ui, words: &str, action: Action, now: &Situation, out: &mut Vec<Command>) {
    let entry = action.entry();
    let is_on = entry.is_on.is_some_and(|is_on| is_on(now));
    let look = Look::of(ui);
    let font = egui::TextStyle::Button.resolve(ui.style());
    let color = if is_on { look.text } else { look.faint };
    let galley = ui.painter().layout_no_wrap(words.to_owned(), font, color);
    let (bounds, response) = ui.allocate_exact_size(galley.size() + vec2(12.0, 6.0), Sense::click());
    response.widget_info(|| WidgetInfo::selected(Role::RadioButton, true, is_on, entry.label));
    if response.hovered() || response.has_focus() {
        ui.painter().rect_filled(bounds, 4.0, look.hover);
    }
    ui.painter().galley(bounds.center() - galley.size() / 2.0, galley, color);
    super::focus_ring(ui, &response);
    if is_on {
        let bottom = bounds.bottom() - 1.0;
        ui.painter().hline(bounds.left() + 6.0..=bounds.right() - 6.0, bottom, (1.5, look.selection));
    }
    let tooltip = tooltip_text(ui, action);
    if response.on_hover_text(tooltip).clicked() {
        out.push(Command::Do(action));
    }
}

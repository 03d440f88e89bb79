//! All actions and their keys, and changing them.

use egui::{
    FontId, Key, KeyboardShortcut, Rect, RichText, Role, ScrollArea, Sense, TextEdit, Ui, WidgetInfo, vec2,
};

use super::super::super::commands::{
    Action, Command, Entry, HOLD_FOR_SOURCE, MORE_KEYS, Menu, SettingsCommand, TABLE,
};
use super::super::super::settings::{Conflict, Keymap};
use super::super::super::widgets::{Icon, focus_ring, paint_icon};
use super::super::Scope;
use super::form::Form;
use super::sheet::heading;

/// Width of the buttons with keys: two of them side by side find room.
const KEYS: f32 = 164.0;

/// The list by menu; keys are changed by clicking them and pressing others.
pub(super) fn shortcuts_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Shortcuts");
    take_keys(ui, form, scope);
    let label = ui.label(RichText::new("Look for").size(12.5).color(scope.look.faint));
    ui.add(
        TextEdit::singleline(&mut form.search)
            .desired_width(f32::INFINITY)
            .hint_text("an action or its keys"),
    )
    .labelled_by(label.id);
    capture_ui(ui, form, scope);
    let map = Keymap::of(ui.ctx());
    let wanted = form.search.to_lowercase();
    let height = (ui.available_height() - 44.0).clamp(80.0, 390.0);
    ScrollArea::vertical().max_height(height).auto_shrink(false).show(ui, |ui| {
        for menu in Menu::ALL {
            let fits = |words: &str| words.to_lowercase().contains(&wanted);
            let keys_fit =
                |action| map.keys_of(action).is_some_and(|keys| fits(&ui.ctx().format_shortcut(&keys)));
            let entries: Vec<_> = TABLE
                .iter()
                .filter(|entry| entry.menu == menu)
                .filter(|entry| fits(entry.label) || fits(entry.tooltip) || keys_fit(entry.action))
                .collect();
            if entries.is_empty() {
                continue;
            }
            ui.add_space(6.0);
            ui.label(RichText::new(menu.title()).size(15.0).color(scope.look.text));
            for entry in entries {
                entry_row(ui, entry, &map, form, scope);
            }
            if menu == Menu::View && fits("source alone hold") {
                let keys = format!("hold {}", ui.ctx().format_shortcut(&HOLD_FOR_SOURCE));
                let more = "The source in place of the result while held";
                key_row(ui, scope, "Source for a moment", &keys, more);
            }
        }
        ui.add_space(6.0);
        ui.label(RichText::new("Pointer").size(15.0).color(scope.look.text));
        for (what, how, more) in [
            ("Scrub", "drag", "across the turn map, the curves or the bar at the bottom"),
            ("Zoom time", "wheel", "over curves and ruler; with Ctrl over the turn map"),
            ("Pan time", "middle drag", "or Shift and drag, over curves and map"),
            ("Circle the figure", "drag", "in the skeleton view"),
            ("Move the view", "middle drag", "or Shift and drag, in the skeleton view"),
            ("Nearer and farther", "wheel", "in the skeleton view"),
            (
                "Size of an area",
                "drag",
                "the line beside it; double click: as usual; arrows while it has the keyboard",
            ),
        ] {
            key_row(ui, scope, what, how, more);
        }
    });
    ui.add_space(4.0);
    let layout = egui::Layout::right_to_left(egui::Align::Center);
    ui.allocate_ui_with_layout(vec2(ui.available_width(), 28.0), layout, |ui| {
        ui.spacing_mut().button_padding = vec2(14.0, 5.0);
        if ui.button("Close").clicked() {
            scope.out.push(Command::CloseDialog);
        }
        let is_changed = !scope.settings.keys.is_empty();
        if ui.add_enabled(is_changed, egui::Button::new("Usual keys for all")).clicked() {
            scope.out.push(Command::Settings(SettingsCommand::UsualKeys));
            form.conflict = None;
        }
    });
}

/// The keys that are pressed while new ones are waited for. Nothing else gets them.
fn take_keys(ui: &Ui, form: &mut Form, scope: &mut Scope<'_>) {
    let Some(action) = form.capturing else { return };
    let pressed = ui.input_mut(|input| {
        let found = input.events.iter().find_map(|event| match event {
            egui::Event::Key { key, pressed: true, modifiers, .. } => Some((*key, *modifiers)),
            // What the desktop's own keys were turned into before they came here.
            egui::Event::Copy => Some((Key::C, egui::Modifiers::COMMAND)),
            egui::Event::Cut => Some((Key::X, egui::Modifiers::COMMAND)),
            egui::Event::Paste(_) => Some((Key::V, egui::Modifiers::COMMAND)),
            _ => None,
        });
        if found.is_some() {
            input.events.clear();
        }
        found
    });
    let Some((key, held)) = pressed else { return };
    form.capturing = None;
    if key == Key::Escape && held.is_none() {
        return;
    }
    let mut modifiers = egui::Modifiers::NONE;
    for (is_held, modifier) in [
        (held.command || held.ctrl, egui::Modifiers::COMMAND),
        (held.alt, egui::Modifiers::ALT),
        (held.shift, egui::Modifiers::SHIFT),
    ] {
        if is_held {
            modifiers |= modifier;
        }
    }
    let keys = KeyboardShortcut::new(modifiers, key);
    match Keymap::of(ui.ctx()).check(action, keys) {
        Ok(()) => {
            form.conflict = None;
            scope.out.push(Command::Settings(SettingsCommand::SetKeys(action, Some(keys))));
        }
        Err(conflict) => form.conflict = Some((action, keys, conflict)),
    }
}

/// What is waited for, or why keys were not taken.
fn capture_ui(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    let look = scope.look;
    if let Some(action) = form.capturing {
        let words = format!("Press the keys for `{}`; Esc leaves them as they are", action.entry().label);
        ui.label(RichText::new(words).color(look.text));
    } else if let Some((action, keys, conflict)) = form.conflict.clone() {
        ui.horizontal_wrapped(|ui| {
            ui.label(RichText::new(conflict.to_string()).color(look.error));
            if let Conflict::Taken { .. } = conflict
                && ui.button(format!("Give them to {}", action.entry().label)).clicked()
            {
                scope.out.push(Command::Settings(SettingsCommand::SetKeys(action, Some(keys))));
                form.conflict = None;
            }
        });
    } else {
        ui.label(
            RichText::new(
                "Click keys to press others; the cross takes them away, the arrow brings the usual ones back",
            )
            .size(12.5)
            .color(look.faint),
        );
    }
}

/// An action, its keys as a button, and buttons to take them away and to have the usual ones.
fn entry_row(ui: &mut Ui, entry: &Entry, map: &Keymap, form: &mut Form, scope: &mut Scope<'_>) {
    let look = scope.look;
    let action = entry.action;
    let own = map.keys_of(action);
    let words = |keys: Option<KeyboardShortcut>| {
        keys.map_or("none".to_owned(), |keys| ui.ctx().format_shortcut(&keys))
    };
    let mut shown = words(own);
    for (keys, _) in MORE_KEYS.iter().filter(|(_, more)| *more == action) {
        if own.is_some() && own == entry.shortcut {
            shown = format!("{shown}, {}", ui.ctx().format_shortcut(keys));
        }
    }
    let usual = words(entry.shortcut);
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 4.0;
        ui.spacing_mut().button_padding = vec2(6.0, 1.0);
        fixed(ui, 182.0, entry.label, look.text);
        let is_waiting = form.capturing == Some(action);
        let label = if is_waiting { "press keys…" } else { &shown };
        let font = RichText::new(label).monospace().size(12.0);
        let button = egui::Button::new(font).min_size(vec2(KEYS, 19.0)).truncate();
        let response = ui.add_sized(vec2(KEYS, 19.0), button);
        response.widget_info(|| {
            WidgetInfo::labeled(Role::Button, true, format!("Keys of {}: {shown}", entry.label))
        });
        if response.clicked() {
            form.capturing = (!is_waiting).then_some(action);
            form.conflict = None;
        }
        // Each has its place, so that the words behind them stand one under the other.
        let (away, back) = (place(ui, 20.0), place(ui, 20.0));
        if own.is_some() {
            small(ui, away, Icon::Close, &format!("No keys for {}", entry.label), (action, None), scope);
        }
        if own != entry.shortcut {
            let label = format!("Usual keys for {}: {usual}", entry.label);
            small(ui, back, Icon::Back, &label, (action, entry.shortcut), scope);
        }
        let room = ui.available_width();
        fixed(ui, room, entry.tooltip, look.faint);
    });
}

/// Room for a small button.
fn place(ui: &mut Ui, width: f32) -> Rect {
    ui.allocate_exact_size(vec2(width, 19.0), Sense::hover()).0
}

fn small(
    ui: &Ui,
    bounds: Rect,
    icon: Icon,
    label: &str,
    (action, keys): (Action, Option<KeyboardShortcut>),
    scope: &mut Scope<'_>,
) {
    let response = ui.interact(bounds, ui.scope_id().with(label), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, label));
    if response.hovered() {
        ui.painter().rect_filled(bounds, 4.0, scope.look.hover);
    }
    let ink = if response.hovered() { scope.look.text } else { scope.look.faint };
    paint_icon(ui.painter(), bounds.shrink(4.0), icon, ink);
    focus_ring(ui, &response);
    if response.on_hover_text(label).clicked() {
        scope.out.push(Command::Settings(SettingsCommand::SetKeys(action, keys)));
    }
}

/// Words in so much room, cut with … where they are too long.
fn fixed(ui: &mut Ui, width: f32, words: &str, ink: egui::Color32) {
    let (bounds, response) = ui.allocate_exact_size(vec2(width.max(10.0), 19.0), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, words));
    let mut job = egui::text::LayoutJob::simple_singleline(words.to_owned(), FontId::proportional(12.5), ink);
    job.wrap = egui::text::TextWrapping::truncate_at_width(bounds.width());
    let galley = ui.painter().layout_job(job);
    let at = egui::pos2(bounds.left(), bounds.center().y - galley.size().y / 2.0);
    ui.painter().galley(at, galley, ink);
    response.on_hover_text(words);
}

fn key_row(ui: &mut Ui, scope: &Scope<'_>, label: &str, keys: &str, tooltip: &str) {
    let look = scope.look;
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 4.0;
        fixed(ui, 182.0, label, look.text);
        fixed(ui, KEYS + 48.0, keys, look.text);
        let room = ui.available_width();
        fixed(ui, room, tooltip, look.faint);
    });
}

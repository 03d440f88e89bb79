//! The menus: every entry of the command table, with its keys beside it.

use egui::{Button, ComboBox, ScrollArea, Ui};

use super::super::bench::file_name;
use super::super::commands::{Action, Command, Entry, Menu, SettingsCommand, Situation, TABLE};
use super::super::settings::Keymap;
use super::super::theme::Look;
use super::super::view_models::counted;
use super::super::widgets::{Icon, paint_icon};
use super::Scope;

/// The height of the bar, points.
const BAR: f32 = 30.0;
/// The margins of a menu, its gap to the bar and a little below it.
const AROUND_MENU: f32 = 26.0;

/// The bar on top: menus on the left, what is open on the right.
pub(crate) fn menus_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let look = scope.look;
    ui.painter().rect_filled(ui.max_rect(), 0.0, look.panel);
    let bar = ui.max_rect();
    egui::MenuBar::new().ui(ui, |ui| {
        ui.add_space(2.0);
        for menu in Menu::ALL {
            ui.menu_button(menu.title(), |ui| {
                ui.set_min_width(250.0);
                // What finds no room below the bar is scrolled to: the menu neither covers the bar nor leaves the window.
                let room = ui.ctx().content_rect().bottom() - bar.top() - BAR - AROUND_MENU;
                let room = room.max(60.0);
                ui.set_max_height(room);
                let mut list = ScrollArea::vertical().id_salt(menu.title()).max_height(room);
                if ui.is_sizing_pass() {
                    // It has just been opened, and begins at its beginning.
                    list = list.vertical_scroll_offset(0.0);
                }
                // That there is more is seen without the pointer on the bar.
                ui.spacing_mut().scroll.dormant_handle_opacity = 0.8;
                list.show(ui, |ui| menu_ui(ui, menu, scope));
            });
        }
        ui.with_layout(egui::Layout::right_to_left(egui::Align::Center), |ui| open_ui(ui, scope));
    });
}

/// The entries of a menu.
fn menu_ui(ui: &mut Ui, menu: Menu, scope: &mut Scope<'_>) {
    let look = scope.look;
    for entry in TABLE.iter().filter(|entry| entry.menu == menu) {
        if entry.starts_group {
            ui.separator();
        }
        entry_ui(ui, entry, scope.now, &look, scope.out);
        if entry.action == Action::OpenDemo {
            recent_ui(ui, scope);
        }
        if entry.action == Action::UsualSize {
            let percent = scope.settings.zoom * 100.0;
            let words = format!("       Now {percent:.0} %");
            ui.label(egui::RichText::new(words).size(12.0).color(look.faint));
        }
    }
}

/// The files that were open lately.
fn recent_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let recent = &scope.settings.recent;
    ui.add_enabled_ui(!recent.is_empty(), |ui| {
        ui.menu_button("       Open recent", |ui| {
            ui.set_min_width(280.0);
            for path in recent {
                let name = file_name(path);
                let folder = path.parent().map(|folder| folder.display().to_string()).unwrap_or_default();
                let response = ui.add(Button::new(&name).truncate()).on_hover_text(folder);
                if response.clicked() {
                    scope.out.push(Command::OpenFiles(vec![path.clone()]));
                    ui.close();
                }
            }
            ui.separator();
            if ui.button("Forget these").clicked() {
                scope.out.push(Command::Settings(SettingsCommand::ForgetRecent));
                ui.close();
            }
        });
    });
}

pub(super) fn entry_ui(ui: &mut Ui, entry: &Entry, now: &Situation, look: &Look, out: &mut Vec<Command>) {
    let label = match (entry.action, &now.undo, &now.redo) {
        (Action::Undo, Some(what), _) => format!("Undo: {what}"),
        (Action::Redo, _, Some(what)) => format!("Redo: {what}"),
        _ => entry.label.to_owned(),
    };
    // Room for the mark of a switch, so that all words begin at one edge.
    let mut button = Button::new(format!("       {label}"));
    if let Some(shortcut) = Keymap::of(ui.ctx()).keys_of(entry.action) {
        button = button.shortcut_text(ui.ctx().format_shortcut(&shortcut));
    }
    let enabled = (entry.is_available)(now);
    let response = ui.add_enabled(enabled, button);
    let is_on = entry.is_on.is_some_and(|is_on| is_on(now));
    response.widget_info(|| match entry.is_on {
        Some(_) => egui::WidgetInfo::selected(egui::Role::MenuItem, enabled, is_on, &label),
        None => egui::WidgetInfo::labeled(egui::Role::MenuItem, enabled, &label),
    });
    if is_on {
        let mark = egui::Rect::from_center_size(
            response.rect.left_center() + egui::vec2(13.0, 0.0),
            egui::vec2(13.0, 13.0),
        );
        paint_icon(ui.painter(), mark, Icon::Check, look.text);
    }
    if response.gained_focus() {
        // Arrow keys go beyond what is in view.
        response.scroll_to_me(None);
    }
    if response.on_hover_text(entry.tooltip).clicked() {
        out.push(Command::Do(entry.action));
        ui.close();
    }
}

/// What is open: the file, the clip, and whether there is unsaved work.
fn open_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let look = scope.look;
    ui.add_space(6.0);
    let Some(project) = &scope.bench.project else {
        return;
    };
    let document = project.document();
    let label = |index: usize| {
        let work = &document.works[index];
        let clip = project.source_clip(index);
        let more = clip.map_or(String::new(), |clip| format!("  ({})", counted(clip.grid.count(), "frame")));
        if document.sources.len() > 1 {
            let file =
                document.sources.get(work.source).map_or(String::new(), |source| file_name(&source.path));
            format!("{file}: {}{more}", work.name)
        } else {
            format!("{}{more}", work.name)
        }
    };
    if document.works.len() > 1 {
        let mut chosen = scope.bench.session.work;
        let combo = ComboBox::from_id_salt("clip").selected_text(label(chosen)).width(180.0).truncate();
        let response = combo
            .show_ui(ui, |ui| {
                for index in 0..document.works.len() {
                    ui.selectable_value(&mut chosen, index, label(index));
                }
            })
            .response;
        response.widget_info(|| egui::WidgetInfo::labeled(egui::Role::ComboBox, true, "Clip on show"));
        if chosen != scope.bench.session.work {
            scope.out.push(Command::ShowClip(chosen));
        }
        ui.label(egui::RichText::new("clip").size(12.0).color(look.faint));
        ui.add_space(8.0);
    }
    let unsaved = project.history.is_unsaved();
    let words = if unsaved { format!("{} · not saved", project.name()) } else { project.name() };
    let response = ui.add(egui::Label::new(egui::RichText::new(words).color(look.text)).truncate());
    let paths: Vec<String> =
        document.sources.iter().map(|source| source.path.display().to_string()).collect();
    response.on_hover_text(paths.join("\n"));
}

//! A marker's name.

use egui::{Key, TextEdit, Ui};

use super::super::super::commands::{Command, TimeCommand};
use super::super::Scope;
use super::form::Form;
use super::sheet::{buttons, heading};

pub(super) fn marker_sheet(ui: &mut Ui, at: usize, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Rename marker");
    let label = ui.label("Name");
    let field = TextEdit::singleline(&mut form.path).desired_width(f32::INFINITY).char_limit(80);
    let response = ui.add(field.margin(egui::Margin::symmetric(6, 5))).labelled_by(label.id);
    if !form.has_focus {
        response.request_focus();
        form.has_focus = true;
    }
    let is_meant = response.lost_focus() && ui.input(|input| input.key_pressed(Key::Enter));
    let name = form.path.trim().to_owned();
    if buttons(ui, "Rename", !name.is_empty(), scope, |_, _| {}) || (is_meant && !name.is_empty()) {
        scope.out.push(Command::Time(TimeCommand::NameMarker(at, name)));
    }
}

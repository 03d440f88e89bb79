//! What all sheets share: the heading, the buttons below, the line that says what was wrong.

use std::path::{Path, PathBuf};

use egui::{Align, Layout, RichText, Ui, vec2};

use super::super::super::commands::Command;
use super::super::super::file_picker::Purpose;
use super::super::super::places::replace_question;
use super::super::Scope;
use super::form::{Form, Replaces};

pub(super) fn heading(ui: &mut Ui, words: &str) {
    ui.heading(words);
    ui.add_space(4.0);
}

/// Buttons at the lower right: the main one outermost. Gives whether it was clicked.
pub(super) fn buttons(
    ui: &mut Ui,
    main: &str,
    enabled: bool,
    scope: &mut Scope<'_>,
    more: impl FnOnce(&mut Ui, &mut Scope<'_>),
) -> bool {
    ui.add_space(6.0);
    let mut clicked = false;
    ui.allocate_ui_with_layout(
        vec2(ui.available_width(), 28.0),
        Layout::right_to_left(Align::Center),
        |ui| {
            ui.spacing_mut().button_padding = vec2(14.0, 5.0);
            let words = RichText::new(main).strong();
            let look = scope.look;
            let button =
                egui::Button::new(words).stroke(egui::Stroke::new(1.0, look.selection.gamma_multiply(0.8)));
            clicked = ui.add_enabled(enabled, button).clicked();
            if ui.button("Cancel").clicked() {
                scope.out.push(Command::CloseDialog);
            }
            more(ui, scope);
        },
    );
    clicked
}

/// The buttons of a sheet that writes a file. Where one of `files` is there already, the question whether it may be replaced comes in their
/// place. Gives the path to write once nothing is to be asked any more; `meant` is one that was meant by pressing Enter.
pub(super) fn buttons_to_write(
    ui: &mut Ui,
    (verb, enabled, browse): (&str, bool, Purpose),
    meant: Option<PathBuf>,
    files: impl FnOnce(&Path) -> Vec<PathBuf>,
    form: &mut Form,
    scope: &mut Scope<'_>,
) -> Option<PathBuf> {
    if let Some(question) = &mut form.replaces {
        let answer = question_ui(ui, question, scope)?;
        let question = form.replaces.take();
        form.has_focus = answer;
        return question.map(|question| question.path).filter(|_| answer);
    }
    let typed = form.path.trim().to_owned();
    let clicked = buttons(ui, verb, enabled && !typed.is_empty(), scope, |ui, scope| {
        if ui.button("Browse…").on_hover_text("The desktop's own file dialog").clicked() {
            scope.out.push(Command::Browse(browse));
        }
    });
    let path = if clicked { PathBuf::from(typed) } else { meant.filter(|_| enabled)? };
    let Some(words) = replace_question(&files(&path)) else { return Some(path) };
    form.replaces = Some(Replaces { path, words, is_new: true });
    None
}

/// What is there already, and whether it may be replaced. The keyboard is on the answer that loses nothing.
fn question_ui(ui: &mut Ui, question: &mut Replaces, scope: &Scope<'_>) -> Option<bool> {
    let mut answer = None;
    ui.add_space(6.0);
    ui.add(egui::Label::new(RichText::new(&question.words).color(scope.look.text)).wrap());
    ui.allocate_ui_with_layout(
        vec2(ui.available_width(), 28.0),
        Layout::right_to_left(Align::Center),
        |ui| {
            ui.spacing_mut().button_padding = vec2(14.0, 5.0);
            if ui.button("Replace").clicked() {
                answer = Some(true);
            }
            let other = ui.button("Choose another name");
            if std::mem::take(&mut question.is_new) {
                other.request_focus();
            }
            if other.clicked() {
                answer = Some(false);
            }
        },
    );
    answer
}

pub(super) fn close_button(ui: &mut Ui, scope: &mut Scope<'_>) {
    ui.add_space(4.0);
    ui.allocate_ui_with_layout(
        vec2(ui.available_width(), 28.0),
        Layout::right_to_left(Align::Center),
        |ui| {
            ui.spacing_mut().button_padding = vec2(14.0, 5.0);
            if ui.button("Close").clicked() {
                scope.out.push(Command::CloseDialog);
            }
        },
    );
}

pub(super) fn error_ui(ui: &mut Ui, form: &Form, scope: &Scope<'_>) {
    if let Some(error) = &form.error {
        ui.add(egui::Label::new(RichText::new(error).color(scope.look.error)).wrap());
    }
}

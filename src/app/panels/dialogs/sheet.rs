//! What all sheets share: the heading, the buttons below, the line that says what was wrong.

use egui::{Align, Layout, RichText, Ui, vec2};

use super::super::super::commands::Command;
use super::super::Scope;
use super::form::Form;

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

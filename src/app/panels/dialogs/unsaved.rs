//! Work that would be lost.

use egui::{RichText, Ui};

use super::super::super::commands::Command;
use super::super::Scope;
use super::sheet::{buttons, heading};

pub(super) fn unsaved_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
    heading(ui, "Save your work?");
    let words = "The passes and decisions of this document are not saved. The clip itself is never changed.";
    ui.add(egui::Label::new(RichText::new(words).color(scope.look.faint)).wrap());
    let save = buttons(ui, "Save", true, scope, |ui, scope| {
        if ui.button("Discard").on_hover_text("Go on without saving").clicked() {
            scope.out.push(Command::DiscardAndGoOn);
        }
    });
    if save {
        scope.out.push(Command::SaveAndGoOn);
    }
}

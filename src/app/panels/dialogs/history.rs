//! All changes since the file was opened.

use egui::{RichText, ScrollArea, Ui};

use super::super::super::commands::Command;
use super::super::Scope;
use super::sheet::{close_button, heading};

pub(super) fn history_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
    heading(ui, "History");
    let Some(project) = &scope.bench.project else { return };
    let (steps, current) = project.history.steps();
    ui.label(RichText::new("Click a step to go there").size(12.5).color(scope.look.faint));
    ScrollArea::vertical().auto_shrink([false, true]).stick_to_bottom(true).show(ui, |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        for (index, step) in steps.iter().enumerate() {
            let ink = if index > current { scope.look.faint } else { scope.look.text };
            let words =
                if index > current { format!("{}  (undone)", step.label) } else { step.label.clone() };
            let response = ui.selectable_label(index == current, RichText::new(words).color(ink));
            if response.clicked() {
                scope.out.push(Command::GoToStep(index));
            }
        }
    });
    close_button(ui, scope);
}

//! Where a source is that is missing or has changed.

use std::path::PathBuf;

use egui::{RichText, Ui};

use super::super::super::bench::SourceState;
use super::super::super::commands::Command;
use super::super::super::file_picker::Purpose;
use super::super::Scope;
use super::form::Form;
use super::path::{CLIPS, Listed, path_ui};
use super::sheet::{buttons, error_ui, heading};

pub(super) fn relocate_sheet(ui: &mut Ui, source: usize, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Find the source again");
    let known = scope.bench.project.as_ref().and_then(|project| {
        let path = project.document().sources.get(source)?.path.display().to_string();
        let state = project.sources.get(source)?;
        Some(match state {
            SourceState::Missing(why) => format!("{why}. Name the file to use in its place"),
            _ => format!(
                "{path} is no longer the file that the scene was saved with. Choose it again to go on with it as it is now, or name another"
            ),
        })
    });
    if let Some(words) = known {
        ui.add(egui::Label::new(RichText::new(words).color(scope.look.faint)).wrap());
    }
    let mut meant =
        path_ui(ui, form, &Listed { endings: &CLIPS, height: 190.0, writes: false }, scope.look.faint);
    error_ui(ui, form, scope);
    let typed = form.path.trim().to_owned();
    let clicked = buttons(ui, "Use this file", !typed.is_empty(), scope, |ui, scope| {
        if ui.button("Browse…").clicked() {
            scope.out.push(Command::Browse(Purpose::Relocate));
        }
    });
    if clicked {
        meant = Some(PathBuf::from(&typed));
    }
    scope.out.extend(meant.map(|path| Command::RelocateTo(source, path)));
}

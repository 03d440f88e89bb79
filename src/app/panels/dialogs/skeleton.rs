//! Where the skeleton of a table is.

use std::path::PathBuf;

use egui::{RichText, Ui};

use super::super::super::bench::file_name;
use super::super::super::commands::Command;
use super::super::super::file_picker::Purpose;
use super::super::Scope;
use super::form::Form;
use super::path::{CLIPS, Listed, path_ui};
use super::sheet::{buttons, error_ui, heading};

pub(super) fn skeleton_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Skeleton of the table");
    let source = scope.bench.project.as_ref().and_then(|project| project.source_of(scope.bench.session.work));
    let named = source.and_then(|source| source.reading.skeleton.as_deref()).map(file_name);
    let words = match &named {
        Some(named) => format!("Taken from {named}. "),
        None => String::new(),
    };
    let words = format!(
        "{words}A clip whose joints bear the names of the table's columns, or a table of joints: joint, parent, offset.x, offset.y, offset.z"
    );
    ui.add(egui::Label::new(RichText::new(words).color(scope.look.faint)).wrap());
    let mut meant =
        path_ui(ui, form, &Listed { endings: &CLIPS, height: 190.0, writes: false }, scope.look.faint);
    error_ui(ui, form, scope);
    let typed = form.path.trim().to_owned();
    let clicked = buttons(ui, "Use this file", !typed.is_empty(), scope, |ui, scope| {
        if ui.button("Browse…").on_hover_text("The desktop's own file dialog").clicked() {
            scope.out.push(Command::Browse(Purpose::Skeleton));
        }
        let tip = "As the table is by itself, or with a table of joints that lies beside it";
        if named.is_some() && ui.button("Without").on_hover_text(tip).clicked() {
            scope.out.push(Command::UseSkeleton(None));
        }
    });
    if clicked {
        meant = Some(PathBuf::from(&typed));
    }
    scope.out.extend(meant.map(|path| Command::UseSkeleton(Some(path))));
}

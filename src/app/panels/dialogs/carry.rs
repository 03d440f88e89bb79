//! Files of a retarget: the target, the joint map, and where the result goes.

use std::path::{Path, PathBuf};

use egui::{RichText, Ui};

use super::super::super::bench::file_name;
use super::super::super::commands::{CarryCommand, CarrySheet, Command};
use super::super::super::file_picker::Purpose;
use super::super::super::places::{export_files, is_source};
use super::super::Scope;
use super::form::Form;
use super::path::{CLIPS, Listed, path_ui};
use super::sheet::{buttons, buttons_to_write, error_ui, heading};

pub(super) fn carry_sheet(ui: &mut Ui, sheet: CarrySheet, form: &mut Form, scope: &mut Scope<'_>) {
    let (title, words, verb, endings): (&str, &str, &str, &[&str]) = match sheet {
        CarrySheet::Onto => (
            "Retarget onto",
            "The file whose skeleton is to make this motion; it need not have a clip",
            "Use this file",
            &CLIPS,
        ),
        CarrySheet::LoadMap => {
            ("Load a joint map", "A table with the columns source and target", "Load", &[".csv"])
        }
        CarrySheet::SaveMap => (
            "Save the joint map",
            "A table with the columns source, target, confidence and reason",
            "Save",
            &[".csv"],
        ),
        CarrySheet::Export => (
            "Export onto the target's file",
            "A copy of the target's file with this motion in it: mesh, skin and all else stay. Another ending makes a new file",
            "Export",
            &CLIPS,
        ),
    };
    heading(ui, title);
    ui.add(egui::Label::new(RichText::new(words).color(scope.look.faint)).wrap());
    if sheet == CarrySheet::Onto {
        open_files_ui(ui, scope);
    }
    let writes = matches!(sheet, CarrySheet::SaveMap | CarrySheet::Export);
    let mut meant = path_ui(ui, form, &Listed { endings, height: 180.0, writes }, scope.look.faint);
    if sheet == CarrySheet::Export {
        let tip = "A page with the joint map, what was held and missed, and how far arms and legs point from where the source's do";
        let sheet = ui.checkbox(&mut form.has_proof, "Proof sheet beside it").on_hover_text(tip);
        if sheet.changed() {
            form.replaces = None;
        }
    }
    error_ui(ui, form, scope);
    let has_proof = form.has_proof;
    if writes {
        let project = scope.bench.project.as_ref();
        let files = |path: &Path| match sheet {
            _ if is_source(project, path) => Vec::new(),
            CarrySheet::Export => export_files(path, has_proof),
            _ => vec![path.to_owned()],
        };
        let purpose = Purpose::Carry(sheet);
        let path = buttons_to_write(ui, (verb, true, purpose), meant, files, form, scope);
        scope.out.extend(path.map(|path| {
            Command::Carry(match sheet {
                CarrySheet::Export => CarryCommand::Export { path, has_proof },
                _ => CarryCommand::SaveMap(path),
            })
        }));
        return;
    }
    let typed = form.path.trim().to_owned();
    let clicked = buttons(ui, verb, !typed.is_empty(), scope, |ui, scope| {
        if ui.button("Browse…").on_hover_text("The desktop's own file dialog").clicked() {
            scope.out.push(Command::Browse(Purpose::Carry(sheet)));
        }
    });
    if clicked {
        meant = Some(PathBuf::from(&typed));
    }
    let Some(path) = meant else { return };
    scope.out.push(Command::Carry(match sheet {
        CarrySheet::LoadMap => CarryCommand::LoadMap(path),
        _ => CarryCommand::OpenOnto(path),
    }));
}

/// The files that are open already.
fn open_files_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let Some(project) = &scope.bench.project else { return };
    let own = scope.bench.work().map(|work| work.source);
    let others: Vec<(usize, String)> = project
        .document()
        .sources
        .iter()
        .enumerate()
        .filter(|(index, _)| Some(*index) != own)
        .map(|(index, source)| (index, file_name(&source.path)))
        .collect();
    if others.is_empty() {
        return;
    }
    ui.horizontal_wrapped(|ui| {
        ui.label("Open already");
        for (index, name) in others {
            if ui.button(name).clicked() {
                scope.out.push(Command::Carry(CarryCommand::Onto(index)));
                scope.out.push(Command::CloseDialog);
            }
        }
    });
}

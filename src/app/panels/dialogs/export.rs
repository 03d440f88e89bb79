//! Where the corrected clip is to go, and what has changed in it.

use std::path::{Path, PathBuf};

use egui::{RichText, Ui};

use super::super::super::commands::Command;
use super::super::super::file_picker::Purpose;
use super::super::super::view_models::pass_rows;
use super::super::Scope;
use super::super::change_plot::change_plot_ui;
use super::form::Form;
use super::path::{CLIPS, path_ui};
use super::sheet::{buttons, error_ui, heading};

pub(super) fn export_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Export clip");
    let evaluated = scope.bench.findings().and_then(|findings| findings.evaluated.as_ref());
    let summary = evaluated
        .map_or("The passes are still being run…".to_owned(), |evaluated| evaluated.changes.sentence());
    ui.label(RichText::new(summary).size(14.5).color(scope.look.text));
    if let (Some(evaluated), Some(work)) = (evaluated, scope.bench.work()) {
        for row in pass_rows(work, Some(&evaluated.evaluation)).into_iter().take(7) {
            let words = format!("{}: {}", row.title, row.problem.unwrap_or(row.change));
            ui.label(RichText::new(words).size(12.5).color(scope.look.faint));
        }
    }
    if let Some(evaluated) = evaluated {
        change_plot_ui(ui, &evaluated.changes, &scope.look);
    }
    ui.add_space(2.0);
    let mut meant = path_ui(ui, form, &CLIPS, 130.0, scope.look.faint);
    let ending =
        Path::new(form.path.trim()).extension().map(|ending| ending.to_string_lossy().to_lowercase());
    let kept = scope.bench.project.as_ref().and_then(|project| {
        let own = project.document().sources.first()?.path.extension()?.to_string_lossy().to_lowercase();
        let is_gltf = |ending: &str| ending == "glb" || ending == "gltf";
        Some(ending.as_deref().is_some_and(|ending| ending == own || (is_gltf(ending) && is_gltf(&own))))
    });
    let words = match (ending.as_deref(), kept) {
        (Some("gltf" | "glb" | "bvh" | "csv"), Some(true)) => {
            "The same format: everything but the changed curves stays as it is in your file"
        }
        (Some("gltf" | "glb" | "bvh" | "csv"), _) => {
            "Another format: a new file with the skeleton and this clip"
        }
        _ => "End the name in .gltf, .glb, .bvh or .csv",
    };
    ui.label(RichText::new(words).size(12.5).color(scope.look.faint));
    ui.checkbox(&mut form.has_proof, "Proof sheet beside it").on_hover_text(
        "A page that shows what was found, which passes ran and what changed, measured on the written file as it is read back",
    );
    error_ui(ui, form, scope);
    let typed = form.path.trim().to_owned();
    let clicked = buttons(ui, "Export", !typed.is_empty() && evaluated.is_some(), scope, |ui, scope| {
        if ui.button("Browse…").clicked() {
            scope.out.push(Command::Browse(Purpose::Export));
        }
    });
    if clicked {
        meant = Some(PathBuf::from(&typed));
    }
    let has_proof = form.has_proof;
    scope.out.extend(meant.map(|path| Command::ExportTo { path, has_proof }));
}

//! Where the corrected clip is to go, and what has changed in it.

use std::path::Path;

use egui::{RichText, ScrollArea, Ui};

use super::super::super::bench::Evaluated;
use super::super::super::commands::Command;
use super::super::super::file_picker::Purpose;
use super::super::super::places::{export_files, is_source};
use super::super::Scope;
use super::super::change_plot::change_plot_ui;
use super::super::passes::rows_of;
use super::form::Form;
use super::path::{CLIPS, Listed, path_ui};
use super::sheet::{buttons_to_write, error_ui, heading};

/// Room for what stands below the list of files: the format, the proof sheet, the buttons or the question in their place.
const BELOW: f32 = 104.0;
/// More, where it is told what was wrong.
const ERROR: f32 = 40.0;
/// Room for the path and the lowest list of files.
const PATHS: f32 = 118.0;
/// Passes that are seen without scrolling, points; in a low window fewer.
const PASSES: [f32; 2] = [118.0, 40.0];
/// The plot with its words.
const PLOT: f32 = 118.0;

pub(super) fn export_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Export clip");
    let bench = scope.bench;
    let evaluated = bench.to_be_written();
    let summary = evaluated
        .map_or("The passes are still being run…".to_owned(), |evaluated| evaluated.changes.sentence());
    ui.label(RichText::new(summary).size(14.5).color(scope.look.text));
    let below = BELOW + if form.error.is_some() { ERROR } else { 0.0 };
    let room = ui.available_height() - below - PATHS;
    let has_plot = room > PLOT + PASSES[1];
    if let Some(evaluated) = evaluated {
        let room = if has_plot { room - PLOT } else { room };
        passes_ui(ui, evaluated, room.clamp(PASSES[1], PASSES[0]), scope);
        if has_plot {
            change_plot_ui(ui, &evaluated.changes, &scope.look);
        }
    }
    ui.add_space(2.0);
    let height = (ui.available_height() - below - 56.0).clamp(44.0, 200.0);
    let listed = Listed { endings: &CLIPS, height, writes: true };
    let meant = path_ui(ui, form, &listed, scope.look.faint);
    ui.label(RichText::new(format_words(form, scope)).size(12.5).color(scope.look.faint));
    let sheet = ui.checkbox(&mut form.has_proof, "Proof sheet beside it").on_hover_text(
        "A page that shows what was found, which passes ran and what changed, measured on the written file as it is read back",
    );
    if sheet.changed() {
        form.replaces = None;
    }
    error_ui(ui, form, scope);
    let has_proof = form.has_proof;
    let project = bench.project.as_ref();
    // A source is never written: that is told in place of a question.
    let files = |path: &Path| {
        if is_source(project, path) { Vec::new() } else { export_files(path, has_proof) }
    };
    let path =
        buttons_to_write(ui, ("Export", evaluated.is_some(), Purpose::Export), meant, files, form, scope);
    scope.out.extend(path.map(|path| Command::ExportTo { path, has_proof }));
}

/// Every pass with what it did.
fn passes_ui(ui: &mut Ui, evaluated: &Evaluated, height: f32, scope: &Scope<'_>) {
    let rows = rows_of(scope, Some(evaluated));
    if rows.is_empty() {
        return;
    }
    let list = ScrollArea::vertical().id_salt("passes to export").max_height(height);
    list.auto_shrink([false, true]).show(ui, |ui| {
        ui.spacing_mut().item_spacing.y = 3.0;
        for row in rows {
            let words = format!("{}: {}", row.title, row.problem.unwrap_or(row.change));
            ui.label(RichText::new(words).size(12.5).color(scope.look.faint));
        }
    });
}

/// What the ending of the name means.
fn format_words(form: &Form, scope: &Scope<'_>) -> &'static str {
    let ending =
        Path::new(form.path.trim()).extension().map(|ending| ending.to_string_lossy().to_lowercase());
    let kept = scope.bench.project.as_ref().and_then(|project| {
        let own = project.document().sources.first()?.path.extension()?.to_string_lossy().to_lowercase();
        let is_gltf = |ending: &str| ending == "glb" || ending == "gltf";
        Some(ending.as_deref().is_some_and(|ending| ending == own || (is_gltf(ending) && is_gltf(&own))))
    });
    match (ending.as_deref(), kept) {
        (Some("gltf" | "glb" | "bvh" | "csv"), Some(true)) => {
            "The same format: everything but the changed curves stays as it is in your file"
        }
        (Some("gltf" | "glb" | "bvh" | "csv"), _) => {
            "Another format: a new file with the skeleton and this clip"
        }
        _ => "End the name in .gltf, .glb, .bvh or .csv",
    }
}

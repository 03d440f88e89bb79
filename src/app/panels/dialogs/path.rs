//! A path to type, with what lies in its folder below.

use std::path::{Path, PathBuf};

use egui::{Key, RichText, ScrollArea, TextEdit, Ui};

use super::super::super::commands::{BlendCommand, Command, TimeCommand};
use super::super::super::file_picker::Purpose;
use super::super::super::places::{is_own_scene, scene_file};
use super::super::Scope;
use super::form::Form;
use super::sheet::{buttons, buttons_to_write, error_ui, heading};
use crate::exchange::disk;

/// How files with clips end.
pub(super) const CLIPS: [&str; 4] = [".gltf", ".glb", ".bvh", ".csv"];
const ALL: [&str; 5] = [".gltf", ".glb", ".bvh", ".csv", ".ron"];

pub(super) fn path_sheet(
    ui: &mut Ui,
    title: &str,
    verb: &str,
    purpose: Purpose,
    form: &mut Form,
    scope: &mut Scope<'_>,
) {
    heading(ui, title);
    let endings: &[&str] = match purpose {
        Purpose::Save => &[".ron"],
        Purpose::Limits => &[".csv", ".ron"],
        Purpose::Second => &CLIPS,
        _ => &ALL,
    };
    let writes = purpose == Purpose::Save;
    let mut meant = path_ui(ui, form, &Listed { endings, height: 230.0, writes }, scope.look.faint);
    error_ui(ui, form, scope);
    if writes {
        let project = scope.bench.project.as_ref();
        // The document's own scene is what saving is for.
        let files = |path: &Path| match scene_file(path.to_owned()) {
            own if is_own_scene(project, &own) => Vec::new(),
            other => vec![other],
        };
        let path = buttons_to_write(ui, (verb, true, purpose), meant, files, form, scope);
        scope.out.extend(path.map(Command::SaveTo));
        return;
    }
    let typed = form.path.trim().to_owned();
    let clicked = buttons(ui, verb, !typed.is_empty(), scope, |ui, scope| {
        if ui.button("Browse…").on_hover_text("The desktop's own file dialog").clicked() {
            scope.out.push(Command::Browse(purpose));
        }
    });
    if clicked {
        meant = Some(PathBuf::from(&typed));
    }
    if let Some(path) = meant {
        scope.out.push(match purpose {
            Purpose::Limits => Command::Time(TimeCommand::ReadLimits(path)),
            Purpose::Second => Command::Blend(BlendCommand::OpenFile(path)),
            _ => Command::OpenFiles(vec![path]),
        });
    }
}

/// The list below a path.
pub(super) struct Listed<'a> {
    /// How the names of files in it end.
    pub endings: &'a [&'a str],
    /// Its height, points.
    pub height: f32,
    /// A file is to be written: a double click names one, and does not yet mean it.
    pub writes: bool,
}

/// A path to type, with what lies in its folder below. Gives the path once it is meant.
pub(super) fn path_ui(
    ui: &mut Ui,
    form: &mut Form,
    listed: &Listed<'_>,
    look_faint: egui::Color32,
) -> Option<PathBuf> {
    let label = ui.label("Path");
    let field = TextEdit::singleline(&mut form.path)
        .desired_width(f32::INFINITY)
        .hint_text("/folder/clip.bvh")
        .font(egui::TextStyle::Monospace)
        .margin(egui::Margin::symmetric(6, 5));
    let response = ui.add(field).labelled_by(label.id);
    if !form.has_focus {
        response.request_focus();
        form.has_focus = true;
    }
    if response.changed() {
        form.error = None;
        form.replaces = None;
    }
    let mut meant = response.lost_focus() && ui.input(|input| input.key_pressed(Key::Enter));
    let typed = PathBuf::from(&form.path);
    let (folder, beginning) = if form.path.is_empty() || form.path.ends_with(['/', '\\']) {
        (typed.clone(), String::new())
    } else {
        let folder = typed.parent().unwrap_or(Path::new("")).to_owned();
        (folder, typed.file_name().map(|name| name.to_string_lossy().to_lowercase()).unwrap_or_default())
    };
    let listing = form.listing.get_or_compute(folder.clone(), |folder| {
        let folder = if folder.as_os_str().is_empty() { Path::new(".") } else { folder };
        disk::entries(folder).map_err(|error| error.to_string())
    });
    let mut chosen: Option<(PathBuf, bool)> = None;
    ScrollArea::vertical()
        .max_height(listed.height)
        .min_scrolled_height(listed.height)
        .auto_shrink(false)
        .show(ui, |ui| {
            ui.spacing_mut().item_spacing.y = 0.0;
            match listing {
                Err(error) => {
                    ui.label(RichText::new(error).color(look_faint));
                }
                Ok(entries) => {
                    let wanted = |entry: &&disk::Entry| {
                        let name = entry.name.to_lowercase();
                        let fits =
                            entry.is_folder() || listed.endings.iter().any(|ending| name.ends_with(ending));
                        // A full name shows its neighbours: it is no longer a beginning.
                        fits && (name.starts_with(&beginning) || typed.is_file()) && !name.starts_with('.')
                    };
                    let found: Vec<_> = entries.iter().filter(wanted).take(400).collect();
                    if found.is_empty() {
                        ui.label(RichText::new("No file here whose name begins so").color(look_faint));
                    }
                    for entry in found {
                        let words =
                            if entry.is_folder() { format!("{}/", entry.name) } else { entry.name.clone() };
                        let is_typed = !entry.is_folder()
                            && typed
                                .file_name()
                                .is_some_and(|name| name.to_string_lossy() == entry.name.as_str());
                        let response = ui.selectable_label(is_typed, words);
                        if response.clicked() {
                            chosen = Some((folder.join(&entry.name), entry.is_folder()));
                        }
                        if response.double_clicked() && !entry.is_folder() {
                            chosen = Some((folder.join(&entry.name), false));
                            meant = !listed.writes;
                        }
                    }
                }
            }
        });
    if let Some((path, is_folder)) = chosen {
        form.name(path.display().to_string());
        if is_folder {
            form.path.push(std::path::MAIN_SEPARATOR);
            form.has_focus = false;
        }
    }
    (meant && !form.path.trim().is_empty()).then(|| PathBuf::from(form.path.trim()))
}

//! Questions and sheets that lie over the window.

use std::path::{Path, PathBuf};

use egui::{
    Align, FontId, Key, Layout, Modal, RichText, Role, ScrollArea, Sense, TextEdit, Ui, WidgetInfo, vec2,
};

use super::super::bench::file_name;
use super::super::commands::{Command, HOLD_FOR_SOURCE, MORE_KEYS, Menu, TABLE};
use super::super::file_picker::Purpose;
use super::super::view_models::{LogBlock, Memo, counted, log_blocks, pass_rows};
use super::Scope;
use super::change_plot::change_plot_ui;
use crate::exchange::csv::{NamedColumns, TimeUnit};
use crate::exchange::disk;

/// What is to happen once unsaved work is dealt with.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Then {
    /// Close the window.
    Quit,
    /// Open these files.
    Open(Vec<PathBuf>),
    /// Ask for files.
    AskForFiles,
    /// Ask for a path.
    AskForPath,
    /// Open the demo.
    OpenDemo,
}

/// Which one lies over the window.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Dialog {
    /// A path to open.
    OpenPath,
    /// A path to save to.
    SavePath,
    /// A path to export to, and what changed.
    Export,
    /// Where a missing source is.
    Relocate(usize),
    /// What the columns of a CSV file are.
    Columns(PathBuf, Vec<String>),
    /// Which clip of several.
    ChooseClip,
    /// Unsaved work.
    Unsaved(Then),
    /// All changes.
    History,
    /// All keys.
    Shortcuts,
    /// The change log.
    WhatsNew,
    /// Version, licences, cautions.
    About,
}

/// What has been typed.
#[derive(Debug, Default)]
pub(crate) struct Form {
    /// The path.
    pub path: String,
    /// What was wrong with it.
    pub error: Option<String>,
    /// Words looked for in the list of keys.
    pub search: String,
    /// Which columns hold the time, and w, x, y, z.
    pub columns: [usize; 5],
    /// The unit of the time column; without it what the header says, else seconds.
    pub time_unit: Option<TimeUnit>,
    /// What lies in the folder of the path.
    listing: Memo<PathBuf, Result<Vec<disk::Entry>, String>>,
    /// The field has been given the keyboard.
    has_focus: bool,
}

impl Form {
    /// A new question about a path.
    pub(crate) fn with_path(path: impl Into<String>) -> Self {
        Self { path: path.into(), ..Self::default() }
    }

    /// A guess at what the columns are: by their names, else the first five in order.
    pub(crate) fn with_columns(names: &[String]) -> Self {
        let like = |wanted: &[&str]| {
            names.iter().position(|name| {
                let name = name.to_lowercase();
                wanted.iter().any(|word| {
                    name == *word
                        || name.ends_with(&format!("_{word}"))
                        || name.ends_with(&format!(".{word}"))
                })
            })
        };
        let guesses = [
            like(&["time", "t", "timestamp", "time_s", "ms", "us"]),
            like(&["w", "qw", "q0"]),
            like(&["x", "qx", "q1"]),
            like(&["y", "qy", "q2"]),
            like(&["z", "qz", "q3"]),
        ];
        let mut columns = [0, 1, 2, 3, 4];
        for (column, guess) in columns.iter_mut().zip(guesses) {
            *column = guess.unwrap_or(*column);
        }
        Self { columns, ..Self::default() }
    }
}

const CHANGES: &str = include_str!("../../../assets/CHANGELOG.md");

/// Draws the dialog, if there is one.
pub(crate) fn dialogs_ui(ctx: &egui::Context, dialog: &Dialog, form: &mut Form, scope: &mut Scope<'_>) {
    let frame = egui::Frame::popup(&ctx.global_style()).inner_margin(egui::Margin::same(18));
    let modal = Modal::new(egui::Id::unique("dialog")).frame(frame);
    let response = modal.show(ctx, |ui| {
        let room = ctx.content_rect().size() - vec2(80.0, 80.0);
        let wanted = match dialog {
            Dialog::Shortcuts => vec2(680.0, 560.0),
            Dialog::WhatsNew | Dialog::History => vec2(560.0, 460.0),
            Dialog::Unsaved(_) => vec2(440.0, 160.0),
            _ => vec2(580.0, 460.0),
        };
        let size = wanted.min(room.max(vec2(200.0, 160.0)));
        ui.set_width(size.x);
        ui.set_max_height(size.y);
        ui.spacing_mut().item_spacing.y = 6.0;
        match dialog {
            Dialog::OpenPath => path_sheet(ui, "Open path", "Open", Purpose::Open, form, scope),
            Dialog::SavePath => path_sheet(ui, "Save scene as", "Save", Purpose::Save, form, scope),
            Dialog::Relocate(source) => relocate_sheet(ui, *source, form, scope),
            Dialog::Export => export_sheet(ui, form, scope),
            Dialog::Columns(path, names) => columns_sheet(ui, path, names, form, scope),
            Dialog::ChooseClip => clips_sheet(ui, scope),
            Dialog::Unsaved(_) => unsaved_sheet(ui, scope),
            Dialog::History => history_sheet(ui, scope),
            Dialog::Shortcuts => shortcuts_sheet(ui, form, scope),
            Dialog::WhatsNew => changes_sheet(ui, scope),
            Dialog::About => about_sheet(ui, scope),
        }
    });
    if response.should_close() {
        scope.out.push(Command::CloseDialog);
    }
}

fn heading(ui: &mut Ui, words: &str) {
    ui.heading(words);
    ui.add_space(4.0);
}

/// Buttons at the lower right: the main one outermost. Gives whether it was clicked.
fn buttons(
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

/// A path to type, with what lies in its folder below. Gives the path once it is meant.
fn path_ui(
    ui: &mut Ui,
    form: &mut Form,
    endings: &[&str],
    list_height: f32,
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
    ScrollArea::vertical().max_height(list_height).min_scrolled_height(list_height).auto_shrink(false).show(
        ui,
        |ui| {
            ui.spacing_mut().item_spacing.y = 0.0;
            match listing {
                Err(error) => {
                    ui.label(RichText::new(error).color(look_faint));
                }
                Ok(entries) => {
                    let wanted = |entry: &&disk::Entry| {
                        let name = entry.name.to_lowercase();
                        let fits = entry.is_folder() || endings.iter().any(|ending| name.ends_with(ending));
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
                            meant = true;
                        }
                    }
                }
            }
        },
    );
    if let Some((path, is_folder)) = chosen {
        form.path = path.display().to_string();
        form.error = None;
        if is_folder {
            form.path.push(std::path::MAIN_SEPARATOR);
            form.has_focus = false;
        }
    }
    (meant && !form.path.trim().is_empty()).then(|| PathBuf::from(form.path.trim()))
}

const CLIPS: [&str; 4] = [".gltf", ".glb", ".bvh", ".csv"];
const ALL: [&str; 5] = [".gltf", ".glb", ".bvh", ".csv", ".ron"];

fn error_ui(ui: &mut Ui, form: &Form, scope: &Scope<'_>) {
    if let Some(error) = &form.error {
        ui.add(egui::Label::new(RichText::new(error).color(scope.look.error)).wrap());
    }
}

fn path_sheet(
    ui: &mut Ui,
    title: &str,
    verb: &str,
    purpose: Purpose,
    form: &mut Form,
    scope: &mut Scope<'_>,
) {
    heading(ui, title);
    let endings: &[&str] = if purpose == Purpose::Save { &[".ron"] } else { &ALL };
    let mut meant = path_ui(ui, form, endings, 230.0, scope.look.faint);
    error_ui(ui, form, scope);
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
            Purpose::Save => Command::SaveTo(path),
            _ => Command::OpenFiles(vec![path]),
        });
    }
}

fn relocate_sheet(ui: &mut Ui, source: usize, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Find the source again");
    let known = scope.bench.project.as_ref().and_then(|project| {
        let path = project.document().sources.get(source)?.path.display().to_string();
        let state = project.sources.get(source)?;
        Some(match state {
            super::super::bench::SourceState::Missing(why) => format!("{why}. Name the file to use in its place"),
            _ => format!(
                "{path} is no longer the file that the scene was saved with. Choose it again to go on with it as it is now, or name another"
            ),
        })
    });
    if let Some(words) = known {
        ui.add(egui::Label::new(RichText::new(words).color(scope.look.faint)).wrap());
    }
    let mut meant = path_ui(ui, form, &CLIPS, 190.0, scope.look.faint);
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

fn export_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
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
    scope.out.extend(meant.map(Command::ExportTo));
}

fn columns_sheet(ui: &mut Ui, path: &Path, names: &[String], form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Which columns are the turns?");
    let words = format!(
        "{} has a header of its own. Say which columns hold the time and the four parts of the quaternion",
        file_name(path)
    );
    ui.add(egui::Label::new(RichText::new(words).color(scope.look.faint)).wrap());
    ui.add_space(4.0);
    egui::Grid::new("columns").num_columns(2).spacing([16.0, 8.0]).show(ui, |ui| {
        for (what, chosen) in ["time", "w", "x", "y", "z"].into_iter().zip(&mut form.columns) {
            ui.label(what);
            let known = names.get(*chosen).cloned().unwrap_or_default();
            let combo = egui::ComboBox::from_id_salt(("column", what)).selected_text(known).width(220.0);
            let response = combo
                .show_ui(ui, |ui| {
                    for (index, name) in names.iter().enumerate() {
                        ui.selectable_value(chosen, index, name);
                    }
                })
                .response;
            response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, format!("Column of {what}")));
            ui.end_row();
        }
        ui.label("time is in");
        ui.horizontal(|ui| {
            ui.radio_value(&mut form.time_unit, None, "as the header says");
            ui.radio_value(&mut form.time_unit, Some(TimeUnit::Seconds), "s");
            ui.radio_value(&mut form.time_unit, Some(TimeUnit::Milliseconds), "ms");
            ui.radio_value(&mut form.time_unit, Some(TimeUnit::Microseconds), "µs");
        });
        ui.end_row();
    });
    error_ui(ui, form, scope);
    if buttons(ui, "Open", true, scope, |_, _| {}) {
        let name = |place: usize| names.get(form.columns[place]).cloned().unwrap_or_default();
        let columns = NamedColumns { time: name(0), xyzw: [name(2), name(3), name(4), name(1)] };
        scope.out.push(Command::OpenTable(path.to_owned(), columns, form.time_unit));
    }
}

fn clips_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
    heading(ui, "Choose clip");
    let Some(project) = &scope.bench.project else { return };
    let document = std::sync::Arc::clone(project.document());
    let look = scope.look;
    ScrollArea::vertical().auto_shrink([false, true]).show(ui, |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        for (index, work) in document.works.iter().enumerate() {
            let clip = project.source_clip(index);
            let (bounds, response) = ui.allocate_exact_size(vec2(ui.available_width(), 28.0), Sense::click());
            let is_on = index == scope.bench.session.work;
            response.widget_info(|| {
                WidgetInfo::selected(Role::Button, true, is_on, format!("Clip {}", work.name))
            });
            if is_on || response.hovered() {
                ui.painter().rect_filled(bounds, 4.0, if is_on { look.chosen } else { look.hover });
            }
            if is_on {
                let bar = egui::Rect::from_min_size(bounds.min, vec2(3.0, bounds.height()));
                ui.painter().rect_filled(bar, 0.0, look.selection);
            }
            let y = bounds.center().y;
            let words = if document.sources.len() > 1 {
                let file =
                    document.sources.get(work.source).map_or(String::new(), |source| file_name(&source.path));
                format!("{file}: {}", work.name)
            } else {
                work.name.clone()
            };
            let mut job =
                egui::text::LayoutJob::simple_singleline(words, FontId::proportional(14.0), look.text);
            job.wrap = egui::text::TextWrapping::truncate_at_width((bounds.width() - 210.0).max(60.0));
            let galley = ui.painter().layout_job(job);
            ui.painter().galley(
                egui::pos2(bounds.left() + 12.0, y - galley.size().y / 2.0),
                galley,
                look.text,
            );
            let numbers = clip.map_or("missing".to_owned(), |clip| {
                let joints = clip.skeleton.listed().count();
                format!(
                    "{}  {:.2} s  {}",
                    counted(clip.grid.count(), "frame"),
                    clip.duration_secs,
                    counted(joints, "joint")
                )
            });
            ui.painter().text(
                egui::pos2(bounds.right() - 8.0, y),
                egui::Align2::RIGHT_CENTER,
                numbers,
                FontId::proportional(12.5),
                look.faint,
            );
            if response.clicked() {
                scope.out.push(Command::ShowClip(index));
                scope.out.push(Command::CloseDialog);
            }
        }
    });
}

fn unsaved_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
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

fn history_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
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

fn close_button(ui: &mut Ui, scope: &mut Scope<'_>) {
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

fn shortcuts_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Shortcuts");
    let label = ui.label(RichText::new("Look for").size(12.5).color(scope.look.faint));
    ui.add(TextEdit::singleline(&mut form.search).desired_width(f32::INFINITY).hint_text("an action"))
        .labelled_by(label.id);
    let wanted = form.search.to_lowercase();
    ScrollArea::vertical().max_height(390.0).auto_shrink(false).show(ui, |ui| {
        for menu in Menu::ALL {
            let fits = |words: &str| words.to_lowercase().contains(&wanted);
            let entries: Vec<_> = TABLE
                .iter()
                .filter(|entry| entry.menu == menu && (fits(entry.label) || fits(entry.tooltip)))
                .collect();
            if entries.is_empty() {
                continue;
            }
            ui.add_space(6.0);
            ui.label(RichText::new(menu.title()).size(15.0).color(scope.look.text));
            for entry in entries {
                let more =
                    MORE_KEYS.iter().filter(|(_, action)| *action == entry.action).map(|(keys, _)| keys);
                let keys: Vec<String> =
                    entry.shortcut.iter().chain(more).map(|keys| ui.ctx().format_shortcut(keys)).collect();
                key_row(ui, scope, entry.label, &keys.join(", "), entry.tooltip);
            }
            if menu == Menu::View && fits("source alone hold") {
                let keys = format!("hold {}", ui.ctx().format_shortcut(&HOLD_FOR_SOURCE));
                key_row(
                    ui,
                    scope,
                    "Source for a moment",
                    &keys,
                    "The source in place of the result while held",
                );
            }
        }
        ui.add_space(6.0);
        ui.label(RichText::new("Pointer").size(15.0).color(scope.look.text));
        for (what, how, more) in [
            ("Scrub", "drag", "across the turn map, the curves or the bar at the bottom"),
            ("Zoom time", "wheel", "over curves and ruler; with Ctrl over the turn map"),
            ("Pan time", "middle drag", "or Shift and drag, over curves and map"),
            ("Circle the figure", "drag", "in the skeleton view"),
            ("Move the view", "middle drag", "or Shift and drag, in the skeleton view"),
            ("Nearer and farther", "wheel", "in the skeleton view"),
        ] {
            key_row(ui, scope, what, how, more);
        }
    });
    close_button(ui, scope);
}

fn key_row(ui: &mut Ui, scope: &Scope<'_>, label: &str, keys: &str, tooltip: &str) {
    let look = &scope.look;
    let (bounds, response) = ui.allocate_exact_size(vec2(ui.available_width(), 19.0), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{label}: {keys}")));
    let y = bounds.center().y;
    let at = |x: f32| egui::pos2(bounds.left() + x, y);
    let left = egui::Align2::LEFT_CENTER;
    ui.painter().text(at(0.0), left, label, FontId::proportional(13.0), look.text);
    ui.painter().text(at(196.0), left, keys, FontId::monospace(12.0), look.text);
    let mut job =
        egui::text::LayoutJob::simple_singleline(tooltip.to_owned(), FontId::proportional(12.0), look.faint);
    job.wrap = egui::text::TextWrapping::truncate_at_width((bounds.width() - 372.0).max(10.0));
    let galley = ui.painter().layout_job(job);
    ui.painter().galley(egui::pos2(bounds.left() + 362.0, y - galley.size().y / 2.0), galley, look.faint);
    response.on_hover_text(tooltip);
}

fn changes_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
    heading(ui, "What's new");
    ScrollArea::vertical().max_height(340.0).auto_shrink(false).show(ui, |ui| {
        let look = scope.look;
        for block in log_blocks(CHANGES) {
            match block {
                LogBlock::Heading(depth, words) => {
                    ui.add_space(if depth == 2 { 8.0 } else { 4.0 });
                    let size = if depth == 2 { 16.5 } else { 14.5 };
                    ui.label(RichText::new(words).size(size).color(look.text));
                }
                LogBlock::Item(words) => {
                    ui.horizontal_top(|ui| {
                        let (dot, _) = ui.allocate_exact_size(vec2(10.0, 18.0), Sense::hover());
                        ui.painter().circle_filled(dot.center(), 2.0, look.faint);
                        ui.add(egui::Label::new(RichText::new(words).color(look.text)).wrap());
                    });
                }
                LogBlock::Text(words) => {
                    ui.add(egui::Label::new(RichText::new(words).color(look.faint)).wrap());
                }
            }
        }
    });
    close_button(ui, scope);
}

fn about_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
    heading(ui, "Turnwright");
    let look = scope.look;
    ui.label(format!("Version {}. A bench for rotation animation.", env!("CARGO_PKG_VERSION")));
    let faint = |words: &str| egui::Label::new(RichText::new(words.to_owned()).color(look.faint)).wrap();
    ui.add(faint("Finds the places where joints turn as they should not, mends them without touching your file, and measures what it changed."));
    ui.add_space(6.0);
    ui.label("Cautions");
    ui.add(faint("A mend is a good guess, not the truth: look at the motion before you hand it on. What the search does not flag may still be wrong, and what it flags may be meant."));
    ui.add(faint("Before exported motion drives a machine that can hurt someone, check it against that machine's own limits of angle, speed and acceleration. This program knows none of them."));
    ui.add_space(6.0);
    ui.label("Licence");
    ui.add(faint("MIT or Apache 2.0, as you like. Without any warranty."));
    close_button(ui, scope);
}

//! Files: opening, saving, exporting, relocating. Reading and writing is done by jobs.

use std::path::{MAIN_SEPARATOR, Path, PathBuf};
use std::sync::Arc;

use egui::Context;

use super::super::bench::{Findings, SourceState};
use super::super::file_picker::Purpose;
use super::super::jobs::Slot;
use super::super::panels::{Dialog, Form, Message, Then};
use super::super::places::{is_scene, scene_file};
use super::super::view_models::counted;
use super::super::window::Window;
use super::answers::Answer;
use crate::demo;
use crate::exchange::csv::{self, CsvErrorKind, CsvOptions, NamedColumns, TimeUnit};
use crate::exchange::{self, ClipAddress, OpenError, OpenOptions, Source, disk, ron};
use crate::scene::{Document, Edit, Library, Loaded, Reading, Revision, SourceRef};

/// A scene as read, with its files as far as they were found.
#[derive(Debug)]
pub(crate) struct OpenedScene {
    /// Where it is.
    pub path: PathBuf,
    /// The document.
    pub document: Document,
    /// Its files.
    pub sources: Vec<SourceState>,
    /// Joints it names that are no longer there.
    pub lost: Vec<String>,
}

impl Window {
    /// Adds a file to the document unless it is there; its index, and whether it is new.
    pub(super) fn add_source(&mut self, source: &Arc<Source>) -> Option<(usize, bool)> {
        let project = self.bench.project.as_mut()?;
        let document = Arc::clone(project.document());
        if let Some(known) = document.sources.iter().position(|own| own.path == source.path) {
            return Some((known, false));
        }
        let index = document.sources.len();
        let to = SourceRef {
            path: source.path.clone(),
            sha256: source.sha256().to_owned(),
            reading: source.reading.clone(),
        };
        let clips: Vec<String> = (0..source.clips.len()).map(|clip| source.clip_label(clip)).collect();
        // What an undone step had added here is gone with it.
        project.sources.truncate(index);
        project.sources.push(SourceState::Ready(Arc::clone(source)));
        project.findings.truncate(document.works.len());
        project.findings.extend(clips.iter().map(|_| Findings::default()));
        self.edit(&Edit::AddSource { source: to, clips });
        Some((index, true))
    }

    /// Does it, or asks about unsaved work first.
    pub(super) fn open_or_ask(&mut self, then: Then) {
        let project = self.bench.project.as_ref();
        let is_unsaved = project.is_some_and(|project| project.history.is_unsaved());
        // Whoever discarded the document to be asked for a path is not asked again once it is typed.
        let is_discarded = self.discarded.is_some() && self.discarded == self.stand();
        if is_unsaved && !is_discarded {
            self.show_dialog(Dialog::Unsaved(then));
        } else {
            // No context is at hand here; what needs one is asked for by command.
            self.pending(then);
        }
    }

    /// Which document it is, and how far it has come.
    fn stand(&self) -> Option<(u64, Revision)> {
        self.bench.project.as_ref().map(|project| (project.serial, project.history.revision()))
    }

    /// Goes on though the document is not saved. Should it be changed before anything takes its place, it is asked about again.
    pub(super) fn discard_and_go_on(&mut self, ctx: &Context) {
        let Some(Dialog::Unsaved(then)) = self.dialog.take() else { return };
        self.discarded = self.stand();
        self.go_on(then, ctx);
    }

    fn pending(&mut self, then: Then) {
        use super::super::commands::Command;
        match then {
            Then::AskForFiles => self.commands.push(Command::Browse(Purpose::Open)),
            Then::Open(paths) => {
                let addresses = paths.into_iter().map(|path| ClipAddress { path, clip: None }).collect();
                self.open_addresses(addresses);
            }
            Then::AskForPath => self.ask_for_path(),
            Then::OpenDemo => self.open_demo(),
            Then::Quit => {
                self.write_settings();
                self.should_close = true;
            }
        }
    }

    pub(super) fn go_on(&mut self, then: Then, ctx: &Context) {
        self.dialog = None;
        self.pending(then);
        ctx.request_repaint();
    }

    fn ask_for_path(&mut self) {
        let folder = self.usual_folder();
        self.dialog = Some(Dialog::OpenPath);
        self.form = Form::with_path(folder);
    }

    /// The folder that a path most likely begins with, ending in a separator.
    pub(super) fn usual_folder(&self) -> String {
        let known = self.bench.project.as_ref().and_then(|project| {
            let source = project.document().sources.first()?;
            source.path.parent().filter(|folder| folder.is_dir()).map(Path::to_owned)
        });
        let folder = known.or_else(|| std::env::current_dir().ok());
        folder.map_or_else(String::new, |folder| {
            let text = folder.display().to_string();
            if text.ends_with(MAIN_SEPARATOR) { text } else { format!("{text}{MAIN_SEPARATOR}") }
        })
    }

    /// Reads clips or a scene.
    pub(in super::super) fn open_addresses(&mut self, addresses: Vec<ClipAddress>) {
        if let Some(scene) = addresses.iter().find(|address| is_scene(&address.path)) {
            let path = scene.path.clone();
            if addresses.len() > 1 {
                let text =
                    format!("{}: a scene is opened alone; the other files were left out", path.display());
                self.tell(Message::note(text));
            }
            self.jobs.submit(Slot::Open, move |_| Some(Answer::SceneOpened(open_scene(path).map(Box::new))));
            return;
        }
        let clip = addresses.iter().find_map(|address| address.clip.clone());
        self.jobs.submit(Slot::Open, move |watch| {
            let mut sources = Vec::new();
            for (done, address) in addresses.iter().enumerate() {
                if !crate::snag::Progress::report(watch, done, addresses.len()) {
                    return None;
                }
                match exchange::open(&address.path, &OpenOptions::default()) {
                    Ok(source) => sources.push(hashed(source)),
                    Err(error) => {
                        return Some(match unknown_header(&error) {
                            Some((path, names)) => Answer::NeedsColumns { path, names, error: error.told() },
                            None => Answer::Opened { result: Err(error.told()), clip },
                        });
                    }
                }
            }
            Some(Answer::Opened { result: Ok(sources), clip })
        });
    }

    /// Reads a CSV file whose columns had to be named.
    pub(super) fn open_table(&mut self, path: PathBuf, columns: NamedColumns, unit: Option<TimeUnit>) {
        self.jobs.submit(Slot::Open, move |_| {
            let csv = CsvOptions { columns: Some(columns), time_unit: unit, ..CsvOptions::default() };
            let result = exchange::open(&path, &OpenOptions { csv, rest: None });
            let result = result.map(hashed).map(|source| vec![source]).map_err(|error| error.told());
            Some(Answer::Opened { result, clip: None })
        });
    }

    /// Reads the demo, which is inside the program.
    pub(in super::super) fn open_demo(&mut self) {
        self.jobs.submit(Slot::Open, |_| {
            let scene = &demo::SCENES[0];
            let path = Path::new(scene.clip_file);
            let result = exchange::open_bytes(path, scene.clip_bytes.to_vec(), &OpenOptions::default());
            let result = result.map(hashed).map(|source| vec![source]).map_err(|error| error.told());
            Some(Answer::Opened { result, clip: None })
        });
    }

    pub(super) fn save(&mut self) {
        match self.bench.project.as_ref().and_then(|project| project.scene_path.clone()) {
            Some(path) => self.save_to(path),
            None => self.ask_where_to_save(),
        }
    }

    pub(super) fn ask_where_to_save(&mut self) {
        let Some(project) = &self.bench.project else { return };
        let source = project.document().sources.first().map(|source| source.path.with_extension("ron"));
        let path = project.scene_path.clone().or(source).unwrap_or_else(|| PathBuf::from("scene.ron"));
        self.form = Form::with_path(absolute(&path));
        self.dialog = Some(Dialog::SavePath);
    }

    pub(super) fn save_and_go_on(&mut self) {
        let Some(Dialog::Unsaved(then)) = self.dialog.take() else { return };
        self.save();
        self.after_save = Some(then);
    }

    pub(super) fn save_to(&mut self, path: PathBuf) {
        let path = scene_file(path);
        if let Err(error) = self.settle_embedded(&path) {
            self.form.fail(error);
            return;
        }
        let Some(project) = &self.bench.project else { return };
        let (serial, revision) = (project.serial, project.history.revision());
        let document = Arc::clone(project.document());
        // For each work the source's skeleton, and the one that each pass gets.
        let library = project.library();
        let skeletons: Vec<_> = (0..document.works.len())
            .map(|work| {
                let source = library.source_clip(work).map(|clip| Arc::clone(&clip.skeleton));
                let own = library.skeletons(work).unwrap_or_default();
                if own.is_empty() { source.into_iter().collect() } else { own }
            })
            .collect();
        self.jobs.submit(Slot::Save, move |_| {
            let label = |work: usize, pass: usize, joint: usize| {
                let skeleton = skeletons.get(work).and_then(|own| own.get(pass));
                let known = skeleton.filter(|skeleton| joint < skeleton.len());
                known.map_or_else(|| format!("#{joint}"), |skeleton| skeleton.label(joint).to_owned())
            };
            let result = ron::write(&path, &document, &label).map_err(|error| error.to_string());
            Some(Answer::Saved { serial, revision, path, result })
        });
    }

    /// The demo's clip lies in no file: a scene that refers to it needs one beside it.
    fn settle_embedded(&mut self, scene: &Path) -> Result<(), String> {
        let Some(project) = &self.bench.project else { return Ok(()) };
        let folder = scene.parent().unwrap_or(Path::new(""));
        let mut moved = Vec::new();
        for (index, known) in project.document().sources.iter().enumerate() {
            let Some(own) = demo::SCENES.iter().find(|own| known.path == Path::new(own.clip_file)) else {
                continue;
            };
            if known.sha256 != disk::hash(own.clip_bytes) || known.path.exists() {
                continue;
            }
            let path = folder.join(own.clip_file);
            if !path.exists() {
                disk::write(&path, own.clip_bytes).map_err(|error| error.to_string())?;
            }
            let to = SourceRef { path, ..known.clone() };
            moved.push(Edit::Relocate { source: index, to, joints: Vec::new() });
        }
        for edit in moved {
            self.edit(&edit);
        }
        Ok(())
    }

    pub(super) fn ask_where_to_export(&mut self) {
        let Some((source, _)) = self.chosen_source() else { return };
        let stem = source.path.file_stem().map_or("clip".into(), |stem| stem.to_string_lossy());
        let name = format!("{stem}_mended.{}", source.format.extension());
        let path = source.path.with_file_name(name);
        self.form = Form::with_path(absolute(&path));
        self.form.has_proof = true;
        self.dialog = Some(Dialog::Export);
    }

    /// The source of the clip on show, and its index.
    pub(super) fn chosen_source(&self) -> Option<(Arc<Source>, usize)> {
        let project = self.bench.project.as_ref()?;
        let index = self.bench.work()?.source;
        Some((Arc::clone(project.sources.get(index)?.source()?), index))
    }

    pub(super) fn ask_for_source(&mut self) {
        let Some(project) = &self.bench.project else { return };
        let Some(index) = project.trouble() else { return };
        let path = project.document().sources.get(index).map(|source| source.path.display().to_string());
        self.form = Form::with_path(path.unwrap_or_default());
        self.dialog = Some(Dialog::Relocate(index));
    }

    pub(super) fn relocate_to(&mut self, index: usize, path: PathBuf) {
        let Some(project) = &self.bench.project else { return };
        let serial = project.serial;
        let known = project.document().sources.get(index).map(|source| source.reading.clone());
        let options = OpenOptions::default().or_as_remembered(&known.unwrap_or_default());
        self.jobs.submit(Slot::Relocate, move |_| {
            let result = exchange::open(&path, &options);
            let result = result.map(hashed).map_err(|error| error.told());
            Some(Answer::Relocated { serial, index, result })
        });
    }

    /// Asks for the file with the skeleton of the table on show.
    pub(super) fn ask_for_skeleton(&mut self) {
        let Some((source, _)) = self.chosen_source() else { return };
        let known = source.reading.skeleton.as_ref().map(|path| path.display().to_string());
        self.form = Form::with_path(known.unwrap_or_else(|| self.usual_folder()));
        self.dialog = Some(Dialog::TableSkeleton);
    }

    /// Reads the table on show anew with the skeleton of that file, or with the one that it has by itself.
    pub(super) fn use_skeleton(&mut self, skeleton: Option<PathBuf>) {
        let (Some(project), Some((source, index))) = (&self.bench.project, self.chosen_source()) else {
            return;
        };
        let serial = project.serial;
        let reading = Reading { skeleton, ..source.reading.clone() };
        let options = OpenOptions::default().or_as_remembered(&reading);
        self.jobs.submit(Slot::Relocate, move |_| {
            let result = exchange::open(&source.path, &options);
            let result = result.map(hashed).map_err(|error| error.told());
            Some(Answer::Reread { serial, index, result })
        });
    }

    /// Asks with the desktop's own dialog.
    pub(super) fn browse(&mut self, purpose: Purpose, ctx: &Context) {
        let typed = match purpose {
            Purpose::Open | Purpose::Limits | Purpose::Second | Purpose::Skeleton => self.usual_folder(),
            _ => self.form.path.clone(),
        };
        let wake = ctx.clone();
        self.picker.ask(purpose, PathBuf::from(typed), move || wake.request_repaint());
    }
}

/// The file and its column names, when it could not be opened because nobody knows what its columns are.
fn unknown_header(error: &OpenError) -> Option<(PathBuf, Vec<String>)> {
    let OpenError::Csv { path, source } = error else { return None };
    let CsvErrorKind::Unexpected { expected, .. } = &source.kind else { return None };
    if !expected.contains("--columns") {
        return None;
    }
    let names = csv::header(&disk::read(path).ok()?).ok()?;
    Some((path.clone(), names))
}

/// The hash of a large file takes a while: it is made here, on the worker's thread, and not when the window asks.
fn hashed(source: Source) -> Arc<Source> {
    source.sha256();
    Arc::new(source)
}

fn absolute(path: &Path) -> String {
    std::path::absolute(path).unwrap_or_else(|_| path.to_owned()).display().to_string()
}

fn open_scene(path: PathBuf) -> Result<OpenedScene, String> {
    let mut scene = ron::read(&path).map_err(|error| error.told())?;
    let mut sources = Vec::new();
    for known in &scene.document.sources {
        let options = OpenOptions::default().or_as_remembered(&known.reading);
        sources.push(match exchange::open(&known.path, &options) {
            Err(error) => SourceState::Missing(error.to_string()),
            Ok(source) if source.sha256() == known.sha256 => SourceState::Ready(Arc::new(source)),
            Ok(source) => SourceState::Changed(Arc::new(source)),
        });
    }
    let mut lost = Vec::new();
    let loaded = sources.iter().map(|state| {
        state.source().map(|source| Loaded { clips: source.clips.clone(), skeleton: source.skeleton() })
    });
    let library = Library::new(Arc::new(scene.document.clone()), loaded.collect());
    for work in 0..scene.document.works.len() {
        let own = &scene.document.works[work];
        let source = sources.get(own.source).and_then(SourceState::source);
        let Some(source) = source else { continue };
        match source.clips.get(own.clip) {
            Some(clip) => lost.extend(scene.fit(work, &clip.skeleton, &library)),
            None => lost.push(format!(
                "all of `{}`, since the file now has {}",
                own.name,
                counted(source.clips.len(), "clip")
            )),
        }
    }
    Ok(OpenedScene { path, document: scene.document, sources, lost })
}

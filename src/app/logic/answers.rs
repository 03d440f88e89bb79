//! The answers of jobs, taken in between frames.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use egui::Context;

use super::super::bench::{Evaluated, FromClips, Project, Searched, SourceState, file_name};
use super::super::commands::Action;
use super::super::file_picker::{Picked, Purpose};
use super::super::panels::{Dialog, Form, Message};
use super::super::view_models::{CurveKey, CurveSet, HeatMap, HeatWish, TimeWindow};
use super::super::window::Window;
use super::blend::BlendAnswer;
use super::carry::CarryAnswer;
use super::export::Exported;
use super::files::OpenedScene;
use super::limits::Fitted;
use crate::clip::Clip;
use crate::exchange::Source;
use crate::scene::{Edit, Revision, SourceRef};
use crate::skeleton::Skeleton;
use crate::skeleton::roles::Roles;
use crate::snag::Snag;

/// What a job came to.
#[derive(Debug)]
pub(crate) enum Answer {
    /// Clips were read, or not.
    Opened {
        /// The files, or why not.
        result: Result<Vec<Arc<Source>>, String>,
        /// The clip that was asked for by name.
        clip: Option<String>,
    },
    /// A CSV file's columns have to be named by a person.
    NeedsColumns {
        /// The file.
        path: PathBuf,
        /// What its header says.
        names: Vec<String>,
        /// What was missing.
        error: String,
    },
    /// A scene was read, or not.
    SceneOpened(Result<Box<OpenedScene>, String>),
    /// Snags were found.
    Surveyed {
        /// For which project.
        serial: u64,
        /// For which clip.
        work: usize,
        /// What was looked for.
        searched: Box<Searched>,
        /// All of them.
        snags: Arc<Vec<Snag>>,
    },
    /// Limits for the clip's joints were found, or not.
    Limits {
        /// For which project.
        serial: u64,
        /// For which clip.
        work: usize,
        /// They are for a new pass, not for the search.
        is_for_pass: bool,
        /// The limits and what is to be told about them, or why there are none.
        result: Fitted,
    },
    /// Passes were run.
    Evaluated {
        /// For which project.
        serial: u64,
        /// For which clip.
        work: usize,
        /// The result.
        evaluated: Box<Evaluated>,
    },
    /// The turn map.
    Heat(FromClips<HeatWish, Arc<HeatMap>>),
    /// Which joint of a skeleton plays which part.
    Roles(Arc<Skeleton>, Arc<Roles>),
    /// The curves.
    Curves(Vec<FromClips<CurveKey, Arc<CurveSet>>>),
    /// The scene was written, or not.
    Saved {
        /// For which project.
        serial: u64,
        /// The document that was saved.
        revision: Revision,
        /// Where.
        path: PathBuf,
        /// Why not.
        result: Result<(), String>,
    },
    /// Clips were written, or not.
    Exported(Result<Box<Exported>, String>),
    /// Settings were written, or not.
    SettingsKept(Result<(), String>),
    /// A source was found anew, or not.
    Relocated {
        /// For which project.
        serial: u64,
        /// Which source.
        index: usize,
        /// The file, or why not.
        result: Result<Arc<Source>, String>,
    },
    /// A table was read anew with another skeleton, or not.
    Reread {
        /// For which project.
        serial: u64,
        /// Which source.
        index: usize,
        /// The file, or why not.
        result: Result<Arc<Source>, String>,
    },
    /// About a blend or a loop.
    Blend(BlendAnswer),
    /// About a retarget.
    Carry(CarryAnswer),
}

impl Window {
    /// Takes in what has come.
    pub(in super::super) fn take_answers(&mut self, ctx: &Context) {
        while let Some(picked) = self.picker.answer() {
            self.take_picked(picked);
        }
        // Without threads an answer may lead to a next order that is answered at once.
        for _ in 0..8 {
            let answers = self.jobs.drain();
            if answers.is_empty() {
                break;
            }
            for answer in answers {
                self.take_answer(answer, ctx);
            }
            self.order_work();
            ctx.request_repaint();
        }
    }

    fn take_answer(&mut self, answer: Answer, ctx: &Context) {
        match answer {
            Answer::Opened { result, clip } => self.take_opened(result, clip.as_deref()),
            Answer::NeedsColumns { names, error, .. } if names.len() < 5 => self.open_failed(error),
            Answer::NeedsColumns { path, names, .. } => {
                self.form = Form::with_columns(&names);
                self.dialog = Some(Dialog::Columns(path, names));
            }
            Answer::SceneOpened(result) => self.take_scene(result),
            Answer::Limits { serial, work, is_for_pass, result } => {
                self.take_limits(serial, work, is_for_pass, result);
            }
            Answer::Roles(skeleton, roles) => self.bench.roles = Some((skeleton, roles)),
            Answer::Surveyed { serial, work, searched, snags } => {
                if let Some(findings) =
                    self.project_mut(serial).and_then(|project| project.findings.get_mut(work))
                {
                    findings.snags = Some(snags);
                    findings.searched = Some(*searched);
                    findings.search_is_stopped = false;
                }
            }
            Answer::Evaluated { serial, work, evaluated } => {
                let chosen = self.chosen_label();
                let shows_all = self.shows_all_time();
                if let Some(project) = self.project_mut(serial) {
                    let document = Arc::clone(project.document());
                    if let (Some(own), Some(findings)) =
                        (document.works.get(work), project.findings.get_mut(work))
                    {
                        findings.take(*evaluated, &own.passes);
                    }
                }
                self.follow_joint(chosen);
                if let Some(clip) = self.bench.result().filter(|_| shows_all) {
                    // A join or a loop is longer than its source: all of it is shown, if all was.
                    self.bench.session.window = TimeWindow::whole(clip.duration_secs);
                }
            }
            Answer::Heat(heat) => self.bench.heat = Some(heat),
            Answer::Curves(mut curves) => {
                self.bench.more_curves = curves.split_off(curves.len().min(1));
                self.bench.curves = curves.pop();
            }
            Answer::Saved { serial, revision, path, result } => {
                self.take_saved(serial, revision, &path, result, ctx);
            }
            Answer::Exported(result) => self.take_exported(result),
            Answer::SettingsKept(result) => self.take_settings_kept(result),
            Answer::Relocated { serial, index, result } => self.take_relocated(serial, index, result),
            Answer::Reread { serial, index, result } => self.take_reread(serial, index, result),
            Answer::Blend(answer) => self.take_blend(answer),
            Answer::Carry(answer) => self.take_carry(answer),
        }
    }

    /// Whether the charts show the whole clip.
    fn shows_all_time(&self) -> bool {
        let length = self.bench.result().map(|clip| clip.duration_secs);
        length.is_some_and(|length| self.bench.session.window == TimeWindow::whole(length))
    }

    /// The label of the chosen joint, and the clip it belongs to.
    pub(super) fn chosen_label(&self) -> Option<(Arc<Clip>, String)> {
        let (joint, clip) = (self.bench.session.joint?, self.bench.result()?);
        (joint < clip.skeleton.len()).then(|| (Arc::clone(clip), clip.skeleton.label(joint).to_owned()))
    }

    /// Keeps the joint of that label chosen when the result has come to another skeleton.
    fn follow_joint(&mut self, chosen: Option<(Arc<Clip>, String)>) {
        let Some((clip, label)) = chosen else { return };
        let Some(result) = self.bench.result() else { return };
        if !clip.has_skeleton_of(result) {
            self.bench.session.joint = result.skeleton.find(&label);
            self.bench.session.more_joints.clear();
            self.bench.session.curves = self.bench.session.curves.without_choice();
        }
    }

    pub(super) fn project_mut(&mut self, serial: u64) -> Option<&mut Project> {
        self.bench.project.as_mut().filter(|project| project.serial == serial)
    }

    fn take_opened(&mut self, result: Result<Vec<Arc<Source>>, String>, clip: Option<&str>) {
        let sources = match result {
            Ok(sources) => sources,
            Err(error) => {
                self.open_failed(error);
                return;
            }
        };
        if let Some(empty) = sources.iter().find(|source| source.clips.is_empty()) {
            let path = empty.path.display();
            self.open_failed(format!(
                "{path}: expected a clip, found a file without animation; nothing was opened"
            ));
            return;
        }
        let wanted = clip.and_then(|text| sources.first().and_then(|source| source.find_clip(text)));
        let unknown = clip.filter(|_| wanted.is_none());
        let notes: Vec<(String, Vec<String>)> = sources
            .iter()
            .filter(|source| !source.notes.is_empty())
            .map(|source| (file_name(&source.path), source.notes.iter().map(ToString::to_string).collect()))
            .collect();
        for source in &sources {
            self.memory.settings.remember_file(&source.path);
        }
        let project = Project::of_sources(self.take_serial(), sources);
        let several = project.document().works.len() > 1 && wanted.is_none();
        self.show_project(project, wanted.unwrap_or(0));
        if let Some(text) = unknown {
            self.tell(Message::error(format!("expected one of the file's clips, found `{text}`")));
        }
        self.tell_notes(notes);
        self.offer_skeleton();
        if several {
            self.show_dialog(Dialog::ChooseClip);
        }
    }

    /// In the sheet that asked, else as a message.
    fn open_failed(&mut self, error: String) {
        match &self.dialog {
            Some(Dialog::OpenPath | Dialog::Columns(..)) => self.form.fail(error),
            _ => self.tell(Message::error(error)),
        }
    }

    pub(in super::super) fn take_serial(&mut self) -> u64 {
        self.next_serial += 1;
        self.next_serial
    }

    pub(in super::super) fn show_project(&mut self, project: Project, work: usize) {
        self.messages.clear();
        self.dialog = None;
        self.discarded = None;
        self.bench.heat = None;
        self.bench.curves = None;
        self.bench.more_curves = Vec::new();
        self.bench.curve_hand.let_go();
        self.bench.blend = None;
        self.bench.carry = None;
        self.bench.carry_measured = None;
        self.bench.preview = None;
        self.bench.trial = None;
        let clip = project.source_clip(work).cloned();
        self.bench.project = Some(project);
        self.bench.session.turn_to(work, clip.as_deref());
    }

    fn tell_notes(&mut self, notes: Vec<(String, Vec<String>)>) {
        for (file, details) in notes {
            let message = match details.as_slice() {
                [only] => Message::note(format!("{file}: {only}")),
                several => {
                    let count = several.len();
                    let text =
                        format!("{file}: {count} things are odd in this file, the first: {}", several[0]);
                    Message { details, ..Message::note(text) }
                }
            };
            self.tell(message);
        }
    }

    fn take_scene(&mut self, result: Result<Box<OpenedScene>, String>) {
        let opened = match result {
            Ok(opened) => *opened,
            Err(error) => {
                self.open_failed(error);
                return;
            }
        };
        self.memory.settings.remember_file(&opened.path);
        let project =
            Project::of_document(self.take_serial(), opened.document, opened.sources, Some(opened.path));
        let trouble: Vec<Message> = project
            .sources
            .iter()
            .zip(&project.document().sources)
            .filter_map(|(state, known)| {
                let text = match state {
                    SourceState::Ready(_) => return None,
                    SourceState::Missing(why) => why.clone(),
                    SourceState::Changed(_) => {
                        format!("{}: this file has changed since the scene was saved", known.path.display())
                    }
                };
                Some(Message { offer: Some(Action::Relocate), ..Message::error(text) })
            })
            .collect();
        self.show_project(project, 0);
        for message in trouble {
            self.tell(message);
        }
        if !opened.lost.is_empty() {
            let text =
                format!("joints of the scene that its source no longer has: {}", opened.lost.join(", "));
            self.tell(Message::error(text));
        }
    }

    fn take_saved(
        &mut self,
        serial: u64,
        revision: Revision,
        path: &Path,
        result: Result<(), String>,
        ctx: &Context,
    ) {
        if let Err(error) = result {
            self.after_save = None;
            match &self.dialog {
                Some(Dialog::SavePath) => self.form.fail(error),
                _ => self.tell(Message::error(error)),
            }
            return;
        }
        self.memory.settings.remember_file(path);
        let Some(project) = self.project_mut(serial) else { return };
        project.scene_path = Some(path.to_owned());
        if project.history.revision() == revision {
            project.history.mark_saved();
        }
        if self.dialog == Some(Dialog::SavePath) {
            self.dialog = None;
        }
        match self.after_save.take() {
            Some(then) => self.go_on(then, ctx),
            None => self.tell(Message::done(format!("Saved {}", path.display()))),
        }
    }

    fn take_exported(&mut self, result: Result<Box<Exported>, String>) {
        match result {
            Ok(exported) => {
                self.dialog = None;
                let more = exported.beside.iter().chain(&exported.proof);
                let more = more.fold(String::new(), |more, path| more + " and " + &file_name(path));
                let text = format!("Exported {}{more}: {}", exported.path.display(), exported.summary);
                self.tell(Message { details: exported.notes, ..Message::done(text) });
            }
            Err(error) if self.dialog == Some(Dialog::Export) => self.form.fail(error),
            Err(error) => self.tell(Message::error(error)),
        }
    }

    fn take_relocated(&mut self, serial: u64, index: usize, result: Result<Arc<Source>, String>) {
        let source = match result {
            Ok(source) => source,
            Err(error) => {
                self.form.fail(error);
                return;
            }
        };
        let Some(project) = self.project_mut(serial) else { return };
        let works = &project.document().works;
        let needed =
            works.iter().filter(|work| work.source == index).map(|work| work.clip + 1).max().unwrap_or(0);
        if source.clips.len() < needed {
            let found = source.clips.len();
            self.form.fail(format!(
                "{}: expected at least {needed} clips, found {found}; this is another file",
                source.path.display()
            ));
            return;
        }
        let to = SourceRef {
            path: source.path.clone(),
            sha256: source.sha256().to_owned(),
            reading: source.reading.clone(),
        };
        let mut joints = Vec::new();
        if let Some(state) = project.sources.get_mut(index) {
            joints = state.source().map_or_else(Vec::new, |old| new_numbers(old, &source));
            // Undo goes back to what was open.
            project.other_readings.extend(state.source().cloned());
            *state = SourceState::Ready(source);
        }
        for findings in &mut project.findings {
            *findings = super::super::bench::Findings::default();
        }
        self.asked.survey = None;
        self.edit(&Edit::Relocate { source: index, to, joints });
        self.dialog = None;
        self.messages.retain(|message| message.offer.is_none());
        let work = self.bench.session.work;
        let clip = self.bench.source().cloned();
        self.bench.session.turn_to(work, clip.as_deref());
    }

    fn take_reread(&mut self, serial: u64, index: usize, result: Result<Arc<Source>, String>) {
        let source = match result {
            Ok(source) => source,
            Err(error) => {
                self.form.fail(error);
                return;
            }
        };
        let Some(old) =
            self.project_mut(serial).and_then(|project| project.sources.get(index)?.source().cloned())
        else {
            return;
        };
        let named = source.reading.skeleton.as_deref().map(file_name);
        if let (Some(named), Some(clip)) = (&named, source.clips.first())
            && !hangs_together(clip)
        {
            let turned = clip.skeleton.listed().find(|&joint| clip.rotation(joint).is_some());
            let name = turned.map_or("", |joint| clip.skeleton.label(joint));
            self.form.fail(format!(
                "{named}: skeleton: expected joints named as in the table, such as `{name}`, found none of them; name another file"
            ));
            return;
        }
        self.dialog = None;
        if source.reading.skeleton == old.reading.skeleton {
            return;
        }
        let to = SourceRef {
            path: source.path.clone(),
            sha256: source.sha256().to_owned(),
            reading: source.reading.clone(),
        };
        let label =
            named.map_or("Skeleton of the table itself".to_owned(), |name| format!("Skeleton of {name}"));
        let edits = vec![Edit::Relocate { source: index, to, joints: new_numbers(&old, &source) }];
        let notes = source.notes.iter().map(ToString::to_string).collect::<Vec<_>>();
        let name = file_name(&source.path);
        if let Some(project) = self.project_mut(serial) {
            project.other_readings.push(source);
        }
        self.messages.retain(|message| message.offer != Some(Action::TableSkeleton));
        self.edit(&Edit::Together { label, edits });
        if !notes.is_empty() {
            self.tell_notes(vec![(name, notes)]);
        }
    }

    /// The clip on show has other joints: what names joints by number is let go, the rest is looked at as before.
    pub(super) fn show_other_joints(&mut self, chosen: Option<String>) {
        let work = self.bench.session.work;
        let clip = self.bench.source().cloned();
        let (window, at) = (self.bench.session.window, self.bench.session.playback.playhead_secs);
        self.bench.session.turn_to(work, clip.as_deref());
        let session = &mut self.bench.session;
        let joint = chosen.zip(clip).and_then(|(label, clip)| clip.skeleton.find(&label));
        session.joint = joint.or(session.joint);
        session.window = window;
        session.playback.playhead_secs = at;
    }

    /// Asks for the skeleton of a table where none of its joints hangs on another.
    fn offer_skeleton(&mut self) {
        let Some((source, _)) = self.chosen_source().filter(|(source, _)| source.takes_skeleton()) else {
            return;
        };
        let lacks = |clip: &Clip| clip.skeleton.listed().count() > 1 && !hangs_together(clip);
        if self.bench.source().is_some_and(|clip| lacks(clip)) {
            let name = file_name(&source.path);
            let text = format!(
                "{name}: no joint hangs on another, since the table does not say how they hang together"
            );
            self.tell(Message { offer: Some(Action::TableSkeleton), ..Message::note(text) });
        }
    }

    fn take_picked(&mut self, picked: Picked) {
        let first = picked.paths.first().cloned();
        match (picked.purpose, first) {
            (Purpose::Open, Some(_)) => {
                self.commands.push(super::super::commands::Command::OpenFiles(picked.paths));
            }
            (Purpose::Open, None) if picked.is_missing => {
                let folder = self.usual_folder();
                self.dialog = Some(Dialog::OpenPath);
                self.form = Form::with_path(folder);
            }
            // Nothing takes the place of the document.
            (Purpose::Open, None) if self.dialog.is_none() => self.discarded = None,
            (_, Some(path)) => {
                self.form.name(path.display().to_string());
            }
            (_, None) if picked.is_missing => {
                self.form.fail("this desktop offers no file dialog: type the path above");
            }
            _ => {}
        }
    }
}

/// Whether any joint that the clip turns hangs on another, or has one that hangs on it.
fn hangs_together(clip: &Clip) -> bool {
    let skeleton = &clip.skeleton;
    let hangs = |joint| skeleton.parent_joint(joint).is_some() || !skeleton.children(joint).is_empty();
    skeleton.listed().any(|joint| clip.rotation(joint).is_some() && hangs(joint))
}

/// The numbers that a file's joints have once it is read anew, by their labels.
fn new_numbers(old: &Source, new: &Source) -> Vec<Option<usize>> {
    let (Some(old), Some(new)) = (old.skeleton(), new.skeleton()) else { return Vec::new() };
    (0..old.len()).map(|joint| new.find(old.label(joint))).collect()
}

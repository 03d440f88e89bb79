//! Carrying a clip to another skeleton: what the sheet asks for, and the work it takes.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::super::bench::{SourceState, file_name};
use super::super::carry_state::{CarryKey, CarryMeasured, CarryWork};
use super::super::commands::{CarryCommand, CarrySheet};
use super::super::jobs::Slot;
use super::super::panels::{Dialog, Form, Message};
use super::super::places::sheet_file;
use super::super::view_models::{BarMark, Lane, carry_facts, with_hold};
use super::super::window::Window;
use super::answers::Answer;
use super::export::not_written;
use crate::exchange::{self, Guard, OpenOptions, Source, disk, joint_maps};
use crate::proof;
use crate::retarget::{Figure, HoldAt, palm, read_map, write_map};
use crate::scene::{Edit, Evaluation, Library, Others, PassId, PassStep, RetargetPass};
use crate::skeleton::Skeleton;

/// Rows of a joint map by labels.
type Rows = Vec<(Option<String>, Option<String>)>;

/// What a job about retargets came to.
#[derive(Debug)]
pub(crate) enum CarryAnswer {
    /// Figures and map were made ready.
    Facts(u64, Box<CarryWork>),
    /// The whole was carried and measured.
    Measured(u64, Box<CarryMeasured>),
    /// A target file was read, or not.
    Opened(u64, Result<Arc<Source>, String>),
    /// Corrections that were kept for a pair of skeletons; for a new pass onto this source.
    Kept(u64, usize, Result<Rows, String>),
    /// A joint map was read, or not.
    Loaded(u64, Result<Rows, String>),
    /// Something was written, or not.
    Written(Result<String, String>),
}

impl Window {
    pub(super) fn run_carry(&mut self, command: CarryCommand) {
        let habits = &mut self.bench.session.carry;
        match command {
            CarryCommand::Close => {
                habits.is_open = false;
                self.bench.preview = None;
            }
            CarryCommand::Show(pass) => {
                habits.pass = Some(pass);
                habits.is_open = true;
            }
            CarryCommand::ChooseRow(row) => {
                habits.row = row;
                habits.scroll_to_row = row.is_some();
            }
            CarryCommand::ChooseBar(bar) => {
                habits.bar = bar;
                habits.lane = bar.map(|bar| bar.lane).or(habits.lane);
            }
            CarryCommand::ChooseLane(lane) => {
                habits.lane = Some(lane);
                habits.bar = None;
            }
            CarryCommand::Hover(which, joint) => self.pictures.carry_hovered[which] = Some(joint),
            CarryCommand::Look(eye) => habits.eye = eye,
            CarryCommand::Overlay(on) => habits.is_overlaid = on,
            CarryCommand::ShowRest(on) => habits.shows_rest = on,
            CarryCommand::QuestionsOnly(on) => habits.questions_only = on,
            CarryCommand::Ask(sheet) => self.ask_for_carry(sheet),
            CarryCommand::OpenOnto(path) => self.open_onto(path),
            CarryCommand::Onto(onto) => self.carry_onto(onto),
            CarryCommand::Change(pass, step) => {
                let work = self.bench.session.work;
                self.edit(&Edit::ChangePass { work, pass, step: (*step).into() });
            }
            CarryCommand::Preview(pass, step) => self.bench.preview = Some((pass, (*step).into())),
            CarryCommand::Hold(mark, at) => self.hold_hand(mark, at),
            CarryCommand::LoadMap(path) => self.load_map(path),
            CarryCommand::SaveMap(path) => self.save_map(path),
            CarryCommand::KeepMap => self.keep_map(),
            CarryCommand::Export { path, has_proof } => self.export_onto(path, has_proof),
        }
    }

    /// Opens the sheet; without a retarget in the list asks for the target first.
    pub(super) fn retarget(&mut self) {
        if self.bench.carried_pass().is_some() {
            self.bench.session.carry.is_open ^= true;
        } else {
            self.ask_for_carry(CarrySheet::Onto);
        }
    }

    fn ask_for_carry(&mut self, sheet: CarrySheet) {
        let path = match sheet {
            CarrySheet::Onto | CarrySheet::LoadMap => self.usual_folder(),
            CarrySheet::SaveMap => format!("{}joint-map.csv", self.usual_folder()),
            CarrySheet::Export => self.suggested_onto().unwrap_or_else(|| self.usual_folder()),
        };
        self.dialog = Some(Dialog::Carry(sheet));
        self.form = Form::with_path(path);
        self.form.has_proof = sheet == CarrySheet::Export;
    }

    /// `wolf walk.glb` beside the target's file.
    fn suggested_onto(&self) -> Option<String> {
        let (_, pass) = self.bench.carried_pass()?;
        let path = &self.bench.project.as_ref()?.document().sources.get(pass.onto)?.path;
        let name = &self.bench.work()?.name;
        let safe: String = name
            .chars()
            .map(|letter| if letter.is_alphanumeric() || " -_.".contains(letter) { letter } else { '-' })
            .collect();
        let stem = path.file_stem()?.to_string_lossy().into_owned();
        let ending = path.extension()?.to_string_lossy().into_owned();
        Some(path.with_file_name(format!("{stem} {safe}.{ending}")).display().to_string())
    }

    fn open_onto(&mut self, path: PathBuf) {
        let Some(project) = &self.bench.project else { return };
        let serial = project.serial;
        self.jobs.submit(Slot::Open, move |_| {
            let result = exchange::open(&path, &OpenOptions::default());
            let result = result.map_err(|error| error.told()).and_then(|source| {
                if source.skeleton().is_none_or(|skeleton| skeleton.is_empty()) {
                    let path = path.display();
                    return Err(format!("{path}: expected a file with joints, found none"));
                }
                // Taken now, so that the window does not wait for it.
                source.sha256();
                Ok(Arc::new(source))
            });
            Some(Answer::Carry(CarryAnswer::Opened(serial, result)))
        });
    }

    /// By the pass that is shown, else by a new one, with the corrections kept for the two skeletons.
    fn carry_onto(&mut self, onto: usize) {
        let clip = match self.bench.carried_pass() {
            Some((pass, _)) => self.bench.carry_clip(pass).cloned(),
            None => self.bench.result().cloned(),
        };
        let (Some(clip), Some(project)) = (clip, &self.bench.project) else { return };
        let serial = project.serial;
        let skeleton = project.library().skeleton(onto);
        self.jobs.submit(Slot::Carry, move |_| {
            let rows = match (skeleton, joint_maps::folder()) {
                (Some(skeleton), Some(folder)) => {
                    let (source, target) = (Figure::new(&clip.skeleton), Figure::new(&skeleton));
                    let kept = joint_maps::kept(&folder, &source, &target);
                    kept.map_err(|error| error.to_string()).map(|kept| {
                        kept.map_or_else(Vec::new, |(_, rows)| corrections(&source, &target, &rows))
                    })
                }
                _ => Ok(Vec::new()),
            };
            Some(Answer::Carry(CarryAnswer::Kept(serial, onto, rows)))
        });
    }

    fn take_kept(&mut self, onto: usize, rows: Result<Rows, String>) {
        let rows = rows.unwrap_or_else(|error| {
            self.tell(Message::error(error));
            Vec::new()
        });
        let n_rows = rows.len();
        let work = self.bench.session.work;
        if let Some((pass, own)) = self.bench.carried_pass() {
            let step = RetargetPass { onto, rows, roots: [None, None], ..own }.into();
            self.edit(&Edit::ChangePass { work, pass, step });
        } else {
            self.bench.session.carry.pass = self.bench.work().map(crate::scene::ClipWork::next_pass_id);
            let step = RetargetPass { rows, ..RetargetPass::new(onto) }.into();
            self.edit(&Edit::AddPass { work, step, at: usize::MAX });
        }
        let habits = &mut self.bench.session.carry;
        habits.is_open = true;
        habits.row = None;
        habits.bar = None;
        self.dialog = None;
        if n_rows > 0 {
            let text = format!("The joint map kept for these two skeletons is used: {n_rows} corrections");
            self.tell(Message::note(text));
        }
    }

    /// A hand at a point is held where it is now.
    fn hold_hand(&mut self, mark: BarMark, at: HoldAt) {
        let Some((pass, own)) = self.bench.carried_pass() else { return };
        let here = || {
            let Lane::Hand(side) = mark.lane else { return None };
            let facts = self.bench.carry.as_ref()?.facts.as_ref().ok()?;
            let hand = palm(&facts.setting.target, side)?;
            let span = own.hands.get(mark.index)?.span_secs;
            let made = self.bench.carry_made()?;
            let secs = self.bench.session.playback.playhead_secs.clamp(span[0], span[1]);
            Some(made.world_at(secs).get(hand.joint)?.scene_from_joint.transform_point3(hand.offset))
        };
        let at = match at {
            HoldAt::Place(_) => HoldAt::Place(here().unwrap_or_default()),
            other => other,
        };
        let step = with_hold(&own, mark, at).into();
        self.edit(&Edit::ChangePass { work: self.bench.session.work, pass, step });
    }

    fn load_map(&mut self, path: PathBuf) {
        let (Some(project), Some(Ok(facts))) =
            (&self.bench.project, self.bench.carry.as_ref().map(|work| work.facts.clone()))
        else {
            return;
        };
        let serial = project.serial;
        self.jobs.submit(Slot::Carry, move |_| {
            let (source, target) = (&facts.setting.source, &facts.setting.target);
            let text = disk::read(&path).map_err(|error| error.to_string());
            let rows = text.and_then(|bytes| {
                let text = String::from_utf8_lossy(&bytes).into_owned();
                let rows = read_map(&text, &source.skeleton, &target.skeleton);
                rows.map_err(|error| format!("{}: {error}", path.display()))
                    .map(|rows| corrections(source, target, &rows))
            });
            Some(Answer::Carry(CarryAnswer::Loaded(serial, rows)))
        });
    }

    fn save_map(&mut self, path: PathBuf) {
        let Some(Ok(facts)) = self.bench.carry.as_ref().map(|work| work.facts.clone()) else { return };
        self.jobs.submit(Slot::Save, move |_| {
            let setting = &facts.setting;
            let text = write_map(&setting.map, &setting.source, &setting.target);
            let written = disk::write(&path, text.as_bytes()).map_err(|error| error.to_string());
            let written = written.map(|()| format!("Saved the joint map as {}", path.display()));
            Some(Answer::Carry(CarryAnswer::Written(written)))
        });
    }

    fn keep_map(&mut self) {
        let Some(Ok(facts)) = self.bench.carry.as_ref().map(|work| work.facts.clone()) else { return };
        self.jobs.submit(Slot::Save, move |_| {
            let setting = &facts.setting;
            let written = match joint_maps::folder() {
                None => Err("no folder for settings was found: name one in TURNWRIGHT_MAPS".to_owned()),
                Some(folder) => joint_maps::keep(&folder, &setting.map, &setting.source, &setting.target)
                    .map_err(|error| error.to_string()),
            };
            let written = written
                .map(|_| "The next clip of these two skeletons gets this joint map at once".to_owned());
            Some(Answer::Carry(CarryAnswer::Written(written)))
        });
    }

    fn export_onto(&mut self, path: PathBuf, has_proof: bool) {
        let (Some((id, _)), Some(project), Some(own)) =
            (self.bench.carried_pass(), &self.bench.project, self.bench.work())
        else {
            return;
        };
        // What is written and proved is the document, whatever is being dragged.
        let Some((_, pass)) = retarget_in(&own.passes, Some(id)) else { return };
        let source = project.sources.get(pass.onto).and_then(SourceState::source).cloned();
        let Some(source) = source else { return };
        let inputs: Vec<PathBuf> =
            project.document().sources.iter().map(|source| source.path.clone()).collect();
        let names = [inputs.get(own.source), inputs.get(pass.onto)];
        let names = names.map(|path| path.map_or_else(String::new, |path| file_name(path)));
        let (library, work) = (project.library(), self.bench.session.work);
        self.jobs.submit(Slot::Export, move |_| {
            let evaluation = library.evaluate(work)?;
            let guard = Guard { inputs, force: false };
            let fits = source.skeleton().is_some_and(|own| own.len() == evaluation.result.skeleton.len());
            let written = if fits {
                exchange::write_onto(&source, &evaluation.result, &path, &guard)
                    .map_err(|error| not_written(&error))
            } else {
                Err("expected a result on the target's skeleton, found another: a later pass or a switch is in the way".to_owned())
            };
            let written = written.map(|written| {
                let mut notes: Vec<String> = written.notes.iter().map(ToString::to_string).collect();
                let sheet =
                    has_proof.then(|| prove(&evaluation, (id, &pass), &library, &names, &written.path, &guard));
                let beside = match sheet {
                    Some(Ok(sheet)) => format!(" and {}", file_name(&sheet)),
                    Some(Err(why)) => {
                        notes.push(format!("There is no proof sheet: {why}"));
                        String::new()
                    }
                    None => String::new(),
                };
                let notes = if notes.is_empty() { String::new() } else { format!(" ({})", notes.join("; ")) };
                format!("Exported {}{beside}{notes}", file_name(&written.path))
            });
            Some(Answer::Carry(CarryAnswer::Written(written)))
        });
    }

    pub(super) fn take_carry(&mut self, answer: CarryAnswer) {
        let now = self.bench.project.as_ref().map(|project| project.serial);
        match answer {
            CarryAnswer::Facts(serial, work) if now == Some(serial) => self.bench.carry = Some(*work),
            CarryAnswer::Measured(serial, made) if now == Some(serial) => {
                self.bench.carry_measured = Some(*made);
            }
            CarryAnswer::Opened(serial, result) if now == Some(serial) => match result {
                Ok(source) => {
                    if let Some((index, _)) = self.add_source(&source) {
                        self.carry_onto(index);
                    }
                }
                Err(error) => self.carry_failed(error),
            },
            CarryAnswer::Kept(serial, onto, rows) if now == Some(serial) => self.take_kept(onto, rows),
            CarryAnswer::Loaded(serial, rows) if now == Some(serial) => match rows {
                Ok(rows) => {
                    self.dialog = None;
                    if let Some((pass, own)) = self.bench.carried_pass() {
                        let step = RetargetPass { rows, ..own }.into();
                        self.edit(&Edit::ChangePass { work: self.bench.session.work, pass, step });
                    }
                }
                Err(error) => self.carry_failed(error),
            },
            CarryAnswer::Written(Ok(words)) => {
                if matches!(self.dialog, Some(Dialog::Carry(_))) {
                    self.dialog = None;
                }
                self.tell(Message::done(words));
            }
            CarryAnswer::Written(Err(error)) => self.carry_failed(error),
            // Of a project that is no longer open.
            _ => {}
        }
    }

    /// In the sheet that asked, else as a message.
    fn carry_failed(&mut self, error: String) {
        if matches!(self.dialog, Some(Dialog::Carry(_))) {
            self.form.fail(error);
        } else {
            self.tell(Message::error(error));
        }
    }

    /// Orders what the sheet shows.
    pub(super) fn order_carry(&mut self) {
        if !self.bench.session.carry.is_open {
            return;
        }
        let Some((id, pass)) = self.bench.carried_pass() else { return };
        let (Some(clip), Some(project)) = (self.bench.carry_clip(id).cloned(), &self.bench.project) else {
            return;
        };
        let serial = project.serial;
        let library = project.library();
        let skeleton: Option<Arc<Skeleton>> = library.skeleton(pass.onto);
        let key = CarryKey { clip, pass, skeleton };
        if self.bench.carry.as_ref().is_none_or(|known| known.key != key) {
            // A drag asks for others with each frame: what is on its way is let through first.
            let waits = self.asked.carry.as_ref() == Some(&key) || self.bench.preview.is_some();
            if !(waits && self.jobs.is_running(Slot::Carry)) {
                self.asked.carry = Some(key.clone());
                let library = project.library();
                let own = key.clone();
                self.jobs.submit(Slot::Carry, move |_| {
                    let facts = carry_facts(&own.clip, &own.pass, &library).map(Arc::new);
                    Some(Answer::Carry(CarryAnswer::Facts(serial, Box::new(CarryWork { key: own, facts }))))
                });
            }
        }
        // While something is dragged the figures show it; it is measured on letting go.
        let is_measured = self.bench.carry_measured.as_ref().is_some_and(|known| known.key == key);
        let is_asked =
            self.asked.carry_measured.as_ref() == Some(&key) && self.jobs.is_running(Slot::CarryMeasure);
        if is_measured || is_asked || self.bench.preview.is_some() {
            return;
        }
        self.asked.carry_measured = Some(key.clone());
        self.jobs.submit(Slot::CarryMeasure, move |_| {
            let made = key.pass.carried(&key.clip, &library, true);
            let made = made.map(|(clip, report, _)| (Arc::new(clip), Arc::new(report)));
            let made = made.map_err(|error| error.to_string());
            Some(Answer::Carry(CarryAnswer::Measured(serial, Box::new(CarryMeasured { key, made }))))
        });
    }
}

/// Writes the sheet of a retarget beside the written file: carried once more, and measured. `names` are those of the two files.
fn prove(
    evaluation: &Evaluation,
    (id, pass): (PassId, &RetargetPass),
    library: &Library,
    names: &[String; 2],
    written: &Path,
    guard: &Guard,
) -> Result<PathBuf, String> {
    let place = evaluation.stages.iter().position(|stage| stage.pass == id);
    let place = place.ok_or("the retarget is switched off")?;
    let before = place.checked_sub(1).map(|before| &evaluation.stages[before].result);
    let clip = before.unwrap_or(&evaluation.source);
    let (_, report, setting) = pass.carried(clip, library, true).map_err(|error| error.to_string())?;
    let path = sheet_file(written);
    guard.check(&path).map_err(|error| not_written(&error))?;
    let page = proof::retarget_sheet(&path, &report, &setting.map, [&setting.source, &setting.target], names);
    disk::write(&path, page.as_bytes()).map_err(|error| error.to_string())?;
    Ok(path)
}

/// Of a map's rows those that say something else than what is found, by labels.
fn corrections(source: &Figure, target: &Figure, rows: &[crate::retarget::MapRow]) -> Rows {
    let found = crate::retarget::JointMap::automatic(source, target);
    let label =
        |figure: &Figure, joint: Option<usize>| joint.map(|joint| figure.skeleton.label(joint).to_owned());
    rows.iter()
        .filter(|row| match (row.source, row.target) {
            (Some(from), Some(to)) => found.of_target(to).is_none_or(|link| link.source != from),
            _ => true,
        })
        .map(|row| (label(source, row.source), label(target, row.target)))
        .collect()
}

/// The retarget pass among some, with its id.
pub(crate) fn retarget_in(
    passes: &[crate::scene::Pass],
    wanted: Option<PassId>,
) -> Option<(PassId, RetargetPass)> {
    let all = || {
        passes.iter().filter_map(|pass| match &pass.step {
            PassStep::Retarget(own) => Some((pass.id, own.clone())),
            _ => None,
        })
    };
    all().find(|(id, _)| Some(*id) == wanted).or_else(|| all().next())
}

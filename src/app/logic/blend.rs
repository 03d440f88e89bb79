//! Blends and loops: what their panels ask for, and the work it takes.

use std::path::PathBuf;
use std::sync::Arc;

use super::super::bench::file_name;
use super::super::blend_state::{BlendKey, BlendWork};
use super::super::commands::BlendCommand;
use super::super::jobs::Slot;
use super::super::panels::{Dialog, Form, Message};
use super::super::view_models::{BlendFacts, BlendKind, TimeWindow, blend_facts, new_blend};
use super::super::window::Window;
use super::answers::Answer;
use crate::blend::{LoopPart, best_loops};
use crate::exchange::{self, OpenOptions, Source};
use crate::scene::{BlendForm, ClipRef, ClipWork, Edit, Others, PassId, PassStep};

/// What a job about blends came to.
#[derive(Debug)]
pub(crate) enum BlendAnswer {
    /// The two clips were compared.
    Facts {
        /// For which project.
        serial: u64,
        /// What it hangs on, and what it is.
        work: Box<BlendWork>,
    },
    /// A further file was read, or not.
    FileOpened {
        /// For which project.
        serial: u64,
        /// The file, or why not.
        result: Result<Arc<Source>, String>,
    },
    /// A part that closes on itself was looked for.
    LoopFound {
        /// For which project.
        serial: u64,
        /// For which clip and pass.
        place: (usize, PassId),
        /// The best part, or why there is none.
        result: Result<Option<LoopPart>, String>,
    },
}

/// A loop is at least this share of the clip long, where nobody says otherwise.
const LOOP_SHARE: f64 = 0.3;
/// Times at which a seam is looked for, at most.
const LOOP_TIMES: usize = 800;

impl Window {
    pub(super) fn run_blend(&mut self, command: BlendCommand) {
        match command {
            BlendCommand::Add(other, kind) => self.add_blend(other, kind),
            BlendCommand::AskForFile(pass) => self.ask_for_clip(pass, 0),
            BlendCommand::AskForMember(pass, place) => self.ask_for_clip(Some(pass), place),
            BlendCommand::OpenFile(path) => self.open_second(path),
            BlendCommand::Show(pass) => {
                self.bench.session.blend.shown = Some(pass);
                self.bench.session.blend.shows_lane = true;
            }
            BlendCommand::FindLoop(pass) => self.find_loop(pass),
            BlendCommand::SetSoft(soft) => self.bench.session.blend.soft = soft,
        }
    }

    fn ask_for_clip(&mut self, pass: Option<PassId>, place: usize) {
        let folder = self.usual_folder();
        self.bench.session.blend.file_for = pass;
        self.bench.session.blend.file_place = place;
        self.dialog = Some(Dialog::SecondFile);
        self.form = Form::with_path(folder);
    }

    fn add_blend(&mut self, other: ClipRef, kind: BlendKind) {
        let (Some(first), Some(project)) = (self.bench.result().cloned(), &self.bench.project) else {
            return;
        };
        let second = match project.document().work_on(other) {
            Some(work) => project.result_clip(work).cloned(),
            None => None,
        };
        let Some(second) = second else { return };
        let (work, pass) = (self.bench.session.work, self.bench.work().map(ClipWork::next_pass_id));
        let blend = new_blend(other, kind, first.duration_secs, second.duration_secs);
        if matches!(blend.form, BlendForm::Join(_)) {
            // Whoever sees all of the clip sees all of the longer one as soon as it is there.
            self.bench.session.window = TimeWindow::whole(first.duration_secs);
        }
        self.bench.session.blend.shown = pass;
        self.bench.session.blend.shows_lane = true;
        self.dialog = None;
        self.edit(&Edit::AddPass { work, step: blend.into(), at: usize::MAX });
        self.open_pass(pass);
    }

    fn open_second(&mut self, path: PathBuf) {
        let Some(project) = &self.bench.project else { return };
        let serial = project.serial;
        self.jobs.submit(Slot::Open, move |_| {
            let result = exchange::open(&path, &OpenOptions::default());
            let result = result.map_err(|error| error.told()).and_then(|source| {
                if source.clips.is_empty() {
                    let path = path.display();
                    return Err(format!("{path}: expected a clip, found a file without animation"));
                }
                // Taken now, so that the window does not wait for it.
                source.sha256();
                Ok(Arc::new(source))
            });
            Some(Answer::Blend(BlendAnswer::FileOpened { serial, result }))
        });
    }

    fn take_second(&mut self, source: &Arc<Source>) {
        let Some((index, is_new)) = self.add_source(source) else { return };
        if is_new {
            self.tell(Message::done(format!("Opened {} as well", file_name(&source.path))));
        }
        let other = ClipRef { source: index, clip: 0 };
        let waiting = self.bench.session.blend.file_for.take();
        let own = waiting.and_then(|id| Some((id, self.bench.work()?.pass(id)?.step.clone())));
        if let Some((pass, PassStep::Blend(blend))) = own {
            self.dialog = None;
            let place = std::mem::take(&mut self.bench.session.blend.file_place);
            let mut blend = blend;
            match (&mut blend.form, place.checked_sub(1)) {
                (BlendForm::Mean { more, .. }, Some(further)) => match more.get_mut(further) {
                    Some((clip, _)) => *clip = other,
                    None => more.push((other, 1.0)),
                },
                _ => blend.other = other,
            }
            let step = blend.into();
            self.edit(&Edit::ChangePass { work: self.bench.session.work, pass, step });
        } else {
            self.show_dialog(Dialog::Blend);
            self.form.second = Some(other);
        }
    }

    fn find_loop(&mut self, pass: PassId) {
        let (Some(clip), Some(project)) = (self.bench.clip_before(pass).cloned(), &self.bench.project) else {
            return;
        };
        let (serial, place) = (project.serial, (self.bench.session.work, pass));
        self.jobs.submit(Slot::Blend, move |_| {
            let least_secs = LOOP_SHARE * clip.duration_secs;
            let result = best_loops(&clip, least_secs, 1, LOOP_TIMES);
            let result = result.map(|parts| parts.first().copied()).map_err(|error| error.to_string());
            Some(Answer::Blend(BlendAnswer::LoopFound { serial, place, result }))
        });
    }

    pub(super) fn take_blend(&mut self, answer: BlendAnswer) {
        let now = self.bench.project.as_ref().map(|project| project.serial);
        match answer {
            BlendAnswer::Facts { serial, work } if now == Some(serial) => self.bench.blend = Some(*work),
            BlendAnswer::FileOpened { serial, result } if now == Some(serial) => match result {
                Ok(source) => self.take_second(&source),
                Err(error) if self.dialog == Some(Dialog::SecondFile) => self.form.fail(error),
                Err(error) => self.tell(Message::error(error)),
            },
            BlendAnswer::LoopFound { serial, place: (work, pass), result } if now == Some(serial) => {
                let own = self.bench.project.as_ref().and_then(|project| {
                    let own = project.document().works.get(work)?.pass(pass)?;
                    if let PassStep::Loop(own) = &own.step { Some(own.clone()) } else { None }
                });
                match (own, result) {
                    (Some(mut own), Ok(Some(part))) => {
                        own.part_secs = Some([part.from_secs, part.to_secs]);
                        self.edit(&Edit::ChangePass { work, pass, step: own.into() });
                    }
                    (Some(_), Ok(None)) => {
                        self.tell(Message::note(
                            "No part of this clip comes back to where it began".to_owned(),
                        ));
                    }
                    (_, Err(error)) => self.tell(Message::error(error)),
                    (None, Ok(_)) => {}
                }
            }
            // Of a project that is no longer open.
            _ => {}
        }
    }

    /// Orders what the lane shows.
    pub(super) fn order_blend(&mut self) {
        let Some((id, pass)) = self.bench.shown_blend() else { return };
        let (Some(first), Some(project)) = (self.bench.clip_before(id).cloned(), &self.bench.project) else {
            return;
        };
        let (serial, work) = (project.serial, self.bench.session.work);
        let key = BlendKey { first, behind: project.behind(work), pass };
        if self.bench.blend.as_ref().is_some_and(|known| known.key == key) {
            return;
        }
        let is_asked = self.asked.blend.as_ref() == Some(&key) && self.jobs.is_running(Slot::Blend);
        if is_asked {
            return;
        }
        self.asked.blend = Some(key.clone());
        let known: Option<Arc<BlendFacts>> =
            self.bench.blend.as_ref().and_then(|known| known.facts.as_ref().ok().cloned());
        let library = project.library();
        self.jobs.submit(Slot::Blend, move |_| {
            let more = key.pass.form.more().iter().map(|&(clip, _)| library.clip(clip));
            let facts = match (library.clip(key.pass.other), more.collect::<Option<Vec<_>>>()) {
                (Some(given), Some(more)) => {
                    blend_facts(&key.first, &given, &more, &key.pass, known.as_deref()).map(Arc::new)
                }
                (None, _) => Err("the second clip is not open".to_owned()),
                (_, None) => Err("one of the further clips is not open".to_owned()),
            };
            Some(Answer::Blend(BlendAnswer::Facts { serial, work: Box::new(BlendWork { key, facts }) }))
        });
    }
}

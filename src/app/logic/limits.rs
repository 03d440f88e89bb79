//! What snags are looked for with: limits of joints, and the kinds that do not concern every clip.

use std::path::PathBuf;
use std::sync::Arc;

use super::super::commands::LEARNED;
use super::super::jobs::Slot;
use super::super::panels::{Dialog, Form, Message};
use super::super::window::Window;
use super::answers::Answer;
use crate::clip::Clip;
use crate::exchange::limits;
use crate::limit::{LearnOptions, Limits, adult, learned, limb_direction};
use crate::mend::{SurveyOptions, survey};
use crate::scene::{Edit, SearchChoice};
use crate::snag::Progress;

/// Limits and what is to be told about them, or why there are none.
pub(crate) type Fitted = Result<(Arc<Limits>, Option<String>), String>;

/// Where limits come from.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum LimitsFrom {
    /// The preset for adult human figures.
    Adult,
    /// This clip itself, its snags mended.
    Clip,
    /// A file.
    File(PathBuf),
}

impl LimitsFrom {
    /// The limits for a clip and what is to be told about them; `None` when it is told to stop.
    fn fit(&self, clip: &Clip, watch: &dyn Progress) -> Option<Fitted> {
        Some(match self {
            Self::Adult => match adult::limits_for(clip) {
                Ok(own) => Ok((Arc::new(own.limits), Some(adult::CAUTION.to_owned()))),
                Err(why) => Err(why.to_string()),
            },
            Self::Clip => {
                let found = survey(clip, &SurveyOptions::default(), watch).ok()?;
                let mut own = learned(&found.mended, &LearnOptions::default());
                LEARNED.clone_into(&mut own.title);
                Ok((Arc::new(own), without_length(&found.mended)))
            }
            Self::File(path) => match limits::read(path).and_then(|file| file.fit(&clip.skeleton)) {
                Ok((own, missing)) => {
                    let note = format!(
                        "{}: this skeleton has none of these joints: {}",
                        path.display(),
                        missing.join(", ")
                    );
                    Ok((Arc::new(own), (!missing.is_empty()).then_some(note)))
                }
                Err(why) => Err(why.to_string()),
            },
        })
    }
}

/// Tells which joints turn and have no length anywhere: without a limb swing can't be told from twist, so that no limit can be learned.
fn without_length(clip: &Clip) -> Option<String> {
    let turns = |joint: usize| clip.rotation(joint).is_some_and(|track| !track.keys.is_empty());
    let skeleton = &clip.skeleton;
    let bare = skeleton.listed().filter(|&joint| {
        skeleton.parent_joint(joint).is_some() && turns(joint) && limb_direction(skeleton, joint).is_none()
    });
    let names: Vec<&str> = bare.map(|joint| skeleton.label(joint)).collect();
    let (first, more) = (names.first()?, names.len() - 1);
    let whose = if more == 0 { (*first).to_owned() } else { format!("{first} and {more} more") };
    Some(format!("No limit was learned for {whose}: a joint without a length has no swing and twist"))
}

impl Window {
    pub(super) fn set_no_limits(&mut self) {
        let work = self.bench.session.work;
        self.jobs.cancel(Slot::Limits);
        self.edit(&Edit::SetLimits { work, limits: None });
    }

    /// Works limits out; they become part of the scene once they are there.
    pub(super) fn work_out_limits(&mut self, from: LimitsFrom) {
        let clip = self.bench.source().cloned();
        self.submit_limits(from, clip, false);
    }

    /// Works limits out for a pass, which is added once they are there.
    pub(super) fn work_out_limits_pass(&mut self, from: LimitsFrom) {
        let clip = self.bench.result().cloned();
        self.submit_limits(from, clip, true);
    }

    fn submit_limits(&mut self, from: LimitsFrom, clip: Option<Arc<Clip>>, is_for_pass: bool) {
        let Some(clip) = clip else { return };
        let serial = self.bench.project.as_ref().map_or(0, |project| project.serial);
        let work = self.bench.session.work;
        self.jobs.submit(Slot::Limits, move |watch| {
            let result = from.fit(&clip, watch)?;
            Some(Answer::Limits { serial, work, is_for_pass, result })
        });
    }

    pub(super) fn take_limits(&mut self, serial: u64, work: usize, is_for_pass: bool, result: Fitted) {
        if self.project_mut(serial).is_none() {
            return;
        }
        match result {
            Ok((limits, note)) if is_for_pass => {
                if work == self.bench.session.work {
                    self.put_limits(limits);
                }
                if let Some(note) = note {
                    let why = "No limits are set for this clip, so the preset for adults is used";
                    self.tell(Message::note(format!("{why}. {note}")));
                }
            }
            Ok((limits, note)) => {
                self.edit(&Edit::SetLimits { work, limits: Some(limits) });
                if let Some(note) = note {
                    self.tell(Message::note(note));
                }
                if self.dialog == Some(Dialog::LimitsPath) {
                    self.dialog = None;
                }
            }
            Err(error) if self.dialog == Some(Dialog::LimitsPath) => self.form.fail(error),
            Err(error) => self.tell(Message::error(error)),
        }
    }

    pub(super) fn ask_for_limits(&mut self) {
        let folder = self.usual_folder();
        self.dialog = Some(Dialog::LimitsPath);
        self.form = Form::with_path(folder);
    }

    pub(super) fn switch_search(&mut self, is_loop: bool) {
        let Some(own) = self.bench.work().map(|work| work.search) else { return };
        let search = if is_loop {
            SearchChoice { is_loop: !own.is_loop, ..own }
        } else {
            SearchChoice { finds_slides: !own.finds_slides, ..own }
        };
        let work = self.bench.session.work;
        self.edit(&Edit::SetSearch { work, search });
    }
}

//! What the retarget sheet remembers: what is worked out for it, and how it is looked at.

use std::sync::Arc;

use crate::clip::Clip;
use crate::retarget::Report;
use crate::scene::{PassId, PassStep, RetargetPass};
use crate::skeleton::Skeleton;

use super::bench::{Bench, is_same};
use super::logic::retarget_in;
use super::view_models::{BarMark, CarryEye, CarryFacts, Lane};

/// How the sheet is looked at. Not part of the document, not undone.
#[derive(Clone, Debug, Default, PartialEq)]
#[expect(clippy::struct_excessive_bools, reason = "independent switches of one sheet")]
pub struct CarryHabits {
    /// It takes the place of the bench.
    pub is_open: bool,
    /// The pass that it shows; the first retarget of the clip where there is none of that id.
    pub pass: Option<PassId>,
    /// The chosen target joint.
    pub row: Option<usize>,
    /// Rest poses in place of the motion.
    pub shows_rest: bool,
    /// Both figures in one picture.
    pub is_overlaid: bool,
    /// Only rows that are questions.
    pub questions_only: bool,
    /// From where the figures are seen.
    pub eye: CarryEye,
    /// The chosen contact.
    pub bar: Option<BarMark>,
    /// The lane that a new contact goes to.
    pub lane: Option<Lane>,
    /// The list is to bring the chosen row into view.
    pub scroll_to_row: bool,
}

/// What the sheet's numbers hang on.
#[derive(Clone, Debug)]
pub struct CarryKey {
    /// The clip as the passes before leave it.
    pub clip: Arc<Clip>,
    /// The pass, with what is being dragged.
    pub pass: RetargetPass,
    /// The target's skeleton as it is measured now.
    pub skeleton: Option<Arc<Skeleton>>,
}

impl PartialEq for CarryKey {
    fn eq(&self, other: &Self) -> bool {
        let same_skeleton = is_same(self.skeleton.as_ref(), other.skeleton.as_ref());
        Arc::ptr_eq(&self.clip, &other.clip) && same_skeleton && self.pass == other.pass
    }
}

/// What has been worked out for the sheet.
#[derive(Clone, Debug)]
pub struct CarryWork {
    /// Of what.
    pub key: CarryKey,
    /// Figures, map and contacts, or why not.
    pub facts: Result<Arc<CarryFacts>, String>,
}

/// What a retarget came to, and of what.
#[derive(Clone, Debug)]
pub struct CarryMeasured {
    /// Of what.
    pub key: CarryKey,
    /// The clip it gave, and what was measured of it; or why not.
    pub made: Result<(Arc<Clip>, Arc<Report>), String>,
}

impl Bench {
    /// The retarget that the sheet shows, with the parameters that are being dragged.
    pub fn carried_pass(&self) -> Option<(PassId, RetargetPass)> {
        let (id, own) = retarget_in(&self.work()?.passes, self.session.carry.pass)?;
        match &self.preview {
            Some((pass, PassStep::Retarget(shown))) if *pass == id => Some((id, shown.clone())),
            _ => Some((id, own)),
        }
    }

    /// The clip that a retarget gets: what the passes before it leave, as far as they have been run.
    pub fn carry_clip(&self, pass: PassId) -> Option<&Arc<Clip>> {
        let on_before =
            self.work()?.passes.iter().take_while(|own| own.id != pass).filter(|own| own.on).count();
        if on_before == 0 {
            return self.source();
        }
        let evaluation = &self.findings()?.evaluated.as_ref()?.evaluation;
        let place = evaluation.stages.iter().position(|stage| stage.pass == pass);
        let before = place.unwrap_or(on_before).checked_sub(1)?;
        evaluation.stages.get(before).map(|stage| &stage.result)
    }

    /// The clip on the target's skeleton, feet held and all, where it has been worked out for what is shown.
    pub fn carry_made(&self) -> Option<&Arc<Clip>> {
        let (work, measured) = (self.carry.as_ref()?, self.carry_measured.as_ref()?);
        if work.key == measured.key {
            return measured.made.as_ref().ok().map(|(clip, _)| clip);
        }
        // The passes are run while something is dragged; measured it is only then.
        let evaluated = self.findings()?.evaluated.as_ref()?;
        let (id, _) = self.carried_pass()?;
        let own = evaluated.passes.iter().find(|pass| pass.id == id)?;
        let is_shown = matches!(&own.step, PassStep::Retarget(step) if *step == work.key.pass);
        let stage = evaluated.evaluation.stages.iter().find(|stage| stage.pass == id)?;
        // While something is dragged the state of a moment ago is nearer than a pose with nothing held.
        (is_shown || self.preview.is_some()).then_some(&stage.result)
    }
}

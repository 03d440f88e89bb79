//! Blends in the session: which one is looked at, and what has been worked out about it.

use std::sync::Arc;

use crate::clip::Clip;
use crate::scene::{BlendPass, Pass, PassId, PassStep};

use super::bench::{Behind, Bench};
use super::view_models::BlendFacts;

/// How the blend lane is set.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct BlendHabits {
    /// Show the lane where there is a blend.
    pub shows_lane: bool,
    /// Show the two clips as faint figures.
    pub shows_clips: bool,
    /// The pass in the lane; the last blend of the list without.
    pub shown: Option<PassId>,
    /// How many joints above a limb a mask takes along.
    pub soft: usize,
    /// The pass that a file is being chosen for.
    pub file_for: Option<PassId>,
    /// Which of its clips that file is to be: 0 for the second, the next numbers for the further ones of a mean, in their order.
    pub file_place: usize,
}

impl Default for BlendHabits {
    fn default() -> Self {
        Self { shows_lane: true, shows_clips: true, shown: None, soft: 1, file_for: None, file_place: 0 }
    }
}

impl BlendHabits {
    /// For another clip: the habits stay.
    #[must_use]
    pub fn for_another_clip(self) -> Self {
        Self { shown: None, file_for: None, file_place: 0, ..self }
    }
}

/// What an answer about a blend hangs on.
#[derive(Clone, Debug)]
pub struct BlendKey {
    /// The clip that the pass gets.
    pub first: Arc<Clip>,
    /// The other clips that are blended in, and what they need.
    pub behind: Behind,
    /// The pass.
    pub pass: BlendPass,
}

impl PartialEq for BlendKey {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.first, &other.first) && self.pass == other.pass && self.behind == other.behind
    }
}

/// What has been worked out about a blend, or why not.
#[derive(Clone, Debug)]
pub struct BlendWork {
    /// For which.
    pub key: BlendKey,
    /// The facts.
    pub facts: Result<Arc<BlendFacts>, String>,
}

impl Bench {
    /// The blend that the lane shows, with the parameters that are being dragged.
    pub fn shown_blend(&self) -> Option<(PassId, BlendPass)> {
        let passes = &self.work()?.passes;
        let of = |pass: &Pass| match &pass.step {
            PassStep::Blend(blend) => Some((pass.id, blend.clone())),
            _ => None,
        };
        let chosen = self.session.blend.shown.and_then(|id| passes.iter().find(|pass| pass.id == id));
        let (id, own) = chosen.and_then(of).or_else(|| passes.iter().rev().find_map(of))?;
        match &self.preview {
            Some((pass, PassStep::Blend(blend))) if *pass == id => Some((id, blend.clone())),
            _ => Some((id, own)),
        }
    }

    /// The clip that a pass gets, as far as passes have been run.
    pub fn clip_before(&self, pass: PassId) -> Option<&Arc<Clip>> {
        let evaluation = &self.findings()?.evaluated.as_ref()?.evaluation;
        let place = evaluation.stages.iter().position(|stage| stage.pass == pass)?;
        Some(place.checked_sub(1).map_or(&evaluation.source, |before| &evaluation.stages[before].result))
    }

    /// What is known of the blend in the lane; while it is dragged, what was known of it a moment ago.
    pub fn blend_facts(&self) -> Option<&Arc<BlendFacts>> {
        let work = self.blend.as_ref()?;
        let facts = work.facts.as_ref().ok()?;
        let (id, pass) = self.shown_blend()?;
        let same_others = |own: &BlendPass, other: &BlendPass| {
            let clips = |pass: &BlendPass| pass.form.more().iter().map(|&(clip, _)| clip).collect::<Vec<_>>();
            own.other == other.other && clips(own) == clips(other)
        };
        let is_of = same_others(&work.key.pass, &pass) && Arc::ptr_eq(self.clip_before(id)?, &work.key.first);
        is_of.then_some(facts)
    }
}

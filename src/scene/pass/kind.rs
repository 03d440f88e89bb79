//! What every kind of pass can tell and do.

use std::sync::Arc;

use crate::clip::Clip;
use crate::skeleton::Skeleton;

use super::blend::Pair;
use super::error::PassError;
use super::number::PassNumber;
use super::others::{Need, Others};
use super::scope::Scope;

/// What a pass made of a clip.
#[derive(Clone, Debug, PartialEq)]
pub struct Outcome {
    /// The clip after it. It may have other frames or another skeleton than the clip before.
    pub clip: Clip,
    /// What is worth telling, each in one sentence for people: how many keys are left, which joints found no partner.
    pub notes: Vec<String>,
}

impl From<Clip> for Outcome {
    fn from(clip: Clip) -> Self {
        Self { clip, notes: Vec::new() }
    }
}

/// What one run of a pass has worked out and the next can use, with other parameters on the same clips: while a weight is dragged
/// two long clips need not be aligned anew for each frame. It changes no result.
#[derive(Clone, Debug, Default)]
pub struct PassMemory {
    pub(super) pairs: Vec<Pair>,
}

/// One kind of pass: its parameters, and what they do to a clip.
///
/// A pass stays valid when passes before it change: it speaks of joints and seconds, not of keys, wherever it can, and
/// what does not fit the clip it gets is an error of [`PassKind::apply`], which leaves the pass out and tells why.
pub trait PassKind {
    /// A short title for lists.
    fn title(&self) -> String;

    /// What it does, in two sentences at most.
    fn explanation(&self) -> &'static str;

    /// The numbers it runs with, but for its amount and scope, which every kind tells alike.
    fn numbers(&self) -> Vec<PassNumber>;

    /// The clip after this pass. Joints it does not touch stay shared with `clip`, and keys it does not touch keep their
    /// bits. The same parameters on the same clip always give the same bits.
    ///
    /// # Errors
    /// When the pass does not fit the clip (a scene whose source has changed).
    fn apply(&self, clip: &Arc<Clip>, others: &dyn Others) -> Result<Outcome, PassError>;

    /// As [`PassKind::apply`], with what an earlier run of this pass has left in `memory`.
    ///
    /// # Errors
    /// As there.
    fn apply_again(
        &self,
        clip: &Arc<Clip>,
        others: &dyn Others,
        _memory: &mut PassMemory,
    ) -> Result<Outcome, PassError> {
        self.apply(clip, others)
    }

    /// Numbers of the joints it names, of the skeleton it is applied to; a joint may come several times.
    fn joints(&self) -> Vec<usize> {
        Vec::new()
    }

    /// Gives the joints it names other numbers. What names a joint that has none any more is taken out.
    fn renumber(&mut self, _now: &dyn Fn(usize) -> Option<usize>) {}

    /// What it takes from outside its own clip.
    fn needs(&self) -> Vec<Need> {
        Vec::new()
    }

    /// The skeleton of its result, where that is another one than that of the clip before.
    fn skeleton_after(&self, _others: &dyn Others) -> Option<Arc<Skeleton>> {
        None
    }

    /// How much of its change is taken, 0 to 1; `None` where it is taken whole or not at all.
    fn amount(&self) -> Option<f64> {
        None
    }

    /// Takes so much of its change, 0 to 1. Does nothing where [`PassKind::amount`] is `None`.
    fn set_amount(&mut self, _amount: f64) {}

    /// Where it acts; `None` where that is no choice.
    fn scope(&self) -> Option<&Scope> {
        None
    }

    /// The same, to change it.
    fn scope_mut(&mut self) -> Option<&mut Scope> {
        None
    }
}

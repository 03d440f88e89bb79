//! Passes: the ordered, switchable steps from a source clip to the result. One file a kind.

mod mend;

pub use mend::{MendPass, SnagMark};

use crate::clip::Clip;
use crate::mend::MendError;

/// Names a pass for as long as the document lives; never used twice in one clip's list.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct PassId(pub u64);

/// One step of the list.
#[derive(Clone, Debug, PartialEq)]
pub struct Pass {
    /// Its name for edits.
    pub id: PassId,
    /// Whether it takes part.
    pub on: bool,
    /// What it does.
    pub step: PassStep,
}

/// What a pass does.
#[derive(Clone, Debug, PartialEq)]
pub enum PassStep {
    /// Mends snags of one kind.
    Mend(MendPass),
}

impl PassStep {
    /// A short title for lists.
    pub fn title(&self) -> String {
        match self {
            Self::Mend(pass) => pass.title(),
        }
    }

    /// The clip after this step. Joints it does not touch stay shared with `clip`.
    ///
    /// # Errors
    /// When the step does not fit the clip (a scene whose source has changed).
    pub fn apply(&self, clip: &Clip) -> Result<Clip, MendError> {
        match self {
            Self::Mend(pass) => pass.apply(clip),
        }
    }
}

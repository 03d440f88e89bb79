//! Why a pass could not be applied.

use crate::blend::BlendError;
use crate::mend::MendError;
use crate::retarget::RetargetError;

/// A pass that does not fit the clip it is to change. It is left out then.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum PassError {
    /// A mend that does not fit.
    #[error(transparent)]
    Mend(#[from] MendError),
    /// Two clips that can't be blended.
    #[error(transparent)]
    Blend(BlendError),
    /// A joint that the clip does not have.
    #[error("expected one of the clip's {count} joints, found number {joint}")]
    NoSuchJoint {
        /// The joint that was meant.
        joint: usize,
        /// How many there are.
        count: usize,
    },
    /// Another clip that is not open.
    #[error(
        "expected clip {clip} of file {file} (both from 1) to be open and not to need this one itself, found it is not so"
    )]
    NoSuchClip {
        /// Number of the file in the scene, from 1.
        file: usize,
        /// Number of the clip in the file, from 1.
        clip: usize,
    },
    /// A clip that can't be carried over.
    #[error(transparent)]
    Retarget(#[from] RetargetError),
    /// A skeleton that is not open.
    #[error("expected the skeleton of file {file} (from 1), found that file not open or without joints")]
    NoSuchSkeleton {
        /// Number of the file in the scene, from 1.
        file: usize,
    },
    /// A parameter out of its range.
    #[error("{name}: expected {expected}, found {found}")]
    Parameter {
        /// What it is called on screen.
        name: &'static str,
        /// Its range.
        expected: &'static str,
        /// What it is.
        found: f64,
    },
}

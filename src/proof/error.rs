//! Why two clips cannot be compared.

use crate::raster::ImageError;
use crate::snag::Cancelled;

/// Two clips that have nothing to compare.
#[derive(Debug, thiserror::Error)]
pub enum ProofError {
    /// Joints are paired by name, and no name is in both.
    #[error(
        "expected two clips of one skeleton, found no joint name in both ({before} joints before, {after} after, for example `{example_before}` and `{example_after}`)"
    )]
    NoSharedJoints {
        /// Joints of the clip before.
        before: usize,
        /// Joints of the clip after.
        after: usize,
        /// A joint of the clip before.
        example_before: String,
        /// A joint of the clip after.
        example_after: String,
    },
    /// The work was stopped from outside.
    #[error(transparent)]
    Cancelled(#[from] Cancelled),
    /// A picture of the sheet could not be made.
    #[error(transparent)]
    Picture(#[from] ImageError),
}

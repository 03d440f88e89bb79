//! Why a mend could not be made.

/// A snag that does not fit the clip it is to be mended in.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum MendError {
    /// The joint has no turns.
    #[error("joint `{joint}` has no rotation keys, expected some to mend")]
    NoKeys {
        /// Its label, or its number where the skeleton is shorter.
        joint: String,
    },
    /// The keys are not there.
    #[error("joint `{joint}` has {count} keys, expected key {key} among them")]
    NoSuchKey {
        /// Its label.
        joint: String,
        /// How many keys it has.
        count: usize,
        /// The key that was meant.
        key: usize,
    },
    /// No sound key is left to draw from.
    #[error("joint `{joint}` has no sound key to draw the others from")]
    NothingSound {
        /// Its label.
        joint: String,
    },
}

//! Long work tells how far it is and can be stopped.

/// Told by long work how far it is.
pub trait Progress: Sync {
    /// `done` of `total` steps are behind. Gives whether to go on.
    fn report(&self, done: usize, total: usize) -> bool;
}

/// Listens to nothing and never stops the work.
#[derive(Clone, Copy, Debug, Default)]
pub struct Unwatched;

impl Progress for Unwatched {
    fn report(&self, _done: usize, _total: usize) -> bool {
        true
    }
}

/// The work was stopped from outside before it was done.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[error("cancelled")]
pub struct Cancelled;

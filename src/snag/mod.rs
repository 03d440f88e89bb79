//! Finding rotation faults. One file a kind; reads clips, never changes them.

mod finding;
mod kind;
mod progress;

pub use finding::{Remedy, Snag};
pub use kind::{NoSuchKind, SnagKind};
pub use progress::{Cancelled, Progress, Unwatched};

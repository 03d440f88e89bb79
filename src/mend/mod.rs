//! Mending rotation faults. One file a kind; a mend gives a new clip and leaves the old one as it was.

mod error;

pub use error::MendError;

//! The document: sources, passes, undo, and the result they give. Knows nothing of files or screens.

mod document;
mod edit;
mod evaluate;
mod history;
pub mod pass;

pub use document::{ClipWork, Document, SourceRef};
pub use edit::{Edit, EditError};
pub use evaluate::{Evaluation, Evaluator, Stage};
pub use history::{History, Revision, Step};
pub use pass::{MendPass, Pass, PassId, PassStep, SnagMark};

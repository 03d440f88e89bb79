//! The document: sources, passes, undo, and the result they give. Knows nothing of files or screens.

mod document;
mod edit;
mod evaluate;
mod history;
mod library;
mod marker;
pub mod pass;

pub use document::{ClipWork, Document, Reading, SearchChoice, SourceRef};
pub use edit::{Edit, EditError};
pub use evaluate::{Evaluation, Evaluator, Stage};
pub use history::{History, Revision, Step};
pub use library::{Library, Loaded};
pub use marker::{Marker, MarkerChange};
pub use pass::{
    BlendForm, BlendPass, ClipRef, Closing, KeysPass, LimitsPass, LoopPass, MendPass, Need, NoOthers, Others,
    Outcome, Pass, PassError, PassId, PassKind, PassNumber, PassStep, PushPass, ReducePass, ResamplePass,
    RetargetPass, RetargetSetting, Scope, SmoothPass, SnagMark,
};

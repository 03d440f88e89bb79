//! Our own scenes: versioned RON text that refers to its sources by relative path and content hash.

mod error;
mod key_edits;
mod limits;
mod mirror;
mod retarget;
mod scene_file;
mod steps;

pub use error::SceneError;
pub use scene_file::{SceneFile, WorkLabels, from_text, read, to_text, write};

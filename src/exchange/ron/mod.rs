//! Our own scenes: versioned RON text that refers to its sources by relative path and content hash.

mod error;
mod mirror;
mod scene_file;

pub use error::SceneError;
pub use scene_file::{SceneFile, from_text, read, to_text, write};

//! Why a scene could not be read or written.

use std::path::PathBuf;

use super::super::disk::DiskError;

/// A scene that could not be read or written.
#[derive(Debug, thiserror::Error)]
pub enum SceneError {
    /// The file itself.
    #[error(transparent)]
    Disk(#[from] DiskError),
    /// Not text.
    #[error("{path}: expected a scene as UTF-8 text, found a byte that is none at position {at}", path = path.display())]
    NoText {
        /// The file.
        path: PathBuf,
        /// Byte position.
        at: usize,
    },
    /// Not a scene as we write them.
    #[error("{path}: line {line}, column {column}: expected a Turnwright scene, found: {what}", path = path.display())]
    Syntax {
        /// The file.
        path: PathBuf,
        /// Line, from 1.
        line: usize,
        /// Column, from 1.
        column: usize,
        /// What the reader said.
        what: String,
    },
    /// From a later program.
    #[error("{path}: expected scene version {known} or older, found {found}; a newer Turnwright reads it", path = path.display())]
    TooNew {
        /// The file.
        path: PathBuf,
        /// The newest version known here.
        known: u32,
        /// Its version.
        found: u32,
    },
    /// Parts that do not fit each other.
    #[error("{path}: {place}: {what}", path = path.display())]
    Meaning {
        /// The file.
        path: PathBuf,
        /// Where in the scene.
        place: String,
        /// Expected and found.
        what: String,
    },
    /// Could not be put into text.
    #[error("{path}: cannot write the scene: {what}", path = path.display())]
    Encode {
        /// The file.
        path: PathBuf,
        /// What the writer said.
        what: String,
    },
}

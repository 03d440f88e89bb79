//! Why a file of limits could not be read or written.

use std::path::PathBuf;

use super::super::disk::DiskError;

/// A file of limits that could not be read or written.
#[derive(Debug, thiserror::Error)]
pub enum LimitsError {
    /// The file itself.
    #[error(transparent)]
    Disk(#[from] DiskError),
    /// Not text.
    #[error("{path}: expected limits as UTF-8 text, found a byte that is none at position {at}", path = path.display())]
    NoText {
        /// The file.
        path: PathBuf,
        /// Byte position.
        at: usize,
    },
    /// Neither of the two forms.
    #[error("{path}: expected limits that end in .csv or .ron, found {found}", path = path.display())]
    NoForm {
        /// The file.
        path: PathBuf,
        /// Its ending.
        found: String,
    },
    /// A line that is none of limits.
    #[error("{path}: line {line}{joint}: expected {expected}, found {found}", path = path.display(), joint = of_joint(joint.as_deref()))]
    Line {
        /// The file.
        path: PathBuf,
        /// Line, from 1.
        line: usize,
        /// The joint it is about, where that is known.
        joint: Option<String>,
        /// What would do.
        expected: String,
        /// What is there.
        found: String,
    },
    /// From a later program.
    #[error("{path}: expected limits of version {known} or older, found {found}; a newer Turnwright reads them", path = path.display())]
    TooNew {
        /// The file.
        path: PathBuf,
        /// The newest version known here.
        known: u32,
        /// Its version.
        found: u32,
    },
    /// Limits of another skeleton.
    #[error("{path}: expected at least one joint of the clip, found none of its joints among {found}", path = path.display())]
    NoJoint {
        /// The file.
        path: PathBuf,
        /// The joints it names.
        found: String,
    },
    /// Could not be put into text.
    #[error("{path}: cannot write the limits: {what}", path = path.display())]
    Encode {
        /// The file.
        path: PathBuf,
        /// What the writer said.
        what: String,
    },
}

fn of_joint(joint: Option<&str>) -> String {
    joint.map_or_else(String::new, |joint| format!(", joint `{joint}`"))
}

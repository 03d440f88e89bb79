//! What to do about a file that can't be read: the same advice wherever it is told.

use std::io;

use super::disk::DiskError;
use super::ron::SceneError;
use super::source::OpenError;

/// A message that says what to do: what it says already, else the advice.
pub fn with_advice(message: &str, advice: &str) -> String {
    if message.contains("; ") { message.to_owned() } else { format!("{message}; {advice}") }
}

impl OpenError {
    /// The message, and what to do.
    pub fn told(&self) -> String {
        let advice = match self {
            Self::Disk(DiskError::Io { source, .. }) => match source.kind() {
                io::ErrorKind::NotFound => "check its name and folder",
                io::ErrorKind::PermissionDenied => "check who may read it",
                _ => "check the disk",
            },
            Self::Disk(DiskError::Folder(_)) => "name a file in it",
            _ => "put it right there, or export the clip anew",
        };
        with_advice(&self.to_string(), advice)
    }
}

impl SceneError {
    /// The message, and what to do.
    pub fn told(&self) -> String {
        with_advice(&self.to_string(), "open it in a text editor, or save it anew from the window")
    }
}

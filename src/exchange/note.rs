//! What a reader or writer tells when it could go on.

use std::fmt;

/// Something odd in a file that did not stop the work.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Note {
    /// Where: a line, a joint, an accessor.
    pub place: String,
    /// What was expected, what was found, and what was done about it.
    pub text: String,
}

impl Note {
    /// A note about a place.
    pub fn new(place: impl Into<String>, text: impl Into<String>) -> Self {
        Self { place: place.into(), text: text.into() }
    }
}

impl fmt::Display for Note {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: {}", self.place, self.text)
    }
}

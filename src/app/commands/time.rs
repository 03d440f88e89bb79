//! What the turn map, the timeline and the lists ask for.

use std::path::PathBuf;

use super::super::view_models::TimeChoice;

/// The title of limits that were learned from the clip itself.
pub(crate) const LEARNED: &str = "learned from this clip";

/// A wish of the panels over time.
#[derive(Clone, Debug, PartialEq)]
pub enum TimeCommand {
    /// Choose joints and a stretch of time to work on.
    Choose(TimeChoice),
    /// Look for snags with the limits of this file.
    ReadLimits(PathBuf),
    /// Give a marker another name.
    NameMarker(usize, String),
    /// Ask for a marker's name.
    AskMarkerName(usize),
}

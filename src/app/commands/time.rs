//! What the turn map, the timeline and the lists ask for.

use super::super::view_models::TimeChoice;

/// A wish of the panels over time.
#[derive(Clone, Debug, PartialEq)]
pub enum TimeCommand {
    /// Choose joints and a stretch of time to work on.
    Choose(TimeChoice),
}

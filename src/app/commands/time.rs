//! What the turn map, the timeline and the lists ask for.

use std::path::PathBuf;

use super::super::view_models::TimeChoice;
use crate::scene::PassId;

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
    /// Add a pass that acts on the choice.
    AddPass(Offer),
    /// Show the form of a pass, or none.
    OpenPass(Option<PassId>),
    /// Ask for a marker's name.
    AskMarkerName(usize),
}

/// What can be added by hand. Whoever adds a kind of pass puts a line here and a form in
/// `panels/pass_forms`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Offer {
    /// Joints within their limits.
    Limits,
    /// Less noise.
    Smooth,
    /// Fewer keys.
    Reduce,
    /// Another rate.
    Resample,
}

impl Offer {
    /// All, in the order in which they stand in the list of passes.
    pub const ALL: [Self; 4] = [Self::Resample, Self::Limits, Self::Smooth, Self::Reduce];

    /// The words in the menu.
    pub const fn label(self) -> &'static str {
        match self {
            Self::Limits => "Limits",
            Self::Smooth => "Smooth",
            Self::Reduce => "Reduce keys",
            Self::Resample => "Resample",
        }
    }

    /// What it is for, in one sentence.
    pub const fn tooltip(self) -> &'static str {
        match self {
            Self::Limits => "Keep joints within the limits of the scene, or of an adult where it has none",
            Self::Smooth => "Take out what is faster than a cut-off, without delay",
            Self::Reduce => "As few keys as keep every joint within a bound",
            Self::Resample => "A key on each frame of another rate",
        }
    }
}

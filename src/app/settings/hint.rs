//! The hint that each area shows until it is put away.

use serde::{Deserialize, Serialize};

/// An area with a hint.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[expect(missing_docs, reason = "the names of the areas")]
pub enum Hint {
    Skeleton,
    JointSheet,
    TurnMap,
    Curves,
    Snags,
    Passes,
    Transport,
}

impl Hint {
    /// All of them.
    pub const ALL: [Self; 7] = [
        Self::Skeleton,
        Self::JointSheet,
        Self::TurnMap,
        Self::Curves,
        Self::Snags,
        Self::Passes,
        Self::Transport,
    ];

    /// The area's name.
    pub const fn area(self) -> &'static str {
        match self {
            Self::Skeleton => "Skeleton",
            Self::JointSheet => "Joints",
            Self::TurnMap => "Turn map",
            Self::Curves => "Rotation curves",
            Self::Snags => "Snags",
            Self::Passes => "Passes",
            Self::Transport => "Transport",
        }
    }

    /// What to know first.
    pub const fn words(self) -> &'static str {
        match self {
            Self::Skeleton => {
                "Click a limb to choose its joint, drag to look from elsewhere, wheel to come nearer"
            }
            Self::JointSheet => {
                "The numbers of the chosen joint at the playhead, and from which pose they are measured"
            }
            Self::TurnMap => {
                "A row for each joint, bright where it turns fast. Letters are snags: click one to go there"
            }
            Self::Curves => {
                "The turns of the chosen joint. Grey is the source, colour the result; drag to scrub"
            }
            Self::Snags => {
                "What was found wrong. F8 jumps to the next, Ctrl+Enter mends it, Ctrl+Delete leaves it"
            }
            Self::Passes => "The steps from file to result, in their order. Each can be switched off",
            Self::Transport => "Space plays. The bar shows the whole clip; arrows step by a frame",
        }
    }
}

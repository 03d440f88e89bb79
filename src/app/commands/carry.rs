//! What the retarget sheet asks for.

use std::path::PathBuf;

use super::super::view_models::{BarMark, CarryEye, Lane};
use crate::retarget::HoldAt;
use crate::scene::{PassId, RetargetPass};

/// A question of the retarget sheet.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum CarrySheet {
    /// Which file's skeleton is meant.
    Onto,
    /// Which joint map to read.
    LoadMap,
    /// Where to write the joint map.
    SaveMap,
    /// Where to write the target's file with the motion.
    Export,
}

/// About carrying the clip to another skeleton.
#[derive(Clone, Debug)]
pub enum CarryCommand {
    /// Back to the bench.
    Close,
    /// Ask for a file.
    Ask(CarrySheet),
    /// Carry the clip to the skeleton of this file: opened beside those that are open.
    OpenOnto(PathBuf),
    /// Carry the clip to the skeleton of an open file: by the pass that is shown, else by a new one.
    Onto(usize),
    /// Show this pass.
    Show(PassId),
    /// Give the pass other parameters.
    Change(PassId, Box<RetargetPass>),
    /// Show it with other parameters while one is dragged.
    Preview(PassId, Box<RetargetPass>),
    /// Hold a hand elsewhere; a point is where the hand is now.
    Hold(BarMark, HoldAt),
    /// Choose a target joint of the map.
    ChooseRow(Option<usize>),
    /// Choose a contact.
    ChooseBar(Option<BarMark>),
    /// New contacts go there.
    ChooseLane(Lane),
    /// The pointer is over a joint of the source (0) or target (1).
    Hover(usize, usize),
    /// See the figures from elsewhere.
    Look(CarryEye),
    /// Both figures in one picture, or side by side.
    Overlay(bool),
    /// Rest poses, or the motion.
    ShowRest(bool),
    /// List only rows that are questions.
    QuestionsOnly(bool),
    /// Take corrections of the joint map from a file.
    LoadMap(PathBuf),
    /// Write the joint map.
    SaveMap(PathBuf),
    /// Keep the joint map for these two skeletons.
    KeepMap,
    /// Write the target's file with the motion.
    Export {
        /// Where to.
        path: PathBuf,
        /// Whether a proof sheet of the retarget is written beside it.
        has_proof: bool,
    },
}

//! What the blend lane, the forms of blends and loops, and their sheets ask for.

use std::path::PathBuf;

use super::super::view_models::BlendKind;
use crate::scene::{ClipRef, PassId};

/// About blends and loops.
#[derive(Clone, Debug)]
pub enum BlendCommand {
    /// A new blend of the clip on show with another.
    Add(ClipRef, BlendKind),
    /// Ask for a file to take the second clip from: for this pass, or for a new one.
    AskForFile(Option<PassId>),
    /// Ask for a file to take a clip of this pass's mean from: the second (0), one of the further ones, or one more.
    AskForMember(PassId, usize),
    /// Open it beside those that are open.
    OpenFile(PathBuf),
    /// Show this pass in the lane.
    Show(PassId),
    /// Look for the part of the clip that closes on itself best, for this pass.
    FindLoop(PassId),
    /// So many joints above a limb are taken along by its mask.
    SetSoft(usize),
}

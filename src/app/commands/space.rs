//! What can be asked for in the skeleton view.

use std::sync::Arc;

use crate::clip::Clip;

use super::super::session::{Disc, TurnPlanes};
use super::super::view_models::HandTurns;

/// An action of the skeleton view.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
#[expect(missing_docs, reason = "each has its label and its tooltip in the table")]
pub enum SpaceAction {
    Arm(Disc),
    TurnBack,
    TurnOn,
    SmallerStep,
    LargerStep,
    Planes(TurnPlanes),
    ShorterFalloff,
    LongerFalloff,
    FitJoint,
    Mirror,
    Discs,
    Path,
    Neighbours,
    Reach,
    Names,
    Floor,
}

/// What the skeleton view asks for.
#[derive(Clone, Debug)]
pub enum SpaceCommand {
    /// Show what is being dragged by hand; nothing is recorded. The clip is the result the drag began on.
    Try(Box<HandTurns>, Arc<Clip>),
    /// Record what was dragged: one step of the history.
    Turn(Box<HandTurns>, Arc<Clip>),
    /// Show no longer what was being dragged.
    GiveUp,
    /// Turn the chosen joint with a disc, by so many of the set steps.
    Step(Disc, f64),
    /// How long a soft push fades, seconds.
    SetFalloff(f64),
    /// How far keys turn, degrees.
    SetStep(f64),
    /// Frames between neighbouring poses.
    SetNeighbours(usize),
    /// In whose planes the discs lie.
    SetPlanes(TurnPlanes),
}

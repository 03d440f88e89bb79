//! What can be asked for on the rotation curves.

use crate::clip::{PathKind, Spacing};

use super::super::view_models::{KeyChoice, KeyDrag};

/// An action on keys and segments: an entry of the menu *Keys*.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
#[expect(missing_docs, reason = "each has its label and its tooltip in the table")]
pub enum CurveAction {
    Add,
    Delete,
    Cut,
    Copy,
    Paste,
    PasteMirrored,
    ChooseAll,
    ChooseNone,
    ChooseHere,
    ChooseRange,
    ChooseSegment,
    OneSegment,
    MoreAbove,
    MoreBelow,
    NextLine,
    Earlier,
    Later,
    Up,
    Down,
    Tighter,
    Looser,
    Hold,
    Slerp,
    Squad,
    Spline,
    BSpline,
    Even,
    EaseIn,
    EaseOut,
    EaseBoth,
    OtherWay,
    TurnMore,
    TurnLess,
    Smooth,
    Reduce,
    Snap,
    FitValues,
    NearerValues,
    FartherValues,
    ValuesUp,
    ValuesDown,
}

/// What the curves ask for with a place, a number or a gesture.
#[derive(Clone, Debug, PartialEq)]
pub enum CurveCommand {
    /// These keys are the chosen ones.
    Choose(KeyChoice),
    /// This segment is the chosen one: its joint, and where it starts.
    ChooseSegment(Option<(usize, f64)>),
    /// The keyboard moves this curve.
    ChooseLine(usize),
    /// A gesture goes on: show what it would do.
    Try(KeyDrag),
    /// A gesture has come to its end: do it.
    Settle(KeyDrag),
    /// A gesture is given up.
    GiveUp,
    /// Another path for the chosen segments.
    SetPath(PathKind),
    /// Another spacing for the chosen segments.
    SetSpacing(Spacing),
    /// Show these values from bottom to top; `None`: fit them.
    ShowValues(Option<[f64; 2]>),
    /// A soft push reaches so many seconds to either side.
    SetFalloff(f64),
    /// The cut-off of the next smoothing, hertz.
    SetSmoothing(f64),
    /// The bound of the next reduction, degrees.
    SetReduction(f64),
}

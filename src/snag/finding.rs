//! One fault that was found, as data.

use crate::clip::{Foot, Round};
use crate::limit::JointLimit;
use crate::rotor::Rotor;

use super::SnagKind;

/// What the mend of a snag does to the keys `first_key..=last_key` of its joint.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Remedy {
    /// Brings each key to unit length; no pose changes.
    Normalise,
    /// Turns the sign of the stored numbers (and tangents) round; no pose changes at keys.
    Negate,
    /// Takes these whole turns out of the three file angles; no pose changes at keys.
    Unwrap([i32; 3]),
    /// Writes for each key the equal angle triple nearest to the key before it; no pose changes at keys.
    NearestAngles,
    /// Draws the keys anew from the sound motion on both sides.
    Redraw,
    /// Draws the keys anew from the sound motion on both sides and from what the other joints do meanwhile.
    FromOthers,
    /// Smooths the keys, by what the poses around and the other joints tell.
    Smooth {
        /// Deviation of the noise per axis, in radians.
        noise_rad: f64,
        /// The same of the joint's motion where it is sound.
        quiet_rad: f64,
        /// Poses so many keys apart tremble each by itself.
        apart_keys: usize,
    },
    /// Makes the segment between the two keys take the short way.
    ShortWay,
    /// Multiplies each key by this turn on the bone side, `q ← q · offset`, and blends the seams.
    TakeOut(Rotor),
    /// As `TakeOut`, on the parent's side: `q ← offset · q`.
    TakeOutAbove(Rotor),
    /// Bends each key softly from the comfort of this limit to its end, and fades the bend out beside them.
    Clamp(JointLimit),
    /// Closes the loop at this joint, its places too: the whole track changes.
    CloseLoop(LoopClose),
    /// Holds a planted foot by bending its limb: three joints change, at the frames of the plant and beside it.
    Hold(Plant),
    /// Two ways are equally good: only a person can tell. The mend does nothing.
    Ask,
}

impl Remedy {
    /// What it does, in a word or two, as in `--json` and on sheets.
    pub const fn name(&self) -> &'static str {
        match self {
            Self::Normalise => "normalise",
            Self::Negate => "negate",
            Self::Unwrap(_) => "unwrap",
            Self::NearestAngles => "nearest-angles",
            Self::Redraw => "redraw",
            Self::FromOthers => "redraw-from-others",
            Self::Smooth { .. } => "smooth",
            Self::ShortWay => "short-way",
            Self::TakeOut(_) => "take-out",
            Self::TakeOutAbove(_) => "take-out-above",
            Self::Clamp(_) => "clamp",
            Self::CloseLoop(_) => "close-loop",
            Self::Hold(_) => "hold",
            Self::Ask => "ask",
        }
    }
}

/// How a loop is closed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct LoopClose {
    /// How the difference is spread.
    pub form: LoopForm,
    /// What is played round and round.
    pub round: Round,
    /// Whether the rates are made to meet too.
    pub with_rate: bool,
}

/// How the difference between the ends of a loop is spread.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LoopForm {
    /// Evenly over the whole clip.
    Spread,
    /// Near the seam alone.
    Window,
}

/// A foot that stands for a while.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plant {
    /// The foot and its limb.
    pub foot: Foot,
    /// First and last frame with the heel down.
    pub heel: Option<(usize, usize)>,
    /// First and last frame with the ball down.
    pub ball: Option<(usize, usize)>,
    /// Frames before and after in which the foot is free; beyond them nothing changes.
    pub free: (usize, usize),
}

/// One rotation fault that was found.
///
/// Frames and times cover the keys that its mend changes. For a jump in numbers or pose that is the frame after the
/// step up to the last frame before the way back; for a long way the two keys.
#[derive(Clone, Debug, PartialEq)]
pub struct Snag {
    /// What is wrong.
    pub kind: SnagKind,
    /// Which joint of the clip's skeleton.
    pub joint: usize,
    /// First key of the joint's rotation track that is concerned.
    pub first_key: usize,
    /// Last key that is concerned.
    pub last_key: usize,
    /// Frame of the first key.
    pub first_frame: usize,
    /// Frame of the last key.
    pub last_frame: usize,
    /// Time of the first key in seconds.
    pub first_secs: f64,
    /// Time of the last key in seconds.
    pub last_secs: f64,
    /// How large the fault is: the turn, or the step of the angle, in radians.
    pub size_rad: f64,
    /// How sure it is a fault, 0 to 1.
    pub confidence: f64,
    /// What its mend would do.
    pub remedy: Remedy,
    /// Whether the mend may be applied unasked.
    pub safe: bool,
    /// A plain sentence in the user's words.
    pub text: String,
}

impl Snag {
    /// Whether a frame lies inside.
    pub fn covers(&self, frame: usize) -> bool {
        (self.first_frame..=self.last_frame).contains(&frame)
    }
}

//! One fault that was found, as data.

use crate::limit::JointLimit;
use crate::rotor::Rotor;

use super::SnagKind;

/// What the mend of a snag does to the keys `first_key..=last_key` of its joint.
#[derive(Clone, Copy, Debug, PartialEq)]
#[expect(
    clippy::large_enum_variant,
    reason = "a snag is plain data that can be copied; its text is on the heap anyway"
)]
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
    /// Makes the segment between the two keys take the short way.
    ShortWay,
    /// Multiplies each key by this turn on the bone side, `q ← q · offset`, and blends the seams.
    TakeOut(Rotor),
    /// As `TakeOut`, on the parent's side: `q ← offset · q`.
    TakeOutAbove(Rotor),
    /// Bends each key softly from the comfort of this limit to its end, and fades the bend out beside them.
    Clamp(JointLimit),
    /// Two ways are equally good: only a person can tell. The mend does nothing.
    Ask,
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

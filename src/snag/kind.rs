//! The kinds of rotation fault.

use std::fmt;
use std::str::FromStr;

/// One kind of rotation fault, in the order in which faults are mended: each later kind is judged on turns that the
/// earlier kinds no longer disturb.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum SnagKind {
    /// Not finite, or not unit within 1e-3.
    BrokenValue,
    /// Neighbouring stored rotors of opposite sign.
    SignFlip,
    /// A file angle steps by about 360° while the orientation hardly moves.
    Wrap,
    /// A file's angle triple jumps to its mirrored equal.
    MirroredAngles,
    /// Played as stored, a segment turns more than 180° though a short way exists.
    LongWay,
    /// For a run of frames a joint sits about 180° off its neighbours.
    HalfTurn,
    /// One to a few frames lie far off the motion around them.
    Spike,
    /// A joint stands perfectly still inside its motion.
    Stuck,
    /// Noise above the motion's own band.
    Jitter,
    /// Beyond the joint's swing or twist limit.
    PastLimit,
    /// The end of a loop does not meet its start in pose or rate.
    Seam,
    /// A planted foot moves.
    Slide,
}

impl SnagKind {
    /// All kinds, in mending order.
    pub const ALL: [Self; 12] = [
        Self::BrokenValue,
        Self::SignFlip,
        Self::Wrap,
        Self::MirroredAngles,
        Self::LongWay,
        Self::HalfTurn,
        Self::Spike,
        Self::Stuck,
        Self::Jitter,
        Self::PastLimit,
        Self::Seam,
        Self::Slide,
    ];

    /// Whether it is looked for when no kinds are named. A clip need not be a loop, and a foot may be meant to slide.
    pub const fn is_default(self) -> bool {
        !matches!(self, Self::Seam | Self::Slide)
    }

    /// The kinds that are looked for when none are named, in mending order.
    pub fn defaults() -> Vec<Self> {
        Self::ALL.into_iter().filter(|kind| kind.is_default()).collect()
    }

    /// Whether finding it asks nothing of other joints; all these come before all others in mending order.
    pub const fn is_of_joint_alone(self) -> bool {
        matches!(self, Self::BrokenValue | Self::SignFlip | Self::Wrap | Self::MirroredAngles | Self::LongWay)
    }

    /// Whether it is a fault in stored numbers alone, whose mend changes no pose.
    pub const fn keeps_pose(self) -> bool {
        matches!(self, Self::SignFlip | Self::Wrap | Self::MirroredAngles)
    }

    /// Whether it is a fault of the whole clip, which no joint shows by itself.
    pub const fn is_of_clip(self) -> bool {
        matches!(self, Self::Seam | Self::Slide)
    }

    /// The name in files, on the command line and on screen.
    pub const fn name(self) -> &'static str {
        match self {
            Self::BrokenValue => "broken-value",
            Self::SignFlip => "sign-flip",
            Self::Wrap => "wrap",
            Self::MirroredAngles => "mirrored-angles",
            Self::LongWay => "long-way",
            Self::HalfTurn => "half-turn",
            Self::Spike => "spike",
            Self::Stuck => "stuck",
            Self::Jitter => "jitter",
            Self::PastLimit => "past-limit",
            Self::Seam => "seam",
            Self::Slide => "slide",
        }
    }

    /// The letter that marks it on the turn map and in lists, beside its colour.
    pub const fn letter(self) -> char {
        match self {
            Self::BrokenValue => 'B',
            Self::SignFlip => 'F',
            Self::Wrap => 'W',
            Self::MirroredAngles => 'M',
            Self::LongWay => 'L',
            Self::HalfTurn => 'H',
            Self::Spike => 'S',
            Self::Stuck => 'K',
            Self::Jitter => 'J',
            Self::PastLimit => 'P',
            Self::Seam => 'O',
            Self::Slide => 'G',
        }
    }

    /// What is wrong, in one sentence for people.
    pub const fn explanation(self) -> &'static str {
        match self {
            Self::BrokenValue => "A stored value is no rotation: not a number, infinite, or off unit length.",
            Self::SignFlip => {
                "Neighbouring keys store the same turn with opposite signs; players that work on the four numbers turn the long way."
            }
            Self::Wrap => "A stored angle steps by a whole turn while the joint hardly moves.",
            Self::MirroredAngles => {
                "The three stored angles jump to another triple that means the same pose."
            }
            Self::LongWay => "Played as stored, the joint takes the long way round between two keys.",
            Self::HalfTurn => "For a run of frames the joint sits about half a turn off its neighbours.",
            Self::Spike => "One or a few frames lie far off the motion around them.",
            Self::Stuck => {
                "The joint stands perfectly still for a while inside its motion: its signal dropped out."
            }
            Self::Jitter => "The joint trembles: noise above the band of its own motion.",
            Self::PastLimit => "The joint tilts or twists beyond its limit.",
            Self::Seam => "Played in a loop, the end does not meet the start in pose or rate.",
            Self::Slide => "A foot that stands on the ground moves along it.",
        }
    }

    /// What its mend does, in one sentence for people.
    pub const fn mend_explanation(self) -> &'static str {
        match self {
            Self::BrokenValue => "Brings the value to unit length, or bridges the gap from sound neighbours.",
            Self::SignFlip => "Chooses the sign of the keys before it; no pose changes.",
            Self::Wrap => "Takes the whole turn out of the angle; no pose changes at any frame.",
            Self::MirroredAngles => {
                "Writes the equal triple nearest the frames before it; no pose changes at any frame."
            }
            Self::LongWay => "Takes the short way between the two keys.",
            Self::HalfTurn => "Takes the half turn out of the run and blends its seams.",
            Self::Spike => "Draws the frames anew from the sound motion on both sides.",
            Self::Stuck => {
                "Draws the frames anew from the motion on both sides and from what the other joints do meanwhile."
            }
            Self::Jitter => {
                "Smooths the span without delay, by what the poses around and the other joints tell, within a bound."
            }
            Self::PastLimit => {
                "Bends the frames back softly, from where the joint is comfortable to its limit."
            }
            Self::Seam => {
                "Spreads the difference over the clip, or brings it in near the seam where it is large."
            }
            Self::Slide => "Holds the foot at one place by bending its limb.",
        }
    }
}

impl fmt::Display for SnagKind {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}

/// A text that names no snag kind.
#[derive(Debug, thiserror::Error, PartialEq, Eq)]
#[error("expected a snag kind ({known}), found `{found}`", known = known())]
pub struct NoSuchKind {
    /// The text.
    pub found: String,
}

fn known() -> String {
    SnagKind::ALL.map(SnagKind::name).join(", ")
}

impl FromStr for SnagKind {
    type Err = NoSuchKind;

    fn from_str(text: &str) -> Result<Self, NoSuchKind> {
        let named = |kind: &Self| kind.name() == text;
        Self::ALL.into_iter().find(named).ok_or_else(|| NoSuchKind { found: text.to_owned() })
    }
}

//! Path kinds.

use std::sync::Arc;

/// Which orientations a segment passes through on its way from one key to the next.
///
/// Hold, slerp, squad and cubic hang on a segment and its neighbours. A run of neighbouring segments of the kind spline, or
/// B-spline, is one curve: where a spline run gives way to another kind inside the track it has that neighbour's rate there;
/// at the track's own ends, and beside a held segment, it does what [`super::Segments::ends`] says. A B-spline run reaches its end
/// keys, without acceleration. Where no spline is found ([`crate::clip::RotationTrack::spline_faults`]) its run plays as squad.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum PathKind {
    /// The first key is held until the second.
    Hold,
    /// The short arc at constant rate.
    Slerp,
    /// Smooth through the keys, with no jump in rate (Shoemake 1987, in its form for uneven times).
    Squad,
    /// glTF CUBICSPLINE: the four numbers follow a Hermite cubic with the file's tangents, then are made unit. Without
    /// tangents it is slerp.
    Cubic,
    /// Smooth through the keys, with no jump in rate or acceleration (Park & Ravani 1997, Kang & Park 1999).
    Spline,
    /// Smoothing: near the keys, with no jump in rate or acceleration (Kim, Kim & Shin 1995).
    BSpline,
}

impl PathKind {
    /// All kinds, in the order lists show them.
    pub const ALL: [Self; 6] =
        [Self::Hold, Self::Slerp, Self::Squad, Self::Spline, Self::BSpline, Self::Cubic];

    /// The word for lists and for scenes.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Hold => "hold",
            Self::Slerp => "slerp",
            Self::Squad => "squad",
            Self::Cubic => "cubic",
            Self::Spline => "spline",
            Self::BSpline => "b-spline",
        }
    }

    /// The kind of a name.
    pub fn named(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|kind| kind.name() == name)
    }

    /// Whether a segment of this kind can go the other way round or add whole turns.
    pub const fn takes_turns(self) -> bool {
        !matches!(self, Self::Hold | Self::Cubic)
    }
}

/// The path kinds of a track: segment `i` runs from key `i` to key `i + 1`.
#[derive(Clone, Debug, PartialEq)]
pub enum Paths {
    /// The same in every segment.
    Every(PathKind),
    /// One for each segment.
    Each(Arc<[PathKind]>),
}

impl Paths {
    /// The kind of a segment; the last kind listed serves for what lies beyond.
    pub fn of(&self, segment: usize) -> PathKind {
        match self {
            Self::Every(kind) => *kind,
            Self::Each(kinds) => kinds.get(segment).or(kinds.last()).copied().unwrap_or(PathKind::Slerp),
        }
    }

    /// From a list of kinds; one for all where they are alike.
    pub fn from_kinds(kinds: &[PathKind]) -> Self {
        match kinds {
            [] => Self::Every(PathKind::Slerp),
            [first, rest @ ..] if rest.iter().all(|kind| kind == first) => Self::Every(*first),
            _ => Self::Each(kinds.into()),
        }
    }
}

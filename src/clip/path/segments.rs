//! What a segment has beside its path kind.

use std::fmt;
use std::sync::Arc;

use crate::rotor::{Bivector, EndRates};

use super::edit::PathError;
use super::runs::Solutions;
use super::spacing::Spacing;

/// How far round a segment turns, beyond the short way.
///
/// `whole` turns are added in the direction of the short way: 0 is the short way, −1 the other way round, 1 the short way and a
/// whole turn, −2 the other way and a whole turn. With a plane of its own they go round in that one instead, while the
/// short way is gone besides: a wheel that comes back to its pose, or wobbles.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct MeantTurn {
    whole: i32,
    plane: Option<Bivector>,
}

impl MeantTurn {
    /// The most whole turns in one segment.
    pub const MOST: i32 = 1000;
    /// The short way.
    pub const SHORT: Self = Self { whole: 0, plane: None };
    /// The other way round.
    pub const OTHER_WAY: Self = Self { whole: -1, plane: None };

    /// So many whole turns in the direction of the short way. Where the two keys are alike there is none, and the direction is
    /// that of the segment before, else of the one after, else xy.
    ///
    /// # Errors
    /// Beyond [`MeantTurn::MOST`] turns.
    pub fn new(whole: i32) -> Result<Self, PathError> {
        if whole.unsigned_abs() > Self::MOST.unsigned_abs() {
            return Err(PathError::TooManyTurns { found: i64::from(whole), most: i64::from(Self::MOST) });
        }
        Ok(Self { whole, plane: None })
    }

    /// So many whole turns in a plane of the joint's own frame at the first key: positive ones in the plane's sense.
    ///
    /// # Errors
    /// Beyond [`MeantTurn::MOST`] turns, and for a plane of no area.
    pub fn in_plane(whole: i32, plane: Bivector) -> Result<Self, PathError> {
        let unit = plane.normalize_or_zero();
        if !unit.is_finite() || unit == Bivector::ZERO {
            return Err(PathError::NoPlane { found: plane.to_degrees() });
        }
        Ok(Self { plane: Some(unit), ..Self::new(whole)? })
    }

    /// Whole turns beyond the short way.
    pub const fn whole(self) -> i32 {
        self.whole
    }

    /// The plane they go round in, of area 1; `None` for that of the short way.
    pub const fn plane(self) -> Option<Bivector> {
        self.plane
    }

    /// Whether it is the short way.
    pub const fn is_short(self) -> bool {
        self.whole == 0
    }
}

/// What one segment has beside its path kind.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Segment {
    /// How fast along the path.
    pub spacing: Spacing,
    /// How far round.
    pub turn: MeantTurn,
}

impl Segment {
    /// Even, the short way.
    pub const PLAIN: Self = Self { spacing: Spacing::Even, turn: MeantTurn::SHORT };
}

/// What the segments of a track have beside their path kinds, and what its curves do at the track's ends.
///
/// The default is what every file format says: even, the short way.
#[derive(Clone, Default)]
pub struct Segments {
    /// One for each segment; `None`: all plain. What lies beyond the list is plain too.
    each: Option<Arc<[Segment]>>,
    ends: EndRates,
    pub(super) solutions: Solutions,
}

impl Segments {
    /// The most whole turns in one track.
    pub const MOST_TURNS: i64 = 100_000;

    /// One for each segment.
    ///
    /// # Errors
    /// With more than [`Segments::MOST_TURNS`] whole turns in all.
    pub fn new(each: &[Segment], ends: EndRates) -> Result<Self, PathError> {
        let found = each.iter().map(|own| i64::from(own.turn.whole.abs())).sum();
        if found > Self::MOST_TURNS {
            return Err(PathError::TooManyTurns { found, most: Self::MOST_TURNS });
        }
        let each = each.iter().any(|own| *own != Segment::PLAIN).then(|| each.into());
        Ok(Self { each, ends, solutions: Solutions::default() })
    }

    /// That of a segment.
    pub fn of(&self, segment: usize) -> Segment {
        self.each.as_ref().and_then(|each| each.get(segment)).copied().unwrap_or(Segment::PLAIN)
    }

    /// What squad, spline and B-spline do at the track's ends. Squad knows no secant: there it has no acceleration.
    pub const fn ends(&self) -> EndRates {
        self.ends
    }

    /// Whether every segment is even and goes the short way.
    pub const fn are_plain(&self) -> bool {
        self.each.is_none()
    }

    /// Whether some segment goes another than the short way.
    pub fn have_turns(&self) -> bool {
        self.each.as_ref().is_some_and(|each| each.iter().any(|own| !own.turn.is_short()))
    }

    pub(super) const fn each(&self) -> Option<&Arc<[Segment]>> {
        self.each.as_ref()
    }
}

impl PartialEq for Segments {
    fn eq(&self, other: &Self) -> bool {
        self.each == other.each && self.ends == other.ends
    }
}

impl fmt::Debug for Segments {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Segments").field("each", &self.each).field("ends", &self.ends).finish_non_exhaustive()
    }
}

//! How a clip is carried over: what is held, where, when, and within which limits.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, FootPart};
use crate::limit::Limits;
use crate::skeleton::roles::Side;

/// A time in which a part of a foot stands on the ground.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FootContact {
    /// Which foot.
    pub side: Side,
    /// Heel or ball.
    pub part: FootPart,
    /// First and last time in seconds of the clip; the frames nearest to them are meant.
    pub span_secs: [f64; 2],
}

/// Where a hand is held, by the middle of its palm: see [`palm`](super::palm()).
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum HoldAt {
    /// Where it is: at the middle of its places in that time.
    Still,
    /// At a point of the target's scene.
    Place(DVec3),
    /// At the other hand, as far from it and on the side of it as in the source, scaled by the legs. Both hands give way by half.
    OtherHand,
}

/// A time in which a hand is held.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HandHold {
    /// Which hand; with [`HoldAt::OtherHand`] either.
    pub side: Side,
    /// First and last time in seconds of the clip; the frames nearest to them are meant.
    pub span_secs: [f64; 2],
    /// Where.
    pub at: HoldAt,
}

/// The limits that the result keeps to.
#[derive(Clone, Debug, PartialEq)]
pub enum KeptLimits {
    /// The preset for adult figures, put on the target by its roles. A figure that is none gets no limits, which is told.
    Adult,
    /// These, by the target's joints.
    Given(Arc<Limits>),
    /// These, by the source's joints: they are carried over with the clip, by the joint map.
    OfSource(Arc<Limits>),
}

/// How a clip is carried over.
#[derive(Clone, Debug, PartialEq)]
pub struct Options {
    /// Feet that are planted are held where they stand.
    pub plant_feet: bool,
    /// When feet are planted; `None` where the source's clip is to be asked.
    pub feet: Option<Vec<FootContact>>,
    /// Hands that are held, with feet held or not.
    pub hands: Vec<HandHold>,
    /// Limits that joints are brought within after all else, softly.
    pub limits: Option<KeptLimits>,
    /// Directions, tips, slide and the use of limits are measured; that takes about as long as the transfer.
    pub measure: bool,
}

impl Default for Options {
    fn default() -> Self {
        Self { plant_feet: false, feet: None, hands: Vec::new(), limits: None, measure: true }
    }
}

impl Options {
    /// Nothing held and nothing measured.
    pub fn bare() -> Self {
        Self { measure: false, ..Self::default() }
    }
}

/// The frames of a span of seconds, first and last; `None` where it lies outside the clip or is turned round.
pub(super) fn frames_of(clip: &Clip, span_secs: [f64; 2]) -> Option<(usize, usize)> {
    let count = clip.grid.count();
    let [first, last] = span_secs;
    let is_outside = count == 0 || last < clip.grid.time(0) || first > clip.grid.time(count - 1);
    if is_outside || first > last || first.is_nan() || last.is_nan() {
        return None;
    }
    Some((clip.grid.frame(first).min(count - 1), clip.grid.frame(last).min(count - 1)))
}

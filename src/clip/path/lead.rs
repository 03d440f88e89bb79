//! The arc of a segment with its meant turns, and the points on it that smooth paths are led through.

use std::f64::consts::TAU;

use crate::rotor::{Bivector, Motion, Rotor, slerp};

use super::super::rotation_track::RotationTrack;
use super::segments::MeantTurn;

/// Points of a lead are at most this far apart, so that from each the next is the short way on.
const LARGEST_STEP_RAD: f64 = TAU / 3.0;

/// A short way below this, in radians, has no direction but rounding's.
const NO_DIRECTION_RAD: f64 = 1e-6;

/// The arc from one key to the next: the short way, and whole turns besides.
#[derive(Clone, Copy, Debug)]
pub(in super::super) struct Lead {
    start: Rotor,
    end: Rotor,
    /// Plane angles of the short way.
    short: Bivector,
    /// Plane angles of the whole turns.
    spin: Bivector,
    /// How many steps between points.
    pub(in super::super) pieces: usize,
}

impl Lead {
    /// Of a segment from unit rotor `a` to `b`; `direction` is the plane of its turns where neither they nor the keys have one.
    pub(super) fn new(a: Rotor, b: Rotor, turn: MeantTurn, direction: impl FnOnce() -> Bivector) -> Self {
        let short = (a.reverse() * b).plane_angles();
        if turn.is_short() {
            return Self { start: a, end: b, short, spin: Bivector::ZERO, pieces: 1 };
        }
        let own = || if short.length() > NO_DIRECTION_RAD { short.normalize_or_zero() } else { direction() };
        let plane = turn.plane().unwrap_or_else(own);
        let spin = plane * (TAU * f64::from(turn.whole()));
        let pieces = ((short.length() + spin.length()) / LARGEST_STEP_RAD).ceil().max(1.0) as usize;
        Self { start: a, end: b, short, spin, pieces }
    }

    /// The rotation at a share of the way.
    pub(in super::super) fn at(&self, share: f64) -> Rotor {
        if self.pieces == 1 {
            return slerp(self.start, self.end, share).normalize();
        }
        self.motion(share).orientation.normalize()
    }

    /// With rate and acceleration by the share.
    pub(super) fn motion(&self, share: f64) -> Motion {
        let short = Motion {
            rate: self.short,
            ..Motion::still(self.start * Rotor::from_plane_angles(self.short * share))
        };
        if self.spin == Bivector::ZERO {
            return short;
        }
        let spin = Motion { rate: self.spin, ..Motion::still(Rotor::from_plane_angles(self.spin * share)) };
        short * spin
    }

    /// A point on the way: 0 is the first key, [`Lead::pieces`] the second.
    pub(in super::super) fn point(&self, number: usize) -> Rotor {
        if number == 0 {
            self.start
        } else if number == self.pieces {
            self.end
        } else {
            self.at(number as f64 / self.pieces as f64)
        }
    }
}

impl RotationTrack {
    /// The arc of a segment. `sound` gives a key as [`RotationTrack::sound_key`].
    pub(in super::super) fn lead(&self, key: usize, sound: impl Fn(usize) -> Rotor) -> Lead {
        let direction = || {
            let short = |from: usize| (sound(from).reverse() * sound(from + 1)).plane_angles();
            let before = key.checked_sub(1).map(&short);
            let after = (key + 2 < self.keys.len()).then(|| short(key + 1));
            let has_direction = |short: &Bivector| short.length() > NO_DIRECTION_RAD;
            let found = [before, after].into_iter().flatten().find(has_direction);
            found.map_or(Bivector::new(0.0, 0.0, 1.0), Bivector::normalize_or_zero)
        };
        Lead::new(sound(key), sound(key + 1), self.segments.of(key).turn, direction)
    }
}

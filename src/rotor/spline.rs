//! A curve through all keys whose rate and acceleration do not jump anywhere.

use std::f64::consts::PI;

use glam::DVec3;

use super::batch::{Level, Streams, compose, exp, turns_with_rests};
use super::linear::Vector;
use super::slope::{Rests, Slope};
use super::spline_rates::{Segment, rates_at_keys};
use super::{Bivector, Motion, Rotor};

/// Interpolating spline with continuous body rate and acceleration: in each segment the plane angles from its first key
/// are a cubic of time.
///
/// All keys hang together: moving one changes every segment a little, the far ones hardly.
///
/// ```
/// use turnwright::rotor::{Bivector, EndRates, RotationSpline, Rotor, SplineError};
///
/// let key = |degrees| Rotor::from_plane_angles(Bivector::from_degrees(degrees));
/// let keys = [key([0.0; 3]), key([40.0, 0.0, 0.0]), key([40.0, 60.0, 0.0]), key([0.0, 0.0, 110.0])];
/// let spline = RotationSpline::new(&[0.0, 1.0, 1.5, 3.0], &keys, EndRates::Natural)?;
/// // Through the keys, and with one rate and one acceleration on both sides of each.
/// assert!(spline.at(1.5).turn_to(keys[2]) < 1e-14);
/// let [before, after] = [1.5 - 1e-9, 1.5 + 1e-9].map(|secs| spline.acceleration(secs));
/// assert!((after - before).length() < 1e-6);
/// // Many times at once.
/// let times: Vec<f64> = (0..360).map(|frame| f64::from(frame) / 120.0).collect();
/// assert_eq!(spline.at_all(&times).len(), times.len());
/// # Ok::<(), SplineError>(())
/// ```
///
/// Source: Park & Ravani 1997, "Smooth invariant interpolation of rotations", ACM TOG 16(3); Kang & Park 1999, "Cubic
/// spline algorithms for orientation interpolation".
#[derive(Clone, Debug)]
pub struct RotationSpline {
    times: Vec<f64>,
    keys: Vec<Rotor>,
    segments: Vec<Cubic>,
}

/// What the curve does at its two ends.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub enum EndRates {
    /// The mean rate of the first and of the last segment.
    #[default]
    Secant,
    /// No acceleration at the ends.
    Natural,
    /// These body rates in radians per second, at the first and at the last key. Zero for a standstill.
    Given(Bivector, Bivector),
    /// A closed loop: rate and acceleration at the last key are those at the first. The last key should be the same
    /// rotation as the first; where it is not, the turn jumps at the seam and the rates still meet.
    Loop,
    /// Its own for each side.
    Sides(EndRate, EndRate),
}

/// What the curve does at one end.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub enum EndRate {
    /// The mean rate of the segment there.
    #[default]
    Secant,
    /// No acceleration.
    Natural,
    /// This body rate in radians per second.
    Given(Bivector),
}

impl EndRates {
    /// Each end by itself; `None` for a closed loop.
    #[must_use]
    pub const fn sides(self) -> Option<[EndRate; 2]> {
        match self {
            Self::Secant => Some([EndRate::Secant; 2]),
            Self::Natural => Some([EndRate::Natural; 2]),
            Self::Given(first, last) => Some([EndRate::Given(first), EndRate::Given(last)]),
            Self::Sides(first, last) => Some([first, last]),
            Self::Loop => None,
        }
    }
}

/// Why there is no spline through the keys.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SplineError {
    /// A curve needs two keys.
    #[error("expected at least 2 keys, found {found}")]
    TooFewKeys {
        /// Number of keys.
        found: usize,
    },
    /// The two lists have to be of one length.
    #[error("expected as many times as keys, found {times} times and {keys} keys")]
    CountsDiffer {
        /// Number of times.
        times: usize,
        /// Number of keys.
        keys: usize,
    },
    /// Times have to rise from key to key.
    #[error("expected the time of key {key} to be finite and above {before} s, found {found} s")]
    TimesNotRising {
        /// Index of the key.
        key: usize,
        /// Time of the key before, in seconds.
        before: f64,
        /// Its own time, in seconds.
        found: f64,
    },
    /// Rotors have to be finite and of unit length within 1e-6.
    #[error("expected key {key} to be a unit rotor, found length {norm}")]
    NotUnit {
        /// Index of the key.
        key: usize,
        /// Length of its rotor.
        norm: f64,
    },
    /// Half a turn is as short one way as the other, so a key between is needed.
    #[error("expected less than half a turn from key {key} to the next, found {turn_rad} rad")]
    HalfTurn {
        /// Index of the key before the half turn.
        key: usize,
        /// The turn in radians.
        turn_rad: f64,
    },
    /// With turns near 180°, or end rates far beyond what the keys need, the rounds that find the rates may not settle.
    #[error(
        "expected the rates at the keys to settle, they still change by {change} rad/s after {rounds} rounds"
    )]
    NotSettled {
        /// Last change of a rate in radians per second.
        change: f64,
        /// Rounds that were made.
        rounds: usize,
    },
}

/// Rows that are computed together.
const TILE: usize = 64;

impl RotationSpline {
    /// The spline through unit rotors `keys` at `times`, in seconds and rising. The signs of the keys don't matter: each
    /// segment goes the short way, and each key takes the sign that is near the one before.
    ///
    /// # Errors
    /// As [`SplineError`] says. After [`SplineError::NotSettled`] and [`SplineError::HalfTurn`], a [`super::hermite`] through
    /// the same keys will do, whose acceleration jumps at the keys.
    pub fn new(times: &[f64], keys: &[Rotor], ends: EndRates) -> Result<Self, SplineError> {
        check_keys(times, keys)?;
        let mut keys = keys.to_vec();
        for i in 1..keys.len() {
            keys[i] = keys[i].aligned_to(keys[i - 1]);
        }
        let segments = segments(times, &keys)?;
        let rates = rates_at_keys(&segments, ends)?;
        // In the place of the other.
        let segments = segments
            .into_iter()
            .zip(rates.windows(2))
            .map(|(Segment { secs, slope }, rates)| {
                let [start, end] = [rates[0], rates[1]].map(DVec3::from);
                Cubic::new(secs, slope.angles.into(), start, slope.change(end))
            })
            .collect();
        Ok(Self { times: times.to_vec(), keys, segments })
    }

    /// The rotation at time `t` in seconds, at the keys exactly theirs. Before the first and after the last key it stands
    /// still.
    #[must_use]
    pub fn at(&self, t: f64) -> Rotor {
        let (segment, s) = self.segment_at(t);
        if t >= self.times[segment + 1] {
            return self.keys[segment + 1];
        }
        let angles = self.segments[segment].angles(s);
        self.keys[segment] * Rotor::from_plane_angles(Bivector::from_axis(angles))
    }

    /// [`RotationSpline::at`] for each of `times`, several times as fast for many, chiefly where they rise: within 2e-15 rad of it.
    #[must_use]
    pub fn at_all(&self, times: &[f64]) -> Vec<Rotor> {
        let mut found = Vec::with_capacity(times.len());
        let mut angles = Streams::zeros(TILE);
        let (mut starts, mut turns, mut results) =
            (Streams::zeros(TILE), Streams::zeros(TILE), Streams::zeros(TILE));
        let level = Level::best();
        let mut near = 0;
        for tile in times.chunks(TILE) {
            for (row, &t) in tile.iter().enumerate() {
                // Mostly it is the segment of the time before, or the next.
                let holds = |segment: usize| self.times[segment] <= t && t < self.times[segment + 1];
                if !holds(near) {
                    near = (near + 1).min(self.segments.len() - 1);
                    if !holds(near) {
                        near = self.segment_at(t).0;
                    }
                }
                let (start, end) = (self.times[near], self.times[near + 1]);
                // At the last key and behind it that key itself.
                let (key, s) = if t >= end { (near + 1, 0.0) } else { (near, t.max(start).min(end) - start) };
                let Rotor { s: scalar, yz, zx, xy } = self.keys[key];
                starts.set(row, [scalar, yz, zx, xy]);
                angles.set(row, self.segments[near].angles(s).to_array());
            }
            let rows = 0..tile.len();
            exp(
                level,
                angles.parts().map(|stream| &stream[rows.clone()]),
                turns.parts_mut().map(|stream| &mut stream[rows.clone()]),
            );
            compose(
                level,
                starts.parts().map(|stream| &stream[rows.clone()]),
                turns.parts().map(|stream| &stream[rows.clone()]),
                results.parts_mut().map(|stream| &mut stream[rows.clone()]),
            );
            let [s, yz, zx, xy] = results.parts();
            found.extend(rows.map(|row| Rotor::new(s[row], yz[row], zx[row], xy[row])));
        }
        found
    }

    /// The body rate at time `t` in radians per second; outside the keys, that at the nearest key.
    #[must_use]
    pub fn rate(&self, t: f64) -> Bivector {
        let (segment, s) = self.segment_at(t);
        let cubic = &self.segments[segment];
        Bivector::from_axis(Slope::of(cubic.angles(s)).rate(cubic.first(s)))
    }

    /// The change of the body rate at time `t` in radians per second squared; outside the keys, that at the nearest key.
    #[must_use]
    pub fn acceleration(&self, t: f64) -> Bivector {
        let (segment, s) = self.segment_at(t);
        let cubic = &self.segments[segment];
        Bivector::from_axis(Slope::of(cubic.angles(s)).acceleration(cubic.first(s), cubic.second(s)))
    }

    /// Rotation, rate and acceleration at time `t` in seconds, as [`RotationSpline::at`], [`RotationSpline::rate`] and
    /// [`RotationSpline::acceleration`] give them.
    #[must_use]
    pub fn motion_at(&self, t: f64) -> Motion {
        let (segment, s) = self.segment_at(t);
        let cubic = &self.segments[segment];
        let angles = [cubic.angles(s), cubic.first(s), cubic.second(s)].map(Bivector::from_axis);
        Motion { orientation: self.at(t), ..Motion::turning(angles[0], angles[1], angles[2]) }
    }

    /// The segment that holds `t`, and the seconds since its start.
    fn segment_at(&self, t: f64) -> (usize, f64) {
        let last = self.segments.len() - 1;
        let segment = self.times.partition_point(|key_time| *key_time <= t).saturating_sub(1).min(last);
        let (start, end) = (self.times[segment], self.times[segment + 1]);
        // `max` and `min` also make the start out of a NaN.
        (segment, t.max(start).min(end) - start)
    }
}

/// Radians below a half turn from which on the direction of the short way is rounding.
const HALF_TURN_MARGIN: f64 = 1e-6;

pub(super) fn check_keys(times: &[f64], keys: &[Rotor]) -> Result<(), SplineError> {
    if times.len() != keys.len() {
        return Err(SplineError::CountsDiffer { times: times.len(), keys: keys.len() });
    }
    if keys.len() < 2 {
        return Err(SplineError::TooFewKeys { found: keys.len() });
    }
    let mut before = f64::NEG_INFINITY;
    for (key, (&found, rotor)) in times.iter().zip(keys).enumerate() {
        if !(found.is_finite() && found > before) {
            return Err(SplineError::TimesNotRising { key, before, found });
        }
        before = found;
        let norm = rotor.norm();
        if (norm - 1.0).abs() <= 1e-6 {
            continue;
        }
        return Err(SplineError::NotUnit { key, norm });
    }
    Ok(())
}

/// The stretches between keys that are near each other in sign.
fn segments(times: &[f64], keys: &[Rotor]) -> Result<Vec<Segment>, SplineError> {
    /// The square of the longest turn.
    const MOST: f64 = (PI - HALF_TURN_MARGIN) * (PI - HALF_TURN_MARGIN);
    let mut segments = Vec::with_capacity(keys.len() - 1);
    let (mut starts, mut ends, mut found) =
        (Streams::zeros(TILE), Streams::zeros(TILE), Streams::zeros(TILE));
    let level = Level::best();
    for first in (0..keys.len() - 1).step_by(TILE) {
        let keys = &keys[first..keys.len().min(first + TILE + 1)];
        for (row, pair) in keys.windows(2).enumerate() {
            starts.set(row, [pair[0].s, pair[0].yz, pair[0].zx, pair[0].xy]);
            ends.set(row, [pair[1].s, pair[1].yz, pair[1].zx, pair[1].xy]);
        }
        let rows = 0..keys.len() - 1;
        turns_with_rests(
            level,
            starts.parts().map(|stream| &stream[rows.clone()]),
            ends.parts().map(|stream| &stream[rows.clone()]),
            found.parts_mut().map(|stream| &mut stream[rows.clone()]),
        );
        let parts = found.parts();
        for row in rows {
            let [x, y, z, cosine, sine, cotangent, across, twice_across] = parts.map(|stream| stream[row]);
            let angles = Vector([x, y, z]);
            let square = angles.dot(angles);
            if square > MOST {
                return Err(SplineError::HalfTurn { key: first + row, turn_rad: square.sqrt() });
            }
            let secs = times[first + row + 1] - times[first + row];
            let rests = Rests { cosine, sine, cotangent, across, twice_across };
            segments.push(Segment { secs, slope: Slope { angles, rests } });
        }
    }
    Ok(segments)
}

/// Plane angles as a cubic of the seconds since the start of a segment: the factors of s, s² and s³.
#[derive(Clone, Copy, Debug)]
struct Cubic([DVec3; 3]);

impl Cubic {
    /// From the length of the segment, the angles at its end, and their slopes at the start and at the end.
    fn new(secs: f64, end: DVec3, slope_at_start: DVec3, slope_at_end: DVec3) -> Self {
        let mean = end / secs;
        Self([
            slope_at_start,
            (3.0 * mean - 2.0 * slope_at_start - slope_at_end) / secs,
            (slope_at_start + slope_at_end - 2.0 * mean) / (secs * secs),
        ])
    }

    fn angles(&self, s: f64) -> DVec3 {
        let Self([a, b, c]) = *self;
        (a + (b + c * s) * s) * s
    }

    fn first(&self, s: f64) -> DVec3 {
        let Self([a, b, c]) = *self;
        a + (2.0 * b + 3.0 * c * s) * s
    }

    fn second(&self, s: f64) -> DVec3 {
        let Self([_, b, c]) = *self;
        2.0 * b + 6.0 * c * s
    }
}

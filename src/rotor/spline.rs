//! A curve through all keys whose rate and acceleration do not jump anywhere.

use std::f64::consts::PI;

use glam::{DMat3, DVec3};

use super::batch::{Level, Streams, compose, exp};
use super::slope::{inverse_jacobian, jacobian, turning_term};
use super::{Bivector, Motion, Rotor};

/// Interpolating spline with continuous body rate and acceleration: in each segment the plane angles from its first key
/// are a cubic of time.
///
/// All keys hang together: moving one changes every segment a little, the far ones hardly.
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
        let secs: Vec<f64> = times.windows(2).map(|pair| pair[1] - pair[0]).collect();
        let arcs: Vec<DVec3> =
            keys.windows(2).map(|pair| (pair[0].reverse() * pair[1]).plane_angles().axis()).collect();
        if let Some(key) = arcs.iter().position(|arc| arc.length() > PI - HALF_TURN_MARGIN) {
            return Err(SplineError::HalfTurn { key, turn_rad: arcs[key].length() });
        }
        let rates = rates_at_keys(&secs, &arcs, ends)?;
        let segments = (0..secs.len())
            .map(|i| Cubic::new(secs[i], arcs[i], rates[i], inverse_jacobian(arcs[i]) * rates[i + 1]))
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
        const TILE: usize = 128;
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
        Bivector::from_axis(jacobian(cubic.angles(s)) * cubic.first(s))
    }

    /// The change of the body rate at time `t` in radians per second squared; outside the keys, that at the nearest key.
    #[must_use]
    pub fn acceleration(&self, t: f64) -> Bivector {
        let (segment, s) = self.segment_at(t);
        let cubic = &self.segments[segment];
        let angles = cubic.angles(s);
        Bivector::from_axis(jacobian(angles) * cubic.second(s) + turning_term(angles, cubic.first(s)))
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

/// Body rates at the keys, so that the acceleration does not jump at any inner one.
///
/// The condition is linear in the rates but for one term; so the linear part is solved again and again with that
/// term from the round before.
fn rates_at_keys(secs: &[f64], arcs: &[DVec3], ends: EndRates) -> Result<Vec<DVec3>, SplineError> {
    /// 3 to 8 are usual; near half turns it takes many more.
    const MOST_ROUNDS: usize = 1000;
    /// Of 200 000 random curves with steps up to 178° all settle with this; with full steps alone up to 3 in 2000 did not.
    const SMALLEST_SHARE: f64 = 0.2;
    let n = secs.len();
    // The secants are also a good first guess for the keys within.
    let mut rates: Vec<DVec3> = std::iter::once(arcs[0] / secs[0])
        .chain((1..n).map(|i| 0.5 * (arcs[i - 1] / secs[i - 1] + arcs[i] / secs[i])))
        .chain(std::iter::once(arcs[n - 1] / secs[n - 1]))
        .collect();
    let ends = ends.sides();
    if let Some(sides) = ends {
        for (key, side) in [(0, sides[0]), (n, sides[1])] {
            if let EndRate::Given(rate) = side {
                rates[key] = rate.axis();
            }
        }
        if n == 1 && !sides.contains(&EndRate::Natural) {
            return Ok(rates);
        }
    }
    let (mut change, mut share) = (f64::INFINITY, 1.0_f64);
    for round in 1..=MOST_ROUNDS {
        let next = match ends {
            Some(sides) => solve_open(secs, arcs, &rates, sides),
            None => solve_loop(secs, arcs, &rates),
        };
        let size = next.iter().fold(0.0, |size: f64, rate| size.max(rate.length()));
        // `max` passes over NaN, and a length overflows long before its parts do.
        if !(next.iter().all(|rate| rate.is_finite()) && size.is_finite()) {
            return Err(SplineError::NotSettled { change: f64::INFINITY, rounds: round });
        }
        let moved = next.iter().zip(&rates).fold(0.0, |moved: f64, (a, b)| moved.max((*a - *b).length()));
        // Rounding may keep it moving a little for ever: there, it is done when it moves no less than before.
        if moved <= 1e-15 * size || (moved <= 1e-12 * size && moved >= change) {
            return Ok(next);
        }
        // Where it swings to and fro, a part of the way leads on.
        if moved >= change {
            share = (share * 0.8).max(SMALLEST_SHARE);
        }
        for (rate, next) in rates.iter_mut().zip(next) {
            *rate += (next - *rate) * share;
        }
        change = moved;
    }
    Err(SplineError::NotSettled { change, rounds: MOST_ROUNDS })
}

/// One condition: `lower · rate before + diagonal · own rate + upper · rate after = right`.
struct Row {
    lower: DMat3,
    diagonal: DMat3,
    upper: DMat3,
    right: DVec3,
}

impl Row {
    /// The acceleration does not jump where segment `before` gives way to segment `after`, at a key of the rate `rate` so far.
    fn inner(secs: &[f64], arcs: &[DVec3], before: usize, after: usize, rate: DVec3) -> Self {
        let (secs_before, secs_after) = (secs[before], secs[after]);
        let right = 6.0
            * (arcs[before] / (secs_before * secs_before) + arcs[after] / (secs_after * secs_after))
            - turning_term(arcs[before], inverse_jacobian(arcs[before]) * rate);
        Self {
            lower: jacobian(arcs[before]) * (2.0 / secs_before),
            diagonal: DMat3::from_diagonal(DVec3::splat(4.0 * (1.0 / secs_before + 1.0 / secs_after))),
            upper: inverse_jacobian(arcs[after]) * (2.0 / secs_after),
            right,
        }
    }

    /// The rate itself is known.
    fn known(rate: DVec3) -> Self {
        Self { lower: DMat3::ZERO, diagonal: DMat3::IDENTITY, upper: DMat3::ZERO, right: rate }
    }

    /// No acceleration at the start of the first segment.
    fn natural_start(secs: f64, arc: DVec3) -> Self {
        let diagonal = DMat3::from_diagonal(DVec3::splat(2.0));
        Self { lower: DMat3::ZERO, diagonal, upper: inverse_jacobian(arc), right: 3.0 * arc / secs }
    }

    /// No acceleration at the end of the last segment, where the rate is `rate` so far.
    fn natural_end(secs: f64, arc: DVec3, rate: DVec3) -> Self {
        let right = 6.0 * arc / secs - secs * turning_term(arc, inverse_jacobian(arc) * rate);
        let diagonal = DMat3::from_diagonal(DVec3::splat(4.0));
        Self { lower: jacobian(arc) * 2.0, diagonal, upper: DMat3::ZERO, right }
    }
}

/// One round with two ends: the block tridiagonal system by elimination from the first to the last key and back.
fn solve_open(secs: &[f64], arcs: &[DVec3], rates: &[DVec3], [start, end]: [EndRate; 2]) -> Vec<DVec3> {
    let n = secs.len();
    let row = |key: usize| match key {
        0 if start == EndRate::Natural => Row::natural_start(secs[0], arcs[0]),
        key if key == n && end == EndRate::Natural => Row::natural_end(secs[n - 1], arcs[n - 1], rates[n]),
        // Known rates stand in the guess.
        key if key == 0 || key == n => Row::known(rates[key]),
        key => Row::inner(secs, arcs, key - 1, key, rates[key]),
    };
    // For each key, `rate = constant − factor · rate of the next`.
    let mut eliminated: Vec<(DMat3, DVec3)> = Vec::with_capacity(n + 1);
    for key in 0..=n {
        let Row { lower, diagonal, upper, right } = row(key);
        let (pivot, right) = match eliminated.last() {
            None => (diagonal, right),
            Some(&(factor, constant)) => (diagonal - lower * factor, right - lower * constant),
        };
        let inverse = pivot.inverse();
        eliminated.push((inverse * upper, inverse * right));
    }
    let mut next = vec![DVec3::ZERO; n + 1];
    let mut after = DVec3::ZERO;
    for (rate, (factor, constant)) in next.iter_mut().zip(eliminated).rev() {
        after = constant - factor * after;
        *rate = after;
    }
    next
}

/// One round in a closed loop: every other rate is told by that at the seam, and the condition at the seam tells that one.
fn solve_loop(secs: &[f64], arcs: &[DVec3], rates: &[DVec3]) -> Vec<DVec3> {
    let n = secs.len();
    // For each inner key, `rate = constant − factor · rate of the next − seam · rate at the seam`.
    let mut eliminated: Vec<(DMat3, DMat3, DVec3)> = Vec::with_capacity(n);
    for (key, &rate) in rates.iter().enumerate().take(n).skip(1) {
        let Row { lower, diagonal, upper, right } = Row::inner(secs, arcs, key - 1, key, rate);
        let (pivot, seam, right) = match eliminated.last() {
            None => (diagonal, lower, right),
            Some(&(factor, seam, constant)) => {
                (diagonal - lower * factor, lower * seam * -1.0, right - lower * constant)
            }
        };
        let inverse = pivot.inverse();
        eliminated.push((inverse * upper, inverse * seam, inverse * right));
    }
    // From the seam back: `rate = constant − seam · rate at the seam`; the seam itself is −1 of it.
    let mut by_seam = vec![(DVec3::ZERO, DMat3::IDENTITY * -1.0); n + 1];
    for key in (1..n).rev() {
        let (factor, seam, constant) = eliminated[key - 1];
        let (after_constant, after_seam) = by_seam[key + 1];
        by_seam[key] = (constant - factor * after_constant, seam - factor * after_seam);
    }
    let Row { lower, diagonal, upper, right } = Row::inner(secs, arcs, n - 1, 0, rates[0]);
    let ((before, before_seam), (after, after_seam)) = (by_seam[n - 1], by_seam[1]);
    let pivot = diagonal - lower * before_seam - upper * after_seam;
    let seam = pivot.inverse() * (right - lower * before - upper * after);
    by_seam.into_iter().map(|(constant, factor)| constant - factor * seam).collect()
}

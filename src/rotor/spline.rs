//! A curve through all keys whose rate and acceleration do not jump anywhere.

use std::f64::consts::PI;

use glam::{DMat3, DVec3};

use super::{Bivector, Rotor};

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
    /// These body rates in radians per second, at the first and at the last key. Zero for a standstill.
    Given(Bivector, Bivector),
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

fn check_keys(times: &[f64], keys: &[Rotor]) -> Result<(), SplineError> {
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
    if let EndRates::Given(first, last) = ends {
        (rates[0], rates[n]) = (first.axis(), last.axis());
    }
    if n == 1 {
        return Ok(rates);
    }
    let (mut change, mut share) = (f64::INFINITY, 1.0_f64);
    for round in 1..=MOST_ROUNDS {
        let next = solve_round(secs, arcs, &rates);
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

/// One round: the block tridiagonal system by elimination from the first to the last key and back.
fn solve_round(secs: &[f64], arcs: &[DVec3], rates: &[DVec3]) -> Vec<DVec3> {
    let n = secs.len();
    let mut next = rates.to_vec();
    // For each inner key, `rate = constant − factor · rate of the next`.
    let mut eliminated: Vec<(DMat3, DVec3)> = Vec::with_capacity(n - 1);
    for i in 1..n {
        let (before, after) = (secs[i - 1], secs[i]);
        let lower = jacobian(arcs[i - 1]) * (2.0 / before);
        let upper = inverse_jacobian(arcs[i]) * (2.0 / after);
        let diagonal = 4.0 * (1.0 / before + 1.0 / after);
        let right = 6.0 * (arcs[i - 1] / (before * before) + arcs[i] / (after * after))
            - turning_term(arcs[i - 1], inverse_jacobian(arcs[i - 1]) * rates[i]);
        let (pivot, right) = match eliminated.last() {
            None => (DMat3::from_diagonal(DVec3::splat(diagonal)), right - lower * rates[0]),
            Some(&(factor, constant)) => {
                (DMat3::from_diagonal(DVec3::splat(diagonal)) - lower * factor, right - lower * constant)
            }
        };
        let inverse = pivot.inverse();
        eliminated.push((inverse * upper, inverse * right));
    }
    for i in (1..n).rev() {
        let (factor, constant) = eliminated[i - 1];
        next[i] = constant - factor * next[i + 1];
    }
    next
}

/// The matrix `[f]` with `[f] v = f × v`.
fn cross_matrix(f: DVec3) -> DMat3 {
    DMat3::from_cols(DVec3::new(0.0, f.z, -f.y), DVec3::new(-f.z, 0.0, f.x), DVec3::new(f.y, -f.x, 0.0))
}

/// Turns shorter than this, in radians, take the series: the closed forms divide what has cancelled by powers of it.
const SERIES_BELOW_RAD: f64 = 0.1;

/// `J` in `rate = J(f) · df/dt`: from the slope of the plane angles `f` to the body rate.
fn jacobian(f: DVec3) -> DMat3 {
    let (f1, f2) = (f.length(), f.length_squared());
    // (1 − cos f)/f² without cancelling.
    let half = 0.5 * f1;
    let sinc = if half < 1e-8 { 1.0 } else { half.sin() / half };
    let cross = cross_matrix(f);
    DMat3::IDENTITY - cross * (0.5 * sinc * sinc) + cross * cross * sine_rest(f1, f2)
}

/// The inverse of [`jacobian`]; exists below a full turn.
fn inverse_jacobian(f: DVec3) -> DMat3 {
    let (f1, f2) = (f.length(), f.length_squared());
    let factor = if f1 < SERIES_BELOW_RAD {
        1.0 / 12.0 + f2 * (1.0 / 720.0 + f2 * (1.0 / 30_240.0 + f2 / 1_209_600.0))
    } else {
        (1.0 - 0.5 * f1 / (0.5 * f1).tan()) / f2
    };
    let cross = cross_matrix(f);
    DMat3::IDENTITY + cross * 0.5 + cross * cross * factor
}

/// The part of the acceleration that comes from the turning of the plane while the angles `f` change at `g`:
/// the acceleration is `J(f) d²f/dt²` and this.
fn turning_term(f: DVec3, g: DVec3) -> DVec3 {
    let (f1, f2) = (f.length(), f.length_squared());
    let (k1, k2) = if f1 < SERIES_BELOW_RAD {
        (
            1.0 / 12.0 + f2 * (-1.0 / 180.0 + f2 * (1.0 / 6_720.0 - f2 / 453_600.0)),
            -1.0 / 60.0 + f2 * (1.0 / 1_260.0 - f2 / 60_480.0),
        )
    } else {
        let (sin, cos) = f1.sin_cos();
        ((2.0 * (1.0 - cos) - f1 * sin) / (f2 * f2), (3.0 * sin - 2.0 * f1 - f1 * cos) / (f2 * f2 * f1))
    };
    let across = f.cross(g);
    f.dot(g) * (k1 * across + k2 * f.cross(across)) + sine_rest(f1, f2) * g.cross(across)
}

/// `(f − sin f)/f³`, of `f` and its square.
fn sine_rest(f1: f64, f2: f64) -> f64 {
    if f1 < SERIES_BELOW_RAD {
        1.0 / 6.0 + f2 * (-1.0 / 120.0 + f2 * (1.0 / 5_040.0 - f2 / 362_880.0))
    } else {
        (f1 - f1.sin()) / (f2 * f1)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Angles of the same direction and of all sizes, the limit of the series among them.
    fn sizes() -> impl Iterator<Item = DVec3> {
        let direction = DVec3::new(2.0, -1.0, 0.5).normalize();
        [0.0, 1e-300, 1e-9, 1e-3, 0.05, 0.099_999, 0.100_001, 1.0, 3.0, 6.0]
            .into_iter()
            .map(move |size| direction * size)
    }

    #[test]
    fn the_two_jacobians_undo_each_other() {
        for f in sizes() {
            let product = jacobian(f) * inverse_jacobian(f);
            assert!(product.abs_diff_eq(DMat3::IDENTITY, 3e-14), "{f}: {product}");
        }
    }

    #[test]
    fn the_jacobian_is_the_slope_of_exp() {
        // Body rate of exp(f + g t) by a central difference.
        let (g, dt) = (DVec3::new(0.3, 0.7, -0.2), 1e-5);
        for f in sizes() {
            let at = |t: f64| Rotor::from_plane_angles(Bivector::from_axis(f + g * t));
            let rate = ((at(-dt).reverse() * at(dt)).plane_angles() / (2.0 * dt)).axis();
            assert!(rate.abs_diff_eq(jacobian(f) * g, 1e-9), "{f}: {rate}");
            // And its change: J(f + g t) g has the slope of the turning term alone, as g stays.
            let slope = (jacobian(f + g * dt) * g - jacobian(f - g * dt) * g) / (2.0 * dt);
            assert!(slope.abs_diff_eq(turning_term(f, g), 1e-9), "{f}: {slope}");
        }
    }

    #[test]
    fn series_and_closed_forms_meet() {
        let direction = DVec3::new(2.0, -1.0, 0.5).normalize();
        let g = DVec3::new(0.9, 0.2, -0.4);
        let sides = [1.0 - 1e-12, 1.0 + 1e-12].map(|share| direction * (SERIES_BELOW_RAD * share));
        let [below, above] = sides.map(|f| inverse_jacobian(f) * g);
        assert!(below.abs_diff_eq(above, 2e-13), "{below} {above}");
        let [below, above] = sides.map(|f| turning_term(f, g));
        assert!(below.abs_diff_eq(above, 2e-13), "{below} {above}");
    }
}

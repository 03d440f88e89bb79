//! Curves made of a product of partial turns, each growing by its own share: Hermite and B-spline.
//!
//! Source: Kim, Kim & Shin 1995, "A general construction scheme for unit quaternion curves with simple high order
//! derivatives", SIGGRAPH.

use super::spline::{SplineError, check_keys};
use super::{Bivector, Motion, Rotor};

/// From `a` to `b` with the body rates wanted at both ends, exactly.
///
/// `t` runs from 0 to 1, and the rates are in radians per unit of it: multiply those in radians per second by the length of
/// the segment. The middle part goes the short way; when it is near half a turn, another key is needed between.
/// Running the segment backwards gives another curve unless the rates change sides and signs too.
#[must_use]
pub fn hermite(a: Rotor, rate_a: Bivector, b: Rotor, rate_b: Bivector, t: f64) -> Rotor {
    let (first, last) = (rate_a / 3.0, rate_b / 3.0);
    let after_first = a * Rotor::from_plane_angles(first);
    let before_last = b * Rotor::from_plane_angles(-last);
    let middle = (after_first.reverse() * before_last).plane_angles();
    let rest = 1.0 - t;
    // The Bernstein polynomials of degree three, summed from the last one on.
    let shares = [1.0 - rest * rest * rest, t * t * (3.0 - 2.0 * t), t * t * t];
    product(a, [first, middle, last], shares)
}

/// [`hermite`] with its rate and acceleration by `t`.
#[must_use]
pub fn hermite_motion(a: Rotor, rate_a: Bivector, b: Rotor, rate_b: Bivector, t: f64) -> Motion {
    let (first, last) = (rate_a / 3.0, rate_b / 3.0);
    let after_first = a * Rotor::from_plane_angles(first);
    let before_last = b * Rotor::from_plane_angles(-last);
    let middle = (after_first.reverse() * before_last).plane_angles();
    let rest = 1.0 - t;
    let shares = [
        [1.0 - rest * rest * rest, 3.0 * rest * rest, -6.0 * rest],
        [t * t * (3.0 - 2.0 * t), 6.0 * t * rest, 6.0 - 12.0 * t],
        [t * t * t, 3.0 * t * t, 6.0 * t],
    ];
    moving_product(a, [first, middle, last], shares)
}

/// One segment of the uniform cubic B-spline of four control rotors, `t` from 0 to 1. Rate and acceleration run on
/// smoothly into the next segment; the curve passes near its controls and not through them, so it smooths.
///
/// Steps between neighbours go the short way.
#[must_use]
pub fn b_spline(controls: [Rotor; 4], t: f64) -> Rotor {
    let [p, q, r, s] = controls;
    let steps = [p.reverse() * q, q.reverse() * r, r.reverse() * s].map(Rotor::plane_angles);
    let shares = [
        (5.0 + t * (3.0 + t * (-3.0 + t))) / 6.0,
        (1.0 + t * (3.0 + t * (3.0 - 2.0 * t))) / 6.0,
        t * t * t / 6.0,
    ];
    product(p, steps, shares)
}

/// `start` and then the shares of three turns, one after the other, each in the frame that the ones before have left.
fn product(start: Rotor, turns: [Bivector; 3], shares: [f64; 3]) -> Rotor {
    turns
        .into_iter()
        .zip(shares)
        .fold(start, |rotor, (turn, share)| rotor * Rotor::from_plane_angles(turn * share))
}

/// [`product`] with the shares' first and second derivative.
fn moving_product(start: Rotor, turns: [Bivector; 3], shares: [[f64; 3]; 3]) -> Motion {
    turns.into_iter().zip(shares).fold(Motion::still(start), |motion, (turn, [share, first, second])| {
        motion * Motion::turning(turn * share, turn * first, turn * second)
    })
}

/// A smoothing curve near its keys: the cubic B-spline whose knots are the key times, even or not. Rate and acceleration
/// don't jump anywhere. With even times its controls are the keys, and its segments those of [`b_spline`]; else the
/// controls are taken from the arcs between keys at the mean of three knots, so that an even turn stays even.
///
/// It passes through the first and the last key, with no acceleration there, and near the others.
///
/// Source: Kim, Kim & Shin 1995; the shares for uneven knots from the recursion of Cox 1972 and de Boor 1972, the places of the
/// controls from Schoenberg 1967.
#[derive(Clone, Debug)]
pub struct RotationBSpline {
    times: Vec<f64>,
    /// The first control of each segment, and the turns from control to control: the curve of segment `i` is made of control
    /// `i` and turns `i`, `i + 1` and `i + 2`.
    starts: Vec<Rotor>,
    turns: Vec<Bivector>,
    /// Seconds from knot to knot, two more than segments on either side.
    secs: Vec<f64>,
}

/// What a [`RotationBSpline`] does at its ends.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum BSplineEnds {
    /// Through the end keys, without acceleration there: the keys next to them are thought on the other side too.
    #[default]
    Natural,
    /// A closed loop: it runs on over the seam, where the last key stands for the first.
    Loop,
}

impl RotationBSpline {
    /// The curve near unit rotors `keys` at `times`, in seconds and rising. Steps between neighbours go the short way.
    ///
    /// # Errors
    /// [`SplineError`] for fewer than two keys, times that don't rise, and keys that are not unit.
    pub fn new(times: &[f64], keys: &[Rotor], ends: BSplineEnds) -> Result<Self, SplineError> {
        check_keys(times, keys)?;
        let n = times.len() - 1;
        let inner_secs: Vec<f64> = times.windows(2).map(|pair| pair[1] - pair[0]).collect();
        let steps: Vec<Bivector> =
            keys.windows(2).map(|pair| (pair[0].reverse() * pair[1]).plane_angles()).collect();
        // The segments thought before the first and behind the last.
        let (before, behind) = match ends {
            BSplineEnds::Natural => ([1.min(n - 1), 0], [n - 1, n.saturating_sub(2)]),
            BSplineEnds::Loop => ([(2 * n - 2) % n, n - 1], [0, 1 % n]),
        };
        let secs: Vec<f64> =
            before.into_iter().chain(0..n).chain(behind).map(|segment| inner_secs[segment]).collect();
        // Signs follow one another, so that a step between controls may pass half a turn.
        let mut signed = vec![keys[0]];
        for key in &keys[1..] {
            signed.push(key.aligned_to(signed[signed.len() - 1]));
        }
        let control = |key: usize| {
            // The mean of the knots before, at and after the key, against the key.
            let (before, after) = (secs[key + 1], secs[key + 2]);
            let off = (after - before) / 3.0;
            let share = if off < 0.0 { off / before } else { off / after };
            let step = match (off < 0.0, ends) {
                _ if off == 0.0 => Bivector::ZERO,
                (true, _) if key > 0 => steps[key - 1],
                (true, _) => steps[n - 1],
                (false, _) if key < n => steps[key],
                (false, _) => steps[0],
            };
            signed[key] * Rotor::from_plane_angles(step * share)
        };
        let mut controls: Vec<Rotor> = (0..=n).map(control).collect();
        // One more on either side: turned about the end, or from across the seam.
        let (first, last) = match ends {
            BSplineEnds::Natural => (
                controls[0] * (controls[1].reverse() * controls[0]),
                controls[n] * (controls[n - 1].reverse() * controls[n]),
            ),
            BSplineEnds::Loop => (
                controls[0] * (controls[n].reverse() * controls[n - 1]),
                controls[n] * (controls[0].reverse() * controls[1]),
            ),
        };
        controls.insert(0, first);
        controls.push(last);
        let turns =
            controls.windows(2).map(|pair| (pair[0].reverse() * pair[1]).plane_angles_as_signed()).collect();
        controls.truncate(n);
        let starts = controls;
        Ok(Self { times: times.to_vec(), starts, turns, secs })
    }

    /// The rotation at time `t` in seconds. Before the first and after the last key it stands still.
    #[must_use]
    pub fn at(&self, t: f64) -> Rotor {
        let (start, turns, shares) = self.parts(t);
        product(start, turns, shares.map(|[share, ..]| share)).normalize()
    }

    /// Rotation, rate and acceleration at time `t` in seconds, the last two in radians per second and second squared; outside the
    /// keys, those at the nearest end.
    #[must_use]
    pub fn motion_at(&self, t: f64) -> Motion {
        let (start, turns, shares) = self.parts(t);
        let motion = moving_product(start, turns, shares);
        Motion { orientation: motion.orientation.normalize(), ..motion }
    }

    /// The first control, the three turns and their shares at a time.
    fn parts(&self, t: f64) -> (Rotor, [Bivector; 3], [[f64; 3]; 3]) {
        let last = self.starts.len() - 1;
        let segment = self.times.partition_point(|key_time| *key_time <= t).saturating_sub(1).min(last);
        let (start, end) = (self.times[segment], self.times[segment + 1]);
        // `max` and `min` also make the start out of a NaN.
        let s = t.max(start).min(end) - start;
        let secs: [f64; 5] = std::array::from_fn(|i| self.secs[segment + i]);
        let turns = std::array::from_fn(|i| self.turns[segment + i]);
        (self.starts[segment], turns, shares_between_knots(secs, s))
    }
}

/// The cumulative shares of the last three, two and one of four controls, with first and second derivative, `s` seconds into
/// the middle one of five stretches between knots.
fn shares_between_knots([a, b, h, c, d]: [f64; 5], s: f64) -> [[f64; 3]; 3] {
    let rest = h - s;
    let leaving = 1.0 / (h * (b + h) * (a + b + h));
    let coming = 1.0 / (h * (h + c) * (h + c + d));
    // The slope of the middle one is a quadratic B-spline over the three stretches around, times 3 over their length.
    let factor = 3.0 / (b + h + c);
    let k0 = b / (b + h);
    let k1 = (h - b) / ((b + h) * h) + 1.0 / h;
    let k2 = -1.0 / ((b + h) * h) - 1.0 / ((h + c) * h);
    let at_start = b * b / ((b + h) * (b + h + c));
    [
        [1.0 - leaving * rest * rest * rest, 3.0 * leaving * rest * rest, -6.0 * leaving * rest],
        [
            at_start + factor * s * (k0 + s * (k1 / 2.0 + s * k2 / 3.0)),
            factor * (k0 + s * (k1 + s * k2)),
            factor * (k1 + 2.0 * s * k2),
        ],
        [coming * s * s * s, 3.0 * coming * s * s, 6.0 * coming * s],
    ]
}

//! The offset with which a joint enters and leaves a run of keys at its borders, motion taken out.

use crate::rotor::{Bivector, Rotor, slerp};

/// Steps to each side of a border that tell how the joint moves there.
const NEAR: usize = 4;

/// Steps to each side of a border on which the guesses are tried.
const TRIED: usize = 14;

/// Which side of the joint's own turn an offset stands on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Side {
    /// `q = truth · offset`
    Bone,
    /// `q = offset · truth`
    Parent,
}

/// An offset and how sure it is.
#[derive(Clone, Copy, Debug)]
pub(super) struct Offset {
    pub(super) turn: Rotor,
    /// Standard deviation in radians.
    pub(super) sigma_rad: f64,
}

impl Side {
    fn offset(self, truth: Rotor, pose: Rotor) -> Rotor {
        match self {
            Self::Bone => truth.reverse() * pose,
            Self::Parent => pose * truth.reverse(),
        }
    }
}

/// The offset of `poses[key..]` against the keys before: `poses[key - 1]` is sound, `poses[key]` off, each side alike as
/// far as `from..to` reaches. With `leaving` it is the other way round, and the offset is that of `poses[key - 1]`.
pub(super) fn offset_at(
    poses: &[Rotor],
    key: usize,
    (from, to): (usize, usize),
    side: Side,
    leaving: bool,
) -> Offset {
    let (a, b) = (poses[key - 1], poses[key]);
    let mut offset = if leaving { side.offset(b, a) } else { side.offset(a, b) };
    let mut sigma_rad = 0.0;
    for _ in 0..3 {
        let step = |last: usize| {
            let own = (poses[last - 1].reverse() * poses[last]).plane_angles();
            // The rates of the side that is off are turned with it.
            let is_off = (last > key) != leaving;
            if is_off && side == Side::Bone { turned(offset, own) } else { own }
        };
        let (expected, sigma) = expected_step(step, key, from, to);
        let forward = Rotor::from_plane_angles(expected);
        offset = if leaving { side.offset(b * forward.reverse(), a) } else { side.offset(a * forward, b) };
        sigma_rad = sigma;
    }
    Offset { turn: offset, sigma_rad }
}

/// The offset of a key in a run of few keys against the way across it.
pub(super) fn offset_in_few(
    poses: &[Rotor],
    secs: &[f64],
    (first, last): (usize, usize),
    key: usize,
    side: Side,
) -> Offset {
    let (a, b) = (poses[first - 1], poses[last + 1]);
    let share = (secs[key] - secs[first - 1]) / (secs[last + 1] - secs[first - 1]);
    // The way across may bend by about a tenth of its length.
    Offset { turn: side.offset(slerp(a, b, share), poses[key]), sigma_rad: a.turn_to(b) * 0.1 }
}

/// The mean of two offsets, each counted by its certainty.
pub(super) fn joined(a: Offset, b: Offset) -> Offset {
    let (va, vb) = (a.sigma_rad.powi(2).max(1e-12), b.sigma_rad.powi(2).max(1e-12));
    Offset { turn: slerp(a.turn, b.turn, va / (va + vb)), sigma_rad: (va * vb / (va + vb)).sqrt() }
}

/// A vector of plane angles turned by a rotor.
fn turned(by: Rotor, angles: Bivector) -> Bivector {
    Bivector::from_axis(by.apply(angles.axis()))
}

/// How the steps around tell the one between: weights of those next to it, and of those one, two … further.
const GUESSES: [&[f64]; 4] = [&[0.5], &[0.562_5, -0.062_5], &[0.25, 0.25], &[2.0 / 3.0, -1.0 / 6.0]];

/// The step into `key` as the steps around tell it, and its standard deviation: the guess that does best on the sound
/// steps near by. `step(k)` is the step from `k − 1` to `k`.
fn expected_step(step: impl Fn(usize) -> Bivector, key: usize, from: usize, to: usize) -> (Bivector, f64) {
    let before = key.saturating_sub(from + 1).min(NEAR);
    let after = to.saturating_sub(key).min(NEAR);
    if before == 0 || after == 0 {
        return one_sided(step, key, before, after);
    }
    let low = key.saturating_sub(TRIED).max(from + 1);
    let high = (key + TRIED).min(to);
    let steps: Vec<Bivector> = (low..=high).map(step).collect();
    let at = |k: usize| steps[k - low];
    let guess = |weights: &[f64], k: usize| {
        weights
            .iter()
            .enumerate()
            .fold(Bivector::ZERO, |sum, (i, weight)| sum + (at(k - 1 - i) + at(k + 1 + i)) * *weight)
    };
    let mut best = ((at(key - 1) + at(key + 1)) * 0.5, f64::INFINITY);
    for weights in GUESSES {
        let reach = weights.len();
        if key < low + reach || key + reach > high {
            continue;
        }
        let mut misses: Vec<f64> = (low + reach..=high - reach)
            // Trials must not see the step in question.
            .filter(|&k| k.abs_diff(key) > reach)
            .map(|k| (guess(weights, k) - at(k)).length())
            .collect();
        if misses.len() < 3 {
            continue;
        }
        misses.sort_by(f64::total_cmp);
        // The median length of a normal miss in three dimensions is 1.538 of its deviation along each.
        let sigma = misses[misses.len() / 2] * (1.732 / 1.538);
        if sigma < best.1 {
            best = (guess(weights, key), sigma);
        }
    }
    if best.1.is_infinite() {
        best.1 = (at(key - 1) - at(key + 1)).length();
    }
    best
}

fn one_sided(step: impl Fn(usize) -> Bivector, key: usize, before: usize, after: usize) -> (Bivector, f64) {
    if before > 0 {
        let own = step(key - 1);
        (own, own.length() * 0.5)
    } else if after > 0 {
        let own = step(key + 1);
        (own, own.length() * 0.5)
    } else {
        (Bivector::ZERO, 0.05)
    }
}

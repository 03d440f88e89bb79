//! The offset with which a joint enters and leaves a run of keys at its borders, motion taken out.

use crate::rotor::{Bivector, Rotor, slerp};

use super::poses::Poses;
use super::scan::Scan;

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

impl Side {
    pub(super) const BOTH: [Self; 2] = [Self::Bone, Self::Parent];
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

/// The offset of the poses from `key` on against those before: the pose before `key` is sound, that at `key` off, each side
/// alike as far as `from..to` reaches. With `leaving` it is the other way round, and the offset is that of the pose before.
/// On the bone side, and on the parent's.
pub(super) fn offsets_at(
    poses: &Poses<'_>,
    key: usize,
    (from, to): (usize, usize),
    leaving: bool,
) -> [Offset; 2] {
    let (a, b) = (poses.at(key - 1), poses.at(key));
    let steps = Steps::new(poses, key, from, to);
    let after = |side: Side, expected: Bivector| {
        let forward = Rotor::from_plane_angles(expected);
        if leaving { side.offset(b * forward.reverse(), a) } else { side.offset(a * forward, b) }
    };
    let on_bone_side = {
        let side = Side::Bone;
        let turn = if leaving { side.offset(b, a) } else { side.offset(a, b) };
        let mut found = Offset { turn, sigma_rad: 0.0 };
        // The rates of the side that is off are turned with it, by an offset that gets better each time.
        for _ in 0..3 {
            let step = |last: usize| {
                let own = steps.step_into(last);
                if (last > key) == leaving { own } else { turned(found.turn, own) }
            };
            let (expected, sigma_rad) = expected_step(step, key, from, to);
            found = Offset { turn: after(side, expected), sigma_rad };
        }
        found
    };
    let (expected, sigma_rad) = expected_step(|last| steps.step_into(last), key, from, to);
    [on_bone_side, Offset { turn: after(Side::Parent, expected), sigma_rad }]
}

/// The steps near a border, as plane angles.
struct Steps {
    low: usize,
    each: Vec<Bivector>,
}

impl Steps {
    /// All that [`expected_step`] asks for.
    fn new(poses: &Poses<'_>, key: usize, from: usize, to: usize) -> Self {
        let low = key.saturating_sub(TRIED).max(from + 1).min(key);
        let high = (key + TRIED).min(to).max(key);
        let step = |last: usize| (poses.at(last - 1).reverse() * poses.at(last)).plane_angles();
        Self { low, each: (low..=high).map(step).collect() }
    }

    /// The step from the key before into `key`.
    fn step_into(&self, key: usize) -> Bivector {
        self.each[key - self.low]
    }
}

/// The offset of a key in a run of few keys against the way across it.
pub(super) fn offset_in_few(
    scan: &Scan<'_>,
    poses: &Poses<'_>,
    (first, last): (usize, usize),
    key: usize,
    side: Side,
) -> Offset {
    let (a, b) = (poses.at(first - 1), poses.at(last + 1));
    let start = scan.secs(first - 1);
    let share = (scan.secs(key) - start) / (scan.secs(last + 1) - start);
    // The way across may bend by about a tenth of its length.
    Offset { turn: side.offset(slerp(a, b, share), poses.at(key)), sigma_rad: a.turn_to(b) * 0.1 }
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
            .map(|k| guess(weights, k) - at(k))
            .map(|miss| miss.dot(miss))
            .collect();
        if misses.len() < 3 {
            continue;
        }
        let middle = misses.len() / 2;
        // The median length of a normal miss in three dimensions is 1.538 of its deviation along each.
        let sigma = misses.select_nth_unstable_by(middle, f64::total_cmp).1.sqrt() * (1.732 / 1.538);
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

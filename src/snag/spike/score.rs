//! How much a run looks like a spike where poses are few: five marks that a person would look at, added up.
//!
//! In a loop of a second or two a spike hides behind the roughness that it makes itself, so a run is held against what lies
//! outside it: the cubic through the keys on both sides, the joint's other steps, and the joint on the other side of the body.
//!
//! The weights are a logistic regression with a ridge of 1 (Cox 1958; le Cessie & van Houwelingen 1992) on some 2900 planted spikes
//! and all other runs of the planter's loops and of its captures cut into short clips. Which marks are worth it, and what they
//! tell, was read from files left out one by one: each is judged by weights that have not seen it.

use std::ops::Range;

use crate::rotor::{Bivector, Rotor, slerp};

use super::super::roughness::{Roughness, angle_of_dot};
use super::alike::{Alike, BESIDE, apart, shape, shape_around};
use super::{END_KEYS, LEAST_SPREAD_RAD, Run, START_KEYS, may_be_spike, offs, weigh};

/// Longest run that is scored.
const LONGEST: usize = 3;

/// What lies off by less than this is not looked for; in radians.
const LEAST_OFF_RAD: f64 = 6.0 / 180.0 * std::f64::consts::PI;

/// Of three keys off the way across at least one has this share of it as roughness: where the motion bends evenly.
const LEAST_ROUGHNESS: f64 = 1.0 / 3.0;

/// Keys on both sides that the cubic goes through.
const SIDE: usize = 3;

/// A run is entered and left by steps of at least this share of how far it lies off: what jumps once and stays is no spike.
const LEAST_STEP: f64 = 0.25;

/// The weights of the marks. Lengths count by their logarithm, so that a mark is a ratio and has no scale but the size in radians.
const SIZE: f64 = 2.14;
const OFF_CURVE: f64 = 2.43;
const STEP: f64 = 2.06;
const EVEN: f64 = 6.75;
const UNLIKE: f64 = 2.82;
const BIAS: f64 = -10.06;

/// Keys to both sides of a run that it is held against, of the joint and of its other side: some seconds, so that long clips cost no
/// more for each run.
const NEAR_KEYS: usize = 256;

/// How unlike the other side is, where there is none.
const UNLIKE_ALONE: f64 = 0.7;

/// From this score on a run is told for that alone. Sound motion outside the fit reached 2.8 (a wolf's gallop) and 1.7 (a backflip),
/// and planted spikes seldom lie between: from 1.5 to 3 the share found falls by a hundredth at most.
const LEAST_SCORE: f64 = 3.2;

/// What the roughness tells is left out below this score.
const LEAST_SCORE_ROUGH: f64 = -1.0;

/// How fast the confidence goes from 0.5 up to 1 with the score: it may be mended unasked from a score of 4.2 on.
const SCORE_SCALE: f64 = 4.5;

/// A joint with few poses, whose runs are scored.
pub(super) struct Scorer<'a> {
    alike: &'a Alike<'a>,
}

impl<'a> Scorer<'a> {
    /// `None` where poses are so many that a spike is told by its roughness.
    pub(super) fn new(alike: &'a Alike<'a>) -> Option<Self> {
        alike.is_coarse.then_some(Self { alike })
    }

    /// The runs that are told by their score, with how sure that is, the surest first.
    pub(super) fn find(&self) -> Vec<(Run, f64)> {
        let mut scored: Vec<(Run, f64)> = Vec::new();
        let mut key = START_KEYS + 1;
        loop {
            key = self.alike.rough.next_rough(key);
            if key + END_KEYS >= self.alike.rough.len() {
                break;
            }
            scored.extend((key..key + LONGEST).filter_map(|last| self.told(key, last)));
            key += 1;
        }
        scored.sort_by(|(_, a), (_, b)| b.total_cmp(a));
        let mut found: Vec<(Run, f64)> = Vec::new();
        for (run, score) in scored {
            if !found.iter().any(|(other, _)| touch(&run, other)) {
                found.push((run, score));
            }
        }
        for (_, score) in &mut found {
            *score = 1.0 - 0.5 * (-(*score - LEAST_SCORE) / SCORE_SCALE).exp();
        }
        found
    }

    /// Whether a run that is told by its roughness has no score that speaks against it, with a key more or less at its ends.
    pub(super) fn agrees(&self, run: Run) -> bool {
        let firsts = run.first.saturating_sub(LONGEST).max(START_KEYS + 1)..=run.last + 1;
        firsts.into_iter().any(|first| {
            let lasts = (first..first + LONGEST).filter(|last| last + 1 >= run.first);
            lasts.into_iter().any(|last| self.score(first, last, LEAST_SCORE_ROUGH).is_some())
        })
    }

    fn told(&self, first: usize, last: usize) -> Option<(Run, f64)> {
        let rough = self.alike.rough;
        let roughest = (first..=last.min(rough.len() - 1)).map(|key| rough.residual(key)).fold(0.0, f64::max);
        if roughest < LEAST_ROUGHNESS * LEAST_OFF_RAD || last + END_KEYS >= rough.len() {
            return None;
        }
        if size(rough, first, last) < LEAST_OFF_RAD {
            return None;
        }
        let run = weigh(rough, first, last);
        may_be_spike(self.alike.scan, rough, run)
            .then(|| self.score(first, last, LEAST_SCORE))
            .flatten()
            .map(|score| (run, score))
    }

    /// The score of a run, if it is at least so much.
    fn score(&self, first: usize, last: usize, least: f64) -> Option<f64> {
        let rough = self.alike.rough;
        if first < SIDE || last + SIDE >= rough.len() {
            return None;
        }
        let size = size(rough, first, last);
        if self.least_step(first, last) < LEAST_STEP * size {
            return None;
        }
        let curve = off_curve(rough, first, last);
        let by_itself = BIAS
            + SIZE * size.max(LEAST_SPREAD_RAD).ln()
            + OFF_CURVE * log_ratio(curve.off, curve.rest)
            + STEP * self.step(first, last)
            + EVEN * curve.even;
        // The other side is dear to ask.
        if by_itself + UNLIKE < least {
            return None;
        }
        let score = by_itself + UNLIKE * self.unlike_mirror(first, last, size);
        (score >= least).then_some(score)
    }

    /// The cosine of half the turn of the step to a key.
    fn cosine(&self, key: usize) -> f64 {
        self.alike.rough.pose(key - 1).dot(self.alike.rough.pose(key)).abs()
    }

    /// The smaller of the steps into and out of a run, in radians.
    fn least_step(&self, first: usize, last: usize) -> f64 {
        angle_of_dot(self.cosine(first).max(self.cosine(last + 1)))
    }

    /// That beside the widest step near by outside the run.
    fn step(&self, first: usize, last: usize) -> f64 {
        let Range { start, end } = near(first, last);
        let outside = (start.max(1)..first).chain(last + 2..end.min(self.alike.rough.len()));
        let cosine = outside.map(|key| self.cosine(key)).fold(1.0, f64::min);
        log_ratio(self.least_step(first, last), angle_of_dot(cosine))
    }

    /// How unlike the nearest stretch of the other side moves, beside the size: 0 does the same, 1 is as unlike as counts.
    fn unlike_mirror(&self, first: usize, last: usize, size: f64) -> f64 {
        let Some(mirror) = self.alike.other_side() else { return UNLIKE_ALONE };
        let wanted = shape_around(self.alike.rough, first, last);
        let Range { start, end } = near(first, last);
        let near: Vec<Rotor> = (start..end.min(mirror.len())).map(|key| mirror.pose(key)).collect();
        let each = near.windows(last + 1 + 2 * BESIDE - first).map(|own| apart(&shape(own), &wanted));
        each.fold(size, f64::min) / size.max(LEAST_SPREAD_RAD)
    }
}

/// The keys that a run is held against.
fn near(first: usize, last: usize) -> Range<usize> {
    first.saturating_sub(NEAR_KEYS)..last + NEAR_KEYS
}

/// Whether two runs share a key or lie side by side.
pub(super) fn touch(a: &Run, b: &Run) -> bool {
    a.first <= b.last + 1 && b.first <= a.last + 1
}

/// The logarithm of a ratio of angles, of which what can't be seen counts for nothing.
fn log_ratio(own: f64, other: f64) -> f64 {
    ((own + LEAST_SPREAD_RAD) / (other + LEAST_SPREAD_RAD)).ln()
}

/// How far the keys of a run lie off the way across, in the median.
fn size(rough: &Roughness<'_>, first: usize, last: usize) -> f64 {
    let off = offs(rough, first, last);
    off[off.len() / 2]
}

/// A run beside the cubic through the keys around it.
struct OffCurve {
    /// How far the keys of the run lie off it, by root mean square.
    off: f64,
    /// How far the keys around lie off it: the standard deviation with the two degrees of freedom that a cubic leaves.
    rest: f64,
    /// The key that lies off least as a share of that which lies off most.
    even: f64,
}

/// Fits a cubic to three keys on both sides by least squares, in plane angles about the way across.
fn off_curve(rough: &Roughness<'_>, first: usize, last: usize) -> OffCurve {
    let middle = slerp(rough.pose(first - 1), rough.pose(last + 1), 0.5);
    let own = |key: usize| (middle.reverse() * rough.pose(key).aligned_to(middle)).plane_angles();
    let (start, end) = (rough.secs(first - SIDE), rough.secs(last + SIDE));
    // From -1 to 1, so that the powers are of one size.
    let powers = |key: usize| {
        let time = (2.0 * rough.secs(key) - start - end) / (end - start);
        [1.0, time, time * time, time * time * time]
    };
    let around = (first - SIDE..first).chain(last + 1..=last + SIDE);
    // Orthogonal polynomials of the keys around (Gram & Schmidt), so that nothing is to be solved.
    let mut basis: Vec<([f64; 4], f64)> = Vec::with_capacity(4);
    for power in 0..4 {
        let mut own = [0.0; 4];
        own[power] = 1.0;
        for (other, square) in &basis {
            let shared: f64 = around.clone().map(|key| powers(key)[power] * dot(*other, powers(key))).sum();
            for (part, other) in own.iter_mut().zip(other) {
                *part -= shared / square * other;
            }
        }
        let square: f64 = around.clone().map(|key| dot(own, powers(key)).powi(2)).sum();
        basis.push((own, square.max(1e-12)));
    }
    let fitted: Vec<([f64; 4], Bivector)> = basis
        .iter()
        .map(|(polynomial, square)| {
            let each = around.clone().map(|key| own(key) * (dot(*polynomial, powers(key)) / square));
            (*polynomial, each.fold(Bivector::ZERO, |sum, part| sum + part))
        })
        .collect();
    let distance = |key: usize| {
        let curve = fitted.iter().map(|(polynomial, part)| *part * dot(*polynomial, powers(key)));
        (own(key) - curve.fold(Bivector::ZERO, |sum, part| sum + part)).length()
    };
    let off: Vec<f64> = (first..=last).map(distance).collect();
    let squares = |all: &mut dyn Iterator<Item = f64>| -> f64 { all.map(|own| own * own).sum() };
    let [least, most] =
        [off.iter().copied().fold(f64::INFINITY, f64::min), off.iter().copied().fold(0.0, f64::max)];
    OffCurve {
        off: (squares(&mut off.iter().copied()) / off.len() as f64).sqrt(),
        rest: (squares(&mut around.map(distance)) / (2 * SIDE - 4) as f64).sqrt(),
        even: if most > 0.0 { least / most } else { 1.0 },
    }
}

fn dot(a: [f64; 4], b: [f64; 4]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

#[cfg(test)]
mod tests {
    use super::super::super::outline::Outlines;
    use super::super::super::scan::View;
    use super::super::super::tests::of_one_joint;
    use super::super::{LEAST_KEYS, Scan};
    use super::*;
    use crate::clip::{Clip, Times};

    fn at_24(keys: Vec<Rotor>) -> Clip {
        of_one_joint(Times::Even { step_secs: 1.0 / 24.0, count: keys.len() }, 24.0, keys)
    }

    /// A key of a joint that swings as it will, off by an angle about one axis.
    fn swinging(key: usize, off_deg: f64) -> Rotor {
        let secs = key as f64 / 24.0;
        let swing = Bivector::new(0.6 * (6.3 * secs).sin(), 0.2 * (12.6 * secs).cos(), 0.1);
        Rotor::from_plane_angles(swing)
            * Rotor::from_plane_angles(Bivector::new(0.0, 0.0, off_deg.to_radians()))
    }

    /// A joint that swings, with some keys off by an angle.
    fn swung(count: usize, off: &[usize], off_deg: f64) -> Clip {
        at_24((0..count).map(|key| swinging(key, if off.contains(&key) { off_deg } else { 0.0 })).collect())
    }

    fn told(clip: &Clip) -> Vec<(usize, usize)> {
        let outlines = Outlines::new(1);
        let scan = Scan::new(View { clip, outlines: &outlines }, 0).unwrap();
        let rough = Roughness::new(scan, LEAST_KEYS).unwrap();
        let found = Scorer::new(&Alike::new(&scan, &rough)).unwrap().find();
        found.into_iter().map(|(run, _)| (run.first, run.last)).collect()
    }

    #[test]
    fn an_even_run_off_its_curve_is_told_to_the_key_and_a_swing_is_not() {
        assert!(told(&swung(30, &[], 0.0)).is_empty());
        for off in [&[12][..], &[12, 13], &[12, 13, 14]] {
            assert_eq!(told(&swung(30, off, 25.0)), [(12, off[off.len() - 1])], "{off:?}");
        }
    }

    #[test]
    fn a_wider_jump_elsewhere_in_a_long_clip_hides_no_spike() {
        let at = 100 + 2 * NEAR_KEYS;
        let off = |key: usize| match key {
            0..100 => 120.0,
            _ if key == at => 12.0,
            _ => 0.0,
        };
        let keys = (0..at + NEAR_KEYS).map(|key| swinging(key, off(key))).collect();
        assert_eq!(told(&at_24(keys)), [(at, at)]);
    }

    #[test]
    fn a_curve_through_keys_of_a_cubic_leaves_nothing_of_them() {
        // About one axis, so that plane angles are numbers.
        let angle = |key: usize| {
            let time = key as f64 / 10.0;
            0.3 - 0.2 * time + 0.4 * time * time - 0.1 * time.powi(3)
        };
        let keys: Vec<Rotor> =
            (0..16).map(|key| Rotor::from_plane_angles(Bivector::new(0.0, 0.0, angle(key)))).collect();
        let clip = at_24(keys);
        let outlines = Outlines::new(1);
        let scan = Scan::new(View { clip: &clip, outlines: &outlines }, 0).unwrap();
        let rough = Roughness::new(scan, LEAST_KEYS).unwrap();
        let curve = off_curve(&rough, 7, 8);
        assert!(curve.off < 1e-12 && curve.rest < 1e-12, "{} {}", curve.off, curve.rest);
    }
}

//! Runs that would be told from a fast move neither by their size nor by what they leave: the joint's other keys and the joint
//! on the other side tell whether it moves like that.
//!
//! In a loop of a second or two at 24 to 30 poses a second a kick of a leg is no smoother than a fault. But a kick is done by
//! the other leg too, and again in the next cycle: there some keys turn against each other by the same angles, whichever way
//! the two joints' own axes lie. A fault is done by no other.

use std::cell::OnceCell;
use std::f64::consts::PI;

use crate::rotor::{Bivector, Rotor};

use super::super::mirror::mirror_of;
use super::super::roughness::{Roughness, angle_of_dot};
use super::super::scan::Scan;
use super::{LEAST_KEYS, LEAST_SPREAD_RAD, Run, STEP_SIZES, across, comes_back, may_be_spike};

/// With more poses a second a spike is told by itself.
const FINE_SECS: f64 = 0.02;

/// Roughness is at least this, and so many spreads above the usual.
const LEAST_RAD: f64 = 12.0 / 180.0 * PI;
const LEAST_SCORE: f64 = 3.0;

/// How many times rougher the motion is with the run than without.
const LEAST_GAIN: f64 = 2.2;
/// The same of a joint that has no other side.
const LEAST_GAIN_ALONE: f64 = 2.75;

/// How many times rougher it is than the joint anywhere else; without another side.
const TIMES_ELSEWHERE: f64 = 1.5;
const TIMES_ELSEWHERE_ALONE: f64 = 2.25;

/// The other side is calm when it is so many times less rough at its worst. Else it is asked whether it does the same.
const TIMES_MIRROR: f64 = 1.2;

/// Two stretches are alike when the angles between their poses differ by less than this share of the roughness, in the mean.
const ALIKE_SHARE: f64 = 0.35;

/// A swing is off unevenly: its weakest key by less than this share of the median. And it is climbed step by step, so that no
/// key shows more than this share of the height in its roughness, or goes on to another place. What is off by the same all
/// along shows half of it at its borders, and comes back.
const SWING_SHARE: f64 = 0.5;
const SWING_ROUGHNESS: f64 = 0.5;

/// Keys beside a run that belong to its shape.
pub(super) const BESIDE: usize = 2;

/// A joint moves like that when it does the same so many times more: poses turn against each other by the same angles, within a share
/// of the roughness (they are taken at other moments of each swing); as rough by a share; and in one plane, by its cosine.
const LEAST_REPEATS: usize = 3;
const REPEAT_SHARE: f64 = 0.5;
const REPEAT_ROUGHNESS: f64 = 0.5;
const REPEAT_PLANE: f64 = 0.9;

/// How sure it is.
const CONFIDENCE: f64 = 0.55;
const CONFIDENCE_CLEAR: f64 = 0.65;
/// From this gain on it is clear.
const CLEAR_GAIN: f64 = 3.3;

/// A joint's roughness, and that of the joint on its other side, worked out when first asked for.
pub(super) struct Alike<'a> {
    pub(super) scan: &'a Scan<'a>,
    pub(super) rough: &'a Roughness<'a>,
    /// Whether poses are so few that a spike is not told by itself.
    pub(super) is_coarse: bool,
    other_side: OnceCell<Option<Roughness<'a>>>,
    /// The largest roughness of the other side.
    worst_there: OnceCell<f64>,
    roughest: OnceCell<Largest>,
}

impl<'a> Alike<'a> {
    pub(super) fn new(scan: &'a Scan<'a>, rough: &'a Roughness<'a>) -> Self {
        let is_coarse = scan.outline().step_secs().is_some_and(|step_secs| step_secs > FINE_SECS);
        let (other_side, worst_there, roughest) = (OnceCell::new(), OnceCell::new(), OnceCell::new());
        Self { scan, rough, is_coarse, other_side, worst_there, roughest }
    }

    /// The joint on the other side of the body, where there is one.
    pub(super) fn other_side(&self) -> Option<&Roughness<'a>> {
        let of_mirror = || {
            let other = self.scan.other(mirror_of(&self.scan.clip.skeleton, self.scan.joint)?)?;
            Roughness::new(other, LEAST_KEYS)
        };
        self.other_side.get_or_init(of_mirror).as_ref()
    }

    /// How sure it is that `run` is a spike because the joint moves like that nowhere else, and the other side neither.
    pub(super) fn stands_alone(&self, run: Run) -> Option<f64> {
        let (scan, rough) = (self.scan, self.rough);
        if !self.is_coarse
            || run.peak < LEAST_RAD
            || !may_be_spike(scan, rough, run)
            || !comes_back(rough, run)
            || is_swing(run)
        {
            return None;
        }
        let usual = rough.usual_without(run.first, run.last);
        let score = (run.peak - usual.median) / usual.spread.max(LEAST_SPREAD_RAD);
        let gain = run.peak / run.rest.max(LEAST_SPREAD_RAD);
        if score < LEAST_SCORE || gain < LEAST_GAIN {
            return None;
        }
        let elsewhere = self.roughest_beside(run);
        let is_alone = match self.other_side() {
            None => gain >= LEAST_GAIN_ALONE && run.peak >= TIMES_ELSEWHERE_ALONE * elsewhere,
            Some(other) => {
                let worst = || (0..other.len()).map(|key| other.residual(key)).fold(0.0, f64::max);
                let worst = *self.worst_there.get_or_init(worst);
                run.peak >= TIMES_ELSEWHERE * elsewhere
                    && (run.peak >= TIMES_MIRROR * worst || !is_done(rough, run, other))
            }
        };
        is_alone.then_some(if gain >= CLEAR_GAIN { CONFIDENCE_CLEAR } else { CONFIDENCE })
    }
}

impl Alike<'_> {
    /// Whether the joint does the same again and again, as toes do that roll off the ground: at 24 poses a second a push of a tenth
    /// of a second is two keys far off all others. Faults lie in no one plane and have no one size.
    pub(super) fn is_repeated(&self, run: Run) -> bool {
        let rough = self.rough;
        if !self.is_coarse {
            return false;
        }
        let wanted = Stretch::of(rough, run.first, run.last);
        let roughest = |keys: std::ops::RangeInclusive<usize>| {
            keys.max_by(|a, b| rough.residual(*a).total_cmp(&rough.residual(*b)))
        };
        let Some(top) = roughest(run.first - 1..=run.last + 1) else { return false };
        let (mut repeats, mut key) = (0, 1);
        loop {
            key = rough.next_rough(key);
            if key + 1 >= rough.len() || repeats == LEAST_REPEATS {
                return repeats == LEAST_REPEATS;
            }
            let is_other = key + BESIDE < run.first || key > run.last + BESIDE;
            // Poses are taken at other moments of each push, so it may lie a key off.
            let is_same = is_other
                && rough.residual(key) >= REPEAT_ROUGHNESS * run.peak
                && [0, 1, 2].into_iter().any(|late| {
                    let Some(first) = (run.first + key + late).checked_sub(top + 1) else { return false };
                    let last = first + run.last - run.first;
                    first >= BESIDE
                        && last + BESIDE < rough.len()
                        && Stretch::of(rough, first, last).is_like(&wanted, run.peak)
                });
            repeats += usize::from(is_same);
            key += if is_same { run.last - run.first + BESIDE } else { 1 };
        }
    }

    /// The largest roughness of the joint, a run and the keys next to it left out.
    fn roughest_beside(&self, run: Run) -> f64 {
        let all =
            || Largest::new(&(0..self.rough.len()).map(|key| self.rough.residual(key)).collect::<Vec<_>>());
        self.roughest.get_or_init(all).outside(run.first.checked_sub(4), run.last + 4).unwrap_or(0.0)
    }
}

/// The largest of a row of numbers up to each, and from each on.
struct Largest {
    before: Vec<f64>,
    after: Vec<f64>,
}

impl Largest {
    fn new(each: &[f64]) -> Self {
        let larger = |so_far: &mut f64, own: &f64| {
            *so_far = so_far.max(*own);
            Some(*so_far)
        };
        let mut after: Vec<f64> = each.iter().rev().scan(f64::NEG_INFINITY, larger).collect();
        after.reverse();
        Self { before: each.iter().scan(f64::NEG_INFINITY, larger).collect(), after }
    }

    /// The largest of those up to `last_before` and from `first_after` on; `None` where there are none.
    fn outside(&self, last_before: Option<usize>, first_after: usize) -> Option<f64> {
        let before = last_before.map(|index| self.before[index]);
        before.into_iter().chain(self.after.get(first_after).copied()).reduce(f64::max)
    }
}

/// Whether a run of several keys goes as a joint moves, and is not off all along.
fn is_swing(run: Run) -> bool {
    let is_uneven = run.last > run.first && run.weakest < SWING_SHARE * run.size;
    is_uneven && (run.peak < SWING_ROUGHNESS * run.size || run.across > STEP_SIZES * run.size)
}

/// How a joint moves around a run.
struct Stretch {
    shape: Vec<f64>,
    /// How far each key of the run lies off the way across it.
    off: Vec<Bivector>,
}

impl Stretch {
    fn of(rough: &Roughness<'_>, first: usize, last: usize) -> Self {
        let off = |key| (across(rough, first, last, key).reverse() * rough.pose(key)).plane_angles();
        Self { shape: shape_around(rough, first, last), off: (first..=last).map(off).collect() }
    }

    /// Whether the poses turn against each other by the same angles, as a share of `size_rad`, and lie off in the same planes.
    fn is_like(&self, other: &Self, size_rad: f64) -> bool {
        let sum = |of: &dyn Fn(&Bivector, &Bivector) -> f64| -> f64 {
            self.off.iter().zip(&other.off).map(|(a, b)| of(a, b)).sum()
        };
        let [both, own, its] = [sum(&|a, b| a.dot(*b)), sum(&|a, _| a.dot(*a)), sum(&|_, b| b.dot(*b))];
        apart(&self.shape, &other.shape) < REPEAT_SHARE * size_rad && both > REPEAT_PLANE * (own * its).sqrt()
    }
}

/// Whether another joint does what this one does around a run, at any time.
fn is_done(rough: &Roughness<'_>, run: Run, other: &Roughness<'_>) -> bool {
    let wanted = shape_around(rough, run.first, run.last);
    let others: Vec<Rotor> = (0..other.len()).map(|key| other.pose(key)).collect();
    let count = (run.last + BESIDE + 1).min(rough.len()) - (run.first - BESIDE);
    others.windows(count).any(|own| apart(&shape(own), &wanted) < ALIKE_SHARE * run.peak)
}

/// How a joint moves from some keys before a run to some keys after it.
pub(super) fn shape_around(rough: &Roughness<'_>, first: usize, last: usize) -> Vec<f64> {
    let keys = first - BESIDE..(last + BESIDE + 1).min(rough.len());
    shape(&keys.map(|key| rough.pose(key)).collect::<Vec<_>>())
}

/// How far two shapes of as many poses are apart, in the mean of their turns, in radians.
pub(super) fn apart(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| (a - b).abs()).sum::<f64>() / a.len() as f64
}

/// The turns from each pose to each later one: they say how a stretch moves, but not about which axes.
pub(super) fn shape(poses: &[Rotor]) -> Vec<f64> {
    let mut turns = Vec::with_capacity(poses.len() * poses.len() / 2);
    for (i, a) in poses.iter().enumerate() {
        turns.extend(poses[i + 1..].iter().map(|b| angle_of_dot(a.dot(*b))));
    }
    turns
}

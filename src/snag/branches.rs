//! Which of its equal triples each key of a file's angles stores, against the row of triples that changes least.

use std::cmp::Ordering;
use std::ops::Range;

use crate::clip::FileAngles;

use super::scan::Scan;

/// What one step into another of the equal triples costs, in squared degrees: a change of branch must gain more than
/// rounding and noise near a pole can.
const SWITCH_COST: f64 = 225.0;

/// And at most this share of the step's own cost may be left: past a pole both ways are about as far.
const LEFT_SHARE: f64 = 0.8;

/// Through a step in which the joint itself turns by more than this, in radians, no branch can be followed.
const FOLLOWED_RAD: f64 = 1.0;

/// No angle of a key steps by more than this, in degrees, unless the step is worth a look: three such squares together are less
/// than [`SWITCH_COST`], so that no other branch can be cheaper, and no angle comes near half a turn.
const CALM_DEG: f64 = 8.66;

/// Keys that are looked over together.
const BLOCK: usize = 64;

/// The keys whose angles step from the key before by more than the calmest motion does; those that are not finite and those
/// after them are among these. Most keys of most joints are not.
pub(super) fn wide_steps(degrees: &[[f64; 3]]) -> Vec<usize> {
    let mut wide = Vec::new();
    let is_calm = |from: f64, to: f64| (to - from).abs() <= CALM_DEG;
    if degrees.first().is_some_and(|triple| !is_finite(triple)) {
        wide.push(0);
    }
    for start in (1..degrees.len()).step_by(BLOCK) {
        let end = (start + BLOCK).min(degrees.len());
        let (before, own) = (degrees[start - 1..end - 1].as_flattened(), degrees[start..end].as_flattened());
        let mut calm = true;
        for (from, to) in before.iter().zip(own) {
            calm &= is_calm(*from, *to);
        }
        if !calm {
            let is_wide = |key: &usize| (0..3).any(|i| !is_calm(degrees[key - 1][i], degrees[*key][i]));
            wide.extend((start..end).filter(is_wide));
        }
    }
    wide
}

pub(super) fn is_finite(triple: &[f64; 3]) -> bool {
    triple.iter().all(|angle| angle.is_finite())
}

/// Keys over which the row of equal triples goes as the file's own does, but for whole turns.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Stretch {
    /// Up to the key before the next stretch.
    pub(super) first: usize,
    /// Whether the file's triples are the mirrored ones against the row.
    pub(super) is_mirrored: bool,
    /// Whole turns by which the row is off the triples.
    pub(super) turns: [f64; 3],
}

/// The row of equal triples that changes least.
#[derive(Clone, Debug)]
pub(super) struct Branches {
    /// In order; the first begins at key 0.
    stretches: Vec<Stretch>,
}

impl Branches {
    /// Each stretch with the key after its last, of `count` keys.
    pub(super) fn stretches(&self, count: usize) -> impl Iterator<Item = (Stretch, usize)> + '_ {
        let ends = self.stretches.iter().skip(1).map(|next| next.first).chain([count]);
        self.stretches.iter().copied().zip(ends)
    }

    /// The runs of keys, first and last, whose triples are the mirrored ones against the row.
    pub(super) fn mirrored_runs(&self, count: usize) -> Vec<(usize, usize)> {
        let mut runs: Vec<(usize, usize)> = Vec::new();
        for (stretch, end) in self.stretches(count).filter(|(stretch, _)| stretch.is_mirrored) {
            match runs.last_mut() {
                Some((_, last)) if *last + 1 == stretch.first => *last = end - 1,
                _ => runs.push((stretch.first, end - 1)),
            }
        }
        runs
    }

    /// Whether a key's triple is the mirrored one against the row.
    pub(super) fn is_mirrored(&self, key: usize) -> bool {
        self.stretch(key).is_mirrored
    }

    /// The triple of the row at a key, in degrees; `None` where the file's is not finite.
    pub(super) fn row(&self, angles: &FileAngles, key: usize) -> Option<[f64; 3]> {
        let triple = angles.degrees[key];
        is_finite(&triple).then(|| self.stretch(key).row(angles, triple))
    }

    fn stretch(&self, key: usize) -> Stretch {
        let index = self.stretches.partition_point(|stretch| stretch.first <= key);
        self.stretches[index.saturating_sub(1)]
    }
}

impl Stretch {
    fn row(&self, angles: &FileAngles, triple: [f64; 3]) -> [f64; 3] {
        let own = if self.is_mirrored { mirrored(angles, triple) } else { triple };
        std::array::from_fn(|i| own[i] + 360.0 * self.turns[i])
    }
}

/// Follows the angles with the two equal triples of each key, and gives the cheapest row by the sum of squared changes;
/// whole turns are free. A row and its mirror image cost the same, so a change of branch is worth while just where it makes
/// its own step cheaper. Which of the two it is, is told by [`Sides::starts_mirrored`]. `wide` are the keys where anything can happen
/// ([`wide_steps`]).
pub(super) fn follow(scan: &Scan<'_>, angles: &FileAngles, wide: &[usize]) -> Branches {
    let degrees: &[[f64; 3]] = &angles.degrees;
    let has_mirror = angles.axes.len() == 3;
    // Finite keys with a wide step, and the finite key before.
    let steps: Vec<(usize, usize)> = wide
        .iter()
        .filter(|&&key| is_finite(&degrees[key]))
        .filter_map(|&key| Some((key, (0..key).rev().find(|&near| is_finite(&degrees[near]))?)))
        .collect();
    let told: Vec<(usize, Change)> = steps
        .iter()
        .filter(|_| has_mirror)
        .filter_map(|&(key, near)| Some((key, change(scan, angles, near, key)?)))
        .collect();
    let changes = changes_of_side(angles, &told);

    let starts_mirrored = changes.first() == Some(&0);
    let mut stretches = vec![Stretch { first: 0, is_mirrored: starts_mirrored, turns: [0.0; 3] }];
    for (key, near) in steps {
        let last = stretches[stretches.len() - 1];
        let is_mirrored = last.is_mirrored != changes.binary_search(&key).is_ok();
        let before = last.row(angles, degrees[near]);
        let own = if is_mirrored { mirrored(angles, degrees[key]) } else { degrees[key] };
        let turns = std::array::from_fn(|i| -((own[i] - before[i]) / 360.0).round() + 0.0);
        let stretch = Stretch { first: key, is_mirrored, turns };
        if stretch != (Stretch { first: key, ..last }) {
            stretches.push(stretch);
        }
    }
    Branches { stretches }
}

/// What a step into another of the equal triples says.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Change {
    /// The row goes from the one to the other triple.
    Switch,
    /// The joint jumps: on which side the row goes on can't be told from the step.
    Jump,
}

/// What there is to the step from key `near` into `key`; `None` where the file's own triples are the nearest.
fn change(scan: &Scan<'_>, angles: &FileAngles, near: usize, key: usize) -> Option<Change> {
    let (before, own) = (angles.degrees[near], angles.degrees[key]);
    let change = |from: [f64; 3], to: [f64; 3]| (0..3).map(|i| short(to[i] - from[i]).powi(2)).sum::<f64>();
    let (kept, switched) = (change(before, own), change(mirrored(angles, before), own));
    if switched + SWITCH_COST >= kept || switched > LEFT_SHARE * kept {
        return None;
    }
    // The turn is dear to compute and seldom asked for.
    let turn = scan.unit(near).zip(scan.unit(key)).map_or(0.0, |(a, b)| a.turn_to(b));
    Some(if turn <= FOLLOWED_RAD { Change::Switch } else { Change::Jump })
}

/// The keys at which the row changes between the file's own triples, on which it is before key 0, and the mirrored ones.
///
/// Between two jumps the steps tell only where it changes. Up to the first jump the first key keeps its own triple, and after a jump the row goes
/// on as before it, but for parts where the other way round less is changed in good numbers: see [`Sides::starts_mirrored`].
fn changes_of_side(angles: &FileAngles, told: &[(usize, Change)]) -> Vec<usize> {
    let count = angles.degrees.len();
    let mut changes = Vec::new();
    let mut is_mirrored = false;
    let mut start = 0;
    let jumps = told.iter().enumerate().filter(|(_, (_, change))| *change == Change::Jump);
    let parts = jumps.map(|(index, (key, _))| (index, *key)).chain([(told.len(), count)]);
    let mut from = 0;
    for (index, end) in parts {
        let switches: Vec<usize> = told[start..index].iter().map(|(key, _)| *key).collect();
        if !switches.is_empty() {
            let sides = Sides::new(angles, from..end, &switches);
            let starts_mirrored = sides.starts_mirrored(is_mirrored, from == 0);
            if starts_mirrored != is_mirrored {
                changes.push(from);
            }
            is_mirrored = starts_mirrored != (switches.len() % 2 == 1);
            changes.extend(switches);
        }
        (start, from) = (index + 1, end);
    }
    changes
}

/// The two sides between which the row of some keys goes to and fro.
struct Sides {
    /// Of the side of the first key and of the other one: how many keys lie in the usual range of the middle angle, and how many in all.
    each: [[usize; 2]; 2],
}

impl Sides {
    /// `switches` are the keys of `keys` at which the side changes.
    fn new(angles: &FileAngles, keys: Range<usize>, switches: &[usize]) -> Self {
        let usual = |middle: f64| {
            if angles.order.is_proper() {
                (-1e-3..=180.001).contains(&middle)
            } else {
                middle.abs() <= 90.001
            }
        };
        let mut each = [[0usize; 2]; 2];
        let mut side = 0;
        let mut switches = switches.iter().peekable();
        for key in keys {
            if switches.next_if(|&&switch| switch == key).is_some() {
                side = 1 - side;
            }
            each[side][0] += usize::from(usual(angles.degrees[key][1]));
            each[side][1] += 1;
        }
        Self { each }
    }

    /// Whether the file's triples are the mirrored ones at the first key. Those are, that lie outside the usual range of the middle angle where
    /// the others lie inside (at a start alone: elsewhere the way that leads there has told). Where both lie inside, the row passes a pole, one of
    /// them has to give way, and it is the one with fewer keys. `carried` is what is so else.
    fn starts_mirrored(&self, carried: bool, is_start: bool) -> bool {
        let [own, other] = self.each;
        let is_usual = |[usual, all]: [usize; 2]| usual * 2 >= all;
        if is_usual(own) && is_usual(other) {
            return match own[1].cmp(&other[1]) {
                Ordering::Less => true,
                Ordering::Equal => carried,
                Ordering::Greater => false,
            };
        }
        if is_start { !is_usual(own) && other[0] * 2 > other[1] } else { carried }
    }
}

/// The other triple of the same turn, in degrees.
fn mirrored(angles: &FileAngles, [a, b, c]: [f64; 3]) -> [f64; 3] {
    let middle = if angles.order.is_proper() { -b } else { 180.0 - b };
    [a + 180.0, middle, c + 180.0]
}

/// A difference of angles in degrees, brought to −180 to 180.
pub(super) fn short(difference: f64) -> f64 {
    difference - 360.0 * (difference / 360.0).round()
}

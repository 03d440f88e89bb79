//! Which of its equal triples each key of a file's angles stores, against the row of triples that changes least.

use crate::clip::FileAngles;

use super::scan::Scan;

/// What one step into another of the equal triples costs, in squared degrees: a change of branch must gain more than
/// rounding and noise near a pole can.
const SWITCH_COST: f64 = 225.0;

/// Through a step in which the joint itself turns by more than this, in radians, no branch can be followed.
const FOLLOWED_RAD: f64 = 1.0;

/// The row of equal triples that changes least.
#[derive(Clone, Debug)]
pub(super) struct Branches {
    /// Whether a key's triple is the mirrored one against the row.
    pub(super) mirrored: Vec<bool>,
    /// The triples of the row, in degrees; none where the file's is not finite.
    pub(super) row: Vec<Option<[f64; 3]>>,
}

/// Follows the angles with the two equal triples of each key, and gives the cheapest row by the sum of squared changes;
/// whole turns are free. Not greedy: the choice at a pole is made by what follows too (methods after Viterbi 1967).
/// The first key keeps its own branch, unless the triples that keep theirs lie outside the usual range of the middle
/// angle and the others inside.
pub(super) fn follow(scan: &Scan<'_>, angles: &FileAngles) -> Branches {
    let count = angles.degrees.len();
    let has_mirror = angles.axes.len() == 3;
    let mut costs = [0.0, if has_mirror { 0.0 } else { f64::INFINITY }];
    // For each key and branch, whether the best way into it comes from the other branch.
    let mut from_other: Vec<[bool; 2]> = Vec::with_capacity(count);
    let mut before: Option<[[f64; 3]; 2]> = None;
    let mut last_key = 0;
    for (key, triple) in angles.degrees.iter().enumerate() {
        if !triple.iter().all(|angle| angle.is_finite()) {
            from_other.push([false; 2]);
            continue;
        }
        let own = [*triple, mirrored(angles, *triple)];
        let Some(near) = before.replace(own) else {
            last_key = key;
            from_other.push([false; 2]);
            continue;
        };
        let change = |a: usize, b: usize| (0..3).map(|i| short(own[b][i] - near[a][i]).powi(2)).sum::<f64>();
        // Both triples mirrored change by the same, so two of the four sums serve.
        let near_key = std::mem::replace(&mut last_key, key);
        let stay = change(0, 0);
        let mut switch = if has_mirror { change(1, 0) + SWITCH_COST } else { f64::INFINITY };
        // The turn is dear to compute and seldom asked for.
        if (0..2).any(|branch| costs[1 - branch] + switch < costs[branch] + stay) {
            let turn = scan.unit(near_key).zip(scan.unit(key)).map_or(0.0, |(a, b)| a.turn_to(b));
            if turn > FOLLOWED_RAD {
                switch = f64::INFINITY;
            }
        }
        let mut taken = [false; 2];
        let mut next = [0.0; 2];
        for branch in 0..2 {
            let (kept, crossed) = (costs[branch] + stay, costs[1 - branch] + switch);
            taken[branch] = crossed < kept;
            next[branch] = kept.min(crossed);
        }
        costs = next;
        from_other.push(taken);
    }

    let mut branch = usize::from(costs[1] < costs[0]);
    let mut mirrored_keys = vec![false; count];
    for key in (0..count).rev() {
        mirrored_keys[key] = branch == 1;
        if from_other[key][branch] {
            branch = 1 - branch;
        }
    }
    settle_side(angles, &mut mirrored_keys);
    let row = row(angles, &mirrored_keys);
    Branches { mirrored: mirrored_keys, row }
}

/// Of the two rows that mirror each other, takes the one that keeps the first key, or the usual range.
fn settle_side(angles: &FileAngles, mirrored: &mut [bool]) {
    if mirrored.first() == Some(&true) {
        for own in mirrored.iter_mut() {
            *own = !*own;
        }
    }
    let usual = |key: usize| {
        let middle = angles.degrees[key][1];
        if angles.order.is_proper() { (-1e-3..=180.001).contains(&middle) } else { middle.abs() <= 90.001 }
    };
    // How many keys of each side lie in the usual range, and how many in all.
    let mut sides = [[0usize; 2]; 2];
    for (key, &side) in mirrored.iter().enumerate() {
        sides[usize::from(side)][0] += usize::from(usual(key));
        sides[usize::from(side)][1] += 1;
    }
    let [kept, other] = sides;
    if other[1] > 0 && kept[0] * 2 < kept[1] && other[0] * 2 > other[1] {
        for own in mirrored.iter_mut() {
            *own = !*own;
        }
    }
}

fn row(angles: &FileAngles, mirrored_keys: &[bool]) -> Vec<Option<[f64; 3]>> {
    let mut before: Option<[f64; 3]> = None;
    angles
        .degrees
        .iter()
        .zip(mirrored_keys)
        .map(|(&triple, &is_mirrored)| {
            if !triple.iter().all(|angle| angle.is_finite()) {
                return None;
            }
            let own = if is_mirrored { mirrored(angles, triple) } else { triple };
            let near = before.unwrap_or(own);
            before = Some(std::array::from_fn(|i| own[i] - 360.0 * ((own[i] - near[i]) / 360.0).round()));
            before
        })
        .collect()
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

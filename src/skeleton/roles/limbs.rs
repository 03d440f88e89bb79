//! Which joints of a limb's chain are thigh, shin and foot, or upper arm, forearm and hand: every way is tried, names and
//! proportions judge.

use glam::DVec3;

use super::figure::{Figure, rank};
use super::name::Part;

/// Joints of a chain that are looked at; further ones belong to fingers.
const MOST_IN_CHAIN: usize = 14;

/// The best way to read a chain, with what speaks for it.
#[derive(Clone, Debug)]
pub(super) struct Reading {
    /// For each part of the limb its place in the chain.
    pub places: [Option<usize>; 4],
    /// Names and proportions together, 0 to 1, for the whole limb.
    pub score: f64,
    /// Proportions alone, 0 to 1.
    pub shape: f64,
    /// For each part: how much worse the best reading is that puts it elsewhere.
    pub margins: [f64; 4],
}

/// The parts of a leg.
pub(super) const LEG: [Part; 4] = [Part::UpperLeg, Part::LowerLeg, Part::Foot, Part::Toes];
/// The parts of an arm.
pub(super) const ARM: [Part; 4] = [Part::Shoulder, Part::UpperArm, Part::LowerArm, Part::Hand];

/// Reads two mirrored chains as legs, both in the same way where they are of one length.
pub(super) fn read_legs(figure: &Figure<'_>, chains: [&[usize]; 2]) -> [Reading; 2] {
    read_both(figure, chains, LEG, &leg_combinations, &|figure, chain, places| {
        leg_shape(figure, chain, places)
    })
}

/// The same as arms. `leg_length` is that from thigh to ankle, or 0 where it is not known; `across` is the normal of the mirror plane.
pub(super) fn read_arms(
    figure: &Figure<'_>,
    chains: [&[usize]; 2],
    leg_length: f64,
    across: DVec3,
) -> [Reading; 2] {
    read_both(figure, chains, ARM, &arm_combinations, &|figure, chain, places| {
        arm_shape(figure, chain, places, leg_length, across)
    })
}

type Places = [Option<usize>; 4];

fn read_both(
    figure: &Figure<'_>,
    chains: [&[usize]; 2],
    parts: [Part; 4],
    combinations: &dyn Fn(usize) -> Vec<Places>,
    shape: &dyn Fn(&Figure<'_>, &[usize], &Places) -> f64,
) -> [Reading; 2] {
    let alike = chains[0].len() == chains[1].len();
    let one = |chains: &[&[usize]]| {
        let n = chains[0].len().min(MOST_IN_CHAIN);
        let mut scored: Vec<(Places, f64, f64)> = combinations(n)
            .into_iter()
            .map(|places| {
                let count = chains.len() as f64;
                let form = chains.iter().map(|chain| shape(figure, chain, &places)).sum::<f64>() / count;
                let name =
                    chains.iter().map(|chain| names(figure, chain, &places, parts)).sum::<f64>() / count;
                let score = if figure.is_named { 0.65 * name + 0.35 * form } else { form };
                (places, score, form)
            })
            .collect();
        // Equal but for rounding: the first of them counts, however the figure is turned.
        scored.sort_by_key(|(_, score, _)| std::cmp::Reverse(rank(*score)));
        let Some(&(places, score, form)) = scored.first() else {
            return Reading { places: [None; 4], score: 0.0, shape: 0.0, margins: [0.0; 4] };
        };
        let margins = std::array::from_fn(|part| {
            let other = scored.iter().find(|(other, _, _)| other[part] != places[part]);
            other.map_or(1.0, |(_, other, _)| score - other)
        });
        Reading { places, score, shape: form, margins }
    };
    if alike {
        let reading = one(&chains);
        [reading.clone(), reading]
    } else {
        [one(&chains[..1]), one(&chains[1..])]
    }
}

/// How well names fit, as a mean over the parts; joints left over that name a part of the limb count against it.
fn names(figure: &Figure<'_>, chain: &[usize], places: &Places, parts: [Part; 4]) -> f64 {
    let mut sum = 0.0;
    let mut count = 0.0;
    for (place, part) in places.iter().zip(parts) {
        if let Some(place) = place {
            sum += figure.names[chain[*place]].score(part);
            count += 1.0;
            continue;
        }
        // Toes and collar bones may be missing; less so where a joint is left for them.
        let is_left = match part {
            Part::Shoulder => places[1].is_some_and(|upper| upper > 0),
            Part::Toes => places[2].is_some_and(|foot| foot + 1 < chain.len()),
            _ => true,
        };
        // A chain of one or two joints has no room for them.
        count += if !is_left || chain.len() <= 2 {
            0.15
        } else if matches!(part, Part::Shoulder | Part::Toes) {
            0.6
        } else {
            0.8
        };
    }
    // A joint passed over that names a part of this limb speaks against the reading.
    let taken: Vec<usize> = places.iter().flatten().copied().collect();
    if let (Some(&first), Some(&last)) = (taken.first(), taken.last()) {
        // A second collar bone is usual.
        let is_collar = |place: usize| {
            parts[0] == Part::Shoulder
                && places[1].is_some_and(|upper| place < upper)
                && figure.names[chain[place]].score(Part::Shoulder) > 0.5
        };
        let passed = (first..last)
            .filter(|place| !taken.contains(place) && !is_collar(*place))
            .map(|place| &figure.names[chain[place]]);
        count += 0.5 * passed.filter(|name| parts.iter().any(|&part| name.score(part) > 0.5)).count() as f64;
    }
    sum / f64::max(count, 1.0)
}

/// Thigh, shin, foot, and perhaps toes; short chains may lack the outer ones.
fn leg_combinations(n: usize) -> Vec<Places> {
    let mut all = Vec::new();
    for upper in 0..n {
        for lower in upper + 1..n {
            for foot in lower + 1..n {
                all.push([Some(upper), Some(lower), Some(foot), None]);
                all.extend((foot + 1..n).map(|toes| [Some(upper), Some(lower), Some(foot), Some(toes)]));
            }
            if n <= 3 {
                all.push([Some(upper), Some(lower), None, None]);
            }
        }
        if n <= 2 {
            all.push([Some(upper), None, None, None]);
        }
    }
    all
}

/// Perhaps a collar bone, then upper arm, forearm, hand; short chains may lack the outer ones.
fn arm_combinations(n: usize) -> Vec<Places> {
    let mut all = Vec::new();
    for upper in 0..n {
        let collars: Vec<Option<usize>> = (0..upper).map(Some).chain([None]).collect();
        for collar in collars {
            for lower in upper + 1..n {
                all.extend((lower + 1..n).map(|hand| [collar, Some(upper), Some(lower), Some(hand)]));
                if n <= 4 {
                    all.push([collar, Some(upper), Some(lower), None]);
                }
            }
            if n <= 2 {
                all.push([collar, Some(upper), None, None]);
            }
        }
    }
    all
}

/// 1 where a ratio is as expected, falling off with its logarithm (`skeleton-names` section 4.4).
fn near(ratio: f64, expected: f64, width: f64) -> f64 {
    if ratio > 0.0 && ratio.is_finite() { (-((ratio / expected).ln() / width).powi(2)).exp() } else { 0.0 }
}

/// Proportions of the H-Anim figure: thigh 0.468, shin 0.476, foot 0.141 of the hip height.
fn leg_shape(figure: &Figure<'_>, chain: &[usize], places: &Places) -> f64 {
    let at = |place: usize| figure.position[chain[place]];
    let [Some(upper), lower, foot, toes] = *places else { return 0.0 };
    let total = figure.reach[chain[upper]];
    let (Some(lower), Some(foot)) = (lower, foot) else { return 0.2 };
    let (thigh, shin) = (at(upper).distance(at(lower)), at(lower).distance(at(foot)));
    let ratio = near(shin / thigh, 1.02, 0.35);
    let share = near((thigh + shin) / total, 0.82, 0.25);
    let ahead = figure.next_place(chain[foot]);
    let ahead_length = ahead.map_or(0.0, |ahead| ahead.distance(at(foot)));
    let turned = ahead.map_or(0.3, |ahead| {
        let angle = (ahead - at(foot)).angle_between(at(foot) - at(lower));
        if angle.is_finite() { (angle.to_degrees() / 45.0).min(1.0) } else { 0.5 }
    });
    let short = if ahead_length < 0.6 * shin { 1.0 } else { 0.2 };
    let toes = match toes {
        Some(toes) => {
            let first = toes == foot + 1;
            if first { 1.0 } else { 0.6 }
        }
        None if chain.len() > foot + 1 => 0.3,
        None => 1.0,
    };
    let connected = first_of_bone(figure, chain, upper)
        * first_of_bone(figure, chain, lower)
        * first_of_bone(figure, chain, foot);
    let connected = connected * straight(figure, chain, upper, lower) * straight(figure, chain, lower, foot);
    // A leg begins at its top.
    let covered = total / figure.reach[chain[0]].max(f64::MIN_POSITIVE);
    let connected = connected * covered.min(1.0);
    let whole = (at(upper).distance(at(foot)) / total.max(f64::MIN_POSITIVE)).min(1.0);
    (0.28 * ratio + 0.24 * share + 0.16 * turned + 0.12 * short + 0.1 * toes + 0.1 * whole) * connected
}

/// How straight the chain runs from one place to another: a bone does not bend within.
fn straight(figure: &Figure<'_>, chain: &[usize], from: usize, to: usize) -> f64 {
    let at = |place: usize| figure.position[chain[place]];
    let along: f64 = (from..to).map(|place| at(place).distance(at(place + 1))).sum();
    if along > 0.0 { (at(from).distance(at(to)) / along).powi(8) } else { 0.0 }
}

/// A joint with nothing of its own length before the next one is a connector: the next one is meant. And a joint in the
/// middle of a straight bone is a helper of its twist.
fn first_of_bone(figure: &Figure<'_>, chain: &[usize], place: usize) -> f64 {
    let Some(&next) = chain.get(place + 1) else { return 1.0 };
    let empty = figure.position[next].distance(figure.position[chain[place]]) < 1e-6 * figure.extent;
    let straight = place > 0 && {
        let before = figure.position[chain[place]] - figure.position[chain[place - 1]];
        let after = figure.position[next] - figure.position[chain[place]];
        before.length() > 1e-6 * figure.extent && before.angle_between(after) < 0.002
    };
    if empty || figure.names[chain[place]].is_twist() {
        0.85
    } else if straight && !figure.is_named {
        0.97
    } else {
        1.0
    }
}

/// Proportions of the H-Anim figure: upper arm 0.332, forearm 0.295 of the hip height, legs 0.944.
fn arm_shape(figure: &Figure<'_>, chain: &[usize], places: &Places, leg_length: f64, across: DVec3) -> f64 {
    let at = |place: usize| figure.position[chain[place]];
    let [collar, Some(upper), lower, hand] = *places else { return 0.0 };
    let Some(lower) = lower else { return 0.2 };
    let upper_arm = at(upper).distance(at(lower));
    let end = hand.map(at).or_else(|| figure.next_place(chain[lower]));
    let forearm = end.map_or(0.0, |end| end.distance(at(lower)));
    let ratio = near(forearm / upper_arm, 0.89, 0.35);
    let length = if leg_length > 0.0 { near((upper_arm + forearm) / leg_length, 0.66, 0.45) } else { 0.5 };
    let hand_fits = match hand {
        None => 0.3,
        // Fingers part at the hand, not beyond it.
        Some(hand) if (lower + 1..hand).any(|place| figure.kids[chain[place]].len() >= 2) => 0.1,
        Some(hand) if figure.kids[chain[hand]].len() >= 2 || hand + 1 == chain.len() => 1.0,
        // Fingers may hang on it: what follows has to be short.
        Some(hand) => {
            let next = figure.next_place(chain[hand]).map_or(0.0, |next| next.distance(at(hand)));
            if next < 0.6 * forearm { 0.7 } else { 0.1 }
        }
    };
    // The first joint of the chain stands near the middle, with a short bone, when it is a collar bone.
    let off_middle =
        figure.parent[chain[0]].map_or(0.0, |on| (at(0) - figure.position[on]).dot(across).abs());
    let first_bone = if upper > 0 { at(0).distance(at(upper)) } else { f64::MAX };
    let collar_fits = match collar {
        Some(collar) => {
            let short = at(collar).distance(at(upper)) < 0.8 * upper_arm;
            let middle = off_middle < 0.5 * upper_arm;
            f64::from(u8::from(short)).mul_add(0.5, 0.3) + if middle { 0.2 } else { 0.0 }
                - 0.2 * collar as f64
        }
        None if upper > 0 && first_bone > 0.05 * upper_arm => 0.1,
        None => 0.9,
    };
    let bones =
        straight(figure, chain, upper, lower) * hand.map_or(1.0, |hand| straight(figure, chain, lower, hand));
    let connected = bones * first_of_bone(figure, chain, upper) * first_of_bone(figure, chain, lower);
    (0.3 * ratio + 0.25 * length + 0.25 * hand_fits + 0.2 * collar_fits) * connected
}

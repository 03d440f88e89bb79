//! The plan of a body: which pair of limbs are legs, which arms, what lies between, and which way is up.

use std::collections::BTreeMap;

use glam::DVec3;

use crate::rotor::Rotor;

use super::figure::{Figure, ROUNDING, rank};
use super::limbs::{self, Reading};
use super::name::Part;
use super::pairs::{Pair, Pairs};

/// Pairs of limbs that are looked at; a body has a handful.
const MOST_PAIRS: usize = 24;

/// Two mirrored limbs, read.
#[derive(Clone, Debug)]
pub(super) struct Limbs {
    pub pair: Pair,
    /// The joints of each, from the trunk outwards.
    pub chains: [Vec<usize>; 2],
    pub readings: [Reading; 2],
    /// Names, proportions and posture together, 0 to 1.
    pub fit: f64,
}

/// What a skeleton is taken for.
#[derive(Clone, Debug)]
pub(super) struct Plan {
    pub up: DVec3,
    /// Across the mirror plane; to the left where names tell sides.
    pub across: DVec3,
    pub is_left_named: bool,
    pub pairs: Vec<Pair>,
    pub legs: Option<Limbs>,
    pub arms: Option<Limbs>,
    /// The foremost pair of legs of a figure that stands on four or more.
    pub front_legs: Option<Limbs>,
    pub hips: Option<usize>,
    /// Joints from below the hips to the one the arms (or front legs) hang on.
    pub trunk: Vec<usize>,
    /// Joints above that, down to the last one of the head's chain.
    pub neck: Vec<usize>,
    /// The whole plan, compared with others of the same skeleton.
    pub score: f64,
    /// Lowest and highest end along up.
    pub span: [f64; 2],
}

/// A score, up, legs, arms, and whether the arms are front legs.
type Choice = (f64, DVec3, Option<usize>, Option<usize>, bool);

/// The best plan for the tree under `root`.
pub(super) fn plan(figure: &Figure<'_>, root: usize) -> Plan {
    let found = Pairs::new(figure, root);
    let pairs: Vec<Pair> = found.list.iter().copied().take(MOST_PAIRS).collect();
    let chains: Vec<[Vec<usize>; 2]> =
        pairs.iter().map(|pair| pair.first.map(|first| figure.path_down(first))).collect();
    let as_legs: Vec<[Reading; 2]> =
        chains.iter().map(|[left, right]| limbs::read_legs(figure, [left, right])).collect();
    let mut as_arms: BTreeMap<(Option<usize>, usize), [Reading; 2]> = BTreeMap::new();
    // Ends alone: a root on the floor below a figure that flies is no foot.
    let ends = |joint: usize| {
        let own = figure.kids[joint].is_empty().then(|| figure.position[joint]);
        figure.tips[joint].iter().copied().chain(own)
    };
    let places: Vec<DVec3> = figure.subtree(root).into_iter().flat_map(ends).collect();
    let says_leg: Vec<bool> = chains.iter().map(|[left, _]| says_leg(figure, left)).collect();

    let mut best: Option<Choice> = None;
    for (up, prior) in ups(figure, &pairs, found.across) {
        let span = places.iter().fold([f64::MAX, f64::MIN], |[low, high], place| {
            [low.min(place.dot(up)), high.max(place.dot(up))]
        });
        let height = (span[1] - span[0]).max(f64::MIN_POSITIVE);
        let leg_fit: Vec<f64> = (0..pairs.len())
            .map(|index| {
                let reading = &as_legs[index];
                fit_of(figure, reading, legs_stand(figure, &pairs[index], up, span[0], height))
            })
            .collect();
        let mut order: Vec<usize> = (0..pairs.len()).collect();
        order.sort_by_key(|&index| (std::cmp::Reverse(rank(leg_fit[index])), index));
        let mut legs_to_try: Vec<Option<usize>> = order.iter().take(4).map(|&index| Some(index)).collect();
        legs_to_try.push(None);
        for legs in legs_to_try {
            let leg_length = legs.map_or(0.0, |legs| leg_length(figure, &chains[legs], &as_legs[legs]));
            let front = |index: usize| chains[index][0].iter().any(|&joint| figure.names[joint].is_front());
            let own_leg = legs.map_or(0.0, |legs| leg_fit[legs] - 0.25 - if front(legs) { 0.4 } else { 0.0 });
            let mut consider = |arms: Option<usize>, arm_score: f64, four: bool| {
                let head = head_score(figure, legs, arms, &pairs, up, height);
                let score = own_leg + arm_score + 0.2 * head + prior;
                if best.is_none_or(|(most, ..)| score > most + 1e-9) {
                    best = Some((score, up, legs, arms, four));
                }
            };
            consider(None, 0.0, false);
            for arms in (0..pairs.len()).filter(|&arms| Some(arms) != legs) {
                let reading = as_arms.entry((legs, arms)).or_insert_with(|| {
                    let [left, right] = &chains[arms];
                    limbs::read_arms(figure, [left, right], leg_length, found.across)
                });
                let stands = legs.is_some_and(|legs| {
                    stand_both(figure, [&pairs[legs], &pairs[arms]], up, height)
                        || (says_leg[arms] && says_leg[legs])
                });
                if stands {
                    // Whatever names call them.
                    let stance = legs_stand(figure, &pairs[arms], up, span[0], height);
                    let shape = 0.5 * (as_legs[arms][0].shape + as_legs[arms][1].shape);
                    consider(Some(arms), 0.4 * shape + 0.6 * stance - 0.2, true);
                } else {
                    let hang = legs.map_or(0.5, |legs| {
                        arms_hang(figure, [&pairs[legs], &pairs[arms]], up, span[0], height)
                    });
                    consider(Some(arms), fit_of(figure, reading, hang) - 0.35, false);
                }
            }
        }
    }
    let (score, up, legs, arms, four) = best.unwrap_or((0.0, DVec3::Y, None, None, false));
    let span = places
        .iter()
        .fold([f64::MAX, f64::MIN], |[low, high], place| [low.min(place.dot(up)), high.max(place.dot(up))]);
    let height = (span[1] - span[0]).max(f64::MIN_POSITIVE);
    let limbs_of = |index: usize, readings: [Reading; 2], stance: f64| Limbs {
        pair: pairs[index],
        chains: chains[index].clone(),
        fit: fit_of(figure, &readings, stance),
        readings,
    };
    let leg_limbs = legs.map(|legs| {
        limbs_of(legs, as_legs[legs].clone(), legs_stand(figure, &pairs[legs], up, span[0], height))
    });
    let second = arms.map(|arms| {
        if four {
            limbs_of(arms, as_legs[arms].clone(), legs_stand(figure, &pairs[arms], up, span[0], height))
        } else {
            let hang =
                legs.map_or(0.5, |legs| arms_hang(figure, [&pairs[legs], &pairs[arms]], up, span[0], height));
            limbs_of(arms, as_arms[&(legs, arms)].clone(), hang)
        }
    });
    let on = [legs.map(|legs| pairs[legs].on), arms.map(|arms| pairs[arms].on)];
    let taken: Vec<usize> = [legs, arms].into_iter().flatten().flat_map(|index| pairs[index].first).collect();
    let leg_size = leg_limbs.as_ref().map_or(height, |legs| leg_length(figure, &legs.chains, &legs.readings));
    let (hips, trunk) = trunk(figure, root, on, &taken, up, leg_size);
    let neck = neck(figure, hips, &trunk, &taken, up, height);
    let (arms, front_legs) = if four { (None, second) } else { (second, None) };
    Plan {
        up,
        across: found.across,
        is_left_named: found.is_left,
        pairs: found.list,
        legs: leg_limbs,
        arms,
        front_legs,
        hips,
        trunk,
        neck,
        score,
        span,
    }
}

/// Directions that may be up, with what speaks for each beforehand: every format here says +Y, and some files mean +Z. Under a carrier that
/// stands askew it is the carrier's axes, so that a figure is read the same however it is turned as a whole.
fn ups(figure: &Figure<'_>, pairs: &[Pair], across: DVec3) -> Vec<(DVec3, f64)> {
    let usual = [
        (DVec3::Y, 0.3),
        (DVec3::Z, 0.15),
        (-DVec3::Y, 0.0),
        (-DVec3::Z, 0.0),
        (DVec3::X, 0.0),
        (-DVec3::X, 0.0),
    ];
    let mut axes: Vec<(DVec3, f64)> =
        usual.iter().map(|&(axis, prior)| (figure.frame.apply(axis), prior)).collect();
    if figure.frame != Rotor::IDENTITY {
        // The carrier may also be there to set the figure upright.
        for (axis, prior) in usual {
            match axes.iter_mut().find(|(own, _)| own.dot(axis) > 0.999_999) {
                Some(own) => own.1 = own.1.max(prior),
                None => axes.push((axis, prior - 0.1)),
            }
        }
    }
    let mut ups: Vec<(DVec3, f64)> =
        axes.iter().copied().filter(|(axis, _)| axis.dot(across).abs() < 0.35).collect();
    for pair in pairs.iter().take(MOST_PAIRS) {
        let ends = (figure.far[pair.first[0]] + figure.far[pair.first[1]]) * 0.5;
        let along = figure.position[pair.on] - ends;
        let along = along - across * along.dot(across);
        // A figure that as a whole stands askew: only where no axis is near.
        if let Some(up) = along.try_normalize()
            && axes.iter().all(|(axis, _)| axis.dot(up) < 0.94)
        {
            ups.push((up, -0.06));
        }
    }
    if ups.is_empty() {
        ups.push((figure.frame.apply(DVec3::Y), 0.0));
    }
    ups
}

fn fit_of(figure: &Figure<'_>, readings: &[Reading; 2], stance: f64) -> f64 {
    let reading = 0.5 * (readings[0].score + readings[1].score);
    if figure.is_named { 0.7 * reading + 0.3 * stance } else { 0.5 * reading + 0.5 * stance }
}

/// Whether the names of a chain speak of a leg and not of an arm.
fn says_leg(figure: &Figure<'_>, chain: &[usize]) -> bool {
    let says = |parts: [Part; 3]| {
        chain.iter().any(|&joint| parts.iter().any(|&part| figure.names[joint].score(part) > 0.6))
    };
    says([Part::UpperLeg, Part::LowerLeg, Part::Foot]) && !says([Part::UpperArm, Part::LowerArm, Part::Hand])
}

/// From thigh to ankle, the mean of both.
pub(super) fn leg_length(figure: &Figure<'_>, chains: &[Vec<usize>; 2], readings: &[Reading; 2]) -> f64 {
    let one = |chain: &[usize], reading: &Reading| {
        let [Some(upper), lower, foot, _] = reading.places else { return 0.0 };
        let at = |place: usize| figure.position[chain[place]];
        match (lower, foot) {
            (Some(lower), Some(foot)) => at(upper).distance(at(lower)) + at(lower).distance(at(foot)),
            _ => figure.reach[chain[upper]],
        }
    };
    0.5 * (one(&chains[0], &readings[0]) + one(&chains[1], &readings[1]))
}

/// Whether two limbs go down and end lowest.
fn legs_stand(figure: &Figure<'_>, pair: &Pair, up: DVec3, lowest: f64, height: f64) -> f64 {
    let both = pair.first.map(|first| {
        let fall = (figure.position[pair.on] - figure.far[first]).dot(up);
        let reach = figure.reach[first] + figure.position[first].distance(figure.position[pair.on]);
        let down = (fall / (0.75 * reach.max(f64::MIN_POSITIVE))).clamp(0.0, 1.0);
        let low = (1.0 - (figure.far[first].dot(up) - lowest) / (0.25 * height)).clamp(0.0, 1.0);
        let long = (reach / (0.3 * height)).min(1.0);
        (0.5 * down + 0.5 * low) * (0.4 + 0.6 * long)
    });
    0.5 * (both[0] + both[1])
}

/// Whether two limbs hang above the legs and end off the ground.
fn arms_hang(figure: &Figure<'_>, [legs, arms]: [&Pair; 2], up: DVec3, lowest: f64, height: f64) -> f64 {
    let above =
        ((figure.position[arms.on] - figure.position[legs.on]).dot(up) / (0.15 * height)).clamp(0.0, 1.0);
    let both = arms.first.map(|first| {
        let off = ((figure.far[first].dot(up) - lowest) / (0.15 * height)).clamp(0.0, 1.0);
        let long = (figure.reach[first] / (0.2 * height)).min(1.0);
        off * (0.3 + 0.7 * long)
    });
    0.5 * above + 0.25 * (both[0] + both[1])
}

/// Whether both pairs stand on one ground with the trunk lying between them: four legs.
fn stand_both(figure: &Figure<'_>, [legs, arms]: [&Pair; 2], up: DVec3, height: f64) -> bool {
    let trunk = figure.position[arms.on] - figure.position[legs.on];
    let mean = |pair: &Pair| 0.5 * (figure.far[pair.first[0]] + figure.far[pair.first[1]]);
    let level = (mean(legs) - mean(arms)).dot(up).abs() < 0.18 * height;
    let fall = |pair: &Pair| (figure.position[pair.on] - mean(pair)).dot(up) > 0.15 * height;
    level && fall(legs) && fall(arms) && trunk.dot(up).abs() < 0.75 * trunk.length()
}

/// Whether something rises above the arms that may be a head.
fn head_score(
    figure: &Figure<'_>,
    legs: Option<usize>,
    arms: Option<usize>,
    pairs: &[Pair],
    up: DVec3,
    height: f64,
) -> f64 {
    let Some(on) = arms.or(legs).map(|index| pairs[index].on) else { return 0.0 };
    let taken =
        |kid: usize| [legs, arms].into_iter().flatten().any(|index| pairs[index].first.contains(&kid));
    let rise = |kid: usize| {
        let named = figure.path_down(kid).into_iter().take(8).any(|joint| {
            figure.names[joint].score(Part::Head) > 0.45 || figure.names[joint].score(Part::Neck) > 0.7
        });
        if named {
            1.0
        } else {
            ((figure.far[kid] - figure.position[on]).dot(up) / (0.12 * height)).clamp(0.0, 0.8)
        }
    };
    // The way to the legs is none to the head.
    let to_legs = |kid: usize| legs.is_some_and(|legs| figure.is_below(pairs[legs].on, kid));
    figure.kids[on].iter().copied().filter(|&kid| !taken(kid) && !to_legs(kid)).map(rise).fold(0.0, f64::max)
}

/// The hips, and the joints from there to where the arms hang.
fn trunk(
    figure: &Figure<'_>,
    root: usize,
    [legs_on, arms_on]: [Option<usize>; 2],
    taken: &[usize],
    up: DVec3,
    leg_size: f64,
) -> (Option<usize>, Vec<usize>) {
    let hips_fit = |joint: usize| figure.names[joint].score(Part::Hips);
    match (legs_on, arms_on) {
        (Some(legs), Some(arms)) => {
            let to_root = figure.ancestors(legs);
            let up_from_arms = figure.ancestors(arms);
            let Some(joins) = up_from_arms.iter().copied().find(|joint| to_root.contains(joint)) else {
                return (Some(legs), Vec::new());
            };
            let mut trunk: Vec<usize> =
                up_from_arms.into_iter().take_while(|&joint| joint != joins).collect();
            trunk.reverse();
            let far = figure.position[joins].distance(figure.position[legs]) > 0.35 * leg_size;
            let hips = if joins != legs && far { legs } else { joins };
            (Some(hips), trunk)
        }
        (Some(legs), None) => {
            // Without arms the way goes up to whatever stands highest, or is named so.
            let mut trunk = Vec::new();
            let mut at = legs;
            loop {
                let next =
                    figure.kids[at].iter().copied().filter(|kid| !taken.contains(kid)).max_by(|&a, &b| {
                        let key = |kid: usize| {
                            let name = [Part::Spine, Part::Chest, Part::Neck, Part::Head]
                                .map(|part| figure.names[kid].score(part))
                                .into_iter()
                                .fold(0.0, f64::max);
                            name * figure.extent + (figure.far[kid] - figure.position[legs]).dot(up)
                        };
                        let size = figure.extent.max(f64::MIN_POSITIVE);
                        rank(key(a) / size).cmp(&rank(key(b) / size)).then(b.cmp(&a))
                    });
                let Some(next) = next else { break };
                let ends =
                    figure.names[next].score(Part::Neck) > 0.7 || figure.names[next].score(Part::Head) > 0.45;
                if ends || figure.kids[next].is_empty() {
                    break;
                }
                trunk.push(next);
                at = next;
            }
            (Some(legs), trunk)
        }
        (None, Some(arms)) => {
            let mut way = figure.ancestors(arms);
            way.reverse();
            let named = way.iter().position(|&joint| hips_fit(joint) > 0.9);
            let start = named.unwrap_or(0);
            (Some(way[start]), way[start + 1..].to_vec())
        }
        (None, None) => {
            let way = figure.path_down(root);
            let named = way.iter().copied().find(|&joint| hips_fit(joint) > 0.9);
            (named, Vec::new())
        }
    }
}

/// The chain of the head: from the joint the arms hang on, or from one further down where that has none.
fn neck(
    figure: &Figure<'_>,
    hips: Option<usize>,
    trunk: &[usize],
    taken: &[usize],
    up: DVec3,
    height: f64,
) -> Vec<usize> {
    let mut best: Option<(f64, usize)> = None;
    for (steps, &on) in trunk.iter().rev().chain(hips.as_ref()).enumerate() {
        for &kid in figure.kids[on].iter().filter(|kid| !taken.contains(kid) && !trunk.contains(kid)) {
            let said = figure.path_down(kid).into_iter().take(8).fold(0.0, |said: f64, joint| {
                let name = &figure.names[joint];
                said.max(name.score(Part::Head)).max(name.score(Part::Neck))
            });
            let named = figure.names[kid].score(Part::Neck).max(figure.names[kid].score(Part::Head));
            let rise = (figure.far[kid] - figure.position[on]).dot(up) / height;
            let other = [Part::Tail, Part::Wing, Part::Ear, Part::UpperArm, Part::UpperLeg]
                .into_iter()
                .any(|part| figure.names[kid].score(part) > 0.6);
            let strand = figure.names[kid].is_strand() || other;
            if (said < 0.45 && (rise < 0.02 || steps > 1)) || strand {
                continue;
            }
            let score = 2.0 * said + 0.5 * named.max(-0.2) + rise - 0.3 * steps as f64;
            if best.is_none_or(|(most, _)| score > most + ROUNDING) {
                best = Some((score, kid));
            }
        }
    }
    let Some((_, first)) = best else { return Vec::new() };
    // Down to the joint named head, or else to the last one before the face fans out.
    let mut chain = vec![first];
    let mut at = first;
    let is_head = |joint: usize| figure.names[joint].score(Part::Head) > 0.9;
    let way = figure.path_down(first);
    if let Some(end) = way.iter().position(|&joint| is_head(joint)) {
        return way[..=end].to_vec();
    }
    while !is_head(at) {
        let kids: Vec<usize> =
            figure.kids[at].iter().copied().filter(|&kid| !figure.names[kid].is_strand()).collect();
        let named = kids.iter().copied().find(|&kid| is_head(kid));
        let next = named.or_else(|| if let [only] = kids[..] { Some(only) } else { None });
        let Some(next) = next else { break };
        let face = [Part::Jaw, Part::Eye, Part::Ear].iter().any(|&part| figure.names[next].score(part) > 0.9);
        if face || chain.len() > 16 {
            break;
        }
        chain.push(next);
        at = next;
    }
    if ends_in_a_mark(figure, &chain, height) {
        chain.pop();
    }
    chain
}

/// Whether the last joint of a neck without names only marks where the head ends: nothing lies beyond it, and the way there is a head's,
/// much longer than what lies between the joints of a neck. With two joints it can't be told: neck and head are as usual as head and mark.
fn ends_in_a_mark(figure: &Figure<'_>, chain: &[usize], height: f64) -> bool {
    /// From the joint of the head to its top are 0.11 to 0.14 of a person's height, from the base of the neck to the head 0.05 to 0.08.
    const LEAST_SHARE: f64 = 0.06;
    const LEAST_RATIO: f64 = 1.5;
    let &[.., before, head, mark] = chain else { return false };
    let way = |from: usize, to: usize| figure.position[from].distance(figure.position[to]);
    let last = way(head, mark);
    !figure.is_named
        && figure.next_place(mark).is_none()
        && last > LEAST_SHARE * height
        && last > LEAST_RATIO * way(before, head)
}

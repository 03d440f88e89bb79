//! Hands held at points of the scene, or at each other.

use glam::DVec3;

use crate::clip::{Clip, JointPoint, Trails, median_place};
use crate::mend::{PlantOptions, faded, move_end};
use crate::skeleton::TwoJointLimb;
use crate::skeleton::roles::{Role, Side};

use super::figure::Figure;
use super::keep::Goal;
use super::options::{HandHold, HoldAt, frames_of};
use super::plan::Plan;
use super::report::{Missed, Report};
use super::smooth::SmoothCurve;
use super::stand::LEAST_MISS;

/// So long before and after a hold its displacement sets in and fades, in seconds.
const EASE_SECS: f64 = 0.5;

/// Over so many seconds what the smooth displacement leaves is taken back.
const FADE_SECS: f64 = 0.15;

/// A hold that fits both figures: which frames, and where.
struct Hold {
    side: Side,
    frames: (usize, usize),
    at: HoldAt,
}

/// Holds hands in the result by bending arms. First those held at places, then those held at each other. What is held comes second.
pub(super) fn hold_hands(
    clip: &Clip,
    [source, target]: [&Figure; 2],
    plan: &Plan,
    holds: &[HandHold],
    result: Clip,
    report: &mut Report,
) -> (Clip, Vec<Goal>) {
    let mut goals = Vec::new();
    let holds = fitting(clip, [source, target], holds, report);
    let mut result = result;
    for side in Side::BOTH {
        let Some(arm) = arm(target, side) else { continue };
        let own = || holds.iter().filter(|hold| hold.side == side && hold.at != HoldAt::OtherHand);
        if own().next().is_none() {
            continue;
        }
        let row = trail(&result, &arm);
        let mut places: Vec<Option<DVec3>> = vec![None; row.len()];
        for hold in own() {
            let place = match hold.at {
                HoldAt::Place(place) => place,
                _ => median_place(&row, hold.frames.0..=hold.frames.1),
            };
            places[hold.frames.0..=hold.frames.1].fill(Some(place));
        }
        result = held(&result, &arm, &places, report);
        let what = format!("the {} arm does not reach the place where the hand is held", side.name());
        tell_misses(&result, &arm, &places, own().map(|hold| hold.frames), &what, report);
        goals.push(goal(&result, &arm, places, own().map(|hold| hold.frames).collect()));
    }
    let pairs: Vec<(usize, usize)> =
        holds.iter().filter(|hold| hold.at == HoldAt::OtherHand).map(|hold| hold.frames).collect();
    let arms = [arm(target, Side::Left), arm(target, Side::Right)];
    let sources = [Side::Left, Side::Right].map(|side| palm(source, side));
    if let ([Some(left), Some(right)], [Some(own_left), Some(own_right)]) = (arms, sources)
        && !pairs.is_empty()
    {
        let from = Trails::of(clip, &[own_left, own_right]).rows;
        let rows = [trail(&result, &left), trail(&result, &right)];
        let count = rows[0].len();
        let mut places = [vec![None; count], vec![None; count]];
        let fixed = [Side::Left, Side::Right].map(|side| {
            let mut is_fixed = vec![false; count];
            for hold in holds.iter().filter(|hold| hold.side == side && hold.at != HoldAt::OtherHand) {
                is_fixed[hold.frames.0..=hold.frames.1].fill(true);
            }
            is_fixed
        });
        for frame in pairs.iter().flat_map(|&(first, last)| first..=last) {
            let wanted = plan.turned.apply(from[1][frame] - from[0][frame]) * plan.scale;
            let off = wanted - (rows[1][frame] - rows[0][frame]);
            // A hand that is held at a place stays there.
            let share = match (fixed[0][frame], fixed[1][frame]) {
                (true, false) => 0.0,
                (false, true) => 1.0,
                _ => 0.5,
            };
            places[0][frame] = Some(rows[0][frame] - off * share);
            places[1][frame] = Some(rows[1][frame] + off * (1.0 - share));
        }
        for (arm, places) in [left, right].iter().zip(&places) {
            result = held(&result, arm, places, report);
        }
        for (arm, places) in [left, right].iter().zip(&places) {
            let what = "the arm does not reach the other hand";
            tell_misses(&result, arm, places, pairs.iter().copied(), what, report);
        }
        for (arm, places) in [left, right].iter().zip(places) {
            goals.push(goal(&result, arm, places, pairs.clone()));
        }
    }
    (result, goals)
}

/// What is left to hold once limits move the arm: the place to which the hand came.
fn goal(clip: &Clip, arm: &Arm, places: Vec<Option<DVec3>>, spans: Vec<(usize, usize)>) -> Goal {
    let come = trail(clip, arm);
    let places = places.into_iter().zip(come).map(|(place, come)| place.map(|_| come)).collect();
    Goal {
        limb: arm.limb,
        points: vec![(arm.palm, places)],
        spans,
        size: length(clip, arm),
        is_foot: false,
        hinge: None,
        what: "limits pull the hand off the place where it is held",
    }
}

fn length(clip: &Clip, arm: &Arm) -> f64 {
    let [root, middle, end] = arm.limb.points(&clip.skeleton, &clip.local_at(clip.grid.time(0)));
    root.distance(middle) + middle.distance(end)
}

/// The holds whose frames and joints are there; the others are told.
fn fitting(clip: &Clip, figures: [&Figure; 2], holds: &[HandHold], report: &mut Report) -> Vec<Hold> {
    let mut fitting = Vec::with_capacity(holds.len());
    for hold in holds {
        let sides: &[Side] =
            if hold.at == HoldAt::OtherHand { &Side::BOTH } else { std::slice::from_ref(&hold.side) };
        let has_arms = sides.iter().all(|&side| {
            let has_hand = hold.at != HoldAt::OtherHand || figures[0].roles.joint(Role::Hand(side)).is_some();
            has_hand && arm(figures[1], side).is_some()
        });
        let is_sound = !matches!(hold.at, HoldAt::Place(place) if !place.is_finite());
        match frames_of(clip, hold.span_secs) {
            Some(frames) if has_arms && is_sound => {
                fitting.push(Hold { side: hold.side, frames, at: hold.at });
            }
            frames => {
                let why = if frames.is_none() {
                    "it lies outside the clip"
                } else if is_sound {
                    "there are no arms for it"
                } else {
                    "its place is no number"
                };
                let [first, last] = hold.span_secs;
                report.notes.push(format!(
                    "the hold of the {} hand from {first:.3} to {last:.3} s is left out: {why}",
                    hold.side.name()
                ));
            }
        }
    }
    fitting
}

/// An arm with the point of its hand that is held.
#[derive(Clone, Copy)]
struct Arm {
    limb: TwoJointLimb,
    palm: JointPoint,
}

fn arm(figure: &Figure, side: Side) -> Option<Arm> {
    let joint = |role| figure.roles.joint(role);
    let limb = TwoJointLimb::new(
        &figure.skeleton,
        joint(Role::UpperArm(side))?,
        joint(Role::LowerArm(side))?,
        joint(Role::Hand(side))?,
    )?;
    Some(Arm { limb, palm: palm(figure, side)? })
}

/// The point of a hand that is held: the middle of its palm, halfway from the wrist to the middle finger's knuckle, or to the end of a hand without
/// fingers. A hand that has no end is held at its wrist; a figure without hands has none.
pub fn palm(figure: &Figure, side: Side) -> Option<JointPoint> {
    let hand = figure.roles.joint(Role::Hand(side))?;
    let shape = &figure.roles.shape;
    let own = figure.skeleton.world(&figure.rest)[hand].scene_from_joint.inverse();
    let middle = shape.limb_end(hand).map(|end| own.transform_point3(0.5 * (end + shape.positions[hand])));
    let offset = middle.filter(|place| place.is_finite()).unwrap_or_default();
    Some(JointPoint { joint: hand, offset })
}

fn trail(clip: &Clip, arm: &Arm) -> Vec<DVec3> {
    Trails::of(clip, &[arm.palm]).rows.pop().unwrap_or_default()
}

/// The clip with the hand of an arm at its places, where it has such: by a displacement that is smooth over the whole clip.
fn held(clip: &Clip, arm: &Arm, places: &[Option<DVec3>], report: &mut Report) -> Clip {
    let row = trail(clip, arm);
    let known: Vec<Option<DVec3>> =
        places.iter().zip(&row).map(|(place, own)| place.map(|place| place - *own)).collect();
    let times: Vec<f64> = clip.grid.times.iter().collect();
    let shifts = spread_out(&known, &times, clip.duration_secs);
    // The hand keeps its turn in the scene: what the wrist is moved by moves the palm.
    let (moved, made) = move_end(clip, &arm.limb, &shifts, &PlantOptions::default());
    report.note_changes(&made.changes);
    moved
}

/// Displacements at all times from those known at some: a smooth curve through them that is nothing from [`EASE_SECS`] away on, and what
/// it leaves of the known ones faded out beside them.
///
/// Source: Lee & Shin 1999, "A hierarchical approach to interactive motion editing for human-like figures" (displacement maps fitted
/// coarse to fine).
pub(super) fn spread_out(known: &[Option<DVec3>], times: &[f64], duration_secs: f64) -> Vec<DVec3> {
    let held: Vec<f64> =
        known.iter().zip(times).filter(|(own, _)| own.is_some()).map(|(_, secs)| *secs).collect();
    let is_far = |secs: f64| {
        let after = held.partition_point(|own| *own < secs);
        let beside = [after.checked_sub(1), Some(after)].into_iter().flatten().filter_map(|at| held.get(at));
        beside.into_iter().all(|own| (own - secs).abs() > EASE_SECS)
    };
    let fixed: Vec<(f64, DVec3)> = known
        .iter()
        .zip(times)
        .filter_map(|(own, &secs)| own.or(is_far(secs).then_some(DVec3::ZERO)).map(|own| (secs, own)))
        .collect();
    let curves = [0, 1, 2].map(|axis| {
        let values: Vec<(f64, f64)> = fixed.iter().map(|(secs, own)| (*secs, own[axis])).collect();
        SmoothCurve::through(&values, duration_secs)
    });
    let smooth: Vec<DVec3> = times
        .iter()
        .map(|&secs| {
            let near = !is_far(secs);
            if near { DVec3::from_array([0, 1, 2].map(|axis| curves[axis].at(secs))) } else { DVec3::ZERO }
        })
        .collect();
    let left: Vec<Option<DVec3>> = known
        .iter()
        .zip(&smooth)
        .zip(times)
        .map(|((own, smooth), &secs)| {
            own.map(|own| own - *smooth).or_else(|| is_far(secs).then_some(DVec3::ZERO))
        })
        .collect();
    let step_secs =
        if times.len() > 1 { (times[times.len() - 1] - times[0]) / (times.len() - 1) as f64 } else { 1.0 };
    let reach = ((FADE_SECS / step_secs.max(1e-9)).round() as usize).max(3);
    faded(&left, reach).into_iter().zip(smooth).map(|(left, smooth)| left + smooth).collect()
}

/// Tells the worst frame of each span in which a hand is not where it is to be.
fn tell_misses(
    clip: &Clip,
    arm: &Arm,
    places: &[Option<DVec3>],
    spans: impl Iterator<Item = (usize, usize)>,
    what: &str,
    report: &mut Report,
) {
    let row = trail(clip, arm);
    let length = length(clip, arm);
    let off = |frame: usize| places[frame].map_or(0.0, |place| place.distance(row[frame]));
    for (first, last) in spans {
        let worst = (first..=last).max_by(|&a, &b| off(a).total_cmp(&off(b)));
        if let Some(frame) = worst.filter(|&frame| off(frame) > LEAST_MISS * length) {
            report.missed.push(Missed { what: what.to_owned(), joint: arm.limb.end, frame, by: off(frame) });
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn displacements_are_met_where_they_are_known_and_smooth_between() {
        let times: Vec<f64> = (0..240).map(|i| f64::from(i) / 60.0).collect();
        let known: Vec<Option<DVec3>> = times
            .iter()
            .map(|&secs| (1.5..2.0).contains(&secs).then(|| DVec3::new(0.1, 0.02 * secs, -0.05)))
            .collect();
        let all = spread_out(&known, &times, 4.0);
        for (own, known) in all.iter().zip(&known) {
            assert!(known.is_none_or(|known| known.distance(*own) < 1e-12));
        }
        assert!(
            all[..50].iter().chain(&all[200..]).all(|own| own.length() < 1e-12),
            "far away nothing moves"
        );
        let step = |i: usize| (all[i + 1] - all[i]).length();
        assert!((0..239).all(|i| step(i) < 0.02), "no jump: {:?}", (0..239).map(step).fold(0.0, f64::max));
    }
}

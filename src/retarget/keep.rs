//! Joints brought within their limits after everything else.

use std::collections::BTreeSet;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, JointPoint, JointTracks, Trails, VectorTrack};
use crate::limit::{Clamp, Limits, adult};
use crate::mend::{PlantOptions, move_end};
use crate::skeleton::TwoJointLimb;

use super::carry_limits::carried_limits;
use super::figure::Figure;
use super::hands::spread_out;
use super::options::KeptLimits;
use super::plan::{Plan, Root};
use super::report::{LargestCorrection, LimitUse, Missed, Report};
use super::stand::LEAST_MISS;

/// The limits that are meant, for the clip as it is now; `None` where there are none for it, which is told.
pub(super) fn limits_for(
    kept: &KeptLimits,
    [source, target]: [&Figure; 2],
    plan: &Plan,
    result: &Clip,
    report: &mut Report,
) -> Option<Arc<Limits>> {
    match kept {
        KeptLimits::Given(limits) => {
            let count = result.joints.len();
            let fits = limits.joints.keys().all(|&joint| joint < count);
            if !fits {
                report
                    .notes
                    .push(format!("the limits name joints beyond the target's {count}; these were left out"));
            }
            let known = |joint: usize| (joint < count).then_some(joint);
            Some(if fits { Arc::clone(limits) } else { Arc::new(limits.renumbered(&known)) })
        }
        KeptLimits::OfSource(limits) => {
            let (carried, lost) = carried_limits(limits, source, target, plan);
            if !lost.is_empty() {
                report.notes.push(format!(
                    "the limits of {} were not carried over: nothing is driven by that alone",
                    lost.join(", ")
                ));
            }
            Some(Arc::new(carried))
        }
        KeptLimits::Adult if target.root.is_some() => {
            report.notes.push("the limits for adults are not known for one figure of several".to_owned());
            None
        }
        KeptLimits::Adult => match adult::limits_for(result) {
            Ok(found) => Some(Arc::new(found.limits)),
            Err(why) => {
                report.notes.push(why.to_string());
                None
            }
        },
    }
}

/// Something held, for bringing it back after limits have moved it.
#[derive(Clone, Debug)]
pub(super) struct Goal {
    /// The limb that carries it.
    pub limb: TwoJointLimb,
    /// The points that are held, and where: at each frame, where it is.
    pub points: Vec<(JointPoint, Vec<Option<DVec3>>)>,
    /// The spans of the frames in which it is held, one for each of the times that somebody would speak of.
    pub spans: Vec<(usize, usize)>,
    /// The limb's length.
    pub size: f64,
    /// It is a foot, for which the hips may give way.
    pub is_foot: bool,
    /// What is told where it is not met.
    pub what: &'static str,
}

impl Goal {
    /// How far its points are from where they should be, as a mean; `None` in frames in which nothing is held.
    fn off(&self, rows: &[Vec<DVec3>]) -> Vec<Option<DVec3>> {
        let count = rows.first().map_or(0, Vec::len);
        let at = |frame: usize| {
            let own = self.points.iter().zip(rows);
            let off: Vec<DVec3> =
                own.filter_map(|((_, places), row)| Some(places[frame]? - row[frame])).collect();
            (!off.is_empty()).then(|| off.iter().sum::<DVec3>() / off.len() as f64)
        };
        (0..count).map(at).collect()
    }

    fn rows(&self, clip: &Clip) -> Vec<Vec<DVec3>> {
        let points: Vec<JointPoint> = self.points.iter().map(|(point, _)| *point).collect();
        Trails::of(clip, &points).rows
    }

    /// The frame of a span in which it is farthest off, and how far, of the point that is.
    fn worst_in(&self, rows: &[Vec<DVec3>], (first, last): (usize, usize)) -> Option<(usize, f64)> {
        let off = |frame: usize| {
            let own = self.points.iter().zip(rows);
            own.filter_map(|((_, places), row)| Some(places[frame]?.distance(row[frame]))).fold(0.0, f64::max)
        };
        (first..=last).map(|frame| (frame, off(frame))).max_by(|a, b| a.1.total_cmp(&b.1))
    }

    /// The farthest that it is off anywhere, in limbs.
    fn worst(&self, rows: &[Vec<DVec3>]) -> f64 {
        let own = self.spans.iter().filter_map(|&span| self.worst_in(rows, span));
        own.map(|(_, off)| off / self.size).fold(0.0, f64::max)
    }

    /// How badly it is held on the whole, in limbs: how far off it is, and much more how it moves while it should stand.
    fn badness(&self, rows: &[Vec<DVec3>]) -> f64 {
        /// What moves from frame to frame is seen sooner than what stands beside its place.
        const MOVING: f64 = 10.0;
        let off = self.off(rows);
        let away: f64 = off.iter().flatten().map(|off| off.length()).sum();
        let steps = off.windows(2).filter_map(|pair| Some(pair[0]?.distance(pair[1]?)));
        (away + MOVING * steps.sum::<f64>()) / self.size
    }
}

/// Rounds of bringing what is held back and joints within their limits again, at most; and how much better each has to make it.
const ROUNDS: usize = 6;
const BETTER: f64 = 0.9;

/// In limbs that hold something, limits are gone up to this near: what is far from the limit could stand, and must not be moved.
const NEAR: f64 = 0.95;

/// The clip with every joint softly within its limit, and what is held still held as far as limits allow: the hips give way, limbs bend to
/// their places again, and joints are brought within their limits once more, in turns. What is left is told.
pub(super) fn keep_limits(
    limits: &Limits,
    root: Option<&Root>,
    goals: &[Goal],
    result: &Clip,
    report: &mut Report,
) -> Clip {
    let soft = limits.clamped(result, Clamp::Soft);
    let judged = |clip: &Clip| {
        let both = goals.iter().map(|goal| {
            let rows = goal.rows(clip);
            (goal.worst(&rows), goal.badness(&rows))
        });
        both.fold((0.0, 0.0), |all: (f64, f64), own| (all.0.max(own.0), all.1 + own.1))
    };
    let (worst, badness) = judged(&soft);
    let mut best = (badness, soft);
    if worst > LEAST_MISS {
        let in_limbs = limb_joints(result, goals);
        let near = within_near(limits, &in_limbs);
        // Limbs as they were, all else within its limits.
        let mut clip = best.1.clone();
        for &joint in &in_limbs {
            clip.joints[joint] = Arc::clone(&result.joints[joint]);
        }
        let mut before = f64::INFINITY;
        for _ in 0..ROUNDS {
            let clamped = near.clamped(&clip, Clamp::Soft);
            let (worst, badness) = judged(&clamped);
            if badness < best.0 {
                best = (badness, clamped.clone());
            }
            if worst <= LEAST_MISS || badness > BETTER * before {
                break;
            }
            before = badness;
            clip = match root {
                Some(root) => with_hips(&clamped, root, goals),
                None => clamped,
            };
            for goal in goals {
                let times: Vec<f64> = clip.grid.times.iter().collect();
                let shifts = spread_out(&goal.off(&goal.rows(&clip)), &times, clip.duration_secs);
                clip = move_end(&clip, &goal.limb, &shifts, &PlantOptions::default()).0;
            }
        }
    }
    let clamped = best.1;
    for goal in goals {
        let rows = goal.rows(&clamped);
        for &span in &goal.spans {
            let worst = goal.worst_in(&rows, span).filter(|(_, off)| *off > LEAST_MISS * goal.size);
            if let Some((frame, by)) = worst {
                report.missed.push(Missed { what: goal.what.to_owned(), joint: goal.limb.end, frame, by });
            }
        }
    }
    for &joint in limits.joints.keys() {
        if clamped.same_joint(result, joint) {
            continue;
        }
        let (Some(before), Some(after)) = (result.rotation(joint), clamped.rotation(joint)) else { continue };
        let times: Vec<f64> = clamped.grid.times.iter().collect();
        let both = before.at_all(&times).into_iter().zip(after.at_all(&times));
        let worst = both.map(|(a, b)| a.turn_to(b)).enumerate().max_by(|a, b| a.1.total_cmp(&b.1));
        if let Some((frame, by_rad)) = worst
            && report.largest_clamp.is_none_or(|known| by_rad > known.by_rad)
        {
            report.largest_clamp = Some(LargestCorrection { joint, by_rad, frame });
        }
    }
    clamped
}

/// The joints from the top of each limb down to its points.
fn limb_joints(clip: &Clip, goals: &[Goal]) -> BTreeSet<usize> {
    let mut joints = BTreeSet::new();
    for goal in goals {
        for (point, _) in &goal.points {
            let mut at = Some(point.joint);
            while let Some(joint) = at {
                joints.insert(joint);
                at = clip.skeleton.joints()[joint].parent.filter(|_| joint != goal.limb.upper);
            }
        }
    }
    joints
}

/// Limits whose comfort reaches near the limit itself in some joints.
fn within_near(limits: &Limits, joints: &BTreeSet<usize>) -> Limits {
    let mut near = limits.clone();
    for (joint, limit) in &mut near.joints {
        if joints.contains(joint) {
            limit.comfort = limit.limit.scaled(NEAR);
        }
    }
    near
}

/// The hips moved by what the legs are off, so far as they are off alike; smoothly.
fn with_hips(clip: &Clip, root: &Root, goals: &[Goal]) -> Clip {
    let Some(track) = clip.joints[root.target].translation.as_ref() else { return clip.clone() };
    let legs = goals.iter().filter(|goal| goal.is_foot);
    let off: Vec<Vec<Option<DVec3>>> = legs.map(|goal| goal.off(&goal.rows(clip))).collect();
    let known: Vec<Option<DVec3>> = (0..clip.grid.count())
        .map(|frame| {
            let own: Vec<DVec3> = off.iter().filter_map(|row| row[frame]).collect();
            (!own.is_empty()).then(|| own.iter().sum::<DVec3>() / own.len() as f64)
        })
        .collect();
    if known.iter().all(Option::is_none) {
        return clip.clone();
    }
    let times: Vec<f64> = clip.grid.times.iter().collect();
    let shifts = spread_out(&known, &times, clip.duration_secs);
    let at_keys = VectorTrack::straight(clip.grid.times.clone(), shifts);
    let keys: Vec<DVec3> = track
        .times
        .iter()
        .zip(track.keys.iter())
        .map(|(secs, key)| {
            let shift = at_keys.at(secs).unwrap_or_default();
            *key + root.parent_from_scene.transform_vector3(shift)
        })
        .collect();
    let mut moved = clip.clone();
    let translation = Some(VectorTrack::straight(track.times.clone(), keys));
    moved.joints[root.target] = Arc::new(JointTracks { translation, ..(*clip.joints[root.target]).clone() });
    moved
}

/// Notes how joints keep to limits, before these were kept and in the end.
pub(super) fn note_use(limits: &Limits, before: &Clip, after: &Clip, report: &mut Report) {
    let earlier = limits.keeping(before);
    report.limits_title.clone_from(&limits.title);
    report.limits = limits
        .keeping(after)
        .into_iter()
        .map(|own| {
            let before = earlier.iter().find(|other| other.joint == own.joint);
            LimitUse {
                joint: own.joint,
                most_use: own.most_use,
                beyond_before: before.map_or(0, |before| before.beyond_limit),
                most_beyond_before_rad: before.map_or(0.0, |before| before.most_beyond_limit_rad),
                beyond: own.beyond_limit,
                most_beyond_rad: own.most_beyond_limit_rad,
            }
        })
        .collect();
}

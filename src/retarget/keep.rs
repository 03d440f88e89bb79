//! Joints brought within their limits after everything else.

use std::collections::BTreeSet;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, JointPoint, JointTracks, Trails, VectorTrack};
use crate::limit::{Clamp, Limits, adult};
use crate::mend::{PlantOptions, move_end};
use crate::skeleton::{TwoJointLimb, eased, smooth_step};

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
    /// The axis of the limb's lower joint about which it bends, where that is known.
    pub hinge: Option<DVec3>,
    /// What is told where it is not met.
    pub what: &'static str,
}

impl Goal {
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
}

/// A goal while it is worked on.
struct Work<'a> {
    goal: &'a Goal,
    /// Where its points are to be by now: first where they were, then where limits let them stand.
    places: Vec<Vec<Option<DVec3>>>,
    /// How much each point counts at each frame: it grows from the ends of a plant towards its middle, so that nothing jumps where another one
    /// begins or ends.
    weights: Vec<Vec<f64>>,
    up: DVec3,
}

impl<'a> Work<'a> {
    /// `reach`: frames in which a point comes to count in full; `up` is unit.
    fn new(goal: &'a Goal, reach: usize, up: DVec3) -> Self {
        let places: Vec<Vec<Option<DVec3>>> = goal.points.iter().map(|(_, places)| places.clone()).collect();
        let weights = places.iter().map(|row| weights(row, reach)).collect();
        Self { goal, places, weights, up }
    }

    /// How far its points are from where they should be, each as much as it counts, with how much they count together; `None` in frames in which
    /// nothing is held. Of a foot that can't be flat what is lower carries it: its heel rises, or its ball.
    fn off(&self, rows: &[Vec<DVec3>]) -> Vec<Option<(DVec3, f64)>> {
        /// A point that is higher above its place than another by this share of the limb carries nothing.
        const LIFTED: f64 = 0.02;
        let count = rows.first().map_or(0, Vec::len);
        let off_of = |point: usize, frame: usize| Some(self.places[point][frame]? - rows[point][frame]);
        (0..count)
            .map(|frame| {
                let own = || (0..rows.len()).filter_map(|point| Some((point, off_of(point, frame)?)));
                let lowest = own().map(|(_, off)| -off.dot(self.up)).fold(f64::INFINITY, f64::min);
                let mut sum = (DVec3::ZERO, 0.0);
                let mut most = 0.0_f64;
                for (point, off) in own() {
                    let lifted = (-off.dot(self.up) - lowest) / (LIFTED * self.goal.size);
                    let weight = self.weights[point][frame] * (1.0 - smooth_step(lifted.min(1.0))).max(LEAST);
                    sum = (sum.0 + off * weight, sum.1 + weight);
                    most = most.max(self.weights[point][frame]);
                }
                (sum.1 > 0.0).then(|| (sum.0 / sum.1, most))
            })
            .collect()
    }

    /// How badly it is held on the whole, in limbs: how far its points move along the ground while they should stand, and a little how far off they
    /// stand.
    fn badness(&self, rows: &[Vec<DVec3>], step_secs: f64) -> f64 {
        /// What moves is seen at once, what stands beside its place hardly: so much of the distance counts in a second.
        const BESIDE: f64 = 0.2;
        let level = |v: DVec3| if self.goal.is_foot { v - self.up * v.dot(self.up) } else { v };
        let own = self.places.iter().zip(rows).map(|(places, row)| {
            let off: Vec<Option<DVec3>> =
                places.iter().zip(row).map(|(place, at)| place.map(|place| place - *at)).collect();
            let away: f64 = off.iter().flatten().map(|off| off.length()).sum();
            let steps = off.windows(2).filter_map(|pair| Some(level(pair[1]? - pair[0]?).length()));
            BESIDE * step_secs * away + steps.sum::<f64>()
        });
        own.sum::<f64>() / self.goal.size
    }

    /// Moves the places of each plant along the ground to where limits let the foot stand in it: standing beside its place it does not slide.
    fn give_way(&mut self, rows: &[Vec<DVec3>]) {
        let off = self.off(rows);
        for (first, last) in runs(&off) {
            let mut shifts = [0, 1, 2].map(|axis| {
                let mut along: Vec<f64> =
                    off[first..=last].iter().flatten().map(|(off, _)| off[axis]).collect();
                along.sort_by(f64::total_cmp);
                along.get(along.len() / 2).copied().unwrap_or(0.0)
            });
            if self.goal.is_foot {
                let shift = DVec3::from_array(shifts);
                shifts = (shift - self.up * shift.dot(self.up)).to_array();
            }
            for place in self.places.iter_mut().flat_map(|row| row[first..=last].iter_mut()).flatten() {
                *place -= DVec3::from_array(shifts);
            }
        }
    }
}

/// What counts least counts so much, so that a point alone is met all the same.
const LEAST: f64 = 1e-3;

/// How much a held point counts at a frame of a run: little at the ends, but for those of the clip's `count` frames, and in full from `reach` frames
/// on.
pub(super) fn weight(frame: usize, (first, last): (usize, usize), count: usize, reach: usize) -> f64 {
    let before = if first == 0 { usize::MAX } else { frame - first };
    let after = if last + 1 >= count { usize::MAX } else { last - frame };
    let within = (before.min(after) as f64 + 0.5) / reach as f64;
    smooth_step(within.min(1.0)).max(LEAST)
}

fn weights(places: &[Option<DVec3>], reach: usize) -> Vec<f64> {
    let mut weights = vec![0.0; places.len()];
    for run in runs(places) {
        for (own, frame) in weights[run.0..=run.1].iter_mut().zip(run.0..) {
            *own = weight(frame, run, places.len(), reach);
        }
    }
    weights
}

/// Runs of frames in which something is known, first and last.
fn runs<T>(known: &[Option<T>]) -> Vec<(usize, usize)> {
    let mut found: Vec<(usize, usize)> = Vec::new();
    for (frame, _) in known.iter().enumerate().filter(|(_, own)| own.is_some()) {
        match found.last_mut() {
            Some((_, last)) if *last + 1 == frame => *last = frame,
            _ => found.push((frame, frame)),
        }
    }
    found
}

/// Rounds of bringing what is held back and joints within their limits again, at most.
const ROUNDS: usize = 8;

/// In limbs that hold something, limits are gone up to this near: what is far from the limit could stand, and must not be moved.
const NEAR: f64 = 0.95;

/// So far the hips give way at most, in limbs; softly from half of it on.
const HIPS_GIVE: f64 = 0.3;

/// So long from the ends of a plant its foot comes to count in full, in seconds.
pub(super) const WEIGHT_SECS: f64 = 0.15;

/// The clip with every joint softly within its limit, and what is held still held as far as limits allow. In turns joints are brought within
/// their limits, the hips give way to what stands, feet that can't stay at their places stand beside them, and limbs bend there. Moving
/// the hips changes no turn, so it comes last of all. What is left is told.
pub(super) fn keep_limits(
    limits: &Limits,
    root: Option<&Root>,
    goals: &[Goal],
    result: &Clip,
    report: &mut Report,
) -> Clip {
    let step_secs = result.grid.times.median_step().unwrap_or(1.0);
    let reach = ((WEIGHT_SECS / step_secs).round() as usize).max(2);
    let up = root.map_or(DVec3::Y, |root| root.ups[1]);
    let asked: Vec<Work<'_>> = goals.iter().map(|goal| Work::new(goal, reach, up)).collect();
    let judged = |clip: &Clip| {
        let both = asked.iter().map(|work| {
            let rows = work.goal.rows(clip);
            (work.goal.worst(&rows), work.badness(&rows, step_secs))
        });
        both.fold((0.0, 0.0), |all: (f64, f64), own| (all.0.max(own.0), all.1 + own.1))
    };
    let soft = limits.clamped(result, Clamp::Soft);
    let (worst, badness) = judged(&soft);
    let mut best = (badness, soft);
    if worst > LEAST_MISS {
        let mut works: Vec<Work<'_>> = goals.iter().map(|goal| Work::new(goal, reach, up)).collect();
        let in_limbs = limb_joints(result, goals);
        let near = within_near(limits, &in_limbs);
        // Limbs as they were, all else within its limits.
        let mut clip = best.1.clone();
        for &joint in &in_limbs {
            clip.joints[joint] = Arc::clone(&result.joints[joint]);
        }
        for round in 0..ROUNDS {
            let clamped = near.clamped(&clip, Clamp::Soft);
            let stood =
                root.map_or_else(|| clamped.clone(), |root| with_hips(result, &clamped, root, &works));
            let (worst, badness) = judged(&stood);
            if badness < best.0 {
                best = (badness, stood.clone());
            }
            if worst <= LEAST_MISS {
                break;
            }
            clip = stood;
            for work in &mut works {
                // The first rounds try for the places themselves.
                if round > 0 {
                    work.give_way(&work.goal.rows(&clip));
                }
                let times: Vec<f64> = clip.grid.times.iter().collect();
                let off: Vec<Option<DVec3>> =
                    work.off(&work.goal.rows(&clip)).into_iter().map(|own| Some(own?.0)).collect();
                let shifts = spread_out(&off, &times, clip.duration_secs);
                let options = PlantOptions { hinges: [work.goal.hinge, None], ..PlantOptions::default() };
                clip = move_end(&clip, &work.goal.limb, &shifts, &options).0;
            }
        }
    }
    let clamped = best.1;
    if let Some(root) = root {
        let moved = hips_moved(root, [result, &clamped]);
        report.hips_shift = report.hips_shift.max(moved);
    }
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

/// How far the hips were moved at most, in the scene's lengths.
fn hips_moved(root: &Root, [before, after]: [&Clip; 2]) -> f64 {
    let tracks = [before, after].map(|clip| clip.joints[root.target].translation.as_ref());
    let [Some(before), Some(after)] = tracks else { return 0.0 };
    let scene_from_parent = root.parent_from_scene.inverse();
    let moved = before.keys.iter().zip(after.keys.iter()).map(|(a, b)| (*b - *a).length_squared());
    let worst = moved.enumerate().max_by(|a, b| a.1.total_cmp(&b.1)).map(|(key, _)| key);
    worst.map_or(0.0, |key| scene_from_parent.transform_vector3(after.keys[key] - before.keys[key]).length())
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

/// The hips moved by what the feet are off, each as much as it counts; smoothly. `before` is the clip before limits.
fn with_hips(before: &Clip, clip: &Clip, root: &Root, works: &[Work<'_>]) -> Clip {
    let legs = works.iter().filter(|work| work.goal.is_foot);
    let off: Vec<Vec<Option<(DVec3, f64)>>> = legs.map(|work| work.off(&work.goal.rows(clip))).collect();
    let known: Vec<Option<DVec3>> = (0..clip.grid.count())
        .map(|frame| {
            let own = || off.iter().filter_map(|row| row[frame]);
            let all: f64 = own().map(|(_, weight)| weight).sum();
            (all > 0.0).then(|| own().map(|(off, weight)| off * weight).sum::<DVec3>() / all)
        })
        .collect();
    // Limits that throw a limb about are no reason to carry the whole figure after it: all rounds together stay within a bound.
    let most = HIPS_GIVE * works.iter().map(|work| work.goal.size).fold(0.0, f64::max);
    let hips = JointPoint::of(root.target);
    let [was, is] = [before, clip].map(|clip| Trails::of(clip, &[hips]).rows.pop().unwrap_or_default());
    let bounded: Vec<Option<DVec3>> = known
        .into_iter()
        .zip(was.iter().zip(&is))
        .map(|(own, (was, is))| {
            let all = own? + *is - *was;
            let length = all.length();
            let share = if length > 0.0 { eased(length, 0.5 * most, most) / length } else { 1.0 };
            Some(*was + all * share - *is)
        })
        .collect();
    let times: Vec<f64> = clip.grid.times.iter().collect();
    hips_by(clip, root, spread_out(&bounded, &times, clip.duration_secs))
}

/// The hips moved by so much at each frame, in the scene.
pub(super) fn hips_by(clip: &Clip, root: &Root, shifts: Vec<DVec3>) -> Clip {
    let Some(track) = clip.joints[root.target].translation.as_ref() else { return clip.clone() };
    if shifts.iter().all(|shift| *shift == DVec3::ZERO) {
        return clip.clone();
    }
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

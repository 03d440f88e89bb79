//! Holds planted feet where they stand by bending their limbs.

use std::collections::BTreeMap;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{
    Branch, Clip, Foot, FootPart, JointPoint, JointTracks, PathKind, Paths, PlantedSpan, RotationTrack,
    Slide, Times, median_place, slides,
};
use crate::rotor::{Bivector, Rotor, chordal_mean};
use crate::skeleton::{EASE_FROM, EndTurn, Reach, TwoJointLimb, eased, smooth_step};
use crate::snag::Plant;

use super::draft::Draft;

/// Frames whose places are computed together.
const CHUNK: usize = 512;

/// Poses looked at for the hinge of a limb.
const HINGE_POSES: usize = 64;

/// Turns smaller than this change nothing, in radians; and shifts smaller than this share of the leg.
const LEAST_RAD: f64 = 1e-9;
const LEAST_SHIFT: f64 = 1e-7;

/// With the ball down, the foot rises about it before its limb has used this share of what is left to full stretch.
const RISE_FROM: f64 = 0.25;

/// Three times as long as a foot takes to come to rise about its ball, or no longer to, at the ends of a time with the ball down; in seconds.
const RISE_SECS: f64 = 0.15;

/// Over so long the rate fades that a correction has where it is known no further, in seconds.
const RATE_SECS: f64 = 0.15;

/// How feet are held.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PlantOptions {
    /// Which way is up in the scene; unit. For measuring alone: feet are held in all three directions.
    pub up: DVec3,
    /// How long the correction takes to fade into the free frames before and after, in seconds; at least three frames.
    pub fade_secs: f64,
    /// From which share of its length on a limb gives way softly.
    pub ease_from: f64,
    /// A foot comes to its place and leaves it without a corner: at the rate that it has beside it, in place of stopping at once.
    pub keeps_rates: bool,
    /// The axes of the lower joints' own frames about which the limbs of the first two feet bend: see [`Reach::hinge`]. `None` where the clip is to tell
    /// by how they do bend, which one that keeps its knees straight can't.
    pub hinges: [Option<DVec3>; 2],
}

impl Default for PlantOptions {
    fn default() -> Self {
        Self { up: DVec3::Y, fade_secs: 0.15, ease_from: EASE_FROM, keeps_rates: false, hinges: [None; 2] }
    }
}

/// A foot that did not come to its place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Miss {
    /// Which foot of the list.
    pub foot: usize,
    /// The frame in which it is farthest off, of a run of such frames.
    pub frame: usize,
    /// How far it is off there, in the scene's lengths.
    pub by: f64,
}

/// What holding feet came to.
#[derive(Clone, Debug, Default)]
pub struct PlantReport {
    /// How each span slid before.
    pub before: Vec<Slide>,
    /// How it slides now.
    pub after: Vec<Slide>,
    /// Where a limb did not reach: the worst frame of each run.
    pub misses: Vec<Miss>,
    /// The largest change of each joint that was turned, in radians, and the frame of it.
    pub changes: BTreeMap<usize, (f64, usize)>,
}

/// Holds feet at one place, and with heel and ball both down at one heading, for as long as they are planted.
///
/// Each plant takes the median of its places. Heel and ball are held apart: with one of them down the foot may turn about it. The
/// correction fades into the free frames with 2t³ − 3t² + 1, from one plant into the next where they are close. Where a limb is too short for it the foot rises about its ball. The limbs bend in their own
/// planes and give way softly near full stretch. Frames that need no change keep their numbers bit for bit; a track without a
/// key at every frame gets some where it is changed.
///
/// The same clip gives the same result. Spans beyond the clip are cut short; those of a foot that is not listed do nothing.
///
/// Source: Kovar, Schreiner & Gleicher 2002, "Footskate cleanup for motion capture editing", without its lengthening of bones.
pub fn plant_feet(
    clip: &Clip,
    feet: &[Foot],
    spans: &[PlantedSpan],
    options: &PlantOptions,
) -> (Clip, PlantReport) {
    plant_feet_at(clip, feet, spans, &[], options)
}

/// As [`plant_feet`], with the height at which the point of a span is to stand along `options.up`, in the scene: one for each of the first spans,
/// `None` for the height it has. Of a flat foot that of the ball counts.
pub fn plant_feet_at(
    clip: &Clip,
    feet: &[Foot],
    spans: &[PlantedSpan],
    heights: &[Option<f64>],
    options: &PlantOptions,
) -> (Clip, PlantReport) {
    let count = clip.grid.count();
    let (spans, heights): (Vec<PlantedSpan>, Vec<Option<f64>>) = spans
        .iter()
        .enumerate()
        .filter(|(_, span)| {
            span.foot < feet.len() && span.first_frame <= span.last_frame && span.first_frame < count
        })
        .map(|(index, span)| {
            let span = PlantedSpan { last_frame: span.last_frame.min(count - 1), ..*span };
            (span, heights.get(index).copied().flatten())
        })
        .unzip();
    let mut report = PlantReport { before: slides(clip, feet, &spans, options.up), ..PlantReport::default() };
    let mut result = clip.clone();
    for (index, foot) in feet.iter().enumerate() {
        let own: Vec<(PlantedSpan, Option<f64>)> = spans
            .iter()
            .copied()
            .zip(heights.iter().copied())
            .filter(|(span, _)| span.foot == index)
            .collect();
        if !own.is_empty() {
            let shift = Corrections::of(&result, foot, &own, &[], options);
            result = bent(&result, index, foot, &shift, options, &mut report);
        }
    }
    report.after = slides(&result, feet, &spans, options.up);
    (result, report)
}

/// Moves the end of a limb by `shifts` in the scene, one for each frame, by bending it in its own plane; the end keeps its turn in the
/// scene, and near full stretch the limb gives way softly. Frames whose shift is nothing keep their numbers.
///
/// The report has no slides; its misses are those of foot 0.
pub fn move_end(
    clip: &Clip,
    limb: &TwoJointLimb,
    shifts: &[DVec3],
    options: &PlantOptions,
) -> (Clip, PlantReport) {
    let count = clip.grid.count();
    let mut report = PlantReport::default();
    let mut all = shifts.to_vec();
    all.resize(count, DVec3::ZERO);
    let point = JointPoint { joint: limb.end, offset: limb.end_point };
    let end = Foot { limb: *limb, heel: point, ball: point };
    let asked = Corrections {
        shifts: all,
        turns: vec![Bivector::ZERO; count],
        ball: vec![DVec3::ZERO; count],
        may_rise: vec![0.0; count],
    };
    let result = bent(clip, 0, &end, &asked, options, &mut report);
    (result, report)
}

/// The clip with these plants held, several of one foot at once.
pub(super) fn hold(clip: &Clip, plants: &[Plant]) -> Clip {
    let count = clip.grid.count();
    let options = PlantOptions::default();
    let mut feet: Vec<Foot> = Vec::new();
    for plant in plants {
        if !feet.contains(&plant.foot) {
            feet.push(plant.foot);
        }
    }
    let mut report = PlantReport::default();
    let mut result = clip.clone();
    for (foot, own) in feet.iter().enumerate() {
        let (mut spans, mut still) = (Vec::new(), Vec::new());
        for plant in plants.iter().filter(|plant| plant.foot == *own) {
            let parts = [(FootPart::Heel, plant.heel), (FootPart::Ball, plant.ball)];
            for (part, frames) in parts {
                let Some((first_frame, last)) = frames.filter(|span| span.0 <= span.1 && span.0 < count)
                else {
                    continue;
                };
                let last_frame = last.min(count - 1);
                // At the height it has.
                spans.push((PlantedSpan { foot, part, first_frame, last_frame }, None));
            }
            let frames = || plant.heel.iter().chain(&plant.ball);
            if let (Some(first), Some(last)) =
                (frames().map(|span| span.0).min(), frames().map(|span| span.1).max())
            {
                still.extend(first.checked_sub(plant.free.0.saturating_add(1)));
                still.extend(
                    Some(last.saturating_add(plant.free.1.saturating_add(1))).filter(|&frame| frame < count),
                );
            }
        }
        if !spans.is_empty() {
            let asked = Corrections::of(&result, own, &spans, &still, &options);
            result = bent(&result, foot, own, &asked, &options, &mut report);
        }
    }
    result
}

/// What is to be done to the end of a limb at each frame, in the scene.
struct Corrections {
    shifts: Vec<DVec3>,
    turns: Vec<Bivector>,
    /// The ball as seen from the limb's end, in the end's own turn.
    ball: Vec<DVec3>,
    /// How far the foot may rise about its ball where the limb is too short, 0 to 1: where the ball is down.
    may_rise: Vec<f64>,
}

/// The end of a limb at every frame as it is: its place and turn, and heel and ball from there, seen in its own turn.
struct EndTrail {
    places: Vec<DVec3>,
    turns: Vec<Rotor>,
    heel: Vec<DVec3>,
    ball: Vec<DVec3>,
}

impl EndTrail {
    fn of(clip: &Clip, foot: &Foot) -> Self {
        let count = clip.grid.count();
        let branch = Branch::of(clip, foot.joints());
        let (clip, foot) = (&branch.clip, &branch.foot(foot).unwrap_or(*foot));
        let mut trail = Self {
            places: Vec::with_capacity(count),
            turns: Vec::with_capacity(count),
            heel: Vec::with_capacity(count),
            ball: Vec::with_capacity(count),
        };
        let times: Vec<f64> = clip.grid.times.iter().collect();
        for chunk in times.chunks(CHUNK) {
            let worlds = clip.worlds_at(chunk);
            for time in 0..chunk.len() {
                let place = worlds.point(foot.limb.end, time, foot.limb.end_point);
                let turn = worlds.rotation(foot.limb.end, time);
                let seen = |point: DVec3| turn.reverse().apply(point - place);
                trail.heel.push(seen(worlds.point(foot.heel.joint, time, foot.heel.offset)));
                trail.ball.push(seen(worlds.point(foot.ball.joint, time, foot.ball.offset)));
                trail.places.push(place);
                trail.turns.push(turn);
            }
        }
        trail
    }

    fn seen(&self, part: FootPart) -> &[DVec3] {
        match part {
            FootPart::Heel => &self.heel,
            FootPart::Ball => &self.ball,
        }
    }

    /// Where a part of the foot is, at each frame.
    fn part(&self, part: FootPart) -> Vec<DVec3> {
        let own = self.seen(part).iter().zip(&self.turns).zip(&self.places);
        own.map(|((offset, turn), place)| *place + turn.apply(*offset)).collect()
    }
}

impl Corrections {
    /// `still`: frames at which nothing is to change.
    fn of(
        clip: &Clip,
        foot: &Foot,
        spans: &[(PlantedSpan, Option<f64>)],
        still: &[usize],
        options: &PlantOptions,
    ) -> Self {
        let count = clip.grid.count();
        let trail = EndTrail::of(clip, foot);
        let step_secs = clip.grid.times.median_step().unwrap_or(1.0);
        let reach = ((options.fade_secs / step_secs).round() as usize).max(3);
        let rate_reach = ((RATE_SECS / step_secs).round() as usize).max(3);
        let mut down = [vec![false; count], vec![false; count]];
        for (span, _) in spans {
            down[usize::from(span.part == FootPart::Ball)][span.frames()].fill(true);
        }
        let rise_reach = ((RISE_SECS / step_secs).round() as usize).max(3) / 3;
        let [heel_down, ball_down] = &down;
        let places = [trail.part(FootPart::Heel), trail.part(FootPart::Ball)];
        let plants = runs(count, |frame| heel_down[frame] || ball_down[frame]);

        // First the turns: one for each run with both points down, faded out from there.
        let mut known_turns: Vec<Option<Bivector>> = vec![None; count];
        let mut flat_turns = Vec::with_capacity(plants.len());
        for &(first, last) in &plants {
            let flat: Vec<usize> = (first..=last).filter(|&f| heel_down[f] && ball_down[f]).collect();
            let weighted: Vec<(Rotor, f64)> = flat.iter().map(|&frame| (trail.turns[frame], 1.0)).collect();
            let turn = chordal_mean(&weighted).map(|mean| mean.rotor);
            if let Some(turn) = turn {
                for &frame in &flat {
                    known_turns[frame] = Some((turn * trail.turns[frame].reverse()).plane_angles());
                }
            }
            flat_turns.push(turn.map(|turn| (turn, flat)));
        }
        let is_free = |frame: &&usize| !heel_down[**frame] && !ball_down[**frame];
        for &frame in still.iter().filter(is_free) {
            known_turns[frame] = Some(Bivector::ZERO);
        }
        let turns = if options.keeps_rates {
            faded_at_rates(&known_turns, reach, rate_reach)
        } else {
            faded(&known_turns, reach)
        };

        // Then the places: of the points that are down, as the foot is turned now.
        let mut known_shifts: Vec<Option<DVec3>> = vec![None; count];
        for (&(first, last), flat) in plants.iter().zip(&flat_turns) {
            let median = |part: usize, down: &[bool]| {
                let own: Vec<DVec3> = (first..=last).filter(|&f| down[f]).map(|f| places[part][f]).collect();
                median_place(&own, 0..=own.len().saturating_sub(1))
            };
            let mut targets = match flat {
                // A foot that is flat for a while is one body: the heel stands where the ball and the heading put it.
                Some((turn, flat)) => {
                    let is_flat: Vec<bool> = (0..count).map(|f| heel_down[f] && ball_down[f]).collect();
                    let ball = median(1, &is_flat);
                    let mean =
                        |row: &[DVec3]| flat.iter().map(|&f| row[f]).sum::<DVec3>() / flat.len() as f64;
                    [ball + turn.apply(mean(&trail.heel) - mean(&trail.ball)), ball]
                }
                None => [median(0, heel_down), median(1, ball_down)],
            };
            // Onto the ground, where it is told how high that is.
            let lift = |part: FootPart, place: DVec3| {
                let own = spans.iter().find(|(span, _)| {
                    span.part == part && span.first_frame <= last && span.last_frame >= first
                });
                own.and_then(|(_, height)| *height)
                    .map(|height| options.up * (height - place.dot(options.up)))
            };
            let lifts = [lift(FootPart::Heel, targets[0]), lift(FootPart::Ball, targets[1])];
            if flat.is_some() {
                let both = lifts[1].or(lifts[0]).unwrap_or_default();
                targets = targets.map(|target| target + both);
            } else {
                targets = [0, 1].map(|part| targets[part] + lifts[part].unwrap_or_default());
            }
            for frame in first..=last {
                let turn = Rotor::from_plane_angles(turns[frame]) * trail.turns[frame];
                let end_for = |part: usize| {
                    let part_offset = [&trail.heel, &trail.ball][part][frame];
                    targets[part] - turn.apply(part_offset)
                };
                let end = match (heel_down[frame], ball_down[frame]) {
                    (true, true) => (end_for(0) + end_for(1)) * 0.5,
                    (true, false) => end_for(0),
                    (false, _) => end_for(1),
                };
                known_shifts[frame] = Some(end - trail.places[frame]);
            }
        }
        for &frame in still.iter().filter(is_free) {
            known_shifts[frame] = Some(DVec3::ZERO);
        }
        let may_rise = smoothed(ball_down, rise_reach);
        let shifts = if options.keeps_rates {
            faded_at_rates(&known_shifts, reach, rate_reach)
        } else {
            faded(&known_shifts, reach)
        };
        Self { shifts, turns, ball: trail.ball, may_rise }
    }
}

/// 1 where a state holds and 0 elsewhere, the change spread over `reach` frames to both sides of it.
fn smoothed(states: &[bool], reach: usize) -> Vec<f64> {
    let last = states.len().saturating_sub(1) as isize;
    let (reach, width) = (reach as isize, (2 * reach + 1) as f64);
    let at = |frame: isize| f64::from(u8::from(states[frame.clamp(0, last) as usize]));
    let box_mean = |frame: isize| (-reach..=reach).map(|i| at(frame + i)).sum::<f64>() / width;
    (0..states.len()).map(|frame| box_mean(frame as isize)).map(smooth_step).collect()
}

/// The turn of a foot about its ball that brings its end within reach of a limb's root, by the shortest way; all in the scene. None where it
/// is within reach, or comes no nearer.
fn rise(root: DVec3, end: DVec3, ball: DVec3, distance: f64) -> Option<Rotor> {
    let (to_root, to_end) = (root - ball, end - ball);
    let (far, length) = (to_root.length(), to_end.length());
    if end.distance(root) <= distance || far <= 0.0 || length <= 0.0 {
        return None;
    }
    // The angle at the ball between root and end, in the triangle whose third side is the distance.
    let cos = (far * far + length * length - distance * distance) / (2.0 * far * length);
    let wanted = cos.clamp(-1.0, 1.0).acos();
    let now = to_root.angle_between(to_end);
    let axis = to_end.cross(to_root).try_normalize()?;
    (wanted < now).then(|| Rotor::from_plane_angles(Bivector::from_axis(axis * (now - wanted))))
}

/// Runs of frames in a state, first and last.
fn runs(count: usize, is_in: impl Fn(usize) -> bool) -> Vec<(usize, usize)> {
    let mut found: Vec<(usize, usize)> = Vec::new();
    for frame in (0..count).filter(|&frame| is_in(frame)) {
        match found.last_mut() {
            Some((_, last)) if *last + 1 == frame => *last = frame,
            _ => found.push((frame, frame)),
        }
    }
    found
}

/// Values at all frames from those known at some: they fade to nothing over `reach` frames with 2t³ − 3t² + 1, and into one another
/// where the gap between is no longer than that.
pub fn faded<T>(known: &[Option<T>], reach: usize) -> Vec<T>
where
    T: Copy + Default + std::ops::Add<Output = T> + std::ops::Mul<f64, Output = T>,
{
    let fade = |frames: usize, reach: usize| {
        let t = (frames as f64 / reach as f64).min(1.0);
        2.0 * t * t * t - 3.0 * t * t + 1.0
    };
    let mut all: Vec<T> = known.iter().map(|value| value.unwrap_or_default()).collect();
    for (first, last) in runs(known.len(), |frame| known[frame].is_none()) {
        let before = first.checked_sub(1).and_then(|frame| known[frame]);
        let after = known.get(last + 1).copied().flatten();
        let gap = last + 2 - first;
        for (frame, value) in all.iter_mut().enumerate().take(last + 1).skip(first) {
            let (from_before, to_after) = (frame + 1 - first, last + 1 - frame);
            *value = match (before, after) {
                (Some(a), Some(b)) if gap <= reach => {
                    let weight = fade(from_before, gap);
                    a * weight + b * (1.0 - weight)
                }
                _ => {
                    before.unwrap_or_default() * fade(from_before, reach)
                        + after.unwrap_or_default() * fade(to_after, reach)
                }
            };
        }
    }
    all
}

/// As [`faded`], without a corner where the known ends: the rate that it has there fades too, over `rate_reach` frames at most.
fn faded_at_rates<T>(known: &[Option<T>], reach: usize, rate_reach: usize) -> Vec<T>
where
    T: Copy + Default + std::ops::Add<Output = T> + std::ops::Mul<f64, Output = T>,
{
    // The cubic that begins at 0 with rate 1 and ends at 0 with rate 0, in frames.
    let bulge = |frames: usize, reach: usize| {
        let t = (frames as f64 / reach as f64).min(1.0);
        reach as f64 * t * (1.0 - t) * (1.0 - t)
    };
    // The change from one frame to the next away from the gap, over two frames where they are known.
    let rate = |at: Option<usize>, one: Option<usize>, two: Option<usize>| {
        let value = |frame: Option<usize>| frame.and_then(|frame| known.get(frame).copied().flatten());
        match (value(at), value(one), value(two)) {
            (Some(end), _, Some(far)) => (far + end * -1.0) * 0.5,
            (Some(end), Some(near), None) => near + end * -1.0,
            _ => T::default(),
        }
    };
    let mut all = faded(known, reach);
    for (first, last) in runs(known.len(), |frame| known[frame].is_none()) {
        let before = rate(first.checked_sub(1), first.checked_sub(2), first.checked_sub(3));
        let after = rate(Some(last + 1), Some(last + 2), Some(last + 3));
        let within = rate_reach.min(last + 2 - first);
        for (frame, value) in all.iter_mut().enumerate().take(last + 1).skip(first) {
            let (from_before, to_after) = (frame + 1 - first, last + 1 - frame);
            // Rates are seen from the known outwards; into the gap they go on the other way.
            *value = *value + before * -bulge(from_before, within) + after * -bulge(to_after, within);
        }
    }
    all
}

/// The clip with the limb of a foot bent so that its end moves as asked.
fn bent(
    clip: &Clip,
    index: usize,
    foot: &Foot,
    asked: &Corrections,
    options: &PlantOptions,
    report: &mut PlantReport,
) -> Clip {
    let whole = clip;
    let branch = Branch::of(whole, foot.joints());
    let Some(own_foot) = branch.foot(foot) else { return whole.clone() };
    let (clip, limb) = (&branch.clip, &own_foot.limb);
    let times: Vec<f64> = clip.grid.times.iter().collect();
    let leg = crate::clip::leg_lengths(clip, std::slice::from_ref(&own_foot))[0];
    let known = options.hinges.get(index).copied().flatten();
    let hinge = known.unwrap_or_else(|| {
        let every = times.len().div_ceil(HINGE_POSES).max(1);
        let poses = times.iter().step_by(every).map(|&secs| clip.local_at(secs));
        poses.map(|local| limb.hinge(&clip.skeleton, &local)).filter(|axis| axis.is_finite()).sum::<DVec3>()
    });
    let frames: Vec<usize> = (0..times.len())
        .filter(|&frame| {
            asked.shifts[frame].length() > LEAST_SHIFT * leg || asked.turns[frame].length() > LEAST_RAD
        })
        .collect();
    let joints: &[usize] =
        if limb.end == limb.lower { &[limb.upper, limb.lower] } else { &[limb.upper, limb.lower, limb.end] };
    let mut poses: Vec<Vec<(usize, Rotor)>> = vec![Vec::with_capacity(frames.len()); joints.len()];
    let mut misses: Vec<(usize, f64)> = Vec::new();
    let mut changes = [(0.0, 0); 3];
    for chunk in frames.chunks(CHUNK) {
        let secs: Vec<f64> = chunk.iter().map(|&frame| times[frame]).collect();
        for (local, &frame) in clip.locals_at_by(&secs, None).iter().zip(chunk) {
            let world = clip.skeleton.world(local);
            let end = &world[limb.end];
            let place = end.scene_from_joint.transform_point3(limb.end_point);
            let mut target = place + asked.shifts[frame];
            let mut turn = Rotor::from_plane_angles(asked.turns[frame]) * end.rotation;
            if asked.may_rise[frame] > 0.0 {
                let [root, middle, _] = limb.points(&clip.skeleton, local);
                let full = root.distance(middle) + middle.distance(place);
                let soft = (options.ease_from * full).max(root.distance(place)).min(full);
                let wanted = target.distance(root);
                // With the foot to help, the limb need not become all straight.
                let near = eased(wanted, soft, soft + RISE_FROM * (full - soft));
                let distance = wanted + asked.may_rise[frame] * (near - wanted);
                let ball = target + turn.apply(asked.ball[frame]);
                if let Some(rise) = rise(root, target, ball, distance) {
                    target = ball + rise.apply(target - ball);
                    turn = rise * turn;
                }
            }
            let reach = Reach {
                target,
                end_turn: EndTurn::To(turn),
                hinge: (hinge.length() > 0.0).then_some(hinge),
                ease_from: options.ease_from,
            };
            let Some(bend) = limb.bend(&clip.skeleton, local, &reach) else { continue };
            if bend.miss > 1e-6 * leg {
                misses.push((frame, bend.miss));
            }
            let rotors = [Some(bend.upper), Some(bend.lower), bend.end];
            let turned = poses.iter_mut().zip(rotors.into_iter().flatten()).zip(joints).zip(&mut changes);
            for (((row, rotor), &joint), worst) in turned {
                let change = local[joint].rotation.turn_to(rotor);
                if change > worst.0 {
                    *worst = (change, frame);
                }
                row.push((frame, rotor));
            }
        }
    }
    for run in runs_of(&misses) {
        if let Some(&(frame, by)) = run.iter().max_by(|a, b| a.1.total_cmp(&b.1)) {
            report.misses.push(Miss { foot: index, frame, by });
        }
    }
    let mut result = whole.clone();
    let numbers = [foot.limb.upper, foot.limb.lower, foot.limb.end];
    for ((joint, changed), worst) in numbers.into_iter().zip(&poses).zip(changes) {
        if !changed.is_empty() {
            let known = report.changes.entry(joint).or_insert(worst);
            if worst.0 > known.0 {
                *known = worst;
            }
            result = with_frames(&result, joint, changed);
        }
    }
    result
}

/// Entries whose frames follow one another.
fn runs_of(entries: &[(usize, f64)]) -> Vec<&[(usize, f64)]> {
    entries.chunk_by(|a, b| b.0 == a.0 + 1).collect()
}

/// The clip with other turns of a joint at some of its frames, in rising order. A track with a key at every frame keeps its form and all its other
/// numbers; any other gets keys at those frames, and at the frames beside them, in place of the keys between.
pub(super) fn with_frames(clip: &Clip, joint: usize, frames: &[(usize, Rotor)]) -> Clip {
    let Some(track) = clip.rotation(joint).filter(|track| !track.keys.is_empty()) else {
        let rest = clip.skeleton.joints()[joint].rest.rotation;
        let mut keys = vec![rest; clip.grid.count()];
        for &(frame, rotor) in frames {
            keys[frame] = rotor.aligned_to(rest);
        }
        let track = RotationTrack::from_rotors(clip.grid.times.clone(), keys);
        return clip.with_rotation(joint, track);
    };
    let is_keyed = track.times == clip.grid.times && !track.keys.is_empty();
    if is_keyed && track.paths == Paths::Every(PathKind::Slerp) {
        let mut draft = Draft::new(track);
        for &(frame, rotor) in frames {
            let was = track.sound_key(frame);
            draft.set_pose(frame, rotor, was);
        }
        return draft.finish().map_or_else(|| clip.clone(), |track| clip.with_rotation(joint, track));
    }
    // What lies between keys of another path can't be kept by slerp: the whole track is keyed.
    let is_slerp = track.paths == Paths::Every(PathKind::Slerp) && track.segments.are_plain();
    let count = clip.grid.count();
    let mut is_near = vec![!is_slerp; count];
    for &(frame, _) in frames {
        is_near[frame.saturating_sub(1)..=(frame + 1).min(count - 1)].fill(true);
    }
    let new: BTreeMap<usize, Rotor> = frames.iter().copied().collect();
    let step = clip.grid.times.median_step().unwrap_or(1.0);
    let mut keys: Vec<(f64, Rotor)> = Vec::new();
    let mut near_frames = (0..count).filter(|&frame| is_near[frame]).peekable();
    let put = |keys: &mut Vec<(f64, Rotor)>, secs: f64, rotor: Rotor| {
        let rotor = keys.last().map_or(rotor, |(_, before)| rotor.aligned_to(*before));
        keys.push((secs, rotor));
    };
    for (key, secs) in track.times.iter().enumerate() {
        let mut is_taken = false;
        while let Some(&frame) =
            near_frames.peek().filter(|&&frame| clip.grid.time(frame) <= secs + 1e-6 * step)
        {
            let time = clip.grid.time(frame);
            is_taken |= (time - secs).abs() <= 1e-6 * step;
            let time = if is_taken { secs } else { time };
            put(&mut keys, time, new.get(&frame).copied().unwrap_or_else(|| track.at(time)));
            near_frames.next();
        }
        let frame = clip.grid.frame(secs);
        let beside = if clip.grid.time(frame) <= secs { frame + 1 } else { frame.saturating_sub(1) };
        let is_inside = is_near[frame] && is_near.get(beside).copied().unwrap_or(true);
        if !(is_taken || is_inside && is_slerp) {
            let rotor = track.keys[key];
            let own = if rotor.is_finite() { rotor } else { track.sound_key(key) };
            put(&mut keys, secs, own);
        }
    }
    for frame in near_frames {
        let time = clip.grid.time(frame);
        put(&mut keys, time, new.get(&frame).copied().unwrap_or_else(|| track.at(time)));
    }
    let (times, rotors): (Vec<f64>, Vec<Rotor>) = keys.into_iter().unzip();
    let track = RotationTrack::from_rotors(Times::Listed(times.into()), rotors);
    let mut joints = clip.joints.clone();
    joints[joint] = Arc::new(JointTracks { rotation: Some(track), ..(*joints[joint]).clone() });
    Clip { joints, ..clip.clone() }
}

//! A loop played several times over, walking on.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, Times};
use crate::rotor::Rotor;

use super::BlendError;
use super::cloud::{Cloud, Landmarks};
use super::frames::{self, Row};
use super::ground::{GroundMove, frame_above, tops};
use super::mix::set_down;

/// The move on the ground from a loop's first pose to its last: its stride. None of it for a loop on the spot.
///
/// # Errors
/// When the clip has no frames.
pub fn stride(clip: &Clip) -> Result<GroundMove, BlendError> {
    frames::check_frames(clip)?;
    let landmarks = Landmarks::of(clip);
    let ends = Cloud::of(clip, &[clip.duration_secs, 0.0], &landmarks);
    Ok(ends.fit_pairs(&ends, std::iter::once((0, 1))).1)
}

/// The clip `times` times over, each round set down where the one before has ended. Its last frame counts as the next
/// round's first, as in a loop that closes: close it first where it does not. The first round keeps its numbers where the clip has a key at
/// every frame; once over is the clip itself.
///
/// # Errors
/// When the clip has no frames, or `times` is 0.
pub fn repeat(clip: &Clip, times: usize) -> Result<Clip, BlendError> {
    frames::check_frames(clip)?;
    if times == 0 {
        return Err(BlendError::Weight { expected: "of at least one round", found: 0.0 });
    }
    let round = clip.grid.count() - 1;
    if times == 1 || round == 0 {
        return Ok(clip.clone());
    }
    let count = round * times + 1;
    let length = clip.grid.time(round) - clip.grid.time(0);
    let out_times = match &clip.grid.times {
        Times::Even { step_secs, .. } => Times::Even { step_secs: *step_secs, count },
        Times::Listed(own) => Times::Listed(
            (0..count).map(|frame| own[frame % round] + length * (frame / round) as f64).collect(),
        ),
    };
    // The frame a result's frame repeats, and in which round. The very last frame is the last of the last round.
    let origin =
        |frame: usize| if frame == count - 1 { (round, times - 1) } else { (frame % round, frame / round) };
    let secs: Vec<f64> = (0..count).map(|frame| clip.grid.time(origin(frame).0)).collect();
    let step = stride(clip)?;
    let moves: Vec<GroundMove> =
        std::iter::successors(Some(GroundMove::default()), |so_far| Some(so_far.then(step)))
            .take(times)
            .collect();
    let tops = tops(clip);
    let joints = (0..clip.joints.len()).map(|joint| {
        let is_top = tops.contains(&joint) && step != GroundMove::default();
        let [turns, places, sizes] = frames::says(clip, joint);
        if !(turns || places || sizes || is_top) {
            return clip.joints[joint].clone();
        }
        let mut own_turns: Vec<Rotor> = clip.rotations_at(joint, &secs);
        let mut own_places: Vec<DVec3> = frames::places(clip, joint, &secs);
        if is_top {
            let above = frame_above(clip, joint);
            for frame in round..count {
                let place = moves[origin(frame).1];
                (own_turns[frame], own_places[frame]) =
                    set_down(place, above, own_turns[frame], own_places[frame]);
            }
        }
        let row = Row {
            rotations: (turns || is_top).then_some(own_turns),
            translations: (places || is_top).then_some(own_places),
            scales: sizes.then(|| frames::sizes(clip, joint, &secs)),
        };
        let on_frames = clip.rotation(joint).is_none_or(|track| track.times == clip.grid.times);
        let kept = |frame: usize| (on_frames && frame < round).then_some(frame);
        Arc::new(frames::tracks(&clip.joints[joint], &out_times, row, Some(&kept)))
    });
    let joints = joints.collect();
    Ok(frames::clip_of(clip, out_times.clone(), joints))
}

/// The clip with one frame more, in which it shows its first pose again: for a loop whose first frame *follows* its last one, so that
/// [`repeat`] finds the shared frame it counts on. A root goes on by the mean of the last step and the first one.
///
/// # Errors
/// When the clip has fewer than two frames.
pub fn with_first_again(clip: &Clip) -> Result<Clip, BlendError> {
    frames::check_frames(clip)?;
    let count = clip.grid.count();
    let Some(last) = count.checked_sub(1).filter(|&last| last > 0) else {
        return Err(BlendError::NoFrames(clip.name.clone()));
    };
    let times = match &clip.grid.times {
        Times::Even { step_secs, .. } => Times::Even { step_secs: *step_secs, count: count + 1 },
        Times::Listed(own) => {
            let step = clip.grid.times.median_step().unwrap_or(1.0 / clip.grid.rate);
            Times::Listed(own.iter().copied().chain([own[last] + step]).collect())
        }
    };
    let secs: Vec<f64> = (0..count).map(|frame| clip.grid.time(frame)).collect();
    let joints = (0..clip.joints.len()).map(|joint| {
        let [turns, places, sizes] = frames::says(clip, joint);
        if !(turns || places || sizes) {
            return clip.joints[joint].clone();
        }
        let is_root = clip.skeleton.parent_joint(joint).is_none();
        let mut own_turns = clip.rotations_at(joint, &secs);
        let mut own_places = frames::places(clip, joint, &secs);
        let step = |from: usize, to: usize| (own_turns[from].reverse() * own_turns[to]).plane_angles();
        let mean = (step(last - 1, last) + step(0, 1)) * 0.5;
        let next = if is_root {
            (own_turns[last] * Rotor::from_plane_angles(mean)).normalize()
        } else {
            own_turns[0]
        };
        let place = if is_root {
            // On a curve the start's way is turned into the end's.
            let turned = next * own_turns[0].reverse();
            let start = turned.apply(own_places[1] - own_places[0]);
            own_places[last] + (own_places[last] - own_places[last - 1] + start) * 0.5
        } else {
            own_places[0]
        };
        own_turns.push(next);
        own_places.push(place);
        let row = Row {
            rotations: turns.then_some(own_turns),
            translations: places.then_some(own_places),
            scales: sizes.then(|| {
                let mut own = frames::sizes(clip, joint, &secs);
                own.push(own[0]);
                own
            }),
        };
        let on_frames = clip.rotation(joint).is_none_or(|track| track.times == clip.grid.times);
        let kept = |frame: usize| (on_frames && frame < count).then_some(frame);
        Arc::new(frames::tracks(&clip.joints[joint], &times, row, Some(&kept)))
    });
    let joints = joints.collect();
    Ok(frames::clip_of(clip, times.clone(), joints))
}

/// A part of a clip that closes on itself, more or less.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LoopPart {
    /// Where it begins, seconds.
    pub from_secs: f64,
    /// Where it ends, in the pose it began with.
    pub to_secs: f64,
    /// How far apart the poses about its ends are, rates counted: root of the mean squared distance, in the clip's lengths.
    pub distance: f64,
}

/// Motion about a seam that counts, to both sides, seconds: rates as well as poses are to meet.
const SEAM_SECS: f64 = 0.1;

/// The parts of a clip at least `least_secs` long that close on themselves best, best first and each a least of its
/// neighbours, at most `count`: smallest distance of poses over windows with their motion, wherever on the ground (Kovar, Gleicher &
/// Pighin 2002). Looked for on at most `most` times.
///
/// # Errors
/// When the clip has no frames, or is shorter than `least_secs`.
pub fn best_loops(
    clip: &Clip,
    least_secs: f64,
    count: usize,
    most: usize,
) -> Result<Vec<LoopPart>, BlendError> {
    frames::check_frames(clip)?;
    let length = clip.duration_secs;
    if !(least_secs > 0.0 && least_secs <= length) {
        return Err(BlendError::LoopLength { most_secs: length, found_secs: least_secs });
    }
    let times = (clip.grid.count()).clamp(2, most.max(2));
    let step = length / (times - 1) as f64;
    let secs: Vec<f64> = (0..times).map(|time| time as f64 * step).collect();
    let cloud = Cloud::of(clip, &secs, &Landmarks::of(clip));
    let reach = ((SEAM_SECS / step).round() as usize).max(1);
    let apart = ((least_secs / step - frames::SLACK).ceil() as usize).max(1);
    // Row after row: where a part begins, and by how many times more than the least it is long.
    let row_of = |from: usize| -> Vec<f64> {
        (from + apart..times).map(|to| cloud.fit(from, &cloud, to, reach).0).collect()
    };
    let rows: Vec<Vec<f64>> = (0..times - apart).map(row_of).collect();
    let mut found: Vec<LoopPart> = Vec::new();
    for (from, row) in rows.iter().enumerate() {
        for (more, &own) in row.iter().enumerate() {
            let to = from + apart + more;
            let is_least = (from.saturating_sub(1)..=(from + 1).min(rows.len() - 1)).all(|near_from| {
                let first = (to - 1).max(near_from + apart);
                (first..=(to + 1).min(times - 1)).all(|near_to| {
                    let near = rows[near_from][near_to - near_from - apart];
                    own < near || (near_from, near_to) >= (from, to) && own <= near
                })
            });
            if is_least {
                let distance = own.sqrt();
                found.push(LoopPart { from_secs: secs[from], to_secs: secs[to], distance });
            }
        }
    }
    found.sort_by(|a, b| a.distance.total_cmp(&b.distance));
    found.truncate(count);
    Ok(found)
}

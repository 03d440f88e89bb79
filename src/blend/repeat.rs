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
        Arc::new(frames::tracks(&clip.joints[joint], &out_times, row, &kept))
    });
    let joints = joints.collect();
    Ok(frames::clip_of(clip, out_times.clone(), joints))
}

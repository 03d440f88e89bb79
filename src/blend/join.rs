//! Joining: one clip after another over an overlap.

use std::sync::Arc;

use crate::clip::{Clip, Times};
use crate::skeleton::smooth_step;

use super::cloud::{Cloud, DistancePicture, Landmarks};
use super::frames::{self, Row, SLACK};
use super::ground::{GroundMove, frame_above, tops};
use super::mix::{between, lines, said, set_down, shares};
use super::{BlendError, Mask};

/// Frames looked at in each window of a distance picture: few tell it apart.
const SAMPLES: usize = 5;

/// Where one clip is joined to another.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct JoinPlace {
    /// The first clip's time at which the overlap begins, seconds.
    pub first_secs: f64,
    /// The second clip's time at which the overlap begins, seconds.
    pub second_secs: f64,
    /// How long the overlap is, seconds.
    pub overlap_secs: f64,
}

impl JoinPlace {
    /// The end of `a` over the beginning of `b`.
    pub fn end_to_start(a: &Clip, overlap_secs: f64) -> Self {
        Self { first_secs: a.duration_secs - overlap_secs, second_secs: 0.0, overlap_secs }
    }

    /// The weight of the second clip at a time of the first: 0 before the overlap, 1 after it.
    pub fn weight(&self, secs: f64) -> f64 {
        smooth_step((secs - self.first_secs) / self.overlap_secs)
    }

    fn check(&self, a: &Clip, b: &Clip) -> Result<(), BlendError> {
        let shorter = a.duration_secs.min(b.duration_secs);
        let slack = SLACK / a.grid.rate;
        let fits = self.overlap_secs > 0.0
            && self.first_secs >= -slack
            && self.first_secs + self.overlap_secs <= a.duration_secs + slack
            && self.second_secs >= -slack
            && self.second_secs + self.overlap_secs <= b.duration_secs + slack;
        if fits {
            return Ok(());
        }
        if let Some(clip) = [a, b].iter().find(|clip| clip.duration_secs <= 0.0) {
            return Err(BlendError::OneFrame(clip.name.clone()));
        }
        if self.overlap_secs > 0.0 && self.overlap_secs <= shorter + slack {
            return Err(BlendError::Place {
                overlap_secs: self.overlap_secs,
                begins_secs: [self.first_secs, self.second_secs],
                lengths_secs: [a.duration_secs, b.duration_secs],
            });
        }
        Err(BlendError::Overlap { most_secs: shorter, found_secs: self.overlap_secs })
    }
}

/// `b` after `a`: up to the overlap `a`, bit for bit at its own frames; after it `b`, set down on the ground where and
/// as `a` was heading over the overlap; within it a slerp for each joint and a straight line for each place with a weight of
/// 3t² − 2t³, so that turns have no jump in rate at either end. Joints outside `mask` follow `a` and hold its end.
///
/// The result has `a`'s rate. Both clips have the same skeleton.
///
/// # Errors
/// When the overlap does not lie within both clips or one has no frames.
pub fn join(a: &Clip, b: &Clip, place: JoinPlace, mask: &Mask) -> Result<Clip, BlendError> {
    frames::check_frames(a)?;
    frames::check_frames(b)?;
    place.check(a, b)?;
    let rate = a.grid.rate;
    let frame_of = |secs: f64| (secs * rate + SLACK).floor();
    let start = place.first_secs;
    let length = start + b.duration_secs - place.second_secs;
    // Frames of `a` with its own times, then even ones on from the last.
    let held = a.grid.times.iter().take_while(|&secs| secs <= start + SLACK / rate).count();
    let last_held = a.grid.time(held.saturating_sub(1));
    let times = match &a.grid.times {
        Times::Even { step_secs, .. } => {
            Times::Even { step_secs: *step_secs, count: (length / step_secs + SLACK).floor() as usize + 1 }
        }
        Times::Listed(own) => {
            let more = frame_of(length - last_held).max(0.0) as usize;
            let rest = (1..=more).map(|frame| last_held + frame as f64 / rate);
            Times::Listed(own[..held].iter().copied().chain(rest).collect())
        }
    };
    let own_secs: Vec<f64> = times.iter().collect();
    let other_secs: Vec<f64> = own_secs.iter().map(|secs| secs - start + place.second_secs).collect();
    let weights: Vec<f64> = own_secs.iter().map(|&secs| place.weight(secs)).collect();
    let ground = join_ground(a, b, place);
    let all_tops: Vec<usize> = tops(a);
    let joints = (0..a.joints.len()).map(|joint| {
        let factor = mask.of(joint);
        let shares = shares(&weights, factor);
        let is_top = all_tops.contains(&joint);
        let [turns, moves, sizes] = said(a, b, joint);
        if !(turns || moves || sizes || is_top) {
            return a.joints[joint].clone();
        }
        let mut other_turns = b.rotations_at(joint, &other_secs);
        let mut other_places = frames::places(b, joint, &other_secs);
        if is_top {
            let above = frame_above(a, joint);
            for (turn, at) in other_turns.iter_mut().zip(&mut other_places) {
                (*turn, *at) = set_down(ground, above, *turn, *at);
            }
        }
        let row = Row {
            rotations: (turns || is_top)
                .then(|| between(&a.rotations_at(joint, &own_secs), &other_turns, &shares)),
            translations: (moves || is_top)
                .then(|| lines(&frames::places(a, joint, &own_secs), &other_places, &shares)),
            scales: sizes.then(|| {
                lines(&frames::sizes(a, joint, &own_secs), &frames::sizes(b, joint, &other_secs), &shares)
            }),
        };
        let on_frames = a.rotation(joint).is_none_or(|track| track.times == a.grid.times);
        let kept = |frame: usize| (on_frames && frame < held && weights[frame] == 0.0).then_some(frame);
        Arc::new(frames::tracks(&a.joints[joint], &times, row, Some(&kept)))
    });
    let joints = joints.collect();
    Ok(frames::clip_of(a, times.clone(), joints))
}

/// The move that sets `b` down on `a`'s ground in a join: turned to face as `a` does over the overlap, and where both fit best.
pub fn join_ground(a: &Clip, b: &Clip, place: JoinPlace) -> GroundMove {
    let landmarks = Landmarks::of(a);
    let count = ((place.overlap_secs * a.grid.rate).round() as usize).max(1) + 1;
    let secs = |from: f64| -> Vec<f64> {
        (0..count).map(|frame| from + place.overlap_secs * frame as f64 / (count - 1) as f64).collect()
    };
    let own = Cloud::of(a, &secs(place.first_secs), &landmarks);
    let other = Cloud::of(b, &secs(place.second_secs), &landmarks);
    own.set_down(&other, (0..count).map(|frame| (frame, frame))).1
}

/// How far apart the poses of `a` and `b` are over windows of the overlap's length that begin at each pair of times, on a
/// grid of at most `most` rows and columns: what a place for a join is chosen from (Kovar, Gleicher & Pighin 2002, but for the turn: the
/// second clip is turned as the join will turn it, [`Cloud::facing`]).
///
/// # Errors
/// When the overlap does not fit in both clips or one has no frames.
pub fn join_distances(
    a: &Clip,
    b: &Clip,
    overlap_secs: f64,
    most: usize,
) -> Result<DistancePicture, BlendError> {
    frames::check_frames(a)?;
    frames::check_frames(b)?;
    JoinPlace { first_secs: 0.0, second_secs: 0.0, overlap_secs }.check(a, b)?;
    let landmarks = Landmarks::of(a);
    let grid = |clip: &Clip| -> Vec<f64> {
        let span = (clip.duration_secs - overlap_secs).max(0.0);
        let count = ((span * a.grid.rate).round() as usize + 1).clamp(1, most.max(2));
        (0..count).map(|row| span * row as f64 / (count - 1).max(1) as f64).collect()
    };
    let (first_secs, second_secs) = (grid(a), grid(b));
    let windows = |clip: &Clip, starts: &[f64]| {
        let secs: Vec<f64> = starts
            .iter()
            .flat_map(|start| {
                (0..SAMPLES).map(move |k| start + overlap_secs * k as f64 / (SAMPLES - 1) as f64)
            })
            .collect();
        Cloud::of(clip, &secs, &landmarks)
    };
    let (own, other) = (windows(a, &first_secs), windows(b, &second_secs));
    let mut distances = Vec::with_capacity(first_secs.len() * second_secs.len());
    for row in 0..first_secs.len() {
        for column in 0..second_secs.len() {
            let pairs = (0..SAMPLES).map(|k| (row * SAMPLES + k, column * SAMPLES + k));
            distances.push(own.set_down(&other, pairs).0.sqrt());
        }
    }
    Ok(DistancePicture { first_secs, second_secs, distances })
}

/// The best places of a picture, best first: the cells no neighbour of which is nearer.
pub fn best_places(picture: &DistancePicture, overlap_secs: f64, count: usize) -> Vec<(JoinPlace, f64)> {
    let (rows, columns) = (picture.first_secs.len(), picture.second_secs.len());
    let mut places = Vec::new();
    for row in 0..rows {
        for column in 0..columns {
            let own = picture.at(row, column);
            let is_least = (row.saturating_sub(1)..=(row + 1).min(rows - 1)).all(|near_row| {
                (column.saturating_sub(1)..=(column + 1).min(columns - 1)).all(|near| {
                    own < picture.at(near_row, near)
                        || (near_row, near) >= (row, column) && own <= picture.at(near_row, near)
                })
            });
            if is_least {
                let place = JoinPlace {
                    first_secs: picture.first_secs[row],
                    second_secs: picture.second_secs[column],
                    overlap_secs,
                };
                places.push((place, own));
            }
        }
    }
    places.sort_by(|a, b| a.1.total_cmp(&b.1));
    places.truncate(count);
    places
}

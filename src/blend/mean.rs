//! Means of many clips: frame by frame, or with their steps in time.

use std::borrow::Cow;
use std::collections::BTreeSet;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{self, Clip, JointTracks, Times};
use crate::rotor::{Rotor, chordal_mean, geodesic_mean};

use super::feet::{self, Origin};
use super::frames::{self, Row, SLACK};
use super::ground::{GroundMove, frame_above, tops};
use super::mix::{centre, path_of, set_down};
use super::registration::{Registration, Stop};
use super::{BlendError, Mask};

/// How the mean of many clips is taken.
#[derive(Clone, Copy, Debug)]
pub struct MeanHow<'a> {
    /// Factors for joints: how much of the clips after the first they take; what is missing of it is the first one's.
    pub mask: &'a Mask,
    /// Which times of each clip after the first belong together with the first one's; `None` for frame by frame.
    pub along: Option<&'a [&'a Registration]>,
    /// Whether feet that stand in the clips are held where they stand in the mean: where the clips that have a foot on the ground weigh more
    /// than half together.
    pub holds_feet: bool,
}

/// The mean of many clips, frame by frame at the first clip's frames up to the shortest end: the geodesic mean of each
/// joint's turns (Karcher 1977), the weighted mean of places and sizes. Only the ratio of the weights matters, and their order
/// does not, but for the rate. Of two clips it is [`mix()`](super::mix()).
///
/// A joint's factor in `mask` is how much of the clips after the first it takes; what is missing of it is the first one's. Where
/// all clips that count are equal, and where the first counts alone, the numbers are the first's, bit for bit.
///
/// # Errors
/// When there is no clip, a weight is negative, all are 0, or a clip has no frames.
pub fn mix_many(clips: &[(&Clip, f64)], mask: &Mask) -> Result<Clip, BlendError> {
    mix_many_by(clips, &MeanHow { mask, along: None, holds_feet: false })
}

/// As [`mix_many()`], with more said of how: with their steps in time, and with feet held.
///
/// In step, every clip is sampled where its registration says that it belongs to the first, the result's clock runs at the weighted mean of all
/// paces, each clip is turned to the first one's heading there, and the path on the ground is summed from the steps of all, each in its own
/// heading, from the first clip's first place on (Kovar & Gleicher 2003, whose registration curves for many motions lead over one of
/// them too). Of two clips it is [`mix_aligned()`](super::mix_aligned()).
///
/// # Errors
/// As for [`mix_many()`].
///
/// # Panics
/// When there are not as many registrations as clips after the first.
pub fn mix_many_by(clips: &[(&Clip, f64)], how: &MeanHow<'_>) -> Result<Clip, BlendError> {
    let weights: Vec<f64> = clips.iter().map(|&(_, weight)| weight).collect();
    let shares = shares(&weights)?;
    for (clip, _) in clips {
        frames::check_frames(clip)?;
    }
    let first = clips[0].0;
    let is_alone = shares[1..].iter().all(|&share| share == 0.0);
    let frames = match how.along {
        Some(_) if is_alone => return Ok(first.clone()),
        Some(along) => in_step(clips, &shares, along, how.mask),
        None => side_by_side(clips),
    };
    let joints = (0..first.joints.len()).map(|joint| frames.joint(joint, &shares, how.mask.of(joint)));
    let made = frames::clip_of(first, frames.times.clone(), joints.collect());
    if !how.holds_feet || is_alone {
        return Ok(made);
    }
    let weights: Vec<Vec<f64>> = shares.iter().map(|&share| vec![share; frames.times.len()]).collect();
    let origins: Vec<Origin<'_>> = frames
        .parts
        .iter()
        .zip(&weights)
        .map(|(part, weights)| Origin { clip: &part.clip, secs: &part.secs, weights })
        .collect();
    Ok(feet::held(&made, &origins, how.mask).map_or(made, |(held, _)| held))
}

/// Where the frames of a mean in step at `rate` come from: for each registration, of a clip to the first, a stop for each frame. The first of
/// the weights is the first clip's.
///
/// # Errors
/// When a weight is negative or all are 0.
///
/// # Panics
/// When there are not as many registrations as weights after the first.
pub fn mean_stops(weights: &[f64], along: &[&Registration], rate: f64) -> Result<Vec<Vec<Stop>>, BlendError> {
    Ok(stops(&shares(weights)?, along, rate))
}

fn stops(shares: &[f64], along: &[&Registration], rate: f64) -> Vec<Vec<Stop>> {
    assert_eq!(along.len() + 1, shares.len(), "a registration for each clip after the first");
    let first_end = along.first().and_then(|along| along.first_secs.last().copied()).unwrap_or(0.0);
    let own_secs = Clock { shares, along }.frames(first_end, rate);
    along.iter().map(|along| own_secs.iter().map(|&secs| along.at_first(secs)).collect()).collect()
}

/// The weights as shares of 1.
fn shares(weights: &[f64]) -> Result<Vec<f64>, BlendError> {
    if weights.is_empty() {
        return Err(BlendError::NoFrames(String::new()));
    }
    if let Some(&found) = weights.iter().find(|weight| **weight < 0.0 || !weight.is_finite()) {
        return Err(BlendError::Weight { expected: "of at least 0", found });
    }
    // Divided by the largest first, so that the sum of huge weights stays finite.
    let largest = weights.iter().copied().fold(0.0, f64::max);
    if largest == 0.0 {
        return Err(BlendError::Weight { expected: "above 0 for at least one clip", found: 0.0 });
    }
    let sum: f64 = weights.iter().map(|weight| weight / largest).sum();
    Ok(weights.iter().map(|weight| weight / largest / sum).collect())
}

/// One clip of a mean.
struct Part<'a> {
    clip: Cow<'a, Clip>,
    /// Its time at each frame of the result, seconds.
    secs: Vec<f64>,
    /// The moves that set its pose down at each frame; `None` where it stays.
    moves: Option<Vec<GroundMove>>,
}

/// Where the frames of a mean come from.
struct Frames<'a> {
    first: &'a Clip,
    times: Times,
    parts: Vec<Part<'a>>,
    /// Joints that carry the whole motion, where poses are set down.
    tops: BTreeSet<usize>,
}

/// Frame by frame, up to the shortest end.
fn side_by_side<'a>(clips: &[(&'a Clip, f64)]) -> Frames<'a> {
    let first = clips[0].0;
    let end = clips.iter().map(|(clip, _)| clip.duration_secs).fold(f64::INFINITY, f64::min);
    let is_shorter = end < first.duration_secs - SLACK / first.grid.rate;
    let base = if is_shorter { Cow::Owned(clip::cut(first, 0.0, end)) } else { Cow::Borrowed(first) };
    let times = base.grid.times.clone();
    let secs: Vec<f64> = times.iter().collect();
    let others = clips[1..].iter().map(|&(clip, _)| Cow::Borrowed(clip));
    let parts = std::iter::once(base).chain(others);
    let parts = parts.map(|clip| Part { clip, secs: secs.clone(), moves: None }).collect();
    Frames { first, times, parts, tops: BTreeSet::new() }
}

/// Each clip where it belongs to the first, on one way over the ground.
fn in_step<'a>(
    clips: &[(&'a Clip, f64)],
    shares: &[f64],
    along: &[&Registration],
    mask: &Mask,
) -> Frames<'a> {
    let first = clips[0].0;
    let rate = first.grid.rate;
    let stops = stops(shares, along, rate);
    let own_secs: Vec<f64> = stops[0].iter().map(|stop| stop.first_secs).collect();
    let times = Times::Even { step_secs: 1.0 / rate, count: own_secs.len() };
    let seconds = stops.iter().map(|stops| stops.iter().map(|stop| stop.second_secs).collect());
    let all_secs: Vec<Vec<f64>> = std::iter::once(own_secs).chain(seconds).collect();
    let still = vec![0.0; times.len()];
    let turns: Vec<Vec<f64>> = std::iter::once(still)
        .chain(stops.iter().map(|stops| stops.iter().map(|stop| stop.turn_rad).collect()))
        .collect();
    let tops: BTreeSet<usize> = clips.iter().flat_map(|(clip, _)| tops(clip)).collect();
    // The way is the first clip's by what the mask leaves it at the top.
    let factor = tops.first().map_or(1.0, |&top| mask.of(top));
    let centre = centre(first);
    let paths: Vec<Vec<DVec3>> =
        clips.iter().zip(&all_secs).map(|((clip, _), secs)| path_of(clip, centre, secs)).collect();
    let moves = way_of_all(&paths, &turns, &masked(shares, factor));
    let parts = clips.iter().zip(all_secs).zip(moves);
    let parts = parts
        .map(|((&(clip, _), secs), moves)| Part { clip: Cow::Borrowed(clip), secs, moves: Some(moves) })
        .collect();
    Frames { first, times, parts, tops }
}

/// The shares where a joint takes so much of the clips after the first: the first gets what they leave, so that the sum is exactly 1 with
/// it alone.
fn masked(shares: &[f64], factor: f64) -> Vec<f64> {
    let mut own: Vec<f64> = shares.iter().map(|share| factor * share).collect();
    own[0] = 1.0 - own[1..].iter().sum::<f64>();
    own
}

/// For each clip the moves that set it down on a way that is summed from the steps of all, each in its own heading.
fn way_of_all(paths: &[Vec<DVec3>], turns: &[Vec<f64>], shares: &[f64]) -> Vec<Vec<GroundMove>> {
    let count = paths[0].len();
    let mut at = paths[0].first().copied().unwrap_or_default();
    // How far the result's heading has left the first clip's.
    let mut drift = 0.0;
    let mut moves: Vec<Vec<GroundMove>> = paths.iter().map(|_| Vec::with_capacity(count)).collect();
    let turned = |turn_rad: f64, step: DVec3| GroundMove { turn_rad, x: 0.0, z: 0.0 }.apply(step);
    for frame in 0..count {
        if frame > 0 {
            let mut step = DVec3::ZERO;
            let mut change = 0.0;
            for ((path, turns), share) in paths.iter().zip(turns).zip(shares) {
                step += turned(turns[frame - 1], path[frame] - path[frame - 1]) * *share;
                change += share * (turns[frame] - turns[frame - 1]);
            }
            at += turned(drift, step);
            drift -= change;
        }
        for ((path, turns), moves) in paths.iter().zip(turns).zip(&mut moves) {
            let turn_rad = drift + turns[frame];
            let from = turned(turn_rad, path[frame]);
            moves.push(GroundMove { turn_rad, x: at.x - from.x, z: at.z - from.z });
        }
    }
    moves
}

/// The time of a mean in step: the weighted mean of the times that belong together.
struct Clock<'a> {
    shares: &'a [f64],
    along: &'a [&'a Registration],
}

impl Clock<'_> {
    /// What it shows at a time of the first clip.
    fn at(&self, first_secs: f64) -> f64 {
        let others = self.along.iter().zip(&self.shares[1..]).filter(|(_, share)| **share > 0.0);
        others.fold(self.shares[0] * first_secs, |sum, (along, share)| {
            sum + share * along.at_first(first_secs).second_secs
        })
    }

    /// The first clip's time at each frame of the result.
    fn frames(&self, first_end_secs: f64, rate: f64) -> Vec<f64> {
        let end = self.at(first_end_secs);
        let count = (end * rate + SLACK).floor() as usize + 1;
        let (mut from, mut from_shows) = (0.0, self.at(0.0));
        (0..count)
            .map(|frame| {
                let secs = (frame as f64 / rate).min(end);
                // The clock rises, and the frame before lies before: what is left is one crossing.
                let found = crossing([from, first_end_secs], [from_shows - secs, end - secs], |first| {
                    self.at(first) - secs
                });
                (from, from_shows) = (found, self.at(found));
                found
            })
            .collect()
    }
}

/// Where a rising function crosses 0, by chords that give up the older end's weight (Dowell & Jarratt 1971, the Illinois rule).
fn crossing([mut from, mut to]: [f64; 2], [mut low, mut high]: [f64; 2], value: impl Fn(f64) -> f64) -> f64 {
    /// Settles in about ten.
    const MOST_STEPS: usize = 60;
    if low >= 0.0 {
        return from;
    }
    if high <= 0.0 {
        return to;
    }
    let mut side = 0_i8;
    for _ in 0..MOST_STEPS {
        let at = (from * high - to * low) / (high - low);
        let at = if at > from && at < to { at } else { f64::midpoint(from, to) };
        let found = value(at);
        if found == 0.0 || at <= from || at >= to {
            return at;
        }
        if found < 0.0 {
            if (at - from).abs() <= f64::EPSILON * at {
                return at;
            }
            (from, low) = (at, found);
            if side < 0 {
                high *= 0.5;
            }
            side = -1;
        } else {
            if (to - at).abs() <= f64::EPSILON * at {
                return at;
            }
            (to, high) = (at, found);
            if side > 0 {
                low *= 0.5;
            }
            side = 1;
        }
    }
    f64::midpoint(from, to)
}

impl Frames<'_> {
    /// What a joint does in the mean, with so much of the clips after the first.
    fn joint(&self, joint: usize, shares: &[f64], factor: f64) -> Arc<JointTracks> {
        let shares = masked(shares, factor);
        let counting: Vec<(&Part<'_>, f64)> = self
            .parts
            .iter()
            .zip(&shares)
            .enumerate()
            .filter(|&(place, (_, &share))| place == 0 || share > 0.0)
            .map(|(_, (part, &share))| (part, share))
            .collect();
        let first = &counting[0].0.clip.joints[joint];
        let is_set_down = self.tops.contains(&joint);
        let says = |kind: usize| counting.iter().any(|(part, _)| frames::says(&part.clip, joint)[kind]);
        if !((0..3).any(says) || is_set_down) {
            return first.clone();
        }
        if !self.is_bent() {
            let shared = &self.first.joints[joint];
            let is_same = |(part, _): &(&Part<'_>, f64)| Arc::ptr_eq(&part.clip.joints[joint], shared);
            if counting[1..].iter().all(is_same) {
                return first.clone();
            }
        }
        let turns = (says(0) || is_set_down).then(|| {
            counting.iter().map(|(part, _)| part.clip.rotations_at(joint, &part.secs)).collect::<Vec<_>>()
        });
        let places = (says(1) || is_set_down).then(|| {
            counting.iter().map(|(part, _)| frames::places(&part.clip, joint, &part.secs)).collect::<Vec<_>>()
        });
        let (mut turns, mut places) = (turns, places);
        if let (true, Some(turns), Some(places)) = (is_set_down, &mut turns, &mut places) {
            for (((part, _), turns), places) in counting.iter().zip(turns).zip(places) {
                let Some(moves) = &part.moves else { continue };
                let above = frame_above(&part.clip, joint);
                for (frame, one) in moves.iter().enumerate() {
                    (turns[frame], places[frame]) = set_down(*one, above, turns[frame], places[frame]);
                }
            }
        }
        let counted: Vec<f64> = counting.iter().map(|&(_, share)| share).collect();
        let sizes = says(2).then(|| {
            let sizes = counting.iter().map(|(part, _)| frames::sizes(&part.clip, joint, &part.secs));
            mean_lines(&sizes.collect::<Vec<_>>(), &counted)
        });
        let row = Row {
            rotations: turns.map(|turns| mean_turns(&turns, &counted)),
            translations: places.map(|places| mean_lines(&places, &counted)),
            scales: sizes,
        };
        Arc::new(frames::tracks(first, &self.times, row, None))
    }

    /// Whether frames come from other times of the clips than their own.
    fn is_bent(&self) -> bool {
        self.parts.iter().any(|part| part.moves.is_some())
    }
}

fn mean_lines(rows: &[Vec<DVec3>], shares: &[f64]) -> Vec<DVec3> {
    let mean = |frame: usize| {
        let own = rows[0][frame];
        // From the first one on, so that what is equal stays so to the last bit.
        rows[1..].iter().zip(&shares[1..]).fold(own, |sum, (row, share)| sum + (row[frame] - own) * *share)
    };
    (0..rows[0].len()).map(mean).collect()
}

fn mean_turns(rows: &[Vec<Rotor>], shares: &[f64]) -> Vec<Rotor> {
    let mean = |frame: usize| {
        let own = rows[0][frame];
        if rows.iter().all(|row| row[frame] == own) {
            return own;
        }
        let weighted: Vec<(Rotor, f64)> =
            rows.iter().zip(shares).map(|(row, share)| (row[frame], *share)).collect();
        // Turns all round have no geodesic mean that a search would settle at.
        let plain = || chordal_mean(&weighted).map(|mean| mean.rotor);
        geodesic_mean(&weighted).or_else(plain).unwrap_or(own)
    };
    (0..rows[0].len()).map(mean).collect()
}

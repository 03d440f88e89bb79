//! Means of many clips.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{self, Clip};
use crate::rotor::{Rotor, chordal_mean, geodesic_mean};

use super::frames::{self, Row, SLACK};
use super::{BlendError, Mask};

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
    let Some(&(first, _)) = clips.first() else { return Err(BlendError::NoFrames(String::new())) };
    let sum: f64 = clips.iter().map(|&(_, weight)| weight).sum();
    if let Some(&(_, found)) = clips.iter().find(|(_, weight)| *weight < 0.0 || !weight.is_finite()) {
        return Err(BlendError::Weight { expected: "of at least 0", found });
    }
    if sum <= 0.0 || !sum.is_finite() {
        return Err(BlendError::Weight { expected: "above 0 for at least one clip", found: sum });
    }
    for (clip, _) in clips {
        frames::check_frames(clip)?;
    }
    let end = clips.iter().map(|(clip, _)| clip.duration_secs).fold(f64::INFINITY, f64::min);
    let is_shorter = end < first.duration_secs - SLACK / first.grid.rate;
    let base = if is_shorter { clip::cut(first, 0.0, end) } else { first.clone() };
    let times: Vec<f64> = base.grid.times.iter().collect();
    let joints = (0..base.joints.len()).map(|joint| {
        let factor = mask.of(joint);
        // The first clip gets what the others leave, so that the weights sum to exactly 1 with it alone.
        let mut shares: Vec<f64> = clips.iter().map(|(_, weight)| factor * weight / sum).collect();
        shares[0] = 1.0 - shares[1..].iter().sum::<f64>();
        let counting: Vec<(&Clip, f64)> = clips
            .iter()
            .zip(&shares)
            .enumerate()
            .filter(|&(place, (_, &share))| place == 0 || share > 0.0)
            .map(|(place, (&(clip, _), &share))| (if place == 0 { &base } else { clip }, share))
            .collect();
        let is_same = clips.iter().all(|(clip, _)| Arc::ptr_eq(&clip.joints[joint], &first.joints[joint]));
        let says = |part: usize| counting.iter().any(|(clip, _)| frames::says(clip, joint)[part]);
        if counting.len() == 1 || is_same || !(0..3).any(says) {
            return base.joints[joint].clone();
        }
        let sampled = |of: &dyn Fn(&Clip) -> Vec<DVec3>| {
            let all: Vec<(Vec<DVec3>, f64)> =
                counting.iter().map(|&(clip, share)| (of(clip), share)).collect();
            let mean = |frame: usize| {
                let own = all[0].0[frame];
                // From the first one on, so that what is equal stays so to the last bit.
                all[1..].iter().fold(own, |sum, (row, share)| sum + (row[frame] - own) * *share)
            };
            (0..times.len()).map(mean).collect::<Vec<DVec3>>()
        };
        let turns = says(0).then(|| {
            let all: Vec<(Vec<Rotor>, f64)> =
                counting.iter().map(|&(clip, share)| (clip.rotations_at(joint, &times), share)).collect();
            let mean = |frame: usize| {
                let own = all[0].0[frame];
                if all.iter().all(|(row, _)| row[frame] == own) {
                    return own;
                }
                let weighted: Vec<(Rotor, f64)> =
                    all.iter().map(|(row, share)| (row[frame], *share)).collect();
                // Turns all round have no geodesic mean that a search would settle at.
                let plain = || chordal_mean(&weighted).map(|mean| mean.rotor);
                geodesic_mean(&weighted).or_else(plain).unwrap_or(own)
            };
            (0..times.len()).map(mean).collect::<Vec<Rotor>>()
        });
        let row = Row {
            rotations: turns,
            translations: says(1).then(|| sampled(&|clip| frames::places(clip, joint, &times))),
            scales: says(2).then(|| sampled(&|clip| frames::sizes(clip, joint, &times))),
        };
        Arc::new(frames::tracks(&base.joints[joint], &base.grid.times, row, &|_| None))
    });
    let joints = joints.collect();
    Ok(frames::clip_of(&base, base.grid.times.clone(), joints))
}

//! Brings a whole clip within its limits: keys, and the curves between them.

use rayon::prelude::*;

use crate::clip::{Clip, Place, RotationTrack};
use crate::rotor::Rotor;

use super::joint_limit::{Clamp, JointLimit, Reading};
use super::limits::Limits;

/// A curve between keys may lie this far from the clamped curve before it gets a key of its own, radians.
const SPARE_RAD: f64 = 0.2 / 180.0 * std::f64::consts::PI;

/// Rounds of adding keys; each halves what is left at least, so this is never reached by a real curve.
const MOST_ROUNDS: usize = 24;

impl Limits {
    /// The clip with every joint clamped at its keys and, where a curve between keys leaves its limit, at added keys too.
    ///
    /// Joints that need no change stay shared with `clip`, bit for bit. Between frames nothing is looked at.
    #[must_use]
    pub fn clamped(&self, clip: &Clip, clamp: Clamp) -> Clip {
        let times: Vec<f64> = clip.grid.times.iter().collect();
        let tracks: Vec<(usize, RotationTrack)> = self
            .joints
            .par_iter()
            .filter_map(|(&joint, limit)| {
                let track = clip.rotation(joint).filter(|track| !track.keys.is_empty())?;
                Some((joint, clamped_track(track, &times, limit, clamp)?))
            })
            .collect();
        tracks.into_iter().fold(clip.clone(), |clip, (joint, track)| clip.with_rotation(joint, track))
    }
}

/// A time at which the track is looked at.
struct Look {
    secs: f64,
    /// The key that stands there.
    key: Option<usize>,
    /// Where the clamp wants the joint; `None` where it is well as it is.
    target: Option<Rotor>,
}

/// `None` when nothing has to change.
fn clamped_track(
    track: &RotationTrack,
    frames: &[f64],
    limit: &JointLimit,
    clamp: Clamp,
) -> Option<RotationTrack> {
    let looks = looks(track, frames, limit, clamp);
    if looks.iter().all(|look| look.target.is_none()) {
        return None;
    }
    let changes: Vec<(usize, Rotor)> =
        looks.iter().filter_map(|look| Some((look.key?, look.target?))).collect();
    let changed: Vec<(usize, Rotor)> =
        changes.iter().map(|&(key, pose)| (key, pose.aligned_to(track.keys[key]))).collect();
    let mut result = with_tangents(track.with_keys(&changed), track, &changed, limit, clamp);
    for _ in 0..MOST_ROUNDS {
        let added = missing_keys(&result, &looks, limit);
        if added.is_empty() {
            break;
        }
        result = with_added(&result, &added, |secs, side| tangent(track, secs, side, limit, clamp));
    }
    Some(result)
}

fn looks(track: &RotationTrack, frames: &[f64], limit: &JointLimit, clamp: Clamp) -> Vec<Look> {
    let keys = (0..track.keys.len()).map(|key| (track.times.at(key), Some(key)));
    let span = track.times.span().unwrap_or((0.0, 0.0));
    let step = track.times.median_step().unwrap_or(1.0);
    let is_between = |secs: &&f64| {
        let nearest = track.times.at(track.times.nearest(**secs));
        **secs > span.0 && **secs < span.1 && (nearest - **secs).abs() > 1e-6 * step
    };
    let mut all: Vec<(f64, Option<usize>)> =
        keys.chain(frames.iter().filter(is_between).map(|&secs| (secs, None))).collect();
    all.sort_by(|a, b| a.0.total_cmp(&b.0));
    let times: Vec<f64> = all.iter().map(|look| look.0).collect();
    let mut before: Option<Reading> = None;
    all.into_iter()
        .zip(track.at_all(&times))
        .map(|((secs, key), pose)| {
            let reading = limit.read(pose, before.as_ref());
            before = Some(reading);
            Look { secs, key, target: limit.clamped(&reading, clamp) }
        })
        .collect()
}

/// In each stretch between two keys of `track` the frame that is farthest from where it should be, if it is too far.
fn missing_keys(track: &RotationTrack, looks: &[Look], limit: &JointLimit) -> Vec<(f64, Rotor)> {
    let mut added: Vec<(f64, Rotor)> = Vec::new();
    let mut worst: Option<(f64, f64, Rotor)> = None;
    let mut segment = 0;
    for look in looks {
        let Some(Place::Between(own, _)) = track.times.place(look.secs) else { continue };
        if own != segment {
            added.extend(worst.take().map(|(_, secs, pose)| (secs, pose)));
            segment = own;
        }
        let Some(target) = look.target else { continue };
        let pose = track.at(look.secs);
        let off = pose.turn_to(target);
        let is_outside = !limit.limit.contains(&limit.read(pose, None));
        if (off > SPARE_RAD || is_outside) && worst.is_none_or(|(most, ..)| off > most) {
            worst = Some((off, look.secs, target));
        }
    }
    added.extend(worst.map(|(_, secs, pose)| (secs, pose)));
    added
}

/// Which side of a key a tangent is on.
#[derive(Clone, Copy)]
enum Side {
    In,
    Out,
}

/// The rate of the clamped curve's four numbers beside a time, per second, by a small step.
fn tangent(track: &RotationTrack, secs: f64, side: Side, limit: &JointLimit, clamp: Clamp) -> Rotor {
    let step = 1e-4 * track.times.median_step().unwrap_or(1.0);
    let step = match side {
        Side::In => -step,
        Side::Out => step,
    };
    let at = |secs: f64| {
        let pose = track.at(secs);
        limit.clamped(&limit.read(pose, None), clamp).unwrap_or(pose)
    };
    let here = at(secs);
    let there = at(secs + step).aligned_to(here);
    let difference = Rotor::new(there.s - here.s, there.yz - here.yz, there.zx - here.zx, there.xy - here.xy);
    difference.scale(1.0 / step)
}

fn with_tangents(
    mut clamped: RotationTrack,
    before: &RotationTrack,
    changed: &[(usize, Rotor)],
    limit: &JointLimit,
    clamp: Clamp,
) -> RotationTrack {
    let Some(tangents) = &before.tangents else { return clamped };
    let mut tangents = tangents.to_vec();
    for &(key, pose) in changed {
        let secs = before.times.at(key);
        tangents[key] = [Side::In, Side::Out].map(|side| {
            let own = tangent(before, secs, side, limit, clamp);
            // The rate was taken at a pose of some sign; it goes with the key's own.
            let here = before.at(secs);
            let here = limit.clamped(&limit.read(here, None), clamp).unwrap_or(here);
            if here.dot(pose) < 0.0 { -own } else { own }
        });
    }
    clamped.tangents = Some(tangents.into());
    clamped
}

/// `track` with keys added at these times; each half of a segment goes on as the whole did.
fn with_added(
    track: &RotationTrack,
    added: &[(f64, Rotor)],
    tangent: impl Fn(f64, Side) -> Rotor,
) -> RotationTrack {
    // Where there is a key already, or none can be put, nothing is left to add.
    let grown =
        added.iter().fold(track.clone(), |track, &(secs, _)| track.with_key_at(secs).unwrap_or(track));
    let put: Vec<(usize, Rotor, f64)> = added
        .iter()
        .filter_map(|&(secs, pose)| match grown.times.place(secs) {
            Some(Place::At(key)) => Some((key, pose.aligned_to(grown.keys[key]), secs)),
            _ => None,
        })
        .collect();
    let changes: Vec<(usize, Rotor)> = put.iter().map(|&(key, pose, _)| (key, pose)).collect();
    let mut result = grown.with_keys(&changes);
    if let Some(tangents) = &result.tangents {
        let mut tangents = tangents.to_vec();
        for &(key, pose, secs) in &put {
            let flip = |own: Rotor| if track.at(secs).dot(pose) < 0.0 { -own } else { own };
            tangents[key] = [Side::In, Side::Out].map(|side| flip(tangent(secs, side)));
        }
        result.tangents = Some(tangents.into());
    }
    result
}

//! Applies mends to a clip.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use glam::DVec3;
use rayon::prelude::*;

use crate::clip::{Clip, JointTracks, PathKind, Paths, RotationTrack, Segments};
use crate::rotor::Rotor;
use crate::snag::{LoopClose, Plant, Remedy, Snag};

use super::draft::Draft;
use super::jitter::{self, Noise};
use super::numbers::{self, Unwrap};
use super::{MendError, clamp, loop_close, plant, redraw, stuck, take_out};

/// `clip` with one snag mended. The same snag in the same clip always gives the same numbers; joints other than the
/// snag's stay shared, and so does its own when there is nothing to do ([`Remedy::Ask`]).
///
/// # Errors
/// When the snag does not fit the clip.
pub fn apply(clip: &Clip, snag: &Snag) -> Result<Clip, MendError> {
    apply_all(clip, std::slice::from_ref(snag))
}

/// `clip` with several snags mended, in the order given. As [`apply`] one after the other, at the cost of one copy of each
/// joint's keys.
///
/// # Errors
/// When one of the snags does not fit the clip.
pub fn apply_all(clip: &Clip, snags: &[Snag]) -> Result<Clip, MendError> {
    let mut mended = clip.clone();
    for group in snags.chunk_by(|a, b| mends_clip(a) == mends_clip(b)) {
        mended = if mends_clip(&group[0]) { of_clip(&mended, group)? } else { of_joints(&mended, group)? };
    }
    Ok(mended)
}

/// Whether a mend changes more than the keys of its joint's turns.
fn mends_clip(snag: &Snag) -> bool {
    matches!(snag.remedy, Remedy::CloseLoop(_) | Remedy::Hold(_))
}

/// Loops first, joint by joint, then all plants at once, so that one passes into the next.
fn of_clip(clip: &Clip, snags: &[Snag]) -> Result<Clip, MendError> {
    let no_joint = |joint: usize| MendError::NoKeys { joint: joint.to_string() };
    let mut mended = clip.clone();
    let mut plants: Vec<Plant> = Vec::new();
    let mut beforehand = loops_of_their_own(clip, snags);
    for (place, snag) in snags.iter().enumerate() {
        match snag.remedy {
            Remedy::CloseLoop(how) if snag.joint < clip.joints.len() => match beforehand.remove(&place) {
                Some(tracks) => mended.joints[snag.joint] = tracks,
                None => mended = loop_close::close_joint(&mended, snag.joint, how, DVec3::Y),
            },
            Remedy::CloseLoop(_) => return Err(no_joint(snag.joint)),
            Remedy::Hold(plant) => {
                if let Some(joint) = plant.foot.joints().into_iter().find(|&joint| joint >= clip.joints.len())
                {
                    return Err(no_joint(joint));
                }
                plants.push(plant);
            }
            _ => {}
        }
    }
    Ok(if plants.is_empty() { mended } else { plant::hold(&mended, &plants) })
}

/// The closed loops of joints that ask for nothing but themselves, by their places in `snags`. Roots ask how large the figure stands, which
/// other joints tell.
fn loops_of_their_own(clip: &Clip, snags: &[Snag]) -> BTreeMap<usize, Arc<JointTracks>> {
    let mut seen: BTreeSet<usize> = BTreeSet::new();
    let own: Vec<(usize, usize, LoopClose)> = snags
        .iter()
        .enumerate()
        .filter_map(|(place, snag)| match snag.remedy {
            Remedy::CloseLoop(how) if snag.joint < clip.joints.len() => Some((place, snag.joint, how)),
            _ => None,
        })
        // The second of a joint goes by what the first has made.
        .filter(|(_, joint, _)| seen.insert(*joint) && clip.skeleton.parent_joint(*joint).is_some())
        .collect();
    let closed = own.into_par_iter().map(|(place, joint, how)| {
        (place, loop_close::close_joint(clip, joint, how, DVec3::Y).joints[joint].clone())
    });
    closed.collect()
}

fn of_joints(clip: &Clip, snags: &[Snag]) -> Result<Clip, MendError> {
    let mut mended = clip.clone();
    let mut drafts: BTreeMap<usize, Draft> = BTreeMap::new();
    let both_unwrap = |a: &Snag, b: &Snag| a.joint == b.joint && is_unwrap(a) && is_unwrap(b);
    for group in snags.chunk_by(both_unwrap) {
        let snag = &group[0];
        if asks_others(snag) {
            // It sees what the mends before it made of the other joints.
            for (joint, draft) in drafts.extract_if(.., |joint, _| *joint != snag.joint) {
                mended = finished(mended, joint, draft);
            }
        }
        let draft = match drafts.entry(snag.joint) {
            std::collections::btree_map::Entry::Occupied(entry) => entry.into_mut(),
            std::collections::btree_map::Entry::Vacant(entry) => entry.insert(draft_of(&mended, snag.joint)?),
        };
        let label = || clip.skeleton.label(snag.joint).to_owned();
        let is_off = |snag: &&Snag| snag.first_key > snag.last_key || snag.last_key >= draft.len();
        if let Some(off) = group.iter().find(is_off) {
            let key = off.first_key.max(off.last_key);
            return Err(MendError::NoSuchKey { joint: label(), count: draft.len(), key });
        }
        mend_row(draft, &mended, group);
    }
    Ok(drafts.into_iter().fold(mended, |mended, (joint, draft)| finished(mended, joint, draft)))
}

fn is_unwrap(snag: &Snag) -> bool {
    matches!(snag.remedy, Remedy::Unwrap(_))
}

/// Mends snags of one joint one after the other, and gives for each the largest change of orientation at a key, in radians.
pub(super) fn mend_row(draft: &mut Draft, clip: &Clip, snags: &[Snag]) -> Vec<f64> {
    let mut changes = Vec::with_capacity(snags.len());
    for group in snags.chunk_by(|a, b| is_unwrap(a) && is_unwrap(b)) {
        if is_unwrap(&group[0]) {
            let runs: Vec<Unwrap> = group
                .iter()
                .filter_map(|snag| match snag.remedy {
                    Remedy::Unwrap(turns) => {
                        Some(Unwrap { first: snag.first_key, last: snag.last_key, turns })
                    }
                    _ => None,
                })
                .collect();
            numbers::unwrap(draft, &runs);
            changes.extend(group.iter().map(|_| 0.0));
        } else {
            for snag in group {
                mend(draft, clip, snag);
                changes.push(draft.take_change());
            }
        }
    }
    changes
}

/// Whether the mend of a snag depends on what other joints do.
pub(super) fn asks_others(snag: &Snag) -> bool {
    matches!(snag.remedy, Remedy::FromOthers | Remedy::Smooth { .. })
}

fn finished(clip: Clip, joint: usize, draft: Draft) -> Clip {
    match draft.finish() {
        Some(track) => clip.with_rotation(joint, track),
        None => clip,
    }
}

fn draft_of(clip: &Clip, joint: usize) -> Result<Draft, MendError> {
    let track = clip.rotation(joint).filter(|track| !track.keys.is_empty());
    track.map(Draft::new).ok_or_else(|| MendError::NoKeys {
        joint: if joint < clip.skeleton.len() {
            clip.skeleton.label(joint).to_owned()
        } else {
            joint.to_string()
        },
    })
}

/// Mends one snag whose keys exist in the draft. `clip` is what the other joints do.
fn mend(draft: &mut Draft, clip: &Clip, snag: &Snag) {
    let (first, last) = (snag.first_key, snag.last_key);
    match snag.remedy {
        Remedy::Normalise => numbers::normalise(draft, first..=last),
        Remedy::Negate => numbers::negate(draft, first..=last),
        Remedy::Unwrap(turns) => numbers::unwrap(draft, &[Unwrap { first, last, turns }]),
        Remedy::NearestAngles => numbers::nearest(draft, first, last),
        Remedy::Redraw => redraw::redraw(draft, first, last),
        Remedy::FromOthers => stuck::redraw_from_others(draft, clip, snag.joint, first, last),
        Remedy::Smooth { noise_rad, quiet_rad, apart_keys } => {
            let noise = Noise { sigma_rad: noise_rad, quiet_rad, apart_keys };
            jitter::smooth(draft, clip, snag.joint, (first, last), noise);
        }
        Remedy::ShortWay => numbers::short_way(draft, last),
        Remedy::TakeOut(offset) => take_out::take_out(draft, first, last, |pose| pose * offset),
        Remedy::TakeOutAbove(offset) => take_out::take_out(draft, first, last, |pose| offset * pose),
        Remedy::Clamp(limit) => clamp::clamp(draft, first, last, &limit),
        // Those of the whole clip are no business of one joint's keys.
        Remedy::Ask | Remedy::CloseLoop(_) | Remedy::Hold(_) => {}
    }
}

/// The largest turn between `before` and `after` of a joint, in radians: at keys, and in the middle between them, where a
/// long way shows that has both ends right. Where a key of `before` is no rotation, what is played in its place counts.
pub fn change_rad(before: &Clip, after: &Clip, joint: usize) -> f64 {
    let (Some(old), Some(new)) = (before.rotation(joint), after.rotation(joint)) else { return 0.0 };
    if before.same_joint(after, joint) {
        return 0.0;
    }
    if old.keys.len() != new.keys.len() || old.times != new.times {
        let times = old.times.iter().chain(new.times.iter());
        return times.map(|time| old.at(time).turn_to(new.at(time))).fold(0.0, f64::max);
    }
    change_of_keys_rad(old, new, 0, old.keys.len().saturating_sub(1))
}

/// The largest turn between `before` and `after` that the mend of `snag` can have made, in radians: of its joint at its keys
/// and in the middles between; of the whole joint where a loop was closed; of a limb at the frames of its plant.
pub fn change_at_snag_rad(before: &Clip, after: &Clip, snag: &Snag) -> f64 {
    let at_frames = |joint: usize| {
        let (Some(old), Some(new)) = (before.rotation(joint), after.rotation(joint)) else { return 0.0 };
        let secs = (snag.first_frame..=snag.last_frame).map(|frame| before.grid.time(frame));
        secs.map(|secs| old.at(secs).turn_to(new.at(secs))).fold(0.0, f64::max)
    };
    match &snag.remedy {
        Remedy::Hold(plant) => {
            let [upper, lower, end, ..] = plant.foot.joints();
            [upper, lower, end].map(at_frames).into_iter().fold(0.0, f64::max)
        }
        Remedy::CloseLoop(_) => change_rad(before, after, snag.joint),
        _ => match (before.rotation(snag.joint), after.rotation(snag.joint)) {
            (Some(old), Some(new)) if old.keys.len() == new.keys.len() => {
                change_of_keys_rad(old, new, snag.first_key, snag.last_key)
            }
            _ => change_rad(before, after, snag.joint),
        },
    }
}

/// The largest turn between two tracks of the same key times, at the keys `first..=last` and in the middles between.
pub(super) fn change_of_keys_rad(old: &RotationTrack, new: &RotationTrack, first: usize, last: usize) -> f64 {
    /// Keys that are looked at together.
    const TILE: usize = 1024;
    let last = last.min(old.keys.len().saturating_sub(1));
    let looked_at = if is_straight(old) && is_straight(new) { widest(old, new, first, last) } else { None };
    let mut largest = 0.0_f64;
    let mut look = |times: &[f64]| {
        let pairs = old.at_all(times).into_iter().zip(new.at_all(times));
        largest = pairs.map(|(old, new)| old.turn_to(new)).fold(largest, f64::max);
    };
    if let Some(times) = looked_at {
        times.chunks(TILE).for_each(&mut look);
        return largest;
    }
    for start in (first..=last).step_by(TILE) {
        let end = (start + TILE - 1).min(last);
        let at_keys = (start..=end).map(|key| old.times.at(key));
        let middles = (start..(end + 1).min(last)).map(|key| middle(old, key));
        look(&at_keys.chain(middles).collect::<Vec<f64>>());
    }
    largest
}

fn middle(track: &RotationTrack, key: usize) -> f64 {
    0.5 * (track.times.at(key) + track.times.at(key + 1))
}

/// Whether the pose in the middle between two keys is the middle of theirs.
fn is_straight(track: &RotationTrack) -> bool {
    track.paths == Paths::Every(PathKind::Slerp) && track.segments == Segments::default()
}

/// Times among which is that of the largest turn, of the keys `first..=last` and the middles between, told by cosines: all others are
/// smaller by more than rounding. `None` where a key is no rotation.
fn widest(old: &RotationTrack, new: &RotationTrack, first: usize, last: usize) -> Option<Vec<f64>> {
    /// What rounding may do to a cosine, many times over.
    const ROUNDING: f64 = 1e-12;
    let mut least = f64::INFINITY;
    let mut near: Vec<(f64, f64)> = Vec::new();
    let mut add = |cosine: f64, secs: f64| -> Option<()> {
        if !cosine.is_finite() {
            return None;
        }
        if cosine <= least + ROUNDING {
            least = least.min(cosine);
            near.push((cosine, secs));
        }
        Some(())
    };
    let cosine = |a: Rotor, b: Rotor| (a.dot(b) / (a.dot(a) * b.dot(b)).sqrt()).abs();
    let unit = |own: Rotor| own.scale(1.0 / own.norm());
    let sum = |a: Rotor, b: Rotor| {
        let (a, b) = (unit(a), unit(b));
        let b = b.aligned_to(a);
        Rotor::new(a.s + b.s, a.yz + b.yz, a.zx + b.zx, a.xy + b.xy)
    };
    for key in first..=last {
        let (was, is) = (old.keys[key], new.keys[key]);
        let after = (key < last).then(|| (old.keys[key + 1], new.keys[key + 1]));
        add(cosine(was, is), old.times.at(key))?;
        if let Some((was_after, is_after)) = after.filter(|after| was != is || after.0 != after.1) {
            add(cosine(sum(was, was_after), sum(is, is_after)), middle(old, key))?;
        }
    }
    Some(near.into_iter().filter(|(own, _)| *own <= least + ROUNDING).map(|(_, secs)| secs).collect())
}

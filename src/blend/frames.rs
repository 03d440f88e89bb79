//! Rows of frames on their way from clips to a clip.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{
    Clip, FileAngles, FrameGrid, JointTracks, PathKind, Paths, RotationTrack, Stored, Times, VectorPath,
    VectorTrack, continuous_angles,
};
use crate::rotor::Rotor;

use super::BlendError;

/// Times nearer than this to a frame are that frame, as a share of the step between frames.
pub(super) const SLACK: f64 = 1e-6;

/// What a joint does at each frame of a result.
#[derive(Clone, Debug, Default)]
pub(super) struct Row {
    /// Unit turns; `None` where neither clip turns the joint.
    pub(super) rotations: Option<Vec<Rotor>>,
    pub(super) translations: Option<Vec<DVec3>>,
    pub(super) scales: Option<Vec<DVec3>>,
}

/// Which frames of a result are frames of the first clip, with its very numbers: that frame's index. `None` where no frame is.
pub(super) type Kept<'a> = Option<&'a dyn Fn(usize) -> Option<usize>>;

/// Fails for a clip that shows nothing.
pub(super) fn check_frames(clip: &Clip) -> Result<(), BlendError> {
    if clip.grid.count() == 0 || clip.skeleton.is_empty() {
        return Err(BlendError::NoFrames(clip.name.clone()));
    }
    Ok(())
}

/// The places of a joint at each time; its rest where nothing moves it.
pub(super) fn places(clip: &Clip, joint: usize, times: &[f64]) -> Vec<DVec3> {
    let rest = clip.skeleton.joints()[joint].rest.translation;
    let track = clip.joints[joint].translation.as_ref();
    times.iter().map(|&secs| track.and_then(|track| track.at(secs)).unwrap_or(rest)).collect()
}

/// The sizes of a joint at each time; its rest where nothing scales it.
pub(super) fn sizes(clip: &Clip, joint: usize, times: &[f64]) -> Vec<DVec3> {
    let rest = clip.skeleton.joints()[joint].rest.scale;
    let track = clip.joints[joint].scale.as_ref();
    times.iter().map(|&secs| track.and_then(|track| track.at(secs)).unwrap_or(rest)).collect()
}

/// Whether a clip says anything of a joint's turn, place and size.
pub(super) fn says(clip: &Clip, joint: usize) -> [bool; 3] {
    let tracks = &clip.joints[joint];
    [
        tracks.rotation.as_ref().is_some_and(|track| !track.keys.is_empty()),
        tracks.translation.as_ref().is_some_and(|track| !track.keys.is_empty()),
        tracks.scale.as_ref().is_some_and(|track| !track.keys.is_empty()),
    ]
}

/// The tracks of a row at `times`, in the form the first clip has them in.
pub(super) fn tracks(first: &JointTracks, times: &Times, row: Row, kept: Kept<'_>) -> JointTracks {
    let vectors = |keys: Option<Vec<DVec3>>, like: Option<&VectorTrack>| {
        let path = match like.map(|track| track.path) {
            Some(VectorPath::Hold) => VectorPath::Hold,
            _ => VectorPath::Straight,
        };
        keys.map(|mut keys| {
            if let Some(like) = like.filter(|like| like.times.len() > 1) {
                keep(&mut keys, &like.keys, kept);
            }
            VectorTrack { path, ..VectorTrack::straight(times.clone(), keys) }
        })
    };
    JointTracks {
        rotation: row.rotations.map(|keys| rotation(first.rotation.as_ref(), times, keys, kept)),
        translation: vectors(row.translations, first.translation.as_ref()),
        scale: vectors(row.scales, first.scale.as_ref()),
    }
}

fn keep<T: Copy>(keys: &mut [T], from: &[T], kept: Kept<'_>) {
    let Some(kept) = kept else { return };
    for (frame, key) in keys.iter_mut().enumerate() {
        if let Some(&own) = kept(frame).and_then(|own| from.get(own)) {
            *key = own;
        }
    }
}

fn rotation(like: Option<&RotationTrack>, times: &Times, keys: Vec<Rotor>, kept: Kept<'_>) -> RotationTrack {
    let stored = match like.map(|track| &track.stored) {
        Some(Stored::Angles(angles)) => {
            let degrees = angles_of(angles, &keys, kept).into();
            Stored::Angles(FileAngles { degrees, ..angles.clone() })
        }
        Some(Stored::PlaneAngles(degrees)) => {
            let mut own: Vec<[f64; 3]> = keys.iter().map(|key| key.plane_angles().to_degrees()).collect();
            keep(&mut own, degrees, kept);
            Stored::PlaneAngles(own.into())
        }
        Some(Stored::Rotors) | None => Stored::Rotors,
    };
    let own = |frame: usize| like?.keys.get(kept?(frame)?).copied();
    let track = RotationTrack::from_rotors(times.clone(), aligned(keys, kept.map(|_| &own as _)));
    let is_held = like.is_some_and(|like| like.paths == Paths::Every(PathKind::Hold));
    let paths = if is_held { Paths::Every(PathKind::Hold) } else { track.paths.clone() };
    RotationTrack { paths, stored, ..track }
}

/// Keys on the side of the key before; those that are kept, as they are.
fn aligned(mut keys: Vec<Rotor>, own: Option<&dyn Fn(usize) -> Option<Rotor>>) -> Vec<Rotor> {
    let mut last = keys.first().copied().unwrap_or(Rotor::IDENTITY);
    // The usual case by itself: nothing is asked of a frame.
    let Some(own) = own else {
        for key in &mut keys {
            *key = key.aligned_to(last);
            if key.is_finite() {
                last = *key;
            }
        }
        return keys;
    };
    for (frame, key) in keys.iter_mut().enumerate() {
        *key = own(frame).unwrap_or_else(|| key.aligned_to(last));
        if key.is_finite() {
            last = *key;
        }
    }
    keys
}

/// File angles in degrees: the first clip's own where its frames are kept, and continuous with them elsewhere.
fn angles_of(angles: &FileAngles, keys: &[Rotor], kept: Kept<'_>) -> Vec<[f64; 3]> {
    let own = |frame: usize| angles.degrees.get(kept?(frame)?);
    let mut degrees: Vec<[f64; 3]> = Vec::with_capacity(keys.len());
    let mut frame = 0;
    while frame < keys.len() {
        if let Some(own) = own(frame) {
            degrees.push(*own);
            frame += 1;
            continue;
        }
        let is_made = |frame: &usize| own(*frame).is_none();
        let end = (frame..keys.len()).take_while(is_made).count() + frame;
        let is_sound = |triple: &&[f64; 3]| triple.iter().all(|angle| angle.is_finite());
        let near = degrees.iter().rev().find(is_sound).or(angles.degrees.iter().find(is_sound));
        let near = near.copied().unwrap_or_default().map(f64::to_radians);
        let made = continuous_angles(angles.order, &keys[frame..end], near);
        degrees.extend(made.into_iter().map(|triple| triple.map(f64::to_degrees)));
        frame = end;
    }
    degrees
}

/// A clip of the first clip's skeleton from the tracks of each joint.
pub(super) fn clip_of(first: &Clip, times: Times, joints: Vec<Arc<JointTracks>>) -> Clip {
    let duration_secs = times.span().map_or(0.0, |(_, last)| last);
    Clip { joints, duration_secs, grid: FrameGrid { times, rate: first.grid.rate }, ..first.clone() }
}

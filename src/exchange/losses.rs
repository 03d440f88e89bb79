//! What a row of poses at even frames can't say of a clip, as notes with the largest difference.

use glam::DVec3;

use crate::clip::{Clip, PathKind, Segment};
use crate::rotor::{Rotor, slerp};
use crate::skeleton::JointKind;

use super::Note;

/// Sizes nearer than this to each other are the same: what a file's 32 bits and a few products leave.
const SAME_SIZE: f64 = 1e-4;

/// Tells that a format without any sizes lost some.
pub(super) fn sizes(clip: &Clip, notes: &mut Vec<Note>) {
    let is_sized = |joint: usize| {
        let own = &clip.skeleton.joints()[joint];
        let is_one = own.rest.scale.distance(DVec3::ONE) <= SAME_SIZE;
        own.kind == JointKind::Joint && (!is_one || changes_size(clip, joint))
    };
    if let Some(joint) = (0..clip.skeleton.len()).find(|&joint| is_sized(joint)) {
        let text = "expected no sizes, as the format has none, found some: left out";
        notes.push(Note::new(format!("joint {}", clip.skeleton.label(joint)), text));
    }
}

/// Tells that a format with sizes at rest alone lost some that change.
pub(super) fn changing_sizes(clip: &Clip, notes: &mut Vec<Note>) {
    if let Some(joint) = (0..clip.skeleton.len()).find(|&joint| changes_size(clip, joint)) {
        let text = "expected no sizes that change, as the format has none, found some: left out";
        notes.push(Note::new(format!("joint {}", clip.skeleton.label(joint)), text));
    }
}

fn changes_size(clip: &Clip, joint: usize) -> bool {
    let rest = clip.skeleton.joints()[joint].rest.scale;
    let track = clip.joints[joint].scale.as_ref();
    track.is_some_and(|track| track.keys.iter().any(|size| size.distance(rest) > SAME_SIZE * rest.length()))
}

/// How far the frames, with the short way between them, are from the clip's own keys and from its ways between them.
pub(super) fn resampling(clip: &Clip, times: &[f64], notes: &mut Vec<Note>) {
    if times.is_empty() {
        return;
    }
    let mut worst: Option<(f64, usize, f64)> = None;
    for joint in clip.skeleton.listed() {
        let Some(track) = clip.rotation(joint).filter(|track| !track.times.is_empty()) else { continue };
        let frames: Vec<Rotor> = times.iter().map(|&time| track.at(time)).collect();
        let ways = (0..track.times.len()).flat_map(|key| {
            let is_plain = track.paths.of(key) == PathKind::Slerp && track.segments.of(key) == Segment::PLAIN;
            // A way that is slow at both ends is on time in its middle.
            let shares: &[f64] = if is_plain { &[0.0, 0.5] } else { &[0.0, 0.2, 0.5, 0.8] };
            let start = track.times.at(key);
            let next = if key + 1 < track.times.len() { track.times.at(key + 1) } else { start };
            shares.iter().map(move |share| start + share * (next - start))
        });
        for time in ways {
            let after = times.partition_point(|&frame| frame <= time);
            let (Some(&end), Some(before)) = (times.get(after), after.checked_sub(1)) else { continue };
            let share = (time - times[before]) / (end - times[before]);
            let written = slerp(frames[before], frames[after], share).normalize();
            let off = written.turn_to(track.at(time));
            if worst.is_none_or(|(most, ..)| off > most) {
                worst = Some((off, joint, time));
            }
        }
    }
    if let Some((off, joint, time)) = worst.filter(|&(off, ..)| off.to_degrees() > 0.01) {
        let text = format!(
            "expected keys at the frames and even turns between, found others: up to {:.3} degrees off, at {time:.4} s; a higher rate comes nearer",
            off.to_degrees()
        );
        notes.push(Note::new(format!("joint {}", clip.skeleton.label(joint)), text));
    }
}

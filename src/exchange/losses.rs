//! What a row of poses at even frames can't say of a clip, as notes with the largest difference.

use glam::DVec3;

use crate::clip::Clip;
use crate::rotor::{Rotor, slerp};
use crate::skeleton::JointKind;

use super::Note;

/// Tells that a format without sizes lost some.
pub(super) fn sizes(clip: &Clip, notes: &mut Vec<Note>) {
    let skeleton = &clip.skeleton;
    let is_sized = |joint: usize| {
        let rest = skeleton.joints()[joint].rest.scale;
        let keys = clip.joints[joint].scale.iter().flat_map(|track| track.keys.iter());
        keys.chain([&rest]).any(|size| size.distance(DVec3::ONE) > 1e-4)
    };
    let mut joints = 0..skeleton.len();
    if let Some(joint) =
        joints.find(|&joint| skeleton.joints()[joint].kind == JointKind::Joint && is_sized(joint))
    {
        let text = "expected no sizes, as the format has none, found some: left out";
        notes.push(Note::new(format!("joint {}", skeleton.label(joint)), text));
    }
}

/// How far the frames, with the short way between them, are from the clip's own keys and the middles between them.
pub(super) fn resampling(clip: &Clip, times: &[f64], notes: &mut Vec<Note>) {
    if times.is_empty() {
        return;
    }
    let mut worst: Option<(f64, usize, f64)> = None;
    for joint in clip.skeleton.listed() {
        let Some(track) = clip.rotation(joint).filter(|track| !track.times.is_empty()) else { continue };
        let frames: Vec<Rotor> = times.iter().map(|&time| track.at(time)).collect();
        let keys = (0..track.times.len()).map(|key| track.times.at(key));
        let middles = (1..track.times.len()).map(|key| 0.5 * (track.times.at(key - 1) + track.times.at(key)));
        for time in keys.chain(middles) {
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
            "expected keys at the frames, found some between: up to {:.3} degrees off, at {time:.4} s",
            off.to_degrees()
        );
        notes.push(Note::new(format!("joint {}", clip.skeleton.label(joint)), text));
    }
}

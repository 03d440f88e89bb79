//! A new CSV text from any clip.

use std::io::{self, Write};

use crate::clip::{Clip, RotationTrack};
use crate::exchange::Note;
use crate::exchange::losses;
use crate::rotor::Rotor;
use crate::skeleton::{JointKind, Skeleton, Transform};

use super::bones::names_text;

/// Writes any clip as CSV: the skeleton as lines before the header, then a row for each frame of its grid, with a
/// quaternion for each joint, and its place where that is animated.
///
/// Numbers have as many digits as it takes to read the same number again, so at most 17. Keys that stand at the frames
/// are written as stored, whatever their sign and length. Notes tell how far the frames are from keys between them, and
/// of sizes that are animated, which are lost.
pub fn from_clip(clip: &Clip) -> (Vec<u8>, Vec<Note>) {
    let mut bytes = Vec::new();
    // Writing into a Vec can't fail.
    let notes = from_clip_to(clip, &mut bytes).unwrap_or_default();
    (bytes, notes)
}

/// As [`from_clip`], into `out`: of the text never more than a few rows are at hand.
///
/// # Errors
/// When `out` fails.
pub fn from_clip_to(clip: &Clip, out: &mut dyn Write) -> io::Result<Vec<Note>> {
    /// Bytes that are given out at once.
    const PORTION: usize = 1 << 16;
    let mut notes = Vec::new();
    let mut bytes = Vec::new();
    let skeleton = &clip.skeleton;
    let has_turns =
        |joint: usize| skeleton.joints()[joint].kind == JointKind::Joint || clip.rotation(joint).is_some();
    let written: Vec<usize> = (0..skeleton.len())
        .filter(|&joint| has_turns(joint) || clip.joints[joint].translation.is_some())
        .collect();
    for joint in 0..skeleton.len() {
        bone_lines(clip, joint, &mut bytes);
    }
    bytes.extend_from_slice(b"time");
    for &joint in &written {
        let mut put = |part: &str| {
            let name = format!("{}.{part}", line_name(skeleton, joint));
            bytes.push(b',');
            if name.contains([',', '"']) || name.starts_with('#') {
                bytes.extend_from_slice(format!("\"{}\"", name.replace('"', "\"\"")).as_bytes());
            } else {
                bytes.extend_from_slice(name.as_bytes());
            }
        };
        if clip.joints[joint].translation.is_some() {
            ["tx", "ty", "tz"].into_iter().for_each(&mut put);
        }
        if has_turns(joint) {
            ["qx", "qy", "qz", "qw"].into_iter().for_each(&mut put);
        }
    }
    bytes.push(b'\n');
    let times: Vec<f64> = (0..clip.grid.count()).map(|frame| clip.grid.time(frame)).collect();
    for (frame, &time) in times.iter().enumerate() {
        bytes.extend_from_slice(number_text(time).as_bytes());
        for &joint in &written {
            let mut put = |value: f64| {
                bytes.push(b',');
                bytes.extend_from_slice(number_text(value).as_bytes());
            };
            let rest = skeleton.joints()[joint].rest;
            if let Some(track) = &clip.joints[joint].translation {
                let is_keyed = track.times == clip.grid.times && frame < track.keys.len();
                let key = if is_keyed { Some(track.keys.vector(frame)) } else { track.at(time) };
                let place = key.unwrap_or(rest.translation);
                place.to_array().into_iter().for_each(&mut put);
            }
            if has_turns(joint) {
                let turn = clip.rotation(joint).map_or(rest.rotation, |track| turn(clip, track, frame, time));
                turn.to_xyzw().into_iter().for_each(&mut put);
            }
        }
        bytes.push(b'\n');
        if bytes.len() >= PORTION {
            out.write_all(&bytes)?;
            bytes.clear();
        }
    }
    out.write_all(&bytes)?;
    losses::changing_sizes(clip, &mut notes);
    losses::resampling(clip, &times, &mut notes);
    Ok(notes)
}

fn turn(clip: &Clip, track: &RotationTrack, frame: usize, time: f64) -> Rotor {
    let is_keyed = track.times == clip.grid.times && frame < track.keys.len();
    if is_keyed { track.keys.rotor(frame) } else { track.at(time) }
}

/// The name of a joint as a line and a cell can hold it: cells are read without the blanks around them.
fn line_name(skeleton: &Skeleton, joint: usize) -> String {
    skeleton.label(joint).replace(['\n', '\r'], "_").trim().to_owned()
}

/// The lines of a joint and its tips.
fn bone_lines(clip: &Clip, index: usize, bytes: &mut Vec<u8>) {
    let skeleton = &clip.skeleton;
    let joint = &skeleton.joints()[index];
    let word = match joint.kind {
        JointKind::Joint => "joint",
        JointKind::Carrier => "carrier",
    };
    let own = line_name(skeleton, index);
    let parent = joint.parent.map(|parent| line_name(skeleton, parent));
    let numbers =
        |values: &[f64]| values.iter().map(|&value| number_text(value)).collect::<Vec<_>>().join(" ");
    let Transform { translation, rotation, scale } = joint.rest;
    // Writing into a Vec can't fail.
    let names = names_text(&own, parent.as_deref());
    let _ = write!(bytes, "# {word} {names} offset {}", numbers(&translation.to_array()));
    if rotation != Rotor::IDENTITY {
        let _ = write!(bytes, " turn {}", numbers(&rotation.to_xyzw()));
    }
    if scale != glam::DVec3::ONE {
        let _ = write!(bytes, " size {}", numbers(&scale.to_array()));
    }
    bytes.push(b'\n');
    for (tip, place) in joint.tips.iter().enumerate() {
        // A joint may bear that name.
        let mut tip = format!("{own}_tip{tip}");
        while skeleton.find(&tip).is_some() {
            tip.push('_');
        }
        let names = names_text(&tip, Some(&own));
        let _ = writeln!(bytes, "# tip {names} offset {}", numbers(&place.to_array()));
    }
}

/// The shortest text that reads as the same number; not finite: `nan`.
pub(super) fn number_text(value: f64) -> String {
    if !value.is_finite() {
        "nan".to_owned()
    } else if value == 0.0 {
        "0".to_owned()
    } else if !(1e-5..1e17).contains(&value.abs()) {
        format!("{value:e}")
    } else {
        value.to_string()
    }
}

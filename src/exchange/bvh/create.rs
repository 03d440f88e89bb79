//! A new BVH text from any clip.

use std::io::{self, Write};

use glam::DVec3;

use crate::clip::{Clip, FrameGrid, Times, continuous_angles};
use crate::exchange::Note;
use crate::exchange::decimal::push_six_decimals;
use crate::exchange::losses;
use crate::rotor::{EulerOrder, Rotor};
use crate::skeleton::WorldJoint;

/// Bytes that are collected before they are given on.
pub(super) const PORTION: usize = 1 << 18;

/// Writes any clip as BVH: one row for each frame of its grid, channels Z X Y.
///
/// Joints stand parallel to the world at rest, so turns are written away from the rest pose (the one that was asked for, else
/// the joints as the file has them) in world axes and offsets are
/// the rest limbs in world axes; carriers are taken into the joints below them. Roots have positions, and so has each
/// joint whose distance to its parent is not the rest limb's all the time: every joint is where it was at every frame.
/// Angles run on from frame to frame without whole turns or mirrored triples where there is a way round. Sizes are lost;
/// uneven times are sampled at an even rate. Notes tell of both, with the largest difference.
pub fn from_clip(clip: &Clip) -> (Vec<u8>, Vec<Note>) {
    let mut bytes = Vec::new();
    // Writing into a Vec can't fail.
    let notes = from_clip_to(clip, &mut bytes).unwrap_or_default();
    (bytes, notes)
}

/// As [`from_clip`], into `out`: of the text never more than a portion is at hand.
///
/// # Errors
/// When `out` fails.
pub fn from_clip_to(clip: &Clip, out: &mut dyn Write) -> io::Result<Vec<Note>> {
    let mut notes = Vec::new();
    let skeleton = &clip.skeleton;
    let (times, step_secs) = frame_times(&clip.grid, &mut notes);
    let listed: Vec<usize> = skeleton.listed().collect();
    let parents: Vec<Option<usize>> = (0..skeleton.len()).map(|joint| skeleton.parent_joint(joint)).collect();
    let rest = skeleton.world(&skeleton.zero_pose());
    let size = listed
        .iter()
        .map(|&joint| rest[joint].position().distance(rest[listed[0]].position()))
        .fold(0.0_f64, f64::max);

    let motion = Motion::of(clip, &times, &rest, &parents, size);
    let moves: Vec<bool> = motion.places.iter().map(Option::is_some).collect();

    let decimals = length_decimals(size);
    let mut bytes = Vec::new();
    let text = Hierarchy { clip, rest: &rest, parents: &parents, moves: &moves, decimals };
    let order = text.write(&mut bytes, &listed);
    // Writing into a Vec can't fail.
    let _ = write!(bytes, "MOTION\nFrames: {}\nFrame Time: {}\n", times.len(), frame_time_text(step_secs));
    let Motion { mut turns, places } = motion;
    // The turns of a joint go as soon as its angles are there.
    let angles: Vec<Vec<[f64; 3]>> = order
        .iter()
        .map(|&joint| continuous_angles(EulerOrder::ZXY, &std::mem::take(&mut turns[joint]), [0.0; 3]))
        .collect();
    for frame in 0..times.len() {
        let mut is_first = true;
        let mut put = |value: f64, decimals: usize, bytes: &mut Vec<u8>| {
            if !std::mem::take(&mut is_first) {
                bytes.push(b' ');
            }
            if decimals == 6 {
                return push_six_decimals(value, bytes);
            }
            // Adding 0 takes the sign from −0; a value may still round to it.
            let text = format!("{:.decimals$}", value + 0.0);
            let is_zero = text.bytes().all(|byte| matches!(byte, b'-' | b'0' | b'.'));
            bytes.extend_from_slice(if is_zero { text.trim_start_matches('-') } else { &text }.as_bytes());
        };
        for (&joint, angles) in order.iter().zip(&angles) {
            if let Some(places) = &places[joint] {
                for value in places[frame].to_array() {
                    put(value, decimals, &mut bytes);
                }
            }
            for angle in angles[frame] {
                put(angle.to_degrees(), 6, &mut bytes);
            }
        }
        bytes.push(b'\n');
        if bytes.len() >= PORTION {
            out.write_all(&bytes)?;
            bytes.clear();
        }
    }
    out.write_all(&bytes)?;
    let inner: Vec<&str> = order
        .iter()
        .filter(|&&joint| moves[joint] && parents[joint].is_some())
        .map(|&joint| skeleton.label(joint))
        .collect();
    if let Some(first) = inner.first() {
        let text = format!(
            "expected limbs of one length, found {} against {}: written with positions",
            if inner.len() == 1 {
                "1 joint that moves".to_owned()
            } else {
                format!("{} joints that move", inner.len())
            },
            if inner.len() == 1 { "its parent" } else { "their parents" }
        );
        notes.push(Note::new(format!("joint {first}"), text));
    }
    losses::sizes(clip, &mut notes);
    losses::resampling(clip, &times, &mut notes);
    Ok(notes)
}

/// What the rows will say, joint by joint.
struct Motion {
    /// Turns away from the rest pose in world axes.
    turns: Vec<Vec<Rotor>>,
    /// Places relative to the parent, of roots and of joints whose limb is not the rest limb all the time.
    places: Vec<Option<Vec<DVec3>>>,
}

impl Motion {
    fn of(clip: &Clip, times: &[f64], rest: &[WorldJoint], parents: &[Option<usize>], size: f64) -> Self {
        let listed: Vec<usize> = clip.skeleton.listed().collect();
        let mut turns: Vec<Vec<Rotor>> = vec![Vec::new(); parents.len()];
        let mut places: Vec<Option<Vec<DVec3>>> = vec![None; parents.len()];
        for &joint in &listed {
            turns[joint].reserve_exact(times.len());
            if parents[joint].is_none() {
                places[joint] = Some(Vec::with_capacity(times.len()));
            }
        }
        let away = |world: &[WorldJoint], joint: usize| {
            (world[joint].rotation * rest[joint].rotation.reverse()).normalize()
        };
        let place = |world: &[WorldJoint], joint: usize, parent_away: Rotor| {
            parent_away.reverse().apply(limb(world, joint, parents[joint]))
        };
        // Joints that begin to move after the first frame.
        let mut late: Vec<usize> = Vec::new();
        for (frame, &time) in times.iter().enumerate() {
            let world = clip.world_at(time);
            for &joint in &listed {
                let parent_away = parents[joint].map_or(Rotor::IDENTITY, |parent| away(&world, parent));
                turns[joint].push((parent_away.reverse() * away(&world, joint)).normalize());
                let own = limb(rest, joint, parents[joint]);
                let now = place(&world, joint, parent_away);
                let is_off = || now.distance(own) > 1e-6 * size.max(own.length());
                if let Some(places) = &mut places[joint] {
                    places.push(now);
                } else if is_off() && !late.contains(&joint) {
                    if frame == 0 {
                        places[joint] = Some(vec![now]);
                    } else {
                        late.push(joint);
                    }
                }
            }
        }
        if !late.is_empty() {
            for &joint in &late {
                places[joint] = Some(Vec::with_capacity(times.len()));
            }
            for &time in times {
                let world = clip.world_at(time);
                for &joint in &late {
                    let parent_away = parents[joint].map_or(Rotor::IDENTITY, |parent| away(&world, parent));
                    if let Some(places) = &mut places[joint] {
                        places.push(place(&world, joint, parent_away));
                    }
                }
            }
        }
        Self { turns, places }
    }
}

/// From the parent, or the scene's origin, to the joint, in world axes.
fn limb(world: &[WorldJoint], joint: usize, parent: Option<usize>) -> DVec3 {
    world[joint].position() - parent.map_or(DVec3::ZERO, |parent| world[parent].position())
}

/// The times that are sampled, evenly apart.
fn frame_times(grid: &FrameGrid, notes: &mut Vec<Note>) -> (Vec<f64>, f64) {
    let usual = if grid.rate.is_finite() && grid.rate > 0.0 { 1.0 / grid.rate } else { 1.0 / 30.0 };
    match &grid.times {
        Times::Even { step_secs, count } => ((0..*count).map(|frame| grid.time(frame)).collect(), *step_secs),
        Times::Listed(times) => {
            let (Some(&start), Some(&end)) = (times.first(), times.last()) else {
                return (Vec::new(), usual);
            };
            if start != 0.0 {
                let text = format!(
                    "expected the first row at 0 s, found it at {start} s: all rows are moved to begin at 0"
                );
                notes.push(Note::new("times", text));
            }
            let even_secs = (end - start) / (times.len() - 1).max(1) as f64;
            let off = |step: f64| {
                let off = |(row, &time): (usize, &f64)| (time - start - row as f64 * step).abs();
                times.iter().enumerate().map(off).fold(0.0, f64::max)
            };
            // Rows that are as even as their digits can tell are the frames.
            if times.len() > 1 && off(even_secs) <= 0.02 * even_secs {
                return (times.to_vec(), even_secs);
            }
            // A gap of years between two rows is damage: it is not filled at the rate of the others.
            let most = (16 * times.len()).max(100_000);
            let usual = usual.max((end - start) / most as f64);
            let count = ((end - start) / usual).round() as usize + 1;
            let text = format!(
                "expected evenly spaced rows, found {} uneven ones: sampled as {count} frames of {usual} s",
                times.len()
            );
            notes.push(Note::new("times", text));
            ((0..count).map(|frame| (start + frame as f64 * usual).min(end)).collect(), usual)
        }
    }
}

/// Enough digits to read the very same number again, and at least 9 significant ones.
pub(super) fn frame_time_text(step_secs: f64) -> String {
    let shortest = step_secs.to_string();
    let decimals = shortest.split('.').nth(1).map_or(0, str::len);
    if decimals >= 10 { shortest } else { format!("{step_secs:.10}") }
}

/// Six decimals, and more where the whole skeleton is smaller than one unit.
fn length_decimals(size: f64) -> usize {
    let extra = if size > 0.0 && size < 1.0 { (-size.log10()).ceil() as usize } else { 0 };
    6 + extra.min(9)
}

struct Hierarchy<'a> {
    clip: &'a Clip,
    rest: &'a [WorldJoint],
    parents: &'a [Option<usize>],
    moves: &'a [bool],
    decimals: usize,
}

impl Hierarchy<'_> {
    /// Writes all joints, and gives their order: each right before what hangs on it.
    fn write(&self, bytes: &mut Vec<u8>, listed: &[usize]) -> Vec<usize> {
        let mut children: Vec<Vec<usize>> = vec![Vec::new(); self.parents.len()];
        let mut roots = Vec::new();
        for &joint in listed {
            match self.parents[joint] {
                Some(parent) => children[parent].push(joint),
                None => roots.push(joint),
            }
        }
        bytes.extend_from_slice(b"HIERARCHY\n");
        let mut order = Vec::with_capacity(listed.len());
        // What is still to be written: a joint to open, or one to close, with its depth.
        let mut open: Vec<(usize, usize, bool)> =
            roots.into_iter().rev().map(|joint| (joint, 0, true)).collect();
        while let Some((joint, depth, is_opening)) = open.pop() {
            let indent = "\t".repeat(depth.min(64));
            if !is_opening {
                let _ = writeln!(bytes, "{indent}}}");
                continue;
            }
            order.push(joint);
            self.joint(bytes, joint, &indent, children[joint].is_empty());
            open.push((joint, depth, false));
            open.extend(children[joint].iter().rev().map(|&child| (child, depth + 1, true)));
        }
        order
    }

    fn joint(&self, bytes: &mut Vec<u8>, joint: usize, indent: &str, is_leaf: bool) {
        let skeleton = &self.clip.skeleton;
        let keyword = if self.parents[joint].is_some() { "JOINT" } else { "ROOT" };
        // A name ends at its line or at the brace.
        let name: String = skeleton
            .label(joint)
            .chars()
            .map(|c| if c.is_control() || matches!(c, '{' | '}') { '_' } else { c })
            .collect();
        let _ = writeln!(bytes, "{indent}{keyword} {name}\n{indent}{{");
        let offset = self.vector(limb(self.rest, joint, self.parents[joint]));
        let _ = writeln!(bytes, "{indent}\tOFFSET {offset}");
        let channels = if self.moves[joint] {
            "6 Xposition Yposition Zposition Zrotation Xrotation Yrotation"
        } else {
            "3 Zrotation Xrotation Yrotation"
        };
        let _ = writeln!(bytes, "{indent}\tCHANNELS {channels}");
        let own = &self.rest[joint];
        let tips: Vec<DVec3> = skeleton.joints()[joint]
            .tips
            .iter()
            .map(|&tip| own.scene_from_joint.transform_vector3(tip))
            .collect();
        let tips = if is_leaf && tips.is_empty() { vec![DVec3::ZERO] } else { tips };
        for tip in tips {
            let tip = self.vector(tip);
            let _ =
                writeln!(bytes, "{indent}\tEnd Site\n{indent}\t{{\n{indent}\t\tOFFSET {tip}\n{indent}\t}}");
        }
    }

    fn vector(&self, v: DVec3) -> String {
        let decimals = self.decimals;
        // Adding 0 takes the sign from −0.
        let [x, y, z] = v.to_array().map(|part| part + 0.0);
        format!("{x:.decimals$} {y:.decimals$} {z:.decimals$}")
    }
}

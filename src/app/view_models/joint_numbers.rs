//! The numbers of one joint at one time.

use crate::clip::{Clip, Paths, Place, Stored};
use crate::rotor::SwingTwist;

use super::sampled::{limb_direction, rotation_at};

/// What a joint's turn is at one time. Degrees.
#[derive(Clone, Debug, PartialEq)]
pub struct RotationNumbers {
    /// Turn inside yz, zx and xy.
    pub plane_angles_deg: [f64; 3],
    /// The whole turn.
    pub turn_deg: f64,
    /// Tilt of the limb from its rest.
    pub swing_deg: f64,
    /// Turn of the limb about itself.
    pub twist_deg: f64,
    /// Degrees a second over the frame before.
    pub turn_rate_deg: f64,
    /// The stored numbers of the key at or before the frame nearest to this time: names and values.
    pub stored: Vec<(String, f64)>,
}

/// One joint at one time, before and after.
#[derive(Clone, Debug, PartialEq)]
pub struct JointNumbers {
    /// Its label.
    pub label: String,
    /// Its parent's label.
    pub parent: Option<String>,
    /// How many rotation keys it has.
    pub keys: usize,
    /// What lies between the keys.
    pub path: &'static str,
    /// Turn of the chosen rest pose in yz, zx and xy.
    pub rest_deg: [f64; 3],
    /// Place in the parent's frame in the chosen rest pose, in the file's lengths.
    pub rest_place: [f64; 3],
    /// In the source.
    pub before: RotationNumbers,
    /// In the result.
    pub after: RotationNumbers,
    /// The turn between the two.
    pub change_deg: f64,
}

impl RotationNumbers {
    /// Whether any number is another, as it is shown. What is no number is the same on both sides.
    fn differs(&self, other: &Self) -> bool {
        let is_same = |a: f64, b: f64| a == b || (a.is_nan() && b.is_nan());
        let all = |of: &Self| {
            let [yz, zx, xy] = of.plane_angles_deg;
            [yz, zx, xy, of.turn_deg, of.swing_deg, of.twist_deg, of.turn_rate_deg]
        };
        let stored = self.stored.iter().zip(&other.stored);
        self.stored.len() != other.stored.len()
            || !all(self).into_iter().zip(all(other)).all(|(a, b)| is_same(a, b))
            || !stored.into_iter().all(|(a, b)| a.0 == b.0 && is_same(a.1, b.1))
    }
}

impl JointNumbers {
    /// Whether the result has other numbers than the source.
    pub fn differs(&self) -> bool {
        self.before.differs(&self.after)
    }
}

/// The numbers of a joint at a time.
pub fn joint_numbers(source: &Clip, result: &Clip, joint: usize, time_secs: f64) -> JointNumbers {
    let skeleton = &source.skeleton;
    let rest = skeleton.chosen_rest(joint);
    let track = result.rotation(joint);
    JointNumbers {
        label: skeleton.label(joint).to_owned(),
        parent: skeleton.parent_joint(joint).map(|parent| skeleton.label(parent).to_owned()),
        keys: track.map_or(0, |track| track.times.len()),
        path: track.map_or("held at rest", |track| path_word(&track.paths)),
        rest_deg: rest.rotation.plane_angles().to_degrees(),
        rest_place: rest.translation.to_array(),
        before: rotation_numbers(source, joint, time_secs),
        after: rotation_numbers(result, joint, time_secs),
        change_deg: rotation_at(source, joint, time_secs)
            .turn_to(rotation_at(result, joint, time_secs))
            .to_degrees(),
    }
}

fn path_word(paths: &Paths) -> &'static str {
    match paths {
        Paths::Every(kind) => kind.name(),
        Paths::Each(_) => "mixed",
    }
}

fn rotation_numbers(clip: &Clip, joint: usize, time_secs: f64) -> RotationNumbers {
    let rotor = rotation_at(clip, joint, time_secs);
    let rest = clip.skeleton.chosen_rest(joint).rotation.reverse();
    let split = SwingTwist::new(rest * rotor, limb_direction(clip, joint));
    let step = 1.0 / clip.grid.rate.max(1e-6);
    let before = rotation_at(clip, joint, (time_secs - step).max(0.0));
    RotationNumbers {
        plane_angles_deg: rotor.plane_angles().to_degrees(),
        turn_deg: rotor.turn().to_degrees(),
        swing_deg: split.swing_rad().to_degrees(),
        twist_deg: split.twist_rad.to_degrees(),
        turn_rate_deg: (before.turn_to(rotor) / step).to_degrees(),
        stored: stored_numbers(clip, joint, time_secs),
    }
}

fn stored_numbers(clip: &Clip, joint: usize, time_secs: f64) -> Vec<(String, f64)> {
    /// Keys and frames so near to each other are at one time: one of them may have been rounded to 32 bits.
    const SAME_SECS: f64 = 1e-5;
    let Some(track) = clip.rotation(joint) else { return Vec::new() };
    // While a clip plays the time lies between frames: the numbers are those of the frame that is told beside them.
    let frame_secs =
        if clip.grid.count() > 0 { clip.grid.time(clip.grid.frame(time_secs)) } else { time_secs };
    let key = match track.times.place(frame_secs + SAME_SECS) {
        None => return Vec::new(),
        Some(Place::At(key) | Place::Between(key, _)) => key,
    };
    match &track.stored {
        Stored::Angles(angles) => {
            let axes = angles.axes.iter().enumerate();
            axes.map(|(place, axis)| (axis.letter().to_string(), angles.degrees[key][place])).collect()
        }
        Stored::PlaneAngles(degrees) => {
            ["yz", "zx", "xy"].into_iter().map(str::to_owned).zip(degrees[key]).collect()
        }
        Stored::Rotors => {
            let rotor = track.keys[key];
            let parts = [("s", rotor.s), ("yz", rotor.yz), ("zx", rotor.zx), ("xy", rotor.xy)];
            parts.into_iter().map(|(name, value)| (name.to_owned(), value)).collect()
        }
    }
}

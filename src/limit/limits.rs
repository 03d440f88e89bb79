//! The limits of a skeleton's joints.

use std::collections::BTreeMap;

use glam::DVec3;

use crate::clip::{Clip, RotationTrack};
use crate::skeleton::Skeleton;

use super::joint_limit::{JointLimit, Reading};

/// Limits by joint. Joints without one may turn as they like.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Limits {
    /// What they are called: `adult`, a file's name, or what they were learned from.
    pub title: String,
    /// The limit of each joint that has one, by its index in the skeleton.
    pub joints: BTreeMap<usize, JointLimit>,
}

/// How one joint of a clip keeps to its limit, frame by frame.
#[derive(Clone, Debug, PartialEq)]
pub struct Keeping {
    /// Which joint.
    pub joint: usize,
    /// How many frames were looked at.
    pub frames: usize,
    /// Frames beyond the limit.
    pub beyond_limit: usize,
    /// How far beyond at most, radians.
    pub most_beyond_limit_rad: f64,
    /// Frames beyond the fault band, which are told as snags.
    pub beyond_fault: usize,
    /// How far beyond at most, radians.
    pub most_beyond_fault_rad: f64,
    /// Frames whose twist could not be told, so near half a turn was the swing.
    pub twist_held: usize,
    /// The largest use of the limit: 1 is at it.
    pub most_use: f64,
}

impl Limits {
    /// Whether no joint has one.
    pub fn is_empty(&self) -> bool {
        self.joints.is_empty()
    }

    /// The limit of a joint.
    pub fn get(&self, joint: usize) -> Option<&JointLimit> {
        self.joints.get(&joint)
    }

    /// The same limits for joints of other numbers; those that have none any more go.
    #[must_use]
    pub fn renumbered(&self, now: &dyn Fn(usize) -> Option<usize>) -> Self {
        let joints = self.joints.iter().filter_map(|(joint, limit)| Some((now(*joint)?, *limit)));
        Self { title: self.title.clone(), joints: joints.collect() }
    }

    /// How each joint that has a limit and turns in `clip` keeps to it at the clip's frames.
    pub fn keeping(&self, clip: &Clip) -> Vec<Keeping> {
        let own = self.joints.iter().filter_map(|(&joint, limit)| {
            let track = clip.rotation(joint).filter(|track| !track.keys.is_empty())?;
            Some(keeping(joint, limit, &readings(track, &clip.grid.times.iter().collect::<Vec<_>>(), limit)))
        });
        own.collect()
    }

    /// How much of its limit a joint uses at each frame of the clip, 1 at the limit; `None` without a limit or keys.
    pub fn use_at_frames(&self, clip: &Clip, joint: usize) -> Option<Vec<f64>> {
        let (limit, track) = (self.get(joint)?, clip.rotation(joint).filter(|track| !track.keys.is_empty())?);
        let times: Vec<f64> = clip.grid.times.iter().collect();
        Some(readings(track, &times, limit).iter().map(|reading| limit.limit.use_of(reading)).collect())
    }
}

fn keeping(joint: usize, limit: &JointLimit, readings: &[Reading]) -> Keeping {
    let mut own = Keeping {
        joint,
        frames: readings.len(),
        beyond_limit: 0,
        most_beyond_limit_rad: 0.0,
        beyond_fault: 0,
        most_beyond_fault_rad: 0.0,
        twist_held: 0,
        most_use: 0.0,
    };
    for reading in readings {
        own.twist_held += usize::from(reading.is_twist_held);
        own.most_use = own.most_use.max(limit.limit.use_of(reading));
        if !limit.limit.contains(reading) {
            own.beyond_limit += 1;
            own.most_beyond_limit_rad = own.most_beyond_limit_rad.max(limit.limit.beyond_rad(reading));
        }
        if !limit.fault.contains(reading) {
            own.beyond_fault += 1;
            own.most_beyond_fault_rad = own.most_beyond_fault_rad.max(limit.fault.beyond_rad(reading));
        }
    }
    own
}

/// A track read at rising times, each reading counted on from the one before.
pub fn readings(track: &RotationTrack, times_secs: &[f64], limit: &JointLimit) -> Vec<Reading> {
    let mut before: Option<Reading> = None;
    let at = |local| {
        let reading = limit.read(local, before.as_ref());
        before = Some(reading);
        reading
    };
    track.at_all(times_secs).into_iter().map(at).collect()
}

/// The direction of the limb that hangs on a joint, in the joint's own frame: towards its one child that stands off, the mean of
/// several, else its tip, else on as its own offset goes. `None` for a joint that has no length anywhere.
pub fn limb_direction(skeleton: &Skeleton, joint: usize) -> Option<DVec3> {
    let rest = skeleton.world(&skeleton.rest_pose());
    let own = rest.get(joint)?;
    let mut ends = Vec::new();
    let mut open = skeleton.children(joint).to_vec();
    // Joints that stand on this one (a roll joint, a hip without an offset) hand the question on.
    while let Some(child) = open.pop() {
        let offset = rest[child].position() - own.position();
        if offset.length() > NO_LENGTH {
            ends.push(offset.normalize());
        } else {
            open.extend(skeleton.children(child));
        }
    }
    let sum: DVec3 = ends.iter().sum();
    let into_joint = |scene: DVec3| own.rotation.reverse().apply(scene).try_normalize();
    if sum.length() > 1e-3 {
        return into_joint(sum);
    }
    let tips: DVec3 = skeleton.joints()[joint].tips.iter().sum();
    if tips.length() > NO_LENGTH {
        return tips.try_normalize();
    }
    let parent = skeleton.parent_joint(joint)?;
    let offset = own.position() - rest[parent].position();
    (offset.length() > NO_LENGTH).then(|| into_joint(offset)).flatten()
}

/// Offsets shorter than this are none.
const NO_LENGTH: f64 = 1e-9;

//! A clip: a skeleton, a track for each joint, and the frames it is counted in.

use std::sync::Arc;

use crate::skeleton::{LocalPose, Skeleton, WorldJoint};

use super::path::PathKind;
use super::rotation_track::RotationTrack;
use super::times::Times;
use super::vector_track::VectorTrack;

/// What a clip animates of one joint. `None`: the rest pose holds.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct JointTracks {
    /// Turns.
    pub rotation: Option<RotationTrack>,
    /// Places.
    pub translation: Option<VectorTrack>,
    /// Sizes.
    pub scale: Option<VectorTrack>,
}

/// The frames that the clip is counted in on screen, in reports and on the command line; 0-based.
///
/// BVH: the file's frames. CSV: its rows. glTF: an even grid from time 0 at the rate of the median key spacing.
#[derive(Clone, Debug, PartialEq)]
pub struct FrameGrid {
    /// The time of each frame.
    pub times: Times,
    /// Frames per second, of uneven rows the median.
    pub rate: f64,
}

impl FrameGrid {
    /// An even grid from 0 to the frame nearest `duration_secs`.
    pub fn even(rate: f64, duration_secs: f64) -> Self {
        let count = (duration_secs * rate).round().max(0.0) as usize + 1;
        Self { times: Times::Even { step_secs: 1.0 / rate, count }, rate }
    }

    /// How many frames.
    pub fn count(&self) -> usize {
        self.times.len()
    }

    /// The time of a frame in seconds.
    pub fn time(&self, frame: usize) -> f64 {
        match &self.times {
            Times::Even { step_secs, .. } => frame as f64 * step_secs,
            Times::Listed(times) => times.get(frame).or(times.last()).copied().unwrap_or(0.0),
        }
    }

    /// The frame nearest a time.
    pub fn frame(&self, time_secs: f64) -> usize {
        self.times.nearest(time_secs)
    }
}

/// A clip as read from a file or made by passes; never changed in place.
#[derive(Clone, Debug, PartialEq)]
pub struct Clip {
    /// The name as the file has it; may be empty.
    pub name: String,
    /// The joints it moves.
    pub skeleton: Arc<Skeleton>,
    /// Tracks for each joint of the skeleton, carriers included. Shared, so that an edit copies what it touches.
    pub joints: Vec<Arc<JointTracks>>,
    /// How frames are counted.
    pub grid: FrameGrid,
    /// The time of the last key or frame in seconds; play starts at 0.
    pub duration_secs: f64,
}

impl Clip {
    /// The rotation track of a joint.
    pub fn rotation(&self, joint: usize) -> Option<&RotationTrack> {
        self.joints.get(joint).and_then(|tracks| tracks.rotation.as_ref())
    }

    /// The pose at a time, each joint relative to its parent.
    pub fn local_at(&self, time_secs: f64) -> LocalPose {
        self.local_at_by(time_secs, None)
    }

    /// As [`Clip::local_at`], with `path` in place of the tracks' own path kinds where it is given.
    pub fn local_at_by(&self, time_secs: f64, path: Option<PathKind>) -> LocalPose {
        let mut pose = self.skeleton.rest_pose();
        for (own, tracks) in pose.iter_mut().zip(&self.joints) {
            if let Some(track) = &tracks.rotation
                && !track.times.is_empty()
            {
                own.rotation = track.at_by(time_secs, path);
            }
            if let Some(place) = tracks.translation.as_ref().and_then(|track| track.at(time_secs)) {
                own.translation = place;
            }
            if let Some(size) = tracks.scale.as_ref().and_then(|track| track.at(time_secs)) {
                own.scale = size;
            }
        }
        pose
    }

    /// Every joint in the scene at a time.
    pub fn world_at(&self, time_secs: f64) -> Vec<WorldJoint> {
        self.skeleton.world(&self.local_at(time_secs))
    }

    /// This clip with another rotation track for one joint; all other joints stay shared.
    #[must_use]
    pub fn with_rotation(&self, joint: usize, track: RotationTrack) -> Self {
        let mut joints = self.joints.clone();
        joints[joint] = Arc::new(JointTracks { rotation: Some(track), ..(*joints[joint]).clone() });
        Self { joints, ..self.clone() }
    }

    /// Whether two clips move the same skeleton, so that joint numbers mean the same in both.
    pub fn has_skeleton_of(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.skeleton, &other.skeleton) || self.skeleton == other.skeleton
    }

    /// Whether a joint's tracks are the very same, shared or bit for bit.
    pub fn same_joint(&self, other: &Self, joint: usize) -> bool {
        match (self.joints.get(joint), other.joints.get(joint)) {
            (Some(own), Some(others)) => Arc::ptr_eq(own, others) || own == others,
            (None, None) => true,
            _ => false,
        }
    }
}

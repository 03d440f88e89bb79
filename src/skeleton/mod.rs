//! Skeletons: joints, rest pose, and forward kinematics.
//!
//! Knows nothing of time, files or screens.

mod joints;
mod pose;
mod transform;

pub use joints::{Joint, JointKind, Skeleton, SkeletonError};
pub use pose::{LocalPose, WorldJoint};
pub use transform::Transform;

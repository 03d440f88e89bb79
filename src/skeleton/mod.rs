//! Skeletons: joints, rest pose, roles, forward kinematics, and limbs bent to a point.
//!
//! Knows nothing of time, files or screens.

mod joints;
mod mirror;
mod pose;
mod rest;
pub mod roles;
mod smooth_step;
mod transform;
mod two_joint_limb;

pub use joints::{Joint, JointKind, Skeleton, SkeletonError};
pub use mirror::Mirror;
pub use pose::{LocalPose, WorldJoint};
pub use rest::{NoRestChoice, RestChoice};
pub use smooth_step::smooth_step;
pub use transform::Transform;
pub use two_joint_limb::{EASE_FROM, EndTurn, LimbBend, Reach, TwoJointLimb, eased};

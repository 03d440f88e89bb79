//! A skeleton in the pose that counts as its rest.

use std::sync::Arc;

use glam::{DMat3, DVec3};

use crate::rotor::Rotor;
use crate::skeleton::roles::{Role, Roles, Side};
use crate::skeleton::{JointKind, LocalPose, Skeleton, Transform};

/// A skeleton in the pose that counts as its rest, with the roles of its joints.
#[derive(Clone, Debug, PartialEq)]
pub struct Figure {
    /// The skeleton.
    pub skeleton: Arc<Skeleton>,
    /// The pose that counts as its rest: one transform a joint, relative to its parent.
    pub rest: LocalPose,
    /// What its joints are, in that pose.
    pub roles: Roles,
    /// The joint that the figure hangs on, where it is one of several of its file.
    pub root: Option<usize>,
}

impl Figure {
    /// In the pose that somebody chose for the skeleton, else as the file has it: node defaults of glTF, the zero pose of BVH.
    pub fn new(skeleton: &Arc<Skeleton>) -> Self {
        Self::with_rest(skeleton, skeleton.zero_pose())
    }

    /// In another pose, for instance that of a clip's first frame.
    ///
    /// # Panics
    /// When `rest` has not one transform for each joint.
    pub fn with_rest(skeleton: &Arc<Skeleton>, rest: LocalPose) -> Self {
        Self::below(skeleton, rest, None)
    }

    /// As [`Figure::with_rest`]; with `root` of what hangs on that joint alone: one figure of several in a file.
    ///
    /// # Panics
    /// When `rest` has not one transform for each joint.
    pub fn below(skeleton: &Arc<Skeleton>, rest: LocalPose, root: Option<usize>) -> Self {
        let roles = Roles::find_below(skeleton, &rest, root);
        Self { skeleton: skeleton.clone(), rest, roles, root }
    }

    /// The same figure with another pose for its rest, its joints being what they are. `up` is where up is in that pose's scene; unit.
    ///
    /// # Panics
    /// When `rest` has not one transform for each joint.
    #[must_use]
    pub fn posed(&self, rest: LocalPose, up: DVec3) -> Self {
        let roles = self.roles.posed(&self.skeleton, &rest, up);
        Self { skeleton: self.skeleton.clone(), rest, roles, root: self.root }
    }

    /// The same figure with arms level and legs down: a T-pose. Only the joints of arms and legs turn.
    #[must_use]
    pub fn straightened(&self) -> Self {
        let mut rest = self.rest.clone();
        let shape = &self.roles.shape;
        for side in Side::BOTH {
            let out = if side == Side::Left { shape.left } else { -shape.left };
            let limbs = [
                (Role::UpperArm(side), out),
                (Role::LowerArm(side), out),
                (Role::Hand(side), out),
                (Role::UpperLeg(side), -shape.up),
                (Role::LowerLeg(side), -shape.up),
            ];
            for (role, wanted) in limbs {
                let Some(joint) = self.roles.joint(role) else { continue };
                // Each in the pose that the joints above have got by now.
                let worlds = self.skeleton.world(&rest);
                let Some(end) = shape.limb_end(joint) else { continue };
                let own = shape.rotations[joint].reverse().apply(end - shape.positions[joint]);
                let now = worlds[joint].rotation.apply(own);
                let turn = Rotor::between(now, wanted);
                let above = worlds[joint].rotation * rest[joint].rotation.reverse();
                rest[joint].rotation = (above.reverse() * turn * worlds[joint].rotation).normalize();
            }
            // Feet stay as they stood.
            for role in [Role::Foot(side)] {
                let Some(joint) = self.roles.joint(role) else { continue };
                let worlds = self.skeleton.world(&rest);
                let above = worlds[joint].rotation * rest[joint].rotation.reverse();
                rest[joint].rotation = (above.reverse() * shape.rotations[joint]).normalize();
            }
        }
        self.posed(rest, self.roles.shape.up)
    }

    /// The turn from the axes (x left, y up, z forward) to the figure's own.
    pub(super) fn body_frame(&self) -> Rotor {
        let shape = &self.roles.shape;
        let forward = self.squared_forward();
        let left = shape.up.cross(forward);
        Rotor::from_matrix(&DMat3::from_cols(left, shape.up, forward))
    }

    /// Forward, put onto the nearest axis of the topmost joint where that is nearly it: feet and arms that are not quite alike
    /// on both sides should not turn the whole figure.
    fn squared_forward(&self) -> DVec3 {
        const NEAR: f64 = 0.9945; // 6°
        let shape = &self.roles.shape;
        let top = self.roles.joint(Role::Hips).or_else(|| self.skeleton.listed().next());
        let Some(top) = top else { return shape.forward };
        [DVec3::X, DVec3::Y, DVec3::Z]
            .into_iter()
            .flat_map(|axis| [axis, -axis])
            .filter_map(|axis| {
                let turned = shape.rotations[top].apply(axis);
                (turned - shape.up * turned.dot(shape.up)).try_normalize()
            })
            .find(|axis| axis.dot(shape.forward) > NEAR)
            .unwrap_or(shape.forward)
    }

    /// How long the legs are from thigh to ankle; without legs how high the figure is.
    pub(super) fn size(&self) -> Option<f64> {
        let shape = &self.roles.shape;
        if shape.leg_length > 0.0 {
            Some(shape.leg_length)
        } else {
            (shape.height > 0.0).then_some(shape.height)
        }
    }

    /// The origin that the figure is placed from: that of the topmost carrier above it, else the scene's.
    pub(super) fn origin(&self) -> DVec3 {
        let joints = self.skeleton.joints();
        let any = self.roles.joint(Role::Hips).or(self.root).or_else(|| self.skeleton.listed().next());
        let top = std::iter::successors(any, |&joint| joints[joint].parent).last();
        let carrier = top.filter(|&joint| joints[joint].kind == JointKind::Carrier);
        carrier.map_or(DVec3::ZERO, |joint| self.roles.shape.positions[joint])
    }

    /// What carries the parent's frame of a joint to the scene at rest.
    pub(super) fn parent_at_rest(&self, joint: usize) -> Transform {
        let parent = self.skeleton.joints()[joint].parent;
        parent.map_or(Transform::IDENTITY, |parent| {
            Transform::from_affine(&self.skeleton.world(&self.rest)[parent].scene_from_joint)
        })
    }
}

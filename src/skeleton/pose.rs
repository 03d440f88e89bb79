//! One pose of a skeleton, and where it puts each joint in the scene.

use glam::{DAffine3, DVec3};

use crate::rotor::Rotor;

use super::{Skeleton, Transform};

/// A transform for each joint, relative to its parent.
pub type LocalPose = Vec<Transform>;

/// A joint in the scene, all ancestors applied.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WorldJoint {
    /// The product of all turns down to this joint. Scales do not enter.
    pub rotation: Rotor,
    /// Takes the joint's own frame to the scene.
    pub scene_from_joint: DAffine3,
}

impl WorldJoint {
    /// Where the joint stands in the scene.
    pub fn position(&self) -> DVec3 {
        self.scene_from_joint.translation
    }
}

impl Skeleton {
    /// The pose in which nothing is animated.
    pub fn rest_pose(&self) -> LocalPose {
        self.joints().iter().map(|joint| joint.rest).collect()
    }

    /// Forward kinematics: places every joint of `local` (one transform a joint) in the scene.
    ///
    /// # Panics
    /// When `local` has not one transform for each joint.
    pub fn world(&self, local: &[Transform]) -> Vec<WorldJoint> {
        assert_eq!(local.len(), self.len(), "a pose has one transform for each joint");
        let mut world: Vec<WorldJoint> = Vec::with_capacity(local.len());
        for (joint, own) in self.joints().iter().zip(local) {
            let (rotation, scene_from_joint) = match joint.parent.map(|parent| world[parent]) {
                Some(parent) => (parent.rotation * own.rotation, parent.scene_from_joint * own.to_affine()),
                None => (own.rotation, own.to_affine()),
            };
            world.push(WorldJoint { rotation, scene_from_joint });
        }
        world
    }
}

#[cfg(test)]
mod tests {
    use super::super::{Joint, JointKind};
    use super::*;
    use crate::rotor::EulerOrder;

    #[test]
    fn a_turned_parent_carries_its_child() {
        let joint = |name: &str, number, parent, offset| Joint {
            name: name.to_owned(),
            number,
            parent,
            rest: Transform::from_translation(offset),
            kind: JointKind::Joint,
            tips: vec![],
        };
        let skeleton = Skeleton::new(vec![
            joint("root", 0, None, DVec3::new(1.0, 2.0, 3.0)),
            joint("arm", 1, Some(0), DVec3::new(0.0, 10.0, 0.0)),
        ])
        .unwrap();
        // reference/method_checks.json `bvh_zxy`: Z 30, X −40, Y 65 degrees.
        let mut pose = skeleton.rest_pose();
        pose[0].rotation = EulerOrder::ZXY.to_rotor([30.0, -40.0, 65.0].map(f64::to_radians));
        let arm = skeleton.world(&pose)[1].position();
        assert!(arm.distance(DVec3::new(-2.830_222_216, 8.634_139_482, -3.427_876_097)) < 1e-8, "{arm}");
    }
}

//! One pose of a skeleton, and where it puts each joint in the scene.

use glam::{DAffine3, DMat3, DVec3};

use crate::rotor::Rotor;

use super::{Skeleton, Transform};

/// A transform for each joint, relative to its parent.
pub type LocalPose = Vec<Transform>;

/// A joint in the scene, all ancestors applied.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WorldJoint {
    /// The product of all turns down to this joint; sizes do not enter. Where a scale of the joint or of an ancestor is
    /// negative it is the turn of [`WorldJoint::scene_from_joint`] with the mirror put into its x axis.
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
        let mut has_mirror: Vec<bool> = Vec::with_capacity(local.len());
        for (joint, own) in self.joints().iter().zip(local) {
            let (rotation, scene_from_joint) = match joint.parent.map(|parent| world[parent]) {
                Some(parent) => (parent.rotation * own.rotation, parent.scene_from_joint * own.to_affine()),
                None => (own.rotation, own.to_affine()),
            };
            let mirrored =
                own.scale.min_element() < 0.0 || joint.parent.is_some_and(|parent| has_mirror[parent]);
            // A mirror turns the sense of every turn below it: the product of the turns is none of the scene's.
            let rotation = mirrored.then(|| turn_of(&scene_from_joint.matrix3)).flatten().unwrap_or(rotation);
            has_mirror.push(mirrored);
            world.push(WorldJoint { rotation, scene_from_joint });
        }
        world
    }
}

/// The turn of a matrix of turns and sizes, a mirror put into its x axis (glTF 2.0 section 3.5.3: the sign of a negative
/// determinant goes into the scale). `None` when a size is 0 or not finite.
fn turn_of(matrix: &DMat3) -> Option<Rotor> {
    let mut columns = DMat3::from_cols(
        matrix.x_axis.try_normalize()?,
        matrix.y_axis.try_normalize()?,
        matrix.z_axis.try_normalize()?,
    );
    if columns.determinant() < 0.0 {
        columns.x_axis = -columns.x_axis;
    }
    Some(Rotor::from_matrix(&columns))
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

    #[test]
    fn below_a_mirror_the_turn_is_the_one_the_scene_shows() {
        let joint = |name: &str, number, parent| Joint {
            name: name.to_owned(),
            number,
            parent,
            rest: Transform::IDENTITY,
            kind: JointKind::Joint,
            tips: vec![],
        };
        let skeleton =
            Skeleton::new(vec![joint("root", 0, None), joint("arm", 1, Some(0)), joint("hand", 2, Some(1))])
                .unwrap();
        let mut pose = skeleton.rest_pose();
        pose[0].scale = DVec3::new(-2.0, 2.0, 2.0);
        pose[1].rotation = EulerOrder::ZXY.to_rotor([30.0, -40.0, 65.0].map(f64::to_radians));
        pose[2].scale = DVec3::new(-1.0, 1.0, 1.0);
        let world = skeleton.world(&pose);
        // Seen in a mirror across x, turns about y and z go the other way round and those about x do not.
        let seen = EulerOrder::ZXY.to_rotor([-30.0, -40.0, -65.0].map(f64::to_radians));
        assert!(world[0].rotation.turn_to(Rotor::IDENTITY) < 1e-12);
        assert!(world[1].rotation.turn_to(seen) < 1e-12, "{:?}", world[1].rotation);
        // A second mirror takes the first away; the sense of what lies between stays turned round.
        assert!(world[2].rotation.turn_to(seen) < 1e-12, "{:?}", world[2].rotation);
        // A mirrored axis points where the scene has it.
        let tip = world[1].scene_from_joint.transform_vector3(DVec3::Y);
        assert!(tip.distance(world[1].rotation.apply(DVec3::Y) * 2.0) < 1e-12, "{tip}");
    }
}

//! What a rest pose looks like: which way the figure faces, how long it is, where each limb points and bends.

use glam::DVec3;

use super::super::{JointKind, Skeleton, Transform, WorldJoint};
use crate::rotor::Rotor;

/// The rest pose of a figure in the scene.
#[derive(Clone, Debug, PartialEq)]
pub struct RestShape {
    /// Up, of unit length; one of the axes unless the figure as a whole stands askew.
    pub up: DVec3,
    /// Where the figure faces, of unit length, at right angles to up.
    pub forward: DVec3,
    /// The figure's left: `up × forward`.
    pub left: DVec3,
    /// How sure the facing is, 0 to 1: toes say it, knees hint at it, else it is the usual +z.
    pub facing_certainty: f64,
    /// From the lowest to the highest end along up.
    pub height: f64,
    /// From thigh to knee to ankle, the mean of both legs; of a figure without legs 0.
    pub leg_length: f64,
    /// The lowest end along up.
    pub ground: f64,
    /// Ankles above the ground, the mean of both; of a figure without feet 0.
    pub ankle_height: f64,
    /// Where each joint stands, carriers included.
    pub positions: Vec<DVec3>,
    /// How each joint is turned.
    pub rotations: Vec<Rotor>,
    pub(super) ends: Vec<Option<DVec3>>,
    pub(super) hinges: Vec<Option<DVec3>>,
}

impl RestShape {
    /// The shape in another pose: limbs end where they did on their joints, hinges and heading go along with what they belong to. `top` tells
    /// how the figure as a whole is turned.
    pub(super) fn posed(
        &self,
        skeleton: &Skeleton,
        pose: &[Transform],
        up: DVec3,
        top: Option<usize>,
    ) -> Self {
        let worlds = skeleton.world(pose);
        let positions: Vec<DVec3> = worlds.iter().map(WorldJoint::position).collect();
        let rotations: Vec<Rotor> = worlds.iter().map(|world| world.rotation).collect();
        let turned = |joint: usize| (rotations[joint] * self.rotations[joint].reverse()).normalize();
        let is_below = |joint: usize, above: usize| {
            std::iter::successors(skeleton.joints()[joint].parent, |&own| skeleton.joints()[own].parent)
                .any(|own| own == above)
        };
        let ends: Vec<Option<DVec3>> = (0..positions.len())
            .map(|joint| {
                let end = self.ends[joint]?;
                let at = (joint + 1..positions.len())
                    .find(|&other| self.positions[other] == end && is_below(other, joint));
                let along = turned(joint).apply(end - self.positions[joint]);
                Some(at.map_or(positions[joint] + along, |other| positions[other]))
            })
            .collect();
        let whole = top.map_or(Rotor::IDENTITY, turned);
        // Heading alone: what leans is set upright the shortest way.
        let forward = Rotor::between(whole.apply(self.up), up).apply(whole.apply(self.forward));
        let forward = (forward - up * forward.dot(up)).normalize_or(self.forward);
        let lowest = |joint: usize| {
            let is_part = skeleton.joints()[joint].kind == JointKind::Joint;
            let own = is_part.then(|| positions[joint].dot(up));
            own.into_iter().chain(ends[joint].filter(|_| is_part).map(|end| end.dot(up)))
        };
        let ground = (0..positions.len()).flat_map(lowest).reduce(f64::min).unwrap_or(self.ground);
        let hinges = (0..positions.len())
            .map(|joint| self.hinges[joint].map(|hinge| turned(joint).apply(hinge)))
            .collect();
        Self {
            up,
            forward,
            left: up.cross(forward),
            ground,
            positions,
            rotations,
            ends,
            hinges,
            ..self.clone()
        }
    }

    /// Where the limb of a joint ends: at the next joint of its chain, or at its tip. `None` where nothing follows.
    pub fn limb_end(&self, joint: usize) -> Option<DVec3> {
        self.ends[joint]
    }

    /// Where the limb of a joint points, of unit length.
    pub fn limb_direction(&self, joint: usize) -> Option<DVec3> {
        (self.ends[joint]? - self.positions[joint]).try_normalize()
    }

    /// How long the limb of a joint is; 0 where nothing follows.
    pub fn limb_length(&self, joint: usize) -> f64 {
        self.ends[joint].map_or(0.0, |end| end.distance(self.positions[joint]))
    }

    /// The axis about which the limb bends, of unit length and at right angles to it; bending (a knee to the back, an elbow to
    /// the front) is a right-handed turn about it. Known for the joints of arms and legs; for trunk, head and feet it is
    /// the figure's left, which is where their nodding axis points.
    pub fn hinge(&self, joint: usize) -> Option<DVec3> {
        self.hinges[joint]
    }

    /// The turn from the frame (limb direction, hinge) of the axes x and y to that of the joint: a full frame that knows
    /// nothing of how the joint's own axes lie. `None` where limb or hinge are not known or lie along each other.
    pub fn limb_frame(&self, joint: usize) -> Option<Rotor> {
        limb_frame(self.limb_direction(joint)?, self.hinges[joint]?)
    }

    /// The factor that takes the figure's lengths to metres, where its height is that of a person, child or giant
    /// (0.3 to 3 m): 1, 0.01 or 0.001. `None` where it is none of these.
    pub fn metres_per_unit(&self) -> Option<f64> {
        [1.0, 0.01, 0.001].into_iter().find(|unit| (0.3..3.0).contains(&(unit * self.height)))
    }
}

/// The turn that takes x to `direction` and y as near to `hinge` as that allows. Both need not be unit.
pub fn limb_frame(direction: DVec3, hinge: DVec3) -> Option<Rotor> {
    let x = direction.try_normalize()?;
    let y = (hinge - x * hinge.dot(x)).try_normalize()?;
    Some(Rotor::from_matrix(&glam::DMat3::from_cols(x, y, x.cross(y))))
}

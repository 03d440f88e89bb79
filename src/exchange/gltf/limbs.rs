//! A plain figure to see a skeleton by: a tapered block along each limb, and a cube where a joint has none.

use glam::DVec3;

use crate::skeleton::{JointKind, Skeleton, WorldJoint};

/// Half the width of a limb at its joint and at its end, as shares of its length.
const WIDTHS: [f64; 2] = [0.09, 0.05];
/// Half the edge of a lone joint's cube, as a share of the figure's height.
const CUBE: f64 = 0.01;

/// A mesh whose corners each follow one joint.
#[derive(Clone, Debug, Default)]
pub(super) struct Limbs {
    /// Corners in the scene, in the rest pose.
    pub corners: Vec<[f32; 3]>,
    /// For each corner the joint of the skeleton that carries it.
    pub joints: Vec<usize>,
    /// Three corners a triangle, counter-clockwise seen from outside.
    pub triangles: Vec<[usize; 3]>,
}

/// The figure of a skeleton whose joints stand at `world`.
pub(super) fn limbs(skeleton: &Skeleton, world: &[WorldJoint]) -> Limbs {
    let size = extent(world);
    let mut limbs = Limbs::default();
    for joint in skeleton.listed() {
        let start = world[joint].position();
        let to_joints = descendants(skeleton, joint).into_iter().map(|child| world[child].position());
        let tips = &skeleton.joints()[joint].tips;
        let to_tips = tips.iter().map(|&tip| world[joint].scene_from_joint.transform_point3(tip));
        let is_long = |end: &DVec3| end.is_finite() && (*end - start).length() > 1e-6 * size;
        let ends: Vec<DVec3> = to_joints.chain(to_tips).filter(is_long).collect();
        for &end in &ends {
            limbs.add_block(joint, start, end);
        }
        if ends.is_empty() && start.is_finite() {
            let up = DVec3::Y * (CUBE * size);
            limbs.add(joint, start - up, start + up, [CUBE * size; 2]);
        }
    }
    limbs
}

/// Height, or width where that is larger; 1 where all is in one place.
pub(super) fn extent(world: &[WorldJoint]) -> f64 {
    let places = || world.iter().map(WorldJoint::position).filter(|place| place.is_finite());
    let least = places().fold(DVec3::INFINITY, DVec3::min);
    let most = places().fold(DVec3::NEG_INFINITY, DVec3::max);
    let size = (most - least).max_element();
    if size > 0.0 && size.is_finite() { size } else { 1.0 }
}

/// The nearest joints below, through carriers.
fn descendants(skeleton: &Skeleton, joint: usize) -> Vec<usize> {
    let mut found = Vec::new();
    let mut open: Vec<usize> = skeleton.children(joint).to_vec();
    while let Some(next) = open.pop() {
        match skeleton.joints()[next].kind {
            JointKind::Joint => found.push(next),
            JointKind::Carrier => open.extend_from_slice(skeleton.children(next)),
        }
    }
    found
}

impl Limbs {
    fn add_block(&mut self, joint: usize, start: DVec3, end: DVec3) {
        let length = (end - start).length();
        self.add(joint, start, end, WIDTHS.map(|width| width * length));
    }

    /// A block with square ends of the given half widths.
    fn add(&mut self, joint: usize, start: DVec3, end: DVec3, half_widths: [f64; 2]) {
        let along = (end - start).normalize_or(DVec3::Y);
        let side = along.any_orthonormal_vector();
        let other = along.cross(side);
        let first = self.corners.len();
        for (place, half) in [(start, half_widths[0]), (end, half_widths[1])] {
            for (a, b) in [(1.0, 1.0), (-1.0, 1.0), (-1.0, -1.0), (1.0, -1.0)] {
                let corner = place + (side * a + other * b) * half;
                self.corners.push(corner.to_array().map(|number| number as f32));
                self.joints.push(joint);
            }
        }
        // `side`, `other`, `along` are right-handed, so the four corners run counter-clockwise seen from the far end.
        let mut quad = |corners: [usize; 4]| {
            let [a, b, c, d] = corners.map(|corner| first + corner);
            self.triangles.extend([[a, b, c], [a, c, d]]);
        };
        quad([3, 2, 1, 0]);
        quad([4, 5, 6, 7]);
        for corner in 0..4 {
            let next = (corner + 1) % 4;
            quad([corner, next, next + 4, corner + 4]);
        }
    }
}

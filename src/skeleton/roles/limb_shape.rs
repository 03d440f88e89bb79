//! Where each limb ends at rest and about which axis it bends.

use std::collections::BTreeMap;

use glam::DVec3;

use super::body::Plan;
use super::find::Finder;
use super::found::ChainKind;
use super::role::{Finger, Phalanx, Role, Side};
use super::shape::RestShape;

impl Finder<'_, '_> {
    /// Where each limb ends and how it bends.
    pub(super) fn shape_of_limbs(&mut self, plan: &Plan) {
        let by_role: BTreeMap<Role, usize> =
            self.candidates.iter().map(|one| (one.role, one.joint)).collect();
        let at = |joint: usize| self.figure.position[joint];
        let shape = &mut self.shape;
        let (up, forward, left) = (shape.up, shape.forward, shape.left);
        // A chain's joints end at the next one of it, whatever else hangs on them.
        for chain in &self.chains {
            for pair in chain.joints.windows(2) {
                if at(pair[0]).distance(at(pair[1])) > 1e-6 * self.figure.extent {
                    shape.ends[pair[0]] = Some(at(pair[1]));
                }
            }
        }
        let mut ends = |from: Option<usize>, to: Option<usize>| {
            if let (Some(from), Some(to)) = (from, to)
                && at(from).distance(at(to)) > 1e-6 * self.figure.extent
            {
                shape.ends[from] = Some(at(to));
            }
        };
        let role = |role: Role| by_role.get(&role).copied();
        for side in Side::BOTH {
            ends(role(Role::Shoulder(side)), role(Role::UpperArm(side)));
            ends(role(Role::UpperArm(side)), role(Role::LowerArm(side)));
            ends(role(Role::LowerArm(side)), role(Role::Hand(side)));
            ends(role(Role::UpperLeg(side)), role(Role::LowerLeg(side)));
            ends(role(Role::LowerLeg(side)), role(Role::Foot(side)));
            ends(role(Role::Foot(side)), role(Role::Toes(side)));
        }
        // The trunk goes on to the neck, not to an arm.
        if let (Some(&last), Some(&first)) = (plan.trunk.last(), plan.neck.first()) {
            ends(Some(last), Some(first));
        }
        let above = plan.trunk.iter().chain(&plan.neck).copied().find(|&joint| {
            plan.hips.is_some_and(|hips| at(hips).distance(at(joint)) > 1e-6 * self.figure.extent)
        });
        ends(plan.hips, above);
        // A hand points along its middle finger, or the mean of its fingers.
        for side in Side::BOTH {
            let Some(hand) = role(Role::Hand(side)) else { continue };
            let middle = [Finger::Middle, Finger::Index, Finger::Ring]
                .into_iter()
                .find_map(|finger| role(Role::Finger(side, finger, Phalanx::First)));
            ends(Some(hand), middle);
        }

        for chain in
            self.chains.iter().filter(|chain| matches!(chain.kind, ChainKind::Trunk | ChainKind::Neck))
        {
            for &joint in &chain.joints {
                shape.hinges[joint] = Some(left);
            }
        }
        if let Some(hips) = plan.hips {
            shape.hinges[hips] = Some(left);
        }
        // A head without a tip points up.
        if let Some(&head) = plan.neck.last()
            && shape.ends[head].is_none()
            && plan.front_legs.is_none()
        {
            shape.ends[head] = Some(at(head) + up * (0.1 * shape.height));
        }
        for side in Side::BOTH {
            let legs = [Role::UpperLeg(side), Role::LowerLeg(side), Role::Foot(side)].map(role);
            if let Some(hinge) = hinge(shape, [legs[0], legs[1]], left, -forward, up) {
                for joint in legs[..2].iter().flatten() {
                    shape.hinges[*joint] = Some(hinge);
                }
                for joint in [role(Role::Foot(side)), role(Role::Toes(side))].into_iter().flatten() {
                    shape.hinges[joint] = Some(left);
                }
            }
            let arms = [Role::UpperArm(side), Role::LowerArm(side)].map(role);
            let fallback =
                arms[1].and_then(|joint| shape.limb_direction(joint)).map(|along| along.cross(forward));
            let fallback = fallback.filter(|axis| axis.length() > 0.2).unwrap_or(-up);
            if let Some(hinge) = hinge(shape, arms, fallback, forward, up) {
                for joint in arms.iter().flatten().copied().chain(role(Role::Hand(side))) {
                    shape.hinges[joint] = Some(hinge);
                }
                for finger in Finger::ALL {
                    for phalanx in Phalanx::ALL {
                        if let Some(joint) = role(Role::Finger(side, finger, phalanx)) {
                            // The palm's normal: fingers bend towards it about an axis across the palm.
                            shape.hinges[joint] = Some(hinge);
                        }
                    }
                }
            }
            if let Some(shoulder) = role(Role::Shoulder(side)) {
                shape.hinges[shoulder] = Some(up);
            }
        }
        // Whatever else: the figure's left, or up where the limb itself points to the side.
        for joint in 0..shape.positions.len() {
            if shape.hinges[joint].is_none()
                && let Some(along) = shape.limb_direction(joint)
            {
                shape.hinges[joint] = Some(if along.dot(left).abs() < 0.8 { left } else { up });
            }
        }
        let ankles: Vec<f64> = Side::BOTH
            .iter()
            .filter_map(|&side| role(Role::Foot(side)))
            .map(|foot| at(foot).dot(up) - shape.ground)
            .collect();
        if !ankles.is_empty() {
            shape.ankle_height = (ankles.iter().sum::<f64>() / ankles.len() as f64).max(0.0);
        }
    }
}

/// The bending axis of a two-joint limb: the normal of its bend at rest where it is bent, else `fallback`. `towards` is where
/// the lower part goes when it bends; a bend at rest of a few degrees the other way is a rest pose overstretched.
fn hinge(
    shape: &RestShape,
    joints: [Option<usize>; 2],
    fallback: DVec3,
    towards: DVec3,
    up: DVec3,
) -> Option<DVec3> {
    let [upper, lower] = [joints[0]?, joints[1]?].map(|joint| shape.limb_direction(joint));
    let (upper, lower) = (upper?, lower?);
    let at_right_angles = |axis: DVec3| (axis - lower * axis.dot(lower)).try_normalize();
    let fallback =
        at_right_angles(fallback).or_else(|| at_right_angles(up)).or_else(|| at_right_angles(towards))?;
    let normal = upper.cross(lower);
    let bend = normal.length().asin().to_degrees();
    let expected = lower.cross(towards);
    // From 15° on the bend itself tells; below it must agree with where the figure faces.
    if bend > 15.0 || (bend > 3.0 && normal.normalize_or_zero().dot(expected.normalize_or_zero()) > 0.5) {
        return at_right_angles(normal);
    }
    Some(fallback)
}

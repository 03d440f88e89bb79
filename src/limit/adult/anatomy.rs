//! The anatomical zero of a skeleton: upright, arms hanging, palms to the thighs, feet forward.
//!
//! Rest poses differ (arms out, arms down, knees a little bent). For each joint it is worked out, from where its limb points at
//! rest and about which axis it bends, which turn of the scene would bring it to the zero; what hangs on it goes along.

use std::collections::BTreeMap;

use glam::DVec3;

use crate::rotor::{Bivector, Rotor};
use crate::skeleton::Skeleton;
use crate::skeleton::roles::{Finger, Phalanx, Role, Roles, Side, limb_frame};

/// The zero, joint by joint.
pub(super) struct Anatomy<'a> {
    skeleton: &'a Skeleton,
    pub(super) roles: &'a Roles,
    /// The turn of the scene that takes each joint from rest to zero.
    corrections: Vec<Rotor>,
    /// How sure each is, 0 to 1.
    certainty: Vec<f64>,
    /// Upper arms and legs whose elbow or knee was seen to bend about another axis: by how much, about the limb pointing down.
    hinge_turns: &'a BTreeMap<usize, f64>,
}

/// Where hands are not seen to have fingers their palms are taken to lie as usual.
const UNSEEN_PALM: f64 = 0.7;

/// A limb that points so little where it should (beyond 120° off) has no sure way there.
const UNSURE_WAY: f64 = -0.5;

/// A hand at rest is bent by less than 53°.
const STRAIGHT_HAND: f64 = 0.6;

impl<'a> Anatomy<'a> {
    pub(super) fn new(
        skeleton: &'a Skeleton,
        roles: &'a Roles,
        hinge_turns: &'a BTreeMap<usize, f64>,
    ) -> Self {
        let facing = 0.5 + 0.5 * roles.shape.facing_certainty;
        let mut own = Self { skeleton, roles, corrections: Vec::new(), certainty: Vec::new(), hinge_turns };
        for joint in 0..skeleton.len() {
            let above = skeleton.joints()[joint].parent;
            let (before, sure) =
                above.map_or((Rotor::IDENTITY, facing), |up| (own.corrections[up], own.certainty[up]));
            let (correction, certainty) = own.correction(joint, before, sure);
            own.corrections.push(correction);
            own.certainty.push(certainty);
        }
        own
    }

    fn correction(&self, joint: usize, before: Rotor, sure: f64) -> (Rotor, f64) {
        let shape = &self.roles.shape;
        let Some(role) = self.roles.role(joint) else { return (before, sure) };
        let Some(direction) = shape.limb_direction(joint) else { return (before, 0.8 * sure) };
        let down = -shape.up;
        let way = |direction: DVec3, to: DVec3| if direction.dot(to) < UNSURE_WAY { 0.4 } else { 1.0 };
        match role {
            Role::UpperArm(_) | Role::UpperLeg(_) => {
                // Elbows bend to the front, knees to the back.
                let hinge = if matches!(role, Role::UpperArm(_)) { -shape.left } else { shape.left };
                let rest = shape.hinge(joint).and_then(|axis| limb_frame(direction, axis));
                // What the clip shows of the elbow or knee goes before what a nearly straight limb at rest does.
                let seen = self.hinge_turns.get(&joint).copied().unwrap_or(0.0);
                let seen = Rotor::from_plane_angles(Bivector::from_axis(down * -seen));
                match (rest, limb_frame(down, hinge)) {
                    (Some(rest), Some(zero)) => (seen * zero * rest.reverse(), sure * way(direction, down)),
                    _ => (seen * Rotor::between(direction, down), 0.5 * sure),
                }
            }
            Role::LowerArm(side) => {
                let straight = straightened(before, direction, down);
                match self.thumb_side(side) {
                    Some(thumb) => (about_to(down, straight.apply(thumb), shape.forward) * straight, sure),
                    None => (straight, UNSEEN_PALM * sure),
                }
            }
            // A hand whose end lies to its side has an end that tells nothing, a thumb perhaps: it goes on straight.
            Role::Hand(_) if before.apply(direction).dot(down) < STRAIGHT_HAND => {
                (before, UNSEEN_PALM * sure)
            }
            Role::LowerLeg(_) | Role::Hand(_) => {
                (straightened(before, direction, down), sure * way(before.apply(direction), down))
            }
            // Flat on the ground as at rest, heading forward.
            Role::Foot(_) => (about_to(shape.up, direction, shape.forward), sure),
            Role::Finger(side, finger, _) if finger != Finger::Thumb => {
                let axis = self.finger_axis(side);
                (about_to(axis, before.apply(direction), down) * before, sure)
            }
            _ => (before, sure),
        }
    }

    /// From the little finger to the first, or along the thumb: towards the thumb's side, at rest in the scene.
    fn thumb_side(&self, side: Side) -> Option<DVec3> {
        let shape = &self.roles.shape;
        let hand = self.roles.joint(Role::Hand(side))?;
        let along = shape.limb_direction(hand)?;
        let first = |finger| self.roles.joint(Role::Finger(side, finger, Phalanx::First));
        let across = |direction: DVec3| {
            let square = direction - along * direction.dot(along);
            (square.length() > 0.2 * direction.length()).then(|| square.try_normalize()).flatten()
        };
        let fingers =
            first(Finger::Index).zip(first(Finger::Little).or(first(Finger::Ring)).or(first(Finger::Middle)));
        let knuckles = fingers.map(|(index, other)| shape.positions[index] - shape.positions[other]);
        let thumb = first(Finger::Thumb).and_then(|joint| shape.limb_end(joint));
        let thumb = thumb.map(|end| end - shape.positions[hand]);
        knuckles.and_then(across).or_else(|| thumb.and_then(across))
    }

    /// The axis about which fingers bend to the palm, with the hand at zero.
    pub(super) fn finger_axis(&self, side: Side) -> DVec3 {
        match side {
            Side::Left => -self.roles.shape.forward,
            Side::Right => self.roles.shape.forward,
        }
    }

    /// How sure the zero of a joint is, with the sureness of its role.
    pub(super) fn confidence(&self, joint: usize) -> f64 {
        self.certainty[joint] * self.roles.joints[joint].confidence
    }

    /// The local turn of a joint at zero.
    pub(super) fn zero(&self, joint: usize) -> Rotor {
        let at = |joint: usize| self.corrections[joint] * self.roles.shape.rotations[joint];
        let above = self.skeleton.joints()[joint].parent.map_or(Rotor::IDENTITY, at);
        (above.reverse() * at(joint)).normalize()
    }

    /// A direction of the scene in the joint's own frame, with the joint at zero.
    pub(super) fn in_joint(&self, joint: usize, scene: DVec3) -> DVec3 {
        (self.corrections[joint] * self.roles.shape.rotations[joint]).reverse().apply(scene)
    }
}

/// The least turn that makes the limb go on straight.
fn straightened(before: Rotor, direction: DVec3, to: DVec3) -> Rotor {
    Rotor::between(before.apply(direction), to) * before
}

/// The turn about `axis` that brings `from` as near to `to` as it can; none where either lies along the axis.
fn about_to(axis: DVec3, from: DVec3, to: DVec3) -> Rotor {
    let square = |v: DVec3| v - axis * v.dot(axis);
    let (from, to) = (square(from), square(to));
    if from.length() < 0.2 || to.length() < 0.2 {
        return Rotor::IDENTITY;
    }
    let angle = axis.dot(from.cross(to)).atan2(from.dot(to));
    Rotor::from_plane_angles(Bivector::from_axis(axis * angle))
}

//! The handles around the chosen joint: discs that turn it, and the tip of its limb that is drawn to a point.

use std::f64::consts::FRAC_PI_4;

use glam::{DVec2, DVec3};

use crate::clip::{Clip, PushFrame};
use crate::raster::{Lens, View};
use crate::rotor::{Bivector, Rotor};
use crate::skeleton::roles::{ChainKind, Role, Roles};
use crate::skeleton::{EndTurn, Skeleton, TwoJointLimb, WorldJoint};

use super::super::session::{Disc, TurnPlanes};
use super::sampled::limb_direction;

/// A disc around a joint, by which it is turned.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DiscHandle {
    /// Which.
    pub disc: Disc,
    /// The joint, world.
    pub center: DVec3,
    /// Unit vector in the plane; angles count from it. World.
    pub u: DVec3,
    /// Unit vector in the plane, square to `u`; positive turns go from `u` to `v`. World.
    pub v: DVec3,
    /// World units.
    pub radius: f64,
    /// Where on the rim it is best taken hold of, radians from `u`.
    pub grip_rad: f64,
}

impl DiscHandle {
    /// The point on the rim at an angle (radians) from `u`, world.
    pub fn rim(&self, angle_rad: f64) -> DVec3 {
        self.center + (self.u * angle_rad.cos() + self.v * angle_rad.sin()) * self.radius
    }

    /// The axis about which positive turns are right-handed, unit, world.
    pub fn axis(&self) -> DVec3 {
        self.u.cross(self.v)
    }
}

/// The end of a limb, by which it is drawn to a point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TipHandle {
    /// The joint that was chosen.
    pub joint: usize,
    /// Where the tip is, world.
    pub at: DVec3,
    /// The limb of two joints that bends; `None`: the joint alone turns so that its limb points there.
    pub limb: Option<TwoJointLimb>,
    /// What becomes of the turn of a hand or foot at the end.
    pub end_turn: EndTurn,
}

/// All handles of a joint.
#[derive(Clone, Debug, PartialEq)]
pub struct Handles {
    /// The joint.
    pub joint: usize,
    /// The discs, from the plane discs to the free one.
    pub discs: Vec<DiscHandle>,
    /// The tip.
    pub tip: Option<TipHandle>,
}

/// Radius of the plane discs, points, and the least of it near the picture's edge.
const RADIUS_POINTS: f64 = 64.0;
const LEAST_RADIUS_POINTS: f64 = 34.0;
/// Beyond the outermost rim a grip needs so many points more.
const GRIP_POINTS: f64 = 6.0;
/// Twist and free, against the plane discs.
const TWIST_SHARE: f64 = 0.62;
const FREE_SHARE: f64 = 1.26;

/// The radius of the plane discs in a picture of that size, pixels; `scale` is pixels to a point. Near the picture's edge discs are smaller, so
/// that their grips can be reached; `at` is where their middle is seen.
pub fn disc_radius_px(size_px: [usize; 2], scale: f64, at: DVec2) -> f64 {
    let size = DVec2::new(size_px[0] as f64, size_px[1] as f64);
    let usual = (RADIUS_POINTS * scale).min(0.24 * size.min_element());
    let least = (LEAST_RADIUS_POINTS * scale).min(0.2 * size.min_element());
    let room = at.min(size - at).min_element();
    ((room - GRIP_POINTS * scale) / FREE_SHARE).max(least).min(usual)
}

/// The handles of a joint in a pose (`world`, one entry for each joint) as they lie in a view, the plane discs of a radius of so
/// many pixels. `None` when the joint is not to be seen.
pub fn handles(
    clip: &Clip,
    world: &[WorldJoint],
    joint: usize,
    planes: TurnPlanes,
    roles: Option<&Roles>,
    view: &View,
    radius_px: f64,
) -> Option<Handles> {
    let own = world.get(joint)?;
    let center = own.position();
    let seen = view.project(center)?;
    let radius = radius_px / seen.px_per_unit;
    let disc =
        |disc, u, v, share, grip_rad| DiscHandle { disc, center, u, v, radius: radius * share, grip_rad };
    let to_eye = match view.lens {
        Lens::Perspective => (view.eye - center).normalize_or(view.back),
        Lens::Orthographic => view.back,
    };
    let frame = frame_in_world(clip, world, joint, planes);
    let [x, y, z] = DVec3::AXES.map(|axis| frame.apply(axis));
    // Each plane is taken hold of in the quarter that faces the eye: so the three grips lie well apart.
    let facing = |u: DVec3, v: DVec3| {
        let sign = |axis: DVec3| if axis.dot(to_eye) < -1e-9 { -1.0 } else { 1.0 };
        f64::atan2(sign(v), sign(u))
    };
    let mut discs: Vec<DiscHandle> = [(Disc::Yz, y, z), (Disc::Zx, z, x), (Disc::Xy, x, y)]
        .into_iter()
        .map(|(own, u, v)| disc(own, u, v, 1.0, facing(u, v)))
        .collect();
    let along = own.rotation.apply(limb_direction(clip, joint));
    let u = along.any_orthonormal_vector();
    let v = along.cross(u);
    let aside = view.right * 0.7 - view.up * 0.5 + to_eye * 0.5;
    discs.push(disc(Disc::Twist, u, v, TWIST_SHARE, f64::atan2(aside.dot(v), aside.dot(u))));
    discs.push(disc(Disc::Free, view.right, view.up, FREE_SHARE, -FRAC_PI_4));
    Some(Handles { joint, discs, tip: tip_handle(clip, world, joint, roles) })
}

/// How the planes of the discs lie in the scene.
fn frame_in_world(clip: &Clip, world: &[WorldJoint], joint: usize, planes: TurnPlanes) -> Rotor {
    match planes {
        TurnPlanes::World => Rotor::IDENTITY,
        TurnPlanes::Parent => parent_in_world(&clip.skeleton, world, joint),
        TurnPlanes::Rest => {
            parent_in_world(&clip.skeleton, world, joint) * clip.skeleton.chosen_rest(joint).rotation
        }
    }
}

/// How a joint's parent turns in the scene.
pub(super) fn parent_in_world(skeleton: &Skeleton, world: &[WorldJoint], joint: usize) -> Rotor {
    skeleton.joints()[joint].parent.map_or(Rotor::IDENTITY, |parent| world[parent].rotation)
}

/// The frame and the plane (of area 1) of a positive turn with a disc; `None` for the free one.
pub(super) fn plane_of(
    clip: &Clip,
    joint: usize,
    disc: Disc,
    planes: TurnPlanes,
) -> Option<(PushFrame, Bivector)> {
    let Some((plane, _)) = disc.plane() else {
        let along = limb_direction(clip, joint);
        return (disc == Disc::Twist).then(|| (PushFrame::Own, Bivector::from_axis(along)));
    };
    Some(match planes {
        TurnPlanes::World => (PushFrame::World, plane),
        TurnPlanes::Parent => (PushFrame::Parent, plane),
        // The chosen rest stands still in the parent's frame.
        TurnPlanes::Rest => {
            let rest = clip.skeleton.chosen_rest(joint).rotation;
            (PushFrame::Parent, Bivector::from_axis(rest.apply(plane.axis())))
        }
    })
}

fn tip_handle(clip: &Clip, world: &[WorldJoint], joint: usize, roles: Option<&Roles>) -> Option<TipHandle> {
    let skeleton = &clip.skeleton;
    if let Some((limb, end_turn)) = roles.and_then(|roles| limb_of(skeleton, roles, joint)) {
        let at = world[limb.end].scene_from_joint.transform_point3(limb.end_point);
        return at.is_finite().then_some(TipHandle { joint, at, limb: Some(limb), end_turn });
    }
    let end = single_end(skeleton, joint)?;
    let at = world[joint].scene_from_joint.transform_point3(end);
    let has_length = at.distance(world[joint].position()) > 1e-9;
    (at.is_finite() && has_length).then_some(TipHandle { joint, at, limb: None, end_turn: EndTurn::Carried })
}

/// The one end of a joint's limb in its own frame; `None` where there are several, or none.
fn single_end(skeleton: &Skeleton, joint: usize) -> Option<DVec3> {
    let children: Vec<DVec3> =
        skeleton.children(joint).iter().map(|&child| skeleton.joints()[child].rest.translation).collect();
    match (children.as_slice(), skeleton.joints()[joint].tips.as_slice()) {
        ([only], []) | ([], [only]) => Some(*only),
        _ => None,
    }
}

/// The limb of two joints that the tip of `joint` belongs to: of a forearm or shin, or of the hand or foot at its end.
fn limb_of(skeleton: &Skeleton, roles: &Roles, joint: usize) -> Option<(TwoJointLimb, EndTurn)> {
    let limb = |upper: usize, lower: usize, end: Option<usize>| {
        if let Some(end) = end {
            return TwoJointLimb::new(skeleton, upper, lower, end);
        }
        let end_point = skeleton.joints()[lower].tips.first().copied()?;
        Some(TwoJointLimb { end_point, ..TwoJointLimb::new(skeleton, upper, lower, lower)? })
    };
    let role = roles.role(joint);
    let of = |upper: Role, lower: Role, end: Role| {
        limb(roles.joint(upper)?, roles.joint(lower)?, roles.joint(end))
    };
    match role {
        Some(Role::LowerArm(side) | Role::Hand(side)) => {
            let own = of(Role::UpperArm(side), Role::LowerArm(side), Role::Hand(side))?;
            return Some((own, EndTurn::Carried));
        }
        // A foot keeps its turn in the scene: it stands on something.
        Some(Role::LowerLeg(side) | Role::Foot(side)) => {
            let own = of(Role::UpperLeg(side), Role::LowerLeg(side), Role::Foot(side))?;
            return Some((own, EndTurn::Kept));
        }
        // These turn alone.
        Some(_) => return None,
        None => {}
    }
    let own = roles.joints.get(joint)?;
    let chain = roles.chains.get(own.chain?)?;
    let bends = matches!(chain.kind, ChainKind::Arm | ChainKind::Leg | ChainKind::FrontLeg | ChainKind::Wing);
    if !bends
        || own.place == 0
        || roles.role(chain.joints[own.place - 1]).is_some_and(|role| !role.is_hinge())
    {
        return None;
    }
    let end = chain.joints.get(own.place + 1).copied();
    Some((limb(chain.joints[own.place - 1], joint, end)?, EndTurn::Carried))
}

/// How far a disc's rim is from a pixel, in pixels: for taking hold of it. The half that faces away counts less.
pub(super) fn rim_distance(handle: &DiscHandle, view: &View, pixel: DVec2) -> Option<f64> {
    const STEPS: u32 = 60;
    let rim = |i: u32| {
        let at = handle.rim(std::f64::consts::TAU * f64::from(i) / f64::from(STEPS));
        let is_behind = handle.disc != Disc::Free && (at - handle.center).dot(view.back) < -1e-9;
        view.project(at).map(|seen| (seen.pixel, is_behind))
    };
    let distance_to_piece = |i: u32| {
        let ((a, behind), (b, _)) = (rim(i)?, rim(i + 1)?);
        let along = (pixel - a).dot(b - a) / (b - a).length_squared();
        let along = if along.is_finite() { along.clamp(0.0, 1.0) } else { 0.0 };
        (!behind).then(|| pixel.distance(a.lerp(b, along)))
    };
    (0..STEPS).filter_map(distance_to_piece).min_by(f64::total_cmp)
}

impl Handles {
    /// The disc whose rim is under a pixel, within `slack_px`: the nearest, and of those about equally near the first.
    pub fn disc_under(&self, view: &View, pixel: DVec2, slack_px: f64) -> Option<&DiscHandle> {
        let distances = self.discs.iter().filter_map(|disc| Some((disc, rim_distance(disc, view, pixel)?)));
        let near = distances.filter(|(_, distance)| *distance <= slack_px);
        near.min_by(|(_, a), (_, b)| a.total_cmp(b)).map(|(disc, _)| disc)
    }
}

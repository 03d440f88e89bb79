//! A limb of two joints, bent so that its end comes to a point.

use glam::{DAffine3, DMat3, DVec3};

use crate::rotor::{Bivector, Rotor};

use super::{Skeleton, Transform, smooth_step};

/// From this share of its full length on a limb gives way softly, unless it is stretched further already.
pub const EASE_FROM: f64 = 0.97;

/// A limb less bent than this sine of the bend (20°) has a bending plane of noise, or of how its knees are bowed: what it is bent by in
/// addition turns more and more about the given hinge.
const SURE_BEND: f64 = 0.342;

/// From this angle on (150°) two sides of a limb lie half round from each other.
const HALF_ROUND: f64 = 2.618;

/// A limb less bent at rest than this sine of the bend (2°) is straight there.
const STRAIGHT: f64 = 0.035;

/// A knee nearer to the line from root to end than this share of the limb's length has no bending plane at all.
const NO_PLANE: f64 = 1e-7;

/// Two joints and the end that they carry: hip, knee and ankle, or shoulder, elbow and wrist. Joints and carriers may stand
/// between them; they keep their own turns.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TwoJointLimb {
    /// The joint that the limb hangs on.
    pub upper: usize,
    /// The joint in its middle, somewhere below `upper`.
    pub lower: usize,
    /// The joint at its end, somewhere below `lower`; or `lower` itself where no joint stands at the end.
    pub end: usize,
    /// The point of `end`'s own frame that is to be carried: zero for the joint itself.
    pub end_point: DVec3,
}

/// What happens to the turn of the end.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum EndTurn {
    /// It goes along with the limb.
    Carried,
    /// It stays as it is in the scene.
    Kept,
    /// It becomes this in the scene; unit, meant as [`super::WorldJoint::rotation`].
    To(Rotor),
}

/// Where the end of a limb is to come.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reach {
    /// The point in the scene.
    pub target: DVec3,
    /// The turn of the end.
    pub end_turn: EndTurn,
    /// The axis of the lower joint's own frame about which a positive turn bends the limb. A limb that is straight, or nearly
    /// so, bends about it. `None`: about the axis of its rest pose.
    pub hinge: Option<DVec3>,
    /// The share of the full length from which on the limb gives way softly and never straightens further than it was; 1 for
    /// not at all. See [`EASE_FROM`].
    pub ease_from: f64,
}

impl Reach {
    /// To a point, the end's turn kept in the scene, with a soft end of reach.
    pub const fn to(target: DVec3) -> Self {
        Self { target, end_turn: EndTurn::Kept, hinge: None, ease_from: EASE_FROM }
    }
}

/// How the joints of a limb turn relative to their parents so that its end comes to a point; unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LimbBend {
    /// The upper joint.
    pub upper: Rotor,
    /// The lower joint.
    pub lower: Rotor,
    /// The end; `None` where the limb ends in a point of its lower joint.
    pub end: Option<Rotor>,
    /// How far the end stays from the target, in the scene's lengths.
    pub miss: f64,
}

impl LimbBend {
    /// Puts the turns into a pose.
    ///
    /// # Panics
    /// When the pose has not the limb's joints.
    pub fn put_into(&self, limb: &TwoJointLimb, local: &mut [Transform]) {
        local[limb.upper].rotation = self.upper;
        local[limb.lower].rotation = self.lower;
        if let Some(end) = self.end {
            local[limb.end].rotation = end;
        }
    }
}

impl TwoJointLimb {
    /// A limb from joint to joint; `None` when they don't hang below one another.
    pub fn new(skeleton: &Skeleton, upper: usize, lower: usize, end: usize) -> Option<Self> {
        let hangs = |joint: usize, above: usize| {
            joint > above
                && std::iter::successors(Some(joint), |&j| skeleton.joints()[j].parent).any(|j| j == above)
        };
        let is_limb = end < skeleton.len() && hangs(lower, upper) && (end == lower || hangs(end, lower));
        is_limb.then_some(Self { upper, lower, end, end_point: DVec3::ZERO })
    }

    /// Root, middle and end of the limb in the scene.
    ///
    /// # Panics
    /// When the pose has not the limb's joints.
    pub fn points(&self, skeleton: &Skeleton, local: &[Transform]) -> [DVec3; 3] {
        let place =
            |joint: usize, point: DVec3| carried(skeleton, local, Some(joint), None).transform_point3(point);
        [place(self.upper, DVec3::ZERO), place(self.lower, DVec3::ZERO), place(self.end, self.end_point)]
    }

    /// Bends the limb of a pose so that its end comes to a point: the limb turns by the shortest way to the new direction and
    /// bends in its own plane, the middle joint on the side where it was.
    ///
    /// Where the target is nearer or farther than the limb can reach, the end comes as near as may be; near full stretch the reach
    /// is eased ([`Reach::ease_from`]), so that the middle joint never snaps straight. Turned, mirrored and unevenly scaled
    /// ancestors are allowed; scales within the limb must be the same along all axes. `None` when a part of the limb has no
    /// length, or a number is not finite.
    ///
    /// Source: the analytic limb of Tolani, Goswami & Badler 2000, "Real-time inverse kinematics techniques for
    /// anthropomorphic limbs"; its swivel is the one the limb has. The easing is the soft clamp by tanh of the methods page (section 11).
    ///
    /// # Panics
    /// When the pose has not the limb's joints.
    pub fn bend(&self, skeleton: &Skeleton, local: &[Transform], reach: &Reach) -> Option<LimbBend> {
        // Everything is computed in the frame that the upper joint hangs in, where its turn is rigid whatever scales stand above.
        let base = skeleton.joints()[self.upper].parent;
        let above = |joint: usize| carried(skeleton, local, skeleton.joints()[joint].parent, base);
        let scene_from_base = carried(skeleton, local, base, None);
        let lower_parent = above(self.lower);
        let lower_frame = lower_parent * local[self.lower].to_affine();
        let end_parent = if self.end == self.lower { lower_parent } else { above(self.end) };
        let end_frame = end_parent * local[self.end].to_affine();

        let root = local[self.upper].translation;
        let middle = lower_frame.translation;
        let upper_part = middle - root;
        let lower_part = end_frame.transform_point3(self.end_point) - middle;
        let lengths = [upper_part.length(), lower_part.length()];
        let base_from_scene = invertible(&scene_from_base)?;
        let wanted = base_from_scene.transform_point3(reach.target) - root;
        if !lengths.iter().all(|length| *length > 0.0 && length.is_finite()) || !wanted.is_finite() {
            return None;
        }

        let own = upper_part + lower_part;
        let from = own.try_normalize().unwrap_or(upper_part / lengths[0]);
        let to = wanted.try_normalize().unwrap_or(from);
        let arc = Rotor::between(from, to);
        let distance = reachable(wanted.length(), own.length(), lengths, reach.ease_from);
        let (along, aside) = triangle(lengths, distance);
        let side = {
            let own_side = upper_part - from * upper_part.dot(from);
            let hinge = self.hinge_in_base(skeleton, local, &lower_frame, reach.hinge);
            let is_trusted = reach.hinge.is_some();
            bending_side(arc, own_side, hinge, to, aside, lengths, is_trusted)
        };
        let new_middle = to * along + side * aside;
        let new_end = to * distance;
        let turned_upper = (Rotor::between(arc.apply(upper_part), new_middle) * arc).normalize();
        let turned_lower = (Rotor::between(arc.apply(lower_part), new_end - new_middle) * arc).normalize();

        let end = (self.end != self.lower).then(|| {
            let turned_end = match reach.end_turn {
                EndTurn::Carried => turned_lower,
                EndTurn::Kept => Rotor::IDENTITY,
                EndTurn::To(turn) => {
                    let now = scene_turn(skeleton, local, self.end);
                    seen_from(&scene_from_base.matrix3, turn * now.reverse())
                }
            };
            let own = local[self.end].rotation;
            (seen_from(&end_parent.matrix3, turned_lower.reverse() * turned_end) * own).normalize()
        });
        let lower_turn = seen_from(&lower_parent.matrix3, turned_upper.reverse() * turned_lower);
        let reached = scene_from_base.transform_point3(root + new_end);
        Some(LimbBend {
            upper: (turned_upper * local[self.upper].rotation).normalize(),
            lower: (lower_turn * local[self.lower].rotation).normalize(),
            end,
            miss: reached.distance(reach.target),
        })
    }

    /// The hinge of the middle joint as the limb stands, in the frame that the upper joint hangs in; unit.
    fn hinge_in_base(
        &self,
        skeleton: &Skeleton,
        local: &[Transform],
        lower_frame: &DAffine3,
        given: Option<DVec3>,
    ) -> Option<DVec3> {
        let own = given.or_else(|| self.rest_hinge(skeleton, local))?;
        axis_through(&lower_frame.matrix3, own).try_normalize()
    }

    /// The axis of the lower joint's own frame about which the limb is bent in its rest pose; `None` when it is straight there.
    fn rest_hinge(&self, skeleton: &Skeleton, local: &[Transform]) -> Option<DVec3> {
        let mut rest = skeleton.rest_pose();
        for (own, now) in rest.iter_mut().zip(local) {
            own.scale = now.scale;
        }
        let hinge = self.hinge(skeleton, &rest);
        (hinge.length() > STRAIGHT).then(|| hinge.normalize())
    }

    /// The axis of the lower joint's own frame about which the limb is bent, as long as the sine of the bend: a turn about it
    /// takes the upper part's direction to the lower's. Zero when it is straight.
    ///
    /// Its sum over the poses of a clip is a good hinge for [`Reach::hinge`].
    ///
    /// # Panics
    /// When the pose has not the limb's joints.
    pub fn hinge(&self, skeleton: &Skeleton, local: &[Transform]) -> DVec3 {
        let base = skeleton.joints()[self.upper].parent;
        let lower = carried(skeleton, local, Some(self.lower), base);
        let end = carried(skeleton, local, Some(self.end), base).transform_point3(self.end_point);
        let parts = [lower.translation - local[self.upper].translation, end - lower.translation];
        let [upper, lower_part] = parts.map(DVec3::normalize_or_zero);
        axis_into(&lower.matrix3, upper.cross(lower_part))
    }
}

/// What carries `joint` down from `from`, both included and excluded: the product of the transforms below `from`.
fn carried(skeleton: &Skeleton, local: &[Transform], joint: Option<usize>, from: Option<usize>) -> DAffine3 {
    let mut all = DAffine3::IDENTITY;
    let mut at = joint;
    while let Some(own) = at.filter(|_| at != from) {
        all = local[own].to_affine() * all;
        at = skeleton.joints()[own].parent;
    }
    all
}

/// The turn of a joint in the scene, as [`Skeleton::world`] gives it.
fn scene_turn(skeleton: &Skeleton, local: &[Transform], joint: usize) -> Rotor {
    let ancestors = || std::iter::successors(Some(joint), |&own| skeleton.joints()[own].parent);
    if ancestors().any(|own| local[own].scale.min_element() < 0.0) {
        let mut matrix = unit_columns(&carried(skeleton, local, Some(joint), None).matrix3);
        if matrix.determinant() < 0.0 {
            matrix.x_axis = -matrix.x_axis;
        }
        return Rotor::from_matrix(&matrix);
    }
    ancestors().fold(Rotor::IDENTITY, |turn, own| local[own].rotation * turn)
}

fn invertible(affine: &DAffine3) -> Option<DAffine3> {
    let determinant = affine.matrix3.determinant();
    (determinant != 0.0 && determinant.is_finite()).then(|| affine.inverse())
}

fn unit_columns(matrix: &DMat3) -> DMat3 {
    let unit = |axis: DVec3| axis.normalize_or_zero();
    DMat3::from_cols(unit(matrix.x_axis), unit(matrix.y_axis), unit(matrix.z_axis))
}

/// The axis of a turn, brought out of a frame: a mirror turns its sense round.
fn axis_through(frame: &DMat3, axis: DVec3) -> DVec3 {
    unit_columns(frame) * axis * frame.determinant().signum()
}

/// The axis of a turn, brought into a frame.
fn axis_into(frame: &DMat3, axis: DVec3) -> DVec3 {
    unit_columns(frame).transpose() * axis * frame.determinant().signum()
}

/// A turn as it is seen from within a frame: `frame⁻¹ · turn · frame`.
fn seen_from(frame: &DMat3, turn: Rotor) -> Rotor {
    Rotor::from_parts(turn.s, Bivector::from_axis(axis_into(frame, turn.bivector().axis()))).normalize()
}

/// The distance from root to end that is taken for a wanted one. Up to `ease_from` of the full length, or as far as the limb is
/// stretched already, it is the wanted one; beyond, it comes near the full length and never reaches it.
fn reachable(wanted: f64, own: f64, [upper, lower]: [f64; 2], ease_from: f64) -> f64 {
    let full = upper + lower;
    let soft = (ease_from * full).max(own).min(full);
    eased(wanted, soft, full).max((upper - lower).abs())
}

/// A length that is left as it is up to `soft` and beyond comes near `full` and never reaches it, without a corner:
/// `soft + (full − soft)·tanh((wanted − soft)/(full − soft))`.
pub fn eased(wanted: f64, soft: f64, full: f64) -> f64 {
    if wanted <= soft {
        wanted
    } else if soft < full {
        soft + (full - soft) * ((wanted - soft) / (full - soft)).tanh()
    } else {
        full
    }
}

/// Where the middle joint stands: how far along the line from root to end, and how far beside it. Law of cosines; the height by
/// Heron's product, which keeps its digits when the limb is almost straight.
fn triangle([upper, lower]: [f64; 2], distance: f64) -> (f64, f64) {
    if distance <= 0.0 {
        return (0.0, upper);
    }
    let along = (upper * upper - lower * lower + distance * distance) / (2.0 * distance);
    let product = (upper + lower - distance)
        * (upper + lower + distance)
        * (distance - upper + lower)
        * (distance + upper - lower);
    (along, product.max(0.0).sqrt() / (2.0 * distance))
}

/// The direction in which the middle joint stands beside the new line `to` from root to end; unit.
///
/// It is the own side of the limb, carried along by `arc`. What a nearly straight limb is bent by in addition goes to the side of the
/// hinge, the more the straighter it was, so that noise in its plane is not made larger.
fn bending_side(
    arc: Rotor,
    own_side: DVec3,
    hinge: Option<DVec3>,
    to: DVec3,
    aside: f64,
    [upper, lower]: [f64; 2],
    is_trusted: bool,
) -> DVec3 {
    let across = |v: DVec3| (v - to * v.dot(to)).try_normalize();
    let own_aside = own_side.length();
    let bend = own_aside * (upper + lower) / (upper * lower);
    let own = (own_aside > NO_PLANE * (upper + lower)).then(|| across(arc.apply(own_side))).flatten();
    // A positive turn about the hinge takes the end to hinge × to, and so the middle joint to the other side.
    let by_hinge = hinge.and_then(|axis| across(to.cross(arc.apply(axis))));
    match (own, by_hinge) {
        (Some(own), Some(by_hinge)) if is_trusted && bend < SURE_BEND && aside > own_aside => {
            // An overstretched limb bends back through straight, and not on the wrong way.
            let agreeing = 0.5 + 0.5 * own.dot(by_hinge);
            let sure = smooth_step(bend / SURE_BEND) * smooth_step(agreeing);
            let share = smooth_step(((aside - own_aside) / (2.0 * own_aside)).min(1.0));
            // It swings round the line from root to end, always the same way where that is half round: nothing jumps in between.
            let angle = to.dot(own.cross(by_hinge)).atan2(own.dot(by_hinge));
            let angle = if angle < -HALF_ROUND { angle + std::f64::consts::TAU } else { angle };
            let swing = Bivector::from_axis(to * (angle * (1.0 - sure) * share));
            Rotor::from_plane_angles(swing).apply(own)
        }
        (Some(own), _) => own,
        (None, Some(by_hinge)) => by_hinge,
        (None, None) => to.any_orthonormal_vector(),
    }
}

#[cfg(test)]
mod tests {
    use super::super::{Joint, JointKind};
    use super::*;

    fn joint(name: &str, number: usize, parent: Option<usize>, offset: DVec3) -> Joint {
        Joint {
            name: name.to_owned(),
            number,
            parent,
            rest: Transform::from_translation(offset),
            kind: JointKind::Joint,
            tips: vec![],
        }
    }

    /// Hip, knee and ankle at these places in the scene, all turns none.
    fn leg(places: [DVec3; 3]) -> Skeleton {
        let offsets = [places[0], places[1] - places[0], places[2] - places[1]];
        let joints = (0..3).map(|i| joint(["hip", "knee", "ankle"][i], i, i.checked_sub(1), offsets[i]));
        Skeleton::new(joints.collect()).unwrap()
    }

    fn limb(skeleton: &Skeleton) -> TwoJointLimb {
        TwoJointLimb::new(skeleton, 0, 1, 2).unwrap()
    }

    fn bent(
        skeleton: &Skeleton,
        limb: &TwoJointLimb,
        local: &[Transform],
        reach: &Reach,
    ) -> (Vec<Transform>, LimbBend) {
        let bend = limb.bend(skeleton, local, reach).unwrap();
        let mut pose = local.to_vec();
        bend.put_into(limb, &mut pose);
        (pose, bend)
    }

    /// `reference/method_checks.json`, `two_bone_ik`.
    #[test]
    fn the_worked_example_of_the_methods_page() {
        let places = [DVec3::new(0.0, 0.92, 0.0), DVec3::new(0.02, 0.49, 0.05), DVec3::new(0.0, 0.07, -0.03)];
        let skeleton = leg(places);
        let target = DVec3::new(0.05, 0.15, 0.2);
        let (pose, bend) = bent(&skeleton, &limb(&skeleton), &skeleton.rest_pose(), &Reach::to(target));
        let [hip, knee, ankle] = limb(&skeleton).points(&skeleton, &pose);
        assert!(
            knee.distance(DVec3::new(0.071_569_851_847, 0.574_369_670_746, 0.251_430_769_411)) < 1e-9,
            "{knee}"
        );
        assert!(ankle.distance(target) < 1e-12 && bend.miss < 1e-12);
        let interior = (hip - knee).angle_between(ankle - knee).to_degrees();
        assert!((interior - 135.456_920_646_588_6).abs() < 1e-9, "{interior}");
        assert!(((hip - knee).length() - (places[0] - places[1]).length()).abs() < 1e-15);
        // The foot keeps its turn in the scene.
        assert!(skeleton.world(&pose)[2].rotation.turn() < 1e-12);
    }

    #[test]
    fn a_limb_below_carriers_scales_and_mirrors_comes_to_its_point() {
        let offsets = [
            DVec3::new(1.0, 2.0, 3.0),
            DVec3::new(0.1, 0.9, 0.2),
            DVec3::new(0.02, -0.2, 0.03),
            DVec3::new(0.01, -0.25, 0.05),
            DVec3::new(0.0, -0.2, -0.04),
            DVec3::new(0.0, -0.21, -0.02),
        ];
        let names = ["carrier", "hip", "helper", "knee", "between", "ankle"];
        let joints = (0..6).map(|i| joint(names[i], i, i.checked_sub(1), offsets[i]));
        let skeleton = Skeleton::new(joints.collect()).unwrap();
        let limb = TwoJointLimb::new(&skeleton, 1, 3, 5).unwrap();
        let turn = |a: f64, b: f64, c: f64| Rotor::from_plane_angles(Bivector::new(a, b, c));
        for scales in [
            [DVec3::ONE, DVec3::ONE, DVec3::ONE],
            [DVec3::splat(100.0), DVec3::splat(0.5), DVec3::splat(2.0)],
            [DVec3::new(-1.0, 1.0, 1.0), DVec3::ONE, DVec3::ONE],
            [DVec3::new(3.0, 0.5, 1.0), DVec3::ONE, DVec3::splat(1.5)],
            [DVec3::ONE, DVec3::splat(-1.0), DVec3::splat(2.0)],
        ] {
            let mut local = skeleton.rest_pose();
            for (i, own) in local.iter_mut().enumerate() {
                let i = i as f64;
                own.rotation = turn(0.3 * (i + 1.0).sin(), 0.4 * i.cos(), 0.2 * (3.0 * i).sin());
            }
            local[0].scale = scales[0];
            local[2].scale = scales[1];
            local[4].scale = scales[2];
            let [hip, knee, ankle] = limb.points(&skeleton, &local);
            let length = hip.distance(knee) + knee.distance(ankle);
            let before = skeleton.world(&local);
            let even = scales[0].x.abs() == scales[0].y;
            for shift in [DVec3::new(0.1, 0.12, 0.05), DVec3::new(-0.2, 0.1, 0.1), DVec3::new(0.0, 0.3, -0.2)]
            {
                let scale = if even { length } else { 0.3 * length };
                let target = hip.lerp(ankle, 0.8) + shift * (0.5 * scale);
                let (pose, bend) =
                    bent(&skeleton, &limb, &local, &Reach { ease_from: 1.0, ..Reach::to(target) });
                let after = skeleton.world(&pose);
                assert!(after[5].position().distance(target) < 1e-9 * length, "{scales:?}: {}", bend.miss);
                assert!(bend.miss < 1e-9 * length);
                if even {
                    let apart = after[5].rotation.turn_to(before[5].rotation);
                    assert!(apart < 1e-9, "{scales:?}: the end turned by {apart}");
                    let wanted = turn(0.5, -0.2, 1.0);
                    let to = Reach { end_turn: EndTurn::To(wanted), ease_from: 1.0, ..Reach::to(target) };
                    let (pose, _) = bent(&skeleton, &limb, &local, &to);
                    assert!(skeleton.world(&pose)[5].rotation.turn_to(wanted) < 1e-9, "{scales:?}");
                }
            }
            // Nothing to do: nothing is done.
            let (pose, _) = bent(&skeleton, &limb, &local, &Reach::to(ankle));
            for (a, b) in pose.iter().zip(&local) {
                assert!(a.rotation.turn_to(b.rotation) < 1e-8, "{scales:?}");
            }
        }
    }

    #[test]
    fn near_full_stretch_the_knee_gives_way_softly_and_stays_on_its_side() {
        let places = [DVec3::new(0.0, 0.9, 0.0), DVec3::new(0.0, 0.47, 0.08), DVec3::new(0.0, 0.08, 0.0)];
        let skeleton = leg(places);
        let limb = limb(&skeleton);
        let local = skeleton.rest_pose();
        let length = (places[0] - places[1]).length() + (places[1] - places[2]).length();
        let mut before: Option<f64> = None;
        for step in 0..800 {
            let target = places[0] - DVec3::Y * length * (0.5 + 0.001 * f64::from(step));
            let (pose, bend) = bent(&skeleton, &limb, &local, &Reach::to(target));
            let [hip, knee, ankle] = limb.points(&skeleton, &pose);
            assert!(knee.z > 0.0, "the knee stays in front at {step}");
            let angle = std::f64::consts::PI - (hip - knee).angle_between(ankle - knee);
            if let Some(before) = before {
                assert!((before - angle).abs() < 2.0_f64.to_radians(), "step {step}: {before} to {angle}");
            }
            before = Some(angle);
            let eased = 0.97_f64.max((places[0] - places[2]).length() / length);
            assert_eq!(bend.miss < 1e-9, 0.5 + 0.001 * f64::from(step) <= eased + 1e-12, "step {step}");
        }
    }

    #[test]
    fn a_straight_limb_bends_about_the_hinge_that_is_given() {
        let places = [DVec3::new(0.0, 0.9, 0.0), DVec3::new(0.0, 0.5, 0.0), DVec3::new(0.0, 0.1, 0.0)];
        let skeleton = leg(places);
        let limb = limb(&skeleton);
        for (hinge, forward) in [(DVec3::X, DVec3::Z), (DVec3::Z, -DVec3::X), (-DVec3::X, -DVec3::Z)] {
            let reach = Reach { hinge: Some(hinge), ..Reach::to(DVec3::new(0.0, 0.3, 0.0)) };
            let (pose, bend) = bent(&skeleton, &limb, &skeleton.rest_pose(), &reach);
            let [_, knee, _] = limb.points(&skeleton, &pose);
            assert!(bend.miss < 1e-12);
            // The lower joint turns about its hinge by a positive angle, and nothing else.
            let angles = bend.lower.plane_angles().axis();
            assert!(angles.cross(hinge).length() < 1e-9 && angles.dot(hinge) > 0.5, "{hinge}: {angles}");
            assert!((knee - places[1]).dot(forward) > 0.1, "{hinge}: {knee}");
        }
    }

    #[test]
    fn what_has_no_length_or_no_place_is_no_limb() {
        let skeleton = leg([DVec3::Y, DVec3::Y, DVec3::ZERO]);
        let limb = limb(&skeleton);
        assert_eq!(limb.bend(&skeleton, &skeleton.rest_pose(), &Reach::to(DVec3::X)), None);
        let skeleton = leg([DVec3::Y, DVec3::X, DVec3::ZERO]);
        assert_eq!(limb.bend(&skeleton, &skeleton.rest_pose(), &Reach::to(DVec3::NAN)), None);
        assert_eq!(TwoJointLimb::new(&skeleton, 1, 0, 2), None);
        assert_eq!(TwoJointLimb::new(&skeleton, 0, 1, 3), None);
    }
}

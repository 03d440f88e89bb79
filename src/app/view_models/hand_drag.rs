//! A drag of a handle: from pixels to turns. Counted from the press on, so that no step of the way is lost or added.

use std::f64::consts::{PI, TAU};
use std::sync::Arc;

use glam::{DVec2, DVec3};

use crate::clip::{Clip, PushFrame};
use crate::raster::{Lens, Ray, View};
use crate::rotor::{Bivector, Rotor};
use crate::scene::ClipWork;
use crate::skeleton::{EASE_FROM, LocalPose, Reach, WorldJoint};

use super::super::session::{Disc, TurnPlanes};
use super::hand_turns::{HandTurn, HandTurns, turn_now};
use super::handles::{DiscHandle, Handles, TipHandle, parent_in_world, plane_of};

/// With the key for fine work held, the pointer counts this much.
pub const FINE: f64 = 0.2;

/// A disc seen flatter than this (the sine of the angle to the line of sight, 12°) is turned by moving along it: a place in
/// its plane could not be told any more.
const EDGE_ON: f64 = 0.208;

/// What a disc has swept: to be drawn as a filled sector.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Swept {
    /// Center, plane and radius.
    pub handle: DiscHandle,
    /// The old direction, radians from the handle's `u`.
    pub from_rad: f64,
    /// The new direction; more than a whole turn is allowed.
    pub to_rad: f64,
}

/// A handle that is held.
#[derive(Clone, Debug)]
pub struct Drag {
    /// The joint.
    pub joint: usize,
    /// The result on which the drag began.
    pub base: Arc<Clip>,
    /// The moment that is changed, seconds.
    pub at_secs: f64,
    view: View,
    /// Where the pointer would be if fine mode did not hold it back.
    pixel: DVec2,
    local: LocalPose,
    world: Vec<WorldJoint>,
    held: Held,
}

#[derive(Clone, Debug)]
enum Held {
    Disc {
        handle: DiscHandle,
        frame: PushFrame,
        plane: Bivector,
        way: Way,
        /// Angle at the press and all that came since, radians.
        start_rad: f64,
        total_rad: f64,
    },
    Free {
        handle: DiscHandle,
        from: DVec3,
    },
    Tip {
        tip: TipHandle,
        /// Where the pointer took hold in the plane through the tip, world.
        hold: DVec3,
        depth: f64,
    },
}

/// How pixels become an angle.
#[derive(Clone, Copy, Debug)]
enum Way {
    /// By the place in the disc's plane under the pointer, whose angle was this last.
    Around { last_rad: f64 },
    /// Along this line of the picture, radians for each pixel.
    Along { rad_per_px: DVec2 },
}

impl Drag {
    /// Takes hold of a disc at a pixel. `None` when the joint is not there.
    pub fn of_disc(
        base: &Arc<Clip>,
        at_secs: f64,
        handle: &DiscHandle,
        joint: usize,
        planes: TurnPlanes,
        view: View,
        pixel: DVec2,
    ) -> Option<Self> {
        let held = match plane_of(base, joint, handle.disc, planes) {
            None => Held::Free { handle: *handle, from: on_sphere(&view.ray(pixel), handle)? },
            Some((frame, plane)) => {
                let (way, start_rad) = way_of(handle, &view, pixel)?;
                Held::Disc { handle: *handle, frame, plane, way, start_rad, total_rad: 0.0 }
            }
        };
        Self::new(base, at_secs, joint, view, pixel, held)
    }

    /// Takes hold of a tip at a pixel.
    pub fn of_tip(base: &Arc<Clip>, at_secs: f64, tip: &TipHandle, view: View, pixel: DVec2) -> Option<Self> {
        let depth = view.project(tip.at)?.depth;
        let held = Held::Tip { tip: *tip, hold: view.unproject(pixel, depth), depth };
        Self::new(base, at_secs, tip.joint, view, pixel, held)
    }

    fn new(
        base: &Arc<Clip>,
        at_secs: f64,
        joint: usize,
        view: View,
        pixel: DVec2,
        held: Held,
    ) -> Option<Self> {
        if joint >= base.skeleton.len() {
            return None;
        }
        let local = base.local_at(at_secs);
        let world = base.skeleton.world(&local);
        Some(Self { joint, base: Arc::clone(base), at_secs, view, pixel, local, world, held })
    }

    /// The pointer has moved by so many pixels. `factor` is 1, or [`FINE`].
    pub fn move_by(&mut self, delta_px: DVec2, factor: f64) {
        let delta = delta_px * factor;
        self.pixel += delta;
        let Held::Disc { handle, way, total_rad, .. } = &mut self.held else { return };
        match way {
            Way::Along { rad_per_px } => *total_rad += delta.dot(*rad_per_px),
            Way::Around { last_rad } => {
                let Some(now) = angle_under(handle, &self.view.ray(self.pixel)) else { return };
                // The nearest of all angles that look the same: so the turn counts on over whole turns.
                let step = (now - *last_rad + PI).rem_euclid(TAU) - PI;
                *total_rad += step;
                *last_rad = now;
            }
        }
    }

    /// The disc that is held; `None` for a tip.
    pub fn disc(&self) -> Option<Disc> {
        match &self.held {
            Held::Disc { handle, .. } | Held::Free { handle, .. } => Some(handle.disc),
            Held::Tip { .. } => None,
        }
    }

    /// The turned sector, in steps of `snap_rad` where given.
    pub fn swept(&self, snap_rad: Option<f64>) -> Option<Swept> {
        match &self.held {
            Held::Disc { handle, start_rad, total_rad, .. } => {
                let to_rad = start_rad + snapped(*total_rad, snap_rad);
                Some(Swept { handle: *handle, from_rad: *start_rad, to_rad })
            }
            Held::Free { handle, from } => {
                let (axis, angle) = self.free_turn(handle, *from, snap_rad);
                let handle = DiscHandle { u: *from, v: axis.cross(*from), ..*handle };
                Some(Swept { handle, from_rad: 0.0, to_rad: angle })
            }
            Held::Tip { .. } => None,
        }
    }

    /// The axis (unit, world) and the angle of a free turn.
    fn free_turn(&self, handle: &DiscHandle, from: DVec3, snap_rad: Option<f64>) -> (DVec3, f64) {
        let to = on_sphere(&self.view.ray(self.pixel), handle).unwrap_or(from);
        let axis = from.cross(to);
        let angle = axis.length().atan2(from.dot(to));
        let axis = axis.try_normalize().unwrap_or_else(|| from.any_orthonormal_vector());
        (axis, snapped(angle, snap_rad))
    }

    /// What the drag comes to so far; `None` while it comes to nothing.
    pub fn turns(&self, snap_rad: Option<f64>) -> Option<HandTurns> {
        let skeleton = &self.base.skeleton;
        let name = skeleton.label(self.joint);
        let before = self.local[self.joint].rotation;
        let above = parent_in_world(skeleton, &self.world, self.joint);
        let (label, turns) = match &self.held {
            Held::Disc { handle, frame, plane, total_rad, .. } => {
                let angle = snapped(*total_rad, snap_rad);
                let turn = HandTurn::new(self.joint, before, *frame, *plane * angle, above);
                (turn_label(name, handle.disc, angle), vec![turn])
            }
            Held::Free { handle, from } => {
                let (axis, angle) = self.free_turn(handle, *from, snap_rad);
                let plane = Bivector::from_axis(above.reverse().apply(axis));
                let turn = HandTurn::new(self.joint, before, PushFrame::Parent, plane * angle, above);
                (turn_label(name, Disc::Free, angle), vec![turn])
            }
            Held::Tip { tip, hold, depth } => {
                let target = tip.at + (self.view.unproject(self.pixel, *depth) - *hold);
                if tip.limb.is_some() {
                    (format!("Bend {name} to a point"), self.bent(tip, target)?)
                } else {
                    let joint = self.world[self.joint].position();
                    let [from, to] = [tip.at, target].map(|end| (end - joint).try_normalize());
                    let turn = Rotor::between(from?, to?);
                    let after = (above.reverse() * turn * above * before).normalize();
                    (format!("Point {name}"), vec![HandTurn::between(self.joint, before, after)])
                }
            }
        };
        let turns: Vec<HandTurn> = turns.into_iter().filter(|turn| turn.turn.length() > 1e-9).collect();
        (!turns.is_empty()).then_some(HandTurns { label, at_secs: self.at_secs, turns })
    }

    /// The joints of a two-joint limb whose tip comes to a point.
    fn bent(&self, tip: &TipHandle, target: DVec3) -> Option<Vec<HandTurn>> {
        let limb = tip.limb.as_ref()?;
        let reach = Reach { target, end_turn: tip.end_turn, hinge: None, ease_from: EASE_FROM };
        let bend = limb.bend(&self.base.skeleton, &self.local, &reach)?;
        let mut afters = vec![(limb.upper, bend.upper), (limb.lower, bend.lower)];
        afters.extend(bend.end.map(|end| (limb.end, end)));
        let turn = |(joint, after): (usize, Rotor)| {
            HandTurn::between(joint, self.local[joint].rotation, after.aligned_to(self.local[joint].rotation))
        };
        Some(afters.into_iter().map(turn).collect())
    }
}

fn snapped(angle_rad: f64, snap_rad: Option<f64>) -> f64 {
    match snap_rad {
        Some(snap) if snap > 0.0 => (angle_rad / snap).round() * snap,
        _ => angle_rad,
    }
}

/// What the history calls a turn with a disc.
fn turn_label(name: &str, disc: Disc, angle_rad: f64) -> String {
    let degrees = angle_rad.to_degrees();
    let digits = usize::from((degrees - degrees.round()).abs() >= 0.005);
    format!("Turn {name} by {degrees:+.digits$}° {}", disc.words())
}

/// How a disc is turned from a pixel on, and the angle there, radians from its `u`.
fn way_of(handle: &DiscHandle, view: &View, pixel: DVec2) -> Option<(Way, f64)> {
    let sight = match view.lens {
        Lens::Perspective => (handle.center - view.eye).try_normalize()?,
        Lens::Orthographic => -view.back,
    };
    let axis = handle.axis();
    if axis.dot(sight).abs() > EDGE_ON
        && let Some(angle) = angle_under(handle, &view.ray(pixel))
    {
        return Some((Way::Around { last_rad: angle }, angle));
    }
    // The rim's nearest point moves this way through the picture when the disc turns.
    let near = (-sight - axis * axis.dot(-sight)).try_normalize()?;
    let way = axis.cross(near);
    let in_picture = DVec2::new(way.dot(view.right), -way.dot(view.up));
    let px_per_unit = view.project(handle.center)?.px_per_unit;
    let rad_per_px = in_picture.try_normalize()? / (handle.radius * px_per_unit);
    Some((Way::Along { rad_per_px }, f64::atan2(near.dot(handle.v), near.dot(handle.u))))
}

/// The angle (radians from `u`, −π..=π) of the place in a disc's plane that a ray meets.
fn angle_under(handle: &DiscHandle, ray: &Ray) -> Option<f64> {
    let met = ray.meet_plane(handle.center, handle.axis())? - handle.center;
    Some(met.dot(handle.v).atan2(met.dot(handle.u)))
}

/// The direction from a disc's center to the point of its sphere under a ray; beside the sphere, to the nearest point of its
/// outline. A direction follows the pointer over the sphere as in Shoemake 1992, "Arcball", but at the pointer's own pace.
fn on_sphere(ray: &Ray, handle: &DiscHandle) -> Option<DVec3> {
    let nearest = ray.nearest_to(handle.center);
    let out = nearest - handle.center;
    let depth = (handle.radius * handle.radius - out.length_squared()).max(0.0).sqrt();
    (out - ray.direction * depth).try_normalize()
}

/// A joint turned with a disc by an angle, as keys do it; `None` for the free disc or a joint that is not there.
pub fn step_turn(
    work: &ClipWork,
    result: &Clip,
    joint: usize,
    at_secs: f64,
    disc: Disc,
    planes: TurnPlanes,
    angle_rad: f64,
) -> Option<HandTurns> {
    if joint >= result.skeleton.len() {
        return None;
    }
    let (frame, plane) = plane_of(result, joint, disc, planes)?;
    let above = parent_in_world(&result.skeleton, &result.world_at(at_secs), joint);
    let before = turn_now(work, result, joint, at_secs);
    let turn = HandTurn::new(joint, before, frame, plane * angle_rad, above);
    let label = turn_label(result.skeleton.label(joint), disc, angle_rad);
    Some(HandTurns { label, at_secs, turns: vec![turn] })
}

impl Handles {
    /// The disc of that kind.
    pub fn disc(&self, disc: Disc) -> Option<&DiscHandle> {
        self.discs.iter().find(|own| own.disc == disc)
    }
}

#[cfg(test)]
mod tests {
    use std::f64::consts::FRAC_PI_2;

    use super::*;
    use crate::clip::{FrameGrid, JointTracks, RotationTrack};
    use crate::raster::{Camera, StraightView};
    use crate::rotor::Axis;
    use crate::skeleton::{EndTurn, Joint, JointKind, Skeleton, Transform, TwoJointLimb};

    /// A shoulder that turns, an arm along x, a forearm bent a little, and a hand.
    fn clip() -> Arc<Clip> {
        let joint = |number: usize, rotation: Rotor| Joint {
            name: ["shoulder", "arm", "forearm", "hand"][number].to_owned(),
            number,
            parent: number.checked_sub(1),
            rest: Transform {
                translation: if number == 0 { DVec3::ZERO } else { DVec3::X },
                rotation,
                ..Transform::IDENTITY
            },
            kind: JointKind::Joint,
            tips: if number == 3 { vec![DVec3::X * 0.3] } else { vec![] },
        };
        let rests = [Rotor::IDENTITY, Axis::Y.rotor(0.4), Axis::Z.rotor(0.6), Rotor::IDENTITY];
        let joints = rests.into_iter().enumerate().map(|(number, rest)| joint(number, rest)).collect();
        let grid = FrameGrid::even(30.0, 2.0);
        let track = |turn: Rotor| {
            let keys = vec![turn; grid.count()];
            let rotation = Some(RotationTrack::from_rotors(grid.times.clone(), keys));
            Arc::new(JointTracks { rotation, ..JointTracks::default() })
        };
        let turns = [Axis::X.rotor(0.7), Axis::Y.rotor(0.4), Axis::Z.rotor(0.6), Axis::X.rotor(0.2)];
        Arc::new(Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new(joints).unwrap()),
            joints: turns.map(track).to_vec(),
            grid,
            duration_secs: 2.0,
        })
    }

    /// Parallel, 4 from the middle: 300 pixels high with an angle of view of 0.6 rad are 150 / tan 0.3 / 4 = 121.23 pixels to a unit.
    fn view(straight: StraightView) -> View {
        let mut camera = Camera { target: DVec3::ZERO, lens: Lens::Orthographic, ..Camera::default() };
        camera.look_straight(straight);
        camera.view(400, 300)
    }
    const PX: f64 = 121.23;
    const MIDDLE: DVec2 = DVec2::new(200.0, 150.0);

    fn handle(disc: Disc) -> DiscHandle {
        let (u, v) = match disc {
            Disc::Yz => (DVec3::Y, DVec3::Z),
            Disc::Zx => (DVec3::Z, DVec3::X),
            _ => (DVec3::X, DVec3::Y),
        };
        DiscHandle { disc, center: DVec3::ZERO, u, v, radius: 0.5, grip_rad: 0.0 }
    }

    /// A drag in the scene's planes, from pixel to pixel.
    fn dragged(straight: StraightView, handle: &DiscHandle, way: &[DVec2]) -> Drag {
        let mut drag =
            Drag::of_disc(&clip(), 1.0, handle, 1, TurnPlanes::World, view(straight), way[0]).unwrap();
        for step in way.windows(2) {
            drag.move_by(step[1] - step[0], 1.0);
        }
        drag
    }

    /// A pixel at an angle counter-clockwise from the right, in degrees, on the rim of a disc of radius 0.5 seen squarely.
    fn rim(degrees: f64) -> DVec2 {
        let (sin, cos) = degrees.to_radians().sin_cos();
        MIDDLE + DVec2::new(cos, -sin) * 0.5 * PX
    }

    #[track_caller]
    fn check_turn(drag: &Drag, expected_deg: [f64; 3]) {
        let turns = drag.turns(None).unwrap();
        let found = turns.turns[0].turn.to_degrees();
        for (found, expected) in found.into_iter().zip(expected_deg) {
            assert!((found - expected).abs() < 0.02, "{found} {expected}: {}", turns.label);
        }
    }

    #[test]
    fn a_quarter_of_a_disc_seen_squarely_is_90_degrees_the_way_its_letters_say() {
        // From the front x is right and y up: from right to top is x to y, +90° in xy (design, section 4).
        let way = [rim(0.0), rim(30.0), rim(60.0), rim(90.0)];
        check_turn(&dragged(StraightView::Xy, &handle(Disc::Xy), &way), [0.0, 0.0, 90.0]);
        // From +x y is up and z to the left: from top to left is y to z.
        let way = [rim(90.0), rim(130.0), rim(180.0)];
        check_turn(&dragged(StraightView::Yz, &handle(Disc::Yz), &way), [90.0, 0.0, 0.0]);
        // From above x is right and z down: from below to right is z to x.
        let way = [rim(-90.0), rim(-40.0), rim(0.0)];
        check_turn(&dragged(StraightView::Zx, &handle(Disc::Zx), &way), [0.0, 90.0, 0.0]);
        // From behind the same way round is the other way.
        let way = [rim(0.0), rim(30.0), rim(60.0), rim(90.0)];
        check_turn(&dragged(StraightView::XyBack, &handle(Disc::Xy), &way), [0.0, 0.0, -90.0]);
    }

    #[test]
    fn turns_count_on_over_whole_turns_and_back() {
        let way: Vec<DVec2> = (0..=24).map(|i| rim(f64::from(i) * 22.5)).collect();
        check_turn(&dragged(StraightView::Xy, &handle(Disc::Xy), &way), [0.0, 0.0, 540.0]);
        let back: Vec<DVec2> = (0..=24).map(|i| rim(f64::from(i) * -22.5)).collect();
        check_turn(&dragged(StraightView::Xy, &handle(Disc::Xy), &back), [0.0, 0.0, -540.0]);
    }

    #[test]
    fn a_disc_seen_edge_on_turns_by_the_way_along_it() {
        // From the front plane zx is a level line; its nearest point is at +z and goes to +x, the right. A way of one radius
        // (0.5 · 121.23 px) is an angle of 1 rad = 57.296°; a way square to it is none.
        let way = [MIDDLE, MIDDLE + DVec2::new(0.5 * PX, 40.0)];
        check_turn(&dragged(StraightView::Xy, &handle(Disc::Zx), &way), [0.0, 57.296, 0.0]);
    }

    #[test]
    fn fine_work_counts_a_fifth_and_snapping_goes_by_steps() {
        let mut drag = dragged(StraightView::Xy, &handle(Disc::Zx), &[MIDDLE]);
        drag.move_by(DVec2::new(0.5 * PX, 0.0), FINE);
        check_turn(&drag, [0.0, 11.459, 0.0]);
        let snapped = drag.turns(Some(5_f64.to_radians())).unwrap();
        assert!((snapped.turns[0].turn.zx.to_degrees() - 10.0).abs() < 1e-9);
        assert_eq!(snapped.label, "Turn arm by +10° in plane zx");
        let swept = drag.swept(Some(5_f64.to_radians())).unwrap();
        assert!((swept.to_rad - swept.from_rad - 10_f64.to_radians()).abs() < 1e-9);
        assert!(dragged(StraightView::Xy, &handle(Disc::Zx), &[MIDDLE]).turns(None).is_none());
    }

    #[test]
    fn a_free_turn_follows_the_pointer_over_the_sphere() {
        // From the silhouette at the right to the middle: from +x to the eye at +z, 90° about x × z = −y.
        let free = DiscHandle { disc: Disc::Free, ..handle(Disc::Xy) };
        let drag = dragged(StraightView::Xy, &free, &[rim(0.0), MIDDLE]);
        let base = clip();
        let turn = drag.turns(None).unwrap().turns[0];
        let above = base.world_at(1.0)[0].rotation;
        let in_scene = above.apply(turn.turn.axis());
        assert!((in_scene - DVec3::NEG_Y * FRAC_PI_2).length() < 1e-3, "{in_scene}");
        let swept = drag.swept(None).unwrap();
        assert!(swept.handle.rim(swept.to_rad).distance(DVec3::Z * 0.5) < 1e-3);
    }

    #[test]
    fn planes_of_scene_parent_rest_and_limb_turn_the_joint_in_just_these() {
        let base = clip();
        let work = ClipWork::new(0, 0, "");
        let world = |turn: Option<Rotor>| {
            let mut local = base.local_at(1.0);
            local[1].rotation = turn.unwrap_or(local[1].rotation);
            base.skeleton.world(&local)
        };
        let turned = |disc, planes| {
            let turns = step_turn(&work, &base, 1, 1.0, disc, planes, 0.5).unwrap();
            let after = turns.turns[0].after;
            (world(Some(after))[1].rotation * world(None)[1].rotation.reverse()).plane_angles().axis()
        };
        let above = world(None)[0].rotation;
        let rest = above * Axis::Y.rotor(0.4);
        let limb = world(None)[1].rotation.apply(DVec3::X);
        for (planes, frame) in
            [(TurnPlanes::World, Rotor::IDENTITY), (TurnPlanes::Parent, above), (TurnPlanes::Rest, rest)]
        {
            for (disc, axis) in [(Disc::Yz, DVec3::X), (Disc::Zx, DVec3::Y), (Disc::Xy, DVec3::Z)] {
                let (found, expected) = (turned(disc, planes), frame.apply(axis) * 0.5);
                assert!(found.distance(expected) < 1e-9, "{planes:?} {disc:?}: {found} {expected}");
            }
            assert!(turned(Disc::Twist, planes).distance(limb * 0.5) < 1e-9);
            assert!(step_turn(&work, &base, 1, 1.0, Disc::Free, planes, 0.5).is_none());
        }
    }

    #[test]
    fn a_tip_goes_where_the_pointer_does_and_the_limb_keeps_its_plane() {
        let base = clip();
        let limb = TwoJointLimb::new(&base.skeleton, 1, 2, 3).unwrap();
        let before = limb.points(&base.skeleton, &base.local_at(1.0));
        let tip = TipHandle { joint: 2, at: before[2], limb: Some(limb), end_turn: EndTurn::Carried };
        let view = view(StraightView::Xy);
        let press = view.project(tip.at).unwrap().pixel + DVec2::new(3.0, -2.0);
        let mut drag = Drag::of_tip(&base, 1.0, &tip, view, press).unwrap();
        drag.move_by(DVec2::new(-0.3 * PX, -0.2 * PX), 1.0);
        let turns = drag.turns(None).unwrap();
        assert_eq!(turns.label, "Bend forearm to a point");
        let mut local = base.local_at(1.0);
        for turn in &turns.turns {
            local[turn.joint].rotation = turn.after;
        }
        let after = limb.points(&base.skeleton, &local);
        let wanted = before[2] + DVec3::new(-0.3, 0.2, 0.0);
        assert!(after[2].distance(wanted) < 1e-4, "{} {wanted}", after[2]);
        // The plane through the three points is the old one turned as the line from root to end turned.
        let normal = |points: [DVec3; 3]| (points[1] - points[0]).cross(points[2] - points[1]).normalize();
        let arc = Rotor::between((before[2] - before[0]).normalize(), (after[2] - after[0]).normalize());
        assert!(normal(after).distance(arc.apply(normal(before))) < 1e-9);
        // A joint without such a limb turns alone so that it points there.
        let alone = TipHandle { joint: 3, at: before[2], limb: None, end_turn: EndTurn::Carried };
        let end = base.world_at(1.0)[3].scene_from_joint.transform_point3(DVec3::X * 0.3);
        let mut drag = Drag::of_tip(&base, 1.0, &TipHandle { at: end, ..alone }, view, press).unwrap();
        drag.move_by(DVec2::new(0.0, -0.2 * PX), 1.0);
        let turn = drag.turns(None).unwrap().turns[0];
        let mut local = base.local_at(1.0);
        local[3].rotation = turn.after;
        let world = base.skeleton.world(&local)[3];
        let pointed = world.scene_from_joint.transform_vector3(DVec3::X).normalize();
        let asked = (end + DVec3::Y * 0.2 - world.position()).normalize();
        assert!(pointed.distance(asked) < 1e-5, "{pointed} {asked}");
    }
}

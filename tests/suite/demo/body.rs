//! What the three figures share: bones, poses over time, easing, and limbs bent to a point.

use std::f64::consts::TAU;

use glam::{DMat3, DVec3};
use turnwright::rotor::{Axis, Rotor};

/// One bone of a figure. Its joint stands at `offset` from the parent's; all joint frames are parallel at rest.
pub(super) struct Bone {
    pub(super) name: &'static str,
    pub(super) parent: Option<usize>,
    pub(super) offset: DVec3,
    /// Where a last bone ends.
    pub(super) tip: Option<DVec3>,
}

/// A bone with a joint that others hang on.
pub(super) const fn bone(name: &'static str, parent: usize, offset: [f64; 3]) -> Bone {
    Bone { name, parent: Some(parent), offset: DVec3::from_array(offset), tip: None }
}

/// A bone at the end of a limb.
pub(super) const fn end_bone(name: &'static str, parent: usize, offset: [f64; 3], tip: [f64; 3]) -> Bone {
    Bone { name, parent: Some(parent), offset: DVec3::from_array(offset), tip: Some(DVec3::from_array(tip)) }
}

/// The bone that the others hang on.
pub(super) const fn root_bone(name: &'static str, offset: [f64; 3]) -> Bone {
    Bone { name, parent: None, offset: DVec3::from_array(offset), tip: None }
}

/// One moment: where the root stands, and each bone's turn relative to its parent.
#[derive(Clone)]
pub(super) struct Pose {
    pub(super) root: DVec3,
    pub(super) turns: Vec<Rotor>,
}

/// A figure and its poses at an even rate.
#[derive(Clone)]
pub(super) struct Motion {
    pub(super) bones: &'static [Bone],
    pub(super) rate: f64,
    pub(super) poses: Vec<Pose>,
}

impl Motion {
    /// The index of a bone.
    pub(super) fn bone(&self, name: &str) -> usize {
        self.bones.iter().position(|bone| bone.name == name).unwrap_or_else(|| panic!("no bone {name}"))
    }

    /// A bone's turns, each on the side of the one before it.
    pub(super) fn unrolled(&self, bone: usize) -> Vec<Rotor> {
        let mut last = Rotor::IDENTITY;
        self.poses
            .iter()
            .map(|pose| {
                last = pose.turns[bone].aligned_to(last);
                last
            })
            .collect()
    }
}

/// A pose under construction: turns are set from the root outwards, and the scene follows.
pub(super) struct Builder {
    bones: &'static [Bone],
    pose: Pose,
    world: Vec<(Rotor, DVec3)>,
}

impl Builder {
    pub(super) fn new(bones: &'static [Bone], root: DVec3) -> Self {
        let pose = Pose { root, turns: vec![Rotor::IDENTITY; bones.len()] };
        Self { bones, pose, world: vec![(Rotor::IDENTITY, root); bones.len()] }
    }

    /// Turns a bone relative to its parent; bones must be turned parents first.
    pub(super) fn turn(&mut self, name: &str, rotor: Rotor) {
        let bone = self.index(name);
        let (parent, place) = self.socket(bone);
        self.pose.turns[bone] = rotor;
        self.world[bone] = (parent * rotor, place);
    }

    /// Turns a bone to an orientation in the scene.
    pub(super) fn turn_to(&mut self, name: &str, in_scene: Rotor) {
        let (parent, _) = self.socket(self.index(name));
        self.turn(name, parent.reverse() * in_scene);
    }

    /// A bone's orientation in the scene, once turned.
    pub(super) fn in_scene(&self, name: &str) -> Rotor {
        self.world[self.index(name)].0
    }

    /// Where a bone's joint stands, once its parent is turned.
    pub(super) fn place(&self, name: &str) -> DVec3 {
        self.socket(self.index(name)).1
    }

    /// Bends a leg, a bone hanging down at rest and its child, so that the child ends at `target`, the knee towards
    /// `pole`. The knee's hinge is the bones' own x axis when it opens backwards.
    pub(super) fn bend_leg(&mut self, upper: &str, lower: &str, end: &str, target: DVec3, pole: DVec3) {
        let [first, second, side] = self.limb(upper, lower, end, target, pole);
        for (name, along) in [(upper, first), (lower, second)] {
            let x = -side;
            self.turn_to(name, Rotor::from_matrix(&DMat3::from_cols(x, -along, x.cross(-along))));
        }
    }

    /// Bends an arm or wing, a bone along `sign` x at rest and its child, likewise; its hinge is the own y axis.
    pub(super) fn bend_arm(&mut self, names: [&str; 3], sign: f64, target: DVec3, pole: DVec3) {
        let [upper, lower, end] = names;
        let [first, second, side] = self.limb(upper, lower, end, target, pole);
        for (name, along) in [(upper, first), (lower, second)] {
            let (x, y) = (along * sign, side * sign);
            self.turn_to(name, Rotor::from_matrix(&DMat3::from_cols(x, y, x.cross(y))));
        }
    }

    pub(super) fn finish(self) -> Pose {
        self.pose
    }

    /// Directions of both bones and the normal of the plane they bend in.
    fn limb(&self, upper: &str, lower: &str, end: &str, target: DVec3, pole: DVec3) -> [DVec3; 3] {
        let start = self.place(upper);
        let (a, b) =
            (self.bones[self.index(lower)].offset.length(), self.bones[self.index(end)].offset.length());
        let towards = (target - start).normalize();
        let reach = soft_reach((target - start).length() / (a + b)) * (a + b);
        let bend = (pole - towards * pole.dot(towards)).normalize();
        // Law of cosines for the angle at the start.
        let cosine = ((reach * reach + a * a - b * b) / (2.0 * reach * a)).clamp(-1.0, 1.0);
        let middle = towards * (cosine * a) + bend * ((1.0 - cosine * cosine).sqrt() * a);
        [middle / a, (towards * reach - middle).normalize(), towards.cross(bend)]
    }

    fn socket(&self, bone: usize) -> (Rotor, DVec3) {
        match self.bones[bone].parent {
            None => (Rotor::IDENTITY, self.pose.root),
            Some(parent) => {
                let (turn, place) = self.world[parent];
                (turn, place + turn.apply(self.bones[bone].offset))
            }
        }
    }

    fn index(&self, name: &str) -> usize {
        self.bones.iter().position(|bone| bone.name == name).unwrap_or_else(|| panic!("no bone {name}"))
    }
}

/// A share of the whole length that never quite stretches a limb, and comes to a stop gently.
fn soft_reach(share: f64) -> f64 {
    const FREE: f64 = 0.93;
    const REST: f64 = 0.062;
    if share < FREE { share } else { FREE + REST * (1.0 - (-(share - FREE) / REST).exp()) }
}

/// From 0 at `from` to 1 at `to`, at rest and without acceleration at both ends.
pub(super) fn ease(time: f64, from: f64, to: f64) -> f64 {
    let u = ((time - from) / (to - from)).clamp(0.0, 1.0);
    u * u * u * (10.0 + u * (6.0 * u - 15.0))
}

/// From 0 up to 1 half way between `from` and `to`, and back.
pub(super) fn bump(time: f64, from: f64, to: f64) -> f64 {
    let u = ((time - from) / (to - from)).clamp(0.0, 1.0);
    64.0 * (u * (1.0 - u)).powi(3)
}

/// The sine of `turns` whole turns.
pub(super) fn wave(turns: f64) -> f64 {
    (TAU * turns).sin()
}

/// From `a` to `b`.
pub(super) fn mix(a: f64, b: f64, share: f64) -> f64 {
    a + (b - a) * share
}

/// A turn about x in degrees: y towards z. A figure that faces z nods forward.
pub(super) fn x(degrees: f64) -> Rotor {
    Axis::X.rotor(degrees.to_radians())
}

/// A turn about y in degrees: z towards x. A figure that faces z looks to its left.
pub(super) fn y(degrees: f64) -> Rotor {
    Axis::Y.rotor(degrees.to_radians())
}

/// A turn about z in degrees: x towards y. A figure that faces z lifts its left side.
pub(super) fn z(degrees: f64) -> Rotor {
    Axis::Z.rotor(degrees.to_radians())
}

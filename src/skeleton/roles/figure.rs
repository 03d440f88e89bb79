//! The joints that count for finding roles, with what names and rest positions say of each.

use glam::DVec3;

use super::super::{JointKind, Skeleton, Transform};
use super::copies::copies;
use super::name::Name;
use super::words;
use crate::rotor::Rotor;

/// Joints beyond which nothing is looked for: no figure has as many.
pub(super) const MOST_JOINTS: usize = 4096;

/// Lengths that differ by less than this share are equal: mirrored limbs, seen from any side, must not be told apart by rounding.
pub(super) const ROUNDING: f64 = 1e-9;

/// The cosine of the angle (0.03°) within which axes count as the scene's own: files round.
const SQUARE: f64 = 0.999_999_86;

/// A score as a number that is the same for scores that differ by rounding only.
pub(super) fn rank(score: f64) -> i64 {
    (score / ROUNDING).round() as i64
}

/// The listed joints as a tree of their own; what the names call helpers and ends does not take part, but its places
/// count as tips.
pub(super) struct Figure<'a> {
    pub skeleton: &'a Skeleton,
    /// For each joint, carriers included.
    pub names: Vec<Name>,
    pub position: Vec<DVec3>,
    pub rotation: Vec<Rotor>,
    /// Whether the joint takes part.
    pub is_active: Vec<bool>,
    /// The joint that it is a copy of, with another skin; copies take no part.
    pub copy_of: Vec<Option<usize>>,
    /// Active children, those behind carriers too.
    pub kids: Vec<Vec<usize>>,
    /// Nearest active ancestor.
    pub parent: Vec<Option<usize>>,
    /// Ends that hang on the joint itself, in the scene.
    pub tips: Vec<Vec<DVec3>>,
    /// Length of the longest way down to a tip.
    pub reach: Vec<f64>,
    /// That tip.
    pub far: Vec<DVec3>,
    /// Active joints in the subtree, itself included.
    pub size: Vec<usize>,
    /// Whether names help: at least five joints name a part.
    pub is_named: bool,
    /// The turn of what the figure hangs under, where that is askew to the scene's axes: the axes that up is looked for among turn with it.
    pub frame: Rotor,
    /// Largest distance of two ends along an axis; the measure of what is small.
    pub extent: f64,
}

impl<'a> Figure<'a> {
    /// `below`: only joints from this one down take part.
    pub(super) fn new(skeleton: &'a Skeleton, rest: &[Transform], below: Option<usize>) -> Self {
        let n = skeleton.len();
        let worlds = skeleton.world(rest);
        let position: Vec<DVec3> = worlds.iter().map(super::super::WorldJoint::position).collect();
        let listed: Vec<usize> = skeleton.listed().collect();
        let raw: Vec<&str> = listed.iter().map(|&joint| skeleton.joints()[joint].name.as_str()).collect();
        let mut names = vec![Name::default(); n];
        for (&joint, name) in listed.iter().zip(words::read(&raw)) {
            names[joint] = name;
        }
        let mut is_meant = vec![below.is_none(); n];
        for joint in 0..n {
            let up = skeleton.joints()[joint].parent;
            is_meant[joint] |= below == Some(joint) || up.is_some_and(|up| is_meant[up]);
        }
        let copy_of = if n > MOST_JOINTS {
            vec![None; n]
        } else {
            copies(skeleton, rest, &is_meant, &|joint| names[joint].is_helper())
        };
        let is_active: Vec<bool> = (0..n)
            .map(|joint| {
                is_meant[joint]
                    && copy_of[joint].is_none()
                    && skeleton.joints()[joint].kind == JointKind::Joint
                    && !names[joint].is_helper()
                    && !(names[joint].is_end() && skeleton.children(joint).is_empty())
                    && position[joint].is_finite()
            })
            .collect();
        let mut parent = vec![None; n];
        let mut kids = vec![Vec::new(); n];
        let mut tips = vec![Vec::new(); n];
        for joint in 0..n {
            // Joints stand behind their parents, so the parent's own answer is known.
            let up = skeleton.joints()[joint].parent;
            // What hangs on a copy hangs on the joint itself.
            let nearest = up.and_then(|up| if is_active[up] { Some(up) } else { copy_of[up].or(parent[up]) });
            parent[joint] = nearest;
            if is_active[joint] {
                if let Some(up) = nearest {
                    kids[up].push(joint);
                }
                let own = &skeleton.joints()[joint].tips;
                tips[joint]
                    .extend(own.iter().map(|tip| worlds[joint].scene_from_joint.transform_point3(*tip)));
            } else if let Some(up) = nearest
                && names[joint].is_end()
            {
                tips[up].push(position[joint]);
            }
        }
        let mut reach = vec![0.0; n];
        let mut far = position.clone();
        let mut size = vec![1; n];
        for joint in (0..n).rev().filter(|&joint| is_active[joint]) {
            for tip in &tips[joint] {
                let length = tip.distance(position[joint]);
                if length > reach[joint] {
                    (reach[joint], far[joint]) = (length, *tip);
                }
            }
            for &kid in &kids[joint] {
                let length = reach[kid] + position[kid].distance(position[joint]);
                if !names[kid].is_strand()
                    && (length > reach[joint] * (1.0 + ROUNDING) || reach[joint] == 0.0)
                {
                    (reach[joint], far[joint]) = (length, far[kid]);
                }
                size[joint] += size[kid];
            }
        }
        let named =
            names.iter().filter(|name| name.names_a_part() && !name.is_helper() && !name.is_end()).count();
        let spread = |axis: DVec3| {
            let along = (0..n).filter(|&joint| is_active[joint]).flat_map(|joint| {
                tips[joint].iter().copied().chain([position[joint]]).map(move |place| place.dot(axis))
            });
            let (low, high) = along.fold((f64::MAX, f64::MIN), |(low, high), at| (low.min(at), high.max(at)));
            (high - low).max(0.0)
        };
        let extent = spread(DVec3::X).max(spread(DVec3::Y)).max(spread(DVec3::Z));
        let rotation = worlds.iter().map(|world| world.rotation).collect();
        let root = (0..n).filter(|&joint| is_active[joint] && parent[joint].is_none()).max_by_key(|&joint| {
            // The first of the largest.
            (size[joint], std::cmp::Reverse(joint))
        });
        let frame = root
            .and_then(|root| skeleton.joints()[root].parent)
            .map_or(Rotor::IDENTITY, |carrier| worlds[carrier].rotation);
        let is_askew = DVec3::AXES.iter().any(|&axis| frame.apply(axis).abs().max_element() < SQUARE);
        let frame = if is_askew { frame } else { Rotor::IDENTITY };
        Self {
            skeleton,
            names,
            position,
            rotation,
            is_active,
            copy_of,
            kids,
            parent,
            tips,
            reach,
            far,
            size,
            is_named: named >= 5,
            frame,
            extent: if extent.is_finite() { extent } else { 0.0 },
        }
    }

    /// Active joints without an active joint above, the largest first.
    pub(super) fn roots(&self) -> Vec<usize> {
        let mut roots: Vec<usize> = (0..self.skeleton.len())
            .filter(|&joint| self.is_active[joint] && self.parent[joint].is_none())
            .collect();
        roots.sort_by_key(|&root| (usize::MAX - self.size[root], root));
        roots
    }

    /// From the joint down to the farthest tip, the joint first.
    pub(super) fn path_down(&self, from: usize) -> Vec<usize> {
        let mut path = vec![from];
        let mut at = from;
        while let Some(next) = self.main_kid(at) {
            path.push(next);
            at = next;
        }
        path
    }

    /// The child that carries the limb on: the one with the longest reach, twist helpers and strands last.
    pub(super) fn main_kid(&self, joint: usize) -> Option<usize> {
        let key = |kid: usize| {
            let whole =
                !(self.names[kid].is_strand() || (self.names[kid].is_twist() && self.kids[kid].is_empty()));
            (u8::from(whole), self.reach[kid] + self.position[kid].distance(self.position[joint]))
        };
        self.kids[joint].iter().copied().reduce(|best, kid| {
            let (a, b) = (key(best), key(kid));
            if b.0 > a.0 || (b.0 == a.0 && b.1 > a.1 * (1.0 + ROUNDING)) { kid } else { best }
        })
    }

    /// The active joints from `from` up to the root.
    pub(super) fn ancestors(&self, from: usize) -> Vec<usize> {
        std::iter::successors(Some(from), |&at| self.parent[at]).collect()
    }

    /// Whether `below` is `above` or hangs on it.
    pub(super) fn is_below(&self, below: usize, above: usize) -> bool {
        std::iter::successors(Some(below), |&at| self.parent[at]).any(|at| at == above)
    }

    /// The end of the joint itself: its one tip, or where its main child stands; `None` where nothing follows.
    pub(super) fn next_place(&self, joint: usize) -> Option<DVec3> {
        let far_enough = |place: &DVec3| place.distance(self.position[joint]) > 1e-6 * self.extent;
        self.main_kid(joint)
            .map(|kid| self.position[kid])
            .filter(far_enough)
            .or_else(|| self.main_kid(joint).and_then(|kid| self.next_place_from(kid, joint)))
            .or_else(|| self.tips[joint].iter().copied().find(far_enough))
    }

    /// Past joints that stand where the first one does.
    fn next_place_from(&self, kid: usize, joint: usize) -> Option<DVec3> {
        let far_enough = |place: &DVec3| place.distance(self.position[joint]) > 1e-6 * self.extent;
        let mut at = kid;
        loop {
            if let Some(tip) = self.tips[at].iter().copied().find(far_enough) {
                return Some(tip);
            }
            at = self.main_kid(at)?;
            if far_enough(&self.position[at]) {
                return Some(self.position[at]);
            }
        }
    }
}

impl Figure<'_> {
    /// The active joints of a tree, its root first.
    pub(super) fn subtree(&self, root: usize) -> Vec<usize> {
        let mut joints = vec![root];
        let mut at = 0;
        while let Some(&joint) = joints.get(at) {
            joints.extend(&self.kids[joint]);
            at += 1;
        }
        joints
    }
}

//! The two sides of a skeleton: which joints are each other's mirror image, and turns carried to the other side.

use std::collections::HashMap;

use glam::DVec3;

use crate::rotor::Rotor;

use super::Skeleton;

/// A plane that divides a skeleton at rest into two sides.
#[derive(Clone, Debug, PartialEq)]
pub struct Mirror {
    normal: DVec3,
    partners: Vec<usize>,
    /// The turn of each joint in the scene at rest, and of what stands above it.
    rests: Vec<[Rotor; 2]>,
}

/// Places nearer than this share of the skeleton's size are the same.
const NEAR: f64 = 0.04;
/// A normal within some degrees of an axis is meant to be that axis.
const AXIS_COSINE: f64 = 0.99;

impl Mirror {
    /// Finds the sides of a skeleton: joints whose names tell left from right are pairs, others are by where they stand
    /// at rest. `None` where nothing stands opposite of anything.
    pub fn of(skeleton: &Skeleton) -> Option<Self> {
        let world = skeleton.world(&skeleton.rest_pose());
        let places: Vec<DVec3> = world.iter().map(super::WorldJoint::position).collect();
        let size = size(&places);
        let named = named_pairs(skeleton);
        let across = named.iter().fold(DVec3::ZERO, |sum, &[left, right]| {
            let way = places[left] - places[right];
            // Lists may name a pair right first.
            if way.dot(sum) < 0.0 { sum - way } else { sum + way }
        });
        let candidates = match across.try_normalize().filter(|_| across.length() > NEAR * size) {
            Some(normal) => vec![on_axis(normal)],
            None => vec![DVec3::X, DVec3::Z, DVec3::Y],
        };
        let found =
            candidates.into_iter().map(|normal| (normal, partners(skeleton, &places, normal, size, &named)));
        let count =
            |partners: &[usize]| partners.iter().enumerate().filter(|&(own, &other)| own != other).count();
        // The first of those with the most pairs.
        let (normal, partners) =
            found.reduce(|best, next| if count(&next.1) > count(&best.1) { next } else { best })?;
        if count(&partners) == 0 {
            return None;
        }
        let above = |joint: usize| match skeleton.joints()[joint].parent {
            Some(parent) => world[parent].rotation,
            None => Rotor::IDENTITY,
        };
        let rests = (0..skeleton.len()).map(|joint| [world[joint].rotation, above(joint)]).collect();
        Some(Self { normal, partners, rests })
    }

    /// The unit vector from one side to the other, in the scene at rest.
    pub fn normal(&self) -> DVec3 {
        self.normal
    }

    /// The joint opposite of `joint`; itself for one in the middle.
    pub fn partner(&self, joint: usize) -> usize {
        self.partners.get(joint).copied().unwrap_or(joint)
    }

    /// The turn relative to its parent that [`Mirror::partner`] needs to be the mirror image of `joint` turned by `turn`
    /// relative to its own.
    ///
    /// What counts is the turn away from the rest pose, seen in the scene and relative to the parent's; a mirror keeps a
    /// turn in its own plane and turns the other two parts round.
    pub fn mirrored(&self, joint: usize, turn: Rotor) -> Rotor {
        let ([own, above], [other, other_above]) = (self.rests[joint], self.rests[self.partner(joint)]);
        let in_scene = above * turn * own.reverse();
        let axis = in_scene.bivector().axis();
        let seen = 2.0 * self.normal.dot(axis) * self.normal - axis;
        let mirrored = Rotor::new(in_scene.s, seen.x, seen.y, seen.z);
        (other_above.reverse() * mirrored * other).normalize()
    }
}

fn size(places: &[DVec3]) -> f64 {
    let low = places.iter().copied().reduce(DVec3::min).unwrap_or_default();
    let high = places.iter().copied().reduce(DVec3::max).unwrap_or_default();
    (high - low).length()
}

fn on_axis(normal: DVec3) -> DVec3 {
    let axes = [DVec3::X, DVec3::Y, DVec3::Z];
    axes.into_iter().find(|axis| axis.dot(normal).abs() > AXIS_COSINE).unwrap_or(normal)
}

/// Joints whose names differ in their side alone.
fn named_pairs(skeleton: &Skeleton) -> Vec<[usize; 2]> {
    let by_name: HashMap<&str, usize> =
        skeleton.joints().iter().enumerate().map(|(index, joint)| (joint.name.as_str(), index)).collect();
    let mut pairs = Vec::new();
    for (index, joint) in skeleton.joints().iter().enumerate() {
        let other = other_names(&joint.name).into_iter().find_map(|name| by_name.get(name.as_str()).copied());
        if let Some(other) = other.filter(|&other| other != index) {
            pairs.push([index, other]);
        }
    }
    // Each pair once, left first, and only where both agree.
    let agreed = pairs.clone();
    pairs.retain(|&[own, other]| agreed.contains(&[other, own]) && is_left(&skeleton.joints()[own].name));
    pairs
}

/// The words of a name: runs of letters, parted also where a capital follows a small letter.
fn words(name: &str) -> Vec<std::ops::Range<usize>> {
    let mut words: Vec<std::ops::Range<usize>> = Vec::new();
    let mut before: Option<char> = None;
    for (at, letter) in name.char_indices() {
        let end = at + letter.len_utf8();
        let goes_on = before.is_some_and(|before| {
            before.is_alphabetic() && !(before.is_lowercase() && letter.is_uppercase())
        });
        if letter.is_alphabetic() {
            match words.last_mut().filter(|_| goes_on) {
                Some(word) => word.end = end,
                None => words.push(at..end),
            }
        }
        before = Some(letter);
    }
    words
}

/// Left and right, in the ways they are written.
const SIDES: [[&str; 2]; 6] =
    [["left", "right"], ["Left", "Right"], ["LEFT", "RIGHT"], ["l", "r"], ["L", "R"], ["Lft", "Rgt"]];

/// What a name might be on the other side, the likeliest first.
fn other_names(name: &str) -> Vec<String> {
    let swapped = |range: std::ops::Range<usize>, to: &str| {
        format!("{}{to}{}", &name[..range.start], &name[range.end..])
    };
    let other = |word: &str| {
        SIDES.iter().find_map(|[left, right]| {
            if word == *left {
                Some(*right)
            } else if word == *right {
                Some(*left)
            } else {
                None
            }
        })
    };
    let mut names: Vec<String> = words(name)
        .into_iter()
        .filter_map(|word| other(&name[word.clone()]).map(|to| swapped(word, to)))
        .collect();
    // A side without a border: `leftArm` of small letters, `lfemur`, `RThigh`.
    for [left, right] in SIDES {
        for (from, to) in [(left, right), (right, left)] {
            if name.len() > from.len() && name.starts_with(from) {
                names.push(swapped(0..from.len(), to));
            }
        }
    }
    names
}

/// Whether a name says left, where its counterpart says right.
fn is_left(name: &str) -> bool {
    let side = |word: &str| SIDES.iter().any(|[left, _]| *left == word);
    let other = |word: &str| SIDES.iter().any(|[_, right]| *right == word);
    let told = words(name).into_iter().find_map(|word| {
        let word = &name[word];
        if side(word) {
            Some(true)
        } else if other(word) {
            Some(false)
        } else {
            None
        }
    });
    told.unwrap_or_else(|| name.starts_with(['l', 'L']))
}

/// The joint opposite of each: by name, else by place among the children of the parent's partner, else itself.
fn partners(
    skeleton: &Skeleton,
    places: &[DVec3],
    normal: DVec3,
    size: f64,
    named: &[[usize; 2]],
) -> Vec<usize> {
    let mut partners: Vec<usize> = (0..skeleton.len()).collect();
    for &[left, right] in named {
        (partners[left], partners[right]) = (right, left);
    }
    // The plane goes through the middle of the pairs that are known, else through the roots.
    let roots = skeleton.joints().iter().enumerate().filter(|(_, joint)| joint.parent.is_none());
    let middles: Vec<f64> = if named.is_empty() {
        roots.map(|(root, _)| places[root].dot(normal)).collect()
    } else {
        named.iter().map(|&[left, right]| 0.5 * (places[left] + places[right]).dot(normal)).collect()
    };
    let offset = middles.iter().sum::<f64>() / middles.len().max(1) as f64;
    for joint in 0..skeleton.len() {
        if partners[joint] != joint {
            continue;
        }
        let Some(parent) = skeleton.joints()[joint].parent else { continue };
        let image = places[joint] - 2.0 * (places[joint].dot(normal) - offset) * normal;
        let is_free = |&other: &usize| partners[other] == other;
        let nearest = skeleton
            .children(partners[parent])
            .iter()
            .copied()
            .filter(is_free)
            .filter(|&other| places[other].distance(image) <= NEAR * size)
            .min_by(|&a, &b| places[a].distance(image).total_cmp(&places[b].distance(image)));
        // Of joints in the middle that lie on each other each is its own.
        let own = places[joint].distance(image) <= NEAR * size && partners[parent] == parent;
        if let Some(other) = nearest.filter(|_| !own) {
            (partners[joint], partners[other]) = (other, joint);
        }
    }
    partners
}

#[cfg(test)]
mod tests {
    use super::super::{Joint, JointKind, Transform};
    use super::*;
    use crate::rotor::Bivector;

    fn skeleton(names: [&str; 6], turned: bool) -> Skeleton {
        // Two arms of two joints along x; the right one may have planes of its own at rest.
        let joint = |number: usize, parent: Option<usize>, offset: DVec3, rest: Rotor| Joint {
            name: names[number].to_owned(),
            number,
            parent,
            rest: Transform { translation: offset, rotation: rest, ..Transform::IDENTITY },
            kind: JointKind::Joint,
            tips: vec![],
        };
        let odd =
            if turned { Rotor::from_plane_angles(Bivector::new(0.4, 1.0, -0.7)) } else { Rotor::IDENTITY };
        let back = odd.reverse();
        Skeleton::new(vec![
            joint(0, None, DVec3::Y, Rotor::IDENTITY),
            joint(1, Some(0), DVec3::new(0.5, 0.5, 0.0), Rotor::IDENTITY),
            joint(2, Some(1), DVec3::X, Rotor::IDENTITY),
            joint(3, Some(0), DVec3::new(-0.5, 0.5, 0.0), odd),
            joint(4, Some(3), back.apply(-DVec3::X), back),
            joint(5, Some(0), DVec3::Y, Rotor::IDENTITY),
        ])
        .unwrap()
    }

    #[test]
    fn sides_are_told_by_name_or_by_place() {
        for names in [
            ["Hips", "LeftArm", "LeftHand", "RightArm", "RightHand", "Head"],
            ["root", "arm_l", "hand_l", "arm_r", "hand_r", "head"],
            ["root", "lhumerus", "lhand", "rhumerus", "rhand", "lowerneck"],
            ["", "", "", "", "", ""],
        ] {
            let mirror = Mirror::of(&skeleton(names, false)).unwrap();
            let partners: Vec<usize> = (0..6).map(|joint| mirror.partner(joint)).collect();
            assert_eq!(partners, [0, 3, 4, 1, 2, 5], "{names:?}");
            assert_eq!(mirror.normal().abs(), DVec3::X);
        }
        let alone = Skeleton::new(vec![skeleton(["a"; 6], false).joints()[0].clone()]).unwrap();
        assert_eq!(Mirror::of(&alone), None);
    }

    #[test]
    fn a_mirrored_pose_stands_where_the_mirror_shows_it() {
        let skeleton = skeleton(["Hips", "LeftArm", "LeftHand", "RightArm", "RightHand", "Head"], true);
        let mirror = Mirror::of(&skeleton).unwrap();
        let mut pose = skeleton.rest_pose();
        for (joint, own) in pose.iter_mut().enumerate() {
            let joint = joint as f64;
            let turn = Bivector::new(0.3 + 0.1 * joint, 0.5 - 0.3 * joint, 0.2 * joint);
            own.rotation = own.rotation * Rotor::from_plane_angles(turn);
        }
        let mut other = skeleton.rest_pose();
        for (joint, own) in pose.iter().enumerate() {
            let partner = mirror.partner(joint);
            other[partner].rotation = mirror.mirrored(joint, own.rotation);
            let back = mirror.mirrored(partner, other[partner].rotation);
            assert!(back.turn_to(own.rotation) < 1e-12, "there and back");
        }
        let (world, mirrored) = (skeleton.world(&pose), skeleton.world(&other));
        for joint in 0..6 {
            let expected = world[joint].position() * DVec3::new(-1.0, 1.0, 1.0);
            let found = mirrored[mirror.partner(joint)].position();
            assert!(found.distance(expected) < 1e-12, "{joint}: {found} for {expected}");
        }
    }
}

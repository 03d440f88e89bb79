//! Moves on the ground: a turn about the vertical and a shift, and clips that are moved so.

use std::sync::Arc;

use glam::{DAffine3, DMat3, DVec3};

use crate::clip::{Clip, JointTracks, RotationTrack, VectorPath, VectorTrack};
use crate::rotor::{Axis, Rotor};
use crate::skeleton::{JointKind, Transform};

/// A turn about +Y, then a shift along the ground. It changes no height.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct GroundMove {
    /// The turn in radians, right-handed about +Y: positive takes z towards x.
    pub turn_rad: f64,
    /// The shift along x after the turn, in the clip's lengths.
    pub x: f64,
    /// The shift along z after the turn, in the clip's lengths.
    pub z: f64,
}

impl GroundMove {
    /// The turn as a rotor.
    pub fn rotor(self) -> Rotor {
        Axis::Y.rotor(self.turn_rad)
    }

    /// Where a point of the scene goes.
    pub fn apply(self, point: DVec3) -> DVec3 {
        let (sin, cos) = self.turn_rad.sin_cos();
        DVec3::new(point.x * cos + point.z * sin + self.x, point.y, -point.x * sin + point.z * cos + self.z)
    }

    /// A direction, turned.
    pub fn turn(self, direction: DVec3) -> DVec3 {
        Self { x: 0.0, z: 0.0, ..self }.apply(direction)
    }

    /// Both moves in one: `next` first, then this one. A stride repeated is the stride then the stride.
    #[must_use]
    pub fn then(self, next: Self) -> Self {
        let shift = self.apply(DVec3::new(next.x, 0.0, next.z));
        Self { turn_rad: self.turn_rad + next.turn_rad, x: shift.x, z: shift.z }
    }

    fn to_affine(self) -> DAffine3 {
        DAffine3::from_mat3_translation(
            DMat3::from_rotation_y(self.turn_rad),
            DVec3::new(self.x, 0.0, self.z),
        )
    }
}

/// The joints that carry a clip's whole motion: the topmost that are listed or animated. What stands above them keeps still. In a table
/// without a hierarchy all joints stand side by side at the origin; there it is those that are placed.
pub(super) fn tops(clip: &Clip) -> Vec<usize> {
    let joints = clip.skeleton.joints();
    let mut is_below = vec![false; joints.len()];
    let mut tops = Vec::new();
    for (index, joint) in joints.iter().enumerate() {
        if joint.parent.is_some_and(|parent| is_below[parent]) {
            is_below[index] = true;
            continue;
        }
        let tracks = clip.joints.get(index).map(|tracks| &**tracks);
        let is_animated = tracks.is_some_and(|tracks| *tracks != JointTracks::default());
        if joint.kind == JointKind::Joint || is_animated {
            is_below[index] = true;
            tops.push(index);
        }
    }
    let is_placed = |&top: &usize| {
        let track = clip.joints.get(top).and_then(|tracks| tracks.translation.as_ref());
        let is_moved = track.is_some_and(|track| !track.keys.is_empty());
        let rest = joints[top].rest.translation;
        is_moved || rest != DVec3::ZERO || joints.iter().any(|joint| joint.parent == Some(top))
    };
    if tops.iter().any(is_placed) {
        tops.retain(is_placed);
    }
    tops
}

/// Takes the frame above a top to the scene: the product of all that stands still above it.
pub(super) fn frame_above(clip: &Clip, top: usize) -> (Rotor, DAffine3) {
    let joints = clip.skeleton.joints();
    let mut chain: Vec<&Transform> = Vec::new();
    let mut at = joints[top].parent;
    while let Some(joint) = at {
        chain.push(&joints[joint].rest);
        at = joints[joint].parent;
    }
    chain.iter().rev().fold((Rotor::IDENTITY, DAffine3::IDENTITY), |(turn, affine), rest| {
        (turn * rest.rotation, affine * rest.to_affine())
    })
}

/// The clip set down elsewhere on the ground. Joints below the topmost stay shared.
#[must_use]
pub fn moved(clip: &Clip, place: GroundMove) -> Clip {
    if place == GroundMove::default() {
        return clip.clone();
    }
    let mut joints = clip.joints.clone();
    for top in tops(clip) {
        let (turn_above, scene_from_above) = frame_above(clip, top);
        let inner_turn = turn_above.reverse() * place.rotor() * turn_above;
        let inner = scene_from_above.inverse() * place.to_affine() * scene_from_above;
        let own = &joints[top];
        let rest = clip.skeleton.joints()[top].rest;
        let turned = |rotor: Rotor| inner_turn * rotor;
        let rotation = match &own.rotation {
            Some(track) if !track.keys.is_empty() => {
                let changes: Vec<(usize, Rotor)> =
                    track.keys.iter().map(|&key| turned(key)).enumerate().collect();
                let tangents = track.tangents.as_ref();
                let tangents = tangents.map(|all| all.iter().map(|pair| pair.map(turned)).collect());
                RotationTrack { tangents, ..track.with_keys(&changes) }
            }
            _ => RotationTrack::from_rotors(
                clip.grid.times.clone(),
                vec![turned(rest.rotation); clip.grid.count()],
            ),
        };
        let translation = match &own.translation {
            Some(track) if !track.keys.is_empty() => VectorTrack {
                keys: track.keys.iter().map(|&key| inner.transform_point3(key)).collect(),
                tangents: track.tangents.as_ref().map(|all| {
                    all.iter().map(|pair| pair.map(|rate| inner.transform_vector3(rate))).collect()
                }),
                ..track.clone()
            },
            _ => VectorTrack {
                path: VectorPath::Straight,
                ..VectorTrack::straight(
                    clip.grid.times.clone(),
                    vec![inner.transform_point3(rest.translation); clip.grid.count()],
                )
            },
        };
        joints[top] = Arc::new(JointTracks {
            rotation: Some(rotation),
            translation: Some(translation),
            scale: own.scale.clone(),
        });
    }
    Clip { joints, ..clip.clone() }
}

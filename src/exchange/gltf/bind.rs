//! The pose that the skins of a document were bound in (glTF 2.0, section 3.7.3).
//!
//! An inverse bind matrix takes from the mesh to the joint, so its inverse is the joint's place in the mesh, where the mesh
//! stands as it was made. Of one skin all places are known up to one common transform; the parent of a joint in the same
//! skin takes that out.

use std::collections::HashMap;
use std::rc::Rc;

use glam::{DAffine3, DMat4, DVec3};

use crate::exchange::Note;
use crate::skeleton::{LocalPose, Skeleton, Transform};

use super::accessor::{Accessors, Wanted};
use super::json::At;

/// Two binds of one joint further apart than this are two: matrices of 32 bits, multiplied a few times, as a share of the
/// largest number in them.
const SAME_BIND: f64 = 1e-3;

/// The places of one skin's joints, by their index in the skeleton.
struct Skin {
    number: usize,
    places: HashMap<usize, DAffine3>,
}

/// Each joint in the pose it was bound in, relative to its parent; joints that no skin binds stand as the file has them.
/// `None` where no skin has inverse bind matrices that can be read. Where skins bind a shared joint differently the first
/// skin's bind is used, and a note tells it.
pub(super) fn bind_pose(
    root: &At<'_>,
    skeleton: &Skeleton,
    joint_of_node: &[Option<usize>],
    accessors: &mut Accessors<'_>,
    notes: &mut Vec<Note>,
) -> Option<LocalPose> {
    let skins = skins(root, joint_of_node, accessors, notes);
    if skins.iter().all(|skin| skin.places.is_empty()) {
        return None;
    }
    note_differences(skeleton, &skins, notes);
    let mut pose = skeleton.rest_pose();
    let rest_world = skeleton.world(&pose);
    let mut world: Vec<DAffine3> = Vec::with_capacity(pose.len());
    for (joint, own) in pose.iter_mut().enumerate() {
        let owner = skins.iter().find(|skin| skin.places.contains_key(&joint));
        let bound = owner.and_then(|skin| {
            let place = skin.places.get(&joint)?;
            let local = if let Some((parent, between)) = bound_parent(skeleton, skin, joint) {
                (parent * between).inverse() * *place
            } else {
                let parent = skeleton.joints()[joint].parent.map(|parent| world[parent]);
                let size = common_size(&rest_world[joint].scene_from_joint, place);
                let place = DAffine3::from_scale(DVec3::splat(size)) * *place;
                parent.unwrap_or(DAffine3::IDENTITY).inverse() * place
            };
            let local = Transform::from_affine(&local);
            let is_sound = local.translation.is_finite() && local.rotation.is_finite();
            (is_sound && local.scale.is_finite() && local.scale.abs().min_element() > 1e-9).then_some(local)
        });
        if let Some(mut bound) = bound {
            // What is left of a size after two matrices of 32 bits is no size.
            let rest = own.scale;
            if (bound.scale - rest).abs().max_element() <= 1e-4 * rest.abs().max_element() {
                bound.scale = rest;
            }
            *own = bound;
        }
        let parent = skeleton.joints()[joint].parent.map_or(DAffine3::IDENTITY, |parent| world[parent]);
        world.push(parent * own.to_affine());
    }
    Some(pose)
}

/// A mesh may be measured in other lengths than the scene: how much larger the first joint of a skin is in the scene.
fn common_size(in_scene: &DAffine3, in_mesh: &DAffine3) -> f64 {
    let size = (in_scene.matrix3.determinant() / in_mesh.matrix3.determinant()).abs().cbrt();
    if size.is_finite() && size > 0.0 && (size - 1.0).abs() > SAME_BIND { size } else { 1.0 }
}

/// The places of all skins that say them. A skin that can't be read is told and passed over: a clip plays without it.
fn skins(
    root: &At<'_>,
    joint_of_node: &[Option<usize>],
    accessors: &mut Accessors<'_>,
    notes: &mut Vec<Note>,
) -> Vec<Skin> {
    // Skins may share their matrices.
    let mut read: HashMap<usize, Option<Rc<Vec<f64>>>> = HashMap::new();
    let mut skins = Vec::new();
    for (number, skin) in root.list("skins").unwrap_or_default().into_iter().enumerate() {
        let place = skin.path_of("inverseBindMatrices");
        let wanted = Wanted { kind: "MAT4", components: 16, integers: false };
        let index = match skin.index("inverseBindMatrices", "accessors", root) {
            Ok(Some(index)) => index,
            Ok(None) => continue,
            Err(error) => {
                notes.push(Note::new(error.place, format!("{}; the bind pose is not read", error.kind)));
                continue;
            }
        };
        let matrices =
            read.entry(index).or_insert_with(|| match accessors.decode(index, wanted, size_of::<f64>()) {
                Ok(decoded) => Some(Rc::new(decoded.numbers)),
                Err(error) => {
                    notes.push(Note::new(error.place, format!("{}; the bind pose is not read", error.kind)));
                    None
                }
            });
        let Some(matrices) = matrices else { continue };
        let joints = skin.list("joints").unwrap_or_default();
        if matrices.len() < 16 * joints.len() {
            let text = format!(
                "expected a matrix for each of {} joints, found {}; the others are passed over",
                joints.len(),
                matrices.len() / 16
            );
            notes.push(Note::new(place, text));
        }
        let mut places = HashMap::new();
        for (node, matrix) in joints.iter().zip(matrices.chunks_exact(16)) {
            let joint =
                node.as_index("nodes", root).ok().and_then(|node| joint_of_node.get(node).copied()?);
            let columns: Option<[f64; 16]> = matrix.try_into().ok();
            let (Some(joint), Some(columns)) = (joint, columns) else { continue };
            let inverse = DAffine3::from_mat4(DMat4::from_cols_array(&columns)).inverse();
            if inverse.is_finite() {
                places.insert(joint, inverse);
            }
        }
        skins.push(Skin { number, places });
    }
    skins
}

/// The nearest ancestor in the same skin, and what stands between as the file has it.
fn bound_parent(skeleton: &Skeleton, skin: &Skin, joint: usize) -> Option<(DAffine3, DAffine3)> {
    let mut between = DAffine3::IDENTITY;
    let mut up = skeleton.joints()[joint].parent;
    while let Some(parent) = up {
        if let Some(place) = skin.places.get(&parent) {
            return Some((*place, between));
        }
        between = skeleton.joints()[parent].rest.to_affine() * between;
        up = skeleton.joints()[parent].parent;
    }
    None
}

/// Tells of joints that two skins bind differently. What the skins have in common is no difference: each has a space of
/// its own.
fn note_differences(skeleton: &Skeleton, skins: &[Skin], notes: &mut Vec<Note>) {
    for (later, skin) in skins.iter().enumerate().skip(1) {
        let mut unlike: Vec<(usize, usize)> = Vec::new();
        for joint in (0..skeleton.len()).filter(|joint| skin.places.contains_key(joint)) {
            let first = skins[..later].iter().find(|first| first.places.contains_key(&joint));
            let limb = |skin: &Skin| {
                let (parent, between) = bound_parent(skeleton, skin, joint)?;
                Some((parent * between).inverse() * *skin.places.get(&joint)?)
            };
            let Some(first) = first else { continue };
            if let (Some(a), Some(b)) = (limb(first), limb(skin))
                && !is_near(&a, &b)
            {
                unlike.push((joint, first.number));
            }
        }
        if let Some(&(joint, first)) = unlike.first() {
            let text = format!(
                "expected the bind pose that skins[{first}] gives, found another for {} joint(s), `{}` first; that of skins[{first}] is used",
                unlike.len(),
                skeleton.label(joint)
            );
            notes.push(Note::new(format!("skins[{}].inverseBindMatrices", skin.number), text));
        }
    }
}

fn is_near(a: &DAffine3, b: &DAffine3) -> bool {
    let columns = |m: &DAffine3| [m.matrix3.x_axis, m.matrix3.y_axis, m.matrix3.z_axis];
    let largest =
        |columns: &[DVec3]| columns.iter().fold(0.0_f64, |most, own| most.max(own.abs().max_element()));
    let turns = largest(&columns(b));
    let length = largest(&[a.translation, b.translation]);
    let same_turn =
        columns(a).iter().zip(columns(b)).all(|(a, b)| (*a - b).abs().max_element() <= SAME_BIND * turns);
    same_turn && (a.translation - b.translation).abs().max_element() <= SAME_BIND * length
}

//! A clip of the same body, told in another joint order or length unit, brought to a skeleton.

use std::sync::Arc;

use crate::clip::{Clip, VectorTrack};
use crate::skeleton::{JointKind, Skeleton};

use super::BlendError;

/// Rest turns that differ by less are the same, in radians (0.01°): files round them.
const SAME_TURN_RAD: f64 = 1.8e-4;
/// Limbs may point so far apart at rest, in radians (25°): bodies of one make differ so in their hips and shoulders.
const SAME_DIRECTION_RAD: f64 = 0.436;
/// Lengths of one unit: their common factor lies within. Beyond it places are scaled.
const SAME_UNIT: std::ops::Range<f64> = 0.75..1.34;
/// Shorter offsets than this share of the body's size say nothing of a direction.
const SHORT: f64 = 0.04;

/// `clip` on `skeleton`: its joints brought into the skeleton's order by their labels, its lengths to the skeleton's by one
/// factor. Turns are taken as they are, so limbs may be longer or shorter (two people captured on one skeleton) but have to
/// point alike at rest. The very clip when it already has this skeleton. Joints of the clip alone are left out; ends of limbs
/// that it lacks keep their rest.
///
/// # Errors
/// When a joint has no partner of its name under the same parent, or rests turned another way: the body is another one.
pub fn fit(clip: &Arc<Clip>, skeleton: &Arc<Skeleton>) -> Result<Arc<Clip>, BlendError> {
    if clip.skeleton == *skeleton {
        return Ok(clip.clone());
    }
    let theirs = &clip.skeleton;
    let partner: Vec<Option<usize>> =
        (0..skeleton.len()).map(|joint| partner(skeleton, joint, theirs)).collect();
    let listed: Vec<usize> = skeleton.listed().collect();
    let lost = |&&joint: &&usize| partner[joint].is_none();
    let missing = listed.iter().filter(lost).count();
    // A body may have a few more leaves than the other; a body without a partner for an inner joint is another.
    let inner_lost = listed
        .iter()
        .filter(lost)
        .find(|&&joint| !skeleton.children(joint).is_empty())
        .or(listed.iter().find(|joint| lost(joint) && 2 * missing > listed.len()));
    let other = |joint: usize| BlendError::OtherSkeleton {
        missing: missing.max(1),
        count: listed.len(),
        joint: skeleton.label(joint).to_owned(),
    };
    if let Some(&joint) = inner_lost {
        return Err(other(joint));
    }
    let scale = common_scale(skeleton, theirs, &partner);
    // Two people differ a little; another unit differs much.
    let scale = if SAME_UNIT.contains(&scale) { 1.0 } else { scale };
    let size = size(skeleton);
    for &joint in &listed {
        let Some(their) = partner[joint] else { continue };
        let (own, other_rest) = (skeleton.joints()[joint].rest, theirs.joints()[their].rest);
        let is_turned = own.rotation.turn_to(other_rest.rotation) > SAME_TURN_RAD;
        // A root's rest place says where the body stands, not what it is.
        let is_root = skeleton.parent_joint(joint).is_none();
        let offsets = [own.translation, other_rest.translation * scale];
        let is_long = offsets.iter().all(|offset| offset.length() > SHORT * size);
        let points_elsewhere = is_long && offsets[0].angle_between(offsets[1]) > SAME_DIRECTION_RAD;
        if is_turned || (!is_root && points_elsewhere) {
            return Err(other(joint));
        }
    }
    let is_same_scale = (scale - 1.0).abs() < 1e-9;
    let scaled = |track: &VectorTrack| {
        if is_same_scale {
            return track.clone();
        }
        VectorTrack {
            keys: track.keys.iter().map(|&key| key * scale).collect(),
            tangents: track
                .tangents
                .as_ref()
                .map(|all| all.iter().map(|pair| pair.map(|v| v * scale)).collect()),
            ..track.clone()
        }
    };
    let joints = partner.iter().map(|their| {
        let Some(tracks) = their.and_then(|their| clip.joints.get(their)) else { return Arc::default() };
        let mut tracks = (**tracks).clone();
        tracks.translation = tracks.translation.as_ref().map(scaled);
        Arc::new(tracks)
    });
    Ok(Arc::new(Clip { joints: joints.collect(), skeleton: skeleton.clone(), ..(**clip).clone() }))
}

/// The joint of `theirs` with the same label and a parent of the same label.
fn partner(skeleton: &Skeleton, joint: usize, theirs: &Skeleton) -> Option<usize> {
    if skeleton.joints()[joint].kind == JointKind::Carrier {
        return theirs.find(skeleton.label(joint));
    }
    let their = theirs.find(skeleton.label(joint))?;
    let parents = [skeleton.parent_joint(joint), theirs.parent_joint(their)];
    let same = match parents {
        [Some(own), Some(other)] => skeleton.label(own) == theirs.label(other),
        [None, None] => true,
        _ => false,
    };
    same.then_some(their)
}

/// The factor that takes their lengths to ours: the median over all limbs.
fn common_scale(skeleton: &Skeleton, theirs: &Skeleton, partner: &[Option<usize>]) -> f64 {
    let mut ratios: Vec<f64> = skeleton
        .listed()
        .filter(|&joint| skeleton.parent_joint(joint).is_some())
        .filter_map(|joint| {
            let own = skeleton.joints()[joint].rest.translation.length();
            let other = theirs.joints()[partner[joint]?].rest.translation.length();
            (own > 0.0 && other > 0.0).then(|| own / other)
        })
        .collect();
    ratios.sort_by(f64::total_cmp);
    ratios.get(ratios.len() / 2).copied().unwrap_or(1.0)
}

/// A length that tells how large a body is: its longest chain of limbs.
fn size(skeleton: &Skeleton) -> f64 {
    let mut reach = vec![0.0; skeleton.len()];
    for (index, joint) in skeleton.joints().iter().enumerate() {
        let Some(parent) = joint.parent else { continue };
        reach[index] = reach[parent] + joint.rest.translation.length();
    }
    reach.into_iter().fold(0.0, f64::max)
}

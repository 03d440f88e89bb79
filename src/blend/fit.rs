//! A clip of the same body, told in another joint order or length unit, brought to a skeleton.

use std::sync::Arc;

use crate::clip::{Clip, VectorTrack};
use crate::skeleton::{JointKind, RestChoice, Skeleton, Transform};

use super::BlendError;

/// Rest turns that differ by less are the same, in radians (0.01°): files round them.
const SAME_TURN_RAD: f64 = 1.8e-4;
/// Limbs may point so far apart at rest, in radians (25°): bodies of one make differ so in their hips and shoulders.
const SAME_DIRECTION_RAD: f64 = 0.436;
/// Two bodies of one make: the larger is at most so many times the smaller.
const MOST_LARGER: f64 = 1.34;
/// Limbs of one body in another unit differ by one factor, but for so much: files round them.
const ONE_FACTOR: f64 = 2e-3;
/// Usual units in metres: metre, centimetre, millimetre, inch, and an inch divided by 0.45, in which captures are handed on.
const UNITS: [f64; 5] = [1.0, 0.01, 0.001, 0.0254, 0.0254 / 0.45];
/// Shorter offsets than this share of the body's size say nothing of a direction.
const SHORT: f64 = 0.04;

/// `clip` on `skeleton`: its joints brought into the skeleton's order by their labels, its lengths into the skeleton's unit.
/// Turns are taken as they are, so limbs may be longer or shorter (two people captured on one skeleton) but have to
/// point alike at rest; how much larger one body is changes no place. The very clip when it already has this skeleton. Joints of the
/// clip alone are left out; ends of limbs that it lacks keep their rest. The pose that the clip's turns are measured from stays its own.
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
    let scale = unit_factor(&ratios(skeleton, theirs, &partner));
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
    let skeleton = measured_as(skeleton, theirs, &partner, scale);
    Ok(Arc::new(Clip { joints: joints.collect(), skeleton, ..(**clip).clone() }))
}

/// `skeleton`, measured from the pose that the turns of `theirs` are measured from.
fn measured_as(
    skeleton: &Arc<Skeleton>,
    theirs: &Skeleton,
    partner: &[Option<usize>],
    scale: f64,
) -> Arc<Skeleton> {
    if [skeleton, theirs].iter().all(|skeleton| skeleton.rest_choice() == RestChoice::Defaults) {
        return skeleton.clone();
    }
    let pose = partner.iter().zip(skeleton.joints()).map(|(their, own)| match their {
        Some(their) => {
            let rest = theirs.chosen_rest(*their);
            Transform { translation: rest.translation * scale, ..rest }
        }
        None => own.rest,
    });
    Arc::new(skeleton.with_rest_by_rule(theirs.rest_choice(), pose.collect()))
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

/// How many times as long each limb is here as there, in rising order.
fn ratios(skeleton: &Skeleton, theirs: &Skeleton, partner: &[Option<usize>]) -> Vec<f64> {
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
    ratios
}

/// The factor that takes their unit to ours, from how limbs compare. Where all limbs compare alike and not nearly as 1 to 1, it is one body in
/// another unit, whichever that is. Else there are two bodies, and the factor is that of two usual units which leaves them most alike in
/// size; without such a pair of units it is what the limbs say.
fn unit_factor(ratios: &[f64]) -> f64 {
    let Some(&median) = ratios.get(ratios.len() / 2) else { return 1.0 };
    // The middle nine tenths: a few joints without a length of their own say nothing.
    let beside = ratios.len() / 20;
    let (least, most) = (ratios[beside], ratios[ratios.len() - 1 - beside]);
    let size_beyond = |factor: f64| (median / factor).ln().abs();
    if most <= least * (1.0 + ONE_FACTOR) && size_beyond(1.0) > MOST_LARGER.ln() {
        return median;
    }
    let pairs = UNITS.iter().flat_map(|own| UNITS.iter().map(move |other| other / own));
    pairs
        .filter(|&factor| size_beyond(factor) <= MOST_LARGER.ln())
        .min_by(|&a, &b| size_beyond(a).total_cmp(&size_beyond(b)))
        .unwrap_or(median)
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

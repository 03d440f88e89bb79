//! Joints that are there twice: a file with several skins of one figure may bring its joints again for each of them.

use super::super::{JointKind, Skeleton, Transform};

/// Turns (radians), lengths and sizes (as shares) that differ by less than this are the same: files round to 32 bits.
const SAME: f64 = 1e-4;

/// Fewer joints that stand where others do are helpers at one place, and no copy of a part of a figure.
const LEAST: usize = 3;

/// For each joint the one that it is a copy of: they stand at the same place, turned alike, in the same chain of joints. What is copied is among
/// `is_meant`, and is never a copy itself; joints that `is_helper` names take no part.
pub(super) fn copies(
    skeleton: &Skeleton,
    rest: &[Transform],
    is_meant: &[bool],
    is_helper: &dyn Fn(usize) -> bool,
) -> Vec<Option<usize>> {
    let n = skeleton.len();
    let joints = skeleton.joints();
    let is_joint = |joint: usize| joints[joint].kind == JointKind::Joint && !is_helper(joint);
    // Listed joints from each one down: what hangs on nothing and carries little can be no copy.
    let mut size = vec![0_usize; n];
    for joint in (0..n).rev() {
        size[joint] += usize::from(is_joint(joint));
        if let Some(parent) = joints[joint].parent {
            size[parent] += size[joint];
        }
    }
    let worlds = skeleton.world(rest);
    let mut of: Vec<Option<usize>> = vec![None; n];
    let mut tops = Vec::new();
    for copy in (0..n).filter(|&joint| is_joint(joint)) {
        let parent = joints[copy].parent;
        let below_copy = parent.and_then(|parent| of[parent]);
        if below_copy.is_none() && size[copy] < LEAST {
            continue;
        }
        let same_frame = |a: Option<usize>, b: Option<usize>| match (a, b) {
            (Some(a), Some(b)) if a == b => true,
            (Some(a), Some(b)) => {
                let is_carrier = |joint: usize| joints[joint].kind == JointKind::Carrier;
                let [one, other] = [a, b].map(|joint| worlds[joint].scene_from_joint);
                is_carrier(a) && is_carrier(b) && one.abs_diff_eq(other, SAME * one.matrix3.x_axis.length())
            }
            (a, b) => a == b,
        };
        let fits = |own: usize| {
            own != copy
                && is_meant[own]
                && is_joint(own)
                && of[own].is_none()
                && (own < copy || !is_meant[copy])
                && is_alike(&rest[own], &rest[copy])
        };
        let found = if let Some(above) = below_copy {
            let kids = skeleton.children(above).iter().copied().filter(|&own| fits(own));
            pick(skeleton, kids, copy)
        } else {
            let all = (0..n)
                .filter(|&own| size[own] >= LEAST && same_frame(joints[own].parent, parent) && fits(own));
            pick(skeleton, all, copy)
        };
        of[copy] = found;
        if found.is_some() && below_copy.is_none() {
            tops.push(copy);
        }
    }
    for top in tops {
        let is_below = |joint: usize| {
            std::iter::successors(Some(joint), |&own| joints[own].parent).any(|own| own == top)
        };
        let own: Vec<usize> = (top..n).filter(|&joint| of[joint].is_some() && is_below(joint)).collect();
        let n_long = own.iter().filter(|&&joint| rest[joint].translation.length() > 0.0).count() + 1;
        if own.len() < LEAST || n_long < LEAST {
            for joint in own {
                of[joint] = None;
            }
        }
    }
    of
}

/// Of several joints at the place the one of the same name, else the first.
fn pick(skeleton: &Skeleton, found: impl Iterator<Item = usize>, copy: usize) -> Option<usize> {
    let found: Vec<usize> = found.collect();
    let name = &skeleton.joints()[copy].name;
    let same = found.iter().copied().find(|&own| skeleton.joints()[own].name == *name);
    same.or_else(|| found.first().copied())
}

fn is_alike(one: &Transform, other: &Transform) -> bool {
    let length = one.translation.length().max(other.translation.length());
    one.translation.distance(other.translation) <= SAME * length
        && one.rotation.turn_to(other.rotation) <= SAME
        && (one.scale - other.scale).length() <= SAME * one.scale.length()
}

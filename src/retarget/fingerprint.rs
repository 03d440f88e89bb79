//! A name for a skeleton: the same joints in the same places have the same.

use sha2::{Digest, Sha256};

use crate::skeleton::{JointKind, Skeleton};

/// Sixteen hexadecimal digits that stand for the names, parents and rest places of a skeleton's joints, whatever the order of siblings in the
/// file. Sizes do not enter, and turns of the joints' own axes do: places are told in the parent's frame.
///
/// Stable: the same in every version and on every machine, so that corrections saved under it are found again.
pub fn fingerprint(skeleton: &Skeleton) -> String {
    let joints = skeleton.joints();
    let size: f64 = joints.iter().map(|joint| joint.rest.translation.length()).fold(0.0, f64::max);
    let path = |joint: usize| {
        let mut names: Vec<&str> = Vec::new();
        let mut at = Some(joint);
        while let Some(own) = at {
            names.push(&joints[own].name);
            at = skeleton.parent_joint(own);
        }
        names.reverse();
        names.join("/")
    };
    let mut lines: Vec<String> = (0..joints.len())
        .filter(|&joint| joints[joint].kind == JointKind::Joint)
        .map(|joint| {
            let unit = if size > 0.0 { size } else { 1.0 };
            let [x, y, z] =
                (joints[joint].rest.translation / unit).to_array().map(|part| (part * 1e4).round() as i64);
            format!("{} {x} {y} {z}", path(joint))
        })
        .collect();
    lines.sort();
    let hash = Sha256::digest(lines.join("\n").as_bytes());
    hash.iter().take(8).map(|byte| format!("{byte:02x}")).collect::<Vec<_>>().concat()
}

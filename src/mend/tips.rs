//! How far the ends of limbs move by a mend.

use std::collections::BTreeSet;

use crate::clip::Clip;
use crate::snag::{Remedy, Snag};

/// Times of a snag that are looked at, at most.
const MOST_TIMES: usize = 240;

/// How far the mend of `snag` moves the ends of limbs, in the clip's own length: the largest distance, at the keys that it
/// changes, between where a limb's end is in `before` and where it is with the snag's joint as in `after` and all else as
/// before. For the mend of a whole clip's fault all joints are as in `after`. Of long snags 240 times are looked at, evenly
/// spread.
pub fn change_at_tips(before: &Clip, after: &Clip, snag: &Snag) -> f64 {
    let whole = matches!(snag.remedy, Remedy::CloseLoop(_) | Remedy::Hold(_));
    let own = match (whole, after.rotation(snag.joint)) {
        (false, Some(track)) if !before.same_joint(after, snag.joint) => {
            before.with_rotation(snag.joint, track.clone())
        }
        (false, _) => return 0.0,
        (true, _) => after.clone(),
    };
    let Some(track) = before.rotation(snag.joint) else { return 0.0 };
    let last = snag.last_key.min(track.keys.len().saturating_sub(1));
    let keys: Vec<usize> = (snag.first_key..=last).collect();
    let stride = keys.len().div_ceil(MOST_TIMES).max(1);
    let mut times: Vec<f64> = keys.iter().step_by(stride).map(|key| track.times.at(*key)).collect();
    // A long way changes nothing at its keys.
    if snag.last_key == snag.first_key + 1 {
        times.push(0.5 * (snag.first_secs + snag.last_secs));
    }
    let skeleton = &before.skeleton;
    let inner: BTreeSet<usize> = skeleton.listed().filter_map(|joint| skeleton.parent_joint(joint)).collect();
    let ends: Vec<usize> = skeleton.listed().filter(|joint| !inner.contains(joint)).collect();
    let (old, new) = (before.worlds_at(&times), own.worlds_at(&times));
    let mut farthest = 0.0_f64;
    for index in 0..times.len() {
        for &joint in &ends {
            let tips = &skeleton.joints()[joint].tips;
            farthest = farthest.max(old.position(joint, index).distance(new.position(joint, index)));
            for &tip in tips {
                farthest = farthest.max(old.point(joint, index, tip).distance(new.point(joint, index, tip)));
            }
        }
    }
    if farthest.is_finite() { farthest } else { 0.0 }
}

//! Brings a run of keys back within a joint's limit, softly.

use crate::limit::Clamp;
use crate::limit::JointLimit;
use crate::limit::Reading;
use crate::rotor::Rotor;

use super::draft::Draft;
use super::redraw::tangent;

/// How far beside the run a seam reaches: this long, and at least so many keys, as long as these are frames and not sparse keys.
const REACH_SECS: f64 = 0.1;
const REACH_KEYS: usize = 3;
const FARTHEST_SECS: f64 = 0.3;

/// Bends `first..=last` from comfort to limit. Beside the run the same bend fades away, without a corner in pose or rate.
pub(super) fn clamp(draft: &mut Draft, first: usize, last: usize, limit: &JointLimit) {
    let (from, to) = (reach(draft, first, true), reach(draft, last, false));
    let weight = |key: usize| {
        let secs = draft.secs(key);
        let outside = if key < first {
            // At the next key beyond the seam nothing is left.
            let end = from.checked_sub(1).map_or(draft.secs(from) - REACH_SECS, |key| draft.secs(key));
            (draft.secs(first) - secs) / (draft.secs(first) - end)
        } else if key > last {
            let end = if to + 1 < draft.len() { draft.secs(to + 1) } else { draft.secs(to) + REACH_SECS };
            (secs - draft.secs(last)) / (end - draft.secs(last))
        } else {
            0.0
        };
        // A smooth step from 1 to 0, with no rate or acceleration at either end.
        1.0 - outside.powi(3) * (outside * (6.0 * outside - 15.0) + 10.0)
    };
    let mut before: Option<Reading> = None;
    let mut poses: Vec<(usize, Rotor, Rotor)> = Vec::new();
    for key in from..=to {
        let Some(pose) = draft.unit(key) else { continue };
        let reading = limit.read(pose, before.as_ref());
        before = Some(reading);
        if let Some(clamped) = limit.clamped(&reading, Clamp::Soft) {
            let bend = (pose.reverse() * clamped).pow(weight(key));
            poses.push((key, (pose * bend).normalize(), pose));
        }
    }
    for &(key, pose, was) in &poses {
        draft.set_pose(key, pose, was);
    }
    if draft.tangents.is_some() {
        for &(key, ..) in &poses {
            let own = tangent(draft, key);
            draft.set_numbers(key, draft.keys[key], Some([own; 2]));
        }
    }
}

/// The last key of the seam that begins beside `end`.
fn reach(draft: &Draft, end: usize, is_before: bool) -> usize {
    let mut farthest = end;
    for count in 1.. {
        let next = if is_before { end.checked_sub(count) } else { Some(end + count) };
        let Some(next) = next.filter(|&key| key < draft.len()) else { break };
        let secs = (draft.secs(next) - draft.secs(end)).abs();
        if secs > FARTHEST_SECS || (count > REACH_KEYS && secs > REACH_SECS + 1e-9) {
            break;
        }
        farthest = next;
    }
    farthest
}

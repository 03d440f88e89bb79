//! Which numbers of a joint are the very same in two clips.

use glam::DVec3;

use crate::clip::{RotationTrack, Stored, Times, VectorTrack};

/// Keys of a joint's turns whose numbers differ, in the form in which both files hold them.
/// `None` where the two hold them in different forms, so that bits say nothing.
pub(super) fn changed_turns(
    before: Option<&RotationTrack>,
    after: Option<&RotationTrack>,
) -> Option<Vec<usize>> {
    match (before, after) {
        (None, None) => Some(Vec::new()),
        (Some(before), Some(after)) if same_form(before, after) => {
            let moved = |key: &usize| {
                before.times.len() != after.times.len()
                    || before.times.at(*key).to_bits() != after.times.at(*key).to_bits()
            };
            let mut changed = after.changed_keys(before);
            if before.times != after.times {
                changed.extend((0..after.keys.len()).filter(moved));
                changed.sort_unstable();
                changed.dedup();
            }
            Some(changed)
        }
        _ => None,
    }
}

fn same_form(before: &RotationTrack, after: &RotationTrack) -> bool {
    match (&before.stored, &after.stored) {
        (Stored::Angles(own), Stored::Angles(others)) => own.axes == others.axes && own.order == others.order,
        (Stored::Rotors, Stored::Rotors) | (Stored::PlaneAngles(_), Stored::PlaneAngles(_)) => true,
        _ => false,
    }
}

/// Keys of places or sizes that differ in any bit, broken values included. `None` where the two have other times or paths, so that keys
/// say nothing.
pub(super) fn changed_vectors(
    before: Option<&VectorTrack>,
    after: Option<&VectorTrack>,
) -> Option<Vec<usize>> {
    let bits = |v: &DVec3| v.to_array().map(f64::to_bits);
    match (before, after) {
        (None, None) => Some(Vec::new()),
        (Some(own), Some(others))
            if same_times(&own.times, &others.times)
                && own.path == others.path
                && own.keys.len() == others.keys.len() =>
        {
            Some((0..own.keys.len()).filter(|&key| bits(&own.keys[key]) != bits(&others.keys[key])).collect())
        }
        _ => None,
    }
}

fn same_times(own: &Times, others: &Times) -> bool {
    own == others || own.iter().map(f64::to_bits).eq(others.iter().map(f64::to_bits))
}

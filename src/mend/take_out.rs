//! Takes a constant offset out of a run of keys and blends the seams.

use crate::rotor::{Bivector, Rotor};
use crate::skeleton::smooth_step;

use super::draft::Draft;

/// How far into the run a seam is blended: this long, and at least so many keys.
const BLEND_SECS: f64 = 0.1;
const BLEND_KEYS: usize = 3;

/// A seam within this many times the roughness of the motion beside it, and this much, is no seam.
const USUAL: f64 = 3.0;
const LEAST_RAD: f64 = 0.005;

/// Seams wider than this are no rounding of one offset: it changes over the run, so they are spread over all of it.
const WIDE_RAD: f64 = 0.26;

/// Takes an offset out of `first..=last`: `pose ← offset · pose` or `pose · offset`, whichever `moved` does.
pub(super) fn take_out(draft: &mut Draft, first: usize, last: usize, moved: impl Fn(Rotor) -> Rotor) {
    let before: Vec<Rotor> = (first..=last).map(|key| draft.unit(key).unwrap_or(Rotor::IDENTITY)).collect();
    let mut poses: Vec<Rotor> = before.iter().map(|pose| moved(*pose).normalize()).collect();
    let seams = [
        (first > 0).then(|| seam(draft, &poses, first, last, true)).flatten(),
        (last + 1 < draft.len()).then(|| seam(draft, &poses, first, last, false)).flatten(),
    ];
    close(draft, &mut poses, first, last, seams);
    for (key, (pose, was)) in (first..=last).zip(poses.into_iter().zip(before)) {
        draft.set_pose(key, pose, was);
    }
}

/// The turn, on the bone side of the run's end pose, that would make the end go on from its sound neighbour. `None` where
/// it is no more than the motion's own roughness.
fn seam(draft: &Draft, poses: &[Rotor], first: usize, last: usize, at_start: bool) -> Option<Bivector> {
    // Keys counted outwards from the seam on both sides: `sound(0)` and `own(0)` are next to it.
    let sound = |i: usize| {
        let key = if at_start { first.checked_sub(i + 1)? } else { last + 1 + i };
        (key < draft.len()).then(|| draft.unit(key)).flatten()
    };
    let own = |i: usize| {
        if at_start { poses.get(i).copied() } else { poses.len().checked_sub(i + 1).map(|i| poses[i]) }
    };
    let (near, end) = (sound(0)?, own(0)?);
    // Steps towards the run.
    let before = |i: usize| Some((sound(i + 1)?.reverse() * sound(i)?).plane_angles());
    let after = |i: usize| Some((own(i)?.reverse() * own(i + 1)?).plane_angles());
    let expected = match (before(0), after(0)) {
        (Some(a), Some(b)) => (a + b) * 0.5,
        (Some(one), None) | (None, Some(one)) => one,
        (None, None) => Bivector::ZERO,
    };
    let wanted = near * Rotor::from_plane_angles(expected);
    let seam = (end.reverse() * wanted).plane_angles();
    let roughness =
        [before(0).zip(before(1)), before(1).zip(before(2)), after(0).zip(after(1)), after(1).zip(after(2))]
            .into_iter()
            .flatten()
            .map(|(a, b)| (a - b).length())
            .fold(0.0, f64::max);
    (seam.length() > USUAL * roughness + LEAST_RAD).then_some(seam)
}

/// Closes the seams by a turn that fades from each end inwards.
fn close(draft: &Draft, poses: &mut [Rotor], first: usize, last: usize, seams: [Option<Bivector>; 2]) {
    let count = poses.len();
    let step_secs = draft.times.median_step().unwrap_or(BLEND_SECS);
    let blend = ((BLEND_SECS / step_secs) as usize).max(BLEND_KEYS).min(count.div_ceil(2));
    let ends: Vec<Rotor> = poses.to_vec();
    for (seam, at_start) in [(seams[0], true), (seams[1], false)] {
        let Some(seam) = seam else { continue };
        let reach = if seam.length() > WIDE_RAD { count } else { blend };
        // On the parent's side, so that both ends fade by turns of the same frame.
        let end = if at_start { ends[0] } else { ends[count - 1] };
        let turn = Bivector::from_axis(end.apply(seam.axis()));
        for i in 0..reach.min(count) {
            let along = (i as f64 + 0.5) / reach as f64;
            // A smooth step from 1 to 0.
            let weight = 1.0 - smooth_step(along);
            let index = if at_start { i } else { count - 1 - i };
            poses[index] = (Rotor::from_plane_angles(turn * weight) * poses[index]).normalize();
        }
    }
    debug_assert_eq!(count, last + 1 - first);
}

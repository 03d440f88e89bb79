//! Mends that change numbers and no pose: length, sign, whole turns, equal triples, and the sign of a cubic's end.

use std::ops::RangeInclusive;

use crate::clip::PathKind;
use crate::rotor::{Bivector, Rotor};
use crate::snag::nearest_plane_angles;

use super::draft::{Draft, Form};

/// Brings keys to unit length, their tangents along.
pub(super) fn normalise(draft: &mut Draft, keys: RangeInclusive<usize>) {
    for key in keys {
        let own = draft.keys[key];
        if let Some(unit) = own.try_normalize() {
            let scaled =
                tangents_of(draft, key).map(|both| both.map(|tangent| tangent.scale(1.0 / own.norm())));
            draft.set_numbers(key, unit, scaled);
        }
    }
}

/// Turns the sign of keys round, of their tangents too.
pub(super) fn negate(draft: &mut Draft, keys: RangeInclusive<usize>) {
    for key in keys {
        let tangents = tangents_of(draft, key).map(|both| both.map(|tangent| -tangent));
        draft.set_numbers(key, -draft.keys[key], tangents);
    }
}

fn tangents_of(draft: &Draft, key: usize) -> Option<[Rotor; 2]> {
    draft.tangents.as_ref().map(|tangents| tangents[key])
}

/// Adds whole turns to the three file angles of keys.
pub(super) fn unwrap(draft: &mut Draft, keys: RangeInclusive<usize>, turns: [i32; 3]) {
    for key in keys {
        if let Form::Angles { degrees, .. } = &draft.form {
            let own = degrees[key];
            let shifted = std::array::from_fn(|i| {
                // An angle without a turn to take keeps its bits, a negative 0 included.
                if turns[i] == 0 { own[i] } else { own[i] + 360.0 * f64::from(turns[i]) }
            });
            draft.set_angles(key, shifted);
        }
    }
}

/// Writes for each key the mirrored triple of its angles, or for plane angles the equal ones, nearest to the key before;
/// from the end backwards where the run starts the track.
pub(super) fn nearest(draft: &mut Draft, first: usize, last: usize) {
    if first > 0 {
        (first..=last).for_each(|key| nearest_to(draft, key, key - 1));
    } else if last + 1 < draft.len() {
        (first..=last).rev().for_each(|key| nearest_to(draft, key, key + 1));
    }
}

fn nearest_to(draft: &mut Draft, key: usize, near: usize) {
    let equal = match &draft.form {
        Form::Rotors => return,
        Form::Angles { order, degrees, .. } => {
            let [a, b, c] = degrees[key];
            let mirrored = [a + 180.0, if order.is_proper() { -b } else { 180.0 - b }, c + 180.0];
            let near = degrees[near];
            std::array::from_fn(|i| mirrored[i] - 360.0 * ((mirrored[i] - near[i]) / 360.0).round())
        }
        Form::PlaneAngles(degrees) => {
            let [own, near] = [key, near].map(|key| Bivector::from_degrees(degrees[key]));
            nearest_plane_angles(own, near).to_degrees()
        }
    };
    if equal.iter().all(|angle| f64::is_finite(*angle)) {
        draft.set_angles(key, equal);
    }
}

/// Makes the cubic segment from `key - 1` to `key` take the short way. A cubic turns the way its signs say, so the sign
/// of `key` changes, and with it all keys up to the next such segment: every other segment stays as it is played.
pub(super) fn short_way(draft: &mut Draft, key: usize) {
    let is_long = |draft: &Draft, key: usize| {
        draft.paths.of(key - 1) == PathKind::Cubic && draft.keys[key - 1].dot(draft.keys[key]) < 0.0
    };
    if key == 0 || !is_long(draft, key) {
        return;
    }
    let until = (key + 1..draft.len()).find(|&next| is_long(draft, next)).unwrap_or(draft.len());
    negate(draft, key..=until - 1);
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::clip::{Paths, RotationTrack, Times};
    use crate::rotor::Axis;

    #[test]
    fn the_short_way_leaves_every_other_segment_as_it_is_played() {
        let turn = |degrees: f64| Axis::Z.rotor(degrees.to_radians());
        let keys = vec![turn(0.0), turn(30.0), -turn(50.0), -turn(90.0), turn(120.0), turn(130.0)];
        let tangents =
            keys.iter().map(|key| [key.scale(0.1), *key * Rotor::new(0.0, 0.0, 0.0, -0.4)]).collect();
        let mut track = RotationTrack::from_rotors(Times::Even { step_secs: 0.5, count: 6 }, keys);
        track.paths = Paths::Every(PathKind::Cubic);
        track.tangents = Some(tangents);
        let mut draft = Draft::new(&track);
        short_way(&mut draft, 2);
        // The second long way is gone with the first: their run is turned as a whole.
        short_way(&mut draft, 4);
        let mended = draft.finish().unwrap();
        for segment in [0.2, 1.2, 2.2] {
            assert!(track.at(segment).turn_to(mended.at(segment)) < 1e-12, "{segment}");
        }
        assert!(track.at(0.75).turn_to(turn(40.0)) > 1.0);
        assert!(mended.at(0.75).turn_to(turn(40.0)) < 0.3);
        assert_eq!(mended.changed_keys(&track), [2, 3]);
    }
}

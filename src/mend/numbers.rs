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

/// Whole turns that are to be added to the three file angles of some keys.
#[derive(Clone, Copy, Debug)]
pub(super) struct Unwrap {
    pub(super) first: usize,
    pub(super) last: usize,
    pub(super) turns: [i32; 3],
}

/// Adds whole turns to file angles: the very same numbers as one run of keys after the other would give.
///
/// All that follows a wrap is a turn off, so that runs lie in one another, and each key would be gone over as often as there are
/// wraps before it. Here each is gone over once.
pub(super) fn unwrap(draft: &mut Draft, runs: &[Unwrap]) {
    let mut borders: Vec<usize> = runs.iter().flat_map(|run| [run.first, run.last + 1]).collect();
    borders.sort_unstable();
    borders.dedup();
    // In the order of `runs`: sorted by their first keys they open at the end of this list.
    let mut opening: Vec<usize> = (0..runs.len()).collect();
    opening.sort_by_key(|&run| runs[run].first);
    let mut opening = opening.into_iter().peekable();
    let mut open: Vec<usize> = Vec::new();
    for two in borders.windows(2) {
        let (from, until) = (two[0], two[1]);
        open.retain(|&run| runs[run].last >= from);
        while let Some(run) = opening.next_if(|&run| runs[run].first == from) {
            let place = open.partition_point(|&other| other < run);
            open.insert(place, run);
        }
        for channel in 0..3 {
            let turns = open.iter().map(|&run| runs[run].turns[channel]).filter(|turns| *turns != 0);
            let mut each: Vec<(i32, u32)> = Vec::new();
            for turns in turns {
                match each.last_mut() {
                    Some((own, times)) if *own == turns => *times += 1,
                    _ => each.push((turns, 1)),
                }
            }
            for (turns, times) in each {
                draft.add_to_angles(from..until, channel, 360.0 * f64::from(turns), times);
            }
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
    use crate::clip::{FileAngles, Paths, RotationTrack, Times};
    use crate::rotor::{Axis, EulerOrder};

    #[test]
    fn runs_in_one_another_come_to_the_very_numbers_of_one_after_the_other() {
        const COUNT: usize = 600;
        let mut state = 7_u64;
        let mut whole = |most: u64| {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
            (state >> 33) % most
        };
        for case in 0..40 {
            let wide = [0.3, 180.0, 1000.0][case % 3];
            let mut angle = || wide * (whole(2_000_001) as f64 * 1e-6 - 1.0);
            let degrees: Vec<[f64; 3]> = (0..COUNT).map(|_| [angle(), angle(), -0.0]).collect();
            let sign = if case % 2 == 0 { 1 } else { -1 };
            let mut runs: Vec<Unwrap> = (0..60)
                .map(|_| {
                    let first = whole(COUNT as u64) as usize;
                    let to_end = whole(4) > 0;
                    let last = if to_end { COUNT - 1 } else { (first + whole(50) as usize).min(COUNT - 1) };
                    let turns = [sign, if whole(5) == 0 { -sign } else { 0 }, 0];
                    Unwrap { first, last, turns }
                })
                .collect();
            runs.sort_by_key(|run| (run.first, run.last));
            let mut wanted = degrees.clone();
            for run in &runs {
                for own in &mut wanted[run.first..=run.last] {
                    for (angle, turns) in own.iter_mut().zip(run.turns).filter(|(_, turns)| *turns != 0) {
                        *angle += 360.0 * f64::from(turns);
                    }
                }
            }
            let angles = FileAngles {
                axes: EulerOrder::ZXY.axes().to_vec(),
                order: EulerOrder::ZXY,
                degrees: degrees.into(),
            };
            let times = Times::Even { step_secs: 0.01, count: COUNT };
            let mut draft = Draft::new(&RotationTrack::from_angles(times, angles));
            unwrap(&mut draft, &runs);
            let mended = draft.finish().unwrap();
            let found = &mended.file_angles().unwrap().degrees;
            for (key, (own, wanted)) in found.iter().zip(&wanted).enumerate() {
                assert_eq!(own.map(f64::to_bits), wanted.map(f64::to_bits), "case {case}, key {key}");
            }
        }
    }

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

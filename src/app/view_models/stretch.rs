//! What a path, a spacing or turns are given to: the segment between two keys, or a stretch of captured motion as a whole.
//!
//! Where a key stands at each frame there is no room between two keys for a path that anybody could see. There the chosen keys from
//! the first to the last are one stretch: those between give way, and the path leads from its first key to its last.

use crate::clip::{FrameGrid, KeyChange, KeyEdit, MeantTurn, PathKind, RotationTrack};

use super::key_drag::key_at;

/// A segment that is to be.
#[derive(Clone, Debug, PartialEq)]
pub struct Stretch {
    /// Of which joint.
    pub joint: usize,
    /// The time in seconds of the key it starts at.
    pub start_secs: f64,
    /// The times of the keys that give way.
    pub gone_secs: Vec<f64>,
}

/// Whether two keys so many seconds apart leave no frame between them, as in captured motion.
pub fn is_frame_apart(grid: &FrameGrid, secs: f64) -> bool {
    /// Slower than this nothing is captured: such keys were set by hand, and their clip is counted in them.
    const LONGEST_SECS: f64 = 0.1;
    secs * grid.rate < 1.5 && secs < LONGEST_SECS
}

/// What chosen keys (times in seconds, rising) of a joint's track mean to a path: each segment between two of them, with one key alone
/// the segment it starts, and each run of captured keys as one stretch. Empty where there is nothing that a path could shape.
pub fn stretches(joint: usize, track: &RotationTrack, grid: &FrameGrid, times: &[f64]) -> Vec<Stretch> {
    let keys: Vec<usize> = times.iter().filter_map(|&secs| key_at(track, secs)).collect();
    let has_next = |key: usize| key + 1 < track.keys.len();
    let is_short = |key: usize| is_frame_apart(grid, track.times.at(key + 1) - track.times.at(key));
    let starts_at =
        |key: usize, gone_secs: Vec<f64>| Stretch { joint, start_secs: track.times.at(key), gone_secs };
    if let [only] = keys.as_slice() {
        let fits = has_next(*only) && !is_short(*only);
        return fits.then(|| starts_at(*only, Vec::new())).into_iter().collect();
    }
    let mut found = Vec::new();
    let mut place = 0;
    // Behind the last chosen key nothing is meant.
    while place + 1 < keys.len() {
        let first = keys[place];
        let run = keys[place..].windows(2).take_while(|pair| pair[1] == pair[0] + 1 && is_short(pair[0]));
        let count = run.count();
        if count > 1 {
            let gone = (first + 1..first + count).map(|key| track.times.at(key));
            found.push(starts_at(first, gone.collect()));
        } else if has_next(first) && !is_short(first) {
            found.push(starts_at(first, Vec::new()));
        }
        place += count.max(1);
    }
    found
}

impl Stretch {
    /// Whether edits that were made before have taken the keys out already.
    pub fn is_known(&self, edits: &[KeyEdit]) -> bool {
        self.gone_secs.is_empty()
            || edits.iter().any(|edit| {
                edit.joint == self.joint
                    && matches!(&edit.change, KeyChange::Delete(gone) if *gone == self.gone_secs)
            })
    }

    /// The edit that takes the keys out that give way.
    pub fn clearing(&self) -> Option<KeyEdit> {
        let change = || KeyChange::Delete(self.gone_secs.clone());
        (!self.gone_secs.is_empty()).then(|| KeyEdit { joint: self.joint, change: change() })
    }

    /// Path and turns that it has: those of `edits`, which the track may not show because it keeps a file's rows, else the track's own.
    pub fn path_and_turn(&self, track: &RotationTrack, edits: &[KeyEdit]) -> (PathKind, MeantTurn) {
        let segment = key_at(track, self.start_secs).unwrap_or(0);
        let own = (track.kind_of(segment, None), track.segments.of(segment).turn);
        let starts_here = |starts: &[f64]| starts.iter().any(|secs| (secs - self.start_secs).abs() < 1e-5);
        let mine = edits.iter().filter(|edit| edit.joint == self.joint);
        mine.fold(own, |(kind, turn), edit| match &edit.change {
            KeyChange::Path(starts, new) if starts_here(starts) => (*new, turn),
            KeyChange::Turn(starts, new) if starts_here(starts) => (kind, *new),
            _ => (kind, turn),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::clip::Times;
    use crate::rotor::Rotor;

    fn track(times: &[f64]) -> RotationTrack {
        RotationTrack::from_rotors(Times::Listed(times.into()), vec![Rotor::IDENTITY; times.len()])
    }

    #[track_caller]
    fn check(times: &[f64], chosen: &[f64], expected: &[(f64, &[f64])]) {
        let found = stretches(3, &track(times), &FrameGrid::even(10.0, 4.0), chosen);
        let expected: Vec<Stretch> = expected
            .iter()
            .map(|&(start_secs, gone)| Stretch { joint: 3, start_secs, gone_secs: gone.to_vec() })
            .collect();
        assert_eq!(found, expected);
    }

    #[test]
    fn sparse_keys_mean_their_segments_and_captured_ones_a_stretch() {
        // Ten frames a second would be 0.1 s apart, which is no capture: 0.09 is.
        let times = [0.0, 0.09, 0.18, 0.27, 1.0, 2.0];
        check(&times, &[1.0], &[(1.0, &[])]);
        check(&times, &[2.0], &[]);
        check(&times, &[0.27, 1.0, 2.0], &[(0.27, &[]), (1.0, &[])]);
        check(&times, &[0.0], &[]);
        check(&times, &[0.0, 0.09], &[]);
        check(&times, &[0.0, 0.09, 0.18, 0.27], &[(0.0, &[0.09, 0.18])]);
        check(&times, &[0.0, 0.09, 0.18, 0.27, 1.0], &[(0.0, &[0.09, 0.18]), (0.27, &[])]);
    }
}

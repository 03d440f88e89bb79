//! What a path, a spacing or turns are given to: the segment between two keys, or a stretch of captured motion as a whole.
//!
//! Where a key stands at each frame there is no room between two keys for a path that anybody could see. There the chosen keys from
//! the first to the last are one stretch: those between give way, and the path leads from its first key to its last.

use crate::clip::{Clip, FrameGrid, KeyChange, KeyEdit, MeantTurn, PathKind, RotationTrack, Spacing};

use super::key_choice::KeyChoice;
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
        let clears = |edit: &KeyEdit| matches!(edit.change, KeyChange::Delete(_));
        self.gone_secs.is_empty() || self.shaping(edits).any(clears)
    }

    /// Those of `edits` that shape it, in their order.
    fn shaping<'a>(&'a self, edits: &'a [KeyEdit]) -> impl Iterator<Item = &'a KeyEdit> {
        edits.iter().filter(|edit| edit.joint == self.joint).filter(|edit| match &edit.change {
            KeyChange::Delete(gone) => *gone == self.gone_secs,
            KeyChange::Path(starts, _) | KeyChange::Space(starts, _) | KeyChange::Turn(starts, _) => {
                starts.iter().any(|secs| (secs - self.start_secs).abs() < 1e-5)
            }
            _ => false,
        })
    }

    /// The time in seconds of the key it leads to.
    pub fn end_secs(&self, track: &RotationTrack) -> f64 {
        let before = key_at(track, self.gone_secs.last().copied().unwrap_or(self.start_secs));
        before.map_or(self.start_secs, |key| track.times.at((key + 1).min(track.times.len() - 1)))
    }

    /// Its keys from the first to the last, as they are chosen.
    pub fn keys(&self, track: &RotationTrack) -> KeyChoice {
        let mut keys = KeyChoice::default();
        let ends = [self.start_secs, self.end_secs(track)];
        keys.add(self.joint, ends.into_iter().chain(self.gone_secs.iter().copied()));
        keys
    }

    /// The spacing that `edits` give it.
    pub fn spacing(&self, edits: &[KeyEdit]) -> Spacing {
        let given = |edit: &KeyEdit| match edit.change {
            KeyChange::Space(_, spacing) => Some(spacing),
            _ => None,
        };
        self.shaping(edits).filter_map(given).last().unwrap_or_default()
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
        self.shaping(edits).fold(own, |(kind, turn), edit| match &edit.change {
            KeyChange::Path(_, new) => (*new, turn),
            KeyChange::Turn(_, new) => (kind, *new),
            _ => (kind, turn),
        })
    }
}

/// The stretches of a file's rows that `edits`, those of one pass, have shaped. Their rows are all there again in `clip`, so that only the
/// edits tell of them.
pub fn shaped_rows(clip: &Clip, edits: &[KeyEdit]) -> Vec<Stretch> {
    let stretch = |edit: &KeyEdit| {
        let KeyChange::Delete(gone) = &edit.change else { return None };
        let track = clip.rotation(edit.joint).filter(|track| !track.times.is_empty())?;
        let [first, last] = [key_at(track, *gone.first()?)?, key_at(track, *gone.last()?)?];
        let is_run = first > 0 && last + 1 == first + gone.len() && last + 1 < track.times.len();
        // What was moved in the same pass is no longer where its row is.
        let moves = |own: &KeyEdit| own.joint == edit.joint && matches!(own.change, KeyChange::Move(_));
        let start_secs = track.times.at(first.checked_sub(1)?);
        (is_run && !edits.iter().any(moves)).then(|| Stretch {
            joint: edit.joint,
            start_secs,
            gone_secs: gone.clone(),
        })
    };
    edits.iter().filter_map(stretch).collect()
}

/// `more` with what has shaped the stretches of rows it speaks of in front, for a look at what it does to `clip` by itself.
pub fn with_shaping(clip: &Clip, edits: &[KeyEdit], more: &[KeyEdit]) -> Vec<KeyEdit> {
    let clears = |joint: usize| {
        more.iter().any(|edit| edit.joint == joint && matches!(edit.change, KeyChange::Delete(_)))
    };
    let rows = shaped_rows(clip, edits);
    let meant = rows.iter().filter(|own| own.shaping(more).next().is_some() && !clears(own.joint));
    meant.flat_map(|own| own.shaping(edits)).chain(more).cloned().collect()
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

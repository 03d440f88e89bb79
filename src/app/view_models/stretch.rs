//! What a path, a spacing or turns are given to: the segment between two keys, or a stretch of captured motion that was made one.
//!
//! Where a key stands at each frame there is hardly room between two keys for a spacing or a turn. There a person may first make one
//! segment of a stretch: the keys between its first and its last give way, and the path leads from one to the other.

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

/// The segments that chosen keys (times in seconds, rising) of a joint's track mean: those that start at each but the last of them,
/// with one key alone the one that starts there. All keys stay.
pub fn segments(joint: usize, track: &RotationTrack, times: &[f64]) -> Vec<Stretch> {
    let keys: Vec<usize> = times.iter().filter_map(|&secs| key_at(track, secs)).collect();
    // Behind the last chosen key nothing is meant.
    let starts = if keys.len() > 1 { &keys[..keys.len() - 1] } else { &keys[..] };
    let starts = starts.iter().filter(|&&key| key + 1 < track.keys.len());
    starts.map(|&key| Stretch { joint, start_secs: track.times.at(key), gone_secs: Vec::new() }).collect()
}

/// The stretch from the first to the last chosen key of a joint's track as one segment: the keys between give way. `None` where there
/// are none.
pub fn one_stretch(joint: usize, track: &RotationTrack, times: &[f64]) -> Option<Stretch> {
    let first = key_at(track, *times.first()?)?;
    let last = key_at(track, *times.last()?)?;
    let gone_secs: Vec<f64> = (first + 1..last).map(|key| track.times.at(key)).collect();
    (!gone_secs.is_empty()).then(|| Stretch { joint, start_secs: track.times.at(first), gone_secs })
}

impl Stretch {
    /// Whether a frame lies between its ends, so that its pace can be seen.
    pub fn has_room(&self, track: &RotationTrack, grid: &FrameGrid) -> bool {
        !is_frame_apart(grid, self.end_secs(track) - self.start_secs)
    }

    /// Whether all its keys are among the chosen ones.
    pub fn is_chosen(&self, track: &RotationTrack, chosen: &KeyChoice) -> bool {
        self.keys(track).times(self.joint).iter().all(|&secs| chosen.has(self.joint, secs))
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
    pub fn clearing(&self) -> KeyEdit {
        KeyEdit { joint: self.joint, change: KeyChange::Delete(self.gone_secs.clone()) }
    }

    /// Path and turns that it has: those of `edits`, which the track may not show because it keeps a file's rows, else the track's own.
    pub fn path_and_turn(&self, track: &RotationTrack, edits: &[KeyEdit]) -> (PathKind, MeantTurn) {
        let segment = key_at(track, self.start_secs).unwrap_or(0);
        // A segment between keys that stand shows its own.
        let edits = if self.gone_secs.is_empty() { &[] } else { edits };
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

    #[test]
    fn chosen_keys_mean_the_segments_that_start_at_them_and_all_keys_stay() {
        let times = [0.0, 0.09, 0.18, 0.27, 1.0, 2.0];
        let (track, grid) = (track(&times), FrameGrid::even(10.0, 4.0));
        let check = |chosen: &[f64], expected: &[f64]| {
            let found = segments(3, &track, chosen);
            let starts: Vec<f64> = found.iter().map(|own| own.start_secs).collect();
            assert_eq!(starts, expected);
            assert!(found.iter().all(|own| own.joint == 3 && own.gone_secs.is_empty()));
        };
        check(&[1.0], &[1.0]);
        check(&[2.0], &[]);
        check(&[0.0, 0.09, 0.18], &[0.0, 0.09]);
        check(&times, &times[..5]);
        let room: Vec<bool> =
            segments(3, &track, &times).iter().map(|own| own.has_room(&track, &grid)).collect();
        // Ten frames a second would be 0.1 s apart, which is no capture: 0.09 is.
        assert_eq!(room, [false, false, false, true, true]);
    }

    #[test]
    fn one_segment_leads_from_the_first_to_the_last_chosen_key() {
        let track = track(&[0.0, 0.09, 0.18, 0.27, 1.0, 2.0]);
        let of = |chosen: &[f64]| one_stretch(3, &track, chosen).map(|own| (own.start_secs, own.gone_secs));
        assert_eq!(of(&[0.09, 1.0]), Some((0.09, vec![0.18, 0.27])));
        assert_eq!(of(&[0.27, 1.0, 2.0]), Some((0.27, vec![1.0])));
        assert_eq!(of(&[1.0, 2.0]), None, "there is none between");
        assert_eq!(of(&[1.0]), None);
        assert_eq!(of(&[]), None);
    }
}

//! Edits of single keys by hand, as plain data that find their keys by time.

use crate::rotor::Rotor;

use super::path::{MeantTurn, PathKind, Paths, Segments, Spacing};
use super::rotation_track::{RotationTrack, Stored};
use super::take::Clip;
use super::times::{Place, Times};

/// A change of some keys of one joint's turns.
#[derive(Clone, Debug, PartialEq)]
pub struct KeyEdit {
    /// Which joint.
    pub joint: usize,
    /// What is changed.
    pub change: KeyChange,
}

/// What is changed of some keys. Keys are told by their times in seconds, so that a change still fits when steps before it
/// leave other keys: the key nearest to a time is meant, within a quarter of a frame. Times are those before the change.
#[derive(Clone, Debug, PartialEq)]
pub enum KeyChange {
    /// New keys; a time where there is a key changes that one.
    Insert(Vec<NewKey>),
    /// Other turns.
    Set(Vec<(f64, Rotor)>),
    /// From one time to another, all at once. A key that stays gives way to one that is moved onto it. No time is below 0.
    Move(Vec<[f64; 2]>),
    /// Take keys away; the last one stays.
    Delete(Vec<f64>),
    /// The path of the segments that start at these keys.
    Path(Vec<f64>, PathKind),
    /// The spacing of the segments that start at these keys.
    Space(Vec<f64>, Spacing),
    /// How far round the segments that start at these keys go.
    Turn(Vec<f64>, MeantTurn),
}

/// A key to be.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NewKey {
    /// When, in seconds from 0 up.
    pub secs: f64,
    /// How the joint turns there; `None`: as it does now.
    pub rotor: Option<Rotor>,
}

impl KeyEdit {
    /// Keys of a joint shifted in time.
    pub fn shift(joint: usize, times_secs: &[f64], by_secs: f64) -> Self {
        let moves = times_secs.iter().map(|&secs| [secs, secs + by_secs]).collect();
        Self { joint, change: KeyChange::Move(moves) }
    }

    /// Keys of a joint drawn out (a factor above 1) or together around a time.
    pub fn scale(joint: usize, times_secs: &[f64], about_secs: f64, factor: f64) -> Self {
        let moves =
            times_secs.iter().map(|&secs| [secs, about_secs + (secs - about_secs) * factor]).collect();
        Self { joint, change: KeyChange::Move(moves) }
    }
}

/// `clip` with edits of keys, one after the other, and how many single changes found no key to change.
///
/// Keys that no edit names keep their bits. A joint without keys gets some where keys are inserted. Tracks that hold their turns
/// in a file's own angles, a row for each frame, keep their rows: the frames take on what the edited keys play, and a frame that
/// does not move keeps its numbers. Where rows were taken out before, what is left are keys like any others.
#[must_use]
pub fn with_key_edits(clip: &Clip, edits: &[KeyEdit]) -> (Clip, usize) {
    let near_secs = 0.25 / clip.grid.rate.max(1e-6);
    let mut result = clip.clone();
    let mut missed = 0;
    let mut joints: Vec<usize> = edits.iter().map(|edit| edit.joint).collect();
    joints.sort_unstable();
    joints.dedup();
    for joint in joints {
        let own: Vec<&KeyChange> =
            edits.iter().filter(|edit| edit.joint == joint).map(|edit| &edit.change).collect();
        let Some(rest) = clip.skeleton.joints().get(joint).map(|joint| joint.rest.rotation) else {
            missed += own.len();
            continue;
        };
        let before = clip.rotation(joint).filter(|track| !track.keys.is_empty());
        let mut track = before.cloned();
        for change in own {
            track = changed(track, change, near_secs, rest, &mut missed);
        }
        let Some(track) = track else { continue };
        let track = match before {
            Some(before)
                if before.stored != Stored::Rotors
                    && before.keys.len() >= clip.grid.count()
                    && !has_rows_of(&track, before) =>
            {
                at_its_own_times(before, &track)
            }
            _ => track,
        };
        if before != Some(&track) {
            result = result.with_rotation(joint, track);
        }
    }
    let last = result.joints.iter().filter_map(|tracks| tracks.rotation.as_ref()?.times.span());
    result.duration_secs = last.map(|(_, last)| last).fold(result.duration_secs, f64::max);
    if result.duration_secs > clip.duration_secs
        && let Times::Even { step_secs, count } = &mut result.grid.times
    {
        *count = (*count).max((result.duration_secs / *step_secs).round() as usize + 1);
    }
    (result, missed)
}

/// Whether a track still has the rows of another, in the same form.
fn has_rows_of(track: &RotationTrack, other: &RotationTrack) -> bool {
    let [own, others] = [track, other].map(|track| std::mem::discriminant(&track.stored));
    own == others && track.times == other.times
}

fn changed(
    track: Option<RotationTrack>,
    change: &KeyChange,
    near_secs: f64,
    rest: Rotor,
    missed: &mut usize,
) -> Option<RotationTrack> {
    let Some(track) = track else {
        // Nothing is there yet: the first new key begins the track.
        let KeyChange::Insert(keys) = change else {
            *missed += 1;
            return None;
        };
        let (first, others) = keys.split_first()?;
        let begin = RotationTrack::from_rotors(
            Times::Listed([first.secs.max(0.0)].into()),
            vec![first.rotor.unwrap_or(rest)],
        );
        return Some(with_new_keys(&begin, others, near_secs));
    };
    let mut found = |secs: &[f64]| -> Vec<usize> {
        let keys: Vec<usize> = secs.iter().filter_map(|&secs| key_near(&track, secs, near_secs)).collect();
        *missed += secs.len() - keys.len();
        keys
    };
    Some(match change {
        KeyChange::Insert(keys) => {
            let sound: Vec<NewKey> = keys.iter().filter(|key| key.secs.is_finite()).copied().collect();
            let lost = keys.len() - sound.len();
            *missed += lost;
            with_new_keys(&track, &sound, near_secs)
        }
        KeyChange::Set(keys) => {
            let changes: Vec<(usize, Rotor)> = keys
                .iter()
                .filter_map(|&(secs, rotor)| {
                    let key = found(&[secs]).first().copied()?;
                    Some((key, rotor.try_normalize()?.aligned_to(track.keys[key])))
                })
                .collect();
            with_turned_keys(&track, &changes)
        }
        KeyChange::Move(moves) => {
            let moves: Vec<(usize, f64)> = moves
                .iter()
                .filter(|[_, to]| to.is_finite())
                .filter_map(|&[from, to]| Some((found(&[from]).first().copied()?, to.max(0.0))))
                .collect();
            moved(&track, &moves)
        }
        KeyChange::Delete(secs) => {
            let mut gone = found(secs);
            gone.sort_unstable();
            gone.dedup();
            if gone.len() == track.keys.len() {
                gone.pop();
            }
            track.without_keys(&gone).unwrap_or(track)
        }
        KeyChange::Path(starts, kind) => {
            let segments = found(starts);
            each_segment(track, &segments, missed, |track, own| track.with_path(own..own + 1, *kind).ok())
        }
        KeyChange::Space(starts, spacing) => {
            let segments = found(starts);
            each_segment(track, &segments, missed, |track, own| {
                track.with_spacing(own..own + 1, *spacing).ok()
            })
        }
        KeyChange::Turn(starts, turn) => {
            let segments = found(starts);
            each_segment(track, &segments, missed, |track, own| track.with_turn(own, *turn).ok())
        }
    })
}

fn each_segment(
    track: RotationTrack,
    segments: &[usize],
    missed: &mut usize,
    change: impl Fn(&RotationTrack, usize) -> Option<RotationTrack>,
) -> RotationTrack {
    segments.iter().fold(track, |track, &segment| {
        change(&track, segment).unwrap_or_else(|| {
            *missed += 1;
            track
        })
    })
}

/// The key at a time, give or take.
fn key_near(track: &RotationTrack, secs: f64, near_secs: f64) -> Option<usize> {
    let key = track.times.nearest(secs);
    (!track.times.is_empty() && (track.times.at(key) - secs).abs() <= near_secs).then_some(key)
}

/// The track with new keys.
pub(super) fn with_new_keys(track: &RotationTrack, new: &[NewKey], near_secs: f64) -> RotationTrack {
    // One by one copies the track each time; that is only needed where a segment has more to divide than its way.
    if track.segments.are_plain() && track.tangents.is_none() {
        return with_plain_keys(track, new, near_secs);
    }
    new.iter().fold(track.clone(), |track, key| inserted(&track, key, near_secs))
}

/// As [`with_new_keys`], all at once.
fn with_plain_keys(track: &RotationTrack, new: &[NewKey], near_secs: f64) -> RotationTrack {
    let mut changes: Vec<(usize, Rotor)> = Vec::new();
    let mut added: Vec<(f64, Rotor)> = Vec::new();
    let times: Vec<f64> = new.iter().map(|key| key.secs.max(0.0)).collect();
    let played = track.at_all(&times);
    for ((key, &secs), played) in new.iter().zip(&times).zip(played) {
        let wanted = key.rotor.and_then(Rotor::try_normalize);
        match key_near(track, secs, near_secs) {
            Some(own) => changes.extend(wanted.map(|rotor| (own, rotor.aligned_to(track.keys[own])))),
            None => added.push((secs, wanted.unwrap_or(played))),
        }
    }
    let track = if changes.is_empty() { track.clone() } else { track.with_keys(&changes) };
    // Of new keys at the same time the last one counts.
    added.reverse();
    added.sort_by(|a, b| a.0.total_cmp(&b.0));
    added.dedup_by(|later, earlier| later.0 - earlier.0 <= near_secs);
    if added.is_empty() {
        return track;
    }
    let mut rows: Vec<(f64, Rotor, PathKind)> = track
        .times
        .iter()
        .zip(track.keys.iter())
        .enumerate()
        .map(|(key, (secs, &rotor))| (secs, rotor, track.paths.of(key)))
        .collect();
    for (secs, rotor) in added {
        let before = track.times.place(secs).map_or(0, |place| match place {
            Place::At(key) => key + usize::from(track.times.at(key) < secs),
            Place::Between(key, _) => key + 1,
        });
        let near = track.keys[before.min(track.keys.len() - 1)];
        rows.push((secs, rotor.aligned_to(near), track.paths.of(before.saturating_sub(1))));
    }
    rows.sort_by(|a, b| a.0.total_cmp(&b.0));
    let kinds: Vec<PathKind> = rows[..rows.len() - 1].iter().map(|row| row.2).collect();
    RotationTrack {
        times: Times::Listed(rows.iter().map(|row| row.0).collect()),
        keys: rows.iter().map(|row| row.1).collect(),
        paths: Paths::from_kinds(&kinds),
        stored: Stored::Rotors,
        ..track
    }
}

fn inserted(track: &RotationTrack, new: &NewKey, near_secs: f64) -> RotationTrack {
    let secs = new.secs.max(0.0);
    let (track, key) = if let Some(key) = key_near(track, secs, near_secs) {
        (track.clone(), key)
    } else {
        let grown = track.with_key_at(secs).unwrap_or_else(|_| with_end_at(track, secs));
        let key = grown.times.nearest(secs);
        (grown, key)
    };
    match new.rotor.and_then(Rotor::try_normalize) {
        Some(rotor) => with_turned_keys(&track, &[(key, rotor.aligned_to(track.keys[key]))]),
        None => track,
    }
}

/// The track with one more key before its first or behind its last, which goes on with the end's turn.
fn with_end_at(track: &RotationTrack, secs: f64) -> RotationTrack {
    let own = track.times.iter().zip(0..);
    let rows: Vec<(f64, usize)> = if secs < track.times.at(0) {
        std::iter::once((secs, 0)).chain(own).collect()
    } else {
        own.chain([(secs, track.keys.len() - 1)]).collect()
    };
    rearranged(track, &rows)
}

/// Other turns at keys, and tangents turned along with them.
pub(super) fn with_turned_keys(track: &RotationTrack, changes: &[(usize, Rotor)]) -> RotationTrack {
    let mut turned = track.with_keys(changes);
    if let Some(tangents) = &track.tangents {
        let mut tangents = tangents.to_vec();
        for &(key, rotor) in changes {
            let by = rotor * track.sound_key(key).reverse();
            tangents[key] = tangents[key].map(|tangent| by * tangent);
        }
        turned.tangents = Some(tangents.into());
    }
    turned
}

fn moved(track: &RotationTrack, moves: &[(usize, f64)]) -> RotationTrack {
    /// Nearer than this no two keys can be: the times would be one in a file of 32 bits.
    const SAME_SECS: f64 = 1e-5;
    let mut is_moved = vec![false; track.keys.len()];
    for &(key, _) in moves {
        is_moved[key] = true;
    }
    let mut taken: Vec<f64> = moves.iter().map(|&(_, to)| to).collect();
    taken.sort_by(f64::total_cmp);
    let is_free = |secs: f64| {
        let from = taken.partition_point(|&to| to < secs - SAME_SECS);
        taken.get(from).is_none_or(|&to| to > secs + SAME_SECS)
    };
    let staying = (0..track.keys.len()).filter(|&key| !is_moved[key]).map(|key| (track.times.at(key), key));
    let mut rows: Vec<(f64, usize)> = staying.filter(|&(secs, _)| is_free(secs)).collect();
    rows.extend(moves.iter().map(|&(key, to)| (to, key)));
    // Of keys moved onto each other the one named last stays.
    rows.reverse();
    rows.sort_by(|a, b| a.0.total_cmp(&b.0));
    rows.dedup_by(|later, earlier| later.0 - earlier.0 <= SAME_SECS);
    rearranged(track, &rows)
}

/// The track with these keys: for each a time, rising, and which of the track's own keys it is. A segment goes with the key it
/// starts at.
fn rearranged(track: &RotationTrack, rows: &[(f64, usize)]) -> RotationTrack {
    let own: Vec<usize> = rows.iter().map(|&(_, key)| key).collect();
    let starts = &own[..own.len().saturating_sub(1)];
    let kinds: Vec<PathKind> = starts.iter().map(|&key| track.paths.of(key)).collect();
    let each: Vec<_> = starts.iter().map(|&key| track.segments.of(key)).collect();
    RotationTrack {
        times: Times::Listed(rows.iter().map(|&(secs, _)| secs).collect()),
        keys: own.iter().map(|&key| track.keys[key]).collect(),
        paths: if kinds.is_empty() { track.paths.clone() } else { Paths::from_kinds(&kinds) },
        tangents: track.tangents.as_ref().map(|all| own.iter().map(|&key| all[key]).collect()),
        segments: Segments::new(&each, track.segments.ends()).unwrap_or_default(),
        stored: track.stored.only(&own),
    }
}

/// `before` with the turns that `edited` plays at its keys; a key that does not move keeps its numbers.
fn at_its_own_times(before: &RotationTrack, edited: &RotationTrack) -> RotationTrack {
    /// Rounding of playing: no change that anybody made.
    const STILL_RAD: f64 = 1e-9;
    let times: Vec<f64> = before.times.iter().collect();
    let played = edited.at_all(&times);
    let changes: Vec<(usize, Rotor)> = played
        .into_iter()
        .enumerate()
        .filter(|&(key, rotor)| rotor.turn_to(before.sound_key(key)) > STILL_RAD)
        .map(|(key, rotor)| (key, rotor.aligned_to(before.keys[key])))
        .collect();
    before.with_keys(&changes)
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::clip::{FileAngles, FrameGrid, JointTracks};
    use crate::rotor::{Axis, EulerOrder};
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    fn turn(degrees: f64) -> Rotor {
        Axis::Z.rotor(degrees.to_radians())
    }

    fn clip_of(track: Option<RotationTrack>) -> Clip {
        let joint = Joint {
            name: "Boom".to_owned(),
            number: 0,
            parent: None,
            rest: Transform { rotation: turn(5.0), ..Transform::IDENTITY },
            kind: JointKind::Joint,
            tips: vec![],
        };
        Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new(vec![joint]).unwrap()),
            joints: vec![Arc::new(JointTracks { rotation: track, ..JointTracks::default() })],
            grid: FrameGrid::even(10.0, 4.0),
            duration_secs: 4.0,
        }
    }

    fn sparse() -> Clip {
        let times = Times::Listed([0.0, 1.0, 2.0, 4.0].into());
        clip_of(Some(RotationTrack::from_rotors(times, vec![turn(0.0), turn(40.0), -turn(60.0), turn(60.0)])))
    }

    fn edited(clip: &Clip, changes: Vec<KeyChange>) -> (RotationTrack, usize) {
        let edits: Vec<KeyEdit> = changes.into_iter().map(|change| KeyEdit { joint: 0, change }).collect();
        let (clip, missed) = with_key_edits(clip, &edits);
        (clip.rotation(0).unwrap().clone(), missed)
    }

    fn times(track: &RotationTrack) -> Vec<f64> {
        track.times.iter().collect()
    }

    #[test]
    fn keys_are_added_set_and_taken_away() {
        let new = |secs, rotor| NewKey { secs, rotor };
        let (track, missed) = edited(
            &sparse(),
            vec![
                KeyChange::Insert(vec![
                    new(0.5, None),
                    new(3.0, Some(turn(90.0))),
                    new(5.0, Some(turn(10.0))),
                ]),
                KeyChange::Set(vec![(1.01, turn(45.0)), (1.3, turn(9.0))]),
                KeyChange::Delete(vec![2.0]),
            ],
        );
        assert_eq!(missed, 1, "nothing stands at 1.3");
        assert_eq!(times(&track), [0.0, 0.5, 1.0, 3.0, 4.0, 5.0]);
        for (secs, degrees) in [(0.5, 20.0), (1.0, 45.0), (3.0, 90.0), (4.0, 60.0), (5.0, 10.0)] {
            assert!(track.at(secs).turn_to(turn(degrees)) < 1e-12, "{secs}");
        }
        // Keys that nobody named keep their bits.
        assert_eq!(track.keys[4], turn(60.0));
    }

    #[test]
    fn keys_move_past_each_other_and_onto_each_other() {
        let (track, missed) = edited(&sparse(), vec![KeyEdit::shift(0, &[1.0, 2.0], 1.0).change]);
        assert_eq!((times(&track), missed), (vec![0.0, 2.0, 3.0, 4.0], 0));
        assert!(track.at(2.0).turn_to(turn(40.0)) < 1e-12);
        assert_eq!(track.keys[2], -turn(60.0));
        let (track, _) = edited(&sparse(), vec![KeyEdit::scale(0, &[0.0, 1.0, 2.0], 0.0, 2.0).change]);
        assert_eq!(times(&track), [0.0, 2.0, 4.0], "the one that stood at 4 gave way");
        assert!(track.at(4.0).turn_to(turn(60.0)) < 1e-12);
        let (track, _) = edited(&sparse(), vec![KeyChange::Move(vec![[0.0, 3.0], [1.0, -1.0]])]);
        assert_eq!(times(&track), [0.0, 2.0, 3.0, 4.0]);
        assert!(track.at(0.0).turn_to(turn(40.0)) < 1e-12 && track.at(3.0).turn_to(turn(0.0)) < 1e-12);
        let longer = [KeyEdit { joint: 0, change: KeyChange::Move(vec![[4.0, 6.0]]) }];
        let (clip, _) = with_key_edits(&sparse(), &longer);
        assert_eq!((clip.duration_secs, clip.grid.count()), (6.0, 61));
    }

    #[test]
    fn the_last_key_stays_and_an_empty_track_begins() {
        let (track, _) = edited(&sparse(), vec![KeyChange::Delete(vec![0.0, 1.0, 2.0, 4.0])]);
        assert_eq!(track.keys.len(), 1);
        let insert = KeyChange::Insert(vec![
            NewKey { secs: 1.0, rotor: None },
            NewKey { secs: 0.0, rotor: Some(turn(9.0)) },
        ]);
        let (track, missed) = edited(&clip_of(None), vec![insert]);
        assert_eq!((times(&track), missed), (vec![0.0, 1.0], 0));
        assert!(track.at(1.0).turn_to(turn(5.0)) < 1e-12, "the rest");
    }

    #[test]
    fn rows_of_a_file_take_on_what_the_edited_keys_play() {
        let rows = Times::Even { step_secs: 0.1, count: 41 };
        let degrees = (0..41).map(|row| [if row == 20 { 50.0 } else { f64::from(row) }, 0.0, 0.0]).collect();
        let order = EulerOrder::ZXY;
        let angles = FileAngles { axes: order.axes().to_vec(), order, degrees };
        let before = RotationTrack::from_angles(rows, angles);
        let clip = clip_of(Some(before.clone()));
        // The spike's key goes, and its row lies on the way between its neighbours.
        let (track, _) = edited(&clip, vec![KeyChange::Delete(vec![2.0])]);
        assert_eq!(track.changed_keys(&before), [20]);
        assert!((track.file_angles().unwrap().degrees[20][0] - 20.0).abs() < 1e-9);
    }
}

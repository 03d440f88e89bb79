//! Whole clips with fewer keys.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use rayon::prelude::*;

use crate::skeleton::Skeleton;

use super::super::rotation_track::RotationTrack;
use super::super::take::{Clip, FrameGrid, JointTracks};
use super::super::times::Times;
use super::super::vector_track::VectorTrack;
use super::spans::{MOST_ENDS, Row, Together, fewest};
use super::tips;

/// What may change, and where.
#[derive(Clone, Debug, PartialEq)]
pub struct ReduceOptions {
    /// The most that a joint's turn relative to its parent may change at any time, in radians, 0 to 45°.
    pub bound_rad: f64,
    /// The most that a joint's place may change, as a share of the skeleton's height; sizes by the same share of 1.
    pub place_share: f64,
    /// The most that the end of a limb may move in the scene, in the file's lengths; `None` for no such bound. It is held at
    /// every key and frame and at three times between neighbours of them.
    pub tip_bound: Option<f64>,
    /// The joints to reduce; `None` for all.
    pub joints: Option<Vec<usize>>,
    /// First and last second of the part to reduce; `None` for all of it. Keys outside stay.
    pub span_secs: Option<[f64; 2]>,
    /// Times whose keys stay where a track has some: contacts, borders of mends.
    pub keep_secs: Vec<f64>,
}

impl ReduceOptions {
    /// All joints within a bound, all the time; places within a thousandth of the skeleton's height.
    pub fn within(bound_rad: f64) -> Self {
        Self {
            bound_rad,
            place_share: 1e-3,
            tip_bound: None,
            joints: None,
            span_secs: None,
            keep_secs: Vec::new(),
        }
    }
}

/// How many keys there were and are, of turns, places and sizes together.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct KeyCount {
    /// Before.
    pub before: usize,
    /// After.
    pub after: usize,
}

/// `clip` with as few keys as its bounds allow, each track for itself. Joints that would not lose a key stay shared.
#[must_use]
pub fn reduced(clip: &Clip, options: &ReduceOptions) -> (Clip, KeyCount) {
    let mut result = clip.clone();
    let place_bound = options.place_share * height(&clip.skeleton);
    let joints: Vec<Arc<JointTracks>> = clip
        .joints
        .par_iter()
        .enumerate()
        .map(|(joint, tracks)| match &options.joints {
            Some(wanted) if !wanted.contains(&joint) => Arc::clone(tracks),
            _ => reduced_joint(tracks, options, place_bound, &options.keep_secs),
        })
        .collect();
    result.joints = joints;
    if let Some(bound) = options.tip_bound {
        hold_tips(clip, &mut result, options, place_bound, bound);
    }
    let count = KeyCount { before: key_count(clip), after: key_count(&result) };
    (result, count)
}

/// Keeps more keys until the ends of limbs stay where they were.
fn hold_tips(clip: &Clip, result: &mut Clip, options: &ReduceOptions, place_bound: f64, bound: f64) {
    /// Every round keeps a key more in each stretch that is off; what is still off then gets all its keys back.
    const MOST_ROUNDS: usize = 24;
    let mut kept: BTreeMap<usize, BTreeSet<u64>> = BTreeMap::new();
    for round in 0..=MOST_ROUNDS {
        let wanted = tips::keys_wanted(clip, result, bound);
        if wanted.is_empty() {
            return;
        }
        let mut changed = BTreeSet::new();
        for (joint, secs) in wanted {
            if round == MOST_ROUNDS || kept.entry(joint).or_default().insert(secs.to_bits()) {
                changed.insert(joint);
            }
        }
        if changed.is_empty() || round == MOST_ROUNDS {
            let all: Vec<usize> = changed.iter().chain(kept.keys()).copied().collect();
            for joint in all {
                result.joints[joint] = Arc::clone(&clip.joints[joint]);
            }
            continue;
        }
        let again: Vec<(usize, Arc<JointTracks>)> = changed
            .into_par_iter()
            .map(|joint| {
                let own = kept.get(&joint).into_iter().flatten().map(|&bits| f64::from_bits(bits));
                let keep: Vec<f64> = options.keep_secs.iter().copied().chain(own).collect();
                (joint, reduced_joint(&clip.joints[joint], options, place_bound, &keep))
            })
            .collect();
        for (joint, tracks) in again {
            result.joints[joint] = tracks;
        }
    }
}

/// As [`reduced`], with the keys of all tracks at the same times, as a table of rows needs them; `options.joints` and
/// `options.tip_bound` are not looked at. The frames of the result are its keys.
///
/// Tracks that do not have their keys at the same times are first given a key at each time that one of them has.
#[must_use]
pub fn reduced_together(clip: &Clip, options: &ReduceOptions) -> (Clip, KeyCount) {
    let even = with_shared_times(clip);
    let times: Vec<f64> = even.grid.times.iter().collect();
    let place_bound = options.place_share * height(&clip.skeleton);
    let mut rows: Vec<Box<dyn Row + Send + '_>> = Vec::new();
    for tracks in &even.joints {
        if let Some(row) = tracks.rotation.as_ref().and_then(|track| track.slerp_row(options.bound_rad)) {
            rows.push(Box::new(row));
        }
        let places = tracks.translation.as_ref().and_then(|track| track.row(place_bound));
        let sizes = tracks.scale.as_ref().and_then(|track| track.row(options.place_share));
        rows.extend(places.into_iter().chain(sizes).map(|row| Box::new(row) as Box<dyn Row + Send>));
    }
    let before = KeyCount { before: times.len(), after: times.len() };
    if rows.is_empty() {
        return (clip.clone(), before);
    }
    let [first, last] = options.span_secs.unwrap_or([f64::NEG_INFINITY, f64::INFINITY]);
    let stays = |&key: &usize| {
        let secs = times[key];
        secs < first || secs > last || options.keep_secs.iter().any(|&kept| even.grid.frame(kept) == key)
    };
    let keep = keys_to_keep(times.len(), stays, &times, [first, last]);
    let chosen = fewest(&mut Together(rows), &keep, MOST_ENDS);
    if chosen.len() >= times.len() {
        return (clip.clone(), before);
    }
    let joints = even.joints.iter().map(|tracks| {
        Arc::new(JointTracks {
            rotation: tracks.rotation.as_ref().map(|track| track.with_only(&chosen)),
            translation: tracks.translation.as_ref().map(|track| track.with_only(&chosen)),
            scale: tracks.scale.as_ref().map(|track| track.with_only(&chosen)),
        })
    });
    let grid = Times::Listed(chosen.iter().map(|&key| times[key]).collect());
    let result = Clip {
        joints: joints.collect(),
        grid: FrameGrid { times: grid, rate: even.grid.rate },
        ..even.clone()
    };
    (result, KeyCount { before: times.len(), after: chosen.len() })
}

/// Keys that stay, and the first and the last within the span.
fn keys_to_keep(
    count: usize,
    stays: impl Fn(&usize) -> bool,
    times: &[f64],
    [first, last]: [f64; 2],
) -> Vec<usize> {
    let start = times.iter().position(|&secs| secs >= first);
    let end = times.iter().rposition(|&secs| secs <= last);
    (0..count).filter(|key| stays(key) || Some(*key) == start || Some(*key) == end).collect()
}

/// The clip with all tracks at the same times: those of all keys and frames.
fn with_shared_times(clip: &Clip) -> Clip {
    let has_them = |times: &Times| *times == clip.grid.times;
    let all_times = |tracks: &JointTracks| {
        let turns = tracks.rotation.as_ref().map(|track| track.times.clone());
        let places = tracks.translation.as_ref().map(|track| track.times.clone());
        let sizes = tracks.scale.as_ref().map(|track| track.times.clone());
        [turns, places, sizes].into_iter().flatten().filter(|times| !times.is_empty()).collect::<Vec<_>>()
    };
    let is_plain = |tracks: &JointTracks| {
        tracks.rotation.as_ref().is_none_or(|track| track.keys.is_empty() || track.slerp_row(0.0).is_some())
    };
    if clip.joints.iter().all(|tracks| all_times(tracks).iter().all(has_them) && is_plain(tracks)) {
        return clip.clone();
    }
    let keys = clip
        .joints
        .iter()
        .flat_map(|tracks| all_times(tracks))
        .flat_map(|times| times.iter().collect::<Vec<_>>());
    let mut listed: Vec<f64> = clip.grid.times.iter().chain(keys).collect();
    listed.sort_by(f64::total_cmp);
    // Times of different tracks that are the same but for rounding.
    let near = 1e-6 * clip.grid.times.median_step().unwrap_or(1.0);
    listed.dedup_by(|later, earlier| *later - *earlier <= near);
    let times = Times::Listed(listed.clone().into());
    let joints = clip.joints.iter().map(|tracks| {
        let turned = tracks.rotation.as_ref().filter(|track| !track.keys.is_empty());
        let vectors = |track: &VectorTrack| {
            let keys: Option<Arc<[_]>> = listed.iter().map(|&secs| track.at(secs)).collect();
            Some(VectorTrack::straight(times.clone(), keys?))
        };
        Arc::new(JointTracks {
            rotation: turned.map(|track| RotationTrack::from_rotors(times.clone(), track.at_all(&listed))),
            translation: tracks.translation.as_ref().and_then(vectors),
            scale: tracks.scale.as_ref().and_then(vectors),
        })
    });
    Clip {
        joints: joints.collect(),
        grid: FrameGrid { times: times.clone(), rate: clip.grid.rate },
        ..clip.clone()
    }
}

fn reduced_joint(
    tracks: &Arc<JointTracks>,
    options: &ReduceOptions,
    place_bound: f64,
    keep_secs: &[f64],
) -> Arc<JointTracks> {
    let rotation = tracks.rotation.as_ref().map(|track| {
        let Some((span, keep)) = span_of(&track.times, options, keep_secs) else { return track.clone() };
        track.reduced_within(options.bound_rad, &keep, span)
    });
    let vectors = |track: &VectorTrack, bound: f64| {
        let Some((span, mut keep)) = span_of(&track.times, options, keep_secs) else { return track.clone() };
        keep.extend((0..track.keys.len()).filter(|key| key <= span.start() || key >= span.end()));
        keep.sort_unstable();
        track.reduced(bound, &keep)
    };
    let translation = tracks.translation.as_ref().map(|track| vectors(track, place_bound));
    let scale = tracks.scale.as_ref().map(|track| vectors(track, options.place_share));
    let new = JointTracks { rotation, translation, scale };
    if new == **tracks { Arc::clone(tracks) } else { Arc::new(new) }
}

/// The keys to reduce, and those among them to keep.
fn span_of(
    times: &Times,
    options: &ReduceOptions,
    keep_secs: &[f64],
) -> Option<(std::ops::RangeInclusive<usize>, Vec<usize>)> {
    let last = times.len().checked_sub(1)?;
    let near = 0.5 * times.median_step().unwrap_or(0.0);
    let (start, end) = match options.span_secs {
        None => (0, last),
        Some([from, to]) => (
            (0..=last).find(|&key| times.at(key) >= from)?,
            (0..=last).rev().find(|&key| times.at(key) <= to)?,
        ),
    };
    let kept = keep_secs.iter().map(|&secs| (secs, times.nearest(secs)));
    let mut keep: Vec<usize> =
        kept.filter(|&(secs, key)| (times.at(key) - secs).abs() <= near).map(|(_, key)| key).collect();
    keep.sort_unstable();
    keep.dedup();
    (start <= end).then_some((start..=end, keep))
}

fn count_of(tracks: &JointTracks) -> usize {
    let turns = tracks.rotation.as_ref().map_or(0, |track| track.keys.len());
    let places = tracks.translation.as_ref().map_or(0, |track| track.keys.len());
    turns + places + tracks.scale.as_ref().map_or(0, |track| track.keys.len())
}

fn key_count(clip: &Clip) -> usize {
    clip.joints.iter().map(|tracks| count_of(tracks)).sum()
}

/// How tall a skeleton stands at rest, in its own lengths; of one without height, how long it is.
fn height(skeleton: &Skeleton) -> f64 {
    let world = skeleton.world(&skeleton.rest_pose());
    let places = skeleton.joints().iter().zip(&world).flat_map(|(joint, placed)| {
        let tips = joint.tips.iter().map(|&tip| placed.scene_from_joint.transform_point3(tip));
        tips.chain([placed.position()])
    });
    let bounds = places.fold(None, |bounds: Option<[glam::DVec3; 2]>, place| {
        let [low, high] = bounds.unwrap_or([place; 2]);
        Some([low.min(place), high.max(place)])
    });
    let size = bounds.map_or(glam::DVec3::ZERO, |[low, high]| high - low);
    if size.y > 0.1 * size.max_element() { size.y } else { size.max_element() }
}

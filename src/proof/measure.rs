//! What changed between two clips, at all their frames, keys and the middles between.

use std::collections::BTreeSet;
use std::sync::Arc;

use glam::DVec3;
use rayon::prelude::*;

use crate::clip::{Clip, Difference, JointTracks, RotationTrack, Stored, Times, VectorTrack, Worlds};
use crate::rotor::Rotor;
use crate::skeleton::Skeleton;
use crate::snag::Cancelled;
use crate::snag::Progress;

use super::error::ProofError;
use super::rates::{Peak, RateMeasure, rates};

/// What changed in one joint's turn relative to its parent.
#[derive(Clone, Debug, PartialEq)]
pub struct JointMeasure {
    /// Its label.
    pub label: String,
    /// Its index in the clip before.
    pub before_joint: usize,
    /// Its index in the clip after.
    pub after_joint: usize,
    /// The largest change, radians, and when.
    pub change: Peak,
    /// The mean change over all times compared, radians.
    pub mean_rad: f64,
    /// 95 of 100 changes are at most this, radians.
    pub p95_rad: f64,
    /// Keys of the clip after whose numbers changed; `None` where the two files hold turns in different forms.
    pub keys_changed: Option<Vec<usize>>,
    /// Whether nothing of the joint changed in any bit.
    pub untouched: bool,
    /// Turn rate and jerk before.
    pub rates_before: RateMeasure,
    /// Turn rate and jerk after, at the same times.
    pub rates_after: RateMeasure,
}

/// How far the end of a limb moved.
#[derive(Clone, Debug, PartialEq)]
pub struct TipMeasure {
    /// Label of the joint it hangs on.
    pub label: String,
    /// The largest distance, in the file's lengths, and when.
    pub moved: Peak,
    /// The mean distance, in the file's lengths.
    pub mean: f64,
}

/// How many joints of a clip hold their turns in which form.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct StoredForms {
    /// As four numbers.
    pub rotors: usize,
    /// As the file's own angles.
    pub file_angles: usize,
    /// As plane angles.
    pub plane_angles: usize,
}

impl StoredForms {
    fn of(clip: &Clip) -> Self {
        let mut forms = Self::default();
        for track in tracks(clip) {
            *match track.stored {
                Stored::Rotors => &mut forms.rotors,
                Stored::Angles(_) => &mut forms.file_angles,
                Stored::PlaneAngles(_) => &mut forms.plane_angles,
            } += 1;
        }
        forms
    }
}

/// What changed from one clip to another.
#[derive(Clone, Debug, PartialEq)]
pub struct Measurement {
    /// Name of the clip before.
    pub clip: String,
    /// Frames of the clip before.
    pub frames: usize,
    /// Frames a second of the clip before.
    pub rate: f64,
    /// Lengths of the clips in seconds, before and after. Compared is what both have.
    pub durations_secs: [f64; 2],
    /// At how many times the two were compared.
    pub times_compared: usize,
    /// The joints that are in both, in the order of the clip before.
    pub joints: Vec<JointMeasure>,
    /// The ends of limbs.
    pub tips: Vec<TipMeasure>,
    /// Joints of the clip before that the clip after lacks.
    pub only_before: Vec<String>,
    /// Joints of the clip after that the clip before lacks.
    pub only_after: Vec<String>,
    /// Frames at which no number changed; `None` where some joint's turns are held in different forms.
    pub frames_untouched: Option<usize>,
    /// Keys of turns that the two hold, before and after.
    pub keys: [usize; 2],
    /// How the files hold turns, before and after.
    pub stored: [StoredForms; 2],
    /// The largest difference from unit length of any stored rotor, before and after.
    pub off_unit: [f64; 2],
    /// Stored turns that are no numbers, before and after.
    pub not_finite: [usize; 2],
}

impl Measurement {
    /// The joint that changed most.
    pub fn most_changed(&self) -> Option<&JointMeasure> {
        self.joints.iter().max_by(|a, b| a.change.value.total_cmp(&b.change.value))
    }

    /// The largest change of any joint, radians.
    pub fn max_change_rad(&self) -> f64 {
        self.joints.iter().map(|joint| joint.change.value).fold(0.0, f64::max)
    }

    /// The tip that moved farthest.
    pub fn farthest_tip(&self) -> Option<&TipMeasure> {
        self.tips.iter().max_by(|a, b| a.moved.value.total_cmp(&b.moved.value))
    }

    /// How many joints are the same in every bit.
    pub fn joints_untouched(&self) -> usize {
        self.joints.iter().filter(|joint| joint.untouched).count()
    }

    /// The fastest turn of any joint, before and after, radians per second.
    pub fn fastest_rad(&self) -> [f64; 2] {
        self.largest(|rates| rates.fastest.value)
    }

    /// The largest jerk of any joint, before and after, radians per second cubed.
    pub fn jerk_rad(&self) -> [f64; 2] {
        self.largest(|rates| rates.jerk.value)
    }

    fn largest(&self, of: impl Fn(&RateMeasure) -> f64) -> [f64; 2] {
        let before = self.joints.iter().map(|joint| of(&joint.rates_before)).fold(0.0, f64::max);
        let after = self.joints.iter().map(|joint| of(&joint.rates_after)).fold(0.0, f64::max);
        [before, after]
    }
}

/// Measures what changed from `before` to `after`, both as they play.
///
/// Joints are paired by label. Where the two skeletons rest differently (a clip carried to another format), turns are
/// compared as turns away from rest, in scene axes. Times: every frame and key of both, as far as both last, and the
/// middles between.
///
/// # Errors
/// When the two have no joint in common, or `progress` stops the work.
pub fn measure(before: &Clip, after: &Clip, progress: &dyn Progress) -> Result<Measurement, ProofError> {
    let pairs = pair_joints(&before.skeleton, &after.skeleton)?;
    let times = times_to_compare(before, after);
    let turn_rests = [rest_turns(&before.skeleton), rest_turns(&after.skeleton)];
    let done = std::sync::atomic::AtomicUsize::new(0);
    let joints: Option<Vec<JointMeasure>> = pairs
        .par_iter()
        .map(|&[b, a]| {
            let finished = done.fetch_add(1, std::sync::atomic::Ordering::Relaxed);
            progress.report(finished, pairs.len() + 1).then(|| {
                let rests = [turn_rests[0][b], turn_rests[1][a]];
                measure_joint([before, after], [b, a], rests, &times)
            })
        })
        .collect();
    let joints = joints.ok_or(Cancelled)?;
    let tips = measure_tips([before, after], &pairs, &times);

    let in_pairs = |side: usize, joint: usize| pairs.iter().any(|pair| pair[side] == joint);
    let lone = |skeleton: &Skeleton, side: usize| {
        let alone = skeleton.listed().filter(|&joint| !in_pairs(side, joint));
        alone.map(|joint| skeleton.label(joint).to_owned()).collect()
    };
    Ok(Measurement {
        clip: before.name.clone(),
        frames: before.grid.count(),
        rate: before.grid.rate,
        durations_secs: [before.duration_secs, after.duration_secs],
        times_compared: times.len(),
        frames_untouched: frames_untouched(before, after, &joints),
        joints,
        tips,
        only_before: lone(&before.skeleton, 0),
        only_after: lone(&after.skeleton, 1),
        keys: [before, after].map(|clip| tracks(clip).map(|track| track.keys.len()).sum()),
        stored: [before, after].map(StoredForms::of),
        off_unit: [off_unit(before), off_unit(after)],
        not_finite: [not_finite(before), not_finite(after)],
    })
}

fn pair_joints(before: &Skeleton, after: &Skeleton) -> Result<Vec<[usize; 2]>, ProofError> {
    let by_label: std::collections::HashMap<&str, usize> =
        after.listed().map(|joint| (after.label(joint), joint)).collect();
    let pairs: Vec<[usize; 2]> =
        before.listed().filter_map(|b| by_label.get(before.label(b)).map(|&a| [b, a])).collect();
    if pairs.is_empty() {
        let example =
            |skeleton: &Skeleton| skeleton.listed().next().map(|joint| skeleton.label(joint).to_owned());
        return Err(ProofError::NoSharedJoints {
            before: before.listed().count(),
            after: after.listed().count(),
            example_before: example(before).unwrap_or_default(),
            example_after: example(after).unwrap_or_default(),
        });
    }
    Ok(pairs)
}

/// Every frame and key of both clips and the middles between, in seconds, rising.
fn times_to_compare(before: &Clip, after: &Clip) -> Vec<f64> {
    // What lies beyond the end of the shorter is not in both. Half a frame of slack: rates are rounded in files.
    let end = before.duration_secs.min(after.duration_secs) + 0.5 / before.grid.rate.max(1e-9);
    let mut rows: Vec<&Times> = Vec::new();
    for clip in [before, after] {
        let of_tracks =
            clip.joints.iter().filter_map(|tracks| tracks.rotation.as_ref()).map(|track| &track.times);
        for times in std::iter::once(&clip.grid.times).chain(of_tracks) {
            if !rows.contains(&times) {
                rows.push(times);
            }
        }
    }
    let mut times: Vec<f64> = rows.iter().flat_map(|row| row.iter()).filter(|&time| time <= end).collect();
    times.sort_by(f64::total_cmp);
    // Times of the same frame that differ by rounding (f32 in one file, text in the other) are one.
    times.dedup_by(|next, kept| *next - *kept < 1e-6);
    if times.is_empty() {
        times.push(0.0);
    }
    let middles: Vec<f64> = times.windows(2).map(|pair| 0.5 * (pair[0] + pair[1])).collect();
    times.extend(middles);
    times.sort_by(f64::total_cmp);
    times
}

/// For each joint the rest turn of its parent in the scene, and its own rest turn.
fn rest_turns(skeleton: &Skeleton) -> Vec<[Rotor; 2]> {
    let world = skeleton.world(&skeleton.rest_pose());
    let parent_turn = |parent: Option<usize>| parent.map_or(Rotor::IDENTITY, |parent| world[parent].rotation);
    skeleton.joints().iter().map(|joint| [parent_turn(joint.parent), joint.rest.rotation]).collect()
}

/// A joint's orientation relative to its parent as its file plays it.
pub(super) fn turn_at(clip: &Clip, joint: usize, time_secs: f64) -> Rotor {
    match clip.rotation(joint) {
        Some(track) if !track.times.is_empty() => track.at(time_secs),
        _ => clip.skeleton.joints()[joint].rest.rotation,
    }
}

/// What turning by two rests and back may add.
const ROUNDING_RAD: f64 = 1e-9;

fn measure_joint(clips: [&Clip; 2], pair: [usize; 2], rests: [[Rotor; 2]; 2], times: &[f64]) -> JointMeasure {
    let same_rest = rests[0] == rests[1];
    let turns = [0, 1].map(|side| {
        let mut turns = clips[side].rotations_at(pair[side], times);
        if !same_rest {
            let [above, own] = rests[side];
            for turn in &mut turns {
                *turn = above * *turn * own.reverse() * above.reverse();
            }
        }
        turns
    });
    let mut change = Peak::default();
    let mut changes = Vec::with_capacity(times.len());
    for (&time, (before, after)) in times.iter().zip(turns[0].iter().zip(&turns[1])) {
        let turned = before.turn_to(*after);
        if turned > change.value {
            change = Peak { value: turned, at_secs: time };
        }
        changes.push(turned);
    }
    let mean_rad = changes.iter().sum::<f64>() / changes.len() as f64;
    let place = (changes.len() * 95).div_ceil(100).max(1) - 1;
    let p95_rad = *changes.select_nth_unstable_by(place, f64::total_cmp).1;

    let tracks = [0, 1].map(|side| &clips[side].joints[pair[side]]);
    let differences = differences(tracks[0], tracks[1]);
    let untouched = differences.iter().all(|found| found.as_ref().is_some_and(Difference::is_none));
    let [turns_differ, _, _] = differences;
    let keys_changed = turns_differ.map(|found| found.keys);
    let rates_of =
        |side: usize| tracks[side].rotation.as_ref().map(|track| rates(track, clips[0])).unwrap_or_default();
    JointMeasure {
        label: clips[0].skeleton.label(pair[0]).to_owned(),
        before_joint: pair[0],
        after_joint: pair[1],
        change,
        mean_rad,
        p95_rad,
        // A rest that differs moves what has no keys.
        untouched: untouched && change.value < ROUNDING_RAD,
        keys_changed,
        rates_before: rates_of(0),
        rates_after: rates_of(1),
    }
}

/// The points at the ends of limbs: tips of a last joint, or the joint itself where the two clips differ in tips.
fn measure_tips(clips: [&Clip; 2], pairs: &[[usize; 2]], times: &[f64]) -> Vec<TipMeasure> {
    struct Tip {
        pair: [usize; 2],
        point: Option<[DVec3; 2]>,
    }
    let is_last = |joint: usize| {
        let skeleton = &clips[0].skeleton;
        !skeleton.listed().any(|other| skeleton.parent_joint(other) == Some(joint))
    };
    let tips: Vec<Tip> = pairs
        .iter()
        .filter(|pair| is_last(pair[0]))
        .flat_map(|&pair| {
            let own = [0, 1].map(|side| clips[side].skeleton.joints()[pair[side]].tips.as_slice());
            let points: Vec<Option<[DVec3; 2]>> = if own[0].is_empty() || own[0].len() != own[1].len() {
                vec![None]
            } else {
                own[0].iter().zip(own[1]).map(|(&b, &a)| Some([b, a])).collect()
            };
            points.into_iter().map(move |point| Tip { pair, point })
        })
        .collect();
    let place = |worlds: &Worlds, time: usize, tip: &Tip, side: usize| {
        let joint = tip.pair[side];
        tip.point
            .map_or_else(|| worlds.position(joint, time), |points| worlds.point(joint, time, points[side]))
    };
    // Chunks of a fixed length, added up in order: the split of the work among cores does not show in the numbers.
    let chunks: Vec<Vec<(Peak, f64)>> = times
        .par_chunks(256)
        .map(|chunk| {
            let mut sums = vec![(Peak::default(), 0.0); tips.len()];
            let worlds = clips.map(|clip| clip.worlds_at(chunk));
            for (index, &time) in chunk.iter().enumerate() {
                for (tip, (moved, sum)) in tips.iter().zip(&mut sums) {
                    let distance =
                        place(&worlds[0], index, tip, 0).distance(place(&worlds[1], index, tip, 1));
                    *sum += distance;
                    if distance > moved.value {
                        *moved = Peak { value: distance, at_secs: time };
                    }
                }
            }
            sums
        })
        .collect();
    let mut sums = vec![(Peak::default(), 0.0); tips.len()];
    for chunk in chunks {
        for ((moved, sum), (chunk_moved, chunk_sum)) in sums.iter_mut().zip(chunk) {
            if chunk_moved.value > moved.value {
                *moved = chunk_moved;
            }
            *sum += chunk_sum;
        }
    }
    tips.iter()
        .zip(sums)
        .map(|(tip, (moved, sum))| TipMeasure {
            label: clips[0].skeleton.label(tip.pair[0]).to_owned(),
            moved,
            mean: sum / times.len() as f64,
        })
        .collect()
}

fn frames_untouched(before: &Clip, after: &Clip, joints: &[JointMeasure]) -> Option<usize> {
    if before.grid.count() != after.grid.count() {
        return None;
    }
    let mut touched: BTreeSet<usize> = BTreeSet::new();
    for joint in joints {
        let tracks = &after.joints[joint.after_joint];
        let times = [
            tracks.rotation.as_ref().map(|track| &track.times),
            tracks.translation.as_ref().map(|track| &track.times),
            tracks.scale.as_ref().map(|track| &track.times),
        ];
        let none = Times::Listed(Arc::default());
        for (found, times) in differences(&before.joints[joint.before_joint], tracks).into_iter().zip(times) {
            touched.extend(found?.frames(times.unwrap_or(&none), &after.grid));
        }
    }
    Some(before.grid.count() - touched.len())
}

/// Where turns, places and sizes of a joint differ; `None` where bits say nothing.
fn differences(before: &JointTracks, after: &JointTracks) -> [Option<Difference>; 3] {
    let vectors = |before: Option<&VectorTrack>, after: Option<&VectorTrack>| {
        Some(match (before, after) {
            (Some(before), Some(after)) => after.difference(before),
            (None, None) => Difference::default(),
            (_, after) => Difference::whole(after.map_or(0, |track| track.keys.len())),
        })
    };
    let turns = match (&before.rotation, &after.rotation) {
        (Some(before), Some(after)) => after.difference(before),
        (None, None) => Some(Difference::default()),
        (_, after) => Some(Difference::whole(after.as_ref().map_or(0, |track| track.keys.len()))),
    };
    [
        turns,
        vectors(before.translation.as_ref(), after.translation.as_ref()),
        vectors(before.scale.as_ref(), after.scale.as_ref()),
    ]
}

/// The tracks of turns, of carriers too: the file holds them.
fn tracks(clip: &Clip) -> impl Iterator<Item = &RotationTrack> {
    clip.joints.iter().filter_map(|tracks| tracks.rotation.as_ref())
}

fn off_unit(clip: &Clip) -> f64 {
    let keys = tracks(clip).flat_map(|track| track.keys.iter());
    keys.filter(|key| key.is_finite()).map(|key| (key.norm() - 1.0).abs()).fold(0.0, f64::max)
}

fn not_finite(clip: &Clip) -> usize {
    tracks(clip).flat_map(|track| track.keys.iter()).filter(|key| !key.is_finite()).count()
}

//! What is different between a source clip and its result, in a few numbers.

use std::collections::BTreeSet;

use crate::clip::{Clip, Difference, Times};

use super::sampled::rotation_at;
use super::words::{counted, degrees};

/// The sum of all passes.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Changes {
    /// Joints with other numbers than before.
    pub joints: usize,
    /// The result has another skeleton: all its joints and frames are new.
    pub other_skeleton: bool,
    /// Frames of the result at which some joint has other numbers, or plays otherwise between keys.
    pub frames: usize,
    /// By how many frames the result is longer than the source, or shorter where below 0.
    pub longer: isize,
    /// The largest turn between before and after at a changed frame or key, as far as both last, in degrees.
    pub largest_deg: f64,
    /// The joint of the largest change.
    pub largest_joint: Option<String>,
    /// How far poses move over time: for each of up to 400 equal stretches of the clip its start in seconds and the largest
    /// turn of any joint in degrees. Empty where no pose moves.
    pub over_time: Vec<[f64; 2]>,
}

/// As many stretches of time as a narrow plot can show.
const MOST_POINTS: usize = 400;

impl Changes {
    /// The sum of the changes of two clips.
    #[must_use]
    pub fn and(&self, other: &Self) -> Self {
        let larger = if other.largest_deg > self.largest_deg { other } else { self };
        Self {
            joints: self.joints + other.joints,
            other_skeleton: self.other_skeleton || other.other_skeleton,
            frames: self.frames + other.frames,
            longer: self.longer + other.longer,
            largest_deg: larger.largest_deg,
            largest_joint: larger.largest_joint.clone(),
            over_time: larger.over_time.clone(),
        }
    }

    /// One sentence for people.
    pub fn sentence(&self) -> String {
        let longer = match self.longer {
            0 => String::new(),
            frames if frames > 0 => format!("; {} longer", counted(frames.unsigned_abs(), "frame")),
            frames => format!("; {} shorter", counted(frames.unsigned_abs(), "frame")),
        };
        if self.joints == 0 {
            return format!("Nothing is changed{longer}");
        }
        let place = format!("{} of {}", counted(self.frames, "frame"), counted(self.joints, "joint"));
        if self.other_skeleton {
            return format!("{place} carried to another skeleton");
        }
        match &self.largest_joint {
            Some(joint) if self.largest_deg >= 5e-3 => {
                format!("{place} changed, at most by {} ({joint}){longer}", degrees(self.largest_deg))
            }
            _ => format!("{place} rewritten; no pose moves{longer}"),
        }
    }
}

/// Compares a source clip with its result.
pub fn changes(source: &Clip, result: &Clip) -> Changes {
    if !source.has_skeleton_of(result) {
        // Nothing of the two can be compared joint by joint.
        let (joints, frames) = (result.skeleton.listed().count(), result.grid.count());
        return Changes { joints, frames, other_skeleton: true, ..Changes::default() };
    }
    let longer = result.grid.count() as isize - source.grid.count() as isize;
    // The last frame of one may differ from that of the other by rounding.
    let both = source.duration_secs.min(result.duration_secs) + 1e-6;
    let mut found = Changes { longer, ..Changes::default() };
    let mut frames: BTreeSet<usize> = BTreeSet::new();
    let mut stretches = vec![0.0_f64; MOST_POINTS.min(result.grid.count())];
    for joint in 0..result.joints.len() {
        if source.same_joint(result, joint) {
            continue;
        }
        found.joints += 1;
        let (Some(before), Some(after)) = (source.rotation(joint), result.rotation(joint)) else { continue };
        let differing = after.difference(before).unwrap_or_else(|| Difference::whole(after.keys.len()));
        // Frames that the source has not are told as such.
        let is_in_both = |frame: &usize| result.grid.time(*frame) <= both;
        let own: BTreeSet<usize> = differing.frames(&after.times, &result.grid).filter(is_in_both).collect();
        frames.extend(&own);
        // Keys of both that lie between frames, and what lies between keys far apart.
        let between = |time: &f64| (result.grid.time(result.grid.frame(*time)) - time).abs() > 1e-6;
        let at_keys = differing.keys.iter().map(|&key| after.times.at(key)).filter(between);
        // Within a frame the short way between poses tells nothing new, where no keys went and no turns are meant.
        let is_plain = [before, after].iter().all(|track| track.segments.are_plain());
        let is_long = |[start, end]: [f64; 2]| !is_plain || (end - start) * result.grid.rate > 1.5;
        let within = differing.stretches.iter().flat_map(|&[start, end]| {
            let gone: Vec<f64> = times_within(&before.times, [start, end]).collect();
            let ends = [start.max(0.0), end.min(both)];
            let looked_at = !gone.is_empty() || is_long(ends);
            let all: Vec<f64> =
                std::iter::once(ends[0]).chain(gone.iter().copied()).chain([ends[1]]).collect();
            // Where whole turns or a spacing are meant the largest turn is anywhere.
            let parts = if is_plain { 2 } else { 8 };
            let middles: Vec<f64> = all
                .windows(2)
                .flat_map(|two| {
                    (1..parts).map(|part| two[0] + (two[1] - two[0]) * f64::from(part) / f64::from(parts))
                })
                .collect();
            gone.into_iter().filter(between).chain(middles.into_iter().filter(move |_| looked_at))
        });
        let at_frames = own.iter().map(|&frame| result.grid.time(frame));
        let times = at_frames.chain(at_keys).chain(within);
        for time in times.filter(|time| (0.0..=both).contains(time)) {
            let turn =
                rotation_at(source, joint, time).turn_to(rotation_at(result, joint, time)).to_degrees();
            let stretch = stretch_of(result.grid.frame(time), result.grid.count(), stretches.len());
            if let Some(largest) = stretches.get_mut(stretch) {
                *largest = largest.max(turn);
            }
            if turn > found.largest_deg {
                found.largest_deg = turn;
                found.largest_joint = Some(result.skeleton.label(joint).to_owned());
            }
        }
    }
    found.frames = frames.len();
    if found.largest_deg > 0.0 {
        let count = stretches.len();
        let time = |stretch: usize| result.grid.time(stretch * result.grid.count() / count);
        found.over_time = stretches.iter().enumerate().map(|(stretch, &deg)| [time(stretch), deg]).collect();
    }
    found
}

/// Times of keys within a stretch.
fn times_within(times: &Times, [start, end]: [f64; 2]) -> impl Iterator<Item = f64> + '_ {
    let first = if start.is_finite() && !times.is_empty() { times.nearest(start) } else { 0 };
    let rest = (first..times.len()).map(|key| times.at(key));
    rest.skip_while(move |time| *time <= start).take_while(move |time| *time < end)
}

/// Which of `stretches` equal parts of the clip a frame falls into.
fn stretch_of(frame: usize, frames: usize, stretches: usize) -> usize {
    (frame * stretches).checked_div(frames).unwrap_or(0).min(stretches.saturating_sub(1))
}

#[cfg(test)]
mod tests {
    use std::path::Path;
    use std::sync::Arc;

    use super::*;
    use crate::clip::{
        JointTracks, MeantTurn, PathKind, Paths, RotationTrack, Segment, Segments, Spacing, resampled,
    };
    use crate::demo;
    use crate::exchange::{self, OpenOptions};
    use crate::rotor::Axis;

    /// Some keys of a track of rotors.
    fn only(track: &RotationTrack, keys: impl Iterator<Item = usize> + Clone) -> RotationTrack {
        let times: Vec<f64> = keys.clone().map(|key| track.times.at(key)).collect();
        RotationTrack::from_rotors(
            Times::Listed(times.into()),
            keys.map(|key| track.keys[key]).collect::<Vec<_>>(),
        )
    }

    /// The heron's clip with the turns of its first moving joint as `change` makes them.
    fn with_one_joint(clip: &Clip, change: impl Fn(&RotationTrack) -> RotationTrack) -> Clip {
        let moving = |joint: &usize| {
            clip.rotation(*joint).is_some_and(|track| {
                track.keys.len() > 20 && track.sound_key(0).turn_to(track.sound_key(15)) > 0.02
            })
        };
        let joint = (0..clip.joints.len()).find(moving).expect("a joint moves");
        let mut changed = clip.clone();
        let rotation = changed.joints[joint].rotation.as_ref().map(change);
        changed.joints[joint] = Arc::new(JointTracks { rotation, ..(*changed.joints[joint]).clone() });
        changed
    }

    #[test]
    fn keys_that_went_move_the_poses_between() {
        let clip = clip();
        let result = with_one_joint(&clip, |track| only(track, (0..3).chain([track.keys.len() - 1])));
        let found = changes(&clip, &result);
        assert!(found.largest_deg > 0.5, "{found:?}");
        assert_eq!((found.joints, found.frames, found.longer), (1, clip.grid.count() - 4, 0));
        assert!(!found.over_time.is_empty() && !found.sentence().contains("no pose moves"), "{found:?}");
    }

    /// A spike of one frame that a slower rate steps over, and a whole turn within one frame.
    #[test]
    fn what_lies_within_a_frame_is_looked_at() {
        let clip = clip();
        let spike = |track: &RotationTrack| {
            let mut keys = track.keys.to_vec();
            keys[7] = keys[7] * Axis::X.rotor(60.0_f64.to_radians());
            RotationTrack { keys: keys.into(), ..track.clone() }
        };
        let before = with_one_joint(&clip, spike);
        let slower = resampled(&before, 0.5 * before.grid.rate, 0.0, before.duration_secs);
        assert!(changes(&before, &slower).largest_deg > 55.0, "{:?}", changes(&before, &slower));
        let turn = |track: &RotationTrack| {
            let ease = [Segment { turn: MeantTurn::new(1).unwrap(), spacing: Spacing::EaseIn }];
            RotationTrack { segments: Segments::new(&ease, track.segments.ends()).unwrap(), ..track.clone() }
        };
        let found = changes(&clip, &with_one_joint(&clip, turn));
        let exact = |u: f64| (360.0 * u * u).min(360.0 - 360.0 * u * u);
        assert!(found.largest_deg > exact(0.75) - 8.0, "{found:?}");
    }

    #[test]
    fn another_path_between_keys_moves_poses() {
        let sparse = |track: &RotationTrack| only(track, (0..track.keys.len()).step_by(7));
        let clip = clip();
        let before = with_one_joint(&clip, sparse);
        let held =
            |track: &RotationTrack| RotationTrack { paths: Paths::Every(PathKind::Hold), ..sparse(track) };
        let found = changes(&before, &with_one_joint(&clip, held));
        assert!(found.largest_deg > 0.1 && found.frames > 7, "{found:?}");
    }

    #[test]
    fn what_is_longer_is_told_apart_from_what_moved() {
        let clip = clip();
        let longer = crate::clip::FrameGrid::even(clip.grid.rate, clip.duration_secs + 1.0);
        let result = Clip { duration_secs: clip.duration_secs + 1.0, grid: longer, ..clip.clone() };
        let found = changes(&clip, &result);
        assert_eq!(found.longer, clip.grid.rate.round() as isize, "{found:?}");
        assert_eq!((found.joints, found.largest_deg), (0, 0.0));
    }

    fn clip() -> Clip {
        let scene = demo::SCENES.iter().find(|scene| scene.name == "heron").expect("there is a heron");
        let bytes = scene.clip_bytes.to_vec();
        let source = exchange::open_bytes(Path::new(scene.clip_file), bytes, &OpenOptions::default());
        (*source.expect("it opens").clips[0]).clone()
    }
}

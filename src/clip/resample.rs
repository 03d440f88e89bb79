//! A clip at another rate, or a part of it.

use std::ops::RangeInclusive;
use std::sync::Arc;

use glam::DVec3;

use crate::rotor::EndRates;

use super::continuity::continuous_angles;
use super::keys::Keys;
use super::path::{PathKind, Paths, Segment, Segments, turn_of_travel};
use super::rotation_track::{FileAngles, RotationTrack, Stored};
use super::take::{Clip, FrameGrid, JointTracks};
use super::times::{Place, Times};
use super::vector_keys::VectorKeys;
use super::vector_track::{VectorPath, VectorTrack};

/// Times nearer than this to a frame are that frame, as a share of the step between frames.
const SLACK: f64 = 1e-6;

/// The clip from `from_secs` to `to_secs` at `rate` frames a second, beginning at 0.
///
/// Frame `i` shows what the clip shows at `from_secs + i / rate`, as its own format plays it. A frame that falls on a key
/// of its track takes that key's own numbers. Meant turns that are still longer than the short way from frame to frame stay
/// meant.
///
/// # Panics
/// When `rate` is not above 0.
#[must_use]
pub fn resampled(clip: &Clip, rate: f64, from_secs: f64, to_secs: f64) -> Clip {
    assert!(rate > 0.0, "a rate is above 0");
    let count = ((to_secs - from_secs).max(0.0) * rate + SLACK).floor() as usize + 1;
    let times = Times::Even { step_secs: 1.0 / rate, count };
    let at: Vec<f64> = (0..count).map(|frame| from_secs + frame as f64 / rate).collect();
    made_at(clip, times, &at, rate)
}

/// The clip with a key at each of `times`, counted in them.
pub(super) fn resampled_at(clip: &Clip, times: Times, rate: f64) -> Clip {
    let at: Vec<f64> = times.iter().collect();
    made_at(clip, times, &at, rate)
}

fn made_at(clip: &Clip, times: Times, at: &[f64], rate: f64) -> Clip {
    let joints = clip.joints.iter().map(|tracks| {
        Arc::new(JointTracks {
            rotation: tracks
                .rotation
                .as_ref()
                .filter(|track| !track.keys.is_empty())
                .map(|track| rotation_at(track, &times, at)),
            translation: tracks.translation.as_ref().and_then(|track| vectors_at(track, &times, at)),
            scale: tracks.scale.as_ref().and_then(|track| vectors_at(track, &times, at)),
        })
    });
    Clip {
        joints: joints.collect(),
        duration_secs: times.span().map_or(0.0, |(_, last)| last),
        grid: FrameGrid { times, rate },
        ..clip.clone()
    }
}

/// The clip from `from_secs` to `to_secs`, beginning at 0, with its own keys.
///
/// Tracks that have a key at every frame (BVH, CSV) are cut at frames; others (glTF) get a key where the cut falls
/// between two of theirs.
#[must_use]
pub fn cut(clip: &Clip, from_secs: f64, to_secs: f64) -> Clip {
    if clip.grid.times.is_empty() {
        // Of nothing there is no part.
        return clip.clone();
    }
    let span = frames_within(&clip.grid.times, from_secs, to_secs);
    let (grid_times, shift) = match &clip.grid.times {
        Times::Even { step_secs, .. } => (
            Times::Even { step_secs: *step_secs, count: span.end() - span.start() + 1 },
            *span.start() as f64 * step_secs,
        ),
        Times::Listed(times) => {
            let start = times[*span.start()];
            (Times::Listed(times[span.clone()].iter().map(|time| time - start).collect()), start)
        }
    };
    let frames = Frames { all: &clip.grid.times, kept: &grid_times, span, shift, ends: [from_secs, to_secs] };
    let joints = clip.joints.iter().map(|tracks| {
        Arc::new(JointTracks {
            rotation: tracks
                .rotation
                .as_ref()
                .filter(|track| !track.keys.is_empty())
                .map(|track| frames.rotation(track)),
            translation: tracks.translation.as_ref().and_then(|track| frames.vectors(track)),
            scale: tracks.scale.as_ref().and_then(|track| frames.vectors(track)),
        })
    });
    let joints: Vec<_> = joints.collect();
    let last_key = |tracks: &Arc<JointTracks>| {
        let turns = tracks.rotation.as_ref().and_then(|track| track.times.span());
        let places = tracks.translation.as_ref().and_then(|track| track.times.span());
        turns.into_iter().chain(places).map(|(_, last)| last).fold(0.0, f64::max)
    };
    let duration_secs = joints.iter().map(last_key).fold(0.0, f64::max);
    Clip {
        joints,
        grid: FrameGrid { times: grid_times, rate: clip.grid.rate },
        duration_secs,
        ..clip.clone()
    }
}

/// First and last frame within the span; at least one frame.
fn frames_within(times: &Times, from_secs: f64, to_secs: f64) -> RangeInclusive<usize> {
    let step = times.median_step().unwrap_or(1.0);
    let first = (0..times.len()).find(|&frame| times.at(frame) >= from_secs - SLACK * step);
    let first = first.unwrap_or(times.len().saturating_sub(1));
    let last = (first..times.len()).rev().find(|&frame| times.at(frame) <= to_secs + SLACK * step);
    first..=last.unwrap_or(first)
}

fn rotation_at(track: &RotationTrack, times: &Times, at: &[f64]) -> RotationTrack {
    let step = track.times.median_step().unwrap_or(1.0);
    let key_at = |secs: f64| match track.times.place(secs) {
        Some(Place::At(key)) => Some(key),
        Some(Place::Between(key, _)) => {
            [key, key + 1].into_iter().find(|&key| (track.times.at(key) - secs).abs() <= SLACK * step)
        }
        None => None,
    };
    // A time that is a key but for rounding becomes that key's own.
    let snapped: Vec<f64> =
        at.iter().map(|&secs| key_at(secs).map_or(secs, |key| track.times.at(key))).collect();
    let keys = track.at_all(&snapped);
    let is_held =
        (0..track.keys.len().saturating_sub(1)).all(|segment| track.paths.of(segment) == PathKind::Hold);
    let paths = Paths::Every(if is_held && track.keys.len() > 1 { PathKind::Hold } else { PathKind::Slerp });
    let stored = match &track.stored {
        Stored::Rotors => Stored::Rotors,
        Stored::Angles(angles) => {
            let first = key_at(at[0]).map(|key| angles.degrees[key]);
            let near =
                first.filter(|triple| triple.iter().all(|degrees| degrees.is_finite())).unwrap_or_default();
            let radians = continuous_angles(angles.order, &keys, near.map(f64::to_radians));
            let degrees = at.iter().zip(radians).map(|(&secs, triple)| {
                let found = triple.map(f64::to_degrees);
                // At a key the file's own numbers, to the last bit, where these are they but for rounding.
                let own = key_at(secs).map(|key| angles.degrees[key]);
                own.filter(|own| (0..3).all(|i| (own[i] - found[i]).abs() < 1e-9)).unwrap_or(found)
            });
            let degrees = degrees.collect();
            Stored::Angles(FileAngles { degrees, ..angles.clone() })
        }
        Stored::PlaneAngles(_) => {
            Stored::PlaneAngles(keys.iter().map(|key| key.plane_angles().to_degrees()).collect())
        }
    };
    let mut last = keys[0];
    let keys: Keys = keys
        .into_iter()
        .map(|key| {
            last = key.aligned_to(last);
            last
        })
        .collect();
    let segments = if track.segments.have_turns() && paths == Paths::Every(PathKind::Slerp) {
        let steps = (1..keys.len()).map(|frame| {
            let travel = track.travel(snapped[frame - 1], snapped[frame]);
            let turn = turn_of_travel(travel, track.at(snapped[frame - 1]), track.at(snapped[frame]));
            Segment { turn, ..Segment::PLAIN }
        });
        // There are no more turns than before.
        Segments::new(&steps.collect::<Vec<_>>(), EndRates::Secant).unwrap_or_default()
    } else {
        Segments::default()
    };
    RotationTrack { times: times.clone(), keys, paths, tangents: None, segments, stored }
}

fn vectors_at(track: &VectorTrack, times: &Times, at: &[f64]) -> Option<VectorTrack> {
    let keys: Option<VectorKeys> = at.iter().map(|&secs| track.at(secs)).collect();
    let path = if track.path == VectorPath::Hold { VectorPath::Hold } else { VectorPath::Straight };
    Some(VectorTrack { times: times.clone(), keys: keys?, path, tangents: None })
}

/// The part of a clip that is kept.
struct Frames<'a> {
    all: &'a Times,
    kept: &'a Times,
    span: RangeInclusive<usize>,
    /// Time of the first frame kept, seconds.
    shift: f64,
    /// Where the cuts are, seconds.
    ends: [f64; 2],
}

impl Frames<'_> {
    fn rotation(&self, track: &RotationTrack) -> RotationTrack {
        if track.times == *self.all {
            return sliced(track, self.span.clone(), self.kept.clone());
        }
        let (times, span) = self.keys_within(&track.times);
        // Keys at the cuts; the parts keep path, spacing and turns.
        let (mut whole, mut end) = (track.clone(), span.end);
        for (is_cut, secs) in [(times.has_first, self.ends[0]), (times.has_last, self.ends[1])] {
            if !is_cut {
                continue;
            }
            let Ok(more) = whole.with_key_at(secs) else {
                // Before the first key or after the last: it stands.
                let keys: Keys = times.times.iter().map(|_| track.at(secs)).collect();
                return RotationTrack::from_rotors(times.times, keys);
            };
            (whole, end) = (more, end + 1);
        }
        let kept = span.start..=end.saturating_sub(1).max(span.start);
        RotationTrack { stored: Stored::Rotors, ..sliced(&whole, kept, times.times) }
    }

    fn vectors(&self, track: &VectorTrack) -> Option<VectorTrack> {
        if track.times == *self.all {
            let keys: VectorKeys = track.keys[self.span.clone()].into();
            let tangents = track.tangents.as_ref().map(|all| all[self.span.clone()].into());
            return Some(VectorTrack { times: self.kept.clone(), keys, path: track.path, tangents });
        }
        let (times, span) = self.keys_within(&track.times);
        if track.path == VectorPath::Cubic {
            // The three numbers have no length to keep, so a straight track with a key at each frame is near enough.
            let at: Vec<f64> = self.kept.iter().map(|secs| secs + self.shift).collect();
            return vectors_at(track, self.kept, &at);
        }
        let mut keys: Vec<DVec3> = track.keys[span].to_vec();
        if times.has_first {
            keys.insert(0, track.at(self.ends[0])?);
        }
        if times.has_last {
            keys.push(track.at(self.ends[1])?);
        }
        Some(VectorTrack { times: times.times, keys: keys.into(), path: track.path, tangents: None })
    }

    /// Times of the keys within the cuts, from the first cut on, and which keys these are. Keys are added at the cuts
    /// where the track has some on both sides.
    fn keys_within(&self, times: &Times) -> (CutTimes, std::ops::Range<usize>) {
        let [from, to] = self.ends;
        let step = times.median_step().unwrap_or(1.0);
        let inside = |key: &usize| (from - SLACK * step..=to + SLACK * step).contains(&times.at(*key));
        let first = (0..times.len()).find(inside);
        let (start, end) = if let Some(first) = first {
            (first, (first..times.len()).take_while(inside).last().unwrap_or(first) + 1)
        } else {
            let after = (0..times.len()).find(|&key| times.at(key) > to).unwrap_or(times.len());
            (after, after)
        };
        let at_start = start < end && times.at(start) - from <= SLACK * step;
        let at_end = start < end && to - times.at(end - 1) <= SLACK * step;
        let has_first = (start > 0 && !at_start) || start == end;
        let has_last = end < times.len() && !at_end && to > from;
        let mut listed: Vec<f64> = (start..end).map(|key| (times.at(key) - from).max(0.0)).collect();
        if has_first {
            listed.insert(0, 0.0);
        }
        if has_last {
            listed.push(to - from);
        }
        (CutTimes { times: Times::Listed(listed.into()), has_first, has_last }, start..end)
    }
}

struct CutTimes {
    times: Times,
    has_first: bool,
    has_last: bool,
}

/// Spacing and turns of the segments between the keys of `span`. Its ends are the track's own where they are kept.
fn part_of_segments(track: &RotationTrack, span: &RangeInclusive<usize>) -> Segments {
    let is_whole = *span.start() == 0 && span.end() + 1 == track.keys.len();
    let ends = if is_whole { track.segments.ends() } else { EndRates::Secant };
    if track.segments.are_plain() && ends == EndRates::Secant {
        return Segments::default();
    }
    let each: Vec<Segment> = (*span.start()..*span.end()).map(|own| track.segments.of(own)).collect();
    // There are no more turns than before.
    Segments::new(&each, ends).unwrap_or_default()
}

fn sliced(track: &RotationTrack, span: RangeInclusive<usize>, times: Times) -> RotationTrack {
    let paths = match &track.paths {
        Paths::Every(kind) => Paths::Every(*kind),
        Paths::Each(_) => Paths::Each(span.clone().map(|segment| track.paths.of(segment)).collect()),
    };
    let stored = match &track.stored {
        Stored::Rotors => Stored::Rotors,
        Stored::Angles(angles) => {
            Stored::Angles(FileAngles { degrees: angles.degrees[span.clone()].into(), ..angles.clone() })
        }
        Stored::PlaneAngles(degrees) => Stored::PlaneAngles(degrees[span.clone()].into()),
    };
    RotationTrack {
        times,
        keys: track.keys[span.clone()].into(),
        paths,
        segments: part_of_segments(track, &span),
        tangents: track.tangents.as_ref().map(|all| all[span].into()),
        stored,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::rotor::{Axis, EulerOrder, Rotor};
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    fn clip_of(track: RotationTrack, grid: Times, rate: f64) -> Clip {
        let joint = Joint {
            name: "Boom".to_owned(),
            number: 0,
            parent: None,
            rest: Transform::IDENTITY,
            kind: JointKind::Joint,
            tips: vec![],
        };
        let duration_secs = track.times.span().unwrap().1;
        Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new(vec![joint]).unwrap()),
            joints: vec![Arc::new(JointTracks { rotation: Some(track), ..JointTracks::default() })],
            grid: FrameGrid { times: grid, rate },
            duration_secs,
        }
    }

    fn turning_angles() -> Clip {
        // 4 degrees a frame about z at 25 frames a second, wrapped at 180.
        let times = Times::Even { step_secs: 0.04, count: 101 };
        let degrees = (0..101).map(|frame| {
            let turn = 4.0 * f64::from(frame);
            [turn - 360.0 * (turn / 360.0).round(), 0.0, 0.0]
        });
        let angles = FileAngles {
            axes: EulerOrder::ZXY.axes().to_vec(),
            order: EulerOrder::ZXY,
            degrees: degrees.collect(),
        };
        clip_of(RotationTrack::from_angles(times.clone(), angles), times, 25.0)
    }

    #[test]
    fn twice_the_rate_has_every_old_frame_and_the_middles() {
        let clip = turning_angles();
        let fine = resampled(&clip, 50.0, 0.0, clip.duration_secs);
        assert_eq!((fine.grid.count(), fine.duration_secs), (201, 4.0));
        let track = fine.rotation(0).unwrap();
        for frame in 0..201_i32 {
            let expected = Axis::Z.rotor((2.0 * f64::from(frame)).to_radians());
            assert!(track.at(f64::from(frame) / 50.0).turn_to(expected) < 1e-12, "frame {frame}");
        }
        // The new angles run on where the old ones wrapped.
        let degrees = &track.file_angles().unwrap().degrees;
        assert!((degrees[200][0] - 400.0).abs() < 1e-9, "{:?}", degrees[200]);
    }

    #[test]
    fn a_cut_at_frames_keeps_their_numbers() {
        let clip = turning_angles();
        let part = cut(&clip, 1.0, 2.0);
        assert_eq!((part.grid.count(), part.duration_secs), (26, 1.0));
        let (own, all) = (part.rotation(0).unwrap(), clip.rotation(0).unwrap());
        assert_eq!(own.file_angles().unwrap().degrees[..], all.file_angles().unwrap().degrees[25..=50]);
        // Between frames it begins at the next one.
        assert_eq!(cut(&clip, 1.01, 2.01).grid.count(), 25);
    }

    #[test]
    fn a_cut_between_keys_goes_on_as_before() {
        let times = Times::Listed([0.0, 1.0, 3.0].into());
        let keys = [0.0, 80.0, 20.0].map(|degrees: f64| Axis::Y.rotor(degrees.to_radians()));
        let rate = |from: Rotor, to: Rotor| Rotor::from_parts(to.s - from.s, to.bivector() - from.bivector());
        let tangents = [rate(keys[0], keys[1]), rate(keys[0], keys[2]).scale(0.5), rate(keys[1], keys[2])];
        let slerped = RotationTrack::from_rotors(times.clone(), keys);
        let cubic = RotationTrack {
            paths: Paths::Every(PathKind::Cubic),
            tangents: Some(tangents.map(|tangent| [tangent; 2]).into()),
            ..slerped.clone()
        };
        for (track, tolerance) in [(slerped, 1e-12), (cubic, 0.02)] {
            let clip = clip_of(track.clone(), Times::Even { step_secs: 1.0, count: 4 }, 1.0);
            let part = cut(&clip, 0.5, 2.0);
            assert_eq!(part.duration_secs, 1.5);
            for secs in [0.0, 0.2, 0.5, 0.9, 1.5] {
                let turn = part.rotation(0).unwrap().at(secs).turn_to(track.at(secs + 0.5));
                assert!(turn < tolerance, "{turn} at {secs}");
            }
        }
        // A part without a key of its own has the pose there.
        let clip =
            clip_of(RotationTrack::from_rotors(times, keys), Times::Even { step_secs: 1.0, count: 4 }, 1.0);
        let part = cut(&clip, 1.5, 1.75);
        for secs in [0.0, 0.1, 0.25] {
            assert!(
                part.rotation(0).unwrap().at(secs).turn_to(clip.rotation(0).unwrap().at(secs + 1.5)) < 1e-12
            );
        }
    }
}

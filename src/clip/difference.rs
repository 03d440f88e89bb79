//! Where two tracks of one joint hold other numbers, or play otherwise between the same numbers.

use super::path::PathKind;
use super::rotation_track::{RotationTrack, Stored};
use super::take::FrameGrid;
use super::times::Times;
use super::vector_track::VectorTrack;

/// What of a track is not as it was, in any bit.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Difference {
    /// Keys that are new, or have other numbers or another time.
    pub keys: Vec<usize>,
    /// Stretches in seconds, rising, both ends left out, between which the track has other keys, paths or spacing; before the first and
    /// after the last key they go on without end.
    pub stretches: Vec<[f64; 2]>,
}

impl Difference {
    /// That of a track where there was none, or of none where there was one.
    pub fn whole(keys: usize) -> Self {
        Self { keys: (0..keys).collect(), stretches: vec![[f64::NEG_INFINITY, f64::INFINITY]] }
    }

    /// Whether there is none.
    pub fn is_none(&self) -> bool {
        self.keys.is_empty() && self.stretches.is_empty()
    }

    /// Frames that are not as they were, in no order; some may come twice. `times` are those of the keys.
    pub fn frames<'a>(&'a self, times: &'a Times, grid: &'a FrameGrid) -> impl Iterator<Item = usize> + 'a {
        // Times of the same frame may differ by rounding.
        let slack = 0.01 / grid.rate.max(1e-9);
        let at_keys = self.keys.iter().map(|&key| grid.frame(times.at(key)));
        at_keys.chain(self.stretches.iter().flat_map(move |&[start, end]| {
            let frame = |time: f64| grid.frame(time.clamp(-1.0, f64::MAX));
            let (first, last) = (frame(start), frame(end));
            let first = first + usize::from(start.is_finite() && grid.time(first) <= start + slack);
            let end = last + usize::from(!end.is_finite() || grid.time(last) < end - slack);
            first..end.min(grid.count())
        }))
    }
}

impl RotationTrack {
    /// Where this track is not as `other`; `None` where the two hold turns in different forms, so that bits say nothing.
    ///
    /// Squads, splines and B-splines hang on keys further off: of a run of such segments all differ where one does.
    pub fn difference(&self, other: &Self) -> Option<Difference> {
        let same_form = match (&self.stored, &other.stored) {
            (Stored::Angles(own), Stored::Angles(others)) => {
                own.axes == others.axes && own.order == others.order
            }
            (Stored::Rotors, Stored::Rotors) | (Stored::PlaneAngles(_), Stored::PlaneAngles(_)) => true,
            _ => false,
        };
        if !same_form {
            return None;
        }
        let kind = |segment: usize| match self.paths.of(segment) {
            PathKind::Hold | PathKind::Slerp | PathKind::Cubic => Reach::Segment,
            PathKind::Squad | PathKind::Spline => Reach::Run,
            PathKind::BSpline => Reach::RunAndKeys,
        };
        let same_ends = self.segments.ends() == other.segments.ends();
        Some(difference(
            [&self.times, &other.times],
            |own, others| self.same_numbers(own, other, others),
            |own, others| {
                let is_smooth = kind(own) != Reach::Segment;
                self.paths.of(own) == other.paths.of(others)
                    && self.segments.of(own) == other.segments.of(others)
                    && (same_ends || !is_smooth)
            },
            kind,
            self.segments.ends().sides().is_none(),
        ))
    }
}

impl VectorTrack {
    /// Where this track is not as `other`, broken values included.
    pub fn difference(&self, other: &Self) -> Difference {
        let bits = |track: &Self, key: usize| {
            let tangents = track.tangents.as_ref().map(|tangents| tangents[key]);
            let vectors = [Some(track.keys[key]), tangents.map(|both| both[0]), tangents.map(|both| both[1])];
            vectors.map(|vector| vector.map(|vector| vector.to_array().map(f64::to_bits)))
        };
        difference(
            [&self.times, &other.times],
            |own, others| bits(self, own) == bits(other, others),
            |_, _| self.path == other.path,
            |_| Reach::Segment,
            false,
        )
    }
}

/// How far a change goes along a track.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Reach {
    /// No further than the segment.
    Segment,
    /// Through all neighbouring segments that reach as far, keys left out.
    Run,
    /// The same, and the path does not go through the keys.
    RunAndKeys,
}

fn difference(
    [own, others]: [&Times; 2],
    same_key: impl Fn(usize, usize) -> bool,
    same_segment: impl Fn(usize, usize) -> bool,
    reach: impl Fn(usize) -> Reach,
    is_loop: bool,
) -> Difference {
    // The key of the other that each of the own keys is.
    let mut twins = Vec::with_capacity(own.len());
    let mut next = 0;
    for key in 0..own.len() {
        let time = own.at(key);
        while next < others.len() && others.at(next) < time {
            next += 1;
        }
        let is_twin = next < others.len() && others.at(next) == time && same_key(key, next);
        twins.push(is_twin.then_some(next));
    }
    let keys: Vec<usize> = (0..own.len()).filter(|&key| twins[key].is_none()).collect();
    let Some(last) = own.len().checked_sub(1) else {
        let stretches = if others.is_empty() { Vec::new() } else { vec![[f64::NEG_INFINITY, f64::INFINITY]] };
        return Difference { keys, stretches };
    };
    let mut differs: Vec<bool> = (0..last)
        .map(|segment| match (twins[segment], twins[segment + 1]) {
            (Some(twin), Some(next)) => next != twin + 1 || !same_segment(segment, twin),
            _ => true,
        })
        .collect();
    let first_differs = twins[0] != Some(0);
    let last_differs = twins[last].is_none_or(|twin| twin + 1 != others.len());
    let any = first_differs || last_differs || differs.contains(&true);
    let mut start = 0;
    while start < last {
        if reach(start) == Reach::Segment {
            start += 1;
            continue;
        }
        let end = (start..last).find(|&segment| reach(segment) == Reach::Segment).unwrap_or(last);
        // What lies beside a run tells its rates there.
        let beside = start.saturating_sub(1)..(end + 1).min(last);
        let at_ends = (start == 0 && first_differs) || (end == last && last_differs);
        if (is_loop && any) || at_ends || differs[beside].contains(&true) {
            differs[start..end].fill(true);
        }
        start = end;
    }
    let mut stretches: Vec<[f64; 2]> = Vec::new();
    if first_differs {
        stretches.push([f64::NEG_INFINITY, own.at(0)]);
    }
    for segment in (0..last).filter(|&segment| differs[segment]) {
        let [start, end] = [segment, segment + 1].map(|key| own.at(key));
        let passes_by = |segment: usize| reach(segment) == Reach::RunAndKeys;
        match stretches.last_mut() {
            Some(before)
                if segment > 0 && passes_by(segment) && passes_by(segment - 1) && before[1] == start =>
            {
                before[1] = end;
            }
            _ => stretches.push([start, end]),
        }
    }
    if last_differs {
        stretches.push([own.at(last), f64::INFINITY]);
    }
    Difference { keys, stretches }
}

#[cfg(test)]
mod tests {
    use super::super::{PathKind, Paths, Segments};
    use super::*;
    use crate::rotor::{Bivector, EndRates, Rotor};

    fn track(times: &[f64]) -> RotationTrack {
        let key = |time: &f64| Rotor::from_plane_angles(Bivector::new(0.3 * time, 0.1 * time * time, 0.0));
        let keys: Vec<Rotor> = times.iter().map(key).collect();
        RotationTrack::from_rotors(Times::Listed(times.into()), keys)
    }

    /// Frames at whole seconds, 0 to 10.
    fn frames(found: &Difference, track: &RotationTrack) -> Vec<usize> {
        let grid = FrameGrid::even(1.0, 10.0);
        let mut frames: Vec<usize> = found.frames(&track.times, &grid).collect();
        frames.sort_unstable();
        frames.dedup();
        frames
    }

    const EVERY: [f64; 11] = [0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0, 10.0];

    /// That a frame plays the same says nothing of its numbers; that it plays otherwise says that it differs.
    fn holds_all_that_plays_otherwise(after: &RotationTrack, before: &RotationTrack) {
        let found = frames(&after.difference(before).expect("of one form"), after);
        for frame in 0..=10 {
            let time = f64::from(frame);
            let is_other = after.at(time).turn_to(before.at(time)) > 1e-9;
            assert!(!is_other || found.contains(&(frame as usize)), "{frame} of {found:?}");
        }
    }

    #[test]
    fn the_same_track_has_no_difference() {
        assert!(track(&EVERY).difference(&track(&EVERY)).unwrap().is_none());
    }

    #[test]
    fn a_changed_key_among_frames_is_one_frame() {
        let before = track(&EVERY);
        let mut keys = before.keys.to_vec();
        keys[4] = Rotor::IDENTITY;
        let after = RotationTrack { keys: keys.into(), ..before.clone() };
        let found = after.difference(&before).unwrap();
        assert_eq!((found.keys.as_slice(), frames(&found, &after).as_slice()), (&[4][..], &[4][..]));
    }

    #[test]
    fn a_changed_key_far_from_others_changes_all_between() {
        let before = track(&[0.0, 5.0, 10.0]);
        let mut keys = before.keys.to_vec();
        keys[1] = Rotor::IDENTITY;
        let after = RotationTrack { keys: keys.into(), ..before.clone() };
        assert_eq!(frames(&after.difference(&before).unwrap(), &after), (1..10).collect::<Vec<_>>());
        holds_all_that_plays_otherwise(&after, &before);
    }

    #[test]
    fn keys_that_went_or_came_change_what_lies_between() {
        let (all, few) = (track(&EVERY), track(&[0.0, 1.0, 2.0, 6.0, 7.0, 8.0, 9.0, 10.0]));
        let gone = few.difference(&all).unwrap();
        assert_eq!((gone.keys.len(), frames(&gone, &few)), (0, vec![3, 4, 5]));
        let came = all.difference(&few).unwrap();
        assert_eq!((came.keys.as_slice(), frames(&came, &all)), (&[3, 4, 5][..], vec![3, 4, 5]));
        let short = track(&EVERY[2..9]);
        assert_eq!(frames(&short.difference(&all).unwrap(), &short), [0, 1, 9, 10]);
        for [after, before] in [[&all, &few], [&few, &all], [&all, &short], [&short, &all]] {
            holds_all_that_plays_otherwise(after, before);
        }
    }

    #[test]
    fn another_path_between_the_same_keys_is_a_difference() {
        let before = track(&[0.0, 3.0, 6.0, 10.0]);
        let kinds = [PathKind::Slerp, PathKind::Hold, PathKind::Slerp];
        let after = RotationTrack { paths: Paths::from_kinds(&kinds), ..before.clone() };
        let found = after.difference(&before).unwrap();
        assert_eq!((found.keys.len(), frames(&found, &after)), (0, vec![4, 5]));
        holds_all_that_plays_otherwise(&after, &before);
    }

    #[test]
    fn a_spline_differs_as_far_as_it_runs() {
        let kinds = [PathKind::Spline, PathKind::Spline, PathKind::Spline, PathKind::Slerp];
        let before = RotationTrack {
            paths: Paths::from_kinds(&kinds),
            segments: Segments::new(&[], EndRates::Natural).unwrap(),
            ..track(&[0.0, 2.0, 4.0, 6.0, 10.0])
        };
        let mut keys = before.keys.to_vec();
        keys[1] = Rotor::IDENTITY;
        let after = RotationTrack { keys: keys.into(), ..before.clone() };
        assert_eq!(frames(&after.difference(&before).unwrap(), &after), [1, 2, 3, 5]);
        holds_all_that_plays_otherwise(&after, &before);
        // A B-spline passes by its keys.
        let kinds = kinds.map(|kind| if kind == PathKind::Spline { PathKind::BSpline } else { kind });
        let [before, after] =
            [before, after].map(|track| RotationTrack { paths: Paths::from_kinds(&kinds), ..track });
        assert_eq!(frames(&after.difference(&before).unwrap(), &after), [1, 2, 3, 4, 5]);
        holds_all_that_plays_otherwise(&after, &before);
    }
}

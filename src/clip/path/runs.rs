//! Runs of neighbouring segments that are one curve: what it takes to play them, kept until the track is another.

use std::f64::consts::PI;
use std::fmt;
use std::ops::Range;
use std::sync::{Arc, Mutex, PoisonError};

use crate::rotor::{
    BSplineEnds, Bivector, EndRate, EndRates, Motion, RotationBSpline, RotationSpline, Rotor, SplineError,
};

use super::super::rotation_track::RotationTrack;
use super::super::times::Times;
use super::kind::{PathKind, Paths};

/// A turn nearer than this to half a turn goes through its middle, as slerp does: a spline knows no way there.
const HALF_TURN_MARGIN_RAD: f64 = 1e-5;

/// The curve of a run.
#[derive(Debug)]
enum Curve {
    Spline(RotationSpline),
    BSpline(RotationBSpline),
    /// No curve was found: it plays as squad.
    Squad,
}

/// Neighbouring segments of one kind.
#[derive(Debug)]
pub(in super::super) struct Run {
    segments: Range<usize>,
    curve: Curve,
}

impl Run {
    /// The rotation at a time of the path; `None` where squad stands in.
    pub(in super::super) fn at(&self, secs: f64) -> Option<Rotor> {
        match &self.curve {
            Curve::Spline(curve) => Some(curve.at(secs)),
            Curve::BSpline(curve) => Some(curve.at(secs)),
            Curve::Squad => None,
        }
    }

    /// With rate and acceleration by seconds.
    pub(super) fn motion(&self, secs: f64) -> Option<Motion> {
        match &self.curve {
            Curve::Spline(curve) => Some(curve.motion_at(secs)),
            Curve::BSpline(curve) => Some(curve.motion_at(secs)),
            Curve::Squad => None,
        }
    }
}

/// The runs of a track.
#[derive(Debug)]
pub(in super::super) struct Solved {
    runs: Vec<Run>,
    /// Why a run plays as squad, with its first key.
    pub(super) faults: Vec<(usize, SplineError)>,
}

impl Solved {
    /// The run that a segment belongs to.
    pub(in super::super) fn run(&self, segment: usize) -> Option<&Run> {
        let after = self.runs.partition_point(|run| run.segments.start <= segment);
        self.runs.get(after.checked_sub(1)?).filter(|run| run.segments.contains(&segment))
    }

    fn new(track: &RotationTrack, path: Option<PathKind>) -> Self {
        let n_segments = track.keys.len().saturating_sub(1);
        let keys = track.sound_keys();
        let mut solved = Self { runs: Vec::new(), faults: Vec::new() };
        let mut start = 0;
        while start < n_segments {
            let kind = track.kind_of(start, path);
            let end = (start..n_segments)
                .find(|&segment| track.kind_of(segment, path) != kind)
                .unwrap_or(n_segments);
            if matches!(kind, PathKind::Spline | PathKind::BSpline) {
                let curve = curve(track, path, &keys, kind, start..end).unwrap_or_else(|error| {
                    solved.faults.push((start, error));
                    Curve::Squad
                });
                solved.runs.push(Run { segments: start..end, curve });
            }
            start = end;
        }
        solved
    }
}

fn curve(
    track: &RotationTrack,
    path: Option<PathKind>,
    keys: &[Rotor],
    kind: PathKind,
    segments: Range<usize>,
) -> Result<Curve, SplineError> {
    let is_whole = segments.start == 0 && segments.end + 1 == keys.len();
    let is_loop = is_whole && track.segments.ends() == EndRates::Loop;
    let (mut times, mut points) = (Vec::new(), Vec::new());
    for segment in segments.clone() {
        let (start, end) = (track.times.at(segment), track.times.at(segment + 1));
        let lead = track.lead(segment, |key| keys[key]);
        times.push(start);
        points.push(keys[segment]);
        let is_half =
            lead.pieces == 1 && keys[segment].turn_to(keys[segment + 1]) > PI - HALF_TURN_MARGIN_RAD;
        let pieces = if is_half { 2 } else { lead.pieces };
        for piece in 1..pieces {
            let share = piece as f64 / pieces as f64;
            times.push(start + (end - start) * share);
            points.push(lead.at(share));
        }
    }
    times.push(track.times.at(segments.end));
    points.push(keys[segments.end]);
    if kind == PathKind::BSpline {
        let ends = if is_loop { BSplineEnds::Loop } else { BSplineEnds::Natural };
        return RotationBSpline::new(&times, &points, ends).map(Curve::BSpline);
    }
    let ends = if is_loop {
        EndRates::Loop
    } else {
        let own = track.segments.ends().sides().unwrap_or_default();
        let n_segments = keys.len() - 1;
        let start = match segments.start.checked_sub(1) {
            None => own[0],
            Some(before) => border(track, path, keys, before, 1.0).map_or(own[0], EndRate::Given),
        };
        let end = if segments.end == n_segments {
            own[1]
        } else {
            border(track, path, keys, segments.end, 0.0).map_or(own[1], EndRate::Given)
        };
        EndRates::Sides(start, end)
    };
    RotationSpline::new(&times, &points, ends).map(Curve::Spline)
}

/// The rate per second of a neighbouring segment of another kind, at its start or end. `None` beside a held one.
fn border(
    track: &RotationTrack,
    path: Option<PathKind>,
    keys: &[Rotor],
    segment: usize,
    share: f64,
) -> Option<Bivector> {
    let secs = track.times.at(segment + 1) - track.times.at(segment);
    match track.kind_of(segment, path) {
        PathKind::Hold => None,
        PathKind::BSpline => {
            let is_of_run = |own: &usize| track.kind_of(*own, path) == PathKind::BSpline;
            let run = if share == 0.0 {
                segment..(segment..keys.len() - 1).take_while(is_of_run).last()? + 1
            } else {
                (0..=segment).rev().take_while(is_of_run).last()?..segment + 1
            };
            let secs = track.times.at(if share == 0.0 { run.start } else { run.end });
            match curve(track, path, keys, PathKind::BSpline, run).ok()? {
                Curve::BSpline(curve) => Some(curve.motion_at(secs).rate),
                Curve::Spline(_) | Curve::Squad => None,
            }
        }
        kind => Some(track.local_motion(segment, share, kind, path, |key| keys[key]).rate / secs),
    }
}

/// The runs that were solved last, with all they were made of: a track that has become another is told by it.
#[derive(Default)]
pub(super) struct Solutions(Mutex<Option<Box<Solution>>>);

struct Solution {
    of: RotationTrack,
    path: Option<PathKind>,
    solved: Arc<Solved>,
}

impl Clone for Solutions {
    /// Empty: the clone may be about to become another track.
    fn clone(&self) -> Self {
        Self::default()
    }
}

impl fmt::Debug for Solutions {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("Solutions")
    }
}

impl RotationTrack {
    /// The runs, solved once as long as the track is the same.
    pub(in super::super) fn solved(&self, path: Option<PathKind>) -> Arc<Solved> {
        let mut kept = self.segments.solutions.0.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(solution) = &*kept
            && solution.path == path
            && is_same(self, &solution.of)
        {
            return Arc::clone(&solution.solved);
        }
        let solved = Arc::new(Solved::new(self, path));
        *kept = Some(Box::new(Solution { of: self.clone(), path, solved: Arc::clone(&solved) }));
        solved
    }

    /// Why some spline runs of this track play as squad: the run's first key, and what stood in the way.
    pub fn spline_faults(&self, path: Option<PathKind>) -> Vec<(usize, SplineError)> {
        self.solved(path).faults.clone()
    }
}

/// Whether all that the runs are made of is the very same memory. What is shared is never changed in place, and a
/// kept track keeps it from being given back, so equal places are equal values.
fn is_same(own: &RotationTrack, kept: &RotationTrack) -> bool {
    let same_times = match (&own.times, &kept.times) {
        (Times::Listed(own), Times::Listed(kept)) => Arc::ptr_eq(own, kept),
        (own, kept) => own == kept,
    };
    let same_paths = match (&own.paths, &kept.paths) {
        (Paths::Each(own), Paths::Each(kept)) => Arc::ptr_eq(own, kept),
        (own, kept) => own == kept,
    };
    let same_tangents = match (&own.tangents, &kept.tangents) {
        (Some(own), Some(kept)) => Arc::ptr_eq(own, kept),
        (own, kept) => own.is_none() && kept.is_none(),
    };
    let same_segments = match (own.segments.each(), kept.segments.each()) {
        (Some(own), Some(kept)) => Arc::ptr_eq(own, kept),
        (own, kept) => own.is_none() && kept.is_none(),
    };
    same_times
        && same_paths
        && same_tangents
        && same_segments
        && std::ptr::eq::<[Rotor]>(&raw const *own.keys, &raw const *kept.keys)
        && own.segments.ends() == kept.segments.ends()
}

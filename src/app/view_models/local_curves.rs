//! The curves around an edit alone, so that it shows in the next frame however long the clip is.

use crate::clip::{Clip, FrameGrid, KeyChange, PathKind, RotationTrack, Times, pushed, with_key_edits};

use super::curves::{CurveKey, CurveSet, rows_between};
use super::key_drag::Stroke;

/// A stretch of one joint's curves, as an edit makes them.
#[derive(Clone, Debug, PartialEq)]
pub struct LocalCurves {
    /// Which joint.
    pub joint: usize,
    /// The times of the samples in seconds, rising.
    pub times: Vec<f64>,
    /// A row of samples for each curve.
    pub rows: Vec<Vec<f32>>,
    /// The times of the keys within.
    pub keys: Vec<f64>,
}

/// More keys than these are left to the worker.
const MOST_KEYS: usize = 6000;
/// Samples, besides those at keys.
const MOST_SAMPLES: f64 = 600.0;
/// So many keys beside a change a path may run otherwise: its neighbours, and in a spline, where what is felt falls to a quarter with
/// each key, all that could be seen.
const PATH_REACH: usize = 2;
const SPLINE_REACH: usize = 16;

impl LocalCurves {
    /// First and last time in seconds.
    pub fn span(&self) -> [f64; 2] {
        [self.times.first().copied().unwrap_or(0.0), self.times.last().copied().unwrap_or(0.0)]
    }

    /// The value of a curve at a time within.
    pub fn value(&self, line: usize, secs: f64) -> Option<f64> {
        let row = self.rows.get(line)?;
        let after = self.times.partition_point(|&own| own < secs);
        let (before, after) = (after.saturating_sub(1), after.min(self.times.len().checked_sub(1)?));
        let (start, end) = (self.times[before], self.times[after]);
        let share = if end > start { ((secs - start) / (end - start)).clamp(0.0, 1.0) } else { 0.0 };
        Some(f64::from(row[before]) + (f64::from(row[after]) - f64::from(row[before])) * share)
    }
}

/// The times between which a stroke changes a joint.
fn touched(stroke: &Stroke, joint: usize) -> Option<[f64; 2]> {
    let mut times: Vec<f64> = Vec::new();
    match stroke {
        Stroke::Keys(edits) => {
            for edit in edits.iter().filter(|edit| edit.joint == joint) {
                match &edit.change {
                    KeyChange::Insert(keys) => times.extend(keys.iter().map(|key| key.secs)),
                    KeyChange::Set(keys) => times.extend(keys.iter().map(|(secs, _)| *secs)),
                    KeyChange::Move(moves) => times.extend(moves.iter().flatten().copied()),
                    KeyChange::Delete(secs)
                    | KeyChange::Path(secs, _)
                    | KeyChange::Space(secs, _)
                    | KeyChange::Turn(secs, _) => times.extend(secs),
                }
            }
        }
        Stroke::Pushes(pushes) => {
            for push in pushes.iter().filter(|push| push.joint == joint) {
                times.extend([push.center_secs - push.reach_secs, push.center_secs + push.reach_secs]);
            }
        }
    }
    let first = times.iter().copied().reduce(f64::min)?;
    Some([first.max(0.0), times.iter().copied().fold(first, f64::max)])
}

/// The curves of a joint around what a stroke on `base` changes, going on from `known` on the left. `None` where the stroke does
/// not touch the joint, or too much of it to be worked out within a frame.
pub fn local_curves(
    base: &Clip,
    key: &CurveKey,
    stroke: &Stroke,
    known: Option<&CurveSet>,
) -> Option<LocalCurves> {
    let [first_secs, last_secs] = touched(stroke, key.joint)?;
    let track = base.rotation(key.joint).filter(|track| !track.times.is_empty())?;
    let count = track.times.len();
    let is_smooth = |range: std::ops::Range<usize>| {
        range.into_iter().any(|own| matches!(track.paths.of(own), PathKind::Spline | PathKind::BSpline))
    };
    let (from, to) = (track.times.nearest(first_secs), track.times.nearest(last_secs));
    if to - from > MOST_KEYS {
        return None;
    }
    let wide = from.saturating_sub(SPLINE_REACH)..(to + SPLINE_REACH).min(count);
    let reach = if is_smooth(wide) { SPLINE_REACH } else { PATH_REACH };
    // What changes, and so much beside it again, so that it changes as in the whole.
    let (left, right) = (from.saturating_sub(reach), (to + reach).min(count - 1));
    let part = track.part(left.saturating_sub(reach + 1)..(right + reach + 2).min(count));
    let span = [if left == 0 { 0.0 } else { track.times.at(left) }, track.times.at(right).max(last_secs)];
    let small = with_part(base, key.joint, part, span);
    let edited = match stroke {
        Stroke::Keys(edits) => {
            let own: Vec<_> = edits.iter().filter(|edit| edit.joint == key.joint).cloned().collect();
            with_key_edits(&small, &own).0
        }
        Stroke::Pushes(pushes) => {
            let own: Vec<_> = pushes.iter().filter(|push| push.joint == key.joint).copied().collect();
            pushed(&small, &own)
        }
    };
    let keys: Vec<f64> = edited
        .rotation(key.joint)?
        .times
        .iter()
        .filter(|secs| (span[0] - 1e-9..=span[1] + 1e-9).contains(secs))
        .collect();
    let times = sample_times(span, &keys, base.grid.rate);
    let start = known.and_then(|known| known.shown_at(span[0]));
    let rows = rows_between(&edited, key, &times, start);
    Some(LocalCurves { joint: key.joint, times, rows, keys })
}

/// The clip with only a part of one joint's keys, and only the frames there.
fn with_part(base: &Clip, joint: usize, part: RotationTrack, span: [f64; 2]) -> Clip {
    let (first, last) = (base.grid.frame(span[0]), base.grid.frame(span[1]));
    let frames = (first..=last).map(|frame| base.grid.time(frame)).collect();
    let grid = FrameGrid { times: Times::Listed(frames), rate: base.grid.rate };
    Clip { grid, ..base.with_rotation(joint, part) }
}

fn sample_times([start, end]: [f64; 2], keys: &[f64], rate: f64) -> Vec<f64> {
    let steps = ((end - start) * rate * 8.0).clamp(16.0, MOST_SAMPLES) as usize;
    let even = (0..=steps).map(|step| start + (end - start) * step as f64 / steps as f64);
    let mut times: Vec<f64> = even.chain(keys.iter().copied()).collect();
    times.sort_by(f64::total_cmp);
    times.dedup_by(|later, earlier| *later - *earlier < 1e-9);
    times
}

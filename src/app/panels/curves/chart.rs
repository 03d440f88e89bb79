//! The chart as it stands in this frame: what lies where.

use std::sync::Arc;

use egui::{Pos2, Rect, pos2};

use super::super::super::curve_hand::ShownStroke;
use super::super::super::view_models::{CurveSet, Grip, KeyChoice, LocalCurves, is_frame_apart};
use super::super::super::widgets::TimeAxis;
use super::axis::ValueAxis;
use crate::clip::{Clip, RotationTrack};

/// The chart.
pub(super) struct Chart<'a> {
    /// All of it, with the numbers on the left.
    pub area: Rect,
    /// Where curves are.
    pub plot: Rect,
    /// The lane of keys below.
    pub lane: Rect,
    /// Time across.
    pub axis: TimeAxis,
    /// Values up.
    pub values: ValueAxis,
    /// The result.
    pub clip: &'a Arc<Clip>,
    /// What is being done by hand.
    pub shown: Option<&'a ShownStroke>,
    /// The chosen keys, where they are now.
    pub choice: &'a KeyChoice,
    /// The curves, the chosen joint's first.
    pub sets: &'a [Arc<CurveSet>],
    /// Only the source is to be seen.
    pub is_source_alone: bool,
}

/// Pips nearer to each other than this can't be told apart.
const LEAST_APART: f64 = 7.0;
/// Nearer than this the pointer is on a pip, on a curve.
const NEAR_PIP: f32 = 8.0;
/// A pip takes this share of the way to the next one.
const PIP_SHARE: f32 = 0.3;
const NEAR_CURVE: f32 = 5.0;

impl Chart<'_> {
    /// What an edit by hand makes of a joint's curves around it.
    pub(super) fn local(&self, joint: usize) -> Option<&LocalCurves> {
        self.shown?.locals.iter().find(|local| local.joint == joint)
    }

    /// The value of a curve as it is drawn.
    pub(super) fn value(&self, set: &CurveSet, line: usize, secs: f64) -> Option<f64> {
        if let Some(local) = self.local(set.joint) {
            let [start, end] = local.span();
            if (start..=end).contains(&secs) {
                return local.value(line, secs);
            }
        }
        let line = set.lines.get(line)?;
        let row = if self.is_source_alone { &line.before } else { line.shown() };
        set.times.value(row.values(), secs).filter(|value| value.is_finite())
    }

    /// Where a point of a curve is on screen.
    pub(super) fn place(&self, set: &CurveSet, line: usize, secs: f64) -> Option<Pos2> {
        Some(pos2(self.axis.x(secs), self.values.y(self.value(set, line, secs)?)))
    }

    /// The joint's track.
    pub(super) fn track(&self, joint: usize) -> Option<&RotationTrack> {
        self.clip.rotation(joint).filter(|track| !track.times.is_empty())
    }

    /// The times of a joint's keys on screen, rising; `None` where they lie too near to each other to be told apart.
    pub(super) fn keys(&self, joint: usize) -> Option<Vec<f64>> {
        let track = self.track(joint)?;
        let window = self.axis.window;
        let first = track.times.nearest(window.start_secs);
        let last = track.times.nearest(window.end_secs);
        let count = last.saturating_sub(first) + 1;
        if f64::from(self.axis.span.span()) < LEAST_APART * count as f64 {
            return None;
        }
        let span = self.local(joint).map(LocalCurves::span);
        let is_apart = |secs: &f64| span.is_none_or(|[start, end]| !(start..=end).contains(secs));
        let mut keys: Vec<f64> = (first..=last).map(|key| track.times.at(key)).filter(is_apart).collect();
        if let Some(local) = self.local(joint) {
            keys.extend(&local.keys);
            keys.sort_by(f64::total_cmp);
        }
        keys.retain(|secs| window.contains(*secs));
        Some(keys)
    }

    /// The pip under the pointer.
    pub(super) fn pip_at(&self, at: Pos2) -> Option<Grip> {
        let mut best: Option<(f32, Grip)> = None;
        for set in self.sets {
            let keys = self.keys(set.joint).unwrap_or_default();
            // Between pips that lie side by side the curve itself must stay within reach.
            let apart = self.axis.span.span() / keys.len().max(1) as f32;
            let near = NEAR_PIP.min(PIP_SHARE * apart);
            for secs in keys {
                if (self.axis.x(secs) - at.x).abs() > near {
                    continue;
                }
                for line in 0..set.lines.len() {
                    let away = self.place(set, line, secs).map_or(f32::INFINITY, |place| place.distance(at));
                    if away <= near.max(3.0) && best.is_none_or(|(least, _)| away < least) {
                        best = Some((away, Grip { joint: set.joint, secs, line }));
                    }
                }
            }
        }
        best.map(|(_, grip)| grip)
    }

    /// The curve under the pointer.
    pub(super) fn curve_at(&self, at: Pos2) -> Option<Grip> {
        let mut best: Option<(f32, Grip)> = None;
        for set in self.sets {
            for (line, own) in set.lines.iter().enumerate() {
                let row = if self.is_source_alone { &own.before } else { own.shown() };
                let [from, to] = [-1.5, 1.5].map(|by| set.times.place(self.axis.time(at.x + by)));
                let range = if self.local(set.joint).is_some() {
                    self.value(set, line, self.axis.time(at.x)).map(|value| [value as f32; 2])
                } else {
                    row.min_max(from.floor() as usize..to.ceil() as usize + 1)
                };
                let Some([low, high]) = range else { continue };
                let (top, bottom) = (self.values.y(high.into()), self.values.y(low.into()));
                let away = (top - at.y).max(at.y - bottom).max(0.0);
                if away <= NEAR_CURVE && best.is_none_or(|(least, _)| away < least) {
                    best = Some((away, Grip { joint: set.joint, secs: self.axis.time(at.x), line }));
                }
            }
        }
        best.map(|(_, grip)| grip)
    }

    /// The segment of a joint that a time lies in: first and last second.
    pub(super) fn segment(&self, joint: usize, secs: f64) -> Option<[f64; 2]> {
        let track = self.track(joint)?;
        let last = track.times.len().checked_sub(2)?;
        let key = match track.times.place(secs)? {
            crate::clip::Place::At(key) | crate::clip::Place::Between(key, _) => key.min(last),
        };
        Some([track.times.at(key), track.times.at(key + 1)])
    }

    /// Whether the joint has a key at about each frame there.
    pub(super) fn is_dense(&self, joint: usize, secs: f64) -> bool {
        let grid = &self.clip.grid;
        self.segment(joint, secs).is_some_and(|[start, end]| is_frame_apart(grid, end - start))
    }

    /// Chosen keys in a rectangle on screen.
    pub(super) fn keys_in(&self, bounds: Rect) -> KeyChoice {
        let mut choice = KeyChoice::default();
        let [start, end] = [bounds.left(), bounds.right()].map(|x| self.axis.time(x));
        for set in self.sets {
            let Some(track) = self.track(set.joint) else { continue };
            let is_inside = |secs: &f64| {
                (0..set.lines.len()).any(|line| {
                    let y = self.value(set, line, *secs).map(|value| self.values.y(value));
                    y.is_some_and(|y| bounds.y_range().contains(y))
                })
            };
            let within = keys_between(track, start, end).map(|key| track.times.at(key));
            choice.add(set.joint, within.filter(is_inside).collect::<Vec<f64>>());
        }
        choice
    }

    /// All keys between two times.
    pub(super) fn keys_from(&self, start: f64, end: f64) -> KeyChoice {
        let mut choice = KeyChoice::default();
        for set in self.sets {
            if let Some(track) = self.track(set.joint) {
                choice.add(set.joint, keys_between(track, start, end).map(|key| track.times.at(key)));
            }
        }
        choice
    }
}

/// The numbers of the keys between two times.
pub(super) fn keys_between(track: &RotationTrack, start: f64, end: f64) -> impl Iterator<Item = usize> + '_ {
    let first = track.times.nearest(start);
    let last = track.times.nearest(end);
    (first..=last).filter(move |&key| (start..=end).contains(&track.times.at(key)))
}

//! What a gesture on the curves does to keys: from where keys were and how far they were taken to plain edits.

use std::collections::BTreeSet;
use std::sync::Arc;

use crate::clip::{Clip, FrameGrid, KeyChange, KeyEdit, Push, PushFrame, RotationTrack, Spacing, Times};
use crate::limit::{JointLimit, Limits};
use crate::rotor::Rotor;

use super::curve_measure::Measure;
use super::curves::{CurveSet, CurveView};
use super::key_choice::KeyChoice;

/// A place on a curve.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Grip {
    /// Of which joint.
    pub joint: usize,
    /// When, in seconds.
    pub secs: f64,
    /// On which of its curves.
    pub line: usize,
}

/// What is being done, told from where it began.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum KeyDrag {
    /// The chosen keys are taken along, in time, and one number of each in value.
    Move {
        /// Where they are held.
        grip: Grip,
        /// Seconds later.
        by_secs: f64,
        /// Degrees up.
        by_deg: f64,
    },
    /// The chosen keys are drawn out or together.
    Scale {
        /// The time that stays.
        about_secs: f64,
        /// Above 1 is out.
        factor: f64,
    },
    /// A segment gets another spacing.
    Space {
        /// Of which joint.
        joint: usize,
        /// Where it starts.
        start_secs: f64,
        /// How it moves along its way.
        spacing: Spacing,
    },
    /// The motion is pushed softly: whole at the grip, fading to both sides.
    Push {
        /// Where.
        grip: Grip,
        /// Degrees up.
        by_deg: f64,
        /// Seconds to where nothing is left of it.
        reach_secs: f64,
    },
}

/// What a gesture began with.
#[derive(Clone, Debug)]
pub struct KeyBase {
    /// The result as it was.
    pub clip: Arc<Clip>,
    /// The curves as they were, where they had been sampled.
    pub sets: Vec<Arc<CurveSet>>,
    /// The view.
    pub view: CurveView,
    /// What the joints are held against.
    pub limits: Option<Arc<Limits>>,
    /// The chosen keys.
    pub choice: KeyChoice,
    /// Whether moved keys come to stand on frames.
    pub snaps_to_frames: bool,
}

/// Edits by hand.
#[derive(Clone, Debug, PartialEq)]
pub enum Stroke {
    /// Of single keys.
    Keys(Vec<KeyEdit>),
    /// Soft ones.
    Pushes(Vec<Push>),
}

impl Stroke {
    /// Whether nothing is changed.
    pub fn is_empty(&self) -> bool {
        match self {
            Self::Keys(edits) => edits.is_empty(),
            Self::Pushes(pushes) => pushes.is_empty(),
        }
    }

    /// The joints, each once.
    pub fn joints(&self) -> Vec<usize> {
        let mut joints: Vec<usize> = match self {
            Self::Keys(edits) => edits.iter().map(|edit| edit.joint).collect(),
            Self::Pushes(pushes) => pushes.iter().map(|push| push.joint).collect(),
        };
        joints.sort_unstable();
        joints.dedup();
        joints
    }
}

/// The time of the frame nearest to `secs`; frames go on behind the end of an even clip.
pub fn on_frame(grid: &FrameGrid, secs: f64) -> f64 {
    match &grid.times {
        Times::Even { step_secs, .. } => (secs / step_secs).round().max(0.0) * step_secs,
        Times::Listed(_) => {
            let last = grid.time(grid.count().saturating_sub(1));
            if secs > last {
                let step = 1.0 / grid.rate.max(1e-6);
                last + ((secs - last) / step).round() * step
            } else {
                grid.time(grid.frame(secs))
            }
        }
    }
}

/// The key nearest to a time, if it is that key.
pub fn key_at(track: &RotationTrack, secs: f64) -> Option<usize> {
    let key = track.times.nearest(secs);
    (!track.times.is_empty() && (track.times.at(key) - secs).abs() < 1e-5).then_some(key)
}

impl KeyBase {
    fn limit(&self, joint: usize) -> Option<JointLimit> {
        self.limits.as_ref()?.get(joint).copied()
    }

    /// How a joint is measured.
    pub fn measure(&self, joint: usize) -> Measure {
        Measure::new(&self.clip, joint, self.view, self.limit(joint))
    }

    /// The numbers of a joint that are on screen at a time.
    pub fn shown(&self, joint: usize, secs: f64) -> Option<[f64; 3]> {
        self.sets.iter().find(|set| set.joint == joint)?.shown_at(secs)
    }

    /// The edits of a gesture, and the chosen keys after it.
    pub fn stroke(&self, drag: &KeyDrag) -> (Stroke, KeyChoice) {
        match *drag {
            KeyDrag::Move { grip, by_secs, by_deg } => self.moved(grip, by_secs, by_deg),
            KeyDrag::Scale { about_secs, factor } => self.scaled(about_secs, factor),
            KeyDrag::Space { joint, start_secs, spacing } => {
                let change = KeyChange::Space(vec![start_secs], spacing);
                (Stroke::Keys(vec![KeyEdit { joint, change }]), self.choice.clone())
            }
            KeyDrag::Push { grip, by_deg, reach_secs } => {
                let push = self.push(grip, by_deg, reach_secs);
                (Stroke::Pushes(push.into_iter().collect()), self.choice.clone())
            }
        }
    }

    fn landing(&self, secs: f64) -> f64 {
        if self.snaps_to_frames { on_frame(&self.clip.grid, secs) } else { secs.max(0.0) }
    }

    fn moved(&self, grip: Grip, by_secs: f64, by_deg: f64) -> (Stroke, KeyChoice) {
        let first = self.choice.span().map_or(0.0, |[first, _]| first);
        let landing = if by_secs == 0.0 { grip.secs } else { self.landing(grip.secs + by_secs) };
        let by_secs = (landing - grip.secs).max(-first);
        let mut edits = Vec::new();
        for (joint, times) in self.choice.rows() {
            let Some(track) = self.clip.rotation(joint) else { continue };
            if by_deg != 0.0 {
                let measure = self.measure(joint);
                let turned = |&secs: &f64| -> Option<(f64, Rotor)> {
                    let now = track.sound_key(key_at(track, secs)?);
                    Some((secs, measure.moved(now, self.shown(joint, secs), grip.line, by_deg)?))
                };
                let set: Vec<(f64, Rotor)> = times.iter().filter_map(turned).collect();
                if !set.is_empty() {
                    edits.push(KeyEdit { joint, change: KeyChange::Set(set) });
                }
            }
            if by_secs.abs() > 1e-9 {
                edits.push(KeyEdit::shift(joint, times, by_secs));
            }
        }
        (Stroke::Keys(edits), self.choice.moved(|secs| secs + by_secs))
    }

    fn scaled(&self, about_secs: f64, factor: f64) -> (Stroke, KeyChoice) {
        let to = |secs: f64| self.landing(about_secs + (secs - about_secs) * factor.max(0.0));
        let mut edits = Vec::new();
        for (joint, times) in self.choice.rows() {
            let moves: Vec<[f64; 2]> = times
                .iter()
                .map(|&secs| [secs, to(secs)])
                .filter(|[from, to]| (from - to).abs() > 1e-9)
                .collect();
            if !moves.is_empty() {
                edits.push(KeyEdit { joint, change: KeyChange::Move(moves) });
            }
        }
        (Stroke::Keys(edits), self.choice.moved(to))
    }

    fn push(&self, grip: Grip, by_deg: f64, reach_secs: f64) -> Option<Push> {
        if by_deg == 0.0 {
            return None;
        }
        let now = super::sampled::rotation_at(&self.clip, grip.joint, grip.secs);
        let shown = self.shown(grip.joint, grip.secs);
        let wanted = self.measure(grip.joint).moved(now, shown, grip.line, by_deg)?;
        Some(Push {
            joint: grip.joint,
            center_secs: grip.secs,
            reach_secs,
            turn: (now.reverse() * wanted).plane_angles(),
            frame: PushFrame::Own,
        })
    }
}

/// `edits` with more behind them. What merely goes on with the last edit of its joint becomes one with it, so that a key that is
/// nudged a hundred times leaves one edit and not a hundred.
pub fn with_more(edits: &[KeyEdit], more: &[KeyEdit]) -> Vec<KeyEdit> {
    let mut all = edits.to_vec();
    for edit in more {
        let last = all.iter_mut().rev().find(|own| own.joint == edit.joint);
        let joined = match (last, &edit.change) {
            (Some(KeyEdit { change: KeyChange::Set(known), .. }), KeyChange::Set(new)) => {
                let again: BTreeSet<u64> = new.iter().map(|(secs, _)| secs.to_bits()).collect();
                known.retain(|(secs, _)| !again.contains(&secs.to_bits()));
                known.extend(new.iter().copied());
                true
            }
            (Some(KeyEdit { change: KeyChange::Move(known), .. }), KeyChange::Move(new))
                if known.len() == new.len()
                    && known.iter().zip(new).all(|([_, to], [from, _])| (to - from).abs() < 1e-9) =>
            {
                for (own, [_, to]) in known.iter_mut().zip(new) {
                    own[1] = to.max(0.0);
                }
                true
            }
            (Some(KeyEdit { change: KeyChange::Space(starts, known), .. }), KeyChange::Space(again, new))
                if starts == again =>
            {
                *known = *new;
                true
            }
            _ => false,
        };
        if !joined {
            all.push(edit.clone());
        }
    }
    all
}

/// The same for pushes: a push at the place of the last one, of the same reach, becomes one with it, and adds up where it is whole.
pub fn with_more_pushes(pushes: &[Push], more: &[Push]) -> Vec<Push> {
    let mut all = pushes.to_vec();
    for push in more {
        let turn = |own: &Push| Rotor::from_plane_angles(own.turn);
        match all.last_mut() {
            Some(last)
                if Push { turn: push.turn, ..*last } == *push
                    && push.frame == PushFrame::Own
                    && last.turn.length() + push.turn.length() < std::f64::consts::PI =>
            {
                last.turn = (turn(last) * turn(push)).plane_angles();
            }
            _ => all.push(*push),
        }
    }
    all
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn times_land_on_frames_also_behind_the_end() {
        let grid = FrameGrid::even(30.0, 1.0);
        for (secs, frame) in [(0.02, 1.0), (-1.0, 0.0), (0.999, 30.0), (1.52, 46.0)] {
            assert!((on_frame(&grid, secs) - frame / 30.0).abs() < 1e-12, "{secs}");
        }
    }

    #[test]
    fn what_goes_on_with_an_edit_becomes_one_with_it() {
        let set = |secs: f64, turn: f64| KeyEdit {
            joint: 1,
            change: KeyChange::Set(vec![(secs, Rotor::from_parts(turn, crate::rotor::Bivector::ZERO))]),
        };
        let shift = |from: f64, to: f64| KeyEdit { joint: 1, change: KeyChange::Move(vec![[from, to]]) };
        let all = with_more(&[set(0.5, 1.0), set(1.0, 1.0)], &[set(0.5, -1.0)]);
        assert_eq!(all.len(), 2, "{all:?}");
        let all = [set(0.5, 1.0), set(0.5, -1.0), shift(0.5, 0.6), shift(0.6, 0.8), shift(0.5, 0.7)]
            .iter()
            .fold(Vec::new(), |all, edit| with_more(&all, std::slice::from_ref(edit)));
        assert_eq!(all, [set(0.5, -1.0), shift(0.5, 0.8), shift(0.5, 0.7)]);
    }
}

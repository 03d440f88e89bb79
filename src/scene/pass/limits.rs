//! The pass that keeps joints within their limits.

use std::sync::Arc;

use crate::clip::{Clip, RotationTrack};
use crate::limit::Clamp;
use crate::limit::Limits;
use crate::rotor::{Rotor, slerp};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::Others;
use super::scope::Scope;

/// Clamps joints to their limits, at keys and between them.
#[derive(Clone, Debug, PartialEq)]
pub struct LimitsPass {
    /// The limits.
    pub limits: Arc<Limits>,
    /// How.
    pub clamp: Clamp,
    /// How much of the change is taken, 0 to 1.
    pub amount: f64,
    /// Where it acts.
    pub scope: Scope,
}

impl LimitsPass {
    /// A soft clamp, taken whole, everywhere.
    pub fn new(limits: Arc<Limits>) -> Self {
        Self { limits, clamp: Clamp::Soft, amount: 1.0, scope: Scope::default() }
    }
}

impl PassKind for LimitsPass {
    fn title(&self) -> String {
        let how = if self.clamp == Clamp::Soft { "Soft" } else { "Hard" };
        let count = self.limits.joints.len();
        let of = if self.limits.title.is_empty() { String::new() } else { format!(" {}", self.limits.title) };
        format!("{how} limits{of} ({count} joint{})", if count == 1 { "" } else { "s" })
    }

    fn explanation(&self) -> &'static str {
        "Keeps joints within their limits, also between keys, where it adds some if need be. Soft bends from comfort on, \
         hard stops at the limit."
    }

    fn numbers(&self) -> Vec<PassNumber> {
        vec![PassNumber::count("limits", self.limits.joints.len())]
    }

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        let count = clip.joints.len();
        if let Some((&joint, _)) = self.limits.joints.iter().find(|(joint, _)| **joint >= count) {
            return Err(PassError::NoSuchJoint { joint, count });
        }
        let joints = self.limits.joints.iter().filter(|(joint, _)| self.scope.has_joint(**joint));
        let chosen =
            Limits { title: self.limits.title.clone(), joints: joints.map(|(k, v)| (*k, *v)).collect() };
        let mut result = chosen.clamped(clip, self.clamp);
        if self.amount < 1.0 || self.scope.span_secs.is_some() {
            for &joint in chosen.joints.keys() {
                if let (Some(before), Some(after)) = (clip.rotation(joint), result.rotation(joint))
                    && !clip.same_joint(&result, joint)
                {
                    let part = self.partly(before, after);
                    result = result.with_rotation(joint, part);
                }
            }
        }
        let keys = |clip: &Clip| {
            let counts =
                chosen.joints.keys().filter_map(|joint| clip.rotation(*joint)).map(|track| track.keys.len());
            counts.sum::<usize>()
        };
        let added = keys(&result) - keys(clip);
        let notes = if added == 0 { vec![] } else { vec![format!("added {added} keys between keys")] };
        Ok(Outcome { clip: result, notes })
    }

    fn joints(&self) -> Vec<usize> {
        self.limits.joints.keys().copied().chain(self.scope.joints.iter().flatten().copied()).collect()
    }

    fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        self.limits = Arc::new(self.limits.renumbered(now));
        self.scope.renumber(now);
    }

    fn amount(&self) -> Option<f64> {
        Some(self.amount)
    }

    fn set_amount(&mut self, amount: f64) {
        self.amount = amount;
    }

    fn scope(&self) -> Option<&Scope> {
        Some(&self.scope)
    }

    fn scope_mut(&mut self) -> Option<&mut Scope> {
        Some(&mut self.scope)
    }
}

impl LimitsPass {
    /// `before` moved part of its way to `after`, as amount and scope say; keys with no part in it keep their numbers.
    fn partly(&self, before: &RotationTrack, after: &RotationTrack) -> RotationTrack {
        let weight = |secs: f64| self.amount * self.scope.weight(secs);
        let blend = |key: usize| {
            let secs = after.times.at(key);
            slerp(before.at(secs), after.sound_key(key), weight(secs)).normalize()
        };
        if before.times == after.times {
            let changed = after.changed_keys(before);
            let changes: Vec<(usize, Rotor)> = changed
                .into_iter()
                .filter(|&key| weight(after.times.at(key)) > 0.0)
                .map(|key| (key, blend(key)))
                .collect();
            return before.with_keys(&changes);
        }
        let own_key = |secs: f64| {
            let key = before.times.nearest(secs);
            #[expect(clippy::float_cmp, reason = "keys of the track before keep their times bit for bit")]
            let is_same = before.times.at(key) == secs;
            is_same.then_some(key)
        };
        let changes: Vec<(usize, Rotor)> = (0..after.keys.len())
            .filter(|&key| weight(after.times.at(key)) < 1.0)
            .map(|key| match own_key(after.times.at(key)) {
                Some(own) if weight(after.times.at(key)) <= 0.0 => (key, before.keys[own]),
                _ => (key, blend(key)),
            })
            .collect();
        after.with_keys(&changes)
    }
}

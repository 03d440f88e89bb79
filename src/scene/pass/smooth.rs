//! The pass that smooths.

use std::sync::Arc;

use crate::clip::{Clip, JointTracks, Smoothing};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::Others;
use super::scope::Scope;

/// Smooths turns, and places where it is wanted, without delay.
#[derive(Clone, Debug, PartialEq)]
pub struct SmoothPass {
    /// Which joints, in which part, and how softly it sets in.
    pub scope: Scope,
    /// Kernel, cut-off and bound.
    pub smoothing: Smoothing,
    /// How much of the change is taken, 0 to 1.
    pub amount: f64,
    /// Smooth places as well as turns.
    pub with_places: bool,
    /// Where nothing is smoothed: contacts, sharp accents. They fade in and out outside their spans.
    pub masks: Vec<Scope>,
}

impl SmoothPass {
    /// All joints, all the time, turns alone.
    pub fn new(smoothing: Smoothing) -> Self {
        Self { scope: Scope::default(), smoothing, amount: 1.0, with_places: false, masks: Vec::new() }
    }

    /// How much of the change a joint takes at a time.
    fn share(&self, joint: usize, secs: f64) -> f64 {
        let masks = self.masks.iter().filter(|mask| mask.has_joint(joint));
        masks.fold(self.amount * self.scope.weight(secs), |share, mask| share * (1.0 - mask.cover(secs)))
    }
}

impl PassKind for SmoothPass {
    fn title(&self) -> String {
        format!("Smooth below {} Hz", (self.smoothing.cutoff_hz * 100.0).round() / 100.0)
    }

    fn explanation(&self) -> &'static str {
        "Takes out what is faster than the cut-off, with no delay, at even and uneven keys. Masked spans, the first and the \
         last key stay as they are."
    }

    fn numbers(&self) -> Vec<PassNumber> {
        let mut numbers = vec![PassNumber::new("cut-off", self.smoothing.cutoff_hz, "Hz")];
        numbers.extend(self.smoothing.most_rad.map(|most| PassNumber::angle("largest change", most)));
        if !self.masks.is_empty() {
            numbers.push(PassNumber::count("masks", self.masks.len()));
        }
        numbers
    }

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        let cutoff = self.smoothing.cutoff_hz;
        if !(cutoff.is_finite() && cutoff > 0.0) {
            return Err(PassError::Parameter { name: "cut-off", expected: "hertz above 0", found: cutoff });
        }
        let mut result = (**clip).clone();
        for (joint, tracks) in clip.joints.iter().enumerate() {
            if !self.scope.has_joint(joint) {
                continue;
            }
            let share = |secs: f64| self.share(joint, secs);
            let rotation = tracks.rotation.as_ref().map(|track| track.smoothed(&self.smoothing, &share));
            let translation = tracks.translation.as_ref().map(|track| {
                if self.with_places { track.smoothed(&self.smoothing, &share) } else { track.clone() }
            });
            let new = JointTracks { rotation, translation, scale: tracks.scale.clone() };
            if new != **tracks {
                result.joints[joint] = Arc::new(new);
            }
        }
        Ok(result.into())
    }

    fn joints(&self) -> Vec<usize> {
        let scopes = self.masks.iter().chain([&self.scope]);
        scopes.filter_map(|scope| scope.joints.as_ref()).flatten().copied().collect()
    }

    fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        self.scope.renumber(now);
        self.masks.iter_mut().for_each(|mask| mask.renumber(now));
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

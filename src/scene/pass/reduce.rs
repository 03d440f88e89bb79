//! The pass that leaves as few keys as a bound allows.

use std::sync::Arc;

use crate::clip::{self, Clip, ReduceOptions};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::Others;
use super::scope::Scope;

/// Fewer keys within a bound.
#[derive(Clone, Debug, PartialEq)]
pub struct ReducePass {
    /// Which joints, and in which part; there is no fading.
    pub scope: Scope,
    /// The most that a joint's turn relative to its parent may change at any time, in radians, 0 to 45°.
    pub bound_rad: f64,
    /// The most that the end of a limb may move in the scene, in the file's lengths.
    pub tip_bound: Option<f64>,
    /// Seconds at which tracks keep a key where they have one: contacts, borders of mends.
    pub keep_secs: Vec<f64>,
}

impl ReducePass {
    /// All joints, all the time, within `bound_rad`.
    pub fn within(bound_rad: f64) -> Self {
        Self { scope: Scope::default(), bound_rad, tip_bound: None, keep_secs: Vec::new() }
    }
}

impl PassKind for ReducePass {
    fn title(&self) -> String {
        format!("Reduce keys within {}°", (self.bound_rad.to_degrees() * 1000.0).round() / 1000.0)
    }

    fn explanation(&self) -> &'static str {
        "Leaves as few keys as keep every joint within the bound, at the keys that go and between them. No step is left \
         larger than 120°."
    }

    fn numbers(&self) -> Vec<PassNumber> {
        let mut numbers = vec![PassNumber::angle("bound", self.bound_rad)];
        numbers.extend(self.tip_bound.map(|bound| PassNumber::new("bound of limb ends", bound, "")));
        if !self.keep_secs.is_empty() {
            numbers.push(PassNumber::count("moments kept", self.keep_secs.len()));
        }
        numbers
    }

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        if !(0.0..=std::f64::consts::FRAC_PI_4).contains(&self.bound_rad) {
            let found = self.bound_rad.to_degrees();
            return Err(PassError::Parameter { name: "bound", expected: "0 to 45 degrees", found });
        }
        if let Some(found) = self.tip_bound.filter(|bound| !(bound.is_finite() && *bound > 0.0)) {
            return Err(PassError::Parameter {
                name: "bound at limb ends",
                expected: "a length above 0",
                found,
            });
        }
        let options = ReduceOptions {
            tip_bound: self.tip_bound,
            joints: self.scope.joints.clone(),
            span_secs: self.scope.span_secs,
            keep_secs: self.keep_secs.clone(),
            ..ReduceOptions::within(self.bound_rad)
        };
        let (clip, count) = clip::reduced(clip, &options);
        Ok(Outcome { clip, notes: vec![format!("{} of {} keys left", count.after, count.before)] })
    }

    fn joints(&self) -> Vec<usize> {
        self.scope.joints.clone().unwrap_or_default()
    }

    fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        self.scope.renumber(now);
    }

    fn scope(&self) -> Option<&Scope> {
        Some(&self.scope)
    }

    fn scope_mut(&mut self) -> Option<&mut Scope> {
        Some(&mut self.scope)
    }
}

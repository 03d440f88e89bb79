//! The pass that gives the clip another rate.

use std::sync::Arc;

use crate::clip::{self, Clip};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::Others;

/// The most keys that a pass makes, of all joints together: an hour at 120 a second of 115 joints.
const MOST_KEYS: f64 = 5e7;

/// A key at each frame of another rate, over the whole clip.
#[derive(Clone, Debug, PartialEq)]
pub struct ResamplePass {
    /// Frames a second, above 0.
    pub rate: f64,
}

impl PassKind for ResamplePass {
    fn title(&self) -> String {
        format!("Resample to {} a second", (self.rate * 1000.0).round() / 1000.0)
    }

    fn explanation(&self) -> &'static str {
        "Puts a key on each frame of another rate, where the clip shows it. Passes after it see those keys alone."
    }

    fn numbers(&self) -> Vec<PassNumber> {
        vec![PassNumber::new("rate", self.rate, "Hz")]
    }

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        let wrong = |expected| PassError::Parameter { name: "rate", expected, found: self.rate };
        if !(self.rate.is_finite() && self.rate > 0.0) {
            return Err(wrong("frames a second above 0"));
        }
        let moving = clip.joints.iter().filter(|tracks| tracks.rotation.is_some()).count().max(1);
        if clip.duration_secs * self.rate * moving as f64 > MOST_KEYS {
            return Err(wrong("a rate that gives at most 50 million keys in all"));
        }
        Ok(clip::resampled(clip, self.rate, 0.0, clip.duration_secs).into())
    }
}

//! The pass that gives the clip another rate.

use std::sync::Arc;

use crate::clip::{self, Clip};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::others::Others;

/// The most frames a clip is resampled to: an hour at 1000 a second.
const MOST_FRAMES: f64 = 3.6e6;

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

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        let wrong = |expected| PassError::Parameter { name: "rate", expected, found: self.rate };
        if !(self.rate.is_finite() && self.rate > 0.0) {
            return Err(wrong("frames a second above 0"));
        }
        if clip.duration_secs * self.rate > MOST_FRAMES {
            return Err(wrong("a rate that gives at most 3600000 frames"));
        }
        Ok(clip::resampled(clip, self.rate, 0.0, clip.duration_secs).into())
    }
}

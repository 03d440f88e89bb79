//! The pass of soft pushes.

use std::sync::Arc;

use crate::clip::{self, Clip, Push};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::Others;

/// Turns added by hand around single moments.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct PushPass {
    /// The pushes, in the order in which they were made.
    pub pushes: Vec<Push>,
}

impl PassKind for PushPass {
    fn title(&self) -> String {
        let count = self.pushes.len();
        format!("Soft push ({count} push{})", if count == 1 { "" } else { "es" })
    }

    fn explanation(&self) -> &'static str {
        "Adds a turn around a moment that fades to nothing on both sides, so that captured motion keeps its detail. Keys \
         outside the reach keep their numbers."
    }

    fn numbers(&self) -> Vec<PassNumber> {
        let turns = self.pushes.iter().map(|push| push.turn.length());
        let reaches = self.pushes.iter().map(|push| push.reach_secs);
        vec![
            PassNumber::count("pushes", self.pushes.len()),
            PassNumber::angle("largest turn", turns.fold(0.0, f64::max)),
            PassNumber::new("longest reach", reaches.fold(0.0, f64::max), "s"),
        ]
    }

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        for push in &self.pushes {
            if push.joint >= clip.skeleton.len() {
                return Err(PassError::NoSuchJoint { joint: push.joint, count: clip.skeleton.len() });
            }
            if !(push.reach_secs.is_finite() && push.reach_secs > 0.0) {
                let found = push.reach_secs;
                return Err(PassError::Parameter { name: "reach", expected: "seconds above 0", found });
            }
        }
        Ok(clip::pushed(clip, &self.pushes).into())
    }

    fn joints(&self) -> Vec<usize> {
        self.pushes.iter().map(|push| push.joint).collect()
    }

    fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        self.pushes.retain_mut(|push| now(push.joint).map(|joint| push.joint = joint).is_some());
    }
}

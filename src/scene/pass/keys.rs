//! The pass of keys edited by hand.

use std::sync::Arc;

use crate::clip::{self, Clip, KeyChange, KeyEdit};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::Others;

/// Edits of single keys, in the order in which they were made.
///
/// Edits find their keys by time. When a pass before this one leaves other keys, those that find none are left out and
/// counted, and all others still apply; values are whole turns relative to the parent, so a pose that was set stays set.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct KeysPass {
    /// The edits.
    pub edits: Vec<KeyEdit>,
}

/// So far behind the end a key may be put: a slip of the hand should not make a clip of days.
const FARTHEST_SECS: f64 = 600.0;

/// The times that keys get.
fn new_times(edit: &KeyEdit) -> Vec<f64> {
    match &edit.change {
        KeyChange::Insert(keys) => keys.iter().map(|key| key.secs).collect(),
        // A key moved to before the start stands at the start.
        KeyChange::Move(moves) => moves.iter().map(|[_, to]| if *to < 0.0 { 0.0 } else { *to }).collect(),
        KeyChange::Set(_)
        | KeyChange::Delete(_)
        | KeyChange::Path(..)
        | KeyChange::Space(..)
        | KeyChange::Turn(..) => Vec::new(),
    }
}

impl PassKind for KeysPass {
    fn title(&self) -> String {
        let count = self.edits.len();
        format!("Keys by hand ({count} edit{})", if count == 1 { "" } else { "s" })
    }

    fn explanation(&self) -> &'static str {
        "Keys that were moved, added, set or taken away by hand, and the paths between them. All other keys keep their \
         numbers."
    }

    fn numbers(&self) -> Vec<PassNumber> {
        vec![PassNumber::count("edits", self.edits.len())]
    }

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        let count = clip.skeleton.len();
        if let Some(edit) = self.edits.iter().find(|edit| edit.joint >= count) {
            return Err(PassError::NoSuchJoint { joint: edit.joint, count });
        }
        let end = clip.duration_secs + FARTHEST_SECS;
        if let Some(found) = self.edits.iter().flat_map(new_times).find(|secs| !(0.0..=end).contains(secs)) {
            let expected = "seconds from 0 to ten minutes behind the end";
            return Err(PassError::Parameter { name: "key time", expected, found });
        }
        let (clip, missed) = clip::with_key_edits(clip, &self.edits);
        let note = |missed: usize| {
            format!("{missed} change{} found no key any more", if missed == 1 { "" } else { "s" })
        };
        Ok(Outcome { clip, notes: if missed > 0 { vec![note(missed)] } else { Vec::new() } })
    }

    fn joints(&self) -> Vec<usize> {
        self.edits.iter().map(|edit| edit.joint).collect()
    }

    fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        self.edits.retain_mut(|edit| now(edit.joint).map(|joint| edit.joint = joint).is_some());
    }
}

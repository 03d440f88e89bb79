//! The pass that mends snags of one kind.

use std::collections::BTreeSet;
use std::sync::Arc;

use crate::clip::{Clip, partly};
use crate::mend;
use crate::snag::{Remedy, Snag, SnagKind};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::Others;

/// Mends a list of snags of one kind.
#[derive(Clone, Debug, PartialEq)]
pub struct MendPass {
    /// The kind of all its snags.
    pub kind: SnagKind,
    /// The snags it mends, in the order they were accepted.
    pub snags: Vec<Snag>,
    /// How much of the change is taken, 0 to 1. Kinds that keep every pose are always taken whole.
    pub amount: f64,
}

/// Names a snag among all snags of a clip.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct SnagMark {
    /// Its kind.
    pub kind: SnagKind,
    /// Its joint in the clip's skeleton.
    pub joint: usize,
    /// Its first key.
    pub first_key: usize,
    /// Its last key.
    pub last_key: usize,
}

impl SnagMark {
    /// The mark of a snag.
    pub fn of(snag: &Snag) -> Self {
        Self { kind: snag.kind, joint: snag.joint, first_key: snag.first_key, last_key: snag.last_key }
    }
}

impl MendPass {
    /// The joints of the limbs that it bends, beside the joints of its snags.
    pub fn limb_joints(&self) -> BTreeSet<usize> {
        let limb = |snag: &Snag| match &snag.remedy {
            Remedy::Hold(plant) => plant.foot.joints().to_vec(),
            _ => Vec::new(),
        };
        self.snags.iter().flat_map(limb).collect()
    }

    /// A pass that takes its mends whole.
    pub fn new(kind: SnagKind, snags: Vec<Snag>) -> Self {
        Self { kind, snags, amount: 1.0 }
    }
}

impl PassKind for MendPass {
    fn title(&self) -> String {
        let count = self.snags.len();
        format!("Mend {} ({count} snag{})", self.kind, if count == 1 { "" } else { "s" })
    }

    fn explanation(&self) -> &'static str {
        self.kind.mend_explanation()
    }

    fn numbers(&self) -> Vec<PassNumber> {
        vec![PassNumber::count("snags", self.snags.len())]
    }

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        let mut mended = mend::apply_all(clip, &self.snags)?;
        if self.amount < 1.0 && moves_poses(self.kind) {
            for joint in 0..mended.joints.len() {
                if let (Some(before), Some(after)) = (clip.rotation(joint), mended.rotation(joint))
                    && !clip.same_joint(&mended, joint)
                {
                    let part = partly(before, after, &|_| self.amount);
                    mended = mended.with_rotation(joint, part);
                }
            }
        }
        Ok(mended.into())
    }

    fn joints(&self) -> Vec<usize> {
        self.snags.iter().map(|snag| snag.joint).chain(self.limb_joints()).collect()
    }

    fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        self.snags.retain_mut(|snag| {
            let own = now(snag.joint);
            if let (Remedy::Hold(plant), Some(_)) = (&mut snag.remedy, own) {
                match plant.foot.renumbered(now) {
                    Some(foot) => plant.foot = foot,
                    None => return false,
                }
            }
            own.map(|joint| snag.joint = joint).is_some()
        });
    }

    /// Kinds that keep every pose are taken whole.
    fn amount(&self) -> Option<f64> {
        moves_poses(self.kind).then_some(self.amount)
    }

    fn set_amount(&mut self, amount: f64) {
        self.amount = amount;
    }
}

fn moves_poses(kind: SnagKind) -> bool {
    matches!(
        kind,
        SnagKind::HalfTurn | SnagKind::Spike | SnagKind::Stuck | SnagKind::Jitter | SnagKind::PastLimit
    )
}

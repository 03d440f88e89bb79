//! The part of a clip that carries some of its joints: a foot needs no fingers.

use std::sync::Arc;

use crate::skeleton::Skeleton;

use super::contact::{Foot, JointPoint};
use super::take::Clip;

/// Some joints of a clip with everything above them, in their old order; tracks are shared with the whole.
#[derive(Clone, Debug)]
pub struct Branch {
    /// The clip of these joints alone.
    pub clip: Clip,
    now: Vec<Option<usize>>,
}

impl Branch {
    /// The branch that carries these joints. Joints that the clip has not are passed over.
    pub fn of(clip: &Clip, joints: impl IntoIterator<Item = usize>) -> Self {
        let all = clip.skeleton.joints();
        let mut is_kept = vec![false; all.len()];
        for joint in joints {
            let mut at = Some(joint).filter(|&joint| joint < all.len());
            while let Some(own) = at.filter(|&own| !is_kept[own]) {
                is_kept[own] = true;
                at = all[own].parent;
            }
        }
        let mut now = vec![None; all.len()];
        let mut kept = Vec::new();
        let mut tracks = Vec::new();
        for (joint, own) in all.iter().enumerate().filter(|(joint, _)| is_kept[*joint]) {
            now[joint] = Some(kept.len());
            kept.push(crate::skeleton::Joint { parent: own.parent.and_then(|up| now[up]), ..own.clone() });
            tracks.push(clip.joints.get(joint).cloned().unwrap_or_default());
        }
        match Skeleton::new(kept) {
            Ok(skeleton) => {
                let clip = Clip {
                    name: String::new(),
                    skeleton: Arc::new(skeleton),
                    joints: tracks,
                    grid: clip.grid.clone(),
                    duration_secs: clip.duration_secs,
                };
                Self { clip, now }
            }
            // Parents stand before their joints here as they did in the whole; should they not, the whole will do.
            Err(_) => Self { clip: clip.clone(), now: (0..all.len()).map(Some).collect() },
        }
    }

    /// The number of a joint within the branch.
    pub fn now(&self, joint: usize) -> Option<usize> {
        self.now.get(joint).copied().flatten()
    }

    /// A point of a joint within the branch; of a joint that is not in it as it was.
    pub fn point(&self, point: JointPoint) -> JointPoint {
        JointPoint { joint: self.now(point.joint).unwrap_or(point.joint), ..point }
    }

    /// A foot within the branch.
    pub fn foot(&self, foot: &Foot) -> Option<Foot> {
        foot.renumbered(&|joint| self.now(joint))
    }
}

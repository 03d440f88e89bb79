//! Which joints a blend reaches, and how strongly.

use std::collections::VecDeque;

use crate::skeleton::{Skeleton, smooth_step};

use super::BlendError;

/// A factor from 0 to 1 for each joint of a skeleton, carriers included: the weight of the blend is multiplied by it.
#[derive(Clone, Debug, PartialEq)]
pub struct Mask {
    /// The factors.
    pub factors: Vec<f64>,
}

impl Mask {
    /// Every joint in full.
    pub fn all(skeleton: &Skeleton) -> Self {
        Self { factors: vec![1.0; skeleton.len()] }
    }

    /// The joints with these labels in full, all others not at all.
    ///
    /// # Errors
    /// When a label is no joint's.
    pub fn joints<S: AsRef<str>>(skeleton: &Skeleton, labels: &[S]) -> Result<Self, BlendError> {
        let mut factors = vec![0.0; skeleton.len()];
        for label in labels {
            let label = label.as_ref();
            let joint = skeleton.find(label).ok_or_else(|| BlendError::NoSuchJoint(label.to_owned()))?;
            factors[joint] = 1.0;
        }
        Ok(Self { factors })
    }

    /// A limb: the joint with this label and all below it in full, and above it a soft edge over `soft` ancestors, so
    /// that a wave of an arm takes some of the chest along.
    ///
    /// # Errors
    /// When the label is no joint's.
    pub fn limb(skeleton: &Skeleton, label: &str, soft: usize) -> Result<Self, BlendError> {
        let root = skeleton.find(label).ok_or_else(|| BlendError::NoSuchJoint(label.to_owned()))?;
        let mut factors = vec![0.0; skeleton.len()];
        let mut queue = VecDeque::from([root]);
        while let Some(joint) = queue.pop_front() {
            factors[joint] = 1.0;
            queue.extend(skeleton.children(joint));
        }
        let mut above = skeleton.parent_joint(root);
        for step in 1..=soft {
            let Some(joint) = above else { break };
            let share = 1.0 - step as f64 / (soft + 1) as f64;
            factors[joint] = smooth_step(share);
            above = skeleton.parent_joint(joint);
        }
        Ok(Self { factors })
    }

    /// The larger of both for each joint.
    #[must_use]
    pub fn or(&self, other: &Self) -> Self {
        let larger = |(a, b): (&f64, &f64)| a.max(*b);
        Self { factors: self.factors.iter().zip(&other.factors).map(larger).collect() }
    }

    /// The factor of a joint; 0 beyond the list.
    pub fn of(&self, joint: usize) -> f64 {
        self.factors.get(joint).copied().unwrap_or(0.0)
    }
}

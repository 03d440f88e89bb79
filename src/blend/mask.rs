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

    /// No joint.
    pub fn none(skeleton: &Skeleton) -> Self {
        Self { factors: vec![0.0; skeleton.len()] }
    }

    /// The joints with these labels in full, all others not at all.
    ///
    /// # Errors
    /// When a label is no joint's.
    pub fn joints<S: AsRef<str>>(skeleton: &Skeleton, labels: &[S]) -> Result<Self, BlendError> {
        labels.iter().try_fold(Self::none(skeleton), |mask, label| mask.with(skeleton, label.as_ref(), 1.0))
    }

    /// A limb: the joint with this label and all below it in full, and above it a soft edge over `soft` ancestors, so
    /// that a wave of an arm takes some of the chest along.
    ///
    /// # Errors
    /// When the label is no joint's.
    pub fn limb(skeleton: &Skeleton, label: &str, soft: usize) -> Result<Self, BlendError> {
        let root = found(skeleton, label)?;
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

    /// The same mask with another factor for one joint.
    ///
    /// # Errors
    /// When the label is no joint's, or the factor is not from 0 to 1.
    pub fn with(mut self, skeleton: &Skeleton, label: &str, factor: f64) -> Result<Self, BlendError> {
        let joint = found(skeleton, label)?;
        check_factor(factor)?;
        self.factors.resize(skeleton.len(), 0.0);
        self.factors[joint] = factor;
        Ok(self)
    }

    /// So much of each factor.
    ///
    /// # Errors
    /// When `factor` is not from 0 to 1.
    pub fn times(mut self, factor: f64) -> Result<Self, BlendError> {
        check_factor(factor)?;
        for own in &mut self.factors {
            *own *= factor;
        }
        Ok(self)
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

fn check_factor(factor: f64) -> Result<(), BlendError> {
    if (0.0..=1.0).contains(&factor) {
        return Ok(());
    }
    Err(BlendError::Weight { expected: "from 0 to 1 for a joint of a mask", found: factor })
}

/// The joint with a label; where there is none, the error names those that are written nearly so, or what there is.
fn found(skeleton: &Skeleton, label: &str) -> Result<usize, BlendError> {
    /// Named at most.
    const MOST: usize = 6;
    skeleton.find(label).ok_or_else(|| {
        let plain = |text: &str| {
            text.chars().filter(|letter| letter.is_alphanumeric()).collect::<String>().to_lowercase()
        };
        let wanted = plain(label);
        let labels: Vec<&str> = skeleton.listed().map(|joint| skeleton.label(joint)).collect();
        let is_near = |label: &&&str| {
            let own = plain(label);
            !wanted.is_empty() && (own.contains(&wanted) || wanted.contains(&own)) && !own.is_empty()
        };
        let near: Vec<&str> = labels.iter().filter(is_near).copied().collect();
        let all = if near.is_empty() { &labels } else { &near };
        let named = all.iter().take(MOST).map(|label| format!("`{label}`")).collect::<Vec<_>>().join(", ");
        let more = all.len().saturating_sub(MOST);
        let there = if more > 0 { format!("{named} and {more} more") } else { named };
        BlendError::NoSuchJoint { found: label.to_owned(), there }
    })
}

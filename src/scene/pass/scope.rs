//! Where a pass acts: on which joints, in which part of the clip, and how softly it sets in.

/// Joints and a stretch of time.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Scope {
    /// The joints by number; `None` for all.
    pub joints: Option<Vec<usize>>,
    /// First and last second; `None` for the whole clip.
    pub span_secs: Option<[f64; 2]>,
    /// Seconds within the span over which the pass sets in and fades out; 0 for at once.
    pub fade_secs: f64,
}

impl Scope {
    /// Some joints, all the time.
    pub fn of_joints(joints: impl Into<Vec<usize>>) -> Self {
        Self { joints: Some(joints.into()), ..Self::default() }
    }

    /// Whether the pass acts on a joint.
    pub fn has_joint(&self, joint: usize) -> bool {
        self.joints.as_ref().is_none_or(|joints| joints.contains(&joint))
    }

    /// How much of the change is taken at a time, 0 to 1: 1 inside, 0 outside, and along the fades the smooth step
    /// `6s⁵ − 15s⁴ + 10s³`, which has no jump in rate or acceleration.
    pub fn weight(&self, time_secs: f64) -> f64 {
        let Some([first, last]) = self.span_secs else { return 1.0 };
        let inside = (time_secs - first).min(last - time_secs);
        if inside < 0.0 || inside.is_nan() {
            return 0.0;
        }
        if inside >= self.fade_secs {
            return 1.0;
        }
        let share = inside / self.fade_secs;
        share.powi(3) * (share * (6.0 * share - 15.0) + 10.0)
    }

    /// The same seen as a mask: 1 inside the span, and along fades of `fade_secs` *outside* of it down to 0.
    pub fn cover(&self, time_secs: f64) -> f64 {
        let wider = |[first, last]: [f64; 2]| [first - self.fade_secs, last + self.fade_secs];
        Self { joints: None, span_secs: self.span_secs.map(wider), ..*self }.weight(time_secs)
    }

    /// Gives the joints other numbers; those that have none any more go.
    pub fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        if let Some(joints) = &mut self.joints {
            *joints = joints.iter().filter_map(|&joint| now(joint)).collect();
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_change_sets_in_and_fades_out_within_the_span() {
        let scope = Scope { span_secs: Some([1.0, 3.0]), fade_secs: 0.5, ..Scope::default() };
        let weights = [0.9, 1.0, 1.25, 1.5, 2.9, 3.0, 3.1].map(|secs| scope.weight(secs));
        assert_eq!(weights[..4], [0.0, 0.0, 0.5, 1.0]);
        assert!(weights[4] > 0.0 && weights[4] < 0.1, "{weights:?}");
        assert_eq!(weights[5..], [0.0, 0.0]);
        let hard = Scope { span_secs: Some([1.0, 3.0]), ..Scope::default() };
        assert_eq!([0.99, 1.0, 3.0, 3.01].map(|secs| hard.weight(secs)), [0.0, 1.0, 1.0, 0.0]);
        assert_eq!(Scope::default().weight(f64::MAX), 1.0);
        assert_eq!([0.5, 0.75, 1.0, 3.0, 3.5].map(|secs| scope.cover(secs)), [0.0, 0.5, 1.0, 1.0, 0.0]);
    }
}

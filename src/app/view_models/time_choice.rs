//! The stretch of time and the joints that a person has chosen to work on.

use crate::clip::Clip;
use crate::scene::Scope;

use super::words::{counted, seconds};

/// A choice on the turn map: joints × time. What is not chosen is not narrowed: without joints all are meant, without a
/// span the whole clip. Joints are numbers of the result on show.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct TimeChoice {
    /// The joints in rising order; `None` for all.
    pub joints: Option<Vec<usize>>,
    /// First and last second; `None` for the whole clip.
    pub span_secs: Option<[f64; 2]>,
}

impl TimeChoice {
    /// These joints, all the time.
    pub fn of_joints(joints: impl IntoIterator<Item = usize>) -> Self {
        let mut joints: Vec<usize> = joints.into_iter().collect();
        joints.sort_unstable();
        joints.dedup();
        Self { joints: (!joints.is_empty()).then_some(joints), span_secs: None }
    }

    /// The same joints between two times, in either order.
    #[must_use]
    pub fn between(self, from_secs: f64, to_secs: f64) -> Self {
        Self { span_secs: Some([from_secs.min(to_secs), from_secs.max(to_secs)]), ..self }
    }

    /// Whether nothing is narrowed.
    pub fn is_everything(&self) -> bool {
        self.joints.is_none() && self.span_secs.is_none()
    }

    /// Whether a joint is meant.
    pub fn has_joint(&self, joint: usize) -> bool {
        self.joints.as_ref().is_none_or(|joints| joints.binary_search(&joint).is_ok())
    }

    /// Whether a time is meant.
    pub fn has_time(&self, time_secs: f64) -> bool {
        self.span_secs.is_none_or(|[from, to]| (from..=to).contains(&time_secs))
    }

    /// With a joint taken in, or out if it was in. Taking out the last one means all again.
    #[must_use]
    pub fn toggled(&self, joint: usize) -> Self {
        let mut joints = self.joints.clone().unwrap_or_default();
        match joints.binary_search(&joint) {
            Ok(place) => {
                joints.remove(place);
            }
            Err(place) => joints.insert(place, joint),
        }
        Self { joints: (!joints.is_empty()).then_some(joints), span_secs: self.span_secs }
    }

    /// Where a pass acts that is added now, setting in and fading out over `fade_secs` inside the span.
    pub fn scope(&self, fade_secs: f64) -> Scope {
        Scope { joints: self.joints.clone(), span_secs: self.span_secs, fade_secs }
    }

    /// In words: `3 joints, 1.200 s to 2.400 s`.
    pub fn words(&self, clip: &Clip) -> String {
        let joints = match self.joints.as_deref() {
            None => "all joints".to_owned(),
            Some([only]) if *only < clip.skeleton.len() => clip.skeleton.label(*only).to_owned(),
            Some(several) => counted(several.len(), "joint"),
        };
        match self.span_secs {
            None => format!("{joints}, whole clip"),
            Some([from, to]) => {
                let frames = clip.grid.frame(to) - clip.grid.frame(from) + 1;
                format!("{joints}, {} to {} ({})", seconds(from), seconds(to), counted(frames, "frame"))
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_not_chosen_is_not_narrowed() {
        let all = TimeChoice::default();
        assert!(all.is_everything() && all.has_joint(7) && all.has_time(-3.0));
        let some = TimeChoice::of_joints([5, 2, 5]).between(2.0, 1.0);
        assert_eq!(some.joints, Some(vec![2, 5]));
        assert_eq!(some.span_secs, Some([1.0, 2.0]));
        assert!(some.has_joint(5) && !some.has_joint(3));
        assert_eq!([0.9, 1.0, 2.0, 2.1].map(|secs| some.has_time(secs)), [false, true, true, false]);
        assert_eq!(some.toggled(3).joints, Some(vec![2, 3, 5]));
        assert_eq!(some.toggled(2).toggled(5).joints, None);
        assert_eq!(some.scope(0.1).fade_secs, 0.1);
    }
}

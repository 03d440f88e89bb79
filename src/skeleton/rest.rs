//! Which pose a skeleton is measured from.

use std::fmt;
use std::str::FromStr;
use std::sync::Arc;

use super::{LocalPose, Skeleton, Transform};

/// A pose that turns are measured from. It does not say
/// where a joint stands that nothing moves: that is always [`Joint::rest`](super::Joint::rest).
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub enum RestChoice {
    /// The pose that the skins were bound in (glTF with inverse bind matrices).
    Bind,
    /// The joints as the file has them: nodes as they stand (glTF), all angles zero (BVH), the skeleton's own lines (CSV).
    #[default]
    Defaults,
    /// The clip's first frame.
    FirstFrame,
}

impl RestChoice {
    /// All of them.
    pub const ALL: [Self; 3] = [Self::Bind, Self::Defaults, Self::FirstFrame];

    /// Its name in files and on the command line.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Bind => "bind",
            Self::Defaults => "defaults",
            Self::FirstFrame => "first-frame",
        }
    }

    /// What a person reads.
    pub const fn title(self) -> &'static str {
        match self {
            Self::Bind => "bind pose",
            Self::Defaults => "as the file has it",
            Self::FirstFrame => "first frame",
        }
    }
}

impl fmt::Display for RestChoice {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}

/// Why a text is no choice of a rest pose.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("expected bind, defaults or first-frame, found `{0}`")]
pub struct NoRestChoice(String);

impl FromStr for RestChoice {
    type Err = NoRestChoice;

    fn from_str(text: &str) -> Result<Self, NoRestChoice> {
        Self::ALL
            .into_iter()
            .find(|choice| choice.name() == text)
            .ok_or_else(|| NoRestChoice(text.to_owned()))
    }
}

/// A pose that was chosen, a transform for each joint.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct ChosenRest {
    choice: RestChoice,
    /// Whether somebody asked for it; else a rule did.
    is_asked: bool,
    pose: Arc<[Transform]>,
}

impl Skeleton {
    /// The same joints, measured from `pose`, as somebody asked.
    ///
    /// # Panics
    /// When `pose` has not one transform for each joint.
    #[must_use]
    pub fn with_rest(&self, choice: RestChoice, pose: LocalPose) -> Self {
        self.measured(choice, pose, true)
    }

    /// The same joints, measured from `pose`, which a rule gives.
    ///
    /// # Panics
    /// When `pose` has not one transform for each joint.
    #[must_use]
    pub fn with_rest_by_rule(&self, choice: RestChoice, pose: LocalPose) -> Self {
        self.measured(choice, pose, false)
    }

    fn measured(&self, choice: RestChoice, pose: LocalPose, is_asked: bool) -> Self {
        assert_eq!(pose.len(), self.len(), "a pose has one transform for each joint");
        let chosen =
            (choice != RestChoice::Defaults).then(|| ChosenRest { choice, is_asked, pose: pose.into() });
        let mut skeleton = self.clone();
        skeleton.chosen = chosen;
        skeleton
    }

    /// The pose that becomes the zero pose of a format that has such: the one that was asked for, else the joints as the file
    /// has them, so that a clip and its translation agree about what rest is.
    pub fn zero_pose(&self) -> LocalPose {
        match &self.chosen {
            Some(chosen) if chosen.is_asked => chosen.pose.to_vec(),
            _ => self.rest_pose(),
        }
    }

    /// Which pose the joints are measured from.
    pub fn rest_choice(&self) -> RestChoice {
        self.chosen.as_ref().map_or(RestChoice::Defaults, |chosen| chosen.choice)
    }

    /// The pose that the joints are measured from; by default [`Skeleton::rest_pose`].
    pub fn chosen_rest_pose(&self) -> LocalPose {
        self.chosen.as_ref().map_or_else(|| self.rest_pose(), |chosen| chosen.pose.to_vec())
    }

    /// A joint in the pose that the joints are measured from.
    ///
    /// # Panics
    /// When there is no such joint.
    pub fn chosen_rest(&self, joint: usize) -> Transform {
        self.chosen.as_ref().map_or(self.joints()[joint].rest, |chosen| chosen.pose[joint])
    }
}

//! The joints of a skeleton, their parents and their rest pose.

use std::collections::HashMap;

use glam::DVec3;

use super::Transform;
use super::rest::ChosenRest;

/// What a joint is there for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum JointKind {
    /// A joint that a clip may turn: listed, drawn, searched for snags.
    Joint,
    /// A node above or between joints, kept because it moves what hangs below it; never listed.
    Carrier,
}

/// One joint.
#[derive(Clone, Debug, PartialEq)]
pub struct Joint {
    /// The name as the file has it; may be empty or repeat.
    pub name: String,
    /// The file's own number for it (glTF: node index; BVH and CSV: order of appearance).
    pub number: usize,
    /// Index of the parent in the skeleton, below the joint's own index; `None` for a root.
    pub parent: Option<usize>,
    /// Where it stands relative to its parent when nothing is animated.
    pub rest: Transform,
    /// Joint or carrier.
    pub kind: JointKind,
    /// End points that hang on this joint without being joints (End Sites), in its own frame.
    pub tips: Vec<DVec3>,
}

impl Joint {
    /// A joint that stands unturned at `place` in its parent, as clips are built with by hand.
    pub fn placed(name: &str, number: usize, parent: Option<usize>, place: DVec3) -> Self {
        Self {
            name: name.to_owned(),
            number,
            parent,
            rest: Transform::from_translation(place),
            kind: JointKind::Joint,
            tips: Vec::new(),
        }
    }
}

/// Joints with parents before children, and a unique label for each.
#[derive(Clone, Debug, PartialEq)]
pub struct Skeleton {
    joints: Vec<Joint>,
    labels: Vec<String>,
    children: Vec<Vec<usize>>,
    /// The pose that turns are measured from, where it is not the one the joints have.
    pub(super) chosen: Option<ChosenRest>,
}

/// Why a list of joints is no skeleton.
#[derive(Debug, thiserror::Error, PartialEq, Eq)]
pub enum SkeletonError {
    /// A parent must stand before its children.
    #[error("joint {joint} `{name}` has parent {parent}, expected a joint before it")]
    ParentNotBefore {
        /// Index of the child.
        joint: usize,
        /// Its name.
        name: String,
        /// The parent it names.
        parent: usize,
    },
}

impl Skeleton {
    /// Takes joints with parents before children.
    ///
    /// A joint's label is its name; `#NUMBER` where it has none; `NAME#NUMBER` where the name repeats.
    ///
    /// # Errors
    /// When a parent does not stand before its child (a cycle shows so too).
    pub fn new(joints: Vec<Joint>) -> Result<Self, SkeletonError> {
        let mut children = vec![Vec::new(); joints.len()];
        let mut uses: HashMap<&str, usize> = HashMap::new();
        for (index, joint) in joints.iter().enumerate() {
            *uses.entry(joint.name.as_str()).or_default() += 1;
            match joint.parent {
                Some(parent) if parent < index => children[parent].push(index),
                Some(parent) => {
                    return Err(SkeletonError::ParentNotBefore {
                        joint: index,
                        name: joint.name.clone(),
                        parent,
                    });
                }
                None => {}
            }
        }
        let labels = joints
            .iter()
            .map(|joint| match (joint.name.as_str(), uses.get(joint.name.as_str())) {
                ("", _) => format!("#{}", joint.number),
                (name, Some(1)) => name.to_owned(),
                (name, _) => format!("{name}#{}", joint.number),
            })
            .collect();
        Ok(Self { joints, labels, children, chosen: None })
    }

    /// All joints, carriers included, parents first.
    pub fn joints(&self) -> &[Joint] {
        &self.joints
    }

    /// How many there are, carriers included.
    pub fn len(&self) -> usize {
        self.joints.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.joints.is_empty()
    }

    /// The unique label of a joint.
    pub fn label(&self, joint: usize) -> &str {
        &self.labels[joint]
    }

    /// The joint with this label; failing that the first with this name.
    pub fn find(&self, label: &str) -> Option<usize> {
        let by_name = || self.joints.iter().position(|joint| joint.name == label);
        self.labels.iter().position(|own| own == label).or_else(by_name)
    }

    /// Indices of the children, carriers included.
    pub fn children(&self, joint: usize) -> &[usize] {
        &self.children[joint]
    }

    /// The nearest ancestor that is a joint and no carrier.
    pub fn parent_joint(&self, joint: usize) -> Option<usize> {
        std::iter::successors(self.joints[joint].parent, |&up| self.joints[up].parent)
            .find(|&up| self.joints[up].kind == JointKind::Joint)
    }

    /// Indices of the joints that are listed, in order.
    pub fn listed(&self) -> impl Iterator<Item = usize> + '_ {
        (0..self.joints.len()).filter(|&index| self.joints[index].kind == JointKind::Joint)
    }

    /// How many joints stand above this one, carriers not counted.
    pub fn depth(&self, joint: usize) -> usize {
        std::iter::successors(self.parent_joint(joint), |&up| self.parent_joint(up)).count()
    }
}

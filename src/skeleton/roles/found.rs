//! What was found: a role for each joint with confidence and reason, chains, twist helpers, and doubts.

use std::collections::BTreeMap;

use glam::DVec3;

use super::super::{Skeleton, Transform};
use super::role::{Finger, Role, Side};
use super::shape::RestShape;

/// Below this a role is not given but asked about.
pub const LEAST_CONFIDENCE: f64 = 0.3;

/// What a skeleton is taken for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Body {
    /// Stands on two legs.
    Upright,
    /// Stands on four legs or more.
    FourLegged,
    /// Neither could be made out.
    Unknown,
}

/// What a chain of joints is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
#[expect(missing_docs, reason = "the names say it")]
pub enum ChainKind {
    Trunk,
    Neck,
    Arm,
    Leg,
    FrontLeg,
    Finger(Finger),
    Tail,
    Wing,
    Ear,
    Other,
}

/// Joints one below the other that move as one limb.
#[derive(Clone, Debug, PartialEq)]
pub struct Chain {
    /// What it is.
    pub kind: ChainKind,
    /// Its side; `None` on the middle plane, or where it is not known.
    pub side: Option<Side>,
    /// From the body outwards; twist helpers not among them.
    pub joints: Vec<usize>,
}

/// What was found of one joint.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct JointRole {
    /// The part it plays; `None` when it plays none of the human figure, or not surely enough.
    pub role: Option<Role>,
    /// The side it lies on, as far as known.
    pub side: Option<Side>,
    /// The chain it is in, as index into [`Roles::chains`].
    pub chain: Option<usize>,
    /// Its place in the chain, from 0.
    pub place: usize,
    /// How sure the role is, 0 to 1; of a joint without a role 0.
    pub confidence: f64,
    /// Why, in words.
    pub reason: String,
}

/// A joint along or beside a bone that shares in its twist.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TwistHelper {
    /// The helper.
    pub joint: usize,
    /// The joint whose bone it lies on.
    pub of: usize,
    /// Where along the bone, 0 at the joint to 1 at its end.
    pub share: f64,
}

/// Something a person should look at.
#[derive(Clone, Debug, PartialEq)]
pub struct Doubt {
    /// The joint it is about.
    pub joint: Option<usize>,
    /// The role it is about.
    pub role: Option<Role>,
    /// What is doubtful and why, in words.
    pub text: String,
}

/// Roles, chains and rest shape of a skeleton.
#[derive(Clone, Debug, PartialEq)]
pub struct Roles {
    /// For each joint of the skeleton, carriers included.
    pub joints: Vec<JointRole>,
    /// All chains: trunk, neck, legs, arms, fingers, then what else there is.
    pub chains: Vec<Chain>,
    /// Twist helpers, in the order of their joints.
    pub twist_helpers: Vec<TwistHelper>,
    /// What should be looked at before the roles are used.
    pub doubts: Vec<Doubt>,
    /// What the skeleton is taken for.
    pub body: Body,
    /// The rest pose they were found in.
    pub shape: RestShape,
    /// Root joints of further figures in the same file, which got no roles: see [`Roles::find_below`].
    pub other_figures: Vec<usize>,
    /// Joints that stand where another one does, with all that hangs on them, and that other: a file may bring a figure's joints again for
    /// each of its skins. Copies play no role.
    pub copies: Vec<(usize, usize)>,
    pub(super) by_role: BTreeMap<Role, usize>,
}

impl Roles {
    /// Finds the roles of a skeleton from its names and its rest pose. What is not sure is not given but among the doubts.
    ///
    /// ```
    /// use turnwright::skeleton::roles::Roles;
    /// use turnwright::skeleton::Skeleton;
    ///
    /// let roles = Roles::find(&Skeleton::new(vec![])?);
    /// assert!(roles.iter().next().is_none());
    /// # Ok::<(), turnwright::skeleton::SkeletonError>(())
    /// ```
    pub fn find(skeleton: &Skeleton) -> Self {
        Self::find_at(skeleton, &skeleton.rest_pose())
    }

    /// As [`Roles::find`], with another pose for the rest: one transform for each joint, relative to its parent.
    ///
    /// # Panics
    /// When `rest` has not one transform for each joint.
    pub fn find_at(skeleton: &Skeleton, rest: &[Transform]) -> Self {
        Self::find_below(skeleton, rest, None)
    }

    /// As [`Roles::find_at`], but with `root` only what hangs on that joint is looked at: one figure of several in a file.
    ///
    /// # Panics
    /// When `rest` has not one transform for each joint.
    pub fn find_below(skeleton: &Skeleton, rest: &[Transform], root: Option<usize>) -> Self {
        super::find::find(skeleton, rest, root)
    }

    /// The same roles in another pose, with the shape that the figure has there. What a joint is does not hang on the pose that counts as rest:
    /// a pose from within a motion would show it worse. `up` is where up is in that pose's scene; unit.
    ///
    /// # Panics
    /// When `pose` has not one transform for each joint.
    #[must_use]
    pub fn posed(&self, skeleton: &Skeleton, pose: &[Transform], up: DVec3) -> Self {
        let top = self.joint(Role::Hips).or_else(|| skeleton.listed().next());
        Self { shape: self.shape.posed(skeleton, pose, up, top), ..self.clone() }
    }

    /// The joint that plays a role.
    pub fn joint(&self, role: Role) -> Option<usize> {
        self.by_role.get(&role).copied()
    }

    /// The role a joint plays.
    pub fn role(&self, joint: usize) -> Option<Role> {
        self.joints.get(joint)?.role
    }

    /// All roles that were given, in the order of [`Role`], with their joints.
    pub fn iter(&self) -> impl Iterator<Item = (Role, usize)> + '_ {
        self.by_role.iter().map(|(role, joint)| (*role, *joint))
    }

    /// The required roles of a human figure that no joint plays.
    pub fn missing(&self) -> Vec<Role> {
        Role::all().into_iter().filter(|role| role.is_required() && self.joint(*role).is_none()).collect()
    }

    /// Whether all required roles of a human figure are given.
    pub fn is_human(&self) -> bool {
        self.body == Body::Upright && self.missing().is_empty()
    }

    /// The chain of that kind and side.
    pub fn chain(&self, kind: ChainKind, side: Option<Side>) -> Option<&Chain> {
        self.chains.iter().find(|chain| chain.kind == kind && chain.side == side)
    }
}

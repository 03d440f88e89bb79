//! Which joint plays which part: the roles of the open humanoid specification, found by names and by shape.
//!
//! Names alone mislead (`leg` is a thigh or a shin, `shoulder` a collar bone or an upper arm), and many files have none worth
//! the name. So the shape decides what is a leg, an arm, the trunk; within a limb every way to read its chain is tried,
//! and names and proportions judge together. What is left unsure is asked and not guessed.
//!
//! Roles: `VRMC_vrm` 1.0, humanoid; names and proportions also of ISO/IEC 19774-1:2019 (H-Anim).

mod body;
mod checks;
mod copies;
mod dictionary;
mod facing;
mod figure;
mod find;
mod fingers;
mod found;
mod limb_roles;
mod limb_shape;
mod limbs;
mod name;
mod other_chains;
mod pairs;
mod role;
mod shape;
mod trunk_roles;
mod words;

pub use found::{Body, Chain, ChainKind, Doubt, JointRole, LEAST_CONFIDENCE, Roles, TwistHelper};
pub use role::{Finger, Phalanx, Role, Side};
pub use shape::{RestShape, limb_frame};

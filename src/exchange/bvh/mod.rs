//! BVH motion text.
//!
//! | matter | in the file | in the clip |
//! |---|---|---|
//! | angles | degrees, right-handed, a row of channels for each joint | rotors, and the degrees as [`crate::clip::FileAngles`] |
//! | order | channels from left to right about moving axes: `R = R1 R2 R3` | the same |
//! | rest pose | all angles 0: every joint stands parallel to the world | rest rotation none, rest place `OFFSET` |
//! | positions | in place of `OFFSET`, in the file's length | translation relative to the parent |
//! | time | frame `i` at `i` × `Frame Time` as written | the same |
//! | between frames | not said | slerp the short way; straight lines for positions |
//! | End Site | a point on its joint | a tip of the joint |
//!
//! No normative text exists. Sources: Meredith & Maddock 2001, *Motion Capture File Formats Explained*, University of
//! Sheffield CS-01-11; Lander 1998, *Working with Motion Capture File Formats*.

mod create;
mod error;
mod read;
mod scanner;
mod syntax;
#[cfg(test)]
mod tests;
mod write;

pub use create::{from_clip, from_clip_to};
pub use error::{BvhError, BvhErrorKind};
pub use read::{Document, read};
pub use write::{write, write_to};

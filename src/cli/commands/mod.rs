//! The commands, one file each.

pub(super) mod blend;
pub(super) mod convert;
pub(super) mod demo;
pub(super) mod mend;
pub(super) mod picture;
pub(super) mod proof;
pub(super) mod retarget;
pub(super) mod sample;
pub(super) mod snags;

//! Carrying a clip to another skeleton.
//!
//! A [`Figure`] is a skeleton in the pose that counts as its rest. A [`JointMap`] says which joint of the source drives which
//! joint of the target. [`retarget`] carries the clip over: world turns away from rest, rest poses compared by where limbs
//! point and bend, chains of unequal length spread along their length, the path scaled by the legs, and feet held where the
//! source's stand.

mod alignment;
mod carry_limits;
mod chain;
mod contact_file;
mod figure;
mod fingerprint;
mod hands;
mod joint_map;
mod keep;
mod map_file;
mod measure;
mod options;
mod partner;
mod plan;
mod report;
mod rest;
mod smooth;
mod stand;
mod transfer;

pub use chain::spread;
pub use contact_file::{ContactError, Contacts, read_contacts, write_contacts};
pub use figure::Figure;
pub use fingerprint::fingerprint;
pub use hands::palm;
pub use joint_map::{JointMap, Link, LinkKind};
pub use map_file::{MapError, MapRow, read_map, write_map};
pub use options::{FootContact, HandHold, HoldAt, KeptLimits, Options};
pub use partner::{Partner, partner};
pub use report::{DirectionError, LargestCorrection, LimitUse, Missed, Report};
pub use rest::RestPick;
pub use stand::find_contacts;
pub use transfer::{Driver, RetargetError, Retargeted, Transfer, retarget};

//! Motion as CSV (RFC 4180).
//!
//! | columns | meaning |
//! |---|---|
//! | `time`, `time_s` | seconds |
//! | `NAME.qx .qy .qz .qw` | quaternion, in any order |
//! | `NAME.yz .zx .xy` | plane angles in degrees |
//! | `NAME.z NAME.x NAME.y` | angles in degrees about moving axes, applied in the order of the columns |
//! | `NAME.tx .ty .tz` | place relative to the parent; what is missing is the rest place |
//!
//! Turns are relative to the parent. Lines `# joint NAME parent NAME offset X Y Z` before the header carry the skeleton;
//! without them every joint is a root, unless a skeleton is given in a file of its own or by another clip. Each row is a
//! frame, at its own time; of rows at the very same time the last is used. A quaternion sensor's `Time (s),W,X,Y,Z` is read as one joint.
//!
//! Where the header has semicolons or tabs between its names, cells are parted by these, and numbers may have a decimal comma
//! in place of the point: one of the two in a whole file.

mod bones;
mod cells;
mod columns;
mod create;
mod error;
mod read;
#[cfg(test)]
mod tests;
mod write;

pub use bones::{Bone, bones_of, has_skeleton, hierarchy};
pub use columns::{CsvOptions, NamedColumns, NoColumns, NoTimeUnit, TimeUnit};
pub use create::{from_clip, from_clip_to};
pub use error::{CsvError, CsvErrorKind};
pub use read::{Document, header, read};
pub use write::write;

//! Clips: keys, tracks, paths between keys, sampling.
//!
//! Knows nothing of files or screens. A clip read from a file is never changed; edits make a new one that shares
//! what they did not touch.

mod angle_rows;
mod branch;
mod bulk;
mod contact;
mod continuity;
mod copied_keys;
mod degrees;
mod difference;
mod displace;
mod feet;
mod key_edit;
mod keys;
mod loop_seam;
mod path;
mod places;
mod playing;
mod reduce;
mod resample;
mod rotation_track;
mod sampler;
mod short_steps;
mod smooth;
mod take;
mod times;
mod vector_keys;
mod vector_track;
mod worlds;

pub use angle_rows::{AngleRows, AngleScratch};
pub use branch::Branch;
pub use bulk::turns_between;
pub use contact::{
    ContactOptions, Contacts, Foot, FootPart, JointPoint, PlantedSpan, Slide, Trails, contacts, leg_lengths,
    median_place, slide_of, slides,
};
pub use continuity::{continuous_angles, continuous_angles_to};
pub use copied_keys::CopiedKeys;
pub use degrees::{Degrees, Growing, is_whole};
pub use difference::Difference;
pub use displace::{Push, PushFrame, pushed};
pub use feet::standing_feet;
pub use key_edit::{KeyChange, KeyEdit, NewKey, with_key_edits};
pub use keys::Keys;
pub(crate) use loop_seam::key_at;
pub use loop_seam::{LoopSeam, Round};
pub use path::{
    Handles, MeantTurn, Pace, PathError, PathKind, Paths, Peak, Segment, Segments, Spacing, SpacingError,
};
pub use playing::Playing;
pub use reduce::{KeyCount, ReduceOptions, reduced, reduced_together};
pub use resample::{cut, resampled};
pub use rotation_track::{FileAngles, RotationTrack, Stored};
pub use short_steps::{ShortSteps, with_short_steps};
pub use smooth::{Kernel, Smoothing, partly};
pub use take::{Clip, FrameGrid, JointTracks};
pub use times::{Place, Times};
pub use vector_keys::{FewAxesRows, VectorKeys};
pub use vector_track::{VectorPath, VectorTrack};
pub use worlds::Worlds;

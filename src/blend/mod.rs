//! Two clips, or more, become one motion: joined, mixed or layered.
//!
//! All functions take clips of one skeleton ([`fit()`] brings a clip of another joint order or length unit there; a clip
//! of another body is carried over first, see the layer above). The result has the first clip's skeleton and rate.

mod add;
mod cloud;
mod error;
mod feet;
mod fit;
mod frames;
mod ground;
mod join;
mod jumps;
mod mask;
mod mean;
mod mix;
mod registration;
mod repeat;
mod root;
mod warp;

pub use add::{Reference, Side, add};
pub use cloud::{Cloud, DistancePicture, Landmarks};
pub use error::BlendError;
pub use feet::join_on_feet;
pub use fit::fit;
pub use ground::{GroundMove, moved};
pub use join::{JoinPlace, best_places, join, join_distances, join_ground};
pub use jumps::{Jump, worst_jump};
pub use mask::Mask;
pub use mean::{MeanHow, mean_stops, mix_many, mix_many_by};
pub use mix::{MixAlong, MixHow, mix, mix_aligned, mix_by};
pub use registration::{Registration, Stop, align};
pub use repeat::{LoopPart, best_loops, repeat, stride, with_first_again};
pub use root::{RootFrom, pose_onto};
pub use warp::{WarpPath, time_warp};

//! Finding rotation faults. One file a kind; reads clips, never changes them.

mod angle_steps;
mod border;
mod branches;
mod broken_value;
mod find;
mod finding;
mod half_turn;
mod jitter;
mod kind;
mod long_way;
mod memory;
mod mirror;
mod mirrored_angles;
mod outline;
mod past_limit;
mod plane_turns;
mod poses;
mod progress;
mod roughness;
mod scan;
mod seam;
mod sign_flip;
mod slide;
mod spike;
mod stuck;
mod wrap;

pub use find::{find, find_in_clip, find_with, preset_limits};
pub use finding::{LoopClose, LoopForm, Plant, Remedy, Snag};
pub use half_turn::{Flips, find_half_turns};
pub use kind::{NoSuchKind, SnagKind};
pub use memory::Memory;
pub use outline::{Outline, Outlines};
pub use past_limit::find_past_limit;
pub(crate) use plane_turns::nearest_plane_angles;
pub use progress::{Cancelled, Progress, Unwatched};
pub use scan::View;

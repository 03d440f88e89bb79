//! Joint limits: how far a joint may tilt and twist, clamps, limits learned from a take, and the preset for adults.
//!
//! Knows clips and skeletons; finds and mends nothing by itself. Angles are radians; degrees stand in the preset's tables, as their
//! sources give them.

pub mod adult;
mod inside;
mod interval;
mod joint_limit;
mod learn;
mod limits;
mod swing;
mod track_clamp;

pub use inside::{Inside, PROVED_TOGETHER};
pub use interval::Interval;
pub use joint_limit::{Clamp, JointLimit, Range, Reading, USUAL_COMFORT};
pub use learn::{LearnOptions, learned};
pub use limits::{Keeping, Limits, limb_direction, readings};
pub use swing::{ClampTo, SwingLimit};

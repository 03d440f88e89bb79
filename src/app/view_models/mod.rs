//! What the panels show, as plain data: no egui types, so that deriving it can be tested without a window.

mod change_log;
mod changes;
mod curves;
mod figure;
mod heat;
mod joint_numbers;
mod joint_tree;
mod map_rows;
mod memo;
mod pass_order;
mod pass_rows;
mod pyramid;
mod sampled;
mod snag_rows;
mod time_choice;
mod time_window;
mod words;

pub use change_log::{LogBlock, log_blocks};
pub use changes::{Changes, changes};
pub use curves::{CurveLine, CurveSet, CurveView, curve_set};
pub use figure::{FigureRequest, Stage, bounds_at, figure_view, scene_from_joint, tip_path};
pub use heat::{HeatKind, HeatMap, HeatScale, HeatWish, heat_map};
pub use joint_numbers::{JointNumbers, RotationNumbers, joint_numbers};
pub use joint_tree::{TreeRow, tree_rows};
pub use map_rows::{MapRow, limb_starts, map_rows};
pub use memo::Memo;
pub use pass_order::place_for;
pub use pass_rows::{PassRow, pass_rows};
pub use pyramid::Pyramid;
pub use sampled::{SampleTimes, limb_direction, rotation_at};
pub use snag_rows::{SnagFilter, SnagOrder, SnagRow, SnagState, snag_rows, snag_states};
pub use time_choice::TimeChoice;
pub use time_window::{Tick, TimeWindow, ticks};
pub use words::{counted, degrees, degrees_fixed, frames_text, rate_text, seconds};

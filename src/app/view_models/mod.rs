//! What the panels show, as plain data: no egui types, so that deriving it can be tested without a window.

mod blend;
mod carry;
mod carry_figures;
mod change_log;
mod changes;
mod curve_measure;
mod curves;
mod figure;
mod hand_drag;
mod hand_turns;
mod handles;
mod heat;
mod joint_numbers;
mod joint_tree;
mod key_choice;
mod key_drag;
mod limit_room;
mod local_curves;
mod map_rows;
mod memo;
mod names;
mod pass_order;
mod pass_rows;
mod pyramid;
mod reach;
mod sampled;
mod snag_rows;
mod stretch;
mod time_choice;
mod time_window;
mod trail;
mod words;

pub use blend::{
    BlendFacts, BlendKind, LaneBars, blend_facts, clip_letter, held_place, knots_of, lane_bars, mean_shares,
    mean_weights, new_blend, weight_at, with_knot, with_knot_at, with_mean_weight, without_knot,
};
pub use carry::{
    BarMark, CarryBar, CarryFacts, CarryLine, CarryRow, CarryState, Lane, carry_bars, carry_facts,
    carry_lines, with_bar, with_bar_at, with_hold, with_link, without_bar, without_link,
};
pub use carry_figures::{CarryEye, CarryPicture, CarryPose, carry_overlay, carry_view};
pub use change_log::{LogBlock, log_blocks};
pub use changes::{Changes, changes};
pub use curve_measure::Measure;
pub use curves::{Ceiling, CurveKey, CurveLine, CurveSet, CurveView, LimitBand, curve_set, fitted_values};
pub use figure::{
    FaintFigure, FigureRequest, FigureView, Handling, Stage, bounds_at, figure_view, joint_bounds,
    scene_from_joint,
};
pub use hand_drag::{Drag, FINE, Swept, step_turn};
pub use hand_turns::{HandTurn, HandTurns, hand_edit, is_dense, turn_now};
pub use handles::{DiscHandle, Handles, TipHandle, disc_radius_px, handles};
pub use heat::{HeatKind, HeatMap, HeatScale, HeatWish, heat_map};
pub use joint_numbers::{JointNumbers, RotationNumbers, joint_numbers};
pub use joint_tree::{TreeRow, tree_rows};
pub use key_choice::KeyChoice;
pub use key_drag::{Grip, KeyBase, KeyDrag, Stroke, key_at, on_frame, with_more, with_more_pushes};
pub use limit_room::{LimitRooms, Room, RoomKey};
pub use local_curves::{LocalCurves, local_curves};
pub use map_rows::{MapRow, limb_starts, map_rows};
pub use memo::Memo;
pub use names::{Shared, shortened};
pub use pass_order::place_for;
pub use pass_rows::{PassRow, pass_rows};
pub use pyramid::Pyramid;
pub use reach::{ReachOf, reach_of};
pub use sampled::{SampleTimes, limb_direction, rotation_at};
pub use snag_rows::{SnagFilter, SnagOrder, SnagRow, SnagState, snag_rows, snag_states};
pub use stretch::{Stretch, is_frame_apart, one_stretch, segments, shaped_rows, with_shaping};
pub use time_choice::TimeChoice;
pub use time_window::{Tick, TimeWindow, ticks};
pub use trail::Trail;
pub use words::{clock, counted, degrees, degrees_fixed, frames_text, rate_text, seconds};

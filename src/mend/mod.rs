//! Mending rotation faults. One file a kind of remedy; a mend gives a new clip and leaves the old one as it was.

mod apply;
mod banded;
mod clamp;
mod draft;
mod error;
mod jitter;
mod loop_close;
mod numbers;
mod other_side;
mod others;
mod plant;
mod redraw;
mod regress;
mod stuck;
mod survey;
mod take_out;
mod tips;

pub use apply::{apply, apply_all, change_at_snag_rad, change_rad};
pub use error::MendError;
pub use loop_close::{LoopOptions, LoopReport, close_loop};
pub use plant::{Miss, PlantOptions, PlantReport, faded, move_end, plant_feet, plant_feet_at};
pub use survey::{Survey, SurveyOptions, survey};
pub use tips::change_at_tips;

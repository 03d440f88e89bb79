//! The preset for adult human figures: published ranges, put on a skeleton by the roles of its joints.
//!
//! Every number stands with its source in `assets/limits`. Measured is from the anatomical zero (see `anatomy`). What is not
//! measured: thumbs (their zero can't be told from a rest shape), jaw and eyes, and the trunk as a whole (each of its joints is, by
//! its share).

mod anatomy;
mod place;
mod spine;
mod table;

pub use place::{AdultLimits, NoAdult, limits, limits_for};
pub use table::{Figure, figures, sources};

/// To stand wherever the preset is listed.
pub const CAUTION: &str = "Population norms for plausible animation, not clinical advice and not limits for a person; machines need \
                           their own limits.";

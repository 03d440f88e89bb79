//! Fewer keys, with a bound on what changes that holds at every time.

mod clip;
mod places;
mod spans;
mod tips;
mod track;
mod turns;

pub use clip::{KeyCount, ReduceOptions, reduced, reduced_together};

//! Turnwright: find, mend, reshape and prove the turns of an animation clip.
//!
//! Layers, lowest first; each knows only those before it: [`rotor`], [`skeleton`], [`clip`], [`limit`], [`snag`], [`mend`],
//! [`blend`], [`retarget`], [`scene`], [`exchange`], [`demo`], [`proof`], [`raster`], [`cli`] and `app`.
//!
//! Conventions: right-handed, Y up, seconds, lengths as in the file, radians, `f64`. Degrees appear at two borders
//! only: in `exchange` and wherever a person reads or types a number.

#[cfg(feature = "gui")]
pub mod app;
pub mod blend;
pub mod cli;
pub mod clip;
pub mod demo;
pub mod exchange;
pub mod limit;
pub mod mend;
pub mod proof;
pub mod raster;
pub mod retarget;
pub mod rotor;
pub mod scene;
pub mod skeleton;
pub mod snag;

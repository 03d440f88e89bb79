//! Turnwright: find, mend, reshape and prove the turns of an animation clip.
pub mod rotor;

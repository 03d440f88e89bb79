//! The suite: what several modules promise together, against values and files from outside.
//!
//! | module | what belongs there |
//! |---|---|
//! | `support` | where the outside files are, and comparing with a tolerance; no tests of its own |
mod rotor_checks;
mod support;

//! The numbers that a pass runs with, for lists and sheets.

/// One number with its name and unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PassNumber {
    /// What it is called.
    pub name: &'static str,
    /// Its value, in the unit.
    pub value: f64,
    /// `°`, `Hz`, `s`, `%`; empty for a count.
    pub unit: &'static str,
}

impl PassNumber {
    /// A number with a unit.
    pub const fn new(name: &'static str, value: f64, unit: &'static str) -> Self {
        Self { name, value, unit }
    }

    /// A count.
    pub const fn count(name: &'static str, count: usize) -> Self {
        Self { name, value: count as f64, unit: "" }
    }

    /// An angle given in radians.
    pub fn angle(name: &'static str, rad: f64) -> Self {
        Self { name, value: rad.to_degrees(), unit: "°" }
    }
}

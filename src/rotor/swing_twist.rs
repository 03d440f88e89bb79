//! A turn split into a twist about a chosen axis and the swing that tilts that axis.

use glam::DVec3;

use super::{Bivector, Rotor};

/// `rotation = swing * twist`: the twist comes first, about `axis`; the swing has no part about it.
///
/// Source: Dobrowolski 2015, "Swing-twist decomposition in Clifford algebra".
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SwingTwist {
    /// The turn that tilts the axis, at most half a turn.
    pub swing: Rotor,
    /// The turn about the axis.
    pub twist: Rotor,
    /// The twist in radians, −π to π, right-handed about the axis.
    pub twist_rad: f64,
    /// Cosine of half the swing. Near 0 (a swing of half a turn) the twist is noise, at 0 it is set to none.
    pub certainty: f64,
}

impl SwingTwist {
    /// Splits `rotation` about the unit vector `axis`.
    pub fn new(rotation: Rotor, axis: DVec3) -> Self {
        let plane = Bivector::from_axis(axis);
        let along = rotation.bivector().dot(plane);
        let certainty = along.hypot(rotation.s);
        if certainty < 1e-150 {
            return Self { swing: rotation, twist: Rotor::IDENTITY, twist_rad: 0.0, certainty: 0.0 };
        }
        let twist = Rotor::from_parts(rotation.s / certainty, plane * (along / certainty));
        let twist_rad = match -2.0 * along.atan2(rotation.s) {
            wide if wide > std::f64::consts::PI => wide - std::f64::consts::TAU,
            wide if wide <= -std::f64::consts::PI => wide + std::f64::consts::TAU,
            narrow => narrow,
        };
        Self { swing: rotation * twist.reverse(), twist, twist_rad, certainty }
    }
}

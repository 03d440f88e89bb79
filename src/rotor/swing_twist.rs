//! A turn split into a twist about a chosen axis and the swing that tilts that axis.

use std::f64::consts::{PI, TAU};

use glam::DVec3;

use super::bivector::length_of;
use super::{Bivector, Rotor};

/// `rotation = swing * twist`: the twist comes first, about `axis`; the swing has no part about it.
///
/// Where the swing is half a turn any twist fits, and near it the twist is noise: with noise of 1e-4 on the parts a true
/// twist of 30° is read as 30.05° at a swing of 170° and as 34.7° at 179.9°. `certainty` says how near that is.
///
/// Source: Dobrowolski 2015, "Swing-twist decomposition in Clifford algebra".
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SwingTwist {
    /// The turn that tilts the axis, at most half a turn; its scalar part is never negative.
    pub swing: Rotor,
    /// The turn about the axis.
    pub twist: Rotor,
    /// The twist in radians, above −π and up to π, right-handed about the axis.
    pub twist_rad: f64,
    /// Cosine of half the swing. Near 0 (a swing of half a turn) the twist is noise, at 0 it is set to none.
    pub certainty: f64,
}

impl SwingTwist {
    /// Splits the unit rotor `rotation` about `axis`, of any length but zero. About a zero axis all is swing.
    #[must_use]
    pub fn new(rotation: Rotor, axis: DVec3) -> Self {
        let plane = Bivector::from_axis(axis).normalize_or_zero();
        let along = rotation.bivector().dot(plane);
        let certainty = length_of(along, rotation.s);
        if plane == Bivector::ZERO || certainty < UNDETERMINED {
            return Self { swing: rotation, twist: Rotor::IDENTITY, twist_rad: 0.0, certainty: 0.0 };
        }
        let twist = Rotor::from_parts(rotation.s / certainty, plane * (along / certainty));
        // Read from the sign with s ≥ 0, so that a tiny twist keeps its digits instead of being 2π less 2π.
        let half = if rotation.s < 0.0 { along.atan2(-rotation.s) } else { -along.atan2(rotation.s) };
        let twist_rad = if 2.0 * half <= -PI { 2.0 * half + TAU } else { 2.0 * half };
        Self { swing: rotation * twist.reverse(), twist, twist_rad, certainty }
    }

    /// The swing in radians, 0 to π.
    #[must_use]
    pub fn swing_rad(&self) -> f64 {
        self.swing.turn()
    }
}

/// Below this the squares of the parts underflow, and there is no twist to read.
const UNDETERMINED: f64 = 1e-150;

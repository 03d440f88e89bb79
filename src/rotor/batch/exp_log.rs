//! From plane angles to rotors and back.

use super::super::{Bivector, Rotor};
use super::blocks::{each_row, each_row_guarded};
use super::level::Level;
use super::real::Real;
use super::streams::{Parts, PartsMut};

/// The rotors of turns given as plane angles in radians, row by row: [`Rotor::from_plane_angles`] within 1e-15 rad
/// (`f32`: 3e-7 rad), of any size.
///
/// Sine and cosine of half the turn are polynomials of its square up to 180°, as far as `log` gives it; longer turns take
/// their time.
///
/// # Panics
/// When the streams differ in length.
pub fn exp<F: Real>(level: Level, angles: Parts<'_, F, 3>, out: PartsMut<'_, F, 4>) {
    // (π/2)² and a hair, as far as the polynomials reach.
    let most = F::narrowed(2.467_402);
    level.run(
        #[inline(always)]
        || {
            each_row_guarded(
                angles,
                out,
                #[inline(always)]
                |[yz, zx, xy]: [F; 3]| {
                    let square = F::HALF * F::HALF * (yz * yz + zx * zx + xy * xy);
                    let factor = -F::HALF * square.sine_over_angle();
                    ([square.cosine(), yz * factor, zx * factor, xy * factor], most - square)
                },
                |[yz, zx, xy]| {
                    let angles = Bivector::new(yz.widened(), zx.widened(), xy.widened());
                    let rotor = Rotor::from_plane_angles(angles);
                    [rotor.s, rotor.yz, rotor.zx, rotor.xy].map(F::narrowed)
                },
            );
        },
    );
}

/// The plane angles in radians of the short turns of unit rotors, row by row: [`Rotor::plane_angles`] within 1e-15 rad
/// (`f32`: 5e-7 rad, which is two units in the last place of π).
///
/// # Panics
/// When the streams differ in length.
pub fn log<F: Real>(level: Level, rotors: Parts<'_, F, 4>, out: PartsMut<'_, F, 3>) {
    level.run(
        #[inline(always)]
        || {
            each_row(
                rotors,
                out,
                #[inline(always)]
                |[s, yz, zx, xy]: [F; 4]| {
                    let sign = if s < F::ZERO { F::TWO } else { -F::TWO };
                    let factor = sign * (F::ONE - s.size()).angle_over_sine();
                    [yz * factor, zx * factor, xy * factor]
                },
            );
        },
    );
}

//! From plane angles to rotors and back.

use super::super::{Bivector, Rotor};
use super::blocks::{Column, each_block, each_row, mend_rare};
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
    level.run(
        #[inline(always)]
        || {
            each_block(
                angles,
                out,
                #[inline(always)]
                |angles: [&Column<F, 64>; 3], out: [&mut Column<F, 64>; 4]| exp_block(angles, out),
            );
        },
    );
}

#[inline(always)]
fn exp_block<F: Real, const ROWS: usize>(angles: [&Column<F, ROWS>; 3], out: [&mut Column<F, ROWS>; 4]) {
    // π² and a hair, as far as the polynomials reach.
    let most = F::narrowed(4.0 * 2.467_402);
    let [yz, zx, xy] = angles;
    let (mut squares, mut guards, mut factors) = ([F::ZERO; ROWS], [F::ZERO; ROWS], [F::ZERO; ROWS]);
    for row in 0..ROWS {
        squares[row] = yz[row] * yz[row] + zx[row] * zx[row] + xy[row] * xy[row];
        guards[row] = most - squares[row];
    }
    for row in 0..ROWS {
        (out[0][row], factors[row]) = squares[row].parts_of_turn();
    }
    for part in 0..3 {
        for row in 0..ROWS {
            out[part + 1][row] = angles[part][row] * factors[row];
        }
    }
    mend_rare(&guards, angles, out, &|[yz, zx, xy]: [F; 3]| {
        let angles = Bivector::new(yz.widened(), zx.widened(), xy.widened());
        let rotor = Rotor::from_plane_angles(angles);
        [rotor.s, rotor.yz, rotor.zx, rotor.xy].map(F::narrowed)
    });
}

/// The plane angles in radians of the short turns of unit rotors, row by row: [`Rotor::plane_angles`] within 1.5e-15 rad
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
                    let (above, below) = s.size().angle_over_sine();
                    let factor = sign * above / below;
                    [yz * factor, zx * factor, xy * factor]
                },
            );
        },
    );
}

//! Products of rotors, and rotors applied to vectors.

use super::blocks::each_row;
use super::level::Level;
use super::real::Real;
use super::streams::{Parts, PartsMut};

/// The products `a b`, row by row: turns by `b` first. The same formula as the product of two [`super::super::Rotor`]s.
///
/// # Panics
/// When the streams differ in length.
pub fn compose<F: Real>(level: Level, a: Parts<'_, F, 4>, b: Parts<'_, F, 4>, out: PartsMut<'_, F, 4>) {
    let [a0, a1, a2, a3] = a;
    let [b0, b1, b2, b3] = b;
    level.run(
        #[inline(always)]
        || {
            each_row(
                [a0, a1, a2, a3, b0, b1, b2, b3],
                out,
                #[inline(always)]
                |[s, yz, zx, xy, os, oyz, ozx, oxy]: [F; 8]| product([s, yz, zx, xy], [os, oyz, ozx, oxy]),
            );
        },
    );
}

/// Vectors turned by unit rotors, row by row: [`super::super::Rotor::apply`].
///
/// # Panics
/// When the streams differ in length.
pub fn apply<F: Real>(
    level: Level,
    rotors: Parts<'_, F, 4>,
    vectors: Parts<'_, F, 3>,
    out: PartsMut<'_, F, 3>,
) {
    let [s, yz, zx, xy] = rotors;
    let [x, y, z] = vectors;
    level.run(
        #[inline(always)]
        || {
            each_row(
                [s, yz, zx, xy, x, y, z],
                out,
                #[inline(always)]
                |[s, b0, b1, b2, x, y, z]: [F; 7]| turned([s, b0, b1, b2], [x, y, z]),
            );
        },
    );
}

/// The geometric product.
#[inline(always)]
pub(super) fn product<F: Real>([s, yz, zx, xy]: [F; 4], [os, oyz, ozx, oxy]: [F; 4]) -> [F; 4] {
    [
        s * os - yz * oyz - zx * ozx - xy * oxy,
        s * oyz + yz * os - (zx * oxy - xy * ozx),
        s * ozx + zx * os - (xy * oyz - yz * oxy),
        s * oxy + xy * os - (yz * ozx - zx * oyz),
    ]
}

/// `R v ~R`.
#[inline(always)]
pub(super) fn turned<F: Real>([s, b0, b1, b2]: [F; 4], [x, y, z]: [F; 3]) -> [F; 3] {
    let cross = [b1 * z - b2 * y, b2 * x - b0 * z, b0 * y - b1 * x];
    let again = [b1 * cross[2] - b2 * cross[1], b2 * cross[0] - b0 * cross[2], b0 * cross[1] - b1 * cross[0]];
    let v = [x, y, z];
    std::array::from_fn(|i| {
        let half = again[i] - s * cross[i];
        v[i] + (half + half)
    })
}

//! The turns between rotors with all that a spline asks of them.

use super::super::slope::Rests;
use super::blocks::each_row;
use super::level::Level;
use super::real::Polynomials;
use super::streams::{Parts, PartsMut};

/// The plane angles in radians of the turns from `a` to `b`, each the short one where the two are near each other in sign, and their
/// [`Rests`] in the order of its fields, row by row. All unit.
///
/// # Panics
/// When the streams differ in length.
pub(in super::super) fn turns_with_rests(
    level: Level,
    a: Parts<'_, f64, 4>,
    b: Parts<'_, f64, 4>,
    out: PartsMut<'_, f64, 8>,
) {
    let [a0, a1, a2, a3] = a;
    let [b0, b1, b2, b3] = b;
    level.run(
        #[inline(always)]
        || {
            each_row(
                [a0, a1, a2, a3, b0, b1, b2, b3],
                out,
                #[inline(always)]
                |[s, yz, zx, xy, t, u, v, w]: [f64; 8]| {
                    // ~a b.
                    let cosine = s * t + yz * u + zx * v + xy * w;
                    let x = s * u - yz * t + (zx * w - xy * v);
                    let y = s * v - zx * t + (xy * u - yz * w);
                    let z = s * w - xy * t + (yz * v - zx * u);
                    let sine = (x * x + y * y + z * z).sqrt();
                    let (above, below) = cosine.angle_over_sine();
                    let factor = -2.0 * above / below;
                    let Rests { cosine, sine, cotangent, across, twice_across } =
                        Rests::of_half_turn(-factor * sine, sine, cosine);
                    [x * factor, y * factor, z * factor, cosine, sine, cotangent, across, twice_across]
                },
            );
        },
    );
}

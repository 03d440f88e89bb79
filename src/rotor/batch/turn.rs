//! The turn between two rotors.

use super::blocks::each_row;
use super::level::Level;
use super::real::Real;
use super::streams::Parts;

/// The turns in radians, 0 to π, from `a` to `b`, row by row: [`super::super::Rotor::turn_to`]. Both unit.
///
/// From the distance of the two points on the sphere of four dimensions, so the smallest turns keep their digits.
///
/// # Panics
/// When the streams differ in length.
pub fn turns<F: Real>(level: Level, a: Parts<'_, F, 4>, b: Parts<'_, F, 4>, out: &mut [F]) {
    let [a0, a1, a2, a3] = a;
    let [b0, b1, b2, b3] = b;
    level.run(
        #[inline(always)]
        || {
            each_row(
                [a0, a1, a2, a3, b0, b1, b2, b3],
                [out],
                #[inline(always)]
                |row: [F; 8]| {
                    let [mut apart, mut sum] = [F::ZERO; 2];
                    for part in 0..4 {
                        let (difference, both) = (row[part] - row[part + 4], row[part] + row[part + 4]);
                        apart = apart + difference * difference;
                        sum = sum + both * both;
                    }
                    // R and −R are one rotation. Half the square of the distance is 1 − cos of half the turn.
                    let rest = F::HALF * if sum < apart { sum } else { apart };
                    let (above, below) = (F::ONE - rest).square_over_rest();
                    [F::TWO * (rest * above / below).root()]
                },
            );
        },
    );
}

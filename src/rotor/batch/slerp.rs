//! Slerp and squad.

use super::super::{self as one, Rotor};
use super::blocks::{each_row, each_row_guarded};
use super::level::Level;
use super::real::Real;
use super::streams::{Parts, PartsMut};

/// Slerp the short way, row by row: [`super::super::slerp`] within 1e-15 rad (`f32`: 3e-7 rad).
///
/// `t` is a share of the way, 0 to 1. Unlike there the ends are met within that error and not exactly. The rotors are to be
/// unit within rounding; so is the result.
///
/// With `θ` half the turn and `u = 1 − cos θ`, `θ²/u` is a polynomial in `u`, and `θ/sin θ` and `sin(tθ)/(tθ)` follow from it
/// without a hard place between 0 and 180°.
///
/// # Panics
/// When the streams differ in length.
pub fn slerp<F: Real>(
    level: Level,
    a: Parts<'_, F, 4>,
    b: Parts<'_, F, 4>,
    t: &[F],
    out: PartsMut<'_, F, 4>,
) {
    level.run(
        #[inline(always)]
        || {
            each_row(
                joined(a, b, t),
                out,
                #[inline(always)]
                |row: [F; 9]| short_way(split(row)),
            );
        },
    );
}

/// Squad from `a` to `b` with given inner points, row by row: [`super::super::squad`] within a few times 1e-15 rad.
///
/// `t` is 0 to 1. Rows with a dot product below 0 go the long way, as there.
///
/// # Panics
/// When the streams differ in length.
pub fn squad<F: Real>(
    level: Level,
    [a, inner_a, inner_b, b]: [Parts<'_, F, 4>; 4],
    t: &[F],
    out: PartsMut<'_, F, 4>,
) {
    let streams: Parts<'_, F, 17> = std::array::from_fn(|stream| match stream {
        0..4 => a[stream],
        4..8 => inner_a[stream - 4],
        8..12 => inner_b[stream - 8],
        12..16 => b[stream - 12],
        _ => t,
    });
    level.run(
        #[inline(always)]
        || {
            each_row_guarded(
                streams,
                out,
                #[inline(always)]
                |row: [F; 17]| {
                    let [a, inner_a, inner_b, b] = four(row);
                    let t = row[16];
                    let outer = short_way((a, b, t));
                    let inner = short_way((inner_a, inner_b, t));
                    let found = short_way((outer, inner, F::TWO * t * (F::ONE - t)));
                    // The polynomials end at a turn of 180°; what goes beyond, as signed, is rare.
                    let guards = [dot(a, b), dot(inner_a, inner_b), dot(outer, inner)];
                    let smaller = |x: F, y: F| if x < y { x } else { y };
                    (found, smaller(smaller(guards[0], guards[1]), guards[2]))
                },
                |row| {
                    let [a, inner_a, inner_b, b] = four(row).map(widened);
                    narrowed(one::squad(a, inner_a, inner_b, b, row[16].widened()))
                },
            );
        },
    );
}

#[inline(always)]
fn short_way<F: Real>((a, b, t): ([F; 4], [F; 4], F)) -> [F; 4] {
    let dot = dot(a, b);
    let sign = if dot < F::ZERO { -F::ONE } else { F::ONE };
    let rest = F::ONE - dot.size();
    let over_rest = rest.square_over_rest();
    let square = rest * over_rest;
    // θ/sin θ. A root and a division keep other parts of the machine busy than one more polynomial would.
    let stretch = (over_rest / (F::TWO - rest)).root();
    let back = F::ONE - t;
    let from = back * stretch * (back * back * square).sine_over_angle();
    let to = sign * t * stretch * (t * t * square).sine_over_angle();
    std::array::from_fn(|part| a[part] * from + b[part] * to)
}

#[inline(always)]
fn dot<F: Real>(a: [F; 4], b: [F; 4]) -> F {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2] + a[3] * b[3]
}

#[inline(always)]
fn joined<'a, F>(a: Parts<'a, F, 4>, b: Parts<'a, F, 4>, t: &'a [F]) -> Parts<'a, F, 9> {
    let [a0, a1, a2, a3] = a;
    let [b0, b1, b2, b3] = b;
    [a0, a1, a2, a3, b0, b1, b2, b3, t]
}

#[inline(always)]
fn split<F: Copy>([a0, a1, a2, a3, b0, b1, b2, b3, t]: [F; 9]) -> ([F; 4], [F; 4], F) {
    ([a0, a1, a2, a3], [b0, b1, b2, b3], t)
}

#[inline(always)]
fn four<F: Copy>(row: [F; 17]) -> [[F; 4]; 4] {
    std::array::from_fn(|rotor| std::array::from_fn(|part| row[4 * rotor + part]))
}

fn widened<F: Real>([s, yz, zx, xy]: [F; 4]) -> Rotor {
    Rotor::new(s.widened(), yz.widened(), zx.widened(), xy.widened())
}

fn narrowed<F: Real>(rotor: Rotor) -> [F; 4] {
    [rotor.s, rotor.yz, rotor.zx, rotor.xy].map(F::narrowed)
}

//! Slerp and squad.

use super::super::{self as one, Rotor};
use super::blocks::{Column, common_len, each_block, mend_rare};
use super::coefficients::MIDDLE_RATE_F64;
use super::level::Level;
use super::real::{Real, polynomial};
use super::streams::{Parts, PartsMut};

/// Rows of a block. With 9 streams in and 4 out a longer one falls behind the memory: the machine fetches ahead a little of each.
const SLERP_ROWS: usize = 32;

/// Rows of a block of squads. Of its 21 streams the machine can't fetch all ahead; so few are read at a time, and each of those
/// for a page of memory.
const SQUAD_ROWS: usize = 512;

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
            let mut desk = [[F::ZERO; SLERP_ROWS]; 7];
            each_block(
                joined(a, b, t),
                out,
                #[inline(always)]
                |[a0, a1, a2, a3, b0, b1, b2, b3, t]: [&Column<F, SLERP_ROWS>; 9],
                 out: [&mut Column<F, SLERP_ROWS>; 4]| {
                    short_way([a0, a1, a2, a3], [b0, b1, b2, b3], t, out, &mut desk);
                },
            );
        },
    );
}

/// [`slerp`] for shares within 1e-10 of a half, as they come up where a clip is brought to twice its rate; within 1e-15 rad and
/// several times as fast: between two rotors lies their sum.
///
/// # Panics
/// When the streams differ in length.
pub fn slerp_at_middle(
    level: Level,
    a: Parts<'_, f64, 4>,
    b: Parts<'_, f64, 4>,
    t: &[f64],
    out: PartsMut<'_, f64, 4>,
) {
    level.run(
        #[inline(always)]
        || {
            let mut desk = [[0.0; SLERP_ROWS]; 3];
            each_block(
                joined(a, b, t),
                out,
                #[inline(always)]
                |[a0, a1, a2, a3, b0, b1, b2, b3, t]: [&Column<f64, SLERP_ROWS>; 9], out| {
                    middle([a0, a1, a2, a3], [b0, b1, b2, b3], t, out, &mut desk);
                },
            );
        },
    );
}

#[inline(always)]
fn middle(
    a: [&Column<f64, SLERP_ROWS>; 4],
    b: [&Column<f64, SLERP_ROWS>; 4],
    t: &Column<f64, SLERP_ROWS>,
    out: [&mut Column<f64, SLERP_ROWS>; 4],
    [dots, from, to]: &mut [Column<f64, SLERP_ROWS>; 3],
) {
    for row in 0..SLERP_ROWS {
        dots[row] =
            a[0][row] * b[0][row] + a[1][row] * b[1][row] + a[2][row] * b[2][row] + a[3][row] * b[3][row];
    }
    for row in 0..SLERP_ROWS {
        let cosine = dots[row].abs();
        // The sum has the length 2 cos θ/2; and the slope there is that of an arc of θ.
        let share = 1.0 / (2.0 + 2.0 * cosine).sqrt();
        let beside = (t[row] - 0.5) * polynomial(&MIDDLE_RATE_F64, 1.0 - cosine);
        from[row] = share - beside;
        let other = share + beside;
        to[row] = if dots[row] < 0.0 { -other } else { other };
    }
    for part in 0..4 {
        for row in 0..SLERP_ROWS {
            out[part][row] = a[part][row] * from[row] + b[part][row] * to[row];
        }
    }
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
    let len = common_len(&streams, &out);
    let pages = len - len % SQUAD_ROWS;
    let mut halves = out.into_iter().map(|stream| stream.split_at_mut(pages));
    let mut rest: PartsMut<'_, F, 4> = Default::default();
    let whole = rest.each_mut().map(|rest| match halves.next() {
        Some((whole, behind)) => {
            *rest = behind;
            whole
        }
        None => &mut [],
    });
    level.run(
        #[inline(always)]
        || squad_blocks::<F, SQUAD_ROWS>(streams.map(|stream| &stream[..pages]), whole),
    );
    level.run(
        #[inline(always)]
        || squad_blocks::<F, SLERP_ROWS>(streams.map(|stream| &stream[pages..]), rest),
    );
}

#[inline(always)]
fn squad_blocks<F: Real, const ROWS: usize>(streams: Parts<'_, F, 17>, out: PartsMut<'_, F, 4>) {
    let zero = [F::ZERO; ROWS];
    let (mut ends, mut more, mut desk) = ([[zero; 4]; 2], [zero; 2], [[F::ZERO; SLERP_ROWS]; 7]);
    each_block(
        streams,
        out,
        #[inline(always)]
        |block: [&Column<F, ROWS>; 17], out: [&mut Column<F, ROWS>; 4]| {
            squad_block(block, out, &mut ends, &mut more, &mut desk);
        },
    );
}

#[inline(always)]
fn squad_block<F: Real, const ROWS: usize>(
    block: [&Column<F, ROWS>; 17],
    mut out: [&mut Column<F, ROWS>; 4],
    [outer, inner]: &mut [[Column<F, ROWS>; 4]; 2],
    [guards, shares]: &mut [Column<F, ROWS>; 2],
    desk: &mut Desk<F>,
) {
    let t = block[16];
    for row in 0..ROWS {
        shares[row] = F::TWO * t[row] * (F::ONE - t[row]);
    }
    // One slerp after the other, so that few streams are read at a time.
    for part in 0..ROWS / SLERP_ROWS {
        let columns = |first: usize| std::array::from_fn(|i| part_of(block[first + i], part));
        let out = outer.each_mut().map(|column| part_of_mut(column, part));
        short_way(columns(0), columns(12), part_of(t, part), out, desk);
        *part_of_mut(guards, part) = desk[0];
    }
    for part in 0..ROWS / SLERP_ROWS {
        let columns = |first: usize| std::array::from_fn(|i| part_of(block[first + i], part));
        let out = inner.each_mut().map(|column| part_of_mut(column, part));
        short_way(columns(4), columns(8), part_of(t, part), out, desk);
        lower(part_of_mut(guards, part), &desk[0]);
    }
    for part in 0..ROWS / SLERP_ROWS {
        let columns = [&*outer, &*inner].map(|four| four.each_ref().map(|column| part_of(column, part)));
        let out = out.each_mut().map(|column| part_of_mut(column, part));
        short_way(columns[0], columns[1], part_of(shares, part), out, desk);
        lower(part_of_mut(guards, part), &desk[0]);
    }
    // The fits end at a turn of 180°; what goes beyond, as signed, is rare.
    mend_rare(guards, block, out, &|row: [F; 17]| {
        let [a, inner_a, inner_b, b] = four(row).map(widened);
        narrowed(one::squad(a, inner_a, inner_b, b, row[16].widened()))
    });
}

#[inline(always)]
fn part_of<F, const ROWS: usize>(column: &Column<F, ROWS>, part: usize) -> &Column<F, SLERP_ROWS> {
    &column.as_chunks().0[part]
}

#[inline(always)]
fn part_of_mut<F, const ROWS: usize>(
    column: &mut Column<F, ROWS>,
    part: usize,
) -> &mut Column<F, SLERP_ROWS> {
    &mut column.as_chunks_mut().0[part]
}

/// The smaller in each row; `other` where one is no number.
#[inline(always)]
fn lower<F: Real>(guards: &mut Column<F, SLERP_ROWS>, other: &Column<F, SLERP_ROWS>) {
    for row in 0..SLERP_ROWS {
        guards[row] = if guards[row] < other[row] { guards[row] } else { other[row] };
    }
}

/// Where the stages of a block lie. The first column is the dot products as signed.
type Desk<F> = [Column<F, SLERP_ROWS>; 7];

/// Slerp of a block.
///
/// Stage by stage, each in a loop of its own: the steps of a polynomial have to wait for each other, and of a short loop so many
/// rounds are under way at once that none waits.
#[inline(always)]
fn short_way<F: Real>(
    a: [&Column<F, SLERP_ROWS>; 4],
    b: [&Column<F, SLERP_ROWS>; 4],
    t: &Column<F, SLERP_ROWS>,
    out: [&mut Column<F, SLERP_ROWS>; 4],
    [dots, above, below, squares, stretches, from, to]: &mut Desk<F>,
) {
    for row in 0..SLERP_ROWS {
        dots[row] =
            a[0][row] * b[0][row] + a[1][row] * b[1][row] + a[2][row] * b[2][row] + a[3][row] * b[3][row];
    }
    for row in 0..SLERP_ROWS {
        (above[row], below[row]) = dots[row].size().square_over_rest();
    }
    // θ² and (θ/sin θ)².
    for row in 0..SLERP_ROWS {
        let cosine = dots[row].size();
        let shared = above[row] / (below[row] * (F::ONE + cosine));
        stretches[row] = shared;
        squares[row] = shared * (F::ONE + cosine) * (F::ONE - cosine);
    }
    for row in 0..SLERP_ROWS {
        let back = F::ONE - t[row];
        from[row] = (back * back * squares[row]).times_sine_over_angle(back);
        stretches[row] = stretches[row].root();
    }
    for row in 0..SLERP_ROWS {
        to[row] = (t[row] * t[row] * squares[row]).times_sine_over_angle(t[row]);
    }
    for row in 0..SLERP_ROWS {
        let stretch = stretches[row];
        from[row] = from[row] * stretch;
        to[row] = to[row] * if dots[row] < F::ZERO { -stretch } else { stretch };
    }
    for part in 0..4 {
        for row in 0..SLERP_ROWS {
            out[part][row] = a[part][row] * from[row] + b[part][row] * to[row];
        }
    }
}

#[inline(always)]
fn joined<'a, F>(a: Parts<'a, F, 4>, b: Parts<'a, F, 4>, t: &'a [F]) -> Parts<'a, F, 9> {
    let [a0, a1, a2, a3] = a;
    let [b0, b1, b2, b3] = b;
    [a0, a1, a2, a3, b0, b1, b2, b3, t]
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

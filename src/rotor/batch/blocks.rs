//! The loop that every kernel runs in.

use super::real::Real;
use super::streams::{Parts, PartsMut};

/// Rows that are computed together where a kernel says no other number: enough for the compiler to make a loop of wide
/// instructions, few enough to stay in the first cache.
pub(super) const BLOCK: usize = 64;

/// A number for each row of a block.
pub(super) type Column<F, const ROWS: usize> = [F; ROWS];

/// Computes `lane` for every row: `I` numbers in, `O` numbers out.
///
/// # Panics
/// When the streams differ in length.
#[inline(always)]
pub(super) fn each_row<F: Real, const I: usize, const O: usize>(
    inputs: Parts<'_, F, I>,
    outputs: PartsMut<'_, F, O>,
    lane: impl Fn([F; I]) -> [F; O],
) {
    let mut found = [[F::ZERO; BLOCK]; O];
    each_block(
        inputs,
        outputs,
        #[inline(always)]
        |block: [&Column<F, BLOCK>; I], out: [&mut Column<F, BLOCK>; O]| {
            if I + O <= FEW {
                fill(block, out, &lane);
            } else {
                fill(block, found.each_mut(), &lane);
                for (column, found) in out.into_iter().zip(&found) {
                    *column = *found;
                }
            }
        },
    );
}

/// So many streams the compiler tests for overlap before it makes a loop of wide instructions. With more it makes none, unless the
/// results go into arrays of their own first.
const FEW: usize = 8;

#[inline(always)]
fn fill<F: Real, const I: usize, const O: usize>(
    block: [&Column<F, BLOCK>; I],
    out: [&mut Column<F, BLOCK>; O],
    lane: &impl Fn([F; I]) -> [F; O],
) {
    for row in 0..BLOCK {
        let results = lane(std::array::from_fn(|part| block[part][row]));
        for part in 0..O {
            out[part][row] = results[part];
        }
    }
}

/// Computes by `exact` the rows whose guard is below 0 or no number.
#[inline(always)]
pub(super) fn mend_rare<F: Real, const I: usize, const O: usize, const ROWS: usize>(
    guards: &Column<F, ROWS>,
    block: [&Column<F, ROWS>; I],
    found: [&mut Column<F, ROWS>; O],
    exact: &impl Fn([F; I]) -> [F; O],
) {
    if guards.iter().fold(false, |any, guard| any | is_rare(*guard)) {
        for row in 0..ROWS {
            if is_rare(guards[row]) {
                let results = exact(std::array::from_fn(|part| block[part][row]));
                for part in 0..O {
                    found[part][row] = results[part];
                }
            }
        }
    }
}

/// Computes `kernel` block by block. It gets `I` columns in, and fills `O` columns.
///
/// # Panics
/// When the streams differ in length.
#[inline(always)]
pub(super) fn each_block<F: Real, const I: usize, const O: usize, const ROWS: usize>(
    inputs: Parts<'_, F, I>,
    mut outputs: PartsMut<'_, F, O>,
    mut kernel: impl FnMut([&Column<F, ROWS>; I], [&mut Column<F, ROWS>; O]),
) {
    let len = common_len(&inputs, &outputs);
    let whole = len - len % ROWS;
    for start in (0..whole).step_by(ROWS) {
        let block: [&Column<F, ROWS>; I] = std::array::from_fn(|part| block_at(inputs[part], start));
        let direct: [&mut Column<F, ROWS>; O] =
            outputs.each_mut().map(|output| output[start..].first_chunk_mut().expect("whole"));
        kernel(block, direct);
    }
    let rest = len - whole;
    if rest > 0 {
        // Filled up with the last row, which is a sound argument where zeros might be none.
        let (mut block, mut found) = ([[F::ZERO; ROWS]; I], [[F::ZERO; ROWS]; O]);
        for (column, stream) in block.iter_mut().zip(inputs) {
            column[..rest].copy_from_slice(&stream[whole..]);
            column[rest..].fill(stream[len - 1]);
        }
        kernel(block.each_ref(), found.each_mut());
        for (output, found) in outputs.iter_mut().zip(&found) {
            output[whole..].copy_from_slice(&found[..rest]);
        }
    }
}

/// Below 0 or no number.
#[expect(clippy::neg_cmp_op_on_partial_ord, reason = "no number is rare too")]
#[inline(always)]
fn is_rare<F: Real>(guard: F) -> bool {
    !(guard >= F::ZERO)
}

#[inline(always)]
fn block_at<F, const ROWS: usize>(stream: &[F], start: usize) -> &Column<F, ROWS> {
    stream[start..].first_chunk().expect("whole blocks lie within the stream")
}

#[inline(always)]
#[track_caller]
pub(super) fn common_len<F, const I: usize, const O: usize>(
    inputs: &Parts<'_, F, I>,
    outputs: &PartsMut<'_, F, O>,
) -> usize {
    let len = outputs[0].len();
    let lens = inputs.iter().map(|stream| stream.len()).chain(outputs.iter().map(|stream| stream.len()));
    for found in lens {
        assert!(found == len, "expected streams of one length, found {len} and {found}");
    }
    len
}

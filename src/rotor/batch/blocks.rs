//! The loop that every kernel runs in.

use super::real::Real;
use super::streams::{Parts, PartsMut};

/// Rows that are computed before they are written. Long enough for the compiler to make a loop of wide instructions, short
/// enough to stay in the first cache.
const BLOCK: usize = 64;

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
    run::<F, I, O, false>(
        inputs,
        outputs,
        #[inline(always)]
        |row| (lane(row), F::ZERO),
        &lane,
    );
}

/// As [`each_row`], for formulas that do not cover every argument: `lane` also tells a guard, and where that is below 0 or
/// no number the row is computed by `exact`.
#[inline(always)]
pub(super) fn each_row_guarded<F: Real, const I: usize, const O: usize>(
    inputs: Parts<'_, F, I>,
    outputs: PartsMut<'_, F, O>,
    lane: impl Fn([F; I]) -> ([F; O], F),
    exact: impl Fn([F; I]) -> [F; O],
) {
    run::<F, I, O, true>(inputs, outputs, lane, exact);
}

#[inline(always)]
fn run<F: Real, const I: usize, const O: usize, const GUARDED: bool>(
    inputs: Parts<'_, F, I>,
    mut outputs: PartsMut<'_, F, O>,
    lane: impl Fn([F; I]) -> ([F; O], F),
    exact: impl Fn([F; I]) -> [F; O],
) {
    let len = common_len(&inputs, &outputs);
    let whole = len - len % BLOCK;
    for start in (0..whole).step_by(BLOCK) {
        let block: [&[F; BLOCK]; I] = std::array::from_fn(|part| block_at(inputs[part], start));
        let found = block_of::<F, I, O, GUARDED>(block, &lane, &exact);
        for (output, found) in outputs.iter_mut().zip(&found) {
            output[start..start + BLOCK].copy_from_slice(found);
        }
    }
    let rest = len - whole;
    if rest > 0 {
        // Filled up with the last row, which is a sound argument where zeros might be none.
        let block: [[F; BLOCK]; I] =
            std::array::from_fn(|part| std::array::from_fn(|row| inputs[part][whole + row.min(rest - 1)]));
        let found = block_of::<F, I, O, GUARDED>(block.each_ref(), &lane, &exact);
        for (output, found) in outputs.iter_mut().zip(&found) {
            output[whole..].copy_from_slice(&found[..rest]);
        }
    }
}

/// One block, into arrays of its own: the compiler sees that nothing else points there, and so needs no tests whether streams
/// overlap, which for so many streams it would refuse to make.
#[inline(always)]
fn block_of<F: Real, const I: usize, const O: usize, const GUARDED: bool>(
    block: [&[F; BLOCK]; I],
    lane: &impl Fn([F; I]) -> ([F; O], F),
    exact: &impl Fn([F; I]) -> [F; O],
) -> [[F; BLOCK]; O] {
    let mut found = [[F::ZERO; BLOCK]; O];
    let mut guards = [F::ZERO; BLOCK];
    for row in 0..BLOCK {
        let (results, guard) = lane(std::array::from_fn(|part| block[part][row]));
        for part in 0..O {
            found[part][row] = results[part];
        }
        if GUARDED {
            guards[row] = guard;
        }
    }
    if GUARDED && guards.iter().fold(false, |any, guard| any | is_rare(*guard)) {
        for row in 0..BLOCK {
            if is_rare(guards[row]) {
                let results = exact(std::array::from_fn(|part| block[part][row]));
                for part in 0..O {
                    found[part][row] = results[part];
                }
            }
        }
    }
    found
}

/// Below 0 or no number.
#[expect(clippy::neg_cmp_op_on_partial_ord, reason = "no number is rare too")]
#[inline(always)]
fn is_rare<F: Real>(guard: F) -> bool {
    !(guard >= F::ZERO)
}

#[inline(always)]
fn block_at<F>(stream: &[F], start: usize) -> &[F; BLOCK] {
    stream[start..].first_chunk().expect("whole blocks lie within the stream")
}

#[inline(always)]
#[track_caller]
fn common_len<F, const I: usize, const O: usize>(
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

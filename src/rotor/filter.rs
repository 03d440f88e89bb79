//! A moving average for rotations: what convolution is for numbers.

use super::{Bivector, Rotor};

/// Why a kernel can't be used.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum KernelError {
    /// A kernel has a middle.
    #[error("expected a kernel of odd length, found length {found}")]
    EvenKernel {
        /// Its length.
        found: usize,
    },
    /// A kernel that does not add up to 1 would turn everything.
    #[error("expected a kernel with finite weights that add up to 1, found the sum {found}")]
    Sum {
        /// Its sum.
        found: f64,
    },
}

/// Filters evenly timed rotors with `kernel`, weights from the past to the future with the present in the middle, of sum 1.
///
/// About one axis this is the ordinary convolution of the angle. It does not depend on the frame the rotors are given in,
/// nor, for a symmetric kernel, on the direction of time; signs don't matter. Beyond the ends the steps are taken as
/// mirrored there. Steps go the short way: frames more than half a turn apart are filtered wrongly.
///
/// ```
/// use turnwright::rotor::{Axis, convolve};
///
/// let rotors = [0.0, 0.0, 0.4, 0.0, 0.0].map(|angle| Axis::Z.rotor(angle));
/// let smooth = convolve(&rotors, &[0.25, 0.5, 0.25]).expect("odd, and of sum 1");
/// assert!((smooth[2].plane_angles().xy - 0.2).abs() < 1e-15);
/// ```
///
/// # Errors
/// When the kernel has no middle or does not add up to 1 within 1e-9.
///
/// Source: Lee & Shin 2002, "General construction of time-domain filters for orientation data", IEEE TVCG 8(2).
pub fn convolve(rotors: &[Rotor], kernel: &[f64]) -> Result<Vec<Rotor>, KernelError> {
    let shares = step_shares(kernel)?;
    let reach = kernel.len() / 2;
    let steps: Vec<Bivector> =
        rotors.windows(2).map(|pair| (pair[0].reverse() * pair[1]).plane_angles()).collect();
    let filtered = rotors.iter().enumerate().map(|(frame, rotor)| {
        let turn = shares.iter().enumerate().fold(Bivector::ZERO, |sum, (i, share)| {
            // The step from frame k to k + 1 has the index k; `shares` starts `reach` steps before the frame.
            sum + mirrored_step(&steps, frame + i, reach) * *share
        });
        *rotor * Rotor::from_plane_angles(turn)
    });
    Ok(filtered.collect())
}

/// How much of each step around a frame the filter adds: of those ahead what the kernel weighs beyond them, of those behind
/// the same, taken back.
fn step_shares(kernel: &[f64]) -> Result<Vec<f64>, KernelError> {
    if kernel.len().is_multiple_of(2) {
        return Err(KernelError::EvenKernel { found: kernel.len() });
    }
    let sum: f64 = kernel.iter().sum();
    let adds_up = (sum - 1.0).abs() <= 1e-9;
    if !adds_up {
        return Err(KernelError::Sum { found: sum });
    }
    let reach = kernel.len() / 2;
    let behind = (0..reach).map(|i| -kernel[..=i].iter().sum::<f64>());
    let ahead = (reach + 1..kernel.len()).map(|i| kernel[i..].iter().sum::<f64>());
    Ok(behind.chain(ahead).collect())
}

/// The step at `index - reach`. Steps before the first and after the last are those as far inside, so that the end frames
/// are drawn from the motion beside them; the motion has a period of twice the steps then.
fn mirrored_step(steps: &[Bivector], index: usize, reach: usize) -> Bivector {
    let count = steps.len();
    if count == 0 {
        return Bivector::ZERO;
    }
    let period = 2 * count;
    // `reach` is lifted to a multiple of the period, so that the difference stays above zero.
    let place = (index + period * reach - reach) % period;
    if place < count { steps[place] } else { steps[period - 1 - place] }
}

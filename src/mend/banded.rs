//! Smoothing of rows of numbers with weights: the smoothest row that lies near them.

use super::regress::Table;

/// How many differences are taken of what is to be smooth.
pub(super) const ORDER: usize = 3;

/// A smoother for rows of one length: minimises `Σ weight·(own − smooth)² + Σ dear·(third difference)²`, times taken as even.
///
/// Source: Whittaker 1923, "On a new method of graduation"; Eilers 2003, "A perfect smoother", Analytical Chemistry 75. The
/// matrix is banded; it is factored by Cholesky.
pub(super) struct Smoother {
    weights: Vec<f64>,
    /// Row `i` holds the entries of the lower factor at columns `i − ORDER ..= i`.
    factor: Vec<[f64; ORDER + 1]>,
    /// Of the prices of third differences.
    log_dear: f64,
}

impl Smoother {
    /// With a weight and a price for each row; a price is that of the third difference that starts there. `None` when too few
    /// weights are above 0 for the row to be determined.
    pub(super) fn new(weights: &[f64], dear: &[f64]) -> Option<Self> {
        const DIFFERENCE: [f64; ORDER + 1] = [-1.0, 3.0, -3.0, 1.0];
        let count = weights.len();
        let mut rows: Vec<[f64; ORDER + 1]> = weights
            .iter()
            .map(|weight| {
                let mut row = [0.0; ORDER + 1];
                row[ORDER] = *weight;
                row
            })
            .collect();
        let dear = &dear[..count.saturating_sub(ORDER)];
        for (start, dear) in dear.iter().enumerate() {
            for (i, a) in DIFFERENCE.iter().enumerate() {
                for (j, b) in DIFFERENCE.iter().enumerate().take(i + 1) {
                    rows[start + i][ORDER + j - i] += dear * a * b;
                }
            }
        }
        for i in 0..count {
            for back in (0..=ORDER.min(i)).rev() {
                let j = i - back;
                let mut sum = rows[i][ORDER - back];
                for k in i.saturating_sub(ORDER).max(j.saturating_sub(ORDER))..j {
                    sum -= rows[i][ORDER + k - i] * rows[j][ORDER + k - j];
                }
                rows[i][ORDER - back] = if back > 0 {
                    sum / rows[j][ORDER]
                } else if sum > 0.0 {
                    sum.sqrt()
                } else {
                    return None;
                };
            }
        }
        let log_dear = dear.iter().map(|dear| dear.ln()).sum();
        Some(Self { weights: weights.to_vec(), factor: rows, log_dear })
    }

    /// How much less likely a column is for the freedom that it is given: the logarithm of the determinant of the system over
    /// that of the prices.
    pub(super) fn log_det(&self) -> f64 {
        2.0 * self.factor.iter().map(|row| row[ORDER].ln()).sum::<f64>() - self.log_dear
    }

    /// Each column of `rows` made smooth.
    pub(super) fn smooth(&self, rows: &Table) -> Table {
        let width = rows.width;
        let mut out = rows.clone();
        for (row, weight) in out.numbers.chunks_exact_mut(width).zip(&self.weights) {
            for number in row {
                *number *= weight;
            }
        }
        let count = self.weights.len();
        for i in 0..count {
            let (before, own) = out.numbers.split_at_mut(i * width);
            let own = &mut own[..width];
            for k in i.saturating_sub(ORDER)..i {
                let entry = self.factor[i][ORDER + k - i];
                for (own, other) in own.iter_mut().zip(&before[k * width..(k + 1) * width]) {
                    *own -= entry * other;
                }
            }
            for number in own {
                *number /= self.factor[i][ORDER];
            }
        }
        for i in (0..count).rev() {
            let (head, after) = out.numbers.split_at_mut((i + 1) * width);
            let own = &mut head[i * width..];
            for k in i + 1..(i + 1 + ORDER).min(count) {
                let entry = self.factor[k][ORDER + i - k];
                let other = &after[(k - i - 1) * width..(k - i) * width];
                for (own, other) in own.iter_mut().zip(other) {
                    *own -= entry * other;
                }
            }
            for number in own {
                *number /= self.factor[i][ORDER];
            }
        }
        out
    }
}

#[cfg(test)]
mod tests {
    use super::super::regress::log_determinant;
    use super::*;

    #[test]
    fn a_parabola_stays_and_a_row_is_the_one_that_solves_its_equations() {
        let parabola: Vec<f64> = (0..30).map(|i| 0.1 * f64::from(i * i) - 2.0 * f64::from(i)).collect();
        let rows = Table { width: 1, numbers: parabola.clone() };
        let smoother = Smoother::new(&[1.0; 30], &[500.0; 30]).unwrap();
        for (own, truth) in smoother.smooth(&rows).numbers.iter().zip(&parabola) {
            assert!((own - truth).abs() < 1e-8);
        }
        // (W + DᵀdD) z = W y, checked by hand-made differences.
        let numbers: Vec<f64> = (0..30).map(|i| f64::from(i * 7 % 11)).collect();
        let weights: Vec<f64> = (0..30).map(|i| f64::from(1 + i % 3)).collect();
        let dear: Vec<f64> = (0..30).map(|i| f64::from(4 + i % 5)).collect();
        let z = Smoother::new(&weights, &dear)
            .unwrap()
            .smooth(&Table { width: 1, numbers: numbers.clone() })
            .numbers;
        let third: Vec<f64> = (0..27).map(|i| z[i + 3] - 3.0 * z[i + 2] + 3.0 * z[i + 1] - z[i]).collect();
        for i in 0..30_usize {
            let part = |lag: usize, factor: f64| {
                i.checked_sub(lag).filter(|k| *k < 27).map_or(0.0, |k| factor * dear[k] * third[k])
            };
            let rough = part(0, -1.0) + part(1, 3.0) + part(2, -3.0) + part(3, 1.0);
            let left = weights[i] * (z[i] - numbers[i]) + rough;
            assert!(left.abs() < 1e-8, "row {i}: {left}");
        }
    }

    #[test]
    fn its_determinant_is_that_of_the_whole_matrix_over_the_prices() {
        const COUNT: usize = 9;
        let weights: [f64; COUNT] = std::array::from_fn(|i| 1.0 + i as f64);
        let dear: [f64; COUNT] = std::array::from_fn(|i| 0.5 + (i % 4) as f64);
        let mut whole = Table::zeros(COUNT, COUNT);
        for (i, weight) in weights.iter().enumerate() {
            whole.row_mut(i)[i] += weight;
        }
        for (start, dear) in dear[..COUNT - 3].iter().enumerate() {
            let third = [-1.0, 3.0, -3.0, 1.0];
            for (i, j) in (0..16).map(|at| (at / 4, at % 4)) {
                whole.row_mut(start + i)[start + j] += dear * third[i] * third[j];
            }
        }
        let prices: f64 = dear[..COUNT - 3].iter().map(|dear| dear.ln()).sum();
        let truth = log_determinant(&whole).unwrap() - prices;
        let told = Smoother::new(&weights, &dear).unwrap().log_det();
        assert!((told - truth).abs() < 1e-10, "{told} {truth}");
    }
}

//! Small dense least squares: Cholesky, ridge and kernel regression, principal directions. Rows are lists of numbers.

/// Row-major numbers with a fixed row length.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Table {
    pub(super) width: usize,
    pub(super) numbers: Vec<f64>,
}

impl Table {
    pub(super) fn new(width: usize) -> Self {
        Self { width, numbers: Vec::new() }
    }

    pub(super) fn zeros(width: usize, height: usize) -> Self {
        Self { width, numbers: vec![0.0; width * height] }
    }

    pub(super) fn push(&mut self, row: &[f64]) {
        debug_assert_eq!(row.len(), self.width);
        self.numbers.extend_from_slice(row);
    }

    pub(super) fn row(&self, index: usize) -> &[f64] {
        &self.numbers[index * self.width..(index + 1) * self.width]
    }

    pub(super) fn row_mut(&mut self, index: usize) -> &mut [f64] {
        &mut self.numbers[index * self.width..(index + 1) * self.width]
    }
}

/// The lower factor of a symmetric positive definite matrix; `None` when it is none.
///
/// Source: the Cholesky factorisation, as in Golub & Van Loan 2013, "Matrix Computations", section 4.2.
fn lower_factor(matrix: &Table) -> Option<Vec<f64>> {
    let n = matrix.width;
    let mut lower = matrix.numbers.clone();
    for j in 0..n {
        let (above, own) = lower.split_at_mut(j * n);
        let own = &mut own[..n];
        for i in 0..j {
            let other = &above[i * n..=i * n + i];
            let sum = dot(&own[..i], &other[..i]);
            own[i] = (own[i] - sum) / other[i];
        }
        let rest = own[j] - dot(&own[..j], &own[..j]);
        if rest.is_nan() || rest <= 0.0 {
            return None;
        }
        own[j] = rest.sqrt();
    }
    Some(lower)
}

/// The logarithm of the determinant of a symmetric positive definite matrix. `None` when it is none.
pub(super) fn log_determinant(matrix: &Table) -> Option<f64> {
    let lower = lower_factor(matrix)?;
    Some(2.0 * (0..matrix.width).map(|i| lower[i * matrix.width + i].ln()).sum::<f64>())
}

/// Solves `matrix · x = right` for a symmetric positive definite matrix, for each column of `right`. `None` when it is none.
pub(super) fn solve(matrix: &Table, right: &Table) -> Option<Table> {
    let n = matrix.width;
    let lower = lower_factor(matrix)?;
    let mut x = right.clone();
    let columns = right.width;
    for column in 0..columns {
        for i in 0..n {
            let mut sum = x.numbers[i * columns + column];
            for k in 0..i {
                sum -= lower[i * n + k] * x.numbers[k * columns + column];
            }
            x.numbers[i * columns + column] = sum / lower[i * n + i];
        }
        for i in (0..n).rev() {
            let mut sum = x.numbers[i * columns + column];
            for k in i + 1..n {
                sum -= lower[k * n + i] * x.numbers[k * columns + column];
            }
            x.numbers[i * columns + column] = sum / lower[i * n + i];
        }
    }
    Some(x)
}

pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// Weights that give `answers` from `features`, with large weights made dear: `share` of the features' mean square.
///
/// Source: Hoerl & Kennard 1970, "Ridge regression", Technometrics 12.
pub(super) fn ridge(
    features: &Table,
    answers: &Table,
    rows: impl Iterator<Item = usize>,
    share: f64,
) -> Option<Table> {
    let (n, m) = (features.width, answers.width);
    let (mut square, mut right) = (Table::zeros(n, n), Table::zeros(m, n));
    for row in rows {
        let (f, a) = (features.row(row), answers.row(row));
        for (i, own) in f.iter().enumerate() {
            for (entry, other) in square.row_mut(i).iter_mut().zip(f) {
                *entry += own * other;
            }
            for (entry, other) in right.row_mut(i).iter_mut().zip(a) {
                *entry += own * other;
            }
        }
    }
    let mean = (0..n).map(|i| square.numbers[i * n + i]).sum::<f64>() / n as f64;
    for i in 0..n {
        square.numbers[i * n + i] += share * mean + 1e-12;
    }
    solve(&square, &right)
}

/// `row · weights`
pub(super) fn times(row: &[f64], weights: &Table) -> Vec<f64> {
    let mut out = vec![0.0; weights.width];
    for (value, weights) in row.iter().zip(weights.numbers.chunks_exact(weights.width)) {
        for (sum, weight) in out.iter_mut().zip(weights) {
            *sum += value * weight;
        }
    }
    out
}

/// The directions along which the rows, of mean 0, spread most; at most `most` of them, as rows of length 1, those of next to no
/// spread left out.
///
/// Source: simultaneous iteration, Golub & Van Loan 2013, section 8.2.
pub(super) fn principal(rows: &Table, most: usize) -> Table {
    const ROUNDS: usize = 15;
    let n = rows.width;
    let mut square = Table::zeros(n, n);
    for row in rows.numbers.chunks_exact(n.max(1)) {
        for (i, own) in row.iter().enumerate() {
            for (entry, other) in square.row_mut(i).iter_mut().zip(row) {
                *entry += own * other;
            }
        }
    }
    // The start: the axes of largest spread, so that it is the same each time.
    let mut order: Vec<usize> = (0..n).collect();
    let spread = |i: usize| square.numbers[i * n + i];
    order.sort_by(|&a, &b| spread(b).total_cmp(&spread(a)));
    let mut found = Table::new(n);
    for &axis in order.iter().take(most) {
        let mut row = vec![0.0; n];
        row[axis] = 1.0;
        found.push(&row);
    }
    let mut lengths = vec![0.0; order.len().min(most)];
    for _ in 0..ROUNDS {
        let mut next = Table::new(n);
        let mut count = 0;
        for row in found.numbers.chunks_exact(n.max(1)) {
            let mut own: Vec<f64> = (0..n).map(|i| dot(square.row(i), row)).collect();
            for before in next.numbers.chunks_exact(n) {
                let along = dot(before, &own);
                own.iter_mut().zip(before).for_each(|(own, before)| *own -= along * before);
            }
            let length = dot(&own, &own).sqrt();
            if length > 1e-12 {
                for number in &mut own {
                    *number /= length;
                }
                next.push(&own);
                lengths[count] = length;
                count += 1;
            }
        }
        lengths.truncate(count);
        found = next;
    }
    let largest = lengths.first().copied().unwrap_or(0.0);
    let kept = lengths.iter().take_while(|length| **length > 1e-8 * largest).count();
    found.numbers.truncate(kept * n);
    found
}

/// The weights from 0 up, one for each row of guesses, with which their sum comes nearest to `wanted`; at most 8 guesses.
pub(super) fn blend_weights(guesses: &[&[f64]], wanted: &[f64]) -> Vec<f64> {
    let mut best = (0.0, vec![0.0; guesses.len()]);
    for subset in 1_u32..1 << guesses.len() {
        let taken: Vec<usize> = (0..guesses.len()).filter(|i| subset >> i & 1 == 1).collect();
        let (mut square, mut right) = (Table::zeros(taken.len(), taken.len()), Table::zeros(1, taken.len()));
        for (i, &a) in taken.iter().enumerate() {
            for (j, &b) in taken.iter().enumerate() {
                square.row_mut(i)[j] = dot(guesses[a], guesses[b]) * if i == j { 1.0 + 1e-9 } else { 1.0 };
            }
            right.row_mut(i)[0] = dot(guesses[a], wanted);
        }
        let Some(weights) = solve(&square, &right) else { continue };
        if weights.numbers.iter().any(|weight| *weight < 0.0) {
            continue;
        }
        // At the best weights the squared error is that of nothing, less this.
        let gain = dot(&weights.numbers, &right.numbers);
        if gain > best.0 {
            let mut all = vec![0.0; guesses.len()];
            taken.iter().zip(&weights.numbers).for_each(|(&i, weight)| all[i] = *weight);
            best = (gain, all);
        }
    }
    best.1
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_system_worked_by_hand_is_solved() {
        let matrix = Table { width: 2, numbers: vec![4.0, 2.0, 2.0, 3.0] };
        let x = solve(&matrix, &Table { width: 1, numbers: vec![2.0, 5.0] }).unwrap();
        let by_hand = matrix.row(0)[0] * matrix.row(1)[1] - matrix.row(0)[1] * matrix.row(1)[0];
        assert!((log_determinant(&matrix).unwrap() - by_hand.ln()).abs() < 1e-12);
        assert!((x.numbers[0] + 0.5).abs() < 1e-15 && (x.numbers[1] - 2.0).abs() < 1e-15, "{x:?}");
        let saddle = Table { width: 2, numbers: vec![1.0, 2.0, 2.0, 1.0] };
        assert_eq!(solve(&saddle, &Table::zeros(1, 2)), None);
    }

    #[test]
    fn the_widest_directions_come_first() {
        let mut rows = Table::new(3);
        for i in 0..20 {
            // In fours + − − +, so that nothing of it goes along with `a`.
            let (a, b) = (f64::from(i) - 9.5, if matches!(i % 4, 0 | 3) { 1.0 } else { -1.0 });
            rows.push(&[0.6 * a, 0.8 * a, b]);
        }
        let found = principal(&rows, 3);
        assert_eq!(found.numbers.len(), 6, "the third has no spread");
        let first = found.row(0);
        assert!((dot(first, &[0.6, 0.8, 0.0]).abs() - 1.0).abs() < 1e-9, "{first:?}");
    }

    #[test]
    fn weights_below_nothing_are_never_taken() {
        let (a, b): (&[f64], &[f64]) = (&[1.0, 0.0, 1.0], &[0.0, 1.0, 0.0]);
        let weights = blend_weights(&[a, b], &[2.0, -3.0, 2.0]);
        assert!((weights[0] - 2.0).abs() < 1e-8 && weights[1] == 0.0, "{weights:?}");
    }
}

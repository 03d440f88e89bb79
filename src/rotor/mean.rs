//! Weighted means of several rotations: chordal and geodesic.

use super::{Bivector, Rotor};

/// A mean rotation, and how well it is determined.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Mean {
    /// The mean; its sign means nothing.
    pub rotor: Rotor,
    /// 0 to 1: the gap between the two largest eigenvalues, as a share of the sum of all. 1 for equal rotations; under
    /// about 0.05 they are spread all round, and the mean says little.
    pub certainty: f64,
}

/// The mean that needs no signs and no start: the rotor with the largest weighted sum of squared dot products.
///
/// `weighted` holds unit rotors with weights from 0 up; only the ratio of the weights matters. For two rotors of
/// unequal weight it is *not* slerp. `None` when no weight is above 0, or a weight is negative or anything not finite.
///
/// Source: Markley, Cheng, Crassidis & Oshman 2007, "Averaging quaternions", J. Guidance Control Dynamics 30(4).
#[must_use]
pub fn chordal_mean(weighted: &[(Rotor, f64)]) -> Option<Mean> {
    let weights = normalized_weights(weighted)?;
    let mut matrix = [[0.0; 4]; 4];
    for ((rotor, _), weight) in weighted.iter().zip(&weights) {
        let parts = rotor.to_xyzw();
        for (row, a) in matrix.iter_mut().zip(parts) {
            for (entry, b) in row.iter_mut().zip(parts) {
                *entry += weight * a * b;
            }
        }
    }
    let (mut values, vectors) = symmetric_eigen(matrix);
    let largest = (0..4).max_by(|&i, &j| values[i].total_cmp(&values[j]))?;
    let rotor = Rotor::from_xyzw(vectors.map(|row| row[largest])).try_normalize()?;
    values.sort_by(f64::total_cmp);
    let sum: f64 = values.iter().sum();
    // A sum of 0 comes of rotors that are none.
    (sum > 0.0).then(|| Mean { rotor, certainty: (values[3] - values[2]) / sum })
}

/// The mean with the smallest weighted sum of squared turns: for two rotors it is slerp, at any weights.
///
/// Starts from the chordal mean. Weights as there. `None` also when the rotations are spread so widely that the search
/// does not settle; within 90° of the mean it always does.
///
/// Source: Karcher 1977; Hartley, Trumpf, Dai & Li 2013, "Rotation averaging", IJCV 103.
#[must_use]
pub fn geodesic_mean(weighted: &[(Rotor, f64)]) -> Option<Rotor> {
    /// Converges in 3 to 8 rounds within 90°, in up to some dozens near 180°.
    const MOST_ROUNDS: usize = 200;
    /// Radians: some roundings more than the sum of the turns has at the mean.
    const SETTLED: f64 = 4e-15;
    let weights = normalized_weights(weighted)?;
    let mut mean = chordal_mean(weighted)?.rotor;
    for _ in 0..MOST_ROUNDS {
        let step = weighted.iter().zip(&weights).fold(Bivector::ZERO, |sum, ((rotor, _), weight)| {
            sum + (mean.reverse() * *rotor).plane_angles() * *weight
        });
        mean = (mean * Rotor::from_plane_angles(step)).normalize();
        if step.length() <= SETTLED {
            return Some(mean);
        }
    }
    None
}

/// The weights divided by their sum; `None` where the means are not defined.
fn normalized_weights(weighted: &[(Rotor, f64)]) -> Option<Vec<f64>> {
    let sound =
        weighted.iter().all(|(rotor, weight)| rotor.is_finite() && weight.is_finite() && *weight >= 0.0);
    // Divided by the largest first, so that the sum of huge weights stays finite.
    let largest = weighted.iter().fold(0.0, |largest: f64, (_, weight)| largest.max(*weight));
    if !sound || largest == 0.0 {
        return None;
    }
    let sum: f64 = weighted.iter().map(|(_, weight)| weight / largest).sum();
    Some(weighted.iter().map(|(_, weight)| weight / largest / sum).collect())
}

/// Eigenvalues and eigenvectors (in columns) of a symmetric matrix, by turning one pair of rows and columns after the other
/// until nothing is left beside the diagonal.
///
/// Source: Jacobi 1846; the stable form of the turn as in Golub & Van Loan, *Matrix Computations*, section 8.5.
fn symmetric_eigen(mut m: [[f64; 4]; 4]) -> ([f64; 4], [[f64; 4]; 4]) {
    /// Converges quadratically; 4 to 6 are usual.
    const MOST_SWEEPS: usize = 30;
    let mut vectors =
        [[1.0, 0.0, 0.0, 0.0], [0.0, 1.0, 0.0, 0.0], [0.0, 0.0, 1.0, 0.0], [0.0, 0.0, 0.0, 1.0]];
    let pairs = [(0, 1), (0, 2), (0, 3), (1, 2), (1, 3), (2, 3)];
    for _ in 0..MOST_SWEEPS {
        if pairs.iter().all(|&(p, q)| m[p][q] == 0.0) {
            break;
        }
        for (p, q) in pairs {
            if m[p][q].abs() < f64::MIN_POSITIVE {
                (m[p][q], m[q][p]) = (0.0, 0.0);
                continue;
            }
            let tau = (m[q][q] - m[p][p]) / (2.0 * m[p][q]);
            // The smaller root, so that the turn stays within 45°.
            let tangent = 1.0_f64.copysign(tau) / (tau.abs() + tau.hypot(1.0));
            let cosine = 1.0 / tangent.hypot(1.0);
            let sine = tangent * cosine;
            for row in &mut m {
                (row[p], row[q]) = (cosine * row[p] - sine * row[q], sine * row[p] + cosine * row[q]);
            }
            let (upper, lower) = (m[p], m[q]);
            m[p] = std::array::from_fn(|i| cosine * upper[i] - sine * lower[i]);
            m[q] = std::array::from_fn(|i| sine * upper[i] + cosine * lower[i]);
            (m[p][q], m[q][p]) = (0.0, 0.0);
            for row in &mut vectors {
                (row[p], row[q]) = (cosine * row[p] - sine * row[q], sine * row[p] + cosine * row[q]);
            }
        }
    }
    ([m[0][0], m[1][1], m[2][2], m[3][3]], vectors)
}

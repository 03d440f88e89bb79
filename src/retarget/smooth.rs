//! A smooth curve through scattered values: a displacement that sets in and fades without a jump in rate or bend.

/// A sum of uniform cubic B-splines, coarse to fine.
///
/// Source: Lee, Wolberg & Shin 1997, "Scattered data interpolation with multilevel B-splines", as used for displacement
/// maps by Lee & Shin 1999, "A hierarchical approach to interactive motion editing for human-like figures": a coarse spline
/// first, then the knot spacing halved to fit what is left.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct SmoothCurve {
    levels: Vec<Level>,
}

#[derive(Clone, Debug, PartialEq)]
struct Level {
    step: f64,
    knots: Vec<f64>,
}

/// Seconds between knots, coarse to fine; the finest keeps corrections below a few hertz. Repeated spacings fit what one left.
const STEPS: [f64; 8] = [1.0, 0.5, 0.25, 0.25, 0.125, 0.125, 0.125, 0.125];

impl SmoothCurve {
    /// Near the values at their times, from 0 to `duration_secs`; where nothing is known it fades towards 0.
    pub(super) fn through(values: &[(f64, f64)], duration_secs: f64) -> Self {
        let mut left: Vec<(f64, f64)> = values.to_vec();
        let mut levels = Vec::with_capacity(STEPS.len());
        for step in STEPS {
            let count = (duration_secs.max(0.0) / step).ceil() as usize + 4;
            let mut sums = vec![(0.0, 0.0); count];
            for &(secs, value) in &left {
                let (first, weights) = place(secs, step, count);
                let square: f64 = weights.iter().map(|weight| weight * weight).sum();
                for (own, weight) in sums[first..].iter_mut().zip(weights) {
                    let wanted = weight * value / square;
                    own.0 += weight * weight * wanted;
                    own.1 += weight * weight;
                }
            }
            let knots =
                sums.into_iter().map(|(sum, weight)| if weight > 0.0 { sum / weight } else { 0.0 }).collect();
            let level = Level { step, knots };
            for (secs, value) in &mut left {
                *value -= level.at(*secs);
            }
            levels.push(level);
        }
        Self { levels }
    }

    /// The value at a time.
    pub(super) fn at(&self, secs: f64) -> f64 {
        self.levels.iter().map(|level| level.at(secs)).sum()
    }
}

impl Level {
    fn at(&self, secs: f64) -> f64 {
        let (first, weights) = place(secs, self.step, self.knots.len());
        self.knots[first..].iter().zip(weights).map(|(knot, weight)| knot * weight).sum()
    }
}

/// The first of the four knots that count at a time, and their weights (the uniform cubic B-spline).
fn place(secs: f64, step: f64, count: usize) -> (usize, [f64; 4]) {
    let at = (secs / step).clamp(0.0, (count - 4) as f64);
    let first = (at as usize).min(count - 4);
    let t = at - first as f64;
    let weights = [
        (1.0 - t).powi(3) / 6.0,
        (3.0 * t * t * t - 6.0 * t * t + 4.0) / 6.0,
        (-3.0 * t * t * t + 3.0 * t * t + 3.0 * t + 1.0) / 6.0,
        t * t * t / 6.0,
    ];
    (first, weights)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_curve_nears_its_values_without_a_jump() {
        let wave = |secs: f64| 0.03 * (1.5 * secs).sin().max(0.0);
        let values: Vec<(f64, f64)> =
            (0..600).map(|i| f64::from(i) / 100.0).map(|secs| (secs, wave(secs))).collect();
        let curve = SmoothCurve::through(&values, 6.0);
        for &(secs, value) in &values {
            assert!((curve.at(secs) - value).abs() < 0.004, "{secs}: {} for {value}", curve.at(secs));
        }
        let rate = |i: i32| (curve.at(f64::from(i + 1) / 1000.0) - curve.at(f64::from(i) / 1000.0)) * 1000.0;
        assert!((1..5998).all(|i| (rate(i + 1) - rate(i)).abs() < 0.002), "a jump in rate");
        assert!(SmoothCurve::through(&[], 2.0).at(1.0) == 0.0);
    }
}

//! The smooth step.

/// `3t² − 2t³`: from 0 at 0 to 1 at 1 with no rate at either end, and held outside (Kovar, Gleicher & Pighin 2002 weigh a
/// transition so).
#[must_use]
pub fn smooth_step(t: f64) -> f64 {
    let t = t.clamp(0.0, 1.0);
    t * t * (3.0 - 2.0 * t)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn it_rises_from_end_to_end_and_is_flat_there() {
        assert_eq!([-1.0, 0.0, 0.25, 0.5, 1.0, 7.0].map(smooth_step), [0.0, 0.0, 0.156_25, 0.5, 1.0, 1.0]);
        let rate = |t: f64| (smooth_step(t + 1e-6) - smooth_step(t - 1e-6)) / 2e-6;
        assert!(rate(1e-6) < 1e-5 && rate(1.0 - 1e-6) < 1e-5 && (rate(0.5) - 1.5).abs() < 1e-6);
    }
}

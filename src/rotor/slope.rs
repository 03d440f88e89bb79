//! How the plane angles of a turn and its body rate hang together: the slope of exp and log.
//!
//! Source: Park & Ravani 1997, "Smooth invariant interpolation of rotations", ACM TOG 16(3).

use glam::{DMat3, DVec3};

/// The matrix `[f]` with `[f] v = f × v`.
fn cross_matrix(f: DVec3) -> DMat3 {
    DMat3::from_cols(DVec3::new(0.0, f.z, -f.y), DVec3::new(-f.z, 0.0, f.x), DVec3::new(f.y, -f.x, 0.0))
}

/// Turns shorter than this, in radians, take the series: the closed forms divide what has cancelled by powers of it.
const SERIES_BELOW_RAD: f64 = 0.1;

/// `J` in `rate = J(f) · df/dt`: from the slope of the plane angles `f` to the body rate.
pub(super) fn jacobian(f: DVec3) -> DMat3 {
    let (f1, f2) = (f.length(), f.length_squared());
    // (1 − cos f)/f² without cancelling.
    let half = 0.5 * f1;
    let sinc = if half < 1e-8 { 1.0 } else { half.sin() / half };
    let cross = cross_matrix(f);
    DMat3::IDENTITY - cross * (0.5 * sinc * sinc) + cross * cross * sine_rest(f1, f2)
}

/// The inverse of [`jacobian`]; exists below a full turn.
pub(super) fn inverse_jacobian(f: DVec3) -> DMat3 {
    let (f1, f2) = (f.length(), f.length_squared());
    let factor = if f1 < SERIES_BELOW_RAD {
        1.0 / 12.0 + f2 * (1.0 / 720.0 + f2 * (1.0 / 30_240.0 + f2 / 1_209_600.0))
    } else {
        (1.0 - 0.5 * f1 / (0.5 * f1).tan()) / f2
    };
    let cross = cross_matrix(f);
    DMat3::IDENTITY + cross * 0.5 + cross * cross * factor
}

/// The part of the acceleration that comes from the turning of the plane while the angles `f` change at `g`:
/// the acceleration is `J(f) d²f/dt²` and this.
pub(super) fn turning_term(f: DVec3, g: DVec3) -> DVec3 {
    let (f1, f2) = (f.length(), f.length_squared());
    let (k1, k2) = if f1 < SERIES_BELOW_RAD {
        (
            1.0 / 12.0 + f2 * (-1.0 / 180.0 + f2 * (1.0 / 6_720.0 - f2 / 453_600.0)),
            -1.0 / 60.0 + f2 * (1.0 / 1_260.0 - f2 / 60_480.0),
        )
    } else {
        let (sin, cos) = f1.sin_cos();
        ((2.0 * (1.0 - cos) - f1 * sin) / (f2 * f2), (3.0 * sin - 2.0 * f1 - f1 * cos) / (f2 * f2 * f1))
    };
    let across = f.cross(g);
    f.dot(g) * (k1 * across + k2 * f.cross(across)) + sine_rest(f1, f2) * g.cross(across)
}

/// `(f − sin f)/f³`, of `f` and its square.
fn sine_rest(f1: f64, f2: f64) -> f64 {
    if f1 < SERIES_BELOW_RAD {
        1.0 / 6.0 + f2 * (-1.0 / 120.0 + f2 * (1.0 / 5_040.0 - f2 / 362_880.0))
    } else {
        (f1 - f1.sin()) / (f2 * f1)
    }
}

#[cfg(test)]
mod tests {
    use super::super::{Bivector, Rotor};
    use super::*;

    /// Angles of the same direction and of all sizes, the limit of the series among them.
    fn sizes() -> impl Iterator<Item = DVec3> {
        let direction = DVec3::new(2.0, -1.0, 0.5).normalize();
        [0.0, 1e-300, 1e-9, 1e-3, 0.05, 0.099_999, 0.100_001, 1.0, 3.0, 6.0]
            .into_iter()
            .map(move |size| direction * size)
    }

    #[test]
    fn the_two_jacobians_undo_each_other() {
        for f in sizes() {
            let product = jacobian(f) * inverse_jacobian(f);
            assert!(product.abs_diff_eq(DMat3::IDENTITY, 3e-14), "{f}: {product}");
        }
    }

    #[test]
    fn the_jacobian_is_the_slope_of_exp() {
        // Body rate of exp(f + g t) by a central difference.
        let (g, dt) = (DVec3::new(0.3, 0.7, -0.2), 1e-5);
        for f in sizes() {
            let at = |t: f64| Rotor::from_plane_angles(Bivector::from_axis(f + g * t));
            let rate = ((at(-dt).reverse() * at(dt)).plane_angles() / (2.0 * dt)).axis();
            assert!(rate.abs_diff_eq(jacobian(f) * g, 1e-9), "{f}: {rate}");
            // And its change: J(f + g t) g has the slope of the turning term alone, as g stays.
            let slope = (jacobian(f + g * dt) * g - jacobian(f - g * dt) * g) / (2.0 * dt);
            assert!(slope.abs_diff_eq(turning_term(f, g), 1e-9), "{f}: {slope}");
        }
    }

    #[test]
    fn series_and_closed_forms_meet() {
        let direction = DVec3::new(2.0, -1.0, 0.5).normalize();
        let g = DVec3::new(0.9, 0.2, -0.4);
        let sides = [1.0 - 1e-12, 1.0 + 1e-12].map(|share| direction * (SERIES_BELOW_RAD * share));
        let [below, above] = sides.map(|f| inverse_jacobian(f) * g);
        assert!(below.abs_diff_eq(above, 2e-13), "{below} {above}");
        let [below, above] = sides.map(|f| turning_term(f, g));
        assert!(below.abs_diff_eq(above, 2e-13), "{below} {above}");
    }
}

//! How the plane angles of a turn and its body rate hang together: the slope of exp and log.
//!
//! Source: Park & Ravani 1997, "Smooth invariant interpolation of rotations", ACM TOG 16(3).

use glam::{DMat3, DVec3};

/// Turns shorter than this, in radians, take the series: the closed forms divide what has cancelled by powers of it.
const SERIES_BELOW_RAD: f64 = 0.1;

/// `J` in `rate = J(f) · df/dt`: from the slope of the plane angles `f` to the body rate.
pub(super) fn jacobian(f: DVec3) -> DMat3 {
    Slope::of(f).jacobian()
}

/// The inverse of [`jacobian`]; exists below a full turn.
pub(super) fn inverse_jacobian(f: DVec3) -> DMat3 {
    Slope::of(f).inverse_jacobian()
}

/// The part of the acceleration that comes from the turning of the plane while the angles `f` change at `g`:
/// the acceleration is `J(f) d²f/dt²` and this.
pub(super) fn turning_term(f: DVec3, g: DVec3) -> DVec3 {
    Slope::of(f).turning_term(g)
}

/// What all of them need of the plane angles, for who asks for several or more than once.
#[derive(Clone, Copy, Debug)]
pub(super) struct Slope {
    angles: DVec3,
    /// `(1 − cos f)/f²`.
    cosine_rest: f64,
    /// `(f − sin f)/f³`.
    sine_rest: f64,
    /// `(1 − (f/2) cot(f/2))/f²`.
    cotangent_rest: f64,
    /// `(2(1 − cos f) − f sin f)/f⁴`.
    across: f64,
    /// `(3 sin f − 2f − f cos f)/f⁵`.
    twice_across: f64,
}

impl Slope {
    /// Of plane angles in radians.
    pub(super) fn of(angles: DVec3) -> Self {
        let f1 = angles.length();
        let (sine, cosine) = (0.5 * f1).sin_cos();
        Self::of_half_turn(angles, f1, sine, cosine)
    }

    /// Of plane angles in radians of which the length is known, and sine and cosine of half of it.
    pub(super) fn of_half_turn(angles: DVec3, f1: f64, sine: f64, cosine: f64) -> Self {
        let f2 = f1 * f1;
        if f1 < SERIES_BELOW_RAD {
            return Self {
                angles,
                cosine_rest: 0.5 + f2 * (-1.0 / 24.0 + f2 * (1.0 / 720.0 - f2 / 40_320.0)),
                sine_rest: 1.0 / 6.0 + f2 * (-1.0 / 120.0 + f2 * (1.0 / 5_040.0 - f2 / 362_880.0)),
                cotangent_rest: 1.0 / 12.0 + f2 * (1.0 / 720.0 + f2 * (1.0 / 30_240.0 + f2 / 1_209_600.0)),
                across: 1.0 / 12.0 + f2 * (-1.0 / 180.0 + f2 * (1.0 / 6_720.0 - f2 / 453_600.0)),
                twice_across: -1.0 / 60.0 + f2 * (1.0 / 1_260.0 - f2 / 60_480.0),
            };
        }
        // Of the whole turn; 1 − cos f without cancelling.
        let (rest, whole_sine) = (2.0 * sine * sine, 2.0 * sine * cosine);
        let (over_f, over_square) = (1.0 / f1, 1.0 / f2);
        Self {
            angles,
            cosine_rest: rest * over_square,
            sine_rest: (f1 - whole_sine) * over_f * over_square,
            cotangent_rest: (1.0 - 0.5 * f1 * cosine / sine) * over_square,
            across: (2.0 * rest - f1 * whole_sine) * over_square * over_square,
            twice_across: (3.0 * (whole_sine - f1) + f1 * rest) * over_square * over_square * over_f,
        }
    }

    /// The plane angles.
    pub(super) const fn angles(&self) -> DVec3 {
        self.angles
    }

    /// [`jacobian`].
    pub(super) fn jacobian(&self) -> DMat3 {
        self.matrix(-self.cosine_rest, self.sine_rest)
    }

    /// [`inverse_jacobian`].
    pub(super) fn inverse_jacobian(&self) -> DMat3 {
        self.matrix(0.5, self.cotangent_rest)
    }

    /// `I + once [f] + twice [f]²`.
    fn matrix(&self, once: f64, twice: f64) -> DMat3 {
        let f = self.angles;
        let (scaled, turned) = (f * twice, f * once);
        let diagonal = 1.0 - scaled.dot(f);
        let [xy, yz, zx] = [scaled.x * f.y, scaled.y * f.z, scaled.z * f.x];
        DMat3::from_cols(
            DVec3::new(diagonal + scaled.x * f.x, xy + turned.z, zx - turned.y),
            DVec3::new(xy - turned.z, diagonal + scaled.y * f.y, yz + turned.x),
            DVec3::new(zx + turned.y, yz - turned.x, diagonal + scaled.z * f.z),
        )
    }

    /// [`turning_term`].
    pub(super) fn turning_term(&self, g: DVec3) -> DVec3 {
        let f = self.angles;
        let across = f.cross(g);
        f.dot(g) * (self.across * across + self.twice_across * f.cross(across))
            + self.sine_rest * g.cross(across)
    }

    /// The slope of [`Slope::turning_term`] as `g` changes.
    pub(super) fn turning_slope(&self, g: DVec3) -> DMat3 {
        let f = self.angles;
        let across = f.cross(g);
        let along = f.dot(g);
        // `[f]²` is `f fᵀ − f² I`, and `[g][f]` is `f gᵀ − (f·g) I`.
        let first = self.across * across + self.twice_across * (f.cross(across) + along * f);
        let second = self.sine_rest * f;
        let turned = along * self.across * f - self.sine_rest * across;
        let diagonal = -along * (self.twice_across * f.length_squared() + self.sine_rest);
        DMat3::from_cols(
            first * f.x + second * g.x + DVec3::new(diagonal, turned.z, -turned.y),
            first * f.y + second * g.y + DVec3::new(-turned.z, diagonal, turned.x),
            first * f.z + second * g.z + DVec3::new(turned.y, -turned.x, diagonal),
        )
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
            // It is a square of `g`, so that a central difference of any width gives its slope.
            let step = DVec3::new(-0.4, 0.1, 0.6);
            let slope = (turning_term(f, g + step) - turning_term(f, g - step)) / 2.0;
            assert!(slope.abs_diff_eq(Slope::of(f).turning_slope(g) * step, 1e-13), "{f}: {slope}");
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

//! How the plane angles of a turn and its body rate hang together: the slope of exp and log.
//!
//! Source: Park & Ravani 1997, "Smooth invariant interpolation of rotations", ACM TOG 16(3).

#![expect(
    clippy::inline_always,
    reason = "a part that stays a function of its own is built for the baseline, and keeps what is around it from wide instructions"
)]

use glam::DVec3;

use super::linear::{Matrix, Number, Vector};

/// Turns shorter than this, in radians, take the series: the closed forms divide what has cancelled by powers of it.
const SERIES_BELOW_RAD: f64 = 0.1;

/// `J` in `rate = J(f) · df/dt`, `f` the plane angles, with all that hangs on them.
#[derive(Clone, Copy, Debug)]
pub(super) struct Slope<T = f64> {
    pub(super) angles: Vector<T>,
    pub(super) rests: Rests<T>,
}

/// What is left of sine and cosine of a turn `f` once the first terms are taken away, divided by the power of `f` that it begins with.
#[derive(Clone, Copy, Debug)]
pub(super) struct Rests<T> {
    /// `(1 − cos f)/f²`.
    pub(super) cosine: T,
    /// `(f − sin f)/f³`.
    pub(super) sine: T,
    /// `(1 − (f/2) cot(f/2))/f²`.
    pub(super) cotangent: T,
    /// `(2(1 − cos f) − f sin f)/f⁴`.
    pub(super) across: T,
    /// `(3 sin f − 2f − f cos f)/f⁵`.
    pub(super) twice_across: T,
}

impl Rests<f64> {
    /// Of a turn in radians of which sine and cosine of half are known. Without a branch, so that many can be worked out at once.
    #[inline(always)]
    pub(super) fn of_half_turn(f1: f64, sine: f64, cosine: f64) -> Self {
        let f2 = f1 * f1;
        // Of the whole turn; 1 − cos f without cancelling.
        let (rest, whole_sine) = (2.0 * sine * sine, 2.0 * sine * cosine);
        let (over_f, over_square) = (1.0 / f1, 1.0 / f2);
        let is_short = f1 < SERIES_BELOW_RAD;
        let either = |series: f64, closed: f64| if is_short { series } else { closed };
        Self {
            cosine: either(0.5 + f2 * (-1.0 / 24.0 + f2 * (1.0 / 720.0 - f2 / 40_320.0)), rest * over_square),
            sine: either(
                1.0 / 6.0 + f2 * (-1.0 / 120.0 + f2 * (1.0 / 5_040.0 - f2 / 362_880.0)),
                (f1 - whole_sine) * over_f * over_square,
            ),
            cotangent: either(
                1.0 / 12.0 + f2 * (1.0 / 720.0 + f2 * (1.0 / 30_240.0 + f2 / 1_209_600.0)),
                (1.0 - 0.5 * f1 * cosine / sine) * over_square,
            ),
            across: either(
                1.0 / 12.0 + f2 * (-1.0 / 180.0 + f2 * (1.0 / 6_720.0 - f2 / 453_600.0)),
                (2.0 * rest - f1 * whole_sine) * over_square * over_square,
            ),
            twice_across: either(
                -1.0 / 60.0 + f2 * (1.0 / 1_260.0 - f2 / 60_480.0),
                (3.0 * (whole_sine - f1) + f1 * rest) * over_square * over_square * over_f,
            ),
        }
    }
}

impl Slope {
    /// Of plane angles in radians.
    pub(super) fn of(angles: DVec3) -> Self {
        let f1 = angles.length();
        let (sine, cosine) = (0.5 * f1).sin_cos();
        Self { angles: angles.into(), rests: Rests::of_half_turn(f1, sine, cosine) }
    }

    /// The body rate where the angles change at `change`.
    pub(super) fn rate(&self, change: DVec3) -> DVec3 {
        (self.jacobian() * Vector::from(change)).into()
    }

    /// How the angles change at a body rate; below a full turn.
    pub(super) fn change(&self, rate: DVec3) -> DVec3 {
        (self.inverse_jacobian() * Vector::from(rate)).into()
    }

    /// The body acceleration where the angles change at `first` and that at `second`.
    pub(super) fn acceleration(&self, first: DVec3, second: DVec3) -> DVec3 {
        (self.jacobian() * Vector::from(second) + self.turning_term(first.into())).into()
    }

    /// The other way about: how the change `first` of the angles changes at a body acceleration.
    pub(super) fn second_change(&self, first: DVec3, acceleration: DVec3) -> DVec3 {
        (self.inverse_jacobian() * (Vector::from(acceleration) - self.turning_term(first.into()))).into()
    }
}

impl<T: Number> Slope<T> {
    /// `J` in `rate = J(f) · df/dt`: from the slope of the plane angles `f` to the body rate.
    #[inline(always)]
    pub(super) fn jacobian(&self) -> Matrix<T> {
        Matrix::of_cross_products(self.angles, -self.rests.cosine, self.rests.sine)
    }

    /// The inverse of [`Slope::jacobian`]; exists below a full turn.
    #[inline(always)]
    pub(super) fn inverse_jacobian(&self) -> Matrix<T> {
        Matrix::of_cross_products(self.angles, T::from(0.5), self.rests.cotangent)
    }

    /// The part of the acceleration that comes from the turning of the plane while the angles `f` change at `g`:
    /// the acceleration is `J(f) d²f/dt²` and this.
    #[inline(always)]
    pub(super) fn turning_term(&self, g: Vector<T>) -> Vector<T> {
        let (f, rests) = (self.angles, &self.rests);
        let across = f.cross(g);
        (across * rests.across + f.cross(across) * rests.twice_across) * f.dot(g)
            + g.cross(across) * rests.sine
    }

    /// The slope of [`Slope::turning_term`] as `g` changes.
    #[inline(always)]
    pub(super) fn turning_slope(&self, g: Vector<T>) -> Matrix<T> {
        let (f, rests) = (self.angles, &self.rests);
        let across = f.cross(g);
        let along = f.dot(g);
        // `[f]²` is `f fᵀ − f² I`, and `[g][f]` is `f gᵀ − (f·g) I`.
        let first = across * rests.across + (f.cross(across) + f * along) * rests.twice_across;
        let second = f * rests.sine;
        let Vector([a, b, c]) = f * (along * rests.across) - across * rests.sine;
        let diagonal = -along * (rests.twice_across * f.dot(f) + rests.sine);
        let (Vector([fx, fy, fz]), Vector([gx, gy, gz])) = (f, g);
        Matrix([
            first * fx + second * gx + Vector([diagonal, c, -b]),
            first * fy + second * gy + Vector([-c, diagonal, a]),
            first * fz + second * gz + Vector([b, -a, diagonal]),
        ])
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

    /// [`Slope::turning_term`] with plain vectors.
    fn turning_term(f: DVec3, g: DVec3) -> DVec3 {
        Slope::of(f).turning_term(g.into()).into()
    }

    #[test]
    fn the_two_jacobians_undo_each_other() {
        for f in sizes() {
            for change in DVec3::AXES {
                let back = Slope::of(f).change(Slope::of(f).rate(change));
                assert!(back.abs_diff_eq(change, 3e-14), "{f}: {back}");
            }
        }
    }

    #[test]
    fn the_jacobian_is_the_slope_of_exp() {
        // Body rate of exp(f + g t) by a central difference.
        let (g, dt) = (DVec3::new(0.3, 0.7, -0.2), 1e-5);
        for f in sizes() {
            let at = |t: f64| Rotor::from_plane_angles(Bivector::from_axis(f + g * t));
            let rate = ((at(-dt).reverse() * at(dt)).plane_angles() / (2.0 * dt)).axis();
            assert!(rate.abs_diff_eq(Slope::of(f).rate(g), 1e-9), "{f}: {rate}");
            // And its change: J(f + g t) g has the slope of the turning term alone, as g stays.
            let [before, after] = [-dt, dt].map(|t| Slope::of(f + g * t).rate(g));
            let slope = (after - before) / (2.0 * dt);
            assert!(slope.abs_diff_eq(turning_term(f, g), 1e-9), "{f}: {slope}");
            // It is a square of `g`, so that a central difference of any width gives its slope.
            let step = DVec3::new(-0.4, 0.1, 0.6);
            let slope = (turning_term(f, g + step) - turning_term(f, g - step)) / 2.0;
            let told: DVec3 = (Slope::of(f).turning_slope(g.into()) * Vector::from(step)).into();
            assert!(slope.abs_diff_eq(told, 1e-13), "{f}: {slope}");
        }
    }

    #[test]
    fn acceleration_and_second_change_undo_each_other() {
        let (first, second) = (DVec3::new(0.3, 0.7, -0.2), DVec3::new(-0.4, 0.1, 0.6));
        for f in sizes() {
            let slope = Slope::of(f);
            let back = slope.second_change(first, slope.acceleration(first, second));
            assert!(back.abs_diff_eq(second, 3e-14), "{f}: {back}");
        }
    }

    #[test]
    fn series_and_closed_forms_meet() {
        let direction = DVec3::new(2.0, -1.0, 0.5).normalize();
        let g = DVec3::new(0.9, 0.2, -0.4);
        let sides = [1.0 - 1e-12, 1.0 + 1e-12].map(|share| direction * (SERIES_BELOW_RAD * share));
        let [below, above] = sides.map(|f| Slope::of(f).change(g));
        assert!(below.abs_diff_eq(above, 2e-13), "{below} {above}");
        let [below, above] = sides.map(|f| turning_term(f, g));
        assert!(below.abs_diff_eq(above, 2e-13), "{below} {above}");
    }
}

//! A rotation on its way: where it is, how fast it turns, and how that changes.

use std::ops::Mul;

use glam::DVec3;

use super::slope::Slope;
use super::{Bivector, Rotor};

/// An orientation with its first and second change, by any one parameter: seconds, or a share of a segment.
///
/// Rate and acceleration are *body* ones: in the turned frame, the one that the orientation carries along.
/// `dR/dt = −½ R rate`; in the frame of the parent the rate is `R rate ~R`. The acceleration is the change of the three
/// numbers of the rate.
///
/// Products, inverses, exp and log carry both derivatives along exactly, so a curve built of them has its own.
///
/// Source: the product rule; for exp and log, Park & Ravani 1997.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Motion {
    /// The rotation.
    pub orientation: Rotor,
    /// The body rate, in radians per unit of the parameter.
    pub rate: Bivector,
    /// The change of the body rate, in radians per unit of the parameter squared.
    pub acceleration: Bivector,
}

impl Motion {
    /// A rotation that stands.
    #[must_use]
    pub const fn still(orientation: Rotor) -> Self {
        Self { orientation, rate: Bivector::ZERO, acceleration: Bivector::ZERO }
    }

    /// The rotation of plane angles that change: `exp`. `first` and `second` are their derivatives. The angles may be of any
    /// size.
    #[must_use]
    pub fn turning(angles: Bivector, first: Bivector, second: Bivector) -> Self {
        let (f, g, h) = (angles.axis(), first.axis(), second.axis());
        let slope = Slope::of(f);
        Self {
            orientation: Rotor::from_plane_angles(angles),
            rate: Bivector::from_axis(slope.rate(g)),
            acceleration: Bivector::from_axis(slope.acceleration(g, h)),
        }
    }

    /// The plane angles of this very rotor, as [`Rotor::plane_angles_as_signed`], and their first and second derivative.
    /// Near a whole turn the derivatives grow without bound, as the plane is no longer told there.
    #[must_use]
    pub fn plane_angles_as_signed(self) -> [Bivector; 3] {
        let angles = self.orientation.plane_angles_as_signed();
        let slope = Slope::of(angles.axis());
        let first = slope.change(self.rate.axis());
        let second = slope.second_change(first, self.acceleration.axis());
        [angles, Bivector::from_axis(first), Bivector::from_axis(second)]
    }

    /// The motion of four numbers that are not unit, once they are divided by their length; `None` where they are zero or not
    /// finite. `first` and `second` are their derivatives: the cubics of glTF, with no slope lost to the division.
    #[must_use]
    pub fn of_four_numbers(value: Rotor, first: Rotor, second: Rotor) -> Option<Self> {
        let orientation = value.try_normalize()?;
        let square = value.dot(value);
        // −2 ~R R' for a unit R; the length adds to the scalar part alone.
        let slope = (value.reverse() * first).bivector();
        let bend = (value.reverse() * second).bivector();
        let rate = slope * (-2.0 / square);
        let growth = 2.0 * value.dot(first) / square;
        let acceleration = bend * (-2.0 / square) - rate * growth;
        (rate.is_finite() && acceleration.is_finite()).then_some(Self { orientation, rate, acceleration })
    }

    /// The turn back.
    #[must_use]
    pub fn reverse(self) -> Self {
        let turned = |b: Bivector| -Bivector::from_axis(self.orientation.apply(b.axis()));
        Self {
            orientation: self.orientation.reverse(),
            rate: turned(self.rate),
            acceleration: turned(self.acceleration),
        }
    }

    /// The same way at another pace: by a new parameter whose first and second derivative of the old one are given.
    #[must_use]
    pub fn paced(self, first: f64, second: f64) -> Self {
        Self {
            orientation: self.orientation,
            rate: self.rate * first,
            acceleration: self.acceleration * (first * first) + self.rate * second,
        }
    }
}

impl Mul for Motion {
    type Output = Self;

    /// As the product of rotors: `other` turns first. Its rate is the outer one in the frame of the inner.
    fn mul(self, other: Self) -> Self {
        let inward = |b: Bivector| other.orientation.reverse().apply(b.axis());
        let own: DVec3 = inward(self.rate);
        Self {
            orientation: self.orientation * other.orientation,
            rate: Bivector::from_axis(own + other.rate.axis()),
            acceleration: Bivector::from_axis(
                inward(self.acceleration) + own.cross(other.rate.axis()) + other.acceleration.axis(),
            ),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A motion of its own kind, by its definition.
    fn swaying(t: f64) -> Motion {
        let angles = Bivector::new(t.sin(), 0.7 * (1.3 * t).cos(), 0.4 * t * t);
        let first = Bivector::new(t.cos(), -0.91 * (1.3 * t).sin(), 0.8 * t);
        let second = Bivector::new(-t.sin(), -1.183 * (1.3 * t).cos(), 0.8);
        Motion::turning(angles, first, second)
    }

    /// Holds rate and acceleration against central differences of the orientation.
    #[track_caller]
    fn check(motion: impl Fn(f64) -> Motion) {
        for t in [0.0, 0.3, 0.9, 1.7] {
            let dt = 1e-5;
            let [before, here, after] = [t - dt, t, t + dt].map(&motion);
            let rate = (before.orientation.reverse() * after.orientation).plane_angles() / (2.0 * dt);
            assert!((rate - here.rate).length() < 1e-8, "{t}: {rate:?} and {:?}", here.rate);
            let change = (after.rate - before.rate) / (2.0 * dt);
            assert!((change - here.acceleration).length() < 1e-7, "{t}: {change:?} and {here:?}");
        }
    }

    #[test]
    fn both_derivatives_go_along_with_every_step() {
        let other = |t: f64| swaying(0.7 * t + 0.2).paced(0.7, 0.0);
        check(swaying);
        check(|t| swaying(t) * other(t));
        check(|t| swaying(t).reverse());
        check(|t| swaying(t * t).paced(2.0 * t, 2.0));
        check(|t| {
            let [angles, first, second] = (swaying(t) * other(t)).plane_angles_as_signed();
            Motion::turning(angles * 0.4, first * 0.4, second * 0.4)
        });
        check(|t| {
            let value = Rotor::new(1.0 + t, 0.3 * t * t, -0.2, 0.5 * t);
            let first = Rotor::new(1.0, 0.6 * t, 0.0, 0.5);
            let second = Rotor::new(0.0, 0.6, 0.0, 0.0);
            Motion::of_four_numbers(value, first, second).unwrap()
        });
    }

    #[test]
    fn four_numbers_without_length_have_no_motion() {
        let zero = Rotor::new(0.0, 0.0, 0.0, 0.0);
        assert_eq!(Motion::of_four_numbers(zero, Rotor::IDENTITY, zero), None);
        assert_eq!(Motion::of_four_numbers(Rotor::IDENTITY, Rotor::new(f64::NAN, 0.0, 0.0, 0.0), zero), None);
    }
}

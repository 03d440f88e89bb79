//! The rotor type itself: product, reverse, applying, and the two ways to and from plane angles.

use std::ops::{Mul, Neg};

use glam::DVec3;

use super::Bivector;

/// A rotation, as the even element `s + yz·e2e3 + zx·e3e1 + xy·e1e2` of the algebra of space.
///
/// Applied as `v' = R v ~R`. A turn by `θ` in the unit plane `B` is `R = cos θ/2 − sin θ/2 · B`, so a positive turn in
/// xy takes x to y. `a * b` turns by `b` first. `R` and `−R` are the same rotation.
///
/// The quaternion `(x, y, z, w)` of the same rotation has `x = −yz`, `y = −zx`, `z = −xy`, `w = s`, because the basis
/// planes multiply in the other order than the quaternion units: `B1 B2 B3 = +1`, but `i j k = −1`.
///
/// Most functions expect a unit rotor; a rotor read from a file need not be one until it is normalised.
///
/// ```
/// use glam::DVec3;
/// use turnwright::rotor::{Bivector, Rotor, slerp};
///
/// // Plane angles are in radians, here a quarter turn from x to y.
/// let quarter = Rotor::from_plane_angles(Bivector::from_degrees([0.0, 0.0, 90.0]));
/// assert!(quarter.apply(DVec3::X).distance(DVec3::Y) < 1e-15);
///
/// // The right factor turns first: z to x, and then x to y.
/// let other = Rotor::from_plane_angles(Bivector::from_degrees([0.0, 90.0, 0.0]));
/// assert!((quarter * other).apply(DVec3::Z).distance(DVec3::Y) < 1e-15);
///
/// // R and −R are one rotation; `slerp` takes the short way all the same.
/// let half_way = slerp(Rotor::IDENTITY, -quarter, 0.5);
/// assert!((half_way.plane_angles().to_degrees()[2] - 45.0).abs() < 1e-13);
/// ```
///
/// Source: Hestenes 1986, *New Foundations for Classical Mechanics*; Doran & Lasenby 2003, *Geometric Algebra for Physicists*.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rotor {
    /// Scalar part.
    pub s: f64,
    /// Part in the plane of y and z.
    pub yz: f64,
    /// Part in the plane of z and x.
    pub zx: f64,
    /// Part in the plane of x and y.
    pub xy: f64,
}

impl Default for Rotor {
    fn default() -> Self {
        Self::IDENTITY
    }
}

impl Rotor {
    /// No turn.
    pub const IDENTITY: Self = Self::new(1.0, 0.0, 0.0, 0.0);

    /// From its four parts, as they are.
    #[must_use]
    pub const fn new(s: f64, yz: f64, zx: f64, xy: f64) -> Self {
        Self { s, yz, zx, xy }
    }

    /// From a scalar and a bivector, as they are.
    #[must_use]
    pub const fn from_parts(s: f64, b: Bivector) -> Self {
        Self::new(s, b.yz, b.zx, b.xy)
    }

    /// The bivector part.
    #[must_use]
    pub const fn bivector(self) -> Bivector {
        Bivector::new(self.yz, self.zx, self.xy)
    }

    /// From a quaternion `[x, y, z, w]` as glTF stores it: the signs of the vector part turn round,
    /// since `i = −e2e3`, `j = −e3e1`, `k = −e1e2`.
    #[must_use]
    pub const fn from_xyzw([x, y, z, w]: [f64; 4]) -> Self {
        Self::new(w, -x, -y, -z)
    }

    /// To a quaternion `[x, y, z, w]` as glTF stores it.
    #[must_use]
    pub const fn to_xyzw(self) -> [f64; 4] {
        [-self.yz, -self.zx, -self.xy, self.s]
    }

    /// The geometric product `u v` of two vectors: scalar and bivector, not made unit.
    /// For unit vectors it is two reflections, and turns by twice the angle from `v` to `u`.
    #[must_use]
    pub fn product_of_vectors(u: DVec3, v: DVec3) -> Self {
        Self::from_parts(u.dot(v), Bivector::outer(u, v))
    }

    /// The reverse `~R`: for a unit rotor the turn back.
    #[must_use]
    pub const fn reverse(self) -> Self {
        Self::new(self.s, -self.yz, -self.zx, -self.xy)
    }

    /// Sum of products of the four parts: the cosine of half the turn between two unit rotors.
    #[must_use]
    pub fn dot(self, other: Self) -> f64 {
        self.s * other.s + self.yz * other.yz + self.zx * other.zx + self.xy * other.xy
    }

    /// Length in four dimensions; 1 for a rotation.
    #[must_use]
    pub fn norm(self) -> f64 {
        self.dot(self).sqrt()
    }

    /// Whether all four parts are finite.
    #[must_use]
    pub fn is_finite(self) -> bool {
        self.s.is_finite() && self.yz.is_finite() && self.zx.is_finite() && self.xy.is_finite()
    }

    /// The unit rotor along this one; `None` for zero or what is not finite.
    #[must_use]
    pub fn try_normalize(self) -> Option<Self> {
        /// Powers of two, which change no digits, and so large that squares are safe between the limits below.
        const UP: f64 = 1.157_920_892_373_162e77; // 2^256
        const DOWN: f64 = 1.0 / UP;
        let norm = self.norm();
        if (DOWN..=UP).contains(&norm) {
            return Some(Self::new(self.s / norm, self.yz / norm, self.zx / norm, self.xy / norm));
        }
        let largest = self.s.abs().max(self.yz.abs()).max(self.zx.abs()).max(self.xy.abs());
        if !(self.is_finite() && largest > 0.0) {
            return None;
        }
        let mut lifted = self;
        // Four steps at most, which reaches the smallest subnormal.
        while lifted.norm() < DOWN {
            lifted = lifted.scale(UP);
        }
        while lifted.norm() > UP {
            lifted = lifted.scale(DOWN);
        }
        let norm = lifted.norm();
        Some(Self::new(lifted.s / norm, lifted.yz / norm, lifted.zx / norm, lifted.xy / norm))
    }

    /// The unit rotor along this one, or no turn where there is none.
    #[must_use]
    pub fn normalize(self) -> Self {
        self.try_normalize().unwrap_or(Self::IDENTITY)
    }

    /// All four parts times `factor`.
    #[must_use]
    pub fn scale(self, factor: f64) -> Self {
        Self::new(self.s * factor, self.yz * factor, self.zx * factor, self.xy * factor)
    }

    /// Of `self` and `−self`, the one nearer to `reference`. A dot product of 0 leaves it as it is.
    #[must_use]
    pub fn aligned_to(self, reference: Self) -> Self {
        if self.dot(reference) < 0.0 { -self } else { self }
    }

    /// `v' = R v ~R`, for a unit rotor.
    #[must_use]
    pub fn apply(self, v: DVec3) -> DVec3 {
        let b = DVec3::new(self.yz, self.zx, self.xy);
        let cross = b.cross(v);
        v - 2.0 * self.s * cross + 2.0 * b.cross(cross)
    }

    /// The rotor of a turn given as plane angles in radians; the whole turn is their length, of any size.
    ///
    /// Full relative accuracy in the bivector part, down to the smallest numbers there are.
    #[must_use]
    pub fn from_plane_angles(angles: Bivector) -> Self {
        let half = 0.5 * angles.length();
        // sin(h)/h by its series near 0: 1 − h²/6 + h⁴/120.
        let sinc = if half < 1e-3 {
            let h2 = half * half;
            1.0 - h2 / 6.0 + h2 * h2 / 120.0
        } else {
            half.sin() / half
        };
        Self::from_parts(half.cos(), angles * (-0.5 * sinc))
    }

    /// Twice the logarithm: the plane angles of the short turn, in radians, of length 0 to π.
    /// Full relative accuracy down to the tiniest turn; need not be unit.
    ///
    /// `R` and `−R` give the same, but for the exact half turn (`s == 0`), which is as long either way round: there the
    /// stored sign decides.
    #[must_use]
    pub fn plane_angles(self) -> Bivector {
        let upper = if self.s < 0.0 { -self } else { self };
        upper.plane_angles_as_signed()
    }

    /// Plane angles of this very rotor and not of its opposite: length 0 to 2π. For curves that count whole turns.
    /// `−1` turns by 2π in no plane in particular, and gives zero.
    #[must_use]
    pub fn plane_angles_as_signed(self) -> Bivector {
        let sine = self.bivector().length();
        if sine == 0.0 {
            return Bivector::ZERO;
        }
        self.bivector() * (-2.0 * (sine.atan2(self.s) / sine))
    }

    /// The short turn carried out `t` times over: `exp(t log R)`, for a unit rotor.
    /// `t` may be any number: 0.5 is half of it, −1 the turn back.
    #[must_use]
    pub fn pow(self, t: f64) -> Self {
        Self::from_plane_angles(self.plane_angles() * t)
    }

    /// The whole turn in radians, 0 to π. Accurate at both ends.
    #[must_use]
    pub fn turn(self) -> f64 {
        2.0 * self.bivector().length().atan2(self.s.abs())
    }

    /// The turn in radians, 0 to π, that takes `self` to `other`. Both unit.
    #[must_use]
    pub fn turn_to(self, other: Self) -> f64 {
        (self.reverse() * other).turn()
    }
}

impl Mul for Rotor {
    type Output = Self;

    /// The geometric product: turns by `other` first, then by `self`. Note the *minus* before the cross product.
    fn mul(self, other: Self) -> Self {
        Self::new(
            self.s * other.s - self.yz * other.yz - self.zx * other.zx - self.xy * other.xy,
            self.s * other.yz + self.yz * other.s - (self.zx * other.xy - self.xy * other.zx),
            self.s * other.zx + self.zx * other.s - (self.xy * other.yz - self.yz * other.xy),
            self.s * other.xy + self.xy * other.s - (self.yz * other.zx - self.zx * other.yz),
        )
    }
}

impl Neg for Rotor {
    type Output = Self;
    fn neg(self) -> Self {
        Self::new(-self.s, -self.yz, -self.zx, -self.xy)
    }
}

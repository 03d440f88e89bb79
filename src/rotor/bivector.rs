//! The bivector: an oriented piece of plane, and so also the three plane angles of a turn.

use std::ops::{Add, Div, Mul, Neg, Sub};

use glam::DVec3;

/// An element of the planes of three-dimensional space: `yz·e2e3 + zx·e3e1 + xy·e1e2`.
///
/// As *plane angles* it holds a turn in radians, split over the three planes; positive turns y towards z,
/// z towards x and x towards y. As the outer product of two vectors it holds the parallelogram between them.
/// Three planes in three dimensions (in two there would be one), which is why three numbers are enough.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Bivector {
    /// Part in the plane of y and z.
    pub yz: f64,
    /// Part in the plane of z and x.
    pub zx: f64,
    /// Part in the plane of x and y.
    pub xy: f64,
}

impl Bivector {
    /// No plane at all.
    pub const ZERO: Self = Self::new(0.0, 0.0, 0.0);

    /// From its parts in the planes yz, zx and xy.
    #[must_use]
    pub const fn new(yz: f64, zx: f64, xy: f64) -> Self {
        Self { yz, zx, xy }
    }

    /// The plane square to `axis`, turned right-handed about it: the same three numbers.
    #[must_use]
    pub const fn from_axis(axis: DVec3) -> Self {
        Self::new(axis.x, axis.y, axis.z)
    }

    /// The vector square to this plane, of the same length: the same three numbers.
    #[must_use]
    pub const fn axis(self) -> DVec3 {
        DVec3::new(self.yz, self.zx, self.xy)
    }

    /// The outer product `u ∧ v`: the plane that runs from `u` to `v`, with the area between them.
    #[must_use]
    pub fn outer(u: DVec3, v: DVec3) -> Self {
        Self::from_axis(u.cross(v))
    }

    /// Sum of products of parts. The geometric product of a bivector with itself is `-b.dot(b)`.
    #[must_use]
    pub fn dot(self, other: Self) -> f64 {
        self.yz * other.yz + self.zx * other.zx + self.xy * other.xy
    }

    /// Area, or as plane angles the whole turn in radians. Neither overflows nor underflows.
    #[must_use]
    pub fn length(self) -> f64 {
        root_of_safe(self.dot(self)).unwrap_or_else(|| self.yz.hypot(self.zx).hypot(self.xy))
    }

    /// The same plane with area 1; zero stays zero.
    #[must_use]
    pub fn normalize_or_zero(self) -> Self {
        let length = self.length();
        if length > 0.0 {
            Self::new(self.yz / length, self.zx / length, self.xy / length)
        } else {
            Self::ZERO
        }
    }

    /// Whether all parts are finite.
    #[must_use]
    pub fn is_finite(self) -> bool {
        self.yz.is_finite() && self.zx.is_finite() && self.xy.is_finite()
    }

    /// The parts in degrees, for people.
    #[must_use]
    pub fn to_degrees(self) -> [f64; 3] {
        [self.yz.to_degrees(), self.zx.to_degrees(), self.xy.to_degrees()]
    }

    /// From parts in degrees, in the order yz, zx, xy.
    #[must_use]
    pub fn from_degrees([yz, zx, xy]: [f64; 3]) -> Self {
        Self::new(yz.to_radians(), zx.to_radians(), xy.to_radians())
    }
}

/// `√(a² + b²)`, which neither overflows nor underflows.
pub(super) fn length_of(a: f64, b: f64) -> f64 {
    root_of_safe(a * a + b * b).unwrap_or_else(|| a.hypot(b))
}

/// The root of a sum of squares that is neither so small nor so large that they may have lost digits. `hypot` is right everywhere,
/// and takes several times as long.
fn root_of_safe(square: f64) -> Option<f64> {
    const SMALLEST: f64 = 1e-270;
    (SMALLEST..1.0 / SMALLEST).contains(&square).then(|| square.sqrt())
}

impl Add for Bivector {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        Self::new(self.yz + other.yz, self.zx + other.zx, self.xy + other.xy)
    }
}

impl Sub for Bivector {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        Self::new(self.yz - other.yz, self.zx - other.zx, self.xy - other.xy)
    }
}

impl Neg for Bivector {
    type Output = Self;
    fn neg(self) -> Self {
        Self::new(-self.yz, -self.zx, -self.xy)
    }
}

impl Mul<f64> for Bivector {
    type Output = Self;
    fn mul(self, factor: f64) -> Self {
        Self::new(self.yz * factor, self.zx * factor, self.xy * factor)
    }
}

impl Div<f64> for Bivector {
    type Output = Self;
    fn div(self, divisor: f64) -> Self {
        Self::new(self.yz / divisor, self.zx / divisor, self.xy / divisor)
    }
}

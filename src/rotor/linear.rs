//! Vectors and matrices of three rows whose numbers may each be several side by side.

#![expect(
    clippy::inline_always,
    reason = "a part that stays a function of its own is built for the baseline, and keeps what is around it from wide instructions"
)]

use std::ops::{Add, Div, Mul, Neg, Sub};

use glam::DVec3;

/// One number, or several side by side that are reckoned with in one instruction.
pub(super) trait Number:
    Copy
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Div<Output = Self>
    + Neg<Output = Self>
    + From<f64>
{
}

impl<T> Number for T where
    T: Copy
        + Add<Output = T>
        + Sub<Output = T>
        + Mul<Output = T>
        + Div<Output = T>
        + Neg<Output = T>
        + From<f64>
{
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Vector<T>(pub(super) [T; 3]);

impl<T: Number> Vector<T> {
    #[inline(always)]
    pub(super) fn zero() -> Self {
        Self([T::from(0.0); 3])
    }

    #[inline(always)]
    pub(super) fn dot(self, other: Self) -> T {
        let (Self([x, y, z]), Self([a, b, c])) = (self, other);
        x * a + y * b + z * c
    }

    #[inline(always)]
    pub(super) fn cross(self, other: Self) -> Self {
        let (Self([x, y, z]), Self([a, b, c])) = (self, other);
        Self([y * c - b * z, z * a - c * x, x * b - a * y])
    }
}

impl From<DVec3> for Vector<f64> {
    #[inline(always)]
    fn from(vector: DVec3) -> Self {
        Self(vector.to_array())
    }
}

impl From<Vector<f64>> for DVec3 {
    #[inline(always)]
    fn from(vector: Vector<f64>) -> Self {
        Self::from_array(vector.0)
    }
}

impl<T: Number> Add for Vector<T> {
    type Output = Self;

    #[inline(always)]
    fn add(self, other: Self) -> Self {
        let (Self([x, y, z]), Self([a, b, c])) = (self, other);
        Self([x + a, y + b, z + c])
    }
}

impl<T: Number> Sub for Vector<T> {
    type Output = Self;

    #[inline(always)]
    fn sub(self, other: Self) -> Self {
        let (Self([x, y, z]), Self([a, b, c])) = (self, other);
        Self([x - a, y - b, z - c])
    }
}

impl<T: Number> Mul<T> for Vector<T> {
    type Output = Self;

    #[inline(always)]
    fn mul(self, factor: T) -> Self {
        let Self([x, y, z]) = self;
        Self([x * factor, y * factor, z * factor])
    }
}

/// By its columns.
#[derive(Clone, Copy, Debug)]
pub(super) struct Matrix<T>(pub(super) [Vector<T>; 3]);

impl<T: Number> Matrix<T> {
    /// The same number three times on the diagonal.
    #[inline(always)]
    pub(super) fn diagonal(number: T) -> Self {
        let zero = T::from(0.0);
        Self([Vector([number, zero, zero]), Vector([zero, number, zero]), Vector([zero, zero, number])])
    }

    /// `I + once [f] + twice [f]²`, where `[f] g` is `f × g`.
    #[inline(always)]
    pub(super) fn of_cross_products(f: Vector<T>, once: T, twice: T) -> Self {
        let Vector([x, y, z]) = f;
        let (scaled, Vector([a, b, c])) = (f * twice, f * once);
        let diagonal = T::from(1.0) - scaled.dot(f);
        let Vector([sx, sy, sz]) = scaled;
        let [xy, yz, zx] = [sx * y, sy * z, sz * x];
        Self([
            Vector([diagonal + sx * x, xy + c, zx - b]),
            Vector([xy - c, diagonal + sy * y, yz + a]),
            Vector([zx + b, yz - a, diagonal + sz * z]),
        ])
    }

    /// What the inverse is once it is divided by the second: by minors, for matrices far from singular.
    #[inline(always)]
    pub(super) fn adjugate(self) -> (Self, T) {
        let [x, y, z] = self.0;
        let (a, b, c) = (y.cross(z), z.cross(x), x.cross(y));
        let (Vector([d, e, f]), Vector([g, h, i]), Vector([j, k, l])) = (a, b, c);
        (Self([Vector([d, g, j]), Vector([e, h, k]), Vector([f, i, l])]), x.dot(a))
    }
}

impl<T: Number> Add for Matrix<T> {
    type Output = Self;

    #[inline(always)]
    fn add(self, other: Self) -> Self {
        let ([x, y, z], [a, b, c]) = (self.0, other.0);
        Self([x + a, y + b, z + c])
    }
}

impl<T: Number> Sub for Matrix<T> {
    type Output = Self;

    #[inline(always)]
    fn sub(self, other: Self) -> Self {
        let ([x, y, z], [a, b, c]) = (self.0, other.0);
        Self([x - a, y - b, z - c])
    }
}

impl<T: Number> Mul<T> for Matrix<T> {
    type Output = Self;

    #[inline(always)]
    fn mul(self, factor: T) -> Self {
        let [x, y, z] = self.0;
        Self([x * factor, y * factor, z * factor])
    }
}

impl<T: Number> Mul<Vector<T>> for Matrix<T> {
    type Output = Vector<T>;

    #[inline(always)]
    fn mul(self, vector: Vector<T>) -> Vector<T> {
        let ([x, y, z], [a, b, c]) = (self.0, vector.0);
        x * a + y * b + z * c
    }
}

impl<T: Number> Mul for Matrix<T> {
    type Output = Self;

    #[inline(always)]
    fn mul(self, other: Self) -> Self {
        let [x, y, z] = other.0;
        Self([self * x, self * y, self * z])
    }
}

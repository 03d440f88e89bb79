//! The two kinds of numbers that the kernels work with.

use std::fmt::Debug;
use std::ops::{Add, Div, Mul, Neg, Sub};

use super::coefficients as fitted;

/// `f32` or `f64`. The trait belongs to the kernels and can't be implemented elsewhere.
pub trait Real: Polynomials {}

impl Real for f32 {}
impl Real for f64 {}

/// What the kernels need of a number. Not reachable from outside.
pub trait Polynomials:
    Copy
    + Debug
    + Default
    + PartialOrd
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Div<Output = Self>
    + Neg<Output = Self>
{
    const ZERO: Self;
    const ONE: Self;
    const HALF: Self;
    const TWO: Self;
    fn size(self) -> Self;
    fn root(self) -> Self;
    fn widened(self) -> f64;
    fn narrowed(value: f64) -> Self;
    /// Numerator and denominator of `θ²/(1 − d)` of `d = cos θ`, 0 to 1.
    fn square_over_rest(self) -> (Self, Self);
    /// Numerator and denominator of `θ/sin θ` of `d = cos θ`, 0 to 1.
    fn angle_over_sine(self) -> (Self, Self);
    /// `factor · sin √y/√y`, 0 to (π/2)²: what is beyond `factor` itself is added last, so that it is off by one rounding and
    /// little more.
    fn times_sine_over_angle(self, factor: Self) -> Self;
    /// `cos(α/2)` and `−sin(α/2)/α` of `α²`, 0 to π²: the parts of a rotor that turns by `α`.
    fn parts_of_turn(self) -> (Self, Self);
    /// `cos √y`, 0 to (π/2)².
    fn cosine(self) -> Self;
}

macro_rules! polynomials {
    ($kind:ty, $narrow:expr, $square:ident, $angle:ident, $sine:ident, $cosine:ident, $turn:ident) => {
        impl Polynomials for $kind {
            const ZERO: Self = 0.0;
            const ONE: Self = 1.0;
            const HALF: Self = 0.5;
            const TWO: Self = 2.0;
            #[inline(always)]
            fn size(self) -> Self {
                self.abs()
            }
            #[inline(always)]
            fn root(self) -> Self {
                self.sqrt()
            }
            #[inline(always)]
            fn widened(self) -> f64 {
                self.into()
            }
            #[inline(always)]
            fn narrowed(value: f64) -> Self {
                ($narrow)(value)
            }
            #[inline(always)]
            fn square_over_rest(self) -> (Self, Self) {
                fitted::$square.at(self)
            }
            #[inline(always)]
            fn angle_over_sine(self) -> (Self, Self) {
                fitted::$angle.at(self)
            }
            #[inline(always)]
            fn times_sine_over_angle(self, factor: Self) -> Self {
                let [_one, beyond @ ..] = fitted::$sine;
                factor + factor * (self * polynomial(&beyond, self))
            }
            #[inline(always)]
            fn parts_of_turn(self) -> (Self, Self) {
                $turn(self)
            }
            #[inline(always)]
            fn cosine(self) -> Self {
                polynomial(&fitted::$cosine, self)
            }
        }
    };
}

polynomials!(
    f32,
    |value: f64| value as f32,
    SQUARE_OVER_REST_F32,
    ANGLE_OVER_SINE_F32,
    SINE_OVER_ANGLE_F32,
    COSINE_F32,
    turn_by_series
);
polynomials!(
    f64,
    std::convert::identity,
    SQUARE_OVER_REST_F64,
    ANGLE_OVER_SINE_F64,
    SINE_OVER_ANGLE_F64,
    COSINE_F64,
    turn_by_tangent
);

/// [`Polynomials::parts_of_turn`] in `f32`: each by its polynomial, which take less than a division.
#[inline(always)]
fn turn_by_series(square: f32) -> (f32, f32) {
    /// The factors for a fourth of the variable, and `times` as much: powers of two, which round nothing.
    const fn of_fourth<const N: usize>(mut factors: [f32; N], times: f32) -> [f32; N] {
        let (mut power, mut by) = (0, times);
        while power < N {
            factors[power] *= by;
            by *= 0.25;
            power += 1;
        }
        factors
    }
    let cosine = polynomial(&const { of_fourth(fitted::COSINE_F32, 1.0) }, square);
    let sine = polynomial(&const { of_fourth(fitted::SINE_OVER_ANGLE_F32, -0.5) }, square);
    (cosine, sine)
}

/// [`Polynomials::parts_of_turn`] in `f64`: both from the tangent of a quarter of the angle, `α·a/b` with short `a` and `b`, as
/// `cos 2y = (1 − tan² y)/(1 + tan² y)` and `sin 2y = 2 tan y/(1 + tan² y)`. No angle gives exactly (1, −½).
#[inline(always)]
fn turn_by_tangent(square: f64) -> (f64, f64) {
    let above = polynomial(&fitted::QUARTER_TANGENT_ABOVE, square);
    let below = polynomial(&fitted::QUARTER_TANGENT_BELOW, square);
    let (above_square, below_square, both) = (square * (above * above), below * below, above * below);
    let share = 1.0 / (below_square + above_square);
    ((below_square - above_square) * share, -((both + both) * share))
}

/// A quotient of two polynomials: factors of rising powers, below the line without the last one, which is 1.
pub(super) struct Quotient<F, const ABOVE: usize, const BELOW: usize> {
    pub(super) above: [F; ABOVE],
    pub(super) below: [F; BELOW],
}

impl<F: Mul<Output = F> + Add<Output = F> + Copy, const ABOVE: usize, const BELOW: usize>
    Quotient<F, ABOVE, BELOW>
{
    /// What stands above and below the line.
    #[inline(always)]
    fn at(&self, d: F) -> (F, F) {
        let mut below = d + self.below[BELOW - 1];
        for power in (0..BELOW - 1).rev() {
            below = below * d + self.below[power];
        }
        (polynomial(&self.above, d), below)
    }
}

/// The polynomial with these factors of rising powers.
///
/// A short one is summed by Horner's rule, which rounds least. In a long one even and odd powers are summed apart: each sum
/// has to wait for the one before, and so there are two that do not wait for each other.
#[inline(always)]
pub(super) fn polynomial<F: Mul<Output = F> + Add<Output = F> + Copy, const N: usize>(
    factors: &[F; N],
    y: F,
) -> F {
    if N < 8 {
        let mut sum = factors[N - 1];
        for power in (0..N - 1).rev() {
            sum = sum * y + factors[power];
        }
        return sum;
    }
    let square = y * y;
    let (mut last, mut other) = (factors[N - 1], factors[N - 2]);
    for power in (0..N - 2).rev() {
        (last, other) = (other, last * square + factors[power]);
    }
    // Two sums are left, of which the later one holds the even powers.
    other + y * last
}

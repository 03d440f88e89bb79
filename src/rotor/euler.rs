//! Euler angles: twelve orders, both ways, and the two triples that mean the same turn.

use std::f64::consts::{PI, TAU};
use std::fmt;
use std::str::FromStr;

use super::Rotor;
use super::bivector::length_of;

/// One of the three axes a file's angle turns about.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Axis {
    /// The plane yz.
    X,
    /// The plane zx.
    Y,
    /// The plane xy.
    Z,
}

impl Axis {
    /// 0, 1 or 2.
    #[must_use]
    pub const fn index(self) -> usize {
        self as usize
    }

    /// From 0, 1 or 2.
    #[must_use]
    pub const fn from_index(index: usize) -> Option<Self> {
        match index {
            0 => Some(Self::X),
            1 => Some(Self::Y),
            2 => Some(Self::Z),
            _ => None,
        }
    }

    /// The letter `X`, `Y` or `Z`.
    #[must_use]
    pub const fn letter(self) -> char {
        match self {
            Self::X => 'X',
            Self::Y => 'Y',
            Self::Z => 'Z',
        }
    }

    /// The turn by `angle` radians about this axis.
    #[must_use]
    pub fn rotor(self, angle: f64) -> Rotor {
        let (sin, cos) = (0.5 * angle).sin_cos();
        match self {
            Self::X => Rotor::new(cos, -sin, 0.0, 0.0),
            Self::Y => Rotor::new(cos, 0.0, -sin, 0.0),
            Self::Z => Rotor::new(cos, 0.0, 0.0, -sin),
        }
    }
}

/// An order of three turns about moving axes, neighbours different: twelve in all.
/// `ZXY` with angles `[a, b, c]` means `R = Rz(a) Rx(b) Ry(c)`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct EulerOrder([Axis; 3]);

impl EulerOrder {
    /// All twelve.
    pub const ALL: [Self; 12] = {
        use Axis::{X, Y, Z};
        [
            Self([X, Y, Z]),
            Self([X, Z, Y]),
            Self([Y, X, Z]),
            Self([Y, Z, X]),
            Self([Z, X, Y]),
            Self([Z, Y, X]),
            Self([X, Y, X]),
            Self([X, Z, X]),
            Self([Y, X, Y]),
            Self([Y, Z, Y]),
            Self([Z, X, Z]),
            Self([Z, Y, Z]),
        ]
    };

    /// The commonest order in BVH files.
    pub const ZXY: Self = Self([Axis::Z, Axis::X, Axis::Y]);

    /// `None` when two neighbours are the same axis.
    #[must_use]
    pub fn new(axes: [Axis; 3]) -> Option<Self> {
        (axes[0] != axes[1] && axes[1] != axes[2]).then_some(Self(axes))
    }

    /// The axes, first applied last.
    #[must_use]
    pub const fn axes(self) -> [Axis; 3] {
        self.0
    }

    /// Whether the first and the last axis are the same (z-x-z and its like).
    #[must_use]
    pub fn is_proper(self) -> bool {
        self.0[0] == self.0[2]
    }

    /// The rotor of three angles in radians.
    #[must_use]
    pub fn to_rotor(self, [a, b, c]: [f64; 3]) -> Rotor {
        self.0[0].rotor(a) * self.0[1].rotor(b) * self.0[2].rotor(c)
    }

    /// Three angles in radians of a unit rotor: the first and last in −π to π, the middle one in −π/2 to π/2 (0 to π for
    /// proper orders). At a pole, where only a sum of the first and the last is fixed, the last becomes `last_at_pole`
    /// (the angle of the frame before, say), brought to −π to π.
    /// `to_rotor` gives the rotation back to a few times 1e-16 rad, at and near the poles too.
    ///
    /// Source: Bernardes & Viollet 2022, "Quaternion to Euler angles conversion: a direct, general and computationally
    /// efficient method", PLOS ONE 17(11). The middle angle of the other six orders is taken here from its own sine and
    /// cosine, so that a tiny one keeps its digits.
    #[must_use]
    pub fn from_rotor(self, rotor: Rotor, last_at_pole: f64) -> [f64; 3] {
        let q = rotor.to_xyzw();
        let [i, j, third] = self.0.map(Axis::index);
        let proper = self.is_proper();
        let k = if proper { 3 - i - j } else { third };
        // +1 for an even permutation of x, y, z.
        let parity = if (j + 3 - i) % 3 == 1 { 1.0 } else { -1.0 };
        // `near` and `far` hold the sum and the difference of the two outer angles, each by half.
        let [a, b, c, d] = if proper {
            [q[3], q[i], q[j], q[k] * parity]
        } else {
            [q[3] - q[j], q[i] - q[k] * parity, q[3] + q[j], q[i] + q[k] * parity]
        };
        let (near, far) = (length_of(a, b), length_of(c, d));
        let middle = if proper {
            2.0 * far.atan2(near)
        } else {
            // (far² − near²)/2 multiplied out is the sine, and near · far the cosine, of the turn about the middle axis.
            (2.0 * (q[3] * q[j] + parity * q[i] * q[k])).atan2(near * far)
        };
        let (half_sum, half_difference) = (b.atan2(a), d.atan2(c));
        let sign = if proper { 1.0 } else { -parity };
        let pole = POLE * length_of(near, far);
        // Brought into range before it is used: whole turns are not exact in f64.
        let kept = wrap(last_at_pole);
        let (first, last) = if far <= pole {
            // Only first + sign · last is known.
            (2.0 * half_sum - sign * kept, kept)
        } else if near <= pole {
            // Only first − sign · last is known.
            (2.0 * half_difference + sign * kept, kept)
        } else {
            (half_sum + half_difference, sign * (half_sum - half_difference))
        };
        [wrap(first), middle, wrap(last)]
    }

    /// The other triple that means the same turn: `(a+π, π−b, c+π)`, for proper orders `(a+π, −b, c+π)`.
    #[must_use]
    pub fn mirrored(self, [a, b, c]: [f64; 3]) -> [f64; 3] {
        let middle = if self.is_proper() { -b } else { PI - b };
        [a + PI, middle, c + PI]
    }

    /// Of all triples that mean the turn of `angles`, the one nearest `reference` by the sum of squared differences.
    /// Radians, whole turns included. At a pole, where the first and the last angle can be traded for each other, that
    /// trade is not tried: give [`Self::from_rotor`] the angle to keep there.
    #[must_use]
    pub fn nearest_equal(self, angles: [f64; 3], reference: [f64; 3]) -> [f64; 3] {
        let shifted = [angles, self.mirrored(angles)].map(|triple| nearest_turns(triple, reference));
        let cost = |triple: [f64; 3]| (0..3).map(|i| (triple[i] - reference[i]).powi(2)).sum::<f64>();
        if cost(shifted[1]) < cost(shifted[0]) { shifted[1] } else { shifted[0] }
    }
}

/// Below this share of the whole, the first and the last angle can't be told apart: what is left is the rounding of the
/// four parts. Leaving it out moves the rotation by at most four times as much, in radians.
const POLE: f64 = 5e-16;

/// An angle brought to −π to π.
fn wrap(angle: f64) -> f64 {
    if angle.abs() <= PI { angle } else { angle - TAU * (angle / TAU).round() }
}

/// Each angle shifted by the whole turns that bring it nearest to its reference.
fn nearest_turns(angles: [f64; 3], reference: [f64; 3]) -> [f64; 3] {
    std::array::from_fn(|i| angles[i] - TAU * ((angles[i] - reference[i]) / TAU).round())
}

impl fmt::Display for EulerOrder {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.iter().try_for_each(|axis| write!(f, "{}", axis.letter()))
    }
}

/// Why a text is no Euler order.
#[derive(Debug, thiserror::Error, PartialEq, Eq)]
#[error("expected three of X, Y, Z with neighbours different, such as ZXY, found `{0}`")]
pub struct NoEulerOrder(String);

impl FromStr for EulerOrder {
    type Err = NoEulerOrder;

    fn from_str(text: &str) -> Result<Self, NoEulerOrder> {
        let axis = |c: char| match c.to_ascii_uppercase() {
            'X' => Some(Axis::X),
            'Y' => Some(Axis::Y),
            'Z' => Some(Axis::Z),
            _ => None,
        };
        let axes: Option<Vec<Axis>> = text.chars().map(axis).collect();
        axes.and_then(|axes| <[Axis; 3]>::try_from(axes).ok())
            .and_then(Self::new)
            .ok_or_else(|| NoEulerOrder(text.to_owned()))
    }
}

//! Rotors and rotation matrices.

use glam::{DMat3, DVec3};

use super::{Bivector, Rotor};

impl Rotor {
    /// The matrix `m` with `m * v == self.apply(v)`.
    #[must_use]
    pub fn to_matrix(self) -> DMat3 {
        let [x, y, z, w] = self.to_xyzw();
        DMat3::from_cols(
            DVec3::new(1.0 - 2.0 * (y * y + z * z), 2.0 * (x * y + w * z), 2.0 * (x * z - w * y)),
            DVec3::new(2.0 * (x * y - w * z), 1.0 - 2.0 * (x * x + z * z), 2.0 * (y * z + w * x)),
            DVec3::new(2.0 * (x * z + w * y), 2.0 * (y * z - w * x), 1.0 - 2.0 * (x * x + y * y)),
        )
    }

    /// The rotor of a rotation matrix, by the largest of its trace and its diagonal.
    ///
    /// Columns somewhat off unit length or square angles give a unit rotor near by. A mirroring matrix (negative
    /// determinant) has no rotor: whatever comes out is of no use, so test for it before. What is not finite gives no turn.
    ///
    /// Source: Shepperd 1978, "Quaternion from rotation matrix".
    #[must_use]
    pub fn from_matrix(m: &DMat3) -> Self {
        let (a, b, c) = (m.x_axis, m.y_axis, m.z_axis);
        let trace = a.x + b.y + c.z;
        let largest = trace.max(a.x).max(b.y).max(c.z);
        let xyzw = if largest == trace {
            [b.z - c.y, c.x - a.z, a.y - b.x, 1.0 + trace]
        } else if largest == a.x {
            [1.0 + a.x - b.y - c.z, a.y + b.x, c.x + a.z, b.z - c.y]
        } else if largest == b.y {
            [a.y + b.x, 1.0 - a.x + b.y - c.z, b.z + c.y, c.x - a.z]
        } else {
            [c.x + a.z, b.z + c.y, 1.0 - a.x - b.y + c.z, a.y - b.x]
        };
        Self::from_xyzw(xyzw).normalize()
    }

    /// The shortest turn from the direction of `from` to that of `to`, whatever their lengths. Directions that
    /// are opposite to rounding turn half round in some plane that holds them; a vector that is zero or not finite gives no turn.
    ///
    /// The turned `from` meets `to` within rounding, also when the two are nearly opposite.
    ///
    /// Source: the product of two vectors, `(1 + v u)/|1 + v u|` (Doran & Lasenby 2003), written with their sum and
    /// difference, so that nothing cancels near the opposite.
    #[must_use]
    pub fn between(from: DVec3, to: DVec3) -> Self {
        let (Some(u), Some(v)) = (direction(from), direction(to)) else { return Self::IDENTITY };
        let sum = u + v;
        // A sum this small is the rounding of the two unit vectors, and points anywhere.
        if sum.length() < 4.0 * f64::EPSILON {
            return Self::product_of_vectors(u.any_orthonormal_vector(), u).normalize();
        }
        // For unit vectors 1 + u·v = |u + v|²/2 and u ∧ v = (u + v) ∧ (v − u)/2. The two factors are at right angles, so
        // their outer product keeps its relative accuracy however small the sum is.
        Self::from_parts(sum.dot(sum), -Bivector::outer(sum, v - u)).normalize()
    }
}

/// The unit vector along `v`, of whatever length; `None` for zero or what is not finite.
fn direction(v: DVec3) -> Option<DVec3> {
    // Powers of two, which change no digits, bring the squares into the range of f64.
    let lift = match v.abs().max_element() {
        tiny if tiny < 1e-150 => 2.0_f64.powi(600),
        huge if huge > 1e150 => 2.0_f64.powi(-600),
        _ => 1.0,
    };
    let lifted = v * lift;
    let length = lifted.length();
    (length > 0.0 && length.is_finite()).then(|| lifted / length)
}

//! Rotors and rotation matrices.

use glam::{DMat3, DVec3};

use super::Rotor;

impl Rotor {
    /// The matrix `m` with `m * v == self.apply(v)`.
    pub fn to_matrix(self) -> DMat3 {
        let [x, y, z, w] = self.to_xyzw();
        DMat3::from_cols(
            DVec3::new(1.0 - 2.0 * (y * y + z * z), 2.0 * (x * y + w * z), 2.0 * (x * z - w * y)),
            DVec3::new(2.0 * (x * y - w * z), 1.0 - 2.0 * (x * x + z * z), 2.0 * (y * z + w * x)),
            DVec3::new(2.0 * (x * z + w * y), 2.0 * (y * z - w * x), 1.0 - 2.0 * (x * x + y * y)),
        )
    }

    /// The rotor of a rotation matrix, by its largest diagonal sum.
    /// Columns off unit length or square angles give the rotor of the branch taken, made unit.
    ///
    /// Source: Shepperd 1978, "Quaternion from rotation matrix".
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

    /// The shortest turn from the direction of `from` to that of `to`. Exactly opposite directions turn half round in
    /// some plane that holds them; a zero vector gives no turn.
    pub fn between(from: DVec3, to: DVec3) -> Self {
        let (Some(u), Some(v)) = (from.try_normalize(), to.try_normalize()) else { return Self::IDENTITY };
        // Two reflections, first in `u` and then in the vector half-way to `v`, turn by the angle between them twice over.
        match (u + v).try_normalize() {
            Some(half_way) if u.dot(v) > -0.999_999 => Self::product_of_vectors(half_way, u).normalize(),
            _ => {
                let side = u.any_orthonormal_vector();
                let half_turn = Self::product_of_vectors(side, u);
                // What is left after the half turn is small, and so well defined.
                let turned = half_turn.apply(u);
                let rest = (turned + v)
                    .try_normalize()
                    .map_or(Self::IDENTITY, |h| Self::product_of_vectors(h, turned));
                (rest * half_turn).normalize()
            }
        }
    }
}

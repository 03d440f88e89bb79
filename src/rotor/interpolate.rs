//! Paths between two rotors: slerp, and squad with its inner points.

use super::{Bivector, Rotor};

/// Spherical linear interpolation the short way: the turn from `a` to `b` at constant rate.
///
/// `t` may leave 0 to 1: the turn is carried on. At `t == 0` and `t == 1` it gives the ends exactly (`b` with the sign
/// that is near `a`). Where the two are exactly half a turn apart (dot 0) it turns from `a` as the stored sign says.
///
/// Source: Shoemake 1985, "Animating rotation with quaternion curves".
pub fn slerp(a: Rotor, b: Rotor, t: f64) -> Rotor {
    slerp_as_signed(a, b.aligned_to(a), t)
}

/// Slerp along the arc between the two rotors as signed: the long way when their dot product is negative.
/// The inner slerps of [`squad`] are of this kind.
pub fn slerp_as_signed(a: Rotor, b: Rotor, t: f64) -> Rotor {
    if t == 0.0 {
        return a;
    }
    if t == 1.0 {
        return b;
    }
    let step = (a.reverse() * b).plane_angles_as_signed();
    a * Rotor::from_plane_angles(step * t)
}

/// Spherical quadrangle: from `a` to `b`, pulled by the inner points `inner_a` and `inner_b`.
/// The four must be aligned beforehand; nothing is aligned inside.
///
/// Source: Shoemake 1987, "Quaternion calculus and fast animation".
pub fn squad(a: Rotor, inner_a: Rotor, inner_b: Rotor, b: Rotor, t: f64) -> Rotor {
    slerp_as_signed(slerp_as_signed(a, b, t), slerp_as_signed(inner_a, inner_b, t), 2.0 * t * (1.0 - t))
}

/// Shoemake's inner point of `key` for evenly spaced keys; it serves the segments on both sides.
pub fn squad_inner(before: Rotor, key: Rotor, after: Rotor) -> Rotor {
    let to_after = (key.reverse() * after).plane_angles_as_signed();
    let to_before = (key.reverse() * before).plane_angles_as_signed();
    key * Rotor::from_plane_angles((to_after + to_before) * -0.25)
}

/// The two inner points of `key` for unevenly spaced keys, `[for the segment that ends, for the segment that starts]`,
/// so that the rate does not jump at the key. `before_secs` and `after_secs` are the lengths of the two segments;
/// `rate` is the body rate wanted at the key in radians per second.
///
/// Source: the end slopes of Shoemake 1987's squad, solved for the inner points.
pub fn squad_inner_uneven(
    before: Rotor,
    key: Rotor,
    after: Rotor,
    before_secs: f64,
    after_secs: f64,
    rate: Bivector,
) -> [Rotor; 2] {
    let from_before = (before.reverse() * key).plane_angles_as_signed();
    let to_after = (key.reverse() * after).plane_angles_as_signed();
    [
        key * Rotor::from_plane_angles((from_before - rate * before_secs) * 0.5),
        key * Rotor::from_plane_angles((rate * after_secs - to_after) * 0.5),
    ]
}

//! Paths between two rotors: slerp, nlerp, and squad with its inner points.

use super::{Bivector, Motion, Rotor};

/// Spherical linear interpolation the short way: the turn from `a` to `b` at constant rate.
///
/// `t` may leave 0 to 1: the turn is carried on. At `t == 0` and `t == 1` it gives the ends exactly (`b` with the sign
/// that is near `a`). Where the two are exactly half a turn apart (dot 0) it turns from `a` as the stored sign says.
///
/// ```
/// use turnwright::rotor::{Bivector, Rotor, slerp};
///
/// let turned = |deg| Rotor::from_plane_angles(Bivector::from_degrees([0.0, 0.0, deg]));
/// let third = slerp(turned(30.0), turned(-60.0), 1.0 / 3.0);
/// assert!(third.turn_to(turned(0.0)) < 1e-14);
/// // 340° one way round is 20° the other.
/// assert!(slerp(turned(-170.0), turned(170.0), 0.5).turn_to(turned(180.0)) < 1e-14);
/// ```
///
/// Source: Shoemake 1985, "Animating rotation with quaternion curves".
#[must_use]
pub fn slerp(a: Rotor, b: Rotor, t: f64) -> Rotor {
    slerp_as_signed(a, b.aligned_to(a), t)
}

/// Straight line between the four parts, brought back to unit length: the arc of [`slerp`] with an uneven rate. At 90° it
/// falls behind or runs ahead by up to 0.92°, at 179° by up to 8°. Meant for many cheap blends of near rotors, not for keys.
///
/// The short way, as [`slerp`]. With `t` in 0 to 1 the line never comes near zero; beyond, use [`slerp`].
#[must_use]
pub fn nlerp(a: Rotor, b: Rotor, t: f64) -> Rotor {
    let b = b.aligned_to(a);
    let part = |from: f64, to: f64| (1.0 - t) * from + t * to;
    Rotor::new(part(a.s, b.s), part(a.yz, b.yz), part(a.zx, b.zx), part(a.xy, b.xy))
        .try_normalize()
        .unwrap_or(a)
}

/// Slerp along the arc between the two rotors as signed: the long way when their dot product is negative.
/// The inner slerps of [`squad`] are of this kind. From `a` to `−a`, which is 360° in no plane in particular, it stays at
/// `a` until the end.
#[must_use]
pub fn slerp_as_signed(a: Rotor, b: Rotor, t: f64) -> Rotor {
    if t == 0.0 {
        return a;
    }
    if t == 1.0 {
        return b;
    }
    // Beyond the keys two large parts would cancel; and near a whole turn the chord says too little about the arc.
    if (0.0..=1.0).contains(&t) && a.dot(b) > -0.5 {
        return weighted(a, b, t);
    }
    let step = (a.reverse() * b).plane_angles_as_signed();
    a * Rotor::from_plane_angles(step * t)
}

/// Both ends by the sines of the arc's shares: rounds less than a product, a logarithm and an exponential one after the other.
/// The arc comes from chord and sum, which is right for the nearest rotors too (Kahan 2006).
fn weighted(a: Rotor, b: Rotor, t: f64) -> Rotor {
    let length = |sign: f64| -> f64 {
        let part = |from: f64, to: f64| to + sign * from;
        Rotor::new(part(a.s, b.s), part(a.yz, b.yz), part(a.zx, b.zx), part(a.xy, b.xy)).norm()
    };
    let arc = 2.0 * length(-1.0).atan2(length(1.0));
    let whole = arc.sin();
    if whole == 0.0 {
        return a;
    }
    let (from, to) = (((1.0 - t) * arc).sin() / whole, (t * arc).sin() / whole);
    let part = |a: f64, b: f64| from * a + to * b;
    Rotor::new(part(a.s, b.s), part(a.yz, b.yz), part(a.zx, b.zx), part(a.xy, b.xy))
}

/// Spherical quadrangle: from `a` to `b`, pulled by the inner points `inner_a` and `inner_b`.
/// The four must be aligned beforehand; nothing is aligned inside.
///
/// ```
/// use turnwright::rotor::{Bivector, Rotor, squad, squad_inner};
///
/// // Keys that turn at one rate in one plane: squad keeps that rate.
/// let key = |deg| Rotor::from_plane_angles(Bivector::from_degrees([0.0, deg, 0.0]));
/// let [before, a, b, after] = [0.0, 40.0, 80.0, 120.0].map(key);
/// let (inner_a, inner_b) = (squad_inner(before, a, b), squad_inner(a, b, after));
/// assert!(squad(a, inner_a, inner_b, b, 0.25).turn_to(key(50.0)) < 1e-14);
/// ```
///
/// Source: Shoemake 1987, "Quaternion calculus and fast animation".
#[must_use]
pub fn squad(a: Rotor, inner_a: Rotor, inner_b: Rotor, b: Rotor, t: f64) -> Rotor {
    slerp_as_signed(slerp_as_signed(a, b, t), slerp_as_signed(inner_a, inner_b, t), 2.0 * t * (1.0 - t))
}

/// [`slerp_as_signed`] with its rate and acceleration by `t`.
#[must_use]
pub fn slerp_motion(a: Rotor, b: Rotor, t: f64) -> Motion {
    let step = (a.reverse() * b).plane_angles_as_signed();
    Motion { orientation: slerp_as_signed(a, b, t), rate: step, acceleration: Bivector::ZERO }
}

/// [`squad`] with its rate and acceleration by `t`, exact: exp and log carry both along.
#[must_use]
pub fn squad_motion(a: Rotor, inner_a: Rotor, inner_b: Rotor, b: Rotor, t: f64) -> Motion {
    let (outer, inner) = (slerp_motion(a, b, t), slerp_motion(inner_a, inner_b, t));
    let [angles, first, second] = (outer.reverse() * inner).plane_angles_as_signed();
    // 2t(1 − t) of the way from the outer arc to the inner one.
    let (share, share_first, share_second) = (2.0 * t * (1.0 - t), 2.0 - 4.0 * t, -4.0);
    let pull = Motion::turning(
        angles * share,
        angles * share_first + first * share,
        angles * share_second + first * (2.0 * share_first) + second * share,
    );
    outer * pull
}

/// Shoemake's inner point of `key` for evenly spaced keys; it serves the segments on both sides.
#[must_use]
pub fn squad_inner(before: Rotor, key: Rotor, after: Rotor) -> Rotor {
    let to_after = (key.reverse() * after).plane_angles_as_signed();
    let to_before = (key.reverse() * before).plane_angles_as_signed();
    key * Rotor::from_plane_angles((to_after + to_before) * -0.25)
}

/// The two inner points of `key` for unevenly spaced keys, `[for the segment that ends, for the segment that starts]`,
/// so that the rate does not jump at the key. `before_secs` and `after_secs` are the lengths of the two segments;
/// `rate` is the body rate wanted at the key in radians per second, from [`mean_rate`], [`parabola_rate`] or elsewhere.
/// With even spacing and either of these, both points are that of [`squad_inner`].
///
/// Source: the end slopes of Shoemake 1987's squad, solved for the inner points.
#[must_use]
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

/// Body rate at `key` in radians per second: the mean of the mean rates of the two segments beside it.
///
/// The three keys must be aligned beforehand. `before_secs` and `after_secs` are the lengths of the segments, above 0.
#[must_use]
pub fn mean_rate(before: Rotor, key: Rotor, after: Rotor, before_secs: f64, after_secs: f64) -> Bivector {
    let [rate_before, rate_after] = segment_rates(before, key, after, before_secs, after_secs);
    (rate_before + rate_after) * 0.5
}

/// Body rate at `key` in radians per second: the slope there of the parabola through the three keys, which leans to the
/// shorter segment. The usual choice for unevenly spaced keys.
///
/// The three keys must be aligned beforehand. `before_secs` and `after_secs` are the lengths of the segments, above 0.
#[must_use]
pub fn parabola_rate(before: Rotor, key: Rotor, after: Rotor, before_secs: f64, after_secs: f64) -> Bivector {
    let [rate_before, rate_after] = segment_rates(before, key, after, before_secs, after_secs);
    let share_before = after_secs / (before_secs + after_secs);
    rate_before * share_before + rate_after * (1.0 - share_before)
}

/// The constant body rates of the two segments beside `key`.
fn segment_rates(
    before: Rotor,
    key: Rotor,
    after: Rotor,
    before_secs: f64,
    after_secs: f64,
) -> [Bivector; 2] {
    [
        (before.reverse() * key).plane_angles_as_signed() / before_secs,
        (key.reverse() * after).plane_angles_as_signed() / after_secs,
    ]
}

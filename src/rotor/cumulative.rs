//! Curves made of a product of partial turns, each growing by its own share: Hermite and B-spline.
//!
//! Source: Kim, Kim & Shin 1995, "A general construction scheme for unit quaternion curves with simple high order
//! derivatives", SIGGRAPH.

use super::{Bivector, Rotor};

/// From `a` to `b` with the body rates wanted at both ends, exactly.
///
/// `t` runs from 0 to 1, and the rates are in radians per unit of it: multiply those in radians per second by the length of
/// the segment. The middle part goes the short way; when it is near half a turn, another key is needed between.
/// Running the segment backwards gives another curve unless the rates change sides and signs too.
#[must_use]
pub fn hermite(a: Rotor, rate_a: Bivector, b: Rotor, rate_b: Bivector, t: f64) -> Rotor {
    let (first, last) = (rate_a / 3.0, rate_b / 3.0);
    let after_first = a * Rotor::from_plane_angles(first);
    let before_last = b * Rotor::from_plane_angles(-last);
    let middle = (after_first.reverse() * before_last).plane_angles();
    let rest = 1.0 - t;
    // The Bernstein polynomials of degree three, summed from the last one on.
    let shares = [1.0 - rest * rest * rest, t * t * (3.0 - 2.0 * t), t * t * t];
    product(a, [first, middle, last], shares)
}

/// One segment of the uniform cubic B-spline of four control rotors, `t` from 0 to 1. Rate and acceleration run on
/// smoothly into the next segment; the curve passes near its controls and not through them, so it smooths.
///
/// Steps between neighbours go the short way.
#[must_use]
pub fn b_spline(controls: [Rotor; 4], t: f64) -> Rotor {
    let [p, q, r, s] = controls;
    let steps = [p.reverse() * q, q.reverse() * r, r.reverse() * s].map(Rotor::plane_angles);
    let shares = [
        (5.0 + t * (3.0 + t * (-3.0 + t))) / 6.0,
        (1.0 + t * (3.0 + t * (3.0 - 2.0 * t))) / 6.0,
        t * t * t / 6.0,
    ];
    product(p, steps, shares)
}

/// `start` and then the shares of three turns, one after the other, each in the frame that the ones before have left.
fn product(start: Rotor, turns: [Bivector; 3], shares: [f64; 3]) -> Rotor {
    turns
        .into_iter()
        .zip(shares)
        .fold(start, |rotor, (turn, share)| rotor * Rotor::from_plane_angles(turn * share))
}

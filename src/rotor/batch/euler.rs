//! Euler angles to rotors and back.

use std::f64::consts::{FRAC_1_PI, FRAC_PI_2, FRAC_PI_4, PI, TAU};

use super::super::EulerOrder;
use super::blocks::{Column, each_block, each_row, mend_rare};
use super::coefficients::ARC_TANGENT_F64;
use super::level::Level;
use super::real::{Polynomials, polynomial};
use super::streams::{Parts, PartsMut};

/// The rotors of Euler angles in radians, row by row: [`EulerOrder::to_rotor`] within 1e-15 rad for angles of a few turns.
/// The streams of angles stand in the order of the axes.
///
/// # Panics
/// When the streams differ in length.
pub fn euler_rotors(level: Level, order: EulerOrder, angles: Parts<'_, f64, 3>, out: PartsMut<'_, f64, 4>) {
    let Axes { places, parity, proper } = Axes::of(order);
    let out = by_place(out, places);
    let exact = |angles| {
        let rotor = order.to_rotor(angles);
        let planes = [rotor.yz, rotor.zx, rotor.xy];
        [rotor.s, planes[places[0]], planes[places[1]], planes[places[2]]]
    };
    level.run(
        #[inline(always)]
        || {
            let mut desk = Desk::new();
            if proper {
                each_block(
                    angles,
                    out,
                    #[inline(always)]
                    |angles, mut out: [&mut Column<f64, ROWS>; 4]| {
                        rotors::<true>(angles, parity, &mut out, &mut desk);
                        mend_rare(&desk.guards, angles, out, &exact);
                    },
                );
            } else {
                each_block(
                    angles,
                    out,
                    #[inline(always)]
                    |angles, mut out: [&mut Column<f64, ROWS>; 4]| {
                        rotors::<false>(angles, parity, &mut out, &mut desk);
                        mend_rare(&desk.guards, angles, out, &exact);
                    },
                );
            }
        },
    );
}

const ROWS: usize = 64;

/// Where the stages of a block lie.
struct Desk {
    guards: Column<f64, ROWS>,
    /// Half the angle without whole half turns.
    rests: Column<f64, ROWS>,
    /// Its square.
    squares: Column<f64, ROWS>,
    /// The sign of all three together: taking off an odd number of half turns turns it.
    signs: Column<f64, ROWS>,
    sines: [Column<f64, ROWS>; 3],
    cosines: [Column<f64, ROWS>; 3],
}

impl Desk {
    fn new() -> Self {
        let zero = [0.0; ROWS];
        Self { guards: zero, rests: zero, squares: zero, signs: zero, sines: [zero; 3], cosines: [zero; 3] }
    }
}

/// The rotors of a block; stage by stage, as slerp is.
#[inline(always)]
fn rotors<const PROPER: bool>(
    angles: [&Column<f64, ROWS>; 3],
    parity: f64,
    out: &mut [&mut Column<f64, ROWS>; 4],
    desk: &mut Desk,
) {
    /// Beyond it the multiples of π that are taken off are no longer exact.
    const MOST: f64 = 1e5;
    /// Below it [`half`] takes nothing off.
    const MOST_SHORT: f64 = 3.1;
    let Desk { guards, rests, squares, signs, sines, cosines } = desk;
    for row in 0..ROWS {
        guards[row] = MOST - size([angles[0][row], angles[1][row], angles[2][row]]);
        signs[row] = 1.0;
    }
    // Seldom is an angle beyond half a turn; without one nothing has to be taken off.
    let are_short =
        angles.iter().all(|angles| angles.iter().fold(true, |all, angle| all & (angle.abs() <= MOST_SHORT)));
    for axis in 0..3 {
        if are_short {
            for row in 0..ROWS {
                rests[row] = 0.5 * angles[axis][row];
                squares[row] = rests[row] * rests[row];
            }
        } else {
            for row in 0..ROWS {
                let (rest, sign) = half(angles[axis][row]);
                rests[row] = rest;
                squares[row] = rest * rest;
                signs[row] *= sign;
            }
        }
        for row in 0..ROWS {
            sines[axis][row] = squares[row].times_sine_over_angle(rests[row]);
        }
        for row in 0..ROWS {
            cosines[axis][row] = squares[row].cosine();
        }
    }
    // The sign of the first goes into all parts.
    for row in 0..ROWS {
        sines[0][row] *= signs[row];
        cosines[0][row] *= signs[row];
    }
    for row in 0..ROWS {
        let sine = [sines[0][row], sines[1][row], sines[2][row]];
        let cosine = [cosines[0][row], cosines[1][row], cosines[2][row]];
        let parts = rotor::<PROPER>(sine, cosine, parity);
        for part in 0..4 {
            out[part][row] = parts[part];
        }
    }
}

#[inline(always)]
fn rotor<const PROPER: bool>([sa, sb, sc]: [f64; 3], [ca, cb, cc]: [f64; 3], parity: f64) -> [f64; 4] {
    if PROPER {
        let (sum_sine, sum_cosine) = (sa * cc + ca * sc, ca * cc - sa * sc);
        let (sine, cosine) = (sa * cc - ca * sc, ca * cc + sa * sc);
        [cb * sum_cosine, -(cb * sum_sine), -(sb * cosine), -(parity * sb * sine)]
    } else {
        let (both_cosines, both_sines) = (ca * cb, sa * sb);
        let (sine_cosine, cosine_sine) = (sa * cb, ca * sb);
        [
            both_cosines * cc - parity * (both_sines * sc),
            -(sine_cosine * cc + parity * (cosine_sine * sc)),
            -(cosine_sine * cc - parity * (sine_cosine * sc)),
            -(both_cosines * sc + parity * (both_sines * cc)),
        ]
    }
}

/// At least the largest of the three.
#[inline(always)]
fn size([a, b, c]: [f64; 3]) -> f64 {
    a.abs() + b.abs() + c.abs()
}

/// The Euler angles in radians of unit rotors, row by row: [`EulerOrder::from_rotor`], with the same ranges and the same
/// choice at a pole; turning them back loses less than 2e-15 rad, at and near the poles too.
/// The streams of angles stand in the order of the axes.
///
/// Source: Bernardes & Viollet 2022, as there.
///
/// # Panics
/// When the streams differ in length.
pub fn euler_angles(
    level: Level,
    order: EulerOrder,
    rotors: Parts<'_, f64, 4>,
    last_at_pole: f64,
    out: PartsMut<'_, f64, 3>,
) {
    let Axes { places, parity, proper } = Axes::of(order);
    let [s, planes @ ..] = rotors;
    let inputs = [s, planes[places[0]], planes[places[1]], planes[places[2]]];
    let kept = wrapped(last_at_pole);
    level.run(
        #[inline(always)]
        || {
            if proper {
                each_row(
                    inputs,
                    out,
                    #[inline(always)]
                    |row: [f64; 4]| triple::<true>(row, parity, kept),
                );
            } else {
                each_row(
                    inputs,
                    out,
                    #[inline(always)]
                    |row: [f64; 4]| triple::<false>(row, parity, kept),
                );
            }
        },
    );
}

#[inline(always)]
fn triple<const PROPER: bool>([w, i, j, k]: [f64; 4], parity: f64, kept: f64) -> [f64; 3] {
    /// As for one rotor: the square of the share of the whole below which two angles can't be told apart.
    const POLE_SQUARE: f64 = 5e-16 * 5e-16;
    // The quaternion's three others are the planes with turned signs.
    let (i, j, k) = (-i, -j, -k * parity);
    let [a, b, c, d] = if PROPER { [w, i, j, k] } else { [w - j, i - k, w + j, i + k] };
    let (near, far) = (a * a + b * b, c * c + d * d);
    let middle = if PROPER {
        2.0 * arc_tangent(far.sqrt(), near.sqrt())
    } else {
        arc_tangent(2.0 * (w * j + i * k), (near * far).sqrt())
    };
    let (half_sum, half_difference) = (arc_tangent(b, a), arc_tangent(d, c));
    let sign = if PROPER { 1.0 } else { -parity };
    let pole = POLE_SQUARE * (near + far);
    let is_far_lost = far <= pole;
    let is_near_lost = near <= pole;
    let first = half_sum + half_difference;
    let last = sign * (half_sum - half_difference);
    let first = if is_near_lost { 2.0 * half_difference + sign * kept } else { first };
    let last = if is_near_lost { kept } else { last };
    let first = if is_far_lost { 2.0 * half_sum - sign * kept } else { first };
    let last = if is_far_lost { kept } else { last };
    [wrapped(first), middle, wrapped(last)]
}

/// What the formulas need of an order.
struct Axes {
    /// The first axis, the middle one, and the one that is left or comes last.
    places: [usize; 3],
    /// +1 where these are an even permutation of x, y, z, else −1.
    parity: f64,
    /// Whether the first axis is also the last.
    proper: bool,
}

impl Axes {
    fn of(order: EulerOrder) -> Self {
        let [i, j, third] = order.axes().map(super::super::Axis::index);
        let proper = order.is_proper();
        let k = if proper { 3 - i - j } else { third };
        let parity = if (j + 3 - i) % 3 == 1 { 1.0 } else { -1.0 };
        Self { places: [i, j, k], parity, proper }
    }
}

/// The streams of the planes in the order of the axes.
fn by_place(parts: PartsMut<'_, f64, 4>, places: [usize; 3]) -> PartsMut<'_, f64, 4> {
    let [s, yz, zx, xy] = parts;
    let mut planes = [Some(yz), Some(zx), Some(xy)];
    let mut take = |place: usize| planes[place].take().unwrap_or_default();
    [s, take(places[0]), take(places[1]), take(places[2])]
}

/// 1.5 · 2^52: adding it leaves no room for a fraction.
const TO_WHOLE: f64 = 6_755_399_441_055_744.0;

/// Half an angle without whole half turns, −π/2 to π/2, and −1 where their number is odd, which turns sine and cosine.
#[inline(always)]
fn half(angle: f64) -> (f64, f64) {
    /// π in two pieces of which the first has 33 bits (after fdlibm's π/2), so that its multiples are exact.
    const PI_PIECES: [f64; 2] = [2.0 * 1.570_796_326_734_125_6, 2.0 * 6.077_100_506_506_192e-11];
    let angle = 0.5 * angle;
    let shifted = angle * FRAC_1_PI + TO_WHOLE;
    let whole = shifted - TO_WHOLE;
    // The last bit says whether their number is odd.
    let sign = f64::from_bits(1.0_f64.to_bits() ^ (shifted.to_bits() << 63));
    ((angle - whole * PI_PIECES[0]) - whole * PI_PIECES[1], sign)
}

/// The angle of `(x, y)` from −π to π; 0 for `(0, 0)`. As `f64::atan2` within 4e-16.
#[inline(always)]
fn arc_tangent(y: f64, x: f64) -> f64 {
    const EIGHTH_TANGENT: f64 = 0.414_213_562_373_095_03;
    let (ax, ay) = (x.abs(), y.abs());
    let is_steep = ay > ax;
    let (small, large) = if is_steep { (ax, ay) } else { (ay, ax) };
    let is_wide = small > EIGHTH_TANGENT * large;
    let above = if is_wide { small - large } else { small };
    let below = if is_wide { small + large } else { large };
    let base = if is_wide { FRAC_PI_4 } else { 0.0 };
    let share = above / if below == 0.0 { 1.0 } else { below };
    let angle = base + share * polynomial(&ARC_TANGENT_F64, share * share);
    let angle = if is_steep { FRAC_PI_2 - angle } else { angle };
    let angle = if x < 0.0 { PI - angle } else { angle };
    angle.copysign(y)
}

/// An angle of at most a few turns brought to −π to π.
#[inline(always)]
fn wrapped(angle: f64) -> f64 {
    let turns = (angle * (1.0 / TAU) + TO_WHOLE) - TO_WHOLE;
    if angle.abs() <= PI { angle } else { angle - TAU * turns }
}

//! Products of rotors, and rotors applied to vectors.

use super::blocks::{Column, each_block, each_row};
use super::level::Level;
use super::real::Real;
use super::streams::{Parts, PartsMut};

/// The products `a b`, row by row: turns by `b` first. The same formula as the product of two [`super::super::Rotor`]s.
///
/// # Panics
/// When the streams differ in length.
pub fn compose<F: Real>(level: Level, a: Parts<'_, F, 4>, b: Parts<'_, F, 4>, out: PartsMut<'_, F, 4>) {
    let [a0, a1, a2, a3] = a;
    let [b0, b1, b2, b3] = b;
    level.run(
        #[inline(always)]
        || {
            each_row(
                [a0, a1, a2, a3, b0, b1, b2, b3],
                out,
                #[inline(always)]
                |[s, yz, zx, xy, os, oyz, ozx, oxy]: [F; 8]| product([s, yz, zx, xy], [os, oyz, ozx, oxy]),
            );
        },
    );
}

/// Vectors turned by unit rotors, row by row: [`super::super::Rotor::apply`].
///
/// # Panics
/// When the streams differ in length.
pub fn apply<F: Real>(
    level: Level,
    rotors: Parts<'_, F, 4>,
    vectors: Parts<'_, F, 3>,
    out: PartsMut<'_, F, 3>,
) {
    let [s, yz, zx, xy] = rotors;
    let [x, y, z] = vectors;
    level.run(
        #[inline(always)]
        || {
            each_row(
                [s, yz, zx, xy, x, y, z],
                out,
                #[inline(always)]
                |[s, b0, b1, b2, x, y, z]: [F; 7]| turned([s, b0, b1, b2], [x, y, z]),
            );
        },
    );
}

/// Forward kinematics from a parent to its child, row by row: given the turn and the place of the parent in the scene and those
/// of the child relative to it, those of the child in the scene.
///
/// # Panics
/// When the streams differ in length.
pub fn carry<F: Real>(
    level: Level,
    (parent_turn, parent_place): (Parts<'_, F, 4>, Parts<'_, F, 3>),
    (turn, place): (Parts<'_, F, 4>, Parts<'_, F, 3>),
    (world_turn, world_place): (PartsMut<'_, F, 4>, PartsMut<'_, F, 3>),
) {
    let [p0, p1, p2, p3] = parent_turn;
    let [px, py, pz] = parent_place;
    let [t0, t1, t2, t3] = turn;
    let [x, y, z] = place;
    let [w0, w1, w2, w3] = world_turn;
    let [wx, wy, wz] = world_place;
    level.run(
        #[inline(always)]
        || {
            each_row(
                [p0, p1, p2, p3, px, py, pz, t0, t1, t2, t3, x, y, z],
                [w0, w1, w2, w3, wx, wy, wz],
                #[inline(always)]
                |[p0, p1, p2, p3, px, py, pz, t0, t1, t2, t3, x, y, z]: [F; 14]| {
                    let [s, yz, zx, xy] = product([p0, p1, p2, p3], [t0, t1, t2, t3]);
                    let [vx, vy, vz] = turned([p0, p1, p2, p3], [x, y, z]);
                    [s, yz, zx, xy, px + vx, py + vy, pz + vz]
                },
            );
        },
    );
}

/// As [`carry`], for a child whose place relative to its parent is the same in all rows.
///
/// # Panics
/// When the streams differ in length.
pub fn carry_bone<F: Real>(
    level: Level,
    (parent_turn, parent_place): (Parts<'_, F, 4>, Parts<'_, F, 3>),
    (turn, place): (Parts<'_, F, 4>, [F; 3]),
    (world_turn, world_place): (PartsMut<'_, F, 4>, PartsMut<'_, F, 3>),
) {
    let [p0, p1, p2, p3] = parent_turn;
    let [px, py, pz] = parent_place;
    let [t0, t1, t2, t3] = turn;
    let [w0, w1, w2, w3] = world_turn;
    let [wx, wy, wz] = world_place;
    level.run(
        #[inline(always)]
        || {
            let (mut turns, mut places) = ([[F::ZERO; CARRIED]; 4], [[F::ZERO; CARRIED]; 3]);
            each_block(
                [p0, p1, p2, p3, px, py, pz, t0, t1, t2, t3],
                [w0, w1, w2, w3, wx, wy, wz],
                #[inline(always)]
                |[p0, p1, p2, p3, px, py, pz, t0, t1, t2, t3]: [&Column<F, CARRIED>; 11],
                 out: [&mut Column<F, CARRIED>; 7]| {
                    // In two short loops, as one that reads and writes eighteen rows is not made one of wide instructions.
                    for row in 0..CARRIED {
                        let parent = [p0[row], p1[row], p2[row], p3[row]];
                        let found = product(parent, [t0[row], t1[row], t2[row], t3[row]]);
                        for part in 0..4 {
                            turns[part][row] = found[part];
                        }
                    }
                    for row in 0..CARRIED {
                        let parent = [p0[row], p1[row], p2[row], p3[row]];
                        let [x, y, z] = turned(parent, place);
                        places[0][row] = px[row] + x;
                        places[1][row] = py[row] + y;
                        places[2][row] = pz[row] + z;
                    }
                    for (out, found) in out.into_iter().zip(turns.iter().chain(&places)) {
                        *out = *found;
                    }
                },
            );
        },
    );
}

/// Rows that are carried from a joint to the next together.
const CARRIED: usize = 32;

/// The geometric product.
#[inline(always)]
fn product<F: Real>([s, yz, zx, xy]: [F; 4], [os, oyz, ozx, oxy]: [F; 4]) -> [F; 4] {
    [
        s * os - yz * oyz - zx * ozx - xy * oxy,
        s * oyz + yz * os - (zx * oxy - xy * ozx),
        s * ozx + zx * os - (xy * oyz - yz * oxy),
        s * oxy + xy * os - (yz * ozx - zx * oyz),
    ]
}

/// `R v ~R`.
#[inline(always)]
fn turned<F: Real>([s, b0, b1, b2]: [F; 4], [x, y, z]: [F; 3]) -> [F; 3] {
    let cross = [b1 * z - b2 * y, b2 * x - b0 * z, b0 * y - b1 * x];
    let again = [b1 * cross[2] - b2 * cross[1], b2 * cross[0] - b0 * cross[2], b0 * cross[1] - b1 * cross[0]];
    let v = [x, y, z];
    std::array::from_fn(|i| v[i] + F::TWO * (again[i] - s * cross[i]))
}

//! A cheap proof that many poses are well inside a range: no angle is worked out for it.

#![expect(
    clippy::inline_always,
    reason = "a part that stays a function of its own is built for the baseline, and keeps the loop around it from being widened"
)]
#![expect(clippy::neg_cmp_op_on_partial_ord, reason = "what is no number must not pass")]

use glam::DVec3;

use crate::rotor::Rotor;
use crate::rotor::batch::Level;

use super::joint_limit::{HELD_BELOW, JointLimit};
use super::swing::{BLEND_SINE, SwingLimit, smooth_step};

/// Poses that are looked at together.
pub const PROVED_TOGETHER: usize = 64;

/// Nearer to an end of a range than this nothing is proved, in radians.
const MARGIN_RAD: f64 = 1e-6;

/// The swing's angle for its sine is told within this share.
const OFF_SHARE: f64 = 2e-4;

/// Axes that are off unit length or square by more prove nothing.
const OFF_UNIT: f64 = 1e-9;

/// What a limit's fault band asks of the four numbers of a pose.
#[derive(Clone, Copy, Debug)]
pub struct Inside {
    /// Rows that make of a pose the cosine part, and the parts about the twist, the bend and the side axis, of its turn from zero.
    rows: [[f64; 4]; 4],
    /// Cosine and sine of half the twist's middle, and the squared cosine of half its half width; none where any twist will do.
    twist: Option<[f64; 3]>,
    tilt: Tilt,
}

#[derive(Clone, Copy, Debug)]
enum Tilt {
    Free,
    /// The squared cosine of half the opening's half.
    Cone(f64),
    /// For each axis one over the square of its semi-axis to the one and to the other side.
    Ellipse([[f64; 2]; 2]),
    Hinge {
        mid_rad: f64,
        half_rad: f64,
        give_rad: f64,
    },
}

impl Inside {
    /// Of a limit's fault band. `None` where nothing could be proved.
    pub fn fault_of(limit: &JointLimit) -> Option<Self> {
        let (twist_axis, bend_axis) = (limit.twist_axis, limit.bend_axis);
        let off = [
            twist_axis.length() - 1.0,
            bend_axis.length() - 1.0,
            twist_axis.dot(bend_axis),
            limit.zero.norm() - 1.0,
        ];
        if !off.iter().all(|off| off.abs() < OFF_UNIT) {
            return None;
        }
        let images = [
            Rotor::new(1.0, 0.0, 0.0, 0.0),
            Rotor::new(0.0, 1.0, 0.0, 0.0),
            Rotor::new(0.0, 0.0, 1.0, 0.0),
            Rotor::new(0.0, 0.0, 0.0, 1.0),
        ]
        .map(|part| {
            let turn = limit.zero.reverse() * part;
            // R = cos − sin · plane
            let about = |axis: DVec3| -turn.bivector().axis().dot(axis);
            [turn.s, about(twist_axis), about(bend_axis), about(limit.side_axis())]
        });
        let rows = std::array::from_fn(|row| images.map(|image| image[row]));
        let range = limit.fault.twist;
        let twist = if range.is_free() {
            None
        } else {
            let half = range.half_rad() - MARGIN_RAD;
            if !(half > 0.0) {
                return None;
            }
            let (sin, cos) = (0.5 * range.mid_rad()).sin_cos();
            Some([cos, sin, (0.5 * half).cos().powi(2)])
        };
        let tilt = match limit.fault.swing {
            SwingLimit::Cone { half_rad } if half_rad >= std::f64::consts::PI => Tilt::Free,
            SwingLimit::Cone { half_rad } => {
                let half = half_rad - MARGIN_RAD;
                if !(half > 0.0) {
                    return None;
                }
                Tilt::Cone((0.5 * half).cos().powi(2))
            }
            SwingLimit::Ellipse { sides_rad } => {
                if !sides_rad.iter().all(|side| *side > 1e-3) {
                    return None;
                }
                let [a, b, c, d] = sides_rad.map(|side| side.powi(-2));
                Tilt::Ellipse([[a, b], [c, d]])
            }
            SwingLimit::Hinge { bend, give_rad } => {
                let half_rad = if bend.is_free() { f64::INFINITY } else { bend.half_rad() - MARGIN_RAD };
                Tilt::Hinge { mid_rad: bend.mid_rad(), half_rad, give_rad: give_rad - MARGIN_RAD }
            }
        };
        Some(Self { rows, twist, tilt })
    }

    /// Whether all of `poses`, [`PROVED_TOGETHER`] at most, are proved to lie inside whatever came before, and no twist of theirs is held. They
    /// need not be unit. What is not proved may be inside too.
    pub fn holds(&self, poses: &[Rotor]) -> bool {
        let mut parts = [[0.0; PROVED_TOGETHER]; 4];
        // What is missing is as the first.
        let Some(first) = poses.first() else { return true };
        let rest = std::iter::repeat(first);
        for (row, pose) in poses.iter().chain(rest).take(PROVED_TOGETHER).enumerate() {
            let own = [pose.s, pose.yz, pose.zx, pose.xy];
            for (stream, part) in parts.iter_mut().zip(own) {
                stream[row] = part;
            }
        }
        let mut missed = 0;
        Level::best().run(
            #[inline(always)]
            || missed = self.missed(&parts),
        );
        missed == 0
    }

    /// How many proofs are missing.
    #[inline(always)]
    fn missed(&self, parts: &[[f64; PROVED_TOGETHER]; 4]) -> u64 {
        match self.tilt {
            Tilt::Free => self.count(parts, |_| true),
            Tilt::Cone(least) => self.count(
                parts,
                #[inline(always)]
                |own| own.cosine_2 >= least * own.square,
            ),
            Tilt::Ellipse(sides) => self.count(
                parts,
                #[inline(always)]
                |own| {
                    let (swing, along) = own.swing();
                    let square = |axis: usize| {
                        let [plus, minus] = sides[axis];
                        minus + (plus - minus) * smooth_step(along[axis] / BLEND_SINE)
                    };
                    let level = swing[0] * swing[0] * square(0) + swing[1] * swing[1] * square(1);
                    level <= (1.0 - OFF_SHARE) * (1.0 - OFF_SHARE)
                },
            ),
            Tilt::Hinge { mid_rad, half_rad, give_rad } => self.count(
                parts,
                #[inline(always)]
                |own| {
                    let (swing, _) = own.swing();
                    let off = OFF_SHARE * swing[0].abs();
                    let gives = swing[1].abs() * (1.0 + OFF_SHARE) <= give_rad;
                    ((swing[0] - mid_rad).abs() + off <= half_rad) & gives
                },
            ),
        }
    }

    #[inline(always)]
    fn count(&self, parts: &[[f64; PROVED_TOGETHER]; 4], is_inside: impl Fn(&Own) -> bool) -> u64 {
        let [cos, sin, least] = self.twist.unwrap_or([0.0, 0.0, 0.0]);
        let [scalars, yzs, zxs, xys] = parts;
        // Proofs that are missing: sums of them need no branch.
        let mut missed = 0;
        for row in 0..PROVED_TOGETHER {
            let pose = [scalars[row], yzs[row], zxs[row], xys[row]];
            let made = |row: &[f64; 4]| {
                (row[0] * pose[0] + row[1] * pose[1]) + (row[2] * pose[2] + row[3] * pose[3])
            };
            let [s, twist, bend, side] = [0, 1, 2, 3].map(|row: usize| made(&self.rows[row]));
            let cosine_2 = s * s + twist * twist;
            let square = cosine_2 + (bend * bend + side * side);
            let own = Own { s, twist, bend, side, cosine_2, square };
            let turned = cos * s + sin * twist;
            // What is zero or not finite is no pose, and has a neighbour's.
            missed += u64::from(!(square > 1e-300)) + u64::from(!(square < 1e300));
            missed += u64::from(!(cosine_2 >= (1.01 * HELD_BELOW * HELD_BELOW) * square));
            missed += u64::from(!(turned * turned >= least * cosine_2));
            missed += u64::from(!is_inside(&own));
        }
        missed
    }
}

/// A pose's turn from zero.
struct Own {
    s: f64,
    twist: f64,
    bend: f64,
    side: f64,
    /// Squared cosine of half the swing, and the squared length of all four numbers, which scales it.
    cosine_2: f64,
    square: f64,
}

impl Own {
    /// The two angles of the swing within [`OFF_SHARE`], radians, and its direction.
    #[inline(always)]
    fn swing(&self) -> ([f64; 2], [f64; 2]) {
        // Abramowitz & Stegun 1964, 4.4.45: acos c = √(1 − c) · P(c) within 6.7e-5, so that the angle over its sine is P(c)/√(1 + c).
        const P: [f64; 4] = [1.570_728_8, -0.212_114_4, 0.074_261_0, -0.018_729_3];
        let cosine = (self.cosine_2 / self.square).sqrt();
        let angle_over_sine =
            2.0 * (P[0] + cosine * (P[1] + cosine * (P[2] + cosine * P[3]))) / (1.0 + cosine).sqrt();
        let scale = 1.0 / (self.cosine_2 * self.square).sqrt();
        let sines = [
            (self.s * self.bend - self.twist * self.side) * scale,
            (self.s * self.side + self.twist * self.bend) * scale,
        ];
        let length = (sines[0] * sines[0] + sines[1] * sines[1]).sqrt().max(f64::MIN_POSITIVE);
        (sines.map(|sine| sine * angle_over_sine), sines.map(|sine| sine / length))
    }
}

#[cfg(test)]
mod tests {
    use super::super::{Interval, Range};
    use super::*;

    /// Turns all over, of any length.
    fn poses() -> Vec<Rotor> {
        let mut state = 5_u64;
        let mut number = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
            (state >> 40) as f64 / f64::from(1 << 23) - 1.0
        };
        (0..20_000)
            .filter_map(|case| {
                let near = Rotor::new(number(), number(), number(), number());
                let share = [1.0, 0.3, 0.05][case % 3];
                let turn = near.try_normalize()?.pow(share);
                Some(turn.scale(1.0 + 0.001 * number()))
            })
            .collect()
    }

    #[track_caller]
    fn check(fault: Range) {
        let zero = Rotor::new(0.6, 0.0, 0.8, 0.0);
        let limit = JointLimit::new(zero, DVec3::new(1.0, 2.0, -0.5), DVec3::new(0.3, -1.0, 4.0), fault);
        let proof = Inside::fault_of(&limit).unwrap();
        let (mut inside, mut proved) = (0, 0);
        for pose in poses() {
            let pose = zero * pose;
            let reading = limit.read(pose.normalize(), None);
            let is_inside = limit.fault.contains(&reading) && !reading.is_twist_held;
            let is_proved = proof.holds(&[pose]);
            assert!(is_inside || !is_proved, "{fault:?}: {pose:?} {reading:?}");
            inside += usize::from(is_inside);
            proved += usize::from(is_proved);
        }
        assert!(inside > 100, "{fault:?}: {inside}");
        // Turns of nearly half a turn that are read the other way round are not proved.
        assert!(proved * 10 > inside * 8, "{fault:?}: {proved} of {inside}");
        assert!(
            !proof.holds(&[Rotor::new(f64::NAN, 0.0, 0.0, 1.0)])
                && !proof.holds(&[Rotor::IDENTITY.scale(0.0)])
                && !proof.holds(&[Rotor::new(f64::INFINITY, 0.0, 0.0, 0.0)])
        );
    }

    #[test]
    fn what_is_proved_is_inside_and_most_that_is_inside_is_proved() {
        let twists =
            [Interval::FREE, Interval::from_degrees(-90.0, 60.0), Interval::from_degrees(20.0, 200.0)];
        let swings = [
            SwingLimit::FREE,
            SwingLimit::Cone { half_rad: 0.9 },
            SwingLimit::Ellipse { sides_rad: [150.0, 30.0, 20.0, 80.0].map(f64::to_radians) },
            SwingLimit::Hinge { bend: Interval::from_degrees(-5.0, 140.0), give_rad: 0.3 },
        ];
        for twist in twists {
            for swing in swings {
                check(Range { swing, twist });
            }
        }
    }

    #[test]
    fn one_pose_outside_is_enough() {
        let range = Range { swing: SwingLimit::Cone { half_rad: 0.5 }, twist: Interval::FREE };
        let limit = JointLimit::new(Rotor::IDENTITY, DVec3::Y, DVec3::X, range);
        let proof = Inside::fault_of(&limit).unwrap();
        let mut poses = vec![Rotor::IDENTITY; PROVED_TOGETHER];
        assert!(proof.holds(&poses));
        poses[41] = limit.local([0.51, 0.0], 0.0);
        assert!(!proof.holds(&poses));
    }
}

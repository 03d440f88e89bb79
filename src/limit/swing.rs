//! How far a joint may tilt: cone, ellipse with four sides, or hinge.
//!
//! A swing is two angles: the plane angles of the swing about the joint's bend axis and about its side axis (both square to the
//! twist axis), radians. Their length is the whole tilt.

use super::interval::{Interval, NARROWEST_RAD, ROUNDING, bent};

/// The tilt a joint may take.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum SwingLimit {
    /// The same to every side.
    Cone {
        /// Half the opening, radians.
        half_rad: f64,
    },
    /// A semi-axis for each side: about the bend axis forwards and backwards, about the side axis forwards and backwards.
    Ellipse {
        /// The four, radians, above 0.
        sides_rad: [f64; 4],
    },
    /// Bends about one axis, gives a little about the other.
    Hinge {
        /// Range of the bend.
        bend: Interval,
        /// How far it gives to either side, radians.
        give_rad: f64,
    },
}

/// How a swing outside is brought back.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ClampTo {
    /// Along its own direction: keeps the way the limb bends.
    SameDirection,
    /// To the nearest swing inside: moves the limb least.
    Nearest,
}

/// Over so much to both sides of an axis, as the sine of the direction, the semi-axes of two unlike sides blend into each
/// other (10°): without it the boundary has a step in its curvature there, and a soft clamp a step in acceleration.
pub(super) const BLEND_SINE: f64 = 0.173_648_177_666_930_33;

/// Comfort is kept this far inside the limit, so that the soft clamp has room to bend.
const LARGEST_COMFORT: f64 = 0.98;

impl SwingLimit {
    /// No limit at all.
    pub const FREE: Self = Self::Cone { half_rad: std::f64::consts::PI };

    /// 1 on the boundary, less inside, more outside; smooth along a ray.
    pub fn level(&self, swing: [f64; 2]) -> f64 {
        match self {
            Self::Hinge { bend, give_rad } => {
                bend.level(swing[0]).max(swing[1].abs() / give_rad.max(NARROWEST_RAD))
            }
            Self::Cone { .. } | Self::Ellipse { .. } => {
                let length = swing[0].hypot(swing[1]);
                if length == 0.0 { 0.0 } else { length * self.steepness(swing, length) }
            }
        }
    }

    /// Whether a swing lies inside, a rounding error included.
    pub fn contains(&self, swing: [f64; 2]) -> bool {
        self.level(swing) <= 1.0 + ROUNDING
    }

    /// For people: 0 at rest, 1 at the limit, more beyond.
    pub fn use_of(&self, swing: [f64; 2]) -> f64 {
        match self {
            Self::Hinge { bend, give_rad } => {
                bend.use_of(swing[0]).max(swing[1].abs() / give_rad.max(NARROWEST_RAD))
            }
            Self::Cone { .. } | Self::Ellipse { .. } => self.level(swing),
        }
    }

    /// How far a swing lies outside, radians, along its own direction; 0 inside.
    pub fn beyond_rad(&self, swing: [f64; 2]) -> f64 {
        if self.contains(swing) {
            return 0.0;
        }
        let inside = self.hard(swing, ClampTo::SameDirection);
        (swing[0] - inside[0]).hypot(swing[1] - inside[1])
    }

    /// The swing brought to the boundary if it lies outside.
    pub fn hard(&self, swing: [f64; 2], to: ClampTo) -> [f64; 2] {
        if self.contains(swing) {
            return swing;
        }
        match (self, to) {
            (Self::Hinge { bend, give_rad }, _) => {
                [bend.hard(swing[0]), swing[1].clamp(-give_rad, *give_rad)]
            }
            (Self::Ellipse { sides_rad }, ClampTo::Nearest) => self.nearest(*sides_rad, swing),
            // On a cone both are the same.
            _ => scaled(swing, 1.0 / self.level(swing)),
        }
    }

    /// The swing itself inside `comfort`; beyond it bent smoothly so that it never passes the limit.
    ///
    /// A ray is bent as `k + (1 − k) tanh((u − k)/(1 − k))` from the share `k` of the limit at which comfort ends in its direction.
    /// `comfort` is to be of the same form; a hinge goes by its two angles.
    pub fn soft(&self, comfort: &Self, swing: [f64; 2]) -> [f64; 2] {
        if let (Self::Hinge { bend, give_rad }, Self::Hinge { bend: comfort, give_rad: inner }) =
            (self, comfort)
        {
            let give = Interval { lo_rad: -give_rad, hi_rad: *give_rad };
            let inner = Interval { lo_rad: -inner, hi_rad: *inner };
            return [bend.soft(*comfort, swing[0]), give.soft(inner, swing[1])];
        }
        let level = self.level(swing);
        let comfortable = comfort.level(swing);
        if comfortable <= 1.0 && level <= LARGEST_COMFORT {
            return swing;
        }
        // Where the ray leaves comfort, as a share of the way to the limit.
        let k = (level / comfortable.max(f64::MIN_POSITIVE)).min(LARGEST_COMFORT);
        if level <= k {
            return swing;
        }
        scaled(swing, (k + bent(level - k, 1.0 - k)) / level)
    }

    /// One over the boundary's distance in a direction; `length` is that of `swing`.
    fn steepness(&self, swing: [f64; 2], length: f64) -> f64 {
        match self {
            Self::Cone { half_rad } => 1.0 / half_rad.max(NARROWEST_RAD),
            Self::Ellipse { sides_rad } => {
                let along = [swing[0] / length, swing[1] / length];
                let square = |axis: usize| {
                    let [plus, minus] = [sides_rad[2 * axis], sides_rad[2 * axis + 1]]
                        .map(|side| side.max(NARROWEST_RAD).powi(-2));
                    minus + (plus - minus) * smooth_step(along[axis] / BLEND_SINE)
                };
                (along[0] * along[0] * square(0) + along[1] * along[1] * square(1)).sqrt()
            }
            Self::Hinge { .. } => self.level(swing) / length,
        }
    }

    /// The nearest point of the boundary to a point outside.
    fn nearest(&self, sides_rad: [f64; 4], point: [f64; 2]) -> [f64; 2] {
        let pick = |axis: usize| sides_rad[2 * axis + usize::from(point[axis] < 0.0)].max(NARROWEST_RAD);
        let first = nearest_on_ellipse([pick(0), pick(1)], point);
        let is_even = sides_rad[0] == sides_rad[1] && sides_rad[2] == sides_rad[3];
        let found = if is_even { first } else { self.nearest_by_search(sides_rad, point) };
        // On the boundary to the last digit, so that clamping again finds it inside.
        scaled(found, 1.0 / self.level(found))
    }

    /// Where two unlike sides blend there is no closed form: the best of many points of the boundary, then golden section about it.
    fn nearest_by_search(&self, sides_rad: [f64; 4], point: [f64; 2]) -> [f64; 2] {
        const GOLDEN: f64 = 0.618_033_988_749_894_9;
        const POINTS: usize = 360;
        // By the angle of the ellipse and not by direction, so that the points are as close at a narrow end as along the sides.
        let at = |angle: f64| {
            let (sin, cos) = angle.sin_cos();
            let side =
                |axis: usize, part: f64| sides_rad[2 * axis + usize::from(part < 0.0)].max(NARROWEST_RAD);
            let ray = [side(0, cos) * cos, side(1, sin) * sin];
            scaled(ray, 1.0 / self.level(ray))
        };
        let distance = |angle: f64| {
            let own = at(angle);
            (own[0] - point[0]).powi(2) + (own[1] - point[1]).powi(2)
        };
        let step = std::f64::consts::TAU / POINTS as f64;
        let angles = (0..POINTS).map(|i| i as f64 * step);
        let best = angles.min_by(|a, b| distance(*a).total_cmp(&distance(*b))).unwrap_or(0.0);
        let (mut lo, mut hi) = (best - step, best + step);
        for _ in 0..44 {
            let (a, b) = (hi - GOLDEN * (hi - lo), lo + GOLDEN * (hi - lo));
            if distance(a) < distance(b) {
                hi = b;
            } else {
                lo = a;
            }
        }
        at(0.5 * (lo + hi))
    }
}

fn scaled(swing: [f64; 2], factor: f64) -> [f64; 2] {
    [swing[0] * factor, swing[1] * factor]
}

/// From 0 at −1 to 1 at 1, with two derivatives of 0 at both ends.
#[expect(clippy::inline_always, reason = "a call would keep the loop around it from being widened")]
#[inline(always)]
pub(super) fn smooth_step(x: f64) -> f64 {
    let t = (0.5 * (x + 1.0)).clamp(0.0, 1.0);
    t * t * t * (t * (6.0 * t - 15.0) + 10.0)
}

/// The nearest point on `(x/a)² + (y/b)² = 1` to a point outside: `x' = a² x/(a² + t)` with the `t ≥ 0` that puts it there.
fn nearest_on_ellipse([a, b]: [f64; 2], point: [f64; 2]) -> [f64; 2] {
    let (a2, b2) = (a * a, b * b);
    let at = |t: f64| [a2 * point[0] / (a2 + t), b2 * point[1] / (b2 + t)];
    let miss = |t: f64| {
        let [x, y] = at(t);
        (x / a).powi(2) + (y / b).powi(2) - 1.0
    };
    // The miss falls from above 0 to −1; at the upper end the point is within the smaller circle.
    let (mut lo, mut hi) = (0.0, a.max(b) * point[0].hypot(point[1]) + a2.max(b2));
    for _ in 0..200 {
        let middle = 0.5 * (lo + hi);
        if miss(middle) > 0.0 {
            lo = middle;
        } else {
            hi = middle;
        }
        if hi - lo <= f64::EPSILON * hi {
            break;
        }
    }
    at(0.5 * (lo + hi))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn degrees(sides: [f64; 4]) -> SwingLimit {
        SwingLimit::Ellipse { sides_rad: sides.map(f64::to_radians) }
    }

    #[test]
    fn the_clamps_are_the_worked_example() {
        // reference/method_checks.json `ellipse_clamp`.
        let limit = degrees([90.0, 90.0, 40.0, 40.0]);
        let point = [80.0_f64, 50.0].map(f64::to_radians);
        let radial = limit.hard(point, ClampTo::SameDirection).map(f64::to_degrees);
        let nearest = limit.hard(point, ClampTo::Nearest).map(f64::to_degrees);
        assert!((limit.level(point).powi(2) - 2.352_623_456_790_12).abs() < 1e-12);
        assert!((radial[0] - 52.157_140_772_4).abs() < 1e-8 && (radial[1] - 32.598_212_982_75).abs() < 1e-8);
        assert!((nearest[0] - 67.881_765_854_032).abs() < 1e-8);
        assert!((nearest[1] - 26.263_868_489_942).abs() < 1e-8);
    }

    #[test]
    fn the_soft_clamp_is_the_worked_example() {
        // reference/method_checks.json `soft_clamp_tanh`: k = 0.8.
        let limit = SwingLimit::Cone { half_rad: 1.0 };
        let comfort = SwingLimit::Cone { half_rad: 0.8 };
        for (u, expected) in [
            (0.5, 0.5),
            (0.8, 0.8),
            (0.9, 0.892_423_431_452_002),
            (1.0, 0.952_318_831_191_153),
            (1.2, 0.992_805_516_015_163),
            (2.0, 0.999_997_542_330_159),
        ] {
            let soft = limit.soft(&comfort, [0.6 * u, 0.8 * u]);
            assert!((soft[0].hypot(soft[1]) - expected).abs() < 1e-14, "{u}: {soft:?}");
        }
    }

    #[test]
    fn the_nearest_point_is_nearest_where_unlike_sides_meet() {
        let limit = degrees([150.0, 30.0, 20.0, 80.0]);
        for i in 0..720 {
            let direction = f64::from(i) * 0.5_f64.to_radians();
            let boundary = scaled(
                [direction.cos(), direction.sin()],
                1.0 / limit.level([direction.cos(), direction.sin()]),
            );
            for out in [1.02, 1.5] {
                let point = scaled(boundary, out);
                let found = limit.hard(point, ClampTo::Nearest);
                let reached = (found[0] - point[0]).hypot(found[1] - point[1]);
                let least = (0..7200)
                    .map(|j| {
                        let direction = f64::from(j) * 0.05_f64.to_radians();
                        let ray = [direction.cos(), direction.sin()];
                        let own = scaled(ray, 1.0 / limit.level(ray));
                        (own[0] - point[0]).hypot(own[1] - point[1])
                    })
                    .fold(f64::INFINITY, f64::min);
                assert!(reached <= least + 1e-6, "{direction} {out}: {reached} for {least}");
                assert_eq!(limit.hard(found, ClampTo::Nearest), found);
            }
        }
    }
}

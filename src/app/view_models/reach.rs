//! The limit of the chosen joint as it lies in space, and how much of it the pose uses, in words.

use std::f64::consts::{PI, TAU};

use glam::DVec3;

use crate::limit::{JointLimit, SwingLimit};
use crate::rotor::Rotor;

use super::words::degrees;

/// A joint's limit in a pose.
#[derive(Clone, Debug, PartialEq)]
pub struct ReachOf {
    /// The rim of the directions that the limb may take, world, at the limb's length; empty where the swing is free.
    pub rim: Vec<DVec3>,
    /// The limb's direction now, world, at the same length.
    pub now: DVec3,
    /// Whether the pose is beyond the limit.
    pub is_beyond: bool,
    /// How much of the limit is used, for people.
    pub words: String,
}

/// Points of the rim.
const POINTS: usize = 72;
/// A swing this wide is as good as free, and a cone for it would lie inside out around the limb.
const WIDEST_RAD: f64 = 2.97;

/// The limit of a joint that turns by `local` relative to a parent that turns by `above` in the scene. `apex` is the joint,
/// `length` the limb's; `name` stands in the words.
pub fn reach_of(
    limit: &JointLimit,
    local: Rotor,
    above: Rotor,
    apex: DVec3,
    length: f64,
    name: &str,
) -> ReachOf {
    let reading = limit.read(local, None);
    let along = |turn: Rotor| apex + (above * turn).apply(limit.twist_axis) * length;
    let rim = boundary(&limit.limit.swing).into_iter().map(|swing| along(limit.local(swing, 0.0))).collect();
    let is_beyond = !limit.limit.contains(&reading);
    let swing = degrees(reading.swing[0].hypot(reading.swing[1]).to_degrees());
    let twist = degrees(reading.twist_rad.to_degrees());
    let words = if is_beyond {
        let beyond = degrees(limit.limit.beyond_rad(&reading).to_degrees());
        format!("{name}: {beyond} beyond its limit, swing {swing}, twist {twist}")
    } else {
        let share = 100.0 * limit.limit.use_of(&reading);
        format!("{name}: {share:.0} % of its limit, swing {swing}, twist {twist}")
    };
    ReachOf { rim, now: along(local), is_beyond, words }
}

/// Swings on the boundary of a limit, in order around it; none where it is free.
fn boundary(swing: &SwingLimit) -> Vec<[f64; 2]> {
    if let SwingLimit::Hinge { bend, give_rad } = swing {
        if bend.is_free() || bend.hi_rad - bend.lo_rad > TAU - 0.1 {
            return Vec::new();
        }
        let give = give_rad.max(0.02);
        let half = POINTS / 2;
        let at = |i: usize| bend.lo_rad + (bend.hi_rad - bend.lo_rad) * i as f64 / (half - 1) as f64;
        let there = (0..half).map(|i| [at(i), give]);
        let back = (0..half).rev().map(|i| [at(i), -give]);
        return there.chain(back).collect();
    }
    let points: Vec<[f64; 2]> = (0..POINTS)
        .map(|i| {
            let (sin, cos) = (TAU * i as f64 / POINTS as f64).sin_cos();
            let far = (1.0 / swing.level([cos, sin])).min(PI);
            [cos * far, sin * far]
        })
        .collect();
    let narrowest = points.iter().map(|point| point[0].hypot(point[1])).fold(f64::INFINITY, f64::min);
    if narrowest > WIDEST_RAD { Vec::new() } else { points }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::limit::{Interval, Range};
    use crate::rotor::Axis;

    fn limit(swing: SwingLimit) -> JointLimit {
        let range = Range { swing, twist: Interval { lo_rad: -1.0, hi_rad: 1.0 } };
        JointLimit::new(Rotor::IDENTITY, DVec3::Y, DVec3::X, range)
    }

    #[test]
    fn the_rim_of_a_cone_is_as_far_from_its_axis_as_the_limit_says() {
        let cone = limit(SwingLimit::Cone { half_rad: 0.5 });
        let above = Axis::Z.rotor(0.3);
        let seen = reach_of(&cone, Rotor::IDENTITY, above, DVec3::ONE, 2.0, "arm");
        let axis = above.apply(DVec3::Y);
        for point in &seen.rim {
            let from_apex = *point - DVec3::ONE;
            assert!((from_apex.length() - 2.0).abs() < 1e-12);
            assert!((from_apex.angle_between(axis) - 0.5).abs() < 1e-9);
        }
        assert!((seen.now - DVec3::ONE - axis * 2.0).length() < 1e-12);
        assert_eq!(
            (seen.is_beyond, seen.words.as_str()),
            (false, "arm: 0 % of its limit, swing 0°, twist 0°")
        );
    }

    #[test]
    fn the_words_say_how_far_beyond_and_by_what() {
        let sides_rad = [0.4, 0.2, 0.6, 0.6];
        let ellipse = limit(SwingLimit::Ellipse { sides_rad });
        // A bend of 40° about x against a side of 0.4 rad (22.92°): 17.08° too much.
        let seen =
            reach_of(&ellipse, Axis::X.rotor(40_f64.to_radians()), Rotor::IDENTITY, DVec3::ZERO, 1.0, "arm");
        assert!(seen.is_beyond);
        assert_eq!(seen.words, "arm: 17.1° beyond its limit, swing 40.0°, twist 0°");
        // Forwards the rim is at 0.4, backwards at 0.2.
        let highest = |sign: f64| {
            let tilt = |p: &&DVec3| (p.z * sign).atan2(p.y);
            seen.rim.iter().filter(|p| p.x.abs() < 1e-9).map(|p| tilt(&p)).fold(f64::NEG_INFINITY, f64::max)
        };
        assert!((highest(1.0) - 0.4).abs() < 1e-9 && (highest(-1.0) - 0.2).abs() < 1e-9);
    }

    #[test]
    fn a_free_swing_has_no_rim_and_a_hinge_a_narrow_band() {
        assert!(boundary(&SwingLimit::FREE).is_empty());
        let hinge = SwingLimit::Hinge { bend: Interval { lo_rad: 0.1, hi_rad: 2.0 }, give_rad: 0.05 };
        let rim = boundary(&hinge);
        assert_eq!((rim[0], rim[POINTS / 2 - 1]), ([0.1, 0.05], [2.0, 0.05]));
        assert!(rim.iter().all(|swing| hinge.contains(*swing)));
    }
}

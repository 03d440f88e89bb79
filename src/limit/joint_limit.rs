//! The limit of one joint: where it is measured from, and how far it may tilt and twist.

use glam::DVec3;

use crate::rotor::{Bivector, Rotor, SwingTwist};

use super::interval::Interval;
use super::swing::{ClampTo, SwingLimit};

/// How far a joint may tilt and twist.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Range {
    /// The tilt of the twist axis.
    pub swing: SwingLimit,
    /// The turn about the twist axis, right-handed.
    pub twist: Interval,
}

/// The limit of one joint, in three bands one inside the other.
///
/// A turn `local` of the joint relative to its parent is measured as `zero⁻¹ · local = swing · twist`: the twist comes first, about
/// `twist_axis`, then the swing about an axis square to it. Axes are in the joint's own frame.
///
/// Source: Grassia 1998; Baerlocher & Boulic 2001.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct JointLimit {
    /// The local turn at which swing and twist are 0.
    pub zero: Rotor,
    /// The limb's own direction; unit.
    pub twist_axis: DVec3,
    /// The axis about which the first swing angle turns; unit, square to the twist axis.
    pub bend_axis: DVec3,
    /// Inside this a soft clamp changes nothing.
    pub comfort: Range,
    /// A clamp stays inside this.
    pub limit: Range,
    /// Beyond this a pose is told as past its limit. The limit itself, unless measured spread asks for more.
    pub fault: Range,
    /// How sure zero and axes are, 0 to 1; 1 where they were stated.
    pub confidence: f64,
}

/// A local turn as its limit sees it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reading {
    /// Swing about the bend axis and about the side axis, radians.
    pub swing: [f64; 2],
    /// Twist, radians; counted on from the reading before while outside the range.
    pub twist_rad: f64,
    /// The swing is so near half a turn that the twist is noise; that of the reading before is held.
    pub is_twist_held: bool,
}

/// A clamp.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Clamp {
    /// Not beyond the limit; makes a corner in the curve where it sets in.
    Hard(ClampTo),
    /// Bends from comfort on, so that smooth curves stay smooth.
    Soft,
}

/// A comfort that nobody stated is this share of the limit.
pub const USUAL_COMFORT: f64 = 0.8;

/// Below this cosine of half the swing (a swing above 177.7°) the twist is noise and is held.
pub(super) const HELD_BELOW: f64 = 0.02;

impl Range {
    /// No limit at all.
    pub const FREE: Self = Self { swing: SwingLimit::FREE, twist: Interval::FREE };

    /// The same range scaled about rest; an interval that has no 0 in it about its middle.
    #[must_use]
    pub fn scaled(&self, factor: f64) -> Self {
        let about_rest = |range: Interval| {
            if range.is_free() {
                return range;
            }
            let rest = if range.lo_rad <= 0.0 && range.hi_rad >= 0.0 { 0.0 } else { range.mid_rad() };
            let scaled = |end: f64| rest + (end - rest) * factor;
            Interval { lo_rad: scaled(range.lo_rad), hi_rad: scaled(range.hi_rad) }
        };
        let swing = match self.swing {
            SwingLimit::Cone { half_rad } => SwingLimit::Cone { half_rad: half_rad * factor },
            SwingLimit::Ellipse { sides_rad } => {
                SwingLimit::Ellipse { sides_rad: sides_rad.map(|side| side * factor) }
            }
            SwingLimit::Hinge { bend, give_rad } => {
                SwingLimit::Hinge { bend: about_rest(bend), give_rad: give_rad * factor }
            }
        };
        Self { swing, twist: about_rest(self.twist) }
    }

    /// Whether a reading lies inside, a rounding error included.
    pub fn contains(&self, reading: &Reading) -> bool {
        self.swing.contains(reading.swing) && self.twist.contains(reading.twist_rad)
    }

    /// How far a reading lies outside, radians: the larger of tilt and twist; 0 inside.
    pub fn beyond_rad(&self, reading: &Reading) -> f64 {
        self.swing.beyond_rad(reading.swing).max(self.twist.beyond_rad(reading.twist_rad))
    }

    /// For people: 0 at rest, 1 at the limit, more beyond.
    pub fn use_of(&self, reading: &Reading) -> f64 {
        self.swing.use_of(reading.swing).max(self.twist.use_of(reading.twist_rad))
    }
}

impl JointLimit {
    /// A limit of one range, measured from `zero`; comfort is its middle [`USUAL_COMFORT`]. The axes are made unit and square.
    pub fn new(zero: Rotor, twist_axis: DVec3, bend_axis: DVec3, limit: Range) -> Self {
        let (twist_axis, bend_axis) = squared(twist_axis, bend_axis);
        Self {
            zero,
            twist_axis,
            bend_axis,
            comfort: limit.scaled(USUAL_COMFORT),
            limit,
            fault: limit,
            confidence: 1.0,
        }
    }

    /// The axis about which the second swing angle turns.
    pub fn side_axis(&self) -> DVec3 {
        self.twist_axis.cross(self.bend_axis)
    }

    /// Reads a unit local turn. `before` is the reading of the frame before, from which a twist outside its range is counted on
    /// and a twist that can't be told is held.
    pub fn read(&self, local: Rotor, before: Option<&Reading>) -> Reading {
        let turn = self.zero.reverse() * local;
        let split = SwingTwist::new(turn, self.twist_axis);
        let is_twist_held = split.certainty < HELD_BELOW;
        let (swing, twist_rad) = if is_twist_held {
            let held = before.map_or(self.limit.twist.mid_rad(), |before| before.twist_rad);
            let twist = Rotor::from_plane_angles(Bivector::from_axis(self.twist_axis) * held);
            (turn * twist.reverse(), held)
        } else {
            (split.swing, split.twist_rad)
        };
        let axis = swing.plane_angles().axis();
        let near = [axis.dot(self.bend_axis), axis.dot(self.side_axis())];
        Reading {
            swing: self.shorter_or_nearer(near, before),
            twist_rad: self.counted_on(twist_rad, before),
            is_twist_held,
        }
    }

    /// A swing of 170° backwards is one of 190° forwards: which is meant, the range tells, and outside it the frame before.
    fn shorter_or_nearer(&self, near: [f64; 2], before: Option<&Reading>) -> [f64; 2] {
        let length = near[0].hypot(near[1]);
        if length < 0.5 * std::f64::consts::PI {
            return near;
        }
        let factor = 1.0 - std::f64::consts::TAU / length;
        let far = [near[0] * factor, near[1] * factor];
        let widest = &self.fault.swing;
        let (near_level, far_level) = (widest.level(near), widest.level(far));
        let best = if far_level < near_level { far } else { near };
        match before {
            Some(before) if near_level.min(far_level) > 1.0 => {
                let away = |swing: [f64; 2]| (swing[0] - before.swing[0]).hypot(swing[1] - before.swing[1]);
                if away(far) < away(near) { far } else { near }
            }
            _ => best,
        }
    }

    fn counted_on(&self, twist_rad: f64, before: Option<&Reading>) -> f64 {
        let own = Interval::nearest_round(twist_rad, self.fault.twist.mid_rad());
        match before {
            Some(before) if !self.fault.twist.contains(own) => Interval::nearest_round(own, before.twist_rad),
            _ => own,
        }
    }

    /// The unit local turn of a swing and a twist in radians.
    pub fn local(&self, swing: [f64; 2], twist_rad: f64) -> Rotor {
        let tilt = self.bend_axis * swing[0] + self.side_axis() * swing[1];
        let swing = Rotor::from_plane_angles(Bivector::from_axis(tilt));
        let twist = Rotor::from_plane_angles(Bivector::from_axis(self.twist_axis * twist_rad));
        (self.zero * swing * twist).normalize()
    }

    /// The clamped turn for a reading; `None` where the clamp changes nothing.
    pub fn clamped(&self, reading: &Reading, clamp: Clamp) -> Option<Rotor> {
        let (swing, twist_rad) = match clamp {
            Clamp::Hard(to) => {
                let twist = self.limit.twist;
                let own = reading.twist_rad;
                let twist_rad = if twist.contains(own) { own } else { twist.hard(own) };
                (self.limit.swing.hard(reading.swing, to), twist_rad)
            }
            Clamp::Soft => (
                self.limit.swing.soft(&self.comfort.swing, reading.swing),
                self.limit.twist.soft(self.comfort.twist, reading.twist_rad),
            ),
        };
        #[expect(clippy::float_cmp, reason = "asked is whether any bit was changed")]
        let is_same = swing == reading.swing && twist_rad == reading.twist_rad;
        (!is_same).then(|| self.local(swing, twist_rad))
    }
}

/// Both unit, the second square to the first; where they are alike or zero, any square axis serves.
fn squared(twist_axis: DVec3, bend_axis: DVec3) -> (DVec3, DVec3) {
    let twist_axis = twist_axis.try_normalize().unwrap_or(DVec3::Y);
    let square = bend_axis - twist_axis * bend_axis.dot(twist_axis);
    let bend_axis =
        if square.length() > 1e-6 { square.normalize() } else { twist_axis.any_orthonormal_vector() };
    (twist_axis, bend_axis)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::rotor::Axis;

    fn shoulder() -> JointLimit {
        let limit = Range {
            swing: SwingLimit::Ellipse { sides_rad: [217.0, 89.0, 193.0, 66.0].map(f64::to_radians) },
            twist: Interval::from_degrees(-90.0, 60.0),
        };
        JointLimit::new(Rotor::IDENTITY, DVec3::NEG_Y, DVec3::NEG_X, limit)
    }

    #[test]
    fn a_turn_is_read_as_the_worked_example() {
        // reference/method_checks.json `swing_twist`: swing 61.93°, twist 44.60° about y.
        let limit = JointLimit::new(Rotor::IDENTITY, DVec3::Y, DVec3::X, Range::FREE);
        let swing =
            Rotor::from_xyzw([0.335_748_626_263_607, 0.0, 0.389_846_564_502_058, 0.857_491_991_862_34]);
        let twist = Rotor::from_xyzw([0.0, 0.379_474_880_440_335, 0.0, 0.925_202_040_159_226]);
        let reading = limit.read(swing * twist, None);
        assert!((reading.twist_rad.to_degrees() - 44.602_318_682_212_9).abs() < 1e-11);
        let tilt = reading.swing[0].hypot(reading.swing[1]).to_degrees();
        assert!((tilt - 61.927_721_056_512).abs() < 1e-11);
        assert!(limit.local(reading.swing, reading.twist_rad).turn_to(swing * twist) < 1e-14);
    }

    #[test]
    fn an_arm_past_straight_up_is_read_the_way_it_came() {
        let limit = shoulder();
        for degrees in [170.0_f64, 185.0, 200.0] {
            let reading = limit.read(Axis::X.rotor(-degrees.to_radians()), None);
            assert!((reading.swing[0].to_degrees() - degrees).abs() < 1e-9, "{degrees}: {reading:?}");
            assert!(limit.limit.contains(&reading));
        }
    }

    #[test]
    fn near_half_a_turn_of_swing_the_twist_before_is_held() {
        let limit = shoulder();
        let twist = Axis::Y.rotor(-0.3);
        let before = limit.read(Axis::X.rotor(-170.0_f64.to_radians()) * twist, None);
        assert!((before.twist_rad - 0.3).abs() < 1e-9);
        let up = limit.read(Axis::X.rotor(-179.0_f64.to_radians()) * Axis::Y.rotor(-2.0), Some(&before));
        assert!(up.is_twist_held && (up.twist_rad - before.twist_rad).abs() < 1e-15);
    }

    #[test]
    fn a_twist_outside_is_counted_on_and_comes_back_to_its_round() {
        let limit = shoulder();
        let mut before = None;
        let mut largest: f64 = 0.0;
        for degrees in (0..=260).chain((0..=260).rev()) {
            let reading = limit.read(Axis::Y.rotor(-f64::from(degrees).to_radians()), before.as_ref());
            largest = largest.max(reading.twist_rad.to_degrees());
            before = Some(reading);
        }
        assert!((largest - 260.0).abs() < 1e-9, "{largest}");
        assert!(before.unwrap().twist_rad.abs() < 1e-12);
    }
}

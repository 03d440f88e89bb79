//! A range of one angle, its hard clamp and its soft one.

/// From `lo_rad` to `hi_rad`, radians. May lie on one side of 0; an interval of a whole turn or more sets no limit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Interval {
    /// Lower end, radians.
    pub lo_rad: f64,
    /// Upper end, radians; not below the lower one.
    pub hi_rad: f64,
}

/// So far beyond an end, as a share of half the range, still counts as at it: rounding.
pub(super) const ROUNDING: f64 = 1e-9;

impl Interval {
    /// No limit at all.
    pub const FREE: Self = Self { lo_rad: -std::f64::consts::PI, hi_rad: std::f64::consts::PI };

    /// From ends in degrees.
    pub const fn from_degrees(lo: f64, hi: f64) -> Self {
        Self { lo_rad: lo.to_radians(), hi_rad: hi.to_radians() }
    }

    /// The ends in degrees.
    pub fn to_degrees(self) -> [f64; 2] {
        [self.lo_rad.to_degrees(), self.hi_rad.to_degrees()]
    }

    /// The middle, radians.
    pub fn mid_rad(self) -> f64 {
        0.5 * (self.lo_rad + self.hi_rad)
    }

    /// Half the width, radians.
    pub fn half_rad(self) -> f64 {
        0.5 * (self.hi_rad - self.lo_rad)
    }

    /// Whether every angle lies inside, since turns repeat.
    pub fn is_free(self) -> bool {
        self.half_rad() >= std::f64::consts::PI - 1e-12
    }

    /// How far from the middle, in half widths: 1 at the ends. The test of the limit, but for rounding.
    pub fn level(self, angle_rad: f64) -> f64 {
        if self.is_free() {
            return 0.0;
        }
        (angle_rad - self.mid_rad()).abs() / self.half_rad().max(NARROWEST_RAD)
    }

    /// Whether an angle lies inside, a rounding error included.
    pub fn contains(self, angle_rad: f64) -> bool {
        self.level(angle_rad) <= 1.0 + ROUNDING
    }

    /// How far an angle lies outside, radians; 0 inside.
    pub fn beyond_rad(self, angle_rad: f64) -> f64 {
        if self.contains(angle_rad) { 0.0 } else { (angle_rad - self.hard(angle_rad)).abs() }
    }

    /// For people: 0 at angle 0, 1 at the end on that side, more beyond. Where 0 is no part of the range it is counted from the
    /// middle.
    pub fn use_of(self, angle_rad: f64) -> f64 {
        if self.is_free() {
            return 0.0;
        }
        let beyond = self.beyond_rad(angle_rad);
        if beyond > 0.0 {
            return 1.0 + beyond / self.half_rad().max(NARROWEST_RAD);
        }
        if self.lo_rad > 0.0 || self.hi_rad < 0.0 {
            return self.level(angle_rad).min(1.0);
        }
        let end = if angle_rad >= 0.0 { self.hi_rad } else { self.lo_rad };
        // At an end that is 0 itself the joint is at rest, not at its limit.
        if end.abs() < NARROWEST_RAD { 0.0 } else { (angle_rad / end).min(1.0) }
    }

    /// The nearest angle inside.
    pub fn hard(self, angle_rad: f64) -> f64 {
        if self.is_free() { angle_rad } else { angle_rad.clamp(self.lo_rad, self.hi_rad) }
    }

    /// The angle itself inside `comfort`; beyond it bent smoothly so that it never passes an end of this range.
    ///
    /// `c + (e − c) tanh((a − c)/(e − c))` between the comfortable angle `c` and the end `e`: slope 1 and no curvature at `c`, so a curve
    /// with a continuous second derivative keeps one (methods after Grassia 1998).
    pub fn soft(self, comfort: Self, angle_rad: f64) -> f64 {
        if self.is_free() {
            return angle_rad;
        }
        let inner_hi = comfort.hi_rad.min(self.hi_rad);
        let inner_lo = comfort.lo_rad.max(self.lo_rad).min(inner_hi);
        if angle_rad > inner_hi {
            inner_hi + bent(angle_rad - inner_hi, self.hi_rad - inner_hi)
        } else if angle_rad < inner_lo {
            inner_lo - bent(inner_lo - angle_rad, inner_lo - self.lo_rad)
        } else {
            angle_rad
        }
    }

    /// The turn of `angle_rad` by whole rounds that lies nearest to `to_rad`.
    pub(super) fn nearest_round(angle_rad: f64, to_rad: f64) -> f64 {
        angle_rad - std::f64::consts::TAU * ((angle_rad - to_rad) / std::f64::consts::TAU).round()
    }
}

/// Narrower ranges count as this wide where they are divided by, radians.
pub(super) const NARROWEST_RAD: f64 = 1e-4;

/// `past` bent to stay below `room`.
pub(super) fn bent(past: f64, room: f64) -> f64 {
    if room <= 0.0 { 0.0 } else { room * (past / room).tanh() }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_soft_clamp_is_the_worked_example() {
        // reference/method_checks.json `soft_clamp_tanh`: k = 0.8, range −20 to 60, angle 75.
        let range = Interval::from_degrees(-20.0, 60.0);
        let comfort = Interval::from_degrees(-12.0, 52.0);
        let soft = range.soft(comfort, 75.0_f64.to_radians()).to_degrees();
        assert!((soft - 59.949_237_074_520_2).abs() < 1e-12, "{soft}");
        assert_eq!(range.soft(comfort, 0.9), 0.9);
    }

    #[test]
    fn use_is_counted_from_rest() {
        let knee = Interval::from_degrees(0.0, 140.0);
        assert_eq!(knee.use_of(0.0), 0.0);
        assert!((knee.use_of(70.0_f64.to_radians()) - 0.5).abs() < 1e-12);
        assert!(knee.use_of(-0.1) > 1.0 && knee.use_of(2.6) > 1.0);
        let away = Interval::from_degrees(10.0, 30.0);
        assert_eq!(away.use_of(20.0_f64.to_radians()), 0.0);
        assert_eq!(Interval::FREE.use_of(3.0), 0.0);
    }
}

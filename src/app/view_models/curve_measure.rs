//! How one view reads a joint's turn as numbers, and what turn a changed number means.

use glam::DVec3;

use crate::clip::{Clip, FileAngles, Stored};
use crate::limit::JointLimit;
use crate::rotor::{Bivector, Rotor, SwingTwist};

use super::curves::CurveView;
use super::sampled::limb_direction;

/// How a joint is measured in a view.
#[derive(Clone, Debug, PartialEq)]
pub struct Measure {
    /// Which view.
    pub view: CurveView,
    /// Where swing and twist are 0.
    pub zero: Rotor,
    /// The twist is about it.
    pub axis: DVec3,
    /// The limit that swing and twist are held against.
    pub limit: Option<JointLimit>,
    form: Form,
}

/// What the file stores for a key.
#[derive(Clone, Debug, PartialEq)]
enum Form {
    Rotors,
    PlaneAngles,
    Angles(FileAngles),
}

/// A shown number may be rounded and lie between two samples; farther off it belongs to another clip.
const NEAR_RAD: f64 = 2e-2;

impl Measure {
    /// Of a joint: from its chosen rest pose and about its limb, or as its limit measures it.
    pub fn new(clip: &Clip, joint: usize, view: CurveView, limit: Option<JointLimit>) -> Self {
        let form = match clip.rotation(joint).map(|track| &track.stored) {
            Some(Stored::Angles(angles)) => {
                // The rule alone is needed, not the rows.
                Form::Angles(FileAngles { degrees: [].into(), ..angles.clone() })
            }
            Some(Stored::PlaneAngles(_)) => Form::PlaneAngles,
            Some(Stored::Rotors) | None => Form::Rotors,
        };
        let (zero, axis) = match &limit {
            Some(limit) => (limit.zero, limit.twist_axis),
            None => (clip.skeleton.chosen_rest(joint).rotation, limb_direction(clip, joint)),
        };
        Self { view, zero, axis, limit, form }
    }

    /// Swing and twist of a turn.
    pub fn split(&self, rotor: Rotor) -> SwingTwist {
        SwingTwist::new(self.zero.reverse() * rotor, self.axis)
    }

    /// The most that the limb may tilt in the direction it tilts to now, in radians.
    pub fn most_swing_rad(&self, split: &SwingTwist) -> Option<f64> {
        let limit = self.limit.as_ref()?;
        let tilt = split.swing.plane_angles().axis();
        let swing = [tilt.dot(limit.bend_axis), tilt.dot(limit.side_axis())];
        let (length, level) = (swing[0].hypot(swing[1]), limit.limit.swing.level(swing));
        let most = if level > 1e-9 { length / level } else { std::f64::consts::PI };
        Some(most.min(std::f64::consts::PI))
    }

    /// The turn that three numbers of the view mean, in degrees. `None` where the view's numbers are no such triple.
    pub fn turn_of(&self, degrees: [f64; 3]) -> Option<Rotor> {
        match (self.view, &self.form) {
            (CurveView::PlaneAngles, _) | (CurveView::FileNumbers, Form::PlaneAngles) => {
                Some(Rotor::from_plane_angles(Bivector::from_degrees(degrees)))
            }
            (CurveView::FileNumbers, Form::Angles(angles)) => Some(angles.rotor(degrees)),
            (CurveView::FileNumbers, Form::Rotors) | (CurveView::SwingTwist | CurveView::TurnRate, _) => None,
        }
    }

    /// The turn that comes of moving one number of the view by so many degrees, with its other numbers left alone. `shown` are
    /// the numbers on screen, which may tell of whole turns that the rotor does not know. `None` where the number can't be
    /// moved alone.
    pub fn moved(&self, now: Rotor, shown: Option<[f64; 3]>, line: usize, by_deg: f64) -> Option<Rotor> {
        let plane_angles = || {
            let own = || now.plane_angles().to_degrees();
            let fits = |degrees: &[f64; 3]| {
                let meant = Rotor::from_plane_angles(Bivector::from_degrees(*degrees));
                degrees.iter().all(|number| number.is_finite()) && meant.turn_to(now) < NEAR_RAD
            };
            let mut degrees = shown.filter(fits).unwrap_or_else(own);
            *degrees.get_mut(line)? += by_deg;
            Some(Rotor::from_plane_angles(Bivector::from_degrees(degrees)))
        };
        match (self.view, &self.form) {
            (CurveView::PlaneAngles, _) | (CurveView::FileNumbers, Form::PlaneAngles) => plane_angles(),
            (CurveView::FileNumbers, Form::Angles(angles)) => {
                let own = || {
                    let radians = angles.order.from_rotor(now, 0.0);
                    let near = shown.map_or(radians, |shown| {
                        angles.order.nearest_equal(radians, shown.map(f64::to_radians))
                    });
                    near.map(f64::to_degrees)
                };
                let fits = |degrees: &[f64; 3]| angles.rotor(*degrees).turn_to(now) < NEAR_RAD;
                let mut degrees = shown.filter(fits).unwrap_or_else(own);
                *degrees.get_mut(line)? += by_deg;
                Some(angles.rotor(degrees))
            }
            (CurveView::SwingTwist, _) => {
                let split = self.split(now);
                let by_rad = by_deg.to_radians();
                let twist = |rad: f64| Rotor::from_plane_angles(Bivector::from_axis(self.axis) * rad);
                match line {
                    0 => {
                        let tilt = split.swing.plane_angles();
                        let length = (tilt.length() + by_rad).clamp(0.0, std::f64::consts::PI);
                        let plane = if tilt.length() > 1e-6 {
                            tilt.normalize_or_zero()
                        } else {
                            // Straight limbs tilt about any axis square to them: the limit's own, or one that is as good.
                            let square = self.axis.any_orthonormal_vector();
                            Bivector::from_axis(self.limit.as_ref().map_or(square, |limit| limit.bend_axis))
                        };
                        Some(self.zero * Rotor::from_plane_angles(plane * length) * split.twist)
                    }
                    1 => Some(self.zero * split.swing * twist(split.twist_rad + by_rad)),
                    _ => None,
                }
            }
            (CurveView::FileNumbers, Form::Rotors) | (CurveView::TurnRate, _) => None,
        }
    }

    /// Whether numbers of this view can be moved alone.
    pub fn can_move(&self) -> bool {
        match self.view {
            CurveView::PlaneAngles | CurveView::SwingTwist => true,
            CurveView::FileNumbers => !matches!(self.form, Form::Rotors),
            CurveView::TurnRate => false,
        }
    }
}

//! Which way a figure faces, and which of its sides is left.

use glam::DVec3;

use super::body::Plan;
use super::find::Finder;
use super::pairs::Pair;
use super::role::Side;

impl Finder<'_, '_> {
    /// Forward, left, and how sure that is.
    pub(super) fn facing(&mut self, plan: &Plan) {
        let up = plan.up;
        let flat = |v: DVec3| v - up * v.dot(up);
        let across = flat(plan.across).normalize_or(DVec3::X);
        let size = self.shape.height.max(f64::MIN_POSITIVE);
        let mut toes = DVec3::ZERO;
        let mut knees = DVec3::ZERO;
        if let Some(legs) = &plan.legs {
            for (chain, reading) in legs.chains.iter().zip(&legs.readings) {
                let [upper, lower, foot, _] = reading.places.map(|place| place.map(|place| chain[place]));
                if let Some(foot) = foot {
                    toes += flat(self.figure.far[foot] - self.figure.position[foot]);
                }
                if let (Some(upper), Some(lower), Some(foot)) = (upper, lower, foot) {
                    let at = |joint: usize| self.figure.position[joint];
                    let axis = (at(foot) - at(upper)).normalize_or_zero();
                    let off = at(lower) - at(upper);
                    knees += flat(off - axis * off.dot(axis));
                }
            }
        }
        let mut elbows = DVec3::ZERO;
        if let Some(arms) = &plan.arms {
            for (chain, reading) in arms.chains.iter().zip(&arms.readings) {
                if let [_, Some(upper), Some(lower), Some(hand)] =
                    reading.places.map(|place| place.map(|place| chain[place]))
                {
                    let at = |joint: usize| self.figure.position[joint];
                    let axis = (at(hand) - at(upper)).normalize_or_zero();
                    let off = at(lower) - at(upper);
                    elbows += flat(off - axis * off.dot(axis));
                }
            }
        }
        let along = |v: DVec3| v - across * v.dot(across);
        let [toes, knees, elbows] = [toes, knees, elbows].map(along);
        let lying = plan.front_legs.as_ref().zip(plan.legs.as_ref()).map(|(front, rear)| {
            along(flat(self.figure.position[front.pair.on] - self.figure.position[rear.pair.on]))
        });
        let seen = if let Some(lying) = lying.filter(|lying| lying.length() > 0.1 * size) {
            Some((lying, 0.95))
        } else if toes.length() > 0.03 * size {
            Some((toes, 0.9))
        } else if knees.length() > 0.012 * size {
            Some((knees, 0.6))
        } else if elbows.length() > 0.012 * size {
            Some((-elbows, 0.5))
        } else {
            None
        };
        let (mut forward, mut certainty) = if let Some((forward, certainty)) = seen {
            (forward.normalize(), certainty)
        } else {
            // The formats say that +z is the front.
            let guess = across.cross(up);
            let front = self.figure.frame.apply(DVec3::Z).dot(guess);
            let second = -self.figure.frame.apply(DVec3::Y).dot(guess);
            let front = if front.abs() > 0.1 { front } else { second };
            (if front < 0.0 { -guess } else { guess }, 0.35)
        };
        if plan.is_left_named {
            let said = across.cross(up);
            let agrees = said.dot(forward) > 0.0;
            if seen.is_none() {
                forward = said;
                certainty = 0.8;
            } else if agrees {
                certainty = f64::max(certainty, 0.95);
            } else if certainty >= 0.9 {
                self.doubt(
                    None,
                    None,
                    "the joints named left lie at the right of a figure that looks where its feet point: it is mirrored, or \
                     its sides are named the other way round; the names were kept",
                );
            } else {
                // Bent knees tell less than names.
                forward = said;
                certainty = 0.7;
            }
        }
        self.side_certainty = if plan.is_left_named { 1.0 } else { certainty };
        self.shape.forward = forward;
        self.shape.left = up.cross(forward).normalize_or(across);
        self.shape.facing_certainty = certainty;
        if !plan.is_left_named && certainty < 0.5 && !plan.pairs.is_empty() {
            self.doubt(
                None,
                None,
                "nothing shows where the figure faces; it was taken to face along +z, as files usually do",
            );
        }
    }

    /// The side of each of a pair's first joints.
    pub(super) fn sides(&self, pair: &Pair) -> [Side; 2] {
        if pair.is_named {
            return Side::BOTH;
        }
        let apart = |of: &[DVec3]| (of[pair.first[0]] - of[pair.first[1]]).dot(self.left_of_sides());
        let apart = apart(&self.figure.far) + apart(&self.figure.position);
        if apart >= 0.0 { Side::BOTH } else { [Side::Right, Side::Left] }
    }

    /// Where the side called left lies: names win over what the feet say.
    pub(super) fn left_of_sides(&self) -> DVec3 {
        match &self.plan {
            Some(plan) if plan.is_left_named => plan.across,
            _ => self.shape.left,
        }
    }
}

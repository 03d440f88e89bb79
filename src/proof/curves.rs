//! The curves of one joint before and after, for the sheet.

use std::f64::consts::TAU;

use crate::clip::Clip;
use crate::rotor::{Bivector, Rotor};

use super::measure::{JointMeasure, Measurement, turn_at};

/// Plane angles of a joint before and after, over the part of the clip around its largest change.
#[derive(Clone, Debug, PartialEq)]
pub struct JointCurves {
    /// Label of the joint.
    pub label: String,
    /// When its largest change is, seconds.
    pub worst_secs: f64,
    /// The largest change, radians.
    pub change_rad: f64,
    /// Times in seconds, rising.
    pub times_secs: Vec<f64>,
    /// Plane angles in degrees away from a reference orientation, before.
    pub before_deg: Vec<[f64; 3]>,
    /// The same after.
    pub after_deg: Vec<[f64; 3]>,
}

/// The most joints whose curves are shown.
const MOST_JOINTS: usize = 6;
/// Changes below this are rounding of files: radians, a thousandth of a degree.
const ROUNDING_RAD: f64 = 1.75e-5;
/// How much of a clip is shown around the largest change, seconds.
const WINDOW_SECS: f64 = 5.0;
/// The most points of a curve; more than the sheet has pixels.
const MOST_POINTS: usize = 900;

/// The curves of the joints that changed most, largest first.
pub fn joint_curves(before: &Clip, after: &Clip, measurement: &Measurement) -> Vec<JointCurves> {
    let mut joints: Vec<&JointMeasure> =
        measurement.joints.iter().filter(|joint| joint.change.value > ROUNDING_RAD).collect();
    joints.sort_by(|a, b| b.change.value.total_cmp(&a.change.value));
    joints.into_iter().take(MOST_JOINTS).map(|joint| curves_of(before, after, joint)).collect()
}

fn curves_of(before: &Clip, after: &Clip, joint: &JointMeasure) -> JointCurves {
    let end = before.duration_secs.min(after.duration_secs);
    let start = (joint.change.at_secs - 0.5 * WINDOW_SECS).min(end - WINDOW_SECS).max(0.0);
    let stop = (start + WINDOW_SECS).min(end);
    let points = (((stop - start) * before.grid.rate).round() as usize).clamp(1, MOST_POINTS);
    let times_secs: Vec<f64> =
        (0..=points).map(|point| start + (stop - start) * point as f64 / points as f64).collect();
    // In the middle of the shown motion, so that the angles stay as small as they can.
    let reference = turn_at(after, joint.after_joint, 0.5 * (start + stop));
    let angles = |clip: &Clip, index: usize| {
        let turns = times_secs.iter().map(|&time| turn_at(clip, index, time));
        unrolled(turns, reference)
    };
    let (before_deg, after_deg) = (angles(before, joint.before_joint), angles(after, joint.after_joint));
    JointCurves {
        label: joint.label.clone(),
        worst_secs: joint.change.at_secs,
        change_rad: joint.change.value,
        before_deg,
        after_deg,
        times_secs,
    }
}

/// Plane angles away from `reference` in degrees, each the one nearest the one before: a spin goes on past 180°.
fn unrolled(turns: impl Iterator<Item = Rotor>, reference: Rotor) -> Vec<[f64; 3]> {
    let mut last = Bivector::ZERO;
    turns
        .map(|turn| {
            let short = (reference.reverse() * turn).plane_angles();
            let plane = short.normalize_or_zero();
            // The same orientation with whole turns more or less, in the same plane.
            let along = last.dot(plane);
            let whole_turns = ((along - short.length()) / TAU).round();
            last = short + plane * (whole_turns * TAU);
            last.to_degrees()
        })
        .collect()
}

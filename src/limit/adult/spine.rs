//! Shares out what the trunk or the neck can do as a whole over the joints a skeleton has for it.

use glam::DVec3;

use super::table::{bands, segments};

/// Captures and animators divide a bend otherwise than vertebrae do, and some put all of it into one joint: comfort and limit of a
/// joint are its share times this, up to the whole, and only what would be too much for the whole is a fault. Chosen for this
/// program, no published figure.
const SLACK: f64 = 2.0;

/// Limits of one joint of the chain, in degrees: comfort, limit and fault of flexion, extension, side bend and rotation.
pub(super) struct Share {
    pub(super) flexion: [f64; 3],
    pub(super) extension: [f64; 3],
    pub(super) side_bend: [f64; 3],
    pub(super) rotation: [f64; 3],
}

/// One for each joint of a chain from below upwards, standing at `places` along the way from 0 to 1.
pub(super) fn shares(is_neck: bool, places: &[f64]) -> Vec<Share> {
    let part = if is_neck { "neck" } else { "trunk" };
    let own: Vec<[f64; 3]> = segments()
        .iter()
        .filter(|segment| segment.is_neck == is_neck)
        .map(|segment| segment.degrees)
        .collect();
    let count = places.len();
    (0..count)
        .map(|k| {
            let from = if k == 0 { 0.0 } else { 0.5 * (places[k - 1] + places[k]) };
            let to = if k + 1 == count { 1.0 } else { 0.5 * (places[k] + places[k + 1]) };
            // An even share at least: joints without length, and rigs that divide evenly.
            let share = |motion: usize| of(&own, motion, from, to).max(1.0 / count as f64).min(1.0);
            let banded = |name: &str, motion: usize| {
                let [comfort, limit, fault] = bands(part, name);
                let share = (SLACK * share(motion)).min(1.0);
                [comfort * share, limit * share, fault]
            };
            Share {
                flexion: banded("flexion", 0),
                extension: banded("extension", 0),
                side_bend: banded("side_bend", 1),
                rotation: banded("rotation", 2),
            }
        })
        .collect()
}

/// The part of a motion that the segments between two places contribute; segments are taken to be equally long.
fn of(segments: &[[f64; 3]], motion: usize, from: f64, to: f64) -> f64 {
    let count = segments.len() as f64;
    let all: f64 = segments.iter().map(|segment| segment[motion]).sum();
    let within = segments.iter().enumerate().map(|(i, segment)| {
        let (start, end) = (i as f64 / count, (i + 1) as f64 / count);
        let overlap = (end.min(to) - start.max(from)).max(0.0) * count;
        segment[motion] * overlap
    });
    within.sum::<f64>() / all
}

/// How far along the way from `start` over the joints to `end` each joint stands, 0 to 1.
pub(super) fn places(start: DVec3, joints: &[DVec3], end: Option<DVec3>) -> Vec<f64> {
    let mut along = 0.0;
    let mut before = start;
    let mut places: Vec<f64> = joints
        .iter()
        .map(|joint| {
            along += joint.distance(before);
            before = *joint;
            along
        })
        .collect();
    let whole = along + end.map_or(0.0, |end| end.distance(before));
    for place in &mut places {
        *place = if whole > 0.0 { *place / whole } else { 0.0 };
    }
    places
}

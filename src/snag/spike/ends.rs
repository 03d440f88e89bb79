//! Spikes in the very first or last keys, where there is sound motion on one side only.

use std::f64::consts::PI;

use super::super::roughness::{Roughness, angle_of_dot};
use super::super::scan::Scan;
use super::Run;
use crate::rotor::Rotor;

/// Keys at an end that are looked at.
const LONGEST: usize = 2;

/// It lies off by at least this, by so many times what is rough near by, and so many usual steps.
const LEAST_RAD: f64 = 10.0 / 180.0 * PI;
const TIMES_ROUGH: f64 = 8.0;
const TIMES_STEP: f64 = 6.0;

/// Keys that tell what is usual.
const NEAR_KEYS: usize = 16;

/// A joint elsewhere that makes a step of this many usual ones at the same time: a calibration pose or a cut, which is meant.
const TIMES_OTHER: f64 = 5.0;
const LEAST_OTHER_RAD: f64 = 2.0 / 180.0 * PI;

/// A joint whose usual step is no more than this rests, and tells nothing.
const LEAST_MOVE_RAD: f64 = 1e-4;

/// Nothing beyond it shows that the motion goes on as before, so it is left to a person.
pub(super) const CONFIDENCE: f64 = 0.55;

/// The runs at the ends of a joint's keys that lie off where the motion beside them leads to.
pub(super) fn find<'a>(scan: &'a Scan<'a>, rough: &'a Roughness<'a>) -> impl Iterator<Item = Run> + 'a {
    [true, false]
        .into_iter()
        .filter_map(move |at_start| (1..=LONGEST).find_map(|length| off(scan, rough, at_start, length)))
}

fn off(scan: &Scan<'_>, rough: &Roughness<'_>, at_start: bool, length: usize) -> Option<Run> {
    let count = rough.len();
    if count < NEAR_KEYS + length + 2 {
        return None;
    }
    // Counted from the end inwards.
    let key = |i: usize| if at_start { i } else { count - 1 - i };
    let pose = |i: usize| rough.pose(key(i));
    let turn = |i: usize, j: usize| angle_of_dot(pose(i).dot(pose(j)));
    let near = length + 1..length + NEAR_KEYS;
    let mut steps: Vec<f64> = near.clone().map(|i| turn(i, i + 1)).collect();
    steps.sort_by(f64::total_cmp);
    let usual = steps[steps.len() / 2];
    // Where the next three poses lead to.
    let back = pose(length + 2).reverse() * pose(length);
    let rate = back.plane_angles() * 0.5;
    let distance = |i: usize| {
        let led = pose(length) * Rotor::from_plane_angles(rate * (length - i) as f64);
        angle_of_dot(led.dot(pose(i)))
    };
    let mut offs: Vec<f64> = (0..length).map(distance).collect();
    offs.sort_by(f64::total_cmp);
    let (weakest, size) = (offs[0], offs[length / 2]);
    let roughest = near.map(|i| rough.residual(key(i))).fold(0.0, f64::max);
    let sure = LEAST_RAD.max(TIMES_ROUGH * roughest).max(TIMES_STEP * usual);
    let (first, last) = (key(0).min(key(length - 1)), key(0).max(key(length - 1)));
    let moves = (first.saturating_sub(1)..=last.min(count - 2)).all(|key| scan.moves_after(key));
    if weakest < sure || !moves || may_be_meant(scan, rough.secs(key(length)), rough.secs(key(length - 1))) {
        return None;
    }
    Some(Run { first, last, size, weakest, peak: size, rest: roughest, across: size })
}

/// Whether another joint jumps between two neighbouring times too, or none moves on there that could speak against a
/// calibration pose.
fn may_be_meant(scan: &Scan<'_>, from: f64, to: f64) -> bool {
    let mut moves_on = false;
    for other in scan.clip.skeleton.listed().filter(|other| *other != scan.joint) {
        let Some(other) = scan.other(other).filter(|other| other.keys.len() > 4) else {
            continue;
        };
        let track = other.track;
        let turn = |from: f64, to: f64| track.at(from).turn_to(track.at(to));
        let own = turn(from, to);
        let mut beside: Vec<f64> =
            (1..=9).map(|i| f64::from(i) * (from - to)).map(|off| turn(from + off, to + off)).collect();
        beside.sort_by(f64::total_cmp);
        let usual = beside[4];
        if own > (TIMES_OTHER * usual).max(LEAST_OTHER_RAD) {
            return true;
        }
        moves_on |= usual > LEAST_MOVE_RAD;
    }
    !moves_on
}

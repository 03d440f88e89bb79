//! Stored plane angles that jump by a whole turn: the same orientation, reached the other way round.

use std::f64::consts::TAU;

use crate::rotor::Bivector;

use super::scan::Scan;

/// Up to this the joint hardly moves.
const HARDLY_RAD: f64 = 0.53;

/// A run of keys whose plane angles are whole turns off the row that changes least.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct PlaneRun {
    pub(super) first: usize,
    pub(super) last: usize,
    /// Whether the joint hardly moves where the run begins and ends.
    pub(super) is_wrap: bool,
}

/// Of all plane angles of the same orientation, those nearest `reference`: `angles` may be longer or shorter by whole
/// turns in its own plane. Without an own plane, that is without a turn, it stays as it is.
pub(crate) fn nearest_plane_angles(angles: Bivector, reference: Bivector) -> Bivector {
    let plane = angles.normalize_or_zero();
    let along = plane.dot(reference);
    let turns = ((along - angles.length()) / TAU).round();
    if turns == 0.0 || plane == Bivector::ZERO { angles } else { angles + plane * (turns * TAU) }
}

/// Runs of keys that do not keep to the row that starts at the first key; the other way round where the first keys alone
/// turn by more than half a round.
pub(super) fn plane_runs(scan: &Scan<'_>, degrees: &[[f64; 3]]) -> Vec<PlaneRun> {
    let finite = |key: usize| Some(Bivector::from_degrees(degrees[key])).filter(|angles| angles.is_finite());
    let mut before: Option<Bivector> = None;
    let mut off: Vec<bool> = (0..degrees.len())
        .map(|key| {
            let Some(angles) = finite(key) else { return false };
            let nearest = nearest_plane_angles(angles, before.unwrap_or(angles));
            before = Some(nearest);
            nearest != angles
        })
        .collect();
    let wide = |key: usize| finite(key).is_some_and(|angles| angles.length() > TAU / 2.0 + 1e-6);
    let first_off = off.iter().take_while(|off| !**off).count();
    if first_off < off.len() && off[first_off..].iter().all(|off| *off) {
        let wide_start = (0..first_off).filter(|&key| wide(key)).count();
        let wide_rest = (first_off..off.len()).filter(|&key| wide(key)).count();
        if wide_start * 2 > first_off && wide_rest * 2 < off.len() - first_off {
            for off in &mut off {
                *off = !*off;
            }
        }
    }
    super::scan::runs(off.iter().map(|&off| off.then_some(())))
        .into_iter()
        .map(|(first, last, ())| {
            let turn = |key: usize| {
                let (before, after) = (scan.unit(key.checked_sub(1)?)?, scan.unit(key)?);
                Some(before.turn_to(after))
            };
            let hardly = |key: usize| key >= degrees.len() || turn(key).is_none_or(|turn| turn < HARDLY_RAD);
            PlaneRun { first, last, is_wrap: hardly(first) || (last + 1 < degrees.len() && hardly(last + 1)) }
        })
        .collect()
}

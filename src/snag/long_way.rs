//! Segments that go the long way round though a short way exists.

use std::f64::consts::TAU;

use crate::clip::{FileAngles, PathKind, Stored};
use crate::rotor::Bivector;

use super::plane_turns::plane_runs;
use super::scan::{Finding, Scan, View};
use super::{Memory, Remedy, Snag, SnagKind};

/// Finds long ways of one joint.
///
/// Where the file stores rotors: cubic segments between rotors of opposite sign, which a player turns the long way.
/// Where it stores angles: steps over half a turn with which the joint really moves. Such a file is played the short way
/// between frames, so nothing is to be mended unless the user knows what was meant. Turns that are marked as meant are none.
pub(super) fn find(view: View<'_>, joint: usize, memory: &mut Memory) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint) else { return Vec::new() };
    let snags: Vec<Snag> = match &scan.track.stored {
        Stored::Rotors => (1..scan.keys.len()).filter_map(|key| cubic(&scan, key)).collect(),
        Stored::Angles(angles) => of_angles(&scan, angles, memory),
        Stored::PlaneAngles(degrees) => of_plane_angles(&scan, degrees),
    };
    // Where somebody said how far round it goes, that is how far.
    let is_said = |snag: &Snag| !scan.track.segments.of(snag.first_key).turn.is_short();
    snags.into_iter().filter(|snag| !is_said(snag)).collect()
}

fn cubic(scan: &Scan<'_>, key: usize) -> Option<Snag> {
    if scan.track.paths.of(key - 1) != PathKind::Cubic || scan.track.tangents.is_none() {
        return None;
    }
    let (before, after) = (scan.unit(key - 1)?, scan.unit(key)?);
    if before.dot(after) >= 0.0 {
        return None;
    }
    let short = before.turn_to(after);
    Some(scan.snag(Finding {
        kind: SnagKind::LongWay,
        keys: (key - 1, key),
        size_rad: TAU - short,
        confidence: 1.0,
        remedy: Remedy::ShortWay,
        safe: true,
        text: format!(
            "{} turns {:.0}° the long way between frames {} and {}, {:.0}° the short way",
            scan.label(),
            (TAU - short).to_degrees(),
            scan.frame(key - 1),
            scan.frame(key),
            short.to_degrees()
        ),
    }))
}

fn of_angles(scan: &Scan<'_>, angles: &FileAngles, memory: &mut Memory) -> Vec<Snag> {
    let mut snags: Vec<Snag> = Vec::new();
    for step in &memory.steps(scan, angles).moves {
        if snags.last().is_some_and(|snag| snag.last_key == step.key) {
            continue;
        }
        let size_deg =
            (angles.degrees[step.key][step.channel] - angles.degrees[step.key - 1][step.channel]).abs();
        let letter = angles.axes.get(step.channel).map_or('?', |axis| axis.letter());
        snags.push(stored_step(scan, step.key, size_deg.to_radians(), &format!("its {letter} angle")));
    }
    snags
}

fn of_plane_angles(scan: &Scan<'_>, degrees: &[[f64; 3]]) -> Vec<Snag> {
    let mut borders: Vec<usize> = plane_runs(scan, degrees)
        .into_iter()
        .filter(|run| !run.is_wrap)
        .flat_map(|run| [run.first, run.last + 1])
        .filter(|key| (1..degrees.len()).contains(key))
        .collect();
    borders.dedup();
    borders
        .into_iter()
        .map(|key| {
            let step = Bivector::from_degrees(degrees[key]) - Bivector::from_degrees(degrees[key - 1]);
            stored_step(scan, key, step.length(), "its plane angles")
        })
        .collect()
}

fn stored_step(scan: &Scan<'_>, key: usize, size_rad: f64, what: &str) -> Snag {
    let turn_rad = match (scan.unit(key - 1), scan.unit(key)) {
        (Some(before), Some(after)) => before.turn_to(after),
        _ => 0.0,
    };
    scan.snag(Finding {
        kind: SnagKind::LongWay,
        keys: (key - 1, key),
        size_rad,
        confidence: 0.5,
        remedy: Remedy::Ask,
        safe: false,
        text: format!(
            "{} stores a step of {:.0}° in {what} between frames {} and {}; it is played as the short way, {:.0}°",
            scan.label(),
            size_rad.to_degrees(),
            scan.frame(key - 1),
            scan.frame(key),
            turn_rad.to_degrees()
        ),
    })
}

//! Stored angles that step by whole turns while the joint hardly moves.

use std::f64::consts::TAU;

use crate::clip::{FileAngles, Stored};
use crate::rotor::Bivector;

use super::plane_turns::{PlaneRun, plane_runs};
use super::scan::{Finding, Scan, View};
use super::{Memory, Remedy, Snag, SnagKind};

/// Finds wraps of one joint.
pub(super) fn find(view: View<'_>, joint: usize, memory: &mut Memory) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint) else { return Vec::new() };
    match &scan.track.stored {
        Stored::Rotors => Vec::new(),
        Stored::Angles(angles) => of_angles(&scan, angles, memory),
        Stored::PlaneAngles(degrees) => plane_runs(&scan, degrees)
            .into_iter()
            .filter(|run| run.is_wrap)
            .map(|run| of_plane_run(&scan, degrees, run))
            .collect(),
    }
}

fn of_angles(scan: &Scan<'_>, angles: &FileAngles, memory: &mut Memory) -> Vec<Snag> {
    memory.steps(scan, angles).wraps.iter().map(|&run| unwrap(scan, angles, run)).collect()
}

fn unwrap(scan: &Scan<'_>, angles: &FileAngles, (first, last, turns): (usize, usize, [i32; 3])) -> Snag {
    let channels: Vec<String> = (0..3)
        .filter(|&channel| turns[channel] != 0)
        .map(|channel| {
            let letter = angles.axes.get(channel).map_or('?', |axis| axis.letter());
            format!("{letter} by {}°", -360 * i64::from(turns[channel]))
        })
        .collect();
    let most = turns.iter().map(|turns| turns.unsigned_abs()).max().unwrap_or(0);
    scan.snag(Finding {
        kind: SnagKind::Wrap,
        keys: (first, last),
        size_rad: f64::from(most) * TAU,
        confidence: 1.0,
        remedy: Remedy::Unwrap(turns),
        safe: true,
        text: format!(
            "{} is stored off in {} {}, the joint hardly moves",
            scan.label(),
            channels.join(" and "),
            scan.span(first, last)
        ),
    })
}

fn of_plane_run(scan: &Scan<'_>, degrees: &[[f64; 3]], run: PlaneRun) -> Snag {
    let step = |key: usize| {
        let (before, after) =
            (Bivector::from_degrees(degrees[key - 1]), Bivector::from_degrees(degrees[key]));
        (after - before).length()
    };
    let border = if run.first > 0 { run.first } else { (run.last + 1).min(degrees.len() - 1) };
    let size_rad = if border > 0 { step(border) } else { 0.0 };
    scan.snag(Finding {
        kind: SnagKind::Wrap,
        keys: (run.first, run.last),
        size_rad,
        confidence: 1.0,
        remedy: Remedy::NearestAngles,
        safe: true,
        text: format!(
            "{} is stored with its plane angles {:.0}° off {}, the joint hardly moves",
            scan.label(),
            size_rad.to_degrees(),
            scan.span(run.first, run.last)
        ),
    })
}

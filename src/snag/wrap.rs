//! Stored angles that step by whole turns while the joint hardly moves.

use std::f64::consts::TAU;

use crate::clip::{Clip, FileAngles, Stored};
use crate::rotor::Bivector;

use super::angle_steps::{AngleStep, angle_steps};
use super::branches::follow;
use super::plane_turns::{PlaneRun, plane_runs};
use super::scan::{Finding, Scan};
use super::{Remedy, Snag, SnagKind};

/// Up to this many keys at the start, and this share of all, a run there is taken for the wrong one: a calibration pose.
const START_KEYS: usize = 3;
const START_SHARE: usize = 20;

/// Finds wraps of one joint.
pub(super) fn find(clip: &Clip, joint: usize) -> Vec<Snag> {
    let Some(scan) = Scan::new(clip, joint) else { return Vec::new() };
    match &scan.track.stored {
        Stored::Rotors => Vec::new(),
        Stored::Angles(angles) => of_angles(&scan, angles),
        Stored::PlaneAngles(degrees) => plane_runs(&scan, degrees)
            .into_iter()
            .filter(|run| run.is_wrap)
            .map(|run| of_plane_run(&scan, degrees, run))
            .collect(),
    }
}

fn of_angles(scan: &Scan<'_>, angles: &FileAngles) -> Vec<Snag> {
    let steps = angle_steps(scan, angles, &follow(angles));
    let mut found: Vec<(usize, usize, [i32; 3])> = Vec::new();
    for channel in 0..3 {
        let own: Vec<AngleStep> =
            steps.iter().filter(|step| step.is_wrap && step.channel == channel).copied().collect();
        for (first, last, turns) in matched(scan, angles, channel, &own) {
            match found.iter_mut().find(|run| (run.0, run.1) == (first, last)) {
                Some(run) => run.2[channel] = turns,
                None => {
                    let mut all = [0; 3];
                    all[channel] = turns;
                    found.push((first, last, all));
                }
            }
        }
    }
    found.sort_unstable();
    found.into_iter().map(|run| unwrap(scan, angles, run)).collect()
}

/// Pairs each step of a channel with its way back: runs `(first, last, turns)` that leave the angle without steps once
/// their turns are taken in. A step out of the usual range is paired with one back in, and a step inside it with another.
fn matched(
    scan: &Scan<'_>,
    angles: &FileAngles,
    channel: usize,
    steps: &[AngleStep],
) -> Vec<(usize, usize, i32)> {
    let count = scan.track.keys.len();
    let mut runs = Vec::new();
    let mut open: [Vec<AngleStep>; 2] = [Vec::new(), Vec::new()];
    for &step in steps {
        let lane = &mut open[usize::from(step.leaves != 0)];
        match lane.last() {
            Some(way_in) if way_in.turns == -step.turns => {
                runs.push((way_in.key, step.key - 1, way_in.turns));
                lane.pop();
            }
            _ => lane.push(step),
        }
    }
    for step in open.into_iter().flatten() {
        // What lies outside the usual range is the fault; else the start is right, but for a pose or two.
        let few = step.key <= START_KEYS && step.key * START_SHARE <= count;
        let from_start =
            step.leaves < 0 || (step.leaves == 0 && few && starts_apart(angles, channel, step.key));
        runs.push(if from_start {
            (0, step.key - 1, -step.turns)
        } else {
            (step.key, count - 1, step.turns)
        });
    }
    runs
}

/// Whether the angle of the first keys has its sign alone: no later step comes back to it.
fn starts_apart(angles: &FileAngles, channel: usize, until: usize) -> bool {
    let sign = |key: usize| angles.degrees[key][channel] < 0.0;
    (until..angles.degrees.len()).all(|key| sign(key) != sign(0))
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

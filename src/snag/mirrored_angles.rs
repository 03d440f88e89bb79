//! Angle triples that jump to the mirrored triple of the same turn.

use crate::clip::{FileAngles, Stored};

use super::branches::Branches;
use super::scan::{Finding, Scan, View};
use super::{Memory, Remedy, Snag, SnagKind};

/// Near a pole two angles may run through large steps while the joint hardly turns; from here on that is told.
const POLE_STEP_DEG: f64 = 50.0;

/// The joint hardly turns up to this.
const POLE_TURN_DEG: f64 = 20.0;

/// Finds mirrored triples of one joint.
pub(super) fn find(view: View<'_>, joint: usize, memory: &mut Memory) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint) else { return Vec::new() };
    let Stored::Angles(angles) = &scan.track.stored else { return Vec::new() };
    if angles.axes.len() < 3 {
        return Vec::new();
    }
    let wide: Vec<usize> = memory.wide(angles).iter().copied().filter(|key| *key > 0).collect();
    let branches = memory.branches(&scan, angles);
    let runs = branches.mirrored_runs(angles.degrees.len());
    let mut snags: Vec<Snag> =
        runs.into_iter().map(|(first, last)| mirrored(&scan, angles, first, last)).collect();
    snags.extend(wide.into_iter().filter_map(|key| at_pole(&scan, angles, branches, key)));
    snags
}

fn mirrored(scan: &Scan<'_>, angles: &FileAngles, first: usize, last: usize) -> Snag {
    let step = |key: usize| {
        let (before, after) = (angles.degrees.get(key.checked_sub(1)?)?, angles.degrees.get(key)?);
        Some((0..3).map(|i| (after[i] - before[i]).abs()).fold(0.0, f64::max))
    };
    let size_deg = step(first).or_else(|| step(last + 1)).unwrap_or(0.0);
    scan.snag(Finding {
        kind: SnagKind::MirroredAngles,
        keys: (first, last),
        size_rad: size_deg.to_radians(),
        confidence: 1.0,
        remedy: Remedy::NearestAngles,
        safe: true,
        text: format!(
            "{} is stored with the mirrored triple of its angles {}, a step of {size_deg:.0}° in numbers alone",
            scan.label(),
            scan.span(first, last)
        ),
    })
}

/// A step through a pole that no choice among equal triples takes out.
fn at_pole(scan: &Scan<'_>, angles: &FileAngles, branches: &Branches, key: usize) -> Option<Snag> {
    if branches.is_mirrored(key) != branches.is_mirrored(key - 1) {
        return None;
    }
    let (before, after) = (branches.row(angles, key - 1)?, branches.row(angles, key)?);
    let step = |i: usize| (after[i] - before[i]).abs();
    if step(0).min(step(2)) < POLE_STEP_DEG {
        return None;
    }
    let turn_deg = scan.unit(key - 1)?.turn_to(scan.unit(key)?).to_degrees();
    if turn_deg > POLE_TURN_DEG {
        return None;
    }
    let [first, _, last] = [0, 1, 2].map(|i| angles.axes[i].letter());
    Some(scan.snag(Finding {
        kind: SnagKind::MirroredAngles,
        keys: (key, key),
        size_rad: step(0).max(step(2)).to_radians(),
        confidence: 0.5,
        remedy: Remedy::Ask,
        safe: false,
        text: format!(
            "{} passes its angles' pole at frame {}: {first} and {last} step by {:.0}° and {:.0}° while it turns {turn_deg:.1}°",
            scan.label(),
            scan.frame(key),
            step(0),
            step(2)
        ),
    }))
}

//! Runs of frames in which a joint is beyond its limit.

use crate::clip::{Clip, PathKind, Paths};
use crate::limit::{Inside, JointLimit, Limits, PROVED_TOGETHER, Reading};
use crate::rotor::Rotor;

use super::scan::{Finding, Scan, View};
use super::{Outlines, Remedy, Snag, SnagKind};

/// Nearer than this beyond the limit is what file formats round away, radians.
const ROUNDING_RAD: f64 = 0.02 / 180.0 * std::f64::consts::PI;

/// Runs nearer to each other than the mend of one reaches are one: frames, and seconds.
const NEAR_FRAMES: usize = 3;
const NEAR_SECS: f64 = 0.1;

/// So far beyond, a joint is turned wrongly rather than bent too far: bringing it to its limit would hide that.
const TURNED_RAD: f64 = 60.0 / 180.0 * std::f64::consts::PI;

/// Limits less sure than this are shown and not mended unasked.
const LEAST_CONFIDENCE: f64 = 0.5;

/// Finds the runs of frames in which one joint of `clip` is beyond the fault band of its limit, in order. None without a limit.
///
/// Looks at the clip's frames, so that curves between keys are seen too.
pub fn find_past_limit(clip: &Clip, joint: usize, limits: &Limits) -> Vec<Snag> {
    let outlines = Outlines::new(clip.joints.len());
    let Some(scan) = Scan::new(View { clip, outlines: &outlines }, joint) else { return Vec::new() };
    let Some(limit) = limits.get(joint) else { return Vec::new() };
    let near = (NEAR_SECS * clip.grid.rate) as usize;
    let near = near.max(NEAR_FRAMES);
    let mut runs: Vec<Run> = Vec::new();
    let mut before: Option<Reading> = None;
    // Whether a twist was held since the last frame beyond the limit.
    let mut is_held = false;
    let times = &clip.grid.times;
    let passes_keys = matches!(scan.track.paths, Paths::Every(kind) if kind != PathKind::BSpline);
    let is_key_by_key = passes_keys && scan.track.times == *times;
    let proof = Inside::fault_of(limit);
    // The last pose that was passed over: its reading does not depend on what came before.
    let mut passed: Option<Rotor> = None;
    for start in (0..times.len()).step_by(TILE) {
        let frames = start..(start + TILE).min(times.len());
        let made: Vec<Rotor>;
        let poses: &[Rotor] = if is_key_by_key {
            &scan.keys[frames]
        } else {
            made = scan.track.at_all(&frames.map(|frame| times.at(frame)).collect::<Vec<_>>());
            &made
        };
        let pose_at = |frame: usize, pose: Rotor| {
            if is_key_by_key { scan.track.sound_key(frame) } else { pose }
        };
        for (first, poses) in (start..).step_by(PROVED_TOGETHER).zip(poses.chunks(PROVED_TOGETHER)) {
            if proof.is_some_and(|proof| proof.holds(poses)) {
                let last = poses.len() - 1;
                passed = Some(pose_at(first + last, poses[last]));
                continue;
            }
            if let Some(passed) = passed.take() {
                before = Some(limit.read(passed, None));
            }
            for (frame, pose) in (first..).zip(poses) {
                let reading = limit.read(pose_at(frame, *pose), before.as_ref());
                before = Some(reading);
                is_held |= reading.is_twist_held;
                let size_rad = limit.fault.beyond_rad(&reading);
                if size_rad <= ROUNDING_RAD {
                    continue;
                }
                match runs.last_mut() {
                    Some(run) if frame <= run.last + near => {
                        run.last = frame;
                        run.is_held |= is_held;
                        if size_rad >= run.size_rad {
                            (run.worst, run.size_rad) = (reading, size_rad);
                        }
                    }
                    _ => {
                        let is_held = reading.is_twist_held;
                        runs.push(Run { first: frame, last: frame, worst: reading, size_rad, is_held });
                    }
                }
                is_held = false;
            }
        }
    }
    runs.into_iter().map(|run| snag(&scan, limit, &limits.title, run)).collect()
}

/// Frames whose poses are made together.
const TILE: usize = 16 * PROVED_TOGETHER;

/// A run of frames beyond the limit.
#[derive(Clone, Copy, Debug)]
struct Run {
    first: usize,
    last: usize,
    /// The reading farthest beyond, and how far that is in radians.
    worst: Reading,
    size_rad: f64,
    /// Whether any twist in it was held.
    is_held: bool,
}

fn snag(scan: &Scan<'_>, limit: &JointLimit, title: &str, run: Run) -> Snag {
    let Run { first, last, worst, size_rad, is_held } = run;
    let [first_secs, last_secs] = [first, last].map(|frame| scan.clip.grid.times.at(frame));
    let is_twist = limit.fault.twist.beyond_rad(worst.twist_rad) >= limit.fault.swing.beyond_rad(worst.swing);
    let keys = keys_within(scan, first_secs, last_secs);
    let has_keys = keys.is_some();
    // Without a key inside, those on both sides bound what is wrong.
    let (first_key, last_key) = keys.unwrap_or_else(|| {
        let before = scan.track.times.nearest(first_secs);
        let before = if scan.secs(before) > first_secs { before.saturating_sub(1) } else { before };
        (before, (before + 1).min(scan.keys.len() - 1))
    });
    let whose = if title.is_empty() { String::new() } else { format!(" ({title})") };
    let at = if first == last { format!("at frame {first}") } else { format!("at frames {first} to {last}") };
    let how = if is_twist { "twists" } else { "tilts" };
    let between = if has_keys { "" } else { ", between two keys: a limits pass adds keys there" };
    let text = format!(
        "{} {how} {:.0}° past its limit{whose} {at}{between}",
        scan.label(),
        size_rad.to_degrees().max(1.0)
    );
    let mut snag = scan.snag(Finding {
        kind: SnagKind::PastLimit,
        keys: (first_key, last_key),
        size_rad,
        // Sure of the limit, and of being beyond it by more than a capture's noise of a few degrees.
        confidence: limit.confidence * (0.5 + 0.5 * (size_rad / (size_rad + 0.05))),
        remedy: if has_keys { Remedy::Clamp(*limit) } else { Remedy::Ask },
        safe: has_keys && !is_held && limit.confidence >= LEAST_CONFIDENCE && size_rad < TURNED_RAD,
        text,
    });
    (snag.first_frame, snag.last_frame) = (first, last);
    (snag.first_secs, snag.last_secs) = (first_secs, last_secs);
    snag
}

/// First and last key between two times, a rounding error beside them included.
fn keys_within(scan: &Scan<'_>, from_secs: f64, to_secs: f64) -> Option<(usize, usize)> {
    let slack = 1e-3 / scan.clip.grid.rate.max(1.0);
    let times = &scan.track.times;
    let near = times.nearest(from_secs).saturating_sub(1);
    let first = (near..times.len()).find(|&key| times.at(key) >= from_secs - slack)?;
    let last = (first..times.len()).take_while(|&key| times.at(key) <= to_secs + slack).last()?;
    Some((first, last))
}

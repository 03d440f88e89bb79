//! Runs of frames in which a joint is beyond its limit.

use crate::clip::Clip;
use crate::limit::JointLimit;
use crate::limit::Limits;
use crate::limit::Reading;
use crate::limit::readings;

use super::scan::{Finding, Scan};
use super::{Remedy, Snag, SnagKind};

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
    let (Some(scan), Some(limit)) = (Scan::new(clip, joint), limits.get(joint)) else { return Vec::new() };
    let times: Vec<f64> = clip.grid.times.iter().collect();
    let readings = readings(scan.track, &times, limit);
    let is_beyond = |reading: &Reading| limit.fault.beyond_rad(reading) > ROUNDING_RAD;
    let near = (NEAR_SECS * clip.grid.rate) as usize;
    let near = near.max(NEAR_FRAMES);
    let mut runs: Vec<(usize, usize)> = Vec::new();
    for (frame, _) in readings.iter().enumerate().filter(|(_, reading)| is_beyond(reading)) {
        match runs.last_mut() {
            Some((_, last)) if frame <= *last + near => *last = frame,
            _ => runs.push((frame, frame)),
        }
    }
    runs.into_iter()
        .map(|(first, last)| snag(&scan, limit, &limits.title, &readings, &times, (first, last)))
        .collect()
}

fn snag(
    scan: &Scan<'_>,
    limit: &JointLimit,
    title: &str,
    readings: &[Reading],
    times: &[f64],
    (first, last): (usize, usize),
) -> Snag {
    let run = &readings[first..=last];
    let beyond = |reading: &Reading| limit.fault.beyond_rad(reading);
    let worst = run.iter().copied().max_by(|a, b| beyond(a).total_cmp(&beyond(b))).unwrap_or(run[0]);
    let size_rad = beyond(&worst);
    let is_twist = limit.fault.twist.beyond_rad(worst.twist_rad) >= limit.fault.swing.beyond_rad(worst.swing);
    let is_held = run.iter().any(|reading| reading.is_twist_held);
    let keys = keys_within(scan, times[first], times[last]);
    let has_keys = keys.is_some();
    // Without a key inside, those on both sides bound what is wrong.
    let (first_key, last_key) = keys.unwrap_or_else(|| {
        let before = scan.track.times.nearest(times[first]);
        let before = if scan.secs(before) > times[first] { before.saturating_sub(1) } else { before };
        (before, (before + 1).min(scan.track.keys.len() - 1))
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
    (snag.first_secs, snag.last_secs) = (times[first], times[last]);
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

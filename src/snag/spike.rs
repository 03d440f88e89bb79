//! One to a few keys that lie far off the motion around them.

mod alike;
mod ends;
mod score;

use std::f64::consts::PI;

use crate::rotor::{Rotor, slerp};

use super::roughness::{Roughness, angle_to_way};
use super::scan::{Finding, Scan, View};
use super::stuck::is_same;
use super::{Remedy, Snag, SnagKind};
use alike::Alike;
use score::{Scorer, touch};

/// With fewer keys nothing can be said about what is usual.
const LEAST_KEYS: usize = 8;

/// Longest run told as a spike.
const LONGEST: usize = 4;

/// Roughness below this is not looked at.
const LEAST_RAD: f64 = 3.5 / 180.0 * PI;

/// The least spread that roughness is measured in.
const LEAST_SPREAD_RAD: f64 = 0.2 / 180.0 * PI;

/// The roughness of a spike is at least so many spreads above the usual.
const LEAST_SCORE: f64 = 5.0;

/// What a joint can do by itself, in radians per second squared: beyond it even a single key far off is told.
const FASTEST: f64 = 12_000.0 / 180.0 * PI;

/// How many times rougher the motion is with the run than without: a spike takes its roughness with it, while a fast move
/// that is sampled coarsely stays rough whichever key is taken out. First for what a joint could do, then for the rest.
const LEAST_GAIN_SLOW: f64 = 8.0;
const LEAST_GAIN: f64 = 4.0;

/// Enough where the move is far beyond what any joint can do. A single step, which is a jump and no spike, gains 2.
const LEAST_GAIN_IMPOSSIBLE: f64 = 3.0;

/// Score times gain: either may be small where the other is large.
const LEAST_PRODUCT: f64 = 60.0;

/// From this product on a smaller gain will do, if the run lies off by all of the roughness.
const CLEAR_PRODUCT: f64 = 150.0;
const LEAST_GAIN_CLEAR: f64 = 3.3;

/// A run that ends further from where it began, in its own sizes, is a step and no spike.
const STEP_SIZES: f64 = 1.2;

/// Unless the joint moves that fast near by too: so many usual steps for each key.
const USUAL_STEPS: f64 = 2.0;

/// A run that takes so many seconds, in and out, is as long as a quick flick of a foot or hand.
const FLICK_SECS: f64 = 0.12;

/// A flick swells: its weakest key lies off by less than this share of the median. A spike is off all along.
const FLICK_SHARE: f64 = 0.6;

/// A flick is no wider than this; what lies farther off is no motion of a foot or hand.
const FLICK_RAD: f64 = 25.0 / 180.0 * PI;

/// A joint that repeats so many keys, moved before, and goes elsewhere by this share of the run's size, stood still and catches up.
const RESTING: usize = 3;
const CAUGHT_UP: f64 = 0.2;

/// Sound keys between two spikes that are looked at together.
const NEXT_KEYS: usize = 3;

/// The keys after a calibration pose at the start are no spike.
const START_KEYS: usize = 2;

/// So near the end nothing shows that the motion goes on as before.
const END_KEYS: usize = 3;

/// A run of keys that may be a spike.
#[derive(Clone, Copy, Debug)]
struct Run {
    first: usize,
    last: usize,
    /// Distance of the run's keys from the way across, their median, in radians.
    size: f64,
    /// Distance of the key of the run that lies nearest to the way across, in radians.
    weakest: f64,
    /// Largest roughness near by with the run, in radians.
    peak: f64,
    /// Largest roughness that stays near by when the run is drawn anew.
    rest: f64,
    /// The turn across the run.
    across: f64,
}

/// Finds spikes of one joint.
pub(super) fn find(view: View<'_>, joint: usize) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint) else { return Vec::new() };
    let Some(rough) = Roughness::new(scan, LEAST_KEYS) else { return Vec::new() };
    let alike = Alike::new(&scan, &rough);
    let mut found = by_roughness(&scan, &rough, &alike);
    if let Some(scorer) = Scorer::new(&alike) {
        found.retain(|(run, _)| scorer.agrees(*run));
        add_scored(&mut found, scorer.find().into_iter().filter(|(run, _)| !alike.is_repeated(*run)));
    }
    found.extend(ends::find(&scan, &rough).map(|run| (run, ends::CONFIDENCE)));
    found.into_iter().map(|(run, confidence)| spike(&scan, run, confidence)).collect()
}

/// Adds the runs that are told by their score. They are the better ones where they touch those of the roughness, but as sure.
fn add_scored(found: &mut Vec<(Run, f64)>, scored: impl Iterator<Item = (Run, f64)>) {
    for (run, confidence) in scored {
        let touched = found.iter().filter(|(other, _)| touch(&run, other));
        let confidence = touched.map(|(_, confidence)| *confidence).fold(confidence, f64::max);
        found.retain(|(other, _)| !touch(&run, other));
        found.push((run, confidence));
    }
}

/// The runs that are told because they take the roughness of the motion with them, and how sure that is.
fn by_roughness(scan: &Scan<'_>, rough: &Roughness<'_>, alike: &Alike<'_>) -> Vec<(Run, f64)> {
    let mut found = Vec::new();
    let mut key = 1;
    loop {
        key = rough.next_rough(key);
        if key + 1 >= rough.len() {
            return found;
        }
        let threshold = threshold(rough, key);
        if rough.residual(key) < threshold {
            key += 1;
            continue;
        }
        let end = stretch(rough, key, threshold);
        if let Some(run) = best_run(rough, key, end)
            && let Some(confidence) = judge(scan, rough, run, LEAST_PRODUCT)
                .or_else(|| beside_another(scan, rough, run))
                .or_else(|| alike.stands_alone(run))
            && !alike.is_repeated(run)
        {
            found.push((run, confidence));
            key = end.max(run.last) + 1;
        } else {
            key += 1;
        }
    }
}

/// At the ends of a longer run only half of its roughness shows.
const SHOWN: f64 = 2.5;

/// No key with less roughness is looked at.
pub(super) const LEAST_LOOKED_AT_RAD: f64 = LEAST_RAD / SHOWN;

/// From this roughness on a key may belong to a spike.
fn threshold(rough: &Roughness<'_>, key: usize) -> f64 {
    let usual = rough.usual(key);
    (usual.median + LEAST_SCORE * usual.spread).max(LEAST_RAD) / SHOWN
}

/// The last of the rough keys from `start` on, with no more than a calm one between.
fn stretch(rough: &Roughness<'_>, start: usize, threshold: f64) -> usize {
    let mut end = start;
    for key in start + 1..(start + LONGEST + 4).min(rough.len() - 1) {
        if rough.residual(key) >= threshold {
            end = key;
        } else if key > end + 2 {
            break;
        }
    }
    end
}

/// The run in a stretch of rough keys that takes most of the roughness with it.
fn best_run(rough: &Roughness<'_>, start: usize, end: usize) -> Option<Run> {
    let mut best: Option<(f64, Run)> = None;
    for length in 1..=LONGEST {
        for first in start..=end {
            let last = first + length - 1;
            if last > end || last + 1 >= rough.len() {
                continue;
            }
            let run = weigh(rough, first, last);
            // A longer run takes more with it by itself, so it must take clearly more.
            let cost = run.rest * (1.0 + 0.15 * length as f64);
            if best.is_none_or(|(least, _)| cost < least) {
                best = Some((cost, run));
            }
        }
    }
    best.map(|(_, run)| run)
}

/// How rough the motion stays around `first..=last` when those keys are drawn anew, and those of `also` with them.
fn rest(rough: &Roughness<'_>, (first, last): (usize, usize), also: Option<(usize, usize)>) -> f64 {
    let runs = [Some((first, last)), also];
    let way = |key: usize| {
        let inside = |&(first, last): &(usize, usize)| (first..=last).contains(&key);
        match runs.iter().flatten().find(|run| inside(run)) {
            None => rough.pose(key),
            Some((first, last)) => across(rough, *first, *last, key),
        }
    };
    (first.saturating_sub(2).max(1)..=(last + 2).min(rough.len() - 2))
        .map(|key| {
            let share = (rough.secs(key) - rough.secs(key - 1)) / (rough.secs(key + 1) - rough.secs(key - 1));
            angle_to_way(way(key - 1), way(key + 1), share, way(key))
        })
        .fold(0.0, f64::max)
}

/// A key of `first..=last` on the way across them.
fn across(rough: &Roughness<'_>, first: usize, last: usize, key: usize) -> Rotor {
    let (a, b) = (first - 1, last + 1);
    let share = (rough.secs(key) - rough.secs(a)) / (rough.secs(b) - rough.secs(a));
    slerp(rough.pose(a), rough.pose(b), share)
}

/// How far the keys of `first..=last` lie off the way across them, the nearest first.
fn offs(rough: &Roughness<'_>, first: usize, last: usize) -> Vec<f64> {
    let mut off: Vec<f64> =
        (first..=last).map(|key| across(rough, first, last, key).turn_to(rough.pose(key))).collect();
    off.sort_by(f64::total_cmp);
    off
}

fn weigh(rough: &Roughness<'_>, first: usize, last: usize) -> Run {
    let off = offs(rough, first, last);
    let near = first.saturating_sub(2).max(1)..=(last + 2).min(rough.len() - 2);
    Run {
        first,
        last,
        size: off[off.len() / 2],
        weakest: off[0],
        peak: near.map(|key| rough.residual(key)).fold(0.0, f64::max),
        rest: rest(rough, (first, last), None),
        across: rough.pose(first - 1).turn_to(rough.pose(last + 1)),
    }
}

/// How sure it is that `run` is a spike with another close by: of two neither takes the other's roughness with it, so
/// both are drawn anew to see what stays rough.
fn beside_another(scan: &Scan<'_>, rough: &Roughness<'_>, run: Run) -> Option<f64> {
    // The roughness must be the run's own.
    if run.last > run.first + 1 || run.peak > 1.3 * run.size {
        return None;
    }
    let mut least = run.rest;
    for length in 1..=2 {
        for gap in 1..=NEXT_KEYS {
            let after = run.last + 1 + gap;
            let before = run.first.checked_sub(gap + length).filter(|&first| first > 0);
            for first in [Some(after), before].into_iter().flatten() {
                let last = first + length - 1;
                if last + 1 < rough.len() {
                    least = least.min(rest(rough, (run.first, run.last), Some((first, last))));
                }
            }
        }
    }
    judge(scan, rough, Run { rest: least, ..run }, CLEAR_PRODUCT)
}

/// Whether a run is a spike, and how sure that is, 0.5 to 1.
fn judge(scan: &Scan<'_>, rough: &Roughness<'_>, run: Run, least_product: f64) -> Option<f64> {
    if !may_be_spike(scan, rough, run) {
        return None;
    }
    let span_secs = rough.secs(run.last + 1) - rough.secs(run.first - 1);
    let swells = run.last > run.first && run.weakest < FLICK_SHARE * run.size;
    if span_secs >= FLICK_SECS && run.size < FLICK_RAD && swells {
        return None;
    }
    let usual = rough.usual_without(run.first, run.last);
    let score = (run.peak - usual.median) / usual.spread.max(LEAST_SPREAD_RAD);
    let gain = run.peak / run.rest.max(LEAST_SPREAD_RAD);
    // The acceleration that the roughness stands for, twice the distance in half the span's square.
    let half_secs = span_secs / (run.last + 2 - run.first) as f64;
    let least_gain = match 2.0 * run.peak / (FASTEST * half_secs * half_secs) {
        times if times > 40.0 => LEAST_GAIN_IMPOSSIBLE,
        times if times > 1.0 && score * gain >= CLEAR_PRODUCT && run.peak <= run.size => LEAST_GAIN_CLEAR,
        times if times > 1.0 => LEAST_GAIN,
        _ => LEAST_GAIN_SLOW,
    };
    let is_spike = run.peak >= LEAST_RAD
        && score >= LEAST_SCORE
        && gain >= least_gain
        && score * gain >= least_product
        && comes_back(rough, run);
    is_spike.then(|| 1.0 - 0.5 * (LEAST_PRODUCT / (score * gain)).sqrt())
}

/// Whether a run has enough sound keys on both sides, and the joint neither jumps as its file says nor rests there.
fn may_be_spike(scan: &Scan<'_>, rough: &Roughness<'_>, run: Run) -> bool {
    run.first > START_KEYS
        && run.last + END_KEYS < rough.len()
        && (run.first - 1..=run.last).all(|key| scan.moves_after(key))
        && !is_rest(rough, run)
        && !catches_up(rough, run)
}

/// Whether a run comes back to where it began, as nearly as the joint's motion near by would.
fn comes_back(rough: &Roughness<'_>, run: Run) -> bool {
    let keys = (run.last + 2 - run.first) as f64;
    let usual = USUAL_STEPS * rough.usual_step_without(run.first, run.last) * keys;
    run.across <= (STEP_SIZES * run.size).max(usual)
}

/// Whether the keys of a run do no more than repeat the one before them: the joint is stuck there.
fn is_rest(rough: &Roughness<'_>, run: Run) -> bool {
    run.last > run.first && (run.first..=run.last).all(|key| is_same(rough.pose(key - 1), rough.pose(key)))
}

/// Whether a run is where a joint goes on that stood still inside its motion: what it missed is no spike.
fn catches_up(rough: &Roughness<'_>, run: Run) -> bool {
    let repeats = |key: &usize| is_same(rough.pose(key - 1), rough.pose(*key));
    let resting = (1..run.first).rev().take_while(repeats).count();
    resting >= RESTING && resting + 1 < run.first && run.across > CAUGHT_UP * run.size
}

/// From this confidence on a spike may be mended unasked.
const SAFE_CONFIDENCE: f64 = 0.6;

fn spike(scan: &Scan<'_>, run: Run, confidence: f64) -> Snag {
    scan.snag(Finding {
        kind: SnagKind::Spike,
        keys: (run.first, run.last),
        size_rad: run.size,
        confidence,
        remedy: Remedy::Redraw,
        safe: confidence >= SAFE_CONFIDENCE,
        text: format!(
            "{} lies {:.0}° off the motion around {}",
            scan.label(),
            run.size.to_degrees(),
            scan.span(run.first, run.last)
        ),
    })
}

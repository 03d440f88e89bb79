//! Steps of a stored angle over half a turn, told apart: a wrap while the joint hardly moves, or a real move that the
//! file may mean.

use std::cell::OnceCell;
use std::collections::BTreeMap;

use crate::clip::FileAngles;

use super::branches::{Branches, is_finite, short};
use super::scan::Scan;

/// The joint hardly moves below this, whatever its rates.
const HARDLY_DEG: f64 = 30.0;

/// Or below this many times its usual step near by.
const USUAL_STEPS: f64 = 2.5;

/// What is left of a wrap once its whole turns are taken out is never more than this.
const WRAP_REST_DEG: f64 = 90.0;

/// A step so near a whole turn is a wrap unless the joint jumps.
const NEAR_WHOLE_DEG: f64 = 40.0;
const JUMP_DEG: f64 = 60.0;

/// Up to this many keys at the start, and this share of all, a run there is taken for the wrong one: a calibration pose.
const START_KEYS: usize = 3;
const START_SHARE: usize = 20;

/// Keys looked at to both sides for the usual step.
const NEAR_KEYS: usize = 5;

/// A step over half a turn of one stored angle.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct AngleStep {
    /// The key after the step.
    pub(super) key: usize,
    /// Which of the three angles.
    pub(super) channel: usize,
    /// The whole turns that take the step out of all that follows.
    pub(super) turns: i32,
    /// Whether the angle leaves (1) or enters (−1) its usual range with this step.
    pub(super) leaves: i8,
    /// Whether it is a wrap.
    pub(super) is_wrap: bool,
}

/// The steps of a joint's angles, sorted out.
#[derive(Clone, Debug, Default)]
pub(super) struct SortedSteps {
    /// Runs `(first, last, turns)` that are whole turns off.
    pub(super) wraps: Vec<(usize, usize, [i32; 3])>,
    /// Steps with which the joint really moves.
    pub(super) moves: Vec<AngleStep>,
}

/// Pairs each step of a channel with its way back. A pair of which one is a wrap is a run that is whole turns off; so is
/// all that follows a wrap without a way back. The rest are moves.
pub(super) fn sorted_steps(scan: &Scan<'_>, angles: &FileAngles, branches: &Branches) -> SortedSteps {
    let steps = angle_steps(scan, angles, branches);
    let mut wraps: BTreeMap<(usize, usize), [i32; 3]> = BTreeMap::new();
    let mut add = |run: (usize, usize), channel: usize, turns: i32| {
        wraps.entry(run).or_default()[channel] = turns;
    };
    let mut moves = Vec::new();
    for channel in 0..3 {
        // A step out of the usual range goes with one back in, and a step inside it with another.
        let mut open: [Vec<AngleStep>; 2] = [Vec::new(), Vec::new()];
        for &step in steps.iter().filter(|step| step.channel == channel) {
            let lane = &mut open[usize::from(step.leaves != 0)];
            match lane.pop_if(|way_in| way_in.turns == -step.turns) {
                Some(way_in) if way_in.is_wrap || step.is_wrap => {
                    add((way_in.key, step.key - 1), channel, way_in.turns);
                }
                Some(way_in) => moves.extend([way_in, step]),
                None => lane.push(step),
            }
        }
        for step in open.into_iter().flatten() {
            if !step.is_wrap {
                moves.push(step);
                continue;
            }
            // What lies outside the usual range is the fault; else the start is right, but for a pose or two.
            let few = step.key <= START_KEYS && step.key * START_SHARE <= angles.degrees.len();
            let from_start =
                step.leaves < 0 || (step.leaves == 0 && few && starts_apart(angles, channel, step.key));
            if from_start {
                add((0, step.key - 1), channel, -step.turns);
            } else {
                add((step.key, angles.degrees.len() - 1), channel, step.turns);
            }
        }
    }
    moves.sort_by_key(|step| (step.key, step.channel));
    let wraps = wraps.into_iter().map(|((first, last), turns)| (first, last, turns)).collect();
    SortedSteps { wraps, moves }
}

/// Whether the angle of the first keys has its sign alone: no later step comes back to it.
fn starts_apart(angles: &FileAngles, channel: usize, until: usize) -> bool {
    let sign = |key: usize| angles.degrees[key][channel] < 0.0;
    (until..angles.degrees.len()).all(|key| sign(key) != sign(0))
}

/// All steps over half a turn between keys on the kept branch, in order.
fn angle_steps(scan: &Scan<'_>, angles: &FileAngles, branches: &Branches) -> Vec<AngleStep> {
    let degrees: &[[f64; 3]] = &angles.degrees;
    let lows = [const { OnceCell::new() }; 3];
    let mut steps = Vec::new();
    let mut before: Option<(usize, [i32; 3])> = None;
    for (stretch, end) in branches.stretches(degrees.len()).filter(|(stretch, _)| !stretch.is_mirrored) {
        let is_sound = |key: &usize| is_finite(&degrees[*key]);
        let (Some(key), Some(last)) =
            ((stretch.first..end).find(is_sound), (stretch.first..end).rev().find(is_sound))
        else {
            continue;
        };
        let level = stretch.turns.map(|turns| turns as i32);
        if let Some((near, near_level)) = before {
            for channel in 0..3 {
                // Angles beyond ±2³¹ turns have no digits left for the turn itself.
                let turns = level[channel].saturating_sub(near_level[channel]);
                if turns != 0 {
                    let low = lows[channel].get_or_init(|| usual_low(degrees, channel));
                    let inside = |key: usize| (-1e-3..=360.001).contains(&(degrees[key][channel] - low));
                    steps.push(AngleStep {
                        key,
                        channel,
                        turns,
                        leaves: i8::from(!inside(key)) - i8::from(!inside(near)),
                        is_wrap: key > near + 1 || is_wrap(scan, angles, key, channel),
                    });
                }
            }
        }
        before = Some((last, level));
    }
    steps
}

/// Where the usual range of an angle begins: most files keep to ±180, some to 0 to 360.
fn usual_low(degrees: &[[f64; 3]], channel: usize) -> f64 {
    let (mut around, mut above) = (0usize, 0usize);
    for triple in degrees {
        let angle = triple[channel];
        around += usize::from((-180.0..=180.0).contains(&angle));
        above += usize::from((0.0..=360.0).contains(&angle));
    }
    if above > around { 0.0 } else { -180.0 }
}

fn is_wrap(scan: &Scan<'_>, angles: &FileAngles, key: usize, channel: usize) -> bool {
    let step = |key: usize| angles.degrees[key][channel] - angles.degrees[key - 1][channel];
    let own = step(key);
    // A wheel that is stored with whole steps of more than half a turn goes on so; a wrap comes once.
    let goes_on = |key: usize| {
        (1..angles.degrees.len()).contains(&key)
            && step(key).signum() == own.signum()
            && step(key).abs() > 180.0
    };
    let Some(turn) = turn_into(scan, key) else { return false };
    if short(own).abs() > WRAP_REST_DEG || goes_on(key - 1) || goes_on(key + 1) {
        return false;
    }
    if short(own).abs() <= NEAR_WHOLE_DEG && turn < JUMP_DEG {
        return true;
    }
    turn < HARDLY_DEG || turn < USUAL_STEPS * usual_step(scan, key)
}

/// The turn of the joint into a key, in degrees.
fn turn_into(scan: &Scan<'_>, key: usize) -> Option<f64> {
    Some(scan.unit(key.checked_sub(1)?)?.turn_to(scan.unit(key)?).to_degrees())
}

/// The median turn into the keys around, the own left out, in degrees.
fn usual_step(scan: &Scan<'_>, key: usize) -> f64 {
    let last = scan.keys.len() - 1;
    let near = key.saturating_sub(NEAR_KEYS).max(1)..=(key + NEAR_KEYS).min(last);
    let mut turns: Vec<f64> =
        near.filter(|&other| other != key).filter_map(|key| turn_into(scan, key)).collect();
    turns.sort_by(f64::total_cmp);
    turns.get(turns.len() / 2).copied().unwrap_or(0.0)
}

//! Runs of keys in which a joint stands perfectly still although it moves: a signal that dropped out.

use std::cell::OnceCell;
use std::f64::consts::PI;

use crate::rotor::Rotor;

use super::roughness::angle_of_dot;
use super::scan::{Finding, Scan, View, runs_of};
use super::{Remedy, Snag, SnagKind};

/// With fewer keys nothing can be said about how a joint moves.
const LEAST_KEYS: usize = 16;

/// The shortest run told: so many keys that repeat the one before them, and this long.
const SHORTEST_KEYS: usize = 3;
const SHORTEST_SECS: f64 = 0.04;

/// Steps up to this are none: what is left of equal numbers after a change of format.
pub(super) const STILL_RAD: f64 = 2e-5 / 180.0 * PI;

/// A joint whose smallest steps (this share of all) are so many times what counts as still never stands still by itself:
/// it carries the noise of a capture, or moves on all the time.
const SMALLEST_SHARE: f64 = 0.02;
const LIVE: f64 = 5.0;

/// As long as no more than this share of its other steps repeats.
const LIVE_REPEATS: f64 = 0.02;

/// A joint that has more long rests than this many and one for each so many seconds rests by habit. One that is still in more than this share
/// of its steps does too, so that only a rest in the midst of motion, which it then catches up with, is told.
const HABIT_SHARE: f64 = 0.5;
const HABIT_RUNS: usize = 4;
const HABIT_SECS: f64 = 1.0;

/// With fewer steps in which it moves a joint shows nothing of how it does.
const LEAST_MOVING: usize = NEAR + 2;

/// Steps on each side of a run that tell how the joint moves there.
const NEAR: usize = 4;

/// A run that ends by a step of so many usual ones, and at least so wide, has missed motion that it now catches up with.
const CATCH_UP: f64 = 2.0;
const CATCH_UP_RAD: f64 = 1.0 / 180.0 * PI;

/// How abruptly a rest is entered and left: its last step as a share of those before it, and its first one as a share of
/// those after it, each counted up to this, both together. A rest that is eased into and out of is meant.
const MOST_ABRUPT: f64 = 1.5;
const ABRUPT: f64 = 1.35;
const VERY_ABRUPT: f64 = 1.7;
const EASED: f64 = 0.6;

/// So many abrupt rests of a joint that also rests by itself are its manner.
const MANNER: usize = 2;

/// Steps that differ by no more than this share are those of a straight way between far keys: rests between such are meant.
const EVEN: f64 = 5e-3;

/// A pose that is taken so many more times is the end of the joint's range, where a solver holds it.
const FOUND_AGAIN: usize = 3;

/// When this share of the other moving joints repeats its frames too, the whole clip was held.
const HELD_SHARE: f64 = 0.5;

/// Steps of another joint that tell whether it moves at all.
const SAMPLED: usize = 48;

/// Finds stuck runs of one joint.
pub(super) fn find(view: View<'_>, joint: usize) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint).filter(|scan| scan.keys.len() >= LEAST_KEYS) else {
        return Vec::new();
    };
    let rests = rests(&scan);
    if rests.is_empty() {
        return Vec::new();
    }
    let Some(habits) = Habits::new(&scan, &rests) else { return Vec::new() };
    rests.into_iter().filter_map(|rest| judge(&scan, &habits, rest)).collect()
}

/// Keys `first..=last` that repeat the pose of the key before them.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Rest {
    first: usize,
    last: usize,
}

/// Whether two keys hold the same pose but for rounding.
pub(super) fn is_same(a: Rotor, b: Rotor) -> bool {
    // The chord of two unit rotors is half the turn, for small turns.
    const LEAST: f64 = STILL_RAD * STILL_RAD / 4.0;
    let b = b.aligned_to(a);
    let chord = (a.s - b.s).powi(2) + (a.yz - b.yz).powi(2) + (a.zx - b.zx).powi(2) + (a.xy - b.xy).powi(2);
    chord <= LEAST
}

/// All runs of repeated keys long enough to be looked at, inside the clip.
fn rests(scan: &Scan<'_>) -> Vec<Rest> {
    let keys = scan.keys;
    let repeats = |key: &usize| *key > 0 && is_same(keys[key - 1], keys[*key]) && scan.moves_after(key - 1);
    runs_of(scan.outline().repeating().filter(repeats).map(|key| (key, ())))
        .into_iter()
        .map(|(first, last, ())| Rest { first, last })
        .filter(|rest| {
            let secs = scan.secs(rest.last) - scan.secs(rest.first - 1);
            rest.last + 1 - rest.first >= SHORTEST_KEYS && secs >= SHORTEST_SECS
        })
        .collect()
}

/// How a joint moves and rests over the whole clip.
struct Habits {
    /// The size of the scalar part of each key, in order, with the key: equal poses lie close together there.
    by_scalar: OnceCell<Vec<(f64, usize)>>,
    /// Whether it never stands still by itself.
    is_live: bool,
    /// Whether it stops and goes on abruptly time and again.
    has_manner: bool,
    /// Whether it is still most of the time.
    is_still: bool,
}

impl Habits {
    /// `None` for a joint that has many rests, or that never moves.
    fn new(scan: &Scan<'_>, rests: &[Rest]) -> Option<Self> {
        let count = scan.keys.len();
        let secs = scan.secs(count - 1) - scan.secs(0);
        if rests.len() > HABIT_RUNS + (secs / HABIT_SECS) as usize {
            return None;
        }
        let resting: usize = rests.iter().map(|rest| rest.last + 1 - rest.first).sum();
        let mut moving: Vec<f64> =
            (1..count).map(|key| step(scan, key)).filter(|own| *own > STILL_RAD).collect();
        if moving.len() < LEAST_MOVING {
            return None;
        }
        let is_still = (moving.len() as f64) < (1.0 - HABIT_SHARE) * (count - 1) as f64;
        let repeats = (count - 1 - moving.len()).saturating_sub(resting) as f64;
        let rank = (SMALLEST_SHARE * moving.len() as f64) as usize;
        let smallest = *moving.select_nth_unstable_by(rank, f64::total_cmp).1;
        let abrupt = |rest: &&Rest| Ends::new(scan, **rest).is_some_and(|ends| ends.is_very_abrupt());
        Some(Self {
            by_scalar: OnceCell::new(),
            has_manner: rests.iter().filter(abrupt).count() > MANNER,
            is_still,
            is_live: !is_still
                && repeats <= LIVE_REPEATS * moving.len() as f64
                && smallest >= LIVE * STILL_RAD,
        })
    }
}

/// The turn into a key; 0 where a key is no rotation.
fn step(scan: &Scan<'_>, key: usize) -> f64 {
    match (scan.unit(key - 1), scan.unit(key)) {
        (Some(a), Some(b)) if !is_same(a, b) => angle_of_dot(a.dot(b)),
        _ => 0.0,
    }
}

/// The middle rate, in radians per second, of the steps into `keys`; 0 without any.
fn usual_rate(scan: &Scan<'_>, keys: impl Iterator<Item = usize>) -> f64 {
    let mut rates: Vec<f64> =
        keys.map(|key| step(scan, key) / (scan.secs(key) - scan.secs(key - 1))).collect();
    rates.sort_by(f64::total_cmp);
    rates.get(rates.len() / 2).copied().unwrap_or(0.0)
}

/// Whether the steps into `keys`, a whole row of them, are all alike.
fn is_even(scan: &Scan<'_>, keys: std::ops::Range<usize>) -> bool {
    let steps: Vec<f64> = keys.map(|key| step(scan, key)).collect();
    let least = steps.iter().copied().fold(f64::INFINITY, f64::min);
    let most = steps.iter().copied().fold(0.0, f64::max);
    steps.len() >= NEAR && most - least <= EVEN * most
}

/// How a joint moves on both sides of a rest.
struct Ends {
    /// Usual rate before and after, in radians per second.
    before: f64,
    after: f64,
    /// The step out of the rest, in radians.
    exit: f64,
    /// The last step before the rest as a share of the usual ones there.
    entry: f64,
    /// The rest ends by a step that catches up with motion missed.
    catches_up: bool,
    /// Shares of the usual steps by which the rest is entered and left, together.
    abruptness: f64,
    /// One of them is small.
    is_eased: bool,
    /// Steps on both sides are all alike.
    is_even: bool,
}

impl Ends {
    /// `None` at either end of the track: motion on one side only, and holding a pose there is common.
    fn new(scan: &Scan<'_>, Rest { first, last }: Rest) -> Option<Self> {
        let count = scan.keys.len();
        if first < 2 || last + 2 >= count {
            return None;
        }
        let (from, to) = (first.saturating_sub(NEAR).max(1), (last + 2 + NEAR).min(count));
        let (before, after) = (usual_rate(scan, from..first), usual_rate(scan, last + 2..to));
        let exit = step(scan, last + 1);
        let exit_secs = scan.secs(last + 1) - scan.secs(last);
        let entry_rate = step(scan, first - 1) / (scan.secs(first - 1) - scan.secs(first - 2));
        let share = |own: f64, usual: f64| if usual > 0.0 { (own / usual).min(MOST_ABRUPT) } else { 0.0 };
        let shares = [share(entry_rate, before), share(exit / exit_secs, after)];
        Some(Self {
            before,
            after,
            exit,
            catches_up: exit >= CATCH_UP_RAD && exit >= CATCH_UP * before.max(after) * exit_secs,
            entry: shares[0],
            abruptness: shares[0] + shares[1],
            is_eased: shares[0].min(shares[1]) < EASED,
            is_even: is_even(scan, from..first) && is_even(scan, last + 2..to),
        })
    }

    fn is_very_abrupt(&self) -> bool {
        self.abruptness >= VERY_ABRUPT && !self.is_even
    }
}

fn judge(scan: &Scan<'_>, habits: &Habits, rest: Rest) -> Option<Snag> {
    let Rest { first, last } = rest;
    let ends = Ends::new(scan, rest)?;
    let is_inside = ends.before > 0.0 && ends.after > 0.0;
    let confidence = match (habits.is_live, ends.catches_up) {
        (true, true) => 0.95,
        (true, false) if ends.abruptness >= ABRUPT && !ends.is_even && !habits.is_found_again(scan, rest) => {
            0.8
        }
        (false, true) if is_inside && ends.is_very_abrupt() => 0.6,
        (false, true) if ends.before > 0.0 && ends.after <= 0.0 && ends.entry >= EASED => 0.5,
        (false, false) if is_inside && ends.is_very_abrupt() && !habits.has_manner && !habits.is_still => 0.5,
        _ => return None,
    };
    let along = Along::new(scan, rest);
    // Where nothing was missed and one side is eased, one joint that rests at the very same frames is enough: a pose that was
    // meant.
    if along.is_held() || (along.alike > 0 && !ends.catches_up && ends.is_eased) {
        return None;
    }
    let name = scan.label();
    let across = step_between(scan, first - 1, last + 1);
    let (from, to) = (scan.frame(first), scan.frame(last));
    let degrees = ends.exit.to_degrees();
    let text = if ends.catches_up {
        format!("{name} stands still at frames {from} to {to}, then jumps {degrees:.1}°")
    } else {
        format!("{name} stands still at frames {from} to {to} inside its motion")
    };
    Some(scan.snag(Finding {
        kind: SnagKind::Stuck,
        keys: (first, last),
        size_rad: across,
        confidence,
        remedy: Remedy::FromOthers,
        safe: habits.is_live,
        text,
    }))
}

fn step_between(scan: &Scan<'_>, a: usize, b: usize) -> f64 {
    match (scan.unit(a), scan.unit(b)) {
        (Some(a), Some(b)) => angle_of_dot(a.dot(b)),
        _ => 0.0,
    }
}

impl Habits {
    /// Whether the joint takes the very pose of the rest at other times too: it stands at the end of its range.
    fn is_found_again(&self, scan: &Scan<'_>, rest: Rest) -> bool {
        let by_scalar = self.by_scalar.get_or_init(|| {
            let mut sorted: Vec<(f64, usize)> = scan.keys.iter().map(|own| own.s.abs()).zip(0..).collect();
            sorted.sort_by(|a, b| a.0.total_cmp(&b.0));
            sorted
        });
        let held = scan.keys[rest.first];
        let (low, high) = (held.s.abs() - STILL_RAD, held.s.abs() + STILL_RAD);
        let near = &by_scalar[by_scalar.partition_point(|(own, _)| *own < low)..];
        let is_again = |(_, key): &&(f64, usize)| {
            !(rest.first - 1..=rest.last).contains(key) && is_same(scan.keys[*key], held)
        };
        near.iter().take_while(|(own, _)| *own <= high).filter(is_again).take(FOUND_AGAIN).count()
            == FOUND_AGAIN
    }
}

/// What the other joints that move at all do during a rest.
#[derive(Default)]
struct Along {
    moving: usize,
    /// Those that repeat their frames too.
    held: usize,
    /// Those of them that do at the very same frames, and neither before nor after.
    alike: usize,
}

impl Along {
    fn new(scan: &Scan<'_>, rest: Rest) -> Self {
        let mut along = Self::default();
        let (start, end) = (scan.secs(rest.first - 1), scan.secs(rest.last));
        for other in scan.clip.skeleton.listed().filter(|other| *other != scan.joint) {
            let Some(other) = scan.other(other) else { continue };
            let count = other.keys.len();
            let sampled = (count.saturating_sub(1)).min(SAMPLED);
            let steps = (0..sampled).map(|i| 1 + i * (count - 1) / sampled);
            let moves = steps.filter(|&key| !is_same(other.keys[key - 1], other.keys[key])).count();
            if moves * 2 <= sampled {
                continue;
            }
            along.moving += 1;
            let (from, to) = (other.track.times.nearest(start), other.track.times.nearest(end));
            let keys = other.keys;
            let is_repeat = |key: usize| (1..count).contains(&key) && is_same(keys[key - 1], keys[key]);
            let repeats = (from + 1..=to).filter(|&key| is_repeat(key)).count();
            along.held += usize::from(to > from && repeats * 5 >= (to - from) * 4);
            along.alike +=
                usize::from(to > from && repeats == to - from && !is_repeat(from) && !is_repeat(to + 1));
        }
        along
    }

    /// Whether the whole clip was held.
    fn is_held(&self) -> bool {
        self.held > 0 && self.held as f64 >= HELD_SHARE * self.moving as f64
    }
}

//! Neighbouring keys that store the same turn with opposite signs.

use std::f64::consts::TAU;

use crate::clip::PathKind;

use super::scan::{Finding, Scan, View, runs};
use super::{Remedy, Snag, SnagKind};

/// A dot product of unit rotors this near 0 is a turn of exactly half a round: both ways are equally long.
const AMBIGUOUS_DOT: f64 = 1e-9;

/// Cosine of half of 170°: beyond it a sign change beside a real turn is no fault of the sign.
const REAL_TURN_DOT: f64 = 0.087_155_742_747_658_17;

/// How the sign goes on from one key to the next.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Step {
    Kept,
    Flipped,
    Ambiguous,
}

/// Finds sign flips of one joint. Only where the file stores rotors: elsewhere signs are our own choice.
///
/// A cubic segment between opposite signs moves otherwise than one between equal signs, so it is a long way and none of
/// these.
pub(super) fn find(view: View<'_>, joint: usize) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint).filter(Scan::stores_rotors) else { return Vec::new() };
    let steps = steps(&scan);
    let mut snags: Vec<Snag> = steps
        .iter()
        .enumerate()
        .filter(|(_, step)| **step == Step::Ambiguous)
        .map(|(key, _)| ambiguous(&scan, key))
        .collect();

    let mut negative = false;
    let mut signs: Vec<bool> = steps
        .iter()
        .map(|step| {
            negative ^= *step == Step::Flipped;
            negative
        })
        .collect();
    if starts_wrong(&signs) {
        for sign in &mut signs {
            *sign = !*sign;
        }
    }
    for (first, last, ()) in runs(signs.iter().map(|&sign| sign.then_some(()))) {
        snags.push(flipped(&scan, first, last));
    }
    snags
}

/// The step into each key; the first has none.
fn steps(scan: &Scan<'_>) -> Vec<Step> {
    let mut before = None;
    (0..scan.keys.len())
        .map(|key| {
            let Some(own) = scan.unit(key) else { return Step::Kept };
            let Some(near) = before.replace(own) else { return Step::Kept };
            let dot = own.dot(near);
            if scan.track.paths.of(key - 1) == PathKind::Cubic {
                Step::Kept
            } else if dot.abs() <= AMBIGUOUS_DOT {
                Step::Ambiguous
            } else if dot < -REAL_TURN_DOT {
                Step::Flipped
            } else {
                Step::Kept
            }
        })
        .collect()
}

/// Whether it is the few keys before the only flip that are wrong: they are no more than an eighth of all.
fn starts_wrong(negative: &[bool]) -> bool {
    let first = negative.iter().take_while(|sign| !**sign).count();
    first * 8 <= negative.len() && negative[first..].iter().all(|sign| *sign)
}

fn flipped(scan: &Scan<'_>, first: usize, last: usize) -> Snag {
    // The four numbers turn by this much more than the joint does.
    let step = |key: usize| Some(scan.unit(key)?.turn_to(scan.unit(key.checked_sub(1)?)?));
    let size_rad = TAU - step(first).or_else(|| step(last + 1)).unwrap_or(0.0);
    scan.snag(Finding {
        kind: SnagKind::SignFlip,
        keys: (first, last),
        size_rad,
        confidence: 1.0,
        remedy: Remedy::Negate,
        safe: true,
        text: format!("{} stores its turn with the opposite sign {}", scan.label(), scan.span(first, last)),
    })
}

fn ambiguous(scan: &Scan<'_>, key: usize) -> Snag {
    scan.snag(Finding {
        kind: SnagKind::SignFlip,
        keys: (key, key),
        size_rad: TAU / 2.0,
        confidence: 0.5,
        remedy: Remedy::Ask,
        safe: false,
        text: format!(
            "{} turns by exactly 180° into frame {}: ambiguous, both ways are equally long",
            scan.label(),
            scan.frame(key)
        ),
    })
}

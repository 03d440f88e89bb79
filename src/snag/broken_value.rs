//! Stored values that are no rotation: not finite, zero, or off unit length.

use crate::clip::{PathKind, Stored};
use crate::rotor::slerp;

use super::branches::is_finite;
use super::scan::{Finding, Scan, View, runs, runs_of};
use super::{Memory, Remedy, Snag, SnagKind};

/// Lengths further from 1 than this are off.
const NORM_TOLERANCE: f64 = 1e-3;

/// Between these lengths only the length is wrong: the direction is trusted.
const SOUND_LENGTHS: std::ops::RangeInclusive<f64> = 0.5..=2.0;

/// How far, beside the step across it, a key of quite another length may lie from its neighbours and be trusted.
const SOUND_DIRECTION_RAD: f64 = 0.17;

#[derive(Clone, Copy, Debug, PartialEq)]
enum Fault {
    OffUnit,
    NoRotation,
}

/// Finds broken values of one joint.
pub(super) fn find(view: View<'_>, joint: usize, memory: &mut Memory) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint) else { return Vec::new() };
    let faults: Vec<(usize, usize, Fault)> = match &scan.track.stored {
        Stored::Angles(angles) => {
            // What is not finite is no calm step.
            let broken = |key: &&usize| !is_finite(&angles.degrees[**key]);
            runs_of(memory.wide(angles).iter().filter(broken).map(|&key| (key, Fault::NoRotation)))
        }
        Stored::PlaneAngles(degrees) => {
            runs(degrees.iter().map(|triple| (!is_finite(triple)).then_some(Fault::NoRotation)))
        }
        Stored::Rotors => runs((0..scan.keys.len()).map(|key| fault(&scan, key))),
    };
    faults
        .into_iter()
        .map(|(first, last, fault)| {
            let (name, span) = (scan.label(), scan.span(first, last));
            let (remedy, text) = match fault {
                Fault::OffUnit => {
                    let off = |key: usize| (scan.keys[key].norm() - 1.0).abs();
                    let worst = (first..=last).map(off).fold(0.0, f64::max);
                    (Remedy::Normalise, format!("{name} is off unit length by up to {worst:.4} {span}"))
                }
                Fault::NoRotation => (Remedy::Redraw, format!("{name} has no usable value {span}")),
            };
            scan.snag(Finding {
                kind: SnagKind::BrokenValue,
                keys: (first, last),
                size_rad: 0.0,
                confidence: 1.0,
                remedy,
                safe: true,
                text,
            })
        })
        .collect()
}

/// What is wrong with a stored rotor.
fn fault(scan: &Scan<'_>, key: usize) -> Option<Fault> {
    let norm = scan.keys[key].norm();
    let is_cubic = |segment: usize| scan.track.paths.of(segment) == PathKind::Cubic;
    let tangents_finite = scan.track.tangents.as_ref().is_none_or(|tangents| {
        let are_used = is_cubic(key) || (key > 0 && is_cubic(key - 1));
        !are_used || tangents[key].iter().all(|tangent| tangent.is_finite())
    });
    if !tangents_finite {
        Some(Fault::NoRotation)
    } else if (norm - 1.0).abs() <= NORM_TOLERANCE {
        None
    } else if SOUND_LENGTHS.contains(&norm) || points_along(scan, key) {
        Some(Fault::OffUnit)
    } else {
        Some(Fault::NoRotation)
    }
}

/// Whether a key of quite another length still lies on the way between its neighbours.
fn points_along(scan: &Scan<'_>, key: usize) -> bool {
    let neighbour =
        |key: Option<usize>| key.filter(|&key| key < scan.keys.len()).and_then(|key| scan.unit(key));
    let (before, after) = (neighbour(key.checked_sub(1)), neighbour(Some(key + 1)));
    match (before, scan.unit(key), after) {
        (Some(before), Some(own), Some(after)) => {
            own.turn_to(slerp(before, after, 0.5)) <= before.turn_to(after) + SOUND_DIRECTION_RAD
        }
        (Some(near), Some(own), None) | (None, Some(own), Some(near)) => {
            own.turn_to(near) <= SOUND_DIRECTION_RAD
        }
        _ => false,
    }
}

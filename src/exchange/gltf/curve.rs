//! Tracks to samplers: key times and values of 32 bits, with one of glTF's three interpolations.

use std::borrow::Cow;

use glam::DVec3;

use crate::clip::{PathKind, Paths, RotationTrack, Times, VectorPath, VectorTrack};
use crate::rotor::{Rotor, slerp};

use super::follow::{Followed, TOLERANCE_RAD, playable};
use super::tracks::Interpolation;

/// What a sampler holds, ready to be written.
#[derive(Clone, Debug)]
pub(super) struct Curve {
    /// Key times in seconds, strictly rising.
    pub secs: Vec<f32>,
    /// Numbers of the output accessor.
    pub values: Vec<f32>,
    /// `VEC3` or `VEC4`.
    pub kind: &'static str,
    /// Elements of the output accessor.
    pub count: usize,
    /// The interpolation.
    pub interpolation: Interpolation,
    /// Keys that fell together with the next when their times were rounded to 32 bits.
    pub n_merged: usize,
    /// How far it was measured to be from a track that it only follows, in radians.
    pub off_rad: f64,
}

impl Curve {
    /// Of turns. Keys keep their numbers, rounded to 32 bits; signs stay.
    pub(super) fn of_rotation(track: &RotationTrack) -> Self {
        Self::of_followed(&playable(track))
    }

    /// Of turns that one interpolation says.
    pub(super) fn of_followed(followed: &Followed<'_>) -> Self {
        let track = &followed.track;
        let quaternion = |rotor: Rotor| rotor.to_xyzw().map(|number| number as f32);
        let interpolation = match (track.paths.of(0), &track.tangents) {
            (PathKind::Hold, _) => Interpolation::Step,
            (PathKind::Cubic, Some(_)) => Interpolation::CubicSpline,
            _ => Interpolation::Linear,
        };
        let per_key = |key: usize| match (&track.tangents, interpolation) {
            (Some(tangents), Interpolation::CubicSpline) => {
                vec![
                    quaternion(tangents[key][0]),
                    quaternion(track.keys.rotor(key)),
                    quaternion(tangents[key][1]),
                ]
            }
            _ => vec![quaternion(track.keys.rotor(key))],
        };
        Self { off_rad: followed.off_rad, ..Self::new(&track.times, "VEC4", interpolation, per_key) }
    }

    /// Of places or sizes.
    pub(super) fn of_vector(track: &VectorTrack) -> Self {
        let vector = |v: DVec3| v.to_array().map(|number| number as f32);
        let interpolation = match (track.path, &track.tangents) {
            (VectorPath::Hold, _) => Interpolation::Step,
            (VectorPath::Cubic, Some(_)) => Interpolation::CubicSpline,
            _ => Interpolation::Linear,
        };
        let per_key = |key: usize| match (&track.tangents, interpolation) {
            (Some(tangents), Interpolation::CubicSpline) => {
                vec![vector(tangents[key][0]), vector(track.keys.vector(key)), vector(tangents[key][1])]
            }
            _ => vec![vector(track.keys.vector(key))],
        };
        Self::new(&track.times, "VEC3", interpolation, per_key)
    }

    fn new<const N: usize>(
        times: &Times,
        kind: &'static str,
        interpolation: Interpolation,
        per_key: impl Fn(usize) -> Vec<[f32; N]>,
    ) -> Self {
        let rounded: Vec<f32> = times.iter().map(|secs| secs as f32).collect();
        // Of keys that fall together the last is kept, as on reading.
        let kept: Vec<usize> = (0..rounded.len())
            .filter(|&key| rounded.get(key + 1).is_none_or(|next| *next > rounded[key]))
            .collect();
        let elements: Vec<[f32; N]> = kept.iter().flat_map(|&key| per_key(key)).collect();
        Self {
            secs: kept.iter().map(|&key| rounded[key]).collect(),
            count: elements.len(),
            values: elements.into_iter().flatten().collect(),
            kind,
            interpolation,
            n_merged: rounded.len() - kept.len(),
            off_rad: 0.0,
        }
    }

    /// Gives keys of turns that differ from those of `old` the sign of the key before them, so that a player that does
    /// not look at signs goes the short way too. Keys that did not change keep every bit; with other times all keys are
    /// new. Signs of smooth keys choose their path and stay; where keys are held, signs mean nothing.
    pub(super) fn unroll(&mut self, old: Option<&Self>) {
        if self.kind != "VEC4" || self.interpolation != Interpolation::Linear {
            return;
        }
        let old = old.filter(|old| old.interpolation == self.interpolation && self.has_times_of(old));
        for key in 1..self.count {
            let at = 4 * key;
            let is_old = |old: &Self| bits(&old.values[at..at + 4]).eq(bits(&self.values[at..at + 4]));
            if old.is_some_and(is_old) {
                continue;
            }
            let (before, own) = self.values[at - 4..at + 4].split_at_mut(4);
            let dot: f32 = before.iter().zip(&*own).map(|(a, b)| a * b).sum();
            if dot < 0.0 {
                for number in own {
                    *number = -*number;
                }
            }
        }
    }

    /// What is worth telling of it: keys that fell together, a path that it could not follow within the tolerance.
    pub(super) fn remarks(&self) -> Vec<String> {
        let merged = (self.n_merged > 0).then(|| {
            let count = self.n_merged;
            format!("{count} key(s) fell together with the next when times were rounded to 32 bits")
        });
        let off = (self.off_rad > TOLERANCE_RAD).then(|| {
            format!(
                "expected to follow the path within {:.2} degrees, found it up to {:.3} off",
                TOLERANCE_RAD.to_degrees(),
                self.off_rad.to_degrees()
            )
        });
        merged.into_iter().chain(off).collect()
    }

    /// Whether both would be written with the very same bits.
    pub(super) fn is_same(&self, other: &Self) -> bool {
        self.interpolation == other.interpolation
            && self.kind == other.kind
            && self.has_times_of(other)
            && bits(&self.values).eq(bits(&other.values))
    }

    /// Whether both have the same key times to the bit.
    pub(super) fn has_times_of(&self, other: &Self) -> bool {
        bits(&self.secs).eq(bits(&other.secs))
    }
}

/// The bits of floats: equal for what is not a number too.
pub(super) fn bits(floats: &[f32]) -> impl Iterator<Item = u32> {
    floats.iter().map(|float| float.to_bits())
}

/// A track of unit rotors whose signs follow one another, with keys put in where neighbours are more than
/// `largest_arc_rad` apart, so that every player turns the same way.
pub(super) fn unrolled(track: &RotationTrack, largest_arc_rad: f64) -> Followed<'_> {
    let followed = playable(track);
    let (track, off_rad) = (&followed.track, followed.off_rad);
    if track.paths.of(0) == PathKind::Cubic && track.tangents.is_some() {
        // The signs and lengths of such keys choose the path.
        return followed;
    }
    let mut secs: Vec<f64> = Vec::with_capacity(track.keys.len());
    let mut keys: Vec<Rotor> = Vec::with_capacity(track.keys.len());
    let mut push = |time: f64, key: Rotor| {
        keys.push(keys.last().map_or(key, |before| key.aligned_to(*before)));
        secs.push(time);
    };
    let n_keys = track.keys.len();
    for key in 0..n_keys {
        let (start, own) = (track.times.at(key), track.sound_key(key));
        push(start, own);
        if key + 1 < n_keys && track.paths.of(key) == PathKind::Slerp {
            let (end, next) = (track.times.at(key + 1), track.sound_key(key + 1));
            let pieces = (own.turn_to(next) / largest_arc_rad).ceil() as u32;
            for piece in 1..pieces {
                let share = f64::from(piece) / f64::from(pieces);
                push(start + (end - start) * share, slerp(own, next, share).normalize());
            }
        }
    }
    let path = if track.paths.of(0) == PathKind::Hold { PathKind::Hold } else { PathKind::Slerp };
    let times = if keys.len() == n_keys { track.times.clone() } else { Times::Listed(secs.into()) };
    let track = RotationTrack { paths: Paths::Every(path), ..RotationTrack::from_rotors(times, keys) };
    Followed { track: Cow::Owned(track), off_rad }
}

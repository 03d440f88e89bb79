//! The turns of one joint over time.

use std::sync::Arc;

use crate::rotor::{Axis, Bivector, EulerOrder, Rotor};

use super::angle_rows::rotors;
use super::continuity::refit;
use super::degrees::Degrees;
use super::keys::Keys;
use super::path::{PathKind, Paths, Segments};
use super::times::Times;

/// The angles a file stores for a joint in place of a rotor.
#[derive(Clone, Debug, PartialEq)]
pub struct FileAngles {
    /// The axes in the order the file lists them; one, two or three.
    pub axes: Vec<Axis>,
    /// The order they belong to, filled up where the file has fewer than three.
    pub order: EulerOrder,
    /// Degrees as the file has them, a triple for each key in the axes' order; what the file lacks is 0.
    pub degrees: Degrees,
}

impl FileAngles {
    /// The rotor of a triple in degrees.
    pub fn rotor(&self, degrees: [f64; 3]) -> Rotor {
        self.order.to_rotor(degrees.map(f64::to_radians))
    }
}

/// How the file itself holds the turns of a track, beside the rotors made of it.
#[derive(Clone, Debug, PartialEq)]
pub enum Stored {
    /// The four numbers of each key; their signs and lengths are the file's own.
    Rotors,
    /// Euler angles (BVH, and CSV of that kind).
    Angles(FileAngles),
    /// Plane angles in degrees, yz, zx, xy (CSV of that kind).
    PlaneAngles(Arc<[[f64; 3]]>),
}

/// Keys of one joint's turn relative to its parent.
///
/// The rotors are as stored: they may be off unit length, of changing sign, or not finite; [`RotationTrack::at`] copes.
#[derive(Clone, Debug, PartialEq)]
pub struct RotationTrack {
    /// Key times in seconds.
    pub times: Times,
    /// A rotor for each key, as stored.
    pub keys: Keys,
    /// Path kinds of the segments.
    pub paths: Paths,
    /// In- and out-tangent of each key, per second, of the four numbers; for [`PathKind::Cubic`] alone.
    pub tangents: Option<Arc<[[Rotor; 2]]>>,
    /// Spacing and meant turns of the segments, and what smooth paths do at the track's ends.
    pub segments: Segments,
    /// The file's own form.
    pub stored: Stored,
}

impl RotationTrack {
    /// A track of rotors with slerp between.
    pub fn from_rotors(times: Times, keys: impl Into<Keys>) -> Self {
        Self {
            times,
            keys: keys.into(),
            paths: Paths::Every(PathKind::Slerp),
            tangents: None,
            segments: Segments::default(),
            stored: Stored::Rotors,
        }
    }

    /// A track of a file's angles, a triple in degrees for each key, with slerp between.
    /// Angles that are not finite give rotors that are not.
    pub fn from_angles(times: Times, angles: FileAngles) -> Self {
        let keys = rotors(angles.order, &angles.degrees);
        Self { stored: Stored::Angles(angles), ..Self::from_rotors(times, keys) }
    }

    /// A track of plane angles in degrees, a triple yz, zx, xy for each key, with slerp between.
    pub fn from_plane_angles(times: Times, degrees: Arc<[[f64; 3]]>) -> Self {
        Self {
            times,
            keys: aligned(degrees.iter().map(|&d| Rotor::from_plane_angles(Bivector::from_degrees(d)))),
            paths: Paths::Every(PathKind::Slerp),
            tangents: None,
            segments: Segments::default(),
            stored: Stored::PlaneAngles(degrees),
        }
    }

    /// This track, of which playing at many times keeps nothing: several times as slow, for clips that would take many
    /// times the memory of their file.
    #[must_use]
    pub fn lean(self) -> Self {
        Self { keys: self.keys.lean(), ..self }
    }

    /// The file's angles, where it stores such.
    pub fn file_angles(&self) -> Option<&FileAngles> {
        match &self.stored {
            Stored::Angles(angles) => Some(angles),
            Stored::Rotors | Stored::PlaneAngles(_) => None,
        }
    }

    /// The unit rotor of a key; where it is not finite or zero, of the nearest sound key before it, else after it.
    pub fn sound_key(&self, key: usize) -> Rotor {
        let unit = |key: usize| self.keys.rotor(key).try_normalize();
        let before = || (0..key).rev().find_map(unit);
        let after = || (key + 1..self.keys.len()).find_map(unit);
        unit(key).or_else(before).or_else(after).unwrap_or(Rotor::IDENTITY)
    }

    /// This track with other rotors at some keys, `(key, rotor)`. All other keys keep their numbers. The file's own
    /// form follows: of the equal triples those with the least steps are taken, over each run of neighbouring keys.
    ///
    /// # Panics
    /// When a key does not exist.
    #[must_use]
    pub fn with_keys(&self, changes: &[(usize, Rotor)]) -> Self {
        let mut keys = self.keys.to_vec();
        for &(key, rotor) in changes {
            keys[key] = rotor;
        }
        let stored = match &self.stored {
            Stored::Rotors => Stored::Rotors,
            Stored::Angles(angles) => {
                let mut degrees = angles.degrees.to_vec();
                refit(angles.order, &mut degrees, changes);
                Stored::Angles(FileAngles { degrees: degrees.into(), ..angles.clone() })
            }
            Stored::PlaneAngles(degrees) => {
                let mut degrees = degrees.to_vec();
                for &(key, rotor) in changes {
                    degrees[key] = rotor.plane_angles().to_degrees();
                }
                Stored::PlaneAngles(degrees.into())
            }
        };
        Self { keys: keys.into(), stored, ..self.clone() }
    }

    /// This track with other file angles in degrees at some keys, `(key, triple)`, and the rotors that follow from them.
    /// A track without file angles stays as it is.
    ///
    /// # Panics
    /// When a key does not exist.
    #[must_use]
    pub fn with_angles(&self, changes: &[(usize, [f64; 3])]) -> Self {
        let Stored::Angles(angles) = &self.stored else { return self.clone() };
        let mut degrees = angles.degrees.to_vec();
        let mut keys = self.keys.to_vec();
        for &(key, triple) in changes {
            degrees[key] = triple;
            keys[key] = angles.rotor(triple).aligned_to(keys[key]);
        }
        let stored = Stored::Angles(FileAngles { degrees: degrees.into(), ..angles.clone() });
        Self { keys: keys.into(), stored, ..self.clone() }
    }

    /// Some neighbouring keys as a track of their own, with the segments between them. Its smooth paths end where it ends, so
    /// they play as before only some keys inside.
    ///
    /// # Panics
    /// When a key does not exist.
    #[must_use]
    pub fn part(&self, keys: std::ops::Range<usize>) -> Self {
        let own: Vec<usize> = keys.clone().collect();
        let starts = &own[..own.len().saturating_sub(1)];
        let kinds: Vec<PathKind> = starts.iter().map(|&key| self.paths.of(key)).collect();
        let each: Vec<_> = starts.iter().map(|&key| self.segments.of(key)).collect();
        Self {
            times: Times::Listed(own.iter().map(|&key| self.times.at(key)).collect()),
            keys: own.iter().map(|&key| self.keys[key]).collect(),
            paths: if kinds.is_empty() { self.paths.clone() } else { Paths::from_kinds(&kinds) },
            tangents: self.tangents.as_ref().map(|all| all[keys].into()),
            // The turns are no more than they were.
            segments: Segments::new(&each, self.segments.ends()).unwrap_or_default(),
            stored: self.stored.only(&own),
        }
    }

    /// Keys whose numbers differ from `other`'s in any bit, in the file's own form. Every key when their counts differ.
    pub fn changed_keys(&self, other: &Self) -> Vec<usize> {
        if self.keys.len() != other.keys.len() {
            return (0..self.keys.len()).collect();
        }
        (0..self.keys.len()).filter(|&key| !self.same_numbers(key, other, key)).collect()
    }

    /// Whether a key and one of `other`'s hold the same numbers in every bit, in the file's own form.
    pub(super) fn same_numbers(&self, key: usize, other: &Self, others: usize) -> bool {
        let same_triple = |a: [f64; 3], b: [f64; 3]| a.map(f64::to_bits) == b.map(f64::to_bits);
        match (&self.stored, &other.stored) {
            (Stored::Angles(own), Stored::Angles(angles)) => {
                same_triple(own.degrees.triple(key), angles.degrees.triple(others))
            }
            (Stored::PlaneAngles(own), Stored::PlaneAngles(angles)) => same_triple(own[key], angles[others]),
            _ => {
                bits(self.keys.rotor(key)) == bits(other.keys.rotor(others))
                    && self.tangent_bits(key) == other.tangent_bits(others)
            }
        }
    }

    fn tangent_bits(&self, key: usize) -> Option<[[u64; 4]; 2]> {
        self.tangents.as_ref().map(|tangents| tangents[key].map(bits))
    }
}

fn bits(rotor: Rotor) -> [u64; 4] {
    [rotor.s.to_bits(), rotor.yz.to_bits(), rotor.zx.to_bits(), rotor.xy.to_bits()]
}

/// Rotors made of angles have no sign of their own: each takes the one near the last finite one before it.
fn aligned(keys: impl Iterator<Item = Rotor>) -> Keys {
    let mut reference = Rotor::IDENTITY;
    keys.map(|key| {
        let own = key.aligned_to(reference);
        if own.is_finite() {
            reference = own;
        }
        own
    })
    .collect()
}

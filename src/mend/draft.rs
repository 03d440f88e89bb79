//! A rotation track under mending: numbers that can be changed in place, in the file's own form too.

use crate::clip::{FileAngles, PathKind, Paths, RotationTrack, Segments, Stored, Times};
use crate::rotor::{Axis, Bivector, EulerOrder, Rotor};
use crate::snag::nearest_plane_angles;

/// The file's own form of the keys, beside their rotors.
#[derive(Clone, Debug)]
pub(super) enum Form {
    Rotors,
    Angles { axes: Vec<Axis>, order: EulerOrder, degrees: Vec<[f64; 3]> },
    PlaneAngles(Vec<[f64; 3]>),
}

/// A track whose keys are being changed. Many mends share one draft, so each costs no more than its own keys.
#[derive(Clone, Debug)]
pub(super) struct Draft {
    pub(super) times: Times,
    pub(super) keys: Vec<Rotor>,
    pub(super) paths: Paths,
    pub(super) tangents: Option<Vec<[Rotor; 2]>>,
    segments: Segments,
    pub(super) form: Form,
    /// Largest change of orientation at a key since the last [`Draft::take_change`], in radians.
    change_rad: f64,
    is_changed: bool,
}

impl Draft {
    pub(super) fn new(track: &RotationTrack) -> Self {
        let form = match &track.stored {
            Stored::Rotors => Form::Rotors,
            Stored::Angles(FileAngles { axes, order, degrees }) => {
                Form::Angles { axes: axes.clone(), order: *order, degrees: degrees.to_vec() }
            }
            Stored::PlaneAngles(degrees) => Form::PlaneAngles(degrees.to_vec()),
        };
        Self {
            times: track.times.clone(),
            keys: track.keys.to_vec(),
            paths: track.paths.clone(),
            tangents: track.tangents.as_ref().map(|tangents| tangents.to_vec()),
            segments: track.segments.clone(),
            form,
            change_rad: 0.0,
            is_changed: false,
        }
    }

    /// The track as it is now; `None` when nothing was changed.
    pub(super) fn finish(self) -> Option<RotationTrack> {
        let stored = match self.form {
            Form::Rotors => Stored::Rotors,
            Form::Angles { axes, order, degrees } => {
                Stored::Angles(FileAngles { axes, order, degrees: degrees.into() })
            }
            Form::PlaneAngles(degrees) => Stored::PlaneAngles(degrees.into()),
        };
        self.is_changed.then(|| RotationTrack {
            times: self.times,
            keys: self.keys.into(),
            paths: self.paths,
            tangents: self.tangents.map(Into::into),
            segments: self.segments,
            stored,
        })
    }

    /// Largest change of orientation at a key since this was last asked, in radians.
    pub(super) fn take_change(&mut self) -> f64 {
        std::mem::take(&mut self.change_rad)
    }

    pub(super) fn len(&self) -> usize {
        self.keys.len()
    }

    pub(super) fn secs(&self, key: usize) -> f64 {
        self.times.at(key)
    }

    pub(super) fn unit(&self, key: usize) -> Option<Rotor> {
        self.keys[key].try_normalize()
    }

    /// The nearest sound key before `key`.
    pub(super) fn sound_before(&self, key: usize) -> Option<usize> {
        (0..key).rev().find(|&key| self.unit(key).is_some())
    }

    /// The nearest sound key after `key`.
    pub(super) fn sound_after(&self, key: usize) -> Option<usize> {
        (key + 1..self.len()).find(|&key| self.unit(key).is_some())
    }

    pub(super) fn is_held_after(&self, key: usize) -> bool {
        self.paths.of(key) == PathKind::Hold
    }

    /// Other numbers for the same orientation.
    pub(super) fn set_numbers(&mut self, key: usize, rotor: Rotor, tangents: Option<[Rotor; 2]>) {
        self.keys[key] = rotor;
        if let (Some(own), Some(tangents)) = (&mut self.tangents, tangents) {
            own[key] = tangents;
        }
        self.is_changed = true;
    }

    /// Other angles for the same orientation; the rotor stays as it is.
    pub(super) fn set_angles(&mut self, key: usize, triple: [f64; 3]) {
        if let Form::Angles { degrees, .. } | Form::PlaneAngles(degrees) = &mut self.form {
            degrees[key] = triple;
            self.is_changed = true;
        }
    }

    /// Another orientation; unit. Its numbers are the nearest to those of the key before (at the start, to those of the
    /// key after). `was` is how the key is played so far.
    pub(super) fn set_pose(&mut self, key: usize, rotor: Rotor, was: Rotor) {
        let near = key.checked_sub(1).or((key + 1 < self.len()).then_some(key + 1)).unwrap_or(key);
        let mut rotor = if self.keys[near].is_finite() { rotor.aligned_to(self.keys[near]) } else { rotor };
        match &mut self.form {
            Form::Rotors => {}
            Form::Angles { axes, order, degrees } => {
                let near = finite_or_zero(degrees[near]).map(f64::to_radians);
                let triple = order.nearest_equal(order.from_rotor(rotor, near[2]), near);
                let mirrored = order.nearest_equal(order.mirrored(triple), order.mirrored(near));
                // Angles the file has no channel for stay 0, so the triple nearest to that serves.
                let outside = |triple: &[f64; 3]| {
                    triple[axes.len().min(3)..].iter().map(|angle| angle.sin().abs()).sum::<f64>()
                };
                let mut triple = if outside(&mirrored) + 1e-9 < outside(&triple) { mirrored } else { triple };
                if axes.len() < 3 {
                    triple[axes.len()..].fill(0.0);
                    rotor = order.to_rotor(triple).aligned_to(rotor);
                }
                degrees[key] = triple.map(f64::to_degrees);
            }
            Form::PlaneAngles(degrees) => {
                let near = Bivector::from_degrees(finite_or_zero(degrees[near]));
                degrees[key] = nearest_plane_angles(rotor.plane_angles(), near).to_degrees();
            }
        }
        self.keys[key] = rotor;
        self.change_rad = self.change_rad.max(was.turn_to(rotor));
        self.is_changed = true;
    }
}

fn finite_or_zero(triple: [f64; 3]) -> [f64; 3] {
    if triple.iter().all(|angle| angle.is_finite()) { triple } else { [0.0; 3] }
}

//! What every finder needs: one joint's keys with their frames, and a snag made of two of them.

use crate::clip::{Clip, PathKind, RotationTrack, Stored};
use crate::rotor::Rotor;
use crate::skeleton::JointKind;

use super::outline::{Outline, Outlines};
use super::{Remedy, Snag, SnagKind};

/// A clip under search, with what is known about its joints.
#[derive(Clone, Copy, Debug)]
pub struct View<'a> {
    /// The clip.
    pub clip: &'a Clip,
    /// Of this very clip.
    pub outlines: &'a Outlines,
}

/// One joint of a clip, looked at by a finder.
#[derive(Clone, Copy, Debug)]
pub(super) struct Scan<'a> {
    pub(super) view: View<'a>,
    pub(super) clip: &'a Clip,
    pub(super) joint: usize,
    pub(super) track: &'a RotationTrack,
    /// The rotors of the track.
    pub(super) keys: &'a [Rotor],
}

/// What a finder says about a run of keys; [`Scan::snag`] adds where it is.
#[derive(Clone, Debug)]
pub(super) struct Finding {
    pub(super) kind: SnagKind,
    /// First and last key.
    pub(super) keys: (usize, usize),
    pub(super) size_rad: f64,
    pub(super) confidence: f64,
    pub(super) remedy: Remedy,
    pub(super) safe: bool,
    pub(super) text: String,
}

impl<'a> Scan<'a> {
    /// `None` for what has no keys, and for carriers: they are not listed.
    pub(super) fn new(view: View<'a>, joint: usize) -> Option<Self> {
        let clip = view.clip;
        let track = clip.rotation(joint).filter(|track| !track.keys.is_empty())?;
        let listed = clip.skeleton.joints().get(joint).is_some_and(|own| own.kind == JointKind::Joint);
        listed.then(|| Self { view, clip, joint, track, keys: &track.keys })
    }

    /// Another joint of the same clip.
    pub(super) fn other(&self, joint: usize) -> Option<Self> {
        Self::new(self.view, joint)
    }

    /// Where the joint does anything that is worth a look.
    pub(super) fn outline(&self) -> &'a Outline {
        self.view.outlines.of(self.clip, self.joint)
    }

    pub(super) fn label(&self) -> &'a str {
        self.clip.skeleton.label(self.joint)
    }

    pub(super) fn secs(&self, key: usize) -> f64 {
        self.track.times.at(key)
    }

    pub(super) fn frame(&self, key: usize) -> usize {
        self.clip.grid.frame(self.secs(key))
    }

    /// The key's rotor made unit; `None` where it is no rotation.
    pub(super) fn unit(&self, key: usize) -> Option<Rotor> {
        self.keys[key].try_normalize()
    }

    /// Whether the file stores rotors, so that signs and lengths are its own.
    pub(super) fn stores_rotors(&self) -> bool {
        matches!(self.track.stored, Stored::Rotors)
    }

    /// Whether the joint moves on from `key` to the next, and does not jump there as its file says.
    pub(super) fn moves_after(&self, key: usize) -> bool {
        self.track.paths.of(key) != PathKind::Hold
    }

    /// `at frame 7`, `at frames 7 to 9`, `from frame 7 to the end`.
    pub(super) fn span(&self, first: usize, last: usize) -> String {
        let (from, to) = (self.frame(first), self.frame(last));
        if from == to {
            format!("at frame {from}")
        } else if last + 1 == self.keys.len() {
            format!("from frame {from} to the end")
        } else {
            format!("at frames {from} to {to}")
        }
    }

    pub(super) fn snag(&self, finding: Finding) -> Snag {
        let (first_key, last_key) = finding.keys;
        Snag {
            kind: finding.kind,
            joint: self.joint,
            first_key,
            last_key,
            first_frame: self.frame(first_key),
            last_frame: self.frame(last_key),
            first_secs: self.secs(first_key),
            last_secs: self.secs(last_key),
            size_rad: finding.size_rad,
            confidence: finding.confidence,
            remedy: finding.remedy,
            safe: finding.safe,
            text: finding.text,
        }
    }
}

/// Runs of neighbouring keys with the same state, `(first, last, state)`; keys without a state belong to none.
pub(super) fn runs<T: PartialEq>(states: impl Iterator<Item = Option<T>>) -> Vec<(usize, usize, T)> {
    runs_of(states.enumerate().filter_map(|(key, state)| Some((key, state?))))
}

/// The same of the keys that have a state, in order.
pub(super) fn runs_of<T: PartialEq>(states: impl Iterator<Item = (usize, T)>) -> Vec<(usize, usize, T)> {
    let mut found: Vec<(usize, usize, T)> = Vec::new();
    for (key, state) in states {
        match found.last_mut() {
            Some((_, last, own)) if *last + 1 == key && *own == state => *last = key,
            _ => found.push((key, key, state)),
        }
    }
    found
}

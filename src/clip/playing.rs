//! Joint after joint at the same many times.

use std::sync::Arc;

use crate::rotor::Rotor;
use crate::rotor::batch::{PartsMut, Streams};

use super::path::PathKind;
use super::places::{Places, TILE};
use super::rotation_track::RotationTrack;
use super::sampler::Sampler;
use super::take::Clip;
use super::times::Times;

/// A clip at many times, joint after joint: as [`Clip::rotations_at`] for each, but where the times fall among the keys is worked out
/// once for all joints in a row that have their keys at the same times, as most of a clip do.
///
/// ```
/// # use turnwright::clip::Clip;
/// # fn largest_turn(clip: &Clip) -> f64 {
/// let times: Vec<f64> = (0..1000).map(|frame| f64::from(frame) / 120.0).collect();
/// let mut playing = clip.playing(&times, None);
/// let turns = (0..clip.skeleton.len()).flat_map(|joint| playing.rotations(joint));
/// turns.map(|turn| turn.turn()).fold(0.0, f64::max)
/// # }
/// ```
pub struct Playing<'a> {
    clip: &'a Clip,
    times_secs: &'a [f64],
    path: Option<PathKind>,
    sampler: Sampler,
    /// Where the times fall among the keys of the joint before.
    places: Option<(&'a Times, Vec<Places>)>,
}

impl std::fmt::Debug for Playing<'_> {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let mut shown = formatter.debug_struct("Playing");
        shown.field("times", &self.times_secs.len()).field("path", &self.path).finish_non_exhaustive()
    }
}

impl Clip {
    /// This clip at each of `times_secs`, with `path` in place of the tracks' own path kinds where it is given.
    pub fn playing<'a>(&'a self, times_secs: &'a [f64], path: Option<PathKind>) -> Playing<'a> {
        Playing { clip: self, times_secs, path, sampler: Sampler::new(), places: None }
    }
}

impl Playing<'_> {
    /// What is played.
    pub const fn clip(&self) -> &Clip {
        self.clip
    }

    /// A joint's turn relative to its parent at each of the times; its rest where nothing turns it.
    ///
    /// # Panics
    /// When there is no such joint.
    pub fn rotations(&mut self, joint: usize) -> Vec<Rotor> {
        let clip = self.clip;
        let Some(track) = clip.rotation(joint).filter(|track| !track.times.is_empty()) else {
            return vec![clip.skeleton.joints()[joint].rest.rotation; self.times_secs.len()];
        };
        let Some(keys) = self.plain_keys(track) else { return track.at_all_by(self.times_secs, self.path) };
        let mut found = Vec::with_capacity(self.times_secs.len());
        let (places, sampler) = self.places(track);
        for places in places {
            sampler.append(keys, places, &mut found);
        }
        found
    }

    /// As [`Playing::rotations`], in streams as long as there are times.
    pub(super) fn turns(&mut self, joint: usize, mut out: PartsMut<'_, f64, 4>) {
        let clip = self.clip;
        let parts = |rotor: Rotor| [rotor.s, rotor.yz, rotor.zx, rotor.xy];
        let Some(track) = clip.rotation(joint).filter(|track| !track.times.is_empty()) else {
            let rest = clip.skeleton.joints()[joint].rest.rotation;
            for (stream, part) in out.into_iter().zip(parts(rest)) {
                stream.fill(part);
            }
            return;
        };
        let Some(keys) = self.plain_keys(track) else {
            for (row, turn) in track.at_all_by(self.times_secs, self.path).into_iter().enumerate() {
                for (stream, part) in out.iter_mut().zip(parts(turn)) {
                    stream[row] = part;
                }
            }
            return;
        };
        let mut start = 0;
        let (places, sampler) = self.places(track);
        for places in places {
            let tile = out.each_mut().map(|stream| &mut stream[start..start + places.len]);
            sampler.sample(keys, places, tile);
            start += places.len;
        }
    }

    /// The keys to sample between, where slerp is all there is to it.
    fn plain_keys<'k>(&self, track: &'k RotationTrack) -> Option<&'k Streams<f64, 4>> {
        track.sound_for(self.times_secs.len()).filter(|_| track.is_slerp_alone(self.path))
    }
}

impl<'a> Playing<'a> {
    fn places(&mut self, track: &'a RotationTrack) -> (&[Places], &mut Sampler) {
        let places = match self.places.take() {
            Some(last) if same_times(last.0, &track.times) => self.places.insert(last),
            _ => {
                let tiles = self.times_secs.chunks(TILE).map(|secs| {
                    let mut places = Places::new();
                    places.find(&track.times, secs);
                    places
                });
                self.places.insert((&track.times, tiles.collect()))
            }
        };
        (&places.1, &mut self.sampler)
    }
}

/// Whether they are surely the same; without looking at long lists.
fn same_times(own: &Times, other: &Times) -> bool {
    match (own, other) {
        (Times::Listed(own), Times::Listed(other)) => Arc::ptr_eq(own, other),
        (Times::Even { .. }, Times::Even { .. }) => own == other,
        _ => false,
    }
}

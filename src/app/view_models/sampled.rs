//! Where curves are sampled, and what is sampled there.

use glam::DVec3;

use crate::clip::{Clip, FrameGrid, Place, Times};
use crate::rotor::Rotor;

/// Times at which a clip is sampled for curves: every frame, and so many steps between two frames that sparse keys show
/// the path between them.
#[derive(Clone, Debug, PartialEq)]
pub struct SampleTimes {
    frames: Times,
    steps: usize,
}

/// As many samples as a wide screen has pixels: below that more steps between frames are worth their time.
const WANTED: usize = 2400;
const MOST_STEPS: usize = 16;

impl SampleTimes {
    /// For a clip counted in `grid`.
    pub fn new(grid: &FrameGrid) -> Self {
        let spans = grid.count().saturating_sub(1).max(1);
        Self { frames: grid.times.clone(), steps: (WANTED / spans).clamp(1, MOST_STEPS) }
    }

    /// How many.
    pub fn len(&self) -> usize {
        match self.frames.len() {
            0 => 0,
            frames => (frames - 1) * self.steps + 1,
        }
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The time of a sample in seconds.
    pub fn time(&self, index: usize) -> f64 {
        let (frame, step) = (index / self.steps, index % self.steps);
        let start = self.frames.at(frame);
        if step == 0 {
            return start;
        }
        start + (self.frames.at(frame + 1) - start) * (step as f64 / self.steps as f64)
    }

    /// The place of a time among the samples: 2.5 lies half way between the third and the fourth. Held at the ends.
    pub fn place(&self, time_secs: f64) -> f64 {
        match self.frames.place(time_secs) {
            None => 0.0,
            Some(Place::At(frame)) => (frame * self.steps) as f64,
            Some(Place::Between(frame, share)) => (frame as f64 + share) * self.steps as f64,
        }
    }

    /// The value of a row of samples at a time, on a straight line between two of them.
    pub fn value(&self, values: &[f32], time_secs: f64) -> Option<f64> {
        let place = self.place(time_secs);
        let before = *values.get(place as usize)?;
        let after = values.get(place as usize + 1).copied().unwrap_or(before);
        Some(f64::from(before) + f64::from(after - before) * place.fract())
    }
}

/// A joint's turn relative to its parent at a time; its rest where nothing turns it.
pub fn rotation_at(clip: &Clip, joint: usize, time_secs: f64) -> Rotor {
    match clip.rotation(joint) {
        Some(track) if !track.times.is_empty() => track.at(time_secs),
        _ => clip.skeleton.joints()[joint].rest.rotation,
    }
}

/// The direction a joint's limb points to in its own frame: to its child, else to its end point, else on from its parent.
/// The twist is the turn about it.
pub fn limb_direction(clip: &Clip, joint: usize) -> DVec3 {
    let joints = clip.skeleton.joints();
    let own = &joints[joint];
    let children = clip.skeleton.children(joint).iter().map(|&child| joints[child].rest.translation);
    children
        .chain(own.tips.iter().copied())
        .chain([own.rest.rotation.reverse().apply(own.rest.translation)])
        .find(|direction| direction.length() > 1e-9)
        .map_or(DVec3::Y, DVec3::normalize)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn samples_hit_every_frame_and_places_are_the_way_back() {
        for grid in [FrameGrid::even(30.0, 2.0), FrameGrid::even(120.0, 300.0)] {
            let samples = SampleTimes::new(&grid);
            assert_eq!(samples.time(0), 0.0);
            assert_eq!(samples.time(samples.len() - 1), grid.time(grid.count() - 1));
            for index in [0, 1, 17, samples.len() - 1] {
                assert!((samples.place(samples.time(index)) - index as f64).abs() < 1e-6);
            }
        }
        let uneven = FrameGrid { times: Times::Listed([0.0, 0.1, 0.4].into()), rate: 10.0 };
        let samples = SampleTimes::new(&uneven);
        assert!((samples.time(24) - 0.25).abs() < 1e-12);
        assert_eq!(samples.value(&[0.0; 33], 0.2), Some(0.0));
    }
}

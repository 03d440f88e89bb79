//! Clips whose frames are so near to each other that the short way between them is the meant one.

use std::f64::consts::TAU;

use super::resample::{resampled, resampled_at};
use super::take::Clip;
use super::times::{Place, Times};

/// A step from frame to frame above this, in radians, gets frames between where a turn is meant.
const LARGEST_STEP_RAD: f64 = TAU / 3.0;

/// A clip is given no more frames than this.
const MOST_FRAMES: usize = 3_600_000;

/// What was done so that meant turns survive in rows of poses.
#[derive(Clone, Debug)]
pub struct ShortSteps {
    /// The clip with more frames.
    pub clip: Clip,
    /// How many frames it had, and has.
    pub frames: [usize; 2],
    /// A joint with the longest step, and that step in radians.
    pub longest: (usize, f64),
}

/// The clip with frames put between its own where a joint with meant turns steps by more than 120°, for formats in which a row of
/// poses means the short way; evenly, all over, or only where it is needed (`is_even`). `None` where nothing is needed, and where
/// it would take more than 3.6 million frames.
pub fn with_short_steps(clip: &Clip, is_even: bool) -> Option<ShortSteps> {
    if !clip.joints.iter().any(|own| own.rotation.as_ref().is_some_and(|track| track.segments.have_turns())) {
        return None;
    }
    let count = clip.grid.count();
    let rate = match &clip.grid.times {
        Times::Even { step_secs, .. } => 1.0 / step_secs,
        Times::Listed(_) => clip.grid.rate,
    };
    let own: Vec<f64> = if is_even {
        let last = (clip.duration_secs * rate + 1e-6).floor() as usize;
        (0..=last).map(|frame| frame as f64 / rate).collect()
    } else {
        clip.grid.times.iter().collect()
    };
    let (longest, step) = longest_step(clip, &own);
    if step <= LARGEST_STEP_RAD {
        return None;
    }
    let mut finer = own.clone();
    let mut factor = 1;
    loop {
        // Steps may be uneven inside a frame, so that a share of the longest is not always enough.
        let (_, step) = longest_step(clip, &finer);
        if step <= LARGEST_STEP_RAD * (1.0 + 1e-9) {
            break;
        }
        if is_even {
            factor = (factor + 1).max((factor as f64 * step / LARGEST_STEP_RAD) as usize);
            if own.len().saturating_mul(factor) > MOST_FRAMES {
                return None;
            }
            let last = (own.len() - 1) * factor;
            finer = (0..=last).map(|frame| frame as f64 / (rate * factor as f64)).collect();
        } else {
            let mut more = Vec::with_capacity(2 * finer.len());
            for pair in finer.windows(2) {
                more.push(pair[0]);
                let pieces =
                    (step_between(clip, pair[0], pair[1]) / LARGEST_STEP_RAD).ceil().max(1.0) as usize;
                more.extend(
                    (1..pieces).map(|piece| pair[0] + (pair[1] - pair[0]) * piece as f64 / pieces as f64),
                );
            }
            more.extend(finer.last());
            if more.len() > MOST_FRAMES || more.len() == finer.len() {
                return None;
            }
            finer = more;
        }
    }
    let made = if is_even {
        resampled(clip, rate * factor as f64, 0.0, clip.duration_secs)
    } else {
        resampled_at(clip, Times::Listed(finer.into()), clip.grid.rate)
    };
    Some(ShortSteps { frames: [count, made.grid.count()], longest: (longest, step), clip: made })
}

/// The longest meant step from one time to the next, and its joint.
fn longest_step(clip: &Clip, times: &[f64]) -> (usize, f64) {
    let mut longest = (0, 0.0);
    for joint in 0..clip.joints.len() {
        for pair in times.windows(2) {
            let step = meant_step(clip, joint, pair[0], pair[1]);
            if step > longest.1 {
                longest = (joint, step);
            }
        }
    }
    longest
}

fn step_between(clip: &Clip, from_secs: f64, to_secs: f64) -> f64 {
    (0..clip.joints.len()).map(|joint| meant_step(clip, joint, from_secs, to_secs)).fold(0.0, f64::max)
}

/// How far round a joint turns between two times; 0 where no turn is meant.
fn meant_step(clip: &Clip, joint: usize, from_secs: f64, to_secs: f64) -> f64 {
    let Some(track) = clip.rotation(joint).filter(|track| track.segments.have_turns()) else { return 0.0 };
    let last = track.segment_count() - 1;
    let first = match track.times.place(from_secs) {
        None => return 0.0,
        Some(Place::At(key) | Place::Between(key, _)) => key,
    };
    let mut touched = (first..=last).take_while(|&segment| track.times.at(segment) < to_secs);
    let is_meant = touched.any(|segment| track.pieces(segment) > 1);
    if is_meant { track.travel(from_secs, to_secs).length() } else { 0.0 }
}

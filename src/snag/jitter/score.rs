//! How much a window of a short clip looks like white noise where poses are few: four marks, added up.
//!
//! In a loop of a second or two noise is seldom many times what the joint does else, so a window is held against what noise is
//! by itself and against the other joints: how neighbouring fourth differences go against each other, in how many directions
//! it goes, what the joint on the other side does at its worst, and what the other joints do at the very same keys.
//!
//! The weights are a logistic regression with a ridge of 1 (Cox 1958; le Cessie & van Houwelingen 1992) on some 3400 planted spans
//! and all other windows of the planter's loops and of its captures cut into short clips. Which marks are worth it, and what they
//! tell, was read from files left out one by one: each is judged by weights that have not seen it.

use std::f64::consts::PI;
use std::ops::RangeInclusive;

use super::{middle_of, noise_of};
use crate::snag::scan::Scan;

/// Windows that are scored are so many keys wide at most.
pub(super) const WIDEST: usize = 14;

/// Noise below this, per axis, is not told for its score alone: captures tremble by so much at fingers and toes.
pub(super) const LEAST_RAD: f64 = PI / 180.0;

/// What holds of a scored window in any case: neighbouring differences go along by at most this, growth to twice the distance is at
/// most that, and so much of it at most is what a joint near by does.
pub(super) const MOST_ALONG: f64 = -0.5;
pub(super) const MOST_GROWTH: f64 = 1.8;
pub(super) const MOST_NEAR: f64 = 0.8;

/// The weights of the marks. Levels count by the logarithm of their ratio.
const ALONG: f64 = -17.17;
const SPREAD: f64 = 12.93;
const MIRROR: f64 = 1.30;
const HERE: f64 = 1.60;
const BIAS: f64 = -19.19;

/// Logarithms of ratios go so far.
const RATIOS: RangeInclusive<f64> = -2.0..=5.0;

/// A level below this is as good as none, in radians.
const CALM_RAD: f64 = 0.05 / 180.0 * PI;

/// What a joint without another side counts as, and one without other joints.
const ALONE: f64 = 4.26;
const NO_OTHERS: f64 = 1.5;

/// From this score on a window is noise. Sound motion outside the fit reached 3.4 to 3.7 (a run, a limping walk), inside it 1.6.
const LEAST_SCORE: f64 = 3.5;

/// Other joints that are asked, at most.
const ASKED: usize = 48;

/// What is seen in a window.
pub(super) struct Marks {
    /// In radians per axis.
    pub(super) level: f64,
    pub(super) along: f64,
    pub(super) spread: f64,
    /// The worst level of the joint on the other side.
    pub(super) mirror: Option<f64>,
}

/// Whether these marks are those of noise. What the other joints do is dear to ask: `here` tells it where it could decide.
pub(super) fn is_noise(marks: &Marks, here: impl FnOnce() -> Option<f64>) -> bool {
    let ratio = |other: f64| (marks.level / other.max(CALM_RAD)).ln().clamp(*RATIOS.start(), *RATIOS.end());
    let by_itself = BIAS
        + ALONG * marks.along
        + SPREAD * marks.spread
        + MIRROR * marks.mirror.filter(|worst| *worst > 0.0).map_or(ALONE, ratio);
    by_itself + HERE * RATIOS.end() >= LEAST_SCORE
        && by_itself + HERE * here().map_or(NO_OTHERS, ratio) >= LEAST_SCORE
}

/// The middle of what the other joints do at some keys.
pub(super) fn level_of_others(scan: &Scan<'_>, keys: &[usize]) -> Option<f64> {
    let skeleton = &scan.clip.skeleton;
    let stride = skeleton.listed().count().div_ceil(ASKED);
    let others = skeleton.listed().filter(|other| *other != scan.joint).step_by(stride.max(1));
    let levels: Vec<f64> = others
        .filter_map(|other| scan.other(other))
        .filter(|other| other.track.times == scan.track.times)
        .map(|other| middle_of(keys.iter().map(|key| noise_of(&other, *key, 1)).collect()))
        .collect();
    (!levels.is_empty()).then(|| middle_of(levels))
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::super::tests::shaken;
    use super::*;
    use crate::clip::{Clip, Times};
    use crate::skeleton::{Joint, Skeleton};
    use crate::snag::outline::Outlines;
    use crate::snag::scan::View;

    /// Marks in the middle of planted noise and of sound motion that is as loud.
    const NOISE: Marks = Marks { level: 0.05, along: -0.69, spread: 0.66, mirror: Some(0.03) };
    const SOUND: Marks = Marks { level: 0.05, along: -0.5, spread: 0.25, mirror: Some(0.05) };

    #[test]
    fn a_mark_that_is_weak_is_made_up_for_by_others_but_not_all_of_them() {
        let quiet = || Some(0.002);
        assert!(is_noise(&NOISE, quiet));
        assert!(!is_noise(&SOUND, quiet));
        let [along, spread] = [Marks { along: -0.55, ..NOISE }, Marks { spread: 0.4, ..NOISE }];
        assert!(is_noise(&along, quiet) && is_noise(&spread, quiet));
        assert!(!is_noise(&Marks { spread: 0.4, ..along }, quiet));
        // Where all joints are as loud it is how the body moves; where no other joint or side is there to be asked, it may be noise.
        assert!(!is_noise(&Marks { mirror: Some(0.05), ..NOISE }, || Some(0.05)));
        assert!(is_noise(&Marks { mirror: None, ..NOISE }, || None));
    }

    #[test]
    fn the_other_joints_are_asked_only_where_they_could_decide() {
        assert!(!is_noise(&SOUND, || unreachable!("it is far from noise")));
        let asked = std::cell::Cell::new(false);
        let _ = is_noise(&NOISE, || {
            asked.set(true);
            None
        });
        assert!(asked.get());
    }

    /// Three joints at one place, each with the rotations of a clip of one joint.
    fn side_by_side(clips: &[Clip; 3]) -> Clip {
        let joint = |number: usize| Joint {
            name: format!("J{number}"),
            number,
            parent: None,
            ..clips[0].skeleton.joints()[0].clone()
        };
        let skeleton = Skeleton::new((0..3).map(joint).collect()).unwrap();
        let joints = clips.iter().map(|clip| clip.joints[0].clone()).collect();
        Clip { skeleton: Arc::new(skeleton), joints, ..clips[0].clone() }
    }

    #[test]
    fn the_level_of_the_others_is_their_middle_at_those_keys_alone() {
        let times = Times::Even { step_secs: 1.0 / 24.0, count: 30 };
        let trembles = |keys, noise_deg, seed| shaken(times.clone(), keys, noise_deg, seed);
        let clip =
            side_by_side(&[trembles((0, 29), 40.0, 1), trembles((0, 14), 2.0, 2), trembles((0, 14), 2.0, 3)]);
        let outlines = Outlines::new(3);
        let scan = Scan::new(View { clip: &clip, outlines: &outlines }, 0).unwrap();
        let level_deg = |keys: &[usize]| level_of_others(&scan, keys).unwrap().to_degrees();
        let [loud, calm] = [&[4, 5, 6, 7, 8, 9][..], &[19, 20, 21, 22, 23, 24]].map(level_deg);
        assert!((1.0..4.0).contains(&loud), "{loud}");
        assert!(calm < 0.2, "{calm}");
    }
}

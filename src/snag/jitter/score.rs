//! How much a window looks like white noise where poses are few: four marks, added up.
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

use super::{fourth_difference, middle_of};
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
        .map(|other| {
            let level = |key: &usize| {
                let near = other.keys[*key];
                fourth_difference(std::array::from_fn(|i| other.keys[key + i - 2].aligned_to(near)))
            };
            middle_of(keys.iter().map(level).collect())
        })
        .collect();
    (!levels.is_empty()).then(|| middle_of(levels))
}

//! Takes the trembling out of a span: what is left is the smoothest motion that goes with the poses, with the sound ones on
//! both sides, and with what the other joints do.
//!
//! Pose = what the other joints tell (linear in their principal directions) + a smooth rest + noise. Both parts are fitted at
//! once, as Speckman 1988, "Kernel smoothing in partial linear models", J. Royal Statistical Society B 50, with a spline for
//! the kernel. How smooth the rest is, and how far the others are believed, is tried by leaving out poses of the span in turn
//! (cross-validation); where the noise runs over some poses, as many together. What did well near a pose weighs most there
//! (exponential weights, Leung & Barron 2006, "Information theory and mixing least-squares regressions", IEEE Trans. Inf.
//! Theory 52), so that a quick step keeps its speed and the rest is calm. There is no delay: it looks ahead as far as back.

use crate::clip::Clip;
use crate::rotor::{Bivector, Rotor, chordal_mean, convolve};

use super::banded::Smoother;
use super::draft::Draft;
use super::others::Others;
use super::redraw;
use super::regress::{Table, dot, solve, times};

/// What is known of the noise.
#[derive(Clone, Copy, Debug)]
pub(super) struct Noise {
    /// Its deviation per axis, in radians.
    pub(super) sigma_rad: f64,
    /// The same of the sound motion beside it.
    pub(super) quiet_rad: f64,
    /// Poses so many keys apart tremble each by itself.
    pub(super) apart_keys: usize,
}

/// Sound motion to each side that is looked at: at least so long, as long as the span, and at most so many keys.
const BESIDE_SECS: f64 = 1.5;
const BESIDE_KEYS: usize = 500;

/// Keys that the choice is made on, at most; of longer spans those around the middle.
const TRIED_KEYS: usize = 2400;

/// What is tried: up to which frequency the rest may move, in hertz; and how dear the others' weights are, as a share of
/// their features' mean square; without a share the others are not asked.
const CUTOFFS_HZ: [f64; 7] = [0.8, 1.4, 2.2, 3.5, 5.5, 8.5, 13.0];
const SHARES: [Option<f64>; 3] = [None, Some(1e-3), Some(1e-1)];

/// How near a pose what is left out tells about it, and how many variances of the noise a trial must be worse for a weight
/// of 1/e.
const NEAR_SECS: f64 = 0.2;
const WORSE: f64 = 3.0;

/// Poses are left out in so many turns.
const TURNS: usize = 5;

/// The least noise that sound motion is taken to have, and the largest weight that follows for a sound pose.
const LEAST_QUIET_RAD: f64 = 3e-4;
const MOST_WEIGHT: f64 = 1e4;

/// No pose is moved by more than so many deviations of the noise, but for outliers.
const MOST_DEVIATIONS: f64 = 6.0;

/// So few keys in a row that lie farther off are spikes in the noise: they tell nothing, and are drawn from the poses around. Taking them out
/// shows others that they had hidden, in so many rounds.
const MOST_OUTLIERS: usize = 4;
const OUTLIER_ROUNDS: usize = 2;

/// Joints that turn further than this from their middle pose are taken relative to a slow motion of their own, this slow.
const WIDE_RAD: f64 = 2.0;
const SLOW_SECS: f64 = 0.25;

/// Smooths `first..=last` of `joint`. `clip` gives what the other joints do.
pub(super) fn smooth(
    draft: &mut Draft,
    clip: &Clip,
    joint: usize,
    (first, last): (usize, usize),
    noise: Noise,
) {
    if let Some(poses) = smoothed(draft, clip, joint, (first, last), noise) {
        redraw::write(draft, first, &poses);
    }
}

fn smoothed(
    draft: &Draft,
    clip: &Clip,
    joint: usize,
    (first, last): (usize, usize),
    noise: Noise,
) -> Option<Vec<Rotor>> {
    let step_secs = draft.times.median_step()?;
    let beside = ((BESIDE_SECS / step_secs) as usize).max(last - first).min(BESIDE_KEYS);
    let (from, to) = (first.saturating_sub(beside), (last + 1 + beside).min(draft.len()));
    let mut before = draft.unit(first)?;
    let poses: Vec<Rotor> = (from..to)
        .map(|key| {
            before = draft.unit(key).unwrap_or(before).aligned_to(before);
            before
        })
        .collect();
    let (base, is_fixed) = base(&poses, step_secs)?;
    let mut own = Table::new(3);
    for (base, pose) in base.iter().zip(&poses) {
        let off = (base.reverse() * *pose).plane_angles();
        own.push(&[off.yz, off.zx, off.xy]);
    }
    // The others are told by where they are, so they can't be asked about what is left beside a slow motion.
    let stride = ((to - from) / 300).max(1);
    let sampled: Vec<usize> = (from..to).step_by(stride).collect();
    let others = is_fixed.then(|| Others::new(clip, joint, draft, (first, last), &sampled)).flatten();
    let features = others.map(|others| {
        let mut rows = Table::new(others.width());
        (from..to).for_each(|key| rows.push(&others.at(draft.secs(key))));
        rows
    });
    let weight = (noise.sigma_rad / noise.quiet_rad.max(LEAST_QUIET_RAD)).powi(2).clamp(1.0, MOST_WEIGHT);
    let trembles = first - from..last + 1 - from;
    let weights = (0..to - from).map(|i| if trembles.contains(&i) { 1.0 } else { weight }).collect();
    let mut task = Task { own, features, weights, trembles, step_secs, apart: noise.apart_keys.max(1) };
    let most = MOST_DEVIATIONS * noise.sigma_rad;
    let change_of = |fitted: &Table, i: usize| {
        let row = fitted.row(i);
        let pose = base[i] * Rotor::from_plane_angles(Bivector::new(row[0], row[1], row[2]));
        (poses[i].reverse() * pose).plane_angles()
    };
    let mut fitted = task.fitted(noise.sigma_rad)?;
    for _ in 0..OUTLIER_ROUNDS {
        let far: Vec<usize> =
            task.trembles.clone().filter(|&i| change_of(&fitted, i).length() > most).collect();
        let few = far.chunk_by(|a, b| b - a == 1).filter(|run| run.len() <= MOST_OUTLIERS);
        let new: Vec<usize> = few.flatten().copied().filter(|&i| task.weights[i] > 0.0).collect();
        if new.is_empty() {
            break;
        }
        for i in new {
            task.weights[i] = 0.0;
        }
        fitted = task.fitted(noise.sigma_rad)?;
    }
    let smoothed = task.trembles.clone().map(|i| {
        let change = change_of(&fitted, i);
        let is_outlier = task.weights[i] <= 0.0;
        let share = if is_outlier { 1.0 } else { (most / change.length().max(f64::MIN_POSITIVE)).min(1.0) };
        (poses[i] * Rotor::from_plane_angles(change * share)).normalize()
    });
    Some(smoothed.collect())
}

/// What the poses are taken relative to, and whether it is one fixed pose.
fn base(poses: &[Rotor], step_secs: f64) -> Option<(Vec<Rotor>, bool)> {
    let weighted: Vec<(Rotor, f64)> = poses.iter().map(|pose| (*pose, 1.0)).collect();
    let middle = chordal_mean(&weighted)?.rotor;
    if poses.iter().all(|pose| pose.turn_to(middle) < WIDE_RAD) {
        return Some((vec![middle; poses.len()], true));
    }
    let sigma = (SLOW_SECS / step_secs).max(1.0);
    let reach = ((3.0 * sigma) as usize).clamp(1, poses.len().max(2) - 1);
    let bell: Vec<f64> =
        (0..=2 * reach).map(|i| (-0.5 * ((i as f64 - reach as f64) / sigma).powi(2)).exp()).collect();
    let sum: f64 = bell.iter().sum();
    let kernel: Vec<f64> = bell.iter().map(|weight| weight / sum).collect();
    Some((convolve(poses, &kernel).ok()?, false))
}

#[derive(Clone, Copy, Debug)]
struct Choice {
    cutoff_hz: f64,
    share: Option<f64>,
}

/// Rows that are to be smoothed.
struct Task {
    own: Table,
    features: Option<Table>,
    weights: Vec<f64>,
    trembles: std::ops::Range<usize>,
    step_secs: f64,
    apart: usize,
}

impl Task {
    /// The part of it around the middle of the span, of no more than so many rows.
    fn around_the_middle(&self, most: usize) -> Self {
        let count = self.weights.len();
        let middle = usize::midpoint(self.trembles.start, self.trembles.end);
        let from = middle.saturating_sub(most / 2);
        let to = (middle + most / 2).min(count);
        let part = |table: &Table| Table {
            width: table.width,
            numbers: table.numbers[from * table.width..to * table.width].to_vec(),
        };
        Self {
            own: part(&self.own),
            features: self.features.as_ref().map(part),
            weights: self.weights[from..to].to_vec(),
            trembles: self.trembles.start.max(from) - from..self.trembles.end.min(to) - from,
            ..*self
        }
    }

    /// All rows made smooth; meaningful where they tremble.
    fn fitted(&self, noise_rad: f64) -> Option<Table> {
        let tried = self.around_the_middle(TRIED_KEYS);
        let trials = tried.trials();
        if tried.weights.len() < self.weights.len() {
            // Too long to be tried everywhere: what does best in the middle.
            let total = |trial: &(Choice, Vec<f64>)| trial.1.iter().sum::<f64>();
            let best = trials.iter().min_by(|a, b| total(a).total_cmp(&total(b)))?;
            return self.fit(&self.weights, best.0);
        }
        let near: Vec<Vec<f64>> = trials.iter().map(|trial| self.summed_near(&trial.1)).collect();
        let fits: Vec<Table> =
            trials.iter().map(|trial| self.fit(&self.weights, trial.0)).collect::<Option<_>>()?;
        let mut out = self.own.clone();
        for key in self.trembles.clone() {
            let at = |trial: &Vec<f64>| trial[key - self.trembles.start];
            let least = near.iter().map(at).fold(f64::INFINITY, f64::min);
            let weights: Vec<f64> = near
                .iter()
                .map(|trial| (-(at(trial) - least) / (WORSE * noise_rad * noise_rad)).exp())
                .collect();
            let sum: f64 = weights.iter().sum();
            let row = out.row_mut(key);
            row.fill(0.0);
            for (fit, weight) in fits.iter().zip(&weights) {
                add(row, weight / sum, fit.row(key));
            }
        }
        (!fits.is_empty()).then_some(out)
    }

    /// Sums of errors, each counted by how near it is, for the rows that tremble.
    fn summed_near(&self, errors: &[f64]) -> Vec<f64> {
        let sigma = NEAR_SECS / self.step_secs;
        let reach = (3.0 * sigma) as usize;
        let bell: Vec<f64> = (0..=reach).map(|i| (-0.5 * (i as f64 / sigma).powi(2)).exp()).collect();
        (0..errors.len())
            .map(|key| {
                let near = key.saturating_sub(reach)..(key + reach + 1).min(errors.len());
                near.map(|other| errors[other] * bell[key.abs_diff(other)]).sum()
            })
            .collect()
    }

    /// What is tried, with the squared error at each row that trembles when it is left out.
    fn trials(&self) -> Vec<(Choice, Vec<f64>)> {
        // Above this it is faster than the poses can tell.
        let told = CUTOFFS_HZ.into_iter().filter(|cutoff_hz| cutoff_hz * self.step_secs <= 0.3);
        told.flat_map(|cutoff_hz| SHARES.map(|share| Choice { cutoff_hz, share }))
            .filter_map(|choice| Some((choice, self.errors(choice)?)))
            .collect()
    }

    fn errors(&self, choice: Choice) -> Option<Vec<f64>> {
        if choice.share.is_some() && self.features.is_none() {
            return None;
        }
        let mut errors = vec![0.0; self.trembles.len()];
        for turn in 0..TURNS {
            let is_out = |i: usize| {
                self.trembles.contains(&i) && self.weights[i] > 0.0 && i / self.apart % TURNS == turn
            };
            let weights: Vec<f64> =
                self.weights.iter().enumerate().map(|(i, own)| if is_out(i) { 0.0 } else { *own }).collect();
            let fitted = self.fit(&weights, choice)?;
            for i in self.trembles.clone().filter(|i| is_out(*i)) {
                errors[i - self.trembles.start] =
                    self.own.row(i).iter().zip(fitted.row(i)).map(|(a, b)| (a - b).powi(2)).sum();
            }
        }
        Some(errors)
    }

    fn fit(&self, weights: &[f64], choice: Choice) -> Option<Table> {
        // The smoother halves what moves at its cutoff: there its sixth power is as dear as a pose.
        let turn = std::f64::consts::TAU * choice.cutoff_hz * self.step_secs;
        let smoother = Smoother::new(weights, turn.powi(-6))?;
        let (Some(share), Some(features)) = (choice.share, &self.features) else {
            return Some(smoother.smooth(&self.own));
        };
        let rough = |rows: &Table| minus(rows, &smoother.smooth(rows));
        let (own_rough, rough_features) = (rough(&self.own), rough(features));
        let width = features.width;
        let (mut square, mut right) = (Table::zeros(width, width), Table::zeros(3, width));
        for (row, weight) in weights.iter().enumerate() {
            for (i, feature) in features.row(row).iter().enumerate() {
                let weighed = feature * weight;
                add(square.row_mut(i), weighed, rough_features.row(row));
                add(right.row_mut(i), weighed, own_rough.row(row));
            }
        }
        let mean = (0..width).map(|i| square.row(i)[i]).sum::<f64>() / width as f64;
        for i in 0..width {
            square.row_mut(i)[i] += share * mean + 1e-12;
        }
        let told_by = solve(&square, &right)?;
        let mut told = Table::new(3);
        for row in 0..weights.len() {
            told.push(&times(features.row(row), &told_by));
        }
        let mut fitted = smoother.smooth(&minus(&self.own, &told));
        fitted.numbers.iter_mut().zip(&told.numbers).for_each(|(own, told)| *own += told);
        dot(&fitted.numbers, &fitted.numbers).is_finite().then_some(fitted)
    }
}

fn add(row: &mut [f64], factor: f64, other: &[f64]) {
    row.iter_mut().zip(other).for_each(|(own, other)| *own += factor * other);
}

fn minus(a: &Table, b: &Table) -> Table {
    Table { width: a.width, numbers: a.numbers.iter().zip(&b.numbers).map(|(a, b)| a - b).collect() }
}

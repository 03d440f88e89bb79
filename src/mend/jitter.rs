//! Takes the trembling out of a span: what is left is the smoothest motion that goes with the poses, with the sound ones on
//! both sides, and with what the other joints do.
//!
//! Pose = what the other joints tell (linear in their principal directions) + a smooth rest + noise. Both parts are fitted at
//! once, as Speckman 1988, "Kernel smoothing in partial linear models", J. Royal Statistical Society B 50, with a spline for
//! the kernel. How smooth the rest is, whether it is rougher where the other joints are, and how far these are believed, is
//! weighed by how likely each choice makes all the poses, trembling and sound, the noise being known: Wahba 1985, "A comparison
//! of GCV and GML for choosing the smoothing parameter in the generalized spline smoothing problem", Annals of Statistics 13.
//! The choices are mixed by that likelihood. There is no delay: it looks ahead as far as back.

use crate::clip::Clip;
use crate::rotor::{Bivector, Rotor, chordal_mean, convolve};

use super::banded::{ORDER, Smoother};
use super::draft::Draft;
use super::others::Others;
use super::redraw;
use super::regress::{Table, dot, log_determinant, solve, times};

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

/// What is tried: up to which frequency the rest may move, in hertz, each so many times the one before.
const LOWEST_HZ: f64 = 0.5;
const HIGHEST_HZ: f64 = 16.0;
const CUTOFF_RATIO: f64 = 1.35;

/// Above this many times the rate of the poses it is faster than they can tell.
const MOST_OF_RATE: f64 = 0.3;

/// How far the rest's roughness goes along with that of the other joints, as a power.
const GOING_ALONG: [f64; 3] = [0.0, 0.5, 1.0];

/// The variance that the weights of the others' directions are taken to have, times the joint's mean square over theirs.
const BELIEFS: [f64; 3] = [0.1, 1.0, 10.0];

/// The roughness of the other joints is what they do over about so long.
const ROUGH_SECS: f64 = 0.08;

/// The least noise that sound motion is taken to have, and the largest weight that follows for a sound pose.
const LEAST_QUIET_RAD: f64 = 3e-4;
const MOST_WEIGHT: f64 = 1e4;

/// Steps that are off the usual one by no more than this share are even.
const EVEN: f64 = 0.05;

/// No pose is moved by more than so many deviations of the noise, but for outliers.
const MOST_DEVIATIONS: f64 = 6.0;

/// Nor by more than this, in radians (30°): what is farther off is a flip that is left to a person, or was not looked for.
const MOST_RAD: f64 = 0.52;

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
    let times: Vec<f64> = (from..to).map(|key| draft.secs(key)).collect();
    let told = others.map(|others| {
        let mut features = Table::new(others.width());
        for secs in &times {
            features.push(&others.at(*secs));
        }
        Told { features, roughness: others.roughness(&times, (ROUGH_SECS / step_secs).max(1.0)) }
    });
    // Noise that runs over some poses is, to what is slower, white noise of so many times the power.
    let noise_rad = noise.sigma_rad * (noise.apart_keys.max(1) as f64).sqrt();
    let weight = (noise_rad / noise.quiet_rad.max(LEAST_QUIET_RAD)).powi(2).clamp(1.0, MOST_WEIGHT);
    let trembles = first - from..last + 1 - from;
    let weights = (0..to - from).map(|i| if trembles.contains(&i) { 1.0 } else { weight }).collect();
    let ease = ease(&times, step_secs);
    let mut task = Task { own, told, weights, ease, trembles, step_secs, noise_rad };
    let most = (MOST_DEVIATIONS * noise.sigma_rad).min(MOST_RAD);
    let change_of = |fitted: &Table, i: usize| {
        let row = fitted.row(i);
        let pose = base[i] * Rotor::from_plane_angles(Bivector::new(row[0], row[1], row[2]));
        (poses[i].reverse() * pose).plane_angles()
    };
    let mut fitted = task.fitted()?;
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
        fitted = task.fitted()?;
    }
    let smoothed = task.trembles.clone().map(|i| {
        let change = change_of(&fitted, i);
        let is_outlier = task.weights[i] <= 0.0;
        let share = match change.length() {
            size if is_outlier => f64::from(u8::from(size <= MOST_RAD)),
            size => (most / size.max(f64::MIN_POSITIVE)).min(1.0),
        };
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

/// What a third difference that starts at each time is to cost, beside one over even steps: over a pause a motion goes farther, by
/// the fifth power of how long it has (the variance of a jerk that is white noise, integrated).
fn ease(times: &[f64], step_secs: f64) -> Vec<f64> {
    let over = |start: usize| {
        let end = (start + ORDER).min(times.len() - 1);
        let long = (times[end] - times[start]) / (step_secs * (end - start).max(1) as f64);
        if (long - 1.0).abs() <= EVEN { 1.0 } else { long.max(1.0 - EVEN).powi(-5) }
    };
    (0..times.len()).map(over).collect()
}

/// What is tried.
#[derive(Clone, Copy, Debug)]
struct Choice {
    cutoff_hz: f64,
    /// The power that the others' roughness is taken to.
    along: f64,
    /// `None` where the others' directions are not asked.
    belief: Option<f64>,
}

/// What the other joints tell at each row.
struct Told {
    features: Table,
    roughness: Vec<f64>,
}

/// Rows that are to be smoothed.
struct Task {
    own: Table,
    told: Option<Told>,
    weights: Vec<f64>,
    /// The cost of each third difference beside one over even steps.
    ease: Vec<f64>,
    trembles: std::ops::Range<usize>,
    step_secs: f64,
    noise_rad: f64,
}

/// All rows made smooth by one choice, and the logarithm of how likely it makes them, up to one constant.
struct Trial {
    choice: Choice,
    likely: f64,
    fit: Table,
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
            told: self.told.as_ref().map(|told| Told {
                features: part(&told.features),
                roughness: told.roughness[from..to].to_vec(),
            }),
            weights: self.weights[from..to].to_vec(),
            ease: self.ease[from..to].to_vec(),
            trembles: self.trembles.start.max(from) - from..self.trembles.end.min(to) - from,
            ..*self
        }
    }

    /// All rows made smooth; meaningful where they tremble.
    fn fitted(&self) -> Option<Table> {
        if self.weights.len() > TRIED_KEYS {
            // Too long to be tried everywhere: what does best in the middle.
            let trials = self.around_the_middle(TRIED_KEYS).trials();
            let best = trials.iter().max_by(|a, b| a.likely.total_cmp(&b.likely))?.choice;
            let trials = self.smoothed_by(best.cutoff_hz, best.along, &[best.belief])?;
            return trials.into_iter().next().map(|trial| trial.fit);
        }
        let trials = self.trials();
        let best = trials.iter().map(|trial| trial.likely).max_by(f64::total_cmp)?;
        let weights: Vec<f64> = trials.iter().map(|trial| (trial.likely - best).exp()).collect();
        let sum: f64 = weights.iter().sum();
        let mut out = Table { width: 3, numbers: vec![0.0; self.own.numbers.len()] };
        for (trial, weight) in trials.iter().zip(&weights) {
            add(&mut out.numbers, weight / sum, &trial.fit.numbers);
        }
        Some(out)
    }

    fn trials(&self) -> Vec<Trial> {
        let highest = HIGHEST_HZ.min(MOST_OF_RATE / self.step_secs);
        let cutoffs = std::iter::successors(Some(LOWEST_HZ), |hz| Some(hz * CUTOFF_RATIO));
        let (along, beliefs): (&[f64], Vec<Option<f64>>) = if self.told.is_some() {
            (&GOING_ALONG, std::iter::once(None).chain(BELIEFS.map(Some)).collect())
        } else {
            (&GOING_ALONG[..1], vec![None])
        };
        cutoffs
            .take_while(|hz| *hz <= highest)
            .flat_map(|hz| along.iter().map(move |along| (hz, *along)))
            .filter_map(|(hz, along)| self.smoothed_by(hz, along, &beliefs))
            .flatten()
            .filter(|trial| trial.likely.is_finite())
            .collect()
    }

    /// A trial for each belief.
    fn smoothed_by(&self, cutoff_hz: f64, along: f64, beliefs: &[Option<f64>]) -> Option<Vec<Trial>> {
        // The smoother halves what moves at its cutoff: there its sixth power is as dear as a pose.
        let dear = (std::f64::consts::TAU * cutoff_hz * self.step_secs).powi(-6);
        let rough = |row: usize| self.told.as_ref().map_or(1.0, |told| told.roughness[row].powf(-along));
        let dear: Vec<f64> =
            self.ease.iter().enumerate().map(|(row, ease)| dear * ease * rough(row)).collect();
        let smoother = Smoother::new(&self.weights, &dear)?;
        let smooth = smoother.smooth(&self.own);
        let rough = minus(&self.own, &smooth);
        let weighed = |rows: &Table, others: &Table| -> f64 {
            let each = rows.numbers.chunks_exact(rows.width).zip(others.numbers.chunks_exact(rows.width));
            each.zip(&self.weights).map(|((a, b), weight)| weight * dot(a, b)).sum()
        };
        let energy = weighed(&self.own, &rough);
        let log_det = smoother.log_det();
        let likely =
            |log_det: f64, energy: f64| -0.5 * (3.0 * log_det + energy / (self.noise_rad * self.noise_rad));
        let told = self.told.as_ref().map(|told| {
            let features = &told.features;
            (features, minus(features, &smoother.smooth(features)))
        });
        let trial = |belief: Option<f64>| -> Option<Trial> {
            let choice = Choice { cutoff_hz, along, belief };
            let (Some(belief), Some((features, rough_features))) = (belief, &told) else {
                return Some(Trial { choice, likely: likely(log_det, energy), fit: smooth.clone() });
            };
            let width = features.width;
            let (mut square, mut right) = (Table::zeros(width, width), Table::zeros(3, width));
            for (row, weight) in self.weights.iter().enumerate() {
                for (i, feature) in features.row(row).iter().enumerate() {
                    let weighed = feature * weight;
                    add(square.row_mut(i), weighed, rough_features.row(row));
                    add(right.row_mut(i), weighed, rough.row(row));
                }
            }
            let mean_square = dot(&self.own.numbers, &self.own.numbers) / 3.0;
            let variance = belief * mean_square / dot(&features.numbers, &features.numbers);
            let ridge = self.noise_rad * self.noise_rad / variance;
            (0..width).for_each(|i| square.row_mut(i)[i] += ridge);
            let told_by = solve(&square, &right)?;
            let log_det = log_det + log_determinant(&square)? - width as f64 * ridge.ln();
            let energy = energy - dot(&right.numbers, &told_by.numbers);
            let mut fit = smooth.clone();
            for row in 0..self.weights.len() {
                add(fit.row_mut(row), 1.0, &times(rough_features.row(row), &told_by));
            }
            Some(Trial { choice, likely: likely(log_det, energy), fit })
        };
        Some(beliefs.iter().filter_map(|belief| trial(*belief)).collect())
    }
}

fn add(row: &mut [f64], factor: f64, other: &[f64]) {
    row.iter_mut().zip(other).for_each(|(own, other)| *own += factor * other);
}

fn minus(a: &Table, b: &Table) -> Table {
    Table { width: a.width, numbers: a.numbers.iter().zip(&b.numbers).map(|(a, b)| a - b).collect() }
}

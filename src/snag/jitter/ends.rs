//! Where a span ends: the change from its noise to the sound motion beside it.
//!
//! A fourth difference shows the noise of a span's outermost key with a seventieth of its power, so that by its level alone
//! one or two keys are left out or taken along by chance. Here every key near by, the last one of the clip among them, is
//! weighed as the end by how likely it makes the third differences of all of them together: those of white noise up to there,
//! which hang together over several keys, beside those of motion, each by itself. How rough the motion is beside the span is
//! not asked beforehand, since in a clip of a second there may be four keys to tell: every roughness is tried and weighed by
//! its likelihood. (A change point as in Hinkley 1970, "Inference about the change-point in a sequence of random variables",
//! Biometrika 57; the heavy tails of motion as in Lange, Little & Taylor 1989, "Robust statistical modeling using the t
//! distribution", J. American Statistical Association 84.)

use std::ops::Range;

use super::{Row, Span, UNEVEN};

/// So many keys to both sides of an end as it was told are tried, and so many more tell.
const REACH: usize = 16;
const BESIDE: usize = 10;

/// Keys of a span at least.
const SHORTEST: usize = 6;

/// The noise that is tried, beside what was told.
const NOISES: [f64; 5] = [0.75, 1.0, 1.33, 1.8, 2.4];

/// The roughness that is tried: of the length that the noise's own differences have a half, a quarter, and so on so often.
const ROUGHNESSES: i32 = 7;

/// No motion is told more exactly than this.
const LEAST_RAD: f64 = 3e-4;

/// Degrees of freedom of the motion's differences, and the logarithm of such a density's factor beside Gauss's, in three
/// dimensions: Γ(5/2) / Γ(1).
const FREEDOM: f64 = 2.0;
const FACTOR: f64 = 0.284_68;

/// How likely a trembling key is left out at most: to a mend, which takes it for sound, it is worse than a sound one too many.
const LEFT_OUT: f64 = 0.1;

/// A third difference, and the length of its weights: √20.
const WEIGHTS: [f64; 4] = [1.0, -3.0, 3.0, -1.0];
const ORDER: usize = WEIGHTS.len() - 1;
const THIRD: f64 = 4.472_136;

/// The span with the ends that the keys which are `free` make likely.
pub(super) fn fitted(row: &Row<'_>, mut span: Span, free: &Range<usize>) -> Span {
    // Each end tells how much of the span the other one may count on. Spans that touch or overlap leave no room.
    for _ in 0..2 {
        let (before, after) = (span.first.saturating_sub(free.start), free.end.saturating_sub(span.last + 1));
        span.last = End { row, span, room: after, is_before: false }.fitted();
        span.first = End { row, span, room: before, is_before: true }.fitted();
    }
    span
}

/// One end of a span.
struct End<'a> {
    row: &'a Row<'a>,
    span: Span,
    /// Keys outside of it.
    room: usize,
    is_before: bool,
}

/// A difference, whose outermost pose is at `start`.
struct Difference {
    start: usize,
    parts: [f64; 4],
}

impl End<'_> {
    /// The key that is likely the outermost one of the span.
    fn fitted(&self) -> usize {
        // Keys are counted inwards: from those that tell of the motion beside the span to those that tell of its noise.
        let outside = self.room.min(REACH + BESIDE);
        let count = outside + (self.span.last - self.span.first).min(REACH + BESIDE) + 1;
        let at = |index: usize| {
            if self.is_before { self.span.first + index - outside } else { self.span.last + outside - index }
        };
        let told = at(outside);
        let Some(most) = count.checked_sub(SHORTEST) else { return told };
        let differences = self.differences(count, at);
        let log_likelihood_of = |sound: usize| {
            let noises = NOISES.map(|times| times * self.span.noise);
            log_sum(noises.into_iter().flat_map(|noise| {
                let differences = &differences;
                (1..=ROUGHNESSES).map(move |halved| {
                    let motion = THIRD * (noise / 2.0_f64.powi(halved)).max(LEAST_RAD);
                    log_likelihood(differences, sound, noise, motion)
                })
            }))
        };
        // From the end that is farthest out on.
        let tried = outside.saturating_sub(REACH)..=(outside + REACH).min(most);
        let each: Vec<(usize, f64)> = tried.map(|sound| (sound, log_likelihood_of(sound))).collect();
        let all = log_sum(each.iter().map(|own| own.1));
        let mut farther_out = 0.0;
        let end = each.iter().find(|(_, own)| {
            farther_out += (own - all).exp();
            farther_out >= LEFT_OUT
        });
        end.map_or(told, |(sound, _)| at(*sound))
    }

    /// The differences of `count` keys, from the outermost on, where these are evenly spaced.
    fn differences(&self, count: usize, at: impl Fn(usize) -> usize) -> Vec<Difference> {
        let step = |index: usize| (self.row.scan.secs(at(index + 1)) - self.row.scan.secs(at(index))).abs();
        let is_even = |index: usize| (step(index) - self.row.step_secs).abs() <= UNEVEN * self.row.step_secs;
        let starts = (0..count.saturating_sub(ORDER)).filter(|start| (*start..start + ORDER).all(is_even));
        starts
            .map(|start| {
                let mut parts = [0.0; 4];
                for (i, weight) in WEIGHTS.iter().enumerate() {
                    let own = self.row.poses.at(at(start + i));
                    for (sum, part) in parts.iter_mut().zip([own.s, own.yz, own.zx, own.xy]) {
                        // Rotors turn by half the angle.
                        *sum += 2.0 * weight * part;
                    }
                }
                Difference { start, parts }
            })
            .collect()
    }
}

/// The logarithm of a sum of numbers whose logarithms are known.
fn log_sum(logs: impl Iterator<Item = f64>) -> f64 {
    let logs: Vec<f64> = logs.collect();
    let most = logs.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    most + logs.iter().map(|own| (own - most).exp()).sum::<f64>().ln()
}

/// How likely differences are, as a logarithm, where the first `sound` of the keys that they are made of do not tremble and
/// the others do by `noise`, and the motion's own differences have the deviation `motion`, per axis.
fn log_likelihood(differences: &[Difference], sound: usize, noise: f64, motion: f64) -> f64 {
    // What the noise brings to two differences that are `apart`, the inner one of which begins at `start`.
    let shared = |start: usize, apart: usize| {
        let trembling = sound.saturating_sub(start)..WEIGHTS.len().saturating_sub(apart);
        trembling.map(|i| WEIGHTS[i] * WEIGHTS[i + apart]).sum::<f64>() * noise * noise
    };
    // The covariance as factors L D Lᵀ, of which a row needs the last few: what the differences before tell is taken off
    // each, and what is left stands by itself.
    let mut factors: Vec<Factor> = Vec::with_capacity(differences.len());
    let mut sum = 0.0;
    for (index, own) in differences.iter().enumerate() {
        let mut factor =
            Factor { lower: [0.0; ORDER], variance: shared(own.start, 0) + motion * motion, left: own.parts };
        for back in (1..=ORDER.min(index)).rev() {
            let other = &factors[index - back];
            let mut value = shared(own.start, own.start - differences[index - back].start);
            for further in back + 1..=ORDER.min(index) {
                value -= factor.lower[further - 1]
                    * other.lower[further - back - 1]
                    * factors[index - further].variance;
            }
            let share = value / other.variance;
            factor.lower[back - 1] = share;
            factor.variance -= share * value;
            factor.left.iter_mut().zip(other.left).for_each(|(left, other)| *left -= share * other);
        }
        let square = factor.left.iter().map(|part| part * part).sum::<f64>() / factor.variance;
        let is_sound = own.start + ORDER < sound;
        sum -= 1.5 * factor.variance.ln();
        sum += if is_sound {
            FACTOR - 0.5 * (FREEDOM + 3.0) * (square / FREEDOM).ln_1p()
        } else {
            -0.5 * square
        };
        factors.push(factor);
    }
    sum
}

/// A row of the factors of a covariance.
struct Factor {
    /// What it takes of the rows before: the last, the one before that, and so on.
    lower: [f64; ORDER],
    variance: f64,
    left: [f64; 4],
}

#[cfg(test)]
mod tests {
    use super::super::tests::{shaken, with_row};
    use super::*;
    use crate::clip::Times;

    /// The ends of a span that was told from one key to another, for noise of 2° from one key to another.
    fn ends(seed: u64, true_keys: (usize, usize), told: (usize, usize)) -> (usize, usize) {
        let clip = shaken(Times::Even { step_secs: 1.0 / 30.0, count: 60 }, true_keys, 2.0, seed);
        with_row(&clip, |row| {
            let noise = 2.0_f64.to_radians();
            let span =
                Span { first: told.0, last: told.1, noise, quiet: 0.0, clarity: 1.0, is_scored: false };
            let span = fitted(row, span, &(0..row.len()));
            (span.first, span.last)
        })
    }

    #[test]
    fn ends_that_were_told_wrong_are_told_to_a_key() {
        // Noise alone has keys now and then that do not stir: so not all of them.
        let is_near = |own: usize, truth: usize| own.abs_diff(truth) <= 1;
        for (true_keys, told) in [
            ((20, 40), (20, 40)),
            ((20, 40), (24, 35)),
            ((20, 40), (13, 48)),
            ((20, 59), (20, 53)),
            ((0, 40), (5, 40)),
            // The clip's end is one candidate among the others.
            ((20, 53), (20, 59)),
        ] {
            let right = |seed: &u64| {
                let (first, last) = ends(*seed, true_keys, told);
                is_near(first, true_keys.0) && is_near(last, true_keys.1)
            };
            let count = (1..=10).filter(right).count();
            assert!(count >= 9, "{true_keys:?} told as {told:?}: {count} of 10");
        }
    }
}

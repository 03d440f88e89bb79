//! Where a span ends: keys beside it that tremble too.
//!
//! A fourth difference shows the noise of a span's outermost key with a seventieth of its power, so that by chance one or two
//! keys are left out, and near the end of the clip all that follow. To a mend that takes them for sound they are worse than
//! noise. Here each is laid beside where the sound motion outside leads, which tells one key by itself.

use std::ops::Range;

use crate::rotor::Rotor;

use super::{FOURTH, MIDDLE, Row, Span, UNEVEN, middle_of};

/// So many keys may be left out at an end that lies inside the clip, and how much likelier as noise than as motion, as a
/// logarithm, each must be: two are rare.
const LIKELIER: [f64; 2] = [0.0, 4.0];

/// No key counts as noise that is off by less than this share of its deviation.
const LEAST_SHARE: f64 = 0.35;

/// Keys outside on which the sound motion is measured: none of those that may have been left out.
const SOUND: Range<usize> = 4..14;
const LEAST_SOUND: usize = 3;

/// Motion beside a span may be so many times rougher than where it was measured.
const ROUGHER: f64 = 2.0;

/// So few keys up to the end of the clip are taken for noise where their fourth differences are this many deviations long:
/// those of noise are 14, those of sound ones beside one that trembles 2.
const END_KEYS: usize = 7;
const END_DEVIATIONS: f64 = 2.5;

/// No motion is told more exactly than this.
const LEAST_RAD: f64 = 3e-4;

/// Differences of first to fourth order.
const WEIGHTS: [&[f64]; 4] =
    [&[1.0, -1.0], &[1.0, -2.0, 1.0], &[1.0, -3.0, 3.0, -1.0], &[1.0, -4.0, 6.0, -4.0, 1.0]];

/// The span with the keys beside it that tremble too, of those that are free.
pub(super) fn extended(row: &Row<'_>, span: Span, free: &Range<usize>) -> Span {
    let reach = SOUND.end + WEIGHTS.len();
    let near = span.first.saturating_sub(reach).max(free.start)..(span.last + reach + 1).min(free.end);
    let step = |key: usize| row.scan.secs(key + 1) - row.scan.secs(key);
    let is_even = (near.start..near.end.saturating_sub(1))
        .all(|key| (step(key) - row.step_secs).abs() <= UNEVEN * row.step_secs);
    if !is_even {
        return span;
    }
    let before = Side { row, end: span.first, is_before: true, room: span.first.saturating_sub(free.start) };
    let after = Side { row, end: span.last, is_before: false, room: free.end.saturating_sub(span.last + 1) };
    Span {
        first: span.first - before.left_out(&after, &span),
        last: span.last + after.left_out(&before, &span),
        ..span
    }
}

/// The keys on one side of a span, counted from its last one, which is 0, outwards.
struct Side<'a> {
    row: &'a Row<'a>,
    end: usize,
    is_before: bool,
    room: usize,
}

impl Side<'_> {
    fn pose(&self, index: usize) -> Rotor {
        self.row.poses.at(if self.is_before { self.end - index } else { self.end + index })
    }

    /// How far a pose lies from where the `order` poses outside it lead, in radians.
    fn off(&self, index: usize, order: usize) -> f64 {
        let mut sum = [0.0; 4];
        for (i, weight) in WEIGHTS[order - 1].iter().enumerate() {
            let own = self.pose(index + i);
            for (sum, part) in sum.iter_mut().zip([own.s, own.yz, own.zx, own.xy]) {
                *sum += weight * part;
            }
        }
        // Rotors turn by half the angle.
        2.0 * sum.iter().map(|part| part * part).sum::<f64>().sqrt()
    }

    /// The same of all sound keys.
    fn sound(&self, order: usize) -> Vec<f64> {
        let inside = SOUND.filter(|index| index + order <= self.room);
        inside.map(|index| self.off(index, order)).collect()
    }

    /// The order that tells the sound motion best, and how exactly, as a deviation per axis.
    fn sound_deviation(&self, other: &Self) -> (usize, f64) {
        let each = (1..=WEIGHTS.len()).filter_map(|order| {
            let mut off = self.sound(order);
            if off.len() < LEAST_SOUND {
                off.extend(other.sound(order));
            }
            (off.len() >= LEAST_SOUND).then(|| (order, middle_of(off) / MIDDLE))
        });
        each.min_by(|a, b| a.1.total_cmp(&b.1)).unwrap_or((WEIGHTS.len(), f64::INFINITY))
    }

    /// How many keys on this side tremble too.
    fn left_out(&self, other: &Self, span: &Span) -> usize {
        const ORDER: usize = WEIGHTS.len();
        if self.room < ORDER {
            return 0;
        }
        if self.room <= END_KEYS {
            let squares: Vec<f64> =
                (0..=self.room - ORDER).map(|index| self.off(index, ORDER).powi(2)).collect();
            let mean = squares.iter().sum::<f64>() / squares.len() as f64;
            if mean.sqrt() >= END_DEVIATIONS * span.noise {
                return self.room;
            }
        }
        let quiet = span.quiet.min(span.noise / 3.0);
        let (order, deviation) = self.sound_deviation(other);
        let motion = (ROUGHER * deviation.min(FOURTH * quiet)).max(LEAST_RAD).powi(2);
        let both = motion + span.noise.powi(2);
        let is_noise = |index: usize| {
            let off = self.off(index, order);
            let likelier = 0.5 * off * off * (1.0 / motion - 1.0 / both) - 1.5 * (both / motion).ln();
            off >= LEAST_SHARE * span.noise && likelier > LIKELIER[index - 1]
        };
        let tried = (1..=LIKELIER.len()).rev().filter(|index| index + order <= self.room);
        tried.into_iter().find(|index| is_noise(*index)).unwrap_or(0)
    }
}

//! Which times of two clips belong together: a registration curve (Kovar & Gleicher 2003).

use crate::clip::Clip;

use super::BlendError;
use super::cloud::{Cloud, Landmarks};
use super::frames;
use super::mix::MixAlong;
use super::warp::{Band, WarpPath, diagonal_band, warp_within};

/// Which times of two clips belong together, strictly increasing in both, and how the second is to be turned there to
/// face as the first does. The ends belong together.
///
/// A place on the curve is a number from 0 to 1, half from the share of the first clip's length and half from the second's.
#[derive(Clone, Debug, PartialEq)]
pub struct Registration {
    /// Places of the knots, from 0 to 1.
    pub places: Vec<f64>,
    /// The first clip's time at each knot, seconds.
    pub first_secs: Vec<f64>,
    /// The second clip's time at each knot, seconds.
    pub second_secs: Vec<f64>,
    /// The turn about the vertical that makes the second face as the first, in radians, without jumps.
    pub turns_rad: Vec<f64>,
}

/// One frame of a mix: where it takes its poses from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stop {
    /// Time in the first clip.
    pub first_secs: f64,
    /// Time in the second clip.
    pub second_secs: f64,
    /// The turn of the second clip, radians about the vertical.
    pub turn_rad: f64,
}

/// Frames to either side that a pose is compared with, seconds: rates count too.
const WINDOW_SECS: f64 = 0.08;
/// How far the curve may leave the straight way, as a share of the second clip's length to either side.
const BAND: f64 = 0.3;
/// Steps of one clip alone in a row: its pace is at most one more than this times the other's.
const MOST_STRAIGHT: usize = 2;
/// Above so many frames the way is found on fewer first and then made finer.
const COARSE_FRAMES: usize = 800;
/// Distance of the curve's knots in seconds; shorter detours of the way are noise.
const KNOT_SECS: f64 = 0.15;

/// The registration of `b` to `a`: dynamic time warping on the distances of their poses, which don't depend on where
/// on the ground and how turned about the vertical either is, and a smooth strictly increasing curve through the way found. Both
/// clips have the same skeleton.
///
/// # Errors
/// When a clip has no frames, or one is more than three times as long as the other at the same pace.
pub fn align(a: &Clip, b: &Clip) -> Result<Registration, BlendError> {
    frames::check_frames(a)?;
    frames::check_frames(b)?;
    let rate = a.grid.rate.max(1.0);
    // The same number of frames for both keeps the bound on the pace to the share of the length that each is at.
    let count = ((a.duration_secs.max(b.duration_secs) * rate).round() as usize + 1).max(2);
    let landmarks = Landmarks::of(a);
    let secs = |clip: &Clip| -> Vec<f64> {
        (0..count).map(|frame| clip.duration_secs * frame as f64 / (count - 1) as f64).collect()
    };
    let (own_secs, other_secs) = (secs(a), secs(b));
    let (own, other) = (Cloud::of(a, &own_secs, &landmarks), Cloud::of(b, &other_secs, &landmarks));
    let reach = ((WINDOW_SECS * rate).round() as usize).max(1);
    let path = path(&own, &other, reach).ok_or(BlendError::TooUnlike {
        most: MOST_STRAIGHT + 1,
        rows: own.len(),
        columns: other.len(),
    })?;
    let last = count - 1;
    let about = |i: usize, j: usize| {
        let reach = (2 * reach).min(i).min(j).min(last - i).min(last - j);
        (0..=2 * reach).map(move |step| (i + step - reach, j + step - reach))
    };
    let turns = unrolled(path.cells.iter().map(|&(i, j)| own.facing(&other, about(i, j))));
    Ok(through(&path, &turns, count, [a.duration_secs, b.duration_secs]))
}

/// The cheapest way: on few frames first where the clips are long, and then about the way found on four times as many, again and
/// again. What it takes in memory grows with the clips' length, not with its square.
fn path(own: &Cloud, other: &Cloud, reach: usize) -> Option<WarpPath> {
    /// Frames that come in between from one round to the next.
    const FINER: usize = 4;
    let (rows, columns) = (own.len(), other.len());
    let mut stride = 1;
    while rows.max(columns).div_ceil(stride) > COARSE_FRAMES {
        stride *= FINER;
    }
    let left = |frames: usize, stride: usize| (frames - 1) / stride + 1;
    let distance = |stride: usize| move |i: usize, j: usize| own.fit(i * stride, other, j * stride, reach).0;
    let band = diagonal_band(left(rows, stride), left(columns, stride), BAND, 2);
    let most = Some(MOST_STRAIGHT);
    let mut way = warp_within(&band, left(columns, stride), most, distance(stride))?;
    while stride > 1 {
        stride /= FINER;
        let (rows, columns) = (left(rows, stride), left(columns, stride));
        way = warp_within(&around(&way, FINER, rows, columns), columns, most, distance(stride))?;
    }
    Some(way)
}

/// A band of cells about a coarse way.
fn around(path: &WarpPath, stride: usize, rows: usize, columns: usize) -> Band {
    let reach = 2 * stride;
    let mut band = vec![(columns, 0); rows];
    for &(i, j) in &path.cells {
        let (row, column) = (i * stride, j * stride);
        let span = (column.saturating_sub(reach), (column + reach + 1).min(columns));
        for own in &mut band[row.saturating_sub(reach)..(row + reach + 1).min(rows)] {
            *own = (own.0.min(span.0), own.1.max(span.1));
        }
    }
    // The last cell may lie a part of a stride beyond the coarse grid's.
    if let Some(last) = band.last_mut() {
        last.1 = columns;
    }
    for row in (0..rows.saturating_sub(1)).rev().take(reach) {
        band[row].1 = band[row].1.max(columns.saturating_sub(rows - row));
    }
    band
}

pub(super) fn unrolled(turns: impl Iterator<Item = f64>) -> Vec<f64> {
    let mut last: Option<f64> = None;
    turns
        .map(|turn| {
            let turn = last.map_or(turn, |last| last + wrapped(turn - last));
            last = Some(turn);
            turn
        })
        .collect()
}

fn wrapped(turn: f64) -> f64 {
    let full = std::f64::consts::TAU;
    turn - full * (turn / full).round()
}

/// A smooth curve through a way of cells of a square grid of `count` frames.
fn through(path: &WarpPath, turns: &[f64], count: usize, lengths_secs: [f64; 2]) -> Registration {
    let share = |frame: usize| frame as f64 / (count - 1) as f64;
    let longest = lengths_secs[0].max(lengths_secs[1]);
    let pieces = ((longest / KNOT_SECS).round() as usize).clamp(1, count - 1);
    let width = 1.0 / pieces as f64;
    // At each knot the lead of the first clip over the second, and the turn, averaged with a tent of a knot's width.
    let mut sums = vec![[0.0; 3]; pieces + 1];
    for (&(i, j), &turn) in path.cells.iter().zip(turns) {
        let (lead, place) = (share(i) - share(j), f64::midpoint(share(i), share(j)));
        let knot = place / width;
        for near in [knot.floor(), knot.floor() + 1.0] {
            let weight = 1.0 - (knot - near).abs();
            if let Some(sum) = sums.get_mut(near as usize).filter(|_| weight > 0.0) {
                *sum = [sum[0] + weight, sum[1] + weight * lead, sum[2] + weight * turn];
            }
        }
    }
    let mut leads: Vec<f64> = sums.iter().map(|sum| sum[1] / sum[0]).collect();
    // The ends belong together.
    leads[0] = 0.0;
    leads[pieces] = 0.0;
    // A lead that grows by less than twice the place keeps both times rising; three quarters of that leave some pace.
    let most = 1.5 * width;
    for knot in 1..=pieces {
        leads[knot] = leads[knot].clamp(leads[knot - 1] - most, leads[knot - 1] + most);
    }
    leads[pieces] = 0.0;
    for knot in (0..pieces).rev() {
        leads[knot] = leads[knot].clamp(leads[knot + 1] - most, leads[knot + 1] + most);
    }
    let places: Vec<f64> = (0..=pieces).map(|knot| knot as f64 * width).collect();
    let time = |sign: f64, length: f64| {
        leads.iter().zip(&places).map(|(lead, place)| (place + sign * 0.5 * lead) * length).collect()
    };
    Registration {
        first_secs: time(1.0, lengths_secs[0]),
        second_secs: time(-1.0, lengths_secs[1]),
        turns_rad: sums.iter().map(|sum| sum[2] / sum[0]).collect(),
        places,
    }
}

impl Registration {
    /// The two clips frame for frame at the same share of their lengths, unturned.
    pub fn straight(a: &Clip, b: &Clip) -> Self {
        Self {
            places: vec![0.0, 1.0],
            first_secs: vec![0.0, a.duration_secs],
            second_secs: vec![0.0, b.duration_secs],
            turns_rad: vec![0.0, 0.0],
        }
    }

    /// Times in both clips and the turn of the second at a place from 0 to 1.
    pub fn at(&self, place: f64) -> Stop {
        Stop {
            first_secs: monotone(&self.places, &self.first_secs, place)[0],
            second_secs: monotone(&self.places, &self.second_secs, place)[0],
            turn_rad: monotone(&self.places, &self.turns_rad, place)[0],
        }
    }

    /// What belongs to a time of the first clip; beyond its ends what belongs to them.
    pub fn at_first(&self, first_secs: f64) -> Stop {
        /// Halvings to the last bit of a place, should Newton's steps not settle before.
        const MOST_STEPS: usize = 60;
        let last = self.places.len() - 1;
        let (first, end) = (self.first_secs[0], self.first_secs[last]);
        if first_secs <= first || first_secs >= end {
            let place = if first_secs <= first { self.places[0] } else { self.places[last] };
            return Stop { first_secs, ..self.at(place) };
        }
        // Times rise from knot to knot.
        let knot = self.first_secs.partition_point(|&secs| secs <= first_secs) - 1;
        let [mut from, mut to] = [self.places[knot], self.places[knot + 1]];
        let chord =
            (first_secs - self.first_secs[knot]) / (self.first_secs[knot + 1] - self.first_secs[knot]);
        let mut place = from + (to - from) * chord;
        for _ in 0..MOST_STEPS {
            let [secs, slope] = monotone(&self.places, &self.first_secs, place);
            let beyond = secs - first_secs;
            if beyond < 0.0 {
                from = place;
            } else {
                to = place;
            }
            let next = place - beyond / slope;
            let next = if next >= from && next <= to { next } else { f64::midpoint(from, to) };
            let is_settled = (next - place).abs() <= f64::EPSILON * place;
            place = next;
            if is_settled {
                break;
            }
        }
        Stop { first_secs, ..self.at(place) }
    }

    /// The frames of a mix at `rate`: its clock runs at the weighted mean of both clips' paces. A weight of 1 all along gives
    /// the second clip's own times exactly.
    pub fn stops(&self, weight: &MixAlong, rate: f64) -> Vec<Stop> {
        // The result's time at places along the curve: the mean of both paces, summed by the trapezium rule.
        const STEPS: usize = 16;
        let steps = STEPS * (self.places.len() - 1);
        let only = weight.only();
        let mut clock = Vec::with_capacity(steps + 1);
        let mut before = self.at(0.0);
        let mut now = 0.0;
        for step in 0..=steps {
            let stop = self.at(step as f64 / steps as f64);
            let mean = |w: f64| {
                w.mul_add(
                    stop.second_secs - before.second_secs,
                    (1.0 - w) * (stop.first_secs - before.first_secs),
                )
            };
            now = match only {
                Some(w) => (1.0 - w) * stop.first_secs + w * stop.second_secs,
                None => now + mean(weight.at(f64::midpoint(before.first_secs, stop.first_secs))),
            };
            clock.push(now);
            before = stop;
        }
        let count = (now * rate + frames::SLACK).floor() as usize + 1;
        let mut cell = 0;
        (0..count)
            .map(|frame| {
                let secs = (frame as f64 / rate).min(now);
                while cell + 2 < clock.len() && clock[cell + 1] < secs {
                    cell += 1;
                }
                let (from, to) = (clock[cell], clock[cell + 1]);
                let share = if to > from { ((secs - from) / (to - from)).clamp(0.0, 1.0) } else { 0.0 };
                let ends = [cell as f64, cell as f64 + 1.0].map(|at| at / steps as f64);
                let mut stop = self.at(self.place_of(only, ends, share, secs));
                if only == Some(1.0) {
                    stop.second_secs = secs;
                }
                if only == Some(0.0) {
                    stop.first_secs = secs;
                }
                stop
            })
            .collect()
    }

    /// The place whose clock shows `secs`, between two places, from the share of the way that the chord says. Exact for one
    /// weight all along, by Newton's steps held between the places; by the chord else, which is a sixteenth of a knot long.
    fn place_of(&self, only: Option<f64>, [mut from, mut to]: [f64; 2], share: f64, secs: f64) -> f64 {
        /// Each step doubles the digits that are right.
        const STEPS: usize = 8;
        let mut place = from + (to - from) * share;
        let Some(w) = only else { return place };
        for _ in 0..STEPS {
            let [first, first_slope] = monotone(&self.places, &self.first_secs, place);
            let [second, second_slope] = monotone(&self.places, &self.second_secs, place);
            let beyond = (1.0 - w) * first + w * second - secs;
            if beyond < 0.0 {
                from = place;
            } else {
                to = place;
            }
            let step = beyond / ((1.0 - w) * first_slope + w * second_slope);
            let next = place - step;
            // A clock that stands still for a moment has no slope to go by.
            let next = if next >= from && next <= to { next } else { f64::midpoint(from, to) };
            if (next - place).abs() <= f64::EPSILON * place {
                return next;
            }
            place = next;
        }
        place
    }
}

/// A piecewise cubic through knots that rises where they rise and has no peak of its own (Fritsch & Carlson 1980, with
/// the harmonic mean of slopes by Fritsch & Butland 1984): its value and its slope.
fn monotone(knots: &[f64], values: &[f64], at: f64) -> [f64; 2] {
    let last = knots.len() - 1;
    if last == 0 {
        return [values[0], 0.0];
    }
    let at = at.clamp(knots[0], knots[last]);
    if at == knots[last] {
        return [values[last], (values[last] - values[last - 1]) / (knots[last] - knots[last - 1])];
    }
    let cell = knots.partition_point(|&knot| knot <= at) - 1;
    let slope = |cell: usize| (values[cell + 1] - values[cell]) / (knots[cell + 1] - knots[cell]);
    let slope_at = |knot: usize| {
        if knot == 0 || knot == last {
            // At the ends the chord's slope: monotone, and straight where there is one piece only.
            return slope(knot.min(last - 1));
        }
        let (left, right) = (slope(knot - 1), slope(knot));
        let (before, after) = (knots[knot] - knots[knot - 1], knots[knot + 1] - knots[knot]);
        if left * right <= 0.0 {
            return 0.0;
        }
        let (w_left, w_right) = (2.0 * after + before, after + 2.0 * before);
        (w_left + w_right) / (w_left / left + w_right / right)
    };
    let width = knots[cell + 1] - knots[cell];
    let t = (at - knots[cell]) / width;
    let (t2, t3) = (t * t, t * t * t);
    let [from, to] = [values[cell], values[cell + 1]];
    let [out, into] = [slope_at(cell), slope_at(cell + 1)];
    let value = from * (2.0 * t3 - 3.0 * t2 + 1.0)
        + out * width * (t3 - 2.0 * t2 + t)
        + to * (3.0 * t2 - 2.0 * t3)
        + into * width * (t3 - t2);
    let slope =
        (to - from) * 6.0 * (t - t2) / width + out * (3.0 * t2 - 4.0 * t + 1.0) + into * (3.0 * t2 - 2.0 * t);
    [value, slope]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_clock_of_a_mix_shows_each_frames_time() {
        let places: Vec<f64> = (0..=8).map(|knot| f64::from(knot) / 8.0).collect();
        let lead = |place: f64| 0.11 * (5.0 * place).sin() * place * (1.0 - place);
        let time = |sign: f64, length: f64| -> Vec<f64> {
            places.iter().map(|&place| (place + sign * lead(place)) * length).collect()
        };
        let (first_secs, second_secs) = (time(1.0, 2.0), time(-1.0, 1.3));
        let along = Registration { first_secs, second_secs, turns_rad: vec![0.0; 9], places };
        for w in [0.0, 0.3, 0.5, 1.0] {
            let stops = along.stops(&MixAlong::constant(w), 30.0);
            for (frame, stop) in stops.iter().enumerate() {
                let clock = (1.0 - w) * stop.first_secs + w * stop.second_secs;
                assert!((clock - frame as f64 / 30.0).abs() < 1e-13, "{w}: frame {frame} at {clock}");
            }
            assert_eq!(stops.len(), ((2.0 - 0.7 * w) * 30.0 + 1e-6) as usize + 1);
        }
        // What belongs to a time of the first clip is what the curve has beside it.
        for step in 0..=97 {
            let stop = along.at(f64::from(step) / 97.0);
            let found = along.at_first(stop.first_secs);
            assert!((found.second_secs - stop.second_secs).abs() < 1e-12, "{found:?} {stop:?}");
        }
        assert_eq!([along.at_first(-1.0), along.at_first(9.0)].map(|stop| stop.second_secs), [0.0, 1.3]);
    }

    #[test]
    fn a_long_way_is_found_in_rounds_as_on_all_frames_at_once() {
        // Points on a circle, the second at an uneven pace: which frame fits which is known.
        let count = 1700;
        let cloud = |pace: &dyn Fn(f64) -> f64| {
            let points = (0..count).flat_map(|frame| {
                let angle = 40.0 * pace(frame as f64 / (count - 1) as f64);
                let height = 1.0 + 0.6 * angle.sin();
                [glam::DVec3::new(0.0, height, 0.2 * angle.cos()), glam::DVec3::new(0.4, 0.0, 0.0)]
            });
            Cloud::from_points(vec![0.5, 0.5], points.collect())
        };
        let bent = |share: f64| share + 0.05 * (std::f64::consts::TAU * share).sin();
        let (own, other) = (cloud(&|share| share), cloud(&bent));
        let rounds = path(&own, &other, 2).unwrap();
        let band = diagonal_band(count, count, BAND, 2);
        let whole =
            warp_within(&band, count, Some(MOST_STRAIGHT), |i, j| own.fit(i, &other, j, 2).0).unwrap();
        assert!(rounds.total <= 1.02 * whole.total + 1e-12, "{} and {}", rounds.total, whole.total);
        let worst = rounds
            .cells
            .iter()
            .map(|&(i, j)| (i as f64 - bent(j as f64 / (count - 1) as f64) * (count - 1) as f64).abs())
            .fold(0.0, f64::max);
        assert!(worst < 6.0, "{worst} frames off");
    }
}

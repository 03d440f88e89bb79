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
    let turns = unrolled(path.cells.iter().map(|&(i, j)| own.fit(i, &other, j, 2 * reach).1.turn_rad));
    Ok(through(&path, &turns, count, [a.duration_secs, b.duration_secs]))
}

/// The cheapest way, coarse first where the clips are long.
fn path(own: &Cloud, other: &Cloud, reach: usize) -> Option<WarpPath> {
    let (rows, columns) = (own.len(), other.len());
    let stride = rows.max(columns).div_ceil(COARSE_FRAMES);
    let coarse = |frames: usize| (frames - 1) / stride + 1;
    let distance = |i: usize, j: usize| own.fit(i, other, j, reach).0;
    let band = diagonal_band(coarse(rows), coarse(columns), BAND, 2);
    let most = Some(MOST_STRAIGHT);
    let first = warp_within(&band, coarse(columns), most, |i, j| distance(i * stride, j * stride))?;
    if stride == 1 {
        return Some(first);
    }
    warp_within(&around(&first, stride, rows, columns), columns, most, distance)
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

fn unrolled(turns: impl Iterator<Item = f64>) -> Vec<f64> {
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
            first_secs: monotone(&self.places, &self.first_secs, place),
            second_secs: monotone(&self.places, &self.second_secs, place),
            turn_rad: monotone(&self.places, &self.turns_rad, place),
        }
    }

    /// The frames of a mix at `rate`: its clock runs at the weighted mean of both clips' paces. A weight of 1 all along gives
    /// the second clip's own times exactly.
    pub(super) fn stops(&self, weight: &MixAlong, rate: f64) -> Vec<Stop> {
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
                let place = self.place_of(
                    only,
                    [cell as f64, cell as f64 + 1.0].map(|at| at / steps as f64),
                    share,
                    secs,
                );
                let mut stop = self.at(place);
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

    /// The place whose clock shows `secs`, between two places. Exact for one weight all along, by halving; by the chord else,
    /// which is a sixteenth of a knot long.
    fn place_of(&self, only: Option<f64>, [mut from, mut to]: [f64; 2], share: f64, secs: f64) -> f64 {
        let Some(w) = only else { return from + (to - from) * share };
        for _ in 0..60 {
            let middle = f64::midpoint(from, to);
            let stop = self.at(middle);
            if (1.0 - w) * stop.first_secs + w * stop.second_secs < secs {
                from = middle;
            } else {
                to = middle;
            }
        }
        f64::midpoint(from, to)
    }
}

/// A piecewise cubic through knots that rises where they rise and has no peak of its own (Fritsch & Carlson 1980, with
/// the harmonic mean of slopes by Fritsch & Butland 1984).
fn monotone(knots: &[f64], values: &[f64], at: f64) -> f64 {
    let last = knots.len() - 1;
    if last == 0 || at <= knots[0] {
        return values[0];
    }
    if at >= knots[last] {
        return values[last];
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
    values[cell] * (2.0 * t3 - 3.0 * t2 + 1.0)
        + slope_at(cell) * width * (t3 - 2.0 * t2 + t)
        + values[cell + 1] * (3.0 * t2 - 2.0 * t3)
        + slope_at(cell + 1) * width * (t3 - t2)
}

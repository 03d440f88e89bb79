//! What the other joints of a clip do, as a few numbers for each time.

use glam::DVec3;

use crate::clip::{Clip, RotationTrack};
use crate::rotor::{Rotor, chordal_mean};

use super::draft::Draft;
use super::regress::{Table, dot, principal};

/// So many numbers at most.
const DIRECTIONS: usize = 15;

/// Poses from which the means and directions are taken, at most.
const SAMPLED: usize = 400;

/// A joint whose poses spread less than this, in radians, tells nothing.
const LEAST_SPREAD_RAD: f64 = 2e-3;

/// Nowhere are the other joints told to be so much rougher than usual, or so much calmer.
const ROUGHER: f64 = 50.0;

/// The other joints of a clip.
pub(super) struct Others<'a> {
    tracks: Vec<Other<'a>>,
    /// The mean of the raw numbers.
    mean: Vec<f64>,
    /// Rows: directions in the raw numbers.
    directions: Table,
}

struct Other<'a> {
    track: &'a RotationTrack,
    /// Back from its mean pose. A root has none: which way it is heading tells nothing, so what is up for it counts.
    home: Option<Rotor>,
}

impl<'a> Others<'a> {
    /// Those joints of `clip` beside `joint` that move, and that do not themselves stand still throughout the gap between
    /// keys `gap` of `draft`; learned from the times of the keys `starts`. `None` when there are none.
    pub(super) fn new(
        clip: &'a Clip,
        joint: usize,
        draft: &Draft,
        gap: (usize, usize),
        starts: &[usize],
    ) -> Option<Self> {
        let stride = starts.len().div_ceil(SAMPLED).max(1);
        let times: Vec<f64> = starts.iter().step_by(stride).map(|key| draft.secs(*key)).collect();
        let gap_secs = (draft.secs(gap.0), draft.secs(gap.1));
        let skeleton = &clip.skeleton;
        let tracks: Vec<Other<'a>> = skeleton
            .listed()
            .filter(|other| *other != joint)
            .filter_map(|other| {
                let track = clip.rotation(other).filter(|track| track.keys.len() > 2)?;
                let poses: Vec<(Rotor, f64)> = times.iter().map(|time| (track.at(*time), 1.0)).collect();
                let mean = chordal_mean(&poses)?.rotor;
                let spread = poses.iter().map(|(pose, _)| pose.turn_to(mean).powi(2)).sum::<f64>();
                let spread = (spread / poses.len() as f64).sqrt();
                if spread < LEAST_SPREAD_RAD || stands_still(track, gap_secs) {
                    return None;
                }
                let home = skeleton.parent_joint(other).map(|_| mean.reverse());
                Some(Other { track, home })
            })
            .collect();
        if tracks.is_empty() || times.is_empty() {
            return None;
        }
        let mut others = Self { tracks, mean: Vec::new(), directions: Table::default() };
        let width = 3 * others.tracks.len();
        let mut rows = Table::new(width);
        for time in &times {
            rows.push(&others.raw(*time));
        }
        let count = times.len() as f64;
        others.mean = vec![0.0; width];
        for row in rows.numbers.chunks_exact(width) {
            others.mean.iter_mut().zip(row).for_each(|(mean, own)| *mean += own / count);
        }
        for row in rows.numbers.chunks_exact_mut(width) {
            row.iter_mut().zip(&others.mean).for_each(|(own, mean)| *own -= mean);
        }
        others.directions = principal(&rows, DIRECTIONS);
        (others.width() > 0).then_some(others)
    }

    /// How many numbers a time has.
    pub(super) fn width(&self) -> usize {
        self.directions.numbers.len().checked_div(self.directions.width).unwrap_or(0)
    }

    /// The numbers of a time.
    pub(super) fn at(&self, secs: f64) -> Vec<f64> {
        let mut raw = self.raw(secs);
        raw.iter_mut().zip(&self.mean).for_each(|(own, mean)| *own -= mean);
        (0..self.width()).map(|i| dot(self.directions.row(i), &raw)).collect()
    }

    /// How rough the joints are at each of some evenly spaced times, beside what each is in the mean over all: the middle one
    /// of the joints, so that one that trembles itself does not count. Told by third differences near by (a bell of `sigma`
    /// times).
    pub(super) fn roughness(&self, times: &[f64], sigma: f64) -> Vec<f64> {
        let mut raw = Table::new(3 * self.tracks.len());
        for secs in times {
            raw.push(&self.raw(*secs));
        }
        let count = times.len().saturating_sub(3);
        let reach = (3.0 * sigma) as usize + 1;
        let bell: Vec<f64> = (0..=reach).map(|i| (-0.5 * (i as f64 / sigma).powi(2)).exp()).collect();
        let of_joint = |joint: usize| -> Vec<f64> {
            let part = |start: usize, axis: usize| {
                let at = |i: usize| raw.row(start + i)[3 * joint + axis];
                at(3) - 3.0 * at(2) + 3.0 * at(1) - at(0)
            };
            let thirds: Vec<f64> = (0..count)
                .map(|start| [0, 1, 2].map(|axis| part(start, axis).powi(2)).iter().sum())
                .collect();
            let near = |start: usize| {
                let keys = start.saturating_sub(reach)..(start + reach + 1).min(count);
                let weight = |key: usize| bell[key.abs_diff(start)];
                keys.clone().map(|key| weight(key) * thirds[key]).sum::<f64>() / keys.map(weight).sum::<f64>()
            };
            let near: Vec<f64> = (0..count).map(near).collect();
            let mean = near.iter().sum::<f64>() / count.max(1) as f64;
            near.iter().map(|own| own / mean.max(f64::MIN_POSITIVE)).collect()
        };
        let each: Vec<Vec<f64>> = (0..self.tracks.len()).map(of_joint).collect();
        let middle = |key: usize| {
            let mut own: Vec<f64> = each.iter().map(|joint| joint[key]).collect();
            let middle = own.len() / 2;
            *own.select_nth_unstable_by(middle, f64::total_cmp).1
        };
        // The last three times begin no third difference.
        let told = (0..times.len()).map(|key| if count == 0 { 1.0 } else { middle(key.min(count - 1)) });
        told.map(|own| own.clamp(1.0 / ROUGHER, ROUGHER)).collect()
    }

    fn raw(&self, secs: f64) -> Vec<f64> {
        let numbers = |other: &Other<'_>| -> [f64; 3] {
            let pose = other.track.at(secs);
            match other.home {
                Some(home) => {
                    let angles = (home * pose).plane_angles();
                    [angles.yz, angles.zx, angles.xy]
                }
                None => pose.reverse().apply(DVec3::Y).to_array(),
            }
        };
        self.tracks.iter().flat_map(numbers).collect()
    }
}

/// Whether a joint repeats one pose over most of a gap: its signal may have dropped out too.
fn stands_still(track: &RotationTrack, (from, to): (f64, f64)) -> bool {
    let (from, to) = (track.times.nearest(from), track.times.nearest(to));
    let repeats = (from + 1..=to).filter(|&key| track.keys[key] == track.keys[key - 1]).count();
    to > from && repeats * 2 > to - from
}

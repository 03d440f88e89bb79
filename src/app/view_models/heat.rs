//! The turn map: for each joint and frame how fast it turns, or how far the result is from the source.

use std::ops::Range;
use std::sync::Arc;

use crate::clip::{Clip, turns_between};
use crate::limit::{Limits, adult};
use crate::snag::{Cancelled, Progress};

/// What the colours of the turn map stand for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum HeatKind {
    /// Degrees a second, of the result.
    TurnRate,
    /// Degrees between source and result.
    Change,
    /// Percent of what the joint's limit allows, of the result.
    LimitUse,
}

impl HeatKind {
    /// Its words on screen.
    pub const fn label(self) -> &'static str {
        match self {
            Self::TurnRate => "Turn rate",
            Self::Change => "Change",
            Self::LimitUse => "Use of limits",
        }
    }

    /// Written behind its numbers.
    pub const fn unit(self) -> &'static str {
        match self {
            Self::TurnRate => "°/s",
            Self::Change => "°",
            Self::LimitUse => " %",
        }
    }
}

/// What a turn map is wanted of.
#[derive(Clone, Debug, PartialEq)]
pub struct HeatWish {
    /// What its colours stand for.
    pub kind: HeatKind,
    /// The limits of the clip's work, for [`HeatKind::LimitUse`]; with none the preset for adults is tried.
    pub limits: Option<Arc<Limits>>,
}

/// One joint's row: a code for each frame, and the largest of each [`FACTOR`] of them at each level above.
///
/// A code is one byte on a logarithmic scale, since it only becomes a colour; that keeps an hour of a hundred joints in
/// memory.
#[derive(Clone, Debug, PartialEq)]
struct Row {
    levels: Vec<Vec<u8>>,
    /// How often each code stands in it.
    counts: [u32; 256],
    /// Its hottest value.
    worst: f32,
}

const FACTOR: usize = 8;

impl Row {
    fn new(values: &[f32]) -> Self {
        let codes: Vec<u8> = values.iter().map(|&value| code(value)).collect();
        let mut counts = [0; 256];
        for &code in &codes {
            counts[usize::from(code)] += 1;
        }
        let mut levels = vec![codes];
        while let Some(top) = levels.last().filter(|top| top.len() > FACTOR) {
            let next = top.chunks(FACTOR).map(|chunk| chunk.iter().copied().max().unwrap_or(0)).collect();
            levels.push(next);
        }
        Self { levels, counts, worst: values.iter().copied().fold(0.0, f32::max) }
    }

    fn largest(&self, frames: Range<usize>) -> u8 {
        let (mut start, mut end) = (frames.start, frames.end.min(self.levels[0].len()));
        let mut found = 0;
        let largest = |codes: &[u8]| codes.iter().copied().max().unwrap_or(0);
        for (level, codes) in self.levels.iter().enumerate() {
            if start >= end {
                return found;
            }
            if level + 1 == self.levels.len() || end - start < 2 * FACTOR {
                return found.max(largest(&codes[start..end]));
            }
            let (whole_start, whole_end) = (start.div_ceil(FACTOR) * FACTOR, end / FACTOR * FACTOR);
            found = found.max(largest(&codes[start..whole_start])).max(largest(&codes[whole_end..end]));
            (start, end) = (whole_start / FACTOR, whole_end / FACTOR);
        }
        found
    }
}

/// The rows of all listed joints.
#[derive(Clone, Debug, PartialEq)]
pub struct HeatMap {
    /// What it shows.
    pub kind: HeatKind,
    /// The joints in the order of the skeleton.
    pub joints: Vec<usize>,
    /// The value that gets the hottest colour, in degrees (a second) or percent.
    pub scale: HeatScale,
    /// The limits that were held against, and whether they are the preset because the clip has none of its own.
    pub limits: Option<(Arc<Limits>, bool)>,
    /// Why there is nothing to show.
    pub trouble: Option<String>,
    /// Rows of joints that stayed the same are shared with the map before.
    rows: Vec<Arc<Row>>,
}

/// From values to shares of the colour scale.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HeatScale {
    /// The hottest value that is told apart, in degrees (a second) or percent.
    pub top: f32,
    /// Equal steps of value are equal steps of colour.
    pub is_even: bool,
}

impl HeatScale {
    /// The share of the colour scale for a value: a square root, so that slow motion shows beside fast; use of limits is even.
    pub fn share(&self, value: f32) -> f32 {
        let share = (value / self.top).clamp(0.0, 1.0);
        if self.is_even { share } else { share.sqrt() }
    }

    /// The value at a share of the colour scale.
    pub fn value(&self, share: f32) -> f32 {
        if self.is_even { share * self.top } else { share * share * self.top }
    }
}

/// The largest value a code can hold, and the value from which on codes grow like a logarithm.
const MOST: f32 = 20_000.0;
const KNEE: f32 = 0.25;

fn code(value: f32) -> u8 {
    if value.is_nan() || value <= 0.0 {
        return 0;
    }
    let share = (value / KNEE).ln_1p() / (MOST / KNEE).ln_1p();
    (share * 255.0).round().clamp(1.0, 255.0) as u8
}

fn decode(code: u8) -> f32 {
    ((f32::from(code) / 255.0 * (MOST / KNEE).ln_1p()).exp() - 1.0) * KNEE
}

impl HeatMap {
    /// How many rows.
    pub fn len(&self) -> usize {
        self.rows.len()
    }

    /// Whether there are no rows.
    pub fn is_empty(&self) -> bool {
        self.rows.is_empty()
    }

    /// Share of the colour scale of the hottest of some frames of a row, 0 to 1.
    pub fn share(&self, row: usize, frames: Range<usize>) -> f32 {
        self.scale.share(decode(self.rows[row].largest(frames)))
    }

    /// Shares for every code, so that a picture needs no arithmetic per pixel.
    pub fn shares(&self) -> [f32; 256] {
        std::array::from_fn(|code| self.scale.share(decode(code as u8)))
    }

    /// The code of the hottest of some frames of a row.
    pub fn code(&self, row: usize, frames: Range<usize>) -> u8 {
        self.rows[row].largest(frames)
    }

    /// The value of a row at a frame, as finely as a code tells it.
    pub fn value(&self, row: usize, frame: usize) -> f32 {
        decode(self.rows[row].largest(frame..frame + 1))
    }

    /// The hottest value of a row.
    pub fn worst(&self, row: usize) -> f32 {
        self.rows[row].worst
    }

    /// Whether a row has the colours that it has in another map, as far as that is known without looking at its numbers.
    pub fn has_row_of(&self, other: &Self, row: usize) -> bool {
        let is_shared = |own: &Arc<Row>| other.rows.get(row).is_some_and(|known| Arc::ptr_eq(own, known));
        self.scale == other.scale && self.rows.get(row).is_some_and(is_shared)
    }
}

/// Computes the turn map of a result and its source. `known` is an older map with its source and result: rows of joints
/// that are the same there are taken over.
///
/// # Errors
/// When it is told to stop.
pub fn heat_map(
    source: &Clip,
    result: &Clip,
    wish: &HeatWish,
    known: Option<(&Clip, &Clip, &HeatMap)>,
    progress: &dyn Progress,
) -> Result<HeatMap, Cancelled> {
    let kind = wish.kind;
    let joints: Vec<usize> = result.skeleton.listed().collect();
    let (mut limits, mut trouble) = (None, None);
    if kind == HeatKind::LimitUse {
        match &wish.limits {
            Some(own) => limits = Some((Arc::clone(own), false)),
            None => match adult::limits_for(result) {
                Ok(preset) => limits = Some((Arc::new(preset.limits), true)),
                Err(why) => trouble = Some(why.to_string()),
            },
        }
    }
    let known = known.filter(|(old_source, _, map)| {
        std::ptr::eq(*old_source, source) && map.kind == kind && map.joints == joints && map.limits == limits
    });
    let mut rows = Vec::with_capacity(joints.len());
    for (place, &joint) in joints.iter().enumerate() {
        if !progress.report(place, joints.len()) {
            return Err(Cancelled);
        }
        rows.push(match known {
            Some((_, old, map)) if old.same_joint(result, joint) => Arc::clone(&map.rows[place]),
            _ => Arc::new(Row::new(&match kind {
                HeatKind::TurnRate => rates(result, joint),
                HeatKind::Change => differences(source, result, joint),
                HeatKind::LimitUse => uses(limits.as_ref().map(|(own, _)| &**own), result, joint),
            })),
        });
    }
    let top = match kind {
        HeatKind::TurnRate => {
            let counts: [usize; 256] =
                std::array::from_fn(|code| rows.iter().map(|row| row.counts[code] as usize).sum());
            quantile(&counts, 0.998).max(30.0)
        }
        HeatKind::Change => rows.iter().map(|row| row.worst).fold(1.0, f32::max),
        HeatKind::LimitUse => MOST_USE,
    };
    let is_even = kind == HeatKind::LimitUse;
    let scale = HeatScale { top: if is_even { top } else { round_up(top) }, is_even };
    Ok(HeatMap { kind, joints, scale, limits, trouble, rows })
}

/// The hottest colour of the use of limits, in percent: beyond the limit it goes on getting hotter for a while.
const MOST_USE: f32 = 125.0;

/// Percent of what the limit allows at each frame; 0 for a joint without a limit.
fn uses(limits: Option<&Limits>, clip: &Clip, joint: usize) -> Vec<f32> {
    let own = limits.and_then(|limits| limits.use_at_frames(clip, joint));
    own.map_or_else(
        || vec![0.0; clip.grid.count()],
        |own| own.into_iter().map(|share| (share * 100.0) as f32).collect(),
    )
}

/// Degrees a second over the step that ends at each frame.
fn rates(clip: &Clip, joint: usize) -> Vec<f32> {
    let count = clip.grid.count();
    let mut values = vec![0.0; count];
    if clip.rotation(joint).is_none_or(|track| track.times.len() < 2) {
        return values;
    }
    let times: Vec<f64> = (0..count).map(|frame| clip.grid.time(frame)).collect();
    let turns = turns_between(&clip.rotations_at(joint, &times));
    for (frame, turn) in turns.into_iter().enumerate() {
        values[frame + 1] = (turn / (times[frame + 1] - times[frame])).to_degrees() as f32;
    }
    if count > 1 {
        values[0] = values[1];
    }
    values
}

fn differences(source: &Clip, result: &Clip, joint: usize) -> Vec<f32> {
    let count = result.grid.count();
    if source.same_joint(result, joint) {
        return vec![0.0; count];
    }
    let times: Vec<f64> = (0..count).map(|frame| result.grid.time(frame)).collect();
    let [before, after] = [source, result].map(|clip| clip.rotations_at(joint, &times));
    before.iter().zip(&after).map(|(before, after)| before.turn_to(*after).to_degrees() as f32).collect()
}

/// The value below which `share` of all codes above 0 lie.
fn quantile(counts: &[usize; 256], share: f64) -> f32 {
    let total: usize = counts[1..].iter().sum();
    let mut below = 0;
    for (code, &count) in counts.iter().enumerate().skip(1) {
        below += count;
        if below as f64 >= share * total as f64 {
            return decode(code as u8);
        }
    }
    0.0
}

/// The next of 1, 2, 5, 10, 20, 50 …
fn round_up(value: f32) -> f32 {
    let power = 10.0_f32.powf(value.max(1e-3).log10().floor());
    [1.0, 2.0, 5.0, 10.0]
        .into_iter()
        .map(|step| step * power)
        .find(|&step| step >= value * 0.999)
        .unwrap_or(value)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn codes_keep_values_within_a_few_percent() {
        for value in [0.5_f32, 3.0, 40.0, 720.0, 15_000.0] {
            let back = decode(code(value));
            assert!((back / value - 1.0).abs() < 0.05, "{value} came back as {back}");
        }
        assert_eq!(code(0.0), 0);
        assert_eq!(code(f32::NAN), 0);
        assert_eq!(code(1e9), 255);
    }

    #[test]
    fn the_hottest_of_any_range_is_the_plain_maximum() {
        let values: Vec<f32> = (0..5000_u32).map(|i| ((i * 7919) % 251) as f32).collect();
        let codes: Vec<u8> = values.iter().map(|&value| code(value)).collect();
        let row = Row::new(&values);
        for (start, end) in [(0, 1), (3, 5), (7, 900), (64, 4096), (1, 5000), (4990, 6000), (9, 9)] {
            let plain = codes[start..end.min(5000)].iter().copied().max().unwrap_or(0);
            assert_eq!(row.largest(start..end), plain, "{start}..{end}");
        }
    }

    #[test]
    fn scales_end_on_round_numbers() {
        for (value, round) in [(1.0, 1.0), (1.2, 2.0), (33.0, 50.0), (501.0, 1000.0)] {
            assert_eq!(round_up(value), round);
        }
    }
}

//! Spans in which a joint trembles: noise above the band of its own motion.
//!
//! A fourth difference takes out what a motion does slowly. What it leaves of white noise does not depend on how far apart
//! the poses are that it is made of; what it leaves of motion grows up to sixteenfold when they are twice as far apart. So
//! the two together tell noise from motion, without a word about how fast the joint may be; how much noise is usual is told
//! by the joint's other times, and by the joint on the other side of the body.

mod ends;
mod score;
mod white;

use std::cell::OnceCell;
use std::f64::consts::PI;
use std::ops::Range;

use crate::clip::Times;
use crate::rotor::Rotor;

use super::mirror::mirror_of;
use super::poses::{Lazy, Poses};
use super::scan::{Finding, Scan, View};
use super::{Remedy, Snag, SnagKind};

/// With fewer keys nothing can be said about what is usual.
const LEAST_KEYS: usize = 24;

/// The shortest span told.
const SHORTEST_SECS: f64 = 0.2;
const SHORTEST_KEYS: usize = 10;

/// Levels are taken over this long, and at least so many keys.
const WINDOW_SECS: f64 = 0.2;
const WINDOW_KEYS: usize = 8;

/// Poses up to so far apart are compared: what trembles slower is motion.
pub(super) const FARTHEST_SECS: f64 = 0.034;
/// With fewer poses a second than this a motion's own bends look like noise.
const COARSEST_SECS: f64 = 0.05;
pub(super) const LAGS: [usize; 3] = [1, 2, 4];

/// Noise below this, per axis, is not seen.
pub(super) const LEAST_RAD: f64 = 0.35 / 180.0 * PI;

/// Jitter is so many times the joint's quiet level: what this share of its windows stays below.
const TIMES_QUIET: f64 = 4.0;
const QUIET_SHARE: f64 = 0.3;

/// And so many times what the joint on the other side does at its worst: what this share of its windows stays below.
const TIMES_MIRROR: f64 = 1.6;
const WORST_SHARE: f64 = 0.85;

/// And so many times the middle of the keys beside all such spans: at 24 poses a second the steps of a walk are as rough as noise, but
/// little rougher than the rest of it.
const TIMES_BESIDE: f64 = 2.6;

/// A joint that is never quiet is measured by the middle of all joints; without a mirror it must be far above.
const TIMES_ALL: f64 = 5.0;
const TIMES_ALL_ALONE: f64 = 7.0;

/// Level at twice the distance, as a share of that at the distance itself: 1 for white noise. Above this it is motion: over
/// a whole span, and in a window, which has few keys to tell.
const MOST_GROWTH: f64 = 1.6;
const MOST_GROWTH_IN_WINDOW: f64 = 2.3;

/// A span of so few keys tells less surely.
const FEW_KEYS: usize = 12;
const MOST_GROWTH_IN_FEW: f64 = 1.4;

/// From so many poses a second on noise is told from motion well enough that a mirror joint which trembles too is not
/// taken for moving that fast.
const FINE_SECS: f64 = 0.02;

/// Poses count as evenly spaced when no time between them is off by more than this share.
const UNEVEN: f64 = 0.2;

/// The fourth difference of white noise of this deviation in each of three axes has a squared length of 3 · 70 times its
/// square; the middle length of three normal numbers is 1.538 of their deviation.
pub(super) const MIDDLE: f64 = 1.538;
pub(super) const FOURTH: f64 = 8.366_6;

/// Finds trembling spans of one joint.
pub(super) fn find(view: View<'_>, joint: usize) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint).filter(|scan| scan.keys.len() >= LEAST_KEYS) else {
        return Vec::new();
    };
    let Some(row) = Row::new(scan) else { return Vec::new() };
    let step_secs = row.step_secs;
    if step_secs > COARSEST_SECS {
        return Vec::new();
    }
    let mut found = Vec::new();
    let mut told: Vec<Span> = Vec::new();
    for (index, lag) in LAGS.into_iter().enumerate() {
        if lag > 1 && lag as f64 * step_secs > FARTHEST_SECS {
            break;
        }
        let Some(levels) = Levels::new(&row, index) else { break };
        let mut spans = spans(&scan, &row, &levels);
        if lag == 1 {
            let loud = levels.loud();
            if !loud.is_empty() {
                spans = joined(spans, white::find(&scan, &row, &levels, &loud), &levels);
            }
        }
        if !spans.is_empty() {
            let beside = level_beside(&levels, &spans);
            spans.retain(|span| span.is_scored || span.noise >= TIMES_BESIDE * beside);
        }
        if lag == 1 {
            for index in 0..spans.len() {
                // A span ends before the next, and that one behind this.
                let start = index.checked_sub(1).map_or(0, |before| spans[before].last + 1);
                let end = spans.get(index + 1).map_or(row.len(), |next| next.first);
                spans[index] = ends::fitted(&row, spans[index], &(start..end));
            }
        }
        // Noise shows at every distance: what was told at a shorter one is told.
        spans.retain(|span| !told.iter().any(|told| lies_beside(span, told)));
        found.extend(spans.iter().map(|span| snag(&scan, &levels, *span)));
        told.extend(spans);
    }
    found.sort_by_key(|snag| snag.first_key);
    found
}

/// Whether two spans share keys, or lie so close that the one may be the fringe of the other.
fn lies_beside(a: &Span, b: &Span) -> bool {
    a.first <= b.last + 2 && b.first <= a.last + 2
}

/// Two lists of spans as one, in order. Of two that overlap it is both together where they tremble all along, else the one
/// of `others`, which are fitted closer.
fn joined(spans: Vec<Span>, others: Vec<Span>, levels: &Levels<'_>) -> Vec<Span> {
    let mut kept: Vec<Span> = others;
    for span in spans {
        let (first, last) = kept
            .iter()
            .filter(|other| lies_beside(&span, other))
            .fold((span.first, span.last), |(first, last), other| {
                (first.min(other.first), last.max(other.last))
            });
        let is_overlapped = kept.iter().any(|other| lies_beside(&span, other));
        let inside = first.max(2)..(last + 1).min(levels.len() - 2).max(first.max(2));
        let inside = levels.even_within(inside);
        let level = 0.5 * white::usual_loud(&inside);
        let trembling = inside.iter().filter(|own| **own >= level).count();
        if is_overlapped && trembling * 4 < inside.len() * 3 {
            continue;
        }
        let touching = || kept.iter().filter(|other| lies_beside(&span, other));
        let clarity = touching().fold(span.clarity, |clarity, other| clarity.max(other.clarity));
        let is_scored = touching().any(|other| other.is_scored);
        kept.retain(|other| !lies_beside(&span, other));
        kept.push(Span { first, last, clarity, is_scored, ..span });
    }
    kept.sort_by_key(|span| span.first);
    kept
}

/// A joint's poses and their times.
struct Row<'a> {
    scan: Scan<'a>,
    /// Unit, of neighbouring signs; where the file has none, the one before.
    poses: Poses<'a>,
    /// The usual time from key to key.
    step_secs: f64,
}

impl<'a> Row<'a> {
    fn new(scan: Scan<'a>) -> Option<Self> {
        let step_secs = scan.outline().step_secs()?;
        Some(Self { scan, poses: Poses::new(scan), step_secs })
    }

    fn len(&self) -> usize {
        self.poses.len()
    }

    /// The noise, in radians per axis, that the fourth difference at a key stands for; 0 where its five poses are not
    /// evenly spaced, and where they reach beyond the ends.
    fn noise(&self, key: usize, lag: usize) -> f64 {
        if key < 2 * lag || key + 2 * lag >= self.len() || !self.is_even(key, 2, lag) {
            return 0.0;
        }
        fourth_difference([0, 1, 2, 3, 4].map(|i| self.poses.at(key + i * lag - 2 * lag)))
    }

    /// Whether the poses at a key and at `reach` to both sides, each `lag` keys from the next, are evenly spaced; they exist.
    fn is_even(&self, key: usize, reach: usize, lag: usize) -> bool {
        if matches!(self.scan.track.times, Times::Even { .. }) {
            return true;
        }
        let wide = lag as f64 * self.step_secs;
        let first = key - reach * lag;
        let secs = |i: usize| self.scan.secs(first + i * lag);
        (0..2 * reach).all(|i| (secs(i + 1) - secs(i) - wide).abs() <= UNEVEN * wide)
    }
}

/// How much a joint trembles, key by key and in windows, in radians per axis; made as it is looked at.
struct Levels<'r> {
    row: &'r Row<'r>,
    /// Which of [`LAGS`], and that.
    index: usize,
    lag: usize,
    /// Length of the fourth difference at each key as the deviation of noise that it stands for; 0 at the ends.
    each: Lazy<f64>,
    /// Keys from one window to the next.
    hop: usize,
    /// Keys of a window: about twice that.
    width: usize,
    windows: Vec<OnceCell<Window>>,
}

/// What is seen in a window.
#[derive(Clone, Copy)]
struct Window {
    level: f64,
    /// The level at twice the distance beside that.
    growth: f64,
}

impl<'r> Levels<'r> {
    fn new(row: &'r Row<'r>, index: usize) -> Option<Self> {
        let lag = LAGS[index];
        if row.len() < 8 * lag + WINDOW_KEYS {
            return None;
        }
        let width = ((WINDOW_SECS / row.step_secs) as usize).max(WINDOW_KEYS);
        let hop = width.div_ceil(2);
        let windows = (0..row.len().div_ceil(hop)).map(|_| OnceCell::new()).collect();
        Some(Self { row, index, lag, each: Lazy::new(row.len()), hop, width, windows })
    }

    /// How many keys there are.
    fn len(&self) -> usize {
        self.row.len()
    }

    /// The level at a key.
    fn at(&self, key: usize) -> f64 {
        self.each.get(key, |keys| keys.map(|key| self.row.noise(key, self.lag)).collect())
    }

    /// The levels at some keys; `None` where there are no such keys.
    fn within(&self, keys: Range<usize>) -> Option<Vec<f64>> {
        (keys.start <= keys.end && keys.end <= self.len()).then(|| keys.map(|key| self.at(key)).collect())
    }

    /// The levels at those of some keys whose poses around are evenly spaced: a pause has none.
    fn even_within(&self, keys: Range<usize>) -> Vec<f64> {
        keys.filter(|&key| self.row.is_even(key, 2, self.lag)).map(|key| self.at(key)).collect()
    }

    /// The keys of a window.
    fn keys_of(&self, window: usize) -> Range<usize> {
        let (low, high) = (2 * self.lag, self.len() - 2 * self.lag);
        let start = window * self.hop;
        start.max(low).min(high - self.width.min(high - low))..(start + self.width).clamp(low, high)
    }

    fn window(&self, window: usize) -> Window {
        *self.windows[window].get_or_init(|| {
            let near = self.keys_of(window);
            let level = middle_of(near.clone().map(|key| self.at(key)).collect());
            // Growth matters only where there is something to see.
            let growth = if level >= LEAST_RAD {
                middle_of(twice(self.row, self.lag, near)) / level
            } else {
                f64::INFINITY
            };
            Window { level, growth }
        })
    }

    /// A window whose level is at least `least`, which is no less than [`LEAST_RAD`].
    fn loud_window(&self, window: usize, least: f64) -> Option<Window> {
        let keys = self.keys_of(window);
        let needed = keys.len() - keys.len() / 2;
        let may_be = self.row.scan.outline().trembling(&keys, self.index) >= needed;
        may_be.then(|| self.window(window)).filter(|own| own.level >= least)
    }

    /// The windows that are loud enough for anything to be seen.
    fn loud_windows(&self) -> impl Iterator<Item = (usize, Window)> + '_ {
        (0..self.windows.len()).filter_map(|index| Some((index, self.loud_window(index, LEAST_RAD)?)))
    }

    /// Where there is anything to see: keys of windows that are loud enough, and as many beside them.
    fn loud(&self) -> Vec<Range<usize>> {
        let mut loud: Vec<Range<usize>> = Vec::new();
        for (index, _) in self.loud_windows() {
            let start = (index * self.hop).saturating_sub(2 * self.hop);
            let end = (index * self.hop + 4 * self.hop).min(self.len());
            match loud.last_mut() {
                Some(last) if start <= last.end => last.end = end,
                _ => loud.push(start..end),
            }
        }
        loud
    }

    /// The level that a share of the windows stays below.
    fn level_of_share(&self, share: f64) -> f64 {
        self.level_among(share, |_| true)
    }

    /// The same among some of the windows; 0 without any.
    fn level_among(&self, share: f64, is_counted: impl Fn(&Window) -> bool) -> f64 {
        let windows = (0..self.windows.len()).map(|index| self.window(index));
        let mut levels: Vec<f64> = windows.filter(is_counted).map(|window| window.level).collect();
        if levels.is_empty() {
            return 0.0;
        }
        let rank = ((levels.len() - 1) as f64 * share).round() as usize;
        *levels.select_nth_unstable_by(rank, f64::total_cmp).1
    }
}

fn fourth_difference([a, b, c, d, e]: [Rotor; 5]) -> f64 {
    let part = |a: f64, b: f64, c: f64, d: f64, e: f64| a + e - 4.0 * (b + d) + 6.0 * c;
    let parts = [
        part(a.s, b.s, c.s, d.s, e.s),
        part(a.yz, b.yz, c.yz, d.yz, e.yz),
        part(a.zx, b.zx, c.zx, d.zx, e.zx),
        part(a.xy, b.xy, c.xy, d.xy, e.xy),
    ];
    // Rotors turn by half the angle.
    2.0 * parts.iter().map(|part| part * part).sum::<f64>().sqrt() / (FOURTH * MIDDLE)
}

/// What the fourth difference at a key of any joint stands for, as [`Row::noise`] tells it of an even row.
fn noise_of(scan: &Scan<'_>, key: usize, lag: usize) -> f64 {
    let near = scan.keys[key];
    fourth_difference(std::array::from_fn(|i| scan.keys[key + i * lag - 2 * lag].aligned_to(near)))
}

/// The same at twice the distance, for the keys of a window that have such.
fn twice(row: &Row<'_>, lag: usize, keys: Range<usize>) -> Vec<f64> {
    let inside = keys.start.max(4 * lag)..keys.end.min(row.len() - 4 * lag);
    // What is not evenly spaced tells nothing.
    inside.map(|key| row.noise(key, 2 * lag)).filter(|noise| *noise > 0.0).collect()
}

fn middle(values: &[f64]) -> f64 {
    middle_of(values.to_vec())
}

fn middle_of(mut values: Vec<f64>) -> f64 {
    if values.is_empty() {
        return f64::INFINITY;
    }
    let rank = values.len() / 2;
    *values.select_nth_unstable_by(rank, f64::total_cmp).1
}

/// A span of keys that tremble.
#[derive(Clone, Copy, Debug)]
struct Span {
    first: usize,
    last: usize,
    noise: f64,
    /// What is usual for the joint.
    quiet: f64,
    /// How many times the noise is above the least that would be told.
    clarity: f64,
    /// Whether it is told for its marks together.
    is_scored: bool,
}

fn spans(scan: &Scan<'_>, row: &Row<'_>, levels: &Levels<'_>) -> Vec<Span> {
    let step_secs = row.step_secs;
    // Most joints have nothing that could be seen.
    if levels.loud_windows().all(|(_, window)| window.growth > MOST_GROWTH_IN_WINDOW) {
        return Vec::new();
    }
    let own_quiet = levels.level_of_share(QUIET_SHARE);
    let mirror_row =
        mirror_of(&scan.clip.skeleton, scan.joint).and_then(|other| Row::new(scan.other(other)?));
    let mirror = mirror_row.as_ref().and_then(|row| Levels::new(row, levels.index));
    let worst_mirrored = mirror.as_ref().map(|mirror| {
        let trembles = |window: &Window| {
            step_secs <= FINE_SECS && window.level >= LEAST_RAD && window.growth <= MOST_GROWTH
        };
        mirror.level_among(WORST_SHARE, |window| !trembles(window))
    });
    let within = |least: f64| -> Vec<Span> {
        let is_loud = |index: usize| levels.loud_window(index, least);
        let mut found = Vec::new();
        let mut index = 0;
        while index < levels.windows.len() {
            let trembles = is_loud(index).is_some_and(|window| window.growth <= MOST_GROWTH_IN_WINDOW);
            if !trembles {
                index += 1;
                continue;
            }
            let start = index;
            // A window between two that tremble belongs to them.
            while index < levels.windows.len()
                && (is_loud(index).is_some()
                    || (index + 1 < levels.windows.len() && is_loud(index + 1).is_some()))
            {
                index += 1;
            }
            found.extend(fitted(levels, row, (start, index - 1), least, own_quiet));
        }
        found.retain(|span| {
            span.last + 1 - span.first >= SHORTEST_KEYS
                && scan.secs(span.last) - scan.secs(span.first) >= SHORTEST_SECS - step_secs
        });
        found
    };
    // The worst of the mirror bounds what is told, unless it is much quieter.
    let mirrored = worst_mirrored.map_or(0.0, |worst| TIMES_MIRROR * worst);
    let spans = within(LEAST_RAD.max(TIMES_QUIET * own_quiet).max(mirrored));
    if !spans.is_empty() || own_quiet < LEAST_RAD {
        return spans;
    }
    // Never quiet: all of it may tremble.
    let all = level_of_all(scan, levels.lag);
    let (times, quiet) = match &mirror {
        Some(mirror) => (TIMES_ALL, mirror.level_of_share(0.5).max(all)),
        None => (TIMES_ALL_ALONE, all),
    };
    let least = LEAST_RAD.max(times * quiet).max(mirrored);
    if own_quiet < least {
        return Vec::new();
    }
    let mut spans = within(least);
    for span in &mut spans {
        span.quiet = quiet;
    }
    spans
}

/// The middle of what is usual for each joint of the clip that moves.
fn level_of_all(scan: &Scan<'_>, lag: usize) -> f64 {
    /// Keys that are looked at.
    const SAMPLED: usize = 2000;
    let levels: Vec<f64> = scan
        .clip
        .skeleton
        .listed()
        .filter(|other| *other != scan.joint)
        .filter_map(|other| {
            let other = scan.other(other)?;
            let count = other.keys.len();
            if count < 8 * lag + WINDOW_KEYS {
                return None;
            }
            let stride = (count / SAMPLED).max(1);
            let each: Vec<f64> = (2 * lag..count - 2 * lag)
                .step_by(stride)
                .map(|key| noise_of(&other, key, lag))
                .filter(|level| level.is_finite() && *level > 0.0)
                .collect();
            (each.len() * 2 * stride > count).then(|| middle(&each))
        })
        .collect();
    if levels.is_empty() { f64::INFINITY } else { middle(&levels) }
}

/// The middle level of the keys that lie in none of the spans; 0 where most keys do.
fn level_beside(levels: &Levels<'_>, spans: &[Span]) -> f64 {
    /// Keys that are looked at.
    const SAMPLED: usize = 2000;
    let keys = 2 * levels.lag..levels.len() - 2 * levels.lag;
    let is_beside = |key: &usize| !spans.iter().any(|span| (span.first..=span.last).contains(key));
    let stride = (keys.len() / SAMPLED).max(1);
    let looked_at = keys.len().div_ceil(stride);
    let beside: Vec<f64> = keys.step_by(stride).filter(is_beside).map(|key| levels.at(key)).collect();
    if 4 * beside.len() < looked_at { 0.0 } else { middle_of(beside) }
}

/// The keys of a row of windows that tremble, from the first to the last whose difference shows it.
fn fitted(
    levels: &Levels<'_>,
    row: &Row<'_>,
    (start, end): (usize, usize),
    least: f64,
    quiet: f64,
) -> Option<Span> {
    let count = levels.len();
    let (from, to) = (start * levels.hop, ((end + 2) * levels.hop).min(count));
    // Half the middle level is seldom missed by noise and seldom reached without.
    let within = from.max(2 * levels.lag)..to.min(count - 2 * levels.lag).max(from + 1);
    let level = middle_of(levels.within(within)?);
    let shows =
        |key: &usize| levels.at(*key) >= (0.5 * level).max(0.5 * least).max(2.0 * quiet.min(least / 4.0));
    let (low, high) = (from.saturating_sub(levels.hop), (to + levels.hop).min(count));
    let (first, last) = (first_of_run(levels, low..high, &shows)?, last_of_run(levels, low..high, &shows)?);
    // The difference shows the noise of the next key too.
    let first = if first <= 2 * levels.lag { 0 } else { first + levels.lag };
    let last = if last + 2 * levels.lag + 1 >= count { count - 1 } else { last.saturating_sub(levels.lag) };
    let inside = first.max(2 * levels.lag)..(last + 1).min(count - 2 * levels.lag);
    let noise = middle_of(levels.within(inside.clone())?);
    let growth = middle_of(twice(row, levels.lag, inside)) / noise;
    let most = if last < first + FEW_KEYS { MOST_GROWTH_IN_FEW } else { MOST_GROWTH };
    let is_noise = first < last && noise >= 0.8 * least && growth <= most;
    is_noise.then_some(Span { first, last, noise, quiet, clarity: noise / least, is_scored: false })
}

/// The first key that shows noise, with another soon after.
fn first_of_run(levels: &Levels<'_>, keys: Range<usize>, shows: &impl Fn(&usize) -> bool) -> Option<usize> {
    let shown: Vec<usize> = keys.filter(shows).collect();
    let near = 2 * levels.lag + 1;
    shown.windows(3).find(|three| three[2] - three[0] <= 2 * near).map(|three| three[0])
}

fn last_of_run(levels: &Levels<'_>, keys: Range<usize>, shows: &impl Fn(&usize) -> bool) -> Option<usize> {
    let shown: Vec<usize> = keys.filter(shows).collect();
    let near = 2 * levels.lag + 1;
    shown.windows(3).rev().find(|three| three[2] - three[0] <= 2 * near).map(|three| three[2])
}

/// From this clarity on a span may be mended unasked.
const SAFE_CLARITY: f64 = 1.0;

/// Noise beyond this, in radians (12°), is more likely flips that nobody looked for.
const SAFE_NOISE_RAD: f64 = 0.21;

fn snag(scan: &Scan<'_>, levels: &Levels<'_>, span: Span) -> Snag {
    scan.snag(Finding {
        kind: SnagKind::Jitter,
        keys: (span.first, span.last),
        size_rad: span.noise,
        confidence: (1.0 - 0.4 / span.clarity).clamp(0.5, 0.97),
        remedy: Remedy::Smooth {
            noise_rad: span.noise,
            quiet_rad: span.quiet.min(span.noise),
            apart_keys: levels.lag,
        },
        safe: span.clarity >= SAFE_CLARITY && span.noise <= SAFE_NOISE_RAD,
        text: format!(
            "{} trembles by about {:.1}° {}",
            scan.label(),
            span.noise.to_degrees(),
            scan.span(span.first, span.last)
        ),
    })
}

#[cfg(test)]
mod tests {
    use super::super::outline::Outlines;
    use super::super::tests::of_one_joint;
    use super::*;
    use crate::clip::Clip;
    use crate::rotor::Bivector;

    /// A joint that swings calmly and trembles from one key to another by so many degrees per axis.
    pub(super) fn shaken(times: Times, (first, last): (usize, usize), noise_deg: f64, seed: u64) -> Clip {
        let mut state = seed;
        let mut unit = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (state >> 11) as f64 / (1_u64 << 53) as f64
        };
        // Irwin and Hall's near-normal number: the sum of twelve has a variance of 1.
        let mut normal = || (0..12).map(|_| unit()).sum::<f64>() - 6.0;
        let keys = (0..times.len()).map(|key| {
            let secs = times.at(key);
            let swing = Bivector::new((2.1 * secs).sin(), 0.4 * (3.3 * secs).cos(), 0.1);
            let noise = Bivector::new(normal(), normal(), normal()) * noise_deg.to_radians();
            let shake = if (first..=last).contains(&key) { noise } else { Bivector::new(0.0, 0.0, 0.0) };
            Rotor::from_plane_angles(swing) * Rotor::from_plane_angles(shake)
        });
        let keys = keys.collect();
        of_one_joint(times, 30.0, keys)
    }

    #[test]
    fn a_pause_between_keys_does_not_hide_the_noise_beside_it() {
        let pause = |key: usize| if key > 16 { 0.2 - 1.0 / 24.0 } else { 0.0 };
        let times: Vec<f64> = (0..60).map(|key| key as f64 / 24.0 + pause(key)).collect();
        let is_told = |seed: &u64| {
            let clip = shaken(Times::Listed(times.clone().into()), (10, 22), 3.0, *seed);
            let outlines = Outlines::new(1);
            let snags = find(View { clip: &clip, outlines: &outlines }, 0);
            snags.iter().any(|snag| snag.first_key.abs_diff(10) <= 2 && snag.last_key.abs_diff(22) <= 2)
        };
        let told = (0..20).filter(is_told).count();
        assert!(told >= 16, "{told} of 20");
    }

    /// What is to be told of the first joint's row.
    pub(super) fn with_row<T>(clip: &Clip, told: impl FnOnce(&Row<'_>) -> T) -> T {
        let outlines = Outlines::new(1);
        let scan = Scan::new(View { clip, outlines: &outlines }, 0).unwrap();
        told(&Row::new(scan).unwrap())
    }
}

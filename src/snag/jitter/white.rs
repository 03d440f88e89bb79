//! Spans whose differences look like white noise and like nothing else.
//!
//! Where poses are few (24 a second, or a clip of a second) a level alone can't tell noise from a quick move. Five marks of
//! white noise can, taken together, in as few as eight keys: sixth differences are no smaller than fourth ones (of a motion
//! they are), and not much larger (of a kink they are); neighbouring fourth differences go against each other, in the mean by
//! −56/70; those of poses twice as far apart are no larger; it goes in more than one direction, or else no joint near by does
//! the same at the same keys and the joint on the other side never comes near it; and it is far above what the joint does
//! else. The shares of the difference schemes are those of binomial coefficients; the limits were set on real clips with
//! noise planted along one axis and three, so that neither way of trembling is needed.

use std::cell::OnceCell;
use std::f64::consts::PI;
use std::ops::Range;

use crate::rotor::Rotor;

use super::super::mirror::mirror_of;
use super::super::poses::Poses;
use super::super::scan::Scan;
use super::score::{self, Marks};
use super::{
    FINE_SECS, Levels, MIDDLE, Row, Span, first_of_run, last_of_run, level_of_all, middle, middle_of,
};

/// Windows are so many keys wide; what holds in them: neighbouring fourth differences go along by at most this, growth
/// to twice the distance is at most that, and so much of it at most is what a joint near by does.
const WIDTHS: [(usize, f64, f64, f64); 3] =
    [(8, -0.6, 1.8, 0.75), (14, -0.66, 1.6, 0.7), (24, -0.7, 1.4, 0.6)];

/// Noise below this, per axis, is not told.
const LEAST_RAD: f64 = 0.45 / 180.0 * PI;

/// So many times the joint's own quiet level; or, where it is never quiet, the level of all joints.
const TIMES_QUIET: f64 = 4.0;
const TIMES_ALL: f64 = 5.0;
const QUIET_SHARE: f64 = 0.2;

/// Sixth differences beside fourth ones, each as the noise that it stands for.
const SIXTH_BESIDE_FOURTH: std::ops::RangeInclusive<f64> = 0.7..=1.45;

/// Second direction beside the first: from here on a motion does not account for it. Where the mirror joint comes near the
/// same level, it must be more.
const SPREAD: f64 = 0.25;
const SPREAD_BESIDE_MIRROR: f64 = 0.4;
const MIRROR_SHARE: f64 = 0.6;

/// Along one direction in few keys it must be so many times what the mirror joint does at its worst.
const TIMES_MIRROR: f64 = 1.6;
const FEW_KEYS: usize = 14;

/// In a joint near by less than this is nothing to compare with.
const LEAST_NEAR_RAD: f64 = 0.3 / 180.0 * PI;

/// Differences that tell a window's level at least.
const LEAST_TOLD: usize = 4;

/// Up to so many keys every window is looked at, and scored where poses are few.
const ALL_KEYS: usize = 400;

/// The length of the coefficients of the sixth difference: √924.
const SIXTH: f64 = 30.397_368;

/// Keys of a span at least.
const SHORTEST: usize = 7;

/// A fitted span whose noise is below this share of the least is none: what was seen in a window was chance.
const LEAST_SHARE: f64 = 0.9;

/// So many keys in a row are seldom calm for the most part where it trembles.
const ON_KEYS: usize = 10;

/// Four numbers of a fourth difference, in radians per axis of white noise.
type Parts = [f64; 4];

fn parts(rotor: Rotor) -> Parts {
    [rotor.s, rotor.yz, rotor.zx, rotor.xy]
}

fn dot(a: Parts, b: Parts) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// A weighted sum of poses around a key, as radians.
fn difference<const N: usize>(
    pose: impl Fn(usize) -> Rotor,
    key: usize,
    weights: [f64; N],
    length: f64,
) -> Parts {
    let mut sum = [0.0; 4];
    for (i, weight) in weights.iter().enumerate() {
        for (sum, own) in sum.iter_mut().zip(parts(pose(key + i - N / 2))) {
            *sum += weight * own;
        }
    }
    // Rotors turn by half the angle.
    sum.map(|own| 2.0 * own / length)
}

fn fourth(pose: impl Fn(usize) -> Rotor, key: usize) -> Parts {
    difference(pose, key, [1.0, -4.0, 6.0, -4.0, 1.0], super::FOURTH)
}

fn sixth_level(poses: &Poses<'_>, key: usize) -> f64 {
    let own = difference(|key| poses.at(key), key, [1.0, -6.0, 15.0, -20.0, 15.0, -6.0, 1.0], SIXTH);
    dot(own, own).sqrt() / MIDDLE
}

/// What is seen in a window.
struct Window {
    /// Those whose poses around are evenly spaced.
    keys: Vec<usize>,
    /// The smaller of both levels.
    level: f64,
    fourths: Vec<Parts>,
    energy: f64,
    /// How far neighbouring fourth differences go along with each other, −1 to 1.
    along: f64,
    /// The level at twice the distance beside that of the fourth differences; `None` where too few keys tell.
    growth: Option<f64>,
}

impl Window {
    /// Whether neighbouring differences go against each other as those of noise do, and do not grow with the distance.
    fn is_white(&self, most_along: f64, most_growth: f64) -> bool {
        self.along <= most_along && self.growth.is_none_or(|growth| growth <= most_growth)
    }
}

/// Spans of white noise in the keys around `where_loud`.
pub(super) fn find(scan: &Scan<'_>, row: &Row<'_>, levels: &Levels<'_>, loud: &[Range<usize>]) -> Vec<Span> {
    let mut judge = Judge { scan, row, levels, quiet: None, all: None, mirror: OnceCell::new() };
    // A longer clip tells by itself what is usual.
    let is_short = row.step_secs > FINE_SECS && row.len() <= ALL_KEYS;
    let mut hit = vec![Hit::None; row.len()];
    let mut any = false;
    for keys in loud {
        for (width, along, growth, near) in WIDTHS {
            let stride = if keys.len() > ALL_KEYS { width / 4 } else { 1 };
            let Some(end) = keys.end.checked_sub(width) else { continue };
            for start in (keys.start..=end).step_by(stride) {
                let is_scored = is_short && width <= score::WIDEST;
                let most_along = if is_scored { along.max(score::MOST_ALONG) } else { along };
                let Some(window) = judge.window(start..start + width, most_along) else { continue };
                let hits = &mut hit[start..start + width];
                if is_scored && judge.is_scored_noise(&window) {
                    hits.fill(Hit::Scored);
                    any = true;
                } else if window.is_white(along, growth) && judge.is_noise(&window, width, near) {
                    for hit in hits {
                        *hit = (*hit).max(Hit::Told);
                    }
                    any = true;
                }
            }
        }
    }
    if any { judge.spans(&hit) } else { Vec::new() }
}

/// What was seen at a key.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Hit {
    None,
    /// All marks of noise, each by itself.
    Told,
    /// Marks that together are those of noise.
    Scored,
}

struct Judge<'a> {
    scan: &'a Scan<'a>,
    row: &'a Row<'a>,
    levels: &'a Levels<'a>,
    /// Worked out when first asked for.
    quiet: Option<f64>,
    all: Option<f64>,
    mirror: OnceCell<Option<f64>>,
}

impl Judge<'_> {
    /// A window whose differences are loud, as loud in the sixth as in the fourth, and go against each other.
    fn window(&self, keys: Range<usize>, most_along: f64) -> Option<Window> {
        let poses = &self.row.poses;
        let inside = (keys.start + 1).max(3)..(keys.end - 1).min(poses.len() - 3);
        // Poses to both sides of a pause tell nothing of noise.
        let even = |reach: usize| inside.clone().filter(move |&key| self.row.is_even(key, reach, 1));
        let inside: Vec<usize> = even(2).collect();
        let sixths: Vec<usize> = even(3).collect();
        if inside.len() < LEAST_TOLD || sixths.len() < LEAST_TOLD {
            return None;
        }
        let each: Vec<f64> = inside.iter().map(|key| self.levels.at(*key)).collect();
        let fourth_level = middle(&each);
        if fourth_level < LEAST_RAD || each.contains(&0.0) {
            return None;
        }
        let sixth_level = middle_of(sixths.into_iter().map(|key| sixth_level(poses, key)).collect());
        if sixth_level < LEAST_RAD || !SIXTH_BESIDE_FOURTH.contains(&(sixth_level / fourth_level)) {
            return None;
        }
        let fourths: Vec<Parts> = inside.iter().map(|&key| fourth(|key| poses.at(key), key)).collect();
        let energy: f64 = fourths.iter().map(|own| dot(*own, *own)).sum();
        let pairs = inside.windows(2).zip(fourths.windows(2)).filter(|(keys, _)| keys[1] == keys[0] + 1);
        let (along, count) =
            pairs.fold((0.0, 0), |(sum, count), (_, two)| (sum + dot(two[0], two[1]), count + 1));
        // A row without a pause has one pair less than keys.
        let along = along / energy * (inside.len() - 1) as f64 / f64::from(count.max(1));
        if along > most_along {
            return None;
        }
        let wide: Vec<f64> = inside
            .iter()
            .filter(|key| (4..poses.len() - 4).contains(*key))
            .map(|&key| self.row.noise(key, 2))
            .filter(|noise| *noise > 0.0)
            .collect();
        let growth = (wide.len() >= 3).then(|| middle_of(wide) / fourth_level);
        Some(Window { keys: inside, level: fourth_level.min(sixth_level), fourths, energy, along, growth })
    }

    /// Whether its marks together are those of noise.
    fn is_scored_noise(&self, window: &Window) -> bool {
        if window.level < score::LEAST_RAD || !window.is_white(score::MOST_ALONG, score::MOST_GROWTH) {
            return false;
        }
        let marks = Marks {
            level: window.level,
            along: window.along,
            spread: spread(&window.fourths),
            mirror: self.mirror(),
        };
        score::is_noise(&marks, || score::level_of_others(self.scan, &window.keys))
            && self.done_near(window) <= score::MOST_NEAR
    }

    fn is_noise(&mut self, window: &Window, width: usize, most_near: f64) -> bool {
        let quiet = self.quiet();
        if window.level <= TIMES_QUIET * quiet && window.level <= TIMES_ALL * self.all() {
            return false;
        }
        let mirror = self.mirror();
        let is_mirrored = mirror.is_some_and(|worst| worst > MIRROR_SHARE * window.level);
        let spread = spread(&window.fourths);
        let is_spread = spread >= if is_mirrored { SPREAD_BESIDE_MIRROR } else { SPREAD };
        let is_above = width >= FEW_KEYS || mirror.is_none_or(|worst| window.level > TIMES_MIRROR * worst);
        // A bend that runs along a tail or a spine spreads too; noise of several directions is never a neighbour's.
        (is_spread || is_above) && self.done_near(window) <= most_near
    }

    fn quiet(&mut self) -> f64 {
        let row = self.row;
        *self.quiet.get_or_insert_with(|| level_of_share(row, QUIET_SHARE))
    }

    fn all(&mut self) -> f64 {
        let scan = self.scan;
        *self.all.get_or_insert_with(|| level_of_all(scan, 1))
    }

    /// What the joint on the other side does at its worst.
    fn mirror(&self) -> Option<f64> {
        let scan = self.scan;
        *self.mirror.get_or_init(|| {
            let other = scan.other(mirror_of(&scan.clip.skeleton, scan.joint)?)?;
            let row = Row::new(other).filter(|row| row.len() >= 16)?;
            Some(level_of_share(&row, 1.0))
        })
    }

    /// What share of a window is what one of the joints near by does at the same keys.
    fn done_near(&self, window: &Window) -> f64 {
        let skeleton = &self.scan.clip.skeleton;
        let joint = self.scan.joint;
        let above =
            std::iter::successors(skeleton.parent_joint(joint), |&up| skeleton.parent_joint(up)).take(2);
        let below = skeleton.children(joint).iter().copied();
        let below = below.clone().chain(below.flat_map(|child| skeleton.children(child).iter().copied()));
        let near = above.chain(below).chain(mirror_of(skeleton, joint));
        near.filter_map(|other| self.scan.other(other))
            .filter(|other| other.track.times == self.scan.track.times)
            .map(|other| Self::share_of(window, &other))
            .fold(0.0, f64::max)
    }

    fn share_of(window: &Window, other: &Scan<'_>) -> f64 {
        let [first, .., end] = window.keys[..] else { return 0.0 };
        let (low, high) = (first - 2, end + 3);
        let mut before = other.track.sound_key(low);
        let poses: Vec<Rotor> = (low..high)
            .map(|key| {
                before = other.track.sound_key(key).aligned_to(before);
                before
            })
            .collect();
        let rows: Vec<Parts> = window.keys.iter().map(|key| fourth(|key| poses[key], key - low)).collect();
        let (along, _) = directions(&rows);
        let signal: Vec<f64> = rows.iter().map(|own| dot(*own, along)).collect();
        let length = signal.iter().map(|own| own * own).sum::<f64>();
        if length < LEAST_NEAR_RAD * LEAST_NEAR_RAD {
            return 0.0;
        }
        let mut sum = [0.0; 4];
        for (signal, own) in signal.iter().zip(&window.fourths) {
            sum.iter_mut().zip(own).for_each(|(sum, own)| *sum += signal * own);
        }
        dot(sum, sum) / (length * window.energy)
    }

    /// Runs of keys that were hit, fitted to where the noise shows.
    fn spans(&mut self, hit: &[Hit]) -> Vec<Span> {
        let count = hit.len();
        let levels = self.levels;
        let quiet = self.quiet();
        let mut spans: Vec<Span> = Vec::new();
        let mut key = 0;
        while key < count {
            if hit[key] == Hit::None {
                key += 1;
                continue;
            }
            let (mut low, mut high) = (key, key);
            while high + 1 < count && hit[high + 1] != Hit::None {
                high += 1;
            }
            let is_scored = hit[low..=high].contains(&Hit::Scored);
            // Wide windows reach beyond the noise, so not the middle.
            let inside = low.max(2)..(high + 1).min(count - 2);
            let level = usual_loud(&inside.map(|key| levels.at(key)).collect::<Vec<_>>());
            // On as long as it trembles.
            let goes_on =
                |keys: Range<usize>| levels.within(keys).is_some_and(|each| middle_of(each) >= 0.5 * level);
            while low >= 2 + ON_KEYS && goes_on(low - ON_KEYS..low) {
                low -= 1;
            }
            while high + ON_KEYS + 3 <= count && goes_on(high + 1..high + 1 + ON_KEYS) {
                high += 1;
            }
            key = high + 1;
            let around = low.saturating_sub(ON_KEYS)..(high + 1 + ON_KEYS).min(count);
            if let Some(span) = self.fitted(around, level, quiet) {
                let span = Span { is_scored, ..span };
                match spans.last_mut() {
                    Some(last) if span.first <= last.last + ON_KEYS => {
                        last.last = last.last.max(span.last);
                        last.clarity = last.clarity.max(span.clarity);
                        last.is_scored |= span.is_scored;
                    }
                    _ => spans.push(span),
                }
            }
        }
        spans
    }

    fn fitted(&self, keys: Range<usize>, level: f64, quiet: f64) -> Option<Span> {
        let count = self.row.len();
        let shows = |key: &usize| self.levels.at(*key) >= 0.5 * level;
        let first = first_of_run(self.levels, keys.clone(), &shows)?;
        let last = last_of_run(self.levels, keys, &shows)?;
        // The difference shows the noise of the next key too.
        let first = if first <= 2 { 0 } else { first + 1 };
        let last = if last + 3 >= count { count - 1 } else { last.saturating_sub(1) };
        if last + 1 < first + SHORTEST {
            return None;
        }
        let noise = middle_of(self.levels.even_within(first.max(2)..(last + 1).min(count - 2)));
        let least = LEAST_RAD.max(TIMES_QUIET * quiet.min(noise / TIMES_QUIET));
        if noise < LEAST_SHARE * least || noise.is_infinite() {
            return None;
        }
        Some(Span { first, last, noise, quiet: quiet.min(noise), clarity: noise / least, is_scored: false })
    }
}

/// What is usual among the louder part of some levels.
pub(super) fn usual_loud(levels: &[f64]) -> f64 {
    let mut levels = levels.to_vec();
    if levels.is_empty() {
        return f64::INFINITY;
    }
    let rank = (levels.len() - 1) * 7 / 10;
    // Above the middle of noise by as much as such a share of it is.
    *levels.select_nth_unstable_by(rank, f64::total_cmp).1 / 1.24
}

/// The level of sixth differences that a share of the windows stays below.
fn level_of_share(row: &Row<'_>, share: f64) -> f64 {
    const WIDTH: usize = 8;
    /// Windows that are looked at.
    const SAMPLED: usize = 600;
    let poses = &row.poses;
    let stride = (poses.len() / SAMPLED).max(1);
    let mut levels: Vec<f64> = (0..(poses.len() + 1).saturating_sub(WIDTH))
        .step_by(stride)
        .filter_map(|start| {
            let keys = (start + 1).max(3)..(start + WIDTH - 1).min(poses.len() - 3);
            let even = keys.filter(|&key| row.is_even(key, 3, 1));
            let own: Vec<f64> = even.map(|key| sixth_level(poses, key)).collect();
            (own.len() >= LEAST_TOLD).then(|| middle_of(own))
        })
        .collect();
    if levels.is_empty() {
        return 0.0;
    }
    let rank = ((levels.len() - 1) as f64 * share).round() as usize;
    *levels.select_nth_unstable_by(rank, f64::total_cmp).1
}

/// How much the rows spread in the second direction beside the first, 0 to 1.
fn spread(rows: &[Parts]) -> f64 {
    let (first, all) = directions(rows);
    let length = rows.iter().map(|row| dot(*row, first).powi(2)).sum::<f64>();
    let rest: Vec<Parts> = rows
        .iter()
        .map(|row| {
            let along = dot(*row, first);
            std::array::from_fn(|i| row[i] - along * first[i])
        })
        .collect();
    let (second, _) = directions(&rest);
    let other = rest.iter().map(|row| dot(*row, second).powi(2)).sum::<f64>();
    if all > 0.0 && length > 0.0 { (other / length).sqrt() } else { 0.0 }
}

/// The direction along which rows are longest, and the sum of their squares. By the power method, from the longest row.
fn directions(rows: &[Parts]) -> (Parts, f64) {
    const ROUNDS: usize = 12;
    let all: f64 = rows.iter().map(|row| dot(*row, *row)).sum();
    let longest = rows.iter().max_by(|a, b| dot(**a, **a).total_cmp(&dot(**b, **b)));
    let mut along = longest.copied().unwrap_or([1.0, 0.0, 0.0, 0.0]);
    for _ in 0..ROUNDS {
        let mut next = [0.0; 4];
        for row in rows {
            let share = dot(*row, along);
            next.iter_mut().zip(row).for_each(|(next, own)| *next += share * own);
        }
        let length = dot(next, next).sqrt();
        if length <= f64::MIN_POSITIVE {
            break;
        }
        along = next.map(|own| own / length);
    }
    (along, all)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_along_one_line_do_not_spread_and_rows_along_two_do() {
        let line: Vec<Parts> =
            (0..8).map(|i| [0.0, f64::from(i) - 3.0, 2.0 * (f64::from(i) - 3.0), 0.0]).collect();
        assert!(spread(&line) < 1e-9, "{}", spread(&line));
        let two = [[3.0, 0.0, 0.0, 0.0], [0.0, 2.0, 0.0, 0.0], [-3.0, 0.0, 0.0, 0.0], [0.0, -2.0, 0.0, 0.0]];
        assert!((spread(&two) - 2.0 / 3.0).abs() < 1e-6, "{}", spread(&two));
    }
}

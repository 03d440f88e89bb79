//! Draws a stuck run anew from the joint's own motion on both sides and from what the other joints do meanwhile.
//!
//! Gaps of the same length are pretended all over the joint's sound motion. For each the *bulge* is known: how the truth
//! lies off the straight way across, at a few places inside. Three guesses of it are learned and tried by leaving blocks of
//! gaps out: the cubic with fitted end rates; a linear one from how the other joints lie off their own straight way (ridge
//! regression on their principal directions); and one from the most alike stretches of the whole body's motion (kernel
//! regression). They are taken with the weights that do best on the gaps left out, and only when they beat what
//! `redraw` would do alone. Where that teaches nothing, as in a loop of a second, the joint on the other side may ([`other_side`]).

use crate::clip::Clip;
use crate::rotor::{Bivector, Rotor, slerp};

use super::draft::Draft;
use super::other_side;
use super::others::Others;
use super::redraw::{self, Hermite};
use super::regress::{Table, blend_weights, dot, ridge, solve, times};

/// Keys beside the gap that its end rates are fitted over: this long, within these counts.
const FIT_SECS: f64 = 0.067;
const FIT_KEYS: (usize, usize) = (3, 8);

/// Places inside a gap at which the bulge is guessed, at most.
const PLACES: usize = 9;

/// Pretended gaps looked at, the most alike of them that are kept, and how many are learned from.
const CANDIDATES: usize = 700;
const ALIKE: usize = 440;
const LEARNED: usize = 220;

/// Fewer pretended gaps teach nothing.
const LEAST_GAPS: usize = 24;

/// Blocks of pretended gaps that are left out in turn.
const BLOCKS: usize = 5;

/// What is tried: how dear weights are in the linear guess; and for the kernel its width, as a share of the usual squared
/// distance, how much of an answer is taken for noise, and how much the joint's own ends count beside the other joints.
const RIDGES: [f64; 4] = [1e-3, 1e-2, 1e-1, 1.0];
const WIDTHS: [f64; 2] = [0.1, 0.4];
const NOISES: [f64; 2] = [1e-2, 1e-1];
const ENDS: [[f64; 3]; 2] = [[1.0, 3.0, 1.0], [2.0, 8.0, 2.0]];

/// The learned bulge is taken when it leaves at most this share of the squared error of the better of slerp and cubic.
const WORTH: f64 = 0.85;

/// Above this turn across the gap the straight way has no sure side.
const WIDE_RAD: f64 = 2.6;

/// Draws `first..=last` of `joint` anew. `clip` gives what the other joints do.
pub(super) fn redraw_from_others(draft: &mut Draft, clip: &Clip, joint: usize, first: usize, last: usize) {
    let learned = bulges(draft, clip, joint, first, last)
        .or_else(|| other_side::poses(draft, clip, joint, first, last));
    match learned {
        Some(poses) => redraw::write(draft, first, &poses),
        None => redraw::redraw(draft, first, last),
    }
}

/// The poses of a gap from the learned bulge; `None` where it is not worth it.
fn bulges(draft: &Draft, clip: &Clip, joint: usize, first: usize, last: usize) -> Option<Vec<Rotor>> {
    let (left, right) = (first.checked_sub(1)?, last + 1);
    if right >= draft.len() || draft.is_held_after(left) {
        return None;
    }
    let step_secs = draft.times.median_step()?;
    let fit = ((FIT_SECS / step_secs) as usize).clamp(FIT_KEYS.0, FIT_KEYS.1);
    let gap = Gap::new(right - left, fit);
    let own = gap.example(draft, left)?;
    let straight_turn = draft.unit(left)?.turn_to(draft.unit(right)?);
    if straight_turn > WIDE_RAD {
        return None;
    }
    let starts = gap.starts(draft, first, last);
    let others = Others::new(clip, joint, draft, (left, right), &starts)?;
    let lesson = Lesson::new(&gap, draft, &others, left, own, starts)?;
    let bulge = lesson.bulge()?;
    Some(gap.poses(draft, left, &bulge))
}

/// A gap of a certain length: keys `start + 1 .. start + span` are drawn between `start` and `start + span`.
struct Gap {
    span: usize,
    fit: usize,
    /// Keys inside, counted from the start, at which the bulge is guessed.
    places: Vec<usize>,
}

/// What is known of one gap of the joint itself.
struct Example {
    /// The bulge of the truth, place by place; meaningless for the gap to be drawn.
    truth: Vec<f64>,
    /// The bulge of the cubic with fitted rates.
    cubic: Vec<f64>,
    /// Plane angles across the gap.
    across: Bivector,
}

impl Gap {
    fn new(span: usize, fit: usize) -> Self {
        let inside = span - 1;
        let count = inside.min(PLACES);
        let places = (0..count).map(|i| (((i + 1) * span) as f64 / (count + 1) as f64).round() as usize);
        let mut places: Vec<usize> = places.map(|place| place.clamp(1, inside)).collect();
        places.dedup();
        Self { span, fit, places }
    }

    fn example(&self, draft: &Draft, start: usize) -> Option<Example> {
        let end = start + self.span;
        let (a, b) = (draft.unit(start)?, draft.unit(end)?);
        let curve = Hermite::new(draft, start, end, self.fit)?;
        let (mut truth, mut cubic) = (Vec::new(), Vec::new());
        for place in &self.places {
            let share = self.share(draft, start, *place);
            let straight = slerp(a, b, share).reverse();
            let bulge = (straight * draft.unit(start + place)?).plane_angles();
            truth.extend([bulge.yz, bulge.zx, bulge.xy]);
            let bulge = (straight * curve.at(share)).plane_angles();
            cubic.extend([bulge.yz, bulge.zx, bulge.xy]);
        }
        Some(Example { truth, cubic, across: (a.reverse() * b).plane_angles() })
    }

    fn share(&self, draft: &Draft, start: usize, place: usize) -> f64 {
        let from = draft.secs(start);
        (draft.secs(start + place) - from) / (draft.secs(start + self.span) - from)
    }

    /// Where gaps of this length can be pretended beside `first..=last`, in order. No key of them, nor of those that their
    /// rates are fitted over, is broken or part of another rest.
    fn starts(&self, draft: &Draft, first: usize, last: usize) -> Vec<usize> {
        let count = draft.len();
        // For each key how many unusable ones lie before it.
        let mut unusable = vec![0_usize; count + 1];
        for key in 0..count {
            let inside = (first..=last).contains(&key);
            let repeats = key > 0 && draft.keys[key] == draft.keys[key - 1];
            let broken = inside || repeats || draft.unit(key).is_none();
            unusable[key + 1] = unusable[key] + usize::from(broken);
        }
        let Some(end) = count.checked_sub(self.span + self.fit) else { return Vec::new() };
        let all: Vec<usize> = (self.fit - 1..end)
            .filter(|&start| {
                let (from, to) = (start + 1 - self.fit, start + self.span + self.fit);
                unusable[to] == unusable[from]
            })
            .collect();
        let stride = all.len().div_ceil(CANDIDATES).max(1);
        all.into_iter().step_by(stride).collect()
    }

    /// The poses inside a gap: through the bulge at the places, with the fitted rates at both ends.
    fn poses(&self, draft: &Draft, start: usize, bulge: &[f64]) -> Vec<Rotor> {
        let end = start + self.span;
        let [a, b] = [start, end].map(|key| draft.unit(key).unwrap_or(Rotor::IDENTITY));
        let mut knots = vec![(0.0, Bivector::ZERO)];
        for (place, own) in self.places.iter().zip(bulge.chunks_exact(3)) {
            knots.push((self.share(draft, start, *place), Bivector::new(own[0], own[1], own[2])));
        }
        knots.push((1.0, Bivector::ZERO));
        // The bulge of the cubic tells the slopes at the ends: small steps inwards along it.
        let slopes = Hermite::new(draft, start, end, self.fit).map_or([Bivector::ZERO; 2], |curve| {
            const SMALL: f64 = 1e-4;
            let at = |share: f64| (slerp(a, b, share).reverse() * curve.at(share)).plane_angles();
            [at(SMALL) * (1.0 / SMALL), at(1.0 - SMALL) * (-1.0 / SMALL)]
        });
        let curve = Spline::new(&knots, slopes);
        (1..self.span)
            .map(|place| {
                let share = self.share(draft, start, place);
                (slerp(a, b, share) * Rotor::from_plane_angles(curve.at(share))).normalize()
            })
            .collect()
    }
}

/// Pretended gaps with what the other joints do in them, and the gap that is to be drawn.
struct Lesson {
    starts: Vec<usize>,
    /// Keys that a gap spans.
    span: usize,
    /// A row for each gap: the bulge of the truth.
    truth: Table,
    /// The same of the cubic.
    cubic: Table,
    /// A row for each place of each gap: how the others lie off their straight way, then the cubic's bulge.
    linear: Table,
    /// A row for each gap: the others' poses along it.
    poses: Table,
    /// A row for each gap: plane angles across, and the cubic's bulge.
    ends: [Table; 2],
    /// A row for each gap: where the joint is at its start.
    place: Table,
    /// The same of the gap to be drawn.
    own: OwnGap,
}

struct OwnGap {
    cubic: Vec<f64>,
    linear: Table,
    poses: Vec<f64>,
    ends: [Vec<f64>; 2],
    place: Vec<f64>,
}

impl Lesson {
    fn new(
        gap: &Gap,
        draft: &Draft,
        others: &Others<'_>,
        left: usize,
        own: Example,
        starts: Vec<usize>,
    ) -> Option<Self> {
        let width = others.width();
        let look = |start: usize| -> (Vec<f64>, Table) {
            let [a, b] = [start, start + gap.span].map(|key| others.at(draft.secs(key)));
            let mut inside = Table::new(width);
            let mut poses = a.clone();
            for place in &gap.places {
                let share = gap.share(draft, start, *place);
                let own = others.at(draft.secs(start + place));
                let off: Vec<f64> =
                    (0..width).map(|i| own[i] - (a[i] * (1.0 - share) + b[i] * share)).collect();
                inside.push(&off);
                poses.extend(own);
            }
            poses.extend(b);
            (poses, inside)
        };
        let (own_poses, own_inside) = look(left);
        let mut gaps: Vec<(usize, f64, Vec<f64>, Table)> = starts
            .into_iter()
            .map(|start| {
                let (poses, inside) = look(start);
                let apart = distance(&poses, &own_poses);
                (start, apart, poses, inside)
            })
            .collect();
        gaps.sort_by(|a, b| a.1.total_cmp(&b.1));
        gaps.truncate(ALIKE);
        gaps.sort_by_key(|gap| gap.0);
        let stride = gaps.len().div_ceil(LEARNED).max(1);

        let places = gap.places.len();
        let answers = 3 * places;
        let with_cubic = |inside: &Table, cubic: &[f64], into: &mut Table| {
            for place in 0..places {
                let mut row = inside.row(place).to_vec();
                row.extend_from_slice(&cubic[3 * place..3 * place + 3]);
                into.push(&row);
            }
        };
        let home = draft.unit(left)?.reverse();
        let spot = |start: usize| {
            let at = (home * draft.unit(start).unwrap_or(Rotor::IDENTITY)).plane_angles();
            vec![at.yz, at.zx, at.xy]
        };
        let across = |example: &Example| vec![example.across.yz, example.across.zx, example.across.xy];
        let mut own_linear = Table::new(width + 3);
        with_cubic(&own_inside, &own.cubic, &mut own_linear);
        let mut lesson = Self {
            starts: Vec::new(),
            span: gap.span,
            truth: Table::new(answers),
            cubic: Table::new(answers),
            linear: Table::new(width + 3),
            poses: Table::new(own_poses.len()),
            ends: [Table::new(3), Table::new(answers)],
            place: Table::new(3),
            own: OwnGap {
                ends: [across(&own), own.cubic.clone()],
                cubic: own.cubic,
                linear: own_linear,
                poses: own_poses,
                place: spot(left),
            },
        };
        for (start, _, poses, inside) in gaps.into_iter().step_by(stride) {
            let Some(example) = gap.example(draft, start) else { continue };
            lesson.starts.push(start);
            lesson.truth.push(&example.truth);
            lesson.cubic.push(&example.cubic);
            with_cubic(&inside, &example.cubic, &mut lesson.linear);
            lesson.poses.push(&poses);
            lesson.ends[0].push(&across(&example));
            lesson.ends[1].push(&example.cubic);
            lesson.place.push(&spot(start));
        }
        (lesson.starts.len() >= LEAST_GAPS).then_some(lesson)
    }

    fn places(&self) -> usize {
        self.truth.width / 3
    }

    /// The bulge of the gap to be drawn; `None` where what was learned is not worth it.
    fn bulge(&self) -> Option<Vec<f64>> {
        let blocks = self.blocks()?;
        let truth = &self.truth.numbers;
        let (linear_tried, linear) = self.linear(&blocks)?;
        let (alike_tried, alike) = self.alike(&blocks)?;
        let weights = blend_weights(&[&self.cubic.numbers, &linear_tried, &alike_tried], truth);
        let blended = |cubic: &[f64], linear: &[f64], alike: &[f64]| -> Vec<f64> {
            (0..cubic.len())
                .map(|i| weights[0] * cubic[i] + weights[1] * linear[i] + weights[2] * alike[i])
                .collect()
        };
        let tried = blended(&self.cubic.numbers, &linear_tried, &alike_tried);
        let plain = dot(truth, truth).min(distance(truth, &self.cubic.numbers));
        (distance(truth, &tried) <= WORTH * plain).then(|| blended(&self.own.cubic, &linear, &alike))
    }

    /// For each block the gaps in it, and those that share no key with them.
    fn blocks(&self) -> Option<Vec<(Vec<usize>, Vec<usize>)>> {
        let count = self.starts.len();
        let mut blocks = Vec::new();
        for block in 0..BLOCKS {
            let tried: Vec<usize> = (block * count / BLOCKS..(block + 1) * count / BLOCKS).collect();
            let (low, high) = (self.starts[*tried.first()?], self.starts[*tried.last()?]);
            let learned: Vec<usize> = (0..count)
                .filter(|&i| self.starts[i] + self.span < low || self.starts[i] > high + self.span)
                .collect();
            if learned.len() * 3 < LEAST_GAPS {
                return None;
            }
            blocks.push((tried, learned));
        }
        Some(blocks)
    }

    /// The linear guess: tried on the gaps left out, and of the gap to be drawn.
    fn linear(&self, blocks: &[(Vec<usize>, Vec<usize>)]) -> Option<(Vec<f64>, Vec<f64>)> {
        let places = self.places();
        // A row of answers for each place in place of one for each gap.
        let answers = Table { width: 3, numbers: self.truth.numbers.clone() };
        let rows = |gaps: &[usize]| -> Vec<usize> {
            gaps.iter().flat_map(|gap| gap * places..(gap + 1) * places).collect()
        };
        let mut best: Option<(f64, f64, Vec<f64>)> = None;
        for share in RIDGES {
            let mut tried = vec![0.0; self.truth.numbers.len()];
            for (left_out, learned) in blocks {
                let weights = ridge(&self.linear, &answers, rows(learned).into_iter(), share)?;
                for row in rows(left_out) {
                    tried[3 * row..3 * row + 3].copy_from_slice(&times(self.linear.row(row), &weights));
                }
            }
            let error = distance(&tried, &self.truth.numbers);
            if best.as_ref().is_none_or(|(least, _, _)| error < *least) {
                best = Some((error, share, tried));
            }
        }
        let (_, share, tried) = best?;
        let all = 0..self.starts.len() * places;
        let weights = ridge(&self.linear, &answers, all, share)?;
        let own = (0..places).flat_map(|place| times(self.own.linear.row(place), &weights)).collect();
        Some((tried, own))
    }

    /// The guess from the most alike stretches: tried on the gaps left out, and of the gap to be drawn.
    ///
    /// Source: kernel ridge regression, Saunders, Gammerman & Vovk 1998, "Ridge regression learning algorithm in dual variables".
    fn alike(&self, blocks: &[(Vec<usize>, Vec<usize>)]) -> Option<(Vec<f64>, Vec<f64>)> {
        let count = self.starts.len();
        let mut best: Option<(f64, Vec<f64>, Vec<f64>)> = None;
        for ends in ENDS {
            let apart = Table {
                width: count,
                numbers: (0..count * count).map(|i| self.apart(ends, i / count, i % count)).collect(),
            };
            let own: Vec<f64> = (0..count).map(|i| self.own_apart(ends, i)).collect();
            let mut sorted = apart.numbers.clone();
            let middle = sorted.len() / 2;
            let usual = *sorted.select_nth_unstable_by(middle, f64::total_cmp).1;
            if usual <= 0.0 {
                continue;
            }
            for width in WIDTHS {
                let near = |apart: f64| (-apart / (width * usual)).exp();
                let kernel =
                    Table { width: count, numbers: apart.numbers.iter().map(|apart| near(*apart)).collect() };
                for noise in NOISES {
                    let mut tried = vec![0.0; self.truth.numbers.len()];
                    for (left_out, learned) in blocks {
                        let weights = self.dual(&kernel, learned, noise)?;
                        for gap in left_out {
                            let row: Vec<f64> =
                                learned.iter().map(|other| kernel.row(*gap)[*other]).collect();
                            let width = self.truth.width;
                            tried[gap * width..(gap + 1) * width].copy_from_slice(&times(&row, &weights));
                        }
                    }
                    let error = distance(&tried, &self.truth.numbers);
                    if best.as_ref().is_none_or(|(least, _, _)| error < *least) {
                        let all: Vec<usize> = (0..count).collect();
                        let weights = self.dual(&kernel, &all, noise)?;
                        let row: Vec<f64> = own.iter().map(|apart| near(*apart)).collect();
                        best = Some((error, tried, times(&row, &weights)));
                    }
                }
            }
        }
        best.map(|(_, tried, own)| (tried, own))
    }

    fn dual(&self, kernel: &Table, learned: &[usize], noise: f64) -> Option<Table> {
        let (mut square, mut right) = (Table::new(learned.len()), Table::new(self.truth.width));
        for &gap in learned {
            let row: Vec<f64> = learned
                .iter()
                .map(|&other| kernel.row(gap)[other] + if gap == other { noise } else { 0.0 })
                .collect();
            square.push(&row);
            right.push(self.truth.row(gap));
        }
        solve(&square, &right)
    }

    /// How unlike two gaps are.
    fn apart(&self, ends: [f64; 3], a: usize, b: usize) -> f64 {
        let row = |table: &Table| distance(table.row(a), table.row(b));
        self.weighed(ends, [row(&self.poses), row(&self.ends[0]), row(&self.ends[1]), row(&self.place)])
    }

    fn own_apart(&self, ends: [f64; 3], gap: usize) -> f64 {
        self.weighed(
            ends,
            [
                distance(self.poses.row(gap), &self.own.poses),
                distance(self.ends[0].row(gap), &self.own.ends[0]),
                distance(self.ends[1].row(gap), &self.own.ends[1]),
                distance(self.place.row(gap), &self.own.place),
            ],
        )
    }

    fn weighed(&self, [across, cubic, place]: [f64; 3], apart: [f64; 4]) -> f64 {
        let places = self.places() as f64;
        apart[0] / (places + 2.0)
            + across * across * apart[1]
            + cubic * cubic * apart[2] / places
            + place * place * apart[3]
    }
}

/// The squared distance of two rows.
fn distance(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| (a - b) * (a - b)).sum()
}

/// A cubic spline with two rates in a row, through knots with given slopes at both ends.
///
/// Source: the tridiagonal system for the slopes, de Boor 1978, "A Practical Guide to Splines", chapter IV.
struct Spline {
    knots: Vec<(f64, Bivector)>,
    slopes: Vec<Bivector>,
}

impl Spline {
    fn new(knots: &[(f64, Bivector)], ends: [Bivector; 2]) -> Self {
        let last = knots.len() - 1;
        let width = |i: usize| knots[i + 1].0 - knots[i].0;
        let rise = |i: usize| (knots[i + 1].1 - knots[i].1) * (1.0 / width(i));
        let mut slopes = vec![Bivector::ZERO; knots.len()];
        (slopes[0], slopes[last]) = (ends[0], ends[1]);
        // Thomas' algorithm over the inner knots.
        let (mut above, mut right) = (vec![0.0; knots.len()], vec![Bivector::ZERO; knots.len()]);
        for i in 1..last {
            let (before, after) = (width(i - 1), width(i));
            let own = (rise(i - 1) * after + rise(i) * before) * 3.0;
            let known = if i == 1 { slopes[0] } else { right[i - 1] };
            let factor = if i == 1 { 0.0 } else { above[i - 1] };
            let diagonal = 2.0 * (before + after) - after * factor;
            let last_known = if i + 1 == last { slopes[last] * before } else { Bivector::ZERO };
            above[i] = before / diagonal;
            right[i] = (own - known * after - last_known) * (1.0 / diagonal);
        }
        for i in (1..last).rev() {
            let next = if i + 1 == last { Bivector::ZERO } else { slopes[i + 1] * above[i] };
            slopes[i] = right[i] - next;
        }
        Self { knots: knots.to_vec(), slopes }
    }

    fn at(&self, share: f64) -> Bivector {
        let next = self.knots.partition_point(|knot| knot.0 <= share).clamp(1, self.knots.len() - 1);
        let ((from, a), (to, b)) = (self.knots[next - 1], self.knots[next]);
        let (width, t) = (to - from, (share - from) / (to - from));
        let (t2, t3) = (t * t, t * t * t);
        a * (2.0 * t3 - 3.0 * t2 + 1.0)
            + self.slopes[next - 1] * (width * (t3 - 2.0 * t2 + t))
            + b * (3.0 * t2 - 2.0 * t3)
            + self.slopes[next] * (width * (t3 - t2))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cubic_is_its_own_spline() {
        let cubic = |t: f64| Bivector::new(t * t * t - t, 2.0 * t * t - 2.0 * t, t - t);
        let knots: Vec<_> = [0.0, 0.2, 0.5, 0.6, 1.0].map(|t| (t, cubic(t))).to_vec();
        let curve = Spline::new(&knots, [Bivector::new(-1.0, -2.0, 0.0), Bivector::new(2.0, 2.0, 0.0)]);
        for i in 0..=20 {
            let t = f64::from(i) / 20.0;
            assert!((curve.at(t) - cubic(t)).length() < 1e-12, "at {t}");
        }
    }
}

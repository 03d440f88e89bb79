//! The body rates at the keys of a rotation spline.
//!
//! That the acceleration does not jump at a key is linear in the rates of the key and its two neighbours, but for one term: the
//! turning term of the segment before it, a square of the key's own rate. Split at a guess `w₀`, with `d = w − w₀`, that is
//! `q(w) = q(w₀) + q'(w₀) d + q(d)`: the first two go into the system of equations, which is eliminated once; the last is small, and
//! only the right sides are worked out again, round after round, until nothing moves.
//!
//! Source: Park & Ravani 1997, "Smooth invariant interpolation of rotations", ACM TOG 16(3), section 4; the split is ours.

use glam::{DMat3, DVec3};

use super::slope::Slope;
use super::spline::{EndRate, EndRates, SplineError};

/// One stretch between two keys.
#[derive(Clone, Copy, Debug)]
pub(super) struct Segment {
    pub(super) secs: f64,
    pub(super) slope: Slope,
    /// From the body rate at its end to the slope of its angles there.
    pub(super) inverse: DMat3,
}

impl Segment {
    pub(super) fn new(secs: f64, slope: Slope) -> Self {
        Self { secs, slope, inverse: slope.inverse_jacobian() }
    }

    /// The mean rate.
    fn secant(&self) -> DVec3 {
        self.slope.angles() / self.secs
    }
}

/// Body rates at the keys, so that the acceleration does not jump at any inner one.
pub(super) fn rates_at_keys(segments: &[Segment], ends: EndRates) -> Result<Vec<DVec3>, SplineError> {
    let n = segments.len();
    let sides = ends.sides();
    // The secants are also a good first guess for the keys within.
    let mut rates: Vec<DVec3> = std::iter::once(segments[0].secant())
        .chain(segments.windows(2).map(|pair| 0.5 * (pair[0].secant() + pair[1].secant())))
        .chain(std::iter::once(segments[n - 1].secant()))
        .collect();
    if let Some(sides) = sides {
        for (key, side) in [(0, sides[0]), (n, sides[1])] {
            if let EndRate::Given(rate) = side {
                rates[key] = rate.axis();
            }
        }
        if n == 1 && !sides.contains(&EndRate::Natural) {
            return Ok(rates);
        }
    }
    let system = System { segments, sides };
    match system.near(&rates) {
        Some(found) => Ok(found),
        None => system.patiently(rates),
    }
}

struct System<'a> {
    segments: &'a [Segment],
    /// The two ends; `None` for a closed loop.
    sides: Option<[EndRate; 2]>,
}

/// One condition: `lower · rate before + diagonal · own rate + bend · turning term of the segment before + upper · rate after = right`.
#[derive(Clone, Copy)]
struct Row {
    lower: DMat3,
    diagonal: f64,
    upper: DMat3,
    right: DVec3,
    bend: f64,
    before: usize,
}

/// A condition with all that does not depend on the right side worked out: `rate = own · right − before · constant of the key before −
/// after · rate after`.
#[derive(Clone, Copy)]
struct Eliminated {
    own: DMat3,
    before: DMat3,
    after: DMat3,
    right: DVec3,
    bend: f64,
    segment: usize,
    /// The rate that the bend is split at.
    anchor: DVec3,
}

/// A closed loop: every other rate is told by that at the seam, `rate = constant − factor · rate at the seam`, and the condition at
/// the seam tells that one.
struct Seam {
    /// For each key.
    factors: Vec<DMat3>,
    row: Row,
    own: DMat3,
    anchor: DVec3,
}

/// The conditions of all keys, eliminated from the first to the last.
struct Elimination<'a> {
    segments: &'a [Segment],
    rows: Vec<Eliminated>,
    seam: Option<Seam>,
}

impl System<'_> {
    /// From a guess by quick steps; `None` where these do not lead on.
    fn near(&self, guess: &[DVec3]) -> Option<Vec<DVec3>> {
        /// 3 to 5 are usual.
        const MOST_ROUNDS: usize = 12;
        /// Of the largest rate: below its rounding.
        const SETTLED: f64 = 1e-16;
        let mut rates = Vec::with_capacity(guess.len());
        let plain = self.eliminated(None, Vec::new());
        plain.solve(guess, &mut rates);
        let elimination = self.eliminated(Some(&rates), plain.rows);
        let mut next = Vec::with_capacity(rates.len());
        let mut change = f64::INFINITY;
        for _ in 0..MOST_ROUNDS {
            elimination.solve(&rates, &mut next);
            let (moved, size) = moved(&rates, &next)?;
            std::mem::swap(&mut rates, &mut next);
            // What all later rounds together will move.
            let share = if change.is_finite() { moved / change } else { 0.5 };
            if moved == 0.0 || moved * share <= SETTLED * size {
                return Some(rates);
            }
            if share > 0.5 {
                // Rounding may keep it moving a little.
                return (moved <= 1e-13 * size).then_some(rates);
            }
            change = moved;
        }
        None
    }

    /// By as many rounds as it takes: with turns near 180° the quick steps go astray.
    fn patiently(&self, mut rates: Vec<DVec3>) -> Result<Vec<DVec3>, SplineError> {
        const MOST_ROUNDS: usize = 1000;
        /// Of 200 000 random curves with steps up to 178° all settle with this; with full steps alone up to 3 in 2000 did not.
        const SMALLEST_SHARE: f64 = 0.2;
        let elimination = self.eliminated(None, Vec::new());
        let mut next = Vec::with_capacity(rates.len());
        let (mut change, mut share) = (f64::INFINITY, 1.0_f64);
        for round in 1..=MOST_ROUNDS {
            elimination.solve(&rates, &mut next);
            let Some((moved, size)) = moved(&rates, &next) else {
                return Err(SplineError::NotSettled { change: f64::INFINITY, rounds: round });
            };
            // Rounding may keep it moving a little for ever: there, it is done when it moves no less than before.
            if moved <= 1e-15 * size || (moved <= 1e-12 * size && moved >= change) {
                return Ok(next);
            }
            // Where it swings to and fro, a part of the way leads on.
            if moved >= change {
                share = (share * 0.8).max(SMALLEST_SHARE);
            }
            for (rate, next) in rates.iter_mut().zip(&next) {
                *rate += (*next - *rate) * share;
            }
            change = moved;
        }
        Err(SplineError::NotSettled { change, rounds: MOST_ROUNDS })
    }

    /// The acceleration does not jump where segment `before` gives way to segment `after`.
    fn inner(&self, before: usize, after: usize) -> Row {
        let [left, right] = [before, after].map(|segment| &self.segments[segment]);
        let (over_left, over_right) = (1.0 / left.secs, 1.0 / right.secs);
        Row {
            lower: left.slope.jacobian() * (2.0 * over_left),
            diagonal: 4.0 * (over_left + over_right),
            upper: right.inverse * (2.0 * over_right),
            right: 6.0
                * (left.slope.angles() * (over_left * over_left)
                    + right.slope.angles() * (over_right * over_right)),
            bend: 1.0,
            before,
        }
    }

    /// The condition at one of two ends.
    fn end(&self, side: EndRate, is_first: bool) -> Row {
        let before = self.segments.len() - 1;
        let known = |rate| Row {
            lower: DMat3::ZERO,
            diagonal: 1.0,
            upper: DMat3::ZERO,
            right: rate,
            bend: 0.0,
            before,
        };
        let segment = &self.segments[if is_first { 0 } else { before }];
        match side {
            EndRate::Given(rate) => known(rate.axis()),
            EndRate::Secant => known(segment.secant()),
            EndRate::Natural if is_first => {
                Row { diagonal: 2.0, upper: segment.inverse, ..known(3.0 * segment.secant()) }
            }
            EndRate::Natural => Row {
                lower: segment.slope.jacobian() * 2.0,
                diagonal: 4.0,
                bend: segment.secs,
                ..known(6.0 * segment.secant())
            },
        }
    }

    /// The conditions eliminated, the bends split at the rates `anchors`, or at standstill. `rows` lends its room.
    fn eliminated(&self, anchors: Option<&[DVec3]>, mut rows: Vec<Eliminated>) -> Elimination<'_> {
        let n = self.segments.len();
        let anchor = |key: usize| anchors.map_or(DVec3::ZERO, |rates| rates[key]);
        rows.clear();
        rows.reserve_exact(n + 1);
        let mut last = DMat3::ZERO;
        let mut eliminate = |row: Row, key: usize| {
            let anchor = anchor(key);
            let (own, right) = self.split(&row, anchor);
            let own = inverse(own - row.lower * last);
            let after = own * row.upper;
            last = after;
            let before = own * row.lower;
            rows.push(Eliminated { own, before, after, right, bend: row.bend, segment: row.before, anchor });
        };
        if let Some([first, end]) = self.sides {
            eliminate(self.end(first, true), 0);
            (1..n).for_each(|key| eliminate(self.inner(key - 1, key), key));
            eliminate(self.end(end, false), n);
            return Elimination { segments: self.segments, rows, seam: None };
        }
        (1..n).for_each(|key| eliminate(self.inner(key - 1, key), key));
        // From the seam back; the seam itself is −1 of it.
        let mut factors = vec![DMat3::IDENTITY * -1.0; n + 1];
        let mut forward = DMat3::IDENTITY * -1.0;
        for (row, factor) in rows.iter_mut().zip(&mut factors[1..]) {
            forward = row.before * forward * -1.0;
            *factor = forward;
        }
        for key in (1..n).rev() {
            let behind = factors[key + 1];
            factors[key] -= rows[key - 1].after * behind;
        }
        if let Some(row) = rows.first_mut() {
            // What comes before it is the seam, and that is in the factors.
            row.before = DMat3::ZERO;
        }
        let row = self.inner(n - 1, 0);
        let anchor = anchor(0);
        let (own, right) = self.split(&row, anchor);
        let own = inverse(own - row.lower * factors[n - 1] - row.upper * factors[1]);
        let seam = Seam { factors, row: Row { right, ..row }, own, anchor };
        Elimination { segments: self.segments, rows, seam: Some(seam) }
    }

    /// What a row's own rate is multiplied by, and its right side, with the bend split at the rate `anchor`.
    fn split(&self, row: &Row, anchor: DVec3) -> (DMat3, DVec3) {
        let own = DMat3::from_diagonal(DVec3::splat(row.diagonal));
        if row.bend == 0.0 || anchor == DVec3::ZERO {
            return (own, row.right);
        }
        let Segment { slope, inverse, .. } = &self.segments[row.before];
        let g = *inverse * anchor;
        // `q'(w₀) w₀` is twice `q(w₀)`.
        let right = row.right + row.bend * slope.turning_term(g);
        (own + slope.turning_slope(g) * *inverse * row.bend, right)
    }
}

impl Elimination<'_> {
    /// One round: the rates that fulfil the conditions with what is left of the bends as `rates` have it.
    fn solve(&self, rates: &[DVec3], next: &mut Vec<DVec3>) {
        let left = |right: DVec3, bend: f64, segment: usize, apart: DVec3| {
            let Segment { slope, inverse, .. } = &self.segments[segment];
            if bend == 0.0 { right } else { right - bend * slope.turning_term(*inverse * apart) }
        };
        next.clear();
        let first = usize::from(self.seam.is_some());
        next.extend(std::iter::repeat_n(DVec3::ZERO, first));
        let mut constant = DVec3::ZERO;
        for (row, rate) in self.rows.iter().zip(&rates[first..]) {
            let right = left(row.right, row.bend, row.segment, *rate - row.anchor);
            constant = row.own * right - row.before * constant;
            next.push(constant);
        }
        let mut after = DVec3::ZERO;
        for (row, rate) in self.rows.iter().zip(&mut next[first..]).rev() {
            after = *rate - row.after * after;
            *rate = after;
        }
        let Some(Seam { factors, row, own, anchor }) = &self.seam else { return };
        let n = self.segments.len();
        let right = left(row.right, row.bend, row.before, rates[0] - *anchor);
        // With one segment the seam is its own neighbour.
        let [before, after] =
            [n - 1, 1].map(|key| if key == 0 || key == n { DVec3::ZERO } else { next[key] });
        let seam = *own * (right - row.lower * before - row.upper * after);
        next.push(DVec3::ZERO);
        for (rate, factor) in next.iter_mut().zip(factors) {
            *rate -= *factor * seam;
        }
    }
}

/// How far the rates moved at most, and the largest; `None` when one is no number.
fn moved(rates: &[DVec3], next: &[DVec3]) -> Option<(f64, f64)> {
    let (mut moved, mut size, mut all) = (0.0_f64, 0.0_f64, DVec3::ZERO);
    for (rate, next) in rates.iter().zip(next) {
        moved = moved.max((*next - *rate).length_squared());
        size = size.max(next.length_squared());
        all += *next;
    }
    // `max` passes over NaN, and a square overflows long before its parts do.
    (all.is_finite() && size.is_finite() && moved.is_finite()).then(|| (moved.sqrt(), size.sqrt()))
}

/// The inverse of a matrix by its minors; all that is inverted here is far from singular.
fn inverse(matrix: DMat3) -> DMat3 {
    let DMat3 { x_axis: x, y_axis: y, z_axis: z } = matrix;
    let [a, b, c] = [y.cross(z), z.cross(x), x.cross(y)];
    let over = 1.0 / x.dot(a);
    DMat3::from_cols(a * over, b * over, c * over).transpose()
}

//! The body rates at the keys of a rotation spline.
//!
//! That the acceleration does not jump at a key is linear in the rates of the key and its two neighbours, but for one term: the
//! turning term of the segment before it, a square of the key's own rate. Split at a guess `w₀`, with `d = w − w₀`, that is
//! `q(w) = q(w₀) + q'(w₀) d + q(d)`: the first two go into the system of equations, which is eliminated once; the last is small, and
//! only the right sides are worked out again, round after round, until nothing moves.
//!
//! The equations are eliminated from both ends towards the middle, two side by side: each step waits for the one before it, so
//! that two take little longer than one, and both go into one instruction.
//!
//! Source: Park & Ravani 1997, "Smooth invariant interpolation of rotations", ACM TOG 16(3), section 4; the split is ours.

#![expect(
    clippy::inline_always,
    reason = "a part that stays a function of its own is built for the baseline, and keeps what is around it from wide instructions"
)]

use wide::f64x2;

use super::batch::Level;
use super::linear::{Matrix, Vector};
use super::slope::{Rests, Slope};
use super::spline::{EndRate, EndRates, SplineError};

/// One stretch between two keys.
#[derive(Clone, Copy, Debug)]
pub(super) struct Segment {
    pub(super) secs: f64,
    pub(super) slope: Slope,
}

impl Segment {
    /// The mean rate.
    fn secant(&self) -> Vector<f64> {
        self.slope.angles * (1.0 / self.secs)
    }
}

/// Body rates at the keys, so that the acceleration does not jump at any inner one.
pub(super) fn rates_at_keys(segments: &[Segment], ends: EndRates) -> Result<Vec<Vector<f64>>, SplineError> {
    let n = segments.len();
    let sides = ends.sides();
    if let (1, Some(sides)) = (n, sides)
        && !sides.contains(&EndRate::Natural)
    {
        let mut rates = first_guess(segments, Some(sides));
        rates.truncate(n + 1);
        return Ok(rates);
    }
    let system = System::new(segments, sides);
    let mut found = match system.near(first_guess(segments, sides)) {
        Some(found) => found,
        None => system.patiently(first_guess(segments, sides))?,
    };
    found.truncate(n + 1);
    Ok(found)
}

/// The mean rates of the segments around each key, and one more, as the conditions go in pairs.
fn first_guess(segments: &[Segment], sides: Option<[EndRate; 2]>) -> Vec<Vector<f64>> {
    let n = segments.len();
    let mut rates = Vec::with_capacity(n + 2);
    let mut before = segments[0].secant();
    rates.push(before);
    for segment in &segments[1..] {
        let after = segment.secant();
        rates.push((before + after) * 0.5);
        before = after;
    }
    rates.extend([before, Vector::zero()]);
    for (key, side) in [0, n].into_iter().zip(sides.into_iter().flatten()) {
        if let EndRate::Given(rate) = side {
            rates[key] = rate.axis().into();
        }
    }
    rates
}

/// One condition: `lower · J(segment before) · rate before + diagonal · own rate + bend · turning term of the segment before + upper ·
/// J⁻¹(segment after) · rate after = right`.
#[derive(Clone, Copy)]
struct Condition {
    lower: f64,
    diagonal: f64,
    upper: f64,
    right: Vector<f64>,
    bend: f64,
}

impl Condition {
    /// Tells a rate.
    fn known(rate: Vector<f64>) -> Self {
        Self { lower: 0.0, diagonal: 1.0, upper: 0.0, right: rate, bend: 0.0 }
    }

    /// The acceleration does not jump where segment `left` gives way to segment `right`.
    fn inner(left: &Segment, right: &Segment) -> Self {
        let (over_left, over_right) = (1.0 / left.secs, 1.0 / right.secs);
        let [of_left, of_right] = [(left, over_left), (right, over_right)]
            .map(|(segment, over)| segment.slope.angles * (over * over));
        Self {
            lower: 2.0 * over_left,
            diagonal: 4.0 * (over_left + over_right),
            upper: 2.0 * over_right,
            right: (of_left + of_right) * 6.0,
            bend: 1.0,
        }
    }

    /// At one of two ends.
    fn end(side: EndRate, segment: &Segment, is_first: bool) -> Self {
        match side {
            EndRate::Given(rate) => Self::known(rate.axis().into()),
            EndRate::Secant => Self::known(segment.secant()),
            EndRate::Natural if is_first => {
                Self { diagonal: 2.0, upper: 1.0, ..Self::known(segment.secant() * 3.0) }
            }
            EndRate::Natural => {
                Self { lower: 2.0, diagonal: 4.0, bend: segment.secs, ..Self::known(segment.secant() * 6.0) }
            }
        }
    }
}

/// The conditions of all keys, or, of a closed loop, of all but the seam.
struct System<'a> {
    segments: &'a [Segment],
    /// The key of the first condition.
    first: usize,
    /// An even number.
    conditions: Vec<Condition>,
    /// Of a closed loop, that at the seam.
    seam: Option<Condition>,
}

/// Two conditions, as far from the first as from the last, with all that does not depend on the right sides worked out: `rate = own · (right −
/// inward · constant of the key further out) − outward · rate of the key further in`.
#[derive(Clone, Copy)]
struct Rung {
    inward: Matrix<f64x2>,
    own: Matrix<f64x2>,
    outward: Matrix<f64x2>,
    right: Vector<f64x2>,
    /// The rates that the bends are split at.
    anchor: Vector<f64x2>,
}

/// The conditions, eliminated from both ends to the middle.
struct Elimination<'a> {
    system: &'a System<'a>,
    rungs: Vec<Rung>,
    /// Where they meet: the rate of the last key of the first half is this, times its constant less what the other half adds.
    join: Matrix<f64>,
    seam: Option<Seam>,
}

/// A closed loop: every other rate is told by that at the seam, `rate = constant − factor · rate at the seam`, and the condition at
/// the seam tells that one.
struct Seam {
    /// For each key.
    factors: Vec<Matrix<f64>>,
    lower: Matrix<f64>,
    upper: Matrix<f64>,
    right: Vector<f64>,
    bend: Slope,
    own: Matrix<f64>,
    anchor: Vector<f64>,
}

impl<'a> System<'a> {
    fn new(segments: &'a [Segment], sides: Option<[EndRate; 2]>) -> Self {
        let n = segments.len();
        let mut conditions = Vec::with_capacity(n + 2);
        conditions.extend(sides.map(|[first, _]| Condition::end(first, &segments[0], true)));
        conditions.extend(segments.windows(2).map(|pair| Condition::inner(&pair[0], &pair[1])));
        conditions.extend(sides.map(|[_, last]| Condition::end(last, &segments[n - 1], false)));
        if conditions.len() % 2 == 1 {
            conditions.push(Condition::known(Vector::zero()));
        }
        let seam = sides.is_none().then(|| Condition::inner(&segments[n - 1], &segments[0]));
        Self { segments, first: usize::from(sides.is_none()), conditions, seam }
    }

    /// From a guess by quick steps; `None` where these do not lead on.
    fn near(&self, guess: Vec<Vector<f64>>) -> Option<Vec<Vector<f64>>> {
        /// 3 to 5 are usual.
        const MOST_ROUNDS: usize = 12;
        /// Of the largest rate: below its rounding.
        const SETTLED: f64 = 1e-16;
        let mut rates = vec![Vector::zero(); guess.len()];
        let plain = self.eliminated(None, Vec::new());
        plain.solve(&guess, &mut rates);
        let elimination = self.eliminated(Some(&rates), plain.rungs);
        let mut next = guess;
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
    fn patiently(&self, mut rates: Vec<Vector<f64>>) -> Result<Vec<Vector<f64>>, SplineError> {
        const MOST_ROUNDS: usize = 1000;
        /// Of 200 000 random curves with steps up to 178° all settle with this; with full steps alone up to 3 in 2000 did not.
        const SMALLEST_SHARE: f64 = 0.2;
        let elimination = self.eliminated(None, Vec::new());
        let mut next = rates.clone();
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
                *rate = *rate + (*next - *rate) * share;
            }
            change = moved;
        }
        Err(SplineError::NotSettled { change, rounds: MOST_ROUNDS })
    }

    /// The segments before and after the key of a condition; at the ends, and for the condition that makes them even, any one.
    #[inline(always)]
    fn around(&self, condition: usize) -> [&Slope; 2] {
        let (key, last) = (self.first + condition, self.segments.len() - 1);
        [&self.segments[key.saturating_sub(1).min(last)].slope, &self.segments[key.min(last)].slope]
    }

    /// The conditions eliminated, the bends split at the rates `anchors`, or at standstill. `rungs` lends its room.
    fn eliminated(&self, anchors: Option<&[Vector<f64>]>, mut rungs: Vec<Rung>) -> Elimination<'_> {
        rungs.clear();
        rungs.reserve_exact(self.conditions.len() / 2);
        Level::best().run(
            #[inline(always)]
            || self.fill(anchors, &mut rungs),
        );
        let one = Matrix::diagonal(1.0);
        let join = rungs.last().map_or(one, |rung| {
            let [front, back] = apart(rung.outward);
            inverse(one - front * back)
        });
        let mut elimination = Elimination { system: self, rungs, join, seam: None };
        elimination.seam = self.seam.as_ref().map(|condition| elimination.seam(condition, anchors));
        elimination
    }

    /// Eliminates the conditions two by two.
    #[inline(always)]
    fn fill(&self, anchors: Option<&[Vector<f64>]>, rungs: &mut Vec<Rung>) {
        let last = self.conditions.len().wrapping_sub(1);
        let mut outward = Matrix::diagonal(f64x2::ZERO);
        for i in 0..self.conditions.len() / 2 {
            let [front, back] = [&self.conditions[i], &self.conditions[last - i]];
            let ([before_front, after_front], [before_back, after_back]) =
                (self.around(i), self.around(last - i));
            // What couples the outermost two to the seam stands in the factors.
            let [lower, upper] =
                if self.seam.is_some() && i == 0 { [0.0; 2] } else { [front.lower, back.upper] };
            let inward = Matrix::of_cross_products(
                beside(before_front.angles, after_back.angles),
                f64x2::new([-before_front.rests.cosine, 0.5]),
                f64x2::new([before_front.rests.sine, after_back.rests.cotangent]),
            ) * f64x2::new([lower, upper]);
            let further = Matrix::of_cross_products(
                beside(after_front.angles, before_back.angles),
                f64x2::new([0.5, -before_back.rests.cosine]),
                f64x2::new([after_front.rests.cotangent, before_back.rests.sine]),
            ) * f64x2::new([front.upper, back.lower]);
            let mut own = Matrix::diagonal(f64x2::new([front.diagonal, back.diagonal]));
            let mut right = beside(front.right, back.right);
            let mut anchor = Vector::zero();
            if let Some(anchors) = anchors {
                let (slope, bend) = self.bend(i, last - i);
                let inverse = slope.inverse_jacobian();
                anchor = beside(anchors[self.first + i], anchors[self.first + last - i]);
                let g = inverse * anchor;
                // `q'(w₀) w₀` is twice `q(w₀)`.
                right = right + slope.turning_term(g) * bend;
                own = own + slope.turning_slope(g) * inverse * bend;
            }
            let (adjugate, determinant) = (own - inward * outward).adjugate();
            let over = f64x2::ONE / determinant;
            outward = (adjugate * further) * over;
            rungs.push(Rung { inward, own: adjugate * over, outward, right, anchor });
        }
    }

    /// The segments before two keys, whose turning bends their conditions, and how much.
    #[inline(always)]
    fn bend(&self, front: usize, back: usize) -> (Slope<f64x2>, f64x2) {
        let slope = both(self.around(front)[0], self.around(back)[0]);
        (slope, f64x2::new([self.conditions[front].bend, self.conditions[back].bend]))
    }
}

impl Elimination<'_> {
    fn seam(&self, condition: &Condition, anchors: Option<&[Vector<f64>]>) -> Seam {
        let System { segments, conditions, .. } = self.system;
        let n = segments.len();
        let one = Matrix::diagonal(1.0);
        // The seam itself is −1 of it, at both of its keys.
        let mut factors = vec![one * -1.0; n + 1];
        if let ([first, ..], Some(last)) = (&conditions[..], n.checked_sub(2)) {
            let before = segments[0].slope.jacobian() * first.lower;
            let behind = segments[n - 1].slope.inverse_jacobian() * conditions[last].upper;
            let (mut rights, mut found) =
                (vec![Vector::zero(); conditions.len()], vec![Vector::zero(); n + 2]);
            for column in 0..3 {
                rights[0] = before.0[column];
                rights[last] = if last == 0 { rights[0] } else { Vector::zero() } + behind.0[column];
                self.substitute(&mut found, |i, _| beside(rights[i], rights[conditions.len() - 1 - i]));
                for (factor, found) in factors[1..n].iter_mut().zip(&found[1..n]) {
                    factor.0[column] = *found;
                }
            }
        }
        let bend = segments[n - 1].slope;
        let (lower, upper) =
            (bend.jacobian() * condition.lower, segments[0].slope.inverse_jacobian() * condition.upper);
        let (mut own, mut right) = (one * condition.diagonal, condition.right);
        let anchor = anchors.map_or(Vector::zero(), |rates| rates[0]);
        let g = bend.inverse_jacobian() * anchor;
        right = right + bend.turning_term(g);
        own = own + bend.turning_slope(g) * bend.inverse_jacobian();
        let own = inverse(own - lower * factors[n - 1] - upper * factors[1]);
        Seam { factors, lower, upper, right, bend, own, anchor }
    }

    /// One round: the rates that fulfil the conditions with what is left of the bends as `rates` have it.
    fn solve(&self, rates: &[Vector<f64>], next: &mut [Vector<f64>]) {
        Level::best().run(
            #[inline(always)]
            || {
                self.substitute(
                    next,
                    #[inline(always)]
                    |i, rung| self.right(rates, i, rung),
                );
            },
        );
        let Some(Seam { factors, lower, upper, right, bend, own, anchor }) = &self.seam else { return };
        let n = self.system.segments.len();
        let right = *right - bend.turning_term(bend.inverse_jacobian() * (rates[0] - *anchor));
        next[0] = Vector::zero();
        next[n] = Vector::zero();
        let seam = *own * (right - *lower * next[n - 1] - *upper * next[1]);
        for (rate, factor) in next.iter_mut().zip(factors) {
            *rate = *rate - *factor * seam;
        }
    }

    /// The right sides of a rung with what is left of the bends as `rates` have it.
    #[inline(always)]
    fn right(&self, rates: &[Vector<f64>], i: usize, rung: &Rung) -> Vector<f64x2> {
        let System { first, conditions, .. } = self.system;
        let [front, back] = [i, conditions.len() - 1 - i];
        let moved = beside(rates[first + front], rates[first + back]) - rung.anchor;
        let (slope, bend) = self.system.bend(front, back);
        rung.right - slope.turning_term(slope.inverse_jacobian() * moved) * bend
    }

    /// The rates within of these right sides, a pair for each rung.
    #[inline(always)]
    fn substitute(&self, found: &mut [Vector<f64>], right: impl Fn(usize, &Rung) -> Vector<f64x2>) {
        let len = self.system.conditions.len();
        let found = &mut found[self.system.first..][..len];
        let mut constant = Vector::zero();
        for (i, rung) in self.rungs.iter().enumerate() {
            constant = rung.own * (right(i, rung) - rung.inward * constant);
            [found[i], found[len - 1 - i]] = one_by_one(constant);
        }
        let Some(rung) = self.rungs.last() else { return };
        let ([front, back], [of_front, of_back]) = (one_by_one(constant), apart(rung.outward));
        let met = self.join * (front - of_front * back);
        let mut further = beside(met, back - of_back * met);
        [found[len / 2 - 1], found[len / 2]] = one_by_one(further);
        for (i, rung) in self.rungs.iter().enumerate().rev().skip(1) {
            further = beside(found[i], found[len - 1 - i]) - rung.outward * further;
            [found[i], found[len - 1 - i]] = one_by_one(further);
        }
    }
}

/// How far the rates moved at most, and the largest; `None` when one is no number.
fn moved(rates: &[Vector<f64>], next: &[Vector<f64>]) -> Option<(f64, f64)> {
    let (mut moved, mut size, mut all) = (0.0_f64, 0.0_f64, Vector::zero());
    for (rate, next) in rates.iter().zip(next) {
        let step = *next - *rate;
        moved = moved.max(step.dot(step));
        size = size.max(next.dot(*next));
        all = all + *next;
    }
    // `max` passes over NaN, and a square overflows long before its parts do.
    let is_sound = all.0.iter().all(|part| part.is_finite()) && size.is_finite() && moved.is_finite();
    is_sound.then(|| (moved.sqrt(), size.sqrt()))
}

#[inline(always)]
fn inverse(matrix: Matrix<f64>) -> Matrix<f64> {
    let (adjugate, determinant) = matrix.adjugate();
    adjugate * (1.0 / determinant)
}

#[inline(always)]
fn beside(front: Vector<f64>, back: Vector<f64>) -> Vector<f64x2> {
    let (Vector([x, y, z]), Vector([a, b, c])) = (front, back);
    Vector([f64x2::new([x, a]), f64x2::new([y, b]), f64x2::new([z, c])])
}

#[inline(always)]
fn one_by_one(both: Vector<f64x2>) -> [Vector<f64>; 2] {
    let Vector([x, y, z]) = both;
    let (x, y, z) = (x.to_array(), y.to_array(), z.to_array());
    [Vector([x[0], y[0], z[0]]), Vector([x[1], y[1], z[1]])]
}

fn apart(both: Matrix<f64x2>) -> [Matrix<f64>; 2] {
    let [x, y, z] = both.0.map(one_by_one);
    [Matrix([x[0], y[0], z[0]]), Matrix([x[1], y[1], z[1]])]
}

#[inline(always)]
fn both(front: &Slope, back: &Slope) -> Slope<f64x2> {
    let (a, b) = (&front.rests, &back.rests);
    Slope {
        angles: beside(front.angles, back.angles),
        rests: Rests {
            cosine: f64x2::new([a.cosine, b.cosine]),
            sine: f64x2::new([a.sine, b.sine]),
            cotangent: f64x2::new([a.cotangent, b.cotangent]),
            across: f64x2::new([a.across, b.across]),
            twice_across: f64x2::new([a.twice_across, b.twice_across]),
        },
    }
}

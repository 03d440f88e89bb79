//! Spans of turns: one slerp in place of many, within a bound at every time.

use crate::rotor::{Bivector, Rotor};

use super::spans::Row;

/// No span turns farther than 120°, so that no player can take the other way round. A little more is rounding: steps of 10°
/// add up to it.
pub(super) const LARGEST_STEP_RAD: f64 = 2.0 * std::f64::consts::FRAC_PI_3 + 1e-12;

/// The largest bound that the search is made for.
pub(super) const LARGEST_BOUND_RAD: f64 = std::f64::consts::FRAC_PI_4;

/// Keys with slerp between neighbours, all the short way.
///
/// With `S` the span's slerp and `O` the row's own between two neighbouring keys, both as points of the unit sphere in four
/// dimensions that run over `s` = 0 to 1 at constant speeds `α` and `β` (half the turn of each), let
/// `g = 1 − ⟨S, O⟩ = 1 − cos(error / 2)`. Then `g'' = (α² + β²)⟨S, O⟩ − 2⟨S', O'⟩ ≥ −(α² + β²) g`, since
/// `⟨S', O'⟩ ≤ αβ` and `(α − β)² ≥ 0`. A function with `g'' ≥ −m` lies at most `m / 8` above its chord, so
/// `max g ≤ max(g₀, g₁) / (1 − (α² + β²) / 8)`: from the errors at frames follows a bound for all times between. For steps of
/// 10° it costs 0.2 % of the bound; where it is not enough the stretch is halved until it is.
///
/// Which spans can't be admissible is told from the rates that a span from a key may have: the log of each later key over
/// its time, give or take. `exp` never takes points farther apart, and within a ball brings them nearer by
/// `sin(r/2) / (r/2)` at most; boxes around those balls are intersected as keys go by, one from outside, which proves that
/// nothing farther is admissible, one from inside, which proves that a span is.
pub(super) struct TurnRow {
    times: Vec<f64>,
    keys: Vec<Rotor>,
    /// `β²` of the step that ends at each key.
    steps: Vec<f64>,
    bound_rad: f64,
    /// `1 − cos(bound / 2)`.
    limit: f64,
    opened: Opened,
}

/// The spans that start at one key.
#[derive(Default)]
struct Opened {
    from: usize,
    /// For each later key: log over time, whole turn, and the boxes of those before it.
    ends: Vec<SpanEnd>,
    /// Where a span failed last.
    failed_at: usize,
}

#[derive(Clone, Copy)]
struct SpanEnd {
    rate: Bivector,
    turn_rad: f64,
    outside: RateBox,
    inside: RateBox,
}

/// Rates within bounds on each part.
#[derive(Clone, Copy)]
struct RateBox {
    low: [f64; 3],
    high: [f64; 3],
}

impl RateBox {
    const ALL: Self = Self { low: [f64::NEG_INFINITY; 3], high: [f64::INFINITY; 3] };
    const NONE: Self = Self { low: [f64::INFINITY; 3], high: [f64::NEG_INFINITY; 3] };

    fn contains(&self, rate: Bivector) -> bool {
        let parts = [rate.yz, rate.zx, rate.xy];
        (0..3).all(|i| self.low[i] <= parts[i] && parts[i] <= self.high[i])
    }

    fn within(&self, rate: Bivector, radius: f64) -> Self {
        let parts = [rate.yz, rate.zx, rate.xy];
        Self {
            low: std::array::from_fn(|i| self.low[i].max(parts[i] - radius)),
            high: std::array::from_fn(|i| self.high[i].min(parts[i] + radius)),
        }
    }

    fn is_empty(&self) -> bool {
        (0..3).any(|i| self.low[i] > self.high[i])
    }
}

impl TurnRow {
    /// Unit keys at rising times. `bound_rad` from 0 to [`LARGEST_BOUND_RAD`].
    pub(super) fn new(times: Vec<f64>, mut keys: Vec<Rotor>, bound_rad: f64) -> Self {
        for key in 1..keys.len() {
            keys[key] = keys[key].aligned_to(keys[key - 1]);
        }
        let step = |key: usize| match key.checked_sub(1) {
            Some(before) => (0.5 * keys[before].turn_to(keys[key])).powi(2),
            None => 0.0,
        };
        let steps = (0..keys.len()).map(step).collect();
        // A ten-thousandth is left for rounding, here and in files of 32 bits.
        let bound_rad = bound_rad.min(LARGEST_BOUND_RAD) * (1.0 - 1e-4);
        let limit = 2.0 * (0.25 * bound_rad).sin().powi(2);
        Self { times, keys, steps, bound_rad, limit, opened: Opened::default() }
    }

    /// Whether `g` stays within the limit between keys `to - 1` and `to`, halving as often as it takes.
    fn holds_between(&self, span: &Span, to: usize) -> bool {
        const MOST_PIECES: usize = 64;
        let [start, end] = [self.times[to - 1], self.times[to]];
        let (a, b) = (self.keys[to - 1], self.keys[to]);
        let share = self.share_of_square(span, to);
        let mut pieces = 2;
        while pieces <= MOST_PIECES {
            let limit = self.limit * (1.0 - share / (pieces * pieces) as f64);
            let mut worst: f64 = 0.0;
            for piece in 0..=pieces {
                let s = piece as f64 / pieces as f64;
                let own = crate::rotor::slerp_as_signed(a, b, s);
                worst = worst.max(span.miss(start + (end - start) * s, own));
            }
            if worst <= limit {
                return true;
            }
            if worst > self.limit {
                return false;
            }
            pieces *= 2;
        }
        false
    }

    /// `(α² + β²) / 8` for the step that ends at key `to`.
    fn share_of_square(&self, span: &Span, to: usize) -> f64 {
        let along = span.half_rate * (self.times[to] - self.times[to - 1]);
        (along * along + self.steps[to]) / 8.0
    }

    /// Whether the span stays within the bound at all times.
    fn holds(&mut self, to: usize) -> bool {
        let from = self.opened.from;
        let span = Span::new([self.times[from], self.times[to]], self.keys[from], self.keys[to]);
        let miss = |key: usize| span.miss(self.times[key], self.keys[key]);
        let known = self.opened.failed_at;
        if from < known && known < to && miss(known) > self.limit {
            return false;
        }
        let mut before = 0.0;
        for key in from + 1..=to {
            let own = if key == to { 0.0 } else { miss(key) };
            let worst = own.max(before);
            if worst > self.limit {
                self.opened.failed_at = key;
                return false;
            }
            if worst > self.limit * (1.0 - self.share_of_square(&span, key))
                && !self.holds_between(&span, key)
            {
                return false;
            }
            before = own;
        }
        true
    }
}

/// One slerp on the sphere: `start cos φ + across sin φ`.
struct Span {
    start: Rotor,
    across: Rotor,
    start_secs: f64,
    /// Radians on the sphere a second: half the turn rate.
    half_rate: f64,
}

impl Span {
    fn new([start_secs, end_secs]: [f64; 2], start: Rotor, end: Rotor) -> Self {
        let end = end.aligned_to(start);
        let half_turn = 0.5 * start.turn_to(end);
        let sine = half_turn.sin();
        let across = if sine > 0.0 {
            let cosine = half_turn.cos();
            Rotor::new(
                (end.s - start.s * cosine) / sine,
                (end.yz - start.yz * cosine) / sine,
                (end.zx - start.zx * cosine) / sine,
                (end.xy - start.xy * cosine) / sine,
            )
        } else {
            Rotor::new(0.0, 0.0, 0.0, 0.0)
        };
        Self { start, across, start_secs, half_rate: half_turn / (end_secs - start_secs) }
    }

    /// `1 − ⟨S, O⟩` as half the squared distance, which keeps its digits.
    fn miss(&self, secs: f64, own: Rotor) -> f64 {
        let (sine, cosine) = (self.half_rate * (secs - self.start_secs)).sin_cos();
        let part = |start: f64, across: f64, own: f64| (start * cosine + across * sine - own).powi(2);
        0.5 * (part(self.start.s, self.across.s, own.s)
            + part(self.start.yz, self.across.yz, own.yz)
            + part(self.start.zx, self.across.zx, own.zx)
            + part(self.start.xy, self.across.xy, own.xy))
    }
}

impl Row for TurnRow {
    fn len(&self) -> usize {
        self.keys.len()
    }

    fn open(&mut self, from: usize, until: usize) -> usize {
        let back = self.keys[from].reverse();
        let start = self.times[from];
        let farthest_turn = LARGEST_STEP_RAD + self.bound_rad;
        let half = 0.5 * farthest_turn;
        let nearer = half.sin() / half;
        let (mut outside, mut inside) = (RateBox::ALL, RateBox::ALL);
        let mut largest_step: f64 = 0.0;
        self.opened.from = from;
        self.opened.ends.clear();
        let mut farthest = from + 1;
        for key in from + 1..=until {
            // The sign counts: what went round has turned far, though it looks near.
            let log = (back * self.keys[key]).plane_angles_as_signed();
            let turn_rad = log.length();
            let secs = self.times[key] - start;
            let rate = log / secs;
            self.opened.ends.push(SpanEnd { rate, turn_rad, outside, inside });
            farthest = key;
            if turn_rad > farthest_turn {
                break;
            }
            // With a little to spare for the rounding of the logs.
            outside = outside.within(rate, (self.bound_rad * (1.0 + 1e-6) / nearer + 1e-12) / secs);
            largest_step = largest_step.max(self.steps[key].sqrt());
            let shares = largest_step.powi(2) + (largest_step + self.bound_rad).powi(2);
            let sure = 0.99 * (1.0 - shares / 8.0);
            inside = if sure > 0.0 {
                inside.within(rate, self.bound_rad * sure / (3.0_f64.sqrt() * secs))
            } else {
                RateBox::NONE
            };
            if outside.is_empty() {
                break;
            }
        }
        farthest
    }

    fn admits(&mut self, to: usize) -> bool {
        if to == self.opened.from + 1 {
            return true;
        }
        let end = self.opened.ends[to - self.opened.from - 1];
        end.turn_rad <= LARGEST_STEP_RAD
            && end.outside.contains(end.rate)
            && (end.inside.contains(end.rate) || self.holds(to))
    }
}

/// Turns that are held from key to key.
pub(super) struct HeldRow {
    keys: Vec<Rotor>,
    bound_rad: f64,
    from: usize,
}

impl HeldRow {
    /// Unit keys.
    pub(super) fn new(keys: Vec<Rotor>, bound_rad: f64) -> Self {
        Self { keys, bound_rad: bound_rad * (1.0 - 1e-4), from: 0 }
    }
}

impl Row for HeldRow {
    fn len(&self) -> usize {
        self.keys.len()
    }

    fn open(&mut self, from: usize, until: usize) -> usize {
        self.from = from;
        let held = self.keys[from];
        let is_near = |&key: &usize| held.turn_to(self.keys[key]) <= self.bound_rad;
        // The key behind those that the held one stands for.
        ((from + 1..until).take_while(is_near).last().unwrap_or(from) + 1).min(until)
    }

    fn admits(&mut self, _to: usize) -> bool {
        true
    }
}

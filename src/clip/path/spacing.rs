//! How fast a segment moves along its path.

/// The shallowest slope of time along the curve of handles under a pointer: nowhere more than a hundred times as fast as even.
const LEAST_SLOPE: f64 = 0.03;

/// The shallowest slope that is taken at all. Parts of a curve that was cut may reach it.
const LEAST_ACCEPTED: f64 = 0.009;

/// How fast a segment moves along its path: a rising curve from the share of its time to the share of its way.
///
/// It changes when each orientation is reached and never which. Every spacing is a cubic Bezier curve from (0, 0) to (1, 1)
/// with two handles; the named ones have theirs at a third and two thirds of the time, where the curve is a plain cubic.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub enum Spacing {
    /// The way in step with time.
    #[default]
    Even,
    /// Starts from a standstill: the square of the time.
    EaseIn,
    /// Comes to a standstill.
    EaseOut,
    /// Starts and ends at a standstill.
    EaseBoth,
    /// Own handles; made by [`Spacing::handles`] and [`Spacing::nearest`].
    Own(Handles),
}

/// Two handles that were checked, as (share of the time, share of the way).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Handles([[f64; 2]; 2]);

impl Handles {
    /// The two points.
    pub const fn points(self) -> [[f64; 2]; 2] {
        self.0
    }
}

/// Where a segment is on its way, and how that changes with the share of its time.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pace {
    /// Share of the way, 0 to 1.
    pub share: f64,
    /// Its slope: 1 is even, 0 a standstill. Never below 0.
    pub first: f64,
    /// The slope of the slope.
    pub second: f64,
}

/// Handles that make no spacing.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SpacingError {
    /// The way never goes back. Between 0 and 1 handles are always right.
    #[error("expected handles along which the way never goes back, found it at {found:.4} of its even pace")]
    RunsBack {
        /// The least slope of the way along the curve.
        found: f64,
    },
    /// Time has to move on along the whole curve.
    #[error(
        "expected handles along which time moves on, found it at {found:.4} of its even pace; at least {LEAST_ACCEPTED} is needed"
    )]
    TooSteep {
        /// The least slope of time along the curve.
        found: f64,
    },
}

impl Spacing {
    /// Own handles, as (share of the time, share of the way). The way may not go back, and time has to move on: between 0 and 1
    /// the first is always so.
    ///
    /// # Errors
    /// When the way goes back, or time nearly stands still somewhere along the curve.
    pub fn handles(points: [[f64; 2]; 2]) -> Result<Self, SpacingError> {
        let [time, way] = [0, 1].map(|axis| least_slope(points[0][axis], points[1][axis]));
        // Not the other way round, so that what is no number is refused.
        if !(time >= LEAST_ACCEPTED && time.is_finite()) {
            return Err(SpacingError::TooSteep { found: time });
        }
        if !(way >= -1e-9 && way.is_finite()) {
            return Err(SpacingError::RunsBack { found: way });
        }
        Ok(Self::Own(Handles(points)))
    }

    /// The handles nearest to `points` that make a spacing: into the unit square, and then to the straight line in time as
    /// far as is needed. For handles under a pointer.
    pub fn nearest(points: [[f64; 2]; 2]) -> Self {
        let inside = points.map(|point| point.map(|number| number.clamp(0.0, 1.0)));
        let [[x1, y1], [x2, y2]] =
            if inside.as_flattened().iter().all(|number| number.is_finite()) { inside } else { EVEN };
        // The least slope rises on the way to the even thirds, where it is 1.
        let (mut low, mut high) = (0.0, 1.0);
        let toward = |share: f64| [x1 + (EVEN[0][0] - x1) * share, x2 + (EVEN[1][0] - x2) * share];
        let is_sound = |[x1, x2]: [f64; 2]| least_slope(x1, x2) >= LEAST_SLOPE;
        if is_sound([x1, x2]) {
            high = 0.0;
        }
        for _ in 0..50 {
            let middle = f64::midpoint(low, high);
            if is_sound(toward(middle)) {
                high = middle;
            } else {
                low = middle;
            }
        }
        let [x1, x2] = toward(high);
        Self::Own(Handles([[x1, y1], [x2, y2]]))
    }

    /// The handles, as (share of the time, share of the way).
    pub const fn points(self) -> [[f64; 2]; 2] {
        match self {
            Self::Even => EVEN,
            Self::EaseIn => [[THIRD, 0.0], [2.0 * THIRD, THIRD]],
            Self::EaseOut => [[THIRD, 2.0 * THIRD], [2.0 * THIRD, 1.0]],
            Self::EaseBoth => [[THIRD, 0.0], [2.0 * THIRD, 1.0]],
            Self::Own(Handles(points)) => points,
        }
    }

    /// Whether the way goes in step with time.
    pub fn is_even(self) -> bool {
        self == Self::Even
    }

    /// Where the segment is on its way at a share of its time, 0 to 1.
    pub fn pace(self, share: f64) -> Pace {
        let u = share.clamp(0.0, 1.0);
        let plain = |share, first, second| Pace { share, first, second };
        match self {
            Self::Even => plain(share, 1.0, 0.0),
            Self::EaseIn => plain(u * u, 2.0 * u, 2.0),
            Self::EaseOut => plain(u * (2.0 - u), 2.0 - 2.0 * u, -2.0),
            Self::EaseBoth => plain(u * u * (3.0 - 2.0 * u), 6.0 * u * (1.0 - u), 6.0 - 12.0 * u),
            Self::Own(Handles([[x1, y1], [x2, y2]])) => {
                let s = parameter(x1, x2, u);
                let ([x, dx, ddx], [y, dy, ddy]) = (bezier(x1, x2, s), bezier(y1, y2, s));
                // What is left of the time goes on with the slope.
                let first = dy / dx;
                plain(
                    (y + (u - x) * first).clamp(0.0, 1.0),
                    first.max(0.0),
                    (ddy * dx - dy * ddx) / (dx * dx * dx),
                )
            }
        }
    }

    /// The steepest slope of the way, 1 for even, and the share of the time where it is. Exact.
    pub fn steepest(self) -> (f64, f64) {
        let [[x1, y1], [x2, y2]] = self.points();
        // The slope y'/x' is extreme where y'' x' = y' x'', a quadratic: the terms of the third and fourth power cancel.
        let ([a, b, c], [d, e, f]) = (slope_factors(y1, y2), slope_factors(x1, x2));
        let roots = quadratic_roots(b * d - a * e, 2.0 * (c * d - a * f), c * e - b * f);
        let slope = |s: f64| bezier(y1, y2, s)[1] / bezier(x1, x2, s)[1];
        let candidates = roots.into_iter().filter(|root| (0.0..=1.0).contains(root)).chain([0.0, 1.0]);
        let (s, steepest) = candidates
            .map(|s| (s, slope(s)))
            .fold((0.0, f64::NEG_INFINITY), |best, own| if own.1 > best.1 { own } else { best });
        (steepest, bezier(x1, x2, s)[0])
    }

    /// The spacings of the two parts when the segment is cut at a share of its time, above 0 and below 1: each part moves as
    /// the whole did there. The first part covers [`Pace::share`] of the way.
    pub fn split(self, share: f64) -> [Self; 2] {
        if self.is_even() {
            return [self; 2];
        }
        let [p, q] = self.points();
        let s = parameter(p[0], q[0], share);
        // Repeated midpoints (de Casteljau 1959), here at s.
        let between = |a: [f64; 2], b: [f64; 2]| [a[0] + (b[0] - a[0]) * s, a[1] + (b[1] - a[1]) * s];
        let (first, middle, last) = (between([0.0; 2], p), between(p, q), between(q, [1.0; 2]));
        let (left, right) = (between(first, middle), between(middle, last));
        let cut = between(left, right);
        let part = |points: [[f64; 2]; 2], from: [f64; 2], to: [f64; 2]| {
            let fit = |axis: usize, value: f64| {
                let length = to[axis] - from[axis];
                if length > 0.0 { (value - from[axis]) / length } else { 0.0 }
            };
            Self::Own(Handles(points.map(|point| [fit(0, point[0]), fit(1, point[1])])))
        };
        [part([first, left], [0.0; 2], cut), part([right, last], cut, [1.0; 2])]
    }
}

const THIRD: f64 = 1.0 / 3.0;
const EVEN: [[f64; 2]; 2] = [[THIRD, THIRD], [2.0 * THIRD, 2.0 * THIRD]];

/// A Bezier cubic from 0 to 1 with its first and second derivative.
fn bezier(p: f64, q: f64, s: f64) -> [f64; 3] {
    let rest = 1.0 - s;
    let value = s * (3.0 * p * rest * rest + s * (3.0 * q * rest + s));
    let first = 3.0 * (p * rest * rest + 2.0 * (q - p) * s * rest + (1.0 - q) * s * s);
    let second = 6.0 * ((q - 2.0 * p) * rest + (1.0 - 2.0 * q + p) * s);
    [value, first, second]
}

/// The factors of s², s and 1 in the slope of a Bezier cubic from 0 to 1.
fn slope_factors(p: f64, q: f64) -> [f64; 3] {
    [3.0 * (1.0 + 3.0 * (p - q)), 6.0 * (q - 2.0 * p), 3.0 * p]
}

/// The least slope of a Bezier cubic from 0 to 1.
fn least_slope(p: f64, q: f64) -> f64 {
    let [a, b, _] = slope_factors(p, q);
    let turning = (a != 0.0).then(|| -b / (2.0 * a)).filter(|s| (0.0..=1.0).contains(s));
    let slopes = [0.0, 1.0].into_iter().chain(turning).map(|s| bezier(p, q, s)[1]);
    // `min` would pass over what is no number.
    slopes.fold(f64::INFINITY, |least, slope| if slope < least || slope.is_nan() { slope } else { least })
}

fn quadratic_roots(a: f64, b: f64, c: f64) -> [f64; 2] {
    if a.abs() <= 1e-14 * (b.abs() + c.abs()) {
        return [-c / b; 2];
    }
    let root = (b * b - 4.0 * a * c).max(0.0).sqrt();
    // Without taking nearly equal numbers from each other.
    let half = -0.5 * (b + root.copysign(b));
    [half / a, c / half]
}

/// Where along the curve its time is `u`: Newton's steps, halving where one leaves the bracket.
fn parameter(x1: f64, x2: f64, u: f64) -> f64 {
    if u <= 0.0 || u >= 1.0 {
        return u.clamp(0.0, 1.0);
    }
    let (mut low, mut high, mut s) = (0.0, 1.0, u);
    for _ in 0..100 {
        let [x, slope, _] = bezier(x1, x2, s);
        if x < u {
            low = s;
        } else {
            high = s;
        }
        let step = s - (x - u) / slope;
        let next = if step > low && step < high { step } else { f64::midpoint(low, high) };
        if (next - s).abs() <= 1e-16 + 1e-16 * s {
            return next;
        }
        s = next;
    }
    s
}

//! Key times: evenly spaced or listed.

use std::sync::Arc;

/// The times of a row of keys, in seconds, strictly rising.
#[derive(Clone, Debug, PartialEq)]
pub enum Times {
    /// Key `i` at `i * step_secs`.
    Even {
        /// Seconds from key to key, above 0.
        step_secs: f64,
        /// How many keys.
        count: usize,
    },
    /// A time for each key.
    Listed(Arc<[f64]>),
}

/// Where a time falls among keys.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Place {
    /// On a key within the rounding of the time, or before the first or after the last, where the end key is held.
    At(usize),
    /// Between key `.0` and the next, at share `.1` of the way, above 0 and below 1.
    Between(usize, f64),
}

impl Times {
    /// How many keys.
    pub fn len(&self) -> usize {
        match self {
            Self::Even { count, .. } => *count,
            Self::Listed(times) => times.len(),
        }
    }

    /// Whether there are no keys.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The time of a key in seconds.
    ///
    /// # Panics
    /// When a listed key does not exist.
    pub fn at(&self, key: usize) -> f64 {
        match self {
            Self::Even { step_secs, .. } => key as f64 * step_secs,
            Self::Listed(times) => times[key],
        }
    }

    /// First and last time; `None` without keys.
    pub fn span(&self) -> Option<(f64, f64)> {
        (!self.is_empty()).then(|| (self.at(0), self.at(self.len() - 1)))
    }

    /// All times in order.
    pub fn iter(&self) -> impl Iterator<Item = f64> + '_ {
        (0..self.len()).map(|key| self.at(key))
    }

    /// Where `time_secs` falls. `None` without keys. What is no number counts as before the first key.
    pub fn place(&self, time_secs: f64) -> Option<Place> {
        let last = self.len().checked_sub(1)?;
        if time_secs.is_nan() || time_secs <= self.at(0) {
            return Some(Place::At(0));
        }
        if time_secs >= self.at(last) {
            return Some(Place::At(last));
        }
        let before = match self {
            Self::Even { step_secs, .. } => {
                // The quotient may land a hair beside a key that the product hits exactly.
                let guess = ((time_secs / step_secs) as usize).min(last - 1);
                if self.at(guess) > time_secs {
                    guess - 1
                } else if self.at(guess + 1) <= time_secs {
                    guess + 1
                } else {
                    guess
                }
            }
            Self::Listed(times) => times.partition_point(|&time| time <= time_secs) - 1,
        };
        Some(place_between(before, time_secs, self.at(before), self.at(before + 1)))
    }

    /// As [`Times::place`], sooner where `time_secs` falls just after key `near` or the one behind it: for rows of rising times.
    #[inline]
    pub fn place_near(&self, time_secs: f64, near: usize) -> Option<Place> {
        for before in [near, near.saturating_add(1)] {
            if before.saturating_add(1) >= self.len() {
                break;
            }
            let (start, end) = (self.at(before), self.at(before + 1));
            if start <= time_secs && time_secs < end {
                return Some(place_between(before, time_secs, start, end));
            }
        }
        self.place(time_secs)
    }

    /// The key nearest to `time_secs`, 0 without keys.
    pub fn nearest(&self, time_secs: f64) -> usize {
        match self.place(time_secs) {
            None => 0,
            Some(Place::At(key)) => key,
            Some(Place::Between(key, share)) => key + usize::from(share >= 0.5),
        }
    }

    /// The middle of the sorted steps from key to key, in seconds; `None` with fewer than two keys.
    pub fn median_step(&self) -> Option<f64> {
        match self {
            Self::Even { step_secs, count } => (*count > 1).then_some(*step_secs),
            Self::Listed(times) => {
                let mut steps: Vec<f64> = times.windows(2).map(|pair| pair[1] - pair[0]).collect();
                if steps.is_empty() {
                    return None;
                }
                let middle = steps.len() / 2;
                Some(*steps.select_nth_unstable_by(middle, f64::total_cmp).1)
            }
        }
    }
}

/// A share of a time within which it is on a key: `k/60` and `k·(1/60)` differ so much, and either may be the key's or the one asked
/// for.
pub(super) const ROUNDING: f64 = 4.0 * f64::EPSILON;

/// A time between key `before`, at `start` seconds or earlier than the time, and the next, later than it at `end`.
fn place_between(before: usize, time_secs: f64, start: f64, end: f64) -> Place {
    let near = ROUNDING * time_secs.abs();
    let (past, left) = (time_secs - start, end - time_secs);
    if past <= near && past <= left {
        Place::At(before)
    } else if left <= near {
        Place::At(before + 1)
    } else {
        Place::Between(before, past / (end - start))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_frame_time_lands_on_its_own_frame() {
        // 0.008333 is a frame time of real captures; the quotient of time and step is off by a bit for many frames.
        let times = Times::Even { step_secs: 0.008_333, count: 5000 };
        for frame in 0..5000 {
            assert_eq!(times.place(times.at(frame)), Some(Place::At(frame)));
        }
        assert_eq!(times.place(f64::NAN), Some(Place::At(0)));
    }

    #[test]
    fn a_time_told_in_another_way_is_on_the_key() {
        let times = Times::Even { step_secs: 1.0 / 60.0, count: 5000 };
        for frame in 0..5000 {
            assert_eq!(times.place(frame as f64 / 60.0), Some(Place::At(frame)));
        }
        assert!(matches!(times.place(1.0 / 60.0 + 1e-13), Some(Place::Between(1, share)) if share < 1e-11));
    }

    #[test]
    fn a_good_or_a_bad_guess_changes_nothing() {
        let listed: Vec<f64> = (0..50).map(|i| f64::from(i) * 0.1 + f64::from(i % 3) * 0.01).collect();
        for times in [Times::Even { step_secs: 0.008_333, count: 50 }, Times::Listed(listed.into())] {
            for step in -10..2000 {
                let secs = 0.003 * f64::from(step);
                for near in [0, 1, 17, 48, 49, 50, usize::MAX] {
                    assert_eq!(times.place_near(secs, near), times.place(secs), "{secs} near {near}");
                }
            }
        }
    }

    #[test]
    fn listed_times_are_held_at_both_ends() {
        let times = Times::Listed([0.5, 1.0, 2.0].into());
        assert_eq!(times.place(0.0), Some(Place::At(0)));
        assert_eq!(times.place(1.25), Some(Place::Between(1, 0.25)));
        assert_eq!(times.place(9.0), Some(Place::At(2)));
        assert_eq!(times.nearest(1.6), 2);
    }
}

//! Spans of places or sizes: one straight line in place of many.

use glam::DVec3;

use super::spans::Row;

/// Vectors with straight lines between neighbours. The difference of two straight lines is largest at an end, so a bound
/// that holds at keys holds everywhere.
pub(super) struct PlaceRow {
    times: Vec<f64>,
    keys: Vec<DVec3>,
    bound: f64,
    is_held: bool,
    from: usize,
    /// For each later key: its rate, and the box of rates that those before it leave.
    ends: Vec<(DVec3, [DVec3; 2])>,
    failed_at: usize,
}

impl PlaceRow {
    /// Finite keys at rising times, held or with straight lines between. `bound` in their own unit.
    pub(super) fn new(times: Vec<f64>, keys: Vec<DVec3>, bound: f64, is_held: bool) -> Self {
        Self { times, keys, bound: bound * (1.0 - 1e-4), is_held, from: 0, ends: Vec::new(), failed_at: 0 }
    }

    fn holds(&mut self, to: usize) -> bool {
        let (start, end) = (self.keys[self.from], self.keys[to]);
        let secs = self.times[to] - self.times[self.from];
        let misses = |key: usize| {
            let share = (self.times[key] - self.times[self.from]) / secs;
            (start + (end - start) * share).distance(self.keys[key]) > self.bound
        };
        let known = self.failed_at;
        if self.from < known && known < to && misses(known) {
            return false;
        }
        match (self.from + 1..to).find(|&key| misses(key)) {
            Some(key) => {
                self.failed_at = key;
                false
            }
            None => true,
        }
    }
}

impl Row for PlaceRow {
    fn len(&self) -> usize {
        self.keys.len()
    }

    fn open(&mut self, from: usize, until: usize) -> usize {
        self.from = from;
        self.ends.clear();
        let start = self.keys[from];
        if self.is_held {
            let is_near = |&key: &usize| start.distance(self.keys[key]) <= self.bound;
            return ((from + 1..until).take_while(is_near).last().unwrap_or(from) + 1).min(until);
        }
        let mut rates = [DVec3::splat(f64::NEG_INFINITY), DVec3::splat(f64::INFINITY)];
        let mut farthest = from + 1;
        for key in from + 1..=until {
            let secs = self.times[key] - self.times[from];
            let rate = (self.keys[key] - start) / secs;
            self.ends.push((rate, rates));
            farthest = key;
            let radius = DVec3::splat((self.bound * (1.0 + 1e-9) + 1e-15 * start.length()) / secs);
            rates = [rates[0].max(rate - radius), rates[1].min(rate + radius)];
            if rates[0].cmpgt(rates[1]).any() {
                break;
            }
        }
        farthest
    }

    fn admits(&mut self, to: usize) -> bool {
        if self.is_held || to == self.from + 1 {
            return true;
        }
        let (rate, [low, high]) = self.ends[to - self.from - 1];
        rate.cmpge(low).all() && rate.cmple(high).all() && self.holds(to)
    }
}

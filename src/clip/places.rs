//! Where many times fall among keys.

use crate::rotor::batch::Level;

use super::times::{Place, ROUNDING, Times};

/// Orientations that are computed together; few enough to stay in the first cache.
pub(super) const TILE: usize = 128;

/// A number for each of `TILE` places.
pub(super) type Column = [f64; TILE];

/// For each of up to `TILE` times the key at or before it and the share of the way to the next: [`Times::place`], several times
/// as fast.
pub(super) struct Places {
    /// Below the number of keys, and where the share is above 0 below the last.
    pub(super) keys: [usize; TILE],
    /// 0 on a key.
    pub(super) shares: Column,
    pub(super) len: usize,
    /// Whether they stand on one key after the other and halfway between, in turn.
    pub(super) are_double: bool,
}

impl Places {
    pub(super) const fn new() -> Self {
        Self { keys: [0; TILE], shares: [0.0; TILE], len: 0, are_double: false }
    }

    /// Finds those of `times_secs`, of which the first `TILE` count. `times` has keys.
    pub(super) fn find(&mut self, times: &Times, times_secs: &[f64]) {
        self.len = times_secs.len().min(TILE);
        match times {
            // Key numbers that a double holds exactly, with room.
            Times::Even { step_secs, count } if (2..1 << 50).contains(count) => {
                let mut padded = [0.0; TILE];
                padded[..self.len].copy_from_slice(&times_secs[..self.len]);
                let last = (count - 1) as f64;
                let (keys, shares) = (&mut self.keys, &mut self.shares);
                Level::best().run(
                    #[inline(always)]
                    || fill_even(*step_secs, last, &padded, keys, shares),
                );
            }
            _ => self.fill_listed(times, times_secs),
        }
        self.are_double = self.double();
    }

    fn fill_listed(&mut self, times: &Times, times_secs: &[f64]) {
        let mut near = 0;
        for ((key, share), &secs) in self.keys.iter_mut().zip(&mut self.shares).zip(times_secs) {
            (*key, *share) = match times.place_near(secs, near) {
                None => (0, 0.0),
                Some(Place::At(key)) => (key, 0.0),
                Some(Place::Between(key, share)) => (key, share),
            };
            near = *key;
        }
    }

    fn double(&self) -> bool {
        /// All of them together as near a half as [`crate::rotor::batch::slerp_at_middle`] asks of each.
        const NEAR: f64 = 1e-10;
        let (keys, shares) = (&self.keys[..self.len], &self.shares[..self.len]);
        let Some(&first) = keys.first() else { return false };
        // 1 when it begins between two keys.
        let phase = usize::from(shares[0] != 0.0);
        // What is off in any of them; without a branch for each.
        let (mut off, mut past, mut from_half) = (0, 0.0_f64, 0.0_f64);
        for (index, (&key, &share)) in keys.iter().zip(shares).enumerate() {
            let place = index + phase;
            off |= key ^ (first + place / 2);
            let is_between = place % 2 == 1;
            past += if is_between { 0.0 } else { share };
            from_half += if is_between { (share - 0.5).abs() } else { 0.0 };
        }
        off == 0 && past == 0.0 && from_half < NEAR
    }
}

/// Without branches, so that several are found at once.
#[inline(always)]
fn fill_even(step_secs: f64, last: f64, times_secs: &Column, keys: &mut [usize; TILE], shares: &mut Column) {
    /// Adding it leaves no room for a fraction, and the whole number stands in the last bits.
    const TO_WHOLE: f64 = 4_503_599_627_370_496.0; // 2^52
    let (end_secs, rate) = (last * step_secs, 1.0 / step_secs);
    for index in 0..TILE {
        let given = times_secs[index];
        // What is no number fails the comparison and counts as before the first key.
        let secs = if given > 0.0 { given } else { 0.0 };
        let secs = if secs < end_secs { secs } else { end_secs };
        let nearest = (secs * rate + TO_WHOLE) - TO_WHOLE;
        // This may land a hair beside a key that the product hits exactly.
        let before = if nearest * step_secs > secs { nearest - 1.0 } else { nearest };
        let before = if (before + 1.0) * step_secs <= secs { before + 1.0 } else { before };
        let before = if before < last { before } else { last };
        let (start, end) = (before * step_secs, (before + 1.0) * step_secs);
        let (past, left, near) = (secs - start, end - secs, ROUNDING * secs);
        let is_behind = left <= near && left < past;
        let is_on = is_behind || past <= near;
        let before = if is_behind { before + 1.0 } else { before };
        keys[index] = ((before + TO_WHOLE).to_bits() & ((1 << 52) - 1)) as usize;
        shares[index] = if is_on { 0.0 } else { past / (end - start) };
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn many_times_fall_where_each_falls_alone() {
        let listed: Vec<f64> = (0..50).map(|i| f64::from(i) * 0.1 + f64::from(i % 3) * 0.01).collect();
        let mut secs: Vec<f64> = (-10..3000).map(|i| 0.003 * f64::from(i)).collect();
        secs.extend((0..60).map(|i| f64::from(i) * 0.008_333));
        secs.extend((0..60).map(|i| (f64::from(i) * 0.008_333).next_down()));
        secs.extend([f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 1e300, -0.0]);
        for times in [
            Times::Even { step_secs: 0.008_333, count: 50 },
            Times::Even { step_secs: 1.0 / 60.0, count: 2 },
            Times::Even { step_secs: 0.1, count: 1 },
            Times::Listed(listed.into()),
        ] {
            for secs in secs.chunks(TILE - 1) {
                let mut found = Places::new();
                found.find(&times, secs);
                assert_eq!(found.len, secs.len());
                for (index, &secs) in secs.iter().enumerate() {
                    let place = match times.place(secs) {
                        Some(Place::At(key)) => (key, 0.0),
                        Some(Place::Between(key, share)) => (key, share),
                        None => unreachable!(),
                    };
                    assert_eq!((found.keys[index], found.shares[index]), place, "{secs} in {times:?}");
                }
            }
        }
    }

    #[test]
    fn twice_the_rate_is_told() {
        let times = Times::Even { step_secs: 1.0 / 60.0, count: 500 };
        let are_double = |rate: f64, start: i32| {
            let secs: Vec<f64> = (start..start + TILE as i32).map(|i| f64::from(i) / rate).collect();
            let mut places = Places::new();
            places.find(&times, &secs);
            places.are_double
        };
        assert!(are_double(120.0, 0) && are_double(120.0, 333));
        assert!(!are_double(119.999, 333) && !are_double(60.0, 0) && !are_double(240.0, 1));
    }
}

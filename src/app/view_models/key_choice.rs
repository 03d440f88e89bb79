//! Which keys are chosen.

use std::collections::BTreeMap;

/// Chosen keys of some joints, told by their times: a key that was moved, or that a pass before left out, is then simply
/// not there.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct KeyChoice {
    /// For each joint times in seconds, rising.
    rows: BTreeMap<usize, Vec<f64>>,
}

/// Keys nearer to each other than this are one: the times would be one in a file of 32 bits.
const SAME_SECS: f64 = 1e-5;

impl KeyChoice {
    /// One key.
    pub fn one(joint: usize, secs: f64) -> Self {
        let mut choice = Self::default();
        choice.add(joint, [secs]);
        choice
    }

    /// Whether nothing is chosen.
    pub fn is_empty(&self) -> bool {
        self.rows.is_empty()
    }

    /// How many keys.
    pub fn len(&self) -> usize {
        self.rows.values().map(Vec::len).sum()
    }

    /// The joints, rising, with the times of their keys in seconds, rising.
    pub fn rows(&self) -> impl Iterator<Item = (usize, &[f64])> {
        self.rows.iter().map(|(&joint, times)| (joint, times.as_slice()))
    }

    /// The times of a joint's keys in seconds, rising.
    pub fn times(&self, joint: usize) -> &[f64] {
        self.rows.get(&joint).map_or(&[], Vec::as_slice)
    }

    /// Whether a key is chosen.
    pub fn has(&self, joint: usize, secs: f64) -> bool {
        let times = self.times(joint);
        let from = times.partition_point(|&own| own < secs - SAME_SECS);
        times.get(from).is_some_and(|&own| own <= secs + SAME_SECS)
    }

    /// Adds keys of a joint.
    pub fn add(&mut self, joint: usize, secs: impl IntoIterator<Item = f64>) {
        let times = self.rows.entry(joint).or_default();
        times.extend(secs);
        times.sort_by(f64::total_cmp);
        times.dedup_by(|later, earlier| *later - *earlier <= SAME_SECS);
        if times.is_empty() {
            self.rows.remove(&joint);
        }
    }

    /// Adds all keys of another choice.
    pub fn add_all(&mut self, other: &Self) {
        for (joint, times) in other.rows() {
            self.add(joint, times.iter().copied());
        }
    }

    /// Adds a key, or takes it out where it is chosen.
    pub fn toggle(&mut self, joint: usize, secs: f64) {
        if !self.has(joint, secs) {
            self.add(joint, [secs]);
            return;
        }
        if let Some(times) = self.rows.get_mut(&joint) {
            times.retain(|own| (own - secs).abs() > SAME_SECS);
            if times.is_empty() {
                self.rows.remove(&joint);
            }
        }
    }

    /// The first and the last time in seconds.
    pub fn span(&self) -> Option<[f64; 2]> {
        let first = self.rows.values().filter_map(|times| times.first()).copied().reduce(f64::min)?;
        let last = self.rows.values().filter_map(|times| times.last()).copied().reduce(f64::max)?;
        Some([first, last])
    }

    /// The keys at other times.
    #[must_use]
    pub fn moved(&self, to: impl Fn(f64) -> f64) -> Self {
        let mut moved = Self::default();
        for (joint, times) in self.rows() {
            moved.add(joint, times.iter().map(|&secs| to(secs).max(0.0)));
        }
        moved
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn keys_are_added_toggled_and_moved() {
        let mut choice = KeyChoice::one(3, 0.5);
        choice.add(3, [0.25, 0.5]);
        choice.toggle(1, 2.0);
        assert_eq!((choice.len(), choice.span()), (3, Some([0.25, 2.0])));
        assert!(choice.has(3, 0.5 + 1e-7) && !choice.has(3, 0.501) && !choice.has(2, 0.5));
        choice.toggle(3, 0.5);
        choice.toggle(3, 0.25);
        assert_eq!(choice.rows().map(|(joint, _)| joint).collect::<Vec<_>>(), [1]);
        assert_eq!(choice.moved(|secs| secs - 3.0).times(1), [0.0]);
    }
}

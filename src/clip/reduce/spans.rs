//! The fewest keys: a shortest path over admissible spans.

use std::collections::BTreeMap;

/// A row of keys, between any two of which a span may or may not stand for all that lies between.
pub(super) trait Row {
    /// How many keys.
    fn len(&self) -> usize;

    /// Turns to the spans that start at key `from`. Gives a key at most `until` beyond which none of them is admissible; it
    /// is behind `from`.
    fn open(&mut self, from: usize, until: usize) -> usize;

    /// Whether the span from the key opened last to key `to` is admissible. The span to the next key always is.
    fn admits(&mut self, to: usize) -> bool;
}

/// How many ends of spans of the same count are followed, the farthest first.
///
/// Without this limit the search is exact. A span may be admissible and its first half not, so in theory the best way may
/// lead over a near end; on real clips 24 ends lose nothing measurable (see the test of the suite `reduce`).
pub(super) const MOST_ENDS: usize = 24;

/// The fewest keys of `row` from its first to its last, both included, so that each span between neighbours is admissible.
/// Keys of `keep` (rising) are among them.
pub(super) fn fewest(row: &mut dyn Row, keep: &[usize], most_ends: usize) -> Vec<usize> {
    let Some(last) = row.len().checked_sub(1) else { return Vec::new() };
    let mut found = vec![0];
    let inner = keep.iter().copied().filter(|&key| 0 < key && key < last);
    for end in inner.chain([last]) {
        let start = found.last().copied().unwrap_or(0);
        if end > start {
            stretch(row, [start, end], most_ends, &mut found);
        }
    }
    found
}

/// An end of a chain of spans: its key, and where in the list the chain came from.
#[derive(Clone, Copy)]
struct End {
    key: usize,
    before: usize,
}

/// Adds the keys from the one behind `start` to `end`.
fn stretch(row: &mut dyn Row, [start, end]: [usize; 2], most_ends: usize, found: &mut Vec<usize>) {
    let mut ends = vec![End { key: start, before: usize::MAX }];
    // Those reached with the same count of spans.
    let mut layer = 0..1;
    loop {
        // Key and where it was reached from.
        let mut next: BTreeMap<usize, usize> = BTreeMap::new();
        for place in layer.clone().rev() {
            let from = ends[place].key;
            let farthest = row.open(from, end);
            if farthest == end && row.admits(end) {
                let mut keys = vec![end];
                let mut at = place;
                while ends[at].key > start {
                    keys.push(ends[at].key);
                    at = ends[at].before;
                }
                found.extend(keys.into_iter().rev());
                return;
            }
            for to in (from + 1..=farthest.min(end - 1)).rev() {
                let is_full = next.len() >= most_ends;
                if is_full && next.first_key_value().is_some_and(|(&nearest, _)| to <= nearest) {
                    break;
                }
                if !next.contains_key(&to) && row.admits(to) {
                    next.insert(to, place);
                    if is_full {
                        next.pop_first();
                    }
                }
            }
        }
        layer = ends.len()..ends.len() + next.len();
        ends.extend(next.into_iter().map(|(key, before)| End { key, before }));
    }
}

/// Several rows of equal length that take their keys together.
pub(super) struct Together<'a>(pub(super) Vec<Box<dyn Row + Send + 'a>>);

impl Row for Together<'_> {
    fn len(&self) -> usize {
        self.0.first().map_or(0, |row| row.len())
    }

    fn open(&mut self, from: usize, until: usize) -> usize {
        self.0.iter_mut().fold(until, |until, row| row.open(from, until))
    }

    fn admits(&mut self, to: usize) -> bool {
        // The row that refused last is asked first next time.
        match self.0.iter_mut().position(|row| !row.admits(to)) {
            Some(refusing) => {
                self.0[..=refusing].rotate_right(1);
                false
            }
            None => true,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Spans admissible by a table.
    struct Table {
        count: usize,
        spans: Vec<[usize; 2]>,
        from: usize,
    }

    impl Row for Table {
        fn len(&self) -> usize {
            self.count
        }

        fn open(&mut self, from: usize, until: usize) -> usize {
            self.from = from;
            until
        }

        fn admits(&mut self, to: usize) -> bool {
            to == self.from + 1 || self.spans.contains(&[self.from, to])
        }
    }

    #[test]
    fn a_short_first_span_may_be_the_way_to_fewest_keys() {
        // The farthest first span, to 5, leads nowhere; the one to 2 jumps to the end.
        let mut row = Table { count: 9, spans: vec![[0, 5], [0, 2], [2, 8]], from: 0 };
        assert_eq!(fewest(&mut row, &[], 8), [0, 2, 8]);
        assert_eq!(fewest(&mut row, &[1, 4], 8), [0, 1, 2, 3, 4, 5, 6, 7, 8]);
        assert_eq!(fewest(&mut Table { count: 1, spans: vec![], from: 0 }, &[], 8), [0]);
        assert_eq!(fewest(&mut Table { count: 0, spans: vec![], from: 0 }, &[], 8), [0; 0]);
    }
}

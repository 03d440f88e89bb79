//! A joint's poses in a row, made as they are looked at.

use std::cell::OnceCell;
use std::ops::Range;

use crate::rotor::Rotor;

use super::scan::Scan;

/// Items that are made together.
const CHUNK: usize = 128;

/// A row that is made in pieces, each when it is first looked at.
#[derive(Debug)]
pub(super) struct Lazy<T> {
    chunks: Vec<OnceCell<Box<[T]>>>,
    len: usize,
}

impl<T: Copy> Lazy<T> {
    pub(super) fn new(len: usize) -> Self {
        Self { chunks: (0..len.div_ceil(CHUNK)).map(|_| OnceCell::new()).collect(), len }
    }

    /// An item; `make` gives those of a range.
    #[inline]
    pub(super) fn get(&self, index: usize, make: impl FnOnce(Range<usize>) -> Box<[T]>) -> T {
        let start = index - index % CHUNK;
        self.chunks[index / CHUNK].get_or_init(|| make(start..(start + CHUNK).min(self.len)))[index - start]
    }
}

/// Unit poses of a joint's keys, of neighbouring signs; where the file has none, the one before, and before the first the first.
#[derive(Debug)]
pub(super) struct Poses<'a> {
    scan: Scan<'a>,
    /// Keys that are no rotation.
    broken: Vec<usize>,
    /// Keys from which on the sign is the other one of the stored numbers' again.
    turned: Vec<usize>,
    first_sound: Option<usize>,
    made: Lazy<Rotor>,
}

impl<'a> Poses<'a> {
    pub(super) fn new(scan: Scan<'a>) -> Self {
        let count = scan.keys.len();
        let (mut broken, mut turned) = (Vec::new(), Vec::new());
        // The last sound key, and whether its sign is the other one.
        let mut sound: Option<usize> = None;
        let mut is_turned = false;
        let mut at_once: Option<usize> = None;
        for key in scan.outline().stepping() {
            let Some(own) = scan.unit(key) else {
                broken.push(key);
                at_once = Some(key);
                continue;
            };
            // The keys that were passed over are sound and go on with the same sign.
            let before = match at_once {
                Some(last) if last + 1 == key => sound,
                _ => key.checked_sub(1),
            };
            (at_once, sound) = (Some(key), Some(key));
            let Some(near) = before.and_then(|near| scan.unit(near)) else { continue };
            let dot = if is_turned { -near.dot(own) } else { near.dot(own) };
            let turns = dot < 0.0;
            if turns != is_turned {
                is_turned = turns;
                turned.push(key);
            }
        }
        let first_sound = (0..count).find(|&key| broken.get(key) != Some(&key));
        Self { scan, broken, turned, first_sound, made: Lazy::new(count) }
    }

    pub(super) fn len(&self) -> usize {
        self.scan.keys.len()
    }

    /// The pose at a key.
    ///
    /// # Panics
    /// When there is no such key.
    #[inline]
    pub(super) fn at(&self, key: usize) -> Rotor {
        self.made.get(key, |keys| {
            let mut last = None;
            let each = keys.map(|key| {
                let own = match (last, self.is_broken(key)) {
                    (Some(last), true) => last,
                    _ => self.make(key),
                };
                last = Some(own);
                own
            });
            each.collect()
        })
    }

    fn is_broken(&self, key: usize) -> bool {
        self.broken.binary_search(&key).is_ok()
    }

    fn make(&self, key: usize) -> Rotor {
        let key = self.sound(key);
        let own = key.and_then(|key| self.scan.unit(key)).unwrap_or(Rotor::IDENTITY);
        let turns = key.map_or(0, |key| self.turned.partition_point(|turned| *turned <= key));
        if turns % 2 == 1 { -own } else { own }
    }

    /// The nearest sound key at `key` or before, else the first.
    fn sound(&self, key: usize) -> Option<usize> {
        let Ok(last) = self.broken.binary_search(&key) else { return Some(key) };
        // Back through the run of broken keys.
        let mut first = last;
        while first > 0 && self.broken[first - 1] + 1 == self.broken[first] {
            first -= 1;
        }
        self.broken[first].checked_sub(1).or(self.first_sound)
    }
}

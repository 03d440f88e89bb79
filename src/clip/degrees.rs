//! The stored angles of a joint, held in as little memory as their file gives reason for.

use std::fmt;
use std::ops::Deref;
use std::sync::{Arc, OnceLock};

/// Degrees as a file has them, a triple for each key; to be read like a slice, shared when cloned.
///
/// A number of one digit takes two bytes of text, a triple of floats twenty-four. So whole numbers are held as such, and of a joint with one
/// or two axes those alone; the triples are made when they are first asked for. Not one bit of a number is lost.
#[derive(Clone)]
pub struct Degrees(Arc<Inner>);

struct Inner {
    held: Held,
    triples: OnceLock<Vec<[f64; 3]>>,
}

enum Held {
    Triples(Vec<[f64; 3]>),
    Whole { axes: usize, numbers: Vec<i16> },
    Few { axes: usize, numbers: Vec<f64> },
}

impl Held {
    fn len(&self) -> usize {
        match self {
            Self::Triples(triples) => triples.len(),
            Self::Whole { axes, numbers } => numbers.len() / axes,
            Self::Few { axes, numbers } => numbers.len() / axes,
        }
    }
}

impl Degrees {
    /// How many triples. They need not be made for it.
    pub fn len(&self) -> usize {
        self.0.held.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Whether both share their numbers.
    pub fn is_same(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.0, &other.0)
    }

    /// The triple of a key, without making all the others.
    ///
    /// # Panics
    /// When the key does not exist.
    pub fn triple(&self, key: usize) -> [f64; 3] {
        match &self.0.held {
            Held::Triples(triples) => triples[key],
            Held::Whole { axes, numbers } => {
                filled_up(numbers[key * axes..(key + 1) * axes].iter().map(|&own| f64::from(own)))
            }
            Held::Few { axes, numbers } => filled_up(numbers[key * axes..(key + 1) * axes].iter().copied()),
        }
    }

    /// All triples, to be changed: copied first where somebody else has them too.
    pub fn make_mut(&mut self) -> &mut [[f64; 3]] {
        let is_own = Arc::get_mut(&mut self.0).is_some_and(|own| matches!(own.held, Held::Triples(_)));
        if !is_own {
            *self = (0..self.len()).map(|key| self.triple(key)).collect();
        }
        match Arc::get_mut(&mut self.0) {
            Some(Inner { held: Held::Triples(triples), .. }) => triples,
            // Just made its own.
            _ => &mut [],
        }
    }

    fn of(held: Held) -> Self {
        Self(Arc::new(Inner { held, triples: OnceLock::new() }))
    }
}

/// What the file lacks is 0.
fn filled_up(own: impl Iterator<Item = f64>) -> [f64; 3] {
    let mut triple = [0.0; 3];
    for (angle, own) in triple.iter_mut().zip(own) {
        *angle = own;
    }
    triple
}

impl Deref for Degrees {
    type Target = [[f64; 3]];

    fn deref(&self) -> &[[f64; 3]] {
        match &self.0.held {
            Held::Triples(triples) => triples,
            Held::Whole { .. } | Held::Few { .. } => {
                self.0.triples.get_or_init(|| (0..self.len()).map(|key| self.triple(key)).collect())
            }
        }
    }
}

impl From<Vec<[f64; 3]>> for Degrees {
    fn from(triples: Vec<[f64; 3]>) -> Self {
        Self::of(Held::Triples(triples))
    }
}

impl From<&[[f64; 3]]> for Degrees {
    fn from(triples: &[[f64; 3]]) -> Self {
        Self::of(Held::Triples(triples.into()))
    }
}

impl<const N: usize> From<[[f64; 3]; N]> for Degrees {
    fn from(triples: [[f64; 3]; N]) -> Self {
        Self::of(Held::Triples(triples.into()))
    }
}

impl FromIterator<[f64; 3]> for Degrees {
    fn from_iter<I: IntoIterator<Item = [f64; 3]>>(triples: I) -> Self {
        Self::of(Held::Triples(triples.into_iter().collect()))
    }
}

impl PartialEq for Degrees {
    fn eq(&self, other: &Self) -> bool {
        self[..] == other[..]
    }
}

impl fmt::Debug for Degrees {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        self[..].fmt(formatter)
    }
}

/// [`Degrees`] as a reader comes by them.
#[derive(Clone, Debug)]
pub(super) struct GrowingDegrees {
    axes: usize,
    capacity: usize,
    held: GrowingHeld,
}

#[derive(Clone, Debug)]
enum GrowingHeld {
    Whole(Vec<i16>),
    Few(Vec<f64>),
    Triples(Vec<[f64; 3]>),
}

impl GrowingDegrees {
    /// None yet, of `axes` angles a key; room for `capacity` keys.
    pub(super) fn new(axes: usize, capacity: usize) -> Self {
        Self { axes: axes.clamp(1, 3), capacity, held: GrowingHeld::Whole(Vec::new()) }
    }

    /// Makes room for `capacity` keys in all, as soon as it shows how they are held.
    pub(super) fn reserve(&mut self, capacity: usize) {
        self.capacity = self.capacity.max(capacity);
        if self.bytes() > 0 {
            self.make_room();
        }
    }

    /// Bytes that are held.
    pub(super) fn bytes(&self) -> usize {
        match &self.held {
            GrowingHeld::Whole(numbers) => numbers.capacity() * size_of::<i16>(),
            GrowingHeld::Few(numbers) => numbers.capacity() * size_of::<f64>(),
            GrowingHeld::Triples(triples) => triples.capacity() * size_of::<[f64; 3]>(),
        }
    }

    /// Whether all numbers so far are held as whole ones.
    pub(super) fn holds_whole(&self) -> bool {
        matches!(self.held, GrowingHeld::Whole(_))
    }

    /// Bytes of a key once triples are added that are, or are not, all whole numbers.
    pub(super) fn row_bytes(&self, are_whole: bool) -> usize {
        match &self.held {
            GrowingHeld::Whole(_) if are_whole => self.axes * size_of::<i16>(),
            GrowingHeld::Whole(_) | GrowingHeld::Few(_) | GrowingHeld::Triples(_) => {
                self.axes * size_of::<f64>()
            }
        }
    }

    fn make_room(&mut self) {
        let numbers = self.capacity * self.axes;
        match &mut self.held {
            GrowingHeld::Whole(own) => own.reserve_exact(numbers.saturating_sub(own.len())),
            GrowingHeld::Few(own) => own.reserve_exact(numbers.saturating_sub(own.len())),
            GrowingHeld::Triples(own) => own.reserve_exact(self.capacity.saturating_sub(own.len())),
        }
    }

    /// Adds `count` triples, each as `triple` makes it, and gives them back; beyond the axes they are 0. Those that are not held as
    /// such lie in `room`.
    pub(super) fn extend_with<'own>(
        &'own mut self,
        count: usize,
        triple: impl Fn(usize) -> [f64; 3],
        room: &'own mut Vec<[f64; 3]>,
    ) -> &'own [[f64; 3]] {
        match self.held {
            GrowingHeld::Triples(ref mut own) => {
                let start = own.len();
                own.extend((0..count).map(triple));
                &own[start..]
            }
            GrowingHeld::Whole(_) | GrowingHeld::Few(_) => {
                room.clear();
                room.extend((0..count).map(triple));
                self.extend(room);
                room
            }
        }
    }

    /// Adds triples. Beyond the axes they are 0.
    pub(super) fn extend(&mut self, triples: &[[f64; 3]]) {
        let axes = self.axes;
        if let GrowingHeld::Whole(numbers) = &self.held
            && triples.iter().flat_map(|triple| &triple[..axes]).any(|&angle| whole(angle).is_none())
        {
            self.held = if axes == 3 {
                let count = numbers.len() / axes;
                let mut own = Vec::with_capacity(self.capacity.max(count));
                let triple = |old: &[i16]| filled_up(old.iter().map(|&number| f64::from(number)));
                own.extend(numbers.chunks_exact(axes).map(triple));
                GrowingHeld::Triples(own)
            } else {
                let mut own = Vec::with_capacity(self.capacity * axes);
                own.extend(numbers.iter().map(|&number| f64::from(number)));
                GrowingHeld::Few(own)
            };
        }
        if self.bytes() == 0 {
            self.make_room();
        }
        match &mut self.held {
            GrowingHeld::Whole(numbers) => {
                numbers.extend(triples.iter().flat_map(|triple| &triple[..axes]).copied().filter_map(whole));
            }
            GrowingHeld::Few(numbers) => numbers.extend(triples.iter().flat_map(|triple| &triple[..axes])),
            GrowingHeld::Triples(own) => own.extend_from_slice(triples),
        }
    }

    /// All of them.
    pub(super) fn finish(self) -> Degrees {
        let axes = self.axes;
        Degrees::of(match self.held {
            GrowingHeld::Whole(mut numbers) => {
                give_back(&mut numbers);
                Held::Whole { axes, numbers }
            }
            GrowingHeld::Few(mut numbers) => {
                give_back(&mut numbers);
                Held::Few { axes, numbers }
            }
            GrowingHeld::Triples(mut triples) => {
                give_back(&mut triples);
                Held::Triples(triples)
            }
        })
    }
}

/// Whether [`Degrees`] hold an angle as a whole number.
pub fn is_whole(angle: f64) -> bool {
    whole(angle).is_some()
}

/// The whole number that `angle` is to the bit; -0 is none.
fn whole(angle: f64) -> Option<i16> {
    let number = angle as i16;
    (f64::from(number).to_bits() == angle.to_bits()).then_some(number)
}

/// Gives room back where there is much more than was needed.
pub(super) fn give_back<T>(items: &mut Vec<T>) {
    if items.capacity() - items.len() > items.len() / 8 {
        items.shrink_to_fit();
    }
}

/// A shared slice that is written where it will stay: a list that is copied into one at the end would for a time be there
/// twice.
#[derive(Clone, Debug)]
pub struct Growing<T> {
    items: Arc<[T]>,
    len: usize,
    fill: T,
}

impl<T: Copy> Growing<T> {
    /// Nothing yet, with room for `capacity` items. `fill` may be any item; it stands in what is not used yet.
    pub fn new(fill: T, capacity: usize) -> Self {
        Self { items: std::iter::repeat_n(fill, capacity).collect(), len: 0, fill }
    }

    /// Items that there is room for.
    pub fn capacity(&self) -> usize {
        self.items.len()
    }

    /// Makes room for `capacity` items in all.
    pub fn reserve(&mut self, capacity: usize) {
        if capacity > self.items.len() {
            let rest = std::iter::repeat_n(self.fill, capacity - self.len);
            self.items = self.items[..self.len].iter().copied().chain(rest).collect();
        }
    }

    /// The next `count` items, to be written.
    pub fn next(&mut self, count: usize) -> &mut [T] {
        let (start, end) = (self.len, self.len + count);
        if end > self.items.len() {
            self.reserve(end.max(self.items.len() + self.items.len() / 2));
        }
        self.len = end;
        // Nobody else has it before it is finished; a copy of this list, if there is one, keeps its own.
        if Arc::get_mut(&mut self.items).is_none() {
            self.items = self.items.iter().copied().collect();
        }
        Arc::get_mut(&mut self.items).map_or(&mut [], |items| &mut items[start..end])
    }

    /// All items.
    pub fn finish(self) -> Arc<[T]> {
        if self.len == self.items.len() { self.items } else { self.items[..self.len].into() }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Grown in portions, the numbers are those that went in, bit for bit; `held` is what a key takes.
    #[track_caller]
    fn check(axes: usize, triples: &[[f64; 3]], held: usize) {
        for portion in [1, 3, 64] {
            let mut growing = GrowingDegrees::new(axes, 0);
            let mut room = Vec::new();
            growing.reserve(triples.len());
            for part in triples.chunks(portion) {
                assert_eq!(growing.extend_with(part.len(), |key| part[key], &mut room).len(), part.len());
            }
            assert_eq!(growing.bytes(), held * triples.len());
            let degrees = growing.finish();
            assert_eq!(degrees.len(), triples.len());
            let bits = |triple: [f64; 3]| triple.map(f64::to_bits);
            for (key, own) in triples.iter().enumerate() {
                assert_eq!(bits(degrees.triple(key)), bits(*own), "key {key} in portions of {portion}");
                assert_eq!(bits(degrees[key]), bits(*own), "key {key} in portions of {portion}");
            }
        }
    }

    #[test]
    fn a_change_is_seen_by_its_owner_alone() {
        let mut growing = GrowingDegrees::new(2, 0);
        growing.extend(&[[5.0, 6.0, 0.0], [7.0, 8.0, 0.0]]);
        let few = growing.finish();
        let mut own = few.clone();
        own.make_mut()[1][0] = 9.5;
        assert_eq!((few[1], own[1]), ([7.0, 8.0, 0.0], [9.5, 8.0, 0.0]));
        let place = own.as_ptr();
        own.make_mut()[0][0] = -0.0;
        assert_eq!(own.as_ptr(), place, "nobody else has it: changed in place");
        let shared = own.clone();
        own.make_mut()[0][0] = 1.0;
        assert!(shared[0][0].is_sign_negative() && own[0][0] == 1.0 && own.as_ptr() != place);
    }

    #[test]
    fn numbers_come_back_to_the_bit_however_they_are_held() {
        let [far, near] = [f64::from(i16::MIN), f64::from(i16::MAX)];
        check(3, &[[0.0, 9.0, -9.0], [far, near, 1.0]], 6);
        check(3, &[[0.0, 9.0, 1.0], [2.0, 3.0, -0.0]], 24);
        check(3, &[[0.0, 9.0, 1.0], [2.0, near + 1.0, 0.0]], 24);
        check(3, &[[f64::NAN, 0.5, 1.0]], 24);
        check(2, &[[5.0, 6.0, 0.0], [7.0, 8.0, 0.0]], 4);
        check(2, &[[5.0, 6.0, 0.0], [0.5, 8.0, 0.0]], 16);
        check(1, &[[5.0, 0.0, 0.0], [-7.0, 0.0, 0.0], [1e-9, 0.0, 0.0]], 8);
    }
}

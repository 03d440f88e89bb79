//! The vectors of a track's keys, held in as little memory as their file gives reason for.

use std::fmt;
use std::ops::Deref;
use std::sync::{Arc, OnceLock};

use glam::DVec3;

use super::degrees::{Degrees, GrowingDegrees};

/// The vectors of a track's keys; to be read like a slice, shared when cloned.
///
/// Where a file moves a joint along one or two axes alone, no more than these numbers are held; the vectors are made when they are
/// first read as a slice. [`VectorKeys::vector`] makes a single one and keeps nothing.
#[derive(Clone)]
pub struct VectorKeys(Arc<Inner>);

struct Inner {
    stored: OnceLock<Arc<[DVec3]>>,
    few: Option<Few>,
}

/// Numbers along some of the axes.
struct Few {
    numbers: Degrees,
    axes: FewAxes,
}

/// Which of a key's numbers goes along each axis; what an axis has that none goes along.
#[derive(Clone, Copy, Debug)]
struct FewAxes {
    places: [Option<usize>; 3],
    rest: [f64; 3],
}

impl Few {
    fn vector(&self, key: usize) -> DVec3 {
        let numbers = self.numbers.triple(key);
        let FewAxes { places, rest } = self.axes;
        DVec3::from_array(std::array::from_fn(|axis| places[axis].map_or(rest[axis], |place| numbers[place])))
    }
}

impl VectorKeys {
    /// How many. They need not be made for it.
    pub fn len(&self) -> usize {
        let few = || self.0.few.as_ref().map_or(0, |few| few.numbers.len());
        self.0.stored.get().map_or_else(few, |stored| stored.len())
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The vector of a key, without making all the others.
    ///
    /// # Panics
    /// When the key does not exist.
    pub fn vector(&self, key: usize) -> DVec3 {
        match (self.0.stored.get(), &self.0.few) {
            (None, Some(few)) => few.vector(key),
            _ => self[key],
        }
    }
}

impl Deref for VectorKeys {
    type Target = [DVec3];

    fn deref(&self) -> &[DVec3] {
        self.0.stored.get_or_init(|| (0..self.len()).map(|key| self.vector(key)).collect())
    }
}

impl From<Arc<[DVec3]>> for VectorKeys {
    fn from(stored: Arc<[DVec3]>) -> Self {
        Self(Arc::new(Inner { stored: OnceLock::from(stored), few: None }))
    }
}

impl From<Vec<DVec3>> for VectorKeys {
    fn from(stored: Vec<DVec3>) -> Self {
        Arc::<[DVec3]>::from(stored).into()
    }
}

impl From<&[DVec3]> for VectorKeys {
    fn from(stored: &[DVec3]) -> Self {
        Arc::<[DVec3]>::from(stored).into()
    }
}

impl<const N: usize> From<[DVec3; N]> for VectorKeys {
    fn from(stored: [DVec3; N]) -> Self {
        Arc::<[DVec3]>::from(stored).into()
    }
}

impl FromIterator<DVec3> for VectorKeys {
    fn from_iter<I: IntoIterator<Item = DVec3>>(vectors: I) -> Self {
        vectors.into_iter().collect::<Arc<[DVec3]>>().into()
    }
}

impl PartialEq for VectorKeys {
    fn eq(&self, other: &Self) -> bool {
        self[..] == other[..]
    }
}

impl fmt::Debug for VectorKeys {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        self[..].fmt(formatter)
    }
}

/// [`VectorKeys`] along one or two axes as a reader comes by them.
#[derive(Clone, Debug)]
pub struct FewAxesRows {
    axes: FewAxes,
    numbers: GrowingDegrees,
}

impl FewAxesRows {
    /// None yet. `has` says along which axes they move; along the others they stay at `rest`.
    pub fn new(has: [bool; 3], rest: [f64; 3]) -> Self {
        let mut count = 0;
        let places = has.map(|has| {
            has.then(|| {
                count += 1;
                count - 1
            })
        });
        Self { axes: FewAxes { places, rest }, numbers: GrowingDegrees::new(count, 0) }
    }

    /// Makes room for `capacity` rows in all.
    pub fn reserve(&mut self, capacity: usize) {
        self.numbers.reserve(capacity);
    }

    /// Whether all numbers so far are held as whole ones.
    pub fn holds_whole(&self) -> bool {
        self.numbers.holds_whole()
    }

    /// Bytes that a row takes once rows are added that are, or are not, all whole numbers.
    pub fn row_bytes(&self, are_whole: bool) -> usize {
        self.numbers.row_bytes(are_whole)
    }

    /// Adds a row: its numbers along the axes that it has, in their order.
    pub fn push(&mut self, own: impl IntoIterator<Item = f64>) {
        let mut triple = [0.0; 3];
        for (number, own) in triple.iter_mut().zip(own) {
            *number = own;
        }
        self.numbers.extend(&[triple]);
    }

    /// All of them.
    pub fn finish(self) -> VectorKeys {
        let few = Few { numbers: self.numbers.finish(), axes: self.axes };
        VectorKeys(Arc::new(Inner { stored: OnceLock::new(), few: Some(few) }))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn few_axes_are_put_among_those_at_rest() {
        let rest = [7.0, 8.0, 9.0];
        let mut rows = FewAxesRows::new([true, false, true], rest);
        rows.reserve(3);
        for own in [[1.0, 2.0], [3.0, -4.5], [f64::NAN, 5.0]] {
            rows.push(own);
        }
        let keys = rows.finish();
        let expected = [DVec3::new(1.0, 8.0, 2.0), DVec3::new(3.0, 8.0, -4.5)];
        assert_eq!((keys.len(), keys.vector(0), keys.vector(1)), (3, expected[0], expected[1]));
        assert!(keys.vector(2).x.is_nan() && keys.vector(2).y == 8.0);
        assert!(keys.0.stored.get().is_none(), "nothing was made for it");
        assert_eq!(keys[..2], expected);
        assert_eq!(keys.vector(1), expected[1]);
        let mut rows = FewAxesRows::new([false, true, false], rest);
        rows.push([-0.0]);
        assert!(rows.finish()[0].y.is_sign_negative());
    }
}

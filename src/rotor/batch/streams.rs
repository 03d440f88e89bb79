//! Numbers in streams: part by part instead of rotation by rotation.

/// `N` streams to read, all of one length.
pub type Parts<'a, F, const N: usize> = [&'a [F]; N];

/// `N` streams to write, all of one length.
pub type PartsMut<'a, F, const N: usize> = [&'a mut [F]; N];

/// `N` streams of one length in one piece of memory: rotors with `N = 4` (s, yz, zx, xy), plane angles and vectors with 3.
#[derive(Clone, Debug, PartialEq)]
pub struct Streams<F, const N: usize> {
    numbers: Vec<F>,
    len: usize,
    stride: usize,
}

/// Bytes left free between two streams. Streams that begin at the same place of a memory page drive each other out of the first
/// cache, and a read waits for a write a page apart; eleven cache lines between them prevent both.
const GAP: usize = 704;

impl<F: Copy + Default, const N: usize> Streams<F, N> {
    /// Streams full of zeros.
    #[must_use]
    pub fn zeros(len: usize) -> Self {
        let stride = len + GAP / size_of::<F>().max(1);
        Self { numbers: vec![F::default(); stride * N], len, stride }
    }

    /// The same `parts` over and over.
    #[must_use]
    pub fn repeated(parts: [F; N], len: usize) -> Self {
        let mut streams = Self::zeros(len);
        for (stream, part) in streams.parts_mut().into_iter().zip(parts) {
            stream.fill(part);
        }
        streams
    }

    /// From parts that lie together.
    #[must_use]
    pub fn from_rows(rows: impl ExactSizeIterator<Item = [F; N]>) -> Self {
        let mut streams = Self::zeros(rows.len());
        for (index, row) in rows.enumerate() {
            streams.set(index, row);
        }
        streams
    }

    /// How many rows there are.
    #[must_use]
    pub const fn len(&self) -> usize {
        self.len
    }

    /// Whether there are none.
    #[must_use]
    pub const fn is_empty(&self) -> bool {
        self.len == 0
    }

    /// The parts of one row.
    ///
    /// # Panics
    /// When there is no such row.
    #[must_use]
    pub fn get(&self, index: usize) -> [F; N] {
        assert!(index < self.len, "expected a row below {}, found {index}", self.len);
        std::array::from_fn(|part| self.numbers[part * self.stride + index])
    }

    /// Writes the parts of one row.
    ///
    /// # Panics
    /// When there is no such row.
    pub fn set(&mut self, index: usize, parts: [F; N]) {
        assert!(index < self.len, "expected a row below {}, found {index}", self.len);
        for (part, value) in parts.into_iter().enumerate() {
            self.numbers[part * self.stride + index] = value;
        }
    }

    /// All streams, to read.
    #[must_use]
    pub fn parts(&self) -> Parts<'_, F, N> {
        std::array::from_fn(|part| &self.numbers[part * self.stride..part * self.stride + self.len])
    }

    /// All streams, to write.
    pub fn parts_mut(&mut self) -> PartsMut<'_, F, N> {
        let mut streams = self.numbers.chunks_exact_mut(self.stride);
        std::array::from_fn(|_| match streams.next() {
            Some(stream) => &mut stream[..self.len],
            None => &mut [],
        })
    }
}

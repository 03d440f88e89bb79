//! Numbers in streams: part by part instead of rotation by rotation.

/// `N` streams to read, all of one length.
pub type Parts<'a, F, const N: usize> = [&'a [F]; N];

/// `N` streams to write, all of one length.
pub type PartsMut<'a, F, const N: usize> = [&'a mut [F]; N];

/// `N` streams of one length in one piece of memory: rotors with `N = 4` (s, yz, zx, xy), plane angles and vectors with 3.
#[derive(Debug)]
pub struct Streams<F, const N: usize> {
    numbers: Vec<F>,
    /// Where the first stream begins.
    start: usize,
    len: usize,
    stride: usize,
}

/// Bytes left free between two streams. Streams that begin at the same place of a memory page drive each other out of the first
/// cache, and a read waits for a write a page apart; eleven cache lines between them prevent both.
const GAP: usize = 704;

/// Bytes of a cache line. Every stream begins with one, so that what is read or written at once never lies in two.
const LINE: usize = 64;

impl<F: Copy + Default, const N: usize> Streams<F, N> {
    /// Streams full of zeros.
    #[must_use]
    pub fn zeros(len: usize) -> Self {
        let size = size_of::<F>().max(1);
        let line = LINE / size;
        let stride = len.next_multiple_of(line.max(1)) + GAP / size;
        let numbers = vec![F::default(); stride * N + line];
        let start = Some(numbers.as_ptr().align_offset(LINE)).filter(|start| *start <= line).unwrap_or(0);
        Self { numbers, start, len, stride }
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
        std::array::from_fn(|part| self.numbers[self.place(part) + index])
    }

    /// Writes the parts of one row.
    ///
    /// # Panics
    /// When there is no such row.
    pub fn set(&mut self, index: usize, parts: [F; N]) {
        assert!(index < self.len, "expected a row below {}, found {index}", self.len);
        for (part, value) in parts.into_iter().enumerate() {
            let place = self.place(part) + index;
            self.numbers[place] = value;
        }
    }

    /// All streams, to read.
    #[must_use]
    pub fn parts(&self) -> Parts<'_, F, N> {
        std::array::from_fn(|part| &self.numbers[self.place(part)..][..self.len])
    }

    /// Where a stream begins.
    fn place(&self, part: usize) -> usize {
        self.start + part * self.stride
    }

    /// All streams, to write.
    pub fn parts_mut(&mut self) -> PartsMut<'_, F, N> {
        let mut streams = self.numbers[self.start..].chunks_exact_mut(self.stride);
        std::array::from_fn(|_| match streams.next() {
            Some(stream) => &mut stream[..self.len],
            None => &mut [],
        })
    }
}

// The copy lies elsewhere and begins with a line of its own.
impl<F: Copy + Default, const N: usize> Clone for Streams<F, N> {
    fn clone(&self) -> Self {
        let mut copy = Self::zeros(self.len);
        for (copy, own) in copy.parts_mut().into_iter().zip(self.parts()) {
            copy.copy_from_slice(own);
        }
        copy
    }
}

impl<F: Copy + Default + PartialEq, const N: usize> PartialEq for Streams<F, N> {
    fn eq(&self, other: &Self) -> bool {
        self.parts() == other.parts()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn begin_with_lines<F: Copy + Default, const N: usize>(streams: &Streams<F, N>) -> bool {
        streams.parts().iter().all(|part| part.as_ptr().align_offset(LINE) == 0)
    }

    #[test]
    fn every_stream_begins_with_a_cache_line_and_so_do_those_of_a_copy() {
        for len in [1, 7, 64, 1001] {
            let rows = || (0..len).map(|row| [row as f64, 1.0, -2.0, 0.5 * row as f64]);
            let streams = Streams::from_rows(rows());
            let copy = streams.clone();
            assert!(begin_with_lines(&streams) && begin_with_lines(&copy), "{len}");
            assert!(begin_with_lines(&Streams::<f32, 3>::zeros(len)), "{len}");
            assert_eq!(copy, streams);
            assert!((0..len).zip(rows()).all(|(index, row)| copy.get(index) == row));
        }
    }

    #[test]
    fn streams_that_differ_in_a_number_or_in_length_are_not_equal() {
        let streams = Streams::repeated([1.0, 2.0, 3.0], 5);
        let mut other = streams.clone();
        other.set(4, [1.0, 2.0, 4.0]);
        assert_ne!(streams, other);
        assert_ne!(streams, Streams::repeated([1.0, 2.0, 3.0], 6));
    }
}

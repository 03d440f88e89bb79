//! A piece of the picture, drawn by one thread.

use super::area::Area;
use std::ops::Range;

/// Some columns of rows `top..` of the picture.
#[derive(Debug)]
pub(super) struct Band<'p> {
    /// Row by row, `width` pixels each: whole rows, whatever the columns.
    pixels: &'p mut [u32],
    width: usize,
    top: i64,
    columns: Range<i64>,
}

impl<'p> Band<'p> {
    /// `pixels` are whole rows of `width` pixels, the first of them row `top` of the picture; of these the band has `columns`.
    pub(super) fn new(pixels: &'p mut [u32], width: usize, top: usize, columns: Range<usize>) -> Self {
        Self { pixels, width, top: top as i64, columns: columns.start as i64..columns.end as i64 }
    }

    /// Gives all its pixels one colour.
    pub(super) fn clear(&mut self, color: u32) {
        let Area { left, top, right, bottom } = self.area();
        for row in top..bottom {
            self.run(row, left, right).fill(color);
        }
    }

    /// The pixels that this band has.
    pub(super) fn area(&self) -> Area {
        let n_rows = self.pixels.len().checked_div(self.width).unwrap_or(0);
        let Range { start: left, end: right } = self.columns;
        Area { left, top: self.top, right, bottom: self.top + n_rows as i64 }
    }

    /// The pixels `left..right` of one row; all of them must lie in [`Self::area`].
    pub(super) fn run(&mut self, row: i64, left: i64, right: i64) -> &mut [u32] {
        let start = (row - self.top) as usize * self.width;
        &mut self.pixels[start + left as usize..start + right as usize]
    }

    /// The pixels `top..bottom` of one column; all of them must lie in [`Self::area`].
    pub(super) fn column(&mut self, column: i64, top: i64, bottom: i64) -> impl Iterator<Item = &mut u32> {
        let (first, count) =
            ((top - self.top) as usize * self.width + column as usize, (bottom - top) as usize);
        self.pixels[first..].iter_mut().step_by(self.width).take(count)
    }
}

//! A few rows of the picture, drawn by one thread.

use super::area::Area;

/// Rows `top..` of the picture.
#[derive(Debug)]
pub(super) struct Band<'p> {
    /// Row by row, `width` pixels each.
    pixels: &'p mut [u32],
    width: usize,
    top: i64,
}

impl<'p> Band<'p> {
    /// `pixels` are whole rows of `width` pixels, the first of them row `top` of the picture.
    pub(super) fn new(pixels: &'p mut [u32], width: usize, top: usize) -> Self {
        Self { pixels, width, top: top as i64 }
    }

    /// The pixels that this band has.
    pub(super) fn area(&self) -> Area {
        let n_rows = self.pixels.len().checked_div(self.width).unwrap_or(0);
        Area { left: 0, top: self.top, right: self.width as i64, bottom: self.top + n_rows as i64 }
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

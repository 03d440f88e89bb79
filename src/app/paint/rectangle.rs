//! Upright rectangles of one tint: most of a window, and all of its text and images.

use super::area::Area;
use super::area::Corner;
use super::area::STEPS;
use super::area::first_pixel;
use super::band::Band;
use super::pixel;
use super::texture::Tap;
use super::texture::Texture;
use egui::Color32;
use egui::Pos2;
use egui::epaint::Vertex;

/// Farther than this from a texel's centre (in texels) a copy would show.
const ON_CENTRE: f64 = 1.0 / 128.0;

/// Up to so many pixels across, an even rectangle is filled column by column.
const NARROW: i64 = 2;

/// An upright rectangle that egui sent as two triangles.
#[derive(Clone, Copy, Debug)]
pub(super) struct Rectangle {
    from: Corner,
    to: Corner,
    from_uv: Pos2,
    to_uv: Pos2,
    tint: Color32,
}

impl Rectangle {
    /// The rectangle with these vertices at these corners (left top, right top, left bottom, right bottom, as egui
    /// orders them), if it is of one tint and its image stands upright in it.
    pub(super) fn new([a, b, c, d]: [Vertex; 4], [from, .., to]: [Corner; 4]) -> Option<Self> {
        let is_plain = a.color == b.color && a.color == c.color && a.color == d.color;
        let is_upright = a.uv.x == c.uv.x && b.uv.x == d.uv.x && a.uv.y == b.uv.y && c.uv.y == d.uv.y;
        if !is_plain || !is_upright {
            return None;
        }
        Some(Self { from, to, from_uv: a.uv, to_uv: d.uv, tint: a.color })
    }

    /// The pixels whose centres it covers.
    fn area(&self) -> Area {
        Area {
            left: first_pixel(self.from.x().min(self.to.x())),
            top: first_pixel(self.from.y().min(self.to.y())),
            right: first_pixel(self.from.x().max(self.to.x())),
            bottom: first_pixel(self.from.y().max(self.to.y())),
        }
    }

    /// Draws the part inside `clip` and the band.
    pub(super) fn draw(&self, band: &mut Band<'_>, clip: Area, texture: &Texture, taps: &mut Vec<Tap>) {
        let whole = self.area().intersect(clip);
        let area = whole.intersect(band.area());
        if area.is_empty() {
            return;
        }
        let tint = pixel::pack(self.tint);
        if self.from_uv == self.to_uv {
            let across = Axis::still(self.from_uv.x, texture.width);
            let down = Axis::still(self.from_uv.y, texture.height);
            let texel = texture.sample(across.at(0) as f32, down.at(0) as f32, texture.filter(0.0));
            let source = pixel::multiply(tint, texel);
            if area.right - area.left <= NARROW && pixel::is_opaque(source) {
                // A long curve is a row of such bars, one for each pixel across.
                for column in area.left..area.right {
                    band.column(column, area.top, area.bottom).for_each(|below| *below = source);
                }
                return;
            }
            for row in area.top..area.bottom {
                pixel::fill(band.run(row, area.left, area.right), source);
            }
            return;
        }
        let across = Axis::new(self.from.x(), self.to.x(), self.from_uv.x, self.to_uv.x, texture.width);
        let down = Axis::new(self.from.y(), self.to.y(), self.from_uv.y, self.to_uv.y, texture.height);
        // Asked of the whole of it, so that the pixels are the same wherever bands begin.
        let start = (
            across.copy_start(whole.left, whole.right, texture.width),
            down.copy_start(whole.top, whole.bottom, texture.height),
        );
        if let (Some(column), Some(row)) = start {
            let (column, row) =
                (column + (area.left - whole.left) as usize, row + (area.top - whole.top) as usize);
            copy(band, area, texture, column, row, tint);
        } else {
            stretch(band, area, texture, &across, &down, tint, taps);
        }
    }
}

/// How one axis of the picture runs over one axis of the image.
#[derive(Clone, Copy, Debug)]
struct Axis {
    /// Place of the centre of pixel 0, in texels from the edge of the image.
    start: f64,
    /// Texels for each pixel.
    step: f64,
}

impl Axis {
    fn new(from: i64, to: i64, from_uv: f32, to_uv: f32, n_texels: usize) -> Self {
        let n_texels = n_texels as f64;
        let step_per_step = (f64::from(to_uv) - f64::from(from_uv)) * n_texels / (to - from) as f64;
        Self {
            start: f64::from(from_uv) * n_texels + (STEPS / 2 - from) as f64 * step_per_step,
            step: step_per_step * STEPS as f64,
        }
    }

    /// One place of the image for all pixels.
    fn still(uv: f32, n_texels: usize) -> Self {
        Self { start: f64::from(uv) * n_texels as f64, step: 0.0 }
    }

    fn at(&self, pixel: i64) -> f64 {
        self.start + self.step * pixel as f64
    }

    /// The texel for pixel `first` if each pixel of `first..end` falls onto the centre of one texel, the next onto the
    /// next, and all of them are there.
    fn copy_start(&self, first: i64, end: i64, n_texels: usize) -> Option<usize> {
        let is_on_centre = |pixel: i64, texel: f64| (self.at(pixel) - 0.5 - texel).abs() < ON_CENTRE;
        let texel = (self.at(first) - 0.5).round();
        let n_pixels = (end - first) as f64;
        let is_copy = is_on_centre(first, texel) && is_on_centre(end - 1, texel + n_pixels - 1.0);
        // A single pixel fits any step. Then either way of drawing gives the same.
        (is_copy && texel >= 0.0 && texel + n_pixels <= n_texels as f64).then_some(texel as usize)
    }
}

/// Draws texels one to one, beginning with the one at `column`, `row`.
fn copy(band: &mut Band<'_>, area: Area, texture: &Texture, column: usize, row: usize, tint: u32) {
    let n_columns = (area.right - area.left) as usize;
    let rows = texture.texels.chunks_exact(texture.width).skip(row);
    for (y, texels) in (area.top..area.bottom).zip(rows) {
        let run = band.run(y, area.left, area.right);
        let texels = &texels[column..column + n_columns];
        if tint == u32::MAX && texture.is_opaque {
            run.copy_from_slice(texels);
            continue;
        }
        for (below, texel) in run.iter_mut().zip(texels) {
            // Around and inside letters most texels are empty.
            if *texel != 0 {
                put(below, pixel::multiply(tint, *texel));
            }
        }
    }
}

/// Draws texels at any other scale, or mirrored.
fn stretch(
    band: &mut Band<'_>,
    area: Area,
    texture: &Texture,
    across: &Axis,
    down: &Axis,
    tint: u32,
    taps: &mut Vec<Tap>,
) {
    let filter = texture.filter(across.step.abs().max(down.step.abs()));
    taps.clear();
    taps.extend((area.left..area.right).map(|x| texture.tap(across.at(x) as f32, texture.width, filter)));
    for y in area.top..area.bottom {
        let row = texture.tap(down.at(y) as f32, texture.height, filter);
        for (below, column) in band.run(y, area.left, area.right).iter_mut().zip(&*taps) {
            put(below, pixel::multiply(tint, texture.texel(*column, row)));
        }
    }
}

fn put(below: &mut u32, source: u32) {
    *below = if pixel::is_opaque(source) { source } else { pixel::over(*below, source) };
}

//! Frames that no display shows.

use super::Canvas;
use super::Painter;
use super::pixel;
use crate::raster::Color;
use crate::raster::Image;
use egui::ClippedPrimitive;
use egui::Color32;
use egui::Vec2;

/// A painter with pixels of its own, which nobody else changes.
#[derive(Debug)]
pub(super) struct Offscreen {
    pub(super) painter: Painter,
    pixels: Vec<u32>,
    width: usize,
    height: usize,
}

impl Offscreen {
    pub(super) fn new(n_threads: usize) -> Self {
        Self { painter: Painter::new(n_threads), pixels: Vec::new(), width: 0, height: 0 }
    }

    /// Draws a frame and gives its pixels (`0xAARRGGBB`, row by row).
    pub(super) fn paint(
        &mut self,
        size_points: Vec2,
        pixels_per_point: f32,
        primitives: &[ClippedPrimitive],
        background: Color32,
    ) -> &[u32] {
        let size = (size_points * pixels_per_point).round();
        (self.width, self.height) = (size.x as usize, size.y as usize);
        self.pixels.resize(self.width * self.height, 0);
        // At first, and in another size, the painter has drawn no frame that could be left alone.
        let canvas =
            Canvas { pixels: &mut self.pixels, width: self.width, height: self.height, holds_last: true };
        self.painter.paint(canvas, pixels_per_point, primitives, background);
        &self.pixels
    }

    /// The last frame as a picture.
    pub(super) fn image(&self) -> Image {
        let mut image = Image::new(self.width, self.height, Color::TRANSPARENT);
        for (to, from) in image.pixels_mut().iter_mut().zip(&self.pixels) {
            *to = pixel::unpack_rgba(*from);
        }
        image
    }
}

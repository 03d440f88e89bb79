//! Pictures for window tests, without a graphics driver.

use super::headless;
use super::offscreen::Offscreen;
use egui_kittest::TestRenderer;
use image::RgbaImage;

/// Draws for `egui_kittest`: `Harness::builder().renderer(CpuRenderer::new(2))`.
#[derive(Debug)]
pub struct CpuRenderer {
    offscreen: Offscreen,
}

impl CpuRenderer {
    /// Draws on `n_threads` threads. The picture is the same for any number.
    pub fn new(n_threads: usize) -> Self {
        Self { offscreen: Offscreen::new(n_threads) }
    }
}

impl TestRenderer for CpuRenderer {
    fn handle_delta(&mut self, delta: &mut egui::TexturesDelta) {
        self.offscreen.painter.update_textures(delta);
    }

    fn render(&mut self, ctx: &egui::Context, output: &egui::FullOutput) -> Result<RgbaImage, String> {
        let primitives = ctx.tessellate(output.shapes.clone(), output.pixels_per_point);
        let size_points = ctx.content_rect().size();
        let background = headless::background(ctx);
        self.offscreen.paint(size_points, output.pixels_per_point, &primitives, background);
        let picture = self.offscreen.image();
        let (width, height) = (picture.width(), picture.height());
        RgbaImage::from_raw(width as u32, height as u32, picture.as_bytes().to_vec())
            .ok_or_else(|| format!("a picture of {width} by {height} has the wrong number of bytes"))
    }
}

//! Pictures for window tests, without a graphics driver.

use super::Painter;
use super::headless;
use egui_kittest::TestRenderer;
use image::RgbaImage;

/// Draws for `egui_kittest`: `Harness::builder().renderer(CpuRenderer::new(2))`.
#[derive(Debug)]
pub struct CpuRenderer {
    painter: Painter,
}

impl CpuRenderer {
    /// Draws on `n_threads` threads. The picture is the same for any number.
    pub fn new(n_threads: usize) -> Self {
        Self { painter: Painter::new(n_threads) }
    }
}

impl TestRenderer for CpuRenderer {
    fn handle_delta(&mut self, delta: &mut egui::TexturesDelta) {
        self.painter.update_textures(delta);
    }

    fn render(&mut self, ctx: &egui::Context, output: &egui::FullOutput) -> Result<RgbaImage, String> {
        let primitives = ctx.tessellate(output.shapes.clone(), output.pixels_per_point);
        let size_points = ctx.content_rect().size();
        let background = headless::background(ctx);
        let picture =
            headless::draw(&mut self.painter, size_points, output.pixels_per_point, &primitives, background);
        let (width, height) = (picture.width(), picture.height());
        RgbaImage::from_raw(width as u32, height as u32, picture.as_bytes().to_vec())
            .ok_or_else(|| format!("a picture of {width} by {height} has the wrong number of bytes"))
    }
}

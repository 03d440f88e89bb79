//! Draws egui's meshes on the processor.
//!
//! egui describes a frame as clipped triangle meshes and a list of changed textures. This draws them into plain pixels:
//! for the window where there is no graphics driver, for pictures of the window without a display, and for tests. The
//! result is that of egui's own renderers but for single pixels, and the same for any number of threads.

mod area;
mod band;
mod frame;
mod headless;
mod pixel;
mod rectangle;
#[cfg(feature = "gui-tests")]
mod test_renderer;
mod texture;
mod triangle;

pub use headless::Headless;
pub(super) use headless::background;
pub use headless::picture_of;
#[cfg(feature = "gui-tests")]
pub use test_renderer::CpuRenderer;

use band::Band;
use egui::ClippedPrimitive;
use egui::Color32;
use egui::TexturesDelta;
use frame::BAND_ROWS;
use frame::Frame;
use frame::Lists;
use rayon::prelude::*;
use texture::Textures;

/// The pixels to draw on, `0xAARRGGBB`, row by row from the top. The painter sets alpha to 255 everywhere.
#[derive(Debug)]
pub struct Canvas<'p> {
    /// `width * height` pixels.
    pub pixels: &'p mut [u32],
    /// Pixels in a row.
    pub width: usize,
    /// Rows.
    pub height: usize,
}

/// Threads that drawing gains from on this machine: more than four only wait for each other.
pub fn default_threads() -> usize {
    std::thread::available_parallelism().map_or(1, usize::from).min(4)
}

/// Draws the frames of one egui context.
#[derive(Debug)]
pub struct Painter {
    textures: Textures,
    lists: Lists,
    /// Own threads, so that long work on the shared ones cannot hold a frame up. `None`: draw on the calling thread.
    threads: Option<rayon::ThreadPool>,
}

impl Painter {
    /// A painter that draws on `n_threads` threads (0 and 1: the calling one).
    pub fn new(n_threads: usize) -> Self {
        let threads = (n_threads > 1)
            .then(|| {
                rayon::ThreadPoolBuilder::new().num_threads(n_threads).thread_name(|i| format!("paint {i}"))
            })
            .and_then(|builder| builder.build().ok());
        Self { textures: Textures::default(), lists: Lists::default(), threads }
    }

    /// Takes over the texture changes that came with a frame, before that frame is drawn. Leaves `delta` empty.
    pub fn update_textures(&mut self, delta: &mut TexturesDelta) {
        self.textures.update(delta);
    }

    /// Draws a frame: `background` everywhere, then the meshes in order.
    ///
    /// Meshes whose texture is missing and paint callbacks (which need a graphics driver) are left away.
    ///
    /// # Panics
    /// If `canvas.pixels` has not `width * height` pixels.
    pub fn paint(
        &mut self,
        canvas: Canvas<'_>,
        pixels_per_point: f32,
        primitives: &[ClippedPrimitive],
        background: Color32,
    ) {
        let Canvas { pixels, width, height } = canvas;
        assert_eq!(pixels.len(), width * height, "a canvas has all its pixels");
        if pixels.is_empty() {
            return;
        }
        let frame = Frame::new(primitives, &self.textures, &mut self.lists, pixels_per_point, width, height);
        let background = pixel::pack(background) | 0xff00_0000;
        let draw = |(i, pixels): (usize, &mut [u32])| {
            pixels.fill(background);
            frame.draw(&mut Band::new(pixels, width, i * BAND_ROWS), i);
        };
        match &self.threads {
            Some(threads) => threads.install(|| {
                pixels.par_chunks_mut(width * BAND_ROWS).enumerate().with_max_len(1).for_each(draw);
            }),
            None => pixels.chunks_mut(width * BAND_ROWS).enumerate().for_each(draw),
        }
    }
}

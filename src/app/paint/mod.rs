//! Draws egui's meshes on the processor.
//!
//! egui describes a frame as clipped triangle meshes and a list of changed textures. This draws them into plain pixels:
//! for the window where there is no graphics driver, for pictures of the window without a display, and for tests. The
//! result is that of egui's own renderers but for single pixels, and the same for any number of threads and whatever
//! was drawn before: of pixels that hold the frame before only those are drawn that may have changed.

mod area;
mod band;
mod frame;
mod headless;
mod mark;
mod offscreen;
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

use egui::ClippedPrimitive;
use egui::Color32;
use egui::TexturesDelta;
use frame::BAND_ROWS;
use frame::Frame;
use frame::Lists;
use frame::n_tiles;
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
    /// Whether the pixels are still those of the frame that this painter drew last, which then need not all be drawn.
    pub holds_last: bool,
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
    /// Of each tile, what the last frame shows there.
    marks: Vec<Option<u64>>,
    /// Of the last frame, in pixels.
    size: [usize; 2],
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
        Self {
            textures: Textures::default(),
            lists: Lists::default(),
            marks: Vec::new(),
            size: [0, 0],
            threads,
        }
    }

    /// Takes over the texture changes that came with a frame, before that frame is drawn. Leaves `delta` empty.
    pub fn update_textures(&mut self, delta: &mut TexturesDelta) {
        self.textures.update(delta);
    }

    /// Draws a frame: `background` everywhere, then the meshes in order. Pixels that hold the last frame
    /// ([`Canvas::holds_last`]) are left alone where the new one is made of the same shapes.
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
        let Canvas { pixels, width, height, holds_last } = canvas;
        assert_eq!(pixels.len(), width * height, "a canvas has all its pixels");
        if pixels.is_empty() {
            return;
        }
        let frame = Frame::new(primitives, &self.textures, &mut self.lists, pixels_per_point, width, height);
        let n_tiles = n_tiles(width);
        if !holds_last || self.size != [width, height] {
            self.marks.clear();
            self.marks.resize(n_tiles * height.div_ceil(BAND_ROWS), None);
            self.size = [width, height];
        }
        let background = pixel::pack(background) | 0xff00_0000;
        let draw = |(i, (pixels, marks)): (usize, (&mut [u32], &mut [Option<u64>]))| {
            frame.draw(i, pixels, width, background, marks);
        };
        let marks = &mut self.marks;
        if let Some(threads) = &self.threads {
            threads.install(|| {
                let bands = pixels.par_chunks_mut(width * BAND_ROWS).zip(marks.par_chunks_mut(n_tiles));
                bands.enumerate().with_max_len(1).for_each(draw);
            });
        } else {
            let bands = pixels.chunks_mut(width * BAND_ROWS).zip(marks.chunks_mut(n_tiles));
            bands.enumerate().for_each(draw);
        }
    }
}

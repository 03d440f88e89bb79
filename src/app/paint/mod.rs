//! Draws egui's meshes on the processor.
//!
//! egui describes a frame as clipped triangle meshes and a list of changed textures. This draws them into plain pixels:
//! for the window where there is no graphics driver, for pictures of the window without a display, and for tests. The
//! result is that of egui's own renderers but for single pixels, and the same for any number of threads.

mod area;
mod band;
mod headless;
mod pixel;
mod rectangle;
#[cfg(feature = "gui-tests")]
mod test_renderer;
mod texture;
mod triangle;

pub use headless::Headless;
pub use headless::Picture;
pub(super) use headless::background;
pub use headless::picture_of;
#[cfg(feature = "gui-tests")]
pub use test_renderer::CpuRenderer;

use area::Area;
use area::Corner;
use area::first_pixel;
use band::Band;
use egui::ClippedPrimitive;
use egui::Color32;
use egui::Mesh;
use egui::TexturesDelta;
use egui::epaint::Primitive;
use egui::epaint::Vertex;
use rayon::prelude::*;
use rectangle::Rectangle;
use texture::Texture;
use texture::Textures;

/// Rows that one thread takes at a time: enough to be worth the handing over, few enough to spread the work evenly.
const BAND_ROWS: usize = 32;

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
    /// The shapes that touch each band, in drawing order. Kept between frames for its memory.
    bins: Vec<Vec<Shape>>,
    /// Own threads, so that long work on the shared ones cannot hold a frame up. `None`: draw on the calling thread.
    threads: Option<rayon::ThreadPool>,
}

/// A triangle, or two that make a rectangle.
#[derive(Clone, Copy, Debug)]
struct Shape {
    /// Index of the primitive.
    primitive: u32,
    /// Index of the first of its 3 (or 6) indices in the mesh.
    first: u32,
    is_rectangle: bool,
}

/// What the shapes of one primitive have in common.
struct Layer<'f> {
    mesh: &'f Mesh,
    texture: &'f Texture,
    clip: Area,
}

impl Painter {
    /// A painter that draws on `n_threads` threads (0 and 1: the calling one).
    pub fn new(n_threads: usize) -> Self {
        let threads = (n_threads > 1)
            .then(|| {
                rayon::ThreadPoolBuilder::new().num_threads(n_threads).thread_name(|i| format!("paint {i}"))
            })
            .and_then(|builder| builder.build().ok());
        Self { textures: Textures::default(), bins: Vec::new(), threads }
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
        let layers: Vec<_> = primitives
            .iter()
            .map(|primitive| {
                let Primitive::Mesh(mesh) = &primitive.primitive else { return None };
                let clip = Area::clip(primitive.clip_rect, pixels_per_point, width, height);
                let texture = self.textures.get(mesh.texture_id)?;
                (!clip.is_empty() && mesh.is_valid()).then_some(Layer { mesh, texture, clip })
            })
            .collect();
        sort_into_bands(&mut self.bins, height.div_ceil(BAND_ROWS), &layers, pixels_per_point);

        let background = pixel::pack(background) | 0xff00_0000;
        let bins = &self.bins;
        let draw = |(i, pixels): (usize, &mut [u32])| {
            pixels.fill(background);
            let mut band = Band::new(pixels, width, i * BAND_ROWS);
            draw_band(&mut band, &bins[i], &layers, pixels_per_point);
        };
        match &self.threads {
            Some(threads) => threads.install(|| {
                pixels.par_chunks_mut(width * BAND_ROWS).enumerate().with_max_len(1).for_each(draw);
            }),
            None => pixels.chunks_mut(width * BAND_ROWS).enumerate().for_each(draw),
        }
    }
}

/// Fills `bins[i]` with the shapes that touch rows `i * BAND_ROWS..`.
fn sort_into_bands(
    bins: &mut Vec<Vec<Shape>>,
    n_bands: usize,
    layers: &[Option<Layer<'_>>],
    pixels_per_point: f32,
) {
    bins.resize_with(n_bands, Vec::new);
    bins.iter_mut().for_each(Vec::clear);
    for (primitive, layer) in layers.iter().enumerate() {
        let Some(Layer { mesh, clip, .. }) = layer else { continue };
        let mut first = 0;
        while let Some(&[a, b, c]) = mesh.indices.get(first..first + 3) {
            let mut shape = Shape { primitive: primitive as u32, first: first as u32, is_rectangle: false };
            let corner = |index: u32| Corner::new(mesh.vertices[index as usize].pos, pixels_per_point);
            let rows = if let Some([_, _, _, _, _, last]) = rectangle_indices(&mesh.indices, first) {
                // Opposite corners say all, if it is one; otherwise it is drawn as the two triangles it is.
                shape.is_rectangle = true;
                first += 6;
                rows_of(&[corner(a), corner(b), corner(c), corner(last)])
            } else {
                first += 3;
                rows_of(&[corner(a), corner(b), corner(c)])
            };
            let Some((top, bottom)) = rows else { continue };
            let (top, bottom) = (top.max(clip.top), bottom.min(clip.bottom));
            if top < bottom {
                for bin in &mut bins[top as usize / BAND_ROWS..=(bottom - 1) as usize / BAND_ROWS] {
                    bin.push(shape);
                }
            }
        }
    }
}

/// The six indices from `first` on, if they are in the order that egui gives to rectangles: 0 1 2, 2 1 3.
fn rectangle_indices(indices: &[u32], first: usize) -> Option<[u32; 6]> {
    let six: [u32; 6] = indices.get(first..first + 6)?.try_into().ok()?;
    let [_, b, c, again_c, again_b, _] = six;
    (b == again_b && c == again_c).then_some(six)
}

/// First row and row after the last that the corners reach. `None` if there are none.
fn rows_of(corners: &[Option<Corner>]) -> Option<(i64, i64)> {
    let top = corners.iter().flatten().map(|corner| corner.y).min()?;
    let bottom = corners.iter().flatten().map(|corner| corner.y).max()?;
    Some((first_pixel(top), first_pixel(bottom + 1)))
}

/// Draws the shapes of one band in order.
fn draw_band(band: &mut Band<'_>, shapes: &[Shape], layers: &[Option<Layer<'_>>], pixels_per_point: f32) {
    let mut taps = Vec::new();
    for shape in shapes {
        let Some(Layer { mesh, texture, clip }) = &layers[shape.primitive as usize] else { continue };
        let vertex = |i: usize| -> Vertex { mesh.vertices[mesh.indices[shape.first as usize + i] as usize] };
        if shape.is_rectangle {
            let corners = [vertex(0), vertex(1), vertex(2), vertex(5)];
            if let Some(rectangle) = Rectangle::new(corners, pixels_per_point) {
                rectangle.draw(band, *clip, texture, &mut taps);
                continue;
            }
        }
        for first in [0, 3].into_iter().take(1 + usize::from(shape.is_rectangle)) {
            let corners = [vertex(first), vertex(first + 1), vertex(first + 2)];
            triangle::draw(band, *clip, texture, corners, pixels_per_point);
        }
    }
}

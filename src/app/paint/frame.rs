//! One frame on its way to the picture: meshes cut into shapes, shapes sorted into bands, bands cut into tiles.
//!
//! Most of a window stays as it was from one frame to the next. So each tile has a mark of all that is drawn into it, and
//! where the mark is that of the frame before, the pixels stay.

use super::area::Area;
use super::area::Corner;
use super::band::Band;
use super::mark::joined;
use super::mark::of_layer;
use super::mark::of_vertex;
use super::rectangle::Rectangle;
use super::texture::Texture;
use super::texture::Textures;
use super::triangle;
use egui::ClippedPrimitive;
use egui::Mesh;
use egui::epaint::Primitive;
use egui::epaint::Vertex;
use std::ops::Range;

/// Rows that one thread takes at a time: enough to be worth the handing over, few enough to spread the work evenly.
pub(super) const BAND_ROWS: usize = 32;

/// Columns of a tile.
const TILE_COLUMNS: usize = 64;

/// Tiles that `width` pixels across take.
pub(super) fn n_tiles(width: usize) -> usize {
    width.div_ceil(TILE_COLUMNS)
}

/// Lists that are filled anew for each frame, kept for their memory.
#[derive(Debug, Default)]
pub(super) struct Lists {
    /// The corner of every vertex, mesh after mesh.
    corners: Vec<Corner>,
    /// The mark of every vertex in the same order.
    vertex_marks: Vec<u64>,
    /// The shapes that touch each band, in drawing order.
    bins: Vec<Vec<Shape>>,
}

/// A triangle, or two that make a rectangle.
#[derive(Clone, Copy, Debug)]
struct Shape {
    /// Index of the layer.
    layer: u32,
    /// Index of the first of its 3 (or 6) indices in the mesh.
    first: u32,
    /// The tiles that it may touch, the last one among them.
    first_tile: u16,
    last_tile: u16,
    is_rectangle: bool,
}

impl Shape {
    fn touches(&self, tiles: &Range<usize>) -> bool {
        usize::from(self.first_tile) < tiles.end && usize::from(self.last_tile) >= tiles.start
    }

    /// How many indices of the mesh it takes.
    fn n_indices(&self) -> usize {
        if self.is_rectangle { 6 } else { 3 }
    }
}

/// What the shapes of one mesh have in common.
struct Layer<'f> {
    mesh: &'f Mesh,
    texture: &'f Texture,
    /// The texel that shapes without an image use.
    white: u32,
    clip: Area,
    /// Index of the corner of its first vertex.
    first_corner: usize,
    /// Stands for texture and clip in the marks of tiles.
    mark: u64,
}

/// A frame, ready to be drawn band by band.
pub(super) struct Frame<'f> {
    layers: Vec<Layer<'f>>,
    lists: &'f Lists,
}

impl<'f> Frame<'f> {
    /// Sorts the meshes of a frame for a picture of the given size. Leaves away what cannot show.
    pub(super) fn new(
        primitives: &'f [ClippedPrimitive],
        textures: &'f Textures,
        lists: &'f mut Lists,
        pixels_per_point: f32,
        width: usize,
        height: usize,
    ) -> Self {
        lists.corners.clear();
        lists.vertex_marks.clear();
        lists.bins.resize_with(height.div_ceil(BAND_ROWS), Vec::new);
        lists.bins.iter_mut().for_each(Vec::clear);
        let mut layers = Vec::new();
        for ClippedPrimitive { clip_rect, primitive } in primitives {
            let clip = Area::clip(*clip_rect, pixels_per_point, width, height);
            let Primitive::Mesh(mesh) = primitive else { continue };
            let Some(texture) = textures.get(mesh.texture_id) else { continue };
            if clip.is_empty() || !mesh.is_valid() {
                continue;
            }
            let layer = Layer {
                mesh,
                texture,
                white: texture.sample(0.0, 0.0, texture.filter(0.0)),
                clip,
                first_corner: lists.corners.len(),
                mark: of_layer(texture.version, clip),
            };
            lists
                .corners
                .extend(mesh.vertices.iter().map(|vertex| Corner::new(vertex.pos, pixels_per_point)));
            let corners = &lists.corners[layer.first_corner..];
            let marks = mesh.vertices.iter().zip(corners).map(|(vertex, corner)| of_vertex(*vertex, *corner));
            lists.vertex_marks.extend(marks);
            layer.sort(corners, &mut lists.bins, layers.len() as u32);
            layers.push(layer);
        }
        Self { layers, lists }
    }

    /// Draws what has changed of band `i`, whose rows are `pixels` of `width` each: `background`, then its shapes in order.
    /// `marks` are those of its tiles as `pixels` show them, and become those of this frame.
    pub(super) fn draw(
        &self,
        i: usize,
        pixels: &mut [u32],
        width: usize,
        background: u32,
        marks: &mut [Option<u64>],
    ) {
        let mut changed = vec![false; marks.len()];
        for ((changed, kept), mark) in changed.iter_mut().zip(marks).zip(self.marks(i, width, background)) {
            *changed = *kept != Some(mark);
            *kept = Some(mark);
        }
        let mut start = 0;
        for run in changed.chunk_by(|a, b| a == b) {
            let tiles = start..start + run.len();
            start = tiles.end;
            if run[0] {
                let columns = tiles.start * TILE_COLUMNS..(tiles.end * TILE_COLUMNS).min(width);
                let mut band = Band::new(pixels, width, i * BAND_ROWS, columns);
                band.clear(background);
                self.draw_tiles(&mut band, i, &tiles);
            }
        }
    }

    /// What stands for all that is drawn into each tile of band `i`: with the order, for one hides another.
    fn marks(&self, i: usize, width: usize, background: u32) -> Vec<u64> {
        let mut tiles = vec![u64::from(background); n_tiles(width)];
        for shape in &self.lists.bins[i] {
            let Layer { mesh, first_corner, mark, .. } = &self.layers[shape.layer as usize];
            let vertex_marks = &self.lists.vertex_marks[*first_corner..];
            let of = |i: usize| vertex_marks[mesh.indices[shape.first as usize + i] as usize];
            // The last of a rectangle's six indices is its fourth corner; the two before it were there already.
            let fourth = if shape.is_rectangle { of(5) } else { 0 };
            let own = joined(joined(*mark, of(0)), of(1)) ^ joined(joined(0, of(2)), fourth);
            for mark in &mut tiles[usize::from(shape.first_tile)..=usize::from(shape.last_tile)] {
                *mark = joined(*mark, own);
            }
        }
        tiles
    }

    /// Draws the shapes of band `i` in order, as far as they touch some of its tiles.
    fn draw_tiles(&self, band: &mut Band<'_>, i: usize, tiles: &Range<usize>) {
        let mut taps = Vec::new();
        for shape in self.lists.bins[i].iter().filter(|shape| shape.touches(tiles)) {
            let Layer { mesh, texture, white, clip, first_corner, .. } = &self.layers[shape.layer as usize];
            let corners = &self.lists.corners[*first_corner..];
            let vertex = |i: usize| -> (Vertex, Corner) {
                let index = mesh.indices[shape.first as usize + i] as usize;
                (mesh.vertices[index], corners[index])
            };
            if shape.is_rectangle {
                let four = [vertex(0), vertex(1), vertex(2), vertex(5)];
                let rectangle =
                    Rectangle::new(four.map(|(vertex, _)| vertex), four.map(|(_, corner)| corner));
                if let Some(rectangle) = rectangle {
                    rectangle.draw(band, *clip, texture, &mut taps);
                    continue;
                }
            }
            for first in (0..shape.n_indices()).step_by(3) {
                let three = [vertex(first), vertex(first + 1), vertex(first + 2)];
                let (vertices, corners) = (three.map(|(vertex, _)| vertex), three.map(|(_, corner)| corner));
                triangle::draw(band, *clip, texture, *white, vertices, corners);
            }
        }
    }
}

impl Layer<'_> {
    /// Puts each shape into the bins of the bands that it may touch.
    fn sort(&self, corners: &[Corner], bins: &mut [Vec<Shape>], layer: u32) {
        let indices = &self.mesh.indices;
        let around = |a: u32, b: u32, c: u32| {
            let three = [corners[a as usize], corners[b as usize], corners[c as usize]];
            three.into_iter().all(Corner::has_place).then(|| Area::around(three))
        };
        let mut put = |mut shape: Shape, area: Option<Area>| {
            let Some(area) = area.map(|area| area.intersect(self.clip)).filter(|area| !area.is_empty())
            else {
                return;
            };
            let tile = |column: i64| (column as usize / TILE_COLUMNS) as u16;
            (shape.first_tile, shape.last_tile) = (tile(area.left), tile(area.right - 1));
            for bin in &mut bins[area.top as usize / BAND_ROWS..=(area.bottom - 1) as usize / BAND_ROWS] {
                bin.push(shape);
            }
        };
        let mut first = 0;
        while let Some(&[a, b, c]) = indices.get(first..first + 3) {
            let shape =
                Shape { layer, first: first as u32, first_tile: 0, last_tile: 0, is_rectangle: false };
            // egui orders the corners of a rectangle like this. Anything else in this order, such as a piece of a
            // line, has its two triangles sorted one by one.
            if let Some(&[again_c, again_b, d]) = indices.get(first + 3..first + 6)
                && (b, c) == (again_b, again_c)
                && corners[a as usize].is_beside(corners[c as usize], corners[b as usize])
                && corners[d as usize].is_beside(corners[b as usize], corners[c as usize])
            {
                put(Shape { is_rectangle: true, ..shape }, around(a, b, d));
                first += 6;
            } else {
                put(shape, around(a, b, c));
                first += 3;
            }
        }
    }
}

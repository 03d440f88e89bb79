//! One frame on its way to the picture: meshes cut into shapes, shapes sorted into bands.

use super::area::Area;
use super::area::Corner;
use super::band::Band;
use super::rectangle::Rectangle;
use super::texture::Texture;
use super::texture::Textures;
use super::triangle;
use egui::ClippedPrimitive;
use egui::Mesh;
use egui::epaint::Primitive;
use egui::epaint::Vertex;

/// Rows that one thread takes at a time: enough to be worth the handing over, few enough to spread the work evenly.
pub(super) const BAND_ROWS: usize = 32;

/// Lists that are filled anew for each frame, kept for their memory.
#[derive(Debug, Default)]
pub(super) struct Lists {
    /// The corner of every vertex, mesh after mesh.
    corners: Vec<Corner>,
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
    is_rectangle: bool,
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
            };
            lists
                .corners
                .extend(mesh.vertices.iter().map(|vertex| Corner::new(vertex.pos, pixels_per_point)));
            let corners = &lists.corners[layer.first_corner..];
            layer.sort(corners, &mut lists.bins, layers.len() as u32);
            layers.push(layer);
        }
        Self { layers, lists }
    }

    /// Draws the shapes of band `i` in order.
    pub(super) fn draw(&self, band: &mut Band<'_>, i: usize) {
        let mut taps = Vec::new();
        for shape in &self.lists.bins[i] {
            let Layer { mesh, texture, white, clip, first_corner } = &self.layers[shape.layer as usize];
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
            for first in [0, 3].into_iter().take(1 + usize::from(shape.is_rectangle)) {
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
        let mut put = |shape: Shape, area: Option<Area>| {
            let Some(area) = area.map(|area| area.intersect(self.clip)).filter(|area| !area.is_empty())
            else {
                return;
            };
            for bin in &mut bins[area.top as usize / BAND_ROWS..=(area.bottom - 1) as usize / BAND_ROWS] {
                bin.push(shape);
            }
        };
        let mut first = 0;
        while let Some(&[a, b, c]) = indices.get(first..first + 3) {
            let shape = Shape { layer, first: first as u32, is_rectangle: false };
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

//! The painter's copy of egui's textures: the font atlas and the images of the window.

use super::pixel;
use egui::ColorImage;
use egui::ImageData;
use egui::TextureFilter;
use egui::TextureId;
use egui::TextureOptions;
use egui::TextureWrapMode;
use egui::TexturesDelta;
use egui::epaint::ImageDelta;
use std::collections::HashMap;

/// One image, packed for the painter.
#[derive(Debug)]
pub(super) struct Texture {
    /// Texels in a row, at least 1.
    pub(super) width: usize,
    /// Rows, at least 1.
    pub(super) height: usize,
    /// Row by row from the top, `width * height` of them.
    pub(super) texels: Vec<u32>,
    /// No texel lets anything through.
    pub(super) is_opaque: bool,
    /// Another one after each change, and never that of another texture.
    pub(super) version: u64,
    options: TextureOptions,
}

/// Texels that are packed and looked at together.
const PIECE: usize = 2048;

impl Texture {
    fn new() -> Self {
        let options = TextureOptions::default();
        Self { width: 1, height: 1, texels: vec![0], is_opaque: false, version: 0, options }
    }

    fn replace(&mut self, image: &ColorImage) {
        if image.width() == 0 || image.height() == 0 {
            *self = Self { version: self.version, options: self.options, ..Self::new() };
            return;
        }
        self.width = image.width();
        self.height = image.height();
        self.texels.clear();
        self.texels.reserve(image.pixels.len());
        self.is_opaque = true;
        // A piece at a time, so that what was written is looked at while it is near.
        for piece in image.pixels.chunks(PIECE) {
            let start = self.texels.len();
            self.texels.extend(piece.iter().map(|color| pixel::pack(*color)));
            let all = self.texels[start..].iter().fold(u32::MAX, |all, texel| all & texel);
            self.is_opaque &= pixel::is_opaque(all);
        }
    }

    /// Writes `image` with its top left corner at `x`, `y`. What lies outside is left away.
    fn patch(&mut self, image: &ColorImage, [x, y]: [usize; 2]) {
        let width = image.width().min(self.width.saturating_sub(x));
        let height = image.height().min(self.height.saturating_sub(y));
        if width == 0 {
            return;
        }
        let rows = self.texels.chunks_exact_mut(self.width).skip(y);
        for (row, source) in rows.zip(image.pixels.chunks_exact(image.width())).take(height) {
            for (texel, color) in row[x..x + width].iter_mut().zip(source) {
                *texel = pixel::pack(*color);
                self.is_opaque &= pixel::is_opaque(*texel);
            }
        }
    }

    /// How to look texels up when one pixel covers `texels_per_pixel` of them.
    pub(super) fn filter(&self, texels_per_pixel: f64) -> TextureFilter {
        if texels_per_pixel > 1.0 { self.options.minification } else { self.options.magnification }
    }

    /// The column or row that stands at `index` in an image of `len` of them, repeated as the options say.
    fn wrap(&self, index: i32, len: usize) -> usize {
        let last = len as i32 - 1;
        match self.options.wrap_mode {
            TextureWrapMode::ClampToEdge => index.clamp(0, last) as usize,
            TextureWrapMode::Repeat => index.rem_euclid(last + 1) as usize,
            TextureWrapMode::MirroredRepeat => {
                let there_and_back = index.rem_euclid(2 * (last + 1));
                there_and_back.min(2 * last + 1 - there_and_back) as usize
            }
        }
    }

    /// Where to look along one axis of `len` texels for the place `at`, in texels from the edge.
    pub(super) fn tap(&self, at: f32, len: usize, filter: TextureFilter) -> Tap {
        match filter {
            TextureFilter::Nearest => {
                let index = self.wrap(floor(at), len);
                Tap { first: index, second: index, weight: 0 }
            }
            TextureFilter::Linear => {
                let at = at - 0.5;
                let index = floor(at);
                let weight = ((at - index as f32) * 256.0 + 0.5) as u32;
                Tap { first: self.wrap(index, len), second: self.wrap(index.saturating_add(1), len), weight }
            }
        }
    }

    /// The colour where two axes meet.
    pub(super) fn texel(&self, across: Tap, down: Tap) -> u32 {
        let row = |row: usize| {
            let texels = &self.texels[row * self.width..][..self.width];
            let first = texels[across.first];
            if across.weight == 0 { first } else { pixel::mix(first, texels[across.second], across.weight) }
        };
        let first = row(down.first);
        if down.weight == 0 { first } else { pixel::mix(first, row(down.second), down.weight) }
    }

    /// The colour at a place given in texels from the top left corner.
    pub(super) fn sample(&self, x: f32, y: f32, filter: TextureFilter) -> u32 {
        self.texel(self.tap(x, self.width, filter), self.tap(y, self.height, filter))
    }
}

/// Two neighbouring texels along one axis, and how far towards the second (0 to 256).
#[derive(Clone, Copy, Debug)]
pub(super) struct Tap {
    first: usize,
    second: usize,
    weight: u32,
}

/// Rounds down. Far outside values stop at the ends of `i32`.
fn floor(value: f32) -> i32 {
    let towards_zero = value as i32;
    towards_zero.saturating_sub(i32::from(value < towards_zero as f32))
}

/// All textures of one egui context.
#[derive(Debug, Default)]
pub(super) struct Textures {
    by_id: HashMap<TextureId, Texture>,
    /// Freed with the last changes. The frame those came with may still draw them.
    leaving: Vec<TextureId>,
    /// Changes so far.
    changes: u64,
}

impl Textures {
    /// Takes over the changes that came with a frame, and leaves `delta` empty, as egui asks.
    pub(super) fn update(&mut self, delta: &mut TexturesDelta) {
        for id in self.leaving.drain(..) {
            self.by_id.remove(&id);
        }
        #[expect(
            clippy::iter_over_hash_type,
            reason = "each texture is on its own; the order changes nothing"
        )]
        for (id, changes) in delta.set.drain() {
            let texture = self.by_id.entry(id).or_insert_with(Texture::new);
            for ImageDelta { image: ImageData::Color(image), options, pos } in changes {
                texture.options = options;
                self.changes += 1;
                texture.version = self.changes;
                match pos {
                    Some(corner) => texture.patch(&image, corner),
                    None => texture.replace(&image),
                }
            }
        }
        self.leaving.extend(delta.free.drain());
    }

    pub(super) fn get(&self, id: TextureId) -> Option<&Texture> {
        self.by_id.get(&id)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use egui::Color32;

    /// Four texels in a row: black, white, black, white.
    fn stripes(wrap_mode: TextureWrapMode) -> Texture {
        let mut texture = Texture::new();
        let pixels = [Color32::BLACK, Color32::WHITE, Color32::BLACK, Color32::WHITE];
        texture.replace(&ColorImage::new([4, 1], pixels.to_vec()));
        texture.options.wrap_mode = wrap_mode;
        texture
    }

    #[track_caller]
    fn check(wrap_mode: TextureWrapMode, x: f32, expected_grey: u32) {
        let texture = stripes(wrap_mode);
        for filter in [TextureFilter::Nearest, TextureFilter::Linear] {
            assert_eq!(texture.sample(x, 0.5, filter) & 0xff, expected_grey, "{filter:?} at {x}");
        }
    }

    #[test]
    fn both_filters_give_the_texel_itself_at_its_centre() {
        check(TextureWrapMode::ClampToEdge, 0.5, 0);
        check(TextureWrapMode::ClampToEdge, 1.5, 255);
        check(TextureWrapMode::ClampToEdge, -3.5, 0);
        check(TextureWrapMode::ClampToEdge, 99.5, 255);
        check(TextureWrapMode::Repeat, -0.5, 255);
        check(TextureWrapMode::Repeat, 4.5, 0);
        check(TextureWrapMode::MirroredRepeat, -0.5, 0);
        check(TextureWrapMode::MirroredRepeat, 4.5, 255);
        check(TextureWrapMode::MirroredRepeat, 5.5, 0);
    }

    #[test]
    fn linear_goes_straight_from_one_centre_to_the_next() {
        let texture = stripes(TextureWrapMode::ClampToEdge);
        assert_eq!(texture.sample(1.0, 0.5, TextureFilter::Linear), 0xff80_8080);
        assert_eq!(texture.sample(0.75, 0.5, TextureFilter::Linear), 0xff40_4040);
    }

    #[test]
    fn a_patch_changes_its_own_texels_and_stops_at_the_edge() {
        let mut texture = stripes(TextureWrapMode::ClampToEdge);
        assert!(texture.is_opaque);
        texture.patch(&ColorImage::new([3, 2], vec![Color32::from_gray(7); 6]), [2, 0]);
        assert_eq!(texture.texels, [0xff00_0000, 0xffff_ffff, 0xff07_0707, 0xff07_0707]);
        texture.patch(&ColorImage::new([1, 1], vec![Color32::TRANSPARENT]), [0, 0]);
        assert!(!texture.is_opaque);
    }

    #[test]
    fn a_freed_texture_lives_through_the_frame_it_was_freed_in() {
        let id = TextureId::Managed(3);
        let mut textures = Textures::default();
        let mut delta = TexturesDelta::default();
        delta.push(
            id,
            ImageDelta::full(ColorImage::new([1, 1], vec![Color32::WHITE]), TextureOptions::LINEAR),
        );
        delta.free(id);
        textures.update(&mut delta);
        assert!(delta.is_empty());
        assert!(textures.get(id).is_some());
        textures.update(&mut TexturesDelta::default());
        assert!(textures.get(id).is_none());
    }
}

//! A picture in memory and its PNG form.

use crate::raster::palette::Color;

/// A picture: rows from the top, pixels from the left, four bytes each: red, green, blue, alpha in sRGB.
///
/// The colour bytes are **premultiplied** by alpha, as egui's textures are, so a picture can be handed to the window
/// without a pass over its pixels. Pictures made by this layer are opaque unless they are filled with something else.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Image {
    width: usize,
    height: usize,
    pixels: Vec<[u8; 4]>,
}

/// Why a picture could not be written as PNG.
#[derive(Debug, thiserror::Error)]
pub enum ImageError {
    /// PNG holds no picture without pixels.
    #[error("expected a picture of at least 1 × 1 pixels, found {width} × {height}")]
    Empty {
        /// Width found, pixels.
        width: usize,
        /// Height found, pixels.
        height: usize,
    },
    /// The encoder refused.
    #[error("cannot encode the picture as PNG")]
    Encode(#[from] png::EncodingError),
}

impl Image {
    /// The longest side a picture may have. A larger wish (a typing slip on the command line) is cut to it, which
    /// bounds the memory of one picture to 1 GiB.
    pub const MAX_SIDE: usize = 16_384;

    /// A picture of one colour. Sides are cut to [`Image::MAX_SIDE`].
    pub fn new(width: usize, height: usize, color: Color) -> Self {
        let (width, height) = (width.min(Self::MAX_SIDE), height.min(Self::MAX_SIDE));
        Self { width, height, pixels: vec![color.premultiplied(); width * height] }
    }

    /// Width in pixels.
    pub fn width(&self) -> usize {
        self.width
    }

    /// Height in pixels.
    pub fn height(&self) -> usize {
        self.height
    }

    /// The pixels, row by row from the top left; `width · height` of them.
    pub fn pixels(&self) -> &[[u8; 4]] {
        &self.pixels
    }

    /// The pixels for writing, in the same order.
    pub fn pixels_mut(&mut self) -> &mut [[u8; 4]] {
        &mut self.pixels
    }

    /// The pixels as one run of bytes: premultiplied RGBA, as a window's texture takes them.
    pub fn as_bytes(&self) -> &[u8] {
        self.pixels.as_flattened()
    }

    /// The pixel in column `x` and row `y`; nothing outside the picture.
    pub fn pixel(&self, x: usize, y: usize) -> Option<[u8; 4]> {
        if x < self.width { self.pixels.get(y * self.width + x).copied() } else { None }
    }

    /// Gives every pixel one colour, keeping the memory.
    pub fn fill(&mut self, color: Color) {
        self.pixels.fill(color.premultiplied());
    }

    /// Makes the picture `width × height` pixels of one colour, keeping the memory where it suffices.
    pub fn reset(&mut self, width: usize, height: usize, color: Color) {
        (self.width, self.height) = (width.min(Self::MAX_SIDE), height.min(Self::MAX_SIDE));
        self.pixels.clear();
        self.pixels.resize(self.width * self.height, color.premultiplied());
    }

    /// Lays `color` over the pixel at (`x`, `y`), weighted by `coverage` in 0..=1. Outside the picture nothing happens.
    #[inline]
    pub fn blend(&mut self, x: i32, y: i32, color: Color, coverage: f32) {
        if x >= 0 && y >= 0 && (x as usize) < self.width && (y as usize) < self.height {
            blend_pixel(&mut self.pixels[y as usize * self.width + x as usize], color, coverage);
        }
    }

    /// Lays `color` over the whole pixels of a rectangle, cut to the picture.
    pub fn fill_rect(&mut self, left: i32, top: i32, width: i32, height: i32, color: Color) {
        let columns = clip_span(left, width, self.width);
        for y in clip_span(top, height, self.height) {
            for pixel in &mut self.pixels[y * self.width + columns.start..y * self.width + columns.end] {
                blend_pixel(pixel, color, 1.0);
            }
        }
    }

    /// Lays another picture over this one with its top left corner at (`left`, `top`), cut to this picture.
    pub fn blit(&mut self, source: &Self, left: i32, top: i32) {
        let columns = clip_span(left, source.width as i32, self.width);
        if columns.is_empty() {
            return;
        }
        let skip = (columns.start as i32 - left) as usize;
        for y in clip_span(top, source.height as i32, self.height) {
            let source_row = (y as i32 - top) as usize * source.width + skip;
            let into = &mut self.pixels[y * self.width + columns.start..y * self.width + columns.end];
            for (under, &over) in into.iter_mut().zip(&source.pixels[source_row..]) {
                *under = over_premultiplied(*under, over);
            }
        }
    }

    /// The picture as the bytes of a PNG file (8 bits a channel, sRGB, straight alpha as PNG wants it).
    ///
    /// # Errors
    /// [`ImageError::Empty`] without pixels, [`ImageError::Encode`] when the encoder gives up.
    pub fn encode_png(&self) -> Result<Vec<u8>, ImageError> {
        if self.pixels.is_empty() {
            return Err(ImageError::Empty { width: self.width, height: self.height });
        }
        let is_opaque = self.pixels.iter().all(|pixel| pixel[3] == 255);
        let mut bytes = Vec::new();
        let mut encoder = png::Encoder::new(&mut bytes, self.width as u32, self.height as u32);
        encoder.set_color(if is_opaque { png::ColorType::Rgb } else { png::ColorType::Rgba });
        encoder.set_depth(png::BitDepth::Eight);
        encoder.set_source_srgb(png::SrgbRenderingIntent::Perceptual);
        let data: Vec<u8> = if is_opaque {
            self.pixels.iter().flat_map(|&[r, g, b, _]| [r, g, b]).collect()
        } else {
            self.pixels.iter().flat_map(|&pixel| straight(pixel)).collect()
        };
        let mut writer = encoder.write_header()?;
        writer.write_image_data(&data)?;
        writer.finish()?;
        Ok(bytes)
    }
}

/// The part of `start .. start + length` inside `0 .. limit`.
fn clip_span(start: i32, length: i32, limit: usize) -> std::ops::Range<usize> {
    let end = start.saturating_add(length).clamp(0, limit as i32);
    start.clamp(0, end) as usize..end as usize
}

/// Premultiplied to straight alpha, rounded.
fn straight([r, g, b, a]: [u8; 4]) -> [u8; 4] {
    if a == 0 {
        return [0; 4];
    }
    let divide = |channel: u8| ((u32::from(channel) * 255 + u32::from(a) / 2) / u32::from(a)).min(255) as u8;
    [divide(r), divide(g), divide(b), a]
}

/// `x / 255`, rounded to nearest, exact for every `x` up to 255².
#[inline]
const fn divide_by_255(x: u32) -> u32 {
    let x = x + 128;
    (x + (x >> 8)) >> 8
}

/// One premultiplied pixel over another.
#[inline]
fn over_premultiplied(under: [u8; 4], over: [u8; 4]) -> [u8; 4] {
    let keep = 255 - u32::from(over[3]);
    let mut out = over;
    for (channel, under) in out.iter_mut().zip(under) {
        *channel = (u32::from(*channel) + divide_by_255(u32::from(under) * keep)).min(255) as u8;
    }
    out
}

/// The nearest whole number to `value` in 0..=255. Adding 2²³ leaves no bits for a fraction, so the whole number
/// stands in the low bits; unlike `as` this works on several numbers at a time.
#[inline]
pub(super) const fn to_byte(value: f32) -> u32 {
    (value + 8_388_608.0).to_bits() & 0xFF
}

/// `color` over `pixel`, weighted by `coverage` in 0..=1.
#[inline]
pub(super) fn blend_pixel(pixel: &mut [u8; 4], color: Color, coverage: f32) {
    let alpha = (f32::from(color.a) * coverage + 0.5) as u32;
    mix_pixel(pixel, [color.r, color.g, color.b], alpha.min(255));
}

/// A colour over `pixel` with `alpha` in 0..=255.
#[inline]
pub(super) fn mix_pixel(pixel: &mut [u8; 4], rgb: [u8; 3], alpha: u32) {
    let keep = 255 - alpha;
    let mix = |under: u8, over: u8| divide_by_255(u32::from(under) * keep + u32::from(over) * alpha) as u8;
    *pixel = [mix(pixel[0], rgb[0]), mix(pixel[1], rgb[1]), mix(pixel[2], rgb[2]), mix(pixel[3], 255)];
}

#[cfg(test)]
mod tests {
    use super::*;

    const RED: Color = Color::rgb(0xFF_00_00);

    #[test]
    fn opaque_ink_covers_and_half_coverage_mixes() {
        let mut image = Image::new(2, 1, Color::rgb(0x00_00_00));
        image.blend(0, 0, RED, 1.0);
        image.blend(1, 0, RED, 0.5);
        assert_eq!(image.pixels(), &[[255, 0, 0, 255], [128, 0, 0, 255]]);
    }

    #[test]
    fn drawing_outside_the_picture_is_harmless() {
        let mut image = Image::new(3, 2, Color::rgb(0));
        let before = image.clone();
        image.blend(-1, 0, RED, 1.0);
        image.blend(0, 2, RED, 1.0);
        image.fill_rect(5, 5, 9, 9, RED);
        image.fill_rect(i32::MAX - 1, 0, i32::MAX, 1, RED);
        image.blit(&Image::new(2, 2, RED), -2, 0);
        assert_eq!(image, before);
        assert_eq!(image.pixel(3, 0), None);
    }

    #[test]
    fn blit_cuts_at_every_border() {
        let mut image = Image::new(2, 2, Color::rgb(0));
        image.blit(&Image::new(2, 2, RED), -1, 1);
        let red: Vec<bool> = image.pixels().iter().map(|pixel| pixel[0] == 255).collect();
        assert_eq!(red, [false, false, true, false]);
    }

    #[test]
    fn division_by_255_is_exact_rounding() {
        for x in 0..=255 * 255_u32 {
            assert_eq!(divide_by_255(x), (x + 127) / 255, "{x}");
        }
    }

    #[test]
    fn png_round_trip_keeps_pixels_and_straightens_alpha() {
        let mut image = Image::new(2, 1, Color::TRANSPARENT);
        image.blend(0, 0, Color::rgb(0x20_40_80), 0.5);
        let bytes = image.encode_png().unwrap();
        let mut reader = png::Decoder::new(std::io::Cursor::new(bytes)).read_info().unwrap();
        let mut data = vec![0; reader.output_buffer_size().unwrap()];
        let info = reader.next_frame(&mut data).unwrap();
        assert_eq!((info.width, info.height, info.color_type), (2, 1, png::ColorType::Rgba));
        assert_eq!(data, [0x20, 0x40, 0x80, 128, 0, 0, 0, 0]);
    }

    #[test]
    fn an_empty_picture_is_told_in_words() {
        let error = Image::new(0, 7, RED).encode_png().unwrap_err();
        assert_eq!(error.to_string(), "expected a picture of at least 1 × 1 pixels, found 0 × 7");
    }
}

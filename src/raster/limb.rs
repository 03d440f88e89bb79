//! A limb in the picture: its shape, light, flat mark and the dark edge it lays on what stands behind it.

use glam::Vec2;

use crate::raster::canvas::{Canvas, FAR};
use crate::raster::image::{mix_pixel, to_byte};
use crate::raster::palette::Color;
use crate::raster::shape::{ConeFrame, RoundCone};

/// A limb in the picture: a round cone with depth.
#[derive(Clone, Copy, Debug)]
pub(super) struct SolidCone {
    pub(super) shape: RoundCone,
    pub(super) key_a: f32,
    pub(super) key_b: f32,
    /// How much nearer than its axis the middle of the surface is, in depth keys.
    pub(super) bulge_a: f32,
    pub(super) bulge_b: f32,
}

/// How a limb looks.
#[derive(Clone, Copy, Debug)]
pub(super) struct SolidStyle {
    pub(super) color: Color,
    /// Colour of the flat mark near end `b`; none for balls.
    pub(super) mark: Option<Color>,
    /// A ring of this width (pixels) and colour just inside the outline.
    pub(super) ring: Option<(f32, Color)>,
    /// Width of the dark edge laid on what stands well behind the limb, pixels.
    pub(super) halo: f32,
}

impl SolidCone {
    /// The two ends as balls, the far one first: what shows of a limb that points at the eye.
    fn balls_from_back(&self) -> [Self; 2] {
        let ball = |at: Vec2, radius: f32, key: f32, bulge: f32| Self {
            shape: RoundCone { a: at, b: at, radius_a: radius, radius_b: radius },
            key_a: key,
            key_b: key,
            bulge_a: bulge,
            bulge_b: bulge,
        };
        let a = ball(self.shape.a, self.shape.radius_a, self.key_a, self.bulge_a);
        let b = ball(self.shape.b, self.shape.radius_b, self.key_b, self.bulge_b);
        if self.key_a < self.key_b { [a, b] } else { [b, a] }
    }
}

/// How many pixels of a row are worked out at a time: plain loops over so many numbers become vector instructions.
const LANES: usize = 8;

/// Light from the upper left, a little before the figure; x right, y down, z to the viewer. Unit length.
const LIGHT: [f32; 3] = [-0.40, -0.62, 0.675];

/// A limb's surface, ready for its pixels.
struct Surface {
    frame: ConeFrame,
    key: [f32; 2],
    bulge: [f32; 2],
    /// The light along the limb's axis, across it and towards the viewer.
    light: [f32; 3],
}

/// What [`LANES`] neighbouring pixels see of a limb.
struct Lanes {
    /// Covered share, 0..=255.
    alpha: [u32; LANES],
    /// Brightness, an index into [`Tones`].
    tone: [u32; LANES],
    /// Depth of the surface.
    key: [f32; LANES],
    /// Depth behind which something counts as well behind the limb.
    behind: [f32; LANES],
    /// To the outline, pixels; negative inside.
    distance: [f32; LANES],
}

impl Surface {
    fn new(cone: &SolidCone, frame: ConeFrame) -> Self {
        let axis = frame.axis();
        let along = LIGHT[0] * axis.x + LIGHT[1] * axis.y;
        let across = LIGHT[1] * axis.x - LIGHT[0] * axis.y;
        Self {
            frame,
            key: [cone.key_a, cone.key_b - cone.key_a],
            bulge: [cone.bulge_a, cone.bulge_b - cone.bulge_a],
            light: [along, across, LIGHT[2]],
        }
    }

    #[inline]
    fn lanes(&self, start: Vec2) -> Lanes {
        let mut lanes = Lanes {
            alpha: [0; LANES],
            tone: [0; LANES],
            key: [0.0; LANES],
            behind: [0.0; LANES],
            distance: [0.0; LANES],
        };
        for lane in 0..LANES {
            let sample = self.frame.sample(Vec2::new(start.x + lane as f32, start.y));
            // On the rim a pixel's middle may lie outside: its normal is then held to unit length.
            let inverse = 1.0 / sample.radius.max(sample.out_length).max(0.25);
            let (along, across) = (sample.out.x * inverse, sample.out.y * inverse);
            let z = (1.0 - along * along - across * across).max(0.0).sqrt();
            let toward = along * self.light[0] + across * self.light[1] + z * self.light[2];
            let axis_key = self.key[0] + self.key[1] * sample.t;
            let bulge = self.bulge[0] + self.bulge[1] * sample.t;
            lanes.distance[lane] = sample.distance;
            lanes.key[lane] = axis_key + bulge * z;
            lanes.behind[lane] = axis_key - 2.0 * bulge;
            lanes.alpha[lane] = to_byte((0.5 - sample.distance).clamp(0.0, 1.0) * 255.0);
            // Wrapped diffuse light keeps the shaded side legible; the z term darkens every outline a little, which
            // is what separates two crossing limbs of one colour.
            let factor = 0.26 + 0.62 * (0.5 + 0.5 * toward) + 0.22 * z;
            lanes.tone[lane] = to_byte((factor * TONES_AT_ONE).clamp(0.0, 255.0));
        }
        lanes
    }
}

/// The tone that stands for a brightness of 1.
const TONES_AT_ONE: f32 = 225.0;

/// A colour at 256 brightnesses, opaque.
struct Tones([[u8; 4]; 256]);

impl Tones {
    fn new(color: Color) -> Self {
        let scale = |channel: u8, tone: usize| {
            (f32::from(channel) * tone as f32 * (1.0 / TONES_AT_ONE) + 0.5).min(255.0) as u8
        };
        Self(std::array::from_fn(|tone| {
            [scale(color.r, tone), scale(color.g, tone), scale(color.b, tone), 255]
        }))
    }

    #[inline]
    fn at(&self, tone: u32) -> [u8; 4] {
        self.0[(tone & 0xFF) as usize]
    }
}

/// The flat band across a limb near its end: its place leaves room for the round end and for the next limb.
struct Mark {
    at: f32,
    half: f32,
    tones: Tones,
}

impl Mark {
    fn new(cone: &SolidCone, style: &SolidStyle) -> Option<Self> {
        let length = cone.shape.a.distance(cone.shape.b);
        let end_radius = cone.shape.radius_b;
        let color = style.mark.filter(|_| length > 5.0 * end_radius + 4.0)?;
        let half = (0.30 * end_radius).max(0.75);
        Some(Self { at: length - 2.2 * end_radius.max(1.0) - half, half, tones: Tones::new(color) })
    }
}

impl Canvas {
    /// Draws a limb with light, depth and a soft outline. Limbs should come from back to front: depth is right in any
    /// order, but outlines are blended with what is there already.
    pub(super) fn solid(&mut self, cone: &SolidCone, style: &SolidStyle) {
        if cone.shape.is_swallowed() && cone.shape.a != cone.shape.b {
            let plain = SolidStyle { mark: None, ..*style };
            for ball in cone.balls_from_back() {
                self.solid(&ball, &plain);
            }
            return;
        }
        let (width, height) = (self.width(), self.height());
        let (pixels, depth) = (self.image.pixels_mut(), &mut self.depth[..]);
        let frame = cone.shape.frame();
        let surface = Surface::new(cone, frame);
        let ink = Ink::new(cone, style, frame);
        cone.shape.rows(&frame, width, height, ink.halo, |row, columns, first| {
            let span = row * width + columns.start..row * width + columns.end;
            let chunks = pixels[span.clone()].chunks_mut(LANES).zip(depth[span].chunks_mut(LANES));
            for (chunk, (pixels, depths)) in chunks.enumerate() {
                let start = Vec2::new(first.x + (chunk * LANES) as f32, first.y);
                let lanes = surface.lanes(start);
                let pixels = pixels.iter_mut().zip(depths).enumerate();
                if ink.is_plain(start, &lanes) {
                    for (lane, (pixel, standing)) in pixels {
                        if lanes.key[lane] > *standing {
                            *pixel = ink.tones.at(lanes.tone[lane]);
                            *standing = lanes.key[lane];
                        }
                    }
                } else {
                    for (lane, (pixel, standing)) in pixels {
                        ink.draw(start, &lanes, lane, pixel, standing);
                    }
                }
            }
        });
    }
}

/// A limb's looks, ready for its pixels.
struct Ink {
    frame: ConeFrame,
    tones: Tones,
    mark: Option<Mark>,
    ring: Option<(f32, Color)>,
    halo: f32,
    /// Deeper inside than this, pixels, there is neither soft rim nor ring.
    rim: f32,
}

impl Ink {
    fn new(cone: &SolidCone, style: &SolidStyle, frame: ConeFrame) -> Self {
        Self {
            frame,
            tones: Tones::new(style.color),
            mark: Mark::new(cone, style),
            ring: style.ring,
            halo: style.halo.max(0.5),
            rim: 0.5 + style.ring.map_or(0.0, |(width, _)| width),
        }
    }

    /// Whether all pixels from `start` lie well inside and clear of the mark: most do, and need no further thought.
    #[inline]
    fn is_plain(&self, start: Vec2, lanes: &Lanes) -> bool {
        let outermost = lanes.distance.iter().fold(f32::NEG_INFINITY, |most, &distance| most.max(distance));
        outermost < -self.rim
            && self.mark.as_ref().is_none_or(|mark| {
                let along = self.frame.along(start + Vec2::new(LANES as f32 / 2.0, 0.0));
                (along - mark.at).abs() > mark.half + 0.5 + LANES as f32 / 2.0
            })
    }

    /// Draws one pixel, whatever it meets there.
    #[inline]
    fn draw(&self, start: Vec2, lanes: &Lanes, lane: usize, pixel: &mut [u8; 4], standing: &mut f32) {
        let alpha = lanes.alpha[lane];
        if alpha < 255 {
            // Beside the limb and under its soft rim: darken what stands well behind it.
            let near = ((self.halo - lanes.distance[lane]) / self.halo).min(1.0);
            if near > 0.0 && *standing != FAR && *standing < lanes.behind[lane] {
                mix_pixel(pixel, [0, 0, 0], (near * 130.0) as u32);
            }
        }
        let key = lanes.key[lane];
        if alpha == 0 || key <= *standing {
            return;
        }
        let mut color = self.tones.at(lanes.tone[lane]);
        if let Some(mark) = &self.mark {
            let along = self.frame.along(start + Vec2::new(lane as f32, 0.0));
            let inside = (mark.half + 0.5 - (along - mark.at).abs()).clamp(0.0, 1.0);
            if inside > 0.0 {
                let [r, g, b, _] = mark.tones.at(lanes.tone[lane]);
                mix_pixel(&mut color, [r, g, b], to_byte(inside * 255.0));
            }
        }
        if let Some((ring, ring_color)) = self.ring {
            let inside = (lanes.distance[lane] + ring + 0.5).clamp(0.0, 1.0);
            if inside > 0.0 {
                mix_pixel(&mut color, [ring_color.r, ring_color.g, ring_color.b], to_byte(inside * 255.0));
            }
        }
        if alpha == 255 {
            *pixel = color;
        } else {
            let [r, g, b, _] = color;
            mix_pixel(pixel, [r, g, b], alpha);
        }
        if alpha >= 128 {
            *standing = key;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const WHITE: Color = Color::rgb(0xFF_FF_FF);
    const RED: Color = Color::rgb(0xFF_00_00);

    fn limb(a: [f32; 2], b: [f32; 2], key: f32) -> SolidCone {
        SolidCone {
            shape: RoundCone { a: a.into(), b: b.into(), radius_a: 5.0, radius_b: 5.0 },
            key_a: key,
            key_b: key,
            bulge_a: 0.01,
            bulge_b: 0.01,
        }
    }

    fn plain(color: Color) -> SolidStyle {
        SolidStyle { color, mark: None, ring: None, halo: 0.5 }
    }

    #[test]
    fn the_nearer_limb_wins_in_either_order() {
        let near = (limb([10.0, 30.0], [50.0, 30.0], 2.0), plain(RED));
        let far = (limb([30.0, 10.0], [30.0, 50.0], 1.0), plain(WHITE));
        for order in [[near, far], [far, near]] {
            let mut canvas = Canvas::new(60, 60, Color::rgb(0));
            for (cone, style) in order {
                canvas.solid(&cone, &style);
            }
            let crossing = canvas.image.pixel(30, 30).unwrap();
            assert!(crossing[0] > 150 && crossing[1] == 0, "{crossing:?}");
            assert!(canvas.image.pixel(30, 15).unwrap()[1] > 150);
        }
    }

    #[test]
    fn a_limb_seen_end_on_shows_the_nearer_end() {
        let mut cone = limb([30.0, 30.0], [31.0, 30.0], 1.0);
        (cone.shape.radius_b, cone.key_b) = (2.0, 3.0);
        let mut canvas = Canvas::new(60, 60, Color::rgb(0));
        canvas.solid(&cone, &plain(WHITE));
        let depth_at_middle = canvas.depth[30 * 60 + 31];
        assert!(depth_at_middle > 2.9, "{depth_at_middle}");
        assert!(canvas.image.pixel(34, 30).unwrap()[0] > 100);
    }
}

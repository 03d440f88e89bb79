//! A limb in the picture: its shape, light, flat mark and the dark edge it lays on what stands behind it.
#![expect(
    clippy::inline_always,
    reason = "what stays a function of its own is not built with wide instructions"
)]

use glam::Vec2;

use crate::raster::canvas::{Canvas, FAR};
use crate::raster::image::{mix_pixel, to_byte};
use crate::raster::palette::Color;
use crate::raster::shape::{ConeFrame, RoundCone};
use crate::rotor::batch::Level;

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
    /// Whether it has a flat, darker mark near end `b`; balls have none.
    pub(super) has_mark: bool,
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

/// How dark the edge is that a limb lays on what stands well behind it.
const HALO: f32 = 130.0 / 255.0;

/// How much darker the flat mark is than the limb.
const MARK: f32 = 0.45;

/// A limb's surface and looks, ready for its pixels.
struct Surface {
    frame: ConeFrame,
    key: [f32; 2],
    bulge: [f32; 2],
    /// The light along the limb's axis, across it and towards the viewer.
    light: [f32; 3],
    /// Red, green, blue.
    color: [f32; 3],
    halo: f32,
    /// Middle and half width of the flat mark along the axis, pixels; far away where there is none.
    mark: [f32; 2],
    ring: Option<(f32, Color)>,
}

/// Where [`LANES`] neighbouring pixels lie on a limb.
struct Places {
    /// To the outline, pixels; negative inside.
    distance: [f32; LANES],
    /// Along the axis, 0 to 1.
    t: [f32; LANES],
    /// From there to the pixel along the axis and across it, pixels.
    out: [[f32; LANES]; 2],
    /// One over the radius there, or over the distance from the axis where that is longer.
    inverse: [f32; LANES],
}

/// What [`LANES`] neighbouring pixels see of a limb.
struct Lanes {
    /// To the outline, pixels; negative inside.
    distance: [f32; LANES],
    /// Depth of the surface.
    key: [f32; LANES],
    /// Depth behind which something counts as well behind the limb.
    behind: [f32; LANES],
    /// Brightness.
    tone: [f32; LANES],
}

impl Surface {
    fn new(cone: &SolidCone, style: &SolidStyle, frame: ConeFrame) -> Self {
        let axis = frame.axis();
        let along = LIGHT[0] * axis.x + LIGHT[1] * axis.y;
        let across = LIGHT[1] * axis.x - LIGHT[0] * axis.y;
        Self {
            frame,
            key: [cone.key_a, cone.key_b - cone.key_a],
            bulge: [cone.bulge_a, cone.bulge_b - cone.bulge_a],
            light: [along, across, LIGHT[2]],
            color: [style.color.r, style.color.g, style.color.b].map(f32::from),
            halo: style.halo.max(0.5),
            mark: if style.has_mark { mark_of(cone) } else { None }.unwrap_or([-1e9, 0.0]),
            ring: style.ring,
        }
    }

    #[inline(always)]
    fn places(&self, start: Vec2) -> Places {
        let zero = [0.0; LANES];
        let mut places = Places { distance: zero, t: zero, out: [zero; 2], inverse: zero };
        for lane in 0..LANES {
            let sample = self.frame.sample(Vec2::new(start.x + lane as f32, start.y));
            places.distance[lane] = sample.distance;
            places.t[lane] = sample.t;
            places.out[0][lane] = sample.out.x;
            places.out[1][lane] = sample.out.y;
            // On the rim a pixel's middle may lie outside: its normal is then held to unit length.
            places.inverse[lane] = 1.0 / sample.radius.max(sample.out_length).max(0.25);
        }
        places
    }

    #[inline(always)]
    fn lanes(&self, start: Vec2, places: &Places) -> Lanes {
        let zero = [0.0; LANES];
        let mut lanes = Lanes { distance: places.distance, key: zero, behind: zero, tone: zero };
        for lane in 0..LANES {
            let inverse = places.inverse[lane];
            let (along, across) = (places.out[0][lane] * inverse, places.out[1][lane] * inverse);
            let z = (1.0 - along * along - across * across).max(0.0).sqrt();
            let toward = along * self.light[0] + across * self.light[1] + z * self.light[2];
            let axis_key = self.key[0] + self.key[1] * places.t[lane];
            let bulge = self.bulge[0] + self.bulge[1] * places.t[lane];
            lanes.key[lane] = axis_key + bulge * z;
            lanes.behind[lane] = axis_key - 2.0 * bulge;
            // Wrapped diffuse light keeps the shaded side legible; the z term darkens every outline a little, which
            // is what separates two crossing limbs of one colour.
            let tone = 0.26 + 0.62 * (0.5 + 0.5 * toward) + 0.22 * z;
            let from_mark =
                (self.frame.along(Vec2::new(start.x + lane as f32, start.y)) - self.mark[0]).abs();
            let marked = (self.mark[1] + 0.5 - from_mark).clamp(0.0, 1.0);
            lanes.tone[lane] = tone.max(0.0) * (1.0 - MARK * marked);
        }
        lanes
    }

    /// Draws a chunk of pixels that lie well inside: most do.
    #[inline(always)]
    fn draw_inside(&self, lanes: &Lanes, pixels: &mut [[u8; 4]; LANES], depths: &mut [f32; LANES]) {
        let mut olds = [0_u32; LANES];
        for lane in 0..LANES {
            olds[lane] = u32::from_le_bytes(pixels[lane]);
        }
        for lane in 0..LANES {
            let channel = |value: f32| to_byte((value * lanes.tone[lane]).min(255.0));
            let [r, g, b] = self.color.map(channel);
            let ink = r | g << 8 | b << 16 | 0xFF00_0000;
            let nearer = u32::from(lanes.key[lane] > depths[lane]).wrapping_neg();
            olds[lane] = (ink & nearer) | (olds[lane] & !nearer);
            depths[lane] = depths[lane].max(lanes.key[lane]);
        }
        for lane in 0..LANES {
            pixels[lane] = olds[lane].to_le_bytes();
        }
    }

    /// Draws a chunk of pixels at the rim: beside the limb and under its soft rim what stands well behind it gets darker.
    #[inline(always)]
    fn draw_rim(&self, lanes: &Lanes, pixels: &mut [[u8; 4]; LANES], depths: &mut [f32; LANES]) {
        let inverse_halo = 1.0 / self.halo;
        let mut inks = [0_u32; LANES];
        for lane in 0..LANES {
            let alpha = (0.5 - lanes.distance[lane]).clamp(0.0, 1.0);
            let standing = depths[lane];
            let near = ((self.halo - lanes.distance[lane]) * inverse_halo).clamp(0.0, 1.0);
            let is_shaded = alpha < 1.0 && standing > FAR && standing < lanes.behind[lane];
            let left = if is_shaded { 1.0 - near * HALO } else { 1.0 };
            let share = if lanes.key[lane] > standing { alpha } else { 0.0 };
            let old = u32::from_le_bytes(pixels[lane]);
            let channel = |shift: u32, color: f32| {
                let under = ((old >> shift) & 0xFF) as f32 * left;
                let over = (color * lanes.tone[lane]).min(255.0);
                to_byte(under + (over - under) * share) << shift
            };
            let [r, g, b] = self.color;
            let opacity = (old >> 24) as f32;
            let opacity = to_byte(opacity + (255.0 - opacity) * share) << 24;
            inks[lane] = channel(0, r) | channel(8, g) | channel(16, b) | opacity;
        }
        for lane in 0..LANES {
            pixels[lane] = inks[lane].to_le_bytes();
            let covers = lanes.distance[lane] <= 0.0 && lanes.key[lane] > depths[lane];
            depths[lane] = if covers { lanes.key[lane] } else { depths[lane] };
        }
    }

    /// Lays the ring of a chosen limb over pixels that have just been drawn.
    #[inline(always)]
    fn draw_ring(lanes: &Lanes, pixels: &mut [[u8; 4]; LANES], visible: [bool; LANES], ring: (f32, Color)) {
        let (width, color) = ring;
        for lane in 0..LANES {
            let inside = (lanes.distance[lane] + width + 0.5).clamp(0.0, 1.0);
            let alpha = (0.5 - lanes.distance[lane]).clamp(0.0, 1.0);
            if inside > 0.0 && alpha > 0.0 && visible[lane] {
                mix_pixel(&mut pixels[lane], [color.r, color.g, color.b], to_byte(inside * alpha * 255.0));
            }
        }
    }

    #[inline(always)]
    fn draw(&self, start: Vec2, pixels: &mut [[u8; 4]; LANES], depths: &mut [f32; LANES]) {
        let places = self.places(start);
        let (mut outermost, mut innermost) = (f32::NEG_INFINITY, f32::INFINITY);
        for lane in 0..LANES {
            outermost = outermost.max(places.distance[lane]);
            innermost = innermost.min(places.distance[lane]);
        }
        if innermost >= self.halo {
            return;
        }
        let lanes = self.lanes(start, &places);
        if let Some(ring) = self.ring {
            let visible = std::array::from_fn(|lane| lanes.key[lane] > depths[lane]);
            self.draw_rim(&lanes, pixels, depths);
            Self::draw_ring(&lanes, pixels, visible, ring);
        } else if outermost < -0.5 {
            self.draw_inside(&lanes, pixels, depths);
        } else {
            self.draw_rim(&lanes, pixels, depths);
        }
    }
}

/// Middle and half width of the flat band across a limb near its end, pixels along the axis: its place leaves room for the round
/// end and for the next limb. `None` on a limb too short for one.
fn mark_of(cone: &SolidCone) -> Option<[f32; 2]> {
    let length = cone.shape.a.distance(cone.shape.b);
    let end_radius = cone.shape.radius_b;
    let half = (0.30 * end_radius).max(0.75);
    let at = length - 2.2 * end_radius.max(1.0) - half;
    (length > 5.0 * end_radius + 4.0).then_some([at, half])
}

impl Canvas {
    /// Draws a limb with light, depth and a soft outline. Limbs should come from back to front: depth is right in any
    /// order, but outlines are blended with what is there already.
    pub(super) fn solid(&mut self, cone: &SolidCone, style: &SolidStyle) {
        if cone.shape.is_swallowed() && cone.shape.a != cone.shape.b {
            let plain = SolidStyle { has_mark: false, ..*style };
            for ball in cone.balls_from_back() {
                self.solid(&ball, &plain);
            }
            return;
        }
        let (width, height) = (self.width(), self.height());
        let (pixels, depth) = (self.image.pixels_mut(), &mut self.depth[..]);
        let frame = cone.shape.frame();
        let surface = Surface::new(cone, style, frame);
        Level::best().run(
            #[inline(always)]
            || {
                cone.shape.rows(
                    &frame,
                    width,
                    height,
                    surface.halo,
                    #[inline(always)]
                    |row, columns, first| {
                        let span = row * width + columns.start..row * width + columns.end;
                        let (whole, rest) = pixels[span.clone()].as_chunks_mut::<LANES>();
                        let (whole_depth, rest_depth) = depth[span].as_chunks_mut::<LANES>();
                        let mut start = first;
                        for (pixels, depths) in whole.iter_mut().zip(whole_depth) {
                            surface.draw(start, pixels, depths);
                            start.x += LANES as f32;
                        }
                        if !rest.is_empty() {
                            // The last few: drawn aside and taken over.
                            let mut some = [[0; 4]; LANES];
                            let mut some_depth = [f32::INFINITY; LANES];
                            some[..rest.len()].copy_from_slice(rest);
                            some_depth[..rest.len()].copy_from_slice(rest_depth);
                            surface.draw(start, &mut some, &mut some_depth);
                            rest.copy_from_slice(&some[..rest.len()]);
                            rest_depth.copy_from_slice(&some_depth[..rest.len()]);
                        }
                    },
                );
            },
        );
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
        SolidStyle { color, has_mark: false, ring: None, halo: 0.5 }
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

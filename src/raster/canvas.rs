//! A picture with a depth for every pixel, and what is drawn on it.

use glam::{DVec3, Vec2};

use crate::raster::camera::{Projection, View};
use crate::raster::image::{Image, blend_pixel, to_byte};
use crate::raster::palette::Color;
use crate::raster::shape::{PolygonScan, RoundCone, pixel_span, scan_line};

/// The depth of a pixel on which nothing stands.
pub(super) const FAR: f32 = f32::NEG_INFINITY;

/// A picture being drawn. Kept and reused from frame to frame, it allocates nothing.
#[derive(Debug)]
pub struct Canvas {
    /// The picture so far.
    pub image: Image,
    /// Depth key of each pixel (see [`View::key`]): larger is nearer.
    pub(super) depth: Vec<f32>,
    polygons: PolygonScan,
    /// A share for each pixel, gathered while shadows or a long line are drawn; all zero at other times.
    mask: Vec<u8>,
}

impl Default for Canvas {
    fn default() -> Self {
        Self {
            image: Image::new(0, 0, Color::TRANSPARENT),
            depth: Vec::new(),
            polygons: PolygonScan::default(),
            mask: Vec::new(),
        }
    }
}

/// What a line or a mark does where something stands nearer to the eye.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Hidden {
    /// It is drawn over it.
    Shown,
    /// It is left out.
    Cut,
    /// It is drawn with this share of its opacity.
    Faint(f32),
}

/// A place in the picture with its depth key.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Spot {
    pub(super) pixel: Vec2,
    pub(super) key: f32,
}

impl Spot {
    pub(super) fn new(view: &View, seen: &Projection) -> Self {
        Self { pixel: seen.pixel.as_vec2(), key: view.key(seen.depth) }
    }

    /// The place of a world point; nothing behind the eye.
    pub(super) fn of(view: &View, point: DVec3) -> Option<Self> {
        view.project(point).map(|seen| Self::new(view, &seen))
    }
}

/// On and off lengths of a dashed line, pixels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Dash {
    /// Length of a stroke.
    pub on: f32,
    /// Length of a gap.
    pub off: f32,
}

/// How a line looks.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stroke {
    /// Ink.
    pub color: Color,
    /// Pixels. Lines under one pixel are one pixel wide and fainter.
    pub width: f32,
    /// Solid when absent.
    pub dash: Option<Dash>,
    /// What happens behind things.
    pub hidden: Hidden,
}

impl Stroke {
    /// A solid line over everything.
    pub fn over(color: Color, width: f32) -> Self {
        Self { color, width, dash: None, hidden: Hidden::Shown }
    }
}

impl Canvas {
    /// A canvas of one colour on which nothing stands.
    pub fn new(width: usize, height: usize, color: Color) -> Self {
        let mut canvas = Self::default();
        canvas.reset(width, height, color);
        canvas
    }

    /// Starts over with another size and colour, keeping the memory.
    pub fn reset(&mut self, width: usize, height: usize, color: Color) {
        self.image.reset(width, height, color);
        self.depth.clear();
        self.depth.resize(self.image.pixels().len(), FAR);
        // All zero, so a cut or a longer run of zeros is as good as new.
        self.mask.truncate(self.depth.len());
    }

    /// Scratch room with zeros, to be given back so; as long as it needs to be or shorter.
    pub(super) fn mask(&mut self) -> &mut Vec<u8> {
        &mut self.mask
    }

    /// Width in pixels.
    pub fn width(&self) -> usize {
        self.image.width()
    }

    /// Height in pixels.
    pub fn height(&self) -> usize {
        self.image.height()
    }

    /// Draws a line between two places; `ink(t)` is the share of its opacity at `t` of the way (0..=1 in pixels).
    /// `dashed_before` is the length of the dash pattern already used up by earlier pieces, pixels.
    pub(super) fn line_with(
        &mut self,
        a: Spot,
        b: Spot,
        stroke: &Stroke,
        dashed_before: f32,
        ink: impl Fn(f32) -> f32,
    ) {
        let (width, height) = (self.width(), self.height());
        let (pixels, depth) = (self.image.pixels_mut(), &self.depth[..]);
        let thin = stroke.width.clamp(0.0, 1.0);
        let radius = stroke.width.max(1.0) / 2.0;
        let length = a.pixel.distance(b.pixel);
        let share = |t| thin * ink(t);
        scan_line([a.pixel, b.pixel], radius, [width, height], share, |index, t, share| {
            let hidden = hidden_share(stroke.hidden, a.key + (b.key - a.key) * t, depth[index]);
            let dashed = stroke.dash.map_or(1.0, |dash| dash_share(dash, dashed_before + length * t));
            blend_pixel(&mut pixels[index], stroke.color, share * hidden * dashed);
        });
    }

    /// Draws a line between two world points.
    pub fn line(&mut self, view: &View, from: DVec3, to: DVec3, stroke: &Stroke) {
        self.polyline(view, &[from, to], stroke);
    }

    /// Draws a line through world points; dashes run on over the corners. Points that are not finite leave a gap.
    pub fn polyline(&mut self, view: &View, points: &[DVec3], stroke: &Stroke) {
        let pieces = points.windows(2).filter_map(|pair| view.project_line(pair[0], pair[1]));
        let pieces: Vec<[Spot; 2]> =
            pieces.map(|[(a, _), (b, _)]| [Spot::new(view, &a), Spot::new(view, &b)]).collect();
        self.strokes(&pieces, stroke);
    }

    /// Draws a line through places of the picture (pixels), over everything. Places that are not finite leave a gap.
    pub fn flat_polyline(&mut self, points: &[Vec2], stroke: &Stroke) {
        let spot = |pixel| Spot { pixel, key: 0.0 };
        let pieces: Vec<[Spot; 2]> = points
            .windows(2)
            .filter(|pair| pair[0].is_finite() && pair[1].is_finite())
            .map(|pair| [spot(pair[0]), spot(pair[1])])
            .collect();
        self.strokes(&pieces, &Stroke { hidden: Hidden::Shown, ..*stroke });
    }

    /// Draws pieces that make up one line. Where pieces meet, the line is no darker than elsewhere: their covered
    /// shares are gathered first (the larger counts) and inked once.
    fn strokes(&mut self, pieces: &[[Spot; 2]], stroke: &Stroke) {
        if let [[a, b]] = pieces {
            self.line_with(*a, *b, stroke, 0.0, |_| 1.0);
            return;
        }
        let (width, height) = (self.width(), self.height());
        let mut mask = std::mem::take(&mut self.mask);
        mask.resize(width * height, 0);
        let (mut low, mut high) = (Vec2::INFINITY, Vec2::NEG_INFINITY);
        let radius = stroke.width.max(1.0) / 2.0;
        let mut dashed_before = 0.0;
        for [a, b] in pieces {
            let length = a.pixel.distance(b.pixel);
            scan_line(
                [a.pixel, b.pixel],
                radius,
                [width, height],
                |_| stroke.width.min(1.0),
                |index, t, share| {
                    let hidden = hidden_share(stroke.hidden, a.key + (b.key - a.key) * t, self.depth[index]);
                    let dashed = stroke.dash.map_or(1.0, |dash| dash_share(dash, dashed_before + length * t));
                    mask[index] = mask[index].max(to_byte(share * hidden * dashed * 255.0) as u8);
                },
            );
            dashed_before += length;
            low = low.min(a.pixel).min(b.pixel);
            high = high.max(a.pixel).max(b.pixel);
        }
        let columns = pixel_span(low.x - radius - 1.0, high.x + radius + 1.0, width);
        for row in pixel_span(low.y - radius - 1.0, high.y + radius + 1.0, height) {
            let span = row * width + columns.start..row * width + columns.end;
            for (pixel, share) in self.image.pixels_mut()[span.clone()].iter_mut().zip(&mut mask[span]) {
                if *share > 0 {
                    blend_pixel(pixel, stroke.color, f32::from(*share) / 255.0);
                    *share = 0;
                }
            }
        }
        self.mask = mask;
    }

    /// Draws a round dot of `radius` pixels at a world point.
    pub fn dot(&mut self, view: &View, point: DVec3, radius: f32, color: Color, hidden: Hidden) {
        if let Some(spot) = Spot::of(view, point) {
            let stroke = Stroke { color, width: 2.0 * radius, dash: None, hidden };
            self.line_with(spot, spot, &stroke, 0.0, |_| 1.0);
        }
    }

    /// Draws a round dot of `radius` pixels at a place in the picture.
    pub fn flat_dot(&mut self, at: Vec2, radius: f32, color: Color) {
        let spot = Spot { pixel: at, key: 0.0 };
        self.line_with(spot, spot, &Stroke::over(color, 2.0 * radius), 0.0, |_| 1.0);
    }

    /// Draws a ring of `radius` pixels at a place in the picture.
    pub fn flat_ring(&mut self, at: Vec2, radius: f32, stroke_width: f32, color: Color) {
        let (width, height) = (self.width(), self.height());
        let pixels = self.image.pixels_mut();
        let shape = RoundCone { a: at, b: at, radius_a: radius, radius_b: radius };
        let frame = shape.frame();
        shape.rows(&frame, width, height, stroke_width, |row, columns, first| {
            for (i, column) in columns.enumerate() {
                let sample = frame.sample(first + Vec2::new(i as f32, 0.0));
                let coverage = (stroke_width / 2.0 + 0.5 - sample.distance.abs()).clamp(0.0, 1.0);
                blend_pixel(&mut pixels[row * width + column], color, coverage);
            }
        });
    }

    /// Fills a flat outline of the picture (pixels), over everything.
    pub fn flat_polygon(&mut self, points: &[Vec2], color: Color) {
        self.flat_polygons(&[points], color);
    }

    /// Fills nested outlines of the picture by the odd-even rule, over everything.
    pub fn flat_polygons(&mut self, rings: &[&[Vec2]], color: Color) {
        let (width, height) = (self.width(), self.height());
        let pixels = self.image.pixels_mut();
        self.polygons.scan(rings, width, height, |x, y, coverage| {
            blend_pixel(&mut pixels[y * width + x], color, coverage);
        });
    }

    /// Fills an outline that is flat in the world. Nothing is drawn when a part of it is behind the eye.
    pub fn polygon(&mut self, view: &View, points: &[DVec3], color: Color, hidden: Hidden) {
        let spots: Option<Vec<Spot>> = points.iter().map(|&point| Spot::of(view, point)).collect();
        let Some(spots) = spots.filter(|spots| spots.len() >= 3) else { return };
        let outline: Vec<Vec2> = spots.iter().map(|spot| spot.pixel).collect();
        let plane = KeyPlane::through(&spots);
        let (width, height) = (self.width(), self.height());
        let (pixels, depth) = (self.image.pixels_mut(), &self.depth[..]);
        self.polygons.scan(&[&outline], width, height, |x, y, coverage| {
            let index = y * width + x;
            let key = plane.key(Vec2::new(x as f32 + 0.5, y as f32 + 0.5));
            blend_pixel(&mut pixels[index], color, coverage * hidden_share(hidden, key, depth[index]));
        });
    }
}

/// The share of its opacity something keeps at depth `key` on a pixel where something stands at `standing`.
#[inline]
fn hidden_share(hidden: Hidden, key: f32, standing: f32) -> f32 {
    match hidden {
        Hidden::Shown => 1.0,
        _ if key > standing => 1.0,
        Hidden::Cut => 0.0,
        Hidden::Faint(share) => share,
    }
}

/// Whether a dash is on at `at` pixels, with soft ends.
#[inline]
fn dash_share(dash: Dash, at: f32) -> f32 {
    let place = at.rem_euclid((dash.on + dash.off).max(1.0));
    (dash.on - place + 0.5).min(place + 0.5).clamp(0.0, 1.0)
}

/// Depth keys over a flat face: straight in the picture.
#[derive(Clone, Copy, Debug)]
struct KeyPlane {
    at: Vec2,
    key: f32,
    slope: Vec2,
}

impl KeyPlane {
    /// Through the three spots of the widest corner; level when all lie on one line of the picture.
    fn through(spots: &[Spot]) -> Self {
        let first = spots[0];
        let corner = |i: usize| (spots[i].pixel - first.pixel, spots[i].key - first.key);
        let third = spots.len() / 3;
        let ((u, key_u), (v, key_v)) = (corner(third.max(1)), corner((2 * third).max(2)));
        let area = u.perp_dot(v);
        let slope = Vec2::new(key_u * v.y - key_v * u.y, key_v * u.x - key_u * v.x) / area;
        Self { at: first.pixel, key: first.key, slope: if slope.is_finite() { slope } else { Vec2::ZERO } }
    }

    fn key(&self, pixel: Vec2) -> f32 {
        self.key + self.slope.dot(pixel - self.at)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::raster::camera::Camera;

    const WHITE: Color = Color::rgb(0xFF_FF_FF);

    #[test]
    fn hidden_lines_are_cut_faint_or_shown() {
        let view = Camera::default().view(60, 60);
        let target = Camera::default().target;
        let behind = [target - view.back + view.right, target - view.back - view.right];
        let ink_behind = |hidden| {
            let mut canvas = Canvas::new(60, 60, Color::rgb(0));
            canvas.depth.fill(view.key(view.distance));
            canvas.polyline(&view, &behind, &Stroke { color: WHITE, width: 2.0, dash: None, hidden });
            canvas.image.pixel(30, 30).unwrap()[2]
        };
        assert_eq!(ink_behind(Hidden::Cut), 0);
        assert_eq!(ink_behind(Hidden::Shown), 255);
        assert!((120..=135).contains(&ink_behind(Hidden::Faint(0.5))));
    }

    #[test]
    fn dashes_cover_their_share_and_run_over_corners() {
        let ink = |dash| {
            let mut canvas = Canvas::new(120, 40, Color::rgb(0));
            let stroke = Stroke { dash, ..Stroke::over(WHITE, 1.0) };
            canvas.flat_polyline(
                &[Vec2::new(10.0, 20.5), Vec2::new(37.0, 20.5), Vec2::new(110.0, 20.5)],
                &stroke,
            );
            canvas.image.pixels().iter().map(|pixel| u32::from(pixel[0])).sum::<u32>()
        };
        let (solid, dashed) = (ink(None), ink(Some(Dash { on: 6.0, off: 4.0 })));
        let share = f64::from(dashed) / f64::from(solid);
        assert!((share - 0.6).abs() < 0.03, "{share}");
    }

    #[test]
    fn a_tilted_face_is_hidden_where_it_goes_behind() {
        let camera = Camera::default();
        let view = camera.view(80, 80);
        // A square lying in the line of sight: its near half before the target, its far half behind it.
        let (u, v) = (view.right * 0.5, (view.back + view.up * 0.5) * 0.5);
        let square = [u + v, u - v, -u - v, v - u].map(|corner| camera.target + corner);
        let mut canvas = Canvas::new(80, 80, Color::rgb(0));
        canvas.depth.fill(view.key(view.distance));
        canvas.polygon(&view, &square, WHITE, Hidden::Cut);
        let inked_above = canvas.image.pixels()[..80 * 38].iter().filter(|pixel| pixel[0] > 0).count();
        let inked_below = canvas.image.pixels()[80 * 42..].iter().filter(|pixel| pixel[0] > 0).count();
        // The upper half of the square leans towards the eye.
        assert!(inked_above > 100 && inked_below == 0 || inked_below > 100 && inked_above == 0);
        assert!(inked_above > inked_below, "{inked_above} {inked_below}");
    }
}

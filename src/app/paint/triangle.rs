//! Triangles: lines, rounded corners, soft edges, plots.
//!
//! A pixel belongs to a triangle when its centre does. A centre on a shared edge belongs to the triangle whose left or
//! top edge it is (the rule of graphics hardware), so meshes have neither gaps nor seams drawn twice. All of this is in
//! whole numbers, and colours run from where a row of the triangle begins: the result does not depend on where bands do.

use super::area::Area;
use super::area::Corner;
use super::area::STEPS;
use super::band::Band;
use super::pixel;
use super::texture::Texture;
use egui::TextureFilter;
use egui::epaint::Vertex;
use egui::epaint::WHITE_UV;

/// Up to this many pixels are tried one by one, which is faster than working out where a row begins and ends.
const NARROW: i64 = 4;

/// Draws the part of a triangle inside `clip` and the band. `white` is the texel at [`WHITE_UV`].
pub(super) fn draw(
    band: &mut Band<'_>,
    clip: Area,
    texture: &Texture,
    white: u32,
    vertices: [Vertex; 3],
    corners: [Corner; 3],
) {
    let whole = Area::around(corners).intersect(clip);
    let area = whole.intersect(band.area());
    if area.is_empty() {
        return;
    }
    let Some(outline) = Outline::new(vertices, corners) else { return };
    let mut paint = None;
    for row in area.top..area.bottom {
        let (left, right) = outline.span(row, whole.left, whole.right);
        let (from, to) = (left.max(area.left), right.min(area.right));
        if from < to {
            // Many triangles of thin lines pass between all centres and need no paint.
            let paint = paint.get_or_insert_with(|| Paint::new(&outline, texture, white));
            if matches!(paint, Paint::Plain(0)) {
                return;
            }
            paint.draw(band.run(row, from, to), from - left, left, row, texture);
        }
    }
}

/// Three corners in the order in which the inside lies to the right of every side.
struct Outline {
    corners: [Corner; 3],
    vertices: [Vertex; 3],
    /// Twice the area, in square steps; above 0.
    doubled_area: i64,
    sides: [Side; 3],
}

impl Outline {
    /// `None` if it covers nothing.
    fn new(mut vertices: [Vertex; 3], mut corners: [Corner; 3]) -> Option<Self> {
        let mut doubled_area = doubled_area(corners);
        if doubled_area == 0 {
            return None;
        }
        if doubled_area < 0 {
            corners.swap(1, 2);
            vertices.swap(1, 2);
            doubled_area = -doubled_area;
        }
        let [a, b, c] = corners;
        Some(Self {
            corners,
            vertices,
            doubled_area,
            sides: [Side::new(a, b), Side::new(b, c), Side::new(c, a)],
        })
    }

    /// The pixels of a row that lie inside, out of `left..right`.
    fn span(&self, row: i64, mut left: i64, mut right: i64) -> (i64, i64) {
        let sides = self.sides.each_ref().map(|side| side.on_row(row));
        if right - left <= NARROW {
            let is_inside = |column: i64| sides.iter().all(|side| side.rise * column <= side.bound);
            while left < right && !is_inside(left) {
                left += 1;
            }
            while left < right && !is_inside(right - 1) {
                right -= 1;
            }
        } else {
            for side in sides {
                side.narrow(&mut left, &mut right);
            }
        }
        (left, right)
    }
}

/// Twice the signed area; above 0 when the corners go clockwise on the screen.
fn doubled_area([a, b, c]: [Corner; 3]) -> i64 {
    (b.x() - a.x()) * (c.y() - a.y()) - (b.y() - a.y()) * (c.x() - a.x())
}

/// One side, as the condition `rise * column <= offset + run * row` on pixels.
struct Side {
    rise: i64,
    run: i64,
    offset: i64,
}

impl Side {
    fn new(from: Corner, to: Corner) -> Self {
        let run = to.x() - from.x();
        let rise = to.y() - from.y();
        let owns_its_points = rise < 0 || (rise == 0 && run > 0);
        let at_origin = run * (STEPS / 2 - from.y()) - rise * (STEPS / 2 - from.x());
        // All other terms are whole pixels, so rounding this one down changes nothing.
        Self { rise, run, offset: (at_origin - i64::from(!owns_its_points)) >> 8 }
    }

    fn on_row(&self, row: i64) -> SideOnRow {
        SideOnRow { rise: self.rise, bound: self.offset + self.run * row }
    }
}

/// One side on one row, as the condition `rise * column <= bound`.
#[derive(Clone, Copy)]
struct SideOnRow {
    rise: i64,
    bound: i64,
}

impl SideOnRow {
    /// Takes away what lies on the wrong side of it.
    fn narrow(self, left: &mut i64, right: &mut i64) {
        if self.rise > 0 {
            *right = (*right).min(floor_div(self.bound, self.rise) + 1);
        } else if self.rise < 0 {
            *left = (*left).max(-floor_div(self.bound, -self.rise));
        } else if self.bound < 0 {
            *right = *left;
        }
    }
}

/// `dividend / divisor` rounded down, for a divisor above 0. Exact below 2^53, which corners keep to; division in
/// floating point takes a fraction of the time of the whole one.
fn floor_div(dividend: i64, divisor: i64) -> i64 {
    let quotient = (dividend as f64 / divisor as f64) as i64;
    quotient - i64::from(quotient * divisor > dividend)
}

/// A number that changes evenly over the picture.
#[derive(Clone, Copy)]
struct Slope {
    /// Value at the centre of pixel 0, 0.
    start: f64,
    across: f64,
    down: f64,
}

impl Slope {
    /// The slope with the given values at the three corners.
    fn new(outline: &Outline, values: [f64; 3]) -> Self {
        let [a, b, c] = outline.corners;
        let [at_a, at_b, at_c] = values;
        let (to_b, to_c) = (at_b - at_a, at_c - at_a);
        let scale = STEPS as f64 / outline.doubled_area as f64;
        let across = (to_b * (c.y() - a.y()) as f64 - to_c * (b.y() - a.y()) as f64) * scale;
        let down = (to_c * (b.x() - a.x()) as f64 - to_b * (c.x() - a.x()) as f64) * scale;
        let pixels_to = |steps: i64| (STEPS / 2 - steps) as f64 / STEPS as f64;
        Self { start: at_a + across * pixels_to(a.x()) + down * pixels_to(a.y()), across, down }
    }

    fn at(&self, column: i64, row: i64) -> f64 {
        self.start + self.across * column as f64 + self.down * row as f64
    }
}

/// What a triangle is filled with.
enum Paint {
    /// One colour all over.
    Plain(u32),
    /// A colour for each corner: red, green, blue, alpha.
    Blend([Slope; 4]),
    /// An image, tinted. Places in texels.
    Image { across: Slope, down: Slope, tint: [Slope; 4], filter: TextureFilter },
}

impl Paint {
    fn new(outline: &Outline, texture: &Texture, white: u32) -> Self {
        let [a, b, c] = outline.vertices;
        if a.uv != b.uv || a.uv != c.uv {
            let texels = |of: &dyn Fn(Vertex) -> f32, n_texels: usize| {
                Slope::new(outline, outline.vertices.map(|vertex| f64::from(of(vertex)) * n_texels as f64))
            };
            let across = texels(&|vertex| vertex.uv.x, texture.width);
            let down = texels(&|vertex| vertex.uv.y, texture.height);
            let scale = across.across.hypot(down.across).max(across.down.hypot(down.down));
            return Self::Image {
                across,
                down,
                tint: color_slopes(outline, u32::MAX),
                filter: texture.filter(scale),
            };
        }
        let texel = if a.uv == WHITE_UV {
            white
        } else {
            let (x, y) = (a.uv.x * texture.width as f32, a.uv.y * texture.height as f32);
            texture.sample(x, y, texture.filter(0.0))
        };
        if a.color == b.color && a.color == c.color {
            return Self::Plain(pixel::multiply(pixel::pack(a.color), texel));
        }
        Self::Blend(color_slopes(outline, texel))
    }

    /// Draws onto the pixels of one row, which begins at `left`; `run` are its pixels after the first `skipped`.
    fn draw(&self, run: &mut [u32], skipped: i64, left: i64, row: i64, texture: &Texture) {
        match self {
            Self::Plain(source) => pixel::fill(run, *source),
            Self::Blend(slopes) => {
                let mut colors = Colors::new(slopes, left, row).skip(skipped);
                for below in run {
                    *below = pixel::over(*below, colors.next());
                }
            }
            Self::Image { across, down, tint, filter } => {
                let (x, y) = (across.at(left, row) as f32, down.at(left, row) as f32);
                let (x_step, y_step) = (across.across as f32, down.across as f32);
                let mut colors = Colors::new(tint, left, row).skip(skipped);
                for (i, below) in (skipped..).zip(run) {
                    let texel = texture.sample(x + x_step * i as f32, y + y_step * i as f32, *filter);
                    *below = pixel::over(*below, pixel::multiply(colors.next(), texel));
                }
            }
        }
    }
}

/// How red, green, blue and alpha run over the triangle, each times that of `texel`, in [`Colors::ONE`] parts.
fn color_slopes(outline: &Outline, texel: u32) -> [Slope; 4] {
    let scale = pixel::unpack_rgba(texel).map(|channel| f64::from(channel) * (Colors::ONE / 255.0));
    let [a, b, c] = outline.vertices.map(|vertex| vertex.color.to_array().map(f64::from));
    [0, 1, 2, 3].map(|i| Slope::new(outline, [a[i] * scale[i], b[i] * scale[i], c[i] * scale[i]]))
}

/// The colours of one row, from left to right, in fixed point.
struct Colors {
    value: [i32; 4],
    step: [i32; 4],
}

impl Colors {
    /// One level of a channel.
    const ONE: f64 = 65_536.0;

    fn new(slopes: &[Slope; 4], left: i64, row: i64) -> Self {
        // Half a level more, because `next` cuts off.
        let value = slopes.map(|slope| (slope.at(left, row) + Self::ONE * 0.5) as i32);
        // A step beyond the range belongs to a triangle narrower than a pixel, where none is taken.
        Self { value, step: slopes.map(|slope| slope.across as i32) }
    }

    /// As after so many of [`Self::next`].
    fn skip(mut self, pixels: i64) -> Self {
        for (value, step) in self.value.iter_mut().zip(self.step) {
            *value = value.wrapping_add(step.wrapping_mul(pixels as i32));
        }
        self
    }

    fn next(&mut self) -> u32 {
        // At the rim, rounding may lead a little out of the range.
        let [red, green, blue, alpha] = self.value.map(|value| (value >> 16).clamp(0, 255) as u32);
        for (value, step) in self.value.iter_mut().zip(self.step) {
            *value = value.wrapping_add(step);
        }
        alpha << 24 | red << 16 | green << 8 | blue
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn floor_div_rounds_down_on_both_sides_of_zero_and_next_to_whole_quotients() {
        for divisor in [1, 2, 3, 7, 255, 256, (1 << 30) - 1] {
            for quotient in [-(1 << 20), -2, -1, 0, 1, 2, 1 << 20] {
                for rest in [-1, 0, 1] {
                    let dividend = quotient * divisor + rest;
                    assert_eq!(
                        floor_div(dividend, divisor),
                        dividend.div_euclid(divisor),
                        "{dividend} / {divisor}"
                    );
                }
            }
        }
    }
}

//! Triangles: lines, rounded corners, soft edges, plots.
//!
//! A pixel belongs to a triangle when its centre does. A centre on a shared edge belongs to the triangle whose left or
//! top edge it is (the rule of graphics hardware), so meshes have neither gaps nor seams drawn twice. All of this is in
//! whole numbers: the result does not depend on where bands begin.

use super::area::Area;
use super::area::Corner;
use super::area::STEPS;
use super::area::first_pixel;
use super::band::Band;
use super::pixel;
use super::texture::Texture;
use egui::TextureFilter;
use egui::epaint::Vertex;

/// Draws the part of a triangle inside `clip` and the band.
pub(super) fn draw(
    band: &mut Band<'_>,
    clip: Area,
    texture: &Texture,
    vertices: [Vertex; 3],
    pixels_per_point: f32,
) {
    let Some(outline) = Outline::new(vertices, pixels_per_point) else { return };
    let area = outline.area().intersect(clip).intersect(band.area());
    if area.is_empty() {
        return;
    }
    let paint = Paint::new(&outline, texture);
    if matches!(paint, Paint::Plain(0)) {
        return;
    }
    for row in area.top..area.bottom {
        let (left, right) = outline.span(row, area.left, area.right);
        if left < right {
            paint.draw(band.run(row, left, right), left, row, texture);
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
    fn new(mut vertices: [Vertex; 3], pixels_per_point: f32) -> Option<Self> {
        let [a, b, c] = vertices;
        let mut corners = [
            Corner::new(a.pos, pixels_per_point)?,
            Corner::new(b.pos, pixels_per_point)?,
            Corner::new(c.pos, pixels_per_point)?,
        ];
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

    fn area(&self) -> Area {
        let [a, b, c] = self.corners;
        Area {
            left: first_pixel(a.x.min(b.x).min(c.x)),
            top: first_pixel(a.y.min(b.y).min(c.y)),
            // A centre on the last step may belong to a slanted left edge, so this is one step more.
            right: first_pixel(a.x.max(b.x).max(c.x) + 1),
            bottom: first_pixel(a.y.max(b.y).max(c.y) + 1),
        }
    }

    /// The pixels `left..right` of a row that lie inside.
    fn span(&self, row: i64, mut left: i64, mut right: i64) -> (i64, i64) {
        for side in &self.sides {
            side.narrow(row, &mut left, &mut right);
        }
        (left, right)
    }
}

/// Twice the signed area; above 0 when the corners go clockwise on the screen.
fn doubled_area([a, b, c]: [Corner; 3]) -> i64 {
    (b.x - a.x) * (c.y - a.y) - (b.y - a.y) * (c.x - a.x)
}

/// One side, as the condition `rise * column <= offset + run * row` on pixels.
struct Side {
    rise: i64,
    run: i64,
    /// In square steps, for column 0 and row 0.
    offset: i64,
}

impl Side {
    fn new(from: Corner, to: Corner) -> Self {
        let run = to.x - from.x;
        let rise = to.y - from.y;
        let owns_its_points = rise < 0 || (rise == 0 && run > 0);
        let at_origin = run * (STEPS / 2 - from.y) - rise * (STEPS / 2 - from.x);
        Self { rise, run, offset: at_origin - i64::from(!owns_its_points) }
    }

    /// Takes away what lies on the wrong side of it.
    fn narrow(&self, row: i64, left: &mut i64, right: &mut i64) {
        // `rise` and `column` are whole, so rounding the other side of the condition down changes nothing.
        let bound = (self.offset >> 8) + self.run * row;
        if self.rise > 0 {
            *right = (*right).min(bound.div_euclid(self.rise) + 1);
        } else if self.rise < 0 {
            *left = (*left).max(-bound.div_euclid(-self.rise));
        } else if bound < 0 {
            *right = *left;
        }
    }
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
        let across = (to_b * (c.y - a.y) as f64 - to_c * (b.y - a.y) as f64) * scale;
        let down = (to_c * (b.x - a.x) as f64 - to_b * (c.x - a.x) as f64) * scale;
        let pixels_to = |steps: i64| (STEPS / 2 - steps) as f64 / STEPS as f64;
        Self { start: at_a + across * pixels_to(a.x) + down * pixels_to(a.y), across, down }
    }

    fn at(&self, column: i64, row: i64) -> f32 {
        (self.start + self.across * column as f64 + self.down * row as f64) as f32
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
    fn new(outline: &Outline, texture: &Texture) -> Self {
        let [a, b, c] = outline.vertices;
        let slope = |of: &dyn Fn(&Vertex) -> f64| Slope::new(outline, outline.vertices.each_ref().map(of));
        let size = (texture.width as f64, texture.height as f64);
        if a.uv != b.uv || a.uv != c.uv {
            let across = slope(&|vertex| f64::from(vertex.uv.x) * size.0);
            let down = slope(&|vertex| f64::from(vertex.uv.y) * size.1);
            let tint =
                [0, 1, 2, 3].map(|channel| slope(&|vertex| f64::from(vertex.color.to_array()[channel])));
            let scale = across.across.hypot(down.across).max(across.down.hypot(down.down));
            return Self::Image { across, down, tint, filter: texture.filter(scale) };
        }
        let place = (f64::from(a.uv.x) * size.0, f64::from(a.uv.y) * size.1);
        let texel = texture.sample(place.0 as f32, place.1 as f32, texture.filter(0.0));
        if a.color == b.color && a.color == c.color {
            return Self::Plain(pixel::multiply(pixel::pack(a.color), texel));
        }
        let texel = pixel::unpack_rgba(texel).map(|channel| f64::from(channel) / 255.0);
        Self::Blend([0, 1, 2, 3].map(|i| slope(&|vertex| f64::from(vertex.color.to_array()[i]) * texel[i])))
    }

    /// Draws onto the pixels of one row from `left` on.
    fn draw(&self, run: &mut [u32], left: i64, row: i64, texture: &Texture) {
        match self {
            Self::Plain(source) => pixel::fill(run, *source),
            Self::Blend(slopes) => {
                let mut colors = Colors::new(slopes, left, row);
                for below in run {
                    *below = pixel::over(*below, colors.next());
                }
            }
            Self::Image { across, down, tint, filter } => {
                let (x, y) = (across.at(left, row), down.at(left, row));
                let (x_step, y_step) = (across.across as f32, down.across as f32);
                let mut colors = Colors::new(tint, left, row);
                for (i, below) in run.iter_mut().enumerate() {
                    let texel = texture.sample(x + x_step * i as f32, y + y_step * i as f32, *filter);
                    *below = pixel::over(*below, pixel::multiply(colors.next(), texel));
                }
            }
        }
    }
}

/// The colours of one row, from left to right.
struct Colors {
    value: [f32; 4],
    step: [f32; 4],
}

impl Colors {
    fn new(slopes: &[Slope; 4], left: i64, row: i64) -> Self {
        // Half a step more, because the cast to a byte cuts off.
        Self {
            value: slopes.map(|slope| slope.at(left, row) + 0.5),
            step: slopes.map(|slope| slope.across as f32),
        }
    }

    fn next(&mut self) -> u32 {
        let [red, green, blue, alpha] = self.value.map(|channel| channel as u8);
        for (value, step) in self.value.iter_mut().zip(self.step) {
            *value += step;
        }
        u32::from_be_bytes([alpha, red, green, blue])
    }
}

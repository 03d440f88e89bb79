//! The floor: a neutral grid that fades away, one arrow for the heading, and soft shadows under the limbs.

use glam::{DVec3, Vec2};

use crate::raster::camera::{Bounds, Lens, View};
use crate::raster::canvas::{Canvas, Hidden, Spot, Stroke};
use crate::raster::figure::{Figure, solid_cone};
use crate::raster::image::{mix_pixel, to_byte};
use crate::raster::palette::Theme;
use crate::rotor::batch::Level;

/// A square grid on a level floor.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Floor {
    /// The middle of the grid; its y is the floor's height. World.
    pub center: DVec3,
    /// Between neighbouring lines, world units.
    pub step: f64,
    /// Lines to each side of the middle; the grid has faded away there.
    pub cells: u32,
    /// Where the figure faces, for the arrow; level part only. No arrow when it has none.
    pub heading: DVec3,
}

impl Floor {
    /// The same grid, its lines where they were, with its middle near `point`.
    #[must_use]
    pub fn moved_under(self, point: DVec3) -> Self {
        let near = |own: f64, wanted: f64| own + ((wanted - own) / self.step).round() * self.step;
        let center = DVec3::new(near(self.center.x, point.x), self.center.y, near(self.center.z, point.z));
        Self { center, ..self }
    }

    /// A floor under a thing of this size, with a round step (1, 2 or 5 times a power of ten) of about half its size.
    /// The lines stay at multiples of the step, so that they stand still while the thing walks over them.
    ///
    /// The height is the box's lowest point unless that is within a tenth of its size of zero: then it is zero, where
    /// a floor belongs.
    pub fn under(bounds: &Bounds) -> Self {
        let size = bounds.size().max(1e-6);
        let step = round_step(size * 0.4);
        let center = bounds.center();
        let height = if bounds.min.y.abs() < 0.1 * size { 0.0 } else { bounds.min.y };
        let on_line = |x: f64| (x / step).round() * step;
        Self {
            center: DVec3::new(on_line(center.x), height, on_line(center.z)),
            step,
            cells: 9,
            heading: DVec3::Z,
        }
    }

    fn reach(&self) -> f64 {
        self.step * f64::from(self.cells)
    }
}

/// The largest of 1, 2, 5 times a power of ten that is at most `size`.
pub(super) fn round_step(size: f64) -> f64 {
    let power = 10_f64.powf(size.log10().floor());
    let lead = size / power;
    power * [5.0, 2.0].into_iter().find(|&step| lead >= step * (1.0 - 1e-12)).unwrap_or(1.0)
}

/// Draws the floor and the shadows of `figures` on it. To be drawn before anything that stands on it.
pub(super) fn draw_floor(
    canvas: &mut Canvas,
    view: &View,
    floor: &Floor,
    figures: &[&Figure],
    theme: &Theme,
    scale: f32,
) {
    let reach = floor.reach();
    let count = i64::from(floor.cells);
    for i in -count..=count {
        let off = i as f64 * floor.step;
        // A line ends where the round, fading floor does.
        let half = (reach * reach - off * off).max(0.0).sqrt();
        for (across, along) in [(DVec3::X, DVec3::Z), (DVec3::Z, DVec3::X)] {
            let middle = floor.center + across * off;
            grid_line(canvas, view, floor, [middle - along * half, middle + along * half], theme, scale);
        }
    }
    draw_arrow(canvas, view, floor, theme);
    draw_shadows(canvas, view, floor, figures, theme);
}

fn grid_line(canvas: &mut Canvas, view: &View, floor: &Floor, ends: [DVec3; 2], theme: &Theme, scale: f32) {
    let Some([(a, part_a), (b, part_b)]) = view.project_line(ends[0], ends[1]) else { return };
    let reach_squared = floor.reach() * floor.reach();
    let (from, to) =
        (ends[0].lerp(ends[1], part_a) - floor.center, ends[0].lerp(ends[1], part_b) - floor.center);
    // Equal steps in the picture are not equal steps on the floor: weigh by how near each end is.
    let (near_a, near_b) = match view.lens {
        Lens::Perspective => (1.0 / a.depth, 1.0 / b.depth),
        Lens::Orthographic => (1.0, 1.0),
    };
    let (from, to) =
        (from.as_vec3() / reach_squared.sqrt() as f32, to.as_vec3() / reach_squared.sqrt() as f32);
    let ratio = (near_b / near_a) as f32;
    let stroke = Stroke::over(theme.grid, scale);
    canvas.line_with(Spot::new(view, &a), Spot::new(view, &b), &stroke, 0.0, |t| {
        let along = t * ratio / (1.0 - t + t * ratio);
        let left = 1.0 - from.lerp(to, along).length_squared();
        left.max(0.0) * left.max(0.0)
    });
}

/// A flat arrow on the floor, well under one step long, in front of the figure.
fn draw_arrow(canvas: &mut Canvas, view: &View, floor: &Floor, theme: &Theme) {
    let Some(ahead) = floor.heading.with_y(0.0).try_normalize() else { return };
    let aside = DVec3::Y.cross(ahead);
    let outline: Vec<DVec3> =
        [(0.0, 0.05), (0.62, 0.05), (0.62, 0.17), (1.0, 0.0), (0.62, -0.17), (0.62, -0.05), (0.0, -0.05)]
            .into_iter()
            .map(|(x, y)| floor.center + (ahead * (x * 0.6 + 0.55) + aside * y * 0.6) * floor.step)
            .collect();
    canvas.polygon(view, &outline, theme.axis.with_alpha(0.8), Hidden::Shown);
}

/// Soft shadows straight below the limbs, paler the higher a limb is. They show what stands on the floor.
fn draw_shadows(canvas: &mut Canvas, view: &View, floor: &Floor, figures: &[&Figure], theme: &Theme) {
    if view.eye.y <= floor.center.y {
        return;
    }
    let (width, height) = (canvas.width(), canvas.height());
    let strength = if theme.is_dark() { 190.0 } else { 95.0 };
    let mut mask = std::mem::take(canvas.mask());
    mask.resize(width * height, 0);
    let (mut touched_rows, mut touched_columns) = (height..0, width..0);
    for figure in figures {
        let size = figure.bounds().map_or(1.0, |bounds| bounds.size()).max(1e-9);
        for limb in figure.limbs.iter().filter(|limb| !figure.is_tie(limb)) {
            let lift = limb.from.y.midpoint(limb.to.y) - floor.center.y;
            let height_share = lift / size;
            if !(-0.05..1.5).contains(&height_share) {
                continue;
            }
            let mut flat = *limb;
            flat.from.y = floor.center.y;
            flat.to.y = floor.center.y;
            let Some(cone) = solid_cone(view, &flat, figure.girth, 1.0, 0.5) else { continue };
            let darkness = strength / (1.0 + 9.0 * height_share.max(0.0)) as f32;
            let blur = 1.2 + 4.0 * height_share.max(0.0) as f32;
            let soft = (cone.shape.radius_a.max(cone.shape.radius_b) * blur).max(1.0);
            let frame = cone.shape.frame();
            let inverse = 0.5 / soft;
            Level::best().run(
                #[inline(always)]
                || {
                    cone.shape.rows(
                        &frame,
                        width,
                        height,
                        soft,
                        #[inline(always)]
                        |row, columns, first| {
                            touched_rows = touched_rows.start.min(row)..touched_rows.end.max(row + 1);
                            touched_columns = touched_columns.start.min(columns.start)
                                ..touched_columns.end.max(columns.end);
                            let span = row * width + columns.start..row * width + columns.end;
                            for (i, dark) in mask[span].iter_mut().enumerate() {
                                let at = Vec2::new(first.x + i as f32, first.y);
                                let inside = (0.5 - frame.sample(at).distance * inverse).clamp(0.0, 1.0);
                                let shade = darkness * inside * inside * (3.0 - 2.0 * inside);
                                *dark = (*dark).max(to_byte(shade) as u8);
                            }
                        },
                    );
                },
            );
        }
    }
    for row in touched_rows {
        let span = row * width + touched_columns.start..row * width + touched_columns.end;
        for (pixel, dark) in canvas.image.pixels_mut()[span.clone()].iter_mut().zip(&mut mask[span]) {
            if *dark > 0 {
                mix_pixel(pixel, [0, 0, 0], u32::from(*dark));
                *dark = 0;
            }
        }
    }
    *canvas.mask() = mask;
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::raster::camera::Camera;
    use crate::raster::palette::Color;

    #[test]
    fn steps_are_round() {
        for (size, expected) in [(0.7, 0.5), (1.0, 1.0), (1.99, 1.0), (2.0, 2.0), (80.0, 50.0), (0.05, 0.05)]
        {
            let found = round_step(size);
            assert!((found / expected - 1.0).abs() < 1e-9, "{size}: {found}");
        }
    }

    #[test]
    fn the_floor_is_at_zero_for_feet_near_it_and_below_what_hangs_elsewhere() {
        let bounds =
            |low: f64, high: f64| Bounds { min: DVec3::new(0.3, low, 0.0), max: DVec3::new(1.0, high, 0.0) };
        assert_eq!(Floor::under(&bounds(-0.02, 1.8)).center.y, 0.0);
        assert_eq!(Floor::under(&bounds(5.0, 7.0)).center.y, 5.0);
        assert_eq!(Floor::under(&bounds(-90.0, 90.0)).step, 50.0);
    }

    #[test]
    fn the_grid_fades_outward() {
        let mut canvas = Canvas::new(400, 300, Color::rgb(0));
        let floor = Floor { center: DVec3::ZERO, step: 0.5, cells: 9, heading: DVec3::ZERO };
        let mut camera = Camera { pitch_rad: 0.5, ..Camera::default() };
        camera.target = DVec3::ZERO;
        camera.distance = 12.0;
        draw_floor(&mut canvas, &camera.view(400, 300), &floor, &[], &Theme::LIGHT, 1.0);
        let brightest_in_row = |row: usize| {
            canvas.image.pixels()[row * 400..][..400].iter().map(|pixel| pixel[0]).max().unwrap()
        };
        assert!(brightest_in_row(150) > 150);
        assert!(brightest_in_row(60) < brightest_in_row(110));
        assert_eq!(brightest_in_row(2), 0);
    }
}

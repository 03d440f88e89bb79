//! Flat shapes on the pixel grid: which pixels they touch and how much of each they cover.

use std::ops::Range;

use glam::Vec2;

/// Two circles and everything between them: the outline of a tapered limb, a line, or (with equal ends) a dot.
#[derive(Clone, Copy, Debug)]
pub(super) struct RoundCone {
    pub(super) a: Vec2,
    pub(super) b: Vec2,
    /// Radius at `a`, pixels.
    pub(super) radius_a: f32,
    /// Radius at `b`, pixels.
    pub(super) radius_b: f32,
}

/// A pixel beside or inside a [`RoundCone`].
#[derive(Clone, Copy, Debug)]
pub(super) struct Sample {
    /// From the pixel's middle to the outline, pixels; negative inside.
    pub(super) distance: f32,
    /// The place on the axis whose circle reaches out to this pixel: 0 at `a`, 1 at `b`.
    pub(super) t: f32,
    /// Along the axis from `a`, pixels; not held at the ends.
    pub(super) along: f32,
    /// From that place to the pixel, pixels; along the axis and across it.
    pub(super) out: Vec2,
    /// Radius at that place, pixels.
    pub(super) radius: f32,
}

impl Sample {
    /// The covered share of the pixel, 0..=1: exact for a straight edge along the grid, and close for any other.
    #[inline]
    pub(super) fn coverage(&self) -> f32 {
        (0.5 - self.distance).clamp(0.0, 1.0)
    }
}

/// What [`RoundCone::sample`] needs for every pixel, worked out once.
#[derive(Clone, Copy, Debug)]
pub(super) struct ConeFrame {
    origin: Vec2,
    axis: Vec2,
    length: f32,
    radius_a: f32,
    radius_b: f32,
    /// Sine and cosine of the angle between the axis and the outline.
    taper_sin: f32,
    taper_cos: f32,
    inverse_edge: f32,
}

impl RoundCone {
    /// Whether one end's circle swallows the other's, so that only the larger circle shows.
    pub(super) fn is_swallowed(&self) -> bool {
        self.a.distance(self.b) <= (self.radius_a - self.radius_b).abs() + 1e-3
    }

    pub(super) fn frame(&self) -> ConeFrame {
        if self.is_swallowed() {
            let a_is_larger = self.radius_a >= self.radius_b;
            let (origin, radius) =
                if a_is_larger { (self.a, self.radius_a) } else { (self.b, self.radius_b) };
            return ConeFrame {
                origin,
                axis: Vec2::X,
                length: 0.0,
                radius_a: radius,
                radius_b: radius,
                taper_sin: 0.0,
                taper_cos: 1.0,
                inverse_edge: 0.0,
            };
        }
        let length = self.a.distance(self.b);
        let taper_sin = (self.radius_a - self.radius_b) / length;
        let taper_cos = (1.0 - taper_sin * taper_sin).sqrt();
        ConeFrame {
            origin: self.a,
            axis: (self.b - self.a) / length,
            length,
            radius_a: self.radius_a,
            radius_b: self.radius_b,
            taper_sin,
            taper_cos,
            inverse_edge: 1.0 / (length * taper_cos),
        }
    }

    /// Visits every pixel within `margin` pixels of the outline, row by row, in a picture of `width × height`.
    #[inline]
    pub(super) fn scan(
        &self,
        width: usize,
        height: usize,
        margin: f32,
        mut visit: impl FnMut(usize, &Sample),
    ) {
        if !(self.a.is_finite() && self.b.is_finite()) {
            return;
        }
        let frame = self.frame();
        let reach = frame.radius_a.max(frame.radius_b) + margin;
        let end = frame.origin + frame.axis * frame.length;
        let low = frame.origin.min(end) - reach;
        let high = frame.origin.max(end) + reach;
        for row in pixel_span(low.y, high.y, height) {
            let y = row as f32 + 0.5 - frame.origin.y;
            // The row's part inside the band along the axis: |cross| <= reach.
            let (mut left, mut right) = (low.x, high.x);
            if frame.axis.y.abs() > 1e-3 {
                let middle = frame.origin.x + y * frame.axis.x / frame.axis.y;
                let half = reach / frame.axis.y.abs();
                (left, right) = (left.max(middle - half), right.min(middle + half));
            }
            for column in pixel_span(left, right, width) {
                let sample = frame.sample(Vec2::new(column as f32 + 0.5 - frame.origin.x, y));
                if sample.distance < margin {
                    visit(row * width + column, &sample);
                }
            }
        }
    }
}

impl ConeFrame {
    /// The place [`ConeFrame::sample`] counts from: end `a`, or the middle of the one circle that shows.
    pub(super) fn origin(&self) -> Vec2 {
        self.origin
    }

    /// The axis from `a` to `b`, unit, in the picture.
    pub(super) fn axis(&self) -> Vec2 {
        self.axis
    }

    /// The distance and place for a pixel at `from_origin` (pixels from end `a`).
    ///
    /// The outline is the two circles and their outer tangents, so the nearest outline point of a pixel lies on a
    /// circle where the pixel is behind the tangent's foot, and on the tangent between.
    #[inline]
    pub(super) fn sample(&self, from_origin: Vec2) -> Sample {
        let along = from_origin.dot(self.axis);
        let across = self.axis.perp_dot(from_origin);
        let beside = across.abs();
        let t = ((along * self.taper_cos - beside * self.taper_sin) * self.inverse_edge).clamp(0.0, 1.0);
        let radius = self.radius_a + (self.radius_b - self.radius_a) * t;
        let out = Vec2::new(along - t * self.length, across);
        let distance = if t > 0.0 && t < 1.0 {
            along * self.taper_sin + beside * self.taper_cos - self.radius_a
        } else {
            out.length() - radius
        };
        Sample { distance, t, along, out, radius }
    }
}

/// The pixels whose middles lie in `low ..= high`, cut to `0 .. limit`.
#[inline]
pub(super) fn pixel_span(low: f32, high: f32, limit: usize) -> Range<usize> {
    let end = (high + 0.5).floor().clamp(0.0, limit as f32) as usize;
    let start = (low - 0.5).ceil().clamp(0.0, limit as f32) as usize;
    start.min(end)..end
}

/// A flat polygon as covered shares of pixels.
///
/// Each row is cut into [`SUBROWS`] lines; along a line the covered lengths are exact. Nested and crossing outlines
/// follow the odd-even rule.
#[derive(Debug, Default)]
pub(super) struct PolygonScan {
    coverage: Vec<f32>,
    crossings: Vec<f32>,
}

const SUBROWS: usize = 5;

impl PolygonScan {
    /// Visits every touched pixel with its column, row and covered share in 0..=1. `rings` are closed outlines.
    pub(super) fn scan(
        &mut self,
        rings: &[&[Vec2]],
        width: usize,
        height: usize,
        mut visit: impl FnMut(usize, usize, f32),
    ) {
        let points = || rings.iter().flat_map(|ring| ring.iter());
        if points().any(|point| !point.is_finite()) {
            return;
        }
        let (mut low, mut high) = (Vec2::INFINITY, Vec2::NEG_INFINITY);
        for &point in points() {
            (low, high) = (low.min(point), high.max(point));
        }
        let rows = pixel_span(low.y - 0.5, high.y + 0.5, height);
        let columns = pixel_span(low.x - 0.5, high.x + 0.5, width);
        if columns.is_empty() {
            return;
        }
        for row in rows {
            self.coverage.clear();
            self.coverage.resize(columns.len(), 0.0);
            for subrow in 0..SUBROWS {
                self.cross(rings, row as f32 + (subrow as f32 + 0.5) / SUBROWS as f32);
                for pair in self.crossings.chunks_exact(2) {
                    let start = (pair[0] - columns.start as f32).clamp(0.0, columns.len() as f32);
                    let end = (pair[1] - columns.start as f32).clamp(0.0, columns.len() as f32);
                    add_length(&mut self.coverage, start, end);
                }
            }
            for (column, &length) in columns.clone().zip(&self.coverage) {
                if length > 0.0 {
                    visit(column, row, (length / SUBROWS as f32).min(1.0));
                }
            }
        }
    }

    /// Where the outlines cross the line at height `y`, from left to right.
    fn cross(&mut self, rings: &[&[Vec2]], y: f32) {
        self.crossings.clear();
        for ring in rings {
            for (i, &to) in ring.iter().enumerate() {
                let from = ring[if i == 0 { ring.len() - 1 } else { i - 1 }];
                if (from.y <= y) != (to.y <= y) {
                    self.crossings.push(from.x + (to.x - from.x) * (y - from.y) / (to.y - from.y));
                }
            }
        }
        self.crossings.sort_by(f32::total_cmp);
    }
}

/// Adds the length of `start..end` to the cells it passes through, each one unit wide.
fn add_length(cells: &mut [f32], start: f32, end: f32) {
    if end <= start {
        return;
    }
    let last_cell = cells.len() - 1;
    let (first, last) = ((start as usize).min(last_cell), (end as usize).min(last_cell));
    if first == last {
        cells[first] += end - start;
        return;
    }
    cells[first] += (first + 1) as f32 - start;
    for cell in &mut cells[first + 1..last] {
        *cell += 1.0;
    }
    cells[last] += end - last as f32;
}

#[cfg(test)]
mod tests {
    use super::*;

    fn area(shape: &RoundCone) -> f32 {
        let mut area = 0.0;
        shape.scan(100, 100, 1.0, |_, sample| area += sample.coverage());
        area
    }

    fn cone(a: [f32; 2], b: [f32; 2], radius_a: f32, radius_b: f32) -> RoundCone {
        RoundCone { a: a.into(), b: b.into(), radius_a, radius_b }
    }

    #[test]
    fn covered_area_is_the_shapes_area() {
        use std::f32::consts::PI;
        // A stadium, at three slopes and a sub-pixel place; a disc; a lone taper has the area of its parts:
        // two sectors and a trapezoid pair.
        for (b, length) in [([70.3, 40.2], 40.0), ([30.3, 80.2], 40.0), ([60.3, 80.2], 50.0)] {
            let found = area(&cone([30.3, 40.2], b, 5.0, 5.0));
            let expected = PI * 25.0 + 10.0 * length;
            assert!((found - expected).abs() < 0.01 * expected, "{found} {expected}");
        }
        let disc = area(&cone([50.0, 50.0], [50.0, 50.0], 12.0, 12.0));
        assert!((disc - PI * 144.0).abs() < 2.0, "{disc}");
        let (length, big, small) = (40.0_f32, 12.0_f32, 4.0_f32);
        let half = ((big - small) / length).acos();
        let edge = (length * length - (big - small).powi(2)).sqrt();
        let expected = (PI - half) * big * big + half * small * small + edge * (big + small);
        let found = area(&cone([30.0, 50.0], [70.0, 50.0], big, small));
        assert!((found - expected).abs() < 0.01 * expected, "{found} {expected}");
    }

    #[test]
    fn scanning_visits_what_a_whole_picture_would() {
        let shape = cone([20.0, 70.0], [81.0, 33.0], 9.0, 3.0);
        let frame = shape.frame();
        let mut visited = vec![false; 100 * 100];
        shape.scan(100, 100, 0.5, |index, _| visited[index] = true);
        for (index, was_visited) in visited.into_iter().enumerate() {
            let middle = Vec2::new((index % 100) as f32 + 0.5, (index / 100) as f32 + 0.5);
            let distance = frame.sample(middle - shape.a).distance;
            assert_eq!(was_visited, distance < 0.5, "{middle}: {distance}");
        }
    }

    #[test]
    fn far_and_broken_shapes_touch_nothing() {
        let touched = |shape: RoundCone| {
            let mut count = 0;
            shape.scan(10, 10, 1.0, |_, _| count += 1);
            count
        };
        assert_eq!(touched(cone([-50.0, -9e9], [-20.0, -9e9], 3.0, 3.0)), 0);
        assert_eq!(touched(cone([f32::NAN, 0.0], [1.0, 1.0], 3.0, 3.0)), 0);
        assert_eq!(touched(cone([-1e9, 5.0], [1e9, 5.0], 1e3, 1e3)), 100);
    }

    #[test]
    fn polygon_area_and_holes() {
        let square = |low: f32, high: f32| {
            [Vec2::new(low, low), Vec2::new(high, low), Vec2::new(high, high), Vec2::new(low, high)]
        };
        let (outer, inner) = (square(2.3, 12.3), square(4.0, 8.0));
        let mut area = 0.0;
        PolygonScan::default().scan(&[&outer, &inner], 20, 20, |_, _, coverage| area += coverage);
        assert!((area - (100.0 - 16.0)).abs() < 2.1, "{area}");
        let mut outside = 0;
        PolygonScan::default().scan(&[&[Vec2::NAN; 3]], 20, 20, |_, _, _| outside += 1);
        PolygonScan::default().scan(&[&square(-9.0, -2.0)], 20, 20, |_, _, _| outside += 1);
        assert_eq!(outside, 0);
    }
}

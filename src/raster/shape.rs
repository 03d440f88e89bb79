//! Flat shapes on the pixel grid: which pixels they touch and how much of each they cover.
#![expect(
    clippy::inline_always,
    reason = "what stays a function of its own is not built with wide instructions"
)]

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
    /// From that place to the pixel, pixels; along the axis and across it.
    pub(super) out: Vec2,
    /// Length of `out`.
    pub(super) out_length: f32,
    /// Radius at that place, pixels.
    pub(super) radius: f32,
}

/// A [`RoundCone`] with what every pixel needs worked out once.
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

    /// Visits the rows that come within `margin` pixels of the outline, in a picture of `width × height`: the row, its
    /// columns that may be near enough, and the middle of the first of them, counted from the frame's origin.
    #[inline(always)]
    pub(super) fn rows(
        &self,
        frame: &ConeFrame,
        width: usize,
        height: usize,
        margin: f32,
        mut visit: impl FnMut(usize, Range<usize>, Vec2),
    ) {
        if !(self.a.is_finite() && self.b.is_finite()) {
            return;
        }
        let reach = frame.radius_a.max(frame.radius_b) + margin;
        let end = frame.origin + frame.axis * frame.length;
        let low = frame.origin.min(end) - reach;
        let high = frame.origin.max(end) + reach;
        for row in pixel_span(low.y, high.y, height) {
            let y = row as f32 + 0.5 - frame.origin.y;
            // The row's part inside the band along the axis, |across| <= reach, and between the ends' outer squares.
            let (mut left, mut right) = (low.x, high.x);
            if frame.axis.y.abs() > 1e-3 {
                let middle = frame.origin.x + y * frame.axis.x / frame.axis.y;
                let half = reach / frame.axis.y.abs();
                (left, right) = (left.max(middle - half), right.min(middle + half));
            }
            if frame.axis.x.abs() > 1e-3 {
                let at = |along: f32| frame.origin.x + (along - y * frame.axis.y) / frame.axis.x;
                let (start, stop) = (at(-reach), at(frame.length + reach));
                (left, right) = (left.max(start.min(stop)), right.min(start.max(stop)));
            }
            let columns = pixel_span(left, right, width);
            if !columns.is_empty() {
                let first = Vec2::new(columns.start as f32 + 0.5 - frame.origin.x, y);
                visit(row, columns, first);
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

    /// The distance and place for a pixel at `from_origin` (pixels from the frame's origin).
    ///
    /// The outline is the two circles and their outer tangents. Between the tangents' feet the line from a pixel square
    /// to the tangent meets the axis at `t`, and the circle there touches the tangent on that very line; beyond them
    /// the nearest circle is an end's. So one formula serves both, without a branch.
    #[inline(always)]
    pub(super) fn sample(&self, from_origin: Vec2) -> Sample {
        let along = from_origin.x * self.axis.x + from_origin.y * self.axis.y;
        let across = self.axis.x * from_origin.y - self.axis.y * from_origin.x;
        let t = (along * self.taper_cos - across.abs() * self.taper_sin) * self.inverse_edge;
        let t = t.clamp(0.0, 1.0);
        let radius = self.radius_a + (self.radius_b - self.radius_a) * t;
        let out = Vec2::new(along - t * self.length, across);
        let out_length = (out.x * out.x + out.y * out.y).sqrt();
        Sample { distance: out_length - radius, t, out, out_length, radius }
    }

    /// How far along the axis a pixel is, pixels from the frame's origin.
    #[inline(always)]
    pub(super) fn along(&self, from_origin: Vec2) -> f32 {
        from_origin.dot(self.axis)
    }
}

/// Visits the pixels of a line of equal width with round ends: each step along its longer direction asks `share` for
/// the opacity at `t` of the way (0..=1), then `visit` gets index, `t` and covered share of each pixel of the step.
#[inline]
pub(super) fn scan_line(
    [a, b]: [Vec2; 2],
    radius: f32,
    [width, height]: [usize; 2],
    share: impl Fn(f32) -> f32,
    mut visit: impl FnMut(usize, f32, f32),
) {
    if !(a.is_finite() && b.is_finite()) {
        return;
    }
    let reach = radius + 0.5;
    let is_steep = (b.y - a.y).abs() > (b.x - a.x).abs();
    // Work in a picture turned so that the line runs along x.
    let turned = |p: Vec2| if is_steep { Vec2::new(p.y, p.x) } else { p };
    let (a, b) = (turned(a), turned(b));
    let (columns, rows) = if is_steep { (height, width) } else { (width, height) };
    let (row_stride, column_stride) = if is_steep { (1, width) } else { (width, 1) };
    let length = a.distance(b);
    let axis = if length > 0.0 { (b - a) / length } else { Vec2::X };
    let half = reach / axis.x.abs();
    let (low, high) = (a.min(b), a.max(b));
    for column in pixel_span(low.x - reach, high.x + reach, columns) {
        let from_a = column as f32 + 0.5 - a.x;
        let middle = a.y + from_a * axis.y / axis.x;
        let at_middle = if length > 0.0 { from_a / (axis.x * length) } else { 0.0 };
        let ink = share(at_middle.clamp(0.0, 1.0));
        if ink <= 0.0 {
            continue;
        }
        let bottom = (middle - half).max(low.y - reach);
        let top = (middle + half).min(high.y + reach);
        for row in pixel_span(bottom, top, rows) {
            let out = Vec2::new(from_a, row as f32 + 0.5 - a.y);
            let along = out.dot(axis);
            let beyond = along - along.clamp(0.0, length);
            let across = axis.perp_dot(out);
            let distance = if beyond == 0.0 { across.abs() } else { across.hypot(beyond) };
            let coverage = (reach - distance).min(1.0);
            if coverage > 0.0 {
                let t = if length > 0.0 { (along / length).clamp(0.0, 1.0) } else { 0.0 };
                visit(row * row_stride + column * column_stride, t, coverage * ink);
            }
        }
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

    fn each_sample(shape: &RoundCone, margin: f32, mut visit: impl FnMut(usize, Sample)) {
        let frame = shape.frame();
        shape.rows(&frame, 100, 100, margin, |row, columns, first| {
            for (i, column) in columns.enumerate() {
                visit(row * 100 + column, frame.sample(first + Vec2::new(i as f32, 0.0)));
            }
        });
    }

    fn area(shape: &RoundCone) -> f32 {
        let mut area = 0.0;
        each_sample(shape, 1.0, |_, sample| area += (0.5 - sample.distance).clamp(0.0, 1.0));
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
        each_sample(&shape, 0.5, |index, _| visited[index] = true);
        let spared = visited.iter().filter(|was_visited| !**was_visited).count();
        assert!(spared > 8000, "{spared}");
        for (index, was_visited) in visited.into_iter().enumerate() {
            let middle = Vec2::new((index % 100) as f32 + 0.5, (index / 100) as f32 + 0.5);
            let distance = frame.sample(middle - shape.a).distance;
            assert!(was_visited || distance >= 0.5, "{middle}: {distance}");
        }
    }

    #[test]
    fn a_line_is_a_round_cone_of_equal_radii() {
        for (a, b) in
            [([10.2, 20.0], [80.0, 31.5]), ([30.0, 90.0], [41.0, 5.5]), ([50.0, 50.0], [50.0, 50.0])]
        {
            for radius in [0.5, 3.0] {
                let shape = cone(a, b, radius, radius);
                let mut expected = vec![0.0; 100 * 100];
                each_sample(&shape, 1.0, |index, sample| {
                    expected[index] = (0.5 - sample.distance).clamp(0.0, 1.0);
                });
                let mut found = vec![0.0; 100 * 100];
                scan_line(
                    [shape.a, shape.b],
                    radius,
                    [100, 100],
                    |_| 1.0,
                    |index, _, share| found[index] = share,
                );
                let worst = expected.iter().zip(&found).map(|(e, f)| (e - f).abs()).fold(0.0, f32::max);
                assert!(worst < 1e-3, "{a:?} {b:?} {radius}: {worst}");
            }
        }
    }

    #[test]
    fn far_and_broken_shapes_touch_nothing() {
        let touched = |shape: RoundCone| {
            let mut count = 0;
            shape.rows(&shape.frame(), 10, 10, 1.0, |_, columns, _| count += columns.len());
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

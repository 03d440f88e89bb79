//! The camera that circles a point, and the view it gives of a picture of a certain size.

use std::f64::consts::{FRAC_PI_2, TAU};

use glam::{DVec2, DVec3};

/// How depth shows.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Lens {
    /// Far things look smaller.
    Perspective,
    /// Parallel: lengths across the view can be compared at any depth.
    Orthographic,
}

/// A pair of axes to look at squarely. Positive turns (y→z, z→x, x→y) go counter-clockwise on screen when seen from
/// the front.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum StraightView {
    /// From +x; y is up.
    Yz,
    /// From −x; y is up.
    YzBack,
    /// From above; x is right.
    Zx,
    /// From below; x is right.
    ZxBack,
    /// From +z; x is right, y is up.
    Xy,
    /// From −z; y is up.
    XyBack,
}

/// The box around some points, for [`Camera::fit`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bounds {
    /// Smallest coordinates.
    pub min: DVec3,
    /// Largest coordinates.
    pub max: DVec3,
}

impl Bounds {
    /// The box around all finite points; nothing when there are none. Points that are not finite come from broken
    /// values in a clip and must not hide the rest of it.
    pub fn of_points(points: impl IntoIterator<Item = DVec3>) -> Option<Self> {
        points.into_iter().filter(|point| point.is_finite()).fold(None, |bounds: Option<Self>, point| {
            Some(match bounds {
                None => Self { min: point, max: point },
                Some(Self { min, max }) => Self { min: min.min(point), max: max.max(point) },
            })
        })
    }

    /// The middle of the box.
    pub fn center(&self) -> DVec3 {
        self.min.midpoint(self.max)
    }

    /// The diagonal's length.
    pub fn size(&self) -> f64 {
        self.min.distance(self.max)
    }

    /// The eight corners.
    pub fn corners(&self) -> [DVec3; 8] {
        let pick = |use_max: bool, axis: usize| if use_max { self.max[axis] } else { self.min[axis] };
        std::array::from_fn(|i| DVec3::new(pick(i & 1 != 0, 0), pick(i & 2 != 0, 1), pick(i & 4 != 0, 2)))
    }

    /// The smallest box around both.
    #[must_use]
    pub fn union(&self, other: &Self) -> Self {
        Self { min: self.min.min(other.min), max: self.max.max(other.max) }
    }
}

/// A camera on a sphere around its target. World: right-handed, Y up.
///
/// It stands at `target + distance · (sin yaw cos pitch, sin pitch, cos yaw cos pitch)` and looks at the target, so
/// yaw 0 and pitch 0 look along −z. Its axes are written down in closed form, so straight up and down are nothing
/// special.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Camera {
    /// The point looked at, world.
    pub target: DVec3,
    /// From the target, world units.
    pub distance: f64,
    /// Around +Y, radians.
    pub yaw_rad: f64,
    /// Above the floor plane, −π/2..=π/2 radians.
    pub pitch_rad: f64,
    /// Whole vertical angle of view, radians. An orthographic camera shows what this angle shows at the target.
    pub fov_rad: f64,
    /// How depth shows.
    pub lens: Lens,
    /// Whether left and right are exchanged in the picture, as in a mirror.
    pub is_mirrored: bool,
}

impl Default for Camera {
    /// From the front, a little to the side and above, at a metre-sized thing.
    fn default() -> Self {
        Self {
            target: DVec3::new(0.0, 0.9, 0.0),
            distance: 4.0,
            yaw_rad: 0.55,
            pitch_rad: 0.22,
            fov_rad: 0.6,
            lens: Lens::Perspective,
            is_mirrored: false,
        }
    }
}

impl Camera {
    const DISTANCES: [f64; 2] = [1e-6, 1e9];

    /// Turns around the target: a positive yaw brings the right side of the picture nearer. Pitch stops straight above and below.
    pub fn orbit(&mut self, yaw_change_rad: f64, pitch_change_rad: f64) {
        let yaw_change_rad = if self.is_mirrored { -yaw_change_rad } else { yaw_change_rad };
        self.yaw_rad = (self.yaw_rad + yaw_change_rad).rem_euclid(TAU);
        self.pitch_rad = (self.pitch_rad + pitch_change_rad).clamp(-FRAC_PI_2, FRAC_PI_2);
    }

    /// Looks squarely at a pair of axes, from the same distance. The lens stays.
    pub fn look_straight(&mut self, view: StraightView) {
        (self.yaw_rad, self.pitch_rad) = match view {
            StraightView::Yz => (FRAC_PI_2, 0.0),
            StraightView::YzBack => (3.0 * FRAC_PI_2, 0.0),
            StraightView::Zx => (0.0, FRAC_PI_2),
            StraightView::ZxBack => (0.0, -FRAC_PI_2),
            StraightView::Xy => (0.0, 0.0),
            StraightView::XyBack => (2.0 * FRAC_PI_2, 0.0),
        };
    }

    /// Multiplies the distance by `factor`: under 1 comes nearer.
    pub fn zoom(&mut self, factor: f64) {
        if factor.is_finite() && factor > 0.0 {
            self.distance = (self.distance * factor).clamp(Self::DISTANCES[0], Self::DISTANCES[1]);
        }
    }

    /// The same, keeping what lies under `pixel` (at the target's depth) where it is.
    pub fn zoom_at(&mut self, factor: f64, pixel: DVec2, width: usize, height: usize) {
        let before = self.distance;
        self.zoom(factor);
        let view = self.view(width, height);
        let from_center = pixel - view.center_px;
        let shift = (before - self.distance) / view.focal_px;
        self.target += (view.right * from_center.x - view.up * from_center.y) * shift;
    }

    /// Moves the target in the view plane so that the picture follows the pointer by (`dx`, `dy`) pixels.
    pub fn pan(&mut self, dx: f64, dy: f64, width: usize, height: usize) {
        let view = self.view(width, height);
        self.target += (view.up * dy - view.right * dx) * (self.distance / view.focal_px);
    }

    /// Moves back or forth, and sideways, until the box fills the picture but for `margin` (share of each half side,
    /// 0..1) around it. Direction, lens and angle of view stay.
    pub fn fit(&mut self, bounds: &Bounds, width: usize, height: usize, margin: f64) {
        self.target = bounds.center();
        let view = self.view(width, height);
        let room = view.center_px.max(DVec2::ONE) * (1.0 - margin.clamp(0.0, 0.9)) / view.focal_px;
        let needed = bounds.corners().into_iter().map(|corner| {
            let from_target = corner - self.target;
            let across =
                (from_target.dot(view.right).abs() / room.x).max(from_target.dot(view.up).abs() / room.y);
            match self.lens {
                Lens::Perspective => across + from_target.dot(view.back),
                Lens::Orthographic => across,
            }
        });
        let needed = needed.fold(0.0, f64::max);
        // A single joint has no size: stay where we are.
        if needed > 0.0 {
            self.distance = needed.clamp(Self::DISTANCES[0], Self::DISTANCES[1]);
        }
    }

    /// The view for a picture of `width × height` pixels.
    pub fn view(&self, width: usize, height: usize) -> View {
        let (yaw_sin, yaw_cos) = self.yaw_rad.sin_cos();
        let (pitch_sin, pitch_cos) = self.pitch_rad.sin_cos();
        let right = DVec3::new(yaw_cos, 0.0, -yaw_sin);
        let back = DVec3::new(yaw_sin * pitch_cos, pitch_sin, yaw_cos * pitch_cos);
        let distance = self.distance.clamp(Self::DISTANCES[0], Self::DISTANCES[1]);
        View {
            right: if self.is_mirrored { -right } else { right },
            up: back.cross(right),
            back,
            eye: self.target + back * distance,
            distance,
            lens: self.lens,
            focal_px: height.max(1) as f64 / 2.0 / (self.fov_rad.clamp(0.01, 3.0) / 2.0).tan(),
            center_px: DVec2::new(width as f64, height as f64) / 2.0,
        }
    }
}

/// A camera that knows the size of its picture: maps the world to pixels and back.
///
/// Pixels count from the top left corner of the picture; the middle of the first pixel is (0.5, 0.5).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct View {
    /// Unit, world: to the right of the picture. In a mirrored view the three axes are left-handed.
    pub right: DVec3,
    /// Unit, world: to the top of the picture.
    pub up: DVec3,
    /// Unit, world: out of the picture towards the viewer.
    pub back: DVec3,
    /// Where the camera stands, world.
    pub eye: DVec3,
    /// From the eye to the target.
    pub distance: f64,
    /// How depth shows.
    pub lens: Lens,
    /// Pixels for one unit at depth 1 (perspective), or `distance` times the pixels for one unit (orthographic).
    pub focal_px: f64,
    /// The middle of the picture.
    pub center_px: DVec2,
}

/// Where a point of the world falls in the picture.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Projection {
    /// Pixels from the top left corner.
    pub pixel: DVec2,
    /// Straight ahead of the eye, world units.
    pub depth: f64,
    /// Pixels for one world unit across the view at this depth.
    pub px_per_unit: f64,
}

/// A half line into the world.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ray {
    /// Start, world.
    pub origin: DVec3,
    /// Unit direction, world.
    pub direction: DVec3,
}

impl Ray {
    /// The point where the ray meets a plane; nothing when it runs beside or away from it.
    pub fn meet_plane(&self, point: DVec3, normal: DVec3) -> Option<DVec3> {
        let steepness = self.direction.dot(normal);
        let along = (point - self.origin).dot(normal) / steepness;
        (along.is_finite() && along >= 0.0).then(|| self.origin + self.direction * along)
    }

    /// The point on the ray nearest to `point`.
    pub fn nearest_to(&self, point: DVec3) -> DVec3 {
        self.origin + self.direction * (point - self.origin).dot(self.direction).max(0.0)
    }
}

impl View {
    /// Things nearer than this are cut: their pixels would run to infinity.
    pub fn near(&self) -> f64 {
        self.distance * 1e-3
    }

    /// World to camera: x right, y up, z straight ahead.
    pub(super) fn to_view(self, point: DVec3) -> DVec3 {
        let from_eye = point - self.eye;
        DVec3::new(from_eye.dot(self.right), from_eye.dot(self.up), -from_eye.dot(self.back))
    }

    /// Camera (see [`View::to_view`]) to picture. The depth must be at least [`View::near`].
    pub(super) fn to_picture(self, in_view: DVec3) -> Projection {
        let px_per_unit = self.focal_px / self.scale_depth(in_view.z);
        let pixel = self.center_px + DVec2::new(in_view.x, -in_view.y) * px_per_unit;
        Projection { pixel, depth: in_view.z, px_per_unit }
    }

    fn scale_depth(&self, depth: f64) -> f64 {
        match self.lens {
            Lens::Perspective => depth,
            Lens::Orthographic => self.distance,
        }
    }

    /// Where `point` falls; nothing when it is behind the eye, too near to it, or not finite.
    pub fn project(&self, point: DVec3) -> Option<Projection> {
        let in_view = self.to_view(point);
        let is_ahead = in_view.z >= self.near() || (self.lens == Lens::Orthographic && in_view.z.is_finite());
        let projection = self.to_picture(in_view);
        (is_ahead && projection.pixel.is_finite()).then_some(projection)
    }

    /// Both ends of a line, cut at the near plane; nothing when no part of it lies ahead or an end is not finite. The
    /// last two numbers say which part of the line is left (0 and 1: all of it).
    pub(super) fn project_line(&self, from: DVec3, to: DVec3) -> Option<[(Projection, f64); 2]> {
        let (mut a, mut b) = (self.to_view(from), self.to_view(to));
        if !(a.is_finite() && b.is_finite()) {
            return None;
        }
        let mut parts = [0.0, 1.0];
        if self.lens == Lens::Perspective {
            let near = self.near();
            let cut = (near - a.z) / (b.z - a.z);
            match (a.z < near, b.z < near) {
                (true, true) => return None,
                (true, false) => (a, parts[0]) = (a.lerp(b, cut), cut),
                (false, true) => (b, parts[1]) = (a.lerp(b, cut), cut),
                (false, false) => {}
            }
        }
        Some([(self.to_picture(a), parts[0]), (self.to_picture(b), parts[1])])
    }

    /// The depth key of a projected point: larger is nearer, and straight lines and planes of the world stay straight
    /// in it, so that it may be interpolated over the picture.
    pub(super) fn key(&self, depth: f64) -> f32 {
        match self.lens {
            Lens::Perspective => (self.distance / depth) as f32,
            Lens::Orthographic => (1.0 - (depth - self.distance) / self.distance) as f32,
        }
    }

    /// How much the key grows when something at `depth` comes one world unit nearer.
    pub(super) fn key_slope(&self, depth: f64) -> f32 {
        match self.lens {
            Lens::Perspective => (self.distance / (depth * depth)) as f32,
            Lens::Orthographic => (1.0 / self.distance) as f32,
        }
    }

    /// The ray under a pixel. An orthographic ray starts in the plane of the eye.
    pub fn ray(&self, pixel: DVec2) -> Ray {
        let across = (pixel - self.center_px) / self.focal_px;
        let offset = self.right * across.x - self.up * across.y;
        match self.lens {
            Lens::Perspective => Ray { origin: self.eye, direction: (offset - self.back).normalize() },
            Lens::Orthographic => Ray { origin: self.eye + offset * self.distance, direction: -self.back },
        }
    }

    /// The world point under a pixel at a depth straight ahead.
    pub fn unproject(&self, pixel: DVec2, depth: f64) -> DVec3 {
        let across = (pixel - self.center_px) / self.focal_px * self.scale_depth(depth);
        self.eye + self.right * across.x - self.up * across.y - self.back * depth
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn check_close(found: DVec3, expected: DVec3) {
        assert!(found.distance(expected) < 1e-9, "expected {expected}, found {found}");
    }

    fn cameras() -> Vec<Camera> {
        let mut cameras = Vec::new();
        for lens in [Lens::Perspective, Lens::Orthographic] {
            for (yaw_rad, pitch_rad) in [(0.0, 0.0), (2.0, -0.7), (0.3, FRAC_PI_2), (5.0, -FRAC_PI_2)] {
                cameras.push(Camera { yaw_rad, pitch_rad, lens, ..Camera::default() });
            }
        }
        cameras
    }

    #[test]
    fn axes_are_orthonormal_and_right_handed_everywhere() {
        for camera in cameras() {
            let view = camera.view(300, 200);
            check_close(view.right.cross(view.up), view.back);
            for axis in [view.right, view.up, view.back] {
                assert!((axis.length() - 1.0).abs() < 1e-12);
            }
        }
    }

    #[test]
    fn the_target_is_in_the_middle_and_unprojecting_undoes_projecting() {
        for camera in cameras() {
            let view = camera.view(300, 200);
            let middle = view.project(camera.target).unwrap();
            assert!(middle.pixel.distance(DVec2::new(150.0, 100.0)) < 1e-9);
            let point = camera.target + DVec3::new(0.3, -0.4, 0.2);
            let seen = view.project(point).unwrap();
            check_close(view.unproject(seen.pixel, seen.depth), point);
            check_close(view.ray(seen.pixel).nearest_to(point), point);
        }
    }

    #[test]
    fn a_mirrored_view_exchanges_left_and_right_and_nothing_else() {
        for camera in cameras() {
            let mirrored = Camera { is_mirrored: true, ..camera };
            let (view, other) = (camera.view(300, 200), mirrored.view(300, 200));
            let point = camera.target + DVec3::new(0.3, -0.4, 0.2);
            let (seen, seen_other) = (view.project(point).unwrap(), other.project(point).unwrap());
            assert!((seen.pixel.x + seen_other.pixel.x - 300.0).abs() < 1e-9);
            assert!((seen.pixel.y - seen_other.pixel.y).abs() < 1e-9);
            assert!((seen.depth - seen_other.depth).abs() < 1e-12);
            check_close(other.ray(seen_other.pixel).nearest_to(point), point);
            // What is dragged follows the pointer in both: a pan keeps the point under it, an orbit moves it to the same side.
            let moved = |mut camera: Camera| {
                camera.pan(12.0, 0.0, 300, 200);
                camera.view(300, 200).project(point).unwrap().pixel.x
            };
            assert!(moved(camera) > seen.pixel.x && moved(mirrored) > seen_other.pixel.x);
        }
    }

    #[test]
    fn straight_views_show_their_plane_turning_counter_clockwise() {
        for (straight, from, to) in [
            (StraightView::Yz, DVec3::Y, DVec3::Z),
            (StraightView::Zx, DVec3::Z, DVec3::X),
            (StraightView::Xy, DVec3::X, DVec3::Y),
        ] {
            let mut camera = Camera { target: DVec3::ZERO, lens: Lens::Orthographic, ..Camera::default() };
            camera.look_straight(straight);
            let view = camera.view(200, 200);
            let on_screen =
                |point| (view.project(point).unwrap().pixel - view.center_px) * DVec2::new(1.0, -1.0);
            let turn = on_screen(from).perp_dot(on_screen(to));
            assert!(turn > 0.0, "{straight:?}: {turn}");
        }
    }

    #[test]
    fn fit_brings_every_corner_in_and_one_to_the_margin() {
        for scale in [0.01, 1.0, 200.0] {
            for mut camera in cameras() {
                let bounds = Bounds {
                    min: DVec3::new(-0.4, 0.0, -0.2) * scale,
                    max: DVec3::new(0.6, 1.8, 0.3) * scale,
                };
                camera.fit(&bounds, 300, 200, 0.1);
                let view = camera.view(300, 200);
                let reach = bounds.corners().map(|corner| {
                    let off = (view.project(corner).unwrap().pixel - view.center_px).abs() / view.center_px;
                    off.max_element()
                });
                let most = reach.into_iter().fold(0.0, f64::max);
                assert!((most - 0.9).abs() < 1e-9, "{camera:?}: {most}");
            }
        }
    }

    #[test]
    fn panning_follows_the_pointer_and_zooming_keeps_what_is_under_it() {
        for mut camera in cameras() {
            let point = camera.target;
            camera.pan(20.0, -30.0, 300, 200);
            let seen = camera.view(300, 200).project(point).unwrap().pixel;
            assert!(seen.distance(DVec2::new(170.0, 70.0)) < 1e-9, "{seen}");
            camera.zoom_at(0.5, seen, 300, 200);
            let again = camera.view(300, 200).project(point).unwrap().pixel;
            assert!(again.distance(seen) < 1e-6, "{again}");
        }
    }

    #[test]
    fn nothing_comes_from_behind_or_from_broken_numbers() {
        let camera = Camera { target: DVec3::ZERO, yaw_rad: 0.0, pitch_rad: 0.0, ..Camera::default() };
        let view = camera.view(300, 200);
        assert_eq!(view.project(DVec3::new(0.0, 0.0, 5.0)), None);
        assert_eq!(view.project(DVec3::NAN), None);
        assert_eq!(view.project_line(DVec3::NAN, DVec3::ZERO), None);
        let [(a, from), (b, to)] = view.project_line(DVec3::new(0.0, 0.0, 5.0), DVec3::ZERO).unwrap();
        assert!((a.depth - view.near()).abs() < 1e-12 && from > 0.0 && to == 1.0 && b.depth == 4.0);
        assert_eq!(Bounds::of_points([DVec3::NAN]), None);
        assert_eq!(Bounds::of_points([DVec3::NAN, DVec3::ONE]).unwrap().size(), 0.0);
    }

    #[test]
    fn depth_keys_order_near_before_far_and_have_the_stated_slope() {
        for camera in cameras() {
            let view = camera.view(10, 10);
            assert!(view.key(1.0) > view.key(2.0));
            let slope = (view.key(2.0) - view.key(2.01)) / 0.01;
            assert!((slope / view.key_slope(2.0) - 1.0).abs() < 0.02);
        }
    }
}

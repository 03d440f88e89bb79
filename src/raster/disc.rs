//! Marks around a joint: the plane disc that turns it, and the reach its limits allow.

use std::f64::consts::TAU;

use glam::{DVec2, DVec3, Vec2};

use crate::raster::camera::{Ray, View};
use crate::raster::canvas::{Canvas, Hidden, Spot, Stroke};
use crate::raster::names::Words;
use crate::raster::palette::{Color, Theme};
use crate::raster::text::{Align, TextStyle, draw_text_centered, text_width};

/// A disc in the plane of a turn, with the turned part filled.
#[derive(Clone, Debug, PartialEq)]
pub struct PlaneDisc {
    /// The joint, world.
    pub center: DVec3,
    /// Unit vector in the plane; angles count from it, world.
    pub u: DVec3,
    /// Unit vector in the plane, square to `u`; positive turns go from `u` to `v`. World.
    pub v: DVec3,
    /// World units.
    pub radius: f64,
    /// The old direction, radians from `u`.
    pub from_rad: f64,
    /// The new direction, radians from `u`; more than a whole turn away fills the disc.
    pub to_rad: f64,
    /// Ink; one of the planes' colours or the selection's.
    pub color: Color,
    /// What is written at the rim: the plane's letters.
    pub name: String,
    /// What is written in the turned part: the angle.
    pub angle_text: String,
    /// What it is doing.
    pub state: DiscState,
}

/// What a disc is doing, and with it how much of it is drawn.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum DiscState {
    /// It waits: a thin rim, paler where it goes behind the joint.
    Idle,
    /// The pointer is over it, or keys turn it: a firm rim and a pale face.
    Ready,
    /// It is turned: the sector it has swept, and the angle.
    Held,
}

/// A grip: a round dot with letters beside it, by which something is taken hold of.
#[derive(Clone, Debug, PartialEq)]
pub struct Knob {
    /// Where, world.
    pub at: DVec3,
    /// Ink.
    pub color: Color,
    /// Larger, with a ring.
    pub is_ready: bool,
    /// What is written beside it; may be empty.
    pub letters: String,
    /// The middle of what it belongs to, world: letters stand on the other side of the dot.
    pub away_from: DVec3,
}

impl PlaneDisc {
    /// The point on the rim at an angle (radians) from `u`, world.
    pub fn rim(&self, angle_rad: f64) -> DVec3 {
        self.center + (self.u * angle_rad.cos() + self.v * angle_rad.sin()) * self.radius
    }

    /// The angle (radians from `u`, −π..=π) of the place in the disc's plane that a ray meets; nothing when it runs
    /// beside the plane or away from it.
    pub fn angle_under(&self, ray: &Ray) -> Option<f64> {
        let met = ray.meet_plane(self.center, self.u.cross(self.v))? - self.center;
        Some(met.dot(self.v).atan2(met.dot(self.u)))
    }

    /// How far the disc's rim is from a pixel, in pixels: for taking hold of it.
    pub fn rim_distance(&self, view: &View, pixel: DVec2) -> Option<f64> {
        let rim = |i: u32| view.project(self.rim(TAU * f64::from(i) / 72.0)).map(|seen| seen.pixel);
        let distance_to_piece = |i: u32| {
            let (a, b) = (rim(i)?, rim(i + 1)?);
            let along = (pixel - a).dot(b - a) / (b - a).length_squared();
            let along = if along.is_finite() { along.clamp(0.0, 1.0) } else { 0.0 };
            Some(pixel.distance(a.lerp(b, along)))
        };
        (0..72).filter_map(distance_to_piece).min_by(f64::total_cmp)
    }
}

/// The directions a limb may point in: a cone whose rim need not be round.
#[derive(Clone, Debug, PartialEq)]
pub struct ReachCone {
    /// The joint, world.
    pub apex: DVec3,
    /// Closed rim in order, world.
    pub rim: Vec<DVec3>,
    /// Where the limb points now, as far out as the rim; world.
    pub now: Option<DVec3>,
    /// Ink.
    pub color: Color,
}

/// Draws a disc: faint over the figure, so that both can be read.
pub(super) fn draw_disc(canvas: &mut Canvas, view: &View, disc: &PlaneDisc, theme: &Theme, scale: f32) {
    let faint = Hidden::Faint(0.45);
    let line = Stroke { color: disc.color, width: 1.5 * scale, dash: None, hidden: faint };
    let rim: Vec<DVec3> = (0..=72).map(|i| disc.rim(TAU * f64::from(i) / 72.0)).collect();
    if disc.state != DiscState::Held {
        draw_waiting(canvas, view, disc, &rim, &line);
        return;
    }
    canvas.polygon(view, &rim[..72], disc.color.with_alpha(0.10), faint);
    canvas.polyline(view, &rim, &line);

    let turn = (disc.to_rad - disc.from_rad).clamp(-TAU, TAU);
    let steps = ((turn.abs() / TAU * 72.0).ceil() as usize).max(1);
    let arc: Vec<DVec3> =
        (0..=steps).map(|i| disc.rim(disc.from_rad + turn * i as f64 / steps as f64)).collect();
    let sector: Vec<DVec3> = std::iter::once(disc.center).chain(arc.iter().copied()).collect();
    canvas.polygon(view, &sector, disc.color.with_alpha(0.38), Hidden::Faint(0.7));
    canvas.polyline(view, &arc, &Stroke { width: 3.5 * scale, ..line });
    // The old direction is grey like every "before", the new one solid with a grip at its end.
    canvas.line(view, disc.center, arc[0], &Stroke { color: theme.before, ..line });
    let new_end = arc[arc.len() - 1];
    canvas.line(view, disc.center, new_end, &Stroke { width: 2.5 * scale, hidden: Hidden::Shown, ..line });
    canvas.dot(view, new_end, 5.0 * scale, disc.color, Hidden::Shown);
    canvas.dot(view, new_end, 2.0 * scale, disc.color.readable_ink(), Hidden::Shown);

    let middle = disc.from_rad + turn / 2.0;
    if !disc.angle_text.is_empty()
        && let Some(spot) = Spot::of(view, disc.center.lerp(disc.rim(middle), 0.62))
    {
        draw_plate(canvas, &disc.angle_text, spot.pixel, theme, scale);
    }
    if !disc.name.is_empty()
        && let (Some(out), Some(center)) = (Spot::of(view, disc.rim(middle)), Spot::of(view, disc.center))
    {
        let away = (out.pixel - center.pixel).normalize_or(Vec2::NEG_Y);
        let at = out.pixel + away * 12.0 * scale;
        let style = TextStyle::words(14.0 * scale, theme.text).aligned(Align::Center);
        draw_text_centered(&mut canvas.image, &disc.name, at, &style);
    }
}

/// The rim of a disc that nobody turns: its nearer half firm, the half behind the joint pale, so that it reads as a ring in space.
fn draw_waiting(canvas: &mut Canvas, view: &View, disc: &PlaneDisc, rim: &[DVec3], line: &Stroke) {
    let is_ready = disc.state == DiscState::Ready;
    if is_ready {
        canvas.polygon(view, &rim[..72], disc.color.with_alpha(0.12), Hidden::Faint(0.45));
    }
    let nearness = |point: DVec3| (point - disc.center).dot(view.back);
    // A ring that faces the eye has no far half.
    let level = 1e-6 * disc.radius;
    let is_behind = |pair: &[DVec3]| nearness(pair[0].midpoint(pair[1])) < -level;
    let behind = Stroke { color: line.color.with_alpha(if is_ready { 0.5 } else { 0.28 }), ..*line };
    let before = Stroke {
        color: line.color.with_alpha(if is_ready { 1.0 } else { 0.85 }),
        width: line.width * if is_ready { 1.6 } else { 1.0 },
        ..*line
    };
    let pieces: Vec<&[DVec3]> = rim.windows(2).collect();
    for run in pieces.chunk_by(|a, b| is_behind(a) == is_behind(b)) {
        let points: Vec<DVec3> =
            run.iter().map(|piece| piece[0]).chain(run.last().map(|piece| piece[1])).collect();
        canvas.polyline(view, &points, if is_behind(run[0]) { &behind } else { &before });
    }
}

/// Size of a grip's letters, points.
const KNOB_LETTERS: f32 = 12.5;

impl Knob {
    /// Points.
    fn radius(&self) -> f32 {
        if self.is_ready { 6.5 } else { 5.0 }
    }
}

/// Where a grip's letters stand: beyond its dot, as seen from what it turns about.
fn letters_of(view: &View, knob: &Knob, scale: f32) -> Option<Words> {
    let spot = Spot::of(view, knob.at).filter(|_| !knob.letters.is_empty())?;
    let middle = Spot::of(view, knob.away_from).map_or(spot.pixel, |middle| middle.pixel);
    let away = (spot.pixel - middle).normalize_or(Vec2::NEG_Y);
    let style = TextStyle::words(KNOB_LETTERS * scale, Color::TRANSPARENT);
    let half = Vec2::new(text_width(&knob.letters, &style) / 2.0, 6.0 * scale);
    Some(Words {
        middle: spot.pixel + away * (knob.radius() * scale + 4.0 * scale + half.dot(away.abs())),
        half,
    })
}

/// The room that a grip takes: its dot, and its letters.
pub(super) fn room_of_knob(view: &View, knob: &Knob, scale: f32) -> impl Iterator<Item = Words> + use<> {
    let dot = Spot::of(view, knob.at);
    let dot = dot.map(|spot| Words { middle: spot.pixel, half: Vec2::splat((knob.radius() + 1.5) * scale) });
    dot.into_iter().chain(letters_of(view, knob, scale))
}

/// Draws a grip over everything.
pub(super) fn draw_knob(canvas: &mut Canvas, view: &View, knob: &Knob, theme: &Theme, scale: f32) {
    let Some(spot) = Spot::of(view, knob.at) else { return };
    let radius = knob.radius() * scale;
    canvas.flat_dot(spot.pixel, radius + 1.5 * scale, theme.background.with_alpha(0.75));
    canvas.flat_dot(spot.pixel, radius, knob.color);
    if knob.is_ready {
        canvas.flat_ring(spot.pixel, radius + 2.5 * scale, 1.5 * scale, theme.text);
    }
    let Some(Words { middle: at, .. }) = letters_of(view, knob, scale) else { return };
    let style = TextStyle::words(KNOB_LETTERS * scale, theme.text).aligned(Align::Center);
    let shade = TextStyle { color: theme.background.with_alpha(0.8), ..style };
    for (x, y) in [(-1.0, 0.0), (1.0, 0.0), (0.0, -1.0), (0.0, 1.0)] {
        draw_text_centered(&mut canvas.image, &knob.letters, at + Vec2::new(x, y) * scale, &shade);
    }
    draw_text_centered(&mut canvas.image, &knob.letters, at, &style);
}

/// Draws a reach: a pale cone with a firm rim.
pub(super) fn draw_reach(canvas: &mut Canvas, view: &View, reach: &ReachCone, theme: &Theme, scale: f32) {
    let Some(&first) = reach.rim.first() else { return };
    let hidden = Hidden::Faint(0.35);
    let closed: Vec<DVec3> = reach.rim.iter().copied().chain(std::iter::once(first)).collect();
    for pair in closed.windows(2) {
        canvas.polygon(view, &[reach.apex, pair[0], pair[1]], reach.color.with_alpha(0.10), hidden);
    }
    let line = Stroke { color: reach.color, width: 1.5 * scale, dash: None, hidden };
    canvas.polyline(view, &closed, &line);
    for &end in reach.rim.iter().step_by((reach.rim.len() / 8).max(1)) {
        canvas.line(
            view,
            reach.apex,
            end,
            &Stroke { color: reach.color.with_alpha(0.5), width: scale, ..line },
        );
    }
    if let Some(now) = reach.now {
        draw_now(canvas, view, reach, now, theme, scale);
    }
}

/// Where the limb points, among all that it may: a ray with a dot, over everything.
fn draw_now(canvas: &mut Canvas, view: &View, reach: &ReachCone, now: DVec3, theme: &Theme, scale: f32) {
    let line = Stroke { color: reach.color, width: 1.5 * scale, dash: None, hidden: Hidden::Shown };
    canvas.line(view, reach.apex, now, &line);
    canvas.dot(view, now, 4.5 * scale, theme.background, Hidden::Shown);
    canvas.dot(view, now, 3.2 * scale, reach.color, Hidden::Shown);
}

/// The room of a plate that is wanted at `at`, kept inside a picture of `size`.
pub(super) fn room_of_plate(text: &str, at: Vec2, size: Vec2, scale: f32) -> Words {
    let style = TextStyle::words(14.0 * scale, Color::TRANSPARENT);
    let half = Vec2::new(text_width(text, &style) / 2.0 + 5.0 * scale, 9.5 * scale);
    Words { middle: at.max(half + 1.0).min((size - half - 1.0).max(half + 1.0)), half }
}

/// Writes a short text on a plate that keeps it legible over anything, centred at `at` and kept inside the picture.
pub(super) fn draw_plate(canvas: &mut Canvas, text: &str, at: Vec2, theme: &Theme, scale: f32) {
    let style = TextStyle::words(14.0 * scale, theme.text);
    let size = Vec2::new(canvas.width() as f32, canvas.height() as f32);
    let Words { middle: at, half } = room_of_plate(text, at, size, scale);
    let radius = 4.0 * scale;
    let mut outline = Vec::with_capacity(24);
    for (corner, (x, y)) in [(1.0, 1.0), (-1.0, 1.0), (-1.0, -1.0), (1.0, -1.0)].into_iter().enumerate() {
        let middle = at + Vec2::new(x, y) * (half - radius);
        for i in 0..6 {
            let angle = (corner as f32 + i as f32 / 5.0) * std::f32::consts::FRAC_PI_2;
            outline.push(middle + Vec2::from_angle(angle) * radius);
        }
    }
    canvas.flat_polygon(&outline, theme.panel.with_alpha(0.88));
    let centered = style.aligned(Align::Center);
    draw_text_centered(&mut canvas.image, text, at, &centered);
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::raster::camera::Camera;

    #[test]
    fn a_ray_through_the_rim_finds_its_angle_and_the_rim_is_near_its_pixel() {
        let camera = Camera { target: DVec3::ZERO, yaw_rad: 0.7, pitch_rad: 0.3, ..Camera::default() };
        let view = camera.view(400, 300);
        let disc = PlaneDisc {
            center: DVec3::new(0.1, 0.2, 0.0),
            u: DVec3::Y,
            v: DVec3::Z,
            radius: 0.5,
            from_rad: 0.0,
            to_rad: 0.0,
            color: Color::rgb(0),
            name: String::new(),
            angle_text: String::new(),
            state: DiscState::Held,
        };
        for angle in [-3.0, -1.2, 0.0, 0.4, 2.9] {
            let pixel = view.project(disc.rim(angle)).unwrap().pixel;
            let found = disc.angle_under(&view.ray(pixel)).unwrap();
            assert!((found - angle).abs() < 1e-9, "{found}");
            assert!(disc.rim_distance(&view, pixel).unwrap() < 0.3);
        }
        let center = view.project(disc.center).unwrap().pixel;
        assert!(disc.rim_distance(&view, center).unwrap() > 10.0);
        let away = Ray { origin: DVec3::X, direction: DVec3::X };
        assert_eq!(disc.angle_under(&away), None);
    }
}

//! The skeleton view: floor, source, result, neighbouring poses and the marks of the chosen joint, as one picture.

use glam::{DVec3, Vec2};

use crate::raster::camera::{Camera, View};
use crate::raster::canvas::{Canvas, Hidden, Spot, Stroke};
use crate::raster::disc::{
    Knob, PlaneDisc, ReachCone, draw_disc, draw_knob, draw_plate, draw_reach, room_of_knob, room_of_plate,
};
use crate::raster::figure::{Figure, draw_figures};
use crate::raster::floor::{Floor, draw_floor};
use crate::raster::image::Image;
use crate::raster::names::{Taken, draw_names};
use crate::raster::palette::{Color, Theme};

/// The way a joint or tip takes through the world. A dot for each frame shows its speed.
#[derive(Clone, Debug, PartialEq)]
pub struct TipPath {
    /// One place for each frame, world. Places that are not finite leave a gap.
    pub points: Vec<DVec3>,
    /// The frame shown, as an index into `points`.
    pub current: Option<usize>,
    /// Ink.
    pub color: Color,
}

/// A word beside a point of the world.
#[derive(Clone, Debug, PartialEq)]
pub struct Label {
    /// What it names, world.
    pub at: DVec3,
    /// The word.
    pub text: String,
}

/// All that a skeleton view shows.
#[derive(Clone, Debug, PartialEq)]
pub struct SceneView {
    /// Width of the picture, pixels.
    pub width: usize,
    /// Height of the picture, pixels.
    pub height: usize,
    /// Pixels per point: widths of lines and sizes of letters are in points.
    pub scale: f32,
    /// From where.
    pub camera: Camera,
    /// Colours.
    pub theme: Theme,
    /// The floor, if any.
    pub floor: Option<Floor>,
    /// Whatever poses are shown, each with its style.
    pub figures: Vec<Figure>,
    /// Paths of tips.
    pub tip_paths: Vec<TipPath>,
    /// Reaches that limits allow.
    pub reaches: Vec<ReachCone>,
    /// Discs that turn the chosen joint.
    pub discs: Vec<PlaneDisc>,
    /// Grips of the discs and of the limb's tip.
    pub knobs: Vec<Knob>,
    /// Words that are always shown, on plates.
    pub labels: Vec<Label>,
    /// Words beside points, those first that matter most. Where there is no room for one it is left out.
    pub names: Vec<Label>,
}

impl SceneView {
    /// An empty view of this size, one pixel per point.
    pub fn new(width: usize, height: usize, camera: Camera, theme: Theme) -> Self {
        Self {
            width,
            height,
            scale: 1.0,
            camera,
            theme,
            floor: None,
            figures: Vec::new(),
            tip_paths: Vec::new(),
            reaches: Vec::new(),
            discs: Vec::new(),
            knobs: Vec::new(),
            labels: Vec::new(),
            names: Vec::new(),
        }
    }

    /// The camera's view of this picture: for picking and dragging.
    pub fn view(&self) -> View {
        self.camera.view(self.width, self.height)
    }
}

/// The picture of a view.
pub fn render(scene: &SceneView) -> Image {
    let mut canvas = Canvas::default();
    render_into(scene, &mut canvas);
    canvas.image
}

/// The picture of a view, on a canvas kept from frame to frame.
pub fn render_into(scene: &SceneView, canvas: &mut Canvas) {
    canvas.reset(scene.width, scene.height, scene.theme.background);
    let (view, theme, scale) = (scene.view(), &scene.theme, scene.scale);
    let figures: Vec<&Figure> = scene.figures.iter().collect();
    if let Some(floor) = &scene.floor {
        let solid: Vec<&Figure> =
            figures.iter().copied().filter(|figure| figure.style.casts_shadow()).collect();
        draw_floor(canvas, &view, floor, &solid, theme, scale);
    }
    draw_figures(canvas, &view, &figures, theme, scale);
    for reach in &scene.reaches {
        draw_reach(canvas, &view, reach, theme, scale);
    }
    for path in &scene.tip_paths {
        draw_tip_path(canvas, &view, path, theme, scale);
    }
    let size = Vec2::new(scene.width as f32, scene.height as f32);
    let mut taken = Taken(scene.knobs.iter().flat_map(|knob| room_of_knob(&view, knob, scale)).collect());
    let plates: Vec<_> =
        scene.labels.iter().map(|label| place_label(label, &view, size, scale, &mut taken)).collect();
    draw_names(canvas, &view, &scene.names, theme, scale, &mut taken);
    for disc in &scene.discs {
        draw_disc(canvas, &view, disc, theme, scale);
    }
    for knob in &scene.knobs {
        draw_knob(canvas, &view, knob, theme, scale);
    }
    for (label, place) in scene.labels.iter().zip(plates) {
        let Some((foot, at)) = place else { continue };
        canvas.flat_polyline(&[foot, at], &Stroke::over(theme.text_faint, scale));
        draw_plate(canvas, &label.text, at, theme, scale);
    }
}

fn draw_tip_path(canvas: &mut Canvas, view: &View, path: &TipPath, theme: &Theme, scale: f32) {
    let hidden = Hidden::Faint(0.3);
    let line = Stroke { color: path.color.with_alpha(0.85), width: 1.5 * scale, dash: None, hidden };
    canvas.polyline(view, &path.points, &line);
    // A dot for each frame, or for every second, fourth … where most of them would run into a second, thicker line. Where the
    // tip dwells they still do: that it dwells is what they say.
    let seen: Vec<Option<Vec2>> =
        path.points.iter().map(|&point| Spot::of(view, point).map(|spot| spot.pixel)).collect();
    let step = dot_step(&seen, 3.6 * scale);
    let start = path.current.unwrap_or(0) % step;
    for &point in path.points.iter().skip(start).step_by(step) {
        canvas.dot(view, point, 1.9 * scale, path.color, hidden);
    }
    if let Some(&now) = path.current.and_then(|frame| path.points.get(frame)) {
        canvas.dot(view, now, 5.5 * scale, theme.background, Hidden::Shown);
        canvas.dot(view, now, 4.0 * scale, path.color, Hidden::Shown);
    }
}

/// Every how many frames a dot is drawn, a power of two: so that the usual gap is at least so many pixels.
fn dot_step(seen: &[Option<Vec2>], least_gap: f32) -> usize {
    let gaps = seen.windows(2).filter_map(|pair| Some(pair[0]?.distance(pair[1]?)));
    let mut moving: Vec<f32> = gaps.filter(|gap| *gap > 0.25).collect();
    if moving.is_empty() {
        return 1;
    }
    let middle = moving.len() / 2;
    let (_, usual, _) = moving.select_nth_unstable_by(middle, f32::total_cmp);
    let wanted = (least_gap / *usual).ceil().clamp(1.0, 64.0) as usize;
    wanted.next_power_of_two()
}

/// What a label names and where its plate stands, in pixels: above that, else beside or higher where others stand.
fn place_label(
    label: &Label,
    view: &View,
    size: Vec2,
    scale: f32,
    taken: &mut Taken,
) -> Option<(Vec2, Vec2)> {
    let foot = Spot::of(view, label.at)?.pixel;
    let room = |offset: Vec2| room_of_plate(&label.text, foot + offset * scale, size, scale);
    let step = 2.0 * room(Vec2::ZERO).half / scale + 3.0;
    let columns = [0.0, 1.0, -1.0, 2.0, -2.0];
    let places = (0..3).flat_map(|row| columns.map(|column| Vec2::new(column, row as f32)));
    let places = places.map(|Vec2 { x, y }| room(Vec2::new(x * step.x, -20.0 - y * step.y)));
    Some((foot, taken.take_first(places)?.middle))
}

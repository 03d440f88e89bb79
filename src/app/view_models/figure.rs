//! The skeleton view as the rasteriser takes it: poses, floor, tip path and camera at one time.

use std::sync::Arc;

use glam::{DAffine3, DVec3};

use crate::blend::GroundMove;
use crate::clip::Clip;
use crate::raster::{
    Bounds, Camera, Figure, FigureLimb, FigureStyle, Floor, Girth, Label, SceneView, Theme, TipPath,
    limbs_of_skeleton,
};
use crate::skeleton::{Skeleton, Transform};
use crate::snag::{Cancelled, Progress};

use super::sampled::rotation_at;

/// The limbs of a clip at a time. A skeleton without any length, such as a lone sensor, shows its three axes instead:
/// otherwise nothing would be seen of how it turns.
fn limbs_at(clip: &Clip, time_secs: f64) -> Vec<FigureLimb> {
    let world = clip.world_at(time_secs);
    let limbs = limbs_of_skeleton(&clip.skeleton, &world);
    if limbs.iter().any(|limb| limb.from.distance(limb.to) > 0.0) {
        return limbs;
    }
    let axes = |joint: usize| {
        let own = &world[joint];
        let from = own.position();
        DVec3::AXES.map(|axis| FigureLimb { from, to: from + own.rotation.apply(axis) * AXIS_LENGTH, joint })
    };
    clip.skeleton.listed().flat_map(axes).collect()
}

/// World units: a sensor has no size of its own.
const AXIS_LENGTH: f64 = 1.0;

/// What stays the same for a clip whatever its time: the floor, and where the figure goes.
#[derive(Clone, Debug, PartialEq)]
pub struct Stage {
    /// The box around the figure at the start.
    pub figure: Bounds,
    /// The box around the figure at all times.
    pub travel: Bounds,
    /// How thick its limbs are.
    pub girth: Girth,
    /// The joint that carries it.
    pub root: Option<usize>,
}

/// Poses looked at to find where the figure goes.
const POSES: usize = 48;

impl Stage {
    /// Looks through a clip.
    pub fn new(clip: &Clip) -> Self {
        let nowhere = Bounds { min: DVec3::ZERO, max: DVec3::ONE };
        let figure = bounds_at(clip, 0.0).unwrap_or(nowhere);
        let times = (0..=POSES).map(|pose| clip.duration_secs * pose as f64 / POSES as f64);
        let travel = times.filter_map(|time| bounds_at(clip, time)).fold(figure, |all, own| all.union(&own));
        let root = clip.skeleton.listed().next();
        Self { figure, travel, girth: Girth::of_limbs(&limbs_at(clip, 0.0)), root }
    }

    /// Whether the figure leaves the place where it starts.
    pub fn walks(&self) -> bool {
        self.travel.size() > 1.8 * self.figure.size()
    }

    /// How far the figure has gone over the floor since the start, level part only.
    pub fn gone(&self, clip: &Clip, time_secs: f64) -> DVec3 {
        let Some(root) = self.root else { return DVec3::ZERO };
        let at = |time| scene_from_joint(clip, root, time).translation;
        let way = at(time_secs) - at(0.0);
        if way.is_finite() { DVec3::new(way.x, 0.0, way.z) } else { DVec3::ZERO }
    }
}

/// The box around a pose.
pub fn bounds_at(clip: &Clip, time_secs: f64) -> Option<Bounds> {
    let limbs = limbs_at(clip, time_secs);
    Bounds::of_points(limbs.iter().flat_map(|limb| [limb.from, limb.to]))
}

/// Whether the limbs are the axes that [`limbs_at`] draws for want of limbs.
fn has_axes(clip: &Clip, limbs: &[FigureLimb]) -> bool {
    let joints = clip.skeleton.joints();
    let has_no_size =
        |joint: usize| joints[joint].tips.is_empty() && clip.skeleton.children(joint).is_empty();
    clip.skeleton.listed().all(has_no_size) && limbs.len() == 3 * clip.skeleton.listed().count()
}

/// One joint's frame in the scene, worked out along its ancestors alone.
pub fn scene_from_joint(clip: &Clip, joint: usize, time_secs: f64) -> DAffine3 {
    let joints = clip.skeleton.joints();
    let mut affine = local(clip, joint, time_secs).to_affine();
    let mut above = joints[joint].parent;
    while let Some(parent) = above {
        affine = local(clip, parent, time_secs).to_affine() * affine;
        above = joints[parent].parent;
    }
    affine
}

fn local(clip: &Clip, joint: usize, time_secs: f64) -> Transform {
    let rest = clip.skeleton.joints()[joint].rest;
    let tracks = clip.joints.get(joint);
    let place = tracks.and_then(|tracks| tracks.translation.as_ref()).and_then(|track| track.at(time_secs));
    let size = tracks.and_then(|tracks| tracks.scale.as_ref()).and_then(|track| track.at(time_secs));
    Transform {
        translation: place.unwrap_or(rest.translation),
        rotation: rotation_at(clip, joint, time_secs),
        scale: size.unwrap_or(rest.scale),
    }
}

/// The end of a joint's limb in its own frame: its first child, else its end point, else the joint itself.
fn tip_of(skeleton: &Skeleton, joint: usize) -> DVec3 {
    let child = skeleton.children(joint).first().map(|&child| skeleton.joints()[child].rest.translation);
    child.or(skeleton.joints()[joint].tips.first().copied()).unwrap_or(DVec3::ZERO)
}

/// Where the tip of a joint's limb is at each frame.
///
/// # Errors
/// When it is told to stop.
pub fn tip_path(clip: &Clip, joint: usize, progress: &dyn Progress) -> Result<Vec<DVec3>, Cancelled> {
    let tip = tip_of(&clip.skeleton, joint);
    let count = clip.grid.count();
    let mut points = Vec::with_capacity(count);
    for frame in 0..count {
        if frame % 1024 == 0 && !progress.report(frame, count) {
            return Err(Cancelled);
        }
        points.push(scene_from_joint(clip, joint, clip.grid.time(frame)).transform_point3(tip));
    }
    Ok(points)
}

/// What decides the picture of the skeleton view.
#[derive(Clone, Copy, Debug)]
pub struct FigureRequest<'a> {
    /// Size in pixels.
    pub size_px: [usize; 2],
    /// Pixels per point.
    pub scale: f32,
    /// From where, before it follows.
    pub camera: Camera,
    /// Colours.
    pub theme: Theme,
    /// The source clip.
    pub source: &'a Clip,
    /// The result.
    pub result: &'a Clip,
    /// When.
    pub time_secs: f64,
    /// The chosen joint.
    pub chosen: Option<usize>,
    /// The joint under the pointer.
    pub hovered: Option<usize>,
    /// Draw the source as well.
    pub shows_before: bool,
    /// Draw the source in place of the result.
    pub source_alone: bool,
    /// Go along with the figure.
    pub follows: bool,
    /// The way of the chosen joint's tip.
    pub tip_path: Option<&'a [DVec3]>,
    /// Faint figures beside the result.
    pub faint: &'a [FaintFigure],
}

/// A clip at a time of its own, set down elsewhere, drawn faintly with a letter above it.
#[derive(Clone, Debug)]
pub struct FaintFigure {
    /// The clip.
    pub clip: Arc<Clip>,
    /// When, in its own time.
    pub time_secs: f64,
    /// Where.
    pub place: GroundMove,
    /// What it is called.
    pub letter: char,
}

impl PartialEq for FaintFigure {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.clip, &other.clip)
            && (self.time_secs, self.place, self.letter) == (other.time_secs, other.place, other.letter)
    }
}

/// Seconds of a tip's way that are drawn before and after the playhead: more would be a ball of wool.
const PATH_SECS: f64 = 0.7;

/// The view to draw.
pub fn figure_view(stage: &Stage, request: &FigureRequest<'_>) -> SceneView {
    let FigureRequest { source, result, time_secs, .. } = *request;
    let mut camera = request.camera;
    if request.follows {
        camera.target += stage.gone(result, time_secs);
    }
    let mut view = SceneView::new(request.size_px[0], request.size_px[1], camera, request.theme);
    view.scale = request.scale;
    let pose = |clip: &Clip, style| Figure {
        girth: stage.girth,
        chosen: request.chosen,
        hovered: request.hovered,
        ..Figure::new(limbs_at(clip, time_secs), style)
    };
    for faint in request.faint {
        let mut limbs = limbs_at(&faint.clip, faint.time_secs);
        for limb in &mut limbs {
            (limb.from, limb.to) = (faint.place.apply(limb.from), faint.place.apply(limb.to));
        }
        let top = limbs.iter().map(|limb| limb.to).max_by(|a, b| a.y.total_cmp(&b.y));
        view.labels.extend(top.map(|at| Label { at, text: faint.letter.to_string() }));
        view.figures.push(Figure { girth: stage.girth, ..Figure::new(limbs, FigureStyle::Ghost) });
    }
    let shown = if request.source_alone { source } else { result };
    let differs = !std::ptr::eq(source, result);
    if request.shows_before && differs && !request.source_alone {
        view.figures.push(Figure { chosen: None, hovered: None, ..pose(source, FigureStyle::Before) });
    }
    let style = if request.source_alone { FigureStyle::Before } else { FigureStyle::After };
    let figure = pose(shown, style);
    let under = Bounds { min: stage.travel.min, max: stage.travel.max };
    let mut floor = Floor::under(&Bounds {
        min: DVec3::new(stage.figure.min.x, under.min.y, stage.figure.min.z),
        max: stage.figure.max,
    });
    if let Some(now) = figure.bounds() {
        let middle = now.center();
        floor.center.x = (middle.x / floor.step).round() * floor.step;
        floor.center.z = (middle.z / floor.step).round() * floor.step;
    }
    view.floor = Some(floor);
    if has_axes(shown, &figure.limbs) {
        let names = ["x", "y", "z"].into_iter().cycle();
        let label = |(limb, name): (&FigureLimb, &str)| Label { at: limb.to, text: name.to_owned() };
        view.labels.extend(figure.limbs.iter().zip(names).map(label));
    }
    view.figures.push(figure);
    if let Some(points) = request.tip_path.filter(|points| !points.is_empty()) {
        let now = result.grid.frame(time_secs).min(points.len() - 1);
        let frames = (PATH_SECS * result.grid.rate).ceil().clamp(8.0, 400.0) as usize;
        let first = now.saturating_sub(frames);
        let last = (now + frames + 1).min(points.len());
        view.tip_paths.push(TipPath {
            points: points[first..last].to_vec(),
            current: Some(now - first),
            color: request.theme.selection,
        });
    }
    view
}

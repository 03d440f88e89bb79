//! The skeleton view as the rasteriser takes it: poses, floor, tip path and camera at one time.

use std::sync::Arc;

use glam::{DAffine3, DVec3};

use crate::blend::GroundMove;
use crate::clip::Clip;
use crate::limit::JointLimit;
use crate::raster::{
    Bounds, Camera, Color, DiscState, Figure, FigureLimb, FigureStyle, Floor, Girth, Knob, Label, PlaneDisc,
    ReachCone, SceneView, Theme, TipPath, limbs_of_skeleton,
};
use crate::skeleton::roles::Roles;
use crate::skeleton::{Skeleton, Transform, WorldJoint};

use super::super::session::{Disc, TurnPlanes};
use super::hand_drag::Swept;
use super::handles::{DiscHandle, Handles, disc_radius_px, handles, parent_in_world};
use super::reach::{ReachOf, reach_of};
use super::sampled::rotation_at;
use super::words::degrees;

/// The limbs of a clip at a time. A skeleton without any length, such as a lone sensor, shows its three axes instead:
/// otherwise nothing would be seen of how it turns.
fn limbs_at(clip: &Clip, time_secs: f64) -> Vec<FigureLimb> {
    limbs_or_axes(&clip.skeleton, &clip.world_at(time_secs))
}

fn limbs_or_axes(skeleton: &Skeleton, world: &[WorldJoint]) -> Vec<FigureLimb> {
    let limbs = limbs_of_skeleton(skeleton, world);
    if limbs.iter().any(|limb| limb.from.distance(limb.to) > 0.0) {
        return limbs;
    }
    let axes = |joint: usize| {
        let own = &world[joint];
        let from = own.position();
        DVec3::AXES.map(|axis| FigureLimb { from, to: from + own.rotation.apply(axis) * AXIS_LENGTH, joint })
    };
    skeleton.listed().flat_map(axes).collect()
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
    /// The joint that carries it: the first that is moved itself, for above the hips a file may have joints that stand still.
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
        let root = carrying_joint(clip, figure.size());
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

/// The first joint of a clip that is moved from its place by a share of the figure's size, by itself or, at the top, by what it hangs on;
/// where none is, the first.
fn carrying_joint(clip: &Clip, size: f64) -> Option<usize> {
    /// Less is noise.
    const LEAST_SHARE: f64 = 0.01;
    let poses = || (0..=POSES).map(|pose| clip.duration_secs * pose as f64 / POSES as f64);
    let travels = |place: &dyn Fn(f64) -> DVec3| {
        let way = Bounds::of_points(poses().map(place).filter(|place| place.is_finite()));
        way.is_some_and(|way| way.size() > LEAST_SHARE * size)
    };
    let is_moved = |&joint: &usize| {
        let is_top = clip.skeleton.parent_joint(joint).is_none();
        let has_track = clip.joints.get(joint).is_some_and(|tracks| tracks.translation.is_some());
        (has_track && travels(&|secs| local(clip, joint, secs).translation))
            || (is_top && travels(&|secs| scene_from_joint(clip, joint, secs).translation))
    };
    clip.skeleton.listed().find(is_moved).or_else(|| clip.skeleton.listed().next())
}

/// The box around a joint and all that hangs on its limbs' ends.
pub fn joint_bounds(clip: &Clip, joint: usize, time_secs: f64) -> Option<Bounds> {
    let limbs = limbs_at(clip, time_secs);
    let own = limbs.iter().filter(|limb| limb.joint == joint);
    Bounds::of_points(own.flat_map(|limb| [limb.from, limb.to]))
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
pub(super) fn tip_of(skeleton: &Skeleton, joint: usize) -> DVec3 {
    let child = skeleton.children(joint).first().map(|&child| skeleton.joints()[child].rest.translation);
    child.or(skeleton.joints()[joint].tips.first().copied()).unwrap_or(DVec3::ZERO)
}

/// What decides the picture of the skeleton view.
#[derive(Clone, Copy, Debug)]
#[expect(clippy::struct_excessive_bools, reason = "independent switches of one view")]
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
    /// Faint figures beside the result.
    pub faint: &'a [FaintFigure],
    /// The way of the chosen joint's tip around the playhead and the place of the playhead in it, in the source and in the result.
    pub trails: [Option<(&'a [DVec3], usize)>; 2],
    /// Frames from one neighbouring pose to the next, where they are shown.
    pub neighbour_frames: Option<usize>,
    /// Name the joints.
    pub shows_names: bool,
    /// Draw the floor.
    pub shows_floor: bool,
    /// The limit of the chosen joint.
    pub limit: Option<&'a JointLimit>,
    /// What is known of the chosen joint's handles and what they do; none without discs.
    pub handling: Option<Handling<'a>>,
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

/// What decides how the handles of the chosen joint are drawn.
#[derive(Clone, Copy, Debug)]
pub struct Handling<'a> {
    /// In whose planes the discs lie.
    pub planes: TurnPlanes,
    /// Which joint plays which part, for limbs of two joints.
    pub roles: Option<&'a Roles>,
    /// The disc that stands out: under the pointer, or the one that keys turn.
    pub ready: Option<Disc>,
    /// The tip's grip is under the pointer.
    pub tip_is_ready: bool,
    /// The disc that is held, and what it has swept.
    pub swept: Option<Swept>,
    /// Something is held: the other handles are out of the way.
    pub is_held: bool,
}

/// The view to draw, and what in it can be taken hold of.
#[derive(Clone, Debug, PartialEq)]
pub struct FigureView {
    /// For the rasteriser.
    pub scene: SceneView,
    /// The handles of the chosen joint.
    pub handles: Option<Handles>,
    /// The limit of the chosen joint, with its use in words.
    pub reach: Option<ReachOf>,
}

/// Neighbouring poses to either side.
const NEIGHBOURS: usize = 3;

/// The view to draw.
pub fn figure_view(stage: &Stage, request: &FigureRequest<'_>) -> FigureView {
    let FigureRequest { source, result, time_secs, theme, .. } = *request;
    let mut camera = request.camera;
    if request.follows {
        camera.target += stage.gone(result, time_secs);
    }
    let mut scene = SceneView::new(request.size_px[0], request.size_px[1], camera, theme);
    scene.scale = request.scale;
    for faint in request.faint {
        let mut limbs = limbs_at(&faint.clip, faint.time_secs);
        for limb in &mut limbs {
            (limb.from, limb.to) = (faint.place.apply(limb.from), faint.place.apply(limb.to));
        }
        let top = limbs.iter().map(|limb| limb.to).max_by(|a, b| a.y.total_cmp(&b.y));
        scene.labels.extend(top.map(|at| Label { at, text: faint.letter.to_string() }));
        scene.figures.push(Figure { girth: stage.girth, ..Figure::new(limbs, FigureStyle::Ghost) });
    }
    let shown = if request.source_alone { source } else { result };
    let world = shown.world_at(time_secs);
    let figure = |limbs: Vec<FigureLimb>, style| Figure {
        girth: stage.girth,
        chosen: None,
        hovered: None,
        ..Figure::new(limbs, style)
    };
    let differs = !std::ptr::eq(source, result);
    if request.shows_before && differs && !request.source_alone {
        scene.figures.push(figure(limbs_at(source, time_secs), FigureStyle::Before));
    }
    let style = if request.source_alone { FigureStyle::Before } else { FigureStyle::After };
    let own = Figure {
        chosen: request.chosen,
        hovered: request.hovered,
        ..figure(limbs_or_axes(&shown.skeleton, &world), style)
    };
    if request.shows_floor {
        scene.floor = Some(floor_under(stage, &own));
    }
    if has_axes(shown, &own.limbs) {
        // Joints without a hierarchy stand at one place: letters for one of them are enough.
        let named = request.chosen.or(own.limbs.first().map(|limb| limb.joint));
        let its = own.limbs.iter().filter(|limb| Some(limb.joint) == named);
        let label = |(limb, name): (&FigureLimb, &str)| Label { at: limb.to, text: name.to_owned() };
        scene.labels.extend(its.zip(["x", "y", "z"]).map(label));
    } else if request.shows_names {
        scene.names = joint_names(&shown.skeleton, &world, &camera, [request.chosen, request.hovered]);
    }
    scene.figures.push(own);
    if let Some(step) = request.neighbour_frames {
        let times = neighbour_times(shown, time_secs, step);
        scene.figures.extend(times.map(|time| figure(limbs_at(shown, time), FigureStyle::Ghost)));
    }
    let inks = [theme.before, theme.selection];
    for (trail, color) in request.trails.into_iter().zip(inks) {
        let Some((points, current)) = trail.filter(|(points, _)| points.len() > 1) else { continue };
        scene.tip_paths.push(TipPath { points: points.to_vec(), current: Some(current), color });
    }
    let chosen = request.chosen.filter(|&joint| joint < world.len());
    let reach = chosen.and_then(|joint| {
        let limit = request.limit?;
        let tip = world[joint].scene_from_joint.transform_point3(tip_of(&shown.skeleton, joint));
        let apex = world[joint].position();
        let length = tip.distance(apex);
        let length = if length > 0.0 { length } else { 0.1 * stage.figure.size() };
        let local = rotation_at(shown, joint, time_secs);
        let above = parent_in_world(&shown.skeleton, &world, joint);
        Some((apex, reach_of(limit, local, above, apex, length, shown.skeleton.label(joint))))
    });
    if let Some((apex, reach)) = reach.as_ref().filter(|(_, reach)| !reach.rim.is_empty()) {
        let color = if reach.is_beyond { theme.snag } else { theme.text_faint };
        scene.reaches.push(ReachCone { apex: *apex, rim: reach.rim.clone(), now: Some(reach.now), color });
    }
    let handles = chosen.zip(request.handling).and_then(|(joint, handling)| {
        let view = scene.view();
        let seen = view.project(world[joint].position())?;
        let radius_px = disc_radius_px(request.size_px, f64::from(request.scale), seen.pixel);
        let handles = handles(shown, &world, joint, handling.planes, handling.roles, &view, radius_px)?;
        add_handles(&mut scene, &handles, &handling);
        Some(handles)
    });
    FigureView { scene, handles, reach: reach.map(|(_, reach)| reach) }
}

/// The floor under a figure, its lines standing still while the figure walks.
fn floor_under(stage: &Stage, figure: &Figure) -> Floor {
    let mut floor = Floor::under(&Bounds {
        min: DVec3::new(stage.figure.min.x, stage.travel.min.y, stage.figure.min.z),
        max: stage.figure.max,
    });
    if let Some(now) = figure.bounds() {
        let middle = now.center();
        floor.center.x = (middle.x / floor.step).round() * floor.step;
        floor.center.z = (middle.z / floor.step).round() * floor.step;
    }
    floor
}

/// The times of neighbouring poses: frames that are a whole number of steps away, within the clip.
fn neighbour_times(clip: &Clip, time_secs: f64, step: usize) -> impl Iterator<Item = f64> {
    let now = clip.grid.frame(time_secs);
    let before = (1..=NEIGHBOURS).filter_map(move |i| now.checked_sub(i * step));
    let count = clip.grid.count();
    let after = (1..=NEIGHBOURS).map(move |i| now + i * step).filter(move |&frame| frame < count);
    before.chain(after).map(|frame| clip.grid.time(frame))
}

/// Names of the joints, those first that matter most: the chosen one, the one under the pointer, then from the nearest to the eye.
fn joint_names(
    skeleton: &Skeleton,
    world: &[WorldJoint],
    camera: &Camera,
    first: [Option<usize>; 2],
) -> Vec<Label> {
    let back = camera.view(1, 1).back;
    let mut joints: Vec<usize> = skeleton.listed().collect();
    let rank = |joint: usize| first.iter().position(|&own| own == Some(joint)).unwrap_or(first.len());
    let near = |joint: usize| world[joint].position().dot(back);
    joints.sort_by(|&a, &b| rank(a).cmp(&rank(b)).then(near(b).total_cmp(&near(a))));
    let label = |joint: usize| Label { at: world[joint].position(), text: skeleton.label(joint).to_owned() };
    joints.into_iter().map(label).collect()
}

/// The ink of a disc.
fn disc_color(theme: &Theme, disc: Disc) -> Color {
    match disc.plane() {
        Some((_, place)) => theme.planes[place],
        None if disc == Disc::Twist => theme.selection,
        None => theme.text_faint,
    }
}

/// Puts handles into a view. While one is held the others are out of the way.
fn add_handles(scene: &mut SceneView, handles: &Handles, handling: &Handling<'_>) {
    let theme = scene.theme;
    if let Some(swept) = &handling.swept {
        let turn = (swept.to_rad - swept.from_rad).to_degrees();
        scene.discs.push(PlaneDisc {
            from_rad: swept.from_rad,
            to_rad: swept.to_rad,
            name: swept.handle.disc.name().to_owned(),
            angle_text: signed_degrees(turn),
            ..plane_disc(&swept.handle, &theme, DiscState::Held)
        });
    }
    if handling.is_held {
        return;
    }
    for handle in &handles.discs {
        let is_ready = handling.ready == Some(handle.disc);
        let state = if is_ready { DiscState::Ready } else { DiscState::Idle };
        scene.discs.push(plane_disc(handle, &theme, state));
        scene.knobs.push(Knob {
            at: handle.rim(handle.grip_rad),
            color: disc_color(&theme, handle.disc),
            is_ready,
            letters: handle.disc.name().to_owned(),
            away_from: handle.center,
        });
    }
    if let Some(tip) = &handles.tip {
        let joint = handles.discs.first().map_or(tip.at, |disc| disc.center);
        scene.knobs.push(Knob {
            at: tip.at,
            color: theme.text,
            is_ready: handling.tip_is_ready,
            letters: String::new(),
            away_from: joint,
        });
    }
}

fn plane_disc(handle: &DiscHandle, theme: &Theme, state: DiscState) -> PlaneDisc {
    PlaneDisc {
        center: handle.center,
        u: handle.u,
        v: handle.v,
        radius: handle.radius,
        from_rad: 0.0,
        to_rad: 0.0,
        color: disc_color(theme, handle.disc),
        name: String::new(),
        angle_text: String::new(),
        state,
    }
}

/// An angle with its sign: `+12.5°`.
fn signed_degrees(angle_deg: f64) -> String {
    let text = degrees(angle_deg);
    if angle_deg > 0.0 && text != "0°" { format!("+{text}") } else { text }
}

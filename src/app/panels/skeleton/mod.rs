//! The skeleton view: the figure in space, before and after, and the handles that turn the chosen joint.

mod camera;
mod card;
mod hold;
mod tools;

use std::sync::Arc;

use egui::{CursorIcon, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};
use glam::DVec2;

use super::super::commands::{Action, Command};
use super::super::pictures::{ClipKey, Pictures, SkeletonKey, on_pixels};
use super::super::session::Fit;
use super::super::view_models::{FigureRequest, Handling, Trail, figure_view, joint_bounds};
use super::super::widgets::{Icon, hint, icon_button, read_out, segment, strip};
use super::Scope;
use crate::clip::Clip;
use crate::limit::JointLimit;
use crate::raster::{Camera, FigureStyle};
use crate::scene::PassStep;

/// How near a limb the pointer must be to mean it, points.
const SLACK: f32 = 7.0;
/// Lower than this the view has no row of tools.
const ROOM_FOR_TOOLS: f32 = 190.0;

/// The panel.
pub(crate) fn skeleton_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let alone = scope.bench.session.shows_source_alone();
    let title = match (alone, scope.bench.session.camera.is_mirrored) {
        (true, _) => "Skeleton: source alone",
        (false, true) => "Skeleton, mirrored",
        (false, false) => "Skeleton",
    };
    strip(ui, title, |ui| {
        icon_button(ui, Icon::Follow, Action::Follow, scope.now, scope.out);
        icon_button(ui, Icon::Fit, Action::Fit, scope.now, scope.out);
        ui.add_space(6.0);
        segment(ui, "Alone", Action::SourceAlone, scope.now, scope.out);
        segment(ui, "Source", Action::ShowBefore, scope.now, scope.out);
    });
    let (Some(source), Some(result)) = (scope.bench.before().cloned(), scope.bench.result().cloned()) else {
        hint(ui, "No figure: the source file is not there");
        return;
    };
    let mut room = ui.available_rect_before_wrap();
    let tools = (room.height() > ROOM_FOR_TOOLS).then(|| {
        let tools = Rect::from_min_max(pos2(room.left(), room.bottom() - tools::HEIGHT), room.max);
        room.max.y -= tools::HEIGHT;
        tools
    });
    let (bounds, size_px) = on_pixels(room, ui.pixels_per_point());
    if bounds.width() < 24.0 || bounds.height() < 24.0 {
        return;
    }
    let response = ui.allocate_rect(bounds, Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Skeleton view"));
    let rim = hold::take_hold(ui, &response, bounds, scope);
    hold::carry_on(ui, scope);
    let camera = camera_now(ui, &response, bounds, size_px, scope, [&source, &result]);
    show(ui, bounds, size_px, camera, scope, [&source, &result]);
    let is_over_grip = hold::grips_ui(ui, bounds, rim, scope);
    if !is_over_grip && scope.pictures.grip.is_none() {
        choose(ui, &response, bounds, scope, rim.is_some());
    }
    card::legend(ui, bounds, scope, !Arc::ptr_eq(&source, &result));
    let reach = scope.pictures.figure.as_ref().and_then(|figure| figure.reach.clone());
    if let Some(reach) = reach.filter(|_| bounds.height() > 120.0) {
        card::reach_words(ui, bounds, scope, &reach);
    }
    card::view_card(ui, bounds, scope);
    if let Some(tools) = tools {
        tools::tools_ui(ui, tools, scope, &result);
    }
}

/// The least of a disc's radius, points.
const DISC_ROOM: f64 = 36.0;

/// The camera of this frame: fitted if that was asked for, else moved by the pointer.
fn camera_now(
    ui: &Ui,
    response: &egui::Response,
    bounds: Rect,
    size_px: [usize; 2],
    scope: &mut Scope<'_>,
    [source, result]: [&Arc<Clip>; 2],
) -> Camera {
    let session = &scope.bench.session;
    // A retarget, and its undoing, brings another figure, which may be of another size and elsewhere.
    let is_other = |fitted: &Arc<Clip>| !fitted.has_skeleton_of(result);
    let has_come = scope.pictures.fitted.as_ref().is_some_and(is_other).then_some(Fit::Again);
    let Some(fit) = session.fit.or(has_come) else {
        if scope.pictures.grip.is_some() {
            return session.camera;
        }
        let camera = camera::moved(ui, response, session.camera, size_px, bounds);
        if camera != session.camera {
            scope.out.push(Command::SetCamera(camera));
        }
        return camera;
    };
    scope.pictures.fitted = Some(Arc::clone(result));
    let stage = scope.pictures.stage(source);
    let mut camera = session.camera;
    let mut follows = session.follows;
    let time_secs = session.playback.playhead_secs;
    let own = session.joint.filter(|joint| fit == Fit::Joint && *joint < result.skeleton.len());
    let own = own.and_then(|joint| joint_bounds(result, joint, time_secs));
    if fit == Fit::Arrive {
        follows = stage.walks();
    }
    let around = own.as_ref().unwrap_or(if follows { &stage.figure } else { &stage.travel });
    // Around one limb some of its neighbours stay in view.
    // Around the whole figure there is room for the discs of a root on the floor, though not at the price of the figure.
    let half_height = 0.5 * f64::from(bounds.height()).max(1.0);
    let margin = if own.is_some() { 0.5 } else { (DISC_ROOM / half_height).clamp(0.12, 0.18) };
    camera.fit(around, size_px[0], size_px[1], margin);
    if own.is_some() && follows {
        camera.target -= stage.gone(result, time_secs);
    }
    scope.out.push(Command::FigureIsFitted { camera, follows });
    camera
}

/// Draws the picture, if anything in it has changed.
fn show(
    ui: &Ui,
    bounds: Rect,
    size_px: [usize; 2],
    camera: Camera,
    scope: &mut Scope<'_>,
    [source, result]: [&Arc<Clip>; 2],
) {
    let session = &scope.bench.session;
    let space = &session.space;
    let alone = session.shows_source_alone();
    let stage = scope.pictures.stage(source);
    let roles = scope.bench.roles_of(&result.skeleton);
    let joint = session.joint.filter(|&joint| joint < result.skeleton.len());
    let grip = scope.pictures.grip.as_ref();
    let swept = grip.and_then(|grip| grip.drag.swept(grip.snap_rad));
    let has_handles = grip.is_some() || (space.shows_discs && !alone && !session.playback.is_playing);
    let ready = scope.pictures.ready;
    let faint = super::blend_figures(scope, result);
    let limit = joint.filter(|_| space.shows_reach).and_then(|joint| limit_of(scope, joint, result));
    let key = SkeletonKey {
        size_px,
        camera,
        time_bits: session.playback.playhead_secs.to_bits(),
        clips: [ClipKey(Arc::clone(source)), ClipKey(Arc::clone(result))],
        joints: [session.joint, scope.pictures.hovered],
        switches: [
            ui.visuals().dark_mode,
            session.shows_before,
            alone,
            session.follows,
            has_handles,
            grip.is_some(),
            roles.is_some(),
        ],
        space: space.clone(),
        ready,
        swept,
        limit: limit.copied(),
        faint: faint.clone(),
        scale: ui.pixels_per_point(),
    };
    let handling = has_handles.then_some(Handling {
        planes: space.planes,
        roles,
        ready: ready.disc,
        tip_is_ready: ready.tip,
        swept,
        is_held: grip.is_some(),
    });
    let follows = session.follows;
    let time_secs = session.playback.playhead_secs;
    let Pictures { skeleton, figure, canvas, trails, hovered, .. } = &mut *scope.pictures;
    let texture = skeleton.show(ui.ctx(), "skeleton view", key, |_| {
        let path_of = |trail: &mut Trail, clip: &Arc<Clip>| {
            joint.filter(|_| space.shows_path).map(|joint| trail.around(clip, joint, time_secs))
        };
        let differs = !Arc::ptr_eq(source, result);
        let [before, after] = trails;
        let shows_source = alone || (differs && session.shows_before);
        let before = if shows_source { path_of(before, source) } else { None };
        let after = if alone { None } else { path_of(after, result) };
        let request = FigureRequest {
            size_px,
            scale: ui.pixels_per_point(),
            camera,
            theme: scope.look.palette,
            source,
            result,
            time_secs,
            chosen: session.joint,
            hovered: *hovered,
            shows_before: session.shows_before,
            source_alone: alone,
            follows,
            trails: [
                before.as_ref().map(|(points, now)| (points.as_slice(), *now)),
                after.as_ref().map(|(points, now)| (points.as_slice(), *now)),
            ],
            neighbour_frames: space.shows_neighbours.then_some(space.neighbour_frames),
            shows_names: space.shows_names,
            shows_floor: space.shows_floor,
            limit,
            handling,
            faint: &faint,
        };
        let view = figure_view(&stage, &request);
        let image = Pictures::draw_figure(canvas, &view.scene);
        *figure = Some(view);
        image
    });
    let whole = Rect::from_min_max(pos2(0.0, 0.0), pos2(1.0, 1.0));
    ui.painter().image(texture, bounds, whole, egui::Color32::WHITE);
}

/// The limit that a joint of the result is held against: the one for finding snags, else that of a pass.
fn limit_of<'a>(scope: &Scope<'a>, joint: usize, result: &Clip) -> Option<&'a JointLimit> {
    let bench = scope.bench;
    let work = bench.work()?;
    if !bench.source()?.has_skeleton_of(result) {
        return None;
    }
    let of_pass = || {
        work.passes.iter().find_map(|pass| match &pass.step {
            PassStep::Limits(own) => own.limits.get(joint),
            _ => None,
        })
    };
    work.limits.as_ref().and_then(|limits| limits.get(joint)).or_else(of_pass)
}

/// The joint under the pointer: named, and chosen with a click. With Alt the one behind it.
fn choose(ui: &Ui, response: &egui::Response, bounds: Rect, scope: &mut Scope<'_>, is_over_rim: bool) {
    let Some(pointer) = response.hover_pos().filter(|_| !response.dragged()) else {
        return;
    };
    let scale = ui.pixels_per_point();
    let pixel = (pointer - bounds.min) * scale;
    let pixel = DVec2::new(pixel.x.into(), pixel.y.into());
    let found = scope.pictures.figure.as_ref().map_or_else(Vec::new, |view| {
        let of_style = |style| view.scene.figures.iter().rfind(|figure| figure.style == style);
        let solid = of_style(FigureStyle::After).or_else(|| of_style(FigureStyle::Before));
        solid.map_or_else(Vec::new, |figure| figure.pick_all(&view.scene.view(), pixel, SLACK * scale))
    });
    let deeper = usize::from(ui.input(|input| input.modifiers.alt));
    let joint = found.get(deeper).or(found.first()).copied();
    if response.clicked() {
        scope.out.push(joint.map_or(Command::ChooseJoint(None), |joint| super::choose_joint(ui, joint)));
    }
    let Some(joint) = joint else { return };
    if is_over_rim {
        return;
    }
    scope.out.push(Command::HoverJoint(joint));
    ui.ctx().set_cursor_icon(CursorIcon::PointingHand);
    if let Some(clip) = scope.bench.result().filter(|clip| joint < clip.skeleton.len()) {
        let mut lines = vec![(clip.skeleton.label(joint).to_owned(), scope.look.text)];
        if deeper == 0 && found.len() > 1 {
            let behind = clip.skeleton.label(found[1]);
            lines.push((format!("Alt: {behind}, behind it"), scope.look.faint));
        }
        read_out(ui.painter(), &scope.look, pointer + vec2(0.0, 2.0), bounds, &lines);
    }
}

//! Taking hold of the discs and of the limb's tip: with the pointer, or with the keyboard on their grips.

use egui::{
    CursorIcon, EventFilter, Key, Modifiers, PointerButton, Pos2, Rect, Role, Sense, Ui, Vec2, WidgetInfo,
};
use glam::DVec2;

use super::super::super::commands::{Action, Command, SpaceAction, SpaceCommand};
use super::super::super::pictures::{Grip, Ready};
use super::super::super::session::Disc;
use super::super::super::view_models::{Drag, FINE, FigureView};
use super::super::Scope;

/// How near a rim the pointer must be to take hold of it, points.
const RIM_SLACK: f32 = 5.0;
/// Size of a grip, points.
const GRIP: f32 = 20.0;

/// What is taken hold of.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Part {
    Disc(Disc),
    Tip,
}

fn pixel_of(at: Pos2, bounds: Rect, scale: f32) -> DVec2 {
    let from_corner = (at - bounds.min) * scale;
    DVec2::new(from_corner.x.into(), from_corner.y.into())
}

/// Begins a drag where a press on the view itself met a rim. The disc whose rim is under the pointer.
pub(super) fn take_hold(
    ui: &Ui,
    response: &egui::Response,
    bounds: Rect,
    scope: &mut Scope<'_>,
) -> Option<Disc> {
    let scale = ui.pixels_per_point();
    let rim_at = |scope: &Scope<'_>, at: Pos2| -> Option<Disc> {
        let figure = scope.pictures.figure.as_ref()?;
        let slack = f64::from(RIM_SLACK * scale);
        let pixel = pixel_of(at, bounds, scale);
        Some(figure.handles.as_ref()?.disc_under(&figure.scene.view(), pixel, slack)?.disc)
    };
    if scope.pictures.grip.is_some() || !is_shown(scope) {
        return None;
    }
    if response.drag_started_by(PointerButton::Primary) {
        let origin = ui.input(|input| input.pointer.press_origin())?;
        let disc = rim_at(scope, origin)?;
        begin(ui, Part::Disc(disc), origin, bounds, scope);
        return None;
    }
    let over = response.hover_pos().filter(|_| !response.dragged());
    let disc = over.and_then(|at| rim_at(scope, at))?;
    ui.ctx().set_cursor_icon(CursorIcon::Grab);
    Some(disc)
}

/// Whether there are handles to be taken hold of.
fn is_shown(scope: &Scope<'_>) -> bool {
    let session = &scope.bench.session;
    session.space.shows_discs && !session.playback.is_playing && !session.shows_source_alone()
}

fn begin(ui: &Ui, part: Part, origin: Pos2, bounds: Rect, scope: &mut Scope<'_>) {
    let Some(base) = scope.bench.result().cloned() else { return };
    let session = &scope.bench.session;
    let at_secs = session.playback.playhead_secs;
    let Some(FigureView { scene, handles: Some(handles), .. }) = &scope.pictures.figure else { return };
    let pixel = pixel_of(origin, bounds, ui.pixels_per_point());
    let view = scene.view();
    let drag = match part {
        Part::Disc(disc) => handles.disc(disc).and_then(|handle| {
            Drag::of_disc(&base, at_secs, handle, handles.joint, session.space.planes, view, pixel)
        }),
        Part::Tip => handles.tip.as_ref().and_then(|tip| Drag::of_tip(&base, at_secs, tip, view, pixel)),
    };
    if let Part::Disc(disc) = part
        && disc != session.space.disc
    {
        scope.out.push(Command::Do(Action::Space(SpaceAction::Arm(disc))));
    }
    scope.pictures.grip = drag.map(|drag| Grip { drag, pointer: origin, snap_rad: None, shown: None });
}

/// Goes on with a drag, and ends it.
pub(super) fn carry_on(ui: &Ui, scope: &mut Scope<'_>) {
    let step_rad = scope.bench.session.space.step_deg.to_radians();
    let Some(grip) = &mut scope.pictures.grip else { return };
    let (at, is_down, is_given_up, modifiers) = ui.input_mut(|input| {
        let given_up = input.consume_key(Modifiers::NONE, Key::Escape);
        (input.pointer.latest_pos(), input.pointer.primary_down(), given_up, input.modifiers)
    });
    if is_given_up {
        scope.pictures.grip = None;
        scope.out.push(Command::Space(SpaceCommand::GiveUp));
        return;
    }
    let moved = at.map_or(Vec2::ZERO, |at| at - grip.pointer) * ui.pixels_per_point();
    grip.pointer = at.unwrap_or(grip.pointer);
    let factor = if modifiers.shift { FINE } else { 1.0 };
    grip.drag.move_by(DVec2::new(moved.x.into(), moved.y.into()), factor);
    grip.snap_rad = modifiers.command.then_some(step_rad);
    ui.ctx().set_cursor_icon(CursorIcon::Grabbing);
    let turns = grip.drag.turns(grip.snap_rad);
    let base = grip.drag.base.clone();
    if !is_down {
        scope.pictures.grip = None;
        scope.out.push(Command::Space(match turns {
            Some(turns) => SpaceCommand::Turn(Box::new(turns), base),
            None => SpaceCommand::GiveUp,
        }));
    } else if turns != grip.shown {
        grip.shown.clone_from(&turns);
        scope.out.push(Command::Space(match turns {
            Some(turns) => SpaceCommand::Try(Box::new(turns), base),
            None => SpaceCommand::GiveUp,
        }));
    }
}

/// The grips: small areas of their own with names, which also take the keyboard. `rim` is the disc whose rim is under the pointer.
/// Whether the pointer is over a grip.
pub(super) fn grips_ui(ui: &mut Ui, bounds: Rect, rim: Option<Disc>, scope: &mut Scope<'_>) -> bool {
    let mut ready = Ready { disc: rim, tip: false };
    let mut is_over = false;
    for (part, at) in if is_shown(scope) { grips(ui, bounds, scope) } else { Vec::new() } {
        let label = match part {
            Part::Disc(disc) => format!("Turn disc {}", disc.name()),
            Part::Tip => "Limb tip".to_owned(),
        };
        let id = ui.scope_id().with(("grip", &label));
        let response =
            ui.interact(Rect::from_center_size(at, Vec2::splat(GRIP)), id, Sense::click_and_drag());
        response.widget_info(|| WidgetInfo::labeled(Role::Button, true, &label));
        if response.has_focus() {
            ui.painter().circle_stroke(at, 11.0, (2.0, scope.look.selection));
            if let Part::Disc(disc) = part {
                turn_by_keys(ui, id, disc, scope);
            }
        }
        if scope.pictures.grip.is_some() {
            continue;
        }
        if response.hovered() || (response.has_focus() && ready == Ready::default()) {
            is_over |= response.hovered();
            ready = match part {
                Part::Disc(disc) => Ready { disc: Some(disc), tip: false },
                Part::Tip => Ready { disc: None, tip: true },
            };
        }
        if response.hovered() {
            ui.ctx().set_cursor_icon(CursorIcon::Grab);
        }
        if response.clicked()
            && let Part::Disc(disc) = part
        {
            response.request_focus();
            scope.out.push(Command::Do(Action::Space(SpaceAction::Arm(disc))));
        }
        if response.drag_started_by(PointerButton::Primary) {
            let origin = ui.input(|input| input.pointer.press_origin()).unwrap_or(at);
            begin(ui, part, origin, bounds, scope);
        }
        response.on_hover_text(words(part));
    }
    if ready != scope.pictures.ready {
        // The picture shows it from the next frame on.
        scope.pictures.ready = ready;
        ui.ctx().request_repaint();
    }
    is_over
}

/// What there is to take hold of, and where in the window.
fn grips(ui: &Ui, bounds: Rect, scope: &Scope<'_>) -> Vec<(Part, Pos2)> {
    let Some(FigureView { scene, handles: Some(handles), .. }) = &scope.pictures.figure else {
        return Vec::new();
    };
    let scale = f64::from(ui.pixels_per_point());
    let view = scene.view();
    let place = |at| {
        let pixel = view.project(at)?.pixel / scale;
        let at = bounds.min + Vec2::new(pixel.x as f32, pixel.y as f32);
        bounds.contains(at).then_some(at)
    };
    let tip = handles.tip.as_ref().map(|tip| (Part::Tip, tip.at));
    let discs = handles.discs.iter().map(|disc| (Part::Disc(disc.disc), disc.rim(disc.grip_rad)));
    tip.into_iter().chain(discs).filter_map(|(part, at)| Some((part, place(at)?))).collect()
}

fn words(part: Part) -> &'static str {
    match part {
        Part::Disc(Disc::Free) => {
            "Turn freely: drag outwards along the rim or inwards over it. Ctrl: in steps, Shift: finely"
        }
        Part::Disc(Disc::Twist) => "Twist about the limb. Ctrl: in steps, Shift: finely, arrows: a step",
        Part::Disc(_) => "Turn in this plane. Ctrl: in steps, Shift: finely, arrows: a step",
        Part::Tip => "Draw the tip to a point: the limb bends in its own plane. Shift: finely",
    }
}

/// Arrows turn the disc whose grip has the keyboard.
fn turn_by_keys(ui: &Ui, id: egui::Id, disc: Disc, scope: &mut Scope<'_>) {
    ui.memory_mut(|memory| {
        let arrows = EventFilter { horizontal_arrows: true, vertical_arrows: true, ..EventFilter::default() };
        memory.set_focus_lock_filter(id, arrows);
    });
    let keys = [(Key::ArrowLeft, -1.0), (Key::ArrowDown, -1.0), (Key::ArrowRight, 1.0), (Key::ArrowUp, 1.0)];
    for (key, steps) in keys {
        let count = ui.input_mut(|input| input.count_and_consume_key(Modifiers::NONE, key));
        if count > 0 && disc != Disc::Free {
            scope.out.push(Command::Space(SpaceCommand::Step(disc, steps * count as f64)));
        }
    }
}

//! The skeleton view: the figure in space, before and after.

use std::sync::Arc;

use egui::{Align2, CursorIcon, PointerButton, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};
use glam::DVec2;

use super::super::commands::{Action, Command};
use super::super::pictures::{Pictures, SkeletonKey, on_pixels};
use super::super::session::Fit;
use super::super::view_models::{FigureRequest, figure_view};
use super::super::widgets::{Icon, hint, icon_button, segment, strip, tooltip_text};
use super::Scope;
use crate::raster::{Camera, FigureStyle};

/// How near a limb the pointer must be to mean it, points.
const SLACK: f32 = 7.0;

/// The panel.
pub(crate) fn skeleton_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let alone = scope.bench.session.shows_source_alone();
    let title = if alone { "Skeleton: source alone" } else { "Skeleton" };
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
    let (bounds, size_px) = on_pixels(ui.available_rect_before_wrap(), ui.pixels_per_point());
    if bounds.width() < 24.0 || bounds.height() < 24.0 {
        return;
    }
    let response = ui.allocate_rect(bounds, Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Skeleton view"));
    let stage = scope.pictures.stage(&source);
    let session = &scope.bench.session;
    let tip_path = scope.bench.tip_path.as_ref().filter(|path| Some(path.parameters) == session.joint);
    let tip_path = tip_path.map(|path| Arc::clone(&path.value));
    let address = |data: Option<*const ()>| data.map_or(0, |data| data as usize);
    let mut follows = session.follows;
    let camera = if let Some(fit) = session.fit {
        let mut camera = session.camera;
        if fit == Fit::Arrive {
            follows = stage.walks();
        }
        let around = if follows { &stage.figure } else { &stage.travel };
        camera.fit(around, size_px[0], size_px[1], 0.12);
        scope.out.push(Command::FigureIsFitted { camera, follows });
        camera
    } else {
        let camera = moved(ui, &response, session.camera, size_px, bounds);
        if camera != session.camera {
            scope.out.push(Command::SetCamera(camera));
        }
        camera
    };
    let faint = super::blend_figures(scope, &result);
    let key = SkeletonKey {
        size_px,
        camera,
        time_bits: session.playback.playhead_secs.to_bits(),
        data: [
            Arc::as_ptr(&source) as usize,
            Arc::as_ptr(&result) as usize,
            address(tip_path.as_ref().map(|path| Arc::as_ptr(path).cast())),
        ],
        faint: faint.clone(),
        joints: [session.joint, scope.pictures.hovered],
        switches: [ui.visuals().dark_mode, session.shows_before, alone, follows],
        scale: ui.pixels_per_point(),
    };
    let request = FigureRequest {
        size_px,
        scale: ui.pixels_per_point(),
        camera,
        theme: scope.look.palette,
        source: &source,
        result: &result,
        time_secs: session.playback.playhead_secs,
        chosen: session.joint,
        hovered: scope.pictures.hovered,
        shows_before: session.shows_before,
        source_alone: alone,
        follows,
        tip_path: tip_path.as_deref().map(Vec::as_slice),
        faint: &faint,
    };
    let Pictures { skeleton, figure, canvas, .. } = &mut *scope.pictures;
    let texture = skeleton.show(ui.ctx(), "skeleton view", key, |_| {
        let view = figure_view(&stage, &request);
        let image = Pictures::draw_figure(canvas, &view);
        *figure = Some(view);
        image
    });
    let whole = Rect::from_min_max(pos2(0.0, 0.0), pos2(1.0, 1.0));
    ui.painter().image(texture, bounds, whole, egui::Color32::WHITE);
    choose(ui, &response, bounds, scope);
    legend(ui, bounds, scope, !Arc::ptr_eq(&source, &result));
    view_card(ui, bounds, scope);
}

/// The camera after this frame's gestures: dragging circles, the middle button or Shift moves, the wheel comes nearer.
fn moved(
    ui: &Ui,
    response: &egui::Response,
    camera: Camera,
    [width, height]: [usize; 2],
    bounds: Rect,
) -> Camera {
    let mut camera = camera;
    let scale = f64::from(ui.pixels_per_point());
    let (shift, wheel, pinch) =
        ui.input(|input| (input.modifiers.shift, input.smooth_scroll_delta, input.zoom_delta()));
    let drag = response.drag_delta();
    let (dx, dy) = (f64::from(drag.x), f64::from(drag.y));
    let slides =
        response.dragged_by(PointerButton::Middle) || (response.dragged_by(PointerButton::Primary) && shift);
    if slides {
        camera.pan(dx * scale, dy * scale, width, height);
    } else if response.dragged_by(PointerButton::Primary) || response.dragged_by(PointerButton::Secondary) {
        camera.orbit(-dx * 0.008, dy * 0.008);
    }
    if let Some(pointer) = response.hover_pos() {
        let factor = (-f64::from(wheel.y + wheel.x) / 240.0).exp() / f64::from(pinch);
        if factor != 1.0 {
            let from_corner = (pointer - bounds.min) * ui.pixels_per_point();
            camera.zoom_at(factor, DVec2::new(from_corner.x.into(), from_corner.y.into()), width, height);
        }
    }
    camera
}

/// The joint under the pointer: named, and chosen with a click.
fn choose(ui: &Ui, response: &egui::Response, bounds: Rect, scope: &mut Scope<'_>) {
    let Some(pointer) = response.hover_pos().filter(|_| !response.dragged()) else {
        return;
    };
    let scale = ui.pixels_per_point();
    let pixel = (pointer - bounds.min) * scale;
    let found = scope.pictures.figure.as_ref().and_then(|view| {
        let solid =
            view.figures.iter().rfind(|figure| figure.style == FigureStyle::After).or(view.figures.last())?;
        solid.pick(&view.view(), DVec2::new(pixel.x.into(), pixel.y.into()), SLACK * scale)
    });
    if response.clicked() {
        scope.out.push(found.map_or(Command::ChooseJoint(None), |joint| super::choose_joint(ui, joint)));
    }
    if let Some(joint) = found {
        scope.out.push(Command::HoverJoint(joint));
        ui.ctx().set_cursor_icon(CursorIcon::PointingHand);
        if let Some(clip) = scope.bench.result().filter(|clip| joint < clip.skeleton.len()) {
            let name = clip.skeleton.label(joint).to_owned();
            super::super::widgets::read_out(
                ui.painter(),
                &scope.look,
                pointer,
                bounds,
                &[(name, scope.look.text)],
            );
        }
    }
}

/// What the two figures are.
fn legend(ui: &Ui, bounds: Rect, scope: &Scope<'_>, differs: bool) {
    let look = &scope.look;
    let session = &scope.bench.session;
    let font = egui::TextStyle::Small.resolve(ui.style());
    let mut words: Vec<(&str, egui::Color32)> = Vec::new();
    if session.shows_source_alone() {
        words.push(("source", look.before));
    } else if differs {
        words.push(("result", look.after));
        if session.shows_before {
            words.push(("source", look.before));
        }
    }
    let mut at = bounds.left_bottom() + vec2(10.0, -10.0);
    for (word, color) in words {
        ui.painter().hline(at.x..=at.x + 14.0, at.y - 6.0, (if word == "result" { 5.0 } else { 2.0 }, color));
        let end =
            ui.painter().text(at + vec2(19.0, 0.0), Align2::LEFT_BOTTOM, word, font.clone(), look.faint);
        at.x = end.right() + 14.0;
    }
}

/// The card with the pairs of axes to look at squarely. The lower row is the other side.
fn view_card(ui: &mut Ui, bounds: Rect, scope: &mut Scope<'_>) {
    const CELL: egui::Vec2 = egui::Vec2::new(30.0, 20.0);
    let size = vec2(CELL.x * 3.0, CELL.y * 2.0);
    if bounds.width() < size.x + 40.0 || bounds.height() < 120.0 {
        return;
    }
    let card = Rect::from_min_size(bounds.right_top() + vec2(-size.x - 10.0, 10.0), size);
    let look = scope.look;
    ui.painter().rect_filled(card, 5.0, look.panel.gamma_multiply(0.9));
    let cells = [
        [("xy", Action::LookXy), ("zx", Action::LookZx), ("yz", Action::LookYz)],
        [("xy", Action::LookXyBack), ("zx", Action::LookZxBack), ("yz", Action::LookYzBack)],
    ];
    for (row, cells) in cells.into_iter().enumerate() {
        for (column, (letters, action)) in cells.into_iter().enumerate() {
            let corner = card.min + vec2(column as f32 * CELL.x, row as f32 * CELL.y);
            let cell = Rect::from_min_size(corner, CELL);
            let response = ui.interact(cell, ui.scope_id().with(("view card", row, column)), Sense::click());
            let entry = action.entry();
            response.widget_info(|| WidgetInfo::labeled(Role::Button, true, entry.label));
            if response.hovered() || response.has_focus() {
                ui.painter().rect_filled(cell.shrink(1.0), 4.0, look.chosen);
            }
            // The far side: the same letters, seen from behind, between bars.
            let ink = if row == 0 { look.text } else { look.faint };
            let font = egui::FontId::proportional(12.5);
            ui.painter().text(cell.center(), Align2::CENTER_CENTER, letters, font, ink);
            if row == 1 {
                for x in [cell.center().x - 10.0, cell.center().x + 10.0] {
                    ui.painter().vline(x, cell.center().y - 5.0..=cell.center().y + 5.0, (1.0, ink));
                }
            }
            let tooltip = format!("{} ({})", entry.label, tooltip_text(ui, action));
            if response.on_hover_text(tooltip).clicked() {
                scope.out.push(Command::Do(action));
            }
        }
    }
}

//! The two figures: side by side or one over the other, in motion or at rest. A click on a joint chooses it or links it.

use egui::{Align2, CursorIcon, PointerButton, Rect, Response, Role, Sense, Ui, WidgetInfo, pos2, vec2};
use glam::DVec2;

use super::super::super::commands::{CarryCommand, Command};
use super::super::super::pictures::{CarryPictureKey, Pictures, on_pixels};
use super::super::super::view_models::{
    CarryEye, CarryPicture, CarryPose, carry_overlay, carry_view, with_link,
};
use super::super::super::widgets::{hint, read_out, strip};
use super::super::Scope;
use super::{Sheet, change};
use crate::raster::{FigureStyle, SceneView};
use crate::retarget::Figure;
use crate::skeleton::LocalPose;

/// How near a limb the pointer must be to mean it, points.
const SLACK: f32 = 7.0;

pub(super) fn figures_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let habits = sheet.habits;
    strip(ui, "Figures", |ui| {
        let mut toggle = |words: &str, is_on: bool, tip: &str, command: CarryCommand| {
            let response = ui.selectable_label(is_on, words).on_hover_text(tip);
            response.widget_info(|| WidgetInfo::selected(Role::Button, true, is_on, words));
            if response.clicked() {
                scope.out.push(Command::Carry(command));
            }
        };
        toggle(
            "Overlaid",
            habits.is_overlaid,
            "Both in one picture",
            CarryCommand::Overlay(!habits.is_overlaid),
        );
        toggle(
            "Rest poses",
            habits.shows_rest,
            "The poses that are compared, in place of the motion",
            CarryCommand::ShowRest(!habits.shows_rest),
        );
    });
    let Some(facts) = sheet.facts else {
        hint(ui, "The figures are being made ready");
        return;
    };
    let setting = &facts.setting;
    let (source, target) = (&setting.source, &setting.target);
    let poses = poses(sheet, scope);
    let area = ui.available_rect_before_wrap();
    let row = habits.row.filter(|&row| row < target.skeleton.len());
    let driving = row.and_then(|row| facts.rows.iter().find(|own| own.target == row)?.source);
    let hovered = scope.pictures.carry_hovered;
    let source_pose = CarryPose {
        figure: source,
        local: &poses[0],
        chosen: driving,
        hovered: hovered[0],
        style: FigureStyle::After,
    };
    let target_pose = CarryPose {
        figure: target,
        local: &poses[1],
        chosen: row,
        hovered: hovered[1],
        style: FigureStyle::After,
    };
    if habits.is_overlaid {
        let source_pose = CarryPose { style: FigureStyle::Before, ..source_pose };
        let found = picture_ui(ui, area, 0, "Both figures", sheet, scope, &poses, |picture| {
            carry_overlay(picture, [source_pose, target_pose], facts.transfer.as_ref())
        });
        caption(ui, area, scope, "source in thin grey, target solid");
        pick(ui, &found, 1, target, sheet, scope);
        return;
    }
    let middle = area.center().x.round();
    let halves = [
        Rect::from_min_max(area.min, pos2(middle - 1.0, area.bottom())),
        Rect::from_min_max(pos2(middle + 1.0, area.top()), area.max),
    ];
    ui.painter().vline(middle, area.y_range(), (1.0, scope.look.line));
    for (which, half) in halves.into_iter().enumerate() {
        let pose = [source_pose, target_pose][which];
        let name = ["Source figure", "Target figure"][which];
        let found =
            picture_ui(ui, half, which, name, sheet, scope, &poses, |picture| carry_view(picture, pose));
        let file = ["source", "target"][which];
        let class = if habits.shows_rest { "rest pose" } else { "motion" };
        caption(ui, half, scope, &format!("{file}, {class}"));
        pick(ui, &found, which, pose.figure, sheet, scope);
    }
}

/// The poses to show: at rest, or at the playhead.
fn poses(sheet: &Sheet<'_>, scope: &Scope<'_>) -> [LocalPose; 2] {
    let bench = scope.bench;
    let Some(facts) = sheet.facts else { return [Vec::new(), Vec::new()] };
    let setting = &facts.setting;
    if sheet.habits.shows_rest {
        return [setting.source.rest.clone(), setting.target.rest.clone()];
    }
    let secs = bench.session.playback.playhead_secs;
    let own = bench
        .carry
        .as_ref()
        .map(|work| work.key.clip.local_at(secs))
        .filter(|pose| pose.len() == setting.source.skeleton.len())
        .unwrap_or_else(|| setting.source.rest.clone());
    // What was carried whole, feet held and all; until it is there the single pose alone.
    let made = bench.carry_made().map(|clip| clip.local_at(secs));
    let its = made
        .filter(|pose| pose.len() == setting.target.skeleton.len())
        .or_else(|| facts.transfer.as_ref().map(|transfer| transfer.pose_at(secs)))
        .unwrap_or_else(|| setting.target.rest.clone());
    [own, its]
}

struct Shown {
    response: Response,
    bounds: Rect,
    view: Option<SceneView>,
}

#[expect(clippy::too_many_arguments, reason = "one picture, told what it is of")]
fn picture_ui(
    ui: &mut Ui,
    area: Rect,
    which: usize,
    name: &str,
    sheet: &Sheet<'_>,
    scope: &mut Scope<'_>,
    poses: &[LocalPose; 2],
    draw: impl FnOnce(&CarryPicture) -> SceneView,
) -> Shown {
    let (bounds, size_px) = on_pixels(area, ui.pixels_per_point());
    let response = ui.allocate_rect(bounds, Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, name));
    if bounds.width() < 24.0 || bounds.height() < 24.0 {
        return Shown { response, bounds, view: None };
    }
    let eye = moved(ui, &response, sheet.habits.eye);
    if eye != sheet.habits.eye {
        scope.out.push(Command::Carry(CarryCommand::Look(eye)));
    }
    let picture = CarryPicture { size_px, scale: ui.pixels_per_point(), eye, theme: scope.look.palette };
    let key = CarryPictureKey {
        size_px,
        eye,
        scale: ui.pixels_per_point(),
        is_dark: ui.visuals().dark_mode,
        is_overlaid: sheet.habits.is_overlaid,
        poses: poses.clone(),
        row: sheet.habits.row,
        hovered: scope.pictures.carry_hovered,
        facts: sheet.facts.map(std::sync::Arc::as_ptr).map_or(0, |facts| facts as usize),
    };
    let Pictures { carry, carry_views, canvas, .. } = &mut *scope.pictures;
    let texture = carry[which].show(ui.ctx(), name, key, |_| {
        let view = draw(&picture);
        let image = Pictures::draw_figure(canvas, &view);
        carry_views[which] = Some(view);
        image
    });
    let whole = Rect::from_min_max(pos2(0.0, 0.0), pos2(1.0, 1.0));
    ui.painter().image(texture, bounds, whole, egui::Color32::WHITE);
    Shown { response, bounds, view: scope.pictures.carry_views[which].clone() }
}

/// Dragging circles both figures, the wheel comes nearer.
fn moved(ui: &Ui, response: &Response, eye: CarryEye) -> CarryEye {
    let mut eye = eye;
    if response.dragged_by(PointerButton::Primary) || response.dragged_by(PointerButton::Secondary) {
        let drag = response.drag_delta();
        eye.yaw_rad = (eye.yaw_rad - f64::from(drag.x) * 0.008).rem_euclid(std::f64::consts::TAU);
        eye.pitch_rad = (eye.pitch_rad + f64::from(drag.y) * 0.008).clamp(-1.5, 1.5);
    }
    if response.hovered() {
        let (wheel, pinch) = ui.input(|input| (input.smooth_scroll_delta, input.zoom_delta()));
        let factor = (-f64::from(wheel.y) / 240.0).exp() / f64::from(pinch);
        eye.zoom = (eye.zoom * factor).clamp(0.2, 4.0);
    }
    eye
}

/// The joint under the pointer is named; a click on the target chooses its row, one on the source links it to the chosen row.
fn pick(ui: &Ui, shown: &Shown, which: usize, figure: &Figure, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let (Some(pointer), Some(view)) = (shown.response.hover_pos(), &shown.view) else { return };
    let scale = ui.pixels_per_point();
    let pixel = (pointer - shown.bounds.min) * scale;
    let solid = view.figures.last();
    let found = solid.and_then(|figure| {
        figure.pick(&view.view(), DVec2::new(pixel.x.into(), pixel.y.into()), SLACK * scale)
    });
    let Some(joint) = found.filter(|&joint| joint < figure.skeleton.len()) else { return };
    scope.out.push(Command::Carry(CarryCommand::Hover(which, joint)));
    ui.ctx().set_cursor_icon(CursorIcon::PointingHand);
    let label = figure.skeleton.label(joint);
    let chosen = sheet.facts.and_then(|facts| {
        let row = sheet.habits.row?;
        facts.rows.iter().find(|own| own.target == row)
    });
    let mut lines = vec![(label.to_owned(), scope.look.text)];
    if let (0, Some(row)) = (which, chosen) {
        lines.push((format!("click: drives {}", row.target_label), scope.look.faint));
    }
    read_out(ui.painter(), &scope.look, pointer, shown.bounds, &lines);
    if !shown.response.clicked() {
        return;
    }
    match (which, chosen) {
        (0, Some(row)) => {
            let pass = with_link(sheet.pass.1, &row.target_label, Some(label));
            change(scope, sheet, pass);
        }
        (0, None) => {
            let driven =
                sheet.facts.and_then(|facts| facts.rows.iter().find(|own| own.source == Some(joint)));
            let row = driven.map(|row| row.target);
            scope.out.push(Command::Carry(CarryCommand::ChooseRow(row)));
        }
        _ => scope.out.push(Command::Carry(CarryCommand::ChooseRow(Some(joint)))),
    }
}

fn caption(ui: &Ui, area: Rect, scope: &Scope<'_>, words: &str) {
    let font = egui::TextStyle::Small.resolve(ui.style());
    ui.painter().text(
        area.left_bottom() + vec2(10.0, -8.0),
        Align2::LEFT_BOTTOM,
        words,
        font,
        scope.look.faint,
    );
}

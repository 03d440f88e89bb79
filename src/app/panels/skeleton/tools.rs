//! The row below the skeleton view: in whose planes is turned, by what steps, and what a turn does to the clip.

use egui::{DragValue, Rect, Role, Ui, UiBuilder, WidgetInfo};

use super::super::super::commands::{Action, Command, SpaceAction, SpaceCommand};
use super::super::super::session::{FALLOFF_SECS, SpaceHabits, TurnPlanes};
use super::super::super::theme::INSET;
use super::super::super::view_models::is_dense;
use super::super::super::widgets::segment;
use super::super::Scope;
use crate::clip::Clip;

/// Height of the row, points.
pub(super) const HEIGHT: f32 = 27.0;

/// The row.
pub(super) fn tools_ui(ui: &mut Ui, bounds: Rect, scope: &mut Scope<'_>, result: &Clip) {
    let look = scope.look;
    ui.painter().rect_filled(bounds, 0.0, look.panel);
    ui.painter().hline(bounds.x_range(), bounds.top(), (1.0, look.line));
    let inner = bounds.shrink2(egui::vec2(INSET, 2.0));
    let layout = egui::Layout::left_to_right(egui::Align::Center);
    let mut child = ui.new_child(UiBuilder::new().max_rect(inner).layout(layout));
    child.shrink_clip_rect(bounds);
    let ui = &mut child;
    ui.spacing_mut().item_spacing.x = 3.0;
    ui.spacing_mut().interact_size.y = 20.0;
    let wide = bounds.width() > 390.0;
    if wide {
        ui.label(egui::RichText::new("Planes").size(12.0).color(look.faint));
    }
    for planes in TurnPlanes::ALL {
        segment(ui, planes.name(), Action::Space(SpaceAction::Planes(planes)), scope.now, scope.out);
    }
    let session = &scope.bench.session;
    ui.add_space(4.0);
    let mut step = session.space.step_deg;
    let drag = DragValue::new(&mut step).range(0.1..=90.0).speed(0.1).max_decimals(1).suffix("°");
    let response = ui.add(drag).on_hover_text("How far keys turn, and what a drag with Ctrl held snaps to");
    response.widget_info(|| WidgetInfo::labeled(Role::SpinButton, true, "Turn step"));
    if response.changed() {
        scope.out.push(Command::Space(SpaceCommand::SetStep(step)));
    }
    ui.add_space(4.0);
    let joint = session.joint.filter(|&joint| joint < result.skeleton.len());
    let dense = joint.is_some_and(|joint| is_dense(result, joint, session.playback.playhead_secs));
    if dense {
        let mut secs = session.falloff_secs;
        let drag = DragValue::new(&mut secs)
            .range(FALLOFF_SECS[0]..=FALLOFF_SECS[1])
            .speed(0.01)
            .max_decimals(2)
            .prefix("push ±")
            .suffix(" s");
        let words = "This joint has a key for each frame: a turn becomes a soft push that fades over so many seconds to \
                     either side";
        let response = ui.add(drag).on_hover_text(words);
        response.widget_info(|| WidgetInfo::labeled(Role::SpinButton, true, "Falloff"));
        if response.changed() {
            scope.out.push(Command::Space(SpaceCommand::SetFalloff(secs)));
        }
    } else if joint.is_some() {
        let words = "This joint has few keys: a turn sets a key at the playhead";
        ui.label(egui::RichText::new("sets a key").size(12.0).color(look.faint)).on_hover_text(words);
    }
    if session.space.shows_neighbours {
        let [least, most] = SpaceHabits::NEIGHBOUR_FRAMES;
        let mut frames = session.space.neighbour_frames;
        let drag = DragValue::new(&mut frames).range(least..=most).speed(0.1).prefix("poses each ");
        let response = ui.add(drag).on_hover_text("Frames from one neighbouring pose to the next");
        response.widget_info(|| WidgetInfo::labeled(Role::SpinButton, true, "Frames between poses"));
        if response.changed() {
            scope.out.push(Command::Space(SpaceCommand::SetNeighbours(frames)));
        }
    }
}

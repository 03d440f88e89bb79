//! What an empty window says.

use egui::{Align, Layout, RichText, Ui, UiBuilder, vec2};

use super::super::commands::Action;
use super::super::jobs::Slot;
use super::super::widgets::wide_action_button;
use super::Scope;

/// The window with nothing open.
pub(crate) fn welcome_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let look = scope.look;
    let area = ui.available_rect_before_wrap();
    let column = egui::Rect::from_center_size(
        area.center() - vec2(0.0, 30.0),
        vec2(560.0_f32.min(area.width() - 40.0), 330.0),
    );
    let layout = Layout::top_down(Align::Center);
    let mut ui = ui.new_child(UiBuilder::new().max_rect(column).layout(layout));
    let reading = scope.running.iter().any(|(slot, _)| *slot == Slot::Open);
    ui.label(RichText::new("Turnwright").size(30.0).color(look.text));
    ui.add_space(4.0);
    if reading {
        ui.label(RichText::new("Reading…").size(15.0).color(look.faint));
        return;
    }
    ui.label(RichText::new("A bench for rotation animation").size(15.0).color(look.faint));
    ui.add_space(26.0);
    ui.label(RichText::new("Drop a clip or a scene here").size(17.0).color(look.text));
    ui.label(RichText::new(".gltf   .glb   .bvh   .csv   .ron").size(13.0).color(look.faint));
    ui.add_space(18.0);
    ui.horizontal(|ui| {
        // Three buttons in the middle: what they need is known, so the space before them is too.
        let needed = 330.0;
        ui.add_space(((ui.available_width() - needed) / 2.0).max(0.0));
        wide_action_button(ui, Action::Open, scope.now, scope.out);
        wide_action_button(ui, Action::OpenPath, scope.now, scope.out);
        wide_action_button(ui, Action::OpenDemo, scope.now, scope.out);
    });
    ui.add_space(26.0);
    for line in [
        "Snags are found by themselves. Jump from one to the next, look at it before and after,",
        "mend it or leave it, and export the corrected curves. Your file is never changed.",
    ] {
        ui.label(RichText::new(line).size(13.5).color(look.faint));
    }
}

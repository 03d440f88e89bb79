//! The parts of the window. Each reads a [`Scope`] and asks for changes with commands.

mod blend_form;
mod blend_lane;
mod blend_picture;
mod carry;
mod change_plot;
mod curves;
mod dialogs;
mod joint_sheet;
mod menus;
mod messages;
mod pass_forms;
mod passes;
mod skeleton;
mod snags;
mod transport;
mod turn_map;
mod welcome;

use std::sync::Arc;

use super::bench::Bench;
use super::commands::{Command, Situation};
use super::jobs::Slot;
use super::pictures::Pictures;
use super::theme::Look;
use super::view_models::{SnagRow, SnagState};

pub(crate) use blend_lane::blend_figures;
pub(crate) use blend_picture::DistanceKey;
pub(crate) use curves::CurvePress;
pub(crate) use dialogs::{Dialog, Form, Then, dialogs_ui};
pub(crate) use menus::menus_ui;
pub(crate) use messages::{Level, Message, messages_ui};
pub(crate) use transport::transport_ui;
pub(crate) use welcome::welcome_ui;

/// What panels see of the program, and where they put their wishes.
#[derive(Debug)]
pub(crate) struct Scope<'a> {
    /// What is open and looked at.
    pub bench: &'a Bench,
    /// What can be done.
    pub now: &'a Situation,
    /// The rows of the snag table.
    pub rows: Arc<Vec<SnagRow>>,
    /// What has been decided about each snag.
    pub states: Arc<Vec<SnagState>>,
    /// Jobs on their way.
    pub running: &'a [(Slot, Option<f32>)],
    /// Pictures made outside egui.
    pub pictures: &'a mut Pictures,
    /// Wishes.
    pub out: &'a mut Vec<Command>,
    /// Colours.
    pub look: Look,
}

/// What a click on a joint asks for: it alone, or with Ctrl or Shift it as well.
fn choose_joint(ui: &egui::Ui, joint: usize) -> Command {
    if ui.input(|input| input.modifiers.command || input.modifiers.shift) {
        Command::ChooseAlso(joint)
    } else {
        Command::ChooseJoint(Some(joint))
    }
}

/// Lays out a panel inside exactly the room there is: content that is too wide is cut and can't push its panel wider.
fn held(ui: &mut egui::Ui, content: impl FnOnce(&mut egui::Ui)) {
    let bounds = ui.available_rect_before_wrap();
    let mut child = ui.new_child(egui::UiBuilder::new().max_rect(bounds));
    child.shrink_clip_rect(bounds);
    content(&mut child);
    ui.advance_cursor_after_rect(bounds);
}

/// The whole bench: left is space, right is time.
pub(crate) fn bench_ui(ui: &mut egui::Ui, scope: &mut Scope<'_>) {
    if scope.bench.session.carry.is_open {
        carry::carry_ui(ui, scope);
        return;
    }
    let size = ui.available_size();
    let bare = egui::Frame::NONE;
    egui::Panel::left("space")
        .frame(bare)
        .resizable(true)
        .default_size((size.x * 0.34).clamp(280.0, 760.0))
        .size_range(240.0..=(size.x * 0.6).max(241.0))
        .show(ui, |ui| {
            egui::Panel::bottom("joint sheet")
                .frame(bare)
                .resizable(true)
                .default_size((size.y * 0.40).clamp(180.0, 520.0))
                .size_range(120.0..=(size.y * 0.7).max(121.0))
                .show(ui, |ui| held(ui, |ui| joint_sheet::joint_sheet_ui(ui, scope)));
            egui::CentralPanel::no_frame().show(ui, |ui| held(ui, |ui| skeleton::skeleton_ui(ui, scope)));
        });
    egui::CentralPanel::no_frame().show(ui, |ui| {
        egui::Panel::bottom("lists")
            .frame(bare)
            .resizable(true)
            .default_size((size.y * 0.31).clamp(170.0, 420.0))
            .size_range(110.0..=(size.y * 0.6).max(111.0))
            .show(ui, |ui| {
                egui::Panel::right("passes")
                    .frame(bare)
                    .resizable(true)
                    .default_size((size.x * 0.235).clamp(250.0, 460.0))
                    .size_range(190.0..=(size.x * 0.4).max(191.0))
                    .show(ui, |ui| held(ui, |ui| passes::passes_ui(ui, scope)));
                egui::CentralPanel::no_frame().show(ui, |ui| held(ui, |ui| snags::snags_ui(ui, scope)));
            });
        egui::Panel::top("turn map")
            .frame(bare)
            .resizable(true)
            .default_size((size.y * 0.31).clamp(150.0, 520.0))
            .size_range(110.0..=(size.y * 0.6).max(111.0))
            .show(ui, |ui| held(ui, |ui| turn_map::turn_map_ui(ui, scope)));
        if scope.now.has_blend && scope.now.shows_blend_lane {
            egui::Panel::top("blend lane")
                .frame(bare)
                .resizable(true)
                .default_size((size.y * 0.20).clamp(144.0, 260.0))
                .size_range(110.0..=(size.y * 0.4).max(111.0))
                .show(ui, |ui| held(ui, |ui| blend_lane::blend_lane_ui(ui, scope)));
        }
        egui::CentralPanel::no_frame().show(ui, |ui| held(ui, |ui| curves::curves_ui(ui, scope)));
    });
}

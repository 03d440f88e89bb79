//! The parts of the window. Each reads a [`Scope`] and asks for changes with commands.

mod areas;
mod blend_form;
mod blend_lane;
mod blend_mean;
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
use super::settings::Settings;
use super::theme::Look;
use super::view_models::{SnagRow, SnagState};

pub(crate) use areas::{bench_ui, transport_hint_ui};
pub(crate) use blend_lane::blend_figures;
pub(crate) use blend_picture::DistanceKey;
pub(crate) use curves::{Columns, CurvePress};
pub(crate) use dialogs::{Dialog, Form, Then, dialogs_ui};
pub(crate) use menus::menus_ui;
pub(crate) use messages::{Message, messages_ui};
pub(crate) use transport::transport_ui;
pub(crate) use welcome::welcome_ui;

/// What panels see of the program, and where they put their wishes.
#[derive(Debug)]
pub(crate) struct Scope<'a> {
    /// What is open and looked at.
    pub bench: &'a Bench,
    /// What is remembered from one run to the next.
    pub settings: &'a Settings,
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

//! The retarget sheet: it takes the place of the bench while a clip is being carried to another skeleton. Two figures, the joint map, the
//! contacts as bars over time, the settings, and what was not met.

mod bars;
mod figures;
mod report;
mod settings;
mod table;

use std::sync::Arc;

use egui::{Ui, vec2};

use super::super::carry_state::CarryHabits;
use super::super::commands::{CarryCommand, Command};
use super::super::view_models::CarryFacts;
use super::super::widgets::{hint, strip};
use super::Scope;
use crate::scene::{PassId, RetargetPass};

/// What the parts of the sheet show.
struct Sheet<'a> {
    pass: (PassId, &'a RetargetPass),
    facts: Option<&'a Arc<CarryFacts>>,
    habits: &'a CarryHabits,
}

/// The whole sheet.
pub(crate) fn carry_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let bench = scope.bench;
    let Some((id, pass)) = bench.carried_pass() else {
        strip(ui, "Retarget", |ui| close_button(ui, scope));
        hint(ui, "No pass of this clip carries it to another skeleton");
        return;
    };
    let facts = bench.carry.as_ref().and_then(|work| work.facts.as_ref().ok());
    let problem = bench.carry.as_ref().and_then(|work| work.facts.as_ref().err());
    let sheet = Sheet { pass: (id, &pass), facts, habits: &bench.session.carry };
    strip(ui, &title(scope, &pass), |ui| close_button(ui, scope));
    if let Some(problem) = problem {
        hint(ui, &format!("{problem}. Open the target's file again, or choose another at the right"));
    }
    let size = ui.available_size();
    let bare = egui::Frame::NONE;
    egui::Panel::bottom("carry bars")
        .frame(bare)
        .resizable(false)
        .exact_size(bars::HEIGHT)
        .show(ui, |ui| held(ui, |ui| bars::bars_ui(ui, &sheet, scope)));
    egui::Panel::right("carry settings")
        .frame(bare)
        .resizable(true)
        .default_size((size.x * 0.24).clamp(272.0, 420.0))
        .size_range(240.0..=(size.x * 0.4).max(241.0))
        .show(ui, |ui| {
            egui::Panel::bottom("carry report")
                .frame(bare)
                .resizable(true)
                .default_size(
                    (size.y - bars::HEIGHT - settings::HEIGHT).clamp(110.0, 460.0).min(0.25 * size.y),
                )
                .size_range(70.0..=(size.y * 0.6).max(71.0))
                .show(ui, |ui| held(ui, |ui| report::report_ui(ui, &sheet, scope)));
            egui::CentralPanel::no_frame()
                .show(ui, |ui| held(ui, |ui| settings::settings_ui(ui, &sheet, scope)));
        });
    egui::Panel::left("carry figures")
        .frame(bare)
        .resizable(true)
        .default_size((size.x * 0.40).clamp(320.0, 1100.0))
        .size_range(260.0..=(size.x * 0.6).max(261.0))
        .show(ui, |ui| held(ui, |ui| figures::figures_ui(ui, &sheet, scope)));
    egui::CentralPanel::no_frame().show(ui, |ui| held(ui, |ui| table::table_ui(ui, &sheet, scope)));
}

fn title(scope: &Scope<'_>, pass: &RetargetPass) -> String {
    let clip = scope.bench.work().map_or("", |work| work.name.as_str());
    let onto = scope.bench.project.as_ref().and_then(|project| {
        let source = project.document().sources.get(pass.onto)?;
        Some(super::super::bench::file_name(&source.path))
    });
    format!("Retarget {clip} onto {}", onto.unwrap_or_else(|| "a file that is not open".to_owned()))
}

fn close_button(ui: &mut Ui, scope: &mut Scope<'_>) {
    ui.spacing_mut().button_padding = vec2(10.0, 2.0);
    let button = ui.button("Back to the bench").on_hover_text("The pass stays; Ctrl+T comes here again");
    if button.clicked() {
        scope.out.push(Command::Carry(CarryCommand::Close));
    }
}

/// Asks for other parameters of the pass that is shown: one step of the history.
fn change(scope: &mut Scope<'_>, sheet: &Sheet<'_>, pass: RetargetPass) {
    scope.out.push(Command::Carry(CarryCommand::Change(sheet.pass.0, Box::new(pass))));
}

/// Lays out a panel inside exactly the room there is: content that is too wide is cut and can't push its panel wider.
fn held(ui: &mut Ui, content: impl FnOnce(&mut Ui)) {
    let bounds = ui.available_rect_before_wrap();
    let mut child = ui.new_child(egui::UiBuilder::new().max_rect(bounds));
    child.shrink_clip_rect(bounds);
    content(&mut child);
    ui.advance_cursor_after_rect(bounds);
}

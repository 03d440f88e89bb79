//! What the columns of a CSV file are.

use std::path::Path;

use egui::{RichText, Role, Ui, WidgetInfo};

use super::super::super::bench::file_name;
use super::super::super::commands::Command;
use super::super::Scope;
use super::form::Form;
use super::sheet::{buttons, error_ui, heading};
use crate::exchange::csv::{NamedColumns, TimeUnit};

pub(super) fn columns_sheet(
    ui: &mut Ui,
    path: &Path,
    names: &[String],
    form: &mut Form,
    scope: &mut Scope<'_>,
) {
    heading(ui, "Which columns are the turns?");
    let words = format!(
        "{} has a header of its own. Say which columns hold the time and the four parts of the quaternion",
        file_name(path)
    );
    ui.add(egui::Label::new(RichText::new(words).color(scope.look.faint)).wrap());
    ui.add_space(4.0);
    egui::Grid::new("columns").num_columns(2).spacing([16.0, 8.0]).show(ui, |ui| {
        for (what, chosen) in ["time", "w", "x", "y", "z"].into_iter().zip(&mut form.columns) {
            ui.label(what);
            let known = names.get(*chosen).cloned().unwrap_or_default();
            let combo = egui::ComboBox::from_id_salt(("column", what)).selected_text(known).width(220.0);
            let response = combo
                .show_ui(ui, |ui| {
                    for (index, name) in names.iter().enumerate() {
                        ui.selectable_value(chosen, index, name);
                    }
                })
                .response;
            response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, format!("Column of {what}")));
            ui.end_row();
        }
        ui.label("time is in");
        ui.horizontal(|ui| {
            ui.radio_value(&mut form.time_unit, None, "as the header says");
            ui.radio_value(&mut form.time_unit, Some(TimeUnit::Seconds), "s");
            ui.radio_value(&mut form.time_unit, Some(TimeUnit::Milliseconds), "ms");
            ui.radio_value(&mut form.time_unit, Some(TimeUnit::Microseconds), "µs");
        });
        ui.end_row();
    });
    error_ui(ui, form, scope);
    if buttons(ui, "Open", true, scope, |_, _| {}) {
        let name = |place: usize| names.get(form.columns[place]).cloned().unwrap_or_default();
        let columns = NamedColumns { time: name(0), xyzw: [name(2), name(3), name(4), name(1)] };
        scope.out.push(Command::OpenTable(path.to_owned(), columns, form.time_unit));
    }
}

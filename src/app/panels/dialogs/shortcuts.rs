//! All actions and their keys.

use egui::{FontId, RichText, Role, ScrollArea, Sense, TextEdit, Ui, WidgetInfo, vec2};

use super::super::super::commands::{HOLD_FOR_SOURCE, MORE_KEYS, Menu, TABLE};
use super::super::Scope;
use super::form::Form;
use super::sheet::{close_button, heading};

pub(super) fn shortcuts_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Shortcuts");
    let label = ui.label(RichText::new("Look for").size(12.5).color(scope.look.faint));
    ui.add(TextEdit::singleline(&mut form.search).desired_width(f32::INFINITY).hint_text("an action"))
        .labelled_by(label.id);
    let wanted = form.search.to_lowercase();
    ScrollArea::vertical().max_height(390.0).auto_shrink(false).show(ui, |ui| {
        for menu in Menu::ALL {
            let fits = |words: &str| words.to_lowercase().contains(&wanted);
            let entries: Vec<_> = TABLE
                .iter()
                .filter(|entry| entry.menu == menu && (fits(entry.label) || fits(entry.tooltip)))
                .collect();
            if entries.is_empty() {
                continue;
            }
            ui.add_space(6.0);
            ui.label(RichText::new(menu.title()).size(15.0).color(scope.look.text));
            for entry in entries {
                let more =
                    MORE_KEYS.iter().filter(|(_, action)| *action == entry.action).map(|(keys, _)| keys);
                let keys: Vec<String> =
                    entry.shortcut.iter().chain(more).map(|keys| ui.ctx().format_shortcut(keys)).collect();
                key_row(ui, scope, entry.label, &keys.join(", "), entry.tooltip);
            }
            if menu == Menu::View && fits("source alone hold") {
                let keys = format!("hold {}", ui.ctx().format_shortcut(&HOLD_FOR_SOURCE));
                key_row(
                    ui,
                    scope,
                    "Source for a moment",
                    &keys,
                    "The source in place of the result while held",
                );
            }
        }
        ui.add_space(6.0);
        ui.label(RichText::new("Pointer").size(15.0).color(scope.look.text));
        for (what, how, more) in [
            ("Scrub", "drag", "across the turn map, the curves or the bar at the bottom"),
            ("Zoom time", "wheel", "over curves and ruler; with Ctrl over the turn map"),
            ("Pan time", "middle drag", "or Shift and drag, over curves and map"),
            ("Circle the figure", "drag", "in the skeleton view"),
            ("Move the view", "middle drag", "or Shift and drag, in the skeleton view"),
            ("Nearer and farther", "wheel", "in the skeleton view"),
        ] {
            key_row(ui, scope, what, how, more);
        }
    });
    close_button(ui, scope);
}

fn key_row(ui: &mut Ui, scope: &Scope<'_>, label: &str, keys: &str, tooltip: &str) {
    let look = &scope.look;
    let (bounds, response) = ui.allocate_exact_size(vec2(ui.available_width(), 19.0), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{label}: {keys}")));
    let y = bounds.center().y;
    let at = |x: f32| egui::pos2(bounds.left() + x, y);
    let left = egui::Align2::LEFT_CENTER;
    ui.painter().text(at(0.0), left, label, FontId::proportional(13.0), look.text);
    ui.painter().text(at(196.0), left, keys, FontId::monospace(12.0), look.text);
    let mut job =
        egui::text::LayoutJob::simple_singleline(tooltip.to_owned(), FontId::proportional(12.0), look.faint);
    job.wrap = egui::text::TextWrapping::truncate_at_width((bounds.width() - 372.0).max(10.0));
    let galley = ui.painter().layout_job(job);
    ui.painter().galley(egui::pos2(bounds.left() + 362.0, y - galley.size().y / 2.0), galley, look.faint);
    response.on_hover_text(tooltip);
}

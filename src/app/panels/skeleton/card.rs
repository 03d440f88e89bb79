//! The card that sets straight views, and the words in the corners of the skeleton view.

use egui::{Align2, Rect, Role, Sense, Ui, WidgetInfo, vec2};

use super::super::super::commands::{Action, Command};
use super::super::super::view_models::ReachOf;
use super::super::super::widgets::{Icon, paint_icon, tooltip_text};
use super::super::Scope;

/// What the two figures are.
pub(super) fn legend(ui: &Ui, bounds: Rect, scope: &Scope<'_>, differs: bool) {
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

/// How much of its limit the chosen joint uses, above the legend; a sign and the colour of errors where it is beyond.
pub(super) fn reach_words(ui: &mut Ui, bounds: Rect, scope: &Scope<'_>, reach: &ReachOf) {
    let look = &scope.look;
    let color = if reach.is_beyond { look.error } else { look.text };
    let font = egui::TextStyle::Small.resolve(ui.style());
    let room = (bounds.width() - 50.0).max(40.0);
    let mut job = egui::text::LayoutJob::simple_singleline(reach.words.clone(), font, color);
    job.wrap = egui::text::TextWrapping::truncate_at_width(room);
    let galley = ui.painter().layout_job(job);
    let at = bounds.left_bottom() + vec2(10.0, -28.0 - galley.size().y);
    let shift = if reach.is_beyond { 18.0 } else { 0.0 };
    let plate = Rect::from_min_size(at, galley.size() + vec2(shift, 0.0)).expand2(vec2(5.0, 3.0));
    ui.painter().rect_filled(plate, 4.0, look.panel.gamma_multiply(0.85));
    if reach.is_beyond {
        let mark = Rect::from_min_size(at + vec2(0.0, (galley.size().y - 13.0) / 2.0), vec2(13.0, 13.0));
        paint_icon(ui.painter(), mark, Icon::Warning, look.error);
    }
    ui.painter().galley(at + vec2(shift, 0.0), galley, color);
    let response = ui.interact(plate, ui.scope_id().with("reach words"), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &reach.words));
    response.on_hover_text(&reach.words);
}

/// The card with the pairs of axes to look at squarely. The lower row is the other side.
pub(super) fn view_card(ui: &mut Ui, bounds: Rect, scope: &mut Scope<'_>) {
    const CELL: egui::Vec2 = egui::Vec2::new(30.0, 20.0);
    let size = vec2(CELL.x * 3.0, CELL.y * 2.0);
    if bounds.width() < size.x + 40.0 || bounds.height() < 180.0 {
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

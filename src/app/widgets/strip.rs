//! The strip with a panel's title, and the words in an empty panel.

use egui::{Align, Align2, Layout, Rect, Sense, Ui, UiBuilder, vec2};

use super::super::theme::{INSET, Look, STRIP_HEIGHT};

/// A panel's title, with controls at the right end. Lays out from the right: the first control is the outermost.
pub(crate) fn strip(ui: &mut Ui, title: &str, controls: impl FnOnce(&mut Ui)) {
    let look = Look::of(ui);
    let size = vec2(ui.available_width(), STRIP_HEIGHT);
    let (bounds, response) = ui.allocate_exact_size(size, Sense::hover());
    response.widget_info(|| egui::WidgetInfo::labeled(egui::Role::Heading, true, title));
    ui.painter().rect_filled(bounds, 0.0, look.panel);
    let font = egui::TextStyle::Button.resolve(ui.style());
    let galley = ui.painter().layout_no_wrap(title.to_owned(), font, look.text);
    let at = egui::pos2(bounds.left() + INSET, bounds.center().y - galley.size().y / 2.0);
    let title_end = at.x + galley.size().x + 12.0;
    ui.painter().galley(at, galley, look.text);
    let free = Rect::from_min_max(
        egui::pos2(title_end, bounds.top()),
        egui::pos2(bounds.right() - INSET, bounds.bottom()),
    );
    if free.width() > 8.0 {
        let layout = Layout::right_to_left(Align::Center);
        let mut child = ui.new_child(UiBuilder::new().max_rect(free).layout(layout));
        child.shrink_clip_rect(free.expand(2.0));
        child.spacing_mut().item_spacing.x = 2.0;
        controls(&mut child);
    }
}

/// Faint words in the middle of an empty area.
pub(crate) fn hint(ui: &mut Ui, words: &str) {
    let look = Look::of(ui);
    let bounds = ui.available_rect_before_wrap();
    let response = ui.allocate_rect(bounds, Sense::hover());
    response.widget_info(|| egui::WidgetInfo::labeled(egui::Role::Label, true, words));
    let font = egui::TextStyle::Body.resolve(ui.style());
    let width = (bounds.width() - 24.0).clamp(40.0, 360.0);
    let galley = ui.painter().layout(words.to_owned(), font, look.faint, width);
    let at = Align2::CENTER_CENTER.align_size_within_rect(galley.size(), bounds);
    ui.painter().galley(at.min, galley, look.faint);
}

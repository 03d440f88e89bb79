//! Lists that follow what is chosen.

use egui::{Rangef, Rect, Ui};

/// Scrolls a list so that a row lies in it with a neighbour on either side. `row` is measured from the list's own top, which is at `top` on
/// screen. Where nobody asked for it this happens only to a row that was in view before the list became lower: `[offset, height]` is what was
/// in view then.
pub(crate) fn bring_into_view(ui: &Ui, top: f32, row: Rangef, [offset, height]: [f32; 2], is_asked: bool) {
    let was_in_view = row.min >= offset && row.max <= offset + height;
    if is_asked || was_in_view {
        let rows = row.expand(row.span());
        let x = Rangef::point(ui.max_rect().left());
        ui.scroll_to_rect(Rect::from_x_y_ranges(x, Rangef::new(top + rows.min, top + rows.max)), None);
    }
}

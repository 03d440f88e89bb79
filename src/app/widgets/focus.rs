//! Where the keyboard is.

use egui::{Response, StrokeKind, Ui};

use super::super::theme::Look;

/// A ring around what has the keyboard.
pub(crate) fn focus_ring(ui: &Ui, response: &Response) {
    if response.has_focus() {
        let look = Look::of(ui);
        ui.painter().rect_stroke(response.rect.shrink(1.0), 3.0, (1.5, look.text), StrokeKind::Inside);
    }
}

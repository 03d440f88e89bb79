//! Version, licences, cautions.

use egui::{RichText, Ui};

use super::super::Scope;
use super::sheet::{close_button, heading};

pub(super) fn about_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
    heading(ui, "Turnwright");
    let look = scope.look;
    ui.label(format!("Version {}. A bench for rotation animation.", env!("CARGO_PKG_VERSION")));
    let faint = |words: &str| egui::Label::new(RichText::new(words.to_owned()).color(look.faint)).wrap();
    ui.add(faint("Finds the places where joints turn as they should not, mends them without touching your file, and measures what it changed."));
    ui.add_space(6.0);
    ui.label("Cautions");
    ui.add(faint("A mend is a good guess, not the truth: look at the motion before you hand it on. What the search does not flag may still be wrong, and what it flags may be meant."));
    ui.add(faint("Before exported motion drives a machine that can hurt someone, check it against that machine's own limits of angle, speed and acceleration. This program knows none of them."));
    ui.add_space(6.0);
    ui.label("Licence");
    ui.add(faint("MIT or Apache 2.0, as you like. Without any warranty."));
    close_button(ui, scope);
}

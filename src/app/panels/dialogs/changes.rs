//! What has changed from version to version.

use egui::{RichText, ScrollArea, Sense, Ui, vec2};

use super::super::super::view_models::{LogBlock, log_blocks};
use super::super::Scope;
use super::sheet::{close_button, heading};

const CHANGES: &str = include_str!("../../../../assets/CHANGELOG.md");

pub(super) fn changes_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
    heading(ui, "What's new");
    ScrollArea::vertical().max_height(340.0).auto_shrink(false).show(ui, |ui| {
        let look = scope.look;
        for block in log_blocks(CHANGES) {
            match block {
                LogBlock::Heading(depth, words) => {
                    ui.add_space(if depth == 2 { 8.0 } else { 4.0 });
                    let size = if depth == 2 { 16.5 } else { 14.5 };
                    ui.label(RichText::new(words).size(size).color(look.text));
                }
                LogBlock::Item(words) => {
                    ui.horizontal_top(|ui| {
                        let (dot, _) = ui.allocate_exact_size(vec2(10.0, 18.0), Sense::hover());
                        ui.painter().circle_filled(dot.center(), 2.0, look.faint);
                        ui.add(egui::Label::new(RichText::new(words).color(look.text)).wrap());
                    });
                }
                LogBlock::Text(words) => {
                    ui.add(egui::Label::new(RichText::new(words).color(look.faint)).wrap());
                }
            }
        }
    });
    close_button(ui, scope);
}

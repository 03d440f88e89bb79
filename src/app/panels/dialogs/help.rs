//! What each snag kind and each pass is, with a small picture of it.

use egui::{ColorImage, RichText, Role, ScrollArea, Sense, TextEdit, Ui, WidgetInfo, vec2};

use super::super::super::help::{help_picture, topics};
use super::super::super::pictures::Picture;
use super::super::Scope;
use super::form::Form;
use super::sheet::{close_button, heading};

const PICTURE: egui::Vec2 = egui::Vec2::new(220.0, 112.0);

/// The list; typing looks for words, arrows and Page keys go through it.
pub(super) fn help_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Snags and passes");
    let label = ui.label(RichText::new("Look for").size(12.5).color(scope.look.faint));
    let field =
        TextEdit::singleline(&mut form.search).desired_width(f32::INFINITY).hint_text("a snag or a pass");
    let response = ui.add(field).labelled_by(label.id);
    if !form.has_focus {
        response.request_focus();
        form.has_focus = true;
    }
    // The field is one line: these keys are free for the list.
    let steps = ui.input(|input| {
        let count = |key| input.num_presses(key) as f32;
        (count(egui::Key::ArrowDown) - count(egui::Key::ArrowUp)) * 60.0
            + (count(egui::Key::PageDown) - count(egui::Key::PageUp)) * 300.0
    });
    let found = topics(&form.search);
    let height = (ui.available_height() - 44.0).clamp(80.0, 430.0);
    ScrollArea::vertical().max_height(height).auto_shrink(false).show(ui, |ui| {
        if steps != 0.0 {
            ui.scroll_with_delta(vec2(0.0, -steps));
        }
        if found.is_empty() {
            ui.label(RichText::new("Nothing has these words").color(scope.look.faint));
        }
        for topic in &found {
            ui.add_space(6.0);
            ui.horizontal_top(|ui| {
                let (bounds, response) = ui.allocate_exact_size(PICTURE, Sense::hover());
                let name = format!("Picture of {}: grey before, colour after", topic.title);
                response.widget_info(|| WidgetInfo::labeled(Role::Image, true, &name));
                if ui.is_rect_visible(bounds) {
                    picture_ui(ui, bounds, topic.subject, form, scope);
                }
                ui.vertical(|ui| {
                    ui.label(RichText::new(&topic.title).size(15.0).color(scope.look.text));
                    ui.add(egui::Label::new(RichText::new(&topic.words).color(scope.look.text)).wrap());
                });
            });
        }
    });
    close_button(ui, scope);
}

fn picture_ui(
    ui: &Ui,
    bounds: egui::Rect,
    subject: super::super::super::help::Subject,
    form: &mut Form,
    scope: &Scope<'_>,
) {
    let scale = ui.pixels_per_point();
    let (bounds, size_px) = super::super::super::pictures::on_pixels(bounds, scale);
    let palette = scope.look.palette;
    let picture: &mut Picture<_> = form.pictures.entry(subject).or_default();
    let key = (size_px, ui.visuals().dark_mode);
    let texture = picture.show(ui.ctx(), "help", key, |_| {
        let image = help_picture(subject, size_px, &palette, scale);
        ColorImage::from_rgba_premultiplied([image.width(), image.height()], image.as_bytes())
    });
    let whole = egui::Rect::from_min_max(egui::pos2(0.0, 0.0), egui::pos2(1.0, 1.0));
    ui.painter().image(texture, bounds, whole, egui::Color32::WHITE);
}

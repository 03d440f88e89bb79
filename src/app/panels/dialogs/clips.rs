//! Which clip of several to work on.

use egui::{FontId, Rect, RichText, Role, ScrollArea, Sense, TextEdit, Ui, WidgetInfo, pos2, vec2};

use super::super::super::bench::file_name;
use super::super::super::commands::Command;
use super::super::super::view_models::{Shared, counted};
use super::super::super::widgets::{focus_ring, hint, name_ui};
use super::super::Scope;
use super::form::Form;
use super::sheet::{close_button, heading};

/// More clips than these are looked for by name.
const FEW: usize = 10;

pub(super) fn clips_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Choose clip");
    let Some(project) = &scope.bench.project else { return };
    let document = std::sync::Arc::clone(project.document());
    let look = scope.look;
    if document.works.len() > FEW {
        let label = ui.label(RichText::new("Look for").size(12.5).color(look.faint));
        let field = TextEdit::singleline(&mut form.search).desired_width(f32::INFINITY);
        let response = ui.add(field.hint_text("part of a clip's name")).labelled_by(label.id);
        if !form.has_focus {
            response.request_focus();
            form.has_focus = true;
        }
    }
    let wanted = form.search.to_lowercase();
    let found: Vec<usize> = (0..document.works.len())
        .filter(|&work| document.works[work].name.to_lowercase().contains(&wanted))
        .collect();
    let shared = Shared::of(document.works.iter().map(|work| work.name.as_str()));
    let height = (ui.available_height() - 44.0).max(80.0);
    ScrollArea::vertical().max_height(height).auto_shrink([false, true]).show(ui, |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        if found.is_empty() {
            ui.allocate_ui(vec2(ui.available_width(), 60.0), |ui| hint(ui, "No clip has this in its name"));
        }
        for index in found {
            let work = &document.works[index];
            let clip = project.source_clip(index);
            let (bounds, response) = ui.allocate_exact_size(vec2(ui.available_width(), 28.0), Sense::click());
            let is_on = index == scope.bench.session.work;
            response.widget_info(|| {
                WidgetInfo::selected(Role::Button, true, is_on, format!("Clip {}", work.name))
            });
            if is_on || response.hovered() {
                ui.painter().rect_filled(bounds, 4.0, if is_on { look.chosen } else { look.hover });
            }
            if is_on {
                let bar = Rect::from_min_size(bounds.min, vec2(3.0, bounds.height()));
                ui.painter().rect_filled(bar, 0.0, look.selection);
            }
            let y = bounds.center().y;
            let words = if document.sources.len() > 1 {
                let file =
                    document.sources.get(work.source).map_or(String::new(), |source| file_name(&source.path));
                format!("{file}: {}", work.name)
            } else {
                work.name.clone()
            };
            let numbers = clip.map_or("missing".to_owned(), |clip| {
                let joints = clip.skeleton.listed().count();
                format!(
                    "{}  {:.2} s  {}",
                    counted(clip.grid.count(), "frame"),
                    clip.duration_secs,
                    counted(joints, "joint")
                )
            });
            let numbers = ui.painter().text(
                pos2(bounds.right() - 8.0, y),
                egui::Align2::RIGHT_CENTER,
                numbers,
                FontId::proportional(12.5),
                look.faint,
            );
            let room = Rect::from_min_max(
                bounds.min + vec2(12.0, 0.0),
                pos2(numbers.left() - 12.0, bounds.bottom()),
            );
            let is_cut = name_ui(ui.painter(), room, &words, shared, &FontId::proportional(14.0), look.text);
            focus_ring(ui, &response);
            let response = if is_cut { response.on_hover_text(words) } else { response };
            if response.clicked() {
                scope.out.push(Command::ShowClip(index));
                scope.out.push(Command::CloseDialog);
            }
        }
    });
    close_button(ui, scope);
}

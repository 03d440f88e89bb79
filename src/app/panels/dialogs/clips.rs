//! Which clip of several to work on.

use egui::{FontId, Role, ScrollArea, Sense, Ui, WidgetInfo, vec2};

use super::super::super::bench::file_name;
use super::super::super::commands::Command;
use super::super::super::view_models::counted;
use super::super::Scope;
use super::sheet::heading;

pub(super) fn clips_sheet(ui: &mut Ui, scope: &mut Scope<'_>) {
    heading(ui, "Choose clip");
    let Some(project) = &scope.bench.project else { return };
    let document = std::sync::Arc::clone(project.document());
    let look = scope.look;
    ScrollArea::vertical().auto_shrink([false, true]).show(ui, |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        for (index, work) in document.works.iter().enumerate() {
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
                let bar = egui::Rect::from_min_size(bounds.min, vec2(3.0, bounds.height()));
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
            let mut job =
                egui::text::LayoutJob::simple_singleline(words, FontId::proportional(14.0), look.text);
            job.wrap = egui::text::TextWrapping::truncate_at_width((bounds.width() - 210.0).max(60.0));
            let galley = ui.painter().layout_job(job);
            ui.painter().galley(
                egui::pos2(bounds.left() + 12.0, y - galley.size().y / 2.0),
                galley,
                look.text,
            );
            let numbers = clip.map_or("missing".to_owned(), |clip| {
                let joints = clip.skeleton.listed().count();
                format!(
                    "{}  {:.2} s  {}",
                    counted(clip.grid.count(), "frame"),
                    clip.duration_secs,
                    counted(joints, "joint")
                )
            });
            ui.painter().text(
                egui::pos2(bounds.right() - 8.0, y),
                egui::Align2::RIGHT_CENTER,
                numbers,
                FontId::proportional(12.5),
                look.faint,
            );
            if response.clicked() {
                scope.out.push(Command::ShowClip(index));
                scope.out.push(Command::CloseDialog);
            }
        }
    });
}

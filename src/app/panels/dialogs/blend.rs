//! Which clip is blended in, and how.

use egui::{FontId, RichText, Role, ScrollArea, Sense, Ui, WidgetInfo, vec2};

use super::super::super::commands::{BlendCommand, Command};
use super::super::super::view_models::{BlendKind, counted};
use super::super::Scope;
use super::super::blend_form::clip_title;
use super::form::Form;
use super::sheet::{buttons, heading};
use crate::scene::ClipRef;

pub(super) fn blend_sheet(ui: &mut Ui, form: &mut Form, scope: &mut Scope<'_>) {
    heading(ui, "Blend in a clip");
    let Some(project) = &scope.bench.project else { return };
    let document = std::sync::Arc::clone(project.document());
    let look = scope.look;
    let others = document.works.iter().enumerate().filter(|(index, _)| *index != scope.bench.session.work);
    let others: Vec<(usize, ClipRef)> =
        others.map(|(index, work)| (index, ClipRef { source: work.source, clip: work.clip })).collect();
    let words = if others.is_empty() {
        "No other clip is open. Open a file with the clip to blend in"
    } else {
        "With which clip? One of another body is carried over to this one's skeleton"
    };
    ui.add(egui::Label::new(RichText::new(words).color(look.faint)).wrap());
    ScrollArea::vertical().auto_shrink([false, true]).max_height(190.0).show(ui, |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        for &(index, clip) in &others {
            let (bounds, response) = ui.allocate_exact_size(vec2(ui.available_width(), 28.0), Sense::click());
            let is_on = form.second == Some(clip);
            let title = clip_title(scope, clip);
            response.widget_info(|| {
                WidgetInfo::selected(Role::RadioButton, true, is_on, format!("Second clip {title}"))
            });
            if is_on || response.hovered() || response.has_focus() {
                ui.painter().rect_filled(bounds, 4.0, if is_on { look.chosen } else { look.hover });
            }
            if is_on {
                let bar = egui::Rect::from_min_size(bounds.min, vec2(3.0, bounds.height()));
                ui.painter().rect_filled(bar, 0.0, look.selection);
            }
            let mut job =
                egui::text::LayoutJob::simple_singleline(title, FontId::proportional(14.0), look.text);
            job.wrap = egui::text::TextWrapping::truncate_at_width((bounds.width() - 210.0).max(60.0));
            let galley = ui.painter().layout_job(job);
            let y = bounds.center().y;
            ui.painter().galley(
                egui::pos2(bounds.left() + 12.0, y - galley.size().y / 2.0),
                galley,
                look.text,
            );
            let numbers = project.result_clip(index).map_or("missing".to_owned(), |clip| {
                let joints = clip.skeleton.listed().count();
                format!("{:.2} s  {}", clip.duration_secs, counted(joints, "joint"))
            });
            let at = egui::pos2(bounds.right() - 8.0, y);
            let font = FontId::proportional(12.5);
            ui.painter().text(at, egui::Align2::RIGHT_CENTER, numbers, font, look.faint);
            if response.clicked() {
                form.second = Some(clip);
            }
        }
    });
    ui.add_space(4.0);
    let mut kind = form.blend.unwrap_or(BlendKind::Join);
    for own in BlendKind::ALL {
        ui.horizontal(|ui| {
            ui.radio_value(&mut kind, own, own.word());
            ui.label(RichText::new(own.explanation()).color(look.faint));
        });
    }
    form.blend = Some(kind);
    let is_there = form.second.is_some_and(|second| others.iter().any(|(_, clip)| *clip == second));
    let clicked = buttons(ui, "Blend", is_there, scope, |ui, scope| {
        if ui.button("Open a file…").clicked() {
            scope.out.push(Command::Blend(BlendCommand::AskForFile(None)));
        }
    });
    if let Some(second) = form.second.filter(|_| clicked) {
        scope.out.push(Command::Blend(BlendCommand::Add(second, kind)));
    }
}

//! What carrying the clip over came to: what was not met first. A click on a line goes to its frame.

use egui::{FontId, Rect, Role, ScrollArea, Sense, Ui, WidgetInfo, pos2, vec2};

use super::super::super::commands::Command;
use super::super::super::theme::INSET;
use super::super::super::view_models::carry_lines;
use super::super::super::widgets::{Icon, focus_ring, hint, paint_icon, strip};
use super::super::Scope;
use super::Sheet;

pub(super) fn report_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let measured = scope.bench.carry_measured.as_ref();
    let is_current = scope.bench.carry.as_ref().zip(measured).is_some_and(|(work, own)| work.key == own.key);
    let title = if is_current { "Report" } else { "Report: being measured" };
    strip(ui, title, |_| {});
    ui.painter().vline(ui.max_rect().left(), ui.max_rect().y_range(), (1.0, scope.look.line));
    let (Some(measured), Some(facts)) = (measured, sheet.facts) else {
        hint(
            ui,
            "What could not be met, and how well limbs follow, stands here once the clip is carried over",
        );
        return;
    };
    let report = match &measured.made {
        Ok((_, report)) => report,
        Err(problem) => {
            hint(ui, problem);
            return;
        }
    };
    let target = &facts.setting.target.skeleton;
    let is_fitting = report.missed.iter().all(|missed| missed.joint < target.len());
    if !is_fitting {
        hint(ui, "The report is being made anew");
        return;
    }
    let lines = carry_lines(report, target);
    let doubts = &facts.setting.map.doubts;
    let look = scope.look;
    let grid = &measured.key.clip.grid;
    ScrollArea::vertical().id_salt("carry report").auto_shrink(false).show(ui, |ui| {
        ui.spacing_mut().item_spacing.y = 1.0;
        ui.add_space(3.0);
        for line in &lines {
            let indent = INSET + 18.0;
            // The mark says that it is a miss; words in its colour would be hard to read in a light window.
            let ink = look.text;
            let font = FontId::proportional(12.5);
            let width = (ui.available_width() - indent - INSET).max(20.0);
            let galley = ui.painter().layout(line.text.clone(), font, ink, width);
            let size = vec2(ui.available_width(), galley.size().y + 3.0);
            let sense = if line.frame.is_some() { Sense::click() } else { Sense::hover() };
            let (bounds, response) = ui.allocate_exact_size(size, sense);
            let role = if line.frame.is_some() { Role::Button } else { Role::Label };
            response.widget_info(|| WidgetInfo::labeled(role, true, &line.text));
            if line.frame.is_some() && response.hovered() {
                ui.painter().rect_filled(bounds, 0.0, look.hover);
            }
            if line.is_miss {
                let mark = Rect::from_center_size(
                    pos2(bounds.left() + INSET + 7.0, bounds.top() + 9.0),
                    vec2(13.0, 13.0),
                );
                paint_icon(ui.painter(), mark, Icon::Warning, look.error);
            }
            ui.painter().galley(pos2(bounds.left() + indent, bounds.top() + 1.0), galley, ink);
            focus_ring(ui, &response);
            if let Some(frame) = line.frame
                && response.on_hover_text(format!("Go to frame {frame}")).clicked()
            {
                scope.out.push(Command::Scrub(grid.time(frame)));
            }
        }
        for doubt in doubts {
            let margin = egui::Margin { left: INSET as i8 + 18, right: INSET as i8, top: 1, bottom: 1 };
            egui::Frame::NONE.inner_margin(margin).show(ui, |ui| {
                let words = egui::RichText::new(format!("Question: {doubt}")).size(12.5).color(look.faint);
                ui.add(egui::Label::new(words).wrap());
            });
        }
    });
}

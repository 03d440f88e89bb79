//! The passes: the ordered steps from the source to the result.

use egui::{Color32, FontId, Rect, Role, ScrollArea, Sense, Slider, Ui, WidgetInfo, vec2};

use super::super::bench::{Evaluated, file_name};
use super::super::commands::{Action, Command, Offer, TimeCommand};
use super::super::theme::{INSET, Look};
use super::super::view_models::{PassRow, pass_rows};
use super::super::widgets::{Icon, focus_ring, hint, paint_icon, strip};
use super::Scope;
use super::blend_form::clip_title;
use super::pass_forms::form_ui;
use crate::scene::{Edit, PassStep};

/// The panel.
pub(crate) fn passes_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let look = scope.look;
    let rows = rows_of(scope, scope.bench.told());
    strip(ui, "Passes", |ui| add_ui(ui, scope));
    ui.painter().vline(ui.max_rect().left(), ui.max_rect().y_range(), (1.0, look.line));
    if rows.is_empty() {
        hint(
            ui,
            "Nothing is changed yet. Each mend becomes a pass here: ordered, switchable, measured. Add pass offers more",
        );
        return;
    }
    let total = scope.bench.told().map(|evaluated| evaluated.changes.sentence());
    let area = ui.available_rect_before_wrap();
    let footer_height = 26.0;
    let body = Rect::from_min_max(area.min, area.max - vec2(0.0, footer_height));
    ui.scope_builder(egui::UiBuilder::new().max_rect(body), |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        ScrollArea::vertical().id_salt("passes").auto_shrink(false).show(ui, |ui| {
            let count = rows.len();
            for (place, row) in rows.iter().enumerate() {
                pass_ui(ui, place, count, row, scope);
            }
        });
    });
    let footer = Rect::from_min_max(egui::pos2(area.left(), body.bottom()), area.max);
    ui.painter().hline(footer.x_range(), footer.top(), (1.0, look.line));
    if let Some(words) = total {
        let response = ui.allocate_rect(footer, Sense::hover());
        response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &words));
        let place = footer.shrink2(vec2(INSET, 0.0));
        one_line(ui.painter(), place, &words, FontId::proportional(12.5), look.text);
        response.on_hover_text(words);
    }
}

/// The passes of the clip on show with what they came to; other files are called by their names.
pub(super) fn rows_of(scope: &Scope<'_>, evaluated: Option<&Evaluated>) -> Vec<PassRow> {
    let Some(work) = scope.bench.work() else { return Vec::new() };
    let mut rows = pass_rows(work, evaluated.map(|evaluated| &*evaluated.evaluation));
    for (row, pass) in rows.iter_mut().zip(&work.passes) {
        match &pass.step {
            PassStep::Blend(blend) => row.title = blend.title_with(&clip_title(scope, blend.other)),
            PassStep::Retarget(retarget) => {
                let project = scope.bench.project.as_ref();
                let onto = project.and_then(|project| project.document().sources.get(retarget.onto));
                if let Some(onto) = onto {
                    row.title = retarget.title_with(&file_name(&onto.path));
                }
            }
            _ => {}
        }
    }
    rows
}

/// The menu of passes to add. A new one acts on what is chosen on the turn map.
fn add_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let has_clip = scope.now.has_clip;
    ui.add_enabled_ui(has_clip, |ui| {
        let menu = ui.menu_button("Add pass", |ui| {
            ui.set_min_width(200.0);
            let choice = &scope.bench.session.choice;
            let words = scope.bench.result().map_or(String::new(), |clip| choice.words(clip));
            ui.label(egui::RichText::new(format!("acts on {words}")).size(12.0).color(scope.look.faint));
            ui.separator();
            for offer in Offer::ALL {
                if ui.button(offer.label()).on_hover_text(offer.tooltip()).clicked() {
                    scope.out.push(Command::Time(TimeCommand::AddPass(offer)));
                    ui.close();
                }
            }
        });
        menu.response.on_hover_text("A new pass on the choice, or on everything where nothing is chosen");
    });
    if scope.now.has_choice {
        let words = scope.bench.result().map_or(String::new(), |clip| scope.bench.session.choice.words(clip));
        let button = egui::Button::new("Forget choice").small();
        let response = ui.add(button).on_hover_text(format!("Chosen: {words}"));
        if response.clicked() {
            scope.out.push(Command::Do(Action::ChooseAll));
        }
    }
}

fn one_line(painter: &egui::Painter, bounds: Rect, words: &str, font: FontId, color: Color32) {
    let mut job = egui::text::LayoutJob::simple_singleline(words.to_owned(), font, color);
    job.wrap = egui::text::TextWrapping::truncate_at_width(bounds.width().max(8.0));
    let galley = painter.layout_job(job);
    painter.galley(egui::pos2(bounds.left(), bounds.center().y - galley.size().y / 2.0), galley, color);
}

fn pass_ui(ui: &mut Ui, place: usize, count: usize, row: &PassRow, scope: &mut Scope<'_>) {
    let look = scope.look;
    let work = scope.bench.session.work;
    let is_open = scope.bench.session.open_pass == Some(row.id);
    let frame = egui::Frame::NONE.inner_margin(egui::Margin::symmetric(INSET as i8, 5));
    let response = frame
        .show(ui, |ui| {
            ui.set_width(ui.available_width());
            ui.spacing_mut().item_spacing.y = 2.0;
            ui.horizontal(|ui| {
                let mut on = row.on;
                let title = format!("{}. {}", place + 1, row.title);
                let switch = ui.add(egui::Checkbox::without_text(&mut on));
                switch.widget_info(|| {
                    WidgetInfo::selected(Role::CheckBox, true, row.on, format!("Pass {}", row.title))
                });
                if switch.on_hover_text("Take part or not").changed() {
                    scope.out.push(Command::Edit(Edit::SwitchPass { work, pass: row.id, on }));
                }
                let buttons = 3.0 * 24.0 + 2.0;
                ui.spacing_mut().item_spacing.x = 0.0;
                ui.add_space(4.0);
                let (words, response) = ui.allocate_exact_size(
                    vec2((ui.available_width() - buttons).max(30.0), 20.0),
                    Sense::click(),
                );
                response.widget_info(|| {
                    WidgetInfo::selected(
                        Role::DisclosureTriangle,
                        true,
                        is_open,
                        format!("Settings of {}", row.title),
                    )
                });
                if response.hovered() || response.has_focus() {
                    ui.painter().rect_filled(words, 3.0, look.hover);
                }
                let chevron = Rect::from_min_size(words.min, vec2(14.0, words.height()));
                let icon = if is_open { Icon::ChevronDown } else { Icon::ChevronRight };
                paint_icon(ui.painter(), chevron.shrink2(vec2(2.0, 0.0)), icon, look.faint);
                focus_ring(ui, &response);
                if response.on_hover_text(row.explanation).clicked() {
                    let next = (!is_open).then_some(row.id);
                    scope.out.push(Command::Time(TimeCommand::OpenPass(next)));
                }
                let words = words.with_min_x(chevron.right() + 3.0);
                one_line(
                    ui.painter(),
                    words,
                    &title,
                    FontId::proportional(13.5),
                    if row.on { look.text } else { look.faint },
                );
                let named = |verb: &str| format!("{verb}: {}", row.title);
                if small_button(ui, Icon::Up, &named("Move up"), place > 0, &look) {
                    scope.out.push(Command::Edit(Edit::MovePass { work, pass: row.id, to: place - 1 }));
                }
                if small_button(ui, Icon::Down, &named("Move down"), place + 1 < count, &look) {
                    scope.out.push(Command::Edit(Edit::MovePass { work, pass: row.id, to: place + 1 }));
                }
                if small_button(ui, Icon::Close, &named("Remove"), true, &look) {
                    scope.out.push(Command::Edit(Edit::RemovePass { work, pass: row.id }));
                }
            });
            ui.horizontal(|ui| {
                ui.add_space(24.0);
                let (words, response) =
                    ui.allocate_exact_size(vec2(ui.available_width(), 16.0), Sense::hover());
                response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &row.change));
                one_line(ui.painter(), words, &row.change, FontId::proportional(12.0), look.faint);
            });
            if let Some(amount) = row.amount {
                amount_ui(ui, amount, row, scope);
            }
            let own = scope.bench.work().and_then(|work| work.pass(row.id)).filter(|_| is_open).cloned();
            if let Some(pass) = own {
                ui.horizontal(|ui| {
                    ui.add_space(24.0);
                    ui.vertical(|ui| form_ui(ui, &pass, scope));
                });
            }
            if let Some(problem) = &row.problem {
                ui.horizontal(|ui| {
                    ui.add_space(24.0);
                    let (mark, _) = ui.allocate_exact_size(vec2(14.0, 14.0), Sense::hover());
                    paint_icon(ui.painter(), mark, Icon::Warning, look.error);
                    ui.add(
                        egui::Label::new(egui::RichText::new(problem).color(look.error).size(12.0)).wrap(),
                    );
                });
            }
        })
        .response;
    ui.painter().hline(response.rect.x_range(), response.rect.bottom(), (1.0, look.grid));
    if is_open && scope.pictures.scroll_to_form {
        response.scroll_to_me(Some(egui::Align::Min));
    }
}

/// How much of a pass is taken. While it is dragged the window shows the result; letting go is one step of the history.
fn amount_ui(ui: &mut Ui, amount: f64, row: &PassRow, scope: &mut Scope<'_>) {
    let work = scope.bench.session.work;
    let shown = scope.bench.preview.as_ref().filter(|(id, _)| *id == row.id);
    let shown = shown.and_then(|(_, step)| step.kind().amount()).unwrap_or(amount);
    let mut percent = shown * 100.0;
    ui.horizontal(|ui| {
        ui.add_space(24.0);
        ui.spacing_mut().slider_width = (ui.available_width() - 64.0).clamp(40.0, 220.0);
        let slider = Slider::new(&mut percent, 0.0..=100.0).suffix(" %").fixed_decimals(0);
        let response = ui.add(slider);
        response.widget_info(|| WidgetInfo::slider(true, percent, format!("Amount of {}", row.title)));
        let response = response.on_hover_text("How much of the change is taken");
        let wanted = (percent / 100.0).clamp(0.0, 1.0);
        if response.drag_stopped() || (response.changed() && !response.dragged()) {
            scope.out.push(Command::Edit(Edit::SetAmount { work, pass: row.id, amount: wanted }));
        } else if response.changed() {
            let own = scope.bench.work().and_then(|work| work.pass(row.id));
            if let Some(mut step) = own.map(|pass| pass.step.clone()) {
                step.kind_mut().set_amount(wanted);
                scope.out.push(Command::PreviewPass(row.id, Box::new(step)));
            }
        }
    });
}

fn small_button(ui: &mut Ui, icon: Icon, label: &str, enabled: bool, look: &Look) -> bool {
    let sense = if enabled { Sense::click() } else { Sense::hover() };
    let (bounds, response) = ui.allocate_exact_size(vec2(24.0, 20.0), sense);
    response.widget_info(|| WidgetInfo::labeled(Role::Button, enabled, label));
    if enabled && (response.hovered() || response.has_focus()) {
        ui.painter().rect_filled(bounds, 4.0, look.chosen);
    }
    paint_icon(ui.painter(), bounds.shrink(4.0), icon, if enabled { look.text } else { look.line });
    response.on_hover_text(label).clicked() && enabled
}

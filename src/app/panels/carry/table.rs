//! The joint map: a row for each target joint, with what drives it, how sure that is, and why.

use egui::{Align2, FontId, Key, Rect, Role, ScrollArea, Sense, Ui, WidgetInfo, pos2, vec2};

use super::super::super::commands::{CarryCommand, Command};
use super::super::super::theme::{INSET, Look, ROW_HEIGHT};
use super::super::super::view_models::{CarryRow, CarryState, Shared, with_link, without_link};
use super::super::super::widgets::{focus_ring, hint, name_galley, name_ui, strip};
use super::super::Scope;
use super::{Sheet, change};

/// Height of the editor below the rows, and the most that it takes of the whole.
const EDITOR: f32 = 92.0;
const EDITOR_SHARE: f32 = 0.45;

/// Width of the list of source joints.
const COMBO: f32 = 150.0;

pub(super) fn table_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let Some(facts) = sheet.facts else {
        strip(ui, "Joint map", |_| {});
        hint(ui, "The joint map is being made");
        return;
    };
    let questions = facts.questions();
    let only = sheet.habits.questions_only;
    strip(ui, "Joint map", |ui| {
        let words = format!("Questions ({questions})");
        let response =
            ui.selectable_label(only, &words).on_hover_text("Only rows that a person should look at");
        response.widget_info(|| WidgetInfo::selected(Role::Button, true, only, &words));
        if response.clicked() {
            scope.out.push(Command::Carry(CarryCommand::QuestionsOnly(!only)));
        }
    });
    ui.painter().vline(ui.max_rect().left(), ui.max_rect().y_range(), (1.0, scope.look.line));
    let rows: Vec<&CarryRow> = facts.rows.iter().filter(|row| !only || row.is_question).collect();
    let area = ui.available_rect_before_wrap();
    let head = Rect::from_min_size(area.min, vec2(area.width(), 20.0));
    let columns = Columns::of(ui, area, &facts.rows);
    for (x, words) in [
        (columns.target, "Target joint"),
        (columns.source, "driven by"),
        (columns.sure, "sure"),
        (columns.why, "why"),
    ] {
        let font = FontId::proportional(12.0);
        ui.painter().text(pos2(x, head.center().y), Align2::LEFT_CENTER, words, font, scope.look.faint);
    }
    ui.painter().hline(head.x_range(), head.bottom(), (1.0, scope.look.grid));
    let editor_height = EDITOR.min(EDITOR_SHARE * area.height());
    let end = pos2(area.right(), (area.bottom() - editor_height).max(head.bottom()));
    let body = Rect::from_min_max(pos2(area.left(), head.bottom()), end);
    // What all names share tells nothing in a narrow column.
    let shared = [
        Shared::of(facts.rows.iter().map(|row| row.target_label.as_str())),
        Shared::of(facts.rows.iter().filter(|row| row.source.is_some()).map(|row| row.source_label.as_str())),
    ];
    ui.scope_builder(egui::UiBuilder::new().max_rect(body), |ui| {
        if rows.is_empty() {
            let words = if facts.open.is_empty() {
                "No row is a question"
            } else {
                "No row is a question; what is asked of the figures as wholes stands below and in the report"
            };
            hint(ui, words);
            return;
        }
        ui.spacing_mut().item_spacing.y = 0.0;
        let scroll = ScrollArea::vertical().id_salt("carry rows").auto_shrink(false).min_scrolled_height(0.0);
        let scroll = match chosen_place(&rows, sheet).filter(|_| sheet.habits.scroll_to_row) {
            Some(place) => {
                let y = (place as f32 * ROW_HEIGHT - body.height() * 0.4).max(0.0);
                scroll.vertical_scroll_offset(y)
            }
            None => scroll,
        };
        scroll.show_rows(ui, ROW_HEIGHT, rows.len(), |ui, shown| {
            for place in shown {
                row_ui(ui, &rows, place, &columns, shared, sheet, scope);
            }
        });
    });
    let editor = Rect::from_min_max(pos2(area.left(), body.bottom()), area.max);
    ui.painter().hline(editor.x_range(), editor.top(), (1.0, scope.look.line));
    ui.scope_builder(egui::UiBuilder::new().max_rect(editor.shrink2(vec2(INSET, 5.0))), |ui| {
        ui.shrink_clip_rect(editor);
        let chosen = sheet.habits.row.and_then(|row| facts.rows.iter().find(|own| own.target == row));
        if let Some(row) = chosen {
            editor_ui(ui, row, sheet, scope);
            return;
        }
        let words = match facts.open.as_slice() {
            [] => "Choose a row, or click a joint of the target figure, to change what drives it".to_owned(),
            [only] => only.clone(),
            [first, ..] => format!("{first} (and {} more in the report)", facts.open.len() - 1),
        };
        ui.add(egui::Label::new(egui::RichText::new(words).size(12.5).color(scope.look.faint)).wrap());
    });
}

/// Where columns begin.
struct Columns {
    target: f32,
    source: f32,
    sure: f32,
    why: f32,
    end: f32,
}

impl Columns {
    /// Names get the room that the longest of them needs, up to a part of the whole; reasons get the rest.
    fn of(ui: &Ui, area: Rect, rows: &[CarryRow]) -> Self {
        let most = ((area.width() - 150.0) * 0.36).clamp(80.0, 260.0);
        let longest = |name: fn(&CarryRow) -> &str, head: &str| {
            let names = rows.iter().map(name).chain([head]).map(|words| {
                let font = FontId::proportional(13.0);
                ui.painter().layout_no_wrap(words.to_owned(), font, egui::Color32::WHITE).size().x
            });
            (names.fold(0.0, f32::max) + 16.0).min(most)
        };
        let target = area.left() + 26.0;
        let source = target + longest(|row| &row.target_label, "Target joint");
        let sure = source + longest(|row| &row.source_label, "driven by");
        Self { target, source, sure, why: sure + 52.0, end: area.right() - INSET }
    }
}

fn chosen_place(rows: &[&CarryRow], sheet: &Sheet<'_>) -> Option<usize> {
    rows.iter().position(|row| Some(row.target) == sheet.habits.row)
}

fn row_ui(
    ui: &mut Ui,
    rows: &[&CarryRow],
    place: usize,
    columns: &Columns,
    shared: [Shared<'_>; 2],
    sheet: &Sheet<'_>,
    scope: &mut Scope<'_>,
) {
    let (look, row) = (scope.look, rows[place]);
    let (bounds, response) = ui.allocate_exact_size(vec2(ui.available_width(), ROW_HEIGHT), Sense::click());
    let is_chosen = sheet.habits.row == Some(row.target);
    response.widget_info(|| WidgetInfo::selected(Role::Button, true, is_chosen, row.sentence()));
    if is_chosen {
        ui.painter().rect_filled(bounds, 0.0, look.chosen);
        ui.painter().vline(bounds.left() + 1.5, bounds.y_range(), (3.0, look.selection));
    } else if response.hovered() {
        ui.painter().rect_filled(bounds, 0.0, look.hover);
    }
    paint_row(ui, row, bounds, columns, shared, is_chosen, &look);
    focus_ring(ui, &response);
    if response.has_focus() {
        ui.memory_mut(|memory| {
            memory.set_focus_lock_filter(
                response.id,
                egui::EventFilter { vertical_arrows: true, ..egui::EventFilter::default() },
            );
        });
        let step = ui.input(|input| {
            i32::from(input.key_pressed(Key::ArrowDown)) - i32::from(input.key_pressed(Key::ArrowUp))
        });
        let next = place.saturating_add_signed(step as isize).min(rows.len() - 1);
        if step != 0 {
            scope.out.push(Command::Carry(CarryCommand::ChooseRow(Some(rows[next].target))));
        }
    }
    if is_chosen && sheet.habits.scroll_to_row {
        response.request_focus();
    }
    // Whole where the columns cut it.
    let whole = format!("{} driven by {}\n{}", row.target_label, row.source_label, row.reason);
    if response.on_hover_text(whole).clicked() {
        let chosen = (!is_chosen).then_some(row.target);
        scope.out.push(Command::Carry(CarryCommand::ChooseRow(chosen)));
    }
}

fn paint_row(
    ui: &Ui,
    row: &CarryRow,
    bounds: Rect,
    columns: &Columns,
    shared: [Shared<'_>; 2],
    is_chosen: bool,
    look: &Look,
) {
    let y = bounds.center().y;
    // Names are cut in their middle, sentences at their end.
    let name = |from: f32, to: f32, text: &str, shared: Shared<'_>, ink: egui::Color32| {
        let place = Rect::from_min_max(pos2(from, bounds.top()), pos2(to - 6.0, bounds.bottom()));
        name_ui(ui.painter(), place, text, shared, &FontId::proportional(13.0), ink);
    };
    let words = |from: f32, to: f32, text: &str, ink: egui::Color32| {
        let font = FontId::proportional(13.0);
        let mut job = egui::text::LayoutJob::simple_singleline(text.to_owned(), font, ink);
        job.wrap = egui::text::TextWrapping::truncate_at_width((to - from - 6.0).max(6.0));
        let galley = ui.painter().layout_job(job);
        ui.painter().galley(pos2(from, y - galley.size().y / 2.0), galley, ink);
    };
    // A question has a mark of its own besides the words; what a person said, a bar.
    let mark = pos2(bounds.left() + 14.0, y);
    if row.is_question {
        let plate = Rect::from_center_size(mark, vec2(14.0, 14.0));
        ui.painter().rect_filled(plate, 2.5, look.snag);
        ui.painter().text(mark, Align2::CENTER_CENTER, "?", FontId::proportional(11.5), look.snag_ink);
    } else if matches!(row.state, CarryState::ByHand | CarryState::KeptAtRest) {
        ui.painter().rect_filled(Rect::from_center_size(mark, vec2(10.0, 3.0)), 1.0, look.text);
    }
    let is_driven = !matches!(row.state, CarryState::Free | CarryState::KeptAtRest);
    // Faint words would not be read on the chosen row.
    let ink = if is_driven || is_chosen { look.text } else { look.faint };
    name(columns.target, columns.source, &row.target_label, shared[0], ink);
    name(columns.source, columns.sure, &row.source_label, shared[1], ink);
    let sure = match row.confidence {
        Some(own) if row.state == CarryState::Linked => format!("{:.0} %", own * 100.0),
        _ => row.state.word().to_owned(),
    };
    words(columns.sure, columns.why, &sure, if row.is_question { look.error } else { ink });
    words(columns.why, columns.end, &row.reason, if is_chosen { look.text } else { look.faint });
}

/// What drives the chosen joint, to be changed.
fn editor_ui(ui: &mut Ui, row: &CarryRow, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let Some(facts) = sheet.facts else { return };
    let source = &facts.setting.source.skeleton;
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 6.0;
        let font = egui::TextStyle::Body.resolve(ui.style());
        let fitted = |ui: &Ui, name: &str, room: f32| {
            name_galley(ui.painter(), room, name, Shared::default(), &font, scope.look.text).0
        };
        // The list beside it keeps its room.
        let room = (ui.available_width() - COMBO - 90.0).max(40.0);
        let shown = if row.source.is_some() {
            egui::WidgetText::from(fitted(ui, &row.source_label, COMBO - 30.0))
        } else {
            "choose…".into()
        };
        ui.label(fitted(ui, &row.target_label, room)).on_hover_text(&row.target_label);
        ui.label("driven by");
        let mut wanted = None;
        let combo =
            egui::ComboBox::from_id_salt("carry source").selected_text(shown).width(COMBO).height(320.0);
        let response = combo.show_ui(ui, |ui| {
            for joint in source.listed() {
                if ui.selectable_label(row.source == Some(joint), source.label(joint)).clicked() {
                    wanted = Some(joint);
                }
            }
        });
        let label = format!("Source joint that drives {}", row.target_label);
        response.response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, &label));
        if let Some(joint) = wanted {
            change(scope, sheet, with_link(sheet.pass.1, &row.target_label, Some(source.label(joint))));
        }
    });
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 6.0;
        let is_said = sheet.pass.1.rows.iter().any(|(_, own)| own.as_deref() == Some(&row.target_label));
        if ui.button("Keep at rest").on_hover_text("Nothing drives this joint").clicked() {
            change(scope, sheet, with_link(sheet.pass.1, &row.target_label, None));
        }
        let as_found = ui.add_enabled(is_said, egui::Button::new("As found"));
        if as_found.on_hover_text("Forget what was said of this joint").clicked() {
            change(scope, sheet, without_link(sheet.pass.1, &row.target_label));
        }
    });
    // Whole where the table cuts it; more than two lines show on hovering.
    let (font, ink) = (FontId::proportional(12.0), scope.look.faint);
    let mut why = egui::text::LayoutJob::simple(row.reason.clone(), font, ink, ui.available_width());
    why.wrap.max_rows = 2;
    ui.add(egui::Label::new(why)).on_hover_text(&row.reason);
}

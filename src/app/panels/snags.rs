//! The snag table: what is wrong, where, and what has been decided about it.

use egui::{
    Align2, Color32, ComboBox, FontId, Painter, Rect, Role, ScrollArea, Sense, Ui, UiBuilder, WidgetInfo,
    pos2, vec2,
};

use super::super::commands::{Action, Command};
use super::super::jobs::Slot;
use super::super::theme::{INSET, Look, ROW_HEIGHT};
use super::super::view_models::{CurveView, Shared, SnagFilter, SnagOrder, SnagRow, SnagState};
use super::super::widgets::{action_button, focus_ring, hint, letter_plate, name_ui, strip, tooltip_text};
use super::Scope;
use super::menus::entry_ui;
use crate::scene::SnagMark;
use crate::snag::SnagKind;

/// One column: its words, its width in points (0: what is left), what it is ordered by.
struct Column {
    words: &'static str,
    width: f32,
    order: SnagOrder,
}

const COLUMNS: [Column; 6] = [
    Column { words: "Kind", width: 126.0, order: SnagOrder::Kind },
    Column { words: "Joint", width: 0.0, order: SnagOrder::Joint },
    Column { words: "Frames", width: 92.0, order: SnagOrder::Time },
    Column { words: "Size", width: 58.0, order: SnagOrder::Size },
    Column { words: "Sure", width: 52.0, order: SnagOrder::Confidence },
    Column { words: "State", width: 80.0, order: SnagOrder::State },
];

/// The panel.
pub(crate) fn snags_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let rows = std::sync::Arc::clone(&scope.rows);
    let total = scope.bench.snags().len();
    let open = scope.states.iter().filter(|&&state| state == SnagState::Open).count();
    let is_finding = scope.running.iter().any(|(slot, _)| *slot == Slot::Survey);
    let title = match total {
        _ if is_finding => "Snags: finding…".to_owned(),
        0 => "Snags".to_owned(),
        // The buttons beside it need the room.
        _ if ui.available_width() < 260.0 => format!("Snags: {open}"),
        _ => format!("Snags: {open} open of {total}"),
    };
    strip(ui, &title, |ui| filter_ui(ui, scope));
    if scope.bench.source().is_none() {
        hint(ui, "No clip");
        return;
    }
    let footer_height = if total == 0 { 0.0 } else { footer_height(ui) };
    let area = ui.available_rect_before_wrap();
    let body = Rect::from_min_max(area.min, pos2(area.right(), area.bottom() - footer_height));
    let footer = Rect::from_min_max(pos2(area.left(), body.bottom()), area.max);
    let mut body_ui = ui.new_child(UiBuilder::new().max_rect(body));
    if rows.is_empty() {
        hint(&mut body_ui, empty_words(scope, total));
    } else {
        table_ui(&mut body_ui, &rows, scope);
    }
    if total > 0 {
        let mut footer_ui = ui.new_child(UiBuilder::new().max_rect(footer.shrink2(vec2(INSET, 0.0))));
        footer_ui.shrink_clip_rect(footer);
        details_ui(&mut footer_ui, footer, scope);
    }
    ui.allocate_rect(area, Sense::hover());
}

fn empty_words(scope: &Scope<'_>, total: usize) -> &'static str {
    if scope.running.iter().any(|(slot, _)| *slot == Slot::Survey) {
        "Finding snags…"
    } else if total > 0 {
        "No snag passes the filter"
    } else if scope.bench.findings().is_some_and(|findings| findings.snags.is_some()) {
        // The list is of the clip as it came in.
        if scope.bench.work().is_some_and(|work| !work.passes.is_empty()) {
            "No snags in the source. What passes bring is told by the proof sheet of an export"
        } else {
            "No snags: every joint turns as it should"
        }
    } else {
        "Not searched yet: Snags, Find again (F5)"
    }
}

/// Which snags are listed, and what is looked for. Where there is little room the filter is a menu.
fn filter_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    /// The fields beside each other take as much.
    const ROOM: f32 = 375.0;
    /// Two buttons beside each other take as much; where there is less one menu holds both.
    const ROOM_FOR_TWO: f32 = 132.0;
    let mut filter = scope.bench.session.filter.clone();
    if ui.available_width() < ROOM_FOR_TWO {
        search_ui(ui, scope, |ui, scope| {
            ui.separator();
            filter_fields(ui, &mut filter, scope);
        });
        if filter != scope.bench.session.filter {
            scope.out.push(Command::SetFilter(filter));
        }
        return;
    }
    search_ui(ui, scope, |_, _| {});
    ui.add_space(6.0);
    if ui.available_width() > ROOM {
        filter_fields(ui, &mut filter, scope);
    } else {
        let is_plain = filter == SnagFilter::default();
        let menu = ui.menu_button(if is_plain { "Filter" } else { "Filter (on)" }, |ui| {
            ui.set_min_width(170.0);
            filter_fields(ui, &mut filter, scope);
        });
        menu.response
            .on_hover_text("Which snags are listed: by kind, joint, size, and whether they are open");
    }
    if filter != scope.bench.session.filter {
        scope.out.push(Command::SetFilter(filter));
    }
}

fn filter_fields(ui: &mut Ui, filter: &mut SnagFilter, scope: &Scope<'_>) {
    let count = |kind: SnagKind| scope.bench.snags().iter().filter(|snag| snag.kind == kind).count();
    ui.checkbox(&mut filter.only_open, "Open only");
    ui.add_space(6.0);
    let mut only_joint = filter.joint.is_some();
    let joint = scope.bench.session.joint;
    if ui
        .add_enabled(joint.is_some(), egui::Checkbox::new(&mut only_joint, "This joint"))
        .on_hover_text("Only snags of the chosen joint")
        .changed()
    {
        filter.joint = joint.filter(|_| only_joint);
    }
    ui.add_space(6.0);
    let words = |kind: Option<SnagKind>| match kind {
        None => "All kinds".to_owned(),
        Some(kind) => format!("{} {} ({})", kind.letter(), kind, count(kind)),
    };
    let combo = ComboBox::from_id_salt("snag kind").selected_text(words(filter.kind)).height(320.0);
    let response = combo
        .show_ui(ui, |ui| {
            for kind in std::iter::once(None).chain(SnagKind::ALL.map(Some)) {
                let response = ui.selectable_value(&mut filter.kind, kind, words(kind));
                if let Some(kind) = kind {
                    response.on_hover_text(kind.explanation());
                }
            }
        })
        .response;
    response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, "Kinds shown"));
    ui.add_space(6.0);
    let least =
        egui::DragValue::new(&mut filter.least_deg).range(0..=360).speed(0.5).suffix("°").prefix("from ");
    let response = ui.add(least).on_hover_text("Only snags of at least this size. Drag, or click and type");
    let shown = filter.least_deg;
    response.widget_info(|| WidgetInfo::slider(true, f64::from(shown), "Least size"));
}

/// What is looked for is written out where the strip has so many points free.
const ROOM_FOR_SEARCH: f32 = 230.0;

/// What snags are looked for with: limits, the loop's seam, sliding feet. A change looks for them anew and can be undone. `more` stands below
/// in the same menu.
fn search_ui<'s>(ui: &mut Ui, scope: &mut Scope<'s>, below: impl FnOnce(&mut Ui, &mut Scope<'s>)) {
    let mut more: Vec<String> = scope.now.limits.iter().map(|title| format!("limits {title}")).collect();
    if scope.now.search.is_loop {
        more.push("loop".to_owned());
    }
    if scope.now.search.finds_slides {
        more.push("feet".to_owned());
    }
    // In a narrow strip what is looked for is told under the pointer alone.
    let words = match more.as_slice() {
        [] => "Search".to_owned(),
        _ if ui.available_width() < ROOM_FOR_SEARCH => "Search…".to_owned(),
        more => format!("Search: {}", more.join(", ")),
    };
    let menu = ui.menu_button(elided_words(&words, 30), |ui| {
        ui.set_min_width(240.0);
        for action in [
            Action::NoLimits,
            Action::AdultLimits,
            Action::LearnLimits,
            Action::LimitsFile,
            Action::IsLoop,
            Action::FindSlides,
            Action::FindAgain,
        ] {
            if matches!(action, Action::IsLoop | Action::FindAgain) {
                ui.separator();
            }
            entry_ui(ui, action.entry(), scope.now, &scope.look, scope.out);
        }
        below(ui, scope);
    });
    menu.response.on_hover_text(format!(
        "What snags are looked for with: {}",
        if more.is_empty() { "the usual kinds".to_owned() } else { more.join(", ") }
    ));
}

fn elided_words(words: &str, most: usize) -> String {
    if words.chars().count() <= most {
        return words.to_owned();
    }
    words.chars().take(most - 1).chain(['…']).collect()
}

/// The widest the names of joints get while there is something else to show.
const JOINT_WIDTH: f32 = 190.0;

/// Left and right edge of each column, and of the words that follow where there is room for them.
struct Edges {
    columns: [[f32; 2]; COLUMNS.len()],
    words: Option<[f32; 2]>,
}

fn edges(left: f32, width: f32) -> Edges {
    let fixed: f32 = COLUMNS.iter().map(|column| column.width).sum();
    let free = (width - fixed - 2.0 * INSET).max(60.0);
    let has_words = free > JOINT_WIDTH + 160.0;
    let joint_width = if has_words { JOINT_WIDTH } else { free };
    let mut at = left + INSET;
    let columns = COLUMNS.each_ref().map(|column| {
        let start = at;
        at += if column.width == 0.0 { joint_width } else { column.width };
        // A column that would be cut off is left away.
        if at - 8.0 > left + width { [start, start] } else { [start, at - 8.0] }
    });
    Edges { columns, words: has_words.then_some([at, left + width - INSET]) }
}

fn table_ui(ui: &mut Ui, rows: &[SnagRow], scope: &mut Scope<'_>) {
    let look = scope.look;
    let area = ui.available_rect_before_wrap();
    let (header, _) = ui.allocate_exact_size(vec2(area.width(), ROW_HEIGHT), Sense::hover());
    let edges = edges(header.left(), header.width());
    for (column, [left, right]) in COLUMNS.iter().zip(edges.columns).filter(|(_, [left, right])| left < right)
    {
        let cell = Rect::from_x_y_ranges(left - 4.0..=right + 4.0, header.y_range());
        let response = ui.interact(cell, ui.scope_id().with(("column", column.words)), Sense::click());
        let is_on = scope.bench.session.order == column.order;
        response.widget_info(|| {
            WidgetInfo::selected(
                Role::ColumnHeader,
                true,
                is_on,
                format!("Order by {}", column.words.to_lowercase()),
            )
        });
        let color = if is_on || response.hovered() { look.text } else { look.faint };
        let words = ui.painter().text(
            pos2(left, header.center().y),
            Align2::LEFT_CENTER,
            column.words,
            FontId::proportional(12.0),
            color,
        );
        if is_on {
            ui.painter().hline(words.x_range(), header.bottom() - 3.0, (1.5, look.selection));
        }
        if response.clicked() {
            scope.out.push(Command::SetOrder(column.order));
        }
    }
    if let Some([left, _]) = edges.words {
        let at = pos2(left, header.center().y);
        ui.painter().text(at, Align2::LEFT_CENTER, "What is wrong", FontId::proportional(12.0), look.faint);
    }
    ui.painter().hline(header.x_range(), header.bottom(), (1.0, look.line));
    let chosen = scope.bench.session.snag;
    let chosen_place = chosen
        .and_then(|mark| rows.iter().position(|row| SnagMark::of(&scope.bench.snags()[row.index]) == mark));
    ui.spacing_mut().item_spacing.y = 0.0;
    let scrolls = scope.pictures.scroll_to_snag;
    let clip = scope.bench.source().cloned();
    let labels = clip.iter().flat_map(|clip| clip.skeleton.listed().map(|joint| clip.skeleton.label(joint)));
    let shared = Shared::of(labels);
    // Where hints take most of the room few rows are seen, and none over what is below.
    let salt = ("snag rows", scope.bench.document_serial());
    let area_of_rows = ScrollArea::vertical().id_salt(salt).auto_shrink(false).min_scrolled_height(0.0);
    area_of_rows.show_viewport(ui, |ui, viewport| {
        let top = ui.max_rect().top();
        ui.set_height(ROW_HEIGHT * rows.len() as f32);
        if scrolls && let Some(place) = chosen_place {
            let y = top + place as f32 * ROW_HEIGHT;
            ui.scroll_to_rect(Rect::from_min_size(pos2(area.left(), y), vec2(1.0, ROW_HEIGHT)), None);
        }
        let first = (viewport.top() / ROW_HEIGHT).floor().max(0.0) as usize;
        let last = ((viewport.bottom() / ROW_HEIGHT).ceil() as usize).min(rows.len());
        for (place, row) in rows.iter().enumerate().take(last).skip(first) {
            let y = top + place as f32 * ROW_HEIGHT;
            let bounds = Rect::from_min_size(pos2(area.left(), y), vec2(area.width(), ROW_HEIGHT));
            row_ui(ui, bounds, &edges, row, shared, chosen_place == Some(place), scope.out);
        }
    });
}

fn row_ui(
    ui: &mut Ui,
    bounds: Rect,
    edges: &Edges,
    row: &SnagRow,
    shared: Shared<'_>,
    is_chosen: bool,
    out: &mut Vec<Command>,
) {
    let look = &Look::of(ui);
    let response = ui.interact(bounds, ui.scope_id().with(("snag", row.index)), Sense::click());
    response.widget_info(|| {
        let words = format!("Snag {}, {}, frame {}, {}", row.kind, row.joint, row.frames, row.state.word());
        WidgetInfo::selected(Role::Row, true, is_chosen, words)
    });
    let painter = ui.painter();
    if is_chosen {
        painter.rect_filled(bounds, 0.0, look.chosen);
        painter.rect_filled(Rect::from_min_size(bounds.min, vec2(3.0, bounds.height())), 0.0, look.selection);
    } else if response.hovered() {
        painter.rect_filled(bounds, 0.0, look.hover);
    }
    let (y, columns) = (bounds.center().y, &edges.columns);
    letter_plate(painter, look, pos2(columns[0][0] + 8.0, y), 14.0, row.letter, row.state);
    let ink = if row.state == SnagState::Open { look.text } else { look.faint };
    let kind = row.kind.to_string();
    let cells = [&kind, &row.joint, &row.frames, &row.size, &row.confidence];
    let cells = cells.into_iter().zip(*columns).enumerate();
    for (place, (words, [left, right])) in cells.filter(|(_, (_, [left, right]))| left < right) {
        let left = if place == 0 { left + 20.0 } else { left };
        if place == 1 {
            let bounds = Rect::from_x_y_ranges(left..=right.max(left + 8.0), bounds.y_range());
            name_ui(painter, bounds, words, shared, &FontId::proportional(13.0), ink);
        } else {
            cell_ui(painter, words, [left, right], y, ink, place >= 2);
        }
    }
    let [left, right] = columns[5];
    let dot = pos2(left + 4.0, y);
    // Without this column the letter's plate tells it.
    let has_state = left < right;
    match row.state {
        SnagState::Open if has_state => {
            painter.circle_stroke(dot, 3.2, (1.4, look.snag));
        }
        SnagState::Mended if has_state => {
            painter.circle_filled(dot, 3.6, look.after);
        }
        SnagState::Left if has_state => {
            painter.hline(dot.x - 3.5..=dot.x + 3.5, y, (1.6, look.faint));
        }
        _ => {}
    }
    if has_state {
        cell_ui(painter, row.state.word(), [left + 13.0, right], y, ink, false);
    }
    if let Some(words) = edges.words {
        cell_ui(painter, &row.text, words, y, look.faint, false);
    }
    focus_ring(ui, &response);
    if response.clicked() {
        out.push(Command::ChooseSnag(row.index));
    }
    // Whole where the columns cut it.
    let whole = format!("{} of {}\n{}\n{}", row.kind, row.joint, row.text, row.kind.mend_explanation());
    response.on_hover_text_at_pointer(whole);
}

fn cell_ui(painter: &Painter, words: &str, [left, right]: [f32; 2], y: f32, ink: Color32, is_number: bool) {
    let font = if is_number { FontId::monospace(12.0) } else { FontId::proportional(13.0) };
    let mut job = egui::text::LayoutJob::simple_singleline(words.to_owned(), font, ink);
    job.wrap = egui::text::TextWrapping::truncate_at_width((right - left).max(8.0));
    let galley = painter.layout_job(job);
    painter.galley(pos2(left, y - galley.size().y / 2.0), galley, ink);
}

fn footer_height(ui: &Ui) -> f32 {
    if ui.available_height() < 150.0 { 34.0 } else { 70.0 }
}

/// The chosen snag in words, and what can be done about it.
fn details_ui(ui: &mut Ui, footer: Rect, scope: &mut Scope<'_>) {
    let look = scope.look;
    ui.painter().hline(footer.x_range(), footer.top(), (1.0, look.line));
    if footer.height() > 40.0 {
        let words = scope.bench.chosen_snag().map_or_else(
            || "Choose a snag to see what is wrong and what its mend would do".to_owned(),
            |snag| {
                let looked = if scope.bench.looks_at_mend() {
                    "Shown mended, not accepted yet: grey is before. "
                } else {
                    ""
                };
                // What is wrong in the numbers alone is seen in no other view.
                let shown =
                    if snag.kind.keeps_pose() && scope.bench.session.curve_view == CurveView::FileNumbers {
                        " The curves show the file's own numbers, for only there it is seen."
                    } else {
                        ""
                    };
                format!("{looked}{}{shown} {}", sentence(&snag.text), snag.kind.mend_explanation())
            },
        );
        let mut job = egui::text::LayoutJob::simple(
            words.clone(),
            FontId::proportional(12.5),
            look.faint,
            footer.width() - 2.0 * INSET,
        );
        job.wrap.max_rows = 2;
        let galley = ui.painter().layout_job(job);
        let (place, response) =
            ui.allocate_exact_size(vec2(footer.width() - 2.0 * INSET, 36.0), Sense::hover());
        response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &words));
        ui.painter().galley(place.min + vec2(0.0, 4.0), galley, look.faint);
        response.on_hover_text(words);
    } else {
        ui.add_space(4.0);
    }
    let room = ui.available_width();
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 5.0;
        let first = if scope.now.snag_is_mended { Action::TakeBack } else { Action::Mend };
        action_button(ui, first, scope.now, scope.out);
        action_button(ui, Action::Leave, scope.now, scope.out);
        let (has_switch, has_kind, has_all) = (room > 370.0, room > 500.0, room > 290.0);
        if has_switch {
            look_switch(ui, scope);
            ui.separator();
        }
        if has_kind {
            action_button(ui, Action::MendKind, scope.now, scope.out);
        }
        if has_all {
            action_button(ui, Action::MendSafe, scope.now, scope.out);
        }
        if has_switch {
            return;
        }
        // What finds no room beside these is behind one button.
        let menu = ui.menu_button("More", |ui| {
            for action in [Action::LookAtMend, Action::MendKind, Action::MendSafe] {
                entry_ui(ui, action.entry(), scope.now, &scope.look, scope.out);
            }
        });
        menu.response.on_hover_text("What else can be done about snags");
    });
}

/// Shows the mend of the chosen snag before it is accepted.
fn look_switch(ui: &mut Ui, scope: &mut Scope<'_>) {
    let mut looks = scope.now.looks;
    let response = ui.checkbox(&mut looks, "Look at mend");
    let tooltip = tooltip_text(ui, Action::LookAtMend);
    if response.on_hover_text(tooltip).changed() {
        scope.out.push(Command::Do(Action::LookAtMend));
    }
}

/// With one full stop at its end.
fn sentence(words: &str) -> String {
    format!("{}.", words.trim_end_matches('.'))
}

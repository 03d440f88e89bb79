//! The snags on the map: letters on their rows, strokes where a row has too many.

use egui::{Rangef, Rect, Ui, pos2, vec2};

use super::super::super::view_models::SnagState;
use super::super::super::widgets::{TimeAxis, letter_plate};
use super::super::Scope;
use super::Rows;
use crate::snag::Snag;

const MARK: f32 = 13.0;

/// The snags of the visible rows, those that would lie on each other as one.
struct Mark {
    index: usize,
    place: usize,
    x: f32,
    letter: char,
    state: SnagState,
    span: Rangef,
    /// Its row has too many for letters: it is a stroke.
    is_stroke: bool,
}

/// Strokes of a crowded row that would lie nearer to each other than this are one.
const STROKE_APART: f32 = 5.0;

fn marks(axis: &TimeAxis, rows: &Rows<'_>, scope: &Scope<'_>) -> Vec<Mark> {
    let mut place_of = vec![None; rows.heat.joints.iter().max().map_or(0, |last| last + 1)];
    for (place, row) in rows.visible.iter().enumerate() {
        for &member in &row.members {
            place_of[rows.heat.joints[member]] = Some(place);
        }
    }
    // The row of each joint of the source.
    let row_of: Vec<Option<usize>> = scope
        .bench
        .shown_joints()
        .iter()
        .map(|shown| shown.and_then(|joint| place_of.get(joint).copied().flatten()))
        .collect();
    let snags = scope.bench.snags();
    let chosen =
        scope.bench.chosen_snag().and_then(|own| snags.iter().position(|snag| std::ptr::eq(snag, own)));
    let is_chosen = |mark: &Mark| Some(mark.index) == chosen;
    // Plates shoulder to shoulder tell nothing, and an hour of them would take as long to draw as all the rest.
    let mut counts = vec![0_usize; rows.visible.len()];
    let seen = [-MARK, MARK].map(|by| axis.time(if by < 0.0 { axis.span.min } else { axis.span.max } + by));
    let row_in_sight = |snag: &Snag| {
        let place = row_of.get(snag.joint).copied().flatten()?;
        (snag.last_secs >= seen[0] && snag.first_secs <= seen[1]).then_some(place)
    };
    for place in snags.iter().filter_map(row_in_sight) {
        counts[place] += 1;
    }
    let most = (axis.span.span() / (3.0 * MARK)) as usize;
    let mut of_row: Vec<Vec<Mark>> = rows.visible.iter().map(|_| Vec::new()).collect();
    let mut found: Vec<Mark> = Vec::new();
    // Strokes of a crowded row: one in each cell, so that an hour of them takes the time of a minute.
    let cells = (axis.span.span() / STROKE_APART) as usize + 1;
    let mut strokes: Vec<Vec<Option<usize>>> =
        counts.iter().map(|&count| if count > most { vec![None; cells] } else { Vec::new() }).collect();
    for (index, (snag, &state)) in snags.iter().zip(scope.states.iter()).enumerate() {
        let Some(place) = row_in_sight(snag) else { continue };
        let span = Rangef::new(axis.x(snag.first_secs), axis.x(snag.last_secs));
        let is_stroke = counts[place] > most;
        let visible = Rangef::new(span.min.max(axis.span.min), span.max.min(axis.span.max));
        let mark =
            Mark { index, place, x: visible.center(), letter: snag.kind.letter(), state, span, is_stroke };
        if !is_stroke {
            of_row[place].push(mark);
            continue;
        }
        let cell = ((mark.x - axis.span.min) / STROKE_APART).max(0.0) as usize;
        let Some(cell) = strokes[place].get_mut(cell) else { continue };
        // Open ones go before mended ones, and the chosen one before all.
        match cell.map(|before| &mut found[before]) {
            Some(before) if is_chosen(&mark) || (mark.state < before.state && !is_chosen(before)) => {
                *before = mark;
            }
            Some(_) => {}
            None => {
                *cell = Some(found.len());
                found.push(mark);
            }
        }
    }
    for mut marks in of_row {
        // Snags come by their starts: the middle of a long one may lie behind many that start later.
        marks.sort_by(|a, b| a.x.total_cmp(&b.x));
        let first = found.len();
        for mark in marks {
            match found[first..].last_mut().filter(|before| before.x > mark.x - (MARK + 1.0)) {
                Some(before) if is_chosen(&mark) => *before = mark,
                Some(before) if mark.state < before.state && !is_chosen(before) => {
                    *before = Mark { x: before.x, ..mark };
                }
                Some(_) => {}
                None => found.push(mark),
            }
        }
    }
    found
}

pub(super) fn marks_ui(ui: &Ui, axis: &TimeAxis, rows: &Rows<'_>, scope: &Scope<'_>) {
    let look = &scope.look;
    let painter = ui.painter_at(
        ui.clip_rect().intersect(Rect::from_x_y_ranges(axis.span.expand(8.0), Rangef::EVERYTHING)),
    );
    let chosen = scope.bench.chosen_snag().map(std::ptr::from_ref);
    let (mut strokes, mut plates) = (egui::Mesh::default(), Vec::new());
    for mark in marks(axis, rows, scope) {
        let is_chosen = chosen == Some(std::ptr::from_ref(&scope.bench.snags()[mark.index]));
        if !mark.is_stroke || is_chosen {
            plates.push((mark, is_chosen));
            continue;
        }
        // What is dealt with is told by its height, not by colour alone.
        let row = rows.bounds(mark.place, axis.span);
        let (height, color) =
            if mark.state == SnagState::Open { (row.height() - 4.0, look.snag) } else { (5.0, look.faint) };
        let stroke = Rect::from_center_size(pos2(mark.x, row.center().y), vec2(2.0, height));
        strokes.add_colored_rect(stroke, color);
    }
    painter.add(egui::Shape::mesh(strokes));
    for (mark, is_chosen) in plates {
        let row = rows.bounds(mark.place, axis.span);
        let middle = pos2(mark.x, row.center().y);
        if mark.span.span() > MARK {
            let color = if mark.state == SnagState::Open { look.snag } else { look.faint };
            let left = mark.span.min.max(axis.span.min);
            painter.hline(left..=mark.span.max.min(axis.span.max), row.bottom() - 2.5, (2.0, color));
        }
        let size = MARK.min(rows.height - 2.0);
        letter_plate(&painter, look, middle, size, mark.letter, mark.state);
        if is_chosen {
            let ring = Rect::from_center_size(middle, vec2(size + 4.0, size + 4.0));
            painter.rect_stroke(ring, 3.5, (2.0, look.selection), egui::StrokeKind::Middle);
        }
    }
}

pub(super) fn mark_at(
    pointer: egui::Pos2,
    axis: &TimeAxis,
    rows: &Rows<'_>,
    scope: &Scope<'_>,
) -> Option<usize> {
    let place = rows.at(pointer.y)?;
    let hit = |mark: &&Mark| mark.place == place && (mark.x - pointer.x).abs() <= MARK / 2.0 + 1.0;
    marks(axis, rows, scope).iter().find(hit).map(|mark| mark.index)
}

//! Words on small plates: the read-out under the pointer, and the letter of a snag.

use egui::{Align2, Color32, FontId, Painter, Pos2, Rect, Stroke, StrokeKind, vec2};

use super::super::theme::Look;
use super::super::view_models::SnagState;

/// The words of a read-out in one line, as the value of what the pointer is over.
pub(crate) fn spoken(lines: &[(String, Color32)]) -> String {
    lines.iter().map(|(words, _)| words.as_str()).collect::<Vec<_>>().join(", ")
}

/// Lines of words on a plate beside a point, kept inside `bounds`.
pub(crate) fn read_out(
    painter: &Painter,
    look: &Look,
    beside: Pos2,
    bounds: Rect,
    lines: &[(String, Color32)],
) {
    let font = FontId::monospace(12.0);
    let galleys: Vec<_> = lines
        .iter()
        .map(|(words, color)| painter.layout_no_wrap(words.clone(), font.clone(), *color))
        .collect();
    let width = galleys.iter().map(|galley| galley.size().x).fold(0.0, f32::max);
    let height: f32 = galleys.iter().map(|galley| galley.size().y).sum();
    let size = vec2(width + 14.0, height + 8.0);
    let mut min = beside + vec2(14.0, 10.0);
    if min.x + size.x > bounds.right() {
        min.x = beside.x - 14.0 - size.x;
    }
    min.y = min.y.min(bounds.bottom() - size.y).max(bounds.top());
    min.x = min.x.max(bounds.left());
    let plate = Rect::from_min_size(min, size);
    painter.rect(plate, 4.0, look.panel, Stroke::new(1.0, look.line), StrokeKind::Inside);
    let mut at = plate.min + vec2(7.0, 4.0);
    for galley in galleys {
        let step = galley.size().y;
        painter.galley(at, galley, look.text);
        at.y += step;
    }
}

/// The letter of a snag's kind: on a full plate while it is open, on an outline once it is mended, bare when it is left.
pub(crate) fn letter_plate(
    painter: &Painter,
    look: &Look,
    middle: Pos2,
    size: f32,
    letter: char,
    state: SnagState,
) {
    let plate = Rect::from_center_size(middle, vec2(size, size));
    let ink = match state {
        SnagState::Open => {
            painter.rect_filled(plate, 2.5, look.snag);
            look.snag_ink
        }
        SnagState::Mended => {
            painter.rect(plate, 2.5, look.background, Stroke::new(1.0, look.faint), StrokeKind::Inside);
            look.text
        }
        SnagState::Left => {
            painter.rect_filled(plate, 2.5, look.background.gamma_multiply(0.7));
            look.faint
        }
    };
    painter.text(middle, Align2::CENTER_CENTER, letter, FontId::proportional(size * 0.82), ink);
}

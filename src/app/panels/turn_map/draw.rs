//! What is painted on the rows: their heat, and the choice.

use std::sync::Arc;

use egui::{Color32, ColorImage, Painter, Rangef, Rect, Ui, pos2};

use super::super::super::pictures::{MapKey, on_pixels};
use super::super::super::theme::{Look, color32};
use super::super::super::widgets::TimeAxis;
use super::super::Scope;
use super::Rows;
use crate::clip::Clip;
use crate::raster::cividis;

/// How much each joint turns, as a picture of the visible rows.
pub(super) fn heat_ui(ui: &Ui, axis: &TimeAxis, clip: &Clip, rows: &Rows<'_>, scope: &mut Scope<'_>) {
    let look = scope.look;
    let n_rows = rows.visible.len();
    let wanted =
        Rect::from_x_y_ranges(axis.span, Rangef::new(rows.top, rows.top + rows.height * n_rows as f32));
    let (bounds, [width, height]) = on_pixels(wanted, ui.pixels_per_point());
    let key = MapKey {
        map: Arc::clone(rows.heat),
        rows: rows.visible.to_vec(),
        window: axis.window,
        size_px: [width, height / n_rows.max(1)],
        is_dark: ui.visuals().dark_mode,
    };
    let texture = scope
        .pictures
        .map
        .show(ui.ctx(), "turn map", key, |key| heat_image(key, clip, &look, [width, height]));
    ui.painter().image(texture, bounds, Rect::from_min_max(pos2(0.0, 0.0), pos2(1.0, 1.0)), Color32::WHITE);
}

/// What is not chosen is dimmed; the ends of the stretch are lines with hooks inward.
pub(super) fn choice_ui(painter: &Painter, body: Rect, axis: &TimeAxis, rows: &Rows<'_>, scope: &Scope<'_>) {
    let (look, choice) = (&scope.look, &scope.bench.session.choice);
    if choice.is_everything() {
        return;
    }
    let veil = look.background.gamma_multiply(0.62);
    let [from, to] = choice.span_secs.map_or([axis.span.min, axis.span.max], |[from, to]| {
        [from, to].map(|secs| axis.x(secs).clamp(axis.span.min, axis.span.max))
    });
    for (place, row) in rows.visible.iter().enumerate() {
        let is_in = row.members.iter().any(|&own| choice.has_joint(rows.heat.joints[own]));
        let spans: &[Rangef] = if is_in {
            &[Rangef::new(axis.span.min, from), Rangef::new(to, axis.span.max)]
        } else {
            &[axis.span]
        };
        for span in spans.iter().filter(|span| span.span() > 0.0) {
            painter.rect_filled(rows.bounds(place, *span), 0.0, veil);
        }
    }
    let Some(span) = choice.span_secs else { return };
    for (secs, inward) in span.into_iter().zip([1.0_f32, -1.0]) {
        if !axis.window.contains(secs) {
            continue;
        }
        let x = axis.x(secs);
        painter.vline(x, body.y_range(), (1.5, look.selection));
        for y in [body.top() + 1.0, body.bottom() - 1.0] {
            painter.hline(x.min(x + 5.0 * inward)..=x.max(x + 5.0 * inward), y, (2.0, look.selection));
        }
    }
}

/// The picture of the visible rows, at the size of the screen.
fn heat_image(key: &MapKey, clip: &Clip, look: &Look, [width, height]: [usize; 2]) -> ColorImage {
    let colors = key.map.shares().map(|share| color32(cividis(share)));
    // On a light ground bright lines between dark rows would shout.
    let parting = color32(look.palette.background.mix(cividis(0.0), if key.is_dark { 0.0 } else { 0.72 }));
    let mut image = ColorImage::filled([width, height], parting);
    let frames: Vec<usize> =
        (0..=width).map(|column| clip.grid.frame(key.window.time(column as f64 / width as f64))).collect();
    let n_rows = key.rows.len().max(1);
    for (place, row) in key.rows.iter().enumerate() {
        let (top, bottom) = (place * height / n_rows, (place + 1) * height / n_rows);
        let line: Vec<Color32> = (0..width)
            .map(|column| {
                let range = frames[column]..frames[column + 1].max(frames[column] + 1);
                colors[usize::from(row.code(&key.map, &range))]
            })
            .collect();
        // The last line stays background: it parts the rows.
        for y in top..bottom.saturating_sub(1) {
            image.pixels[y * width..(y + 1) * width].copy_from_slice(&line);
        }
    }
    image
}

//! What is painted on the rows: their heat, and the choice.

use std::ops::Range;
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
        size_px: [width, height],
        is_dark: ui.visuals().dark_mode,
    };
    let texture = scope.pictures.map.show_pieces(
        ui.ctx(),
        "turn map",
        key,
        |old, key| {
            let changed = key.changed_since(old)?;
            let inks = Inks::new(key, clip, &look);
            // Of more rows than lines some have none.
            let shown = changed.into_iter().filter(|&place| !inks.lines(place).is_empty());
            Some(shown.map(|place| ([0, inks.lines(place).start], inks.row(place))).collect())
        },
        |key| heat_image(key, clip, &look),
    );
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
fn heat_image(key: &MapKey, clip: &Clip, look: &Look) -> ColorImage {
    let inks = Inks::new(key, clip, look);
    let mut image = ColorImage::filled(key.size_px, inks.parting);
    let width = key.size_px[0];
    for place in 0..key.rows.len() {
        let lines = inks.lines(place);
        image.pixels[lines.start * width..lines.end * width].copy_from_slice(&inks.row(place).pixels);
    }
    image
}

/// What the rows of the turn map are drawn with.
struct Inks<'k> {
    key: &'k MapKey,
    /// For each code.
    colors: [Color32; 256],
    /// Between the rows.
    parting: Color32,
    /// The frame where each column begins, and where the last one ends.
    frames: Vec<usize>,
}

impl<'k> Inks<'k> {
    fn new(key: &'k MapKey, clip: &Clip, look: &Look) -> Self {
        let width = key.size_px[0];
        let time = |column: usize| key.window.time(column as f64 / width as f64);
        Self {
            key,
            colors: key.map.shares().map(|share| color32(cividis(share))),
            // On a light ground bright lines between dark rows would shout.
            parting: color32(look.palette.background.mix(cividis(0.0), if key.is_dark { 0.0 } else { 0.72 })),
            frames: (0..=width).map(|column| clip.grid.frame(time(column))).collect(),
        }
    }

    /// The lines of the picture that a row takes.
    fn lines(&self, place: usize) -> Range<usize> {
        let (height, n_rows) = (self.key.size_px[1], self.key.rows.len().max(1));
        place * height / n_rows..(place + 1) * height / n_rows
    }

    /// A row's piece of the picture.
    fn row(&self, place: usize) -> ColorImage {
        let (width, height) = (self.key.size_px[0], self.lines(place).len());
        let row = &self.key.rows[place];
        let line: Vec<Color32> = self
            .frames
            .windows(2)
            .map(|ends| {
                let range = ends[0]..ends[1].max(ends[0] + 1);
                self.colors[usize::from(row.code(&self.key.map, &range))]
            })
            .collect();
        let mut piece = ColorImage::filled([width, height], self.parting);
        // The last line stays as it is: it parts the rows.
        for pixels in piece.pixels.chunks_exact_mut(width).take(height.saturating_sub(1)) {
            pixels.copy_from_slice(&line);
        }
        piece
    }
}

#[cfg(test)]
mod tests {
    use super::super::super::super::view_models::{
        HeatKind, HeatMap, HeatWish, MapRow, TimeWindow, heat_map, map_rows,
    };
    use super::*;
    use crate::clip::{KeyChange, KeyEdit, with_key_edits};
    use crate::exchange::bvh;
    use crate::rotor::{Bivector, Rotor};
    use crate::snag::Unwatched;

    fn key(map: &Arc<HeatMap>, rows: &[MapRow], height: usize) -> MapKey {
        MapKey {
            map: Arc::clone(map),
            rows: rows.to_vec(),
            window: TimeWindow { start_secs: 0.5, end_secs: 5.0 },
            size_px: [333, height],
            is_dark: true,
        }
    }

    #[test]
    fn only_the_rows_of_a_changed_joint_are_drawn_anew_and_give_the_whole_picture() {
        let bytes: &[u8] = include_bytes!("../../../../demo-scenes/deckhand.bvh");
        let (_, clip, _) = bvh::read(bytes, "deckhand").unwrap();
        let joint = clip.skeleton.listed().nth(7).unwrap();
        let turn = Rotor::from_plane_angles(Bivector::new(1.0, 0.4, -0.3));
        let edit = KeyEdit { joint, change: KeyChange::Set(vec![(2.0, turn)]) };
        let (edited, lost) = with_key_edits(&clip, &[edit]);
        assert_eq!(lost, 0);
        let wish = HeatWish { kind: HeatKind::TurnRate, limits: None };
        let before = Arc::new(heat_map(&clip, &clip, &wish, None, &Unwatched).unwrap());
        let known = Some((&clip, &clip, &*before));
        let after = Arc::new(heat_map(&clip, &edited, &wish, known, &Unwatched).unwrap());
        let rows = map_rows(&clip.skeleton, &before, &std::collections::BTreeSet::new(), false);
        let look = Look::new(true);

        // Rows of several lines, and more rows than lines.
        for height in [401, rows.len() / 2] {
            let (old, new) = (key(&before, &rows, height), key(&after, &rows, height));
            let mut image = heat_image(&old, &clip, &look);
            let changed = new.changed_since(&old).unwrap();
            assert_eq!(changed, [7]);
            let inks = Inks::new(&new, &edited, &look);
            let first = inks.lines(changed[0]).start * 333;
            let piece = inks.row(changed[0]).pixels;
            image.pixels[first..first + piece.len()].copy_from_slice(&piece);
            assert_eq!(image, heat_image(&new, &edited, &look), "{height} lines");
            if height > rows.len() {
                assert_ne!(image, heat_image(&old, &clip, &look), "the change shows");
            }
            assert_eq!(key(&after, &rows, height + 1).changed_since(&old), None, "another size");
        }
    }
}

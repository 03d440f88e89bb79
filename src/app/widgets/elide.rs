//! Names that are too long for their place.

use std::sync::Arc;

use egui::{Color32, FontId, Galley, Painter, Rect, pos2};

use super::super::view_models::{Shared, shortened};

/// A name in one line of so many points, and whether it had to be cut: then the whole name belongs under the pointer. A name that is too
/// long gives up first what it shares with the others (`Shared::of` all of them; `Shared::default()` where it stands for itself), then its middle.
pub(crate) fn name_galley(
    painter: &Painter,
    width: f32,
    name: &str,
    shared: Shared<'_>,
    font: &FontId,
    ink: Color32,
) -> (Arc<Galley>, bool) {
    let layout = |words: String| painter.layout_no_wrap(words, font.clone(), ink);
    let fits = |galley: &Arc<Galley>| galley.size().x <= width;
    let mut galley = layout(name.to_owned());
    let is_cut = !fits(&galley);
    if is_cut {
        let (own, left_away) = shared.own_part(name);
        let mark = |is_left_away: bool| if is_left_away { "…" } else { "" };
        if left_away != [false; 2] {
            galley = layout(format!("{}{own}{}", mark(left_away[0]), mark(left_away[1])));
        }
        let mut kept = (own.chars().count() as f32 * width / galley.size().x).floor() as usize;
        // Letters differ in width: a few rounds bring what was estimated within its place.
        while !fits(&galley) && kept > 0 {
            kept -= 1;
            galley = layout(shortened(own, kept));
        }
    }
    (galley, is_cut)
}

/// Draws a [`name_galley`] from the left of `bounds`, at half its height, and gives whether the name had to be cut.
pub(crate) fn name_ui(
    painter: &Painter,
    bounds: Rect,
    name: &str,
    shared: Shared<'_>,
    font: &FontId,
    ink: Color32,
) -> bool {
    let (galley, is_cut) = name_galley(painter, bounds.width(), name, shared, font, ink);
    painter.galley(pos2(bounds.left(), bounds.center().y - galley.size().y / 2.0), galley, ink);
    is_cut
}

#[cfg(test)]
mod tests {
    use egui::epaint::Shape;
    use egui::vec2;

    use super::*;

    /// What is written of a name in so many points, and how wide it is.
    fn written(name: &str, shared: Shared<'_>, width: f32) -> (String, f32, bool) {
        let ctx = egui::Context::default();
        let mut is_cut = false;
        let mut output = ctx.run_ui(egui::RawInput::default(), |ui| {
            let bounds = Rect::from_min_size(pos2(0.0, 0.0), vec2(width, 20.0));
            is_cut = name_ui(
                ui.painter(),
                bounds,
                name,
                shared,
                &FontId::proportional(13.0),
                Color32::PLACEHOLDER,
            );
        });
        // Nothing is painted, so nobody takes the letters.
        output.textures_delta.clear();
        let text = |shape: &Shape| match shape {
            Shape::Text(text) => Some((text.galley.text().to_owned(), text.galley.size().x)),
            _ => None,
        };
        let (words, own_width) =
            output.shapes.iter().find_map(|clipped| text(&clipped.shape)).expect("it is written");
        (words, own_width, is_cut)
    }

    #[test]
    fn what_tells_names_apart_is_written_in_a_narrow_column() {
        let names =
            ["Figure_01:LeftFoot", "Figure_01:RightFoot", "Figure_01:LeftToeBase", "Figure_01:RightToeBase"];
        let shared = Shared { start: "Figure_01:", end: "" };
        let (whole, _, is_cut) = written(names[0], shared, 300.0);
        assert_eq!((whole.as_str(), is_cut), (names[0], false), "what fits is whole");
        let wide: Vec<String> = names.iter().map(|name| written(name, shared, 100.0).0).collect();
        assert_eq!(wide, ["…LeftFoot", "…RightFoot", "…LeftToeBase", "…RightToeBase"]);
        for width in [20.0, 48.0, 60.0, 100.0] {
            for name in names {
                let (words, own_width, is_cut) = written(name, shared, width);
                assert!(is_cut && own_width <= width, "{words} takes {own_width} of {width}");
            }
        }
        let narrow: std::collections::BTreeSet<String> =
            names.iter().map(|name| written(name, shared, 60.0).0).collect();
        assert_eq!(narrow.len(), 4, "{narrow:?}");
    }
}

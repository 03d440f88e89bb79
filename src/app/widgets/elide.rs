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
            if own.chars().count() < FEWEST {
                let at = if left_away[0] { shared.start.len() } else { 0 };
                galley = widened(layout, galley, [&name[..at], own, mark(left_away[1])], width);
            }
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

/// A number or a side alone says little: an own part of fewer letters gets as many as there is room for of what stands before it.
const FEWEST: usize = 6;

/// The own part of a name with as much of what stands before it as fits, and what stands for the rest behind it; `galley` where there is no
/// room for more.
fn widened(
    layout: impl Fn(String) -> Arc<Galley>,
    galley: Arc<Galley>,
    [before, own, behind]: [&str; 3],
    width: f32,
) -> Arc<Galley> {
    if galley.size().x > width {
        return galley;
    }
    let before: Vec<char> = before.chars().collect();
    // As many as are surely too many, then fewer until they fit: letters differ in width.
    let narrowest = 2.5_f32;
    let mut taken = before.len().min((width / narrowest) as usize);
    while taken > 0 {
        let mark = if taken < before.len() { "…" } else { "" };
        let words: String = before[before.len() - taken..].iter().collect();
        let wider = layout(format!("{mark}{words}{own}{behind}"));
        if wider.size().x <= width {
            return wider;
        }
        let share = (width / wider.size().x).min(0.999);
        taken = (taken as f32 * share).floor() as usize;
    }
    galley
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
    fn a_number_alone_gets_what_there_is_room_for_of_the_words_before_it() {
        let shared = Shared { start: "hand_helper_control_bone_number_", end: "" };
        let name = "hand_helper_control_bone_number_3";
        for width in [60.0, 100.0, 150.0, 190.0] {
            let (words, own_width, is_cut) = written(name, shared, width);
            assert!(is_cut && words.starts_with('…') && words.ends_with("mber_3"), "{words}");
            assert!(own_width <= width && own_width > width - 12.0, "{words} takes {own_width} of {width}");
        }
        assert_eq!(written(name, shared, 20.0).0, "…3", "no room for more");
        // The same number may stand in what is shared.
        let shared = Shared { start: "Row3_bone_number_", end: "_jnt" };
        let (words, ..) = written("Row3_bone_number_3_jnt", shared, 100.0);
        assert!(words.starts_with('…') && words.ends_with("_number_3…"), "{words}");
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

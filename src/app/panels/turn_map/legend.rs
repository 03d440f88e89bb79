//! The colours of the map: from cold to hot, with numbers, and which limits they stand for.

use egui::{Align2, FontId, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use super::super::super::theme::Look;
use super::super::super::view_models::{HeatKind, HeatMap, counted};

/// From cold to hot, with numbers at both ends and in the middle.
pub(super) fn legend(ui: &mut Ui, look: &Look, heat: &HeatMap) {
    let font = FontId::proportional(11.5);
    let unit = heat.kind.unit();
    let stands_in = heat.limits.as_ref().is_some_and(|(_, is_preset)| *is_preset);
    if heat.trouble.is_some() || stands_in {
        let words = if stands_in { "adult preset, none set" } else { "no limits to show" };
        let label = egui::Label::new(egui::RichText::new(words).size(11.5).color(look.faint)).truncate();
        ui.add(label).on_hover_text(limits_words(heat));
        ui.add_space(6.0);
        if !stands_in {
            return;
        }
    }
    let value = |share: f32| {
        let value = heat.scale.value(share);
        if value < 10.0 { format!("{}", (value * 10.0).round() / 10.0) } else { format!("{value:.0}") }
    };
    let words = ["0".to_owned(), value(0.5), format!("{}{unit}", value(1.0))];
    let widths = words
        .each_ref()
        .map(|words| ui.painter().layout_no_wrap(words.clone(), font.clone(), look.faint).size().x);
    let half = 30.0;
    let (bounds, response) =
        ui.allocate_exact_size(vec2(widths.iter().sum::<f32>() + 2.0 * half + 16.0, 18.0), Sense::hover());
    let said = format!("Colours from 0 over {} to {}", words[1], words[2]);
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &said));
    let painter = ui.painter();
    let mut at = bounds.left();
    let steps = 9;
    for (place, words) in words.iter().enumerate() {
        let middle = pos2(at, bounds.center().y);
        painter.text(middle, Align2::LEFT_CENTER, words, font.clone(), look.faint);
        at += widths[place] + 4.0;
        if place == 2 {
            break;
        }
        for step in 0..steps {
            let share = 0.5 * (place as f32 + (step as f32 + 0.5) / steps as f32);
            let width = half / steps as f32;
            let left = at + step as f32 * width;
            let cell = Rect::from_min_size(pos2(left, bounds.center().y - 4.0), vec2(width + 0.5, 8.0));
            painter.rect_filled(cell, 0.0, Look::heat(share));
        }
        at += half + 4.0;
    }
    response.on_hover_text(match heat.kind {
        HeatKind::TurnRate => {
            "Colour = how fast the joint turns. The scale is a square root, so slow motion shows".to_owned()
        }
        HeatKind::Change => {
            "Colour = the turn between source and result. The scale is a square root".to_owned()
        }
        HeatKind::LimitUse => format!(
            "Colour = how much of its limit the joint uses; 100 % is at the limit. {}",
            limits_words(heat)
        ),
    });
}

/// Which limits the colours stand for.
fn limits_words(heat: &HeatMap) -> String {
    match (&heat.limits, &heat.trouble) {
        (Some((limits, is_preset)), _) => {
            let count = counted(limits.joints.len(), "joint");
            let title = if limits.title.is_empty() { "no title" } else { &limits.title };
            if *is_preset {
                format!("No limits are set for this clip: the preset {title} is shown ({count})")
            } else {
                format!("Limits: {title} ({count})")
            }
        }
        (None, Some(trouble)) => trouble.clone(),
        (None, None) => String::new(),
    }
}

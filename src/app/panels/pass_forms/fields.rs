//! The fields that forms are made of: each says whether its value moves, and whether it has come to rest.

use std::ops::RangeInclusive;

use egui::{DragValue, Response, Role, Ui, WidgetInfo};

/// What a form was given.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(crate) struct Touch {
    /// A value is on its way.
    pub has_moved: bool,
    /// A value has come to rest: one step of the history.
    pub is_settled: bool,
}

impl Touch {
    /// Both.
    pub(crate) fn and(self, other: Self) -> Self {
        Self { has_moved: self.has_moved || other.has_moved, is_settled: self.is_settled || other.is_settled }
    }

    /// Of something that is clicked: it rests at once.
    pub(super) fn click(is_changed: bool) -> Self {
        Self { has_moved: false, is_settled: is_changed }
    }

    /// Of a number that is dragged or typed.
    fn of(response: &Response) -> Self {
        let is_settled = response.drag_stopped() || (response.changed() && !response.dragged());
        Self { has_moved: response.changed() && !is_settled, is_settled }
    }
}

/// How a number is shown.
pub(super) struct Number {
    /// Words before it; also its name for screen readers.
    pub label: &'static str,
    /// Written behind it.
    pub unit: &'static str,
    /// What it may be.
    pub range: RangeInclusive<f64>,
    /// Digits behind the point.
    pub decimals: usize,
    /// How much a point of dragging changes.
    pub speed: f64,
    /// What it means.
    pub tooltip: &'static str,
}

/// A number to drag or to type.
pub(super) fn number(ui: &mut Ui, value: &mut f64, how: &Number) -> Touch {
    ui.horizontal(|ui| {
        label(ui, how.label);
        let drag = DragValue::new(value)
            .range(how.range.clone())
            .speed(how.speed)
            .fixed_decimals(how.decimals)
            .suffix(how.unit)
            .update_while_editing(false);
        let response = ui.add(drag);
        let shown = *value;
        response.widget_info(|| WidgetInfo::slider(true, shown, how.label));
        let touch = Touch::of(&response);
        response.on_hover_text(format!("{}. Drag, or click and type", how.tooltip));
        touch
    })
    .inner
}

/// A number that may also be none.
pub(super) fn optional(ui: &mut Ui, value: &mut Option<f64>, usual: f64, how: &Number) -> Touch {
    ui.horizontal(|ui| {
        let mut is_on = value.is_some();
        let response = ui.checkbox(&mut is_on, how.label).on_hover_text(how.tooltip);
        let mut touch = Touch::click(response.changed());
        if response.changed() {
            *value = is_on.then_some(usual);
        }
        if let Some(own) = value {
            let drag = DragValue::new(own)
                .range(how.range.clone())
                .speed(how.speed)
                .fixed_decimals(how.decimals)
                .suffix(how.unit)
                .update_while_editing(false);
            let response = ui.add(drag);
            let (shown, words) = (*own, format!("{}, size", how.label));
            response.widget_info(|| WidgetInfo::slider(true, shown, &words));
            touch = touch.and(Touch::of(&response));
        }
        touch
    })
    .inner
}

/// One of a few words.
pub(super) fn choice<T: PartialEq + Copy>(
    ui: &mut Ui,
    words: &'static str,
    value: &mut T,
    all: &[(T, &'static str, &'static str)],
) -> Touch {
    ui.horizontal_wrapped(|ui| {
        label(ui, words);
        let mut touch = Touch::default();
        for (own, name, tooltip) in all {
            let response = ui.selectable_label(*value == *own, *name).on_hover_text(*tooltip);
            let is_on = *value == *own;
            response.widget_info(|| {
                WidgetInfo::selected(Role::RadioButton, true, is_on, format!("{words}: {name}"))
            });
            if response.clicked() && *value != *own {
                *value = *own;
                touch = Touch::click(true);
            }
        }
        touch
    })
    .inner
}

/// Words before a field, for eyes alone: the field bears them as its own name.
fn label(ui: &mut Ui, words: &str) {
    let (bounds, _) = ui.allocate_exact_size(egui::vec2(62.0, 18.0), egui::Sense::hover());
    let ink = ui.visuals().text_color();
    ui.painter().text(
        bounds.left_center(),
        egui::Align2::LEFT_CENTER,
        words,
        egui::FontId::proportional(12.5),
        ink,
    );
}

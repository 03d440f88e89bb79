//! The parameter of resampling.

use egui::{Role, Ui, WidgetInfo};

use super::super::Scope;
use super::fields::{Number, Touch, number};
use crate::scene::ResamplePass;

const USUAL: [f64; 7] = [24.0, 25.0, 30.0, 48.0, 50.0, 60.0, 120.0];

pub(super) fn resample_form(ui: &mut Ui, pass: &mut ResamplePass, _scope: &mut Scope<'_>) -> Touch {
    let rate = Number {
        label: "Rate",
        unit: " fps",
        range: 1.0..=1000.0,
        decimals: 3,
        speed: 0.1,
        tooltip: "Frames a second",
    };
    let mut touch = number(ui, &mut pass.rate, &rate);
    ui.horizontal_wrapped(|ui| {
        ui.spacing_mut().item_spacing.x = 2.0;
        for usual in USUAL {
            let is_on = (pass.rate - usual).abs() < 1e-9;
            let response = ui.selectable_label(is_on, format!("{usual}"));
            response.widget_info(|| {
                WidgetInfo::selected(Role::RadioButton, true, is_on, format!("{usual} frames a second"))
            });
            if response.clicked() && !is_on {
                pass.rate = usual;
                touch = touch.and(Touch::click(true));
            }
        }
    });
    touch
}

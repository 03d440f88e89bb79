//! The parameters of reduction.

use egui::Ui;

use super::super::Scope;
use super::fields::{Number, Touch, number, optional};
use crate::scene::ReducePass;

pub(super) fn reduce_form(ui: &mut Ui, pass: &mut ReducePass, scope: &mut Scope<'_>) -> Touch {
    let mut bound_deg = pass.bound_rad.to_degrees();
    let mut touch = number(
        ui,
        &mut bound_deg,
        &Number {
            label: "Bound",
            unit: "°",
            range: 0.0..=45.0,
            decimals: 2,
            speed: 0.01,
            tooltip: "The most that a joint's turn may change at any time",
        },
    );
    if touch != Touch::default() {
        pass.bound_rad = bound_deg.to_radians();
    }
    let ends = Number {
        label: "Limb ends",
        unit: "",
        range: 1e-4..=1e4,
        decimals: 3,
        speed: 0.001,
        tooltip: "The most that the end of a limb may move, in the lengths of the file",
    };
    touch = touch.and(optional(ui, &mut pass.tip_bound, 0.01, &ends));
    let markers: Vec<f64> = scope
        .bench
        .work()
        .map(|work| work.markers.iter().map(|marker| marker.secs).collect())
        .unwrap_or_default();
    let mut keeps = !pass.keep_secs.is_empty();
    let words = match pass.keep_secs.len() {
        0 => "Keep keys at markers".to_owned(),
        count => format!("Keep keys at {count} moments"),
    };
    let response = ui
        .add_enabled(keeps || !markers.is_empty(), egui::Checkbox::new(&mut keeps, words))
        .on_hover_text("Keys at the times of the markers, as they are now, stay: contacts, accents");
    if response.changed() {
        pass.keep_secs = if keeps { markers } else { Vec::new() };
        touch = touch.and(Touch::click(true));
    }
    touch
}

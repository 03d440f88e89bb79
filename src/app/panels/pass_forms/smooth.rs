//! The parameters of smoothing.

use egui::Ui;

use super::super::Scope;
use super::fields::{Number, Touch, choice, number, optional};
use crate::clip::Kernel;
use crate::scene::SmoothPass;

pub(super) fn smooth_form(ui: &mut Ui, pass: &mut SmoothPass, scope: &mut Scope<'_>) -> Touch {
    let rate = scope.bench.result().map_or(60.0, |clip| clip.grid.rate);
    let mut touch = number(
        ui,
        &mut pass.smoothing.cutoff_hz,
        &Number {
            label: "Cut-off",
            unit: " Hz",
            // Beyond half the rate there is nothing to take out.
            range: 0.1..=(0.5 * rate).max(1.0),
            decimals: 1,
            speed: 0.05,
            tooltip: "What is faster than this goes; at it 0.71 of the size is left",
        },
    );
    touch = touch.and(choice(
        ui,
        "Kernel",
        &mut pass.smoothing.kernel,
        &[
            (Kernel::Gaussian, "bell", "The gentlest fall beyond the cut-off"),
            (Kernel::Binomial, "binomial", "Nearly a bell, by rows of Pascal's triangle"),
            (Kernel::Box, "average", "A moving average"),
        ],
    ));
    let mut most_deg = pass.smoothing.most_rad.map(f64::to_degrees);
    let bound = Number {
        label: "Bound",
        unit: "°",
        range: 0.01..=90.0,
        decimals: 2,
        speed: 0.02,
        tooltip: "No turn changes by more than this",
    };
    touch = touch.and(optional(ui, &mut most_deg, 2.0, &bound));
    pass.smoothing.most_rad = most_deg.map(f64::to_radians);
    let places = ui.checkbox(&mut pass.with_places, "Places too");
    let places = places.on_hover_text("Smooth where joints stand as well as how they turn");
    touch = touch.and(Touch::click(places.changed()));
    ui.horizontal_wrapped(|ui| {
        let choice = &scope.bench.session.choice;
        let leaves = ui
            .add_enabled(choice.span_secs.is_some(), egui::Button::new("Leave the choice alone").small())
            .on_hover_text("Nothing is smoothed in the chosen stretch: a contact, a sharp accent");
        if leaves.clicked() {
            pass.masks.push(choice.scope(0.1));
            touch = touch.and(Touch::click(true));
        }
        if !pass.masks.is_empty() {
            let words = format!("Smooth there again ({})", pass.masks.len());
            if ui.small_button(words).on_hover_text("Forget what was to be left alone").clicked() {
                pass.masks.clear();
                touch = touch.and(Touch::click(true));
            }
        }
    });
    touch
}

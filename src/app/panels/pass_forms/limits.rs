//! The parameters of limits.

use std::sync::Arc;

use egui::{Label, RichText, Ui};

use super::super::Scope;
use super::fields::{Touch, choice};
use crate::limit::{Clamp, ClampTo};
use crate::scene::LimitsPass;

pub(super) fn limits_form(ui: &mut Ui, pass: &mut LimitsPass, scope: &mut Scope<'_>) -> Touch {
    let mut touch = choice(
        ui,
        "Clamp",
        &mut pass.clamp,
        &[
            (Clamp::Soft, "soft", "Bends from comfort on; smooth curves stay smooth"),
            (Clamp::Hard(ClampTo::SameDirection), "hard", "Stops at the limit in the limb's own direction"),
            (Clamp::Hard(ClampTo::Nearest), "hard, nearest", "Stops at the nearest pose within the limit"),
        ],
    );
    // The scene's limits are for the source's body.
    let is_same_body = match (scope.bench.source(), scope.bench.result()) {
        (Some(source), Some(result)) => source.has_skeleton_of(result),
        _ => false,
    };
    let own = scope.bench.work().and_then(|work| work.limits.as_ref()).filter(|_| is_same_body);
    ui.horizontal_wrapped(|ui| {
        let title = if pass.limits.title.is_empty() { "no title" } else { &pass.limits.title };
        let words = RichText::new(format!("Limits: {title}")).size(12.5);
        ui.add(Label::new(words).wrap());
        if let Some(own) = own.filter(|own| **own != pass.limits) {
            let tooltip = format!("Take the limits that snags are looked for with: {}", own.title);
            if ui.small_button("Use the scene's").on_hover_text(tooltip).clicked() {
                pass.limits = Arc::clone(own);
                touch = touch.and(Touch::click(true));
            }
        }
    });
    touch
}

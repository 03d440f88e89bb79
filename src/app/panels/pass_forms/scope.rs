//! Where a pass acts: joints, a stretch of time, and how softly it sets in.

use egui::{Label, RichText, Ui};

use super::super::super::view_models::TimeChoice;
use super::super::Scope;
use super::fields::{Number, Touch, number};
use crate::scene::{PassStep, Scope as Where};

pub(super) fn scope_form(ui: &mut Ui, step: &mut PassStep, scope: &mut Scope<'_>) -> Touch {
    let fades = !matches!(step, PassStep::Reduce(_));
    let Some(own) = step.kind_mut().scope_mut() else { return Touch::default() };
    let mut touch = Touch::default();
    let said = TimeChoice { joints: own.joints.clone(), span_secs: own.span_secs };
    let words = scope.bench.result().map_or(String::new(), |clip| format!("Acts on {}", said.words(clip)));
    ui.add(Label::new(RichText::new(words).size(12.5)).wrap());
    ui.horizontal_wrapped(|ui| {
        let choice = &scope.bench.session.choice;
        let is_other = !choice.is_everything() && *choice != said;
        let uses = ui
            .add_enabled(is_other, egui::Button::new("Act on the choice").small())
            .on_hover_text("Take the joints and the stretch of time that are chosen on the turn map");
        if uses.clicked() {
            *own = choice.scope(own.fade_secs);
            touch = Touch::click(true);
        }
        let all = ui
            .add_enabled(!said.is_everything(), egui::Button::new("Act on everything").small())
            .on_hover_text("All joints, the whole clip");
        if all.clicked() {
            *own = Where { fade_secs: own.fade_secs, ..Where::default() };
            touch = Touch::click(true);
        }
    });
    if let Some([from, to]) = own.span_secs.filter(|_| fades) {
        let fade = Number {
            label: "Fade",
            unit: " s",
            range: 0.0..=(0.5 * (to - from)).max(0.0),
            decimals: 3,
            speed: 0.002,
            tooltip: "Over so many seconds inside the stretch it sets in and fades out",
        };
        touch = touch.and(number(ui, &mut own.fade_secs, &fade));
    }
    touch
}

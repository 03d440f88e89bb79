//! The parameters of a pass, to look at and to change: one file a kind.
//!
//! A form changes a copy of the pass. While something is dragged the window shows what that copy gives; letting go is one step of
//! the history.

mod fields;
mod limits;
mod reduce;
mod resample;
mod scope;
mod smooth;

use egui::{Label, RichText, Ui};

use super::super::commands::Command;
use super::Scope;
use super::blend_form::blend_form_ui;
use crate::scene::{Edit, Pass, PassStep};

pub(super) use fields::Touch;

/// The form of a pass: what it does, its parameters, where it acts.
pub(super) fn form_ui(ui: &mut Ui, pass: &Pass, scope: &mut Scope<'_>) {
    let shown = scope.bench.preview.as_ref().filter(|(id, _)| *id == pass.id);
    let mut step = shown.map_or_else(|| pass.step.clone(), |(_, step)| step.clone());
    ui.spacing_mut().item_spacing = egui::vec2(6.0, 4.0);
    let words = RichText::new(pass.step.kind().explanation()).size(12.0).color(scope.look.faint);
    ui.add(Label::new(words).wrap());
    if matches!(pass.step, PassStep::Blend(_) | PassStep::Loop(_)) {
        return blend_form_ui(ui, pass.id, &pass.step, scope);
    }
    let mut touch = match &mut step {
        PassStep::Smooth(own) => smooth::smooth_form(ui, own, scope),
        PassStep::Reduce(own) => reduce::reduce_form(ui, own, scope),
        PassStep::Resample(own) => resample::resample_form(ui, own, scope),
        PassStep::Limits(own) => limits::limits_form(ui, own, scope),
        // Mends, keys and pushes are changed where they are made: in the list of snags and in the curves.
        _ => Touch::default(),
    };
    if step.kind().scope().is_some() {
        touch = touch.and(scope::scope_form(ui, &mut step, scope));
    }
    let work = scope.bench.session.work;
    if touch.is_settled {
        scope.out.push(Command::Edit(Edit::ChangePass { work, pass: pass.id, step }));
    } else if touch.has_moved {
        scope.out.push(Command::PreviewPass(pass.id, Box::new(step)));
    }
}

//! Passes that are added by hand.

use std::sync::Arc;

use super::super::commands::Offer;
use super::super::view_models::place_for;
use super::super::window::Window;
use super::limits::LimitsFrom;
use crate::clip::Smoothing;
use crate::limit::Limits;
use crate::scene::{Edit, LimitsPass, PassId, PassStep, ReducePass, ResamplePass, Scope, SmoothPass};

/// What a new pass begins with, to be changed in its form: a cut-off that takes tremble and leaves motion, and a bound that
/// nobody sees.
const USUAL_CUTOFF_HZ: f64 = 8.0;
const USUAL_BOUND_DEG: f64 = 0.2;
/// A pass on a part of the clip sets in over so many seconds, or a fourth of the part where that is shorter.
const USUAL_FADE_SECS: f64 = 0.1;

impl Window {
    /// Adds a pass that acts on the choice, and opens its form.
    pub(super) fn add_pass(&mut self, offer: Offer) {
        let Some(rate) = self.bench.result().map(|clip| clip.grid.rate) else { return };
        let scope = self.new_scope();
        match offer {
            Offer::Resample => self.put_pass(ResamplePass { rate: (rate * 1000.0).round() / 1000.0 }.into()),
            Offer::Smooth => {
                // Where the clip is sampled more coarsely a lower cut-off is one that does something.
                let smoothing = Smoothing::gaussian(USUAL_CUTOFF_HZ.min(rate / 6.0));
                self.put_pass(SmoothPass { scope, ..SmoothPass::new(smoothing) }.into());
            }
            Offer::Reduce => {
                let scope = Scope { fade_secs: 0.0, ..scope };
                let bound = USUAL_BOUND_DEG.to_radians();
                self.put_pass(ReducePass { scope, ..ReducePass::within(bound) }.into());
            }
            Offer::Limits => {
                let own = self.bench.work().and_then(|work| work.limits.clone());
                let is_same_body = match (self.bench.source(), self.bench.result()) {
                    (Some(source), Some(result)) => source.has_skeleton_of(result),
                    _ => false,
                };
                match own.filter(|_| is_same_body) {
                    Some(limits) => self.put_limits(limits),
                    None => self.work_out_limits_pass(LimitsFrom::Adult),
                }
            }
        }
    }

    /// Adds a pass that keeps joints within these limits.
    pub(super) fn put_limits(&mut self, limits: Arc<Limits>) {
        let scope = self.new_scope();
        self.put_pass(LimitsPass { scope, ..LimitsPass::new(limits) }.into());
    }

    /// Where a pass acts that is added now.
    fn new_scope(&self) -> Scope {
        let choice = &self.bench.session.choice;
        let fade = choice.span_secs.map_or(0.0, |[from, to]| USUAL_FADE_SECS.min(0.25 * (to - from)));
        choice.scope(fade)
    }

    /// Adds a pass where it belongs and shows its form.
    pub(super) fn put_pass(&mut self, step: PassStep) {
        let Some(own) = self.bench.work() else { return };
        let (at, id) = (place_for(&step, &own.passes), own.next_pass_id());
        let work = self.bench.session.work;
        self.edit(&Edit::AddPass { work, step, at });
        self.open_pass(Some(id));
    }

    /// Shows the form of a pass, or none.
    pub(super) fn open_pass(&mut self, pass: Option<PassId>) {
        self.bench.preview = None;
        self.bench.session.open_pass = pass;
        self.pictures.scroll_to_form = pass.is_some();
    }
}

//! Work that is missing is ordered: what panels want to show and nobody has worked out yet.

use std::sync::Arc;

use super::super::bench::{Behind, Evaluated, FromClips, Searched};
use super::super::blend_state::BlendKey;
use super::super::carry_state::CarryKey;
use super::super::jobs::Slot;
use super::super::view_models::{CurveKey, HeatKind, HeatWish, changes, curve_set, heat_map};
use super::super::window::Window;
use super::answers::Answer;
use crate::clip::Clip;
use crate::mend::{SurveyOptions, survey};
use crate::scene::Pass;
use crate::skeleton::Skeleton;
use crate::skeleton::roles::Roles;

/// The last order of each purpose, so that none is given twice.
#[derive(Debug, Default)]
pub(crate) struct Asked {
    /// Project, work and what is looked for.
    pub survey: Option<(u64, usize, Searched)>,
    /// Project, work, passes, and what else they need.
    pub evaluation: Option<(u64, usize, Vec<Pass>, Behind)>,
    /// Clips and colours.
    pub heat: Option<FromClips<HeatWish, ()>>,
    /// Clips, joints and view.
    pub curves: Option<FromClips<Vec<CurveKey>, ()>>,
    /// A skeleton.
    pub roles: Option<Arc<Skeleton>>,
    /// A blend.
    pub blend: Option<BlendKey>,
    /// What a retarget hangs on.
    pub carry: Option<CarryKey>,
    /// The same, carried whole.
    pub carry_measured: Option<CarryKey>,
}

impl Window {
    /// Orders what is missing.
    pub(in super::super) fn order_work(&mut self) {
        let Some(source) = self.bench.source().cloned() else { return };
        self.order_survey(&source);
        self.order_evaluation(&source);
        self.order_blend();
        self.order_carry();
        let (Some(before), Some(result)) = (self.bench.before().cloned(), self.bench.result().cloned())
        else {
            return;
        };
        self.order_heat(&before, &result);
        self.order_curves(&before, &result);
        self.order_roles(&result.skeleton);
    }

    /// Until it is known which joints are an arm or a leg the skeleton view has no tip to draw a limb by.
    fn order_roles(&mut self, skeleton: &Arc<Skeleton>) {
        let is_ordered = self.asked.roles.as_ref().is_some_and(|asked| Arc::ptr_eq(asked, skeleton));
        if is_ordered || self.bench.roles_of(skeleton).is_some() {
            return;
        }
        let skeleton = Arc::clone(skeleton);
        self.asked.roles = Some(Arc::clone(&skeleton));
        self.jobs.submit(Slot::Roles, move |_| {
            let roles = Arc::new(Roles::find(&skeleton));
            Some(Answer::Roles(skeleton, roles))
        });
    }

    fn serial(&self) -> u64 {
        self.bench.project.as_ref().map_or(0, |project| project.serial)
    }

    fn order_survey(&mut self, source: &Arc<Clip>) {
        let (Some(findings), Some(own)) = (self.bench.findings(), self.bench.work()) else { return };
        let (serial, work) = (self.serial(), self.bench.session.work);
        let searched = Searched::of(own);
        let is_done = findings.searched.as_ref() == Some(&searched)
            && (findings.snags.is_some() || findings.search_is_stopped);
        let order = (serial, work, searched);
        if is_done || self.asked.survey.as_ref() == Some(&order) {
            return;
        }
        let searched = order.2.clone();
        self.asked.survey = Some(order);
        let clip = Arc::clone(source);
        self.jobs.submit(Slot::Survey, move |watch| {
            let options = SurveyOptions { kinds: searched.search.kinds(), limits: searched.limits.clone() };
            let found = survey(&clip, &options, watch).ok()?;
            let searched = Box::new(searched);
            Some(Answer::Surveyed { serial, work, searched, snags: Arc::new(found.snags) })
        });
    }

    fn order_evaluation(&mut self, source: &Arc<Clip>) {
        let (Some(findings), Some(project)) = (self.bench.findings(), &self.bench.project) else { return };
        let (serial, work) = (project.serial, self.bench.session.work);
        let known = findings.evaluated.as_ref();
        let behind = project.behind(work);
        // Another rest pose, or the file found again, is another source clip under the same passes: its own, or that of a clip or skeleton
        // behind.
        let is_current = |known: Option<&Evaluated>, passes: &[Pass]| {
            known.is_some_and(|known| {
                Arc::ptr_eq(&known.evaluation.source, source)
                    && known.passes == passes
                    && known.behind == behind
            })
        };
        let is_unchanged = |passes: &[Pass]| is_current(known, passes);
        let is_tried = self.bench.is_trying();
        if !is_tried && self.bench.work().is_some_and(|work| is_unchanged(&work.passes)) {
            return;
        }
        // A drag asks for another result with each frame. What is on its way is let through first, else on a long clip none
        // would ever arrive.
        if is_tried && self.jobs.is_running(Slot::Evaluate) {
            return;
        }
        let mut passes = self.bench.passes();
        // A mend is looked at for long, and the document may change meanwhile: its own numbers come first.
        if self.bench.looks_at_mend()
            && let Some(own) = self.bench.work().map(|work| &work.passes)
            && !is_current(findings.settled.as_ref(), own)
        {
            passes.clone_from(own);
        }
        if is_unchanged(&passes) {
            return;
        }
        let order = (serial, work, passes.clone(), behind.clone());
        if self.asked.evaluation.as_ref() == Some(&order) && self.jobs.is_running(Slot::Evaluate) {
            return;
        }
        self.asked.evaluation = Some(order);
        let library = project.library();
        let source = Arc::clone(source);
        self.jobs.submit(Slot::Evaluate, move |_| {
            let evaluation = library.evaluate_with(work, &passes)?;
            let changes = changes(&source, &evaluation.result);
            let evaluated = Evaluated { passes, behind, evaluation: Arc::new(evaluation), changes };
            Some(Answer::Evaluated { serial, work, evaluated: Box::new(evaluated) })
        });
    }

    fn order_heat(&mut self, source: &Arc<Clip>, result: &Arc<Clip>) {
        let wish = self.heat_wish(result);
        let is_there = self.bench.heat.as_ref().is_some_and(|heat| heat.is_of(source, result, &wish));
        let is_ordered = self.asked.heat.as_ref().is_some_and(|asked| asked.is_of(source, result, &wish));
        if is_there || is_ordered {
            return;
        }
        let order =
            FromClips { source: Arc::clone(source), result: Arc::clone(result), parameters: wish, value: () };
        self.asked.heat = Some(order.clone());
        let known = self.bench.heat.clone();
        self.jobs.submit(Slot::Heat, move |watch| {
            let known = known.as_ref().map(|known| (&*known.source, &*known.result, &*known.value));
            let value = heat_map(&order.source, &order.result, &order.parameters, known, watch).ok()?;
            Some(Answer::Heat(order.with(Arc::new(value))))
        });
    }

    /// What the turn map is to show. Limits are those of the source's joints: on another skeleton they go by the labels.
    fn heat_wish(&self, result: &Arc<Clip>) -> HeatWish {
        let kind = self.bench.session.heat_kind;
        let own = self.bench.work().and_then(|work| work.limits.as_ref());
        let limits = own.filter(|_| kind == HeatKind::LimitUse).map(|limits| match self.bench.source() {
            Some(source) if !source.has_skeleton_of(result) => {
                let now = |joint: usize| {
                    let is_there = joint < source.skeleton.len();
                    is_there.then(|| result.skeleton.find(source.skeleton.label(joint))).flatten()
                };
                Arc::new(limits.renumbered(&now))
            }
            _ => Arc::clone(limits),
        });
        HeatWish { kind, limits }
    }

    fn order_curves(&mut self, source: &Arc<Clip>, result: &Arc<Clip>) {
        let joints = self.bench.session.joints();
        let wanted: Vec<CurveKey> = joints.iter().map(|&joint| self.bench.curve_key(joint)).collect();
        let is_there = |key: &CurveKey| {
            let mut known = self.bench.curves.iter().chain(&self.bench.more_curves);
            known.any(|curves| curves.is_of(source, result, key))
        };
        if wanted.iter().all(is_there) {
            return;
        }
        let is_ordered = self.asked.curves.as_ref().is_some_and(|asked| asked.is_of(source, result, &wanted));
        let runs = self.jobs.is_running(Slot::Curves);
        // As with results: while something is dragged, what is on its way is let through first.
        let same_joints = self.asked.curves.as_ref().is_some_and(|asked| asked.parameters == wanted);
        if runs && (is_ordered || (same_joints && self.bench.trial.is_some())) {
            return;
        }
        let order = FromClips {
            source: Arc::clone(source),
            result: Arc::clone(result),
            parameters: wanted,
            value: (),
        };
        self.asked.curves = Some(order.clone());
        self.jobs.submit(Slot::Curves, move |watch| {
            let sample = |&key: &CurveKey| {
                let value = Arc::new(curve_set(&order.source, &order.result, &key, watch).ok()?);
                let (source, result) = (Arc::clone(&order.source), Arc::clone(&order.result));
                Some(FromClips { source, result, parameters: key, value })
            };
            let sets: Option<Vec<_>> = order.parameters.iter().map(sample).collect();
            Some(Answer::Curves(sets?))
        });
    }
}

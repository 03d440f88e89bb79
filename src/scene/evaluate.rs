//! From source clip to result: pass by pass, with what has not changed kept from the last time.

use std::sync::Arc;

use crate::clip::Clip;
use crate::mend;

use super::pass::{Pass, PassId};

/// What one pass did.
#[derive(Clone, Debug)]
pub struct Stage {
    /// Which pass.
    pub pass: PassId,
    /// The clip after it.
    pub result: Arc<Clip>,
    /// Joints whose numbers it changed.
    pub joints_changed: usize,
    /// The largest change of an orientation at a key, in radians.
    pub change_rad: f64,
    /// Why it did nothing, where it does not fit.
    pub problem: Option<String>,
}

/// The clip that comes out, and what each switched-on pass did.
#[derive(Clone, Debug)]
pub struct Evaluation {
    /// The source as it was.
    pub source: Arc<Clip>,
    /// The clip after all passes.
    pub result: Arc<Clip>,
    /// One for each pass that is on, in order.
    pub stages: Vec<Stage>,
}

/// Evaluates pass lists and remembers the last one, so that only what changed is computed anew.
#[derive(Debug, Default)]
pub struct Evaluator {
    last: Option<(Vec<Pass>, Evaluation)>,
}

impl Evaluator {
    /// The result of `passes` on `source`.
    ///
    /// Passes equal to those of the call before, on the same source, are not run again.
    pub fn evaluate(&mut self, source: &Arc<Clip>, passes: &[Pass]) -> Evaluation {
        let on: Vec<Pass> = passes.iter().filter(|pass| pass.on).cloned().collect();
        let mut stages: Vec<Stage> = match &self.last {
            Some((known, evaluation)) if Arc::ptr_eq(&evaluation.source, source) => {
                let same = known.iter().zip(&on).take_while(|(before, now)| before == now).count();
                evaluation.stages[..same].to_vec()
            }
            _ => Vec::new(),
        };
        for pass in &on[stages.len()..] {
            let before = stages.last().map_or(source, |stage| &stage.result).clone();
            stages.push(run(pass, &before));
        }
        let result = stages.last().map_or(source, |stage| &stage.result).clone();
        let evaluation = Evaluation { source: source.clone(), result, stages };
        self.last = Some((on, evaluation.clone()));
        evaluation
    }
}

fn run(pass: &Pass, before: &Arc<Clip>) -> Stage {
    match pass.step.apply(before) {
        Ok(after) => {
            let changed: Vec<usize> =
                (0..after.joints.len()).filter(|&joint| !after.same_joint(before, joint)).collect();
            let change_rad =
                changed.iter().map(|&joint| mend::change_rad(before, &after, joint)).fold(0.0, f64::max);
            Stage {
                pass: pass.id,
                result: Arc::new(after),
                joints_changed: changed.len(),
                change_rad,
                problem: None,
            }
        }
        Err(error) => Stage {
            pass: pass.id,
            result: before.clone(),
            joints_changed: 0,
            change_rad: 0.0,
            problem: Some(error.to_string()),
        },
    }
}

//! From source clip to result: pass by pass, with what has not changed kept from the last time.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::clip::Clip;
use crate::mend;
use crate::skeleton::Skeleton;

use super::pass::{Need, Others, Pass, PassId, PassMemory};

/// What one pass did.
#[derive(Clone, Debug)]
pub struct Stage {
    /// Which pass.
    pub pass: PassId,
    /// The clip after it.
    pub result: Arc<Clip>,
    /// Joints whose numbers it changed; all joints of the result where it has another skeleton.
    pub joints_changed: usize,
    /// The largest change of an orientation, in radians, at keys and in the middle between them; 0 where the result has
    /// another skeleton and the two can't be compared.
    pub change_rad: f64,
    /// The result has another skeleton than the clip before.
    pub has_other_skeleton: bool,
    /// What is worth telling, a sentence each.
    pub notes: Vec<String>,
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

/// What a pass needed, as it was when it was run.
#[derive(Clone, Debug)]
enum Given {
    Clip(Option<Arc<Clip>>),
    Skeleton(Option<Arc<Skeleton>>),
}

impl PartialEq for Given {
    /// Whether both are the very same.
    fn eq(&self, other: &Self) -> bool {
        fn same<T>(a: Option<&Arc<T>>, b: Option<&Arc<T>>) -> bool {
            match (a, b) {
                (Some(a), Some(b)) => Arc::ptr_eq(a, b),
                (None, None) => true,
                _ => false,
            }
        }
        match (self, other) {
            (Self::Clip(a), Self::Clip(b)) => same(a.as_ref(), b.as_ref()),
            (Self::Skeleton(a), Self::Skeleton(b)) => same(a.as_ref(), b.as_ref()),
            _ => false,
        }
    }
}

/// A pass that was run, and what it needed.
type Run = (Pass, Vec<Given>);

/// Evaluates pass lists and remembers the last one, so that only what changed is computed anew.
#[derive(Debug, Default)]
pub struct Evaluator {
    last: Option<(Vec<Run>, Evaluation)>,
    memories: BTreeMap<PassId, PassMemory>,
}

impl Evaluator {
    /// The result of `passes` on `source`. Passes ask `others` for further clips.
    ///
    /// Passes equal to those of the call before, on the same source and with the same further clips, are not run again.
    pub fn evaluate(&mut self, source: &Arc<Clip>, passes: &[Pass], others: &dyn Others) -> Evaluation {
        let given = |need| match need {
            Need::Clip(clip) => Given::Clip(others.clip(clip)),
            Need::Skeleton(source) => Given::Skeleton(others.skeleton(source)),
        };
        let on: Vec<Run> = passes
            .iter()
            .filter(|pass| pass.on)
            .map(|pass| (pass.clone(), pass.step.kind().needs().into_iter().map(given).collect()))
            .collect();
        let mut stages: Vec<Stage> = match &self.last {
            Some((known, evaluation)) if Arc::ptr_eq(&evaluation.source, source) => {
                let same = known.iter().zip(&on).take_while(|(before, now)| before == now).count();
                evaluation.stages[..same].to_vec()
            }
            _ => Vec::new(),
        };
        for (pass, _) in &on[stages.len()..] {
            let before = stages.last().map_or(source, |stage| &stage.result).clone();
            let memory = self.memories.entry(pass.id).or_default();
            stages.push(run(pass, &before, others, memory));
        }
        self.memories.retain(|id, _| on.iter().any(|(pass, _)| pass.id == *id));
        let result = stages.last().map_or(source, |stage| &stage.result).clone();
        let evaluation = Evaluation { source: source.clone(), result, stages };
        self.last = Some((on, evaluation.clone()));
        evaluation
    }
}

fn run(pass: &Pass, before: &Arc<Clip>, others: &dyn Others, memory: &mut PassMemory) -> Stage {
    let outcome = match pass.step.kind().apply_again(before, others, memory) {
        Ok(outcome) => outcome,
        Err(error) => {
            return Stage {
                pass: pass.id,
                result: before.clone(),
                joints_changed: 0,
                change_rad: 0.0,
                has_other_skeleton: false,
                notes: Vec::new(),
                problem: Some(error.to_string()),
            };
        }
    };
    let after = outcome.clip;
    let has_other_skeleton = !before.has_skeleton_of(&after);
    let changed: Vec<usize> = if has_other_skeleton {
        after.skeleton.listed().collect()
    } else {
        (0..after.joints.len()).filter(|&joint| !after.same_joint(before, joint)).collect()
    };
    let change_rad = if has_other_skeleton {
        0.0
    } else {
        changed.iter().map(|&joint| mend::change_rad(before, &after, joint)).fold(0.0, f64::max)
    };
    Stage {
        pass: pass.id,
        result: Arc::new(after),
        joints_changed: changed.len(),
        change_rad,
        has_other_skeleton,
        notes: outcome.notes,
        problem: None,
    }
}

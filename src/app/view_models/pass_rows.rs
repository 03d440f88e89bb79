//! The rows of the passes list.

use crate::scene::{ClipWork, Evaluation, PassId};

use super::words::{counted, degrees};

/// One pass of the list.
#[derive(Clone, Debug, PartialEq)]
pub struct PassRow {
    /// Its name for edits.
    pub id: PassId,
    /// What it does.
    pub title: String,
    /// More about it.
    pub explanation: &'static str,
    /// Whether it takes part.
    pub on: bool,
    /// What it did, measured.
    pub change: String,
    /// How much of it is taken, for the passes that can be taken in part.
    pub amount: Option<f64>,
    /// Why it did nothing.
    pub problem: Option<String>,
}

/// The rows, in order. Without an evaluation the measured change is not told yet.
pub fn pass_rows(work: &ClipWork, evaluation: Option<&Evaluation>) -> Vec<PassRow> {
    work.passes
        .iter()
        .map(|pass| {
            let stage = evaluation.and_then(|all| all.stages.iter().find(|stage| stage.pass == pass.id));
            let change = match stage {
                _ if !pass.on => "off".to_owned(),
                None => "…".to_owned(),
                Some(stage) if stage.has_other_skeleton => {
                    format!("another skeleton, {}", counted(stage.joints_changed, "joint"))
                }
                Some(stage) if stage.joints_changed == 0 => "nothing to change".to_owned(),
                Some(stage) => {
                    let joints = counted(stage.joints_changed, "joint");
                    match stage.change_rad.to_degrees() {
                        largest if largest < 5e-3 => format!("no pose moves, {joints}"),
                        largest => format!("up to {}, {joints}", degrees(largest)),
                    }
                }
            };
            let notes = stage.map_or(&[][..], |stage| &stage.notes);
            let change = [vec![change], notes.to_vec()].concat().join("; ");
            PassRow {
                id: pass.id,
                title: pass.step.title(),
                explanation: pass.step.kind().explanation(),
                on: pass.on,
                change,
                amount: pass.step.kind().amount(),
                problem: stage.and_then(|stage| stage.problem.clone()),
            }
        })
        .collect()
}

//! Which passes ran, with which numbers, and what each of them did.

use crate::clip::Clip;
use crate::mend;
use crate::scene::{Evaluation, Pass, PassNumber, PassStep};
use crate::snag::{Remedy, Snag, SnagKind};

/// One pass that ran.
#[derive(Clone, Debug, PartialEq)]
pub struct PassFacts {
    /// What it is, as in the list of passes.
    pub title: String,
    /// What it does, in a sentence or two.
    pub explanation: &'static str,
    /// The numbers it ran with, amount and scope among them.
    pub numbers: Vec<PassNumber>,
    /// Joints whose numbers it changed.
    pub joints_changed: usize,
    /// The largest change of an orientation, radians; `None` where the skeleton after it is another.
    pub change_rad: Option<f64>,
    /// What it told, a sentence each.
    pub notes: Vec<String>,
    /// Why it did nothing, where it did not fit.
    pub problem: Option<String>,
    /// The mends it made, one for each snag.
    pub mends: Vec<MendFacts>,
}

/// One mend that was made.
#[derive(Clone, Debug, PartialEq)]
pub struct MendFacts {
    /// The snag's kind.
    pub kind: SnagKind,
    /// Label of its joint.
    pub joint: String,
    /// First and last frame of the snag.
    pub frames: [usize; 2],
    /// What was done, in a word or two: `take-out`.
    pub mend: &'static str,
    /// The numbers it was done with.
    pub numbers: Vec<PassNumber>,
    /// The largest change of an orientation at its keys, radians.
    pub change_rad: f64,
    /// How far an end of a limb moved at most, in the file's lengths.
    pub change_length: f64,
}

/// What each pass that was on did in an evaluation of `passes`, in order.
pub fn passes_run(passes: &[Pass], evaluation: &Evaluation) -> Vec<PassFacts> {
    let on = passes.iter().filter(|pass| pass.on);
    let mut before = &evaluation.source;
    let mut facts = Vec::new();
    for (pass, stage) in on.zip(&evaluation.stages) {
        let kind = pass.step.kind();
        let mut numbers = kind.numbers();
        numbers.extend(kind.amount().map(|amount| PassNumber::new("amount", 100.0 * amount, "%")));
        if let Some(scope) = kind.scope() {
            numbers.extend(scope.joints.as_ref().map(|joints| PassNumber::count("joints", joints.len())));
            if let Some([first, last]) = scope.span_secs {
                numbers.extend([PassNumber::new("from", first, "s"), PassNumber::new("to", last, "s")]);
                numbers.push(PassNumber::new("fade", scope.fade_secs, "s"));
            }
        }
        let mends = match &pass.step {
            PassStep::Mend(own) if stage.problem.is_none() => {
                own.snags.iter().map(|snag| mend_facts(before, &stage.result, snag)).collect()
            }
            _ => Vec::new(),
        };
        facts.push(PassFacts {
            title: pass.step.title(),
            explanation: kind.explanation(),
            numbers,
            joints_changed: stage.joints_changed,
            change_rad: (!stage.has_other_skeleton).then_some(stage.change_rad),
            notes: stage.notes.clone(),
            problem: stage.problem.clone(),
            mends,
        });
        before = &stage.result;
    }
    facts
}

fn mend_facts(before: &Clip, after: &Clip, snag: &Snag) -> MendFacts {
    MendFacts {
        kind: snag.kind,
        joint: before.skeleton.label(snag.joint).to_owned(),
        frames: [snag.first_frame, snag.last_frame],
        mend: snag.remedy.name(),
        numbers: remedy_numbers(&snag.remedy),
        change_rad: mend::change_at_snag_rad(before, after, snag),
        change_length: mend::change_at_tips(before, after, snag),
    }
}

/// The numbers of a mend, where it has some beside its keys.
fn remedy_numbers(remedy: &Remedy) -> Vec<PassNumber> {
    match remedy {
        Remedy::Unwrap(turns) => {
            let names = ["turns out of the first angle", "of the second", "of the third"];
            let named = names.into_iter().zip(turns).filter(|(_, turns)| **turns != 0);
            named.map(|(name, turns)| PassNumber::new(name, f64::from(*turns), "")).collect()
        }
        Remedy::Smooth { noise_rad, quiet_rad, .. } => {
            vec![PassNumber::angle("noise", *noise_rad), PassNumber::angle("noise where sound", *quiet_rad)]
        }
        Remedy::TakeOut(offset) | Remedy::TakeOutAbove(offset) => {
            vec![PassNumber::angle("turn taken out", offset.plane_angles().length())]
        }
        Remedy::Hold(plant) => vec![
            PassNumber::count("free frames before", plant.free.0),
            PassNumber::count("free frames after", plant.free.1),
        ],
        _ => Vec::new(),
    }
}

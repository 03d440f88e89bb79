//! Where a new pass goes in the list, so that each sees what it needs.

use crate::scene::{Pass, PassStep};

/// The order of passes: faults first, then what changes frames, bodies and motion, then what a person shaped, then what holds
/// for the whole: limits, filter, and last of all fewer keys.
fn rank(step: &PassStep) -> usize {
    let places: [fn(&PassStep) -> bool; 5] = [
        |step| matches!(step, PassStep::Mend(_)),
        |step| matches!(step, PassStep::Resample(_)),
        |step| matches!(step, PassStep::Blend(_)),
        |step| matches!(step, PassStep::Retarget(_)),
        |step| matches!(step, PassStep::Push(_) | PassStep::Keys(_)),
    ];
    let last: [fn(&PassStep) -> bool; 3] = [
        |step| matches!(step, PassStep::Limits(_)),
        |step| matches!(step, PassStep::Smooth(_)),
        |step| matches!(step, PassStep::Reduce(_)),
    ];
    // Kinds that are named nowhere stand between the two.
    let at_end = last.iter().position(|is_it| is_it(step)).map(|place| places.len() + 1 + place);
    at_end.or_else(|| places.iter().position(|is_it| is_it(step))).unwrap_or(places.len())
}

/// The index at which a new pass is put: behind the last one that goes before it, wherever a person has moved that one to.
pub fn place_for(step: &PassStep, passes: &[Pass]) -> usize {
    let own = rank(step);
    passes.iter().rposition(|pass| rank(&pass.step) <= own).map_or(0, |last| last + 1)
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::clip::Smoothing;
    use crate::limit::Limits;
    use crate::scene::{LimitsPass, MendPass, PassId, PushPass, ReducePass, ResamplePass, SmoothPass};
    use crate::snag::SnagKind;

    #[test]
    fn limits_go_before_the_filter_and_reduction_goes_last() {
        let mut passes: Vec<Pass> = Vec::new();
        let steps: [PassStep; 6] = [
            ReducePass::within(0.01).into(),
            SmoothPass::new(Smoothing::gaussian(6.0)).into(),
            LimitsPass::new(Arc::new(Limits::default())).into(),
            PushPass::default().into(),
            ResamplePass { rate: 60.0 }.into(),
            MendPass::new(SnagKind::Spike, Vec::new()).into(),
        ];
        for (step, id) in steps.into_iter().zip(0..) {
            let at = place_for(&step, &passes);
            passes.insert(at, Pass { id: PassId(id), on: true, step });
        }
        // Each was put before all that were there: mend, resample, push, limits, smooth, reduce.
        let ids: Vec<u64> = passes.iter().map(|pass| pass.id.0).collect();
        assert_eq!(ids, [5, 4, 3, 2, 1, 0]);
        // A reduction that was moved to the front by hand stays there.
        let reduce = passes.remove(5);
        passes.insert(0, reduce);
        let more = SmoothPass::new(Smoothing::gaussian(3.0)).into();
        assert_eq!(place_for(&more, &passes), 6);
    }
}

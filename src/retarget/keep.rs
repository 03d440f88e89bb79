//! Joints brought within their limits after everything else.

use std::sync::Arc;

use crate::clip::Clip;
use crate::limit::{Clamp, Limits, adult};

use super::figure::Figure;
use super::options::KeptLimits;
use super::report::{LargestCorrection, LimitUse, Report};

/// The limits that are meant, for the clip as it is now; `None` where there are none for it, which is told.
pub(super) fn limits_for(
    kept: &KeptLimits,
    target: &Figure,
    result: &Clip,
    report: &mut Report,
) -> Option<Arc<Limits>> {
    match kept {
        KeptLimits::Given(limits) => {
            let count = result.joints.len();
            let fits = limits.joints.keys().all(|&joint| joint < count);
            if !fits {
                report
                    .notes
                    .push(format!("the limits name joints beyond the target's {count}; these were left out"));
            }
            let known = |joint: usize| (joint < count).then_some(joint);
            Some(if fits { Arc::clone(limits) } else { Arc::new(limits.renumbered(&known)) })
        }
        KeptLimits::Adult if target.root.is_some() => {
            report.notes.push("the limits for adults are not known for one figure of several".to_owned());
            None
        }
        KeptLimits::Adult => match adult::limits_for(result) {
            Ok(found) => Some(Arc::new(found.limits)),
            Err(why) => {
                report.notes.push(why.to_string());
                None
            }
        },
    }
}

/// The clip with every joint softly within its limit.
pub(super) fn keep_limits(limits: &Limits, result: &Clip, report: &mut Report) -> Clip {
    let clamped = limits.clamped(result, Clamp::Soft);
    for &joint in limits.joints.keys() {
        if clamped.same_joint(result, joint) {
            continue;
        }
        let (Some(before), Some(after)) = (result.rotation(joint), clamped.rotation(joint)) else { continue };
        let times: Vec<f64> = clamped.grid.times.iter().collect();
        let both = before.at_all(&times).into_iter().zip(after.at_all(&times));
        let worst = both.map(|(a, b)| a.turn_to(b)).enumerate().max_by(|a, b| a.1.total_cmp(&b.1));
        if let Some((frame, by_rad)) = worst
            && report.largest_clamp.is_none_or(|known| by_rad > known.by_rad)
        {
            report.largest_clamp = Some(LargestCorrection { joint, by_rad, frame });
        }
    }
    clamped
}

/// Notes how joints keep to limits, before these were kept and in the end.
pub(super) fn note_use(limits: &Limits, before: &Clip, after: &Clip, report: &mut Report) {
    let earlier = limits.keeping(before);
    report.limits_title.clone_from(&limits.title);
    report.limits = limits
        .keeping(after)
        .into_iter()
        .map(|own| {
            let before = earlier.iter().find(|other| other.joint == own.joint);
            LimitUse {
                joint: own.joint,
                most_use: own.most_use,
                beyond_before: before.map_or(0, |before| before.beyond_limit),
                most_beyond_before_rad: before.map_or(0.0, |before| before.most_beyond_limit_rad),
                beyond: own.beyond_limit,
                most_beyond_rad: own.most_beyond_limit_rad,
            }
        })
        .collect();
}

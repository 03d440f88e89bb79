//! Finds all snags of a clip, kind by kind, each on what the mends before it left.

use std::collections::BTreeSet;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Arc, OnceLock};

use rayon::prelude::*;

use crate::clip::{Clip, RotationTrack};
use crate::limit::Limits;
use crate::snag::{
    Cancelled, Memory, Progress, Remedy, Snag, SnagKind, find, find_half_turns, find_in_clip,
    find_past_limit, find_with, preset_limits,
};

use super::apply::{apply_all, asks_others, change_at_snag_rad, change_of_keys_rad, mend};
use super::draft::Draft;

/// What to look for.
#[derive(Clone, Debug, PartialEq)]
pub struct SurveyOptions {
    /// The kinds; their order does not matter.
    pub kinds: Vec<SnagKind>,
    /// Limits to hold the joints against; without any there is no [`SnagKind::PastLimit`]. They also help to tell which side of a
    /// half-turn is the wrong one; without any the preset for a human figure does.
    pub limits: Option<Arc<Limits>>,
}

impl Default for SurveyOptions {
    fn default() -> Self {
        Self { kinds: SnagKind::defaults(), limits: None }
    }
}

/// The snags of a clip and what their mends come to.
#[derive(Clone, Debug)]
pub struct Survey {
    /// All snags, by first frame, joint and kind.
    pub snags: Vec<Snag>,
    /// The clip with every mend applied that asks nobody. Joints without snags are shared with the source.
    pub mended: Clip,
    /// For each snag the largest change of orientation that its own mend makes at a key (for a long way, between its two
    /// keys), in radians.
    pub changes_rad: Vec<f64>,
}

/// Finds the snags of `clip` and mends them in a copy.
///
/// Goes kind by kind in the order of [`SnagKind::ALL`]: each kind is found on what the mends of the earlier ones left, so
/// a fault is told once and in its own kind. The same clip gives the same survey. Linear in the number of keys.
///
/// # Errors
/// When `progress` says to stop.
pub fn survey(clip: &Clip, options: &SurveyOptions, progress: &dyn Progress) -> Result<Survey, Cancelled> {
    let kinds: Vec<SnagKind> =
        SnagKind::ALL.into_iter().filter(|kind| options.kinds.contains(kind)).collect();
    let total = kinds.len() * clip.joints.len();
    let done = AtomicUsize::new(0);
    let stopped = AtomicBool::new(!progress.report(0, total));

    let mut working = clip.clone();
    let mut found: Vec<(Snag, f64)> = Vec::new();

    // Faults of stored numbers concern one joint alone: all of them in one go, joint by joint.
    let (own, others): (Vec<SnagKind>, Vec<SnagKind>) =
        kinds.into_iter().partition(|kind| kind.is_of_joint_alone());
    let outcomes: Vec<(Vec<(Snag, f64)>, Clip)> = (0..clip.joints.len())
        .into_par_iter()
        .map(|joint| {
            let mut memory = Memory::default();
            let (mut snags, mut working) = (Vec::new(), clip.clone());
            for &kind in &own {
                if stopped.load(Ordering::Relaxed) {
                    break;
                }
                let outcome = mended(&working, joint, find_with(&working, joint, kind, &mut memory));
                snags.extend(outcome.snags);
                if let Some(track) = outcome.mended {
                    working = working.with_rotation(joint, track);
                }
                if !progress.report(done.fetch_add(1, Ordering::Relaxed) + 1, total) {
                    stopped.store(true, Ordering::Relaxed);
                }
            }
            (snags, working)
        })
        .collect();
    if stopped.load(Ordering::Relaxed) {
        return Err(Cancelled);
    }
    for (joint, (snags, own)) in outcomes.into_iter().enumerate() {
        found.extend(snags);
        working.joints[joint] = own.joints[joint].clone();
    }
    // Worked out when the first joint that jumps asks for them.
    let preset = OnceLock::new();
    let side_limits = || match &options.limits {
        Some(limits) => Some(&**limits),
        None => preset.get_or_init(|| preset_limits(clip)).as_ref(),
    };
    for kind in others {
        if kind.is_of_clip() {
            found.extend(of_clip(&mut working, kind));
            let whole = clip.joints.len();
            if !progress.report(done.fetch_add(whole, Ordering::Relaxed) + whole, total) {
                return Err(Cancelled);
            }
            continue;
        }
        let outcomes: Vec<JointOutcome> = (0..clip.joints.len())
            .into_par_iter()
            .map(|joint| {
                if stopped.load(Ordering::Relaxed) {
                    return JointOutcome::default();
                }
                let snags = match (kind, options.limits.as_deref()) {
                    (SnagKind::PastLimit, Some(limits)) => find_past_limit(&working, joint, limits),
                    (SnagKind::HalfTurn, _) => find_half_turns(&working, joint, &side_limits),
                    _ => find(&working, joint, kind),
                };
                let outcome = one_joint(&working, joint, snags);
                if !progress.report(done.fetch_add(1, Ordering::Relaxed) + 1, total) {
                    stopped.store(true, Ordering::Relaxed);
                }
                outcome
            })
            .collect();
        if stopped.load(Ordering::Relaxed) {
            return Err(Cancelled);
        }
        for (joint, mut outcome) in outcomes.into_iter().enumerate() {
            if !outcome.asking.is_empty() {
                // One after the other: each sees what the mends before it made of the other joints.
                outcome = mended(&working, joint, outcome.asking);
            }
            found.extend(outcome.snags);
            if let Some(track) = outcome.mended {
                working = working.with_rotation(joint, track);
            }
        }
    }
    if options.kinds.contains(&SnagKind::Wrap) {
        let count = found.len();
        wraps_left(clip, &mut working, &mut found);
        if found.len() > count {
            // In mending order from the start, as everyone makes these mends: the same bits.
            let mut sorted: Vec<Snag> = found.iter().map(|(snag, _)| snag.clone()).collect();
            sorted.sort_by_key(|snag| (snag.kind, snag.joint, snag.first_key, snag.last_key));
            working = apply_all(clip, &sorted).unwrap_or(working);
        }
    }
    drop_told_twice(&mut found);
    found.sort_by_key(|(snag, _)| (snag.first_frame, snag.joint, snag.kind, snag.first_key, snag.last_key));
    let (snags, changes_rad) = found.into_iter().unzip();
    Ok(Survey { snags, mended: working, changes_rad })
}

/// Whole turns that a jump of the pose has hidden: where a mend has taken the jump away, what follows may still be stored a turn off.
/// Such a mend only adds whole turns to keys behind the earlier mend, so that it may be made before or after it.
fn wraps_left(clip: &Clip, working: &mut Clip, found: &mut Vec<(Snag, f64)>) {
    let jumped: BTreeSet<usize> = found
        .iter()
        .filter(|(snag, _)| {
            matches!(snag.kind, SnagKind::HalfTurn | SnagKind::Spike) && snag.remedy != Remedy::Ask
        })
        .map(|(snag, _)| snag.joint)
        .collect();
    for joint in jumped {
        if clip.same_joint(working, joint) {
            continue;
        }
        // A run follows the numbers before it, so both must be shifted alike.
        let splits = |wrap: &Snag| {
            found.iter().any(|(snag, _)| {
                let is_run = snag.joint == joint && !snag.kind.keeps_pose() && snag.remedy != Remedy::Ask;
                let run = snag.first_key.saturating_sub(1)..=snag.last_key;
                let shared = run.clone().filter(|key| (wrap.first_key..=wrap.last_key).contains(key)).count();
                is_run && shared > 0 && shared < run.count()
            })
        };
        let left: Vec<Snag> = find(working, joint, SnagKind::Wrap)
            .into_iter()
            .filter(|snag| matches!(snag.remedy, Remedy::Unwrap(_)))
            .filter(|snag| !splits(snag))
            .collect();
        if let (false, Ok(mended)) = (left.is_empty(), apply_all(working, &left)) {
            *working = mended;
            found.extend(left.into_iter().map(|snag| (snag, 0.0)));
        }
    }
}

/// The snags of a kind of the whole clip with the changes of their mends, which are made in `working`.
fn of_clip(working: &mut Clip, kind: SnagKind) -> Vec<(Snag, f64)> {
    let snags = find_in_clip(working, kind);
    // What was found in a clip fits it.
    let Ok(mended) = apply_all(working, &snags) else { return Vec::new() };
    let changed = |snag: &Snag| change_at_snag_rad(working, &mended, snag);
    let found = snags.iter().map(|snag| (snag.clone(), changed(snag))).collect();
    *working = mended;
    found
}

/// A step of stored angles into or out of a half-turn or spike is no long way of its own.
fn drop_told_twice(found: &mut Vec<(Snag, f64)>) {
    let stored: BTreeSet<(usize, usize)> = found
        .iter()
        .filter(|(snag, _)| snag.kind == SnagKind::LongWay)
        .map(|(snag, _)| (snag.joint, snag.last_key))
        .collect();
    // A jump without a way back that the file stores as a step is told as that.
    found.retain(|(snag, _)| {
        let is_lone = snag.kind == SnagKind::HalfTurn && snag.remedy == Remedy::Ask;
        !(is_lone && stored.contains(&(snag.joint, snag.first_key)))
    });
    let jumps: BTreeSet<(usize, usize)> = found
        .iter()
        .filter(|(snag, _)| matches!(snag.kind, SnagKind::HalfTurn | SnagKind::Spike))
        .filter(|(snag, _)| snag.remedy != Remedy::Ask)
        .flat_map(|(snag, _)| [(snag.joint, snag.first_key), (snag.joint, snag.last_key + 1)])
        .collect();
    found.retain(|(snag, _)| {
        let is_asked = snag.kind == SnagKind::LongWay && snag.remedy == Remedy::Ask;
        !(is_asked && jumps.contains(&(snag.joint, snag.last_key)))
    });
}

#[derive(Default)]
struct JointOutcome {
    /// Each with the change of its mend in radians.
    snags: Vec<(Snag, f64)>,
    mended: Option<RotationTrack>,
    /// Found, and mended when it is this joint's turn, since what other joints do matters.
    asking: Vec<Snag>,
}

fn one_joint(clip: &Clip, joint: usize, snags: Vec<Snag>) -> JointOutcome {
    if snags.iter().any(asks_others) {
        return JointOutcome { asking: snags, ..JointOutcome::default() };
    }
    mended(clip, joint, snags)
}

/// The snags of a joint with the changes of their mends, and its track after them.
fn mended(clip: &Clip, joint: usize, snags: Vec<Snag>) -> JointOutcome {
    let Some(track) = clip.rotation(joint).filter(|_| !snags.is_empty()) else {
        return JointOutcome::default();
    };
    let kind = snags[0].kind;
    if snags.iter().all(|snag| snag.remedy == Remedy::Ask) {
        let snags = snags.into_iter().map(|snag| (snag, 0.0)).collect();
        return JointOutcome { snags, ..JointOutcome::default() };
    }
    let mut draft = Draft::new(track);
    let mut snags: Vec<(Snag, f64)> = snags
        .into_iter()
        .map(|snag| {
            mend(&mut draft, clip, &snag);
            (snag, draft.take_change())
        })
        .collect();
    let mended = draft.finish();
    if let (SnagKind::LongWay, Some(mended)) = (kind, &mended) {
        // Both keys are right as they are: what changes lies between them.
        for (snag, change) in &mut snags {
            *change = change_of_keys_rad(track, mended, snag.first_key, snag.last_key);
        }
    }
    JointOutcome { snags, mended, asking: Vec::new() }
}

//! Finds all snags of a clip, kind by kind, each on what the mends before it left.

use std::collections::BTreeSet;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Arc, OnceLock};

use rayon::prelude::*;

use crate::clip::{Clip, JointTracks, RotationTrack};
use crate::limit::Limits;
use crate::snag::{
    Cancelled, Flips, Memory, Outline, Outlines, Progress, Remedy, Snag, SnagKind, View, find,
    find_half_turns, find_in_clip, find_past_limit, find_with, preset_limits,
};

use super::apply::{apply_all, asks_others, change_at_snag_rad, change_of_keys_rad, mend_row};
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
    let unseen = Outlines::new(clip.joints.len());
    let outcomes: Vec<(Vec<(Snag, f64)>, Clip)> = (0..clip.joints.len())
        .into_par_iter()
        .map(|joint| {
            let mut memory = Memory::default();
            let (mut snags, mut working) = (Vec::new(), clip.clone());
            for &kind in &own {
                if stopped.load(Ordering::Relaxed) {
                    break;
                }
                // Faults of numbers ask for no outline.
                let view = View { clip: &working, outlines: &unseen };
                let outcome = mended(&working, joint, find_with(view, joint, kind, &mut memory));
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
    let mut outlines = Outlines::new(clip.joints.len());
    for kind in others {
        if kind.is_of_clip() {
            found.extend(of_clip(&mut working, kind));
            outlines = Outlines::new(clip.joints.len());
            let whole = clip.joints.len();
            if !progress.report(done.fetch_add(whole, Ordering::Relaxed) + whole, total) {
                return Err(Cancelled);
            }
            continue;
        }
        let view = View { clip: &working, outlines: &outlines };
        let flips = Flips::new(clip.joints.len());
        let told: Vec<Vec<Snag>> = (0..clip.joints.len())
            .into_par_iter()
            .map(|joint| {
                if stopped.load(Ordering::Relaxed) {
                    return Vec::new();
                }
                let snags = match (kind, options.limits.as_deref()) {
                    (SnagKind::PastLimit, Some(limits)) => find_past_limit(&working, joint, limits),
                    (SnagKind::HalfTurn, _) => find_half_turns(view, joint, &side_limits, &flips),
                    _ => find_with(view, joint, kind, &mut Memory::default()),
                };
                if !progress.report(done.fetch_add(1, Ordering::Relaxed) + 1, total) {
                    stopped.store(true, Ordering::Relaxed);
                }
                snags
            })
            .collect();
        if stopped.load(Ordering::Relaxed) {
            return Err(Cancelled);
        }
        if told.iter().flatten().any(asks_others) {
            // One after the other: each sees what the mends before it made of the other joints.
            for (joint, snags) in told.into_iter().enumerate() {
                let outcome = mended(&working, joint, snags);
                found.extend(outcome.snags);
                if let Some(track) = outcome.mended {
                    working = working.with_rotation(joint, track);
                    outlines.forget(joint);
                }
            }
        } else {
            let slots = working.joints.par_iter_mut().zip(outlines.each_mut()).zip(told);
            let outcomes: Vec<Vec<(Snag, f64)>> = slots
                .map(|((tracks, outline), snags)| mended_in_place(clip, tracks, outline, snags))
                .collect();
            found.extend(outcomes.into_iter().flatten());
        }
    }
    if options.kinds.contains(&SnagKind::Wrap) {
        let mut left = wraps_left(clip, &working, &found);
        if !left.is_empty() {
            safe_where_seen(clip, &found, &mut left);
            let joints: BTreeSet<usize> = left.iter().map(|snag| snag.joint).collect();
            found.extend(left.into_iter().map(|snag| (snag, 0.0)));
            working = mended_anew(clip, working, &found, &joints);
        }
    }
    drop_told_twice(&mut found);
    found.sort_by_key(|(snag, _)| (snag.first_frame, snag.joint, snag.kind, snag.first_key, snag.last_key));
    let (snags, changes_rad) = found.into_iter().unzip();
    Ok(Survey { snags, mended: working, changes_rad })
}

/// Whole turns that a jump of the pose has hidden: where a mend has taken the jump away, what follows may still be stored a turn off.
/// Such a mend only adds whole turns to keys behind the earlier mend, so that it may be made before or after it.
fn wraps_left(clip: &Clip, working: &Clip, found: &[(Snag, f64)]) -> Vec<Snag> {
    let mut jumped = vec![false; clip.joints.len()];
    let mut runs: Vec<Vec<(usize, usize)>> = vec![Vec::new(); clip.joints.len()];
    for (snag, _) in found.iter().filter(|(snag, _)| snag.remedy != Remedy::Ask) {
        jumped[snag.joint] |= matches!(snag.kind, SnagKind::HalfTurn | SnagKind::Spike);
        if !snag.kind.keeps_pose() || snag.kind == SnagKind::MirroredAngles {
            // A run follows the numbers before it, so both must be shifted alike.
            runs[snag.joint].push((snag.first_key.saturating_sub(1), snag.last_key));
        }
    }
    let joints = runs.into_par_iter().enumerate();
    joints
        .filter(|(joint, _)| jumped[*joint] && !clip.same_joint(working, *joint))
        .flat_map_iter(|(joint, runs)| {
            let borders = Borders::new(runs);
            let told = find(working, joint, SnagKind::Wrap);
            told.into_iter().filter(move |wrap| {
                let splits = borders.are_within(wrap.first_key) || borders.are_within(wrap.last_key + 1);
                matches!(wrap.remedy, Remedy::Unwrap(_)) && !splits
            })
        })
        .collect()
}

/// A wrap that shows only where a jump is mended that is left to a person is left to them too: beside the jump it would leave numbers a
/// turn off.
fn safe_where_seen(clip: &Clip, found: &[(Snag, f64)], wraps: &mut [Snag]) {
    for joint in wraps.iter().map(|wrap| wrap.joint).collect::<BTreeSet<usize>>() {
        let own = found.iter().map(|(snag, _)| snag).filter(|snag| snag.joint == joint);
        let (mut safe, left): (Vec<Snag>, Vec<Snag>) =
            own.filter(|snag| snag.remedy != Remedy::Ask).cloned().partition(|snag| snag.safe);
        if left.is_empty() {
            continue;
        }
        safe.sort_by_key(in_order);
        // What was found in a clip fits it.
        let Ok(mended) = apply_all(clip, &safe) else { continue };
        let seen = find(&mended, joint, SnagKind::Wrap);
        let is_seen = |wrap: &Snag| {
            let keys = (wrap.first_key, wrap.last_key);
            seen.iter().any(|seen| (seen.first_key, seen.last_key) == keys && seen.remedy == wrap.remedy)
        };
        for wrap in wraps.iter_mut().filter(|wrap| wrap.joint == joint && !is_seen(wrap)) {
            wrap.safe = false;
            wrap.text.push_str(", which shows once a jump left to you is mended");
        }
    }
}

/// Mending order, joint by joint.
fn in_order(snag: &Snag) -> (SnagKind, usize, usize, usize) {
    (snag.kind, snag.joint, snag.first_key, snag.last_key)
}

/// Runs of keys, asked for borders that lie within one of them.
struct Borders {
    /// For runs in the order of their first keys: that, and the last key of this run and all before it.
    reach: Vec<(usize, usize)>,
}

impl Borders {
    fn new(mut runs: Vec<(usize, usize)>) -> Self {
        runs.sort_unstable();
        let mut farthest = 0;
        for (_, last) in &mut runs {
            farthest = farthest.max(*last);
            *last = farthest;
        }
        Self { reach: runs }
    }

    /// Whether a run holds both `key` and the key before.
    fn are_within(&self, key: usize) -> bool {
        let before = self.reach.partition_point(|(first, _)| *first < key);
        before > 0 && self.reach[before - 1].1 >= key
    }
}

/// The clip with all mends made in mending order from the start, as everyone makes them: the same bits. `working` is what they came to
/// before some wraps were found in `joints`.
fn mended_anew(clip: &Clip, mut working: Clip, found: &[(Snag, f64)], joints: &BTreeSet<usize>) -> Clip {
    let is_bound = |snag: &Snag| asks_others(snag) || snag.kind.is_of_clip();
    if found.iter().any(|(snag, _)| is_bound(snag)) {
        let mut sorted: Vec<Snag> = found.iter().map(|(snag, _)| snag.clone()).collect();
        sorted.sort_by_key(in_order);
        return apply_all(clip, &sorted).unwrap_or(working);
    }
    // Each joint for itself; the others are as they are.
    let mut own: Vec<Vec<Snag>> = vec![Vec::new(); clip.joints.len()];
    for (snag, _) in found.iter().filter(|(snag, _)| joints.contains(&snag.joint)) {
        own[snag.joint].push(snag.clone());
    }
    working.joints.par_iter_mut().zip(&clip.joints).zip(own).for_each(|((tracks, source), mut snags)| {
        if !snags.is_empty() {
            snags.sort_by_key(in_order);
            // What it was gives its memory back first.
            tracks.clone_from(source);
            mended_in_place(clip, tracks, None, snags);
        }
    });
    working
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
}

/// The snags of a joint with the changes of their mends, and its track after them.
fn mended(clip: &Clip, joint: usize, snags: Vec<Snag>) -> JointOutcome {
    let Some(track) = clip.rotation(joint).filter(|_| !snags.is_empty()) else {
        return JointOutcome::default();
    };
    let is_long_way = snags[0].kind == SnagKind::LongWay;
    if are_all_asked(&snags) {
        return JointOutcome { snags: without_change(snags), mended: None };
    }
    let mut draft = Draft::new(track);
    let mut changes = mend_row(&mut draft, clip, &snags);
    let mended = draft.finish();
    if let (true, Some(mended)) = (is_long_way, &mended) {
        // Both keys are right as they are: what changes lies between them.
        for (snag, change) in snags.iter().zip(&mut changes) {
            *change = change_of_keys_rad(track, mended, snag.first_key, snag.last_key);
        }
    }
    JointOutcome { snags: snags.into_iter().zip(changes).collect(), mended }
}

/// Mends snags that ask for no other joint in the tracks themselves, which are copied where others share them, and gives them with the
/// changes of their mends. `outline` is told what changes.
fn mended_in_place(
    clip: &Clip,
    tracks: &mut Arc<JointTracks>,
    outline: Option<&mut Outline>,
    snags: Vec<Snag>,
) -> Vec<(Snag, f64)> {
    if are_all_asked(&snags) {
        return without_change(snags);
    }
    let (mut own, shared) = match Arc::try_unwrap(std::mem::take(tracks)) {
        Ok(own) => (own, None),
        Err(shared) => ((*shared).clone(), Some(shared)),
    };
    let mut changes = Vec::new();
    if let Some(track) = own.rotation.take() {
        let mut draft = Draft::of(track);
        changes = mend_row(&mut draft, clip, &snags);
        if let (false, Some(shared)) = (draft.is_changed(), &shared) {
            // Still shared.
            tracks.clone_from(shared);
            return snags.into_iter().zip(changes).collect();
        }
        let (track, touched) = draft.into_track();
        if let Some(outline) = outline {
            outline.look_again(&track, &touched);
        }
        own.rotation = Some(track);
    }
    *tracks = Arc::new(own);
    snags.into_iter().zip(changes).collect()
}

fn are_all_asked(snags: &[Snag]) -> bool {
    snags.iter().all(|snag| snag.remedy == Remedy::Ask)
}

fn without_change(snags: Vec<Snag>) -> Vec<(Snag, f64)> {
    snags.into_iter().map(|snag| (snag, 0.0)).collect()
}

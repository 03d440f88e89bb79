//! The door to the finders.

use std::cell::OnceCell;

use crate::clip::Clip;
use crate::limit::{Limits, adult};

use super::{
    Flips, Memory, Outlines, Snag, SnagKind, View, broken_value, half_turn, jitter, long_way,
    mirrored_angles, seam, sign_flip, slide, spike, stuck, wrap,
};

/// Finds the snags of one kind in one joint of `clip` as it is, in the order of their keys.
///
/// The kinds build on one another: each expects that the kinds before it in [`SnagKind::ALL`] are mended. Carriers and
/// joints without keys have none. [`SnagKind::PastLimit`] needs limits: [`find_past_limit`](super::find_past_limit).
pub fn find(clip: &Clip, joint: usize, kind: SnagKind) -> Vec<Snag> {
    let outlines = Outlines::new(clip.joints.len());
    find_with(View { clip, outlines: &outlines }, joint, kind, &mut Memory::default())
}

/// As [`find`], with what the earlier kinds have worked out about the clip and the same joint.
pub fn find_with(view: View<'_>, joint: usize, kind: SnagKind, memory: &mut Memory) -> Vec<Snag> {
    let clip = view.clip;
    let mut snags = match kind {
        SnagKind::BrokenValue => broken_value::find(view, joint, memory),
        SnagKind::SignFlip => sign_flip::find(view, joint),
        SnagKind::Wrap => wrap::find(view, joint, memory),
        SnagKind::MirroredAngles => mirrored_angles::find(view, joint, memory),
        SnagKind::LongWay => long_way::find(view, joint, memory),
        SnagKind::HalfTurn => {
            let adult = OnceCell::new();
            let limits = || adult.get_or_init(|| preset_limits(clip)).as_ref();
            half_turn::find_half_turns(view, joint, &limits, &Flips::new(clip.joints.len()))
        }
        SnagKind::Spike => spike::find(view, joint),
        SnagKind::Stuck => stuck::find(view, joint),
        SnagKind::Jitter => jitter::find(view, joint),
        // Only against limits: see `find_past_limit`.
        SnagKind::PastLimit => Vec::new(),
        SnagKind::Seam | SnagKind::Slide => {
            find_in_clip(clip, kind).into_iter().filter(|snag| snag.joint == joint).collect()
        }
    };
    snags.sort_by_key(|snag| (snag.first_key, snag.last_key));
    snags
}

/// Limits for telling which side of a jump is the wrong one, where none are given: those of the preset for a human figure, by its rest
/// pose alone, since how it moves is in question. `None` for other figures.
pub fn preset_limits(clip: &Clip) -> Option<Limits> {
    adult::limits(&clip.skeleton).ok().map(|adult| adult.limits)
}

/// Finds the snags of one kind in all joints of `clip` as it is, by joint and key. Cheaper than [`find`] for each joint where the kind is
/// one of the whole clip ([`SnagKind::is_of_clip`]).
pub fn find_in_clip(clip: &Clip, kind: SnagKind) -> Vec<Snag> {
    let mut snags = match kind {
        SnagKind::Seam => seam::find_all(clip),
        SnagKind::Slide => slide::find_all(clip),
        _ => {
            let outlines = Outlines::new(clip.joints.len());
            let view = View { clip, outlines: &outlines };
            let joints = 0..clip.joints.len();
            joints.flat_map(|joint| find_with(view, joint, kind, &mut Memory::default())).collect()
        }
    };
    snags.sort_by_key(|snag| (snag.joint, snag.first_key, snag.last_key));
    snags
}

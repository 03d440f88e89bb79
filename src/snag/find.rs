//! The door to the finders.

use std::cell::OnceCell;

use crate::clip::Clip;
use crate::limit::{Limits, adult};

use super::{
    Memory, Snag, SnagKind, broken_value, half_turn, jitter, long_way, mirrored_angles, seam, sign_flip,
    slide, spike, stuck, wrap,
};

/// Finds the snags of one kind in one joint of `clip` as it is, in the order of their keys.
///
/// The kinds build on one another: each expects that the kinds before it in [`SnagKind::ALL`] are mended. Carriers and
/// joints without keys have none. [`SnagKind::PastLimit`] needs limits: [`find_past_limit`](super::find_past_limit).
pub fn find(clip: &Clip, joint: usize, kind: SnagKind) -> Vec<Snag> {
    find_with(clip, joint, kind, &mut Memory::default())
}

/// As [`find`], with what the earlier kinds have worked out about the same joint.
pub fn find_with(clip: &Clip, joint: usize, kind: SnagKind, memory: &mut Memory) -> Vec<Snag> {
    let mut snags = match kind {
        SnagKind::BrokenValue => broken_value::find(clip, joint),
        SnagKind::SignFlip => sign_flip::find(clip, joint),
        SnagKind::Wrap => wrap::find(clip, joint, memory),
        SnagKind::MirroredAngles => mirrored_angles::find(clip, joint, memory),
        SnagKind::LongWay => long_way::find(clip, joint, memory),
        SnagKind::HalfTurn => {
            let adult = OnceCell::new();
            half_turn::find_half_turns(clip, joint, &|| adult.get_or_init(|| preset_limits(clip)).as_ref())
        }
        SnagKind::Spike => spike::find(clip, joint),
        SnagKind::Stuck => stuck::find(clip, joint),
        SnagKind::Jitter => jitter::find(clip, joint),
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
        _ => (0..clip.joints.len()).flat_map(|joint| find(clip, joint, kind)).collect(),
    };
    snags.sort_by_key(|snag| (snag.joint, snag.first_key, snag.last_key));
    snags
}

//! The door to the finders.

use crate::clip::Clip;

use super::{
    Snag, SnagKind, broken_value, half_turn, long_way, mirrored_angles, sign_flip, spike, stuck, wrap,
};

/// Finds the snags of one kind in one joint of `clip` as it is, in the order of their keys.
///
/// The kinds build on one another: each expects that the kinds before it in [`SnagKind::ALL`] are mended. Carriers and
/// joints without keys have none. [`SnagKind::PastLimit`] needs limits: [`find_past_limit`](super::find_past_limit).
pub fn find(clip: &Clip, joint: usize, kind: SnagKind) -> Vec<Snag> {
    let mut snags = match kind {
        SnagKind::BrokenValue => broken_value::find(clip, joint),
        SnagKind::SignFlip => sign_flip::find(clip, joint),
        SnagKind::Wrap => wrap::find(clip, joint),
        SnagKind::MirroredAngles => mirrored_angles::find(clip, joint),
        SnagKind::LongWay => long_way::find(clip, joint),
        SnagKind::HalfTurn => half_turn::find(clip, joint),
        SnagKind::Spike => spike::find(clip, joint),
        SnagKind::Stuck => stuck::find(clip, joint),
        // Only against limits: see `find_past_limit`.
        SnagKind::PastLimit => Vec::new(),
    };
    snags.sort_by_key(|snag| (snag.first_key, snag.last_key));
    snags
}

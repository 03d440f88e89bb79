//! Where the ends of limbs moved too far, and which joint should keep a key there.

use std::collections::{BTreeMap, BTreeSet};

use glam::DVec3;

use crate::skeleton::WorldJoint;

use super::super::take::Clip;

/// Times between neighbouring frames at which places are compared.
const BETWEEN: usize = 4;
/// At those the bound is met with something to spare for the times that nobody looks at.
const TO_SPARE: f64 = 0.99;

/// Joints, each with the time of a key of `before` that `after` lacks and that would bring a tip nearer: for each stretch of
/// frames over which some tip is off by more than `bound`, the joint above it whose turn is off most for the tip.
pub(super) fn keys_wanted(before: &Clip, after: &Clip, bound: f64) -> BTreeSet<(usize, Secs)> {
    let times = times(before);
    let skeleton = &before.skeleton;
    let ends: Vec<(usize, DVec3)> = (0..skeleton.len())
        .flat_map(|joint| {
            let own = &skeleton.joints()[joint].tips;
            let is_end = skeleton.children(joint).is_empty() && own.is_empty();
            own.iter().copied().chain(is_end.then_some(DVec3::ZERO)).map(move |tip| (joint, tip))
        })
        .collect();
    // For each end the worst time of the stretch that is open.
    let mut open: BTreeMap<usize, (f64, f64)> = BTreeMap::new();
    let mut worst: Vec<(usize, f64)> = Vec::new();
    for chunk in times.chunks(1024) {
        let [old, new] = [before, after].map(|clip| clip.locals_at_by(chunk, None));
        for ((&secs, old), new) in chunk.iter().zip(&old).zip(&new) {
            let [old, new] = [old, new].map(|pose| skeleton.world(pose));
            for (end, &(joint, tip)) in ends.iter().enumerate() {
                let place = |world: &[WorldJoint]| world[joint].scene_from_joint.transform_point3(tip);
                let off = place(&old).distance(place(&new));
                if off > bound * TO_SPARE {
                    let so_far = open.entry(end).or_insert((off, secs));
                    if off > so_far.0 {
                        *so_far = (off, secs);
                    }
                } else if let Some((_, secs)) = open.remove(&end) {
                    worst.push((end, secs));
                }
            }
        }
    }
    worst.extend(open.into_iter().map(|(end, (_, secs))| (end, secs)));
    worst.into_iter().filter_map(|(end, secs)| key_for(before, after, ends[end].0, secs)).collect()
}

/// A time that can stand in a set.
pub(super) type Secs = OrderedSecs;

/// Seconds, ordered as numbers are.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct OrderedSecs(pub(super) f64);

impl OrderedSecs {
    pub(super) fn to_bits(self) -> u64 {
        self.0.to_bits()
    }
}

impl Eq for OrderedSecs {}

impl PartialOrd for OrderedSecs {
    fn partial_cmp(&self, other: &Self) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for OrderedSecs {
    fn cmp(&self, other: &Self) -> std::cmp::Ordering {
        self.0.total_cmp(&other.0)
    }
}

/// Of the joints from `end` up the one whose tracks, put back at this time, would bring the end nearest; and its key there.
fn key_for(before: &Clip, after: &Clip, end: usize, secs: f64) -> Option<(usize, Secs)> {
    let skeleton = &before.skeleton;
    let (wanted, given) = (before.local_at(secs), after.local_at(secs));
    let place = |pose: &[crate::skeleton::Transform]| skeleton.world(pose)[end].position();
    let goal = place(&wanted);
    let chain = std::iter::successors(Some(end), |&joint| skeleton.joints()[joint].parent);
    let candidates = chain.filter_map(|joint| {
        let key = key_lost(before, after, joint, secs)?;
        let mut pose = given.clone();
        pose[joint] = wanted[joint];
        // The end joint's own turn moves its tips alone; they count as one unit of length.
        let tip = |pose: &[crate::skeleton::Transform]| {
            let world = skeleton.world(pose);
            let own = &skeleton.joints()[end].tips;
            own.first()
                .map_or(world[end].position(), |&tip| world[end].scene_from_joint.transform_point3(tip))
        };
        let off = if skeleton.joints()[end].tips.is_empty() {
            place(&pose).distance(goal)
        } else {
            tip(&pose).distance(tip(&wanted))
        };
        Some((off, joint, key))
    });
    candidates.min_by(|a, b| a.0.total_cmp(&b.0)).map(|(_, joint, key)| (joint, OrderedSecs(key)))
}

/// The time of the key of `before` nearest to `secs` that `after` no longer has, of the joint's turns, else its places.
fn key_lost(before: &Clip, after: &Clip, joint: usize, secs: f64) -> Option<f64> {
    let turns = [before, after].map(|clip| clip.rotation(joint).map(|track| &track.times));
    let places =
        [before, after].map(|clip| clip.joints[joint].translation.as_ref().map(|track| &track.times));
    [turns, places].into_iter().find_map(|[old, new]| {
        let (old, new) = (old?, new?);
        let near = old.nearest(secs);
        let around = [Some(near), near.checked_sub(1), Some(near + 1)];
        let keys = around.into_iter().flatten().filter(|&key| key < old.len()).map(|key| old.at(key));
        let is_lost = |key: &f64| !new.is_empty() && new.at(new.nearest(*key)).to_bits() != key.to_bits();
        keys.into_iter().find(is_lost)
    })
}

/// Every frame and key, and times between them.
fn times(clip: &Clip) -> Vec<f64> {
    let keys =
        clip.joints.iter().filter_map(|tracks| tracks.rotation.as_ref()).flat_map(|track| track.times.iter());
    let mut marks: Vec<f64> = clip.grid.times.iter().chain(keys).collect();
    marks.sort_by(f64::total_cmp);
    marks.dedup();
    let mut all = Vec::with_capacity(marks.len() * BETWEEN);
    for pair in marks.windows(2) {
        let share = |part: usize| pair[0] + (pair[1] - pair[0]) * (part as f64 / BETWEEN as f64);
        all.extend((0..BETWEEN).map(share));
    }
    all.extend(marks.last());
    all
}

//! The transfer itself: frame by frame, joint by joint.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times, VectorTrack, Worlds};
use crate::limit::adult;
use crate::rotor::{Rotor, SwingTwist};
use crate::skeleton::LocalPose;

use super::chain::spread;
use super::figure::Figure;
use super::hands;
use super::joint_map::JointMap;
use super::keep;
use super::measure;
use super::options::Options;
use super::plan::{self, Drive, Plan, Root};
use super::report::Report;
use super::stand;

/// Frames whose source poses are computed together.
const CHUNK: usize = 512;

/// A clip on its new skeleton.
#[derive(Clone, Debug, PartialEq)]
pub struct Retargeted {
    /// The clip, of the source's name, frames and length.
    pub clip: Clip,
    /// What it came to.
    pub report: Report,
}

/// A clip that can't be carried over.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum RetargetError {
    /// Nothing is linked.
    #[error("expected at least one joint of the source to drive one of the target, found none; give a map")]
    NothingMapped,
    /// The source figure is another skeleton than the clip's.
    #[error("expected a clip of the source's {expected} joints, found one of {found}")]
    OtherSkeleton {
        /// Joints of the source figure.
        expected: usize,
        /// Joints of the clip.
        found: usize,
    },
}

/// Carries a clip of `source` over to `target`.
///
/// Each driven joint makes the turn in the scene that its source makes away from the rest pose; rest poses are compared by where limbs point
/// and how they bend, so that the joints' own axes and the pose that counts as rest do not matter. Chains of another length are spread
/// along theirs. The hips' path is scaled by the legs, heights are measured from the ground on both sides.
///
/// The result has a key at every frame of the source and at every key time of its own. The same input gives the same bits.
///
/// Source: Gleicher 1998, "Retargetting motion to new characters"; the methods page, section 20.
///
/// # Errors
/// When nothing is mapped, or the clip is not one of the source's skeleton.
pub fn retarget(
    clip: &Clip,
    source: &Figure,
    target: &Figure,
    map: &JointMap,
    options: &Options,
) -> Result<Retargeted, RetargetError> {
    check(clip, source, map)?;
    let plan = plan::plan(clip, source, target, map);
    let mut report = Report {
        scale: plan.scale,
        source_level: plan.root.as_ref().map(|root| root.levels[0]),
        notes: plan.notes.clone(),
        ..Report::default()
    };
    let is_driven = |joint: &usize| {
        let of = plan.copies.iter().find(|(copy, _)| copy == joint).map_or(*joint, |(_, of)| *of);
        !matches!(plan.drives[of], Drive::Rest)
    };
    report.driven = [target.skeleton.listed().filter(is_driven).count(), target.skeleton.listed().count()];
    let times = times(clip, map);
    let tracks = run(clip, target, map, &plan, &times);
    let grid = FrameGrid { times: clip.grid.times.clone(), rate: clip.grid.rate };
    let mut result = Clip {
        name: clip.name.clone(),
        skeleton: target.skeleton.clone(),
        joints: tracks,
        grid,
        duration_secs: clip.duration_secs,
    };
    let is_changed = options.plant_feet || !options.hands.is_empty() || options.limits.is_some();
    if options.measure && is_changed {
        measure::measure(clip, source, target, map, &plan, &result, &mut report);
        report.unheld_direction_rad = report.worst_direction_rad();
    }
    let (mut held, mut goals) = (None, Vec::new());
    if options.plant_feet {
        let said = options.feet.as_deref();
        (result, held) = stand::hold_feet(clip, [source, target], &plan, said, result, &mut report);
    }
    if !options.hands.is_empty() {
        (result, goals) =
            hands::hold_hands(clip, [source, target], &plan, &options.hands, result, &mut report);
    }
    if let Some(kept) = &options.limits {
        if let Some(limits) = keep::limits_for(kept, [source, target], &plan, &result, &mut report) {
            goals.extend(held.iter().flat_map(|held| held.goals(&result)));
            let clamped = keep::keep_limits(&limits, plan.root.as_ref(), &goals, &result, &mut report);
            if let Some(held) = &held {
                held.measure_again(&clamped, &mut report);
            }
            keep::note_use(&limits, &result, &clamped, &mut report);
            result = clamped;
        }
    } else if options.measure
        && target.root.is_none()
        && let Ok(found) = adult::limits_for(&result)
    {
        keep::note_use(&found.limits, &result, &result, &mut report);
    }
    for &(copy, of) in &plan.copies {
        result.joints[copy] = Arc::clone(&result.joints[of]);
    }
    if options.measure {
        measure::measure(clip, source, target, map, &plan, &result, &mut report);
        if !is_changed {
            report.unheld_direction_rad = report.worst_direction_rad();
        }
    }
    Ok(Retargeted { clip: result, report })
}

/// A transfer worked out once, for single poses at any time: what a window shows before the whole clip is carried over. Nothing is held.
#[derive(Clone, Debug)]
pub struct Transfer {
    clip: Arc<Clip>,
    target: Figure,
    plan: Plan,
}

/// What drives a joint of the target.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Driver {
    /// Nothing: it keeps its rest against its parent.
    Rest,
    /// One joint of the source.
    Joint(usize),
    /// A chain of the source with more or fewer joints, spread along its length.
    Chain(Vec<usize>),
    /// The twist of the limb it lies on, of which it has a share; the joint whose bone that is.
    Twist(usize),
    /// Another joint of the target, which it is a copy of.
    Copy(usize),
}

impl Transfer {
    /// Works out how each joint is driven.
    ///
    /// # Errors
    /// As [`retarget`].
    pub fn new(
        clip: &Arc<Clip>,
        source: &Figure,
        target: &Figure,
        map: &JointMap,
    ) -> Result<Self, RetargetError> {
        check(clip, source, map)?;
        let plan = plan::plan(clip, source, target, map);
        Ok(Self { clip: Arc::clone(clip), target: target.clone(), plan })
    }

    /// What drives a joint of the target.
    ///
    /// # Panics
    /// When there is no such joint.
    pub fn driver(&self, joint: usize) -> Driver {
        match &self.plan.drives[joint] {
            Drive::Direct { source, .. } => Driver::Joint(*source),
            Drive::Spread { chain, .. } => {
                Driver::Chain(self.plan.chains[*chain].sources.iter().map(|(joint, _)| *joint).collect())
            }
            Drive::Rest => {
                let twist = self.plan.twists.iter().find(|own| own.helper == joint);
                let copy = self.plan.copies.iter().find(|(copy, _)| *copy == joint);
                let twist = twist.map(|share| Driver::Twist(share.of));
                twist.or_else(|| copy.map(|&(_, of)| Driver::Copy(of))).unwrap_or(Driver::Rest)
            }
        }
    }

    /// Target lengths as multiples of source lengths.
    pub fn scale(&self) -> f64 {
        self.plan.scale
    }

    /// A direction of the source's scene in the target's.
    pub fn turned(&self, direction: DVec3) -> DVec3 {
        self.plan.turned.apply(direction)
    }

    /// The target's pose at a time in seconds: each joint relative to its parent.
    pub fn pose_at(&self, secs: f64) -> LocalPose {
        let worlds = self.clip.worlds_at(&[secs]);
        let n = self.target.skeleton.len();
        let mut scene = vec![Rotor::IDENTITY; n];
        let mut turns = vec![Vec::new(); n];
        pose(&self.target, &self.plan, &worlds, 0, &mut scene, &mut turns);
        let mut local = self.target.rest.clone();
        for (own, keys) in local.iter_mut().zip(&turns) {
            if let Some(turn) = keys.first() {
                own.rotation = *turn;
            }
        }
        if let Some(root) = &self.plan.root {
            let followed: DVec3 = root.follows.iter().map(|&joint| worlds.position(joint, 0)).sum();
            let place = root.place(&self.plan, followed / root.follows.len() as f64, scene[root.target]);
            local[root.target].translation = place;
        }
        for own in &self.plan.moves {
            let rest = self.clip.skeleton.joints()[own.source].rest.translation;
            let track = self.clip.joints[own.source].translation.as_ref();
            let moved = track.and_then(|track| track.at(secs)).unwrap_or(rest) - rest;
            let to = self.target.rest[own.target].translation;
            local[own.target].translation = to + own.turn.apply(moved) * own.factor;
        }
        for &(copy, of) in &self.plan.copies {
            local[copy] = local[of];
        }
        local
    }
}

fn check(clip: &Clip, source: &Figure, map: &JointMap) -> Result<(), RetargetError> {
    if clip.joints.len() != source.skeleton.len() {
        let (expected, found) = (source.skeleton.len(), clip.joints.len());
        return Err(RetargetError::OtherSkeleton { expected, found });
    }
    if map.links.is_empty() {
        return Err(RetargetError::NothingMapped);
    }
    Ok(())
}

/// Every frame, and every key of the joints that drive something, as long as those do not make many times more.
fn times(clip: &Clip, map: &JointMap) -> Times {
    let frames = clip.grid.count();
    let most = 4 * frames + 1000;
    let is_on_grid = |times: &Times| *times == clip.grid.times;
    let mut all: Vec<f64> = Vec::new();
    for link in &map.links {
        let tracks = &clip.joints[link.source];
        let rows = [
            tracks.rotation.as_ref().map(|track| &track.times),
            tracks.translation.as_ref().map(|track| &track.times),
        ];
        for times in rows.into_iter().flatten().filter(|times| !is_on_grid(times)) {
            if all.len() < 64 * most {
                all.extend(times.iter());
            }
        }
    }
    if all.is_empty() {
        return clip.grid.times.clone();
    }
    all.extend(clip.grid.times.iter());
    all.retain(|time| time.is_finite() && *time >= 0.0);
    all.sort_by(f64::total_cmp);
    all.dedup_by(|a, b| *a - *b < 1e-6);
    if all.len() > most || all.len() == frames && all.iter().zip(clip.grid.times.iter()).all(|(a, b)| *a == b)
    {
        return clip.grid.times.clone();
    }
    Times::Listed(all.into())
}

fn run(clip: &Clip, target: &Figure, map: &JointMap, plan: &Plan, times: &Times) -> Vec<Arc<JointTracks>> {
    let n = target.skeleton.len();
    let own_rest = target.skeleton.rest_pose();
    let mut turns: Vec<Vec<Rotor>> = (0..n)
        .map(|joint| {
            let moves = !matches!(plan.drives[joint], Drive::Rest)
                || plan.twists.iter().any(|own| own.helper == joint);
            Vec::with_capacity(if moves { times.len() } else { 0 })
        })
        .collect();
    let mut places: Vec<DVec3> = Vec::new();
    let all: Vec<f64> = times.iter().collect();
    let mut scene = vec![Rotor::IDENTITY; n];
    for chunk in all.chunks(CHUNK) {
        let worlds = clip.worlds_at(chunk);
        for time in 0..chunk.len() {
            pose(target, plan, &worlds, time, &mut scene, &mut turns);
            if let Some(root) = &plan.root {
                let followed: DVec3 = root.follows.iter().map(|&joint| worlds.position(joint, time)).sum();
                places.push(root.place(plan, followed / root.follows.len() as f64, scene[root.target]));
            }
        }
    }
    let mut tracks: Vec<JointTracks> = turns
        .into_iter()
        .enumerate()
        .map(|(joint, keys)| {
            let rotation = if keys.is_empty() {
                // A rest that is not the skeleton's own has to be said.
                let differs = target.rest[joint].rotation.turn_to(own_rest[joint].rotation) > 1e-12;
                differs.then(|| constant(target.rest[joint].rotation))
            } else {
                Some(RotationTrack::from_rotors(times.clone(), keys))
            };
            let moved = target.rest[joint].translation;
            let translation = (moved != own_rest[joint].translation)
                .then(|| VectorTrack::straight(Times::Listed([0.0].into()), [moved]));
            JointTracks { rotation, translation, scale: None }
        })
        .collect();
    if let Some(root) = &plan.root {
        tracks[root.target].translation = Some(VectorTrack::straight(times.clone(), places));
    }
    for own in &plan.moves {
        if let Some(track) = moved(clip, target, own, times, map.same_build.is_some()) {
            tracks[own.target].translation = Some(track);
        }
    }
    if map.same_build.is_some() {
        for link in &map.links {
            let from = &clip.joints[link.source];
            tracks[link.target].scale.clone_from(&from.scale);
            // The very track, with all its keys and paths, where both joints have the same axes.
            if let (Some(track), Drive::Direct { .. }) = (&from.rotation, &plan.drives[link.target])
                && has_same_axes(clip, target, plan, link.source, link.target)
            {
                tracks[link.target].rotation = Some(track.clone());
            }
        }
    }
    tracks.into_iter().map(Arc::new).collect()
}

fn constant(rotor: Rotor) -> RotationTrack {
    RotationTrack::from_rotors(Times::Listed([0.0].into()), [rotor])
}

/// Whether a turn against the parent means the same for both joints.
fn has_same_axes(clip: &Clip, target: &Figure, plan: &Plan, from: usize, to: usize) -> bool {
    let rests = [clip.skeleton.joints()[from].rest.rotation, target.skeleton.joints()[to].rest.rotation];
    let right = |joint: usize| match &plan.drives[joint] {
        Drive::Direct { right, .. } => Some(*right),
        _ => None,
    };
    let parents = [clip.skeleton.joints()[from].parent, target.skeleton.joints()[to].parent];
    let same_above = match parents {
        [None, None] => plan.turned.turn() == 0.0,
        [Some(_), Some(up)] => right(up).is_some_and(|right| right.turn() < 1e-14),
        _ => false,
    };
    same_above && rests[0].turn_to(rests[1]) < 1e-14 && right(to).is_some_and(|right| right.turn() < 1e-14)
}

/// A translation relative to the parent, taken over as what it differs from rest by.
fn moved(
    clip: &Clip,
    target: &Figure,
    own: &plan::Move,
    times: &Times,
    is_exact: bool,
) -> Option<VectorTrack> {
    let track = clip.joints[own.source].translation.as_ref()?;
    let from = clip.skeleton.joints()[own.source].rest.translation;
    let to = target.rest[own.target].translation;
    let size = from.length().max(1e-9);
    let differences: Vec<DVec3> = times.iter().map(|secs| track.at(secs).unwrap_or(from) - from).collect();
    // Files that repeat the offset in every frame move nothing.
    let least = if is_exact { 0.0 } else { 1e-6 * size };
    if differences.iter().all(|difference| difference.length() <= least) {
        return None;
    }
    let keys: Vec<DVec3> =
        differences.into_iter().map(|difference| to + own.turn.apply(difference) * own.factor).collect();
    Some(VectorTrack::straight(times.clone(), keys))
}

impl Root {
    /// Where the target's hips come to, relative to their parent.
    fn place(&self, plan: &Plan, source: DVec3, turn: Rotor) -> DVec3 {
        let flat = |v: DVec3, up: DVec3| v - up * v.dot(up);
        let path = plan.turned.apply(flat(source - self.anchors[0], self.ups[0])) * plan.scale;
        let height = self.levels[1] + plan.scale * (source.dot(self.ups[0]) - self.levels[0]);
        let place = flat(self.anchors[1], self.ups[1]) + path + self.ups[1] * height;
        self.parent_from_scene.transform_point3(place - turn.apply(self.offset))
    }
}

/// One pose of the target: turns in the scene in `scene`, those against the parents added to `turns`.
fn pose(
    target: &Figure,
    plan: &Plan,
    worlds: &Worlds,
    time: usize,
    scene: &mut [Rotor],
    turns: &mut [Vec<Rotor>],
) {
    let spread: Vec<Vec<Rotor>> =
        plan.chains.iter().map(|chain| spread_turns(plan, chain, worlds, time)).collect();
    let wanted = |joint: usize| match &plan.drives[joint] {
        Drive::Rest => None,
        Drive::Direct { source, right } => Some(plan.turned * worlds.rotation(*source, time) * *right),
        Drive::Spread { chain, place, right } => Some(spread[*chain][*place] * *right),
    };
    for (joint, own) in target.skeleton.joints().iter().enumerate() {
        let above = own.parent.map_or(Rotor::IDENTITY, |parent| scene[parent]);
        let rest = target.rest[joint].rotation;
        let Some(mut turn) = wanted(joint) else {
            scene[joint] = above * rest;
            if let Some(share) = plan.twists.iter().find(|own| own.helper == joint) {
                let turned = helper_turn(target, share, scene, &wanted).unwrap_or(scene[joint]);
                scene[joint] = turned;
                push(&mut turns[joint], above.reverse() * turned);
            }
            continue;
        };
        if let Some(keep) = plan.keeps[joint]
            && let Some(axis) = own_axis(target, joint)
        {
            let split = SwingTwist::new((above * rest).reverse() * turn, axis);
            turn = above * rest * split.swing * split.twist.pow(keep);
        }
        scene[joint] = turn;
        push(&mut turns[joint], above.reverse() * turn);
    }
}

/// Keys follow the sign of the one before, so that all players turn the short way.
fn push(keys: &mut Vec<Rotor>, turn: Rotor) {
    let turn = turn.normalize();
    let turn = keys.last().map_or(turn, |&before| turn.aligned_to(before));
    keys.push(turn);
}

/// The direction of a joint's bone in its own frame.
fn own_axis(target: &Figure, joint: usize) -> Option<DVec3> {
    let shape = &target.roles.shape;
    shape.limb_direction(joint).map(|direction| shape.rotations[joint].reverse().apply(direction))
}

/// The turn in the scene of a joint that shares in a bone's twist.
fn helper_turn(
    target: &Figure,
    share: &plan::TwistShare,
    scene: &[Rotor],
    wanted: &dyn Fn(usize) -> Option<Rotor>,
) -> Option<Rotor> {
    let axis = own_axis(target, share.of)?;
    if share.is_own {
        let parent = target.skeleton.joints()[share.of].parent;
        let above = parent.map_or(Rotor::IDENTITY, |parent| scene[parent]);
        let base = above * target.rest[share.of].rotation;
        let split = SwingTwist::new(base.reverse() * wanted(share.of)?, axis);
        return Some(base * split.swing * split.twist.pow(share.share) * share.rest);
    }
    // The twist of the joint at the end, as seen from the bone.
    let shape = &target.roles.shape;
    let at_rest = shape.rotations[share.of].reverse() * shape.rotations[share.end];
    let now = scene[share.of].reverse() * wanted(share.end)?;
    let split = SwingTwist::new(now * at_rest.reverse(), axis);
    Some(scene[share.of] * split.twist.pow(share.share) * share.rest)
}

/// The turns of a spread chain's places away from rest, in the target's scene.
fn spread_turns(plan: &Plan, chain: &plan::SpreadChain, worlds: &Worlds, time: usize) -> Vec<Rotor> {
    let away = |(joint, rest): (usize, Rotor)| {
        plan.turned * worlds.rotation(joint, time) * rest.reverse() * plan.turned.reverse()
    };
    let base = chain.base.map_or(Rotor::IDENTITY, away);
    let mut before = Rotor::IDENTITY;
    let cumulative: Vec<Rotor> = chain
        .sources
        .iter()
        .map(|&own| {
            // Each on the side of the one before: a chain that bends far bends on.
            before = (base.reverse() * away(own)).aligned_to(before);
            before
        })
        .collect();
    spread(&cumulative, &chain.from, &chain.knots).into_iter().map(|turn| base * turn).collect()
}

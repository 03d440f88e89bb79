//! Where a clip that is played in a loop ends, and where it begins again.

use glam::DVec3;

use crate::rotor::{Bivector, Rotor, SwingTwist};
use crate::skeleton::JointKind;

use super::{Clip, PathKind, RotationTrack, Times, VectorPath};

/// A root that has turned by more than this about the upright at the end is on a curve, and goes on so in the next round.
const CURVE_RAD: f64 = 15.0 / 180.0 * std::f64::consts::PI;

/// A root that has gone further than this share of the figure's size along the ground is on its way; less is drift.
const STRIDE_SHARE: f64 = 0.15;

/// Steps from which a rate at a seam is told.
const STEPS: usize = 4;

/// How a joint would have to change for its loop to close.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct LoopSeam {
    /// What is missing from the end's turn to the start's, on the bone side, in radians.
    pub turn: Bivector,
    /// The rate at the start less the rate at the end, in radians a second.
    pub turn_rate: Bivector,
    /// What is missing from the end's place to the start's, in the parent's lengths. Without the stride of a root.
    pub place: DVec3,
    /// The rate of places at the start less that at the end, a second.
    pub place_rate: DVec3,
}

/// What of a clip is played round and round.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Round {
    /// The frame it begins at: the first one of the motion. Frames before it show a calibration pose.
    pub first: usize,
    /// Whether the last frame shows the pose of the first once more, as against the pose before it: then the first frame of the next
    /// round takes its place, else follows it.
    pub is_first_again: bool,
}

/// Up to so many frames at the start can be a calibration pose, which the figure leaves from one frame to the next: at least so many
/// joints, and half of those that move, make a step of so many usual ones there.
const CALIBRATION_FRAMES: usize = 2;
const CALIBRATION_JOINTS: usize = 3;
const CALIBRATION_STEPS: f64 = 5.0;
const CALIBRATION_RAD: f64 = 2.0 / 180.0 * std::f64::consts::PI;

/// Steps after it that tell what is usual.
const USUAL_STEPS: usize = 9;

impl Round {
    /// The round of a clip that is a loop.
    pub fn of(clip: &Clip, up: DVec3) -> Self {
        let whole = Self { first: first_of_motion(clip), is_first_again: true };
        Self { is_first_again: whole.ends_on_its_first_pose(clip, up), ..whole }
    }

    /// The same for a last frame that is known to be the first again.
    pub fn closed(clip: &Clip) -> Self {
        Self { first: first_of_motion(clip), is_first_again: true }
    }

    /// Told by which of the two fits the motion better: the sum over all joints of the turn from the last pose, and from the pose that
    /// would come next, to the first. A turn of the root about the upright does not count.
    fn ends_on_its_first_pose(self, clip: &Clip, up: DVec3) -> bool {
        if clip.grid.count() < self.first + 3 {
            return true;
        }
        let mut sums = [0.0; 2];
        for joint in moving_joints(clip) {
            for (sum, is_first_again) in sums.iter_mut().zip([true, false]) {
                *sum += LoopSeam::of(clip, joint, Self { is_first_again, ..self }, up).turn.length();
            }
        }
        sums[0] <= sums[1]
    }
}

fn moving_joints(clip: &Clip) -> impl Iterator<Item = usize> + '_ {
    (0..clip.joints.len()).filter(|&joint| {
        clip.skeleton.joints()[joint].kind == JointKind::Joint
            && clip.rotation(joint).is_some_and(|track| track.keys.len() > 1)
    })
}

/// The frame after a calibration pose at the start of a clip; 0 where there is none.
fn first_of_motion(clip: &Clip) -> usize {
    let grid = &clip.grid;
    // What comes after has to be longer than what tells of it.
    let longest = CALIBRATION_FRAMES.min(grid.count().saturating_sub(2 * USUAL_STEPS));
    let leaves = |first: usize| {
        let (mut moving, mut jumping) = (0, 0);
        for joint in moving_joints(clip) {
            let Some(track) = clip.rotation(joint) else { continue };
            let step = |frame: usize| track.at(grid.time(frame)).turn_to(track.at(grid.time(frame + 1)));
            let mut after: Vec<f64> = (first..first + USUAL_STEPS).map(step).collect();
            after.sort_by(f64::total_cmp);
            let (own, usual) = (step(first - 1), after[USUAL_STEPS / 2]);
            moving += usize::from(own.max(after[USUAL_STEPS - 1]) > 1e-6);
            jumping += usize::from(own > CALIBRATION_RAD.max(CALIBRATION_STEPS * usual));
        }
        jumping >= CALIBRATION_JOINTS && 2 * jumping >= moving
    };
    (1..=longest).rev().find(|&first| leaves(first)).unwrap_or(0)
}

impl LoopSeam {
    /// Compares the end of a joint with the start of its round. `up` is unit, in the scene.
    ///
    /// Of a root the way along the ground stays, and its turn about the upright where it is large enough to be meant.
    pub fn of(clip: &Clip, joint: usize, round: Round, up: DVec3) -> Self {
        Self::told(clip, joint, round, false, up)
    }

    /// The same for a round that ends on its first pose, with the rates that the curves themselves have
    /// there where they are smooth: those that have to meet for the path to go on without a bend. Steps of frames, as [`Self::of`]
    /// looks at them, tell such a rate roughly.
    pub fn in_own_rates(clip: &Clip, joint: usize, first: usize, up: DVec3) -> Self {
        Self::told(clip, joint, Round { first, is_first_again: true }, true, up)
    }

    /// The rate of a track at a key, where its round begins, less that at its end, in radians a second on the bone side, where both
    /// are on smooth curves; else `None`.
    pub fn own_turn_rate(track: &RotationTrack, first_key: usize) -> Option<Bivector> {
        let segments = track.keys.len().checked_sub(1).filter(|&segments| segments > first_key)?;
        let is_curve = |segment: usize| match track.paths.of(segment) {
            PathKind::Cubic => track.tangents.is_some(),
            kind => matches!(kind, PathKind::Squad | PathKind::Spline | PathKind::BSpline),
        };
        let rate = |segment: usize, share: f64| track.segment_motion(segment, share, None).rate;
        (is_curve(first_key) && is_curve(segments - 1))
            .then(|| rate(first_key, 0.0) - rate(segments - 1, 1.0))
    }

    fn told(clip: &Clip, joint: usize, round: Round, in_own_rates: bool, up: DVec3) -> Self {
        let grid = &clip.grid;
        let Round { first, is_first_again } = round;
        let Some(last) = grid.count().checked_sub(1).filter(|&last| last > first) else {
            return Self::default();
        };
        let steps = STEPS.min(last - first);
        let secs = (grid.time(last) - grid.time(first)) / (last - first) as f64;
        if secs <= 0.0 {
            return Self::default();
        }
        // Where the last frame lies before the seam, in frames.
        let before = if is_first_again { 0.0 } else { 1.0 };
        let is_root = clip.skeleton.parent_joint(joint).is_none();
        let up = if is_root { up_for(clip, joint, up) } else { DVec3::ZERO };
        let mut seam = Self::default();

        let mut curve = Rotor::IDENTITY;
        if let Some(track) = clip.rotation(joint).filter(|track| !track.keys.is_empty()) {
            let at = |frame: usize| track.at(grid.time(frame));
            let step = |frame: usize| (at(frame).reverse() * at(frame + 1)).plane_angles();
            let [end, start] =
                rates((0..steps).map(|i| step(last - 1 - i)), (first..first + steps).map(step), before);
            let next = at(last) * Rotor::from_plane_angles((end + start) * (0.5 * before));
            let start_pose = at(first);
            if is_root {
                let twist = SwingTwist::new(start_pose * next.reverse(), up);
                if twist.twist_rad.abs() > CURVE_RAD {
                    curve = twist.twist;
                }
            }
            seam.turn = (next.reverse() * curve.reverse() * start_pose).plane_angles();
            let own = if in_own_rates {
                Self::own_turn_rate(track, key_at(&track.times, grid.time(first)))
            } else {
                None
            };
            seam.turn_rate = own.unwrap_or((start - end) * (1.0 / secs));
        }
        if let Some(track) = clip.joints.get(joint).and_then(|tracks| tracks.translation.as_ref()) {
            let at = |frame: usize| track.at(grid.time(frame)).unwrap_or_default();
            let step = |frame: usize| at(frame + 1) - at(frame);
            let [end, start] =
                rates((0..steps).map(|i| step(last - 1 - i)), (first..first + steps).map(step), before);
            let tangents =
                track.tangents.as_ref().filter(|_| in_own_rates && track.path == VectorPath::Cubic);
            let first_key = key_at(&track.times, grid.time(first));
            let [end, start] = match tangents.map(|tangents| (tangents.last(), tangents.get(first_key))) {
                Some((Some([end, _]), Some([_, start]))) => [*end * secs, *start * secs],
                _ => [end, start],
            };
            // On a curve the start's way is turned into the end's.
            let start = curve.reverse().apply(start);
            let missing = at(first) - (at(last) + (end + start) * (0.5 * before));
            let level = missing - up * missing.dot(up);
            let is_stride = is_root && level.length() > STRIDE_SHARE * figure_size(clip, joint);
            seam.place = if is_stride { missing - level } else { missing };
            seam.place_rate = (start - end) * (1.0 / secs);
        }
        seam
    }
}

/// The first key that is not before a time; the last one where all are.
pub(crate) fn key_at(times: &Times, secs: f64) -> usize {
    let near = secs - 1e-9 * secs.abs().max(1.0);
    times.iter().position(|own| own >= near).unwrap_or(times.len().saturating_sub(1))
}

/// The steps for a frame at the seam, of the end and of the start: straight lines fitted to a few steps on each side, the newest first.
fn rates<T>(end: impl Iterator<Item = T>, start: impl Iterator<Item = T>, before: f64) -> [T; 2]
where
    T: Copy + Default + std::ops::Add<Output = T> + std::ops::Mul<f64, Output = T>,
{
    let fitted = |steps: Vec<T>, beside: f64| {
        let count = steps.len() as f64;
        // Step i lies half a frame and i frames from the end frame; least squares, continued to the seam.
        let middle = 0.5 * count;
        let square: f64 = (0..steps.len()).map(|i| (i as f64 + 0.5 - middle).powi(2)).sum();
        steps.iter().enumerate().fold(T::default(), |sum, (i, &step)| {
            let slope =
                if square > 0.0 { -(middle + beside) * (i as f64 + 0.5 - middle) / square } else { 0.0 };
            sum + step * (1.0 / count + slope)
        })
    };
    [fitted(end.collect(), before), fitted(start.collect(), 0.0)]
}

/// The upright in the frame that a root joint hangs in.
fn up_for(clip: &Clip, joint: usize, up: DVec3) -> DVec3 {
    let Some(parent) = clip.skeleton.joints()[joint].parent else { return up };
    let world = clip.world_at(clip.grid.time(0));
    world[parent].rotation.reverse().apply(up)
}

/// The size of the figure in the lengths of the frame that a root joint hangs in.
fn figure_size(clip: &Clip, joint: usize) -> f64 {
    let world = clip.world_at(clip.grid.time(0));
    let from_scene = match clip.skeleton.joints()[joint].parent {
        Some(parent) => world[parent].scene_from_joint.inverse(),
        None => glam::DAffine3::IDENTITY,
    };
    let root = from_scene.transform_point3(world[joint].position());
    clip.skeleton
        .listed()
        .map(|other| from_scene.transform_point3(world[other].position()).distance(root))
        .filter(|distance| distance.is_finite())
        .fold(0.0, f64::max)
}

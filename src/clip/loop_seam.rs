//! Where a clip that is played in a loop ends, and where it begins again.

use glam::DVec3;

use crate::rotor::{Bivector, Rotor, SwingTwist};
use crate::skeleton::JointKind;

use super::{Clip, PathKind, RotationTrack, VectorPath};

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

/// Whether the last frame of a clip shows the pose of the first once more, as against the pose before it: then the first frame of the
/// next round takes its place, else follows it.
///
/// Told by which of the two fits the motion better: the sum over all joints of the turn from the last pose, and from the pose that would
/// come next, to the first. A turn of the root about the upright does not count.
pub fn ends_on_first_pose(clip: &Clip, up: DVec3) -> bool {
    let frames = clip.grid.count();
    if frames < 3 {
        return true;
    }
    let mut sums = [0.0; 2];
    for joint in 0..clip.joints.len() {
        let is_listed = clip.skeleton.joints()[joint].kind == JointKind::Joint;
        if is_listed && clip.rotation(joint).is_some_and(|track| !track.keys.is_empty()) {
            for (sum, is_first_again) in sums.iter_mut().zip([true, false]) {
                *sum += LoopSeam::of(clip, joint, is_first_again, up).turn.length();
            }
        }
    }
    sums[0] <= sums[1]
}

impl LoopSeam {
    /// Compares the end of a joint with its start. `is_first_again`: the last frame stands for the first of the next round
    /// ([`ends_on_first_pose`]), else the first follows a frame after it. `up` is unit, in the scene.
    ///
    /// Of a root the way along the ground stays, and its turn about the upright where it is large enough to be meant.
    pub fn of(clip: &Clip, joint: usize, is_first_again: bool, up: DVec3) -> Self {
        Self::told(clip, joint, is_first_again, false, up)
    }

    /// The same for a last frame that stands for the first of the next round, with the rates that the curves themselves have
    /// there where they are smooth: those that have to meet for the path to go on without a bend. Steps of frames, as [`Self::of`]
    /// looks at them, tell such a rate roughly.
    pub fn in_own_rates(clip: &Clip, joint: usize, up: DVec3) -> Self {
        Self::told(clip, joint, true, true, up)
    }

    /// The rate of a track at its start less that at its end, in radians a second on the bone side, where both ends are smooth
    /// curves; else `None`.
    pub fn own_turn_rate(track: &RotationTrack) -> Option<Bivector> {
        let segments = track.keys.len().checked_sub(1).filter(|&segments| segments > 0)?;
        let is_curve = |segment: usize| match track.paths.of(segment) {
            PathKind::Cubic => track.tangents.is_some(),
            kind => matches!(kind, PathKind::Squad | PathKind::Spline | PathKind::BSpline),
        };
        let rate = |segment: usize, share: f64| track.segment_motion(segment, share, None).rate;
        (is_curve(0) && is_curve(segments - 1)).then(|| rate(0, 0.0) - rate(segments - 1, 1.0))
    }

    fn told(clip: &Clip, joint: usize, is_first_again: bool, in_own_rates: bool, up: DVec3) -> Self {
        let grid = &clip.grid;
        let Some(last) = grid.count().checked_sub(1).filter(|&last| last > 0) else { return Self::default() };
        let steps = STEPS.min(last);
        let secs = (grid.time(last) - grid.time(0)) / last as f64;
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
            let [end, start] = rates((0..steps).map(|i| step(last - 1 - i)), (0..steps).map(step), before);
            let next = at(last) * Rotor::from_plane_angles((end + start) * (0.5 * before));
            let first = at(0);
            if is_root {
                let twist = SwingTwist::new(first * next.reverse(), up);
                if twist.twist_rad.abs() > CURVE_RAD {
                    curve = twist.twist;
                }
            }
            seam.turn = (next.reverse() * curve.reverse() * first).plane_angles();
            let own = if in_own_rates { Self::own_turn_rate(track) } else { None };
            seam.turn_rate = own.unwrap_or((start - end) * (1.0 / secs));
        }
        if let Some(track) = clip.joints.get(joint).and_then(|tracks| tracks.translation.as_ref()) {
            let at = |frame: usize| track.at(grid.time(frame)).unwrap_or_default();
            let step = |frame: usize| at(frame + 1) - at(frame);
            let [end, start] = rates((0..steps).map(|i| step(last - 1 - i)), (0..steps).map(step), before);
            let tangents =
                track.tangents.as_ref().filter(|_| in_own_rates && track.path == VectorPath::Cubic);
            let [end, start] = match tangents.map(|tangents| (tangents.last(), tangents.first())) {
                Some((Some([end, _]), Some([_, start]))) => [*end * secs, *start * secs],
                _ => [end, start],
            };
            // On a curve the start's way is turned into the end's.
            let start = curve.reverse().apply(start);
            let missing = at(0) - (at(last) + (end + start) * (0.5 * before));
            let level = missing - up * missing.dot(up);
            let is_stride = is_root && level.length() > STRIDE_SHARE * figure_size(clip, joint);
            seam.place = if is_stride { missing - level } else { missing };
            seam.place_rate = (start - end) * (1.0 / secs);
        }
        seam
    }
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

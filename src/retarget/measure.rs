//! How well a clip was carried over.

use glam::DVec3;

use crate::clip::Clip;
use crate::skeleton::roles::{Role, Side};

use super::figure::Figure;
use super::joint_map::{JointMap, is_limb};
use super::plan::Plan;
use super::report::{DirectionError, Report};

/// Frames that are looked at, at most; of longer clips every so manieth.
const FRAMES: usize = 2000;

/// Fills in direction errors and tips. Directions are compared in the target's scene: a limb's own, not those of the joints' axes.
pub(super) fn measure(
    clip: &Clip,
    source: &Figure,
    target: &Figure,
    map: &JointMap,
    plan: &Plan,
    result: &Clip,
    report: &mut Report,
) {
    let count = clip.grid.count();
    let every = count.div_ceil(FRAMES).max(1);
    let frames: Vec<usize> = (0..count).step_by(every).collect();
    let times: Vec<f64> = frames.iter().map(|&frame| clip.grid.time(frame)).collect();
    let limbs: Vec<(usize, usize, DVec3, DVec3)> = map
        .links
        .iter()
        .filter(|link| target.roles.role(link.target).is_some_and(is_limb))
        .filter_map(|link| {
            let own = |figure: &Figure, joint: usize| {
                let shape = &figure.roles.shape;
                shape.limb_direction(joint).map(|direction| shape.rotations[joint].reverse().apply(direction))
            };
            Some((link.source, link.target, own(source, link.source)?, own(target, link.target)?))
        })
        .collect();
    let mut directions: Vec<DirectionError> = limbs
        .iter()
        .map(|&(_, joint, ..)| DirectionError { joint, mean_rad: 0.0, worst_rad: 0.0, worst_frame: 0 })
        .collect();
    let tips: Vec<(usize, usize)> = Side::BOTH
        .iter()
        .flat_map(|&side| [Role::Hand(side), Role::Foot(side)])
        .chain([Role::Head])
        .filter_map(|role| Some((source.roles.joint(role)?, target.roles.joint(role)?)))
        .collect();
    let hips = source.roles.joint(Role::Hips).zip(target.roles.joint(Role::Hips));
    let mut off = vec![[0.0_f64; 2]; tips.len()];
    let height = target.roles.shape.height;
    for (chunk, numbers) in times.chunks(512).zip(frames.chunks(512)) {
        let [before, after] = [clip.worlds_at(chunk), result.worlds_at(chunk)];
        for (time, &frame) in numbers.iter().enumerate() {
            for (error, &(from, to, own, its)) in directions.iter_mut().zip(&limbs) {
                let wanted = plan.turned.apply(before.rotation(from, time).apply(own));
                let found = after.rotation(to, time).apply(its);
                // More exact for small angles than an arc cosine.
                let angle = wanted.cross(found).length().atan2(wanted.dot(found));
                error.mean_rad += angle / times.len() as f64;
                if angle > error.worst_rad {
                    (error.worst_rad, error.worst_frame) = (angle, frame);
                }
            }
            if let Some((from, to)) = hips
                && height > 0.0
            {
                for (own, &(a, b)) in off.iter_mut().zip(&tips) {
                    let wanted = plan.turned.apply(before.position(a, time) - before.position(from, time))
                        * plan.scale;
                    let found = after.position(b, time) - after.position(to, time);
                    let share = wanted.distance(found) / height;
                    *own = [own[0] + share / times.len() as f64, own[1].max(share)];
                }
            }
        }
    }
    report.directions = directions;
    if hips.is_some() && height > 0.0 {
        report.tips = tips.iter().zip(off).map(|(&(_, joint), off)| (joint, off)).collect();
    }
}

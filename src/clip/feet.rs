//! Which limbs of a clip stand on the ground, told by shape and motion alone.

use glam::DVec3;

use crate::skeleton::roles::{Role, Roles, Side};
use crate::skeleton::{JointKind, Skeleton, TwoJointLimb};

use super::contact::{Foot, JointPoint};
use super::{Clip, Worlds};

/// So many poses of the clip are looked at.
const POSES: usize = 160;

/// Another branch as long as this share of the figure is a limb of its own: fingers and toes are shorter.
const LIMB_SHARE: f64 = 0.2;

/// A part of a limb is at least so long, as a share of the limb.
const PART_SHARE: f64 = 0.15;

/// A joint that bends its limb by less than this over the clip, and by less than a tenth of the joint that bends most, is a helper.
const LEAST_BEND_RAD: f64 = 0.05;

/// The lowest height of a standing limb's tip above the ground, as a share of the limb, at most.
const STANDING_SHARE: f64 = 0.12;

/// The root of a standing limb is so far above its tip, as a share of the limb, in most poses.
const UPRIGHT_SHARE: f64 = 0.35;

/// The two parts of a limb make up this share of it at least; tails have more joints than that.
const LEAST_LIMB: f64 = 0.5;

impl Foot {
    /// A foot at the end of a limb of hip, knee and ankle, with the joint of its toes where it has one. Without, the front point is
    /// the ankle's own tip, its first joint below, or the ankle itself.
    ///
    /// `None` when the joints don't hang below one another.
    pub fn new(
        skeleton: &Skeleton,
        hip: usize,
        knee: usize,
        ankle: usize,
        toes: Option<usize>,
    ) -> Option<Self> {
        let limb = TwoJointLimb::new(skeleton, hip, knee, ankle)?;
        let tip = skeleton.joints()[ankle].tips.first().map(|&offset| JointPoint { joint: ankle, offset });
        let below = skeleton.children(ankle).first().map(|&joint| JointPoint::of(joint));
        let ball = toes.map(JointPoint::of).or(tip).or(below).unwrap_or(JointPoint::of(ankle));
        Some(Self { limb, heel: JointPoint::of(ankle), ball })
    }
}

/// The limbs whose tips come down to the ground, from left to right as the skeleton lists them: legs of any number, and arms in a clip
/// that stands on its hands. `up` is unit.
///
/// A limb is a chain of joints from a branching of the body to a tip. Its two joints are the pair that bends it best: those that
/// make its shorter part the longest, with no bending joint between.
///
/// Where the skeleton is a human figure by names and shape ([`Roles`]), its two legs are the feet, and a hand that comes down is none.
pub fn standing_feet(clip: &Clip, up: DVec3) -> Vec<Foot> {
    let roles = Roles::find(&clip.skeleton);
    if roles.is_human() {
        let leg = |side: Side| {
            let [hip, knee, ankle] =
                [Role::UpperLeg(side), Role::LowerLeg(side), Role::Foot(side)].map(|role| roles.joint(role));
            Foot::new(&clip.skeleton, hip?, knee?, ankle?, roles.joint(Role::Toes(side)))
        };
        let mut legs: Vec<Foot> = Side::BOTH.into_iter().filter_map(leg).collect();
        if legs.len() == 2 {
            legs.sort_by_key(|foot| foot.limb.upper);
            return legs;
        }
    }
    by_shape(clip, up)
}

fn by_shape(clip: &Clip, up: DVec3) -> Vec<Foot> {
    let count = clip.grid.count();
    let every = count.div_ceil(POSES).max(1);
    let times: Vec<f64> = (0..count).step_by(every).map(|frame| clip.grid.time(frame)).collect();
    if times.is_empty() {
        return Vec::new();
    }
    let worlds = clip.worlds_at(&times);
    let chains = chains(&clip.skeleton);
    let lows: Vec<f64> = chains
        .iter()
        .map(|chain| {
            let tip = chain.points[chain.points.len() - 1];
            let mut heights: Vec<f64> = (0..times.len())
                .map(|time| place(&worlds, tip, time).dot(up))
                .filter(|h| h.is_finite())
                .collect();
            heights.sort_by(f64::total_cmp);
            heights.get(heights.len() / 20).copied().unwrap_or(f64::INFINITY)
        })
        .collect();
    let ground = lows.iter().copied().fold(f64::INFINITY, f64::min);
    let mut feet: Vec<(usize, f64, Foot)> = Vec::new();
    for (chain, low) in chains.iter().zip(lows) {
        let Some((foot, length)) = foot_of(chain, &worlds, times.len()) else { continue };
        let stands = low <= ground + STANDING_SHARE * length
            && carries(&foot, chain, &worlds, times.len(), up, length);
        if !stands {
            continue;
        }
        // Several tips of one limb: the lowest counts.
        match feet.iter_mut().find(|(_, _, own)| own.limb.upper == foot.limb.upper) {
            Some(own) if low < own.1 => *own = (foot.limb.upper, low, foot),
            Some(_) => {}
            None => feet.push((foot.limb.upper, low, foot)),
        }
    }
    feet.sort_by_key(|(upper, ..)| *upper);
    feet.into_iter().map(|(_, _, foot)| foot).collect()
}

/// Joints from the top of a limb down to its tip, the last one being the tip itself.
struct Chain {
    points: Vec<JointPoint>,
}

fn chains(skeleton: &Skeleton) -> Vec<Chain> {
    let joints = skeleton.joints();
    // The longest way from each joint down to a tip, along rest offsets; sizes do not enter.
    let mut reach: Vec<f64> =
        joints.iter().map(|joint| joint.tips.iter().map(|tip| tip.length()).fold(0.0, f64::max)).collect();
    let mut depth = vec![0.0; joints.len()];
    for joint in 0..joints.len() {
        if let Some(parent) = joints[joint].parent {
            depth[joint] = depth[parent] + joints[joint].rest.translation.length();
        }
    }
    for joint in (0..joints.len()).rev() {
        if let Some(parent) = joints[joint].parent {
            reach[parent] = f64::max(reach[parent], joints[joint].rest.translation.length() + reach[joint]);
        }
    }
    let figure = (0..joints.len())
        .map(|joint| reach[joint] + joints[joint].rest.translation.length())
        .fold(0.0, f64::max);
    let figure =
        figure.min((0..joints.len()).map(|joint| reach[joint]).fold(0.0, f64::max).max(1e-300) * 2.0);
    let is_leaf = |joint: usize| {
        joints[joint].kind == JointKind::Joint
            && skeleton
                .children(joint)
                .iter()
                .all(|&child| reach[child] == 0.0 && joints[child].kind == JointKind::Carrier)
    };
    (0..joints.len())
        .filter(|&leaf| is_leaf(leaf))
        .filter_map(|leaf| {
            let mut points = Vec::new();
            if let Some(&offset) = joints[leaf].tips.first().filter(|tip| tip.length() > 0.0) {
                points.push(JointPoint { joint: leaf, offset });
            }
            let mut at = leaf;
            loop {
                if joints[at].kind == JointKind::Joint {
                    points.push(JointPoint::of(at));
                }
                let Some(parent) = joints[at].parent else { break };
                let is_branching = skeleton.children(parent).iter().any(|&other| {
                    other != at
                        && joints[other].rest.translation.length() + reach[other] > LIMB_SHARE * figure
                });
                if is_branching {
                    break;
                }
                at = parent;
            }
            points.reverse();
            (points.len() >= 3).then_some(Chain { points })
        })
        .collect()
}

fn place(worlds: &Worlds, point: JointPoint, time: usize) -> DVec3 {
    if point.offset == DVec3::ZERO {
        worlds.position(point.joint, time)
    } else {
        worlds.point(point.joint, time, point.offset)
    }
}

/// Whether a limb stands as a leg does: its root well above its tip in most poses. A tail or a neck on the ground does not.
fn carries(foot: &Foot, chain: &Chain, worlds: &Worlds, times: usize, up: DVec3, length: f64) -> bool {
    let tip = chain.points[chain.points.len() - 1];
    let stands = |time: &usize| {
        let above = worlds.position(foot.limb.upper, *time) - place(worlds, tip, *time);
        above.dot(up) > UPRIGHT_SHARE * length
    };
    2 * (0..times).filter(stands).count() > times
}

/// The foot of a chain, and the chain's length in the scene.
fn foot_of(chain: &Chain, worlds: &Worlds, times: usize) -> Option<(Foot, f64)> {
    let points = &chain.points;
    let count = points.len();
    let at = |i: usize, time: usize| place(worlds, points[i], time);
    let length: f64 = (1..count).map(|i| at(i - 1, 0).distance(at(i, 0))).sum();
    let bends: Vec<f64> = (0..count)
        .map(|i| {
            if i == 0 || i + 1 == count {
                return 0.0;
            }
            let bend =
                |time: usize| (at(i, time) - at(i - 1, time)).angle_between(at(i + 1, time) - at(i, time));
            let range = (0..times).map(bend).filter(|bend| bend.is_finite());
            let [low, high] =
                range.fold([f64::INFINITY, f64::NEG_INFINITY], |[low, high], b| [low.min(b), high.max(b)]);
            (high - low).max(0.0)
        })
        .collect();
    let most = bends.iter().copied().fold(0.0, f64::max);
    let is_still = most < LEAST_BEND_RAD;
    let does_bend = |i: usize| is_still || bends[i] >= LEAST_BEND_RAD || bends[i] >= 0.1 * most;
    let mut best: Option<(f64, [usize; 3])> = None;
    for hip in 0..count - 2 {
        for knee in hip + 1..count - 1 {
            for ankle in knee + 1..count {
                if (hip + 1..knee).chain(knee + 1..ankle).any(does_bend) || !does_bend(knee) {
                    continue;
                }
                let parts = [at(hip, 0).distance(at(knee, 0)), at(knee, 0).distance(at(ankle, 0))];
                if parts[0] + parts[1] < LEAST_LIMB * length {
                    continue;
                }
                let shorter = parts[0].min(parts[1]);
                if shorter > PART_SHARE * length
                    && best.is_none_or(|(least, _)| shorter > least * (1.0 + 1e-9))
                {
                    best = Some((shorter, [hip, knee, ankle]));
                }
            }
        }
    }
    let (_, [hip, knee, ankle]) = best?;
    let end = points[ankle];
    let limb = TwoJointLimb {
        upper: points[hip].joint,
        lower: points[knee].joint,
        end: end.joint,
        end_point: end.offset,
    };
    // The first point below that is a fair way off: toes, not a helper at the ankle.
    let foot_length: f64 = (ankle + 1..count).map(|i| at(i - 1, 0).distance(at(i, 0))).sum();
    let ball =
        (ankle + 1..count).find(|&i| at(ankle, 0).distance(at(i, 0)) >= 0.25 * foot_length).unwrap_or(ankle);
    Some((Foot { limb, heel: end, ball: points[ball] }, length))
}

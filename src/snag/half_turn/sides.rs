//! What speaks for the one side of a jump and against the other, besides how smooth the motion is there.
//!
//! A jump by itself has no wrong side: what lies before and after it differs by one turn, whichever of them is taken for the
//! truth. Three things tell the sides apart: what the joint's limit allows, how the joint on the other side of the body
//! stands, and where the limb and the limb of its child point, seen from the body, beside the rest pose.

use glam::DVec3;

use crate::clip::Clip;
use crate::limit::{JointLimit, Limits};
use crate::rotor::{Rotor, chordal_mean};
use crate::skeleton::{JointKind, Skeleton};

use super::super::scan::Scan;
use super::Flips;

/// Keys of a run that are looked at, and those of the joint on the other side.
const SAMPLED: usize = 48;

/// A difference of so much makes a witness as sure as it can be.
const SURE_LIMIT_RAD: f64 = 30.0 / 180.0 * std::f64::consts::PI;
const SURE_RAD: f64 = 60.0 / 180.0 * std::f64::consts::PI;

/// Limits that are less sure of their zero and axes are not asked.
const LEAST_CONFIDENCE: f64 = 0.4;

/// How much the limit, the other side and the directions count.
const COUNTS: [f64; 3] = [0.4, 0.4, 0.2];

/// A witness that is less sure is not named.
const NAMED: f64 = 0.25;

/// How far off a run of keys is by one witness, in radians in the mean: as it is, and with its offset taken out.
#[derive(Clone, Copy, Debug)]
struct Off {
    as_is: f64,
    mended: f64,
}

/// What is known about a run of keys.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Evidence {
    limit: Option<Off>,
    other_side: Option<Off>,
    directions: Option<Off>,
}

impl Evidence {
    /// How sure each witness is that the run is the wrong side, −1 to 1; 0 without one.
    fn each(&self) -> [f64; 3] {
        let sure = |off: Option<Off>, sure_rad: f64| {
            off.map_or(0.0, |off| ((off.as_is - off.mended) / sure_rad).clamp(-1.0, 1.0))
        };
        [sure(self.limit, SURE_LIMIT_RAD), sure(self.other_side, SURE_RAD), sure(self.directions, SURE_RAD)]
    }

    /// All witnesses together, −1 to 1: above 0 where they take the run for the wrong side.
    pub(super) fn sum(&self) -> f64 {
        self.each().iter().zip(COUNTS).map(|(own, count)| own * count).sum()
    }

    /// What the witnesses say, for a sentence to be continued by it; nothing where there is none.
    pub(super) fn words(&self) -> String {
        let degrees = |off: Option<Off>| {
            off.map_or([0.0; 2], |off| [off.as_is.to_degrees().round(), off.mended.to_degrees().round()])
        };
        let ([limit, limit_mended], [side, side_mended], [points, points_mended]) =
            (degrees(self.limit), degrees(self.other_side), degrees(self.directions));
        let said = [
            format!("{limit}° beyond its limit, mended {limit_mended}°"),
            format!("{side}° from what the other side does, mended {side_mended}°"),
            format!("limb and child point {points}° from their rest, mended {points_mended}°"),
        ];
        let named = |speaks: &dyn Fn(f64) -> bool| -> Vec<&str> {
            let own = said.iter().zip(self.each()).filter(|(_, sure)| speaks(*sure));
            own.map(|(words, _)| words.as_str()).collect()
        };
        let (pro, contra) = (named(&|sure| sure >= NAMED), named(&|sure| sure <= -NAMED));
        let pro = if pro.is_empty() { String::new() } else { format!(" (in the mean {})", pro.join("; ")) };
        let contra = if contra.is_empty() {
            String::new()
        } else {
            format!(", though in the mean {}", contra.join("; "))
        };
        pro + &contra
    }
}

/// The witnesses of one joint.
#[derive(Debug)]
pub(super) struct Sides<'a> {
    scan: Scan<'a>,
    limit: Option<JointLimit>,
    /// The middle pose of the joint on the other side, as this one's.
    other_side: Option<Rotor>,
    directions: Option<Directions>,
}

impl<'a> Sides<'a> {
    /// Where a joint above jumps along, directions from the body tell of that one and are not asked.
    pub(super) fn new(scan: Scan<'a>, flips: &Flips, limits: Option<&Limits>, is_led: bool) -> Self {
        let limit = limits.and_then(|limits| limits.get(scan.joint)).copied();
        Self {
            scan,
            limit: limit.filter(|limit| limit.confidence >= LEAST_CONFIDENCE),
            other_side: other_side(&scan, flips),
            directions: if is_led { None } else { Directions::new(&scan, flips) },
        }
    }

    /// What is known about the keys `first..=last`, which `mended` would put right.
    pub(super) fn of(&self, (first, last): (usize, usize), mended: impl Fn(Rotor) -> Rotor) -> Evidence {
        let count = last + 1 - first;
        let sampled = count.min(SAMPLED);
        let poses: Vec<(usize, [Rotor; 2])> = (0..sampled)
            .map(|i| first + (2 * i + 1) * count / (2 * sampled))
            .filter_map(|key| {
                let own = self.scan.unit(key)?;
                Some((key, [own, mended(own).try_normalize()?]))
            })
            .collect();
        if poses.is_empty() {
            return Evidence::default();
        }
        let mean = |off: &dyn Fn(usize, Rotor) -> f64| {
            let [as_is, mended] = [0, 1].map(|side: usize| {
                poses.iter().map(|(key, pose)| off(*key, pose[side])).sum::<f64>() / poses.len() as f64
            });
            Off { as_is, mended }
        };
        Evidence {
            limit: self.limit.map(|limit| {
                mean(&|_, pose| {
                    limit.fault.beyond_rad(&limit.read(pose, None)).clamp(0.0, std::f64::consts::PI)
                })
            }),
            other_side: self.other_side.map(|other| mean(&|_, pose| pose.turn_to(other))),
            directions: self.directions.as_ref().map(|own| {
                let mut sums = [0.0; 2];
                for (key, both) in &poses {
                    let off = own.off(self.scan.clip, self.scan.secs(*key), *both);
                    sums = [sums[0] + off[0], sums[1] + off[1]];
                }
                let [as_is, mended] = sums.map(|sum| sum / poses.len() as f64);
                Off { as_is, mended }
            }),
        }
    }
}

/// The middle pose of the joint on the other side, as this one's; `None` where there is no such joint, or one that jumps too.
fn other_side(scan: &Scan<'_>, flips: &Flips) -> Option<Rotor> {
    let mirror = flips.mirror(&scan.clip.skeleton)?;
    let other = mirror.partner(scan.joint);
    if other == scan.joint || mirror.partner(other) != scan.joint {
        return None;
    }
    let partner = scan.other(other)?;
    if !flips.jumps(&partner).is_empty() {
        return None;
    }
    let stride = (partner.keys.len() / (4 * SAMPLED)).max(1);
    let poses: Vec<(Rotor, f64)> = (0..partner.keys.len())
        .step_by(stride)
        .filter_map(|key| Some((mirror.mirrored(other, partner.unit(key)?), 1.0)))
        .collect();
    Some(chordal_mean(&poses)?.rotor)
}

/// Where a limb and that of its child point, seen from the body, in the rest pose.
#[derive(Debug)]
struct Directions {
    /// The joints between the body and the joint, from the body on.
    above: Vec<usize>,
    /// Along the limb, in the joint's frame, and where that points at rest.
    limb: [DVec3; 2],
    /// The child, and the same of its limb; none where the child jumps along: it turns back against the joint.
    child: Option<(usize, [DVec3; 2])>,
}

impl Directions {
    fn new(scan: &Scan<'_>, flips: &Flips) -> Option<Self> {
        let skeleton = &*scan.clip.skeleton;
        let body = body_of(skeleton, scan.joint)?;
        let mut above: Vec<usize> = std::iter::successors(skeleton.joints()[scan.joint].parent, |&joint| {
            skeleton.joints()[joint].parent
        })
        .take_while(|&joint| joint != body)
        .collect();
        above.reverse();
        let rest = skeleton.world(&skeleton.chosen_rest_pose());
        let in_body = |joint: usize| rest[body].rotation.reverse() * rest[joint].rotation;
        let with_rest = |joint: usize, limb: DVec3| [limb, in_body(joint).apply(limb)];
        let (next, limb) = limb_of(skeleton, scan.joint)?;
        let turns_along = |child: usize| {
            scan.other(child).is_some_and(|child| {
                let jumps = flips.jumps(&child);
                flips.jumps(scan).iter().any(|jump| jumps.binary_search(jump).is_ok())
            })
        };
        let child = next
            .filter(|&child| !turns_along(child))
            .and_then(|child| Some((child, with_rest(child, limb_of(skeleton, child)?.1))));
        Some(Self { above, limb: with_rest(scan.joint, limb), child })
    }

    /// How far the directions are from those at rest, in radians in the mean, with the joint in each of two poses.
    fn off(&self, clip: &Clip, secs: f64, poses: [Rotor; 2]) -> [f64; 2] {
        let above = self.above.iter().fold(Rotor::IDENTITY, |turn, &joint| turn * local(clip, joint, secs));
        let off = |turn: Rotor, [limb, rest]: [DVec3; 2]| turn.apply(limb).angle_between(rest);
        let child = self.child.map(|(child, limb)| (local(clip, child, secs), limb));
        poses.map(|pose| {
            let turn = above * pose;
            let own = off(turn, self.limb);
            child.map_or(own, |(child, limb)| 0.5 * (own + off(turn * child, limb)))
        })
    }
}

/// How a joint is turned in its parent at a time.
fn local(clip: &Clip, joint: usize, secs: f64) -> Rotor {
    let track = clip.rotation(joint).filter(|track| !track.keys.is_empty());
    track.map_or(clip.skeleton.joints()[joint].rest.rotation, |track| track.at(secs))
}

/// The body that a joint hangs on: the highest joint above it from which more than one chain goes out, else the highest. `None` for
/// what nothing is above of.
fn body_of(skeleton: &Skeleton, joint: usize) -> Option<usize> {
    let up = |&joint: &usize| skeleton.joints()[joint].parent;
    let above = std::iter::successors(up(&joint), up);
    let mut listed: Vec<usize> =
        above.filter(|&joint| skeleton.joints()[joint].kind == JointKind::Joint).collect();
    listed.reverse();
    listed.iter().copied().find(|&joint| skeleton.children(joint).len() > 1).or(listed.first().copied())
}

/// The first child that stands off the joint, and the way to it; of one without children its tip.
fn limb_of(skeleton: &Skeleton, joint: usize) -> Option<(Option<usize>, DVec3)> {
    let child = skeleton.children(joint).iter().find_map(|&child| {
        let way = skeleton.joints()[child].rest.translation.try_normalize()?;
        Some((Some(child), way))
    });
    child.or_else(|| {
        let tip = skeleton.joints()[joint].tips.iter().find_map(|tip| tip.try_normalize());
        tip.map(|way| (None, way))
    })
}

//! What drives each joint of the target, worked out once for all frames.

use glam::{DAffine3, DVec3};

use crate::clip::Clip;
use crate::rotor::Rotor;
use crate::skeleton::roles::{ChainKind, Role, Side};

use super::alignment::alignment;
use super::figure::Figure;
use super::joint_map::{JointMap, LinkKind, chain_pairs};

/// What drives a joint of the target.
#[derive(Clone, Debug)]
pub(super) enum Drive {
    /// Nothing: it keeps its rest against its parent.
    Rest,
    /// A source joint: the target's turn in the scene is `turned · source · right`.
    Direct { source: usize, right: Rotor },
    /// A chain of another length: the turn at its place, and then `right`.
    Spread { chain: usize, place: usize, right: Rotor },
}

/// A source chain that is spread over a target chain.
#[derive(Clone, Debug)]
pub(super) struct SpreadChain {
    /// The source joint that the chain hangs on, with its turn at rest.
    pub base: Option<(usize, Rotor)>,
    /// The source's joints, with their turns at rest.
    pub sources: Vec<(usize, Rotor)>,
    /// The ends of their bones along the chain.
    pub from: Vec<f64>,
    /// The ends of the target's bones.
    pub knots: Vec<f64>,
}

/// Where the figure stands.
#[derive(Clone, Debug)]
pub(super) struct Root {
    pub target: usize,
    pub parent_from_scene: DAffine3,
    /// Joints of the source whose middle is followed: both thighs, else the root joint alone.
    pub follows: Vec<usize>,
    /// From the target's root joint to that middle, in its own turn but in the scene's lengths.
    pub offset: DVec3,
    /// Where that middle is at rest in source and target.
    pub anchors: [DVec3; 2],
    pub ups: [DVec3; 2],
    /// Heights along up that correspond: of standing ankles, else of the ground.
    pub levels: [f64; 2],
    /// Height of the ground in the target.
    pub ground: f64,
}

/// A translation that is taken over relative to the parent.
#[derive(Clone, Debug)]
pub(super) struct Move {
    pub source: usize,
    pub target: usize,
    pub turn: Rotor,
    pub factor: f64,
}

/// A joint that shares in the twist of a bone.
#[derive(Clone, Debug)]
pub(super) struct TwistShare {
    pub helper: usize,
    /// The joint of the bone.
    pub of: usize,
    /// The joint at the end of the bone.
    pub end: usize,
    /// How much of the twist it has.
    pub share: f64,
    /// Whether the twist is the bone's own (upper arm, thigh) or that of the joint at its end (forearm, shin).
    pub is_own: bool,
    /// From the bone's joint to the helper at rest.
    pub rest: Rotor,
}

/// Everything worked out.
#[derive(Clone, Debug)]
pub(super) struct Plan {
    /// From the source's scene to the target's.
    pub turned: Rotor,
    /// Target lengths as multiples of source lengths.
    pub scale: f64,
    pub drives: Vec<Drive>,
    pub chains: Vec<SpreadChain>,
    pub root: Option<Root>,
    pub moves: Vec<Move>,
    pub twists: Vec<TwistShare>,
    /// For joints whose own twist is shared out along their bone: how much they keep.
    pub keeps: Vec<Option<f64>>,
    /// Joints that move as another one does, which they are a copy of: see [`crate::skeleton::roles::Roles::copies`].
    pub copies: Vec<(usize, usize)>,
    /// What is worth telling.
    pub notes: Vec<String>,
}

pub(super) fn plan(clip: &Clip, source: &Figure, target: &Figure, map: &JointMap) -> Plan {
    let [s, t] = [&source.roles.shape, &target.roles.shape];
    let turned = (target.body_frame() * source.body_frame().reverse()).normalize();
    // Nearly no turn is none: figures that face the same way stay on their axes to the last digit.
    let turned = if turned.turn() < 1e-9 { Rotor::IDENTITY } else { turned };
    let mut notes = Vec::new();
    let scale = map.same_build.unwrap_or_else(|| match (source.size(), target.size()) {
        (Some(own), Some(its)) => its / own,
        _ => 1.0,
    });
    if let Some(text) = units(scale) {
        notes.push(text);
    }
    let n = target.skeleton.len();
    let is_hips = |joint: usize| target.roles.role(joint) == Some(Role::Hips);
    let hips = map.links.iter().find(|link| is_hips(link.target));
    // What stands above the hips would carry them twice.
    let above_hips: Vec<usize> = match hips {
        Some(link) if map.same_build.is_none() => {
            std::iter::successors(target.skeleton.joints()[link.target].parent, |&up| {
                target.skeleton.joints()[up].parent
            })
            .collect()
        }
        _ => Vec::new(),
    };

    let mut drives = vec![Drive::Rest; n];
    let right_of = |from: usize, to: usize| {
        let rest = s.rotations[from].reverse() * turned.reverse();
        let aligned = if map.same_build.is_some() {
            Rotor::IDENTITY
        } else {
            alignment(source, target, [from, to], turned)
        };
        (rest * aligned * t.rotations[to]).normalize()
    };
    for link in map.links.iter().filter(|link| !above_hips.contains(&link.target)) {
        drives[link.target] =
            Drive::Direct { source: link.source, right: right_of(link.source, link.target) };
    }
    let mut chains = Vec::new();
    if map.same_build.is_none() {
        for (from, to) in chain_pairs(source, target) {
            let [a, b] = [&source.roles.chains[from], &target.roles.chains[to]];
            let has_roles = matches!(b.kind, ChainKind::Arm | ChainKind::Leg)
                && b.joints.iter().any(|&joint| target.roles.role(joint).is_some());
            if a.joints.len() == b.joints.len() || has_roles || a.joints.is_empty() {
                continue;
            }
            let index = chains.len();
            for (place, &joint) in b.joints.iter().enumerate() {
                let is_by_hand = map.of_target(joint).is_some_and(|link| link.kind == LinkKind::Hand);
                if is_by_hand || map.at_rest.contains(&joint) {
                    continue;
                }
                // Rests are compared with the source joint at that part of the chain.
                let other = a.joints[(place * a.joints.len() / b.joints.len()).min(a.joints.len() - 1)];
                let aligned = alignment(source, target, [other, joint], turned);
                drives[joint] =
                    Drive::Spread { chain: index, place, right: (aligned * t.rotations[joint]).normalize() };
            }
            chains.push(SpreadChain {
                base: source.skeleton.parent_joint(a.joints[0]).map(|base| (base, s.rotations[base])),
                sources: a.joints.iter().map(|&joint| (joint, s.rotations[joint])).collect(),
                from: ends_along(source, &a.joints),
                knots: ends_along(target, &b.joints),
            });
        }
    }

    let root = if map.same_build.is_some() { None } else { root(clip, source, target, map) };
    let moves = moves(clip, source, target, map, scale, turned, root.as_ref());
    let (twists, keeps) = twists(target, &drives);
    let is_free = |joint: usize| matches!(drives[joint], Drive::Rest) && !map.at_rest.contains(&joint);
    let copies = target.roles.copies.iter().copied().filter(|&(copy, _)| is_free(copy)).collect();
    Plan { turned, scale, drives, chains, root, moves, twists, keeps, copies, notes }
}

/// A note where two figures differ in size by the factor between two units of length.
fn units(scale: f64) -> Option<String> {
    let known = [
        (100.0, "the source seems to be in metres and the target in centimetres"),
        (0.01, "the source seems to be in centimetres and the target in metres"),
        (2.54, "the source seems to be in inches and the target in centimetres"),
        (1.0 / 2.54, "the source seems to be in centimetres and the target in inches"),
        (0.0254, "the source seems to be in inches and the target in metres"),
        (1.0 / 0.0254, "the source seems to be in metres and the target in inches"),
        (1000.0, "the source seems to be in metres and the target in millimetres"),
        (0.001, "the source seems to be in millimetres and the target in metres"),
    ];
    // Figures differ in size too: only a factor beyond that tells, or one hit closely.
    let near = known.iter().find(|(factor, _)| {
        let off = (scale / factor).ln().abs();
        off < if factor.ln().abs() > 2.0 { 0.25 } else { 0.05 }
    })?;
    Some(format!("lengths are multiplied by {scale:.4}: {}", near.1))
}

/// Where the bones of a chain end, as shares of its length; evenly where it has none.
fn ends_along(figure: &Figure, joints: &[usize]) -> Vec<f64> {
    let lengths: Vec<f64> = joints.iter().map(|&joint| figure.roles.shape.limb_length(joint)).collect();
    let total: f64 = lengths.iter().sum();
    let count = joints.len();
    let mut along = 0.0;
    lengths
        .iter()
        .enumerate()
        .map(|(place, length)| {
            along += length;
            if place + 1 == count {
                1.0
            } else if total > 0.0 {
                along / total
            } else {
                (place + 1) as f64 / count as f64
            }
        })
        .collect()
}

fn root(clip: &Clip, source: &Figure, target: &Figure, map: &JointMap) -> Option<Root> {
    let by_hips = map.links.iter().find(|link| {
        source.roles.role(link.source) == Some(Role::Hips)
            || target.roles.role(link.target) == Some(Role::Hips)
    });
    let moved = || {
        map.links
            .iter()
            .find(|link| clip.joints[link.source].translation.is_some())
            .or_else(|| map.links.first())
    };
    let link = by_hips.or_else(moved)?;
    let [s, t] = [&source.roles.shape, &target.roles.shape];
    let parent = target.parent_at_rest(link.target).to_affine();
    let parent_from_scene = parent.inverse();
    if !parent_from_scene.is_finite() {
        return None;
    }
    let by_hips = by_hips.is_some_and(|own| own.target == link.target);
    let thighs = |figure: &Figure| -> Option<Vec<usize>> {
        let both = Side::BOTH
            .iter()
            .map(|&side| figure.roles.joint(Role::UpperLeg(side)))
            .collect::<Option<Vec<_>>>();
        both.filter(|_| by_hips)
    };
    let middle = |figure: &Figure, joints: &[usize]| {
        joints.iter().map(|&joint| figure.roles.shape.positions[joint]).sum::<DVec3>() / joints.len() as f64
    };
    let (follows, follow_target) = match (thighs(source), thighs(target)) {
        (Some(own), Some(its)) => (own, its),
        _ => (vec![link.source], vec![link.target]),
    };
    let anchors = [middle(source, &follows), middle(target, &follow_target)];
    let offset = t.rotations[link.target].reverse().apply(anchors[1] - t.positions[link.target]);
    // A rest pose hung up at its hips stands on no ground of its own: that is where the scene has it, or what carries the figure.
    let origin = target.origin().dot(t.up);
    let hips_height = t.positions[link.target].dot(t.up) - origin;
    let hangs = t.leg_length > 0.0 && hips_height.abs() < 0.15 * t.leg_length;
    let ground = if hangs { origin } else { t.ground };
    let has_feet =
        |figure: &Figure| Side::BOTH.iter().all(|&side| figure.roles.joint(Role::Foot(side)).is_some());
    let with_ankles = has_feet(source) && has_feet(target);
    let level = standing_level(clip, source, with_ankles);
    Some(Root {
        target: link.target,
        parent_from_scene,
        follows,
        offset,
        anchors,
        ups: [s.up, t.up],
        levels: [level, if with_ankles { ground + t.ankle_height } else { ground }],
        ground,
    })
}

/// The height at which a clip's figure stands: the 5th percentile of its lower ankle, or of its lowest foot point. Of a
/// figure without feet it is the lowest point of its rest.
fn standing_level(clip: &Clip, figure: &Figure, with_ankles: bool) -> f64 {
    const POSES: usize = 400;
    let shape = &figure.roles.shape;
    let mut points = foot_points(figure);
    if with_ankles {
        points.retain(|(joint, point)| {
            *point == DVec3::ZERO && matches!(figure.roles.role(*joint), Some(Role::Foot(_)))
        });
    }
    if points.is_empty() {
        return shape.ground;
    }
    let every = clip.grid.count().div_ceil(POSES).max(1);
    let times: Vec<f64> = (0..clip.grid.count()).step_by(every).map(|frame| clip.grid.time(frame)).collect();
    let worlds = clip.worlds_at(&times);
    let mut lows: Vec<f64> = (0..times.len())
        .map(|time| {
            let heights = points.iter().map(|&(joint, point)| worlds.point(joint, time, point).dot(shape.up));
            heights.fold(f64::INFINITY, f64::min)
        })
        .filter(|low| low.is_finite())
        .collect();
    lows.sort_by(f64::total_cmp);
    lows.get(lows.len() / 20).copied().unwrap_or(shape.ground)
}

/// Ankles, toes and their ends: points in the joints' own frames.
pub(super) fn foot_points(figure: &Figure) -> Vec<(usize, DVec3)> {
    let worlds = figure.skeleton.world(&figure.rest);
    let mut points = Vec::new();
    for side in Side::BOTH {
        for role in [Role::Foot(side), Role::Toes(side)] {
            let Some(joint) = figure.roles.joint(role) else { continue };
            points.push((joint, DVec3::ZERO));
            if let Some(end) = figure.roles.shape.limb_end(joint) {
                let own = worlds[joint].scene_from_joint.inverse().transform_point3(end);
                if own.is_finite() {
                    points.push((joint, own));
                }
            }
        }
    }
    points
}

/// Translations of single joints: all of skeletons that are built alike, else those whose parents are linked too.
fn moves(
    clip: &Clip,
    source: &Figure,
    target: &Figure,
    map: &JointMap,
    scale: f64,
    turned: Rotor,
    root: Option<&Root>,
) -> Vec<Move> {
    let worlds = [source, target].map(|figure| figure.skeleton.world(&figure.rest));
    let size = |which: usize, joint: Option<usize>| {
        joint.map_or(1.0, |joint| worlds[which][joint].scene_from_joint.matrix3.determinant().abs().cbrt())
    };
    let turn = |which: usize, joint: Option<usize>| {
        joint.map_or(Rotor::IDENTITY, |joint| worlds[which][joint].rotation)
    };
    map.links
        .iter()
        .filter(|link| {
            clip.joints[link.source].translation.as_ref().is_some_and(|track| !track.times.is_empty())
                && root.is_none_or(|root| root.target != link.target)
        })
        .filter_map(|link| {
            let parents =
                [source.skeleton.joints()[link.source].parent, target.skeleton.joints()[link.target].parent];
            if map.same_build.is_none() {
                let up = target.skeleton.parent_joint(link.target)?;
                let own = map.of_target(up)?;
                if source.skeleton.parent_joint(link.source) != Some(own.source) {
                    return None;
                }
            }
            let factor = scale * size(0, parents[0]) / size(1, parents[1]);
            let turn = (turn(1, parents[1]).reverse() * turned * turn(0, parents[0])).normalize();
            factor.is_finite().then_some(Move { source: link.source, target: link.target, turn, factor })
        })
        .collect()
}

/// How twist is shared out along the bones of the target.
fn twists(target: &Figure, drives: &[Drive]) -> (Vec<TwistShare>, Vec<Option<f64>>) {
    let mut keeps = vec![None; drives.len()];
    let mut twists: Vec<TwistShare> = Vec::new();
    let helpers = &target.roles.twist_helpers;
    let shape = &target.roles.shape;
    for helper in helpers {
        if !matches!(drives[helper.joint], Drive::Rest) || !matches!(drives[helper.of], Drive::Direct { .. })
        {
            continue;
        }
        let Some(role) = target.roles.role(helper.of) else { continue };
        let is_own = matches!(role, Role::UpperArm(_) | Role::UpperLeg(_));
        let end = match role {
            Role::UpperArm(side) => target.roles.joint(Role::LowerArm(side)),
            Role::LowerArm(side) => target.roles.joint(Role::Hand(side)),
            Role::UpperLeg(side) => target.roles.joint(Role::LowerLeg(side)),
            Role::LowerLeg(side) => target.roles.joint(Role::Foot(side)),
            _ => None,
        };
        let Some(end) = end else { continue };
        let carries = |joint: usize| {
            std::iter::successors(target.skeleton.joints()[end].parent, |&up| {
                target.skeleton.joints()[up].parent
            })
            .any(|up| up == joint)
        };
        let in_chain: Vec<f64> = helpers
            .iter()
            .filter(|own| own.of == helper.of && carries(own.joint))
            .map(|own| own.share)
            .collect();
        let share = if is_own && carries(helper.joint) {
            // The bone's own joint keeps a part, the last helper has it all.
            let keep = 1.0 / (in_chain.len() + 1) as f64;
            keeps[helper.of] = Some(keep);
            let most = in_chain.iter().copied().fold(f64::MIN_POSITIVE, f64::max);
            keep + (1.0 - keep) * helper.share / most
        } else {
            helper.share
        };
        let rest = (shape.rotations[helper.of].reverse() * shape.rotations[helper.joint]).normalize();
        twists.push(TwistShare { helper: helper.joint, of: helper.of, end, share, is_own, rest });
    }
    (twists, keeps)
}

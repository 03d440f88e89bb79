//! How the rest pose of a target joint has to be turned so that it looks like the source's.

use glam::DVec3;

use crate::rotor::Rotor;
use crate::skeleton::roles::{ChainKind, Role, limb_frame};

use super::figure::Figure;

/// Limbs that point apart by less than this at rest are brought together the shortest way; others by their whole frames, so that
/// hinges fix the twist.
const ALIKE_DEG: f64 = 25.0;

/// Parts of the trunk and collar bones point where their neighbours happen to stand: only beyond this is the rest another pose.
const TRUNK_DEG: f64 = 32.0;

/// A shin at rest within this of straight down carries a foot that stands.
const STANDING_DEG: f64 = 40.0;

/// The turn in the scene that brings the rest of a target joint to where the source's rest is. `turned` takes directions of the source's
/// scene to the target's.
pub(super) fn alignment(source: &Figure, target: &Figure, [from, to]: [usize; 2], turned: Rotor) -> Rotor {
    let [s, t] = [&source.roles.shape, &target.roles.shape];
    let (Some(wanted), Some(own)) = (s.limb_direction(from), t.limb_direction(to)) else {
        return Rotor::IDENTITY;
    };
    let wanted = turned.apply(wanted);
    let apart = wanted.angle_between(own).to_degrees();
    let whole = || {
        let (Some(a), Some(b)) = (s.hinge(from), t.hinge(to)) else { return Rotor::between(own, wanted) };
        match (limb_frame(wanted, turned.apply(a)), limb_frame(own, b)) {
            (Some(wanted), Some(own)) => wanted * own.reverse(),
            _ => Rotor::between(own, wanted),
        }
    };
    match manner(target, to) {
        Manner::Limb if apart < ALIKE_DEG => Rotor::between(own, wanted),
        Manner::Trunk if apart < TRUNK_DEG => Rotor::IDENTITY,
        Manner::Limb | Manner::Trunk => whole(),
        Manner::Foot => {
            let flat = |v: DVec3| v - t.up * v.dot(t.up);
            let [a, b] = [flat(wanted), flat(own)];
            // Below a shin that stands, a foot stands flat, however high its ankle is: only its heading counts.
            if !(stands(source, from) && stands(target, to)) {
                whole()
            } else if a.length() > 0.2 && b.length() > 0.2 {
                Rotor::between(b, a)
            } else {
                Rotor::IDENTITY
            }
        }
    }
}

/// Whether the shin above a foot points down at rest.
fn stands(figure: &Figure, foot: usize) -> bool {
    let side = figure.roles.joints[foot].side;
    let shin = side.and_then(|side| figure.roles.joint(Role::LowerLeg(side)));
    let shape = &figure.roles.shape;
    let direction = shin.and_then(|shin| shape.limb_direction(shin));
    direction.is_some_and(|shin| shin.angle_between(-shape.up).to_degrees() < STANDING_DEG)
}

enum Manner {
    Limb,
    Trunk,
    Foot,
}

fn manner(figure: &Figure, joint: usize) -> Manner {
    match figure.roles.role(joint) {
        Some(Role::Foot(_) | Role::Toes(_)) => return Manner::Foot,
        Some(
            Role::Hips
            | Role::Spine
            | Role::Chest
            | Role::UpperChest
            | Role::Neck
            | Role::Head
            | Role::Jaw
            | Role::Eye(_)
            | Role::Shoulder(_),
        ) => return Manner::Trunk,
        Some(_) => return Manner::Limb,
        None => {}
    }
    let chain = figure.roles.joints[joint].chain.map(|chain| figure.roles.chains[chain].kind);
    match chain {
        Some(ChainKind::Trunk | ChainKind::Neck | ChainKind::Other) | None => Manner::Trunk,
        Some(_) => Manner::Limb,
    }
}

//! The limits of the source's joints, brought to the target's.

use crate::limit::{JointLimit, Limits};
use crate::rotor::Rotor;

use super::figure::Figure;
use super::plan::{Drive, Plan};

/// Limits of the source's joints as limits of the target joints that they drive: a target joint is at its limit where its source is. A limit is
/// measured against the parent, so it is turned by what the plan turns both by. The labels of source joints whose limits found no place come
/// second: they drive nothing, or a chain of another length.
pub(super) fn carried_limits(
    limits: &Limits,
    source: &Figure,
    target: &Figure,
    plan: &Plan,
) -> (Limits, Vec<String>) {
    let at_rest = rest_in_plan(source, target, plan);
    let source_rest = &source.roles.shape.rotations;
    let mut found = Limits { title: limits.title.clone(), ..Limits::default() };
    let mut has_place = vec![false; source.skeleton.len()];
    for (joint, drive) in plan.drives.iter().enumerate() {
        let Drive::Direct { source: from, .. } = *drive else { continue };
        let Some(limit) = limits.get(from) else { continue };
        // What stands behind the source's turn, and behind that of its parent: local turns differ by these alone.
        let turned = |source_turn: Rotor, target_turn: Rotor| {
            (source_turn.reverse() * plan.turned.reverse() * target_turn).normalize()
        };
        let above = |figure: &Figure, rest: &[Rotor], joint: usize| {
            figure.skeleton.joints()[joint].parent.map_or(Rotor::IDENTITY, |up| rest[up])
        };
        let own = turned(source_rest[from], at_rest[joint]);
        let parent = turned(above(source, source_rest, from), above(target, &at_rest, joint));
        has_place[from] = true;
        found.joints.insert(
            joint,
            JointLimit {
                zero: (parent.reverse() * limit.zero * own).normalize(),
                twist_axis: own.reverse().apply(limit.twist_axis),
                bend_axis: own.reverse().apply(limit.bend_axis),
                ..*limit
            },
        );
    }
    let lost = limits.joints.keys().filter(|&&joint| !has_place.get(joint).is_some_and(|has| *has));
    let label = |&joint: &usize| {
        if joint < source.skeleton.len() {
            source.skeleton.label(joint).to_owned()
        } else {
            format!("joint {joint}")
        }
    };
    (found, lost.map(label).collect())
}

/// How each joint of the target is turned in the scene while the source stands at rest.
fn rest_in_plan(source: &Figure, target: &Figure, plan: &Plan) -> Vec<Rotor> {
    let mut turns: Vec<Rotor> = Vec::with_capacity(plan.drives.len());
    for (joint, drive) in plan.drives.iter().enumerate() {
        let turn = match drive {
            Drive::Direct { source: from, right } => {
                plan.turned * source.roles.shape.rotations[*from] * *right
            }
            Drive::Spread { right, .. } => *right,
            Drive::Rest => {
                let above = target.skeleton.joints()[joint].parent.map_or(Rotor::IDENTITY, |up| turns[up]);
                above * target.rest[joint].rotation
            }
        };
        turns.push(turn.normalize());
    }
    turns
}

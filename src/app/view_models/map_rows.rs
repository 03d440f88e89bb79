//! The rows of the turn map: joints in the order of the skeleton or of their worst, limbs folded to one row.

use std::collections::BTreeSet;
use std::ops::Range;

use crate::skeleton::Skeleton;
use crate::skeleton::roles::{ChainKind, Roles};

use super::heat::HeatMap;
use super::joint_tree::tree_rows;

/// One row on screen.
#[derive(Clone, Debug, PartialEq)]
pub struct MapRow {
    /// The joint, or the first of a folded limb.
    pub joint: usize,
    /// Rows of the heat map that it stands for: its own, and those of the joints folded into it.
    pub members: Vec<usize>,
    /// How far its name is moved in.
    pub depth: usize,
    /// Whether joints hang below it.
    pub has_children: bool,
    /// Whether those have rows of their own.
    pub is_open: bool,
}

impl MapRow {
    /// The code of the hottest of some frames.
    pub fn code(&self, map: &HeatMap, frames: &Range<usize>) -> u8 {
        self.members.iter().map(|&row| map.code(row, frames.clone())).max().unwrap_or(0)
    }

    /// The joint that is hottest in some frames.
    pub fn hottest(&self, map: &HeatMap, frames: &Range<usize>) -> usize {
        let code = |row: usize| map.code(row, frames.clone());
        let mut best = self.members.first().copied().unwrap_or(0);
        for &row in &self.members {
            if code(row) > code(best) {
                best = row;
            }
        }
        map.joints.get(best).copied().unwrap_or(self.joint)
    }
}

/// The rows of a map. With `worst_first` the hottest is on top, and equals stay in the order of the skeleton.
pub fn map_rows(
    skeleton: &Skeleton,
    map: &HeatMap,
    folded: &BTreeSet<usize>,
    worst_first: bool,
) -> Vec<MapRow> {
    let mut row_of = vec![None; skeleton.len()];
    for (row, &joint) in map.joints.iter().enumerate() {
        row_of[joint] = Some(row);
    }
    let mut rows: Vec<MapRow> = tree_rows(skeleton, folded)
        .into_iter()
        .map(|row| {
            let mut members: Vec<usize> = row_of[row.joint].into_iter().collect();
            if !row.is_open {
                let mut open = skeleton.children(row.joint).to_vec();
                while let Some(next) = open.pop() {
                    members.extend(row_of[next]);
                    open.extend(skeleton.children(next));
                }
                members.sort_unstable();
            }
            MapRow {
                joint: row.joint,
                members,
                depth: row.depth,
                has_children: row.has_children,
                is_open: row.is_open,
            }
        })
        .collect();
    if worst_first {
        let worst = |row: &MapRow| row.members.iter().map(|&own| map.worst(own)).fold(0.0, f32::max);
        rows.sort_by(|a, b| worst(b).total_cmp(&worst(a)));
        for row in &mut rows {
            row.depth = 0;
        }
    }
    rows
}

/// The joints to fold so that each limb is one row: the first of every arm, leg, finger, neck, tail and what else hangs on the
/// trunk. Where no chains are known, everything that hangs on a joint with several children.
pub fn limb_starts(skeleton: &Skeleton, roles: &Roles) -> BTreeSet<usize> {
    let has_children = |joint: &usize| {
        skeleton.listed().any(|other| other != *joint && skeleton.parent_joint(other) == Some(*joint))
    };
    let limbs = roles.chains.iter().filter(|chain| chain.kind != ChainKind::Trunk);
    let starts: BTreeSet<usize> =
        limbs.filter_map(|chain| chain.joints.first().copied()).filter(has_children).collect();
    // A root that begins a chain would fold the whole figure into one row.
    if !starts.is_empty() && starts.iter().all(|&joint| skeleton.parent_joint(joint).is_some()) {
        return starts;
    }
    let children_of =
        |joint: usize| skeleton.listed().filter(|&other| skeleton.parent_joint(other) == Some(joint)).count();
    skeleton
        .listed()
        .filter(|&joint| skeleton.parent_joint(joint).is_some_and(|parent| children_of(parent) > 1))
        .filter(has_children)
        .collect()
}

#[cfg(test)]
mod tests {
    use glam::DVec3;

    use super::*;
    use crate::skeleton::{Joint, JointKind, Transform};

    #[test]
    fn limbs_that_all_hang_on_the_root_fold_one_by_one() {
        // Three chains of three side by side: the first of them is found as one that begins at the root.
        let joint = |number: usize| {
            let (limb, place) = (number.saturating_sub(1) / 3, number.saturating_sub(1) % 3);
            let (parent, place) = match (number, place) {
                (0, _) => (None, DVec3::new(0.0, 90.0, 0.0)),
                (_, 0) => (Some(0), DVec3::new(4.0 * limb as f64 - 20.0, 0.0, 1.0)),
                _ => (Some(number - 1), DVec3::new(3.0, 5.0, 1.0)),
            };
            Joint {
                name: format!("part{number}"),
                number,
                parent,
                rest: Transform::from_translation(place),
                kind: JointKind::Joint,
                tips: vec![],
            }
        };
        let skeleton = Skeleton::new((0..10).map(joint).collect()).unwrap();
        assert_eq!(limb_starts(&skeleton, &Roles::find(&skeleton)), BTreeSet::from([1, 4, 7]));
    }
}

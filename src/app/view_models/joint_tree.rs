//! The joints as a tree that folds.

use std::collections::BTreeSet;

use crate::skeleton::Skeleton;

/// One row of the tree.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct TreeRow {
    /// Which joint.
    pub joint: usize,
    /// How far it is moved in.
    pub depth: usize,
    /// Whether joints hang below it.
    pub has_children: bool,
    /// Whether those are shown.
    pub is_open: bool,
}

/// The rows that are not folded away, parents first. Carriers are no rows; what hangs below them moves up.
pub fn tree_rows(skeleton: &Skeleton, folded: &BTreeSet<usize>) -> Vec<TreeRow> {
    let mut has_children = vec![false; skeleton.len()];
    for joint in skeleton.listed() {
        if let Some(parent) = skeleton.parent_joint(joint) {
            has_children[parent] = true;
        }
    }
    let mut rows = Vec::new();
    // A joint's rows follow its parent's at once, whatever the order in the file.
    let mut waiting: Vec<(usize, usize)> =
        roots(skeleton).into_iter().rev().map(|joint| (joint, 0)).collect();
    while let Some((joint, depth)) = waiting.pop() {
        let is_open = !folded.contains(&joint);
        rows.push(TreeRow { joint, depth, has_children: has_children[joint], is_open });
        if is_open {
            let children: Vec<usize> =
                skeleton.listed().filter(|&other| skeleton.parent_joint(other) == Some(joint)).collect();
            waiting.extend(children.into_iter().rev().map(|child| (child, depth + 1)));
        }
    }
    rows
}

fn roots(skeleton: &Skeleton) -> Vec<usize> {
    skeleton.listed().filter(|&joint| skeleton.parent_joint(joint).is_none()).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::skeleton::{Joint, JointKind, Transform};

    fn joint(name: &str, parent: Option<usize>, kind: JointKind) -> Joint {
        Joint { name: name.to_owned(), number: 0, parent, rest: Transform::IDENTITY, kind, tips: Vec::new() }
    }

    #[test]
    fn folding_hides_what_hangs_below_and_carriers_are_no_rows() {
        let skeleton = Skeleton::new(vec![
            joint("hip", None, JointKind::Joint),
            joint("holder", Some(0), JointKind::Carrier),
            joint("arm", Some(1), JointKind::Joint),
            joint("leg", Some(0), JointKind::Joint),
            joint("hand", Some(2), JointKind::Joint),
        ])
        .unwrap();
        let names = |folded: &[usize]| -> Vec<String> {
            let rows = tree_rows(&skeleton, &folded.iter().copied().collect());
            rows.iter().map(|row| format!("{}{}", " ".repeat(row.depth), skeleton.label(row.joint))).collect()
        };
        assert_eq!(names(&[]), ["hip", " arm", "  hand", " leg"]);
        assert_eq!(names(&[2]), ["hip", " arm", " leg"]);
        assert_eq!(names(&[0]), ["hip"]);
    }
}

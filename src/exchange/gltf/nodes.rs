//! The node tree (glTF 2.0, section 3.5), and the skeleton that is made of part of it.

use std::collections::BTreeSet;

use glam::{DAffine3, DMat4, DVec3};

use crate::exchange::Note;
use crate::rotor::Rotor;
use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

use super::error::GltfError;
use super::json::At;

/// Nodes below one another; deeper trees are taken for hostile.
const MAX_DEPTH: usize = 512;

/// The skeleton of a document, and which nodes it was made of.
pub(super) struct Figure {
    /// All skin joints and animated nodes, with what stands above them.
    pub skeleton: Skeleton,
    /// For each node its joint in the skeleton.
    pub joint_of_node: Vec<Option<usize>>,
}

/// The nodes that skins name as joints.
pub(super) fn skin_joints(root: &At<'_>, notes: &mut Vec<Note>) -> Result<BTreeSet<usize>, GltfError> {
    let mut joints = BTreeSet::new();
    for skin in root.list("skins")? {
        let listed = skin.list("joints")?;
        if listed.is_empty() {
            notes.push(Note::new(
                skin.path_of("joints"),
                "expected joints, found none; the skin is passed over",
            ));
        }
        for joint in listed {
            joints.insert(joint.as_index("nodes", root)?);
        }
    }
    Ok(joints)
}

/// Checks the whole tree and makes a skeleton of `wanted` nodes and their ancestors: depth first, roots in the order of
/// the file, parents before children.
pub(super) fn figure(
    root: &At<'_>,
    wanted: &BTreeSet<usize>,
    notes: &mut Vec<Note>,
) -> Result<Figure, GltfError> {
    let nodes = root.list("nodes")?;
    let tree = Tree::new(root, &nodes)?;
    let order = tree.depth_first()?;

    let mut needed = vec![false; nodes.len()];
    for &node in wanted {
        let mut up = Some(node);
        while let Some(node) = up
            && !needed[node]
        {
            needed[node] = true;
            up = tree.parents[node];
        }
    }
    let mut joints = Vec::new();
    let mut joint_of_node = vec![None; nodes.len()];
    for node in order.into_iter().filter(|&node| needed[node]) {
        let at = &nodes[node];
        joint_of_node[node] = Some(joints.len());
        joints.push(Joint {
            name: at.text("name")?.unwrap_or_default().to_owned(),
            number: node,
            parent: tree.parents[node].and_then(|parent| joint_of_node[parent]),
            rest: transform(at, notes)?,
            kind: if wanted.contains(&node) { JointKind::Joint } else { JointKind::Carrier },
            tips: Vec::new(),
        });
    }
    let skeleton = Skeleton::new(joints)
        .map_err(|error| GltfError::unlike("nodes", "parents before children", error.to_string()))?;
    Ok(Figure { skeleton, joint_of_node })
}

/// Who hangs on whom.
struct Tree {
    parents: Vec<Option<usize>>,
    children: Vec<Vec<usize>>,
}

impl Tree {
    fn new(root: &At<'_>, nodes: &[At<'_>]) -> Result<Self, GltfError> {
        let mut parents: Vec<Option<usize>> = vec![None; nodes.len()];
        let mut children: Vec<Vec<usize>> = vec![Vec::new(); nodes.len()];
        for (node, at) in nodes.iter().enumerate() {
            for child in at.list("children")? {
                let index = child.as_index("nodes", root)?;
                if let Some(other) = parents[index] {
                    let found = format!("nodes[{index}] under nodes[{other}] and nodes[{node}]");
                    return Err(GltfError::unlike(child.path, "one parent for each node", found));
                }
                parents[index] = Some(node);
                children[node].push(index);
            }
        }
        Ok(Self { parents, children })
    }

    /// All nodes, parents first. Fails for a cycle, and for a tree that is too deep.
    fn depth_first(&self) -> Result<Vec<usize>, GltfError> {
        let mut order = Vec::with_capacity(self.parents.len());
        let mut seen = vec![false; self.parents.len()];
        let roots = (0..self.parents.len()).filter(|&node| self.parents[node].is_none());
        let mut stack: Vec<(usize, usize)> = roots.rev().map(|node| (node, 1)).collect();
        while let Some((node, depth)) = stack.pop() {
            if depth > MAX_DEPTH {
                let expected = format!("at most {MAX_DEPTH} nodes below one another");
                return Err(GltfError::unlike(format!("nodes[{node}]"), expected, "more"));
            }
            seen[node] = true;
            order.push(node);
            stack.extend(self.children[node].iter().rev().map(|&child| (child, depth + 1)));
        }
        // With one parent at most, what no root leads to leads round in a circle.
        match seen.iter().position(|&seen| !seen) {
            None => Ok(order),
            Some(start) => Err(self.cycle(start)),
        }
    }

    fn cycle(&self, start: usize) -> GltfError {
        let up = |node: usize| self.parents[node].unwrap_or(node);
        let mut met = BTreeSet::new();
        let mut node = start;
        while met.insert(node) {
            node = up(node);
        }
        let first = node;
        let mut names = vec![format!("nodes[{first}]")];
        node = up(first);
        while node != first && names.len() < 8 {
            names.push(format!("nodes[{node}]"));
            node = up(node);
        }
        let found = format!("a circle of {}", names.join(", "));
        GltfError::unlike(format!("nodes[{first}].children"), "a tree", found)
    }
}

/// A node's own transform: its matrix, or its translation, rotation and scale.
pub(super) fn transform(node: &At<'_>, notes: &mut Vec<Note>) -> Result<Transform, GltfError> {
    if let Some(columns) = node.numbers::<16>("matrix")? {
        let affine = DAffine3::from_mat4(DMat4::from_cols_array(&columns));
        let split = Transform::from_affine(&affine);
        if !is_near(&split.to_affine(), &affine) {
            let text =
                "expected translation, rotation and scale, found shear; the shear is left out of the pose";
            notes.push(Note::new(node.path_of("matrix"), text));
        }
        return Ok(split);
    }
    let translation = node.numbers::<3>("translation")?.map_or(DVec3::ZERO, DVec3::from_array);
    let scale = node.numbers::<3>("scale")?.map_or(DVec3::ONE, DVec3::from_array);
    let rotation = match node.numbers::<4>("rotation")? {
        None => Rotor::IDENTITY,
        Some(xyzw) => Rotor::from_xyzw(xyzw).try_normalize().unwrap_or_else(|| {
            let text = "expected a rotation, found zeros; taken for no turn";
            notes.push(Note::new(node.path_of("rotation"), text));
            Rotor::IDENTITY
        }),
    };
    Ok(Transform { translation, rotation, scale })
}

/// Equal within what matrices stored with six digits show.
fn is_near(a: &DAffine3, b: &DAffine3) -> bool {
    let columns = |m: &DAffine3| [m.matrix3.x_axis, m.matrix3.y_axis, m.matrix3.z_axis];
    let largest = columns(b).iter().fold(0.0_f64, |largest, column| largest.max(column.abs().max_element()));
    columns(a).iter().zip(columns(b)).all(|(a, b)| (*a - b).abs().max_element() <= 1e-4 * largest)
}

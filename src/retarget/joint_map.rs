//! Which joint of the source drives which joint of the target.

use std::collections::{BTreeMap, BTreeSet};

use crate::skeleton::roles::{Body, ChainKind, LEAST_CONFIDENCE, Role, Side};

use super::figure::Figure;
use super::map_file::MapRow;

/// How sure a link is that is made by where chains hang alone: to be looked at.
const BY_HANGING: f64 = 0.45;

/// What a link was made by.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LinkKind {
    /// The two skeletons are built alike: the joint in the same place.
    Place,
    /// Both play the same part.
    Role,
    /// Both have the same place in chains of the same kind and length.
    Chain,
    /// Both have the same name.
    Name,
    /// A person said so.
    Hand,
}

/// A source joint that drives a target joint.
#[derive(Clone, Debug, PartialEq)]
pub struct Link {
    /// In the source's skeleton.
    pub source: usize,
    /// In the target's skeleton.
    pub target: usize,
    /// How sure it is, 0 to 1.
    pub confidence: f64,
    /// What made it.
    pub kind: LinkKind,
    /// Why, in words.
    pub reason: String,
}

/// Which joint of the source drives which joint of the target: at most one link for each target joint.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct JointMap {
    /// In the order of the target's joints.
    pub links: Vec<Link>,
    /// Target joints that a person wants at rest.
    pub at_rest: Vec<usize>,
    /// What should be looked at, in words.
    pub doubts: Vec<String>,
    /// The size of the target as a multiple of the source's, where the two are built alike in every joint.
    pub same_build: Option<f64>,
}

impl JointMap {
    /// Finds the map: of skeletons that are built alike joint by joint; else by roles, chains and names.
    pub fn automatic(source: &Figure, target: &Figure) -> Self {
        if let Some(scale) = same_build(source, target) {
            return Self::by_place(source, target, scale);
        }
        let mut found: BTreeMap<usize, Link> = BTreeMap::new();
        let mut used = vec![false; source.skeleton.len()];
        for (role, to) in target.roles.iter() {
            let Some(from) = source.roles.joint(role) else { continue };
            let confidence = source.roles.joints[from].confidence.min(target.roles.joints[to].confidence);
            let reason = format!(
                "both are the {}: {} / {}",
                role.words(),
                source.roles.joints[from].reason,
                target.roles.joints[to].reason
            );
            used[from] = true;
            found.insert(to, Link { source: from, target: to, confidence, kind: LinkKind::Role, reason });
        }
        // Front legs, tails, wings, further legs: chains of one kind and side, in their order.
        for (from, to) in chain_pairs(source, target) {
            let is_strand = target.roles.chains[to].kind == ChainKind::Other;
            let [a, b] = [&source.roles.chains[from].joints, &target.roles.chains[to].joints];
            // Chains of unequal length are spread, but for their first joint.
            if a.len() != b.len() {
                continue;
            }
            for (&from, &to) in a.iter().zip(b) {
                if used[from] || found.contains_key(&to) {
                    continue;
                }
                used[from] = true;
                let (confidence, reason) = if is_strand {
                    (BY_HANGING, "the same place in chains that hang alike; nothing else tells them")
                } else {
                    (0.6, "the same place in chains of the same kind")
                };
                let (kind, reason) = (LinkKind::Chain, reason.to_owned());
                found.insert(to, Link { source: from, target: to, confidence, kind, reason });
            }
        }
        // What is left and has the same name: props, helpers, hair.
        for to in target.skeleton.listed() {
            let name = &target.skeleton.joints()[to].name;
            if found.contains_key(&to) || name.is_empty() || target.roles.role(to).is_some() {
                continue;
            }
            let mut same =
                source.skeleton.listed().filter(|&from| source.skeleton.joints()[from].name == *name);
            if let (Some(from), None) = (same.next(), same.next())
                && !used[from]
                && source.roles.role(from).is_none()
                && in_order(source, target, &found, [from, to])
            {
                used[from] = true;
                let reason = "the same name".to_owned();
                found.insert(
                    to,
                    Link { source: from, target: to, confidence: 0.8, kind: LinkKind::Name, reason },
                );
            }
        }
        let mut map = Self { links: found.into_values().collect(), ..Self::default() };
        map.doubt(source, target);
        map
    }

    fn by_place(source: &Figure, target: &Figure, scale: f64) -> Self {
        let links = source
            .skeleton
            .listed()
            .zip(target.skeleton.listed())
            .map(|(from, to)| Link {
                source: from,
                target: to,
                confidence: 1.0,
                kind: LinkKind::Place,
                reason: "the two skeletons are built alike".to_owned(),
            })
            .collect();
        Self { links, same_build: Some(scale), ..Self::default() }
    }

    fn doubt(&mut self, source: &Figure, target: &Figure) {
        for (who, figure) in [("source", source), ("target", target)] {
            self.doubts.extend(figure.roles.doubts.iter().map(|doubt| format!("{who}: {}", doubt.text)));
        }
        if source.roles.body != target.roles.body
            && [source, target].iter().all(|figure| figure.roles.body != Body::Unknown)
        {
            self.doubts.push(
                "one figure stands upright and the other on four legs; only what both have was mapped"
                    .to_owned(),
            );
        }
        let lost: Vec<&str> = source
            .roles
            .iter()
            .filter(|(role, _)| role.is_required() && target.roles.joint(*role).is_none())
            .map(|(_, joint)| source.skeleton.label(joint))
            .collect();
        if !lost.is_empty() {
            self.doubts.push(format!("no joint of the target takes {}", lost.join(", ")));
        }
        if !strand_pairs(source, target).is_empty() {
            self.doubts.push(
                "neither figure is a body of a known kind; their chains were matched by where they hang alone: look whether they belong together"
                    .to_owned(),
            );
        }
        if self.links.is_empty() {
            self.doubts.push("no joint could be mapped; say which by hand with a map".to_owned());
        }
    }

    /// What drives a target joint.
    pub fn of_target(&self, target: usize) -> Option<&Link> {
        self.links.iter().find(|link| link.target == target)
    }

    /// Takes a person's corrections over: a row with both joints links them, one without a source keeps its target at rest, one without a target
    /// lets its source drive nothing.
    pub fn correct(&mut self, rows: &[MapRow]) {
        for row in rows {
            match (row.source, row.target) {
                (Some(source), Some(target)) => {
                    // Where nothing changes the map stays what it is.
                    if self.of_target(target).is_some_and(|link| link.source == source) {
                        continue;
                    }
                    self.same_build = None;
                    self.at_rest.retain(|&joint| joint != target);
                    self.links.retain(|link| link.target != target);
                    self.links.push(Link {
                        source,
                        target,
                        confidence: 1.0,
                        kind: LinkKind::Hand,
                        reason: "said by hand".to_owned(),
                    });
                }
                (None, Some(target)) => {
                    self.same_build = None;
                    self.links.retain(|link| link.target != target);
                    if !self.at_rest.contains(&target) {
                        self.at_rest.push(target);
                    }
                }
                (Some(source), None) => {
                    self.same_build = None;
                    self.links.retain(|link| link.source != source);
                }
                (None, None) => {}
            }
        }
        self.links.sort_by_key(|link| link.target);
    }

    /// Links surer than what is merely asked about.
    pub fn sure_links(&self) -> impl Iterator<Item = &Link> {
        self.links.iter().filter(|link| link.confidence >= LEAST_CONFIDENCE)
    }
}

/// Chains of both figures that belong together, as indices of their lists.
pub(super) fn chain_pairs(source: &Figure, target: &Figure) -> Vec<(usize, usize)> {
    let mut pairs = Vec::new();
    let mut seen: BTreeMap<(ChainKind, Option<Side>), usize> = BTreeMap::new();
    for (to, chain) in target.roles.chains.iter().enumerate() {
        // Strands can't be told from each other but by their names; arms and legs are told by roles.
        if chain.kind == ChainKind::Other {
            continue;
        }
        let nth = seen.entry((chain.kind, chain.side)).or_default();
        let from = source
            .roles
            .chains
            .iter()
            .enumerate()
            .filter(|(_, own)| own.kind == chain.kind && own.side == chain.side)
            .nth(*nth);
        *nth += 1;
        if let Some((from, _)) = from {
            pairs.push((from, to));
        }
    }
    pairs.extend(strand_pairs(source, target));
    pairs
}

/// The chains of machines and other bodies of no known kind, where both have as many and they hang on one another alike. Where joints have the same
/// names, these tell them better.
fn strand_pairs(source: &Figure, target: &Figure) -> Vec<(usize, usize)> {
    let strands = |figure: &Figure| -> Vec<usize> {
        let is_strand = |chain: &usize| figure.roles.chains[*chain].kind == ChainKind::Other;
        (0..figure.roles.chains.len()).filter(is_strand).collect()
    };
    let (own, its) = (strands(source), strands(target));
    let is_unknown = [source, target].iter().all(|figure| figure.roles.body == Body::Unknown);
    let name = |figure: &Figure, joint: usize| figure.skeleton.joints()[joint].name.clone();
    let names: BTreeSet<String> = source.skeleton.listed().map(|joint| name(source, joint)).collect();
    let shares_names = target.skeleton.listed().map(|joint| name(target, joint)).any(|name| {
        // Files without names have the empty one in common.
        !name.is_empty() && names.contains(&name)
    });
    if !is_unknown || own.len() != its.len() || shares_names {
        return Vec::new();
    }
    let hangs_on = |figure: &Figure, strands: &[usize], chain: usize| {
        let first = *figure.roles.chains[chain].joints.first()?;
        let above = figure.roles.joints[figure.skeleton.parent_joint(first)?].chain?;
        strands.iter().position(|&strand| strand == above)
    };
    let is_alike = own.iter().zip(&its).all(|(&a, &b)| {
        let [one, other] = [&source.roles.chains[a], &target.roles.chains[b]];
        one.side == other.side && hangs_on(source, &own, a) == hangs_on(target, &its, b)
    });
    if is_alike { own.into_iter().zip(its).collect() } else { Vec::new() }
}

/// Whether a link keeps ancestors above descendants among what is linked already.
fn in_order(source: &Figure, target: &Figure, found: &BTreeMap<usize, Link>, [from, to]: [usize; 2]) -> bool {
    let mut at = target.skeleton.parent_joint(to);
    while let Some(up) = at {
        if let Some(link) = found.get(&up) {
            return std::iter::successors(Some(from), |&joint| source.skeleton.parent_joint(joint))
                .any(|joint| joint == link.source);
        }
        at = target.skeleton.parent_joint(up);
    }
    true
}

/// The size of the target as a multiple of the source's, when both have the same tree and, but for size and heading, the same rest
/// places. Names, and how the joints' own axes lie, do not matter.
fn same_build(source: &Figure, target: &Figure) -> Option<f64> {
    let joints: [Vec<usize>; 2] = [source, target].map(|figure| figure.skeleton.listed().collect());
    if joints[0].len() != joints[1].len() || joints[0].len() < 2 {
        return None;
    }
    let rank = |of: &[usize], joint: usize| of.iter().position(|&own| own == joint);
    let at = |which: usize, index: usize| [source, target][which].roles.shape.positions[joints[which][index]];
    let reach = |which: usize| {
        (1..joints[0].len()).map(|index| at(which, index).distance(at(which, 0))).fold(0.0, f64::max)
    };
    let scale = reach(1) / reach(0);
    if !(scale.is_finite() && scale > 0.0) {
        return None;
    }
    let tolerance = 1e-5 * reach(1);
    for index in 0..joints[0].len() {
        let parents = [source, target].map(|figure| {
            figure.skeleton.parent_joint(joints[usize::from(std::ptr::eq(figure, target))][index])
        });
        let up = match parents {
            [None, None] => 0,
            [Some(a), Some(b)] => {
                let up = rank(&joints[0], a)?;
                if rank(&joints[1], b) != Some(up) {
                    return None;
                }
                up
            }
            _ => return None,
        };
        // Distances to the joint above, to the first, to the last and to the neighbour in the list: no other build has the same.
        let last = joints[0].len() - 1;
        for other in [up, 0, last, index.saturating_sub(1), index / 2] {
            let distances = [0, 1].map(|which| at(which, index).distance(at(which, other)));
            if (distances[0] * scale - distances[1]).abs() > tolerance {
                return None;
            }
        }
    }
    // Distances alone would take a mirror image for the same.
    let turned = target.body_frame() * source.body_frame().reverse();
    let fits = (0..joints[0].len()).all(|index| {
        let own = turned.apply(at(0, index) - at(0, 0)) * scale;
        own.distance(at(1, index) - at(1, 0)) <= 1e-3 * reach(1)
    });
    let plain = (0..joints[0].len()).all(|index| {
        let own = (at(0, index) - at(0, 0)) * scale;
        own.distance(at(1, index) - at(1, 0)) <= tolerance
    });
    (fits || plain).then_some(scale)
}

/// Whether the role drives a limb that is compared by where it points.
pub(super) fn is_limb(role: Role) -> bool {
    matches!(
        role,
        Role::UpperArm(_) | Role::LowerArm(_) | Role::UpperLeg(_) | Role::LowerLeg(_) | Role::Hand(_)
    )
}

//! From the plan of a body to a role, a chain, a confidence and a reason for each joint.

use std::collections::BTreeMap;

use glam::DVec3;

use super::super::{JointKind, Skeleton, Transform};
use super::body::{self, Plan};
use super::figure::{Figure, MOST_JOINTS, rank};
use super::found::{Body, Chain, ChainKind, Doubt, JointRole, LEAST_CONFIDENCE, Roles, TwistHelper};
use super::role::Role;
use super::shape::RestShape;

/// See [`Roles::find_below`].
pub(super) fn find(skeleton: &Skeleton, rest: &[Transform], root: Option<usize>) -> Roles {
    let figure = Figure::new(skeleton, rest, root);
    let roots = figure.roots();
    let n_active = figure.is_active.iter().filter(|&&active| active).count();
    if roots.is_empty() || n_active > MOST_JOINTS {
        let mut finder = Finder::new(&figure, None);
        if n_active > MOST_JOINTS {
            finder.doubt(
                None,
                None,
                format!("{n_active} joints are more than any figure has; no roles were looked for"),
            );
        }
        return finder.finish();
    }
    // Two figures in one file: the better one counts, the other is told.
    let mut plans: Vec<(usize, Plan)> =
        roots.iter().take(8).map(|&root| (root, body::plan(&figure, root))).collect();
    plans.sort_by(|(a, one), (b, other)| {
        let key = |root: usize, plan: &Plan| plan.score + if figure.size[root] > 3 { 1.0 } else { 0.0 };
        rank(key(*b, other)).cmp(&rank(key(*a, one))).then(a.cmp(b))
    });
    let others: Vec<usize> = plans
        .iter()
        .skip(1)
        .filter(|(_, plan)| plan.legs.is_some() && plan.arms.is_some() && plan.score > 0.6 * plans[0].1.score)
        .map(|(root, _)| *root)
        .collect();
    let (_, plan) = plans.swap_remove(0);
    let mut finder = Finder::new(&figure, Some(plan));
    if figure.kids.iter().all(Vec::is_empty) && n_active > 3 {
        finder.doubt(
            None,
            None,
            "no joint hangs on another: the file has no hierarchy, and so no figure can be made out",
        );
    }
    for &other in &others {
        let label = skeleton.label(other);
        finder.doubt(
            Some(other),
            None,
            format!("a second figure hangs under `{label}`: one figure of a file is looked at and carried at a time, and the others stay as they are; which one can be chosen by the joint it hangs on"),
        );
    }
    finder.others = others;
    finder.assign();
    finder.finish()
}

/// A role that was considered.
#[derive(Clone, Debug)]
pub(super) struct Candidate {
    pub joint: usize,
    pub role: Role,
    pub confidence: f64,
    pub reason: String,
}

pub(super) struct Finder<'f, 'a> {
    pub figure: &'f Figure<'a>,
    pub plan: Option<Plan>,
    pub candidates: Vec<Candidate>,
    pub chains: Vec<Chain>,
    pub doubts: Vec<Doubt>,
    pub twist: Vec<TwistHelper>,
    pub shape: RestShape,
    /// Root joints of figures that got no roles.
    pub others: Vec<usize>,
    /// How sure it is which side is left, where names don't say: 0 to 1.
    pub side_certainty: f64,
}

/// What speaks for a role.
pub(super) struct Case {
    /// −1 to 1.
    pub name: f64,
    /// 0 to 1.
    pub shape: f64,
    /// 0 to 1.
    pub side: f64,
    /// How much worse the next best is.
    pub margin: f64,
    /// Where the joint is, in words.
    pub place: String,
}

impl<'f, 'a> Finder<'f, 'a> {
    fn new(figure: &'f Figure<'a>, plan: Option<Plan>) -> Self {
        let n = figure.skeleton.len();
        let (up, span) = plan.as_ref().map_or((DVec3::Y, [0.0, 0.0]), |plan| (plan.up, plan.span));
        let shape = RestShape {
            up,
            forward: DVec3::Z,
            left: DVec3::X,
            facing_certainty: 0.0,
            height: (span[1] - span[0]).max(0.0),
            leg_length: 0.0,
            ground: span[0],
            ankle_height: 0.0,
            positions: figure.position.clone(),
            rotations: figure.rotation.clone(),
            ends: (0..n).map(|joint| figure.next_place(joint)).collect(),
            hinges: vec![None; n],
        };
        Self {
            figure,
            plan,
            candidates: Vec::new(),
            chains: Vec::new(),
            doubts: Vec::new(),
            twist: Vec::new(),
            shape,
            side_certainty: 0.0,
            others: Vec::new(),
        }
    }

    pub(super) fn doubt(&mut self, joint: Option<usize>, role: Option<Role>, text: impl Into<String>) {
        self.doubts.push(Doubt { joint, role, text: text.into() });
    }

    pub(super) fn label(&self, joint: usize) -> &str {
        self.figure.skeleton.label(joint)
    }

    fn assign(&mut self) {
        let Some(plan) = self.plan.clone() else { return };
        self.facing(&plan);
        if let Some(legs) = &plan.legs {
            self.shape.leg_length = body::leg_length(self.figure, &legs.chains, &legs.readings);
        }
        self.trunk_roles(&plan);
        self.neck_roles(&plan);
        if let Some(legs) = &plan.legs {
            self.limb_roles(legs, ChainKind::Leg);
        }
        if let Some(arms) = &plan.arms {
            self.limb_roles(arms, ChainKind::Arm);
        }
        if let Some(front) = &plan.front_legs {
            self.front_legs(front);
        }
        self.keep_the_sure();
        self.other_chains(&plan);
        self.shape_of_limbs(&plan);
        self.cross_checks(&plan);
    }

    pub(super) fn add(&mut self, joint: usize, role: Role, case: &Case) {
        let figure = self.figure;
        let score = if figure.is_named {
            // skeleton-names section 4.4; order holds by construction.
            0.5 * case.name.max(-0.6) + 0.3 * case.shape + 0.1 * case.side + 0.1
        } else {
            0.8 * case.shape + 0.1 * case.side + 0.1
        };
        // A name that says nothing in a skeleton whose other names do is no argument against.
        let score = if figure.is_named && case.name == 0.0 {
            f64::max(score, 0.55 * case.shape + 0.1)
        } else {
            score
        };
        let margin = (case.margin / 0.15).clamp(0.0, 1.0);
        let sides = if role.side().is_some() && !figure.is_named { 0.6 + 0.4 * case.side } else { 1.0 };
        let confidence = (score * (0.6 + 0.4 * margin) * sides).clamp(0.0, 1.0);
        let said = match case.name {
            name if name >= 0.9 => "the name says so",
            name if name > 0.0 => "the name may mean it",
            name if name < 0.0 => "the name says something else",
            _ => "the name says nothing",
        };
        let form = match case.shape {
            shape if shape >= 0.7 => "and the proportions fit",
            shape if shape >= 0.4 => "and the proportions fit roughly",
            _ => "and the proportions do not fit",
        };
        let rival = if margin < 0.35 { "; a neighbour fits nearly as well" } else { "" };
        let reason = format!("{}; {said}, {form}{rival}", case.place);
        self.candidates.push(Candidate { joint, role, confidence, reason });
    }

    /// Roles that are not sure become questions.
    fn keep_the_sure(&mut self) {
        let (sure, unsure): (Vec<Candidate>, Vec<Candidate>) = std::mem::take(&mut self.candidates)
            .into_iter()
            .partition(|one| one.confidence >= LEAST_CONFIDENCE);
        self.candidates = sure;
        for one in unsure {
            let text = format!(
                "is `{}` the {}? {}; confidence {:.2}",
                self.label(one.joint),
                one.role.words(),
                one.reason,
                one.confidence
            );
            self.doubt(Some(one.joint), Some(one.role), text);
        }
    }

    fn finish(self) -> Roles {
        let n = self.figure.skeleton.len();
        let mut joints = vec![JointRole::default(); n];
        for (index, chain) in self.chains.iter().enumerate() {
            for (place, &joint) in chain.joints.iter().enumerate() {
                joints[joint].chain = Some(index);
                joints[joint].place = place;
                joints[joint].side = chain.side;
            }
        }
        let mut by_role = BTreeMap::new();
        for one in &self.candidates {
            // One joint a role and one role a joint; the first of equals stays.
            if by_role.contains_key(&one.role) || joints[one.joint].role.is_some() {
                continue;
            }
            by_role.insert(one.role, one.joint);
            let own = &mut joints[one.joint];
            own.role = Some(one.role);
            own.side = one.role.side().or(own.side);
            own.confidence = one.confidence;
            own.reason.clone_from(&one.reason);
        }
        for helper in &self.twist {
            let own = &mut joints[helper.joint];
            if own.role.is_none() {
                own.reason = format!("shares in the twist of `{}`", self.figure.skeleton.label(helper.of));
            }
        }
        for (joint, own) in joints.iter_mut().enumerate() {
            if !own.reason.is_empty() {
                continue;
            }
            let name = &self.figure.names[joint];
            own.reason = if self.figure.skeleton.joints()[joint].kind == JointKind::Carrier {
                "carries the figure and is none of its joints".to_owned()
            } else if name.is_helper() {
                "the name says that it is a control, a target or a prop".to_owned()
            } else if let Some(of) = self.figure.copy_of[joint] {
                format!(
                    "stands where `{}` does, as for another skin of the same figure, and moves as that does",
                    self.figure.skeleton.label(of)
                )
            } else if !self.figure.is_active[joint] {
                "the name says that it ends a limb".to_owned()
            } else if let Some(chain) = own.chain {
                let chain = &self.chains[chain];
                let kind = match chain.kind {
                    ChainKind::Trunk => "the trunk",
                    ChainKind::Neck => "the neck",
                    ChainKind::Arm => "an arm",
                    ChainKind::Leg => "a leg",
                    ChainKind::FrontLeg => "a front leg",
                    ChainKind::Finger(_) => "a finger",
                    ChainKind::Tail => "a tail",
                    ChainKind::Wing => "a wing",
                    ChainKind::Ear => "an ear",
                    ChainKind::Other => "a chain of its own",
                };
                format!("{} of {kind}", place_among(own.place, chain.joints.len()))
            } else {
                "no part of the figure that was found".to_owned()
            };
        }
        let body = match &self.plan {
            Some(plan) if plan.front_legs.is_some() => Body::FourLegged,
            Some(plan) if plan.legs.is_some() => Body::Upright,
            _ => Body::Unknown,
        };
        let copies = self.figure.copy_of.iter().enumerate().filter_map(|(copy, of)| Some((copy, (*of)?)));
        let mut twist_helpers = self.twist;
        twist_helpers.retain(|helper| joints[helper.joint].role.is_none());
        twist_helpers.sort_by_key(|helper| helper.joint);
        twist_helpers.dedup_by_key(|helper| helper.joint);
        Roles {
            joints,
            chains: self.chains,
            twist_helpers,
            doubts: self.doubts,
            body,
            shape: self.shape,
            other_figures: self.others,
            copies: copies.collect(),
            by_role,
        }
    }
}

/// A joint's place among those of a chain.
pub(super) fn place_among(place: usize, count: usize) -> String {
    if count == 1 { "the only joint".to_owned() } else { format!("{} of {count} joints", ordinal(place)) }
}

pub(super) fn ordinal(place: usize) -> String {
    match place {
        0 => "first".to_owned(),
        1 => "second".to_owned(),
        2 => "third".to_owned(),
        other => format!("number {}", other + 1),
    }
}

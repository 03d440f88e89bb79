//! From the plan of a body to a role, a chain, a confidence and a reason for each joint.

use std::collections::BTreeMap;

use glam::DVec3;

use super::super::{JointKind, Skeleton, Transform};
use super::body::{self, Limbs, Plan};
use super::figure::{Figure, MOST_JOINTS};
use super::fingers;
use super::found::{Body, Chain, ChainKind, Doubt, JointRole, LEAST_CONFIDENCE, Roles, TwistHelper};
use super::limbs::{ARM, LEG};
use super::pairs::Pair;
use super::role::{Finger, Phalanx, Role, Side};
use super::shape::RestShape;
use super::words::Part;

/// See [`Roles::find_at`].
pub(super) fn find(skeleton: &Skeleton, rest: &[Transform]) -> Roles {
    let figure = Figure::new(skeleton, rest);
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
        key(*b, other).total_cmp(&key(*a, one)).then(a.cmp(b))
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
    for other in others {
        let label = skeleton.label(other);
        finder.doubt(
            Some(other),
            None,
            format!("a second figure hangs under `{label}`; only the first got roles"),
        );
    }
    finder.assign();
    finder.finish()
}

/// A role that was considered.
#[derive(Clone, Debug)]
struct Candidate {
    joint: usize,
    role: Role,
    confidence: f64,
    reason: String,
}

struct Finder<'f, 'a> {
    figure: &'f Figure<'a>,
    plan: Option<Plan>,
    candidates: Vec<Candidate>,
    chains: Vec<Chain>,
    doubts: Vec<Doubt>,
    twist: Vec<TwistHelper>,
    shape: RestShape,
    /// How sure it is which side is left, where names don't say: 0 to 1.
    side_certainty: f64,
}

/// What speaks for a role.
struct Case {
    /// −1 to 1.
    name: f64,
    /// 0 to 1.
    shape: f64,
    /// 0 to 1.
    side: f64,
    /// How much worse the next best is.
    margin: f64,
    /// Where the joint is, in words.
    place: String,
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
        }
    }

    fn doubt(&mut self, joint: Option<usize>, role: Option<Role>, text: impl Into<String>) {
        self.doubts.push(Doubt { joint, role, text: text.into() });
    }

    fn label(&self, joint: usize) -> &str {
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

    /// Forward, left, and how sure that is.
    fn facing(&mut self, plan: &Plan) {
        let up = plan.up;
        let flat = |v: DVec3| v - up * v.dot(up);
        let across = flat(plan.across).normalize_or(DVec3::X);
        let size = self.shape.height.max(f64::MIN_POSITIVE);
        let mut toes = DVec3::ZERO;
        let mut knees = DVec3::ZERO;
        if let Some(legs) = &plan.legs {
            for (chain, reading) in legs.chains.iter().zip(&legs.readings) {
                let [upper, lower, foot, _] = reading.places.map(|place| place.map(|place| chain[place]));
                if let Some(foot) = foot {
                    toes += flat(self.figure.far[foot] - self.figure.position[foot]);
                }
                if let (Some(upper), Some(lower), Some(foot)) = (upper, lower, foot) {
                    let at = |joint: usize| self.figure.position[joint];
                    let axis = (at(foot) - at(upper)).normalize_or_zero();
                    let off = at(lower) - at(upper);
                    knees += flat(off - axis * off.dot(axis));
                }
            }
        }
        let mut elbows = DVec3::ZERO;
        if let Some(arms) = &plan.arms {
            for (chain, reading) in arms.chains.iter().zip(&arms.readings) {
                if let [_, Some(upper), Some(lower), Some(hand)] =
                    reading.places.map(|place| place.map(|place| chain[place]))
                {
                    let at = |joint: usize| self.figure.position[joint];
                    let axis = (at(hand) - at(upper)).normalize_or_zero();
                    let off = at(lower) - at(upper);
                    elbows += flat(off - axis * off.dot(axis));
                }
            }
        }
        let along = |v: DVec3| v - across * v.dot(across);
        let [toes, knees, elbows] = [toes, knees, elbows].map(along);
        let lying = plan.front_legs.as_ref().zip(plan.legs.as_ref()).map(|(front, rear)| {
            along(flat(self.figure.position[front.pair.on] - self.figure.position[rear.pair.on]))
        });
        let seen = if let Some(lying) = lying.filter(|lying| lying.length() > 0.1 * size) {
            Some((lying, 0.95))
        } else if toes.length() > 0.03 * size {
            Some((toes, 0.9))
        } else if knees.length() > 0.012 * size {
            Some((knees, 0.6))
        } else if elbows.length() > 0.012 * size {
            Some((-elbows, 0.5))
        } else {
            None
        };
        let (mut forward, mut certainty) = if let Some((forward, certainty)) = seen {
            (forward.normalize(), certainty)
        } else {
            // The formats say that +z is the front.
            let guess = across.cross(up);
            let front = DVec3::Z.dot(guess);
            let front = if front.abs() > 0.1 { front } else { -DVec3::Y.dot(guess) };
            (if front < 0.0 { -guess } else { guess }, 0.35)
        };
        if plan.is_left_named {
            let said = across.cross(up);
            let agrees = said.dot(forward) > 0.0;
            if seen.is_none() {
                forward = said;
                certainty = 0.8;
            } else if agrees {
                certainty = f64::max(certainty, 0.95);
            } else if certainty >= 0.9 {
                self.doubt(
                    None,
                    None,
                    "the joints named left lie at the right of a figure that looks where its feet point: it is mirrored, or \
                     its sides are named the other way round; the names were kept",
                );
            } else {
                // Bent knees tell less than names.
                forward = said;
                certainty = 0.7;
            }
        }
        self.side_certainty = if plan.is_left_named { 1.0 } else { certainty };
        self.shape.forward = forward;
        self.shape.left = up.cross(forward).normalize_or(across);
        self.shape.facing_certainty = certainty;
        if !plan.is_left_named && certainty < 0.5 && !plan.pairs.is_empty() {
            self.doubt(
                None,
                None,
                "nothing shows where the figure faces; it was taken to face along +z, as files usually do",
            );
        }
    }

    /// The side of each of a pair's first joints.
    fn sides(&self, pair: &Pair) -> [Side; 2] {
        if pair.is_named {
            return Side::BOTH;
        }
        let apart = |of: &[DVec3]| (of[pair.first[0]] - of[pair.first[1]]).dot(self.left_of_sides());
        let apart = apart(&self.figure.far) + apart(&self.figure.position);
        if apart >= 0.0 { Side::BOTH } else { [Side::Right, Side::Left] }
    }

    /// Where the side called left lies: names win over what the feet say.
    fn left_of_sides(&self) -> DVec3 {
        match &self.plan {
            Some(plan) if plan.is_left_named => plan.across,
            _ => self.shape.left,
        }
    }

    fn add(&mut self, joint: usize, role: Role, case: &Case) {
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

    fn trunk_roles(&mut self, plan: &Plan) {
        let figure = self.figure;
        let name = |joint: usize, part: Part| figure.names[joint].score(part);
        let whole =
            [plan.legs.is_some(), plan.arms.is_some() || plan.front_legs.is_some(), !plan.neck.is_empty()];
        let shape = 0.4 + 0.2 * whole.iter().filter(|&&is| is).count() as f64;
        if let Some(hips) = plan.hips {
            let named = name(hips, Part::Hips);
            let case = Case {
                // Where the legs and the spine meet nothing else can be meant, whatever it is called.
                name: if named < 0.0 && plan.legs.is_some() { 0.0 } else { named },
                shape,
                side: 1.0,
                margin: 1.0,
                place: if plan.legs.is_some() { "legs and spine meet here" } else { "the trunk begins here" }
                    .to_owned(),
            };
            self.add(hips, Role::Hips, &case);
        }
        let n = plan.trunk.len();
        if n > 0 {
            self.chains.push(Chain { kind: ChainKind::Trunk, side: None, joints: plan.trunk.clone() });
        }
        let places = trunk_places(figure, plan);
        for (part, role, place) in [
            (Part::Spine, Role::Spine, places[0]),
            (Part::Chest, Role::Chest, places[1]),
            (Part::UpperChest, Role::UpperChest, places[2]),
        ] {
            let Some(place) = place else { continue };
            let joint = plan.trunk[place];
            // Trunk joints are told by their order; each trunk word fits each of them.
            let named = [Part::Spine, Part::Chest, Part::UpperChest, Part::Hips]
                .map(|part| name(joint, part))
                .into_iter()
                .fold(name(joint, part), f64::max);
            let case = Case {
                name: named,
                shape,
                side: 1.0,
                margin: if n <= 3 { 1.0 } else { 0.1 },
                place: format!(
                    "{} of {n} joint(s) between hips and {}",
                    ordinal(place),
                    if plan.arms.is_some() { "arms" } else { "neck" }
                ),
            };
            self.add(joint, role, &case);
        }
    }

    fn neck_roles(&mut self, plan: &Plan) {
        let figure = self.figure;
        let chain = &plan.neck;
        let Some(&last) = chain.last() else { return };
        let score = |joint: usize, part: Part| figure.names[joint].score(part);
        self.chains.push(Chain { kind: ChainKind::Neck, side: None, joints: chain.clone() });
        let high = (figure.far[last].dot(plan.up) - plan.span[0])
            / (plan.span[1] - plan.span[0]).max(f64::MIN_POSITIVE);
        let shape = if plan.front_legs.is_some() { 0.8 } else { (0.4 + 0.6 * high).min(1.0) };
        let only_neck = chain.len() == 1 && score(last, Part::Neck) > 0.7;
        if !only_neck {
            let place = "the last joint of the chain above the shoulders".to_owned();
            let case = Case { name: score(last, Part::Head), shape, side: 1.0, margin: 1.0, place };
            self.add(last, Role::Head, &case);
        }
        if chain.len() > 1 || only_neck {
            let place = "the first joint above the shoulders".to_owned();
            let case = Case { name: score(chain[0], Part::Neck), shape, side: 1.0, margin: 1.0, place };
            self.add(chain[0], Role::Neck, &case);
        }
        // The face is told by names alone.
        for joint in figure.subtree(last).into_iter().skip(1) {
            let name = &figure.names[joint];
            let case = |named: f64| Case {
                name: named,
                shape: 0.7,
                side: 1.0,
                margin: 1.0,
                place: "it hangs on the head".to_owned(),
            };
            let first = |role: Role| self.candidates.iter().all(|other| other.role != role);
            if name.score(Part::Jaw) > 0.9 && first(Role::Jaw) {
                self.add(joint, Role::Jaw, &case(1.0));
            } else if name.score(Part::Eye) > 0.9
                && let Some(side) = name.side
                && first(Role::Eye(side))
            {
                self.add(joint, Role::Eye(side), &case(1.0));
            }
        }
    }

    fn limb_roles(&mut self, limbs: &Limbs, kind: ChainKind) {
        let figure = self.figure;
        let parts = if kind == ChainKind::Leg { LEG } else { ARM };
        for ((side, chain), reading) in
            self.sides(&limbs.pair).into_iter().zip(&limbs.chains).zip(&limbs.readings)
        {
            let places = reading.places;
            let last = places.iter().flatten().max().copied().unwrap_or(0);
            // A leg goes on to its toes' end; what hangs on a hand are fingers.
            let end = if kind == ChainKind::Leg { chain.len() } else { last + 1 };
            let joints: Vec<usize> = (0..end)
                .filter(|place| places.contains(&Some(*place)) || !self.is_helper(chain, *place))
                .map(|place| chain[place])
                .collect();
            let n = joints.len();
            self.chains.push(Chain { kind, side: Some(side), joints });
            for ((place, part), margin) in places.iter().zip(parts).zip(reading.margins) {
                let Some(place) = *place else { continue };
                let joint = chain[place];
                let name = &figure.names[joint];
                let agrees = name.side.is_none_or(|said| said == side);
                let limb = if kind == ChainKind::Leg { "leg" } else { "arm" };
                let case = Case {
                    name: name.score(part),
                    shape: (0.5 * reading.shape + 0.5 * limbs.fit).clamp(0.0, 1.0),
                    side: if !agrees {
                        0.0
                    } else if name.side.is_some() {
                        1.0
                    } else {
                        self.side_certainty
                    },
                    margin,
                    place: format!("{} of {n} joint(s) in the {} {limb}", ordinal(place), side.name()),
                };
                self.add(joint, role_of(part, side), &case);
            }
            self.find_twist_helpers(chain, &places);
            if kind == ChainKind::Arm
                && let Some(hand) = places[3].map(|place| chain[place])
            {
                self.finger_roles(hand, side);
            }
        }
    }

    fn finger_roles(&mut self, hand: usize, side: Side) {
        let digits = fingers::fingers(self.figure, hand);
        let n = digits.len();
        for digit in digits {
            self.chains.push(Chain {
                kind: ChainKind::Finger(digit.finger),
                side: Some(side),
                joints: digit.joints.clone(),
            });
            for (joint, phalanx) in digit.joints.into_iter().zip(Phalanx::ALL) {
                let name = self.figure.names[joint].score(Part::Finger(digit.finger));
                let case = Case {
                    name,
                    shape: if digit.is_named {
                        0.8
                    } else if n == 5 {
                        0.7
                    } else {
                        0.5
                    },
                    side: self.side_certainty,
                    margin: if digit.is_named { 1.0 } else { 0.08 },
                    place: format!(
                        "{} joint of a finger of the {} hand",
                        ordinal(phalanx as usize),
                        side.name()
                    ),
                };
                self.add(joint, Role::Finger(side, digit.finger, phalanx), &case);
            }
        }
    }

    /// The front legs of an animal are no arms; where names call them so, that is asked.
    fn front_legs(&mut self, front: &Limbs) {
        let figure = self.figure;
        for (side, chain) in self.sides(&front.pair).into_iter().zip(&front.chains) {
            let says_arm = chain.iter().any(|&joint| {
                [Part::UpperArm, Part::LowerArm, Part::Hand]
                    .iter()
                    .any(|&part| figure.names[joint].score(part) > 0.7)
            });
            self.chains.push(Chain { kind: ChainKind::FrontLeg, side: Some(side), joints: chain.clone() });
            let called = if says_arm { ", though its names speak of an arm" } else { "" };
            let text = format!(
                "`{}` begins a limb that stands on the ground: a front leg{called}; it got no role of an arm",
                self.label(chain[0])
            );
            self.doubt(Some(chain[0]), Some(Role::UpperArm(side)), text);
        }
    }

    /// A joint on the straight line between two others of its chain, or one that is named so.
    fn is_helper(&self, chain: &[usize], place: usize) -> bool {
        if self.figure.names[chain[place]].is_twist() {
            return true;
        }
        if place == 0 || place + 1 >= chain.len() {
            return false;
        }
        let at = |place: usize| self.figure.position[chain[place]];
        let (before, after) = (at(place) - at(place - 1), at(place + 1) - at(place));
        let small = 1e-6 * self.figure.extent;
        before.length() > small && after.length() > small && before.angle_between(after) < 0.175
    }

    /// Joints within a bone, in its chain or beside it.
    fn find_twist_helpers(&mut self, chain: &[usize], places: &[Option<usize>; 4]) {
        let figure = self.figure;
        let set: Vec<usize> = places.iter().flatten().copied().collect();
        for ends in set.windows(2) {
            let [from, to] = [chain[ends[0]], chain[ends[1]]];
            let (a, b) = (figure.position[from], figure.position[to]);
            let bone = b - a;
            let length = bone.length();
            if length < 1e-6 * figure.extent {
                continue;
            }
            let share_of = |joint: usize| {
                let along = figure.position[joint] - a;
                let share = along.dot(bone) / (length * length);
                let off = (along - bone * share).length();
                (off < 0.06 * length && (-0.01..=1.01).contains(&share)).then(|| share.clamp(0.0, 1.0))
            };
            let between = &chain[ends[0] + 1..ends[1]];
            for &joint in between {
                if let Some(share) = share_of(joint) {
                    self.twist.push(TwistHelper { joint, of: from, share });
                }
            }
            // Leaves beside the chain: only those that names call so, or that lie within the bone.
            let beside = std::iter::once(&from).chain(between).flat_map(|&on| &figure.kids[on]);
            for &joint in beside {
                let leaf =
                    figure.kids[joint].is_empty() && figure.tips[joint].is_empty() && !chain.contains(&joint);
                if !leaf {
                    continue;
                }
                if let Some(share) = share_of(joint)
                    && (figure.names[joint].is_twist() || (0.02..0.98).contains(&share))
                {
                    self.twist.push(TwistHelper { joint, of: from, share });
                }
            }
        }
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

    /// All that is in no chain yet: further legs, wings, tails, ears, hair.
    fn other_chains(&mut self, plan: &Plan) {
        let figure = self.figure;
        let mut taken = vec![false; figure.names.len()];
        for joint in self.chains.iter().flat_map(|chain| &chain.joints).chain(plan.hips.iter()) {
            taken[*joint] = true;
        }
        for helper in &self.twist {
            taken[helper.joint] = true;
        }
        let used = |first: usize| {
            [&plan.legs, &plan.arms, &plan.front_legs]
                .into_iter()
                .flatten()
                .any(|limbs| limbs.pair.first.contains(&first))
        };
        for pair in plan.pairs.iter().filter(|pair| !used(pair.first[0])) {
            let kind = self.kind_of_pair(plan, pair);
            for (side, first) in self.sides(pair).into_iter().zip(pair.first) {
                let joints: Vec<usize> =
                    figure.path_down(first).into_iter().filter(|&joint| !taken[joint]).collect();
                if joints.is_empty() {
                    continue;
                }
                for &joint in &joints {
                    taken[joint] = true;
                }
                self.chains.push(Chain { kind, side: Some(side), joints });
            }
        }
        for start in (0..figure.names.len()).filter(|&joint| figure.is_active[joint]) {
            if taken[start] {
                continue;
            }
            let mut joints = vec![start];
            taken[start] = true;
            let mut at = start;
            while let Some(next) = figure.main_kid(at).filter(|&next| !taken[next]) {
                taken[next] = true;
                joints.push(next);
                at = next;
            }
            let named_tail = joints.iter().any(|&joint| figure.names[joint].score(Part::Tail) > 0.9);
            let on = figure.parent[start];
            let behind = on.is_some_and(|on| {
                let way = figure.far[start] - figure.position[on];
                way.dot(self.shape.forward) < -0.3 * way.length() && way.length() > 0.1 * self.shape.height
            });
            let on_hips = on.is_some() && on == plan.hips && !figure.names[start].is_strand();
            let kind = if named_tail || (on_hips && behind) { ChainKind::Tail } else { ChainKind::Other };
            let side = figure.names[start].side;
            self.chains.push(Chain { kind, side, joints });
        }
    }

    fn kind_of_pair(&self, plan: &Plan, pair: &Pair) -> ChainKind {
        let figure = self.figure;
        let path = figure.path_down(pair.first[0]);
        let says = |part: Part| path.iter().any(|&joint| figure.names[joint].score(part) > 0.6);
        if says(Part::Wing) {
            return ChainKind::Wing;
        }
        if says(Part::Ear) {
            return ChainKind::Ear;
        }
        if path.iter().any(|&joint| figure.names[joint].is_strand()) {
            return ChainKind::Other;
        }
        let height = self.shape.height.max(f64::MIN_POSITIVE);
        let fall = |first: usize| (figure.position[pair.on] - figure.far[first]).dot(plan.up);
        let low = |first: usize| figure.far[first].dot(plan.up) - plan.span[0] < 0.2 * height;
        if says(Part::UpperLeg)
            || says(Part::LowerLeg)
            || (pair.first.iter().all(|&first| low(first) && fall(first) > 0.15 * height))
        {
            return ChainKind::Leg;
        }
        let on_trunk = Some(pair.on) == plan.hips || plan.trunk.contains(&pair.on);
        let wide = pair.first.iter().all(|&first| figure.reach[first] > 0.25 * height);
        if on_trunk && wide { ChainKind::Wing } else { ChainKind::Other }
    }

    /// Where each limb ends and how it bends.
    fn shape_of_limbs(&mut self, plan: &Plan) {
        let by_role: BTreeMap<Role, usize> =
            self.candidates.iter().map(|one| (one.role, one.joint)).collect();
        let at = |joint: usize| self.figure.position[joint];
        let shape = &mut self.shape;
        let (up, forward, left) = (shape.up, shape.forward, shape.left);
        // A chain's joints end at the next one of it, whatever else hangs on them.
        for chain in &self.chains {
            for pair in chain.joints.windows(2) {
                if at(pair[0]).distance(at(pair[1])) > 1e-6 * self.figure.extent {
                    shape.ends[pair[0]] = Some(at(pair[1]));
                }
            }
        }
        let mut ends = |from: Option<usize>, to: Option<usize>| {
            if let (Some(from), Some(to)) = (from, to)
                && at(from).distance(at(to)) > 1e-6 * self.figure.extent
            {
                shape.ends[from] = Some(at(to));
            }
        };
        let role = |role: Role| by_role.get(&role).copied();
        for side in Side::BOTH {
            ends(role(Role::Shoulder(side)), role(Role::UpperArm(side)));
            ends(role(Role::UpperArm(side)), role(Role::LowerArm(side)));
            ends(role(Role::LowerArm(side)), role(Role::Hand(side)));
            ends(role(Role::UpperLeg(side)), role(Role::LowerLeg(side)));
            ends(role(Role::LowerLeg(side)), role(Role::Foot(side)));
            ends(role(Role::Foot(side)), role(Role::Toes(side)));
        }
        // The trunk goes on to the neck, not to an arm.
        if let (Some(&last), Some(&first)) = (plan.trunk.last(), plan.neck.first()) {
            ends(Some(last), Some(first));
        }
        let above = plan.trunk.iter().chain(&plan.neck).copied().find(|&joint| {
            plan.hips.is_some_and(|hips| at(hips).distance(at(joint)) > 1e-6 * self.figure.extent)
        });
        ends(plan.hips, above);
        // A hand points along its middle finger, or the mean of its fingers.
        for side in Side::BOTH {
            let Some(hand) = role(Role::Hand(side)) else { continue };
            let middle = [Finger::Middle, Finger::Index, Finger::Ring]
                .into_iter()
                .find_map(|finger| role(Role::Finger(side, finger, Phalanx::First)));
            ends(Some(hand), middle);
        }

        for chain in
            self.chains.iter().filter(|chain| matches!(chain.kind, ChainKind::Trunk | ChainKind::Neck))
        {
            for &joint in &chain.joints {
                shape.hinges[joint] = Some(left);
            }
        }
        if let Some(hips) = plan.hips {
            shape.hinges[hips] = Some(left);
        }
        // A head without a tip points up.
        if let Some(&head) = plan.neck.last()
            && shape.ends[head].is_none()
            && plan.front_legs.is_none()
        {
            shape.ends[head] = Some(at(head) + up * (0.1 * shape.height));
        }
        for side in Side::BOTH {
            let legs = [Role::UpperLeg(side), Role::LowerLeg(side), Role::Foot(side)].map(role);
            if let Some(hinge) = hinge(shape, [legs[0], legs[1]], left, -forward, up) {
                for joint in legs[..2].iter().flatten() {
                    shape.hinges[*joint] = Some(hinge);
                }
                for joint in [role(Role::Foot(side)), role(Role::Toes(side))].into_iter().flatten() {
                    shape.hinges[joint] = Some(left);
                }
            }
            let arms = [Role::UpperArm(side), Role::LowerArm(side)].map(role);
            let fallback =
                arms[1].and_then(|joint| shape.limb_direction(joint)).map(|along| along.cross(forward));
            let fallback = fallback.filter(|axis| axis.length() > 0.2).unwrap_or(-up);
            if let Some(hinge) = hinge(shape, arms, fallback, forward, up) {
                for joint in arms.iter().flatten().copied().chain(role(Role::Hand(side))) {
                    shape.hinges[joint] = Some(hinge);
                }
                for finger in Finger::ALL {
                    for phalanx in Phalanx::ALL {
                        if let Some(joint) = role(Role::Finger(side, finger, phalanx)) {
                            // The palm's normal: fingers bend towards it about an axis across the palm.
                            shape.hinges[joint] = Some(hinge);
                        }
                    }
                }
            }
            if let Some(shoulder) = role(Role::Shoulder(side)) {
                shape.hinges[shoulder] = Some(up);
            }
        }
        // Whatever else: the figure's left, or up where the limb itself points to the side.
        for joint in 0..shape.positions.len() {
            if shape.hinges[joint].is_none()
                && let Some(along) = shape.limb_direction(joint)
            {
                shape.hinges[joint] = Some(if along.dot(left).abs() < 0.8 { left } else { up });
            }
        }
        let ankles: Vec<f64> = Side::BOTH
            .iter()
            .filter_map(|&side| role(Role::Foot(side)))
            .map(|foot| at(foot).dot(up) - shape.ground)
            .collect();
        if !ankles.is_empty() {
            shape.ankle_height = (ankles.iter().sum::<f64>() / ankles.len() as f64).max(0.0);
        }
    }

    /// What does not fit together.
    fn cross_checks(&mut self, plan: &Plan) {
        let by_role: BTreeMap<Role, usize> =
            self.candidates.iter().map(|one| (one.role, one.joint)).collect();
        if plan.front_legs.is_none() && (plan.legs.is_some() || plan.arms.is_some()) {
            let missing: Vec<String> = Role::all()
                .into_iter()
                .filter(|role| role.is_required() && !by_role.contains_key(role))
                .map(Role::words)
                .collect();
            if !missing.is_empty() {
                self.doubt(None, None, format!("not found: {}", missing.join(", ")));
            }
        }
        for (role, joint) in &by_role {
            let Some(Side::Left) = role.side() else { continue };
            let Some(other) = by_role.get(&role.mirror()) else { continue };
            let [own, its] = [*joint, *other].map(|joint| self.shape.limb_length(joint));
            let matters =
                matches!(role, Role::UpperArm(_) | Role::LowerArm(_) | Role::UpperLeg(_) | Role::LowerLeg(_));
            if matters && (own - its).abs() > 0.05 * own.max(its) {
                let text = format!(
                    "the {} is {:.0} % {} than the right one",
                    role.words(),
                    100.0 * (own / its - 1.0).abs(),
                    if own > its { "longer" } else { "shorter" }
                );
                self.doubt(Some(*joint), Some(*role), text);
            }
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
                format!("{} of {} joint(s) of {kind}", ordinal(own.place), chain.joints.len())
            } else {
                "no part of the figure that was found".to_owned()
            };
        }
        let body = match &self.plan {
            Some(plan) if plan.front_legs.is_some() => Body::FourLegged,
            Some(plan) if plan.legs.is_some() => Body::Upright,
            _ => Body::Unknown,
        };
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
            by_role,
        }
    }
}

/// The bending axis of a two-joint limb: the normal of its bend at rest where it is bent, else `fallback`. `towards` is where
/// the lower part goes when it bends; a bend at rest of a few degrees the other way is a rest pose overstretched.
fn hinge(
    shape: &RestShape,
    joints: [Option<usize>; 2],
    fallback: DVec3,
    towards: DVec3,
    up: DVec3,
) -> Option<DVec3> {
    let [upper, lower] = [joints[0]?, joints[1]?].map(|joint| shape.limb_direction(joint));
    let (upper, lower) = (upper?, lower?);
    let at_right_angles = |axis: DVec3| (axis - lower * axis.dot(lower)).try_normalize();
    let fallback =
        at_right_angles(fallback).or_else(|| at_right_angles(up)).or_else(|| at_right_angles(towards))?;
    let normal = upper.cross(lower);
    let bend = normal.length().asin().to_degrees();
    let expected = lower.cross(towards);
    // From 15° on the bend itself tells; below it must agree with where the figure faces.
    if bend > 15.0 || (bend > 3.0 && normal.normalize_or_zero().dot(expected.normalize_or_zero()) > 0.5) {
        return at_right_angles(normal);
    }
    Some(fallback)
}

/// Which joints of the trunk are spine, chest and upper chest: up to three in order, of more by names and by their share of the
/// way (`skeleton-names` section 4.3).
fn trunk_places(figure: &Figure<'_>, plan: &Plan) -> [Option<usize>; 3] {
    let n = plan.trunk.len();
    match n {
        0 => return [None; 3],
        1 => return [Some(0), None, None],
        2 => return [Some(0), Some(1), None],
        3 => return [Some(0), Some(1), Some(2)],
        _ => {}
    }
    let mut along = vec![0.0];
    let mut before = plan.hips.map_or(figure.position[plan.trunk[0]], |hips| figure.position[hips]);
    for &joint in &plan.trunk {
        along.push(along[along.len() - 1] + figure.position[joint].distance(before));
        before = figure.position[joint];
    }
    let total = along[n].max(f64::MIN_POSITIVE);
    let share = |place: usize| along[place + 1] / total;
    let name = |place: usize, part: Part| {
        if figure.is_named { figure.names[plan.trunk[place]].score(part) } else { 0.0 }
    };
    let fit = |place: usize, part: Part, middle: f64| name(place, part) - (share(place) - middle).abs();
    let mut best: Option<(f64, [usize; 3])> = None;
    for spine in 0..n {
        for chest in spine + 1..n {
            for upper in chest + 1..n {
                let score = fit(spine, Part::Spine, 0.15)
                    + fit(chest, Part::Chest, 0.575)
                    + fit(upper, Part::UpperChest, 0.95);
                if best.is_none_or(|(most, _)| score > most + 1e-9) {
                    best = Some((score, [spine, chest, upper]));
                }
            }
        }
    }
    best.map_or([None; 3], |(_, places)| places.map(Some))
}

fn role_of(part: Part, side: Side) -> Role {
    match part {
        Part::UpperLeg => Role::UpperLeg(side),
        Part::LowerLeg => Role::LowerLeg(side),
        Part::Foot => Role::Foot(side),
        Part::Toes => Role::Toes(side),
        Part::Shoulder => Role::Shoulder(side),
        Part::UpperArm => Role::UpperArm(side),
        Part::LowerArm => Role::LowerArm(side),
        _ => Role::Hand(side),
    }
}

fn ordinal(place: usize) -> String {
    match place {
        0 => "first".to_owned(),
        1 => "second".to_owned(),
        2 => "third".to_owned(),
        other => format!("number {}", other + 1),
    }
}

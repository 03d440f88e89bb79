//! Roles of legs, arms and fingers, and the helpers that lie along their bones.

use super::body::Limbs;
use super::find::{Case, Finder, ordinal, place_among};
use super::fingers;
use super::found::{Chain, ChainKind, TwistHelper};
use super::limbs::{ARM, LEG};
use super::name::Part;
use super::role::{Phalanx, Role, Side};

impl Finder<'_, '_> {
    pub(super) fn limb_roles(&mut self, limbs: &Limbs, kind: ChainKind) {
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
                    place: format!("{} in the {} {limb}", place_among(place, n), side.name()),
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

    pub(super) fn finger_roles(&mut self, hand: usize, side: Side) {
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
    pub(super) fn front_legs(&mut self, front: &Limbs) {
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
    pub(super) fn is_helper(&self, chain: &[usize], place: usize) -> bool {
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
    pub(super) fn find_twist_helpers(&mut self, chain: &[usize], places: &[Option<usize>; 4]) {
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

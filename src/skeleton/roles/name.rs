//! What the name of a joint says, and how well that fits a part of the body.

use super::dictionary::Word;
use super::role::{Finger, Side};

/// A part of the body without its side, as names can say it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) enum Part {
    Hips,
    Spine,
    Chest,
    UpperChest,
    Neck,
    Head,
    Jaw,
    Eye,
    Shoulder,
    UpperArm,
    LowerArm,
    Hand,
    UpperLeg,
    LowerLeg,
    Foot,
    Toes,
    Finger(Finger),
    Tail,
    Wing,
    Ear,
}

/// What the name of one joint says.
#[derive(Clone, Debug, Default)]
pub(super) struct Name {
    /// The side it names; a lone letter counts only where the mirrored name exists too.
    pub side: Option<Side>,
    /// The known words but sides, in order.
    pub words: Vec<Word>,
    /// The number that counts it within its chain.
    pub number: Option<u32>,
    /// The name without its side, for finding the mirrored one and the same joint of another figure.
    pub key: String,
}

impl Name {
    fn has(&self, word: Word) -> bool {
        self.words.contains(&word)
    }

    /// Whether it says that the joint is none of the body: a control, a prop, a target.
    pub(super) fn is_helper(&self) -> bool {
        self.has(Word::Helper)
    }

    /// Whether it says that the joint ends a limb and turns nothing.
    pub(super) fn is_end(&self) -> bool {
        self.has(Word::End)
    }

    /// Whether it says that the joint takes part of a limb's twist.
    pub(super) fn is_twist(&self) -> bool {
        self.has(Word::Twist)
    }

    /// Whether it names a front limb of an animal.
    pub(super) fn is_front(&self) -> bool {
        self.has(Word::Front)
    }

    /// Hair, skirts, capes: hangs on the body and is no limb.
    pub(super) fn is_strand(&self) -> bool {
        self.has(Word::Strand)
    }

    /// Whether any part of a body is named.
    pub(super) fn names_a_part(&self) -> bool {
        self.words.iter().any(|word| {
            !matches!(
                word,
                Word::Filler
                    | Word::Upper
                    | Word::Lower
                    | Word::Fore
                    | Word::Side(_)
                    | Word::Front
                    | Word::Rear
                    | Word::Helper
                    | Word::End
                    | Word::Twist
                    | Word::Strand
                    | Word::Root
                    | Word::Centre
                    | Word::Body
            )
        })
    }

    /// The finger it names.
    pub(super) fn finger(&self) -> Option<Finger> {
        if self.has(Word::Leg) {
            return None;
        }
        self.words.iter().find_map(|word| match word {
            Word::Finger(finger) => Some(*finger),
            _ => None,
        })
    }

    /// Whether it names the metacarpal bone of a finger, which the specification has for the thumb alone.
    pub(super) fn is_metacarpal(&self) -> bool {
        self.has(Word::Metacarpal)
    }

    /// How well it fits a part: 1 says so, 0.4 to 0.9 may mean it, 0 says nothing, −1 says something else.
    #[expect(clippy::match_same_arms, reason = "a table, part by part")]
    pub(super) fn score(&self, part: Part) -> f64 {
        if self.is_helper() || self.is_end() || self.is_strand() {
            return -1.0;
        }
        let upper = self.has(Word::Upper);
        let lower = self.has(Word::Lower) || self.has(Word::Fore);
        let by_height = |low: f64, high: f64, bare: f64| {
            if lower {
                low
            } else if upper {
                high
            } else {
                bare
            }
        };
        let by_side = |sided: f64, bare: f64| if self.side.is_some() { sided } else { bare };
        let mut best: Option<f64> = None;
        let mut knows = false;
        let of_limb = self.words.iter().any(|word| {
            matches!(
                word,
                Word::Leg
                    | Word::Arm
                    | Word::Thigh
                    | Word::Shin
                    | Word::Foot
                    | Word::Shoulder
                    | Word::Hand
                    | Word::Toe
            )
        });
        for word in &self.words {
            use Word as W;
            // The back leg is no back, and the mid leg no finger.
            if of_limb && (*word == W::Back || (matches!(word, W::Finger(_)) && self.has(W::Leg))) {
                continue;
            }
            let fit = match (part, word) {
                (Part::Hips, W::Hip) => by_side(-1.0, 1.0),
                (Part::Hips, W::Pelvis) => by_side(-0.5, 1.0),
                (Part::Hips, W::Root | W::Centre) => 0.5,
                (Part::Hips, W::Body) => by_height(1.0, 0.4, 0.4),
                (Part::Hips, W::Torso | W::Waist) => 0.3,
                (Part::Hips, W::Spine) => 0.0,
                (Part::Spine | Part::Chest | Part::UpperChest, W::Root | W::Centre) => -0.3,
                (Part::Spine, W::Spine) => 0.9,
                (Part::Spine, W::Waist) => 1.0,
                (Part::Spine, W::Back | W::Torso) => by_height(0.9, 0.2, 0.9),
                (Part::Spine, W::Chest) => 0.2,
                (Part::Spine, W::Body) => by_height(0.3, 0.8, 0.3),
                (Part::Chest, W::Chest) => by_height(0.9, 0.5, 0.9),
                (Part::Chest, W::Spine) => 0.7,
                (Part::Chest, W::Back | W::Torso) => by_height(0.2, 0.7, 0.7),
                (Part::Chest, W::Waist) => 0.0,
                (Part::UpperChest, W::Chest) => by_height(0.8, 1.0, 0.8),
                (Part::UpperChest, W::Spine | W::Torso) => 0.6,
                (Part::UpperChest, W::Back) => by_height(0.1, 0.7, 0.1),
                (Part::Neck, W::Neck) => by_height(1.0, 0.8, 1.0),
                (Part::Head, W::Head) => 1.0,
                (Part::Head, W::Face) => 0.5,
                (Part::Head, W::Neck) => by_height(0.0, 0.1, 0.0),
                (Part::Jaw, W::Jaw) | (Part::Eye, W::Eye) => 1.0,
                (Part::Tail, W::Tail) | (Part::Wing, W::Wing) | (Part::Ear, W::Ear) => 1.0,
                (Part::Shoulder, W::Clavicle) => 1.0,
                (Part::Shoulder, W::Shoulder) => 0.75,
                (Part::UpperArm, W::Shoulder) => 0.7,
                (Part::UpperArm, W::Humerus) => 1.0,
                (Part::UpperArm, W::Arm) => by_height(-1.0, 1.0, 0.8),
                (Part::LowerArm, W::Elbow) => 1.0,
                (Part::LowerArm, W::Arm) => by_height(1.0, -1.0, 0.4),
                (Part::Hand, W::Wrist) => 1.0,
                (Part::Hand, W::Hand) => 0.95,
                (Part::Hand | Part::Shoulder, W::Arm) => by_height(-1.0, -1.0, 0.2),
                (Part::UpperLeg, W::Thigh) => 1.0,
                (Part::UpperLeg, W::Hip) => by_side(0.8, -1.0),
                (Part::UpperLeg, W::Leg) => by_height(-1.0, 1.0, 0.7),
                (Part::LowerLeg, W::Shin) => 1.0,
                (Part::LowerLeg, W::Leg) => by_height(1.0, -1.0, 0.65),
                (Part::Foot, W::Ankle) => 1.0,
                (Part::Foot, W::Foot) => 0.9,
                (Part::Foot | Part::Toes, W::Leg) => by_height(-1.0, -1.0, 0.2),
                (Part::Toes, W::Toe | W::Ball) => 1.0,
                (Part::Toes, W::Foot) => 0.5,
                (Part::Finger(finger), W::Finger(named)) if finger == *named => 1.0,
                (Part::Finger(_), W::AnyFinger) => 0.3,
                // A hand that carries fingers names both; the finger decides.
                (Part::Finger(_), W::Hand) => continue,
                (_, W::Filler | W::Upper | W::Lower | W::Fore | W::Side(_) | W::Front | W::Rear) => continue,
                (_, W::Root | W::Body | W::Centre) => continue,
                _ => -1.0,
            };
            knows = true;
            best = Some(best.map_or(fit, |best| best.max(fit)));
        }
        if !knows {
            return 0.0;
        }
        // A finger of a hand is no hand, and a twist joint of an arm no arm.
        let clash = (self.finger().is_some()
            && !matches!(part, Part::Finger(_))
            && !(part == Part::Toes && self.has(Word::Toe)))
            || (self.is_twist());
        if clash { -1.0 } else { best.unwrap_or(0.0) }
    }
}

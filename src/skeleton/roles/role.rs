//! The parts a joint can play in a human figure.

use std::fmt;

/// Left or right, as the figure itself sees it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Side {
    /// The figure's left; at +x for one that faces +z with y up.
    Left,
    /// The figure's right.
    Right,
}

impl Side {
    /// Left, then right.
    pub const BOTH: [Self; 2] = [Self::Left, Self::Right];

    /// The other one.
    #[must_use]
    pub const fn other(self) -> Self {
        match self {
            Self::Left => Self::Right,
            Self::Right => Self::Left,
        }
    }

    /// `left` or `right`.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Left => "left",
            Self::Right => "right",
        }
    }

    /// 0 for left, 1 for right.
    pub const fn index(self) -> usize {
        self as usize
    }
}

/// A finger.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[expect(missing_docs, reason = "the names say it")]
pub enum Finger {
    Thumb,
    Index,
    Middle,
    Ring,
    Little,
}

impl Finger {
    /// From the thumb outwards.
    pub const ALL: [Self; 5] = [Self::Thumb, Self::Index, Self::Middle, Self::Ring, Self::Little];
}

/// The bone of a finger, counted from the palm. The first of the thumb is its metacarpal.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[expect(missing_docs, reason = "the names say it")]
pub enum Phalanx {
    First,
    Second,
    Third,
}

impl Phalanx {
    /// From the palm to the tip.
    pub const ALL: [Self; 3] = [Self::First, Self::Second, Self::Third];
}

/// A part of the human figure: the humanoid bones of the open specification `VRMC_vrm` 1.0.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[expect(missing_docs, reason = "the names say it")]
pub enum Role {
    Hips,
    Spine,
    Chest,
    UpperChest,
    Neck,
    Head,
    Jaw,
    Eye(Side),
    Shoulder(Side),
    UpperArm(Side),
    LowerArm(Side),
    Hand(Side),
    UpperLeg(Side),
    LowerLeg(Side),
    Foot(Side),
    Toes(Side),
    Finger(Side, Finger, Phalanx),
}

impl Role {
    /// All 55, the trunk first, parents before children.
    pub fn all() -> Vec<Self> {
        let mut all =
            vec![Self::Hips, Self::Spine, Self::Chest, Self::UpperChest, Self::Neck, Self::Head, Self::Jaw];
        for side in Side::BOTH {
            all.extend([
                Self::Eye(side),
                Self::Shoulder(side),
                Self::UpperArm(side),
                Self::LowerArm(side),
                Self::Hand(side),
                Self::UpperLeg(side),
                Self::LowerLeg(side),
                Self::Foot(side),
                Self::Toes(side),
            ]);
            for finger in Finger::ALL {
                all.extend(Phalanx::ALL.map(|phalanx| Self::Finger(side, finger, phalanx)));
            }
        }
        all
    }

    /// The side it belongs to; `None` for the trunk.
    pub const fn side(self) -> Option<Side> {
        match self {
            Self::Eye(side)
            | Self::Shoulder(side)
            | Self::UpperArm(side)
            | Self::LowerArm(side)
            | Self::Hand(side)
            | Self::UpperLeg(side)
            | Self::LowerLeg(side)
            | Self::Foot(side)
            | Self::Toes(side)
            | Self::Finger(side, _, _) => Some(side),
            _ => None,
        }
    }

    /// The same part of the other side; the trunk is its own mirror.
    #[must_use]
    pub const fn mirror(self) -> Self {
        match self {
            Self::Eye(side) => Self::Eye(side.other()),
            Self::Shoulder(side) => Self::Shoulder(side.other()),
            Self::UpperArm(side) => Self::UpperArm(side.other()),
            Self::LowerArm(side) => Self::LowerArm(side.other()),
            Self::Hand(side) => Self::Hand(side.other()),
            Self::UpperLeg(side) => Self::UpperLeg(side.other()),
            Self::LowerLeg(side) => Self::LowerLeg(side.other()),
            Self::Foot(side) => Self::Foot(side.other()),
            Self::Toes(side) => Self::Toes(side.other()),
            Self::Finger(side, finger, phalanx) => Self::Finger(side.other(), finger, phalanx),
            centre => centre,
        }
    }

    /// The part it hangs on; where a figure does not have that one, the part's own parent serves.
    pub const fn parent(self) -> Option<Self> {
        Some(match self {
            Self::Hips => return None,
            Self::Spine | Self::UpperLeg(_) => Self::Hips,
            Self::Chest => Self::Spine,
            Self::UpperChest => Self::Chest,
            Self::Neck | Self::Shoulder(_) => Self::UpperChest,
            Self::Head => Self::Neck,
            Self::Jaw | Self::Eye(_) => Self::Head,
            Self::UpperArm(side) => Self::Shoulder(side),
            Self::LowerArm(side) => Self::UpperArm(side),
            Self::Hand(side) => Self::LowerArm(side),
            Self::LowerLeg(side) => Self::UpperLeg(side),
            Self::Foot(side) => Self::LowerLeg(side),
            Self::Toes(side) => Self::Foot(side),
            Self::Finger(side, _, Phalanx::First) => Self::Hand(side),
            Self::Finger(side, finger, Phalanx::Second) => Self::Finger(side, finger, Phalanx::First),
            Self::Finger(side, finger, Phalanx::Third) => Self::Finger(side, finger, Phalanx::Second),
        })
    }

    /// Whether a human figure has to have it (15 parts).
    pub const fn is_required(self) -> bool {
        matches!(
            self,
            Self::Hips
                | Self::Spine
                | Self::Head
                | Self::UpperArm(_)
                | Self::LowerArm(_)
                | Self::Hand(_)
                | Self::UpperLeg(_)
                | Self::LowerLeg(_)
                | Self::Foot(_)
        )
    }

    /// Whether the joint bends about one axis: knees, elbows, toes and the outer finger joints.
    pub const fn is_hinge(self) -> bool {
        match self {
            Self::LowerArm(_) | Self::LowerLeg(_) | Self::Toes(_) | Self::Jaw => true,
            Self::Finger(_, finger, phalanx) => {
                !matches!(phalanx, Phalanx::First)
                    || matches!((finger, phalanx), (Finger::Thumb, Phalanx::Second))
            }
            _ => false,
        }
    }

    /// Its name in the specification: `leftUpperArm`.
    pub fn name(self) -> String {
        let Some(side) = self.side() else {
            return match self {
                Self::Hips => "hips",
                Self::Spine => "spine",
                Self::Chest => "chest",
                Self::UpperChest => "upperChest",
                Self::Neck => "neck",
                Self::Jaw => "jaw",
                _ => "head",
            }
            .to_owned();
        };
        let part = match self {
            Self::Eye(_) => "Eye",
            Self::Shoulder(_) => "Shoulder",
            Self::UpperArm(_) => "UpperArm",
            Self::LowerArm(_) => "LowerArm",
            Self::Hand(_) => "Hand",
            Self::UpperLeg(_) => "UpperLeg",
            Self::LowerLeg(_) => "LowerLeg",
            Self::Foot(_) => "Foot",
            Self::Finger(_, finger, phalanx) => {
                return format!("{}{}", side.name(), finger_name(finger, phalanx));
            }
            _ => "Toes",
        };
        format!("{}{part}", side.name())
    }

    /// The role of that name in the specification.
    pub fn parse(name: &str) -> Option<Self> {
        Self::all().into_iter().find(|role| role.name() == name)
    }

    /// What a person calls it: `left upper arm`.
    pub fn words(self) -> String {
        let mut words = String::new();
        for letter in self.name().chars() {
            if letter.is_ascii_uppercase() {
                words.push(' ');
            }
            words.push(letter.to_ascii_lowercase());
        }
        words
    }
}

fn finger_name(finger: Finger, phalanx: Phalanx) -> String {
    let bone = match (finger, phalanx) {
        (Finger::Thumb, Phalanx::First) => "Metacarpal",
        (Finger::Thumb, Phalanx::Second) | (_, Phalanx::First) => "Proximal",
        (_, Phalanx::Second) => "Intermediate",
        (_, Phalanx::Third) => "Distal",
    };
    format!("{finger:?}{bone}")
}

impl fmt::Display for Role {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.name())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_roles_are_those_of_the_specification() {
        let all = Role::all();
        assert_eq!(all.len(), 55);
        assert_eq!(all.iter().filter(|role| role.is_required()).count(), 15);
        for role in all {
            assert_eq!(Role::parse(&role.name()), Some(role));
            assert_eq!(role.mirror().mirror(), role);
            assert_eq!(role.parent().map(Role::mirror), role.mirror().parent());
        }
        assert_eq!(Role::Finger(Side::Left, Finger::Thumb, Phalanx::First).name(), "leftThumbMetacarpal");
        assert_eq!(Role::UpperArm(Side::Right).words(), "right upper arm");
    }
}

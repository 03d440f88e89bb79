//! Puts the preset on a skeleton.

use std::collections::BTreeMap;

use glam::DVec3;

use crate::clip::Clip;
use crate::skeleton::Skeleton;
use crate::skeleton::roles::{Body, ChainKind, Finger, Phalanx, Role, Roles, Side};

use super::super::interval::Interval;
use super::super::joint_limit::{JointLimit, Range, Reading};
use super::super::limits::{Limits, readings};
use super::super::swing::SwingLimit;
use super::anatomy::Anatomy;
use super::spine::{self, Share};
use super::table::bands;

/// The preset on a skeleton, and what was taken for what.
#[derive(Clone, Debug, PartialEq)]
pub struct AdultLimits {
    /// The limits, titled `adult`.
    pub limits: Limits,
    /// The part of the body each limited joint was taken for.
    pub parts: Vec<(usize, String)>,
}

/// Why a skeleton gets no limits of the preset.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("the preset adult is for human figures, found {found}; no limits are used")]
pub struct NoAdult {
    /// What was found in place of one.
    pub found: String,
}

/// Without these it is no human figure; hands, feet and head may be missing.
const NEEDED: [fn(Side) -> Role; 4] = [Role::UpperArm, Role::LowerArm, Role::UpperLeg, Role::LowerLeg];

/// The preset for a skeleton, by its rest pose alone. Joints without a role get no limit.
///
/// # Errors
/// When the skeleton is not taken for a human figure.
pub fn limits(skeleton: &Skeleton) -> Result<AdultLimits, NoAdult> {
    let roles = Roles::find(skeleton);
    check(&roles)?;
    Ok(placed_on(skeleton, &roles, &BTreeMap::new()))
}

/// The preset for the skeleton of a clip. About which axes its elbows and knees bend is taken from how they do in the clip: limbs that
/// are straight at rest do not show it, and captures are off by up to 40° there.
///
/// # Errors
/// When the skeleton is not taken for a human figure.
pub fn limits_for(clip: &Clip) -> Result<AdultLimits, NoAdult> {
    let roles = Roles::find(&clip.skeleton);
    check(&roles)?;
    let first = placed_on(&clip.skeleton, &roles, &BTreeMap::new());
    let times: Vec<f64> = clip.grid.times.iter().collect();
    let fault = (LONGEST_FAULT_SECS * clip.grid.rate).ceil() as usize;
    let mut turns = BTreeMap::new();
    let mut loose = Vec::new();
    for side in Side::BOTH {
        for (upper, lower, most) in [
            (Role::UpperArm(side), Role::LowerArm(side), MOST_TURN_ARM),
            (Role::UpperLeg(side), Role::LowerLeg(side), MOST_TURN_LEG),
        ] {
            let (Some(upper), Some(lower)) = (roles.joint(upper), roles.joint(lower)) else { continue };
            let Some(track) = clip.rotation(lower).filter(|track| !track.keys.is_empty()) else { continue };
            let Some(limit) = first.limits.get(lower) else { continue };
            let Some(seen) = hinge_turn(&readings(track, &times, limit), fault) else { continue };
            if seen.is_sure && seen.turn_rad.abs() <= most {
                turns.insert(upper, seen.turn_rad);
            }
            if seen.wanders && matches!(roles.role(lower), Some(Role::LowerArm(_))) {
                loose.push(lower);
            }
        }
    }
    let mut own = placed_on(&clip.skeleton, &roles, &turns);
    for joint in loose {
        if let Some(limit) = own.limits.joints.get_mut(&joint) {
            for range in [&mut limit.comfort, &mut limit.limit, &mut limit.fault] {
                if let SwingLimit::Hinge { bend, .. } = range.swing {
                    range.swing = SwingLimit::Cone { half_rad: bend.hi_rad };
                }
            }
        }
    }
    Ok(own)
}

/// An elbow may be seen to bend so far from where the rest pose says, a knee so far: beyond it is no matter of the rest pose.
const MOST_TURN_ARM: f64 = 110.0 / 180.0 * std::f64::consts::PI;
const MOST_TURN_LEG: f64 = 60.0 / 180.0 * std::f64::consts::PI;

/// Bends between these show their axis.
const SHOWN_RAD: std::ops::Range<f64> = 15.0 / 180.0 * std::f64::consts::PI..2.8;

/// An axis is taken when it is seen in so many frames, and when half of them lie so near their middle.
const LEAST_FRAMES: usize = 8;
const MOST_SPREAD_RAD: f64 = 12.0 / 180.0 * std::f64::consts::PI;

/// An elbow whose axis is seen to wander more than this belongs to a rig that turns the upper arm in the elbow: it is no hinge there.
const MOST_WANDER_RAD: f64 = 25.0 / 180.0 * std::f64::consts::PI;

/// So long a joint may be bent too far by a fault without the axis being read from it.
const LONGEST_FAULT_SECS: f64 = 1.5;

/// About which axis a joint bends; `None` where it does not bend enough to tell. `frames` is how long a fault may go on.
fn hinge_turn(readings: &[Reading], frames: usize) -> Option<Hinge> {
    // Frame and turn of the axis, in time.
    let shown: Vec<(usize, f64)> = readings
        .iter()
        .enumerate()
        .filter(|(_, reading)| SHOWN_RAD.contains(&reading.swing[0].hypot(reading.swing[1])))
        .map(|(frame, reading)| (frame, reading.swing[1].atan2(reading.swing[0])))
        .collect();
    if shown.len() < LEAST_FRAMES {
        return None;
    }
    let sorted = |turns: &mut dyn Iterator<Item = f64>| {
        let mut turns: Vec<f64> = turns.collect();
        turns.sort_by(f64::total_cmp);
        turns
    };
    let at = |turns: &[f64], share: f64| turns[((turns.len() - 1) as f64 * share) as usize];
    let all = sorted(&mut shown.iter().map(|(_, turn)| *turn));
    let turn_rad = at(&all, 0.5);
    let is_wide = |turns: &[f64]| at(turns, 0.98) - at(turns, 0.02) > MOST_WANDER_RAD;
    // A rig whose elbow wanders does so all along. What is off in one stretch alone may be the very fault that is looked for.
    let without_worst = || {
        // Summed up to each frame.
        let far: Vec<f64> = std::iter::once(0.0)
            .chain(shown.iter().scan(0.0, |sum, (_, turn)| {
                *sum += ((turn - turn_rad).abs() - 0.5 * MOST_WANDER_RAD).max(0.0);
                Some(*sum)
            }))
            .collect();
        let worst = (0..shown.len())
            .map(|first| {
                let end = shown.partition_point(|(frame, _)| *frame < shown[first].0 + frames);
                (first, end, far[end] - far[first])
            })
            .max_by(|a, b| a.2.total_cmp(&b.2));
        let (first, end, _) = worst?;
        let left = sorted(&mut shown[..first].iter().chain(&shown[end..]).map(|(_, turn)| *turn));
        (left.len() >= LEAST_FRAMES && 2 * left.len() >= shown.len()).then_some(left)
    };
    Some(Hinge {
        turn_rad,
        is_sure: at(&all, 0.75) - at(&all, 0.25) <= 2.0 * MOST_SPREAD_RAD,
        wanders: is_wide(&all) && without_worst().is_none_or(|left| is_wide(&left)),
    })
}

/// How an elbow or knee is seen to bend.
struct Hinge {
    /// How far its axis is turned from the bend axis, about the twist axis.
    turn_rad: f64,
    /// Whether most frames agree.
    is_sure: bool,
    /// Whether the axis is another one in other frames.
    wanders: bool,
}

/// Trunks that lean more than this at rest belong to no figure that stands upright.
const LEAST_UPRIGHT: f64 = 0.6;

fn check(roles: &Roles) -> Result<(), NoAdult> {
    match roles.body {
        Body::Upright => {}
        Body::FourLegged => return Err(NoAdult { found: "a figure on four legs".to_owned() }),
        Body::Unknown => {
            return Err(NoAdult { found: "a skeleton without arms and legs that could be told".to_owned() });
        }
    }
    let missing: Vec<String> = NEEDED
        .iter()
        .flat_map(|role| Side::BOTH.map(role))
        .filter(|role| roles.joint(*role).is_none())
        .map(Role::words)
        .collect();
    if !missing.is_empty() {
        return Err(NoAdult { found: format!("none for {}", missing.join(", ")) });
    }
    let legs = Side::BOTH.map(Role::UpperLeg).into_iter().filter_map(|role| roles.joint(role));
    let arms = Side::BOTH.map(Role::UpperArm).into_iter().filter_map(|role| roles.joint(role));
    let mean = |joints: &mut dyn Iterator<Item = usize>| {
        let places: Vec<DVec3> = joints.map(|joint| roles.shape.positions[joint]).collect();
        places.iter().sum::<DVec3>() / (places.len() as f64).max(1.0)
    };
    let trunk = mean(&mut arms.into_iter()) - mean(&mut legs.into_iter());
    if trunk.normalize_or_zero().dot(roles.shape.up) < LEAST_UPRIGHT {
        return Err(NoAdult { found: "a trunk that does not stand upright".to_owned() });
    }
    Ok(())
}

fn placed_on(skeleton: &Skeleton, roles: &Roles, hinge_turns: &BTreeMap<usize, f64>) -> AdultLimits {
    let placing = Placing { anatomy: Anatomy::new(skeleton, roles, hinge_turns) };
    let mut own =
        AdultLimits { limits: Limits { title: "adult".to_owned(), ..Limits::default() }, parts: Vec::new() };
    for (kind, name) in [(ChainKind::Trunk, "trunk"), (ChainKind::Neck, "neck")] {
        for (joint, share) in placing.chain(skeleton, kind) {
            own.limits.joints.insert(joint, placing.of_spine(joint, &share));
            own.parts.push((joint, name.to_owned()));
        }
    }
    for (role, joint) in roles.iter() {
        if let Some(limit) = placing.of_role(role, joint) {
            own.limits.joints.insert(joint, limit);
            own.parts.push((joint, role.words()));
        }
    }
    own.parts.sort_by_key(|(joint, _)| *joint);
    own
}

/// The three bands of a motion in radians.
type Bands = [f64; 3];

fn rad(part: &str, motion: &str) -> Bands {
    bands(part, motion).map(f64::to_radians)
}

struct Placing<'a> {
    anatomy: Anatomy<'a>,
}

/// A joint's form: its axes in the scene at zero, and the three bands.
struct Form {
    twist_axis: DVec3,
    bend_axis: DVec3,
    /// Swing forwards and backwards about the bend axis, forwards and backwards about the side axis.
    sides: [Bands; 4],
    /// A hinge: the two first sides bound its bend, the third is what it gives.
    is_hinge: bool,
    /// Twist to the negative side and to the positive one.
    twist: [Bands; 2],
}

impl Placing<'_> {
    /// The joints of trunk or neck, from below upwards, each with its share.
    fn chain(&self, skeleton: &Skeleton, kind: ChainKind) -> Vec<(usize, Share)> {
        let roles = self.anatomy.roles;
        let Some(chain) = roles.chain(kind, None) else { return Vec::new() };
        let hips = roles.joint(Role::Hips);
        let joints: Vec<usize> = chain.joints.iter().copied().filter(|joint| Some(*joint) != hips).collect();
        let (Some(&first), Some(&last)) = (joints.first(), joints.last()) else { return Vec::new() };
        let at = |joint: usize| roles.shape.positions[joint];
        let start = match kind {
            ChainKind::Trunk => hips.or(skeleton.parent_joint(first)).map_or(at(first), at),
            // The neck begins where its first joint stands.
            _ => at(first),
        };
        let end = if kind == ChainKind::Trunk { roles.shape.limb_end(last) } else { None };
        let places = spine::places(start, &joints.iter().map(|joint| at(*joint)).collect::<Vec<_>>(), end);
        joints.into_iter().zip(spine::shares(kind == ChainKind::Neck, &places)).collect()
    }

    fn of_spine(&self, joint: usize, share: &Share) -> JointLimit {
        let [flexion, extension, side, turn] =
            [share.flexion, share.extension, share.side_bend, share.rotation]
                .map(|bands| bands.map(f64::to_radians));
        let shape = &self.anatomy.roles.shape;
        self.placed(
            joint,
            &Form {
                twist_axis: shape.up,
                bend_axis: shape.left,
                sides: [flexion, extension, side, side],
                is_hinge: false,
                twist: [turn, turn],
            },
        )
    }

    fn of_role(&self, role: Role, joint: usize) -> Option<JointLimit> {
        let shape = &self.anatomy.roles.shape;
        let (up, left, forward) = (shape.up, shape.left, shape.forward);
        // Sides and twists are written for the left; the right is its mirror.
        let is_left = role.side() == Some(Side::Left);
        let mirrored = |[a, b, outer, inner]: [Bands; 4]| {
            if is_left { [a, b, outer, inner] } else { [a, b, inner, outer] }
        };
        let turned = |[negative, positive]: [Bands; 2]| {
            if is_left { [negative, positive] } else { [positive, negative] }
        };
        let form = match role {
            Role::Shoulder(side) => {
                let own = |motion| rad("clavicle", motion);
                let along = shape.limb_direction(joint)?;
                let axial = own("axial_rotation");
                Form {
                    twist_axis: along,
                    bend_axis: if side == Side::Left { -up } else { up },
                    sides: mirrored([
                        own("protraction"),
                        own("retraction"),
                        own("depression"),
                        own("elevation"),
                    ]),
                    is_hinge: false,
                    twist: [axial, axial],
                }
            }
            Role::UpperArm(_) => {
                let own = |motion| rad("upper_arm", motion);
                let (flexion, abduction) = (own("flexion"), own("abduction"));
                Form {
                    twist_axis: -up,
                    bend_axis: -left,
                    sides: mirrored([
                        flexion,
                        through(own("extension"), abduction, own("horizontal_abduction"), false),
                        through(own("adduction"), flexion, own("horizontal_adduction"), true),
                        abduction,
                    ]),
                    is_hinge: false,
                    twist: turned([own("external_rotation"), own("internal_rotation")]),
                }
            }
            Role::LowerArm(_) => {
                let own = |motion| rad("forearm", motion);
                let carrying = own("carrying");
                Form {
                    twist_axis: -up,
                    bend_axis: -left,
                    sides: [own("flexion"), own("hyperextension"), carrying, carrying],
                    is_hinge: true,
                    twist: turned([own("supination"), own("pronation")]),
                }
            }
            Role::Hand(side) => {
                let own = |motion| rad("hand", motion);
                Form {
                    twist_axis: -up,
                    bend_axis: self.anatomy.finger_axis(side),
                    sides: mirrored([
                        own("flexion"),
                        own("extension"),
                        own("ulnar_deviation"),
                        own("radial_deviation"),
                    ]),
                    is_hinge: false,
                    // Where a rig turns the palm: in the forearm, in the hand, or shared.
                    twist: turned([rad("forearm", "supination"), rad("forearm", "pronation")]),
                }
            }
            Role::UpperLeg(_) => {
                let own = |motion| rad("upper_leg", motion);
                Form {
                    twist_axis: -up,
                    bend_axis: -left,
                    sides: mirrored([own("flexion"), own("extension"), own("adduction"), own("abduction")]),
                    is_hinge: false,
                    twist: turned([own("external_rotation"), own("internal_rotation")]),
                }
            }
            Role::LowerLeg(_) => {
                let own = |motion| rad("lower_leg", motion);
                let sideways = own("sideways");
                Form {
                    twist_axis: -up,
                    bend_axis: left,
                    sides: [own("flexion"), own("hyperextension"), sideways, sideways],
                    is_hinge: true,
                    twist: turned([own("external_rotation"), own("internal_rotation")]),
                }
            }
            Role::Foot(_) => {
                let own = |motion| rad("foot", motion);
                Form {
                    twist_axis: forward,
                    bend_axis: -left,
                    sides: mirrored([
                        own("dorsiflexion"),
                        own("plantarflexion"),
                        own("toe_in"),
                        own("toe_out"),
                    ]),
                    is_hinge: false,
                    twist: turned([own("inversion"), own("eversion")]),
                }
            }
            Role::Toes(_) => {
                let own = |motion| rad("toes", motion);
                let (sideways, axial) = (own("sideways"), own("axial_rotation"));
                Form {
                    twist_axis: forward,
                    bend_axis: -left,
                    sides: [own("extension"), own("flexion"), sideways, sideways],
                    is_hinge: true,
                    twist: [axial, axial],
                }
            }
            Role::Finger(side, finger, phalanx) if finger != Finger::Thumb => {
                let part = match phalanx {
                    Phalanx::First => "finger_first",
                    Phalanx::Second => "finger_second",
                    Phalanx::Third => "finger_third",
                };
                let spread = rad("finger_first", "abduction");
                Form {
                    twist_axis: -up,
                    bend_axis: self.anatomy.finger_axis(side),
                    sides: [rad(part, "flexion"), rad(part, "hyperextension"), spread, spread],
                    is_hinge: phalanx != Phalanx::First,
                    twist: [spread, spread],
                }
            }
            _ => return None,
        };
        Some(self.placed(joint, &form))
    }

    fn placed(&self, joint: usize, form: &Form) -> JointLimit {
        let range = |band: usize| {
            let sides_rad = form.sides.map(|bands| bands[band]);
            let swing = if form.is_hinge {
                let bend = Interval { lo_rad: -sides_rad[1], hi_rad: sides_rad[0] };
                SwingLimit::Hinge { bend, give_rad: sides_rad[2] }
            } else {
                SwingLimit::Ellipse { sides_rad }
            };
            let twist = Interval { lo_rad: -form.twist[0][band], hi_rad: form.twist[1][band] };
            Range { swing, twist }
        };
        let into = |scene: DVec3| self.anatomy.in_joint(joint, scene);
        let mut limit =
            JointLimit::new(self.anatomy.zero(joint), into(form.twist_axis), into(form.bend_axis), range(1));
        limit.comfort = range(0);
        limit.fault = range(2);
        limit.confidence = self.anatomy.confidence(joint);
        limit
    }
}

/// The side that is wide enough for the arm, raised to the horizontal, to reach as far as a horizontal figure says: that figure is
/// counted from straight out to the side, and `neighbour` is the other side it passes. At least the side's own figure.
fn through(own: Bands, neighbour: Bands, horizontal: Bands, is_across: bool) -> Bands {
    std::array::from_fn(|band| {
        let level = std::f64::consts::FRAC_PI_2;
        let (sin, cos) = horizontal[band].sin_cos();
        // Across the body the arm has passed straight ahead: the far part counts on this side, the rest ahead.
        let (on_this, on_other) = if is_across { (-cos, sin) } else { (sin, cos) };
        let rest = 1.0 - (level * on_other / neighbour[band]).powi(2);
        if on_this <= 0.0 || rest <= 0.0 { own[band] } else { own[band].max(level * on_this / rest.sqrt()) }
    })
}

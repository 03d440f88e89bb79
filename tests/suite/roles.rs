//! Which joint plays which part: the families of names and the hard cases of the outside page on skeleton names
//! (section 4.6), and the outside files.

use glam::DVec3;
use turnwright::exchange;
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::roles::{Body, ChainKind, Finger, Phalanx, Role, Roles, Side};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::support::shared;

/// A figure put together from world places; the tests change what they are about.
#[derive(Clone, Default)]
pub(crate) struct Build {
    pub names: Vec<String>,
    pub parents: Vec<Option<usize>>,
    pub places: Vec<DVec3>,
    pub tips: Vec<Vec<DVec3>>,
    /// What each joint should be found to be.
    pub roles: Vec<Option<Role>>,
}

impl Build {
    pub(crate) fn add(
        &mut self,
        name: &str,
        parent: Option<usize>,
        place: [f64; 3],
        role: Option<Role>,
    ) -> usize {
        self.names.push(name.to_owned());
        self.parents.push(parent);
        self.places.push(DVec3::from_array(place));
        self.tips.push(Vec::new());
        self.roles.push(role);
        self.names.len() - 1
    }

    pub(crate) fn at(&self, role: Role) -> usize {
        self.roles.iter().position(|own| *own == Some(role)).expect("the figure has it")
    }

    /// Every joint's own frame turned by the rotor given for it.
    pub(crate) fn skeleton_with(&self, frame: impl Fn(usize) -> Rotor) -> Skeleton {
        let joints = (0..self.names.len())
            .map(|joint| {
                let parent = self.parents[joint];
                let (above, at) =
                    parent.map_or((Rotor::IDENTITY, DVec3::ZERO), |up| (frame(up), self.places[up]));
                let own = frame(joint);
                let rest = Transform {
                    translation: above.reverse().apply(self.places[joint] - at),
                    rotation: above.reverse() * own,
                    scale: DVec3::ONE,
                };
                let tips = self.tips[joint]
                    .iter()
                    .map(|tip| own.reverse().apply(*tip - self.places[joint]))
                    .collect();
                Joint {
                    name: self.names[joint].clone(),
                    number: joint,
                    parent,
                    rest,
                    kind: JointKind::Joint,
                    tips,
                }
            })
            .collect();
        Skeleton::new(joints).expect("parents stand first")
    }

    pub(crate) fn skeleton(&self) -> Skeleton {
        self.skeleton_with(|_| Rotor::IDENTITY)
    }

    pub(crate) fn map_places(mut self, map: impl Fn(DVec3) -> DVec3) -> Self {
        for place in self.places.iter_mut().chain(self.tips.iter_mut().flatten()) {
            *place = map(*place);
        }
        self
    }

    pub(crate) fn rename(mut self, name: impl Fn(usize, &str) -> String) -> Self {
        for (index, own) in self.names.iter_mut().enumerate() {
            *own = name(index, own);
        }
        self
    }

    /// Takes a joint and all below it away.
    fn without(mut self, joint: usize) -> Self {
        let mut gone = vec![false; self.names.len()];
        for index in 0..self.names.len() {
            gone[index] = index == joint || self.parents[index].is_some_and(|up| gone[up]);
        }
        let mut number = vec![0; gone.len()];
        let mut next = 0;
        for index in 0..gone.len() {
            number[index] = next;
            next += usize::from(!gone[index]);
        }
        for index in (0..gone.len()).rev().filter(|&index| gone[index]) {
            self.names.remove(index);
            self.parents.remove(index);
            self.places.remove(index);
            self.tips.remove(index);
            self.roles.remove(index);
        }
        for parent in self.parents.iter_mut().flatten() {
            *parent = number[*parent];
        }
        self
    }
}

/// Names of the trunk and of one limb's parts; `{}` takes the side.
pub(crate) struct Names {
    hips: &'static str,
    trunk: &'static [&'static str],
    neck: &'static [&'static str],
    head: &'static str,
    arm: [&'static str; 4],
    leg: [&'static str; 4],
    sides: [&'static str; 2],
}

pub(crate) const A: Names = Names {
    hips: "Hips",
    trunk: &["Spine", "Spine1", "Spine2"],
    neck: &["Neck"],
    head: "Head",
    arm: ["{}Shoulder", "{}Arm", "{}ForeArm", "{}Hand"],
    leg: ["{}UpLeg", "{}Leg", "{}Foot", "{}ToeBase"],
    sides: ["Left", "Right"],
};
pub(crate) const B: Names = Names {
    hips: "root",
    trunk: &["lowerback", "upperback", "thorax"],
    neck: &["lowerneck", "upperneck"],
    head: "head",
    arm: ["{}clavicle", "{}humerus", "{}radius", "{}wrist"],
    leg: ["{}femur", "{}tibia", "{}foot", "{}toes"],
    sides: ["l", "r"],
};
pub(crate) const C: Names = Names {
    hips: "pelvis",
    trunk: &["spine1", "spine2", "spine3"],
    neck: &["neck"],
    head: "head",
    arm: ["{}_collar", "{}_shoulder", "{}_elbow", "{}_wrist"],
    leg: ["{}_hip", "{}_knee", "{}_ankle", "{}_foot"],
    sides: ["left", "right"],
};
pub(crate) const D: Names = Names {
    hips: "Hips",
    trunk: &["Spine", "Chest", "UpperChest"],
    neck: &["Neck"],
    head: "Head",
    arm: ["Shoulder_{}", "UpperArm_{}", "LowerArm_{}", "Hand_{}"],
    leg: ["UpperLeg_{}", "LowerLeg_{}", "Foot_{}", "Toes_{}"],
    sides: ["L", "R"],
};

/// A person of 1.8 m in a T-pose with the names given.
pub(crate) fn person(names: &Names) -> Build {
    let mut build = Build::default();
    let trunk_roles = [Role::Spine, Role::Chest, Role::UpperChest];
    let hips = build.add(names.hips, None, [0.0, 1.0, 0.0], Some(Role::Hips));
    let mut last = hips;
    let n = names.trunk.len();
    for (index, name) in names.trunk.iter().enumerate() {
        let y = 1.1 + 0.3 * index as f64 / (n.max(2) - 1) as f64;
        // Of more than three the test says itself which is what.
        let role = (n <= 3).then(|| trunk_roles[index]);
        last = build.add(name, Some(last), [0.0, y, -0.01], role);
    }
    let chest = last;
    for (index, name) in names.neck.iter().enumerate() {
        let role = (index == 0).then_some(Role::Neck);
        last = build.add(name, Some(last), [0.0, 1.5 + 0.05 * index as f64, 0.0], role);
    }
    let head = build.add(names.head, Some(last), [0.0, 1.6, 0.02], Some(Role::Head));
    build.tips[head].push(DVec3::new(0.0, 1.8, 0.02));
    for (side, said) in Side::BOTH.into_iter().zip(names.sides) {
        let x = if side == Side::Left { 1.0 } else { -1.0 };
        let name = |pattern: &str| pattern.replace("{}", said);
        let arm = [[0.05, 1.44, 0.0], [0.18, 1.45, -0.02], [0.46, 1.45, -0.03], [0.71, 1.45, -0.01]];
        let roles = [Role::Shoulder(side), Role::UpperArm(side), Role::LowerArm(side), Role::Hand(side)];
        let mut on = chest;
        for ((pattern, place), role) in names.arm.iter().zip(arm).zip(roles) {
            on = build.add(&name(pattern), Some(on), [x * place[0], place[1], place[2]], Some(role));
        }
        build.tips[on].push(DVec3::new(x * 0.88, 1.45, 0.0));
        let leg = [[0.09, 0.93, 0.0], [0.09, 0.5, 0.01], [0.09, 0.08, -0.02], [0.1, 0.02, 0.12]];
        let roles = [Role::UpperLeg(side), Role::LowerLeg(side), Role::Foot(side), Role::Toes(side)];
        let mut on = hips;
        for ((pattern, place), role) in names.leg.iter().zip(leg).zip(roles) {
            on = build.add(&name(pattern), Some(on), [x * place[0], place[1], place[2]], Some(role));
        }
        build.tips[on].push(DVec3::new(x * 0.1, 0.02, 0.19));
    }
    build
}

/// Fingers of both hands, with joints named by the pattern (side, finger, number).
fn with_fingers(mut build: Build, name: impl Fn(Side, Finger, usize) -> String) -> Build {
    for side in Side::BOTH {
        let hand = build.at(Role::Hand(side));
        build.tips[hand].clear();
        let x = if side == Side::Left { 1.0 } else { -1.0 };
        for finger in Finger::ALL {
            let mut on = hand;
            for (index, phalanx) in Phalanx::ALL.into_iter().enumerate() {
                let k = index as f64;
                let place = match finger {
                    Finger::Thumb => [0.74 + 0.03 * k, 1.44, 0.02 + 0.03 * k],
                    other => [0.80 + 0.03 * k, 1.45, 0.03 - 0.022 * (other as usize - 1) as f64],
                };
                let role = Some(Role::Finger(side, finger, phalanx));
                on = build.add(
                    &name(side, finger, index + 1),
                    Some(on),
                    [x * place[0], place[1], place[2]],
                    role,
                );
            }
        }
    }
    build
}

/// Every joint is found to be what the figure says, and nothing else is given.
#[track_caller]
fn check(case: &str, build: &Build) -> Roles {
    check_least(case, build, 0.3)
}

#[track_caller]
fn check_least(case: &str, build: &Build, least: f64) -> Roles {
    let skeleton = build.skeleton();
    let roles = Roles::find(&skeleton);
    for (joint, expected) in build.roles.iter().enumerate() {
        let own = &roles.joints[joint];
        assert_eq!(
            own.role,
            *expected,
            "{case}: `{}`: {} ({:.2})\n{:#?}",
            skeleton.label(joint),
            own.reason,
            own.confidence,
            roles.doubts
        );
        assert!(
            expected.is_none() || own.confidence >= least,
            "{case}: `{}`: {own:?}",
            skeleton.label(joint)
        );
        assert!(!own.reason.is_empty());
    }
    roles
}

#[test]
fn the_four_families_of_names() {
    for (case, names) in [("A", &A), ("B", &B), ("C", &C), ("D", &D)] {
        let roles = check_least(case, &person(names), 0.5);
        assert!(roles.is_human() && roles.doubts.is_empty(), "{case}: {:?}", roles.doubts);
        assert!(roles.shape.up.distance(DVec3::Y) < 1e-9 && roles.shape.left.distance(DVec3::X) < 1e-3);
        assert!((roles.shape.leg_length - 0.85).abs() < 0.01, "{}", roles.shape.leg_length);
    }
    // Family B has a joint above the thigh, and a hand below the wrist.
    let mut build = person(&B);
    for side in Side::BOTH {
        let letter = if side == Side::Left { "l" } else { "r" };
        let (thigh, hips) = (build.at(Role::UpperLeg(side)), build.at(Role::Hips));
        build.names[thigh] = format!("{letter}hipjoint");
        build.roles[thigh] = None;
        let place = build.places[thigh].to_array();
        build.places[thigh] = build.places[hips];
        let femur = build.add(&format!("{letter}femur"), Some(thigh), place, Some(Role::UpperLeg(side)));
        let wrist = build.at(Role::Hand(side));
        let tip = build.tips[wrist].pop().expect("a hand has a tip");
        let place = (build.places[wrist] + (tip - build.places[wrist]) * 0.3).to_array();
        let hand = build.add(&format!("{letter}hand"), Some(wrist), place, None);
        build.tips[hand].push(tip);
        let knee = build.at(Role::LowerLeg(side));
        build.parents[knee] = Some(femur);
    }
    // Parents stand first.
    let order = sorted(&build);
    check("B with its connectors", &order);
}

#[test]
fn names_in_other_languages() {
    let german = Names {
        hips: "Becken",
        trunk: &["Wirbelsäule", "Brust"],
        neck: &["Hals"],
        head: "Kopf",
        arm: ["{}Schulter", "{}Oberarm", "{}Unterarm", "{}Hand"],
        leg: ["{}Oberschenkel", "{}Unterschenkel", "{}Fuß", "{}Zehen"],
        sides: ["Links", "Rechts"],
    };
    let french = Names {
        hips: "Bassin",
        trunk: &["Colonne", "Poitrine"],
        neck: &["Cou"],
        head: "Tête",
        arm: ["Epaule_{}", "Bras_{}", "Avant-bras_{}", "Poignet_{}"],
        leg: ["Cuisse_{}", "Mollet_{}", "Pied_{}", "Orteils_{}"],
        sides: ["Gauche", "Droite"],
    };
    let spanish = Names {
        hips: "Cadera",
        trunk: &["Columna", "Pecho"],
        neck: &["Cuello"],
        head: "Cabeza",
        arm: ["Hombro {}", "Brazo {}", "Antebrazo {}", "Mano {}"],
        leg: ["Muslo {}", "Pantorrilla {}", "Pie {}", "Dedos {}"],
        sides: ["Izquierda", "Derecha"],
    };
    let italian = Names {
        hips: "bacino",
        trunk: &["colonna", "petto"],
        neck: &["collo"],
        head: "testa",
        arm: ["spalla_{}", "braccio_{}", "avambraccio_{}", "mano_{}"],
        leg: ["coscia_{}", "polpaccio_{}", "piede_{}", "dita_{}"],
        sides: ["sinistra", "destra"],
    };
    for (case, names) in [("German", german), ("French", french), ("Spanish", spanish), ("Italian", italian)]
    {
        let roles = check_least(case, &person(&names), 0.5);
        assert!(roles.is_human() && roles.doubts.is_empty(), "{case}: {:?}", roles.doubts);
    }
}

/// The same figure with parents before children.
fn sorted(build: &Build) -> Build {
    let depth = |joint: usize| std::iter::successors(build.parents[joint], |&up| build.parents[up]).count();
    let mut order: Vec<usize> = (0..build.names.len()).collect();
    order.sort_by_key(|&joint| depth(joint));
    let number = |joint: usize| order.iter().position(|&own| own == joint).expect("all are there");
    Build {
        names: order.iter().map(|&joint| build.names[joint].clone()).collect(),
        parents: order.iter().map(|&joint| build.parents[joint].map(number)).collect(),
        places: order.iter().map(|&joint| build.places[joint]).collect(),
        tips: order.iter().map(|&joint| build.tips[joint].clone()).collect(),
        roles: order.iter().map(|&joint| build.roles[joint]).collect(),
    }
}

#[test]
fn names_that_say_nothing_leave_the_shape() {
    let letters = |index: usize| {
        let mut seed = 7 + 31 * index as u64;
        (0..6)
            .map(|_| {
                seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                char::from(b"qwxzvkgpdtnybc"[(seed >> 33) as usize % 14])
            })
            .collect::<String>()
    };
    for names in [&A, &D] {
        check("numbers only", &person(names).rename(|index, _| format!("joint_{index}")));
        check("random letters", &person(names).rename(|index, _| letters(index)));
        check("all equal", &person(names).rename(|_, _| "bone".to_owned()));
        check("no names", &person(names).rename(|_, _| String::new()));
    }
    let fingers = with_fingers(person(&A), |_, _, _| String::new());
    check("numbers with fingers", &fingers.rename(|index, _| format!("{index}")));
}

#[test]
fn a_shared_prefix_of_any_kind() {
    for prefix in ["abc:", "dummy_", "Rig|", "Figure 01 ", "char-", "kit1_"] {
        check(prefix, &person(&A).rename(|_, name| format!("{prefix}{name}")));
        check(prefix, &person(&D).rename(|_, name| format!("{prefix}{name}")));
    }
    let renamed = |index: usize, name: &str| if index == 0 { name.to_owned() } else { format!("pre_{name}") };
    check("all but one", &person(&C).rename(renamed));
}

#[test]
fn names_in_other_scripts() {
    let kanji = Names {
        hips: "腰",
        trunk: &["上半身", "胸"],
        neck: &["首"],
        head: "頭",
        arm: ["{}肩", "{}腕", "{}ひじ", "{}手首"],
        leg: ["{}足", "{}ひざ", "{}足首", "{}つま先"],
        sides: ["左", "右"],
    };
    check_least("kanji", &person(&kanji), 0.5);
    let roman = Names {
        hips: "koshi",
        trunk: &["mune"],
        neck: &["kubi"],
        head: "atama",
        arm: ["{}_kata", "{}_ude", "{}_hiji", "{}_te"],
        leg: ["{}_ashi", "{}_hiza", "{}_ashikubi", "{}_tsumasaki"],
        sides: ["hidari", "migi"],
    };
    check("romanised", &person(&roman));
    // A script that no word is known of: the shape is left.
    check("Greek", &person(&A).rename(|index, _| format!("άρθρωση{index}")));
}

#[test]
fn figures_that_face_or_stand_otherwise() {
    let back = |build: Build| build.map_places(|p| DVec3::new(-p.x, p.y, -p.z));
    let z_up = |build: Build| build.map_places(|p| DVec3::new(p.x, -p.z, p.y));
    for names in [&A, &B, &C, &D] {
        let roles = check("facing -z", &back(person(names)));
        assert!(roles.shape.forward.distance(-DVec3::Z) < 1e-2, "{:?}", roles.shape.forward);
        let roles = check("z up", &z_up(person(names)));
        assert!(roles.shape.up.distance(DVec3::Z) < 1e-9, "{:?}", roles.shape.up);
    }
    let unnamed = |build: Build| build.rename(|index, _| format!("n{index}"));
    check("unnamed, facing -z", &back(unnamed(person(&A))));
    check("unnamed, z up", &z_up(unnamed(person(&A))));
    for unit in [100.0, 1.0 / 0.0254, 1000.0, 0.01] {
        let roles = check("in other units", &person(&A).map_places(|p| p * unit));
        assert!((roles.shape.height / unit - 1.78).abs() < 1e-6);
        check("unnamed, in other units", &unnamed(person(&D)).map_places(|p| p * unit));
    }
    // As a whole turned and moved, with frames of its own for each joint: roles do not change.
    let turn = Rotor::from_plane_angles(Bivector::new(0.3, -0.9, 0.5));
    let frame = |joint: usize| {
        let k = joint as f64;
        Rotor::from_plane_angles(Bivector::new(k.sin(), (2.0 * k).cos(), (3.0 * k).sin()))
    };
    for build in [person(&C), unnamed(person(&C))] {
        let askew = build.map_places(|p| turn.apply(p) + DVec3::new(5.0, -3.0, 2.0));
        let roles = Roles::find(&askew.skeleton_with(frame));
        for (joint, role) in askew.roles.iter().enumerate() {
            assert_eq!(roles.role(joint), *role, "{}: {:?}", askew.names[joint], roles.doubts);
        }
    }
}

#[test]
fn a_mirrored_file_is_asked_about() {
    let mirrored = person(&A).map_places(|p| DVec3::new(-p.x, p.y, p.z));
    let roles = check("mirrored", &mirrored);
    assert!(roles.doubts.iter().any(|doubt| doubt.text.contains("mirrored")), "{:?}", roles.doubts);
}

#[test]
fn trunks_of_one_to_six_joints() {
    let trunks: [&[&str]; 4] = [
        &["Spine"],
        &["Spine", "Chest"],
        &["Spine", "Spine1", "Spine2"],
        &["Spine", "Spine1", "Spine2", "Spine3", "Spine4", "Spine5"],
    ];
    for trunk in trunks {
        let mut build = person(&Names { trunk, ..A });
        if trunk.len() == 6 {
            for (place, role) in [(1, Role::Spine), (4, Role::Chest), (6, Role::UpperChest)] {
                build.roles[place] = Some(role);
            }
        }
        let skeleton = build.skeleton();
        let roles = Roles::find(&skeleton);
        let chain = roles.chain(ChainKind::Trunk, None).expect("a trunk");
        assert_eq!(chain.joints, (1..=trunk.len()).collect::<Vec<_>>());
        assert_eq!(roles.joint(Role::Spine), Some(1), "{trunk:?}");
        assert_eq!(roles.joint(Role::Chest).is_some(), trunk.len() > 1);
        if trunk.len() == 6 {
            assert_eq!(roles.joint(Role::UpperChest), Some(6));
        } else {
            check("trunk", &build);
        }
    }
}

#[test]
fn collar_bones_twist_helpers_and_what_is_missing() {
    // Two collar bones, as H-Anim has them.
    let mut build = person(&D);
    for side in Side::BOTH {
        let (collar, arm) = (build.at(Role::Shoulder(side)), build.at(Role::UpperArm(side)));
        let place = (build.places[collar] * 0.4 + build.places[arm] * 0.6).to_array();
        let name = if side == Side::Left { "Acromioclavicular_L" } else { "Acromioclavicular_R" };
        build.names[collar] = name.replace("Acromioclavicular", "Sternoclavicular");
        let second = build.add(name, Some(collar), place, None);
        build.parents[arm] = Some(second);
    }
    check("two collar bones", &sorted(&build));

    // Helpers in all limbs, in the chain and beside it.
    for in_chain in [true, false] {
        for named in [true, false] {
            let mut build = person(&A);
            for side in Side::BOTH {
                for (upper, lower) in [
                    (Role::UpperArm(side), Role::LowerArm(side)),
                    (Role::LowerArm(side), Role::Hand(side)),
                    (Role::UpperLeg(side), Role::LowerLeg(side)),
                    (Role::LowerLeg(side), Role::Foot(side)),
                ] {
                    let (from, to) = (build.at(upper), build.at(lower));
                    let place = ((build.places[from] + build.places[to]) * 0.5).to_array();
                    let name = format!("{}Twist", build.names[from]);
                    let helper = build.add(&name, Some(from), place, None);
                    if in_chain {
                        build.parents[to] = Some(helper);
                    }
                }
            }
            let build = if named { build } else { build.rename(|index, _| format!("b{index}")) };
            let roles = check(&format!("twist helpers, in chain {in_chain}, named {named}"), &sorted(&build));
            assert_eq!(roles.twist_helpers.len(), 8, "{:?}", roles.twist_helpers);
            assert!(roles.twist_helpers.iter().all(|helper| (helper.share - 0.5).abs() < 1e-9));
        }
    }

    for side in Side::BOTH {
        let build = person(&A);
        let toes = build.at(Role::Toes(side));
        let bare = build.without(toes);
        check("a foot without toes", &bare);
    }
    let build = person(&A);
    let hands = Side::BOTH.map(|side| build.at(Role::Hand(side)));
    let bare = build.without(hands[1]).without(hands[0]);
    let roles = check("no hands", &bare);
    assert!(roles.doubts.iter().any(|doubt| doubt.text.contains("left hand")), "{:?}", roles.doubts);
    // The head on the chest.
    let mut build = person(&A);
    let (neck, head, chest) = (build.at(Role::Neck), build.at(Role::Head), build.at(Role::UpperChest));
    build.parents[head] = Some(chest);
    build = build.without(neck);
    check("no neck", &build);
}

#[test]
fn what_hangs_on_a_body_is_no_limb() {
    let mut build = person(&A);
    let (hips, head) = (build.at(Role::Hips), build.at(Role::Head));
    let chain = |build: &mut Build, on: usize, name: &str, from: DVec3, step: DVec3| {
        let mut on = on;
        for index in 0..4 {
            on = build.add(
                &format!("{name}{index}"),
                Some(on),
                (from + step * f64::from(index)).to_array(),
                None,
            );
        }
    };
    chain(&mut build, hips, "Tail", DVec3::new(0.0, 0.98, -0.1), DVec3::new(0.0, -0.1, -0.2));
    for angle in 0..6 {
        let (sine, cosine) = (f64::from(angle) * 1.047).sin_cos();
        let from = DVec3::new(0.15 * cosine, 0.95, 0.15 * sine);
        chain(
            &mut build,
            hips,
            &format!("Skirt{angle}_"),
            from,
            DVec3::new(0.02 * cosine, -0.15, 0.02 * sine),
        );
    }
    chain(&mut build, head, "Hair", DVec3::new(0.0, 1.75, -0.1), DVec3::new(0.0, -0.1, -0.03));
    for side in Side::BOTH {
        let hand = build.at(Role::Hand(side));
        let place = (build.places[hand] + DVec3::new(0.0, 0.0, 0.3)).to_array();
        build.add(if side == Side::Left { "LeftWeapon" } else { "RightProp" }, Some(hand), place, None);
    }
    let roles = check("tail, skirt, hair, props", &build);
    assert_eq!(roles.chains.iter().filter(|chain| chain.kind == ChainKind::Tail).count(), 1);
    let roles = check(
        "the same without names",
        &build.clone().rename(|index, name| {
            // A skirt as long as the legs can't be told from them without a name; the tail can.
            if name.starts_with("Skirt")
                || name.starts_with("Hair")
                || name.contains("Weapon")
                || name.contains("Prop")
            {
                name.to_owned()
            } else {
                format!("x{index}")
            }
        }),
    );
    assert_eq!(roles.chains.iter().filter(|chain| chain.kind == ChainKind::Tail).count(), 1);
}

#[test]
fn a_mark_on_the_head_is_not_the_head() {
    let unnamed = |build: &Build| build.clone().rename(|index, _| format!("n{index}"));
    for names in [&A, &B] {
        let mut marked = person(names);
        let head = marked.at(Role::Head);
        marked.tips[head].clear();
        // Neck, or two of them, and a head without an end: the last one is the head.
        check("a head without an end", &unnamed(&marked));
        marked.add("top", Some(head), [0.0, 1.8, 0.02], None);
        check("a head whose end is a joint", &unnamed(&marked));
        check("the same with names", &marked);
    }
}

#[test]
fn fingers_by_name_and_by_place() {
    let word = |finger: Finger| match finger {
        Finger::Little => "Pinky".to_owned(),
        other => format!("{other:?}"),
    };
    let family_a = with_fingers(person(&A), |side, finger, number| {
        format!("{}Hand{}{number}", if side == Side::Left { "Left" } else { "Right" }, word(finger))
    });
    check_least("family A with fingers", &family_a, 0.6);
    let dotted = with_fingers(person(&D), |side, finger, number| {
        format!("{}_{number}_{}", finger_word(finger), if side == Side::Left { "L" } else { "R" })
    });
    check("family D with fingers", &dotted);
}

fn finger_word(finger: Finger) -> &'static str {
    match finger {
        Finger::Thumb => "thumb",
        Finger::Index => "pointer",
        Finger::Middle => "middle",
        Finger::Ring => "ring",
        Finger::Little => "little",
    }
}

#[test]
fn two_figures_animals_and_single_joints() {
    // Two people in one file.
    let mut build = person(&A);
    let other = person(&A).map_places(|p| p + DVec3::X * 3.0);
    let shift = build.names.len();
    for joint in 0..other.names.len() {
        let parent = other.parents[joint].map(|up| up + shift);
        let new = build.add(&other.names[joint], parent, other.places[joint].to_array(), None);
        build.tips[new].clone_from(&other.tips[joint]);
    }
    let roles = check("two figures", &build);
    assert!(roles.doubts.iter().any(|doubt| doubt.text.contains("second figure")), "{:?}", roles.doubts);

    // One joint, and none.
    let mut single = Build::default();
    single.add("Hips", None, [0.0, 1.0, 0.0], None);
    let roles = Roles::find(&single.skeleton());
    assert_eq!(roles.joints.len(), 1);
    assert!(Roles::find(&Skeleton::new(vec![]).expect("empty")).iter().next().is_none());
}

#[track_caller]
fn roles_of(file: &str) -> Option<(std::sync::Arc<turnwright::clip::Clip>, Roles)> {
    let path = shared(&format!("data/{file}"))?;
    let source = exchange::open(&path, &exchange::OpenOptions::default()).expect("an outside file opens");
    let clip = source.clips[0].clone();
    let roles = Roles::find(&clip.skeleton);
    Some((clip, roles))
}

/// `role joint` pairs of an outside file, as a person reads them from its names and its shape.
#[track_caller]
fn check_file(file: &str, expected: &[(&str, &str)]) {
    let Some((clip, roles)) = roles_of(file) else { return };
    for (role, joint) in expected {
        let role = Role::parse(role).unwrap_or_else(|| panic!("{role} is a role"));
        let found = roles.joint(role).map(|joint| clip.skeleton.label(joint));
        assert_eq!(found, Some(*joint), "{file}: {role}\n{:#?}", roles.doubts);
        let mirrored = roles.joint(role.mirror());
        assert!(mirrored.is_some(), "{file}: {}", role.mirror());
    }
}

#[test]
fn the_outside_people() {
    check_file(
        "bvh/cmu_02_01_walk.bvh",
        &[
            ("hips", "Hips"),
            ("spine", "LowerBack"),
            ("chest", "Spine"),
            ("upperChest", "Spine1"),
            ("neck", "Neck"),
            ("head", "Head"),
            ("leftUpperLeg", "LeftUpLeg"),
            ("leftLowerLeg", "LeftLeg"),
            ("leftFoot", "LeftFoot"),
            ("leftToes", "LeftToeBase"),
            ("leftShoulder", "LeftShoulder"),
            ("leftUpperArm", "LeftArm"),
            ("leftLowerArm", "LeftForeArm"),
            ("leftHand", "LeftHand"),
        ],
    );
    check_file(
        "bvh/zxy_19joints_30fps.bvh",
        &[
            ("hips", "Hips"),
            ("spine", "Chest"),
            ("chest", "Chest2"),
            ("neck", "Neck"),
            ("head", "Head"),
            ("leftUpperLeg", "LeftHip"),
            ("leftLowerLeg", "LeftKnee"),
            ("leftFoot", "LeftAnkle"),
            ("leftShoulder", "LeftCollar"),
            ("leftUpperArm", "LeftShoulder"),
            ("leftLowerArm", "LeftElbow"),
            ("leftHand", "LeftWrist"),
        ],
    );
    check_file(
        "bvh/walk01.bvh",
        &[
            ("hips", "Hips"),
            ("spine", "Spine"),
            ("chest", "Spine1"),
            ("neck", "Neck"),
            ("head", "Head"),
            ("rightUpperLeg", "RightUpLeg"),
            ("rightLowerLeg", "RightLeg"),
            ("rightFoot", "RightFoot"),
            ("rightShoulder", "RightShoulder"),
            ("rightUpperArm", "RightArm"),
            ("rightLowerArm", "RightForeArm"),
            ("rightHand", "RightHand"),
        ],
    );
    check_file(
        "bvh/xyz_affective_walk.bvh",
        &[
            ("hips", "Hips"),
            ("spine", "Spine"),
            ("head", "Head"),
            ("leftUpperLeg", "LeftUpLeg"),
            ("leftLowerLeg", "LeftLeg"),
            ("leftFoot", "LeftFoot"),
            ("leftToes", "LeftToeBase"),
            ("leftShoulder", "LeftShoulder"),
            ("leftUpperArm", "LeftArm"),
            ("leftLowerArm", "LeftForeArm"),
            ("leftHand", "LeftHand"),
        ],
    );
    check_file(
        "bvh/yxz_23joints_120fps.bvh",
        &[
            ("hips", "Hips"),
            ("spine", "Chest"),
            ("upperChest", "Chest4"),
            ("neck", "Neck"),
            ("head", "Head"),
            ("leftUpperLeg", "LeftHip"),
            ("leftLowerLeg", "LeftKnee"),
            ("leftFoot", "LeftAnkle"),
            ("leftToes", "LeftToe"),
            ("leftShoulder", "LeftCollar"),
            ("leftUpperArm", "LeftShoulder"),
            ("leftLowerArm", "LeftElbow"),
            ("leftHand", "LeftWrist"),
        ],
    );
    check_file(
        "bvh/mixed_order_6ch.bvh",
        &[
            ("hips", "pelvis"),
            ("spine", "spine"),
            ("chest", "spine.001"),
            ("neck", "neck"),
            ("head", "face"),
            ("leftUpperLeg", "thigh.L"),
            ("leftLowerLeg", "shin.L"),
            ("leftFoot", "foot.L"),
            ("leftShoulder", "shoulder.L"),
            ("leftUpperArm", "upper_arm.L"),
            ("leftLowerArm", "forearm.L"),
        ],
    );
    check_file(
        "gltf/biped23_movement_clips.glb",
        &[
            ("hips", "hips"),
            ("spine", "spine"),
            ("chest", "chest"),
            ("head", "head"),
            ("leftUpperLeg", "upperleg.l"),
            ("leftLowerLeg", "lowerleg.l"),
            ("leftFoot", "foot.l"),
            ("leftToes", "toes.l"),
            ("leftUpperArm", "upperarm.l"),
            ("leftLowerArm", "lowerarm.l"),
            ("leftHand", "wrist.l"),
        ],
    );
    check_file(
        "gltf/RiggedFigure.glb",
        &[
            ("hips", "torso_joint_1"),
            ("spine", "torso_joint_2"),
            ("chest", "torso_joint_3"),
            ("neck", "neck_joint_1"),
            ("head", "neck_joint_2"),
            ("leftUpperLeg", "leg_joint_L_1"),
            ("leftLowerLeg", "leg_joint_L_2"),
            ("leftFoot", "leg_joint_L_3"),
            ("leftToes", "leg_joint_L_5"),
            ("leftUpperArm", "arm_joint_L_1"),
            ("leftLowerArm", "arm_joint_L_2"),
            ("leftHand", "arm_joint_L_3"),
        ],
    );
}

#[test]
fn the_outside_people_without_their_names() {
    for file in [
        "bvh/cmu_02_01_walk.bvh",
        "bvh/cmu_05_06_dance.bvh",
        "bvh/zxy_19joints_30fps.bvh",
        "bvh/walk01.bvh",
        "bvh/xyz_affective_walk.bvh",
        "bvh/yxz_23joints_120fps.bvh",
        "gltf/biped23_movement_clips.glb",
        "gltf/RiggedFigure.glb",
    ] {
        let Some((clip, named)) = roles_of(file) else { return };
        let joints = clip
            .skeleton
            .joints()
            .iter()
            .map(|joint| Joint { name: String::new(), ..joint.clone() })
            .collect();
        let bare = Roles::find(&Skeleton::new(joints).expect("the same tree"));
        for (role, joint) in named.iter() {
            // Arms and legs, hips and head; what the trunk's joints are called is a matter of names.
            let matters = role.is_required() && role != Role::Spine;
            assert!(
                !matters || bare.joint(role) == Some(joint),
                "{file}: {role} is `{}`, found {:?}: {:#?}",
                clip.skeleton.label(joint),
                bare.joint(role).map(|joint| clip.skeleton.label(joint)),
                bare.doubts
            );
        }
    }
}

#[test]
fn animals_get_no_arms() {
    for (file, legs) in [("gltf/Fox.glb", 2), ("gltf/wolf.glb", 2)] {
        let Some((_, roles)) = roles_of(file) else { return };
        assert_eq!(roles.body, Body::FourLegged, "{file}: {:#?}", roles.doubts);
        assert!(
            roles
                .iter()
                .all(|(role, _)| !matches!(role, Role::UpperArm(_) | Role::LowerArm(_) | Role::Hand(_))),
            "{file}"
        );
        assert!(roles.doubts.iter().any(|doubt| doubt.text.contains("front leg")), "{file}");
        let count = |kind| roles.chains.iter().filter(|chain| chain.kind == kind).count();
        assert_eq!(
            (count(ChainKind::FrontLeg), count(ChainKind::Leg)),
            (legs, 2),
            "{file}: {:#?}",
            roles.chains
        );
        assert_eq!(count(ChainKind::Tail), 1, "{file}");
        assert!(roles.shape.up.distance(DVec3::Y) < 1e-9, "{file}");
    }
    let Some((_, roles)) = roles_of("gltf/wasp.glb") else { return };
    let count = |kind| roles.chains.iter().filter(|chain| chain.kind == kind).count();
    assert_eq!(count(ChainKind::Wing), 2, "{:#?}", roles.chains);
    assert!(count(ChainKind::Leg) + count(ChainKind::FrontLeg) >= 6, "{:#?}", roles.chains);
    assert!(
        roles.iter().all(|(role, _)| !matches!(role, Role::UpperArm(_) | Role::LowerArm(_) | Role::Hand(_)))
    );
}

#[test]
fn hinges_bend_the_right_way() {
    // A knee bends to the back about the figure's left, an elbow in a T-pose to the front about down (left) or up (right).
    let roles = check("A", &person(&A));
    let shape = &roles.shape;
    for side in Side::BOTH {
        let knee = roles.joint(Role::LowerLeg(side)).expect("a knee");
        let hinge = shape.hinge(knee).expect("its axis");
        assert!(hinge.dot(shape.left) > 0.99, "{hinge}");
        let shin = shape.limb_direction(knee).expect("its shin");
        let bent = Rotor::from_plane_angles(Bivector::from_axis(hinge * 0.5)).apply(shin);
        assert!(bent.dot(shape.forward) < shin.dot(shape.forward) - 0.3, "{bent}");
        let elbow = roles.joint(Role::LowerArm(side)).expect("an elbow");
        let hinge = shape.hinge(elbow).expect("its axis");
        let forearm = shape.limb_direction(elbow).expect("its forearm");
        let bent = Rotor::from_plane_angles(Bivector::from_axis(hinge * 0.5)).apply(forearm);
        assert!(bent.dot(shape.forward) > forearm.dot(shape.forward) + 0.3, "{bent}");
    }
}

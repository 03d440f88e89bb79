//! Captured walks and acrobatics carried onto figures that are built here: one of 59 joints with fingers, twist joints and odd names, a walker
//! with two skins, a stubby figure of a game. What is asserted is measured from the places of joints alone.

use std::sync::Arc;

use glam::DVec3;
use serde_json::{Value, json};
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times, VectorTrack};
use turnwright::exchange::{self, Guard, OpenOptions, disk};
use turnwright::retarget::{
    Driver, Figure, JointMap, KeptLimits, Options, Retargeted, Transfer, find_contacts, retarget,
};
use turnwright::rotor::Rotor;
use turnwright::skeleton::roles::{Finger, Phalanx, Role, Side};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::roles::{A, Build, person};
use crate::support::{list, number, shared, shared_json};

/// A game figure of 59 joints in metres, y up, its arms 45 degrees down: root, three joints of the spine, a leaf on the head, collar bones, twist
/// joints of both parts of the arms, three joints for each finger, a prop in the right hand. Names are spelled by the pattern.
fn of_59(name: impl Fn(usize, &str) -> String) -> Build {
    let mut build = Build::default();
    let root = build.add("root", None, [0.0, 0.0, 0.0], None);
    let hips = build.add("pelvis", Some(root), [0.0, 1.0, 0.0], Some(Role::Hips));
    let trunk =
        [("spine_a", 1.12, Role::Spine), ("spine_b", 1.25, Role::Chest), ("spine_c", 1.38, Role::UpperChest)];
    let mut on = hips;
    for (word, y, role) in trunk {
        on = build.add(word, Some(on), [0.0, y, -0.01], Some(role));
    }
    let chest = on;
    let neck = build.add("neck", Some(chest), [0.0, 1.52, 0.0], Some(Role::Neck));
    let head = build.add("head", Some(neck), [0.0, 1.6, 0.02], Some(Role::Head));
    build.add("head_end", Some(head), [0.0, 1.8, 0.02], None);
    for side in Side::BOTH {
        let (x, letter) = if side == Side::Left { (1.0, "l") } else { (-1.0, "r") };
        let word = |part: &str| format!("{part}_{letter}");
        // Along the arm from the shoulder, and across it to the front.
        let slant = 0.5_f64.sqrt();
        let arm = |along: f64, front: f64| [x * (0.17 + along * slant), 1.45 - along * slant, front];
        let collar = build.add(&word("clav"), Some(chest), [x * 0.03, 1.46, 0.0], Some(Role::Shoulder(side)));
        let upper = build.add(&word("uparm"), Some(collar), arm(0.0, -0.02), Some(Role::UpperArm(side)));
        build.add(&word("uparm_twist"), Some(upper), arm(0.14, -0.025), None);
        let lower = build.add(&word("loarm"), Some(upper), arm(0.28, -0.03), Some(Role::LowerArm(side)));
        build.add(&word("loarm_twist"), Some(lower), arm(0.40, -0.02), None);
        let hand = build.add(&word("hand"), Some(lower), arm(0.53, -0.01), Some(Role::Hand(side)));
        for finger in Finger::ALL {
            let mut on = hand;
            for (index, phalanx) in Phalanx::ALL.into_iter().enumerate() {
                let k = index as f64;
                let place = match finger {
                    Finger::Thumb => arm(0.56 + 0.03 * k, 0.02 + 0.03 * k),
                    other => arm(0.62 + 0.03 * k, 0.02 - 0.022 * (other as usize - 1) as f64),
                };
                let part = ["thumb", "index", "middle", "ring", "pinky"][finger as usize];
                let role = Some(Role::Finger(side, finger, phalanx));
                on = build.add(&word(&format!("{part}_0{}", index + 1)), Some(on), place, role);
            }
        }
        if side == Side::Right {
            build.add("prop_r", Some(hand), arm(0.6, 0.0), None);
        }
        let thigh = build.add(&word("thigh"), Some(hips), [x * 0.09, 0.93, 0.0], Some(Role::UpperLeg(side)));
        let shin = build.add(&word("calf"), Some(thigh), [x * 0.09, 0.5, 0.01], Some(Role::LowerLeg(side)));
        let foot = build.add(&word("foot"), Some(shin), [x * 0.09, 0.08, -0.02], Some(Role::Foot(side)));
        let toes = build.add(&word("ball"), Some(foot), [x * 0.1, 0.02, 0.12], Some(Role::Toes(side)));
        build.tips[toes].push(DVec3::new(x * 0.1, 0.02, 0.19));
    }
    build.rename(name)
}

/// Every joint's x axis along its bone.
fn along_bones(build: &Build) -> Skeleton {
    let frames: Vec<Rotor> = (0..build.names.len())
        .map(|joint| {
            let end = (0..build.names.len())
                .find(|&below| build.parents[below] == Some(joint))
                .map(|below| build.places[below])
                .or_else(|| build.tips[joint].first().copied());
            let along = end.and_then(|end| (end - build.places[joint]).try_normalize());
            along.map_or(Rotor::IDENTITY, |along| Rotor::between(DVec3::X, along))
        })
        .collect();
    build.skeleton_with(|joint| frames[joint])
}

/// In centimetres with z up, facing -y.
fn z_up_in_centimetres(build: Build) -> Build {
    build.map_places(|p| DVec3::new(p.x, -p.z, p.y) * 100.0)
}

/// A figure of a game: large head and hands, legs a third of its height, leaf joints at every end.
fn stubby() -> Build {
    let mut build = person(&A).map_places(|p| {
        let y = if p.y < 1.0 { 0.55 * p.y } else { 0.55 + 0.9 * (p.y - 1.0) };
        DVec3::new(1.2 * p.x, y, 1.3 * p.z)
    });
    for joint in 0..build.names.len() {
        if let Some(tip) = build.tips[joint].pop() {
            let name = format!("{}_leaf", build.names[joint]);
            build.add(&name, Some(joint), tip.to_array(), None);
        }
    }
    build.map_places(|p| DVec3::new(p.x, -p.z, p.y) * 39.37)
}

/// An acrobat of the outside data on its own skeleton: y up, facing +x, limbs ending in joints that nothing turns.
fn acrobat(what: &str) -> Option<Arc<Clip>> {
    let body = shared_json("data/quatjson/humanoid3d_skeleton_and_limits.json")?;
    let motion = shared_json(&format!("data/quatjson/humanoid3d_{what}.json"))?;
    let listed = list(&body["Skeleton"]["Joints"]);
    let joints = listed.iter().enumerate().map(|(index, own)| {
        let name = own["Name"].as_str().expect("a name").to_owned();
        let at = |key: &str| number(&own[key]);
        Joint {
            number: index,
            parent: usize::try_from(own["Parent"].as_i64().expect("a parent")).ok(),
            rest: Transform::from_translation(DVec3::new(at("AttachX"), at("AttachY"), at("AttachZ"))),
            kind: JointKind::Joint,
            // The front of the boxes that stand for the feet.
            tips: if name.ends_with("ankle") { vec![DVec3::new(0.1335, -0.05, 0.0)] } else { vec![] },
            name,
        }
    });
    let skeleton = Arc::new(Skeleton::new(joints.collect()).expect("parents stand first"));
    let rows = list(&motion["Frames"]);
    let step_secs = number(&rows[0][0]);
    let times = Times::Even { step_secs, count: rows.len() };
    let mut column = 4;
    let joints = listed.iter().enumerate().map(|(index, own)| {
        let kind = own["Type"].as_str().expect("a type");
        if kind == "fixed" {
            return Arc::default();
        }
        let mut keys = Vec::with_capacity(rows.len());
        for row in rows {
            let at = |part: usize| number(&row[column + part]);
            let turn = if kind == "revolute" {
                let half = 0.5 * at(0);
                Rotor::from_xyzw([0.0, 0.0, half.sin(), half.cos()])
            } else {
                Rotor::from_xyzw([at(1), at(2), at(3), at(0)]).normalize()
            };
            keys.push(keys.last().map_or(turn, |&before| turn.aligned_to(before)));
        }
        column += if kind == "revolute" { 1 } else { 4 };
        let place = |row: &Value| DVec3::new(number(&row[1]), number(&row[2]), number(&row[3]));
        Arc::new(JointTracks {
            rotation: Some(RotationTrack::from_rotors(times.clone(), keys)),
            translation: (index == 0)
                .then(|| VectorTrack::straight(times.clone(), rows.iter().map(place).collect::<Vec<_>>())),
            scale: None,
        })
    });
    let joints = joints.collect();
    let duration_secs = step_secs * (rows.len() - 1) as f64;
    let grid = FrameGrid { times, rate: 1.0 / step_secs };
    Some(Arc::new(Clip { name: what.to_owned(), skeleton, joints, grid, duration_secs }))
}

fn captured(file: &str) -> Option<Arc<Clip>> {
    let path = shared(&format!("data/bvh/{file}"))?;
    Some(exchange::open(&path, &OpenOptions::default()).expect("it opens").clips[0].clone())
}

const WALKS: [&str; 4] =
    ["cmu_02_01_walk.bvh", "walk01.bvh", "xyz_affective_walk.bvh", "zxy_19joints_30fps.bvh"];
const ACROBATICS: [&str; 3] = ["backflip", "cartwheel", "spinkick"];

fn clips() -> Option<Vec<(String, Arc<Clip>)>> {
    let walks = WALKS.iter().map(|file| Some(((*file).to_owned(), captured(file)?)));
    walks.chain(ACROBATICS.iter().map(|what| Some(((*what).to_owned(), acrobat(what)?)))).collect()
}

fn targets() -> Vec<(&'static str, Arc<Skeleton>)> {
    let plain = |_: usize, word: &str| format!("Rig4_{word}");
    let odd = |index: usize, _: &str| format!("n{:03}", (index * 37 + 11) % 500);
    vec![
        ("59 joints", Arc::new(along_bones(&z_up_in_centimetres(of_59(plain))))),
        ("59 joints without names", Arc::new(along_bones(&of_59(odd)))),
        ("stubby", Arc::new(stubby().skeleton())),
    ]
}

#[track_caller]
fn carried(clip: &Clip, target: &Arc<Skeleton>, options: &Options) -> (Retargeted, [Figure; 2]) {
    let figures = [Figure::new(&clip.skeleton), Figure::new(target)];
    let map = JointMap::automatic(&figures[0], &figures[1]);
    let made = retarget(clip, &figures[0], &figures[1], &map, options).expect("it is mapped");
    (made, figures)
}

/// Directions of both parts of all limbs in the scene.
fn limbs(clip: &Clip, figure: &Figure, secs: f64) -> Vec<DVec3> {
    let world = clip.world_at(secs);
    let at = |role: Role| world[figure.roles.joint(role).expect("it has that limb")].position();
    let parts = |side: Side| {
        [
            at(Role::LowerArm(side)) - at(Role::UpperArm(side)),
            at(Role::Hand(side)) - at(Role::LowerArm(side)),
            at(Role::LowerLeg(side)) - at(Role::UpperLeg(side)),
            at(Role::Foot(side)) - at(Role::LowerLeg(side)),
        ]
    };
    Side::BOTH.into_iter().flat_map(parts).map(DVec3::normalize).collect()
}

#[test]
fn a_figure_of_59_joints_is_known_whatever_its_names() {
    for (case, spelled) in [
        ("plain", of_59(|_, word| word.to_owned())),
        ("prefix", of_59(|_, word| format!("Rig4_{word}"))),
        ("numbered", of_59(|index, word| format!("b{index:02}.{word}.jnt"))),
        ("none", of_59(|index, _| format!("n{:03}", (index * 37 + 11) % 500))),
    ] {
        assert_eq!(spelled.names.len(), 59);
        let head = spelled.at(Role::Head);
        for skeleton in [along_bones(&spelled), along_bones(&z_up_in_centimetres(spelled.clone()))] {
            let figure = Figure::new(&Arc::new(skeleton));
            for (joint, expected) in spelled.roles.iter().enumerate() {
                let own = &figure.roles.joints[joint];
                // Without names the leaf on the head may as well be the head.
                let is_on_head = joint == head || spelled.parents[joint] == Some(head);
                assert!(
                    own.role == *expected || case == "none" && is_on_head,
                    "{case}: {} {own:?}, expected {expected:?}",
                    spelled.names[joint]
                );
            }
            assert!(figure.roles.is_human());
            let twists: Vec<usize> = figure.roles.twist_helpers.iter().map(|helper| helper.joint).collect();
            assert_eq!(twists.len(), 4, "{case}: {twists:?}");
        }
    }
}

#[test]
fn limbs_make_the_same_angles_on_every_figure() {
    let Some(clips) = clips() else { return };
    for (clip_name, clip) in &clips {
        for (case, target) in targets() {
            let (made, [source, figure]) = carried(clip, &target, &Options::bare());
            let every = (clip.grid.count() / 60).max(1);
            for frame in (0..clip.grid.count()).step_by(every) {
                let secs = clip.grid.time(frame);
                let own = limbs(clip, &source, secs);
                let its = limbs(&made.clip, &figure, secs);
                // Between any two parts of limbs, which needs to know nothing of axes, units and headings.
                for a in 0..own.len() {
                    for b in 0..a {
                        let angles = [own[a].angle_between(own[b]), its[a].angle_between(its[b])];
                        let apart = (angles[0] - angles[1]).abs();
                        assert!(
                            apart < 1e-5,
                            "{clip_name} on {case}, frame {frame}, limbs {a} and {b}: {angles:?}"
                        );
                    }
                }
            }
        }
    }
}

/// Feet, at every frame: left and right ankle and toes above the ground, in legs.
fn heights(made: &Clip, figure: &Figure) -> Vec<f64> {
    let shape = &figure.roles.shape;
    let joints: Vec<usize> = Side::BOTH
        .into_iter()
        .flat_map(|side| [Role::Foot(side), Role::Toes(side)])
        .filter_map(|role| figure.roles.joint(role))
        .collect();
    let low = |frame: usize| {
        let world = made.world_at(made.grid.time(frame));
        let height =
            |&joint: &usize| (world[joint].position().dot(shape.up) - shape.ground) / shape.leg_length;
        joints.iter().map(height).fold(f64::INFINITY, f64::min)
    };
    (0..made.grid.count()).map(low).collect()
}

/// The most that a joint's turn against its parent is off the middle of its neighbours', in degrees, at each frame.
fn bumps(clip: &Clip, joint: usize) -> Vec<f64> {
    let times: Vec<f64> = clip.grid.times.iter().collect();
    let Some(track) = clip.rotation(joint) else { return vec![0.0; times.len()] };
    let keys = track.at_all(&times);
    (0..keys.len())
        .map(|key| {
            if key == 0 || key + 1 == keys.len() {
                return 0.0;
            }
            let middle =
                turnwright::rotor::slerp(keys[key - 1], keys[key + 1].aligned_to(keys[key - 1]), 0.5);
            keys[key].turn_to(middle).to_degrees()
        })
        .collect()
}

/// Frames well inside the time in which the heel or ball of a foot stands.
fn standing(clip: &Clip, source: &Figure, side: Side) -> Vec<usize> {
    let spans: Vec<[usize; 2]> = find_contacts(clip, source)
        .iter()
        .filter(|own| own.side == side)
        .map(|own| own.span_secs.map(|secs| clip.grid.frame(secs)))
        .collect();
    let is_inside = |frame: usize| spans.iter().any(|[first, last]| first + 4 <= frame && frame + 4 <= *last);
    (0..clip.grid.count()).filter(|&frame| is_inside(frame)).collect()
}

#[test]
fn what_holds_feet_neither_slides_dips_nor_trembles() {
    let Some(clips) = clips() else { return };
    let root_mean_square = |row: &[f64], frames: &[usize]| {
        let sum: f64 = frames.iter().map(|&frame| row[frame] * row[frame]).sum();
        (sum / frames.len().max(1) as f64).sqrt()
    };
    for (clip_name, clip) in &clips {
        for (case, target) in targets() {
            let (loose, _) = carried(clip, &target, &Options::bare());
            let (held, [source, figure]) =
                carried(clip, &target, &Options { plant_feet: true, ..Options::default() });
            let leg = figure.roles.shape.leg_length;
            let what = format!("{clip_name} on {case}");
            let slide = held.report.slide.expect("it has feet").map(|slide| slide / leg);
            let low = heights(&held.clip, &figure).into_iter().fold(f64::INFINITY, f64::min);
            println!(
                "{what}: {} plants, slide {:.3} to {:.3}, lowest {low:.3}",
                held.report.n_plants, slide[0], slide[1]
            );
            assert!(slide[1] < 0.1 * slide[0] + 0.03, "{what}: {slide:?}");
            assert!(low > -0.07, "{what}: a foot is {low} legs below the ground");
            for side in Side::BOTH {
                let knee = figure.roles.joint(Role::LowerLeg(side)).expect("a knee");
                let frames = standing(clip, &source, side);
                let [before, after] = [&loose.clip, &held.clip].map(|clip| bumps(clip, knee));
                let trembles = [&before, &after].map(|row| root_mean_square(row, &frames));
                let worst = |row: &[f64]| row.iter().copied().fold(0.0, f64::max);
                println!(
                    "   {side:?} knee: {:.3} to {:.3} where it stands, at worst {:.2} to {:.2}",
                    trembles[0],
                    trembles[1],
                    worst(&before),
                    worst(&after)
                );
                // Of captures at 120 frames a second, where neighbouring frames hardly differ.
                if clip.grid.rate > 100.0 {
                    let more = if case == "stubby" { 0.6 } else { 0.3 };
                    assert!(trembles[1] < trembles[0] + more, "{what}: {side:?} {trembles:?} degrees");
                }
            }
        }
    }
}

#[test]
fn limits_let_feet_stand_beside_their_places_but_not_slide() {
    let Some(clips) = clips() else { return };
    let mut clips = clips;
    clips.extend(captured("mixed_order_6ch.bvh").map(|clip| ("mixed_order".to_owned(), clip)));
    let biped = shared("data/gltf/biped23_movement_clips.glb")
        .and_then(|path| exchange::open(&path, &OpenOptions::default()).expect("it opens").skeleton());
    let targets = targets().into_iter().chain(biped.map(|biped| ("biped23", biped)));
    for (case, target) in targets {
        for (clip_name, clip) in &clips {
            let options = Options { plant_feet: true, ..Options::default() };
            let (loose, _) = carried(clip, &target, &options);
            let options = Options { limits: Some(KeptLimits::Adult), ..options };
            let (held, [_, figure]) = carried(clip, &target, &options);
            let leg = figure.roles.shape.leg_length;
            let [unheld, free] = loose.report.slide.expect("it has feet").map(|slide| slide / leg);
            let slide = held.report.slide.expect("it has feet")[1] / leg;
            let before: usize = held.report.limits.iter().map(|own| own.beyond_before).sum();
            let after: usize = held.report.limits.iter().map(|own| own.beyond).sum();
            println!(
                "{clip_name} on {case}: slide {unheld:.3}, held {free:.3}, within limits {slide:.3} (drift {:.3}, hips moved {:.3}); beyond {before} to {after}; {} missed",
                held.report.drift.expect("it has feet")[1] / leg,
                held.report.hips_shift / leg,
                held.report.missed.len()
            );
            assert_eq!(after, 0, "{clip_name} on {case}");
            // However far limits throw a limb, the whole figure is not carried after it.
            assert!(held.report.hips_shift < 0.5 * leg, "{clip_name} on {case}: {}", held.report.hips_shift);
            // Of walks, whose limbs are beyond limits by some degrees here and there.
            if WALKS[..3].contains(&clip_name.as_str()) {
                assert!(slide < 0.7 * unheld, "{clip_name} on {case}: {slide} of {unheld}");
                let drift = held.report.drift.expect("it has feet")[1] / leg;
                assert!(drift < 0.08, "{clip_name} on {case}: {drift}");
            }
        }
    }
}

/// How the two skins of a walker share the joints of its file.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Skins {
    /// Both skins name all joints.
    Alike,
    /// The legs in one, the rest in the other; both have the hips.
    Halves,
    /// Each skin has joints of its own, two whole hierarchies at one place.
    Apart,
    /// The hips are shared, all below them is there twice.
    OnOneHips,
}

/// The walker as a file: plain nodes, two skins with their bind matrices, a mesh of a triangle for each.
fn two_skins(build: &Build, skins: Skins) -> Value {
    use base64::Engine;
    let n = build.names.len();
    // The joints of the second hierarchy, by those of the first.
    let second: Vec<usize> = match skins {
        Skins::Alike | Skins::Halves => (0..n).collect(),
        Skins::Apart => (n..2 * n).collect(),
        Skins::OnOneHips => (0..n).map(|joint| if joint == 0 { 0 } else { n + joint - 1 }).collect(),
    };
    let count = second.iter().max().map_or(n, |most| most.max(&(n - 1)) + 1);
    let mut places = vec![DVec3::ZERO; count];
    let mut nodes = vec![json!({}); count];
    for (joint, &copy) in second.iter().enumerate() {
        for (own, number) in [(joint, 0), (copy, 1)] {
            let up = build.parents[joint].map(|up| if number == 0 { up } else { second[up] });
            let at = build.parents[joint].map_or(DVec3::ZERO, |up| build.places[up]);
            places[own] = build.places[joint];
            nodes[own]["name"] = json!(build.names[joint]);
            nodes[own]["translation"] = json!((build.places[joint] - at).to_array());
            if let Some(up) = up.filter(|_| own >= n || number == 0) {
                let mut kids = nodes[up]["children"].as_array().cloned().unwrap_or_default();
                kids.push(json!(own));
                nodes[up]["children"] = json!(kids);
            }
        }
    }
    let is_leg = |joint: &usize| {
        let mut above = std::iter::successors(Some(*joint), |&own| build.parents[own]);
        above.any(|own| matches!(build.roles[own], Some(Role::UpperLeg(_))))
    };
    let first: Vec<usize> = match skins {
        Skins::Halves => (0..n).filter(|joint| *joint == 0 || is_leg(joint)).collect(),
        _ => (0..n).collect(),
    };
    let other: Vec<usize> = match skins {
        Skins::Halves => (0..n).filter(|joint| !is_leg(joint)).collect(),
        _ => second.clone(),
    };
    let mut bytes: Vec<u8> = Vec::new();
    let (mut views, mut accessors) = (Vec::new(), Vec::new());
    let mut put = |kind: &str, width: usize, component: u32, data: Vec<u8>, unit: usize| {
        views.push(json!({"buffer": 0, "byteOffset": bytes.len(), "byteLength": data.len()}));
        let mut accessor = json!({
            "bufferView": views.len() - 1, "componentType": component, "type": kind, "count": data.len() / (unit * width)
        });
        if kind == "VEC3" {
            accessor["min"] = json!([0.0, 0.0, 0.0]);
            accessor["max"] = json!([1.0, 1.0, 0.0]);
        }
        accessors.push(accessor);
        bytes.extend(data);
        accessors.len() - 1
    };
    let floats = |numbers: &[f64]| -> Vec<u8> {
        numbers.iter().flat_map(|&number| (number as f32).to_le_bytes()).collect()
    };
    let corners = put("VEC3", 3, 5126, floats(&[0.0, 0.0, 0.0, 1.0, 0.0, 0.0, 0.0, 1.0, 0.0]), 4);
    let joints_of = put("VEC4", 4, 5121, vec![0; 12], 1);
    let weights = put("VEC4", 4, 5126, floats(&[1.0, 0.0, 0.0, 0.0].repeat(3)), 4);
    let listed: Vec<Value> = [&first, &other]
        .into_iter()
        .map(|joints| {
            let binds: Vec<f64> = joints
                .iter()
                .flat_map(|&joint| glam::DMat4::from_translation(-places[joint]).to_cols_array())
                .collect();
            let binds = put("MAT4", 16, 5126, floats(&binds), 4);
            json!({"joints": joints, "inverseBindMatrices": binds})
        })
        .collect();
    let figure = nodes.len();
    let roots: Vec<usize> = if skins == Skins::Apart { vec![0, n] } else { vec![0] };
    nodes.push(json!({"name": "walker", "children": roots}));
    for skin in 0..2 {
        nodes.push(json!({"name": format!("mesh {skin}"), "mesh": 0, "skin": skin}));
    }
    let text = base64::engine::general_purpose::STANDARD.encode(&bytes);
    json!({
        "asset": {"version": "2.0"},
        "scene": 0,
        "scenes": [{"nodes": [figure, figure + 1, figure + 2]}],
        "nodes": nodes,
        "skins": listed,
        "meshes": [{"primitives": [{"attributes": {
            "POSITION": corners, "JOINTS_0": joints_of, "WEIGHTS_0": weights
        }}]}],
        "accessors": accessors,
        "bufferViews": views,
        "buffers": [{"byteLength": bytes.len(), "uri": format!("data:application/octet-stream;base64,{text}")}],
    })
}

#[test]
fn both_skins_of_a_walker_move_together() {
    let Some(clip) = captured("walk01.bvh") else { return };
    let folder = tempfile::tempdir().expect("a folder");
    // A file has no ends beyond its joints.
    let mut walker = person(&A).map_places(|p| DVec3::new(1.1 * p.x, 0.8 * p.y, p.z));
    walker.tips.iter_mut().for_each(Vec::clear);
    let (expected, _) =
        carried(&clip, &Arc::new(walker.skeleton()), &Options { plant_feet: true, ..Options::bare() });
    for skins in [Skins::Alike, Skins::Halves, Skins::Apart, Skins::OnOneHips] {
        let document = two_skins(&walker, skins);
        let path = folder.path().join(format!("{skins:?}.gltf"));
        disk::write(&path, document.to_string().as_bytes()).expect("it writes");
        let file = exchange::open(&path, &OpenOptions::default()).expect("it opens");
        let target = file.skeleton().expect("a skeleton");
        let (made, [source, figure]) =
            carried(&clip, &target, &Options { plant_feet: true, ..Options::bare() });
        assert!(figure.roles.is_human() && figure.roles.other_figures.is_empty(), "{skins:?}");
        let n = walker.names.len();
        let copies = match skins {
            Skins::Alike | Skins::Halves => 0,
            Skins::Apart => n,
            Skins::OnOneHips => n - 1,
        };
        assert_eq!(figure.roles.copies.len(), copies, "{skins:?}");
        let map = JointMap::automatic(&source, &figure);
        assert!(map.doubts.is_empty(), "{skins:?}: {:?}", map.doubts);
        let transfer = Transfer::new(&clip, &source, &figure, &map).expect("it is mapped");
        for &(copy, of) in &figure.roles.copies {
            assert_eq!(target.joints()[copy].name, target.joints()[of].name);
            assert_eq!(transfer.driver(copy), Driver::Copy(of));
        }
        let [driven, _] = expected.report.driven;
        let twice = match skins {
            Skins::Alike | Skins::Halves => driven,
            Skins::Apart => 2 * driven,
            Skins::OnOneHips => 2 * driven - 1,
        };
        assert_eq!(made.report.driven, [twice, n + copies], "{skins:?}");

        // Written onto the file both skins' joints are where a file with one skin has them.
        let onto = folder.path().join(format!("{skins:?} walks.gltf"));
        let guard = Guard { inputs: vec![path.clone()], force: false };
        exchange::write_onto(&file, &made.clip, &onto, &guard).expect("it writes");
        let again = exchange::open(&onto, &OpenOptions::default()).expect("it opens");
        let played = &again.clips[0];
        for frame in (0..clip.grid.count()).step_by(7) {
            let secs = clip.grid.time(frame);
            let [own, its] = [expected.clip.world_at(secs), played.world_at(secs)];
            for (joint, place) in its.iter().enumerate() {
                let name = &played.skeleton.joints()[joint].name;
                let Some(same) = walker.names.iter().position(|own| own == name) else { continue };
                let off = own[same].position().distance(place.position());
                assert!(off < 1e-5, "{skins:?}, frame {frame}, `{name}`: {off}");
            }
        }
        // Meshes, skins and nodes as they were.
        let text: Value = serde_json::from_slice(&disk::read(&onto).expect("it reads")).expect("JSON");
        for part in ["skins", "meshes", "nodes", "scenes"] {
            assert_eq!(text[part], document[part], "{skins:?}: {part}");
        }
        // As a source it carries on: the walk on the walker onto the 59 joints.
        let (_, further) = &targets()[0];
        let (further, [walker_figure, figure]) = carried(played, further, &Options::bare());
        let secs = clip.grid.time(40);
        let [own, its] = [limbs(played, &walker_figure, secs), limbs(&further.clip, &figure, secs)];
        for limb in 1..own.len() {
            let apart = own[0].angle_between(own[limb]) - its[0].angle_between(its[limb]);
            assert!(apart.abs() < 1e-5, "{skins:?}, limb {limb}: {apart}");
        }
    }
}

/// A machine in a row of joints, each with its place and the place of its tip.
fn machine(parts: &[(&str, [f64; 3])], tip: [f64; 3]) -> Build {
    let mut build = Build::default();
    let mut on = None;
    for (name, place) in parts {
        on = Some(build.add(name, on, *place, None));
    }
    build.tips[on.expect("a machine has parts")].push(DVec3::from_array(tip));
    build
}

#[test]
fn a_machine_moves_another_one_and_asks() {
    let crane = machine(
        &[
            ("Pedestal", [0.0, 0.0, 0.0]),
            ("Slewing", [0.0, 3.0, 0.0]),
            ("Boom", [0.0, 4.0, 0.7]),
            ("Hook", [0.0, 4.0, 9.0]),
        ],
        [0.0, 2.0, 9.0],
    );
    let digger = machine(
        &[
            ("Chassis", [0.0, 0.0, 0.0]),
            ("Turret", [0.0, 1.0, 0.0]),
            ("Arm", [0.0, 1.6, 0.4]),
            ("Bucket", [0.0, 1.6, 5.0]),
        ],
        [0.0, 0.6, 5.2],
    );
    let skeleton = Arc::new(crane.skeleton());
    let times = Times::Even { step_secs: 0.1, count: 20 };
    let axis = |joint: usize| if joint == 1 { DVec3::Y } else { DVec3::X };
    let joints = (0..4).map(|joint| {
        let turn = |i: usize| {
            let angle = (0.2 * i as f64 + joint as f64).sin() * 0.5;
            Rotor::from_plane_angles(turnwright::rotor::Bivector::from_axis(axis(joint) * angle))
        };
        let keys: Vec<Rotor> = (0..20).map(turn).collect();
        Arc::new(JointTracks {
            rotation: Some(RotationTrack::from_rotors(times.clone(), keys)),
            ..JointTracks::default()
        })
    });
    let clip = Clip {
        name: "slew".to_owned(),
        skeleton: skeleton.clone(),
        joints: joints.collect(),
        grid: FrameGrid { times: times.clone(), rate: 10.0 },
        duration_secs: 1.9,
    };
    let target = Arc::new(digger.skeleton());
    let map = JointMap::automatic(&Figure::new(&skeleton), &Figure::new(&target));
    let pairs: Vec<(usize, usize)> = map.links.iter().map(|link| (link.source, link.target)).collect();
    assert_eq!(pairs, [(0, 0), (1, 1), (2, 2), (3, 3)]);
    assert!(map.links.iter().all(|link| link.confidence < 0.5), "it is asked about");
    assert!(map.doubts.iter().any(|doubt| doubt.contains("where they hang")), "{:?}", map.doubts);
    let (made, _) = carried(&clip, &target, &Options::bare());
    for frame in 0..20 {
        let secs = clip.grid.time(frame);
        let [own, its] = [clip.world_at(secs), made.clip.world_at(secs)];
        for joint in 0..4 {
            assert!(own[joint].rotation.turn_to(its[joint].rotation) < 1e-9, "joint {joint}, frame {frame}");
        }
    }
    // A branch more: nothing is guessed.
    let mut forked = digger;
    forked.add("Blade", Some(0), [0.0, 0.3, 1.5], None);
    forked.add("Edge", Some(4), [0.0, 0.1, 2.0], None);
    let map = JointMap::automatic(&Figure::new(&skeleton), &Figure::new(&Arc::new(forked.skeleton())));
    assert!(map.links.is_empty(), "{:?}", map.links);
}

//! Clips carried to another skeleton: the worked examples of the methods page, identities, what must not matter, and real
//! captures on real figures.

use std::sync::Arc;

use glam::{DAffine3, DVec3};
use proptest::prelude::*;
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times, VectorTrack};
use turnwright::exchange;
use turnwright::retarget::{
    Figure, JointMap, MapError, Options, Retargeted, fingerprint, read_map, retarget, spread, write_map,
};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::roles::{Role, Side};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::roles::{A, B, Build, D, person};
use crate::support::{Tally, assert_close, list, numbers, shared, shared_json, unit_rotor};

/// Every joint sways, each in its own way; the root walks.
fn sway(skeleton: &Arc<Skeleton>, frames: usize, size: f64) -> Clip {
    let times = Times::Even { step_secs: 1.0 / 30.0, count: frames };
    let listed: Vec<usize> = skeleton.listed().collect();
    let joints = (0..skeleton.len())
        .map(|joint| {
            let own = skeleton.joints()[joint].rest;
            if !listed.contains(&joint) {
                return Arc::default();
            }
            let k = joint as f64;
            let turn = |i: usize| {
                let t = i as f64 / 30.0;
                let angles =
                    Bivector::new((t + k).sin(), (1.3 * t + 2.0 * k).cos(), (0.7 * t - k).sin()) * 0.35;
                own.rotation * Rotor::from_plane_angles(angles)
            };
            let place = |i: usize| {
                let t = i as f64 / 30.0;
                own.translation + DVec3::new(0.4 * t, 0.05 * (6.0 * t).sin(), 0.9 * t) * size
            };
            let is_root = skeleton.parent_joint(joint).is_none();
            Arc::new(JointTracks {
                rotation: Some(RotationTrack::from_rotors(
                    times.clone(),
                    (0..frames).map(turn).collect::<Vec<_>>(),
                )),
                translation: is_root.then(|| {
                    VectorTrack::straight(times.clone(), (0..frames).map(place).collect::<Vec<_>>())
                }),
                scale: None,
            })
        })
        .collect();
    Clip {
        name: "sway".to_owned(),
        skeleton: skeleton.clone(),
        joints,
        grid: FrameGrid { times, rate: 30.0 },
        duration_secs: (frames - 1) as f64 / 30.0,
    }
}

#[track_caller]
fn carried(clip: &Clip, target: &Arc<Skeleton>, options: Options) -> Retargeted {
    let (source, target) = (Figure::new(&clip.skeleton), Figure::new(target));
    let map = JointMap::automatic(&source, &target);
    retarget(clip, &source, &target, &map, options)
        .unwrap_or_else(|error| panic!("{error}: {:?}", map.doubts))
}

fn plain(clip: &Clip, target: &Arc<Skeleton>) -> Clip {
    carried(clip, target, Options { plant_feet: false, measure: false }).clip
}

/// The largest turn in degrees and distance between two clips in the scene, joint by joint of one list.
fn apart(a: &Clip, b: &Clip) -> (f64, f64) {
    let mut worst = (0.0_f64, 0.0_f64);
    for frame in 0..a.grid.count() {
        let secs = a.grid.time(frame);
        let [a, b] = [a.world_at(secs), b.world_at(secs)];
        assert_eq!(a.len(), b.len());
        for (a, b) in a.iter().zip(&b) {
            worst.0 = worst.0.max(a.rotation.turn_to(b.rotation).to_degrees());
            worst.1 = worst.1.max(a.position().distance(b.position()));
        }
    }
    worst
}

#[test]
fn chain_of_three_spread_over_four() {
    let Some(checks) = shared_json("reference/method_checks.json") else { return };
    let check = &checks["chain_3_to_4"];
    let mut all = Rotor::IDENTITY;
    let turns: Vec<Rotor> = list(&check["source_local"])
        .iter()
        .map(|local| {
            all = all * unit_rotor(local);
            all
        })
        .collect();
    let lengths: [f64; 3] = numbers(&check["source_lengths"]);
    let total: f64 = lengths.iter().sum();
    let mut along = 0.0;
    let from: Vec<f64> = lengths
        .iter()
        .map(|length| {
            along += length;
            along / total
        })
        .collect();
    let knots: [f64; 5] = numbers(&check["target_knots"]);
    let found = spread(&turns, &from, &knots[1..]);
    let mut tally = Tally::new("chain_3_to_4");
    let mut before = Rotor::IDENTITY;
    for (index, (turn, expected)) in found.iter().zip(list(&check["target_local"])).enumerate() {
        let local = before.reverse() * *turn;
        tally.check(&format!("joint {index}"), local.turn_to(unit_rotor(expected)), 1e-9);
        before = *turn;
    }
    tally.check("end", before.turn_to(unit_rotor(&check["end"])), 1e-9);
    tally.finish(5);
}

#[test]
fn rest_offsets_as_worked_out() {
    let Some(checks) = shared_json("reference/method_checks.json") else { return };
    let check = &checks["retarget_rest"];
    let two = |key: &str| -> [Rotor; 2] {
        let both: Vec<Rotor> = list(&check[key]).iter().map(unit_rotor).collect();
        [both[0], both[1]]
    };
    // Both figures stand in the same places; only the joints' own axes differ.
    let build = |frames: [Rotor; 2]| {
        let world = [frames[0], frames[0] * frames[1]];
        let joint = |number: usize, parent: Option<usize>, translation: DVec3| Joint {
            name: format!("J{number}"),
            number,
            parent,
            rest: Transform { translation, rotation: frames[number], scale: DVec3::ONE },
            kind: JointKind::Joint,
            tips: vec![world[number].reverse().apply(DVec3::Y)],
        };
        let second = world[0].reverse().apply(DVec3::Y);
        Arc::new(
            Skeleton::new(vec![joint(0, None, DVec3::ZERO), joint(1, Some(0), second)]).expect("a chain"),
        )
    };
    let source = build([Rotor::IDENTITY; 2]);
    let target = build(two("target_rest_local"));
    let pose = two("source_pose_local");
    let once = Times::Even { step_secs: 1.0, count: 1 };
    let clip = Clip {
        name: String::new(),
        skeleton: source,
        joints: pose
            .iter()
            .map(|turn| {
                let rotation = Some(RotationTrack::from_rotors(once.clone(), [*turn]));
                Arc::new(JointTracks { rotation, ..JointTracks::default() })
            })
            .collect(),
        grid: FrameGrid { times: once, rate: 1.0 },
        duration_secs: 0.0,
    };
    let result = plain(&clip, &target);
    for (joint, expected) in two("target_pose_local").into_iter().enumerate() {
        assert_close!(result.local_at(0.0)[joint].rotation, expected, 1e-12, "joint {joint}");
    }
}

#[test]
fn the_same_skeleton_gets_the_same_clip() {
    let skeleton = Arc::new(person(&A).skeleton());
    let clip = sway(&skeleton, 40, 1.0);
    let (turn, place) = apart(&clip, &plain(&clip, &skeleton));
    assert!(turn <= 1e-9 && place < 1e-12, "{turn:e} degrees, {place:e}");

    // Other names, whatever they say.
    let renamed = Arc::new(person(&A).rename(|index, _| format!("part {index}")).skeleton());
    let (turn, place) = apart(&clip, &plain(&clip, &renamed));
    assert!(turn <= 1e-9 && place < 1e-12, "renamed: {turn:e} degrees, {place:e}");

    // Other axes for every joint: the same places, and turns of the scene that differ by a constant of each joint.
    let frame = |joint: usize| {
        let k = joint as f64;
        Rotor::from_plane_angles(Bivector::new((5.0 * k).sin(), (2.0 * k).cos(), (3.0 * k).sin()) * 2.0)
    };
    let other = Arc::new(person(&A).skeleton_with(frame));
    let result = plain(&clip, &other);
    for frame_number in 0..clip.grid.count() {
        let secs = clip.grid.time(frame_number);
        let [own, its] = [clip.world_at(secs), result.world_at(secs)];
        for joint in 0..own.len() {
            assert!(own[joint].position().distance(its[joint].position()) < 1e-12);
            let expected = own[joint].rotation * frame(joint);
            assert!(expected.turn_to(its[joint].rotation).to_degrees() < 1e-9, "joint {joint}");
        }
    }

    // A larger copy: the same turns against the parents, the path in proportion.
    let large = Arc::new(person(&A).map_places(|p| p * 2.5).skeleton());
    let result = plain(&clip, &large);
    for frame_number in 0..clip.grid.count() {
        let secs = clip.grid.time(frame_number);
        let [own, its] = [clip.local_at(secs), result.local_at(secs)];
        for joint in 0..own.len() {
            assert!(own[joint].rotation.turn_to(its[joint].rotation).to_degrees() < 1e-9);
        }
        assert!((own[0].translation * 2.5).distance(its[0].translation) < 1e-12);
    }
}

#[test]
fn outside_clips_onto_their_own_skeletons() {
    let files = [
        "bvh/cmu_02_01_walk.bvh",
        "bvh/mixed_order_6ch.bvh",
        "gltf/Fox.glb",
        "gltf/wolf.glb",
        "gltf/RiggedFigure.glb",
    ];
    for file in files {
        let Some(path) = shared(&format!("data/{file}")) else { return };
        let source = exchange::open(&path, &exchange::OpenOptions::default()).expect("it opens");
        let clip = &source.clips[0];
        let (turn, place) = apart(clip, &plain(clip, &clip.skeleton));
        let size = Figure::new(&clip.skeleton).roles.shape.height.max(1.0);
        assert!(turn <= 1e-9 && place < 1e-9 * size, "{file}: {turn:e} degrees, {place:e}");
    }
}

/// The figure hung under a carrier that turns, moves and sizes it.
fn hung(skeleton: &Skeleton, carrier: Transform) -> Arc<Skeleton> {
    let mut joints = vec![Joint {
        name: "carrier".to_owned(),
        number: 1000,
        parent: None,
        rest: carrier,
        kind: JointKind::Carrier,
        tips: vec![],
    }];
    joints.extend(
        skeleton
            .joints()
            .iter()
            .map(|joint| Joint { parent: Some(joint.parent.map_or(0, |up| up + 1)), ..joint.clone() }),
    );
    Arc::new(Skeleton::new(joints).expect("parents stand first"))
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(12))]

    #[test]
    fn what_the_source_hangs_under_does_not_matter(
        heading in -3.0..3.0_f64, size in 0.01..100.0_f64, x in -5.0..5.0_f64, y in -5.0..5.0_f64, z in -5.0..5.0_f64,
    ) {
        let bare = Arc::new(person(&B).skeleton());
        let target = Arc::new(person(&D).map_places(|p| DVec3::new(1.2 * p.x, 0.8 * p.y, p.z)).skeleton());
        let expected = plain(&sway(&bare, 12, 1.0), &target);
        let rotation = Rotor::from_plane_angles(Bivector::from_axis(DVec3::Y * heading));
        let carrier = Transform { translation: DVec3::new(x, y, z), rotation, scale: DVec3::splat(size) };
        let under = hung(&bare, carrier);
        let mut clip = sway(&under, 12, 1.0);
        // The very same motion below the carrier.
        let plain_clip = sway(&bare, 12, 1.0);
        clip.joints = std::iter::once(Arc::default()).chain(plain_clip.joints.iter().cloned()).collect();
        let found = plain(&clip, &target);
        let (turn, place) = apart(&expected, &found);
        prop_assert!(turn < 1e-6 && place < 1e-8, "{turn:e} degrees, {place:e}");
    }

    #[test]
    fn what_the_target_hangs_under_turns_and_sizes_it_only(
        heading in -3.0..3.0_f64, size in 0.01..100.0_f64, x in -5.0..5.0_f64, z in -5.0..5.0_f64,
    ) {
        let clip = sway(&Arc::new(person(&B).skeleton()), 12, 1.0);
        let bare = person(&D).map_places(|p| DVec3::new(1.2 * p.x, 0.8 * p.y, p.z)).skeleton();
        let expected = plain(&clip, &Arc::new(bare.clone()));
        let rotation = Rotor::from_plane_angles(Bivector::from_axis(DVec3::Y * heading));
        let carrier = Transform { translation: DVec3::new(x, 0.0, z), rotation, scale: DVec3::splat(size) };
        let found = plain(&clip, &hung(&bare, carrier));
        let scene: DAffine3 = carrier.to_affine();
        for frame in 0..clip.grid.count() {
            let secs = clip.grid.time(frame);
            let [own, its] = [expected.world_at(secs), found.world_at(secs)];
            for (own, its) in own.iter().zip(&its[1..]) {
                prop_assert!((rotation * own.rotation).turn_to(its.rotation) < 1e-8);
                let place = scene.transform_point3(own.position());
                prop_assert!(place.distance(its.position()) < 1e-8 * size, "{} {}", place, its.position());
            }
        }
    }
}

/// Directions of arms and legs in the scene.
fn limb_directions(clip: &Clip, build: &Build, secs: f64) -> Vec<DVec3> {
    let world = clip.world_at(secs);
    let at = |role: Role| world[build.at(role)].position();
    Side::BOTH
        .into_iter()
        .flat_map(|side| {
            [
                at(Role::LowerArm(side)) - at(Role::UpperArm(side)),
                at(Role::Hand(side)) - at(Role::LowerArm(side)),
                at(Role::LowerLeg(side)) - at(Role::UpperLeg(side)),
                at(Role::Foot(side)) - at(Role::LowerLeg(side)),
            ]
        })
        .map(DVec3::normalize)
        .collect()
}

/// The figure with arms turned down by so many degrees at rest: 45 is an A-pose, 85 arms at the sides.
fn arms_down(build: Build, degrees: f64) -> Build {
    let shoulders = Side::BOTH.map(|side| build.places[build.at(Role::UpperArm(side))]);
    build.map_places(|p| {
        let (side, x) = if p.x > 0.0 { (0, 1.0) } else { (1, -1.0) };
        if p.x.abs() < 0.17 || p.y < 1.3 {
            return p;
        }
        let turn = Rotor::from_plane_angles(Bivector::from_axis(DVec3::Z * (-x * degrees.to_radians())));
        shoulders[side] + turn.apply(p - shoulders[side])
    })
}

#[test]
fn rest_poses_of_every_kind_are_brought_together() {
    let sources = [0.0, 45.0, 85.0].map(|degrees| arms_down(person(&A), degrees));
    let targets = [0.0, 45.0, 85.0].map(|degrees| arms_down(person(&B), degrees));
    for source in &sources {
        let clip = sway(&Arc::new(source.skeleton()), 20, 1.0);
        for target in &targets {
            let stocky = target.clone().map_places(|p| DVec3::new(1.1 * p.x, 0.9 * p.y, p.z));
            let result = plain(&clip, &Arc::new(stocky.skeleton()));
            for frame in 0..20 {
                let secs = clip.grid.time(frame);
                let pairs = limb_directions(&clip, source, secs);
                for (own, its) in pairs.iter().zip(limb_directions(&result, target, secs)) {
                    assert!(own.distance(its) < 1e-6, "{own} {its}");
                }
            }
        }
    }
}

#[test]
fn captures_on_figures_they_were_not_made_for() {
    let captures = ["cmu_02_01_walk.bvh", "walk01.bvh", "xyz_affective_walk.bvh", "zxy_19joints_30fps.bvh"];
    for figure in ["biped23_movement_clips.glb", "RiggedFigure.glb"] {
        for capture in captures {
            let (Some(clip), Some(onto)) =
                (shared(&format!("data/bvh/{capture}")), shared(&format!("data/gltf/{figure}")))
            else {
                return;
            };
            let open = |path: &std::path::Path| {
                exchange::open(path, &exchange::OpenOptions::default()).expect("it opens")
            };
            let clip = open(&clip).clips[0].clone();
            let target = open(&onto).skeleton().expect("a skeleton");
            let loose = carried(&clip, &target, Options { plant_feet: false, measure: true }).report;
            // Arms and legs point exactly where the source's do.
            assert!(
                loose.worst_direction_rad().to_degrees() < 1e-3,
                "{capture} on {figure}: {:?}",
                loose.directions
            );
            let held = carried(&clip, &target, Options { plant_feet: true, measure: true });
            let (Some(slide), Some(drift)) = (held.report.slide, held.report.drift) else {
                panic!("feet were found")
            };
            let leg = Figure::new(&target).roles.shape.leg_length;
            assert!(held.report.n_plants > 3, "{capture} on {figure}");
            assert!(slide[1] < 0.5 * slide[0] + 0.02 * leg, "{capture} on {figure}: {:?}", held.report);
            assert!(drift[1] < 0.05 * leg, "{capture} on {figure}: {drift:?} for a leg of {leg}");
            // Feet stand near the ground all through.
            let roles = Figure::new(&target).roles;
            let low = (0..clip.grid.count())
                .step_by(5)
                .map(|frame| {
                    let world = held.clip.world_at(clip.grid.time(frame));
                    let height = |side| world[roles.joint(Role::Foot(side)).expect("a foot")].position().y;
                    height(Side::Left).min(height(Side::Right))
                        - roles.shape.ground
                        - roles.shape.ankle_height
                })
                .fold((f64::MAX, f64::MIN), |(low, high), at| (low.min(at), high.max(at)));
            assert!(
                low.0 > -0.2 * leg && low.1 < 0.3 * leg,
                "{capture} on {figure}: ankles {low:?} for a leg of {leg}"
            );
        }
    }
}

#[test]
fn maps_are_written_read_and_corrected() {
    let (source, target) = (
        Figure::new(&Arc::new(person(&B).skeleton())),
        Figure::new(&Arc::new(person(&D).map_places(|p| p * DVec3::new(1.0, 0.9, 1.0)).skeleton())),
    );
    let mut map = JointMap::automatic(&source, &target);
    let text = write_map(&map, &source, &target);
    let rows = read_map(&text, &source.skeleton, &target.skeleton).expect("what is written is read");
    let before = map.clone();
    map.correct(&rows);
    assert_eq!(map, before);
    let rows = read_map("source,target\nlhand,Head\n,Neck\n", &source.skeleton, &target.skeleton);
    assert_eq!(rows, Err(MapError::NoSuchJoint { line: 2, who: "source", found: "lhand".to_owned() }));
    let rows = read_map("source,target\nlwrist,Head\n,Neck\n", &source.skeleton, &target.skeleton)
        .expect("it reads");
    map.correct(&rows);
    let find = |figure: &Figure, name: &str| figure.skeleton.find(name).expect("it is there");
    assert_eq!(map.of_target(find(&target, "Head")).map(|link| link.source), Some(find(&source, "lwrist")));
    assert!(map.of_target(find(&target, "Neck")).is_none());
    assert!(matches!(read_map("a,b\n", &source.skeleton, &target.skeleton), Err(MapError::Heading { .. })));
    let twice = read_map("source,target\nhead,Head\nroot,Head\n", &source.skeleton, &target.skeleton);
    assert!(matches!(twice, Err(MapError::Twice { line: 3, .. })));
}

#[test]
fn a_fingerprint_tells_skeletons_apart_and_not_files() {
    let own = person(&A);
    let print = fingerprint(&own.skeleton());
    assert_eq!(print.len(), 16);
    assert_eq!(print, fingerprint(&own.clone().map_places(|p| p * 100.0).skeleton()));
    assert_ne!(print, fingerprint(&person(&B).skeleton()));
    assert_ne!(print, fingerprint(&own.map_places(|p| DVec3::new(p.x, 1.1 * p.y, p.z)).skeleton()));
}

//! Clips carried to another skeleton: the worked examples of the methods page, identities, what must not matter, and real
//! captures on real figures.

use std::sync::Arc;

use glam::{DAffine3, DVec3};
use proptest::prelude::*;
use turnwright::clip::{
    Clip, FootPart, FrameGrid, JointPoint, JointTracks, RotationTrack, Times, VectorTrack,
};
use turnwright::exchange::{self, disk, joint_maps};
use turnwright::limit::{Interval, JointLimit, Limits, Range, SwingLimit};
use turnwright::retarget::{
    Contacts, Figure, FootContact, HandHold, HoldAt, JointMap, KeptLimits, MapError, MapRow, Options,
    RestPick, Retargeted, Transfer, find_contacts, fingerprint, palm, read_contacts, read_map, retarget,
    spread, write_contacts, write_map,
};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::roles::{Role, Side};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::roles::{A, B, Build, D, person};
use crate::strategies::same_cases;
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
fn carried(clip: &Clip, target: &Arc<Skeleton>, options: &Options) -> Retargeted {
    let (source, target) = (Figure::new(&clip.skeleton), Figure::new(target));
    let map = JointMap::automatic(&source, &target);
    retarget(clip, &source, &target, &map, options)
        .unwrap_or_else(|error| panic!("{error}: {:?}", map.doubts))
}

fn plain(clip: &Clip, target: &Arc<Skeleton>) -> Clip {
    carried(clip, target, &Options::bare()).clip
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

/// Any turn at all.
fn any_turn() -> impl Strategy<Value = Rotor> {
    (-3.0..3.0_f64, -3.0..3.0_f64, -3.0..3.0_f64)
        .prop_map(|(a, b, c)| Rotor::from_plane_angles(Bivector::new(a, b, c)))
}

fn any_place() -> impl Strategy<Value = DVec3> {
    (-5.0..5.0_f64, -5.0..5.0_f64, -5.0..5.0_f64).prop_map(|(x, y, z)| DVec3::new(x, y, z))
}

proptest! {
    #![proptest_config(same_cases(24))]

    #[test]
    fn what_the_source_hangs_under_does_not_matter(
        rotation in any_turn(), size in 0.01..100.0_f64, translation in any_place(),
    ) {
        let bare = Arc::new(person(&B).skeleton());
        let target = Arc::new(person(&D).map_places(|p| DVec3::new(1.2 * p.x, 0.8 * p.y, p.z)).skeleton());
        let expected = plain(&sway(&bare, 12, 1.0), &target);
        let under = hung(&bare, Transform { translation, rotation, scale: DVec3::splat(size) });
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
        rotation in any_turn(), size in 0.01..100.0_f64, translation in any_place(),
    ) {
        let found = below_a_carrier(Transform { translation, rotation, scale: DVec3::splat(size) });
        prop_assert_eq!(found, Ok(()));
    }
}

/// The result below a carrier is the carrier's own transform of the bare result.
fn below_a_carrier(carrier: Transform) -> Result<(), String> {
    let clip = sway(&Arc::new(person(&B).skeleton()), 12, 1.0);
    let bare = person(&D).map_places(|p| DVec3::new(1.2 * p.x, 0.8 * p.y, p.z)).skeleton();
    let expected = plain(&clip, &Arc::new(bare.clone()));
    let found = plain(&clip, &hung(&bare, carrier));
    let scene: DAffine3 = carrier.to_affine();
    for frame in 0..clip.grid.count() {
        let secs = clip.grid.time(frame);
        let [own, its] = [expected.world_at(secs), found.world_at(secs)];
        for (joint, (own, its)) in own.iter().zip(&its[1..]).enumerate() {
            let turn = (carrier.rotation * own.rotation).turn_to(its.rotation);
            let off = scene.transform_point3(own.position()).distance(its.position());
            if turn >= 1e-8 || off >= 1e-8 * carrier.scale.x {
                return Err(format!("frame {frame}, joint {joint}: {turn:e} rad and {off:e} off"));
            }
        }
    }
    Ok(())
}

/// A carrier that tilts the figure's up by 24° and lets it stand with its hips at the height of the scene's origin.
#[test]
fn a_carrier_that_leaves_the_figure_nearly_upright_turns_and_sizes_it_only() {
    let rotation = Rotor::from_parts(
        0.505_465_592_131_367_9,
        Bivector::new(0.0, 0.837_382_067_033_260_8, 0.208_076_449_850_503_86),
    );
    let translation = DVec3::new(-3.512_801_766_451_931_8, -1.673_019_376_848_186_2, -4.001_900_366_773_886);
    let carrier = Transform { translation, rotation, scale: DVec3::splat(4.606_649_180_092_305) };
    assert_eq!(below_a_carrier(carrier), Ok(()));
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
            let loose = carried(&clip, &target, &Options::default()).report;
            // Arms and legs point exactly where the source's do.
            assert!(
                loose.worst_direction_rad().to_degrees() < 1e-3,
                "{capture} on {figure}: {:?}",
                loose.directions
            );
            let held = carried(&clip, &target, &Options { plant_feet: true, ..Options::default() });
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

/// A clip of a figure that stands and moves its arms and trunk.
fn standing(skeleton: &Arc<Skeleton>, build: &Build) -> Clip {
    let mut clip = sway(skeleton, 60, 0.0);
    let legs: Vec<usize> = Side::BOTH
        .iter()
        .flat_map(|&side| [Role::UpperLeg(side), Role::LowerLeg(side), Role::Foot(side), Role::Toes(side)])
        .map(|role| build.at(role))
        .chain([build.at(Role::Hips)])
        .collect();
    for joint in legs {
        clip.joints[joint] = Arc::default();
    }
    clip
}

fn point_place(clip: &Clip, point: JointPoint, frame: usize) -> DVec3 {
    clip.world_at(clip.grid.time(frame))[point.joint].scene_from_joint.transform_point3(point.offset)
}

#[test]
fn a_single_pose_is_that_of_the_whole_transfer() {
    let clip = Arc::new(sway(&Arc::new(person(&B).skeleton()), 20, 1.0));
    let (source, target) = (
        Figure::new(&clip.skeleton),
        Figure::new(&Arc::new(person(&D).map_places(|p| DVec3::new(1.2 * p.x, 0.8 * p.y, p.z)).skeleton())),
    );
    let map = JointMap::automatic(&source, &target);
    let whole = retarget(&clip, &source, &target, &map, &Options::bare()).expect("it is mapped").clip;
    let transfer = Transfer::new(&clip, &source, &target, &map).expect("it is mapped");
    for frame in 0..20 {
        let secs = clip.grid.time(frame);
        for (own, its) in transfer.pose_at(secs).iter().zip(whole.local_at(secs)) {
            assert!(own.rotation.turn_to(its.rotation) < 1e-12);
            assert!(own.translation.distance(its.translation) < 1e-12);
        }
    }
}

#[test]
fn hands_are_held_at_points_and_at_each_other() {
    let build = person(&A);
    let skeleton = Arc::new(build.skeleton());
    let clip = standing(&skeleton, &build);
    let stocky = person(&B).map_places(|p| DVec3::new(1.1 * p.x, 0.9 * p.y, p.z));
    let target = Arc::new(stocky.skeleton());
    let loose = carried(&clip, &target, &Options::default());
    let figures = [Figure::new(&skeleton), Figure::new(&target)];
    let palms = |figure: &Figure| Side::BOTH.map(|side| palm(figure, side).expect("a hand"));
    let [left, right] = palms(&figures[1]);
    // Halfway from the wrist at 0.71 m to the end of the hand at 0.88, wider by a tenth.
    let wrist = stocky.places[stocky.at(Role::Hand(Side::Left))];
    let reach = figures[1].roles.shape.positions[left.joint].distance(wrist) + left.offset.length();
    assert!((reach - 1.1 * 0.085).abs() < 1e-3, "{reach}");
    let point = point_place(&loose.clip, left, 25) + DVec3::new(-0.1, 0.05, 0.02);
    let hold = HandHold { side: Side::Left, span_secs: [0.5, 1.0], at: HoldAt::Place(point) };
    let hands = vec![hold];
    let held = carried(&clip, &target, &Options { hands, ..Options::default() });
    for frame in 15..=30 {
        assert!(point_place(&held.clip, left, frame).distance(point) < 1e-6, "frame {frame}");
        // The hand keeps its turn, and the other one all it has.
        let secs = clip.grid.time(frame);
        let [own, its] = [&loose.clip, &held.clip].map(|clip| clip.world_at(secs));
        assert!(own[left.joint].rotation.turn_to(its[left.joint].rotation) < 1e-9);
        assert_eq!(own[right.joint], its[right.joint]);
    }
    assert!(held.report.missed.is_empty(), "{:?}", held.report.missed);
    assert!(held.report.largest_correction.is_some());
    // No jump: from frame to frame the held hand never moves much faster than the loose one.
    let fastest = |clip: &Clip| {
        let step = |frame| point_place(clip, left, frame).distance(point_place(clip, left, frame + 1));
        (0..59).map(step).fold(0.0, f64::max)
    };
    assert!(fastest(&held.clip) < 2.5 * fastest(&loose.clip) + 0.01);

    // Out of reach: told, with frame and size.
    let far = HandHold { at: HoldAt::Place(point + DVec3::X * 2.0), ..hold };
    let missed = carried(&clip, &target, &Options { hands: vec![far], ..Options::default() });
    let [own] = missed.report.missed.as_slice() else { panic!("{:?}", missed.report.missed) };
    let off = point_place(&missed.clip, left, own.frame).distance(point + DVec3::X * 2.0);
    assert!(
        (own.by - off).abs() < 1e-9 && own.joint == left.joint && (15..=30).contains(&own.frame),
        "{own:?}"
    );

    // At each other: as far apart, and in the direction, as in the source, scaled by the legs.
    let both = HandHold { side: Side::Left, span_secs: [0.5, 1.0], at: HoldAt::OtherHand };
    let held = carried(&clip, &target, &Options { hands: vec![both], ..Options::default() });
    let own = palms(&figures[0]);
    for frame in 15..=30 {
        let apart =
            |clip: &Clip, [a, b]: [JointPoint; 2]| point_place(clip, b, frame) - point_place(clip, a, frame);
        let wanted = apart(&clip, own) * held.report.scale;
        let is_told = !held.report.missed.is_empty();
        assert!(apart(&held.clip, [left, right]).distance(wanted) < 1e-6 || is_told, "frame {frame}");
    }
    assert!(held.report.missed.is_empty(), "{:?}", held.report.missed);
}

#[test]
fn limits_are_kept_after_all_else_and_what_they_cost_is_told() {
    let build = person(&A);
    let skeleton = Arc::new(build.skeleton());
    let mut clip = standing(&skeleton, &build);
    // Both knees bend by 60 degrees and the hips go down with them, so that the feet stand.
    let legs = |build: &Build, side| [Role::UpperLeg(side), Role::LowerLeg(side)].map(|role| build.at(role));
    let times = Times::Even { step_secs: 1.0 / 30.0, count: 60 };
    for side in Side::BOTH {
        for (joint, angle) in legs(&build, side).into_iter().zip([-30.0_f64, 60.0]) {
            let turn = Rotor::from_plane_angles(Bivector::from_axis(DVec3::X * angle.to_radians()));
            let track = RotationTrack::from_rotors(times.clone(), vec![turn; 60]);
            clip = clip.with_rotation(joint, track);
        }
    }
    let target_build = person(&B).map_places(|p| DVec3::new(1.1 * p.x, 0.9 * p.y, p.z));
    let target = Arc::new(target_build.skeleton());
    let knee = legs(&target_build, Side::Left)[1];
    // A knee that bends by 40 degrees at most.
    let hinge = Range {
        swing: SwingLimit::Hinge { bend: Interval::from_degrees(-5.0, 40.0), give_rad: 0.3 },
        twist: Interval::FREE,
    };
    let limit = JointLimit::new(target.joints()[knee].rest.rotation, DVec3::Y, DVec3::X, hinge);
    let limits = Arc::new(Limits { title: "stiff".to_owned(), joints: [(knee, limit)].into() });
    let feet = vec![FootContact { side: Side::Left, part: FootPart::Heel, span_secs: [0.2, 1.5] }];
    let options = Options {
        plant_feet: true,
        feet: Some(feet),
        limits: Some(KeptLimits::Given(Arc::clone(&limits))),
        ..Options::default()
    };
    let made = carried(&clip, &target, &options);
    let own = limits.keeping(&made.clip);
    assert!(own.iter().all(|own| own.beyond_limit == 0), "{own:?}");
    let [told] = made.report.limits.as_slice() else { panic!("{:?}", made.report.limits) };
    assert_eq!((told.joint, told.beyond), (knee, 0));
    assert!(told.beyond_before > 30 && told.most_beyond_before_rad > 0.2, "{told:?}");
    assert_eq!(made.report.limits_title, "stiff");
    assert!(made.report.largest_clamp.is_some_and(|own| own.joint == knee && own.by_rad > 0.2));
    // The hips give way, so that the foot stands all the same, at the very place where it stood.
    let missed = &made.report.missed;
    assert!(missed.is_empty(), "{missed:?}");
    let leg = Figure::new(&target).roles.shape.leg_length;
    let drift = made.report.drift.expect("a foot is planted");
    assert!(drift[1] < 2e-3 * leg, "{drift:?}");

    // A foot that no knee within 40 degrees could leave where it is, since the other leg holds the hips: listed, with size and frame.
    let narrow = |side: Side, span_secs| FootContact { side, part: FootPart::Heel, span_secs };
    let both = vec![narrow(Side::Left, [0.2, 1.5]), narrow(Side::Right, [0.2, 1.5])];
    let straight = target_build.at(Role::LowerLeg(Side::Right));
    let stiff = Range { swing: SwingLimit::Cone { half_rad: 0.01 }, twist: Interval::FREE };
    let bent_on = Rotor::from_plane_angles(Bivector::from_axis(DVec3::X * 1.3));
    let mut two = (*limits).clone();
    two.joints.insert(
        straight,
        JointLimit::new(target.joints()[straight].rest.rotation * bent_on, DVec3::Y, DVec3::X, stiff),
    );
    let options =
        Options { feet: Some(both), limits: Some(KeptLimits::Given(Arc::new(two.clone()))), ..options };
    let made = carried(&clip, &target, &options);
    assert!(two.keeping(&made.clip).iter().all(|own| own.beyond_limit == 0));
    let missed = &made.report.missed;
    assert!(missed.iter().any(|own| own.what.contains("limits") && own.by > 0.01), "{missed:?}");

    // Limits of the source's own knee reach the target's by the joint map, whatever axes its joints have.
    let turned = Arc::new(
        target_build.skeleton_with(|joint| Rotor::from_plane_angles(Bivector::new(joint as f64, 0.3, -0.7))),
    );
    let knees = [legs(&build, Side::Left)[1], knee];
    let limit = JointLimit::new(skeleton.joints()[knees[0]].rest.rotation, DVec3::Y, DVec3::X, hinge);
    let own = Limits { title: "own".to_owned(), joints: [(knees[0], limit)].into() };
    let options = Options { limits: Some(KeptLimits::OfSource(Arc::new(own))), ..Options::default() };
    let loose = carried(&clip, &turned, &Options { limits: None, ..options.clone() });
    let made = carried(&clip, &turned, &options);
    let [told] = made.report.limits.as_slice() else { panic!("{:?}", made.report.limits) };
    assert_eq!((told.joint, told.beyond), (knee, 0));
    // As far beyond as the source's knee was: 60 degrees of 40.
    assert!((told.most_beyond_before_rad - 20.0_f64.to_radians()).abs() < 1e-6, "{told:?}");
    let bend = |clip: &Clip| {
        let [hip, knee, ankle] =
            [Role::UpperLeg(Side::Left), Role::LowerLeg(Side::Left), Role::Foot(Side::Left)]
                .map(|role| clip.world_at(0.5)[target_build.at(role)].position());
        (knee - hip).angle_between(ankle - knee).to_degrees()
    };
    // The limb is bent by some degrees at rest, which the limit does not count.
    let bends = [bend(&loose.clip), bend(&made.clip)];
    assert!(bends[0] - bends[1] > 20.0, "{bends:?}");

    // The preset for adults: within it too.
    let options = Options { limits: Some(KeptLimits::Adult), ..Options::default() };
    let made = carried(&sway(&skeleton, 40, 1.0), &target, &options);
    assert!(made.report.limits.len() > 8 && made.report.limits.iter().all(|own| own.beyond == 0));
}

#[test]
fn contacts_are_found_given_written_and_read() {
    let Some(path) = shared("data/bvh/cmu_02_01_walk.bvh") else { return };
    let source = exchange::open(&path, &exchange::OpenOptions::default()).expect("it opens");
    let clip = &source.clips[0];
    let figure = Figure::new(&clip.skeleton);
    let target = Arc::new(person(&B).map_places(|p| p * 20.0).skeleton());
    let found = find_contacts(clip, &figure);
    assert!(found.len() > 4);
    let options = |feet| Options { plant_feet: true, feet, ..Options::default() };
    let by_itself = carried(clip, &target, &options(None));
    let said = carried(clip, &target, &options(Some(found.clone())));
    assert_eq!(by_itself, said, "the same whether found or given");
    // One fewer: that foot is free there.
    let fewer = carried(clip, &target, &options(Some(found[1..].to_vec())));
    assert_eq!(fewer.report.n_plants + 1, said.report.n_plants);
    assert_ne!(fewer.clip, said.clip);
    let beyond = FootContact { span_secs: [100.0, 101.0], ..found[0] };
    let told = carried(clip, &target, &options(Some(vec![beyond])));
    assert!(
        told.report.notes.iter().any(|note| note.contains("outside the clip")),
        "{:?}",
        told.report.notes
    );

    let hands = vec![
        HandHold { side: Side::Right, span_secs: [0.25, 0.5], at: HoldAt::Place(DVec3::new(0.1, -2.0, 3.5)) },
        HandHold { side: Side::Left, span_secs: [1.0, 1.5], at: HoldAt::OtherHand },
        HandHold { side: Side::Left, span_secs: [2.0, 2.5], at: HoldAt::Still },
    ];
    for feet in [Some(found), Some(vec![]), None] {
        let all = Contacts { feet, hands: hands.clone() };
        assert_eq!(read_contacts(&write_contacts(&all)), Ok(all));
    }
    let wrong = |text: &str, line, expected: &str| {
        let error = read_contacts(text).expect_err("it is wrong");
        assert_eq!((error.line, error.expected), (line, expected));
    };
    wrong("", 1, "the heading side,part,first_s,last_s,at");
    wrong("side,part,first_s,last_s\nleft,knee,0,1\n", 2, "heel, ball or hand");
    wrong("side,part,first_s,last_s\nleft,heel,2,1\n", 2, "a last second that is not before the first");
    wrong("side,part,first_s,last_s\nleft,heel,0,NaN\n", 2, "a time in seconds");
}

#[test]
fn any_pose_can_count_as_rest() {
    // Frame 0 of the source is bent anyhow; with it as rest of both figures the target stands in its own rest at frame 0.
    let skeleton = Arc::new(person(&A).skeleton());
    let clip = sway(&skeleton, 20, 1.0);
    let build = arms_down(person(&B), 60.0).map_places(|p| DVec3::new(1.1 * p.x, 0.9 * p.y, p.z));
    let target = Figure::new(&Arc::new(build.skeleton()));
    let at_frame = RestPick { frame_secs: Some(0.0), is_straightened: false };
    let source = at_frame.figure(&skeleton, Some(&clip), None);
    assert_eq!(source.rest, clip.local_at(0.0));
    assert_eq!(at_frame.figure(&skeleton, None, None).rest, skeleton.rest_pose(), "without a clip its own");

    // Straightened: arms level, legs down, whatever they were before, and limbs still point as in the source.
    let straight = RestPick { frame_secs: None, is_straightened: true };
    let figure = straight.figure(&target.skeleton, None, None);
    let shape = &figure.roles.shape;
    for side in Side::BOTH {
        let out = if side == Side::Left { shape.left } else { -shape.left };
        for role in [Role::UpperArm(side), Role::LowerArm(side)] {
            let joint = figure.roles.joint(role).expect("an arm");
            let off = shape.limb_direction(joint).expect("it points").angle_between(out).to_degrees();
            assert!(off < 0.5, "{role:?} {off}");
        }
    }
    let source = Figure::new(&skeleton);
    let map = JointMap::automatic(&source, &figure);
    let made = retarget(&clip, &source, &figure, &map, &Options::default()).expect("it is mapped");
    assert!(made.report.worst_direction_rad() < 1e-6);
}

#[test]
fn contacts_do_not_hang_on_the_pose_that_counts_as_rest() {
    for file in ["cmu_05_06_dance.bvh", "cmu_02_01_walk.bvh"] {
        let Some(path) = shared(&format!("data/bvh/{file}")) else { return };
        let source = exchange::open(&path, &exchange::OpenOptions::default()).expect("it opens");
        let clip = &source.clips[0];
        let own = Figure::new(&clip.skeleton);
        let usual = find_contacts(clip, &own);
        assert!(usual.len() > 4, "{file}: {usual:?}");
        for share in [0.1, 0.25, 0.4, 0.5, 0.6, 0.75, 0.9] {
            let secs = clip.duration_secs * share;
            let pick = RestPick { frame_secs: Some(secs), is_straightened: false };
            let figure = pick.figure(&clip.skeleton, Some(clip), None);
            assert_eq!(figure.roles.shape.up, own.roles.shape.up, "{file} at {secs}");
            assert!(figure.roles.iter().eq(own.roles.iter()), "{file} at {secs}: joints stay what they are");
            assert_eq!(find_contacts(clip, &figure), usual, "{file} at {secs}");
            let straight =
                RestPick { is_straightened: true, ..pick }.figure(&clip.skeleton, Some(clip), None);
            assert_eq!(find_contacts(clip, &straight), usual, "{file} straightened at {secs}");
        }
    }
}

#[test]
fn units_and_up_axes_are_recognised() {
    let clip = sway(&Arc::new(person(&B).skeleton()), 20, 1.0);
    let plain_target = person(&D).map_places(|p| DVec3::new(1.2 * p.x, 0.8 * p.y, p.z));
    let expected = carried(&clip, &Arc::new(plain_target.skeleton()), &Options::default());
    let upright: fn(DVec3) -> DVec3 = |p| p;
    let z_up: fn(DVec3) -> DVec3 = |p| DVec3::new(p.x, -p.z, p.y);
    for (factor, unit, axes) in [
        (100.0, "centimetres", upright),
        (1.0, "", z_up),
        (100.0, "centimetres", z_up),
        (1000.0, "millimetres", upright),
    ] {
        let target = plain_target.clone().map_places(|p| axes(p) * factor);
        let found = carried(&clip, &Arc::new(target.skeleton()), &Options::default());
        assert!((found.report.scale - expected.report.scale * factor).abs() < 1e-9 * factor);
        let said = found.report.notes.iter().any(|note| note.contains(unit) && note.contains("metres"));
        assert!(unit.is_empty() || said, "{:?}", found.report.notes);
        for frame in 0..20 {
            let [own, its] = [&expected.clip, &found.clip].map(|clip| clip.world_at(clip.grid.time(frame)));
            for (own, its) in own.iter().zip(&its) {
                let place = axes(own.position()) * factor;
                assert!(place.distance(its.position()) < 1e-6 * factor, "{place} {}", its.position());
            }
        }
    }
}

/// Two figures side by side in one file.
fn two_figures(first: &Skeleton, second: &Skeleton) -> (Arc<Skeleton>, usize) {
    let count = first.len();
    let moved = second.joints().iter().map(|joint| Joint {
        name: format!("{}_b", joint.name),
        number: joint.number + 500,
        parent: joint.parent.map(|up| up + count),
        rest: Transform {
            translation: joint.rest.translation
                + if joint.parent.is_none() { DVec3::X * 3.0 } else { DVec3::ZERO },
            ..joint.rest
        },
        ..joint.clone()
    });
    let joints: Vec<Joint> = first.joints().iter().cloned().chain(moved).collect();
    (Arc::new(Skeleton::new(joints).expect("parents stand first")), count)
}

#[test]
fn of_two_figures_in_a_file_either_can_be_chosen() {
    let clip = sway(&Arc::new(person(&B).skeleton()), 12, 1.0);
    let second = person(&D).map_places(|p| DVec3::new(1.2 * p.x, 0.8 * p.y, p.z));
    let (both, count) = two_figures(&person(&A).skeleton(), &second.skeleton());
    let source = Figure::new(&clip.skeleton);
    let by_itself = Figure::new(&both);
    let others = by_itself.roles.other_figures.clone();
    assert_eq!(others.len(), 1, "{:?}", by_itself.roles.doubts);
    let first_root = if others[0] == count { 0 } else { count };
    for root in [first_root, others[0]] {
        let target = Figure::below(&both, both.rest_pose(), Some(root));
        let map = JointMap::automatic(&source, &target);
        let made = retarget(&clip, &source, &target, &map, &Options::default()).expect("it is mapped");
        assert!(made.report.worst_direction_rad() < 1e-6);
        let own = if root == count { count..both.len() } else { 0..count };
        for (joint, tracks) in made.clip.joints.iter().enumerate() {
            assert!(own.contains(&joint) || tracks.rotation.is_none(), "{}", both.label(joint));
        }
        assert!(made.report.driven[0] > 15);
        // The other figure in the file changes nothing of it.
        if root == count {
            let alone = plain(&clip, &Arc::new(second.skeleton()));
            for frame in 0..12 {
                let [all, alone] = [&made.clip, &alone].map(|clip| clip.world_at(clip.grid.time(frame)));
                for (own, its) in all[count..].iter().zip(&alone) {
                    assert!(own.rotation.turn_to(its.rotation) < 1e-9);
                    assert!((own.position() - DVec3::X * 3.0).distance(its.position()) < 1e-9);
                }
            }
        }
    }
}

#[test]
fn a_long_foot_does_not_dip_below_the_floor_between_plants() {
    let Some(path) = shared("data/bvh/cmu_02_01_walk.bvh") else { return };
    let source = exchange::open(&path, &exchange::OpenOptions::default()).expect("it opens");
    let clip = &source.clips[0];
    // Feet twice as long.
    let build = person(&B);
    let ankles = Side::BOTH.map(|side| build.places[build.at(Role::Foot(side))]);
    let long = build.map_places(|p| {
        let ankle = ankles[usize::from(p.x < 0.0)];
        if p.y < ankle.y && p.z > ankle.z { DVec3::new(p.x, p.y, ankle.z + 2.0 * (p.z - ankle.z)) } else { p }
    });
    let target = Arc::new(long.skeleton());
    let made = carried(clip, &target, &Options { plant_feet: true, ..Options::default() });
    let leg = Figure::new(&target).roles.shape.leg_length;
    let [before, after] = made.report.deepest_dip.expect("feet were found");
    // The capture's frame 0 is a T-pose, out of which the first step jumps.
    assert!(before > 0.04 * leg && after < 0.02 * leg, "{before} {after} for a leg of {leg}");
    // What is less than a thousandth of the leg is not listed.
    assert!(made.report.missed.iter().all(|missed| missed.by > 1e-3 * leg), "{:?}", made.report.missed);
}

#[test]
fn a_map_is_kept_for_its_two_skeletons() {
    let folder = tempfile::tempdir().expect("a folder");
    let source = Figure::new(&Arc::new(person(&B).skeleton()));
    let target = Figure::new(&Arc::new(person(&D).map_places(|p| p * DVec3::new(1.0, 0.9, 1.0)).skeleton()));
    let mut map = JointMap::automatic(&source, &target);
    assert!(joint_maps::kept(folder.path(), &source, &target).expect("it looks").is_none());
    let find = |figure: &Figure, name: &str| figure.skeleton.find(name).expect("it is there");
    let row = MapRow { source: Some(find(&source, "lwrist")), target: Some(find(&target, "Head")) };
    map.correct(&[row]);
    let path = joint_maps::keep(folder.path(), &map, &source, &target).expect("it writes");
    let (kept, rows) =
        joint_maps::kept(folder.path(), &source, &target).expect("it reads").expect("it is kept");
    assert_eq!(kept, path);
    let mut again = JointMap::automatic(&source, &target);
    again.correct(&rows);
    let pairs = |map: &JointMap| map.links.iter().map(|link| (link.source, link.target)).collect::<Vec<_>>();
    assert_eq!(pairs(&again), pairs(&map));
    // Another size is the same skeleton, other names are not.
    let large = Figure::new(&Arc::new(person(&B).map_places(|p| p * 100.0).skeleton()));
    assert!(joint_maps::kept(folder.path(), &large, &target).expect("it looks").is_some());
    let other = Figure::new(&Arc::new(person(&A).skeleton()));
    assert!(joint_maps::kept(folder.path(), &other, &target).expect("it looks").is_none());
    disk::write(&path, b"nonsense").expect("it writes");
    assert!(
        joint_maps::kept(folder.path(), &source, &target)
            .expect_err("it is damaged")
            .to_string()
            .contains("heading")
    );
}

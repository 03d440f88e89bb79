//! Two clips become one: what each form of blend promises, on the outside clips and on worked examples.

#![expect(clippy::unwrap_used, reason = "the helpers of a test fail as the test does")]

use std::path::Path;
use std::sync::Arc;

use glam::DVec3;
use turnwright::blend::{
    self, BlendError, GroundMove, JoinPlace, LoopPart, Mask, MixAlong, MixHow, Reference, RootFrom, Side,
    add, align, best_loops, fit, join, join_distances, join_on_feet, mix, mix_aligned, mix_by, mix_many,
    moved, repeat, stride, with_first_again,
};
use turnwright::clip::{
    Clip, ContactOptions, FrameGrid, JointTracks, RotationTrack, Times, VectorTrack, contacts, slides,
    standing_feet,
};
use turnwright::exchange::{self, OpenOptions, ron};
use turnwright::rotor::{Axis, Bivector, Rotor};
use turnwright::scene::{
    BlendForm, BlendPass, ClipRef, ClipWork, Closing, Document, LoopPass, NoOthers, Pass, PassId, PassKind,
    SourceRef,
};
use turnwright::skeleton::{Joint, Skeleton};

use crate::support::{assert_close, largest, numbers, shared, shared_json};

fn clips(path: &str) -> Option<Vec<Arc<Clip>>> {
    Some(exchange::open(&shared(path)?, &OpenOptions::default()).unwrap().clips)
}

fn clip(path: &str, name: &str) -> Option<Arc<Clip>> {
    let found = clips(path)?.into_iter().find(|clip| clip.name == name);
    // A file that is there has the clip, or nothing would be tested.
    assert!(found.is_some(), "no clip `{name}` in {path}");
    found
}

/// The pairs that every form of blend meets: a walk and a run of an animal, two takes of one maker, game clips.
fn pairs() -> Vec<(&'static str, Arc<Clip>, Arc<Clip>)> {
    let mut pairs = Vec::new();
    let fox = |name| clip("data/gltf/Fox.glb", name);
    if let (Some(walk), Some(run)) = (fox("Walk"), fox("Run")) {
        pairs.push(("fox", walk, run));
    }
    let bvh = |name: &str| clips(&format!("data/bvh/{name}.bvh")).map(|clips| clips[0].clone());
    if let (Some(walk), Some(dance)) = (bvh("cmu_02_01_walk"), bvh("cmu_05_06_dance")) {
        pairs.push(("captures", walk, dance));
    }
    let biped = |name| clip("data/gltf/biped23_movement_clips.glb", name);
    if let (Some(walk), Some(run)) = (biped("Rig_Medium|Walking_A"), biped("Rig_Medium|Running_A")) {
        pairs.push(("biped", walk, run));
    }
    pairs
        .into_iter()
        .map(|(name, a, b)| {
            let b = fit(&b, &a.skeleton).unwrap();
            (name, a, b)
        })
        .collect()
}

/// A skeleton of one root with a limb, and a clip of it from turns and places of the root.
fn one_root(turns: &[Rotor], places: &[DVec3]) -> Clip {
    let skeleton = Skeleton::new(vec![
        Joint::placed("root", 0, None, DVec3::ZERO),
        Joint::placed("left", 1, Some(0), DVec3::new(0.3, 1.0, 0.1)),
        Joint::placed("right", 2, Some(0), DVec3::new(-0.3, 0.8, 0.0)),
    ])
    .unwrap();
    let times = Times::Even { step_secs: 1.0 / 30.0, count: turns.len() };
    let root = JointTracks {
        rotation: Some(RotationTrack::from_rotors(times.clone(), turns.to_vec())),
        translation: Some(VectorTrack::straight(times.clone(), places.to_vec())),
        scale: None,
    };
    Clip {
        name: "one".to_owned(),
        skeleton: Arc::new(skeleton),
        joints: vec![Arc::new(root), Arc::default(), Arc::default()],
        duration_secs: times.at(turns.len() - 1),
        grid: FrameGrid { times, rate: 30.0 },
    }
}

fn rotor(json: &serde_json::Value) -> Rotor {
    let [x, y, z, w] = numbers::<4>(json);
    Rotor::from_xyzw([x, y, z, w])
}

#[test]
fn worked_examples_of_slerp_layers_and_means() {
    // reference/method_checks.json, computed with scipy: `slerp_nlerp`, `additive`, `weighted_mean`.
    let Some(checks) = shared_json("reference/method_checks.json") else { return };
    let still = |turn: Rotor| one_root(&[turn; 2], &[DVec3::ZERO; 2]);
    let mask = Mask::all(&still(Rotor::IDENTITY).skeleton);
    let turn = |clip: &Clip| clip.rotation(0).unwrap().at(0.0);

    let q0 = Rotor::from_plane_angles(
        Bivector::from_axis(DVec3::new(1.0, 2.0, 3.0).normalize()) * 20_f64.to_radians(),
    );
    let q1 = Rotor::from_plane_angles(
        Bivector::from_axis(DVec3::new(-1.0, 0.5, 2.0).normalize()) * 140_f64.to_radians(),
    );
    let quarter = mix(&still(q0), &still(q1), &MixAlong::constant(0.25), &mask).unwrap();
    let expected =
        Rotor::from_xyzw([-0.086_824_845_208, 0.139_091_777_710, 0.365_008_400_627, 0.916_451_739_646]);
    assert_close!(turn(&quarter), expected, 2e-12);

    let case = &checks["additive"];
    let [reference, layer, base] = ["ref", "clip", "base"].map(|name| rotor(&case[name]));
    let moving = one_root(&[reference, layer], &[DVec3::ZERO; 2]);
    for (side, name) in [(Side::Body, "body_result"), (Side::Parent, "parent_result")] {
        let laid = add(&still(base), &moving, 0.5, Reference::First, side, &mask).unwrap();
        assert_close!(laid.rotation(0).unwrap().keys[1], rotor(&case[name]), 1e-12);
        assert_eq!(laid.rotation(0).unwrap().keys[0], base);
    }

    let case = &checks["weighted_mean"];
    let turns: Vec<Rotor> = case["quats"].as_array().unwrap().iter().map(rotor).collect();
    let weights = numbers::<3>(&case["weights"]);
    let stills: Vec<Clip> = turns.iter().map(|&turn| still(turn)).collect();
    let weighted: Vec<(&Clip, f64)> = stills.iter().zip(weights).collect();
    assert_close!(turn(&mix_many(&weighted, &mask).unwrap()), rotor(&case["karcher_mean"]), 1e-12);
}

#[test]
fn weights_at_their_ends_give_the_clips_themselves() {
    for (name, a, b) in pairs() {
        let mask = Mask::all(&a.skeleton);
        let none = mix(&a, &b, &MixAlong::constant(0.0), &mask).unwrap();
        let both = mix(&a, &a, &MixAlong::constant(0.4), &mask).unwrap();
        assert_eq!(both.joints, a.joints, "{name}: a clip with itself");
        assert_eq!(add(&a, &b, 0.0, Reference::First, Side::Body, &mask).unwrap().joints, a.joints, "{name}");
        let full = mix(&a, &b, &MixAlong::constant(1.0), &mask).unwrap();
        let half = mix(&a, &b, &MixAlong::constant(0.3), &mask).unwrap();
        let other = mix(&b, &a, &MixAlong::constant(0.3), &mask).unwrap();
        let same_frames = a.grid.times.at(1) == b.grid.times.at(1);
        let seven = mix(&b, &a, &MixAlong::constant(0.7), &mask).unwrap();
        for joint in 0..a.joints.len() {
            let bits = none.rotation(joint).zip(a.rotation(joint));
            if let Some((own, first)) = bits {
                let count = own.keys.len().min(first.keys.len());
                // A cut glTF clip ends with a key of its own.
                assert_eq!(own.keys[..count - 1], first.keys[..count - 1], "{name} {joint}");
            }
            // The last frame of a glTF clip lies a rounding beyond its end.
            let end = a.duration_secs.min(b.duration_secs) - 1e-6;
            for secs in full.grid.times.iter().filter(|&secs| secs < end) {
                let turns = |clip: &Clip| clip.rotations_at(joint, &[secs])[0];
                assert_close!(turns(&full), turns(&b), 1e-11, "{name} {joint} at {secs}");
                if same_frames {
                    assert_close!(turns(&half), turns(&seven), 1e-11, "{name} {joint} at {secs}");
                }
                let way = turns(&a).turn_to(turns(&b));
                assert_close!(turns(&a).turn_to(turns(&half)), 0.3 * way, 1e-9, "{name} {joint} at {secs}");
            }
            for secs in other.grid.times.iter().filter(|&secs| secs < end) {
                let turns = |clip: &Clip| clip.rotations_at(joint, &[secs])[0];
                let way = turns(&a).turn_to(turns(&b));
                assert_close!(turns(&b).turn_to(turns(&other)), 0.3 * way, 1e-9, "{name} {joint} at {secs}");
            }
        }
    }
}

#[test]
fn an_aligned_mix_ends_in_both_clips() {
    for (name, a, b) in pairs() {
        let along = match align(&a, &b) {
            Ok(along) => along,
            Err(error) => panic!("{name}: {error}"),
        };
        for secs in [&along.first_secs, &along.second_secs] {
            assert!(secs.windows(2).all(|pair| pair[0] < pair[1]), "{name}: strictly rising {secs:?}");
        }
        let mask = Mask::all(&a.skeleton);
        let at = |weight| {
            let weight = MixAlong::constant(weight);
            let how = MixHow { weight, mask: mask.clone(), root: RootFrom::Both, holds_feet: true };
            mix_aligned(&a, &b, &along, &how).unwrap()
        };
        assert_eq!(at(0.0), *a, "{name}");
        let (half, full) = (at(0.5), at(1.0));
        let between = f64::midpoint(a.duration_secs, b.duration_secs);
        assert!((half.duration_secs - between).abs() < 1.0 / a.grid.rate, "{name}: {}", half.duration_secs);
        assert!((full.duration_secs - b.duration_secs).abs() < 1.0 / a.grid.rate, "{name}");
        // With the full weight it is the second clip, set down elsewhere: turns below the root are the same, and the root
        // moves as there.
        let secs: Vec<f64> = full.grid.times.iter().collect();
        let (own, other) = (full.worlds_at(&secs), b.worlds_at(&secs));
        let size = (0..a.skeleton.len())
            .map(|joint| own.position(joint, 0).distance(own.position(0, 0)))
            .fold(0.0, f64::max);
        let ends = [0, secs.len() - 1];
        let top = a.skeleton.listed().next().unwrap();
        for joint in a.skeleton.listed() {
            for (frame, _) in secs.iter().enumerate() {
                let relative = |worlds: &turnwright::clip::Worlds| {
                    worlds.position(joint, frame).distance(worlds.position(top, frame))
                };
                assert!(
                    (relative(&own) - relative(&other)).abs() < 1e-9 * size.max(1.0),
                    "{name} {joint} {frame}"
                );
            }
            let path = |worlds: &turnwright::clip::Worlds| {
                worlds.position(joint, ends[0]).distance(worlds.position(joint, ends[1]))
            };
            assert!(
                (path(&own) - path(&other)).abs() < 1e-6 * size.max(1.0),
                "{name} {joint}: {} {}",
                path(&own),
                path(&other)
            );
        }
    }
}

#[test]
fn a_clip_and_its_own_slowed_copy_are_aligned() {
    let Some(fox) = clip("data/gltf/Fox.glb", "Walk") else { return };
    // The same motion on a bent clock: at share s of its length the copy shows s + 0.08·sin 2πs.
    let count = fox.grid.count();
    let bent = |share: f64| share + 0.08 * (std::f64::consts::TAU * share).sin();
    let secs: Vec<f64> =
        (0..2 * count).map(|i| fox.duration_secs * bent(i as f64 / (2 * count - 1) as f64)).collect();
    let times = Times::Even { step_secs: fox.duration_secs / (count - 1) as f64, count: 2 * count };
    let joints = (0..fox.joints.len()).map(|joint| {
        let tracks = &fox.joints[joint];
        let rotation = tracks
            .rotation
            .as_ref()
            .map(|track| RotationTrack::from_rotors(times.clone(), track.at_all(&secs)));
        let translation = tracks.translation.as_ref().map(|track| {
            VectorTrack::straight(
                times.clone(),
                secs.iter().map(|&t| track.at(t).unwrap()).collect::<Vec<_>>(),
            )
        });
        Arc::new(JointTracks { rotation, translation, scale: None })
    });
    let joints = joints.collect();
    let slowed = Clip {
        joints,
        duration_secs: times.at(2 * count - 1),
        grid: FrameGrid { times, rate: fox.grid.rate },
        ..(*fox).clone()
    };
    // Turned and set down elsewhere: that must not matter.
    let slowed = moved(&slowed, GroundMove { turn_rad: 2.0, x: 300.0, z: -120.0 });
    let along = align(&fox, &slowed).unwrap();
    let worst = largest((0..=40).map(|step| {
        let stop = along.at(f64::from(step) / 40.0);
        let meant = fox.duration_secs * bent(stop.second_secs / slowed.duration_secs);
        (stop.first_secs - meant).abs()
    }));
    assert!(worst < 1.5 / fox.grid.rate, "off by {worst} s");
    let wrapped =
        |turn: f64| (turn + std::f64::consts::PI).rem_euclid(std::f64::consts::TAU) - std::f64::consts::PI;
    let turn = largest(along.turns_rad.iter().map(|&turn| wrapped(turn + 2.0).abs()));
    assert!(turn < 0.02, "{turn}");
}

#[test]
fn a_join_has_both_clips_and_no_jump() {
    for (name, a, b) in pairs() {
        let overlap = (0.4 * a.duration_secs.min(b.duration_secs)).min(0.5);
        let mask = Mask::all(&a.skeleton);
        let joined = join(&a, &b, JoinPlace::end_to_start(&a, overlap), &mask).unwrap();
        let length = a.duration_secs + b.duration_secs - overlap;
        assert!((joined.duration_secs - length).abs() < 1.0 / a.grid.rate, "{name}");
        let start = a.duration_secs - overlap;
        let frames: Vec<f64> = joined.grid.times.iter().collect();
        for joint in 0..a.joints.len() {
            for &secs in &frames {
                let turns = |clip: &Clip, secs| clip.rotations_at(joint, &[secs])[0];
                if secs < start {
                    assert_close!(turns(&joined, secs), turns(&a, secs), 1e-12, "{name} {joint} at {secs}");
                } else if secs > start + overlap && a.skeleton.parent_joint(joint).is_some() {
                    assert_close!(
                        turns(&joined, secs),
                        turns(&b, secs - start),
                        1e-12,
                        "{name} {joint} at {secs}"
                    );
                }
            }
        }
        // Nothing moves faster than the faster of both, but for what the two are apart over the overlap.
        let fastest = |clip: &Clip| {
            let secs: Vec<f64> = clip.grid.times.iter().collect();
            let worlds = clip.worlds_at(&secs);
            largest(clip.skeleton.listed().flat_map(|joint| {
                let (worlds, secs) = (&worlds, &secs);
                (1..secs.len()).map(move |i| {
                    worlds.position(joint, i).distance(worlds.position(joint, i - 1))
                        / (secs[i] - secs[i - 1])
                })
            }))
        };
        let size =
            largest(a.skeleton.world(&a.skeleton.rest_pose()).iter().map(|joint| joint.position().length()));
        let most = fastest(&a).max(fastest(&b)) + 1.5 * size / overlap;
        assert!(fastest(&joined) < most, "{name}: {} against {most}", fastest(&joined));
    }
}

#[test]
fn a_clip_cut_in_two_is_joined_to_what_it_was() {
    let Some(walk) = clips("data/bvh/cmu_02_01_walk.bvh").map(|clips| clips[0].clone()) else { return };
    let step = walk.grid.times.at(1);
    let first = turnwright::clip::cut(&walk, 0.0, 220.0 * step);
    let second = turnwright::clip::cut(&walk, 160.0 * step, walk.duration_secs);
    let second = moved(&second, GroundMove { turn_rad: -1.2, x: 40.0, z: 15.0 });
    let joined =
        join(&first, &second, JoinPlace::end_to_start(&first, 60.0 * step), &Mask::all(&walk.skeleton))
            .unwrap();
    assert_eq!(joined.grid.count(), walk.grid.count());
    for frame in 0..walk.grid.count() {
        let (own, other) = (joined.world_at(joined.grid.time(frame)), walk.world_at(walk.grid.time(frame)));
        for (own, other) in own.iter().zip(&other) {
            assert_close!(own.position(), other.position(), 1e-8, "frame {frame}");
            assert_close!(own.rotation, other.rotation, 1e-9, "frame {frame}");
        }
    }
    // And the best place for the join is found where the cut was.
    let picture = join_distances(&first, &second, 60.0 * step, 400).unwrap();
    let (place, distance) = blend::best_places(&picture, 60.0 * step, 5)[0];
    assert!((place.first_secs - place.second_secs - 160.0 * step).abs() < 1.5 * step, "{place:?}");
    assert!(distance < 0.05, "{distance}");
}

#[test]
fn masks_leave_the_rest_alone() {
    let Some((_, a, b)) = pairs().into_iter().find(|(name, ..)| *name == "captures") else { return };
    let mask = Mask::joints(&a.skeleton, &["LeftArm", "LeftForeArm"]).unwrap();
    for made in [
        mix(&a, &b, &MixAlong::constant(0.6), &mask).unwrap(),
        add(&a, &b, 0.6, Reference::First, Side::Body, &mask).unwrap(),
    ] {
        for joint in a.skeleton.listed() {
            let is_meant = ["LeftArm", "LeftForeArm"].contains(&a.skeleton.label(joint));
            assert_eq!(!is_meant, made.same_joint(&a, joint), "{}", a.skeleton.label(joint));
        }
    }
    let error = |label: &str| Mask::joints(&a.skeleton, &[label]).unwrap_err().to_string();
    let near = error("left_arm");
    assert!(near.contains("such as `LeftArm`") && near.ends_with("found `left_arm`"), "{near}");
    let far = error("Tail");
    assert!(far.contains("such as `Hips`, ") && far.contains(" more, found `Tail`"), "{far}");
    let limb = Mask::limb(&a.skeleton, "LeftArm", 2).unwrap();
    let factor = |label: &str| limb.of(a.skeleton.find(label).unwrap());
    assert_eq!(
        (factor("LeftHand"), factor("LeftArm"), factor("RightArm"), factor("Hips")),
        (1.0, 1.0, 0.0, 0.0)
    );
    assert!(0.0 < factor("Spine1") && factor("Spine1") < factor("LeftShoulder"), "{limb:?}");
}

#[test]
fn bodies_that_are_not_one_are_told() {
    let (Some(fox), Some(walk)) = (clip("data/gltf/Fox.glb", "Walk"), clips("data/bvh/walk01.bvh")) else {
        return;
    };
    let error = fit(&walk[0], &fox.skeleton).unwrap_err();
    assert!(error.to_string().contains("retarget"), "{error}");
    let all = Mask::all(&fox.skeleton);
    let refused = |clip: &Clip, place: JoinPlace| join(clip, &fox, place, &all).unwrap_err().to_string();
    let error = refused(&fox, JoinPlace::end_to_start(&fox, 30.0));
    assert!(
        error.contains("an overlap above 0 and at most 0.708 s, the shorter clip, found 30 s"),
        "{error}"
    );
    // One that is short enough and lies beyond an end, and a clip that is one pose.
    let error = refused(&fox, JoinPlace { first_secs: 0.6, second_secs: 0.1, overlap_secs: 0.25 });
    assert!(error.contains("found it to begin at 0.6 s of 0.708 s of the first and at 0.1 s of"), "{error}");
    let pose = turnwright::clip::cut(&fox, 0.0, 0.0);
    let error = refused(&pose, JoinPlace::end_to_start(&pose, 0.1));
    assert!(error.contains("at least two frames each to join, found one frame in `Walk`"), "{error}");
}

/// Which way a clip's body goes along the ground between two times: the angle from +Z towards +X, degrees.
fn heading_deg(clip: &Clip, from_secs: f64, to_secs: f64) -> f64 {
    let body = clip.skeleton.listed().next().unwrap();
    let worlds = clip.worlds_at(&[from_secs, to_secs]);
    let way = worlds.position(body, 1) - worlds.position(body, 0);
    way.x.atan2(way.z).to_degrees()
}

#[test]
fn a_walk_goes_on_its_way_also_where_legs_are_out_of_step() {
    // Joined to itself from eleven moments of the stride: where the other foot is in front, places alone are nearest with the body turned
    // round. The way before and after is read off the places of the hips.
    let Some(walk) = clips("data/bvh/cmu_02_01_walk.bvh").map(|clips| clips[0].clone()) else { return };
    let mask = Mask::all(&walk.skeleton);
    let mut turned_round = 0;
    for begin in 0..11 {
        let second_secs = 0.02 + 0.12 * f64::from(begin);
        let place = JoinPlace { second_secs, ..JoinPlace::end_to_start(&walk, 0.2) };
        let joined = join(&walk, &walk, place, &mask).unwrap();
        let before = heading_deg(&joined, place.first_secs - 1.2, place.first_secs);
        let after = heading_deg(&joined, joined.duration_secs - 1.2, joined.duration_secs);
        let own = heading_deg(&walk, walk.duration_secs - 1.2, walk.duration_secs);
        let off = (after - before - (own - before)).abs();
        assert!(off < 20.0, "from {second_secs} s: {after} after {before} degrees");
        let landmarks = blend::Landmarks::of(&walk);
        let secs = |from: f64| (0..5).map(|step| from + 0.05 * f64::from(step)).collect::<Vec<f64>>();
        let cloud = |from: f64| blend::Cloud::of(&walk, &secs(from), &landmarks);
        let (own, other) = (cloud(place.first_secs), cloud(second_secs));
        turned_round += i32::from(own.fit(2, &other, 2, 2).1.turn_rad.abs() > 1.5);
    }
    assert!(turned_round > 0, "nothing is proved where places tell the heading too");
}

#[test]
fn a_table_without_a_hierarchy_is_moved_by_its_root_alone() {
    let Some(flip) = clips("data/csv/humanoid3d_backflip_quat.csv").map(|clips| clips[0].clone()) else {
        return;
    };
    let Some(wheel) = clips("data/csv/humanoid3d_cartwheel_quat.csv").map(|clips| clips[0].clone()) else {
        return;
    };
    let wheel = fit(&wheel, &flip.skeleton).unwrap();
    let place = JoinPlace::end_to_start(&flip, 0.3);
    let joined = join(&flip, &wheel, place, &Mask::all(&flip.skeleton)).unwrap();
    // On a frame of the result, where it has the second clip's turns as played.
    let at = joined.grid.time(joined.grid.frame(place.first_secs + 1.0));
    for joint in flip.skeleton.listed() {
        let [own, other] = [(&joined, at), (&*wheel, at - place.first_secs)]
            .map(|(clip, secs)| clip.rotations_at(joint, &[secs])[0]);
        let is_root = flip.skeleton.label(joint) == "root";
        let turn = own.turn_to(other);
        assert!(is_root || turn < 1e-6, "{} is turned by {turn}", flip.skeleton.label(joint));
        assert!(is_root || joined.joints[joint].translation.is_none(), "{}", flip.skeleton.label(joint));
    }
}

#[test]
fn a_mix_across_half_a_turn_is_told() {
    let Some((_, walk, dance)) = pairs().into_iter().find(|(name, ..)| *name == "captures") else { return };
    let mask = Mask::all(&walk.skeleton);
    let half = MixAlong::constant(0.5);
    let plain = mix(&walk, &dance, &half, &mask).unwrap();
    let jump = blend::worst_jump(&plain, &[&walk, &dance]).unwrap();
    // The dancer turns round, the walker does not: read off the clips' own numbers, the hips stand half a turn apart there.
    assert_eq!(walk.skeleton.label(jump.joint), "Hips");
    let [own, other] = [&walk, &dance].map(|clip| clip.rotations_at(jump.joint, &[jump.secs])[0]);
    assert!(own.turn_to(other).to_degrees() > 170.0, "{}", own.turn_to(other).to_degrees());
    assert!(jump.words(&walk.skeleton).contains("`Hips` turns by 17"), "{}", jump.words(&walk.skeleton));
    // In step both face alike.
    let how = MixHow { weight: half, mask, root: RootFrom::Both, holds_feet: true };
    let in_step = mix_aligned(&walk, &dance, &align(&walk, &dance).unwrap(), &how).unwrap();
    assert_eq!(blend::worst_jump(&in_step, &[&walk, &dance]), None);
}

#[test]
fn a_move_on_the_ground_moves_every_joint_alike() {
    for path in [
        "data/gltf/wolf.glb",
        "data/gltf/RiggedFigure.glb",
        "data/gltf/biped23_movement_clips.glb",
        "data/bvh/mixed_order_6ch.bvh",
    ] {
        let Some(all) = clips(path) else { return };
        let clip = &all[0];
        let place = GroundMove { turn_rad: 0.7, x: 3.0, z: -2.0 };
        let after = moved(clip, place);
        let secs = [0.0, 0.3 * clip.duration_secs, clip.duration_secs];
        let (own, other) = (after.worlds_at(&secs), clip.worlds_at(&secs));
        for joint in clip.skeleton.listed() {
            for frame in 0..3 {
                let expected = place.apply(other.position(joint, frame));
                let size = 1.0 + expected.length();
                assert_close!(own.position(joint, frame), expected, 1e-9 * size, "{path} {joint}");
                assert_close!(
                    own.rotation(joint, frame),
                    Axis::Y.rotor(0.7) * other.rotation(joint, frame),
                    1e-9,
                    "{path} {joint}"
                );
            }
        }
    }
}

/// The largest speed of any planted point of a foot along the ground in its contacts, in leg lengths a second.
fn fastest_slide(clip: &Clip) -> f64 {
    let options = ContactOptions::default();
    let feet = standing_feet(clip, options.up);
    let found = contacts(clip, &feet, &options);
    let rows = slides(clip, &feet, &found.spans, options.up);
    largest(rows.iter().map(|slide| slide.fastest)) / found.leg
}

#[test]
fn planted_feet_stay_planted_in_a_mix() {
    for (name, a, b) in pairs() {
        let along = align(&a, &b).unwrap();
        let how = MixHow {
            weight: MixAlong::constant(0.5),
            mask: Mask::all(&a.skeleton),
            root: RootFrom::Both,
            holds_feet: true,
        };
        let mixed = mix_aligned(&a, &b, &along, &how).unwrap();
        let most = fastest_slide(&a).max(fastest_slide(&b));
        let found = fastest_slide(&mixed);
        assert!(found <= 1.05 * most, "{name}: {found} leg lengths a second, in the clips {most}");
    }
}

#[test]
fn a_scene_keeps_a_blend() {
    let label = |_: usize, _: usize, joint: usize| format!("joint{joint}");
    let forms = [
        BlendForm::Join(JoinPlace { first_secs: 1.5, second_secs: 0.25, overlap_secs: 0.5 }),
        BlendForm::Mix {
            weight: MixAlong { knots: vec![[0.0, 0.0], [1.0, 0.75], [2.0, 1.0]] },
            is_aligned: true,
            root: RootFrom::First,
        },
        BlendForm::Add { weight: -1.5, reference: Reference::Mean, side: Side::Parent },
        BlendForm::Mean {
            weights: [2.0, 0.5],
            more: vec![(ClipRef { source: 0, clip: 5 }, 1.25), (ClipRef { source: 0, clip: 1 }, 0.0)],
            is_aligned: true,
        },
    ];
    let mut document = Document::default();
    document.sources.push(SourceRef {
        path: "/a/walk.bvh".into(),
        sha256: "0".repeat(64),
        reading: turnwright::scene::Reading::default(),
    });
    document.works.push(ClipWork::new(0, 0, "walk"));
    for (id, form) in forms.into_iter().enumerate() {
        let other = ClipRef { source: 0, clip: id };
        let joints = (id == 1).then(|| vec![(2, 0.5), (3, 1.0)]);
        let step = BlendPass { other, form, joints, holds_feet: id == 1 }.into();
        document.works[0].passes.push(Pass { id: PassId(id as u64), on: true, step });
    }
    for (id, close) in [(4, None), (5, Some(Closing::Window))] {
        let part_secs = close.map(|_| [0.5, 1.25]);
        let step = LoopPass { part_secs, close, rounds: 3 }.into();
        document.works[0].passes.push(Pass { id: PassId(id), on: true, step });
    }
    let text = ron::to_text(Path::new("/a/night.ron"), &document, &label).unwrap();
    let back = ron::from_text(Path::new("/a/night.ron"), &text).unwrap().document;
    assert_eq!(back.works[0].passes, document.works[0].passes, "{text}");
    // What an older program knows keeps its version.
    assert!(text.contains("turnwright_scene: 3,"), "{text}");
    document.works[0].passes.remove(3);
    let text = ron::to_text(Path::new("/a/night.ron"), &document, &label).unwrap();
    assert!(text.contains("turnwright_scene: 2,"), "{text}");
}

#[test]
fn a_repeated_walk_walks_on() {
    let Some(walk) = clip("data/gltf/biped23_movement_clips.glb", "Rig_Medium|Walking_A") else { return };
    // Given a stride, as a captured walk has it.
    let top = walk.skeleton.listed().next().unwrap();
    let count = walk.grid.count();
    let step = GroundMove { turn_rad: 0.3, x: 0.2, z: 0.9 };
    let times = Times::Even { step_secs: 1.0 / walk.grid.rate, count };
    let secs: Vec<f64> = times.iter().collect();
    let closes = walk.rotations_at(top, &secs)[0].turn_to(walk.rotations_at(top, &secs)[count - 1]);
    assert!(closes < 0.02, "the clip is a loop: {closes}");
    let walking = moved(&walk, step);
    let share = |frame: usize| frame as f64 / (count - 1) as f64;
    let strides = mix(
        &walk,
        &walking,
        &MixAlong { knots: vec![[0.0, 0.0], [walk.duration_secs, 1.0]] },
        &Mask::all(&walk.skeleton),
    )
    .unwrap();
    assert_eq!(share(count - 1), 1.0);
    let found = stride(&strides).unwrap();
    let thrice = repeat(&strides, 3).unwrap();
    assert_eq!(thrice.grid.count(), 3 * (strides.grid.count() - 1) + 1);
    let length = strides.grid.time(strides.grid.count() - 1);
    for joint in walk.skeleton.listed() {
        for frame in 0..strides.grid.count() - 1 {
            let secs = strides.grid.time(frame);
            let first = strides.world_at(secs)[joint].position();
            let second = thrice.world_at(secs + length)[joint].position();
            assert_close!(second, found.apply(first), 1e-6, "{joint} {frame}");
            let third = thrice.world_at(secs + 2.0 * length)[joint].position();
            assert_close!(third, found.apply(found.apply(first)), 1e-6, "{joint} {frame}");
        }
    }
    assert_eq!(repeat(&strides, 1).unwrap(), strides);
}

/// As [`fastest_slide`], of the contacts within some seconds: elsewhere the standing height of the whole tells other contacts than in
/// the clips by themselves.
fn slide_within(clip: &Clip, [from, to]: [f64; 2]) -> f64 {
    let options = ContactOptions::default();
    let feet = standing_feet(clip, options.up);
    let found = contacts(clip, &feet, &options);
    let inside = |mut span: turnwright::clip::PlantedSpan| {
        span.first_frame = span.first_frame.max(clip.grid.frame(from.max(0.0)));
        span.last_frame = span.last_frame.min(clip.grid.frame(to));
        (span.first_frame < span.last_frame).then_some(span)
    };
    let spans: Vec<_> = found.spans.iter().copied().filter_map(inside).collect();
    largest(slides(clip, &feet, &spans, options.up).iter().map(|slide| slide.fastest)) / found.leg
}

fn on_feet(a: &Clip, b: &Clip, weight: &MixAlong, mask: &Mask) -> Result<Clip, BlendError> {
    let how = MixHow { weight: weight.clone(), mask: mask.clone(), root: RootFrom::Both, holds_feet: true };
    mix_by(a, b, &how)
}

/// Two takes of walking people, and the pairs of before: where feet stand.
fn standing_pairs() -> Vec<(&'static str, Arc<Clip>, Arc<Clip>)> {
    let mut all = pairs();
    let walk = clips("data/bvh/cmu_02_01_walk.bvh").map(|clips| clips[0].clone());
    if let Some(walk) = walk {
        let step = walk.grid.times.at(1);
        let part = |from: f64, to: f64| Arc::new(turnwright::clip::cut(&walk, from * step, to * step));
        all.push(("a walk and its later part", part(1.0, 200.0), part(140.0, 343.0)));
    }
    all
}

#[test]
fn planted_feet_stay_planted_in_a_join() {
    for (name, a, b) in standing_pairs() {
        let mask = Mask::all(&a.skeleton);
        let overlap = (0.4 * a.duration_secs.min(b.duration_secs)).min(0.5);
        let picture = join_distances(&a, &b, overlap, 60).unwrap();
        let most = fastest_slide(&a).max(fastest_slide(&b));
        for (place, _) in blend::best_places(&picture, overlap, 2)
            .into_iter()
            .chain([(JoinPlace::end_to_start(&a, overlap), 0.0)])
        {
            let plain = join(&a, &b, place, &mask).unwrap();
            let held = join_on_feet(&a, &b, place, &mask).unwrap();
            let near = [place.first_secs - 0.2, place.first_secs + overlap + 0.2];
            let [before, after] = [&plain, &held].map(|clip| slide_within(clip, near));
            println!("{name} {place:?}: slide {before:.3} held {after:.3}, clips {most:.3}");
            assert!(
                after <= 1.05 * most,
                "{name} {place:?}: {after} leg lengths a second, in the clips {most}"
            );
            // Far from the overlap nothing is touched.
            for joint in a.skeleton.listed() {
                for (frame, secs) in plain.grid.times.iter().enumerate() {
                    let is_far = secs < place.first_secs - 2.0 || secs > place.first_secs + overlap + 2.0;
                    if is_far {
                        let at = |clip: &Clip| clip.rotations_at(joint, &[secs])[0];
                        assert_eq!(at(&plain), at(&held), "{name} {joint} {frame}");
                    }
                }
            }
        }
    }
}

#[test]
fn planted_feet_stay_planted_in_a_mix_frame_by_frame() {
    for (name, a, b) in standing_pairs() {
        let mask = Mask::all(&a.skeleton);
        for weight in [MixAlong::constant(0.5), MixAlong { knots: vec![[0.0, 0.0], [a.duration_secs, 1.0]] }]
        {
            let plain = mix(&a, &b, &weight, &mask).unwrap();
            let held = on_feet(&a, &b, &weight, &mask).unwrap();
            let most = fastest_slide(&a).max(fastest_slide(&b));
            let [before, after] = [&plain, &held].map(fastest_slide);
            println!("{name} {weight:?}: slide {before:.3} held {after:.3}, clips {most:.3}");
            assert!(after <= 1.05 * most, "{name}: {after} leg lengths a second, in the clips {most}");
        }
        // Without a share of the second clip nothing is held.
        assert_eq!(on_feet(&a, &b, &MixAlong::constant(0.0), &mask).unwrap(), {
            mix(&a, &b, &MixAlong::constant(0.0), &mask).unwrap()
        });
        // Arms alone leave the feet alone.
        let arms: Vec<&str> =
            ["LeftArm", "upperarm.l"].into_iter().filter(|label| a.skeleton.find(label).is_some()).collect();
        let mask = Mask::joints(&a.skeleton, &arms).unwrap();
        let half = MixAlong::constant(0.5);
        assert_eq!(on_feet(&a, &b, &half, &mask).unwrap(), mix(&a, &b, &half, &mask).unwrap(), "{name}");
    }
}

#[test]
fn a_clip_of_another_body_is_blended_after_it_was_carried_over() {
    let (Some(walk), Some(biped)) = (
        clips("data/bvh/cmu_02_01_walk.bvh").map(|clips| clips[0].clone()),
        clip("data/gltf/biped23_movement_clips.glb", "Rig_Medium|Running_A"),
    ) else {
        return;
    };
    let partner = turnwright::retarget::partner(&biped, &walk.skeleton).unwrap();
    assert!(partner.is_carried && !partner.notes.is_empty());
    let mask = Mask::all(&walk.skeleton);
    let joined = join_on_feet(&walk, &partner.clip, JoinPlace::end_to_start(&walk, 0.3), &mask).unwrap();
    assert!((joined.duration_secs - (walk.duration_secs + biped.duration_secs - 0.3)).abs() < 0.02);
    // What is alike is not carried but taken as it is.
    let same = turnwright::retarget::partner(&walk, &walk.skeleton).unwrap();
    assert!(Arc::ptr_eq(&same.clip, &walk) && !same.is_carried);
}

/// How far a clip's ends are apart once the stride is taken out: degrees of the worst joint, and the worst step of a rate there against
/// the largest such step within the clip.
fn seam_of(clip: &Clip) -> (f64, f64) {
    let last = clip.grid.count() - 1;
    let secs: Vec<f64> = (0..=last).map(|frame| clip.grid.time(frame)).collect();
    let below = clip.skeleton.listed().filter(|&joint| clip.skeleton.parent_joint(joint).is_some());
    let mut worst = (0.0, 0.0);
    for joint in below {
        let turns = clip.rotations_at(joint, &secs);
        let step = |frame: usize| (turns[frame].reverse() * turns[frame + 1]).plane_angles();
        let jump = (step(0) - step(last - 1)).length();
        let usual = largest((1..last).map(|frame| (step(frame) - step(frame - 1)).length()));
        worst = (
            f64::max(worst.0, turns[0].turn_to(turns[last]).to_degrees()),
            f64::max(worst.1, jump / usual.max(1e-3)),
        );
    }
    worst
}

#[test]
fn a_loop_pass_closes_finds_and_repeats() {
    let Some(walk) = clips("data/bvh/cmu_02_01_walk.bvh").map(|clips| clips[0].clone()) else { return };
    let parts = best_loops(&walk, 0.9, 5, 400).unwrap();
    assert!(parts.windows(2).all(|pair| pair[0].distance <= pair[1].distance));
    let LoopPart { from_secs, to_secs, distance } = parts[0];
    // A step cycle of a walk is about 1.1 s; its ends are nearer than those of the whole clip.
    assert!((0.9..1.6).contains(&(to_secs - from_secs)), "{parts:?}");
    assert!(distance < 0.5 * parts.iter().map(|part| part.distance).fold(1.0, f64::max).max(distance * 2.0));
    let of = |close, rounds| LoopPass { part_secs: Some([from_secs, to_secs]), close, rounds };
    let made = |pass: &LoopPass| pass.apply(&walk, &NoOthers).unwrap().clip;
    let open = made(&of(None, 1));
    let (gap, _) = seam_of(&open);
    for close in [Closing::BySize, Closing::Spread, Closing::Window] {
        let closed = made(&of(Some(close), 1));
        let (left, jump) = seam_of(&closed);
        assert!(left < 0.01 * gap + 1e-6, "{close:?}: {gap} left {left} degrees");
        assert!(jump < 1.6, "{close:?}: a rate steps {jump} times as far as anywhere else");
        // The stride is kept.
        let [own, was] = [stride(&closed).unwrap(), stride(&open).unwrap()];
        let size = was.x.hypot(was.z);
        assert!((own.x - was.x).hypot(own.z - was.z) < 0.05 * size, "{own:?} {was:?}");
        let thrice = made(&of(Some(close), 3));
        assert_eq!(thrice.grid.count(), 3 * (closed.grid.count() - 1) + 1);
        let far = stride(&thrice).unwrap();
        assert!((far.x.hypot(far.z) - 3.0 * size).abs() < 0.2 * size, "{far:?}, once {was:?}");
    }
    let error = of(None, 0).apply(&walk, &NoOthers).unwrap_err().to_string();
    assert_eq!(error, "rounds: expected 1 to 1000, found 0");
    let late = LoopPass { part_secs: Some([99.0, 100.0]), ..LoopPass::default() };
    assert!(late.apply(&walk, &NoOthers).unwrap_err().to_string().contains("within the clip"));
    assert!(best_loops(&walk, 99.0, 1, 400).unwrap_err().to_string().contains("the clip's length"));
}

#[test]
fn a_loop_whose_first_frame_follows_its_last_does_not_stutter() {
    // A turning root that walks round a circle, 24 frames a round, the first of the next round not among them.
    let count = 24;
    let angle = |frame: usize| std::f64::consts::TAU / 4.0 * frame as f64 / count as f64;
    let turns: Vec<Rotor> = (0..count).map(|frame| Axis::Y.rotor(angle(frame))).collect();
    let places: Vec<DVec3> =
        (0..count).map(|frame| Axis::Y.rotor(angle(frame)).apply(DVec3::new(0.0, 1.0, -2.0))).collect();
    let clip = one_root(&turns, &places);
    let longer = with_first_again(&clip).unwrap();
    assert_eq!(longer.grid.count(), count + 1);
    assert_close!(longer.rotation(0).unwrap().keys[count], Axis::Y.rotor(angle(count)), 1e-9);
    let next = Axis::Y.rotor(angle(count)).apply(DVec3::new(0.0, 1.0, -2.0));
    let found = longer.joints[0].translation.as_ref().unwrap().keys[count];
    assert_close!(found, next, 0.01);
    let round = repeat(&longer, 4).unwrap();
    assert_eq!(round.grid.count(), 4 * count + 1);
    let end = round.world_at(round.duration_secs)[0];
    assert!(end.position().distance(places[0]) < 0.2, "back where it began: {}", end.position());
}

#[test]
fn weight_curves_are_checked() {
    let still = one_root(&[Rotor::IDENTITY; 3], &[DVec3::ZERO; 3]);
    let mask = Mask::all(&still.skeleton);
    for (knots, words) in [
        (vec![[0.0, 0.1], [0.0, 0.2]], "0 after 0"),
        (vec![[1.0, 0.1], [0.5, 0.2]], "0.5 after 1"),
        (vec![], "none"),
        (vec![[0.0, 1.5]], "from 0 to 1"),
    ] {
        let error = mix(&still, &still, &MixAlong { knots }, &mask).unwrap_err().to_string();
        assert!(error.contains(words), "{error}");
    }
}

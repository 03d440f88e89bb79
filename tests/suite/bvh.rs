//! BVH against the outside files: what scipy says their poses are, and writing them back.

use std::sync::Arc;

use glam::{DAffine3, DVec3};
use serde_json::Value;
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times, VectorTrack};
use turnwright::exchange::{bvh, disk};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::support::{Distance, Tally, list, number, numbers, shared, unit_rotor};

/// File, joints, End Sites, frames, frame time, columns: from the table in the outside files' own list.
const FILES: [(&str, usize, usize, usize, f64, usize); 8] = [
    ("cmu_02_01_walk.bvh", 31, 7, 344, 0.008_333_3, 96),
    ("cmu_05_06_dance.bvh", 31, 7, 885, 0.008_333, 96),
    ("mixed_order_6ch.bvh", 19, 7, 3089, 0.041_667, 111),
    ("rotation_first_root.bvh", 4, 2, 4, 0.04, 15),
    ("walk01.bvh", 19, 5, 101, 0.041_666_7, 60),
    ("xyz_affective_walk.bvh", 23, 7, 1064, 0.008_333, 72),
    ("yxz_23joints_120fps.bvh", 23, 5, 61, 0.008_333, 72),
    ("zxy_19joints_30fps.bvh", 19, 5, 455, 0.033_333, 60),
];

fn bytes_of(name: &str) -> Option<Vec<u8>> {
    shared(&format!("data/bvh/{name}")).map(|path| disk::read(&path).expect("an existing file is read"))
}

fn reference() -> Value {
    serde_json::from_str(include_str!("../data/bvh_reference.json")).expect("our own file is JSON")
}

#[test]
fn every_outside_file_opens_as_its_source_describes_it() {
    for (name, joints, tips, frames, frame_secs, _) in FILES {
        let Some(bytes) = bytes_of(name) else { return };
        let (_, clip, notes) = bvh::read(&bytes, name).unwrap_or_else(|error| panic!("{name}: {error}"));
        assert_eq!(notes, [], "{name}");
        assert_eq!(clip.skeleton.len(), joints, "{name}");
        assert_eq!(
            clip.skeleton.joints().iter().map(|joint| joint.tips.len()).sum::<usize>(),
            tips,
            "{name}"
        );
        assert_eq!(clip.grid.count(), frames, "{name}");
        assert_eq!(clip.grid.time(1), frame_secs, "{name}");
        assert_eq!(clip.duration_secs, (frames - 1) as f64 * frame_secs, "{name}");
        assert_eq!(clip.name, name);
    }
}

#[test]
fn poses_are_those_scipy_finds() {
    let reference = reference();
    let mut places = Tally::new("world places, relative to the skeleton's reach");
    let mut turns = Tally::new("world turns, radians");
    let mut checks = 0;
    for (name, file) in reference["files"].as_object().unwrap() {
        let Some(bytes) = bytes_of(name) else { return };
        let (_, clip, _) = bvh::read(&bytes, name).unwrap();
        let names: Vec<&str> = clip.skeleton.joints().iter().map(|joint| joint.name.as_str()).collect();
        let expected: Vec<&str> = list(&file["joints"]).iter().map(|name| name.as_str().unwrap()).collect();
        assert_eq!(names, expected, "{name}");
        for pose in list(&file["poses"]) {
            let frame = pose["frame"].as_u64().unwrap() as usize;
            let world = clip.world_at(clip.grid.time(frame));
            let expected: Vec<DVec3> =
                list(&pose["places"]).iter().map(|place| DVec3::from_array(numbers(place))).collect();
            let reach = expected.iter().map(|place| place.length()).fold(0.0, f64::max);
            for (joint, own) in world.iter().enumerate() {
                let case = format!("{name} frame {frame} {}", clip.skeleton.label(joint));
                places.check(&case, own.position().distance(expected[joint]) / reach, 1e-9);
                let turn = unit_rotor(&list(&pose["turns_xyzw"])[joint]);
                turns.check(&case, own.rotation.distance_to(&turn), 1e-9);
                checks += 1;
            }
        }
    }
    assert_eq!(number(&reference["files"]["walk01.bvh"]["frames"]), 101.0);
    places.finish(checks);
    turns.finish(checks);
}

#[test]
fn a_clip_nobody_touched_is_written_as_the_bytes_it_came_from() {
    for (name, ..) in FILES {
        let Some(bytes) = bytes_of(name) else { return };
        let (document, clip, _) = bvh::read(&bytes, name).unwrap();
        let (same, notes) = bvh::write(&document, &clip, &clip.clone());
        assert!(same == bytes, "{name}");
        assert_eq!(notes, []);
        // A track that was made anew, of the same numbers, is no change either.
        let joint = clip.skeleton.len() - 1;
        let track = clip.rotation(joint).unwrap();
        let angles = track.file_angles().unwrap().clone();
        let remade = clip.with_rotation(joint, RotationTrack::from_angles(track.times.clone(), angles));
        assert!(bvh::write(&document, &clip, &remade).0 == bytes, "{name}");
    }
}

/// The words of a text with what stands before each.
fn words(bytes: &[u8]) -> Vec<(&[u8], &[u8])> {
    let mut words = Vec::new();
    let mut at = 0;
    while at < bytes.len() {
        let blank = at;
        let start = bytes[at..].iter().position(|b| !b.is_ascii_whitespace()).map_or(bytes.len(), |n| at + n);
        let end = bytes[start..]
            .iter()
            .position(u8::is_ascii_whitespace)
            .map_or(bytes.len(), |length| start + length);
        words.push((&bytes[blank..start], &bytes[start..end]));
        at = end;
    }
    words
}

#[test]
fn an_edit_changes_the_numbers_it_means_and_no_other_byte() {
    for (name, joints, _, frames, _, columns) in FILES {
        let Some(bytes) = bytes_of(name) else { return };
        let (document, clip, _) = bvh::read(&bytes, name).unwrap();
        let (joint, frame) = (joints / 2, frames / 2);
        let track = clip.rotation(joint).unwrap();
        let turned =
            (Rotor::from_plane_angles(Bivector::new(0.1, -0.2, 0.3)) * track.keys[frame]).normalize();
        let edited = clip.with_rotation(joint, track.with_keys(&[(frame, turned)]));
        let (written, notes) = bvh::write(&document, &clip, &edited);
        assert_eq!(notes, [], "{name}");

        let (old, new) = (words(&bytes), words(&written));
        assert_eq!(old.len(), new.len(), "{name}");
        let changed: Vec<usize> = (0..old.len()).filter(|&word| old[word] != new[word]).collect();
        assert!((1..=3).contains(&changed.len()), "{name}: {} words", changed.len());
        let first_number = old.iter().position(|word| word.1 == b"Time:").unwrap() + 2;
        for word in changed {
            assert_eq!((word - first_number) / columns, frame, "{name}");
            assert_eq!(old[word].0, new[word].0, "{name}: blanks");
            let text = std::str::from_utf8(new[word].1).unwrap();
            assert_eq!(text.split('.').nth(1).map(str::len), Some(6), "{name}: {text}");
        }
        let (_, again, _) = bvh::read(&written, name).unwrap();
        for other in 0..joints {
            let (own, others) = (again.rotation(other).unwrap(), clip.rotation(other).unwrap());
            let expected = if other == joint { vec![frame] } else { vec![] };
            assert_eq!(own.changed_keys(others), expected, "{name}");
        }
        let off = again.rotation(joint).unwrap().keys[frame].turn_to(turned);
        assert!(off.to_degrees() < 2e-6, "{name}: {off} rad off");
    }
}

#[test]
fn a_moved_root_changes_its_positions_alone() {
    let Some(bytes) = bytes_of("rotation_first_root.bvh") else { return };
    let (document, clip, _) = bvh::read(&bytes, "root").unwrap();
    let mut edited = clip.clone();
    let mut root = (*clip.joints[0]).clone();
    let mut track = root.translation.unwrap();
    let mut keys = track.keys.to_vec();
    keys[2].y += 1.0;
    track.keys = keys.into();
    root.translation = Some(track);
    edited.joints[0] = Arc::new(root);
    let (written, _) = bvh::write(&document, &clip, &edited);
    let expected = String::from_utf8(bytes).unwrap().replace("52.000000 -18.000000", "53.000000 -18.000000");
    assert_eq!(String::from_utf8(written).unwrap(), expected);
}

#[test]
fn a_stretch_of_a_clip_keeps_the_text_of_its_numbers() {
    let Some(bytes) = bytes_of("walk01.bvh") else { return };
    let (document, clip, _) = bvh::read(&bytes, "walk01").unwrap();
    let (from, count) = (30, 20);
    let times = Times::Even { step_secs: clip.grid.time(1), count };
    let cut = |tracks: &Arc<JointTracks>| {
        let mut tracks = (**tracks).clone();
        if let Some(rotation) = &mut tracks.rotation {
            let mut angles = rotation.file_angles().unwrap().clone();
            angles.degrees = angles.degrees[from..from + count].into();
            *rotation = RotationTrack::from_angles(times.clone(), angles);
        }
        if let Some(track) = &mut tracks.translation {
            *track = VectorTrack::straight(times.clone(), &track.keys[from..from + count]);
        }
        Arc::new(tracks)
    };
    let short = Clip {
        joints: clip.joints.iter().map(cut).collect(),
        grid: FrameGrid { times: times.clone(), rate: clip.grid.rate },
        ..clip.clone()
    };
    let (written, _) = bvh::write(&document, &clip, &short);
    let (old, new) = (String::from_utf8(bytes).unwrap(), String::from_utf8(written).unwrap());
    let rows = |text: &str| -> Vec<String> {
        let motion = text.lines().skip_while(|line| !line.starts_with("Frame Time")).skip(1);
        motion.map(|line| line.split_whitespace().collect::<Vec<_>>().join(" ")).collect()
    };
    assert_eq!(rows(&new), rows(&old)[from..from + count]);
    assert!(new.contains("Frames: 20\nFrame Time: 0.0416667\n"));
    assert_eq!(new.split("MOTION").next(), old.split("MOTION").next());
}

/// The largest distance of any joint in any frame, and the largest difference of a turn away from rest.
fn apart(a: &Clip, b: &Clip) -> (f64, f64) {
    let (mut place, mut turn) = (0.0_f64, 0.0_f64);
    let (rest_a, rest_b) =
        (a.skeleton.world(&a.skeleton.rest_pose()), b.skeleton.world(&b.skeleton.rest_pose()));
    for frame in 0..a.grid.count() {
        let (world_a, world_b) = (a.world_at(a.grid.time(frame)), b.world_at(b.grid.time(frame)));
        for joint in a.skeleton.listed() {
            let other = b.skeleton.find(a.skeleton.label(joint)).expect("no joint is lost");
            place = place.max(world_a[joint].position().distance(world_b[other].position()));
            let away_a = world_a[joint].rotation * rest_a[joint].rotation.reverse();
            let away_b = world_b[other].rotation * rest_b[other].rotation.reverse();
            turn = turn.max(away_a.normalize().distance_to(&away_b.normalize()));
        }
    }
    (place, turn)
}

#[test]
fn a_new_file_from_each_outside_clip_puts_every_joint_where_it_was() {
    for (name, _, _, frames, ..) in FILES {
        let Some(bytes) = bytes_of(name) else { return };
        let (_, clip, _) = bvh::read(&bytes, name).unwrap();
        let (made, _) = bvh::from_clip(&clip);
        let (_, again, notes) = bvh::read(&made, name).unwrap();
        assert_eq!(notes, [], "{name}");
        assert_eq!(again.grid.count(), frames, "{name}");
        assert_eq!(again.grid.time(1), clip.grid.time(1), "{name}");
        let (place, turn) = apart(&clip, &again);
        let world = clip.world_at(0.0);
        let reach =
            world.iter().map(|joint| joint.position().distance(world[0].position())).fold(0.0, f64::max);
        assert!(place < 3e-6 * reach.max(1.0), "{name}: {place}, reach {reach}");
        assert!(turn.to_degrees() < 1e-5, "{name}: {turn}");
    }
}

/// A skeleton as scene files have them: a turned and scaled carrier above, one between two joints that moves, turned
/// rest poses, and a joint that slides.
fn carried_clip() -> Clip {
    let turn = |yz, zx, xy| Rotor::from_plane_angles(Bivector::from_degrees([yz, zx, xy]));
    let joint = |name: &str, number, parent, kind, translation, rotation| Joint {
        name: name.to_owned(),
        number,
        parent,
        rest: Transform { translation, rotation, scale: DVec3::ONE },
        kind,
        tips: vec![],
    };
    let mut stage =
        joint("stage", 0, None, JointKind::Carrier, DVec3::new(1.0, 0.0, 2.0), turn(-90.0, 0.0, 0.0));
    stage.rest.scale = DVec3::splat(100.0);
    let mut hand =
        joint("hand", 5, Some(3), JointKind::Joint, DVec3::new(0.1, 0.4, 0.0), turn(10.0, 20.0, 30.0));
    hand.tips = vec![DVec3::new(0.0, 0.2, 0.0)];
    let skeleton = Skeleton::new(vec![
        stage,
        joint("hip", 2, Some(0), JointKind::Joint, DVec3::new(0.0, 0.0, 1.0), turn(90.0, 0.0, 15.0)),
        joint("rail", 7, Some(1), JointKind::Carrier, DVec3::new(0.0, 0.5, 0.0), turn(0.0, 40.0, 0.0)),
        joint("arm", 3, Some(2), JointKind::Joint, DVec3::new(0.3, 0.0, 0.0), turn(0.0, 0.0, 120.0)),
        hand,
        joint("arm", 4, Some(1), JointKind::Joint, DVec3::new(-0.3, 0.5, 0.0), turn(0.0, 0.0, -120.0)),
    ])
    .expect("parents stand first");
    let times = Times::Even { step_secs: 0.04, count: 40 };
    let swing = |rest: Rotor, plane: Bivector| {
        let key = |i: usize| rest * Rotor::from_plane_angles(plane * (i as f64 * 0.2).sin());
        RotationTrack::from_rotors(times.clone(), (0..40).map(key).collect::<Vec<_>>())
    };
    let joints = skeleton.joints().iter().enumerate().map(|(index, joint)| {
        let plane = Bivector::new(0.4 + index as f64 * 0.3, -0.9, 0.5);
        let mut tracks =
            JointTracks { rotation: Some(swing(joint.rest.rotation, plane)), ..JointTracks::default() };
        if joint.name == "hand" {
            let slide = |i: usize| joint.rest.translation * (1.0 + 0.01 * i as f64);
            tracks.translation =
                Some(VectorTrack::straight(times.clone(), (0..40).map(slide).collect::<Vec<_>>()));
        }
        Arc::new(tracks)
    });
    Clip {
        name: "carried".to_owned(),
        joints: joints.collect(),
        skeleton: Arc::new(skeleton),
        grid: FrameGrid { times: times.clone(), rate: 25.0 },
        duration_secs: 39.0 * 0.04,
    }
}

#[test]
fn carriers_turned_rests_and_sliding_joints_are_taken_in() {
    let clip = carried_clip();
    let (made, notes) = bvh::from_clip(&clip);
    let (_, again, _) = bvh::read(&made, "carried").unwrap();
    let text = String::from_utf8(made).unwrap();
    assert_eq!(again.skeleton.len(), 4);
    let (place, turn) = apart(&clip, &again);
    // Lengths are in hundreds and have 6 decimals.
    assert!(place < 1e-5, "{place}");
    assert!(turn.to_degrees() < 1e-5, "{turn}");
    // The rail carries the first arm about the hip; the hand slides on the arm.
    let moving: Vec<&str> =
        text.split("JOINT ").skip(1).filter(|joint| joint.contains("CHANNELS 6")).map(|j| &j[..5]).collect();
    assert_eq!(moving, ["arm#3", "hand\n"]);
    let texts: Vec<String> = notes.iter().map(ToString::to_string).collect();
    assert_eq!(
        texts,
        [
            "joint arm#3: expected limbs of one length, found 2 joints that move against their parents: written with positions"
        ]
    );
    let rest = again.skeleton.world(&again.skeleton.rest_pose());
    let own = clip.skeleton.world(&clip.skeleton.rest_pose());
    let tip = own[4].scene_from_joint.transform_point3(DVec3::new(0.0, 0.2, 0.0));
    let hand = again.skeleton.find("hand").unwrap();
    let tip_again = rest[hand].position() + again.skeleton.joints()[hand].tips[0];
    assert!(tip.distance(tip_again) < 1e-5, "{tip} {tip_again}");
    assert_ne!(own[4].scene_from_joint, DAffine3::IDENTITY);
}

#[test]
fn every_gltf_clip_becomes_bvh_with_every_joint_where_it_was() {
    let mut clips_seen = 0;
    for path in crate::gltf::outside_files() {
        for clip in crate::gltf::open(&path).1 {
            let place = format!("{} {}", path.display(), clip.name);
            let (made, _) = bvh::from_clip(&clip);
            let (_, again, notes) =
                bvh::read(&made, "made").unwrap_or_else(|error| panic!("{place}: {error}"));
            assert_eq!(notes, [], "{place}");
            assert_eq!(again.grid, clip.grid, "{place}");
            assert_eq!(again.skeleton.len(), clip.skeleton.listed().count(), "{place}");
            let (far, turn) = apart(&clip, &again);
            let rest = again.skeleton.world(&again.skeleton.rest_pose());
            let reach =
                rest.iter().map(|own| own.position().distance(rest[0].position())).fold(1.0, f64::max);
            // Six decimals a joint, in a chain.
            assert!(far < 1e-5 * reach, "{place}: {far}, reach {reach}");
            assert!(turn.to_degrees() < 1e-4, "{place}: {turn}");
            clips_seen += 1;
        }
    }
    assert!(clips_seen == 0 || clips_seen > 40, "{clips_seen} clips");
}

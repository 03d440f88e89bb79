//! Proof sheets: what is measured between two clips whose difference is known.

use std::path::Path;
use std::sync::Arc;

use turnwright::clip::{Clip, JointTracks, PathKind, Paths, RotationTrack, Times, cut};
use turnwright::exchange::{self, OpenOptions, Source, disk, encode};
use turnwright::proof::{self, ClipProof, FileFacts, Measurement, Sheet, sheet_html, sheet_json};
use turnwright::rotor::{Axis, Rotor};
use turnwright::snag::Unwatched;

use crate::support::{assert_close, number, shared};

fn open(path: &str) -> Source {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(path);
    exchange::open(&path, &OpenOptions::default()).expect("a demo clip opens")
}

fn measure(before: &Clip, after: &Clip) -> Measurement {
    proof::measure(before, after, &Unwatched).expect("the clips share joints")
}

/// The clip as it comes back from a file of another format.
fn through(source: &Source, target: &str) -> Arc<Clip> {
    let encoded = encode(source, &source.clips, None, Path::new(target)).expect("the clip can be written");
    let back = exchange::open_bytes(Path::new(target), encoded.bytes, &OpenOptions::default());
    back.expect("what was written opens").clips[0].clone()
}

fn sheet(before: &Clip, after: &Clip) -> Sheet {
    let mut clip: ClipProof =
        proof::compare(before, after, "take <1>".to_owned(), 0, &Unwatched).expect("the clips share joints");
    clip.draw(before, after).expect("the pictures can be made");
    let facts = |file: &str| FileFacts {
        file: file.to_owned(),
        format: "BVH".to_owned(),
        bytes: 12_345,
        clips: 1,
        sha256: disk::hash(file.as_bytes()),
    };
    Sheet {
        before: facts("a.bvh"),
        after: facts("b&c.bvh"),
        clips: vec![clip],
        notes: vec!["x < y".to_owned()],
        is_computed: false,
    }
}

#[test]
fn the_same_clip_twice_shows_no_change_at_all() {
    for path in ["demo-scenes/deckhand.bvh", "demo-scenes/heron.glb", "demo-scenes/crane.csv"] {
        let (first, second) = (open(path), open(path));
        let found = measure(&first.clips[0], &second.clips[0]);
        assert_eq!(found.max_change_rad(), 0.0, "{path}");
        assert_eq!(found.joints_untouched(), found.joints.len(), "{path}");
        assert_eq!(found.frames_untouched, Some(found.frames), "{path}");
        assert!(found.tips.iter().all(|tip| tip.moved.value == 0.0), "{path}");
    }
}

#[test]
fn planted_faults_are_measured_as_they_were_planted() {
    let faulty = open("demo-scenes/deckhand.bvh");
    let clean = open("tests/data/demo_clean/deckhand.bvh");
    let found = measure(&clean.clips[0], &faulty.clips[0]);
    let joint = |label: &str| found.joints.iter().find(|joint| joint.label == label).unwrap();

    // 14 frames of half a turn; the angles have six decimals.
    for label in ["RightThigh", "RightFoot"] {
        let flipped = joint(label);
        assert_close!(flipped.change.value.to_degrees(), 180.0, 1e-4);
        assert_eq!(flipped.keys_changed.as_deref(), Some(&(206..=219).collect::<Vec<_>>()[..]));
        // 300 frames and 299 middles; the flip is held over 14 of them and 13 middles, and is half way at two more.
        let turns = 27.0 * 180.0 + 2.0 * 90.0;
        assert_close!(flipped.mean_rad.to_degrees(), turns / 599.0, 0.5);
        // Into and out of it in one frame: at least 120 degrees a frame at 60 frames a second.
        assert!(flipped.rates_after.fastest.value.to_degrees() > 7200.0);
        assert!(flipped.rates_before.fastest.value.to_degrees() < 400.0);
    }
    assert_close!(joint("LeftHand").change.value.to_degrees(), 41.0, 1e-4);
    assert_close!(joint("LeftHand").change.at_secs, 95.0 / 60.0, 1e-6);
    assert_eq!(joint("LeftHand").p95_rad, 0.0);
    // Wraps and mirrored triples change numbers, not poses.
    for label in ["Hips", "RightForearm"] {
        assert!(joint(label).change.value.to_degrees() < 1e-5, "{label}");
        assert!(!joint(label).untouched, "{label}");
    }
    assert_eq!(found.joints_untouched(), 15);
    assert_eq!(found.not_finite, [0, 1]);
    let farthest = found.farthest_tip().unwrap();
    assert_eq!(farthest.label, "RightToes");
    assert!(farthest.moved.value > 30.0, "the leg swings round: {}", farthest.moved.value);
}

#[test]
fn a_tip_moves_by_the_chord_of_the_turn() {
    let before = open("tests/data/demo_clean/crane.csv").clips[0].clone();
    let slewing = before.skeleton.find("Slewing").unwrap();
    // Pedestal and slewing stand on the y axis: everything goes round by 90 degrees about it.
    let track = before.rotation(slewing).unwrap();
    let quarter = Axis::Y.rotor(std::f64::consts::FRAC_PI_2);
    let turned: Vec<_> = (0..track.keys.len()).map(|key| (key, track.keys[key] * quarter)).collect();
    let after = before.with_rotation(slewing, track.with_keys(&turned));
    let found = measure(&before, &after);
    assert_close!(found.max_change_rad().to_degrees(), 90.0, 1e-9);
    let tip = &found.tips[0];
    assert_eq!((found.tips.len(), tip.label.as_str()), (1, "Hook"));
    let hook = before.skeleton.find("Hook").unwrap();
    let reach = |secs: f64| {
        let place = before.world_at(secs)[hook].position();
        place.x.hypot(place.z)
    };
    assert_close!(tip.moved.value, reach(tip.moved.at_secs) * std::f64::consts::SQRT_2, 1e-9);
}

#[test]
fn clips_of_different_formats_are_compared_as_they_play() {
    let deckhand = open("tests/data/demo_clean/deckhand.bvh");
    let found = measure(&deckhand.clips[0], &through(&deckhand, "deckhand.glb"));
    // 32-bit floats in the one, six decimals in the other.
    assert!(found.max_change_rad().to_degrees() < 1e-3, "{}", found.max_change_rad().to_degrees());
    assert_eq!(found.joints.len(), 22);
    assert!(found.joints.iter().all(|joint| joint.keys_changed.is_none()));
    assert_eq!((found.frames_untouched, found.joints_untouched()), (None, 0));
    assert!(found.tips.iter().all(|tip| tip.moved.value < 0.01), "{:?}", found.farthest_tip());
}

#[test]
fn turned_rest_poses_do_not_count_as_change() {
    let Some(path) = shared("data/gltf/Fox.glb") else { return };
    let fox = exchange::open(&path, &OpenOptions::default()).unwrap();
    // A BVH joint stands parallel to the world at rest, a joint of the fox does not.
    let found = measure(&fox.clips[0], &through(&fox, "fox.bvh"));
    assert!(found.joints.len() >= 20, "{}", found.joints.len());
    let most = found.most_changed().unwrap();
    assert!(most.change.value.to_degrees() < 0.1, "{} {}", most.label, most.change.value.to_degrees());
}

#[test]
fn what_cannot_be_compared_is_told() {
    let (deckhand, crane) = (open("demo-scenes/deckhand.bvh"), open("demo-scenes/crane.csv"));
    let error = proof::measure(&deckhand.clips[0], &crane.clips[0], &Unwatched).unwrap_err().to_string();
    assert_eq!(
        error,
        "expected two clips of one skeleton, found no joint name in both (22 joints before, 5 after, for \
         example `Hips` and `Pedestal`)"
    );
}

#[test]
fn a_shorter_clip_is_compared_as_far_as_it_lasts() {
    let whole = open("demo-scenes/crane.csv").clips[0].clone();
    let part = cut(&whole, 0.0, 3.0);
    let found = measure(&whole, &part);
    assert_eq!(found.max_change_rad(), 0.0);
    assert_eq!(found.frames_untouched, None);
    assert!(
        sheet_html(&sheet(&whole, &part)).contains("The clips last 8 s and 3 s; compared is what both have.")
    );
}

#[test]
fn the_page_needs_nothing_beside_it_and_names_stay_text() {
    let (faulty, clean) = (open("demo-scenes/heron.glb"), open("tests/data/demo_clean/heron.glb"));
    let page = sheet_html(&sheet(&faulty.clips[0], &clean.clips[0]));
    assert!(page.starts_with("<!doctype html>") && page.ends_with("</html>\n"));
    for outside in ["http:", "https:", "<link", "<script", "url(", "@import", "src=\"/", "file:"] {
        assert!(!page.contains(outside), "{outside}");
    }
    for part in [
        "prefers-color-scheme: dark",
        "@media print",
        "<svg",
        "data:image/png;base64,",
        "Turn maps",
        "Where it changed most",
        "NeckHigh",
        "licensed or qualified person",
        "take &lt;1&gt;",
        "b&amp;c.bvh",
        "x &lt; y",
    ] {
        assert!(page.contains(part), "{part}");
    }
    assert!(!page.contains("take <1>"));
    // The same input gives the same page.
    assert!(page == sheet_html(&sheet(&faulty.clips[0], &clean.clips[0])));
}

#[test]
fn the_object_holds_plain_numbers() {
    let (faulty, clean) = (open("demo-scenes/deckhand.bvh"), open("tests/data/demo_clean/deckhand.bvh"));
    let text = sheet_json(&sheet(&faulty.clips[0], &clean.clips[0]));
    let object: serde_json::Value = serde_json::from_str(&text).unwrap();
    assert_close!(number(&object["max_change_deg"]), 180.0, 1e-4);
    let joints = object["joints"].as_array().unwrap();
    assert_eq!(joints.len(), 22);
    let hand = joints.iter().find(|joint| joint["joint"] == "LeftHand").unwrap();
    assert_close!(number(&hand["max_change_deg"]), 41.0, 1e-4);
    assert_eq!((&hand["keys_changed"], &hand["untouched"]), (&1.into(), &false.into()));
    let clip = &object["clips"][0];
    assert_eq!((&clip["joints_untouched"], &clip["frames"]), (&15.into(), &300.into()));
    assert_eq!((&clip["not_finite_before"], &clip["not_finite_after"]), (&1.into(), &0.into()));
    assert_eq!(clip["snags_gone"], clip["snags_before"]);
    let snags = object["snags"].as_array().unwrap();
    assert!(snags.iter().any(|snag| snag["kind"] == "half-turn" && snag["state"] == "gone"), "{snags:?}");
}

/// Some keys of a track of rotors.
fn only(track: &RotationTrack, keys: &[usize]) -> RotationTrack {
    let times: Vec<f64> = keys.iter().map(|&key| track.times.at(key)).collect();
    let keys: Vec<Rotor> = keys.iter().map(|&key| track.keys[key]).collect();
    RotationTrack::from_rotors(Times::Listed(times.into()), keys)
}

/// The joint that turns farthest from its first pose.
fn most_turning(clip: &Clip) -> usize {
    let travel = |joint: usize| {
        let track = clip.rotation(joint)?;
        let first = track.sound_key(0);
        Some((0..track.keys.len()).map(|key| track.sound_key(key).turn_to(first)).fold(0.0, f64::max))
    };
    let by_travel = |a: &usize, b: &usize| travel(*a).partial_cmp(&travel(*b)).expect("turns are numbers");
    (0..clip.joints.len()).max_by(by_travel).expect("there are joints")
}

/// A clip with the turns of a joint as `change` makes them.
fn with_joint(clip: &Clip, joint: usize, change: impl Fn(&RotationTrack) -> RotationTrack) -> Clip {
    let mut changed = clip.clone();
    let rotation = changed.joints[joint].rotation.as_ref().map(change);
    changed.joints[joint] = Arc::new(JointTracks { rotation, ..(*changed.joints[joint]).clone() });
    changed
}

/// Every frame that is told as untouched plays the same in all joints, and the joint itself is not.
fn tells_no_moved_frame_untouched(before: &Clip, after: &Clip, joint: usize) -> usize {
    let found = measure(before, after);
    let moved = |frame: usize| {
        // A key that lies at the frame but for the rounding of its time tells the frame's pose, held segments too.
        let times = &before.rotation(joint).expect("it turns").times;
        let (at, key) = (before.grid.time(frame), times.at(times.nearest(before.grid.time(frame))));
        let secs = if (key - at).abs() < 1e-5 { key } else { at };
        let [own, others] = [before, after].map(|clip| clip.rotation(joint).expect("it turns").at(secs));
        own.turn_to(others) > 1e-9
    };
    let moved = (0..before.grid.count()).filter(|&frame| moved(frame)).count();
    assert!(moved > 0, "the change shows");
    assert!(found.frames_untouched.expect("of one form") + moved <= found.frames, "{found:?}");
    let own = found.joints.iter().find(|own| own.before_joint == joint).expect("it is measured");
    assert!(!own.untouched && own.change.value > 0.0);
    assert_eq!(found.joints_untouched(), found.joints.len() - 1);
    moved
}

#[test]
fn frames_between_keys_that_went_are_touched() {
    let source = open("demo-scenes/heron.glb");
    let clip = &source.clips[0];
    let joint = most_turning(clip);
    let after = with_joint(clip, joint, |track| {
        let keys: Vec<usize> =
            (0..track.keys.len()).filter(|key| *key < 5 || *key + 5 > track.keys.len()).collect();
        only(track, &keys)
    });
    let moved = tells_no_moved_frame_untouched(clip, &after, joint);
    assert!(measure(clip, &after).frames_untouched.unwrap() >= 5, "the keys that stayed: {moved} moved");
}

#[test]
fn other_paths_between_the_same_keys_are_a_change() {
    let source = open("demo-scenes/heron.glb");
    let sparse = |track: &RotationTrack| only(track, &(0..track.keys.len()).step_by(6).collect::<Vec<_>>());
    let joint = most_turning(&source.clips[0]);
    let clip = with_joint(&source.clips[0], joint, sparse);
    for kind in [PathKind::Hold, PathKind::Spline, PathKind::BSpline] {
        let after =
            with_joint(&clip, joint, |track| RotationTrack { paths: Paths::Every(kind), ..track.clone() });
        tells_no_moved_frame_untouched(&clip, &after, joint);
    }
}

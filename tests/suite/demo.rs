//! The demo scenes: made here by our own code, with faults planted whose truth is known.
//!
//! `UPDATE_DEMOS=1 cargo test demo_scenes_are_current` writes them anew, and their clean originals to
//! `tests/data/demo_clean`. Without the variable the test compares the files, bit for bit.

mod body;
mod crane;
mod deckhand;
mod heron;
mod write;

use std::path::{Path, PathBuf};

use turnwright::exchange;
use turnwright::exchange::OpenOptions;
use turnwright::exchange::Source;
use turnwright::exchange::disk;
use turnwright::exchange::ron;
use turnwright::mend::{self, SurveyOptions};
use turnwright::proof;
use turnwright::rotor::{EulerOrder, Rotor};
use turnwright::scene::{ClipWork, Document, SourceRef};
use turnwright::snag::SnagKind;
use turnwright::snag::Unwatched;

use body::Motion;
use write::{Channel, Columns};

/// A fault that was put into a demo clip: its kind, joint, first and last frame.
type Planted = (SnagKind, &'static str, usize, usize);

/// The faults of `deckhand.bvh`, besides the wraps of the hips that follow from the heading.
const DECKHAND: &[Planted] = &[
    (SnagKind::BrokenValue, "Neck", 40, 40),
    (SnagKind::MirroredAngles, "RightForearm", 150, 171),
    (SnagKind::HalfTurn, "RightThigh", 206, 219),
    (SnagKind::HalfTurn, "RightFoot", 206, 219),
    (SnagKind::Spike, "LeftHand", 95, 95),
    (SnagKind::Spike, "Head", 250, 251),
];

/// The faults of `heron.glb`.
const HERON: &[Planted] = &[
    (SnagKind::BrokenValue, "RightTarsus", 88, 88),
    (SnagKind::SignFlip, "LeftWing", 120, 143),
    (SnagKind::LongWay, "NeckHigh", 99, 108),
    (SnagKind::Spike, "Head", 205, 205),
];

/// The faults of `crane.csv`, besides the wrap where it slews past 180°.
const CRANE: &[Planted] = &[
    (SnagKind::BrokenValue, "Hook", 150, 150),
    (SnagKind::SignFlip, "Fall", 88, 110),
    (SnagKind::Spike, "Boom", 60, 60),
];

/// Every ninth frame is a key of the heron's upper neck.
const NECK_KEY_FRAMES: usize = 9;

/// Name of the file, its bytes with faults, and its bytes without.
fn clips() -> [(&'static str, Vec<u8>, Vec<u8>); 3] {
    let deckhand = deckhand::motion();
    let heron = heron::motion();
    let crane = crane::motion();
    [
        ("deckhand.bvh", deckhand_bvh(&deckhand, true), deckhand_bvh(&deckhand, false)),
        ("heron.glb", heron_glb(&heron, true), heron_glb(&heron, false)),
        ("crane.csv", crane_csv(&crane, true), crane_csv(&crane, false)),
    ]
}

/// Frames of the fault of this kind in this joint.
fn frames(planted: &[Planted], kind: SnagKind, joint: &str) -> std::ops::RangeInclusive<usize> {
    let own = planted.iter().find(|fault| fault.0 == kind && fault.1 == joint).expect("the fault is listed");
    own.2..=own.3
}

fn deckhand_bvh(clean: &Motion, faulty: bool) -> Vec<u8> {
    if !faulty {
        return write::bvh(clean, &write::angles(clean));
    }
    let mut motion = clean.clone();
    for joint in ["RightThigh", "RightFoot"] {
        let bone = motion.bone(joint);
        for frame in frames(DECKHAND, SnagKind::HalfTurn, joint) {
            motion.poses[frame].turns[bone] = motion.poses[frame].turns[bone] * body::y(180.0);
        }
    }
    let hand = motion.bone("LeftHand");
    for frame in frames(DECKHAND, SnagKind::Spike, "LeftHand") {
        motion.poses[frame].turns[hand] = motion.poses[frame].turns[hand] * body::z(41.0);
    }
    let head = motion.bone("Head");
    for (frame, degrees) in frames(DECKHAND, SnagKind::Spike, "Head").zip([31.0, 22.0]) {
        motion.poses[frame].turns[head] = motion.poses[frame].turns[head] * body::y(degrees);
    }

    let mut angles = write::angles(clean);
    for (bone, triples) in angles.iter_mut().enumerate() {
        let mut last = [0.0; 3];
        for (frame, triple) in triples.iter_mut().enumerate() {
            let rotor = motion.poses[frame].turns[bone];
            if rotor != clean.poses[frame].turns[bone] {
                let own = EulerOrder::ZXY.from_rotor(rotor.normalize(), last[2]);
                *triple = EulerOrder::ZXY.nearest_equal(own, last).map(f64::to_degrees);
            }
            last = triple.map(f64::to_radians);
        }
    }
    for triple in &mut angles[motion.bone("Hips")] {
        triple[2] = within_half_turn(triple[2]);
    }
    let forearm = motion.bone("RightForearm");
    for frame in frames(DECKHAND, SnagKind::MirroredAngles, "RightForearm") {
        let mirrored = EulerOrder::ZXY.mirrored(angles[forearm][frame].map(f64::to_radians));
        angles[forearm][frame] = mirrored.map(f64::to_degrees).map(within_half_turn);
    }
    let neck = motion.bone("Neck");
    for frame in frames(DECKHAND, SnagKind::BrokenValue, "Neck") {
        angles[neck][frame] = [f64::NAN; 3];
    }
    write::bvh(&motion, &angles)
}

fn heron_glb(motion: &Motion, faulty: bool) -> Vec<u8> {
    let unmoved = ["Bill", "LeftWingTip", "RightWingTip"];
    let moved = (0..motion.bones.len()).filter(|&bone| !unmoved.contains(&motion.bones[bone].name));
    let mut channels: Vec<Channel> = moved
        .map(|bone| {
            let keys = motion.unrolled(bone);
            let times = (0..keys.len()).map(|frame| frame as f64 / motion.rate).collect();
            match motion.bones[bone].name {
                "NeckHigh" => cubic_channel(bone, &keys, motion.rate),
                _ => Channel { bone, times, keys, tangents: None },
            }
        })
        .collect();
    if faulty {
        let mut keys = |joint: &str| {
            let bone = motion.bone(joint);
            let channel = channels.iter_mut().find(|channel| channel.bone == bone).expect("the joint moves");
            std::mem::take(&mut channel.keys)
        };
        let (mut tarsus, mut wing, mut head, mut neck) =
            (keys("RightTarsus"), keys("LeftWing"), keys("Head"), keys("NeckHigh"));
        for frame in frames(HERON, SnagKind::BrokenValue, "RightTarsus") {
            tarsus[frame] = tarsus[frame].scale(1.18);
        }
        for frame in frames(HERON, SnagKind::SignFlip, "LeftWing") {
            wing[frame] = -wing[frame];
        }
        for frame in frames(HERON, SnagKind::Spike, "Head") {
            head[frame] = head[frame] * body::y(29.0) * body::x(11.0);
        }
        let from = frames(HERON, SnagKind::LongWay, "NeckHigh").last().expect("two keys") / NECK_KEY_FRAMES;
        neck[from..].iter_mut().for_each(|key| *key = -*key);
        for (joint, keys) in [("RightTarsus", tarsus), ("LeftWing", wing), ("Head", head), ("NeckHigh", neck)]
        {
            let bone = motion.bone(joint);
            let channel = channels.iter_mut().find(|channel| channel.bone == bone).expect("the joint moves");
            channel.keys = keys;
            for tangents in channel.tangents.iter_mut().flat_map(|all| all.iter_mut().skip(from)) {
                *tangents = tangents.map(|tangent| -tangent);
            }
        }
    }
    write::glb(motion, "Take-off", &channels)
}

/// Few keys with the rates of the motion itself, on a cubic.
fn cubic_channel(bone: usize, turns: &[Rotor], rate: f64) -> Channel {
    let last = turns.len() - 1;
    let key_frames: Vec<usize> = (0..turns.len()).step_by(NECK_KEY_FRAMES).collect();
    let tangent = |frame: usize| {
        let (before, after) = (turns[frame.max(1) - 1], turns[(frame + 1).min(last)]);
        let per_second = rate / ((frame + 1).min(last) - (frame.max(1) - 1)) as f64;
        Rotor::new(after.s - before.s, after.yz - before.yz, after.zx - before.zx, after.xy - before.xy)
            .scale(per_second)
    };
    Channel {
        bone,
        times: key_frames.iter().map(|&frame| frame as f64 / rate).collect(),
        keys: key_frames.iter().map(|&frame| turns[frame]).collect(),
        tangents: Some(key_frames.iter().map(|&frame| [tangent(frame); 2]).collect()),
    }
}

fn crane_csv(motion: &Motion, faulty: bool) -> Vec<u8> {
    let mut slewing: Vec<[f64; 3]> =
        (0..motion.poses.len()).map(|row| [0.0, 0.0, crane::slew_deg(row as f64 / motion.rate)]).collect();
    let mut boom: Vec<[f64; 3]> = motion
        .unrolled(motion.bone("Boom"))
        .into_iter()
        .map(|rotor| rotor.plane_angles().to_degrees())
        .collect();
    let mut fall = motion.unrolled(motion.bone("Fall"));
    let mut hook = motion.unrolled(motion.bone("Hook"));
    if faulty {
        for triple in &mut slewing {
            triple[2] = within_half_turn(triple[2]);
        }
        for row in frames(CRANE, SnagKind::Spike, "Boom") {
            boom[row][0] += 16.0;
        }
        for row in frames(CRANE, SnagKind::SignFlip, "Fall") {
            fall[row] = -fall[row];
        }
        for row in frames(CRANE, SnagKind::BrokenValue, "Hook") {
            hook[row] = hook[row].scale(0.86);
        }
    }
    let joints = [
        (motion.bone("Slewing"), Columns::Angles(slewing)),
        (motion.bone("Boom"), Columns::PlaneAngles(boom)),
        (motion.bone("Fall"), Columns::Rotors(fall)),
        (motion.bone("Hook"), Columns::Rotors(hook)),
    ];
    write::csv(motion, &joints)
}

/// An angle as captures store it, from −180° to 180°.
fn within_half_turn(degrees: f64) -> f64 {
    degrees - 360.0 * (degrees / 360.0).round()
}

fn folder(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

/// The scene of a clip that nothing has been done to, which lies beside it.
fn scene_bytes(clip_name: &str, clip_bytes: &[u8]) -> Vec<u8> {
    let folder = tempfile::tempdir().expect("a temporary folder");
    let clip_path = folder.path().join(clip_name);
    let opened = exchange::open_bytes(&clip_path, clip_bytes.to_vec(), &OpenOptions::default());
    let source = opened.expect("a demo clip opens");
    let work = ClipWork::new(0, 0, source.clips[0].name.clone());
    let sources = vec![SourceRef {
        path: clip_path,
        sha256: source.sha256().to_owned(),
        reading: source.reading.clone(),
    }];
    let scene_path = folder.path().join("scene.ron");
    let document = Document { sources, works: vec![work] };
    ron::write(&scene_path, &document, &|_, _, _| String::new()).expect("the scene can be written");
    disk::read(&scene_path).expect("what was written can be read")
}

#[test]
fn demo_scenes_are_current() {
    let update = std::env::var_os("UPDATE_DEMOS").is_some();
    for (name, faulty, clean) in clips() {
        let scene = scene_bytes(name, &faulty);
        let scene_name = Path::new(name).with_extension("ron").to_string_lossy().into_owned();
        for (path, name, bytes) in [
            ("demo-scenes", name, faulty),
            ("demo-scenes", &scene_name, scene),
            ("tests/data/demo_clean", name, clean),
        ] {
            let path = folder(path).join(name);
            if update {
                disk::write(&path, &bytes).unwrap();
            }
            let found = disk::read(&path).unwrap();
            // Not `assert_eq`: nobody wants to read two lists of bytes.
            assert!(
                found == bytes,
                "{} is not what the generator makes; UPDATE_DEMOS=1 cargo test demo_scenes_are_current",
                path.display()
            );
        }
    }
}

fn open(path: &str, name: &str) -> Source {
    exchange::open(&folder(path).join(name), &OpenOptions::default()).expect("a demo clip opens")
}

/// Every planted fault is found at its frames, wraps besides, and nothing else.
#[test]
fn planted_faults_are_found_and_no_others() {
    for (name, planted, wrapped) in
        [("deckhand.bvh", DECKHAND, "Hips"), ("heron.glb", HERON, ""), ("crane.csv", CRANE, "Slewing")]
    {
        let source = open("demo-scenes", name);
        let clip = &source.clips[0];
        let survey = mend::survey(clip, &SurveyOptions::default(), &Unwatched).unwrap();
        let found: Vec<(SnagKind, &str, usize, usize)> = survey
            .snags
            .iter()
            .map(|snag| (snag.kind, clip.skeleton.label(snag.joint), snag.first_frame, snag.last_frame))
            .collect();
        for fault in planted {
            assert!(found.contains(fault), "{name}: {fault:?} is not among {found:?}");
        }
        for snag in &found {
            let is_wrap = snag.0 == SnagKind::Wrap && snag.1 == wrapped;
            assert!(is_wrap || planted.contains(snag), "{name}: {snag:?} was not planted");
        }
        assert_eq!(found.iter().any(|snag| snag.0 == SnagKind::Wrap), !wrapped.is_empty(), "{name}");

        let clean = open("tests/data/demo_clean", name);
        let none = mend::survey(&clean.clips[0], &SurveyOptions::default(), &Unwatched).unwrap();
        assert!(none.snags.is_empty(), "{name}: {:?}", none.snags);

        // What was drawn anew is near the truth; all else is the truth.
        let apart = proof::measure(&clean.clips[0], &survey.mended, &Unwatched).unwrap();
        let most = apart.most_changed().unwrap();
        let degrees = most.change.value.to_degrees();
        assert!(degrees < 0.5, "{name}: {} is {degrees} degrees off its clean original", most.label);
    }
}

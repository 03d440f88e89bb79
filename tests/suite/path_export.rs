//! Paths, spacings and meant turns in files: what is written plays, as its format says, what the track plays.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use turnwright::clip::{Clip, MeantTurn, PathKind, Paths, RotationTrack, Spacing, Times};
use turnwright::exchange::{self, Guard, OpenOptions, disk, gltf};
use turnwright::rotor::{Axis, Bivector, EndRates, Rotor};

use crate::paths::clip_of;
use crate::support::assert_close;

fn folder() -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("path-export");
    std::fs::create_dir_all(&folder).expect("a folder for the tests");
    folder
}

fn about_z(degrees: f64) -> Rotor {
    Axis::Z.rotor(degrees.to_radians())
}

/// Keys at uneven times with steps up to 140°, the last arcs long in time.
fn keys() -> (Vec<f64>, Vec<Rotor>) {
    let turns =
        [[0.0, 0.0, 0.0], [40.0, 0.0, 0.0], [30.0, 60.0, -20.0], [10.0, -20.0, 110.0], [0.0, 5.0, 100.0]];
    let keys = turns.map(|degrees| Rotor::from_plane_angles(Bivector::from_degrees(degrees)));
    (vec![0.0, 1.0, 1.5, 3.0, 4.25], keys.to_vec())
}

fn smooth(path: PathKind) -> RotationTrack {
    let (times, keys) = keys();
    RotationTrack {
        paths: Paths::Every(path),
        ..RotationTrack::from_rotors(Times::Listed(times.into()), keys)
    }
}

/// The track of a new .glb of the clip, as our reader has it.
fn through_glb(track: &RotationTrack, name: &str) -> RotationTrack {
    let output = gltf::from_clip(&clip_of(track.clone(), 30.0), name).expect("sound");
    assert!(!output.notes.iter().any(|note| note.text.contains("degrees")), "{name}: {:?}", output.notes);
    // For the outside check: the three loader plays these too.
    disk::write(&folder().join(format!("{name}.glb")), &output.bytes).expect("sound");
    let none = |_: &str| Err("no file".to_owned());
    let (_, clips, _) = gltf::read(output.bytes, name, &none).expect("sound");
    clips[0].rotation(0).expect("sound").clone()
}

/// The largest difference at 3000 times in degrees.
fn largest_difference(a: &RotationTrack, b: &RotationTrack) -> f64 {
    let (start, end) = a.times.span().expect("sound");
    (0..=3000)
        .map(|step| start + (end - start) * f64::from(step) / 3000.0)
        .map(|time| a.at(time).turn_to(b.at(time)).to_degrees())
        .fold(0.0, f64::max)
}

fn turned_about_z(track: &RotationTrack) -> f64 {
    let (start, end) = track.times.span().expect("sound");
    let at = |step: i32| track.at(start + (end - start) * f64::from(step) / 6000.0);
    (0..6000).map(|step| (at(step).reverse() * at(step + 1)).plane_angles().xy).sum::<f64>().to_degrees()
}

#[test]
fn smooth_curves_become_cubics_within_the_tolerance() {
    let natural = smooth(PathKind::Spline).with_ends(EndRates::Natural);
    let (n, own) = (natural.segment_count(), MeantTurn::OTHER_WAY);
    let tracks = [
        ("squad", smooth(PathKind::Squad)),
        ("spline", smooth(PathKind::Spline)),
        ("b-spline", smooth(PathKind::BSpline)),
        ("natural", natural.clone()),
        ("eased", smooth(PathKind::Slerp).with_spacing(0..n, Spacing::EaseBoth).unwrap()),
        ("handles", natural.with_spacing(1..3, Spacing::nearest([[0.9, 0.0], [0.3, 0.9]])).unwrap()),
        ("turning", natural.with_turn(1, own).unwrap().with_turn(2, MeantTurn::new(2).unwrap()).unwrap()),
        (
            "mixed",
            natural.with_path(0..1, PathKind::Slerp).unwrap().with_path(2..3, PathKind::Squad).unwrap(),
        ),
        ("held", natural.with_path(1..2, PathKind::Hold).unwrap()),
        (
            "tangents",
            natural.with_path(0..n, PathKind::Cubic).unwrap().with_spacing(0..1, Spacing::EaseIn).unwrap(),
        ),
    ];
    for (name, track) in tracks {
        let written = through_glb(&track, name);
        assert_eq!(written.paths, Paths::Every(PathKind::Cubic), "{name}");
        let off = largest_difference(&track, &written);
        assert!(off <= 0.01, "{name}: {off} degrees off with {} keys", written.keys.len());
        // A cubic of the track itself may be longer than the 120° of all others.
        let least = if name == "tangents" { 0.0 } else { 0.4 };
        for pair in written.keys.windows(2) {
            assert!(pair[0].dot(pair[1]) > least, "{name}: neighbours of unlike signs or too far apart");
        }
        // Sparing with keys: a rate of 60 would take 256.
        assert!(written.keys.len() < 120, "{name}: {} keys", written.keys.len());
    }
}

#[test]
fn what_gltf_says_itself_stays_as_it_is() {
    let n = smooth(PathKind::Hold).segment_count();
    for (path, written) in [(PathKind::Hold, PathKind::Hold), (PathKind::Cubic, PathKind::Cubic)] {
        let track = smooth(PathKind::Slerp).with_path(0..n, path).unwrap();
        let found = through_glb(&track, path.name());
        assert_eq!((found.paths.clone(), found.keys.len()), (Paths::Every(written), n + 1));
        assert!(largest_difference(&track, &found) < 1e-4, "{path:?}");
    }
    // A key for each frame: short arcs are near enough, and less.
    let times: Vec<f64> = (0..200).map(|frame| f64::from(frame) / 60.0).collect();
    let keys: Vec<Rotor> = times.iter().map(|secs| smooth(PathKind::Spline).at(*secs)).collect();
    let dense = RotationTrack::from_rotors(Times::Listed(times.into()), keys);
    let dense = dense.with_path(40..80, PathKind::Spline).unwrap();
    let found = through_glb(&dense, "dense");
    assert_eq!(found.paths, Paths::Every(PathKind::Slerp));
    assert!(largest_difference(&dense, &found) <= 0.01);
}

/// 3 turns and 50°, then the other way round to 100°, then 30° more.
fn wheel() -> RotationTrack {
    let keys = [0.0, 50.0, 100.0, 130.0].map(about_z).to_vec();
    RotationTrack::from_rotors(Times::Listed([0.0, 1.0, 2.0, 3.0].into()), keys)
        .with_turn(0, MeantTurn::new(3).expect("allowed"))
        .expect("allowed")
        .with_turn(1, MeantTurn::OTHER_WAY)
        .expect("allowed")
}

const WHOLE_WHEEL: f64 = 1130.0 - 310.0 + 30.0;

#[test]
fn meant_turns_are_written_as_short_steps() {
    let found = through_glb(&wheel(), "wheel");
    assert_eq!(found.paths, Paths::Every(PathKind::Slerp));
    assert!((turned_about_z(&found) - WHOLE_WHEEL).abs() < 1e-3);
    for pair in found.keys.windows(2) {
        assert!(pair[0].turn_to(pair[1]) <= 120.001_f64.to_radians());
    }
    assert!(largest_difference(&wheel(), &found) <= 0.01);
    // In a plane of their own, with a short way beside.
    let leaning = MeantTurn::in_plane(2, Bivector::new(0.3, 0.0, 1.0)).unwrap();
    let track = smooth(PathKind::Slerp).with_turn(2, leaning).unwrap();
    assert!(largest_difference(&track, &through_glb(&track, "leaning")) <= 0.01);
}

#[test]
fn meant_turns_come_through_every_format() {
    // Frames a quarter and half a second apart: a step of the wheel is up to 565°.
    for rate in [2.0, 4.0, 30.0] {
        let clip = Arc::new(clip_of(wheel(), rate));
        // A source of its own for the result to be written from: the clip at rest.
        let glb = folder().join(format!("source-{rate}.glb"));
        let still =
            clip_of(RotationTrack::from_rotors(Times::Listed([0.0, 3.0].into()), [Rotor::IDENTITY; 2]), rate);
        disk::write(&glb, &gltf::from_clip(&still, "still").unwrap().bytes).unwrap();
        let source = exchange::open(&glb, &OpenOptions::default()).unwrap();
        let skeleton = Arc::clone(&source.clips[0].skeleton);
        let joint = skeleton.find("Wheel").unwrap();
        let mut result = Clip::clone(&source.clips[0]);
        result.grid = clip.grid.clone();
        let result = Arc::new(result.with_rotation(joint, wheel()));
        for ending in ["glb", "gltf", "bvh", "csv"] {
            let target = folder().join(format!("wheel-{rate}.{ending}"));
            let written =
                exchange::write(&source, std::slice::from_ref(&result), None, &target, &Guard::default())
                    .unwrap();
            let again = exchange::open(&target, &OpenOptions::default()).unwrap();
            let joint = again.clips[0].skeleton.find("Wheel").unwrap();
            let track = again.clips[0].rotation(joint).unwrap();
            let found = turned_about_z(track);
            assert!((found - WHOLE_WHEEL).abs() < 1e-3, "{ending} at {rate}: {found}");
            for key in 1..track.keys.len() {
                let step = track.sound_key(key - 1).turn_to(track.sound_key(key));
                assert!(step <= 120.01_f64.to_radians(), "{ending} at {rate}: a step of {step}");
            }
            // More rows than frames is told, where there are more.
            let is_told = written.notes.iter().any(|note| note.text.contains("meant turn"));
            assert_eq!(
                is_told,
                rate < 10.0 && ["bvh", "csv"].contains(&ending),
                "{ending}: {:?}",
                written.notes
            );
            if ending == "bvh" {
                // The angles themselves run on over the whole turns.
                let angles = &track.file_angles().unwrap().degrees;
                let z = |key: usize| angles[key][0];
                let last = angles.len() - 1;
                assert!((z(last) - z(0) - WHOLE_WHEEL).abs() < 1e-3, "{} to {}", z(0), z(last));
            }
        }
    }
}

#[test]
fn a_step_that_is_meant_in_a_bvh_file_gets_frames_between() {
    let text = "HIERARCHY\nROOT Wheel\n{\n\tOFFSET 0 0 0\n\tCHANNELS 3 Zrotation Xrotation Yrotation\n\tEnd Site\n\t{\n\
                \t\tOFFSET 0 1 0\n\t}\n}\nMOTION\nFrames: 4\nFrame Time: 0.5\n0 0 0\n10 0 0\n360 0 0\n375 0 0\n";
    let path = folder().join("meant.bvh");
    disk::write(&path, text.as_bytes()).unwrap();
    let source = exchange::open(&path, &OpenOptions::default()).unwrap();
    let track = source.clips[0].rotation(0).unwrap();
    // By itself the short way: back over 10°.
    assert!((turned_about_z(track) - 15.0).abs() < 1e-6);
    let meant = Arc::new(source.clips[0].with_rotation(0, track.with_turn(1, MeantTurn::OTHER_WAY).unwrap()));
    assert!((turned_about_z(meant.rotation(0).unwrap()) - 375.0).abs() < 1e-6);
    for ending in ["bvh", "csv", "glb"] {
        let target = folder().join(format!("meant-written.{ending}"));
        exchange::write(&source, std::slice::from_ref(&meant), None, &target, &Guard::default()).unwrap();
        let again = exchange::open(&target, &OpenOptions::default()).unwrap();
        let joint = again.clips[0].skeleton.find("Wheel").unwrap();
        let track = again.clips[0].rotation(joint).unwrap();
        assert!((turned_about_z(track) - 375.0).abs() < 1e-3, "{ending}: {}", turned_about_z(track));
        assert_close!(track.at(1.0), Rotor::IDENTITY, 1e-6);
        if ending == "bvh" {
            let angles = &track.file_angles().unwrap().degrees;
            assert_eq!((angles[0][0], angles.len()), (0.0, 10));
            assert!((angles[9][0] - 375.0).abs() < 1e-6, "{angles:?}");
        }
    }
}

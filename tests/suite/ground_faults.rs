//! Seams planted into real loops and slides planted into real stands, with known truth: what is found, and what is left of them.
#![expect(clippy::unwrap_used, reason = "a helper fails its test")]

use std::sync::Arc;

use glam::DVec3;
use turnwright::clip::{
    Clip, ContactOptions, FileAngles, FootPart, FrameGrid, JointTracks, LoopSeam, RotationTrack, Round,
    Times, contacts, leg_lengths, slides, standing_feet,
};
use turnwright::mend::{LoopOptions, PlantOptions, SurveyOptions, apply_all, close_loop, plant_feet, survey};
use turnwright::rotor::{Axis, Bivector, EulerOrder, Rotor};
use turnwright::skeleton::{EndTurn, Joint, JointKind, Reach, Skeleton, Transform};
use turnwright::snag::{LoopForm, Snag, SnagKind, Unwatched, find_in_clip};

use crate::planter::Random;
use crate::support::{assert_close, shared};

fn clips(file: &str) -> Vec<Arc<Clip>> {
    let Some(path) = shared(&format!("data/{file}")) else { return Vec::new() };
    turnwright::exchange::open(&path, &turnwright::exchange::OpenOptions::default()).unwrap().clips
}

/// One joint with a key at every frame.
fn one_joint(keys: Vec<Rotor>) -> Clip {
    let times = Times::Even { step_secs: 1.0 / 30.0, count: keys.len() };
    let joint = Joint {
        name: "joint".to_owned(),
        number: 0,
        parent: None,
        rest: Transform::IDENTITY,
        kind: JointKind::Joint,
        tips: vec![],
    };
    Clip {
        name: String::new(),
        skeleton: Arc::new(Skeleton::new(vec![joint]).unwrap()),
        duration_secs: times.span().unwrap().1,
        joints: vec![Arc::new(JointTracks {
            rotation: Some(RotationTrack::from_rotors(times.clone(), keys)),
            ..JointTracks::default()
        })],
        grid: FrameGrid { times, rate: 30.0 },
    }
}

/// `reference/method_checks.json`, `loop_close`.
#[test]
fn the_worked_example_of_the_methods_page_is_spread() {
    let mut keys: Vec<Rotor> = (0..4).map(|k| Axis::Y.rotor(f64::from(2 * k).to_radians())).collect();
    let axis = DVec3::new(0.1, 1.0, 0.0).normalize();
    keys.push(Rotor::from_plane_angles(Bivector::from_axis(axis * 9.5_f64.to_radians())));
    let clip = one_joint(keys);
    let options = LoopOptions {
        form: Some(LoopForm::Spread),
        with_rate: false,
        is_first_again: Some(true),
        up: DVec3::X,
    };
    let (closed, report) = close_loop(&clip, &options);
    let missing = report.seams[0].1.turn.axis() * (180.0 / std::f64::consts::PI);
    assert_close!(missing, DVec3::new(-0.945_285_330_699_49, -9.452_853_306_994_9, 0.0), 1e-9);
    let keys = &closed.rotation(0).unwrap().keys;
    let expected =
        Rotor::from_xyzw([0.004_123_404_283_158_43, 0.041_234_042_831_584_3, 0.0, 0.999_141_006_689_687]);
    assert_close!(keys[0], expected, 1e-9);
    assert_close!(keys[4], expected, 1e-9);
}

#[test]
fn whether_the_last_frame_is_the_first_again_is_told_from_the_motion() {
    let round = |count: usize, noise: f64| -> Vec<Rotor> {
        let mut random = Random::new(7);
        (0..count)
            .map(|frame| {
                let t = frame as f64 / 24.0 * std::f64::consts::TAU;
                let small = random.direction() * noise;
                Axis::Z.rotor(0.5 * t.sin() + small.x) * Axis::X.rotor(0.3 * (2.0 * t + 1.0).cos() + small.y)
            })
            .collect()
    };
    for noise in [0.0, 0.002] {
        assert!(
            Round::of(&one_joint(round(25, noise)), DVec3::Y).is_first_again,
            "frame 24 is frame 0 again"
        );
        assert!(
            !Round::of(&one_joint(round(24, noise)), DVec3::Y).is_first_again,
            "frame 0 follows frame 23"
        );
    }
    // The real loops end on their first pose, and none of their joints is told.
    for (file, names) in [
        ("gltf/Fox.glb", &["Walk", "Run"][..]),
        (
            "gltf/biped23_movement_clips.glb",
            &["Rig_Medium|Running_A", "Rig_Medium|Running_B", "Rig_Medium|Walking_A"],
        ),
        ("gltf/wasp.glb", &["WaspArmature|Wasp_Flying"]),
    ] {
        for clip in clips(file).iter().filter(|clip| names.contains(&clip.name.as_str())) {
            let round = Round::of(clip, DVec3::Y);
            assert!(round.is_first_again && round.first == 0, "{file} {}: {round:?}", clip.name);
            let told = find_in_clip(clip, SnagKind::Seam);
            assert!(told.is_empty(), "{file} {}: {:?}", clip.name, told.first().map(|snag| &snag.text));
        }
    }
}

#[test]
fn a_seam_that_is_planted_into_a_real_loop_is_found_and_closed() {
    let mut random = Random::new(20_261_201);
    let (mut planted, mut found, mut told_wrongly) = (0, 0, 0);
    for file in ["gltf/Fox.glb", "gltf/biped23_movement_clips.glb", "gltf/wolf.glb", "gltf/wasp.glb"] {
        for clip in clips(file) {
            if !find_in_clip(&clip, SnagKind::Seam).is_empty() || clip.grid.count() < 12 {
                continue;
            }
            let moving: Vec<usize> = (0..clip.joints.len())
                .filter(|&joint| clip.skeleton.joints()[joint].kind == JointKind::Joint)
                .filter(|&joint| clip.rotation(joint).is_some_and(|track| track.keys.len() > 8))
                .collect();
            for _ in 0..6 {
                let joint = moving[random.whole(0, moving.len() - 1)];
                let off = random.direction() * random.between(3.0, 25.0).to_radians();
                let track = clip.rotation(joint).unwrap();
                // A drift that grows: the motion itself stays as it is.
                let end = clip.grid.time(clip.grid.count() - 1);
                let keys: Vec<Rotor> = (0..track.keys.len())
                    .map(|key| {
                        let by = off * (track.times.at(key) / end).clamp(0.0, 1.0);
                        track.keys[key] * Rotor::from_plane_angles(Bivector::from_axis(by))
                    })
                    .collect();
                let drifting =
                    clip.with_rotation(joint, RotationTrack { keys: keys.into(), ..track.clone() });
                let options = SurveyOptions { kinds: vec![SnagKind::Seam], ..SurveyOptions::default() };
                let survey = survey(&drifting, &options, &Unwatched).unwrap();
                planted += 1;
                told_wrongly += survey.snags.iter().filter(|snag| snag.joint != joint).count();
                if survey.snags.iter().any(|snag| snag.joint == joint) {
                    found += 1;
                    let left = find_in_clip(&survey.mended, SnagKind::Seam);
                    assert!(left.is_empty(), "{file} {}: {}", clip.name, left[0].text);
                    let seam = LoopSeam::of(&survey.mended, joint, Round::of(&clip, DVec3::Y), DVec3::Y);
                    assert!(seam.turn.length() < 1e-6, "{file} {}: {:?}", clip.name, seam);
                }
            }
        }
    }
    println!("seams: {found} of {planted} found, {told_wrongly} told wrongly");
    if planted > 0 {
        assert!(found * 100 >= planted * 98, "{found} of {planted}");
        assert!(told_wrongly * 100 <= planted * 3, "{told_wrongly}");
    }
}

#[test]
fn a_capture_is_closed_and_keeps_its_stride() {
    for clip in clips("bvh/walk01.bvh") {
        let (closed, report) = close_loop(&clip, &LoopOptions::default());
        assert!(report.seams.len() > 10);
        let left = find_in_clip(&closed, SnagKind::Seam);
        assert!(left.is_empty(), "{}", left[0].text);
        let way = |clip: &Clip| {
            let keys = clip.joints[0].translation.as_ref().unwrap().keys.clone();
            keys[keys.len() - 1] - keys[0]
        };
        let (before, after) = (way(&clip), way(&closed));
        // The way along the ground is the stride; up and down it closes.
        assert!(before.length() > 100.0 && (before - after).with_y(0.0).length() < 0.02 * before.length());
        // Rates meet too: played twice, the middle is as smooth as the rest.
        for joint in 0..closed.joints.len() {
            if let Some(track) = closed.rotation(joint) {
                let step =
                    |a: usize, b: usize| (track.sound_key(a).reverse() * track.sound_key(b)).plane_angles();
                let last = track.keys.len() - 1;
                let over = if report.round.is_first_again {
                    step(0, 1) - step(last - 1, last)
                } else {
                    step(last, 0) - step(last - 1, last)
                };
                let usual =
                    (0..last - 1).map(|k| (step(k + 1, k + 2) - step(k, k + 1)).length()).fold(0.0, f64::max);
                assert!(
                    over.length() < usual + 0.02,
                    "{}: {} over {usual}",
                    clip.skeleton.label(joint),
                    over.length()
                );
            }
        }
    }
}

/// A capture whose first frame is a calibration pose: a jump of 87° into the motion is no rate that the end would have to meet.
#[test]
fn a_calibration_pose_before_the_motion_is_not_of_the_loop() {
    for clip in clips("bvh/cmu_02_01_walk.bvh") {
        let round = Round::of(&clip, DVec3::Y);
        assert_eq!(round.first, 1);
        let last = clip.grid.count() - 1;
        let seams = find_in_clip(&clip, SnagKind::Seam);
        for snag in &seams {
            assert_eq!((snag.first_frame, snag.last_frame), (1, last), "{}", snag.text);
            let joint = snag.joint;
            let closed = turnwright::mend::apply(&clip, snag).unwrap();
            let [was, is] = [&clip, &closed].map(|clip| clip.rotation(joint).unwrap());
            assert_eq!(was.keys[0], is.keys[0], "{}", snag.text);
            let missing = LoopSeam::of(&clip, joint, round, DVec3::Y);
            let change = (0..=last).map(|key| was.keys[key].turn_to(is.keys[key])).fold(0.0, f64::max);
            // Half of what is missing at each end, and what brings the rates together.
            let most = 0.5 * missing.turn.length() + 0.05 * missing.turn_rate.length() + 1e-6;
            assert!(change < most, "{}: {change} of {most}", snag.text);
            let left = LoopSeam::of(&closed, joint, round, DVec3::Y);
            assert!(left.turn.length() < 1e-3 * missing.turn.length(), "{}: {left:?}", snag.text);
        }
        assert!(seams.len() > 5, "{}", seams.len());
        // Arms that end 70° from where they begin are no loop: not half of it is closed unasked.
        assert!(seams.iter().all(|snag| !snag.safe), "{seams:?}");
    }
}

/// The same clip with its own feet held still, so that it is known that they do not slide.
fn held(clip: &Clip) -> Clip {
    let feet = standing_feet(clip, DVec3::Y);
    let spans = contacts(clip, &feet, &ContactOptions::default()).spans;
    plant_feet(clip, &feet, &spans, &PlantOptions::default()).0
}

#[test]
fn a_slide_that_is_planted_under_a_real_foot_is_found_and_held() {
    let mut random = Random::new(20_261_202);
    let (mut planted, mut found, mut told_wrongly, mut told_of_held) = (0, 0, 0, 0);
    let (mut slid, mut left) = (0.0, 0.0);
    for file in [
        "bvh/cmu_02_01_walk.bvh",
        "bvh/walk01.bvh",
        "bvh/xyz_affective_walk.bvh",
        "bvh/mixed_order_6ch.bvh",
        "bvh/zxy_19joints_30fps.bvh",
    ] {
        for clip in clips(file) {
            let still = held(&clip);
            let feet = standing_feet(&still, DVec3::Y);
            let legs = leg_lengths(&still, &feet);
            let spans = contacts(&still, &feet, &ContactOptions::default()).spans;
            let long: Vec<_> = spans
                .iter()
                .filter(|span| span.part == FootPart::Ball)
                .filter(|span| (span.last_frame - span.first_frame) as f64 > 0.25 * clip.grid.rate)
                .collect();
            let told = find_in_clip(&still, SnagKind::Slide);
            for snag in &told {
                println!("{file}, feet held: {}", snag.text);
            }
            told_of_held += told.len();
            for _ in 0..long.len().min(12) {
                let span = long[random.whole(0, long.len() - 1)];
                let foot = &feet[span.foot];
                // Out and back along the ground within the plant, so that nothing else changes.
                let reach = random.between(0.08, 0.15) * legs[span.foot];
                let way = random.direction().with_y(0.0).normalize_or(DVec3::X) * reach;
                let length = (span.last_frame - span.first_frame) as f64;
                // No faster than a foot that is still taken for planted.
                let slow =
                    (length / clip.grid.rate * 0.33 * legs[span.foot] / 0.9 / (std::f64::consts::PI * reach))
                        .min(1.0);
                let mut tracks: Vec<(usize, RotationTrack)> = Vec::new();
                let joints = [foot.limb.upper, foot.limb.lower, foot.limb.end];
                let mut changes = vec![Vec::new(); 3];
                for frame in span.frames() {
                    let local = still.local_at(still.grid.time(frame));
                    let [_, _, end] = foot.limb.points(&still.skeleton, &local);
                    let t = (frame - span.first_frame) as f64 / length;
                    let shift = way * slow * (std::f64::consts::PI * t).sin().powi(2);
                    let reach = Reach { end_turn: EndTurn::Kept, ..Reach::to(end + shift) };
                    let bend = foot.limb.bend(&still.skeleton, &local, &reach).unwrap();
                    for (row, rotor) in changes.iter_mut().zip([bend.upper, bend.lower, bend.end.unwrap()]) {
                        row.push((frame, rotor));
                    }
                }
                for (joint, row) in joints.into_iter().zip(&changes) {
                    tracks.push((joint, still.rotation(joint).unwrap().with_keys(row)));
                }
                let sliding = tracks
                    .into_iter()
                    .fold(still.clone(), |clip, (joint, track)| clip.with_rotation(joint, track));
                let own = [*span];
                let before = slides(&sliding, &feet, &own, DVec3::Y)[0];
                if before.farthest < 0.04 * legs[span.foot] {
                    continue;
                }
                planted += 1;
                let snags = find_in_clip(&sliding, SnagKind::Slide);
                let hits: Vec<_> = snags
                    .iter()
                    .filter(|snag| snag.joint == foot.limb.end)
                    .filter(|snag| snag.first_frame <= span.last_frame && span.first_frame <= snag.last_frame)
                    .cloned()
                    .collect();
                let is_known = |snag: &Snag| {
                    hits.contains(snag)
                        || told.iter().any(|own| {
                            own.joint == snag.joint
                                && own.first_frame <= snag.last_frame
                                && snag.first_frame <= own.last_frame
                        })
                };
                told_wrongly += snags.iter().filter(|snag| !is_known(snag)).count();
                if !hits.is_empty() {
                    found += 1;
                    let mended = apply_all(&sliding, &hits).unwrap();
                    slid += before.path / legs[span.foot];
                    left += slides(&mended, &feet, &own, DVec3::Y)[0].path / legs[span.foot];
                }
            }
        }
    }
    println!(
        "slides: {found} of {planted} found, {told_wrongly} told wrongly, {told_of_held} of feet held before; {slid:.3} legs slid, {left:.3} after holding"
    );
    if planted > 0 {
        assert!(found * 100 >= planted * 90, "{found} of {planted}");
        assert!(told_of_held <= 6, "{told_of_held}");
        assert!(told_wrongly * 10 <= planted, "{told_wrongly} of {planted}");
        assert!(left < 0.1 * slid, "{left} of {slid}");
    }
}

#[test]
fn angles_of_a_file_stay_angles_when_its_loop_is_closed() {
    let degrees: Vec<[f64; 3]> =
        (0..20).map(|k| [f64::from(k), 20.0 * (f64::from(k) * 0.3).sin(), 5.0]).collect();
    let times = Times::Even { step_secs: 0.05, count: 20 };
    let angles =
        FileAngles { axes: EulerOrder::ZXY.axes().to_vec(), order: EulerOrder::ZXY, degrees: degrees.into() };
    let mut clip = one_joint(vec![Rotor::IDENTITY; 20]);
    clip.grid = FrameGrid { times: times.clone(), rate: 20.0 };
    let clip = clip.with_rotation(0, RotationTrack::from_angles(times, angles));
    let options = LoopOptions { is_first_again: Some(true), ..LoopOptions::default() };
    let (closed, _) = close_loop(&clip, &options);
    let track = closed.rotation(0).unwrap();
    let angles = track.file_angles().expect("the file's own form");
    for (key, triple) in angles.degrees.iter().enumerate() {
        assert_close!(angles.rotor(*triple), track.keys[key], 1e-9, "key {key}");
    }
    assert!(track.keys[0].turn_to(track.keys[19]) < 1e-9);
}

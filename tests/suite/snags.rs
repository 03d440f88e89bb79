//! Snags and mends: built clips in which one thing is wrong, and the real files with what is known to be wrong in them.
#![expect(clippy::unwrap_used, reason = "a helper fails its test, and the figures are what the test is for")]

use std::sync::Arc;

use serde_json::Value;
use turnwright::clip::{
    Clip, FileAngles, FrameGrid, JointTracks, PathKind, Paths, RotationTrack, Stored, Times, resampled,
};
use turnwright::exchange::{OpenOptions, open};
use turnwright::mend::{self, Survey, SurveyOptions};
use turnwright::rotor::{Axis, EulerOrder, Rotor, slerp};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};
use turnwright::snag::{Cancelled, Progress, Remedy, Snag, SnagKind, Unwatched};

use crate::support::{shared, shared_json};

/// A clip of one joint per track, all roots, 30 frames a second.
fn clip_of(tracks: Vec<RotationTrack>) -> Clip {
    let joints = (0..tracks.len())
        .map(|number| Joint {
            name: format!("joint{number}"),
            number,
            parent: None,
            rest: Transform::IDENTITY,
            kind: JointKind::Joint,
            tips: vec![],
        })
        .collect();
    let duration_secs = tracks[0].times.span().map_or(0.0, |(_, last)| last);
    Clip {
        name: String::new(),
        skeleton: Arc::new(Skeleton::new(joints).unwrap()),
        grid: FrameGrid { times: tracks[0].times.clone(), rate: 30.0 },
        joints: tracks
            .into_iter()
            .map(|track| Arc::new(JointTracks { rotation: Some(track), ..JointTracks::default() }))
            .collect(),
        duration_secs,
    }
}

fn even(count: usize) -> Times {
    Times::Even { step_secs: 1.0 / 30.0, count }
}

/// Calm motion about all three axes, in degrees, ZXY.
fn calm(count: usize) -> Vec<[f64; 3]> {
    let wave = |i: usize, speed: f64| (i as f64 * speed).sin();
    (0..count).map(|i| [60.0 * wave(i, 0.05), 35.0 * wave(i, 0.07), 80.0 * wave(i, 0.03)]).collect()
}

fn angles(degrees: Vec<[f64; 3]>) -> RotationTrack {
    RotationTrack::from_angles(
        even(degrees.len()),
        FileAngles { axes: vec![Axis::Z, Axis::X, Axis::Y], order: EulerOrder::ZXY, degrees: degrees.into() },
    )
}

fn rotors(count: usize) -> Vec<Rotor> {
    calm(count).into_iter().map(|triple| EulerOrder::ZXY.to_rotor(triple.map(f64::to_radians))).collect()
}

fn all(clip: &Clip) -> Survey {
    mend::survey(clip, &SurveyOptions::default(), &Unwatched).unwrap()
}

/// The only snag, in its kind and frames.
#[track_caller]
fn only(survey: &Survey, kind: SnagKind, frames: (usize, usize)) -> Snag {
    let told: Vec<&str> = survey.snags.iter().map(|snag| snag.text.as_str()).collect();
    assert_eq!(survey.snags.len(), 1, "{told:?}");
    let snag = &survey.snags[0];
    assert_eq!((snag.kind, snag.first_frame, snag.last_frame), (kind, frames.0, frames.1), "{told:?}");
    snag.clone()
}

/// `mended` is `truth` in every key, to `tolerance` degrees, and every key not in `keys` has the bits of `broken`.
#[track_caller]
fn is_mended(
    broken: &Clip,
    mended: &Clip,
    truth: &Clip,
    keys: std::ops::RangeInclusive<usize>,
    tolerance: f64,
) {
    let [broken, mended, truth] = [broken, mended, truth].map(|clip| clip.rotation(0).unwrap());
    for key in mended.changed_keys(broken) {
        assert!(keys.contains(&key), "key {key} outside {keys:?} was changed");
    }
    for key in 0..truth.keys.len() {
        let error = mended.sound_key(key).turn_to(truth.sound_key(key)).to_degrees();
        assert!(error <= tolerance, "key {key}: {error}° from the truth");
    }
}

#[test]
fn a_sound_clip_has_no_snags_and_stays_the_very_same() {
    let clip = clip_of(vec![angles(calm(200)), RotationTrack::from_rotors(even(200), rotors(200))]);
    let survey = all(&clip);
    assert_eq!(survey.snags, []);
    for (own, mended) in clip.joints.iter().zip(&survey.mended.joints) {
        assert!(Arc::ptr_eq(own, mended));
    }
}

#[test]
fn lengths_off_one_are_one_snag_and_made_unit() {
    let truth = clip_of(vec![RotationTrack::from_rotors(even(60), rotors(60))]);
    let mut keys = rotors(60);
    keys[20..30].iter_mut().for_each(|key| *key = key.scale(1.05));
    keys[40] = keys[40].scale(7.0);
    let broken = clip_of(vec![RotationTrack::from_rotors(even(60), keys)]);
    let survey = all(&broken);
    let found: Vec<_> =
        survey.snags.iter().map(|snag| (snag.first_frame, snag.last_frame, snag.remedy)).collect();
    assert_eq!(found, [(20, 29, Remedy::Normalise), (40, 40, Remedy::Normalise)]);
    is_mended(&broken, &survey.mended, &truth, 20..=40, 1e-9);
}

#[test]
fn values_that_are_no_rotation_are_drawn_anew() {
    let truth = clip_of(vec![angles(calm(120))]);
    let mut degrees = calm(120);
    degrees[50] = [f64::NAN, 0.0, 0.0];
    degrees[51][1] = f64::INFINITY;
    degrees[0][0] = f64::NAN;
    let broken = clip_of(vec![angles(degrees)]);
    let survey = all(&broken);
    let found: Vec<_> = survey.snags.iter().map(|snag| (snag.first_frame, snag.last_frame)).collect();
    assert_eq!(found, [(0, 0), (50, 51)]);
    let mended = survey.mended.rotation(0).unwrap();
    for key in [50, 51] {
        let error = mended.keys[key].turn_to(truth.rotation(0).unwrap().keys[key]).to_degrees();
        assert!(error < 0.05, "{error}");
        let triple = mended.file_angles().unwrap().degrees[key];
        assert!((0..3).all(|i| (triple[i] - calm(120)[key][i]).abs() < 0.1), "{triple:?}");
    }
    assert_eq!(mended.changed_keys(broken.rotation(0).unwrap()), [0, 50, 51]);
}

#[test]
fn a_run_of_the_wrong_sign_is_one_snag_and_sampling_stays() {
    let truth = clip_of(vec![RotationTrack::from_rotors(even(60), rotors(60))]);
    for (first, last) in [(20, 34), (40, 59), (0, 3)] {
        let mut keys = rotors(60);
        keys[first..=last].iter_mut().for_each(|key| *key = -*key);
        let broken = clip_of(vec![RotationTrack::from_rotors(even(60), keys)]);
        let survey = all(&broken);
        let snag = only(&survey, SnagKind::SignFlip, (first, last));
        assert!(snag.safe);
        is_mended(&broken, &survey.mended, &truth, first..=last, 0.0);
        assert_eq!(survey.mended.rotation(0), truth.rotation(0));
        for i in 0..400 {
            let secs = f64::from(i) * 0.005;
            let (before, after) =
                (broken.rotation(0).unwrap().at(secs), survey.mended.rotation(0).unwrap().at(secs));
            assert!(before.turn_to(after) < 1e-12);
        }
    }
}

#[test]
fn a_turn_of_nearly_or_exactly_half_a_round_is_no_sign_flip() {
    let turn = |degrees: f64| Axis::Y.rotor(degrees.to_radians());
    // The halves of 0°, 178° and −2°: the stored signs are opposite, and the joint really turns.
    let near = clip_of(vec![RotationTrack::from_rotors(even(3), vec![turn(0.0), turn(182.0), turn(185.0)])]);
    assert_eq!(all(&near).snags, []);
    let exact = Rotor::from_xyzw([0.0, 1.0, 0.0, 0.0]);
    let exact = clip_of(vec![RotationTrack::from_rotors(even(2), vec![Rotor::IDENTITY, exact])]);
    let survey = all(&exact);
    let snag = only(&survey, SnagKind::SignFlip, (1, 1));
    assert_eq!(snag.remedy, Remedy::Ask);
    assert!(!snag.safe && snag.text.contains("ambiguous"), "{}", snag.text);
    assert!(Arc::ptr_eq(&exact.joints[0], &survey.mended.joints[0]));
}

#[test]
fn whole_turns_in_an_angle_are_taken_out_to_the_last_digit() {
    let truth = clip_of(vec![angles(calm(90))]);
    for (first, last, turns) in
        [(30, 50, [360.0, 0.0, 0.0]), (60, 89, [0.0, 0.0, -720.0]), (0, 20, [0.0, 360.0, 360.0])]
    {
        let mut degrees = calm(90);
        for triple in &mut degrees[first..=last] {
            (0..3).for_each(|i| triple[i] += turns[i]);
        }
        let broken = clip_of(vec![angles(degrees)]);
        let survey = all(&broken);
        only(&survey, SnagKind::Wrap, (first, last));
        is_mended(&broken, &survey.mended, &truth, first..=last, 1e-9);
        let mended = survey.mended.rotation(0).unwrap().file_angles().unwrap();
        for (own, triple) in mended.degrees.iter().zip(calm(90)) {
            assert!((0..3).all(|i| (own[i] - triple[i]).abs() < 1e-10), "{own:?} {triple:?}");
        }
    }
}

#[test]
fn plane_angles_that_went_round_the_other_way_come_back() {
    // A joint that turns on past half a round, as a file writes it whose angles stay within half a round.
    let track = |wrapped: bool| {
        let degrees = (0..60).map(|i| {
            let along = 120.0 + 2.0 * f64::from(i);
            let short = if wrapped && along > 180.0 { along - 360.0 } else { along };
            [0.6 * short, 0.0, 0.8 * short]
        });
        RotationTrack::from_plane_angles(even(60), degrees.collect())
    };
    let (broken, truth) = (clip_of(vec![track(true)]), clip_of(vec![track(false)]));
    let survey = all(&broken);
    only(&survey, SnagKind::Wrap, (31, 59));
    is_mended(&broken, &survey.mended, &truth, 31..=59, 1e-9);
    assert_eq!(all(&truth).snags, []);
}

#[test]
fn mirrored_triples_go_back_to_the_branch_of_the_rest() {
    let truth = clip_of(vec![angles(calm(90))]);
    for (first, last) in [(30, 50), (60, 89), (0, 10), (44, 44)] {
        let mut degrees = calm(90);
        for triple in &mut degrees[first..=last] {
            let [a, b, c] = *triple;
            let fold = |angle: f64| if angle > 180.0 { angle - 360.0 } else { angle };
            *triple = [fold(a + 180.0), fold(180.0 - b), fold(c + 180.0)];
        }
        let broken = clip_of(vec![angles(degrees)]);
        let survey = all(&broken);
        only(&survey, SnagKind::MirroredAngles, (first, last));
        is_mended(&broken, &survey.mended, &truth, first..=last, 1e-9);
        let mended = survey.mended.rotation(0).unwrap().file_angles().unwrap();
        for (own, triple) in mended.degrees.iter().zip(calm(90)) {
            assert!((0..3).all(|i| (own[i] - triple[i]).abs() < 1e-10), "{own:?} {triple:?}");
        }
    }
}

#[test]
fn a_stored_step_over_half_a_turn_with_a_real_move_is_told_and_left() {
    let mut degrees = vec![[0.0, 10.0, 20.0]; 40];
    degrees[20..].iter_mut().for_each(|triple| triple[2] = 240.0);
    let clip = clip_of(vec![angles(degrees)]);
    let survey = all(&clip);
    let snag = only(&survey, SnagKind::LongWay, (19, 20));
    assert!(!snag.safe);
    assert!(Arc::ptr_eq(&clip.joints[0], &survey.mended.joints[0]));
}

#[test]
fn a_cubic_that_goes_the_long_way_takes_the_short_one() {
    let turn = |degrees: f64| Axis::Z.rotor(degrees.to_radians());
    let mut track = RotationTrack::from_rotors(
        even(6),
        vec![turn(0.0), turn(20.0), -turn(40.0), -turn(60.0), -turn(80.0), -turn(100.0)],
    );
    track.paths = Paths::Every(PathKind::Cubic);
    track.tangents = Some(vec![[Rotor::new(0.0, 0.0, 0.0, 0.0); 2]; 6].into());
    let clip = clip_of(vec![track]);
    let survey = all(&clip);
    let snag = only(&survey, SnagKind::LongWay, (1, 2));
    assert!((snag.size_rad.to_degrees() - 340.0).abs() < 1e-9);
    let middle = |clip: &Clip| clip.rotation(0).unwrap().at(0.05);
    assert!(middle(&clip).turn_to(turn(30.0)).to_degrees() > 100.0);
    assert!(middle(&survey.mended).turn_to(turn(30.0)).to_degrees() < 1e-6);
}

#[test]
fn one_mend_by_itself_is_what_the_survey_did() {
    let mut keys = rotors(60);
    keys[20..30].iter_mut().for_each(|key| *key = -*key);
    keys[40] = Rotor::new(f64::NAN, 0.0, 0.0, 0.0);
    let clip = clip_of(vec![
        RotationTrack::from_rotors(even(60), rotors(60)),
        RotationTrack::from_rotors(even(60), keys),
    ]);
    let survey = all(&clip);
    assert_eq!(survey.snags.len(), 2);
    let mut stepwise = clip.clone();
    for snag in &survey.snags {
        let before = stepwise.clone();
        stepwise = mend::apply(&before, snag).unwrap();
        assert!(Arc::ptr_eq(&before.joints[0], &stepwise.joints[0]), "another joint was touched");
        let change = mend::change_rad(&before, &stepwise, 1);
        assert!(if snag.kind == SnagKind::SignFlip { change < 1e-12 } else { change > 0.0 });
    }
    assert_eq!(stepwise.joints, survey.mended.joints);
    assert_eq!(mend::apply_all(&clip, &survey.snags).unwrap().joints, survey.mended.joints);
}

#[test]
fn a_snag_that_does_not_fit_is_told() {
    let clip = clip_of(vec![RotationTrack::from_rotors(even(60), rotors(60))]);
    let mut keys = rotors(60);
    keys[50] = -keys[50];
    let mut snag = all(&clip_of(vec![RotationTrack::from_rotors(even(60), keys)])).snags.remove(0);
    snag.last_key = 60;
    let error = mend::apply(&clip, &snag).unwrap_err().to_string();
    assert_eq!(error, "joint `joint0` has 60 keys, expected key 60 among them");
    snag.joint = 9;
    assert_eq!(
        mend::apply(&clip, &snag).unwrap_err().to_string(),
        "joint `9` has no rotation keys, expected some to mend"
    );
}

#[test]
fn a_survey_can_be_stopped() {
    struct Stop;
    impl Progress for Stop {
        fn report(&self, done: usize, _total: usize) -> bool {
            done < 2
        }
    }
    let clip = clip_of((0..4).map(|_| angles(calm(50))).collect());
    assert_eq!(mend::survey(&clip, &SurveyOptions::default(), &Stop).err(), Some(Cancelled));
}

/// A record of `natural_faults.json` and the snags of its clip.
struct Known {
    file: String,
    record: Value,
    joint: Option<usize>,
    clip: Arc<Clip>,
    survey: Arc<Survey>,
}

impl Known {
    fn text(&self, field: &str) -> &str {
        self.record[field].as_str().unwrap_or("")
    }

    /// The frame after the step.
    fn frame(&self) -> usize {
        let time = self.record["t"].as_f64();
        match self.record["frame"].as_u64().or(self.record["worst_row"].as_u64()) {
            Some(frame) => frame as usize,
            None => self.clip.grid.frame(time.expect("a glTF record has a time")),
        }
    }

    /// Whether a snag of one of these kinds begins at the step or ends before it.
    fn is_border_of(&self, kinds: &[SnagKind]) -> bool {
        let frame = self.frame();
        self.survey.snags.iter().any(|snag| {
            Some(snag.joint) == self.joint
                && kinds.contains(&snag.kind)
                && (snag.first_frame == frame || self.frame_of_key(snag.last_key + 1) == Some(frame))
        })
    }

    fn frame_of_key(&self, key: usize) -> Option<usize> {
        let times = &self.clip.rotation(self.joint?)?.times;
        (key < times.len()).then(|| self.clip.grid.frame(times.at(key)))
    }

    fn is_inside(&self, kinds: &[SnagKind]) -> bool {
        let inside = |snag: &&Snag| Some(snag.joint) == self.joint && kinds.contains(&snag.kind);
        self.survey.snags.iter().filter(inside).any(|snag| snag.covers(self.frame()))
    }
}

fn known_faults() -> Option<Vec<Known>> {
    let list = shared_json("data/natural_faults.json")?;
    let mut known = Vec::new();
    for (file, records) in list.as_object().unwrap() {
        let source = open(&shared(&format!("data/{file}"))?, &OpenOptions::default()).unwrap();
        let surveys: Vec<Arc<Survey>> = source.clips.iter().map(|clip| Arc::new(all(clip))).collect();
        for record in records.as_array().unwrap() {
            let name = record["anim"].as_str();
            let index =
                name.and_then(|name| source.clips.iter().position(|clip| clip.name == name)).unwrap_or(0);
            let clip = source.clips[index].clone();
            let joint = record["joint"].as_str().and_then(|name| clip.skeleton.find(name));
            let survey = surveys[index].clone();
            known.push(Known { file: file.clone(), record: record.clone(), joint, clip, survey });
        }
    }
    Some(known)
}

#[test]
fn the_natural_faults_of_the_real_files_are_found() {
    let Some(known) = known_faults() else { return };
    let mut missing = Vec::new();
    let mut counted = [0; 4];
    for fault in &known {
        let (kind, found) = match fault.text("kind") {
            "sign_flip" => (0, fault.is_border_of(&[SnagKind::SignFlip])),
            // Inside the dance's flips a step of numbers can also be the flip itself.
            "euler_wrap" => {
                let kinds = [SnagKind::Wrap, SnagKind::MirroredAngles, SnagKind::HalfTurn];
                (1, fault.is_border_of(&kinds))
            }
            "gimbal_branch_flip" => (2, fault.is_border_of(&[SnagKind::MirroredAngles])),
            "non_unit" => (3, fault.is_inside(&[SnagKind::BrokenValue])),
            _ => continue,
        };
        counted[kind] += 1;
        if !found {
            missing.push(format!("{} {}", fault.file, fault.record));
        }
    }
    println!("sign flips, wraps, branch flips, lengths: {counted:?}");
    assert!(counted.iter().all(|count| *count > 0));
    assert!(missing.is_empty(), "{} missing:\n{}", missing.len(), missing.join("\n"));
}

/// Frames at which the sources page names a flip or spike of the dance's joints.
const DANCE: [(SnagKind, &str, &[usize]); 5] = [
    (SnagKind::HalfTurn, "RightUpLeg", &[121, 128, 146, 156, 165, 175, 192, 432, 459, 466]),
    (SnagKind::HalfTurn, "RightFoot", &[121, 128, 146, 156, 165, 175, 192, 432, 459, 466]),
    (SnagKind::Spike, "RightToeBase", &[262, 368, 491, 540]),
    (SnagKind::Spike, "LeftArm", &[93]),
    (SnagKind::Spike, "LeftHand", &[509]),
];

#[test]
fn the_flips_and_spikes_of_the_dance_are_found() {
    let Some(path) = shared("data/bvh/cmu_05_06_dance.bvh") else { return };
    let clip = open(&path, &OpenOptions::default()).unwrap().clips.remove(0);
    let survey = all(&clip);
    for (kind, joint, frames) in DANCE {
        let own: Vec<&Snag> = survey
            .snags
            .iter()
            .filter(|snag| snag.kind == kind && clip.skeleton.label(snag.joint) == joint)
            .collect();
        for frame in frames {
            let is_told = own.iter().any(|snag| match kind {
                SnagKind::HalfTurn => snag.first_frame == *frame || snag.last_frame + 1 == *frame,
                _ => snag.covers(*frame),
            });
            assert!(is_told, "{kind} of {joint} at frame {frame} is missing");
        }
    }
    // A foot that jumps and does not come back is told.
    let foot = clip.skeleton.find("LeftFoot").unwrap();
    let is_told = survey.snags.iter().any(|snag| snag.joint == foot && snag.covers(270));
    assert!(is_told, "the jump of LeftFoot at frame 270");
    // Mended, the hip goes on where it jumped, but for the two ways in and out that are half a flip.
    let hip = clip.skeleton.find("RightUpLeg").unwrap();
    let widest = |clip: &Clip| {
        let track = clip.rotation(hip).unwrap();
        (1..track.keys.len())
            .map(|key| track.keys[key - 1].turn_to(track.keys[key]))
            .fold(0.0, f64::max)
            .to_degrees()
    };
    println!("widest step of the hip: {:.1}° before, {:.1}° after", widest(&clip), widest(&survey.mended));
    assert!(widest(&clip) > 170.0);
    assert!(widest(&survey.mended) < 35.0);
}

/// Files of honest fast motion, and files of sound captures: nothing in them is a half-turn, a spike or a long way.
const HONEST: [&str; 15] = [
    "gltf/wasp.glb",
    "gltf/wolf.glb",
    "gltf/biped23_movement_clips.glb",
    "gltf/Fox.glb",
    "gltf/Fox_gltfpack.glb",
    "gltf/node_character.glb",
    "csv/humanoid3d_backflip_quat.csv",
    "csv/humanoid3d_cartwheel_quat.csv",
    "csv/humanoid3d_spinkick_quat.csv",
    "bvh/cmu_02_01_walk.bvh",
    "bvh/zxy_19joints_30fps.bvh",
    "bvh/walk01.bvh",
    "bvh/xyz_affective_walk.bvh",
    "bvh/yxz_23joints_120fps.bvh",
    "bvh/mixed_order_6ch.bvh",
];

/// The walker's right hand goes 11°, 19°, 16°, 20° from frame to frame near the end of the file, and the back with it: a
/// capture that trembles in earnest.
fn is_real(file: &str, snag: &Snag) -> bool {
    file.ends_with("cmu_02_01_walk.bvh") && snag.kind == SnagKind::Jitter && snag.first_frame >= 300
}

#[test]
fn honest_fast_motion_is_left_alone() {
    let moving = [SnagKind::LongWay, SnagKind::HalfTurn, SnagKind::Spike, SnagKind::Stuck, SnagKind::Jitter];
    let mut wrong = Vec::new();
    let (mut minutes, mut untouched) = (0.0, 0);
    for file in HONEST {
        let Some(path) = shared(&format!("data/{file}")) else { return };
        for clip in open(&path, &OpenOptions::default()).unwrap().clips {
            let survey = all(&clip);
            minutes += clip.duration_secs / 60.0 * clip.skeleton.listed().count() as f64;
            let told = |snag: &&Snag| moving.contains(&snag.kind) && !is_real(file, snag);
            for snag in survey.snags.iter().filter(told) {
                wrong.push(format!("{file}#{}: {}", clip.name, snag.text));
            }
            // What no snag was found in is the very same.
            for joint in 0..clip.joints.len() {
                if survey.snags.iter().all(|snag| snag.joint != joint || snag.remedy == Remedy::Ask) {
                    assert!(Arc::ptr_eq(&clip.joints[joint], &survey.mended.joints[joint]));
                    untouched += 1;
                }
            }
        }
    }
    println!("{} wrong in {minutes:.1} joint minutes; {untouched} joints untouched", wrong.len());
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// Toes that roll off the ground: nothing for most of a step, and then two or three keys far off.
fn toes(pushes: usize) -> Vec<Rotor> {
    let turn = |degrees: f64| EulerOrder::ZXY.to_rotor([0.0, degrees.to_radians(), 0.0]);
    let mut keys = Vec::new();
    for push in 0..pushes {
        // No two are alike to the degree, nor taken at the same moment.
        let (share, late) = (0.85 + 0.1 * (push % 4) as f64, push % 3);
        keys.extend((0..18 + late).map(|key| turn(-10.0 + 0.5 * (key as f64).sin())));
        keys.extend([-17.0, -33.0, -42.0 + 3.0 * late as f64].map(|degrees| turn(degrees * share)));
    }
    keys.extend((0..20).map(|_| turn(-10.0)));
    keys
}

#[test]
fn what_a_joint_does_with_each_step_is_no_spike() {
    let clip = |keys: Vec<Rotor>| clip_of(vec![RotationTrack::from_rotors(even(keys.len()), keys)]);
    let spikes = |clip: &Clip| -> Vec<(usize, usize)> {
        let is_spike = |snag: &&Snag| snag.kind == SnagKind::Spike;
        all(clip).snags.iter().filter(is_spike).map(|snag| (snag.first_frame, snag.last_frame)).collect()
    };
    assert_eq!(spikes(&clip(toes(8))), []);
    // A fault among them goes another way and stays one.
    let mut keys = toes(8);
    keys[100] = keys[100] * EulerOrder::ZXY.to_rotor([0.5, 0.0, 0.0]);
    assert_eq!(spikes(&clip(keys)), [(100, 100)]);
    // Done once, nothing speaks for it.
    assert_eq!(spikes(&clip(toes(1))).len(), 1);
}

#[test]
fn a_sound_walk_stays_sound_at_lower_rates() {
    let Some(path) = shared("data/bvh/xyz_affective_walk.bvh") else { return };
    let clip = &open(&path, &OpenOptions::default()).unwrap().clips[0];
    let moving = [SnagKind::HalfTurn, SnagKind::Spike, SnagKind::Stuck];
    for rate in [24.0, 25.0, 30.0, 40.0, 60.0, 90.0, 240.0] {
        let slower = resampled(clip, rate, 0.0, clip.duration_secs);
        let told: Vec<_> =
            all(&slower).snags.into_iter().filter(|snag| moving.contains(&snag.kind)).collect();
        assert!(told.is_empty(), "at {rate} a second: {told:#?}");
    }
}

#[test]
fn mends_of_numbers_change_no_pose_and_every_mend_keeps_the_rest() {
    for file in ["bvh/cmu_05_06_dance.bvh", "gltf/wolf.glb", "gltf/biped23_movement_clips.glb"] {
        let Some(path) = shared(&format!("data/{file}")) else { return };
        for clip in open(&path, &OpenOptions::default()).unwrap().clips {
            let survey = all(&clip);
            let mut working = (*clip).clone();
            let mut in_order: Vec<&Snag> = survey.snags.iter().collect();
            in_order.sort_by_key(|snag| (snag.kind, snag.joint, snag.first_key, snag.last_key));
            for snag in in_order {
                let before = working;
                working = mend::apply(&before, snag).unwrap();
                for joint in (0..before.joints.len()).filter(|joint| *joint != snag.joint) {
                    assert!(Arc::ptr_eq(&before.joints[joint], &working.joints[joint]));
                }
                let (old, new) =
                    (before.rotation(snag.joint).unwrap(), working.rotation(snag.joint).unwrap());
                for key in new.changed_keys(old) {
                    assert!((snag.first_key..=snag.last_key).contains(&key), "{}: key {key}", snag.text);
                }
                if matches!(snag.kind, SnagKind::SignFlip | SnagKind::Wrap | SnagKind::MirroredAngles) {
                    for i in 0..200 {
                        let secs = clip.duration_secs * f64::from(i) / 199.0;
                        assert!(old.at(secs).turn_to(new.at(secs)) < 1e-9, "{} at {secs} s", snag.text);
                    }
                    if let Some(angles) = new.file_angles() {
                        for key in snag.first_key..=snag.last_key {
                            let error = angles.rotor(angles.degrees[key]).turn_to(new.keys[key]);
                            assert!(error < 1e-9, "{}: key {key} off by {error}", snag.text);
                        }
                    }
                }
            }
            assert_eq!(working.joints, survey.mended.joints, "{file}#{}", clip.name);
            // What is mended stays mended: nothing of the numeric kinds is left.
            let again = all(&survey.mended);
            let left: Vec<&str> = again
                .snags
                .iter()
                .filter(|snag| snag.kind <= SnagKind::MirroredAngles && snag.remedy != Remedy::Ask)
                .map(|snag| snag.text.as_str())
                .collect();
            println!(
                "{file}#{}: {} snags, then {} ({} numeric)",
                clip.name,
                survey.snags.len(),
                again.snags.len(),
                left.len()
            );
        }
    }
}

/// `keys` with half a turn about `axis` in the runs, as text over all frames.
fn flipped(keys: &[Rotor], runs: &[(usize, usize)], axis: Axis) -> Vec<Rotor> {
    let half = axis.rotor(std::f64::consts::PI);
    let off = |key: usize| runs.iter().any(|run| (run.0..=run.1).contains(&key));
    keys.iter().enumerate().map(|(key, own)| if off(key) { *own * half } else { *own }).collect()
}

#[track_caller]
fn half_turns_are(survey: &Survey, joint: usize, runs: &[(usize, usize)]) {
    let own: Vec<(usize, usize)> = survey
        .snags
        .iter()
        .filter(|snag| snag.joint == joint && snag.kind == SnagKind::HalfTurn)
        .map(|snag| (snag.first_frame, snag.last_frame))
        .collect();
    assert_eq!(own, runs);
}

#[track_caller]
fn worst_error_deg(mended: &Clip, truth: &[Rotor], joint: usize) -> f64 {
    let track = mended.rotation(joint).unwrap();
    let errors =
        track.keys.iter().zip(truth).map(|(own, truth)| own.normalize().turn_to(*truth).to_degrees());
    errors.fold(0.0, f64::max)
}

#[test]
fn half_turns_are_taken_out_wherever_they_lie() {
    let truth = rotors(240);
    let cases: [&[(usize, usize)]; 5] =
        [&[(60, 90)], &[(200, 239)], &[(0, 20)], &[(50, 59), (80, 110), (112, 130)], &[(77, 77)]];
    for runs in cases {
        for axis in [Axis::X, Axis::Y, Axis::Z] {
            let broken = clip_of(vec![RotationTrack::from_rotors(even(240), flipped(&truth, runs, axis))]);
            let survey = all(&broken);
            half_turns_are(&survey, 0, runs);
            let error = worst_error_deg(&survey.mended, &truth, 0);
            assert!(error < 0.3, "{runs:?} about {axis:?}: {error}°");
        }
    }
}

#[test]
fn whole_turns_that_a_flip_hides_are_taken_out_too() {
    // A heading that goes round, written as an exporter does, each frame by itself within ±180°; it passes 180° while the joint is flipped.
    let order = EulerOrder::ZXY;
    let truth: Vec<Rotor> = (0..240)
        .map(f64::from)
        .map(|i| order.to_rotor([100.0 + 0.7 * i, 20.0 * (0.05 * i).sin(), 5.0].map(f64::to_radians)))
        .collect();
    let stored: Vec<[f64; 3]> = flipped(&truth, &[(100, 140)], Axis::Y)
        .into_iter()
        .map(|pose| order.from_rotor(pose, 0.0).map(f64::to_degrees))
        .collect();
    let broken = clip_of(vec![angles(stored)]);
    let survey = all(&broken);
    let Stored::Angles(mended) = &survey.mended.rotation(0).unwrap().stored else {
        panic!("angles stay angles")
    };
    let step = |pair: &[[f64; 3]]| (0..3).map(|i| (pair[1][i] - pair[0][i]).abs()).fold(0.0, f64::max);
    let widest = mended.degrees.windows(2).map(step).fold(0.0, f64::max);
    assert!(widest < 20.0, "{widest}: {:?}", survey.snags.iter().map(|snag| &snag.text).collect::<Vec<_>>());
    assert!(worst_error_deg(&survey.mended, &truth, 0) < 0.3);
    // Passes mend kind by kind: that comes to the same.
    let mut sorted = survey.snags.clone();
    sorted.sort_by_key(|snag| (snag.kind, snag.joint, snag.first_key));
    let again = mend::apply_all(&broken, &sorted).unwrap();
    let Stored::Angles(again) = &again.rotation(0).unwrap().stored else { panic!("angles stay angles") };
    for (a, b) in again.degrees.iter().zip(mended.degrees.iter()) {
        assert!((0..3).all(|i| (a[i] - b[i]).abs() < 1e-9), "{a:?} {b:?}");
    }
}

#[test]
fn a_jump_without_a_way_back_is_told_and_left_to_a_person() {
    let turn = Axis::X.rotor(120.0_f64.to_radians());
    let keys: Vec<Rotor> = rotors(240)
        .iter()
        .enumerate()
        .map(|(key, own)| if key >= 100 { *own * turn } else { *own })
        .collect();
    let broken = clip_of(vec![RotationTrack::from_rotors(even(240), keys)]);
    let survey = all(&broken);
    let snag = only(&survey, SnagKind::HalfTurn, (100, 100));
    assert!(!snag.safe && snag.remedy == Remedy::Ask, "{snag:?}");
    assert!(snag.text.contains("frame 100") && snag.text.contains("does not come back"), "{}", snag.text);
    assert!(survey.mended.same_joint(&broken, 0));
}

#[test]
fn a_flip_says_why_its_side_is_the_wrong_one() {
    let broken =
        clip_of(vec![RotationTrack::from_rotors(even(240), flipped(&rotors(240), &[(60, 90)], Axis::Y))]);
    let text = only(&all(&broken), SnagKind::HalfTurn, (60, 90)).text;
    assert!(
        text.starts_with("joint0 flips 17") || text.contains(" flips 17") || text.contains(" flips 18"),
        "{text}"
    );
    assert!(text.contains("at frame 60 and back at 91; the 31 frames between are off"), "{text}");
    let of_one = |at: usize| {
        let keys = flipped(&rotors(240), &[(at, at)], Axis::Y);
        let broken = clip_of(vec![RotationTrack::from_rotors(even(240), keys)]);
        only(&all(&broken), SnagKind::HalfTurn, (at, at)).text
    };
    let text = of_one(60);
    assert!(text.contains("at frame 60 and back at 61; the frame between is off"), "{text}");
    let text = of_one(239);
    assert!(text.contains("of 240 frames this one alone is taken for the wrong side"), "{text}");
}

#[test]
fn a_child_that_turns_back_against_its_flipped_parent_is_mended_with_it() {
    let truth = rotors(240);
    let half = Axis::Y.rotor(std::f64::consts::PI);
    let parent = flipped(&truth, &[(60, 150)], Axis::Y);
    let child: Vec<Rotor> = truth
        .iter()
        .enumerate()
        .map(|(key, own)| if (60..=150).contains(&key) { half.reverse() * *own } else { *own })
        .collect();
    let broken = clip_of(vec![
        RotationTrack::from_rotors(even(240), parent),
        RotationTrack::from_rotors(even(240), child),
    ]);
    let survey = all(&broken);
    for joint in 0..2 {
        half_turns_are(&survey, joint, &[(60, 150)]);
        let error = worst_error_deg(&survey.mended, &truth, joint);
        assert!(error < 0.3, "{error}°");
    }
}

#[test]
fn a_calibration_pose_at_the_start_is_no_fault() {
    let mut keys = rotors(240);
    keys[0] = keys[0] * Axis::X.rotor(2.9);
    let clip = clip_of(vec![RotationTrack::from_rotors(even(240), keys)]);
    assert_eq!(all(&clip).snags, []);
}

#[test]
fn a_spike_is_found_at_every_rate_and_with_uneven_keys() {
    for rate in [24.0, 30.0, 60.0, 120.0, 240.0] {
        for uneven in [0.0, 0.3] {
            let secs: Vec<f64> =
                (0..200).map(|i| (f64::from(i) + uneven * f64::from(i * 7 % 5) / 5.0) / rate).collect();
            let truth: Vec<Rotor> = secs
                .iter()
                .map(|t| Axis::Z.rotor((1.5 * t).sin()) * Axis::X.rotor(0.7 * (2.2 * t).cos()))
                .collect();
            let mut keys = truth.clone();
            for key in [80, 81] {
                keys[key] = keys[key] * Axis::Y.rotor(0.6);
            }
            let track = RotationTrack::from_rotors(Times::Listed(secs.into()), keys);
            let mut broken = clip_of(vec![track]);
            broken.grid.rate = rate;
            let survey = all(&broken);
            only(&survey, SnagKind::Spike, (80, 81));
            let error = worst_error_deg(&survey.mended, &truth, 0);
            assert!(error < 0.3, "{rate} a second, uneven {uneven}: {error}°");
        }
    }
}

#[test]
fn a_foot_that_pushes_off_once_a_stride_is_left_alone_at_low_rates() {
    // A toe that bends more and more and is let go: a few keys at this rate, and they swell.
    const PUSH_DEG: [f64; 4] = [7.0, 19.0, 28.0, 12.0];
    let bend_deg = |key: usize| {
        let push = PUSH_DEG.get((key + 10) % 28).copied().unwrap_or(0.0);
        -10.0 - 0.8 * (0.2 * key as f64).sin() - push
    };
    let keys: Vec<Rotor> = (0..150).map(|key| Axis::X.rotor(bend_deg(key).to_radians())).collect();
    let times = Times::Listed((0..150).map(|key| f64::from(key) / 30.0).collect());
    let mut clip = clip_of(vec![RotationTrack::from_rotors(times, keys)]);
    clip.grid.rate = 30.0;
    assert_eq!(all(&clip).snags, []);
}

#[test]
fn a_held_track_may_jump() {
    let mut track = RotationTrack::from_rotors(even(60), flipped(&rotors(60), &[(20, 30)], Axis::Y));
    track.paths = Paths::Every(PathKind::Hold);
    assert_eq!(all(&clip_of(vec![track])).snags, []);
}

/// Three joints that are led by the same two slow waves, each in its own way, with a little of a capture's noise.
fn led_together(rate: f64, secs: f64) -> Vec<Vec<Rotor>> {
    let count = (secs * rate) as usize;
    let noise = |key: usize, joint: usize| {
        // A fixed scatter of about a hundredth of a degree.
        let scatter = ((key * 7919 + joint * 104_729) as f64 * 0.618_034).fract() - 0.5;
        4e-4 * scatter
    };
    let pose = |key: usize, joint: usize| {
        let t = key as f64 / rate;
        let (a, b) = ((5.1 * t).sin() + 0.4 * (11.3 * t).cos(), (7.7 * t + 0.5).cos());
        let n = noise(key, joint);
        match joint {
            0 => Axis::Z.rotor(0.5 * a + 0.2 * b + n) * Axis::X.rotor(0.3 * b - 0.2 * a),
            1 => Axis::X.rotor(0.4 * a + n) * Axis::Y.rotor(0.1 * b),
            _ => Axis::Y.rotor(0.35 * b + n) * Axis::Z.rotor(0.1 * a),
        }
    };
    (0..3).map(|joint| (0..count).map(|key| pose(key, joint)).collect()).collect()
}

fn clip_at(rate: f64, joints: &[Vec<Rotor>]) -> Clip {
    let times = |count: usize| Times::Even { step_secs: 1.0 / rate, count };
    let tracks =
        joints.iter().map(|keys| RotationTrack::from_rotors(times(keys.len()), keys.clone())).collect();
    let mut clip = clip_of(tracks);
    clip.grid.rate = rate;
    clip
}

#[test]
fn a_joint_that_is_stuck_is_drawn_from_what_the_others_do() {
    for rate in [24.0, 60.0, 120.0, 240.0] {
        let truth = led_together(rate, 8.0);
        let (first, last) = ((3.0 * rate) as usize, (3.4 * rate) as usize);
        let mut joints = truth.clone();
        let held = joints[0][first - 1];
        joints[0][first..=last].fill(held);
        let broken = clip_at(rate, &joints);
        let survey = all(&broken);
        let snag = only(&survey, SnagKind::Stuck, (first, last));
        assert!(snag.safe && snag.remedy == Remedy::FromOthers, "{}", snag.text);
        let mended = survey.mended.rotation(0).unwrap();
        assert!(
            mended.changed_keys(broken.rotation(0).unwrap()).iter().all(|key| (first..=last).contains(key))
        );
        let error = worst_error_deg(&survey.mended, &truth[0], 0);
        let across = |key: usize| {
            let share = (key + 1 - first) as f64 / (last + 2 - first) as f64;
            slerp(truth[0][first - 1], truth[0][last + 1], share).turn_to(truth[0][key])
        };
        let straight = (first..=last).map(across).fold(0.0, f64::max).to_degrees();
        assert!(error < 0.2 * straight, "{rate} a second: {error}°, straight across {straight}°");
        // No corner at the borders: from step to step the rate changes no more there than the truth's does near by.
        let bend = |keys: &[Rotor], key: usize| {
            let step = |key: usize| (keys[key - 1].reverse() * keys[key]).plane_angles();
            (step(key + 1) - step(key)).length()
        };
        let usual = (first - 8..=last + 8).map(|key| bend(&truth[0], key)).fold(0.0, f64::max);
        for key in [first - 1, first, last, last + 1] {
            let own = bend(&mended.keys, key);
            assert!(own < 1.5 * usual + 1e-3, "{rate} a second, key {key}: {own}, usual {usual}");
        }
    }
}

#[test]
fn a_joint_that_trembles_is_calmed_at_every_rate() {
    for (rate, most) in [(24.0, 0.75), (60.0, 0.5), (120.0, 0.4), (240.0, 0.3)] {
        let truth = led_together(rate, 8.0);
        let (first, last) = ((3.0 * rate) as usize, (5.0 * rate) as usize);
        let mut random = crate::planter::Random::new(7);
        let mut joints = truth.clone();
        for key in &mut joints[0][first..=last] {
            let mut shake = || Axis::Z.rotor(0.03 * random.normal()) * Axis::X.rotor(0.03 * random.normal());
            *key = *key * shake() * Axis::Y.rotor(0.03 * random.normal());
        }
        let broken = clip_at(rate, &joints);
        let survey = all(&broken);
        let told: Vec<&str> = survey.snags.iter().map(|snag| snag.text.as_str()).collect();
        assert_eq!(survey.snags.len(), 1, "{rate} a second: {told:?}");
        let snag = &survey.snags[0];
        assert_eq!(snag.kind, SnagKind::Jitter, "{told:?}");
        assert!(snag.safe && (snag.size_rad / 0.03 - 1.0).abs() < 0.25, "{}", snag.text);
        let near = 2 + (0.05 * rate) as usize;
        assert!(snag.first_key.abs_diff(first) <= near && snag.last_key.abs_diff(last) <= near, "{told:?}");
        let mended = survey.mended.rotation(0).unwrap();
        let inside = snag.first_key..=snag.last_key;
        assert!(mended.changed_keys(broken.rotation(0).unwrap()).iter().all(|key| inside.contains(key)));
        let rms = |keys: &[Rotor]| {
            let square = |key: usize| keys[key].turn_to(truth[0][key]).powi(2);
            ((first..=last).map(square).sum::<f64>() / (last + 1 - first) as f64).sqrt()
        };
        let share = rms(&mended.keys) / rms(&joints[0]);
        println!("{rate} a second: {share:.3} of the noise is left");
        assert!(share < most, "{rate} a second: {share}");
    }
}

#[test]
fn fast_wings_do_not_tremble() {
    // Up and down within three or four keys, a little differently each time.
    let beat = |key: usize, sign: f64| {
        let t = key as f64;
        Axis::X.rotor(sign * 0.8 * (1.9 * t).sin()) * Axis::Z.rotor(sign * 0.2 * (0.31 * t).cos())
    };
    let mut joints = led_together(24.0, 8.0);
    let count = joints[0].len();
    joints.push((0..count).map(|key| beat(key, 1.0)).collect());
    joints.push((0..count).map(|key| beat(key, -1.0)).collect());
    let told: Vec<String> = all(&clip_at(24.0, &joints)).snags.into_iter().map(|snag| snag.text).collect();
    assert!(told.is_empty(), "{told:?}");
}

#[test]
fn rests_that_are_meant_are_not_stuck() {
    let rate = 60.0;
    let sound = led_together(rate, 8.0);
    let none = |what: &str, joints: &[Vec<Rotor>]| {
        let told = all(&clip_at(rate, joints)).snags;
        assert!(told.is_empty(), "{what}: {}", told[0].text);
    };
    // The whole clip is held.
    let mut joints = sound.clone();
    for keys in &mut joints {
        let held = keys[199];
        keys[200..230].fill(held);
    }
    none("repeated frames", &joints);
    // A joint that never moves, and one that hardly ever does.
    let mut joints = sound.clone();
    joints[1].fill(Axis::X.rotor(0.2));
    let held = joints[2][0];
    joints[2][..400].fill(held);
    none("a joint at rest", &joints);
    // A pose that is eased into, held, and eased out of.
    let eased = |key: usize| {
        let along = |t: f64| t * t * (3.0 - 2.0 * t);
        let t = key as f64 / rate;
        match t {
            t if t < 2.0 => 0.4 * along(t / 2.0),
            t if t < 3.0 => 0.4,
            t if t < 6.0 => 0.4 + 0.6 * along((t - 3.0) / 3.0),
            t => 1.0 + 0.3 * (1.0 - (t - 6.0).cos()),
        }
    };
    let mut joints = sound.clone();
    joints[0] = (0..480).map(|key| Axis::Y.rotor(eased(key))).collect();
    none("an eased pose", &joints);
    // Straight ways between far keys, as a machine moves.
    let straight = |key: usize| match key {
        0..100 => 0.01 * key as f64,
        100..160 => 1.0,
        160..300 => 1.0 + 0.008 * (key - 160) as f64,
        _ => 2.12 - 0.006 * (key - 300) as f64,
    };
    let mut joints = sound.clone();
    joints[0] = (0..480).map(|key| Axis::Y.rotor(straight(key))).collect();
    none("a machine", &joints);
    // A knee that a solver holds at the end of its range, time and again.
    let mut joints = sound;
    let bend = |key: usize| (0.8 + 1.1 * (0.11 * key as f64).sin()).max(0.0);
    joints[0] = (0..480).map(|key| Axis::X.rotor(bend(key))).collect();
    none("a straight knee", &joints);
}

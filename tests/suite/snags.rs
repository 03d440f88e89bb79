//! Snags and mends: built clips in which one thing is wrong, and the real files with what is known to be wrong in them.

use std::sync::Arc;

use turnwright::clip::{Clip, FileAngles, FrameGrid, JointTracks, PathKind, Paths, RotationTrack, Times};
use turnwright::mend::{self, Survey, SurveyOptions};
use turnwright::rotor::{Axis, EulerOrder, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};
use turnwright::snag::{Cancelled, Progress, Remedy, Snag, SnagKind, Unwatched};

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

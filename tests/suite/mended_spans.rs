//! What every mend that draws keys anew keeps to, in a built clip: it goes on at its borders as fast as the motion beside it,
//! and it is found and made alike at any rate and in any unit of length.
#![expect(clippy::unwrap_used, reason = "a helper fails its test")]

use std::sync::Arc;

use glam::DVec3;
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times};
use turnwright::exchange::{self, OpenOptions};
use turnwright::mend::{SurveyOptions, change_at_tips, survey};
use turnwright::rotor::{Axis, Bivector, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};
use turnwright::snag::{SnagKind, Unwatched};

use crate::support::shared;

/// Seconds of the built clip.
const SECS: f64 = 6.0;

/// Where the faulty joint is off, in seconds.
const FAULT: (f64, f64) = (2.5, 2.52);

/// A chain of three limbs of this length that swing smoothly, at `rate` keys a second.
fn swinging(rate: f64, length: f64) -> Clip {
    let joints: Vec<Joint> = (0..3)
        .map(|number: usize| Joint {
            name: format!("limb{number}"),
            number,
            parent: number.checked_sub(1),
            rest: Transform { translation: DVec3::new(0.0, length, 0.0), ..Transform::IDENTITY },
            kind: JointKind::Joint,
            tips: if number == 2 { vec![DVec3::new(0.0, length, 0.0)] } else { vec![] },
        })
        .collect();
    let count = (SECS * rate) as usize + 1;
    let times = Times::Even { step_secs: 1.0 / rate, count };
    let tracks = (0..3).map(|joint| {
        let keys: Vec<Rotor> = (0..count).map(|key| truth(joint, key as f64 / rate)).collect();
        let rotation = Some(RotationTrack::from_rotors(times.clone(), keys));
        Arc::new(JointTracks { rotation, ..JointTracks::default() })
    });
    Clip {
        name: "swinging".to_owned(),
        joints: tracks.collect(),
        skeleton: Arc::new(Skeleton::new(joints).unwrap()),
        grid: FrameGrid { times, rate },
        duration_secs: SECS,
    }
}

fn truth(joint: usize, secs: f64) -> Rotor {
    let phase = secs * 2.3 + joint as f64;
    Axis::Z.rotor(0.5 * phase.sin()) * Axis::X.rotor(0.3 * (0.7 * phase).cos())
}

/// The same with the middle joint turned by 40° where the fault is.
fn with_spike(clip: &Clip) -> (Clip, usize, usize) {
    let track = clip.rotation(1).unwrap();
    let mut keys = track.keys.to_vec();
    let off = Rotor::from_plane_angles(Bivector::new(0.5, 0.4, 0.3));
    let first = track.times.nearest(FAULT.0);
    let last = track.times.nearest(FAULT.1).max(first).min(first + 2);
    keys[first..=last].iter_mut().for_each(|key| *key = *key * off);
    let track = RotationTrack { keys: keys.into(), ..track.clone() };
    (clip.with_rotation(1, track), first, last)
}

/// The body rate from a key to the next, in radians per second.
fn rate_from(track: &RotationTrack, key: usize) -> Bivector {
    let secs = track.times.at(key + 1) - track.times.at(key);
    (track.keys[key].reverse() * track.keys[key + 1]).plane_angles() * (1.0 / secs)
}

#[test]
fn a_spike_is_found_and_mended_alike_at_any_rate_and_in_any_unit() {
    for rate in [24.0, 30.0, 60.0, 120.0, 240.0] {
        for length in [0.3, 30.0] {
            let sound = swinging(rate, length);
            assert_eq!(survey(&sound, &SurveyOptions::default(), &Unwatched).unwrap().snags, []);
            let (broken, first, last) = with_spike(&sound);
            let found = survey(&broken, &SurveyOptions::default(), &Unwatched).unwrap();
            let keys: Vec<_> = found
                .snags
                .iter()
                .map(|snag| (snag.kind, snag.joint, snag.first_key, snag.last_key))
                .collect();
            assert_eq!(keys, [(SnagKind::Spike, 1, first, last)], "{rate} a second");
            let (mended, truth) = (found.mended.rotation(1).unwrap(), sound.rotation(1).unwrap());
            for key in first..=last {
                let error_deg = mended.keys[key].turn_to(truth.keys[key]).to_degrees();
                assert!(error_deg < 0.3, "{rate} a second: {error_deg}");
            }
            // 40° at the lower of two limbs' lengths below the joint moves the tip by about 2 · 2 · sin 20° of one.
            let moved = change_at_tips(&broken, &found.mended, &found.snags[0]) / length;
            assert!((0.7..1.5).contains(&moved), "{moved} lengths at {rate} a second");
        }
    }
}

#[test]
fn what_is_drawn_anew_goes_on_at_its_borders_as_fast_as_the_motion_beside_it() {
    for rate in [60.0, 120.0, 240.0] {
        let sound = swinging(rate, 1.0);
        let (broken, first, last) = with_spike(&sound);
        let found = survey(&broken, &SurveyOptions::default(), &Unwatched).unwrap();
        let mended = found.mended.rotation(1).unwrap();
        for border in [first - 1, last + 1] {
            let step = rate_from(mended, border) - rate_from(mended, border - 1);
            // What the motion's own acceleration, at most 0.5 · 2.3² and a little, does within a frame.
            let bound = 2.0 * 3.5 / rate;
            assert!(step.length() < bound, "{rate} a second: {} at key {border}", step.length());
        }
        // All other keys and joints are as they were, bit for bit.
        let old = broken.rotation(1).unwrap();
        let others = (0..old.keys.len()).filter(|key| !(first..=last).contains(key));
        assert!(others.into_iter().all(|key| old.keys[key] == mended.keys[key]));
        assert!(broken.same_joint(&found.mended, 0) && broken.same_joint(&found.mended, 2));
    }
}

/// The dance of the outside data has flips in the legs. Where only trembling is asked for they are no business of its mend.
#[test]
fn a_tremble_is_smoothed_within_a_bound_where_flips_are_not_looked_for() {
    let Some(path) = shared("data/bvh/cmu_05_06_dance.bvh") else { return };
    let source = exchange::open(&path, &OpenOptions::default()).unwrap();
    let options = SurveyOptions { kinds: vec![SnagKind::Jitter], ..SurveyOptions::default() };
    let found = survey(&source.clips[0], &options, &Unwatched).unwrap();
    assert!(found.snags.len() > 20, "{}", found.snags.len());
    let mut widest = 0.0_f64;
    for (snag, change) in found.snags.iter().zip(&found.changes_rad) {
        assert!(change.to_degrees() < 30.0, "{}: {}", snag.text, change.to_degrees());
        assert!(!snag.safe || snag.size_rad.to_degrees() < 12.1, "{}", snag.text);
        widest = widest.max(snag.size_rad);
    }
    assert!(widest.to_degrees() > 12.1, "there are flips: {widest}");
}

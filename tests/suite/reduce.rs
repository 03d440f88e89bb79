//! Key reduction on real clips: the bound, checked by other means than the search uses; the count, against the fewest there
//! could be.

use std::path::Path;

use turnwright::clip::{
    Clip, MeantTurn, PathKind, ReduceOptions, RotationTrack, Spacing, Times, reduced, reduced_together,
};
use turnwright::exchange::{self, OpenOptions, Source, encode, open_bytes};
use turnwright::rotor::{Bivector, Rotor};

use crate::support::{Distance, shared};

fn open(path: &str) -> Option<Source> {
    let path = shared(&format!("data/{path}"))?;
    Some(exchange::open(&path, &OpenOptions::default()).expect("a sound file"))
}

/// As [`Distance`] without a product, and slerp by its textbook formula (Shoemake 1985).
fn slerp(a: Rotor, b: Rotor, t: f64) -> Rotor {
    let b = if a.dot(b) < 0.0 { -b } else { b };
    let angle = 0.5 * a.distance_to(&b);
    if angle < 1e-9 {
        return if t < 0.5 { a } else { b };
    }
    let (from, to) = (((1.0 - t) * angle).sin() / angle.sin(), (t * angle).sin() / angle.sin());
    let mix = |x: f64, y: f64| from * x + to * y;
    Rotor::new(mix(a.s, b.s), mix(a.yz, b.yz), mix(a.zx, b.zx), mix(a.xy, b.xy))
}

/// The largest turn between two tracks at 9 times between neighbouring keys of the first, in degrees.
fn largest_change_deg(before: &RotationTrack, after: &RotationTrack) -> f64 {
    let keys: Vec<f64> = before.times.iter().collect();
    let mut largest: f64 = 0.0;
    for pair in keys.windows(2) {
        for part in 0..=9 {
            let secs = pair[0] + (pair[1] - pair[0]) * f64::from(part) / 9.0;
            largest = largest.max(before.at(secs).distance_to(&after.at(secs)));
        }
    }
    largest.to_degrees()
}

/// The fewest keys there can be, by the plain method: every span is tried, at every key and 3 times between neighbours, in
/// rising order of its end. What it finds is a lower bound for a search that holds the bound at all times.
fn fewest_by_trying_all(track: &RotationTrack, bound_deg: f64) -> usize {
    let keys: Vec<Rotor> = track.keys.iter().map(|key| key.normalize()).collect();
    let times: Vec<f64> = track.times.iter().collect();
    let fine = |key: usize, part: usize| match part {
        0 => keys[key],
        _ => slerp(keys[key], keys[key + 1], part as f64 / 4.0),
    };
    let played: Vec<Rotor> = (0..keys.len() - 1)
        .flat_map(|key| (0..4).map(move |part| (key, part)))
        .map(|(k, p)| fine(k, p))
        .collect();
    let near = (bound_deg.to_radians() / 4.0).sin() * 2.0;
    let admits = |from: usize, to: usize| {
        if keys[from].distance_to(&keys[to]).to_degrees() > 120.0 {
            return false;
        }
        (4 * from + 1..4 * to).all(|place| {
            let (key, part) = (place / 4, place % 4);
            let secs = times[key] + (times[key + 1] - times[key]) * part as f64 / 4.0;
            let on_span = slerp(keys[from], keys[to], (secs - times[from]) / (times[to] - times[from]));
            // Chords on the sphere of four dimensions: 2 sin(error / 4).
            let own = played[place];
            let chord = |sign: f64| {
                ((on_span.s + sign * own.s).powi(2)
                    + (on_span.yz + sign * own.yz).powi(2)
                    + (on_span.zx + sign * own.zx).powi(2)
                    + (on_span.xy + sign * own.xy).powi(2))
                .sqrt()
            };
            chord(-1.0).min(chord(1.0)) <= near
        })
    };
    let mut fewest = vec![usize::MAX; keys.len()];
    fewest[0] = 1;
    for to in 1..keys.len() {
        for from in 0..to {
            let count = fewest[from] + 1;
            if count < fewest[to] && (to == from + 1 || admits(from, to)) {
                fewest[to] = count;
            }
        }
    }
    fewest[keys.len() - 1]
}

fn largest_step_deg(track: &RotationTrack) -> f64 {
    track
        .keys
        .windows(2)
        .map(|pair| pair[0].normalize().distance_to(&pair[1].normalize()).to_degrees())
        .fold(0.0, f64::max)
}

const CLIPS: [&str; 7] = [
    "bvh/cmu_02_01_walk.bvh",
    "bvh/cmu_05_06_dance.bvh",
    "csv/humanoid3d_backflip_quat.csv",
    "csv/imu_a_quaternion_wxyz.csv",
    "gltf/Fox.glb",
    "gltf/wolf.glb",
    "gltf/InterpolationTest.glb",
];

#[test]
fn the_bound_holds_at_all_times() {
    for path in CLIPS {
        let Some(source) = open(path) else { continue };
        for (index, clip) in source.clips.iter().enumerate() {
            for bound_deg in [0.1_f64, 1.0] {
                let (result, count) = reduced(clip, &ReduceOptions::within(bound_deg.to_radians()));
                let mut worst: f64 = 0.0;
                for joint in 0..clip.joints.len() {
                    let (Some(before), Some(after)) = (clip.rotation(joint), result.rotation(joint)) else {
                        continue;
                    };
                    if before.keys.is_empty() {
                        continue;
                    }
                    worst = worst.max(largest_change_deg(before, after));
                    assert!(largest_step_deg(after) <= 120.0 + 1e-9 || after == before, "{path}: {joint}");
                    assert_eq!(before.times.span(), after.times.span(), "{path}: {joint} keeps its ends");
                }
                println!(
                    "{path}#{index} within {bound_deg}: {} of {} keys, {worst:.5} off",
                    count.after, count.before
                );
                assert!(worst <= bound_deg, "{path}: {worst} degrees off, {bound_deg} allowed");
            }
        }
    }
}

#[test]
fn the_count_is_within_five_percent_of_the_fewest() {
    for (path, joints) in
        [("bvh/cmu_02_01_walk.bvh", 8), ("csv/humanoid3d_backflip_quat.csv", 20), ("gltf/Fox.glb", 24)]
    {
        let Some(source) = open(path) else { continue };
        let clip = &source.clips[0];
        for bound_deg in [0.2, 1.0, 4.0] {
            let (mut ours, mut fewest) = (0, 0);
            for joint in (0..clip.joints.len()).take(joints) {
                let Some(track) = clip.rotation(joint).filter(|track| track.keys.len() > 1) else { continue };
                ours += track.reduced(f64::to_radians(bound_deg), &[]).keys.len();
                fewest += fewest_by_trying_all(track, bound_deg);
            }
            let ratio = ours as f64 / fewest as f64;
            println!("{path} within {bound_deg}: {ours} keys, the fewest are {fewest}: {ratio:.4}");
            assert!(fewest > 0 && ratio <= 1.05, "{path}: {ratio}");
        }
    }
}

#[test]
fn curved_paths_spacing_and_meant_turns_are_drawn_within_the_bound() {
    let keys: Vec<Rotor> = (0..120)
        .map(|i| {
            let t = f64::from(i) * 0.1;
            Rotor::from_plane_angles(Bivector::new((1.3 * t).sin(), 0.7 * t.cos(), 0.2 * t))
        })
        .collect();
    let plain = RotationTrack::from_rotors(Times::Even { step_secs: 0.1, count: 120 }, keys);
    let all = 0..plain.segment_count();
    let mut tracks: Vec<(&str, RotationTrack)> = PathKind::ALL
        .into_iter()
        .map(|kind| (kind.name(), plain.with_path(all.clone(), kind).unwrap()))
        .collect();
    let eased = plain.with_spacing(30..40, Spacing::EaseBoth).unwrap();
    tracks.push(("eased", eased.clone()));
    tracks.push(("turned", eased.with_turn(60, MeantTurn::OTHER_WAY).unwrap()));
    for (name, track) in tracks {
        for bound_deg in [0.2, 2.0] {
            let few = track.reduced(f64::to_radians(bound_deg), &[]);
            let off = largest_change_deg(&track, &few);
            assert!(off <= bound_deg, "{name}: {off} of {bound_deg}");
            assert!(
                few.keys.len() < track.keys.len() || bound_deg < 1.0 || name == "hold",
                "{name}: {} keys",
                few.keys.len()
            );
        }
        // A part of it alone: all else plays as before, to the bit of its keys.
        let part = track.reduced_within(2.0_f64.to_radians(), &[], 20..=90);
        for secs in [0.0, 0.55, 1.95, 9.05, 11.15] {
            assert!(track.at(secs).distance_to(&part.at(secs)) < 1e-12, "{name} at {secs}");
        }
        assert!(largest_change_deg(&track, &part) <= 2.0, "{name}");
    }
}

#[test]
fn ends_of_limbs_stay_within_their_bound() {
    let Some(source) = open("bvh/cmu_02_01_walk.bvh") else { return };
    let clip = &source.clips[0];
    let bound = 0.1;
    let plain = ReduceOptions::within(1.0_f64.to_radians());
    let held = ReduceOptions { tip_bound: Some(bound), ..plain.clone() };
    let ((loose, few), (tight, more)) = (reduced(clip, &plain), reduced(clip, &held));
    let off = |result: &Clip| {
        let mut largest: f64 = 0.0;
        for step in 0..clip.grid.count() * 7 {
            let secs = clip.duration_secs * step as f64 / (clip.grid.count() * 7 - 1) as f64;
            let (old, new) = (clip.world_at(secs), result.world_at(secs));
            for joint in clip.skeleton.listed() {
                for &tip in &clip.skeleton.joints()[joint].tips {
                    let place = |world: &[turnwright::skeleton::WorldJoint]| {
                        world[joint].scene_from_joint.transform_point3(tip)
                    };
                    largest = largest.max(place(&old).distance_to(&place(&new)));
                }
            }
        }
        largest
    };
    assert!(off(&loose) > bound, "the bound is one that matters");
    assert!(off(&tight) <= bound, "{} of {bound}", off(&tight));
    assert!(few.after < more.after && more.after * 2 < more.before, "{few:?} {more:?}");
    let turned =
        (0..clip.joints.len()).filter_map(|joint| Some((clip.rotation(joint)?, tight.rotation(joint)?)));
    for (before, after) in turned {
        assert!(largest_change_deg(before, after) <= 1.0);
    }
}

#[test]
fn a_table_keeps_the_same_rows_for_all() {
    let Some(source) = open("bvh/cmu_02_01_walk.bvh") else { return };
    let clip = &source.clips[0];
    let bound_deg = 3.0_f64;
    let (result, count) = reduced_together(clip, &ReduceOptions::within(bound_deg.to_radians()));
    assert!(count.after * 3 < count.before * 2, "{count:?}");
    // As written and read back.
    let bytes = encode(&source, &[result.into()], None, Path::new("new.csv")).unwrap().bytes;
    let back = open_bytes(Path::new("new.csv"), bytes, &OpenOptions::default()).unwrap();
    assert_eq!(back.clips[0].grid.count(), count.after);
    for joint in 0..clip.joints.len() {
        let Some(before) = clip.rotation(joint) else { continue };
        let off = largest_change_deg(before, back.clips[0].rotation(joint).unwrap());
        assert!(off <= bound_deg, "joint {joint}: {off}");
    }
}

#[test]
fn steps_over_120_degrees_are_halved_and_whole_turns_stay() {
    let turn = |degrees: f64| turnwright::rotor::Axis::Z.rotor(degrees.to_radians());
    let times = |count: usize| Times::Even { step_secs: 0.1, count };
    // Ten whole turns at even speed: nothing but the step limit asks for keys.
    let spin = RotationTrack::from_rotors(
        times(361),
        (0..361).map(|i| turn(10.0 * f64::from(i))).collect::<Vec<_>>(),
    );
    let few = spin.reduced(0.01, &[]);
    assert_eq!(few.keys.len(), 31, "a key each 120 degrees");
    assert!(largest_change_deg(&spin, &few) < 1e-9);
    let jump = RotationTrack::from_rotors(times(4), vec![turn(0.0), turn(0.0), turn(170.0), turn(170.0)]);
    assert!(largest_step_deg(&jump.reduced(0.01, &[])) < 120.0);
    let still = RotationTrack::from_rotors(times(50_000), vec![turn(33.0); 50_000]);
    assert_eq!(still.reduced(0.0, &[]).keys.len(), 2);
    assert_eq!(
        still.reduced(0.0, &[7, 9]).times.iter().collect::<Vec<_>>()[1..3],
        [still.times.at(7), still.times.at(9)]
    );
}

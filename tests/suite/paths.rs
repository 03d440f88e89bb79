//! Paths between keys, spacing and meant turns: outside values, and what has to hold for every track.

use std::f64::consts::{PI, TAU};
use std::sync::Arc;

use proptest::prelude::*;
use serde_json::Value;
use turnwright::clip::{
    self, Clip, FrameGrid, JointTracks, MeantTurn, PathError, PathKind, Paths, RotationTrack, Spacing,
    SpacingError, Times,
};
use turnwright::rotor::{
    Axis, BSplineEnds, Bivector, EndRates, Motion, RotationBSpline, RotationSpline, Rotor, b_spline,
    hermite_motion,
};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::strategies::{same_cases, unit_rotor, unit_vector};
use crate::support::{Tally, assert_close, list, number, numbers, shared_json, unit_rotor as read_rotor};

const SMOOTH: [PathKind; 3] = [PathKind::Squad, PathKind::Spline, PathKind::BSpline];

fn track(times: &[f64], keys: &[Rotor], path: PathKind) -> RotationTrack {
    RotationTrack {
        paths: Paths::Every(path),
        ..RotationTrack::from_rotors(Times::Listed(times.into()), keys.to_vec())
    }
}

fn rotor(value: &Value) -> Rotor {
    let [s, yz, zx, xy] = numbers(value);
    Rotor::new(s, yz, zx, xy)
}

fn bivector(value: &Value) -> Bivector {
    let [yz, zx, xy] = numbers(value);
    Bivector::new(yz, zx, xy)
}

/// Turns by so many degrees about z.
fn about_z(degrees: f64) -> Rotor {
    Axis::Z.rotor(degrees.to_radians())
}

/// How far round the joint turns about z from one time to another, in degrees, followed in small steps.
fn turned_about_z(track: &RotationTrack, from: f64, to: f64) -> f64 {
    let steps = 5000;
    let at = |step: i32| track.at(from + (to - from) * f64::from(step) / f64::from(steps));
    (0..steps).map(|step| (at(step).reverse() * at(step + 1)).plane_angles().xy).sum::<f64>().to_degrees()
}

/// The track of a case, playing its kind.
fn track_of(case: &Value) -> RotationTrack {
    let (kind, ends) = match case["kind"].as_str().expect("a kind") {
        "b-spline loop" => (PathKind::BSpline, EndRates::Loop),
        name => (PathKind::named(name).expect("a known kind"), EndRates::Secant),
    };
    let times: Vec<f64> = list(&case["times"]).iter().map(number).collect();
    let keys: Vec<Rotor> = list(&case["keys"]).iter().map(rotor).collect();
    let mut track = track(&times, &keys, kind).with_ends(ends);
    if let Some(tangents) = case.get("tangents") {
        let pair = |value: &Value| [rotor(&value[0]), rotor(&value[1])];
        track.tangents = Some(list(tangents).iter().map(pair).collect());
    }
    track
}

#[test]
fn rate_and_acceleration_agree_with_fifty_digits() {
    // tests/data/make_path_reference.py: derivatives of the definitions with mpmath. Rates there reach some hundreds.
    let text = include_str!("../data/path_reference.json");
    let file: Value = serde_json::from_str(text).expect("the reference is JSON");
    let mut tally = Tally::new("path reference");
    let mut count = 0;
    for case in list(&file["cases"]) {
        let kind = case["kind"].as_str().expect("a kind");
        let motion: Box<dyn Fn(f64) -> Motion> = if kind == "hermite" {
            let [a, b] = [0, 1].map(|i| rotor(&case["keys"][i]).normalize());
            let [rate_a, rate_b] = [0, 1].map(|i| bivector(&case["rates"][i]));
            Box::new(move |t| hermite_motion(a, rate_a, b.aligned_to(a), rate_b, t))
        } else {
            let track = track_of(case);
            Box::new(move |t| track.motion_at(t))
        };
        for sample in list(&case["samples"]) {
            let found = motion(number(&sample["t"]));
            let (rate, acceleration) = (bivector(&sample["rate"]), bivector(&sample["acceleration"]));
            let off = found.orientation.turn_to(rotor(&sample["rotor"]));
            let rate_off = (found.rate - rate).length() / (1.0 + rate.length());
            let acceleration_off =
                (found.acceleration - acceleration).length() / (1.0 + acceleration.length());
            tally.check(kind, off, 4e-15);
            tally.check(kind, rate_off, 2e-14);
            tally.check(kind, acceleration_off, 1e-12);
            count += 3;
        }
    }
    tally.finish(count);
    assert!(count > 400, "{count}");
}

#[test]
fn the_spline_of_a_track_is_scipys() {
    let Some(file) = shared_json("checks/rotation_checks.json") else { return };
    let mut tally = Tally::new("rotation_spline of a track");
    let mut count = 0;
    for case in list(&file["cases"]).iter().filter(|case| case["kind"] == "rotation_spline") {
        let times: Vec<f64> = list(&case["in"]["times"]).iter().map(number).collect();
        let keys: Vec<Rotor> = list(&case["in"]["keys"]).iter().map(read_rotor).collect();
        let track = track(&times, &keys, PathKind::Spline);
        for sample in list(&case["out"]["samples"]) {
            let found = track.motion_at(number(&sample["t"]));
            let id = case["id"].as_str().expect("an id");
            // At the very ends our track gives what comes and goes, as the checks do.
            tally.check(id, found.orientation.turn_to(read_rotor(&sample["q"])), number(&case["tol"]));
            let rate = found.rate - bivector(&sample["rate"]);
            tally.check(id, rate.length(), number(&case["tol_rate"]));
            let acceleration = found.acceleration - bivector(&sample["accel"]);
            tally.check(id, acceleration.length(), number(&case["tol_accel"]));
            count += 3;
        }
    }
    tally.finish(count);
}

#[test]
fn worked_examples_of_the_methods_page() {
    // Sections 6 to 8 and 22 of reference/methods.md, by the track and not by the functions below it.
    let Some(checks) = shared_json("reference/method_checks.json") else { return };
    let keys: Vec<Rotor> = list(&checks["key_set_K"]).iter().map(read_rotor).collect();
    let times = [0.0, 1.0, 1.5, 3.0];
    let squad = track(&times, &keys, PathKind::Squad);
    let check = &checks["squad_nonuniform"];
    for (share, expected) in check["seg1_u"].as_object().expect("shares") {
        let share: f64 = share.parse().expect("a share");
        assert_close!(squad.at(1.0 + 0.5 * share), read_rotor(expected), 1e-9);
    }
    for (key, expected) in [(1, "1"), (2, "2")] {
        let expected: [f64; 3] = numbers(&check["rate_deg_s"][expected]);
        assert_close!(squad.segment_motion(key, 0.0, None).rate.to_degrees(), expected, 1e-9);
        assert_close!(squad.segment_motion(key - 1, 1.0, None).rate.to_degrees(), expected, 1e-9);
    }
    let spline = track(&times, &keys, PathKind::Spline);
    let check = &checks["c2_spline"];
    for (key, expected) in list(&check["rates_at_keys_deg_s"]).iter().enumerate() {
        let found = spline.motion_at(times[key]).rate.to_degrees();
        assert_close!(found, numbers::<3>(expected), 1e-7, "key {key}");
    }
    let acceleration: [f64; 3] = numbers(&check["acc_deg_s2_at_1.25"]);
    assert_close!(spline.motion_at(1.25).acceleration.to_degrees(), acceleration, 1e-6);

    // With even times the inner stretch of the four keys is the uniform B-spline.
    let even = [0.0, 1.0, 2.0, 3.0];
    let smoothed = track(&even, &keys, PathKind::BSpline);
    let check = &checks["cumulative_bspline"];
    for share in ["0", "0.5", "1"] {
        let time = 1.0 + share.parse::<f64>().expect("a share");
        assert_close!(smoothed.at(time), read_rotor(&check[share]), 1e-9, "{share}");
    }

    let check = &checks["gltf_cubic"];
    let secs = number(&check["td"]);
    let mut cubic =
        track(&[0.0, secs], &[read_rotor(&check["v0"]), read_rotor(&check["v1"])], PathKind::Cubic);
    let tangent = |name: &str| Rotor::from_xyzw(numbers(&check[name]));
    cubic.tangents = Some([[tangent("b0"); 2], [tangent("a1"); 2]].into());
    assert_close!(cubic.at(0.25 * secs), read_rotor(&check["unit_0.25"]), 1e-9);
    for time in [0.0, secs] {
        assert_close!(cubic.motion_at(time).rate.to_degrees(), [0.0, 0.0, 180.0], 1e-9, "{time}");
    }
}

#[test]
fn a_cubic_leaves_the_spline_it_was_written_from_as_far_as_the_methods_page_says() {
    // Section 22 of reference/methods.md, `cubicspline_export_error`: why exports put keys in.
    let Some(checks) = shared_json("reference/method_checks.json") else { return };
    let check = &checks["cubicspline_export_error"];
    let keys: Vec<Rotor> = list(&checks["key_set_K"]).iter().map(read_rotor).collect();
    let times = [0.0, 1.0, 1.5, 3.0];
    let spline = track(&times, &keys, PathKind::Spline);
    // The cubic with the spline's own values and rates at so many times a segment; what it is off at most, in degrees.
    let off = |segment: usize, parts: u32| {
        let (from, to) = (times[segment], times[segment + 1]);
        let cuts: Vec<f64> =
            (0..=parts).map(|part| from + (to - from) * f64::from(part) / f64::from(parts)).collect();
        let at: Vec<Motion> = cuts.iter().map(|time| spline.motion_at(*time)).collect();
        let mut values: Vec<Rotor> = at.iter().map(|motion| motion.orientation).collect();
        for key in 1..values.len() {
            values[key] = values[key].aligned_to(values[key - 1]);
        }
        let mut cubic = track(&cuts, &values, PathKind::Cubic);
        let tangent = |key: usize| {
            let rate = at[key].rate;
            (values[key] * Rotor::from_xyzw([rate.yz, rate.zx, rate.xy, 0.0])).scale(0.5)
        };
        cubic.tangents = Some((0..values.len()).map(|key| [tangent(key); 2]).collect());
        let shares = (0..=2000_u32).map(|step| f64::from(step) / 2000.0);
        let angles = shares.map(|share| {
            let time = from + (to - from) * share;
            cubic.at(time).turn_to(spline.at(time)).to_degrees()
        });
        (angles.fold(0.0, f64::max), tangent(0))
    };
    let tolerance = number(&check["tolerance"]);
    let each = list(&check["max_deg_per_segment"]);
    assert_eq!(each.len(), 3);
    for (segment, expected) in each.iter().enumerate() {
        assert_close!(off(segment, 1).0, number(expected), tolerance, "segment {segment}");
    }
    let first_tangent = off(1, 1).1;
    assert_close!(first_tangent.to_xyzw(), numbers::<4>(&check["tangent_key1"]), 1e-6);
    let halved = list(&check["last_segment_subdivided_1_2_4_8"]);
    for (parts, expected) in [1, 2, 4, 8].into_iter().zip(halved) {
        assert_close!(off(2, parts).0, number(expected), tolerance, "in {parts} parts");
    }
}

#[test]
fn even_knots_make_the_uniform_b_spline() {
    let keys: Vec<Rotor> = (0..6)
        .map(|i| Rotor::from_plane_angles(Bivector::new(f64::from(i).sin(), 0.4 * f64::from(i), -0.3)))
        .collect();
    let times: Vec<f64> = (0..6).map(|i| 0.5 * f64::from(i)).collect();
    let curve = RotationBSpline::new(&times, &keys, BSplineEnds::Natural).unwrap();
    for segment in 1..4_usize {
        let controls = std::array::from_fn(|i| keys[segment - 1 + i]);
        for share in [0.0, 0.3, 0.9] {
            let time = 0.5 * (segment as f64 + share);
            assert_close!(curve.at(time), b_spline(controls, share), 1e-14);
        }
    }
    // Through its ends, without acceleration.
    for (time, key) in [(0.0, 0), (2.5, 5)] {
        let motion = curve.motion_at(time);
        assert_close!(motion.orientation, keys[key], 1e-14);
        assert!(motion.acceleration.length() < 1e-12, "{motion:?}");
    }
}

/// Keys at uneven times, among them equal and nearly equal ones and steps near half a turn.
fn hard_keys() -> impl Strategy<Value = (Vec<f64>, Vec<Rotor>)> {
    let step = prop_oneof![
        1 => Just(Rotor::IDENTITY),
        1 => (unit_vector(), -12.0..-3.0_f64).prop_map(|(axis, power)| {
            Rotor::from_plane_angles(Bivector::from_axis(axis * 10_f64.powf(power)))
        }),
        1 => (unit_vector(), 3.0..3.1_f64)
            .prop_map(|(axis, angle)| Rotor::from_plane_angles(Bivector::from_axis(axis * angle))),
        6 => (unit_vector(), 0.05..2.2_f64)
            .prop_map(|(axis, angle)| Rotor::from_plane_angles(Bivector::from_axis(axis * angle))),
    ];
    let secs = prop_oneof![Just(0.25), 0.02..2.0_f64];
    (unit_rotor(), prop::collection::vec((step, secs, any::<bool>()), 1..7)).prop_map(|(first, steps)| {
        let (mut times, mut keys) = (vec![0.5], vec![first]);
        for (step, secs, opposite) in steps {
            times.push(times[times.len() - 1] + secs);
            let key = (keys[keys.len() - 1] * step).normalize();
            keys.push(if opposite { -key } else { key });
        }
        (times, keys)
    })
}

fn spacing() -> impl Strategy<Value = Spacing> {
    prop_oneof![
        Just(Spacing::Even),
        Just(Spacing::EaseIn),
        Just(Spacing::EaseOut),
        Just(Spacing::EaseBoth),
        prop::array::uniform2(prop::array::uniform2(0.0..1.0_f64)).prop_map(Spacing::nearest),
    ]
}

fn turn() -> impl Strategy<Value = MeantTurn> {
    prop_oneof![
        Just(MeantTurn::SHORT),
        (-3..=3_i32).prop_map(|whole| MeantTurn::new(whole).expect("allowed")),
        (-2..=2_i32, unit_vector()).prop_map(|(whole, axis)| MeantTurn::in_plane(
            whole,
            Bivector::from_axis(axis)
        )
        .expect("allowed")),
    ]
}

/// Tracks of mixed paths, spacings and turns.
fn mixed_track() -> impl Strategy<Value = RotationTrack> {
    let kind = prop::sample::select(vec![
        PathKind::Hold,
        PathKind::Slerp,
        PathKind::Squad,
        PathKind::Spline,
        PathKind::Spline,
        PathKind::BSpline,
    ]);
    let ends = prop_oneof![Just(EndRates::Secant), Just(EndRates::Natural), Just(EndRates::Loop)];
    (hard_keys(), prop::collection::vec((kind, spacing(), turn()), 7), ends).prop_map(
        |((times, keys), each, ends)| {
            let mut own = track(&times, &keys, PathKind::Slerp).with_ends(ends);
            for (segment, (kind, spacing, turn)) in each.into_iter().enumerate().take(keys.len() - 1) {
                own = own.with_path(segment..segment + 1, kind).expect("allowed");
                own = own.with_spacing(segment..segment + 1, spacing).expect("allowed");
                if kind.takes_turns() {
                    own = own.with_turn(segment, turn).expect("allowed");
                }
            }
            own
        },
    )
}

proptest! {
    #![proptest_config(same_cases(150))]

    #[test]
    fn derivatives_are_those_of_what_is_played(track in mixed_track(), segment in 0..6_usize, share in 0.03..0.97_f64) {
        let segment = segment % track.segment_count();
        let (start, end) = (track.times.at(segment), track.times.at(segment + 1));
        let secs = end - start;
        let time = start + secs * share;
        let here = track.motion_at(time);
        let pose = track.at(time);
        prop_assert!(here.orientation == pose, "{here:?} {pose:?}");
        // Differences of the fourth order; the step follows the size of what changes.
        let size = here.rate.length() + here.acceleration.length() * secs + 1.0 / secs;
        let dt = (2e-3 / size).min(0.005 * secs);
        let at = |steps: f64| (pose.reverse() * track.at(time + steps * dt)).plane_angles();
        let near = (at(1.0) - at(-1.0)) / (2.0 * dt);
        let far = (at(2.0) - at(-2.0)) / (4.0 * dt);
        let rate = near * (4.0 / 3.0) - far * (1.0 / 3.0);
        // Cuts between led points are not smooth for squad, nor within a step of the handles' stops.
        let is_led = !track.segments.of(segment).turn.is_short();
        let kind = track.kind_of(segment, None);
        let is_smooth = !(is_led && kind == PathKind::Squad);
        let rate_off = (rate - here.rate).length();
        prop_assert!(rate_off <= 2e-5 * size || !is_smooth, "rate off by {rate_off} of {size}: {rate:?} {here:?}");
        let slope = |dt: f64| (track.motion_at(time + dt).rate - track.motion_at(time - dt).rate) / (2.0 * dt);
        let change = slope(dt) * (4.0 / 3.0) - slope(2.0 * dt) * (1.0 / 3.0);
        let change_off = (change - here.acceleration).length();
        prop_assert!(
            change_off <= 1e-4 * size * size || !is_smooth,
            "acceleration off by {change_off} of {}: {change:?} {here:?}", size * size
        );
    }

    #[test]
    fn many_times_at_once_are_what_each_is_alone(track in mixed_track()) {
        let (start, end) = track.times.span().unwrap();
        let times: Vec<f64> = (-20..=420).map(|i| start + (end - start) * f64::from(i) / 400.0).collect();
        for (found, &time) in track.at_all(&times).iter().zip(&times) {
            let alone = track.at(time);
            prop_assert!(found.turn_to(alone) < 1e-14, "{time}: {found:?} {alone:?}");
            prop_assert!((found.norm() - 1.0).abs() < 1e-14);
        }
    }

    #[test]
    fn spacing_changes_when_and_never_which(track in mixed_track(), own in spacing(), share in 0.0..1.0_f64) {
        let even = track.with_spacing(0..track.segment_count(), Spacing::Even).unwrap();
        let spaced = track.with_spacing(0..track.segment_count(), own).unwrap();
        for segment in 0..track.segment_count() {
            let (start, end) = (track.times.at(segment), track.times.at(segment + 1));
            let way = own.pace(share).share;
            let (found, expected) =
                (spaced.at(start + (end - start) * share), even.at(start + (end - start) * way));
            prop_assert!(found.turn_to(expected) <= 1e-12, "{found:?} {expected:?}");
        }
    }

    #[test]
    fn the_rate_runs_on_at_keys((times, keys) in hard_keys(), loops in any::<bool>()) {
        for kind in SMOOTH {
            let mut track = track(&times, &keys, kind);
            if loops {
                let last = keys.len() - 1;
                let mut keys = keys.clone();
                keys[last] = keys[0];
                track = RotationTrack { keys: keys.into(), ..track }.with_ends(EndRates::Loop);
            }
            if !track.spline_faults(None).is_empty() {
                continue;
            }
            let n = track.segment_count();
            for key in (1..n).chain(loops.then_some(n)) {
                let (before, after) = (track.segment_motion(key - 1, 1.0, None), track.segment_motion(key % n, 0.0, None));
                let size = before.rate.length() + after.rate.length() + 1.0;
                let jump = (before.rate - after.rate).length();
                prop_assert!(jump <= 1e-9 * size, "{kind:?} key {key}: rate jumps by {jump}");
                let jump = (before.acceleration - after.acceleration).length();
                let size = before.acceleration.length() + after.acceleration.length() + size * size;
                prop_assert!(
                    kind == PathKind::Squad || jump <= 1e-8 * size,
                    "{kind:?} key {key}: acceleration jumps by {jump} of {size}"
                );
                prop_assert!(
                    kind == PathKind::BSpline || before.orientation.turn_to(track.sound_key(key)) < 1e-12,
                    "{kind:?} misses key {key}"
                );
            }
        }
    }

    #[test]
    fn a_smooth_run_has_its_neighbours_rate((times, keys) in hard_keys(), kind in prop::sample::select(vec![
        PathKind::Slerp, PathKind::Squad, PathKind::BSpline,
    ]), at in 1..6_usize) {
        let n = keys.len() - 1;
        if n < 2 {
            return Ok(());
        }
        let at = 1 + at % (n - 1);
        for order in [[PathKind::Spline, kind], [kind, PathKind::Spline]] {
            let track = track(&times, &keys, PathKind::Slerp)
                .with_path(0..at, order[0]).unwrap()
                .with_path(at..n, order[1]).unwrap();
            if !track.spline_faults(None).is_empty() {
                continue;
            }
            let (before, after) = (track.segment_motion(at - 1, 1.0, None), track.segment_motion(at, 0.0, None));
            let jump = (before.rate - after.rate).length();
            let size = before.rate.length() + after.rate.length() + 1.0;
            prop_assert!(jump <= 1e-9 * size, "{order:?} at {at}: rate jumps by {jump}");
        }
    }

    #[test]
    fn cutting_a_segment_keeps_how_it_moves(own in spacing(), cut in 0.05..0.95_f64, share in 0.0..1.0_f64) {
        let [first, second] = own.split(cut);
        let way = own.pace(cut).share;
        let parts = [
            (first.pace(share).share * way, own.pace(share * cut).share),
            (way + second.pace(share).share * (1.0 - way), own.pace(cut + share * (1.0 - cut)).share),
        ];
        for (found, expected) in parts {
            prop_assert!((found - expected).abs() < 1e-9, "{own:?}: {found} {expected}");
        }
    }

    #[test]
    fn spacing_rises_and_tells_its_steepest(own in spacing()) {
        let (steepest, when) = own.steepest();
        prop_assert!((own.pace(when).first - steepest).abs() <= 1e-6 * steepest, "{own:?}");
        let mut last = 0.0;
        for step in 0..=500 {
            let pace = own.pace(f64::from(step) / 500.0);
            prop_assert!(pace.share >= last && pace.first >= 0.0 && pace.first <= steepest * (1.0 + 1e-9), "{own:?} {pace:?}");
            last = pace.share;
        }
        prop_assert!((own.pace(0.0).share, own.pace(1.0).share) == (0.0, 1.0));
        prop_assert!(steepest <= 101.0, "{own:?}: {steepest}");
    }

    #[test]
    fn the_highest_rate_is_not_passed(track in mixed_track(), segment in 0..6_usize) {
        let segment = segment % track.segment_count();
        let peak = track.highest_rate(segment);
        let most = (0..=3000)
            .map(|i| track.segment_motion(segment, f64::from(i) / 3000.0, None).rate.length())
            .fold(0.0, f64::max);
        prop_assert!(most <= peak.rate_rad * 1.001 + 1e-9, "{most} above {peak:?}");
        prop_assert!(peak.rate_rad <= most * 1.05 + 1e-9, "{peak:?}, but {most}");
        let at = track.motion_at(peak.time_secs).rate.length();
        let is_end = track.times.iter().any(|time| (time - peak.time_secs).abs() < 1e-9);
        prop_assert!(is_end || (at - peak.rate_rad).abs() <= 1e-6 * (1.0 + at), "{peak:?} {at}");
    }

    #[test]
    fn a_new_key_stands_on_the_way(track in mixed_track(), segment in 0..6_usize, share in 0.1..0.9_f64) {
        let segment = segment % track.segment_count();
        let (start, end) = (track.times.at(segment), track.times.at(segment + 1));
        let time = start + (end - start) * share;
        let more = track.with_key_at(time).unwrap();
        prop_assert_eq!(more.keys.len(), track.keys.len() + 1);
        prop_assert!(more.keys[segment + 1].turn_to(track.at(time)) < 1e-12);
        // Slerp and hold play on as before; but for whole turns in a plane of their own, which bend.
        let kind = track.kind_of(segment, None);
        let turn = track.segments.of(segment).turn;
        if kind == PathKind::Hold || (kind == PathKind::Slerp && (turn.is_short() || turn.plane().is_none())) {
            for step in 0..=50 {
                let time = start + (end - start) * f64::from(step) / 50.0;
                let (found, expected) = (more.at(time), track.at(time));
                // A key that is nearly equal to the next has no direction left in either half.
                prop_assert!(found.turn_to(expected) < 1e-7, "{time}: {found:?} {expected:?}");
            }
        }
    }
}

#[test]
fn the_other_way_and_whole_turns_about_one_plane() {
    let own = track(&[0.0, 1.0, 2.0, 3.0], &[0.0, 50.0, 100.0, 130.0].map(about_z), PathKind::Slerp);
    for (whole, expected) in [(0, 50.0), (-1, -310.0), (1, 410.0), (-3, -1030.0), (25, 9050.0)] {
        for kind in [PathKind::Slerp, PathKind::Squad, PathKind::Spline, PathKind::BSpline] {
            let own = own.with_path(0..3, kind).unwrap();
            let own = own.with_turn(1, MeantTurn::new(whole).unwrap()).unwrap();
            assert_eq!(own.spline_faults(None), [], "{kind:?}");
            let found = turned_about_z(&own, 0.0, 3.0);
            assert!((found - 80.0 - expected).abs() < 1e-6, "{kind:?} {whole}: {found}");
            if kind == PathKind::BSpline {
                continue;
            }
            let found = turned_about_z(&own, 1.0, 2.0);
            assert!((found - expected).abs() < 1e-6, "{kind:?} {whole}: {found}");
            assert_close!(own.at(2.0), about_z(100.0), 1e-12);
            if kind == PathKind::Slerp {
                let rate = own.motion_at(1.3).rate.to_degrees();
                assert_close!(rate, [0.0, 0.0, expected], 1e-9, "{whole}");
                assert!((own.highest_rate(1).rate_rad.to_degrees() - expected.abs()).abs() < 1e-9);
            }
        }
    }
}

#[test]
fn a_wheel_that_comes_back_to_its_pose_turns_in_the_plane_that_is_named() {
    // Both keys are alike but for a wobble of a thousandth of a degree, whose plane must not decide.
    let wobble = Axis::X.rotor(1e-3_f64.to_radians());
    let own = track(&[0.0, 2.0], &[Rotor::IDENTITY, wobble], PathKind::Slerp);
    let turn = MeantTurn::in_plane(3, Bivector::new(0.0, 0.0, 2.0)).unwrap();
    let own = own.with_turn(0, turn).unwrap();
    assert!((turned_about_z(&own, 0.0, 2.0) - 1080.0).abs() < 1e-2);
    assert_close!(own.at(2.0), wobble, 1e-15);
    // Without a plane, and without a short way: that of the segment beside it.
    let own =
        track(&[0.0, 1.0, 2.0], &[Rotor::IDENTITY, Axis::Y.rotor(0.5), Axis::Y.rotor(0.5)], PathKind::Slerp);
    let own = own.with_turn(1, MeantTurn::new(1).unwrap()).unwrap();
    assert_close!(own.at(1.25), Axis::Y.rotor(0.5 + 0.25 * TAU), 1e-12);
}

#[test]
fn what_no_path_can_do_is_told() {
    let own = track(&[0.0, 1.0], &[Rotor::IDENTITY, about_z(50.0)], PathKind::Hold);
    let error = own.with_turn(0, MeantTurn::OTHER_WAY).unwrap_err();
    assert_eq!(error.to_string(), "expected a path that can go round otherwise, found hold in segment 0");
    let error = own.with_path(1..2, PathKind::Slerp).unwrap_err();
    assert_eq!(error.to_string(), "expected segments below 1, found 1");
    assert_eq!(
        MeantTurn::new(1001).unwrap_err().to_string(),
        "expected at most 1000 whole turns, found 1001"
    );
    assert!(matches!(MeantTurn::in_plane(1, Bivector::ZERO), Err(PathError::NoPlane { .. })));
    assert!(matches!(own.with_key_at(1.0), Err(PathError::NoTimeBetween { .. })));
    assert!(matches!(own.without_keys(&[0, 1]), Err(PathError::NoSuchKey { .. })));
    assert!(matches!(Spacing::handles([[0.2, -0.1], [0.8, 1.0]]), Err(SpacingError::RunsBack { .. })));
    assert!(matches!(Spacing::handles([[f64::NAN, 0.0], [0.8, 1.0]]), Err(SpacingError::TooSteep { .. })));
    assert!(matches!(Spacing::handles([[0.0, 0.5], [1.0, 0.5]]), Err(SpacingError::TooSteep { .. })));
    assert!(matches!(Spacing::nearest([[0.0, 0.5], [1.0, 0.5]]), Spacing::Own(_)));
}

#[test]
fn few_keys_and_broken_ones_play() {
    for kind in PathKind::ALL {
        let none = track(&[], &[], kind);
        assert_eq!(none.motion_at(1.0), Motion::still(Rotor::IDENTITY), "{kind:?}");
        let one = track(&[0.5], &[about_z(20.0)], kind);
        let still = one.motion_at(0.5);
        assert_close!(still.orientation, about_z(20.0), 1e-15, "{kind:?}");
        assert_eq!((still.rate, still.acceleration), (Bivector::ZERO, Bivector::ZERO));
        let two = track(&[0.5, 1.5], &[Rotor::IDENTITY, about_z(60.0)], kind);
        let expected = if kind == PathKind::Hold { 0.0 } else { 30.0 };
        assert_close!(two.at(1.0), about_z(expected), 1e-12, "{kind:?}");
        assert_eq!(two.motion_at(2.0).rate, Bivector::ZERO);
        let nan = Rotor::new(f64::NAN, 0.0, 0.0, 0.0);
        let broken = track(&[0.0, 1.0, 2.0], &[nan, about_z(10.0), nan], kind);
        assert_close!(broken.at(0.7), about_z(10.0), 1e-12, "{kind:?}");
        let all_broken = track(&[0.0, 1.0, 2.0], &[nan; 3], kind);
        assert_close!(all_broken.at(0.7), Rotor::IDENTITY, 1e-12, "{kind:?}");
    }
}

#[test]
fn half_turns_have_a_way_in_every_kind() {
    let half = Axis::X.rotor(PI);
    for kind in SMOOTH {
        for second in [half, -half] {
            let own = track(&[0.0, 1.0, 2.0, 3.0], &[Rotor::IDENTITY, second, about_z(30.0), half], kind);
            assert_eq!(own.spline_faults(None), [], "{kind:?}");
            let steps: Vec<Rotor> = (0..=300).map(|i| own.at(f64::from(i) / 100.0)).collect();
            let largest = steps.windows(2).map(|pair| pair[0].turn_to(pair[1])).fold(0.0, f64::max);
            assert!(largest < 0.2, "{kind:?}: a step of {largest}");
        }
    }
}

#[test]
fn ends_do_what_they_say() {
    let keys = [0.3, 1.1, -0.4, 0.9]
        .map(|angle| Rotor::from_plane_angles(Bivector::new(angle, 1.0 - angle, angle * angle)));
    let times = [0.0, 0.4, 1.5, 2.0];
    let own = track(&times, &keys, PathKind::Spline);
    let natural = own.with_ends(EndRates::Natural);
    for time in [0.0, 2.0] {
        assert!(natural.motion_at(time).acceleration.length() < 1e-9, "{:?}", natural.motion_at(time));
        assert!(own.motion_at(time).acceleration.length() > 0.1);
    }
    let given = [Bivector::new(0.1, -0.2, 0.3), Bivector::ZERO];
    for kind in [PathKind::Spline, PathKind::Squad] {
        let clamped = own.with_path(0..3, kind).unwrap().with_ends(EndRates::Given(given[0], given[1]));
        for (time, rate) in [(0.0, given[0]), (2.0, given[1])] {
            assert_close!(clamped.motion_at(time).rate, rate, 1e-12, "{kind:?} {time}");
        }
    }
    // Two keys alone: an arc at the mean rate, or a loop that stands.
    let short = RotationSpline::new(&times[..2], &keys[..2], EndRates::Natural).unwrap();
    let mean = (keys[0].reverse() * keys[1]).plane_angles() / 0.4;
    assert_close!(short.rate(0.1), mean, 1e-12);
    let still = RotationSpline::new(&times[..2], &[keys[0]; 2], EndRates::Loop).unwrap();
    assert!(still.rate(0.1).length() < 1e-12);
}

#[test]
fn a_run_is_solved_anew_when_the_track_becomes_another() {
    let keys = [0.0, 40.0, 10.0, 70.0].map(about_z);
    let own = track(&[0.0, 1.0, 2.0, 3.0], &keys, PathKind::Spline);
    let before = own.at(1.5);
    let moved = own.with_keys(&[(2, about_z(30.0))]);
    assert!(moved.at(1.5).turn_to(before) > 0.1);
    assert_close!(own.at(1.5), before, 0.0);
    // In place too.
    let mut changed = own.clone();
    assert_close!(changed.at(1.5), before, 0.0);
    changed.keys = moved.keys.clone();
    assert_close!(changed.at(1.5), moved.at(1.5), 0.0);
    changed.times = Times::Even { step_secs: 2.0, count: 4 };
    assert_close!(changed.at(3.0), moved.at(1.5), 1e-12);
}

#[test]
fn keys_taken_out_leave_meant_turns() {
    let own = track(&[0.0, 1.0, 2.0], &[0.0, 90.0, 180.5].map(about_z), PathKind::Slerp);
    // Short ways stay short.
    let plain = own.without_keys(&[1]).unwrap();
    assert!((turned_about_z(&plain, 0.0, 2.0) + 179.5).abs() < 1e-6);
    let wheel = own.with_turn(0, MeantTurn::new(2).unwrap()).unwrap();
    let fewer = wheel.without_keys(&[1]).unwrap();
    assert!((turned_about_z(&fewer, 0.0, 2.0) - 900.5).abs() < 1e-6);
    // And a key put in shares them.
    let more = wheel.with_key_at(0.3).unwrap();
    assert!((turned_about_z(&more, 0.0, 0.3) - 243.0).abs() < 1e-6);
    assert!((turned_about_z(&more, 0.0, 2.0) - 900.5).abs() < 1e-6);
}

/// A clip of one joint, counted at a rate.
pub(crate) fn clip_of(track: RotationTrack, rate: f64) -> Clip {
    let joint = Joint {
        name: "Wheel".to_owned(),
        number: 0,
        parent: None,
        rest: Transform::IDENTITY,
        kind: JointKind::Joint,
        tips: vec![],
    };
    let duration_secs = track.times.span().expect("some keys").1;
    Clip {
        name: "turning".to_owned(),
        skeleton: Arc::new(Skeleton::new(vec![joint]).expect("one joint")),
        joints: vec![Arc::new(JointTracks { rotation: Some(track), ..JointTracks::default() })],
        grid: FrameGrid::even(rate, duration_secs),
        duration_secs,
    }
}

/// A wheel: eased in, some turns, the other way, and a plain end.
fn wheel(path: PathKind) -> RotationTrack {
    track(&[0.0, 1.0, 2.0, 3.0], &[0.0, 50.0, 100.0, 130.0].map(about_z), path)
        .with_turn(0, MeantTurn::new(3).expect("allowed"))
        .expect("allowed")
        .with_turn(1, MeantTurn::OTHER_WAY)
        .expect("allowed")
        .with_spacing(0..1, Spacing::EaseIn)
        .expect("allowed")
}

#[test]
fn cutting_and_another_rate_keep_meant_turns() {
    for path in [PathKind::Slerp, PathKind::Squad] {
        let clip = clip_of(wheel(path), 30.0);
        let whole = turned_about_z(clip.rotation(0).unwrap(), 0.0, 3.0);
        assert!((whole - (1130.0 - 310.0 + 30.0)).abs() < 1e-6);
        // At 2 and at 4 frames a second a step is far more than half a turn.
        for rate in [2.0, 4.0, 60.0] {
            let fine = clip::resampled(&clip, rate, 0.0, 3.0);
            let found = turned_about_z(fine.rotation(0).unwrap(), 0.0, 3.0);
            assert!((found - whole).abs() < 1e-6, "{path:?} at {rate}: {found} of {whole}");
        }
        let part = clip::cut(&clip, 0.3, 1.4);
        let track = part.rotation(0).unwrap();
        let expected = turned_about_z(clip.rotation(0).unwrap(), 0.3, 1.4);
        let found = turned_about_z(track, 0.0, 1.1);
        assert!((found - expected).abs() < 1e-6, "{path:?}: {found} of {expected}");
        if path == PathKind::Slerp {
            for step in 0..=110 {
                let time = f64::from(step) / 100.0;
                assert_close!(track.at(time), clip.rotation(0).unwrap().at(time + 0.3), 1e-9, "{time}");
            }
        }
    }
}

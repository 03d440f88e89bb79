//! Every case of `checks/rotation_checks.json`: made with mpmath at 50 digits and cross-checked with scipy and
//! numpy-quaternion; its README names versions and conventions. Each case states its own tolerance.

use std::f64::consts::PI;

use glam::{DMat3, DVec3};
use serde_json::Value;
use turnwright::rotor::{
    Bivector, EndRates, EulerOrder, RotationSpline, Rotor, SwingTwist, chordal_mean, mean_rate,
    parabola_rate, slerp, squad, squad_inner, squad_inner_uneven,
};

use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::support::{Distance, Tally, largest, list, number, numbers, shared_json, unit_rotor};

/// Runs `check(input, output, tolerance, compare)` on every case of a kind. It gives the errors that the tolerance of the case
/// bounds; the number of cases must be the one the file says.
#[track_caller]
fn for_each_case(kind: &'static str, mut check: impl FnMut(&Value, &Value, &Value) -> Vec<f64>) {
    let Some(file) = shared_json("checks/rotation_checks.json") else { return };
    let mut tally = Tally::new(kind);
    for case in list(&file["cases"]).iter().filter(|case| case["kind"] == kind) {
        let id = case["id"].as_str().expect("each case has an id");
        let errors = check(&case["in"], &case["out"], case);
        assert!(!errors.is_empty(), "{id} compares nothing");
        let error = largest(errors.into_iter());
        tally.check(id, error, number(&case["tol"]));
    }
    let count = file["meta"]["kinds"][kind].as_u64().expect("the file counts each kind");
    tally.finish(usize::try_from(count).expect("a small count"));
}

/// A rotation vector as plane angles: the plane is the one square to the axis.
fn plane_angles(value: &Value) -> Bivector {
    Bivector::from_axis(vector(value))
}

fn vector(value: &Value) -> DVec3 {
    DVec3::from_array(numbers(value))
}

#[test]
fn no_kind_is_forgotten() {
    let here = include_str!("rotor_checks.rs");
    let Some(file) = shared_json("checks/rotation_checks.json") else { return };
    let kinds = file["meta"]["kinds"].as_object().expect("the file counts each kind");
    for kind in kinds.keys() {
        let tested = here.contains(&format!("for_each_case(\"{kind}\""));
        assert!(tested, "no test for the kind {kind}");
    }
}

#[test]
fn compose() {
    for_each_case("compose", |input, output, _| {
        let found = unit_rotor(&input["a"]) * unit_rotor(&input["b"]);
        vec![found.distance_to(&unit_rotor(&output["q"]))]
    });
}

#[test]
fn inverse() {
    for_each_case("inverse", |input, output, _| {
        vec![unit_rotor(&input["a"]).reverse().distance_to(&unit_rotor(&output["q"]))]
    });
}

#[test]
fn apply() {
    for_each_case("apply", |input, output, _| {
        let v = vector(&input["v"]);
        vec![unit_rotor(&input["q"]).apply(v).distance_to(&vector(&output["v"])) / v.length()]
    });
}

#[test]
fn to_matrix() {
    for_each_case("to_matrix", |input, output, _| {
        // The file's rows are the columns of the transposed matrix.
        let [a, b, c]: [DVec3; 3] = std::array::from_fn(|row| vector(&output["m"][row]));
        let expected = DMat3::from_cols(a, b, c).transpose();
        let rotor = unit_rotor(&input["q"]);
        // Back again: the tolerance of the matrix is also the accuracy its rotor can have.
        vec![
            rotor.to_matrix().distance_to(&expected),
            Rotor::from_matrix(&expected).distance_to(&rotor) / 4.0,
        ]
    });
}

#[test]
fn exp() {
    for_each_case("exp", |input, output, _| {
        vec![Rotor::from_plane_angles(plane_angles(&input["v"])).distance_to(&unit_rotor(&output["q"]))]
    });
}

#[test]
fn log() {
    for_each_case("log", |input, output, case| {
        let found = unit_rotor(&input["q"]).plane_angles();
        let expected = plane_angles(&output["v"]);
        assert!(found.length() <= PI, "the short way");
        let difference = found.distance_to(&expected);
        vec![match case["compare"].as_str() {
            Some("vector-absolute") => difference,
            Some("vector-relative") => difference / expected.length(),
            Some("vector-up-to-sign") => difference.min(found.distance_to(&-expected)),
            other => panic!("unknown comparison {other:?}"),
        }]
    });
}

#[test]
fn power() {
    for_each_case("power", |input, output, _| {
        vec![unit_rotor(&input["q"]).pow(number(&input["t"])).distance_to(&unit_rotor(&output["q"]))]
    });
}

#[test]
fn slerp_short_way() {
    for_each_case("slerp", |input, output, _| {
        let found = slerp(unit_rotor(&input["a"]), unit_rotor(&input["b"]), number(&input["t"]));
        vec![found.distance_to(&unit_rotor(&output["q"]))]
    });
}

#[test]
fn distance() {
    for_each_case("distance", |input, output, case| {
        let found = unit_rotor(&input["a"]).turn_to(unit_rotor(&input["b"]));
        let expected = number(&output["angle"]);
        let relative = case["compare"] == "scalar-relative";
        vec![found.distance_to(&expected) / if relative { expected } else { 1.0 }]
    });
}

#[test]
fn squad_inner_uniform() {
    for_each_case("squad_inner_uniform", |input, output, _| {
        let key = unit_rotor(&input["key"]);
        let [before, after] = [&input["prev"], &input["next"]].map(|value| unit_rotor(value).aligned_to(key));
        vec![squad_inner(before, key, after).distance_to(&unit_rotor(&output["s"]))]
    });
}

/// The keys of a case, aligned along the clip, and their times.
fn keys_and_times(input: &Value) -> (Vec<Rotor>, Vec<f64>) {
    let mut keys: Vec<Rotor> = list(&input["keys"]).iter().map(unit_rotor).collect();
    for i in 1..keys.len() {
        keys[i] = keys[i].aligned_to(keys[i - 1]);
    }
    (keys, list(&input["times"]).iter().map(number).collect())
}

/// Squad through the keys of a case. `inner(i)` gives the two inner points of a key that has neighbours on both sides;
/// at the first and the last the inner point is the key itself, as the README of the checks says.
fn squad_through(input: &Value, inner: impl Fn(&[Rotor], &[f64], usize) -> [Rotor; 2]) -> Rotor {
    let (keys, times) = keys_and_times(input);
    let t = number(&input["t"]);
    let last = keys.len() - 1;
    let i = times
        .iter()
        .rposition(|key_time| *key_time <= t)
        .expect("the time is not before the first key")
        .min(last - 1);
    let inner_a = if i == 0 { keys[0] } else { inner(&keys, &times, i)[1] };
    let inner_b = if i + 1 == last { keys[last] } else { inner(&keys, &times, i + 1)[0] };
    squad(keys[i], inner_a, inner_b, keys[i + 1], (t - times[i]) / (times[i + 1] - times[i]))
}

#[test]
fn squad_uniform() {
    for_each_case("squad_uniform", |input, output, _| {
        let found = squad_through(input, |keys, _, i| [squad_inner(keys[i - 1], keys[i], keys[i + 1]); 2]);
        vec![found.distance_to(&unit_rotor(&output["q"]))]
    });
}

/// Both rules for the rate at unevenly spaced keys.
fn check_uneven(
    input: &Value,
    output: &Value,
    rate: impl Fn(Rotor, Rotor, Rotor, f64, f64) -> Bivector,
) -> Vec<f64> {
    let found = squad_through(input, |keys, times, i| {
        let (before_secs, after_secs) = (times[i] - times[i - 1], times[i + 1] - times[i]);
        let rate = rate(keys[i - 1], keys[i], keys[i + 1], before_secs, after_secs);
        squad_inner_uneven(keys[i - 1], keys[i], keys[i + 1], before_secs, after_secs, rate)
    });
    vec![found.distance_to(&unit_rotor(&output["q"]))]
}

#[test]
fn squad_nonuniform_mean_velocity() {
    for_each_case("squad_nonuniform_mean_velocity", |input, output, _| {
        check_uneven(input, output, mean_rate)
    });
}

#[test]
fn squad_nonuniform_three_point() {
    for_each_case("squad_nonuniform_three_point", |input, output, _| {
        check_uneven(input, output, parabola_rate)
    });
}

#[test]
fn rotation_spline() {
    // The three tolerances of a case are brought to that of the rotation.
    for_each_case("rotation_spline", |input, output, case| {
        let (keys, times) = keys_and_times(input);
        let spline = RotationSpline::new(&times, &keys, EndRates::Secant).expect("sound keys");
        let [tol, tol_rate, tol_accel] = ["tol", "tol_rate", "tol_accel"].map(|name| number(&case[name]));
        let at = |sample: &Value| {
            let t = number(&sample["t"]);
            [
                spline.at(t).distance_to(&unit_rotor(&sample["q"])),
                spline.rate(t).distance_to(&plane_angles(&sample["rate"])) * tol / tol_rate,
                spline.acceleration(t).distance_to(&plane_angles(&sample["accel"])) * tol / tol_accel,
            ]
        };
        list(&output["samples"]).iter().flat_map(at).collect()
    });
}

#[test]
fn swing_twist() {
    for_each_case("swing_twist", |input, output, _| {
        let rotation = unit_rotor(&input["q"]);
        let found = SwingTwist::new(rotation, vector(&input["axis"]));
        vec![
            found.swing.distance_to(&unit_rotor(&output["swing"])),
            found.twist.distance_to(&unit_rotor(&output["twist"])),
            found.twist_rad.distance_to(&number(&output["twist_angle"])),
            found.swing_rad().distance_to(&number(&output["swing_angle"])),
            (found.swing * found.twist).distance_to(&rotation),
        ]
    });
}

#[test]
fn weighted_mean() {
    for_each_case("weighted_mean", |input, output, _| {
        let weighted: Vec<(Rotor, f64)> = list(&input["q"])
            .iter()
            .zip(list(&input["w"]))
            .map(|(q, w)| (unit_rotor(q), number(w)))
            .collect();
        let found = chordal_mean(&weighted).expect("sound weights");
        vec![
            found.rotor.distance_to(&unit_rotor(&output["q"])),
            found.certainty.distance_to(&number(&output["relative_eigengap"])),
        ]
    });
}

/// The order, angles and rotation of an Euler case.
fn euler_case(input: &Value, output: &Value) -> (EulerOrder, [f64; 3], Rotor) {
    let order = input["order"].as_str().expect("an order").parse().expect("a known order");
    (order, numbers(&input["angles"]), unit_rotor(&output["q"]))
}

#[test]
fn euler_both_ways() {
    for_each_case("euler", |input, output, case| {
        let (order, angles, rotor) = euler_case(input, output);
        let mut errors = vec![order.to_rotor(angles).distance_to(&rotor)];
        if !case["note"].as_str().is_some_and(|note| note.contains("only angles -> q")) {
            errors.push(order.from_rotor(rotor, 0.0).distance_to(&angles));
        }
        errors
    });
}

#[test]
fn forward_kinematics() {
    for_each_case("forward_kinematics", |input, output, _| {
        let joint = |(number, (parent, offset)): (usize, (&Value, &Value))| Joint {
            name: format!("joint {number}"),
            number,
            parent: parent.as_u64().map(|parent| usize::try_from(parent).expect("a small index")),
            rest: Transform::from_translation(vector(offset)),
            kind: JointKind::Joint,
            tips: vec![],
        };
        let (parents, offsets) = (list(&input["parents"]), list(&input["offsets"]));
        let joints = parents.iter().zip(offsets).enumerate().map(joint).collect();
        let skeleton = Skeleton::new(joints).expect("parents stand before children");
        let mut pose = skeleton.rest_pose();
        for (transform, local) in pose.iter_mut().zip(list(&input["local"])) {
            transform.rotation = unit_rotor(local);
        }
        let expected = list(&output["global"]).iter().zip(list(&output["positions"]));
        let world = skeleton.world(&pose);
        assert_eq!(world.len(), expected.len());
        let errors = world.iter().zip(expected).flat_map(|(found, (rotation, position))| {
            [
                found.rotation.distance_to(&unit_rotor(rotation)),
                found.position().distance_to(&vector(position)),
            ]
        });
        errors.collect()
    });
}

/// At and near the poles the angles are not unique, the rotation is.
fn check_pole(input: &Value, output: &Value) -> Vec<f64> {
    let (order, angles, rotor) = euler_case(input, output);
    // Any angle may be asked to be kept; none may harm the rotation.
    let back = [0.0, angles[2], -3.0, 100.0]
        .map(|kept| order.to_rotor(order.from_rotor(rotor, kept)).distance_to(&rotor));
    [vec![order.to_rotor(angles).distance_to(&rotor)], back.to_vec()].concat()
}

#[test]
fn euler_at_the_poles() {
    for_each_case("euler_gimbal", |input, output, _| check_pole(input, output));
}

#[test]
fn euler_near_the_poles() {
    for_each_case("euler_near_gimbal", |input, output, _| check_pole(input, output));
}

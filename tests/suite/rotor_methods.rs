//! The entries of `reference/method_checks.json` that concern rotors: worked examples of `reference/methods.md`, computed
//! with numpy and scipy. The section, with the published source, is beside each test. Angles there are in degrees; the
//! tolerance is 1e-9 unless the entry states another.

use glam::{DMat3, DVec3};
use serde_json::Value;
use turnwright::rotor::{
    Axis, Bivector, EndRates, EulerOrder, RotationSpline, Rotor, SwingTwist, b_spline, chordal_mean,
    convolve, geodesic_mean, hermite, nlerp, parabola_rate, slerp, slerp_as_signed, squad, squad_inner,
    squad_inner_uneven,
};

use crate::support::{assert_close, list, number, numbers, shared_json, unit_rotor};

/// Of the whole file, unless an entry states its own.
const TOLERANCE: f64 = 1e-9;

/// The whole file; `None` where it is missing.
#[track_caller]
fn method_checks() -> Option<Value> {
    shared_json("reference/method_checks.json")
}

/// The turn by `degrees` about `axis`, by its definition, so that the code under test is not checked by itself.
fn turn(degrees: f64, axis: DVec3) -> Rotor {
    let (sin, cos) = (0.5 * degrees.to_radians()).sin_cos();
    let [x, y, z] = (axis.normalize() * sin).to_array();
    Rotor::from_xyzw([x, y, z, cos])
}

fn vector(value: &Value) -> DVec3 {
    DVec3::from_array(numbers(value))
}

fn matrix_of_rows(value: &Value) -> DMat3 {
    let [a, b, c]: [DVec3; 3] = std::array::from_fn(|row| vector(&value[row]));
    DMat3::from_cols(a, b, c).transpose()
}

/// The entries whose key is a number, such as `"0.25": […]`.
fn at_times(value: &Value) -> Vec<(f64, &Value)> {
    let entries = value.as_object().expect("an object");
    let times: Vec<_> = entries.iter().filter_map(|(key, value)| Some((key.parse().ok()?, value))).collect();
    assert!(!times.is_empty(), "no times in {value}");
    times
}

/// The four keys that several checks share.
fn key_set(checks: &Value) -> [Rotor; 4] {
    std::array::from_fn(|i| unit_rotor(&checks["key_set_K"][i]))
}

#[test]
fn rotor_map() {
    // Section 2: Doran & Lasenby 2003.
    let Some(checks) = method_checks() else { return };
    let check = &checks["rotor_map"];
    let rotor = turn(number(&check["angle_deg"]), vector(&check["axis"]));
    assert_close!(rotor.to_xyzw(), numbers::<4>(&check["quat"]), TOLERANCE);
    assert_close!([rotor.s, rotor.yz, rotor.zx, rotor.xy], numbers::<4>(&check["rotor"]), TOLERANCE);
    let angles =
        Bivector::from_axis(vector(&check["axis"]).normalize() * number(&check["angle_deg"]).to_radians());
    assert_close!(Rotor::from_plane_angles(angles), rotor, TOLERANCE);
    assert_close!(rotor.to_matrix(), matrix_of_rows(&check["matrix_rows"]), TOLERANCE);
    assert_close!(Rotor::from_matrix(&matrix_of_rows(&check["matrix_rows"])), rotor, TOLERANCE);
    assert_close!(rotor.apply(DVec3::X), vector(&check["image_of_100"]), TOLERANCE);
    assert_close!(
        rotor.apply(DVec3::new(0.3, -0.4, 0.5)),
        vector(&check["image_of_0.3_-0.4_0.5"]),
        TOLERANCE
    );
}

#[test]
fn product() {
    // Section 2.
    let Some(checks) = method_checks() else { return };
    let check = &checks["product"];
    let found = Axis::X.rotor(40_f64.to_radians()) * Axis::Y.rotor(70_f64.to_radians());
    assert_close!(found.to_xyzw(), numbers::<4>(&check["quat_ab"]), TOLERANCE);
    assert_close!([found.s, found.yz, found.zx, found.xy], numbers::<4>(&check["rotor_ab"]), TOLERANCE);
    assert_close!(found.turn().to_degrees(), number(&check["angle_deg"]), TOLERANCE);
}

#[test]
fn from_two_vectors() {
    // Section 2: the rotor (1 + v u)/|1 + v u|.
    let Some(checks) = method_checks() else { return };
    let check = &checks["from_two_vectors"];
    let (from, to) = (vector(&check["from"]), vector(&check["to"]));
    let found = Rotor::between(from, to);
    assert_close!([found.s, found.yz, found.zx, found.xy], numbers::<4>(&check["rotor"]), TOLERANCE);
    assert_close!(found.to_xyzw(), numbers::<4>(&check["quat"]), TOLERANCE);
    assert_close!(found.turn().to_degrees(), number(&check["angle_deg"]), TOLERANCE);
    assert_close!(found.apply(from), to, TOLERANCE);
}

#[test]
fn double_cover() {
    // Section 4.
    let Some(checks) = method_checks() else { return };
    let check = &checks["double_cover"];
    let [a, b] = [&check["q0"], &check["q1"]].map(unit_rotor);
    assert_close!(a.dot(b), number(&check["dot"]), TOLERANCE);
    assert_close!(slerp(a, b, 0.5), unit_rotor(&check["short_mid"]), TOLERANCE);
    assert_close!(slerp_as_signed(a, b, 0.5), unit_rotor(&check["raw_mid"]), TOLERANCE);
    assert_close!(slerp(a, b, 0.5).plane_angles().to_degrees(), [0.0, 0.0, -45.0], TOLERANCE);
    assert_close!(slerp_as_signed(a, b, 0.5).plane_angles().to_degrees(), [0.0, 0.0, 135.0], TOLERANCE);
}

#[test]
fn slerp_nlerp() {
    // Section 5: Shoemake 1985.
    let Some(checks) = method_checks() else { return };
    let check = &checks["slerp_nlerp"];
    let [a, b] = [&check["q0"], &check["q1"]].map(unit_rotor);
    assert_close!(a, turn(20.0, DVec3::new(1.0, 2.0, 3.0)), TOLERANCE);
    assert_close!(b, turn(140.0, DVec3::new(-1.0, 0.5, 2.0)), TOLERANCE);
    assert_close!(a.turn_to(b).to_degrees(), number(&check["angle_deg"]), TOLERANCE);
    for t in ["0.25", "0.9"] {
        let at: f64 = t.parse().expect("a number");
        assert_close!(slerp(a, b, at), unit_rotor(&check[format!("slerp_{t}")]), TOLERANCE, "slerp at {t}");
        assert_close!(nlerp(a, b, at), unit_rotor(&check[format!("nlerp_{t}")]), TOLERANCE, "nlerp at {t}");
    }
    let gap = slerp(a, b, 0.25).turn_to(nlerp(a, b, 0.25)).to_degrees();
    assert_close!(gap, number(&check["gap_deg_0.25"]), TOLERANCE);
    assert_close!(slerp(a, b, 0.5), nlerp(a, b, 0.5), TOLERANCE, "half-way the two agree");
    let quarter = nlerp(Rotor::IDENTITY, Axis::Z.rotor(90_f64.to_radians()), 0.25);
    assert_close!(quarter.turn().to_degrees(), number(&check["nlerp_z90_0.25_deg"]), TOLERANCE);
}

#[test]
fn key_set_is_as_described() {
    // Section 6: identity; 40° about x; (60° about y)(40° about x); 110° about z.
    let Some(checks) = method_checks() else { return };
    let x = turn(40.0, DVec3::X);
    let expected = [Rotor::IDENTITY, x, turn(60.0, DVec3::Y) * x, turn(110.0, DVec3::Z)];
    for (found, expected) in key_set(&checks).into_iter().zip(expected) {
        assert_close!(found, expected, TOLERANCE);
    }
}

#[test]
fn squad_uniform() {
    // Section 6: Shoemake 1987.
    let Some(checks) = method_checks() else { return };
    let check = &checks["squad_uniform"];
    let keys = key_set(&checks);
    let inner = [1, 2].map(|i| squad_inner(keys[i - 1], keys[i], keys[i + 1]));
    assert_close!(inner[0], unit_rotor(&check["s1"]), TOLERANCE);
    assert_close!(inner[1], unit_rotor(&check["s2"]), TOLERANCE);
    for (t, expected) in at_times(&check["seg1"]) {
        let found = squad(keys[1], inner[0], inner[1], keys[2], t);
        assert_close!(found, unit_rotor(expected), TOLERANCE, "at {t}");
    }
}

#[test]
fn squad_nonuniform() {
    // Section 6, the parabola through three keys.
    let Some(checks) = method_checks() else { return };
    let check = &checks["squad_nonuniform"];
    let keys = key_set(&checks);
    let times: [f64; 4] = numbers(&check["times"]);
    let inner = |i: usize| {
        let (before_secs, after_secs) = (times[i] - times[i - 1], times[i + 1] - times[i]);
        let rate = parabola_rate(keys[i - 1], keys[i], keys[i + 1], before_secs, after_secs);
        let expected = numbers::<3>(&check["rate_deg_s"][i.to_string()]);
        assert_close!(rate.to_degrees(), expected, TOLERANCE, "rate at key {i}");
        squad_inner_uneven(keys[i - 1], keys[i], keys[i + 1], before_secs, after_secs, rate)
    };
    let ([before_1, after_1], [before_2, _]) = (inner(1), inner(2));
    assert_close!(after_1, unit_rotor(&check["a_plus_1"]), TOLERANCE);
    assert_close!(before_2, unit_rotor(&check["b_minus_2"]), TOLERANCE);
    let segment = |u: f64| squad(keys[1], after_1, before_2, keys[2], u);
    for (u, expected) in at_times(&check["seg1_u"]) {
        assert_close!(segment(u), unit_rotor(expected), TOLERANCE, "at {u}");
    }
    // The rate must not jump at key 1; it does with the inner point for even spacing on both sides.
    let step = 1e-5;
    let rates_deg = |inner_before: Rotor, inner_after: Rotor| {
        let left = squad(keys[0], keys[0], inner_before, keys[1], 1.0 - step).turn_to(keys[1]);
        let right = keys[1].turn_to(squad(keys[1], inner_after, before_2, keys[2], step));
        [left / step, right / (0.5 * step)].map(f64::to_degrees)
    };
    let [left, right] = rates_deg(before_1, after_1);
    assert_close!(left, right, 0.01, "rates on both sides of key 1 in degrees per second");
    let naive = squad_inner(keys[0], keys[1], keys[2]);
    let expected = numbers::<2>(&check["naive_uniform_inner_left_right_speed_deg_s_at_key1"]);
    assert_close!(rates_deg(naive, naive), expected, 0.01, "rates with the even inner point");
}

#[test]
fn cumulative_hermite() {
    // Section 7: Kim, Kim & Shin 1995.
    let Some(checks) = method_checks() else { return };
    let check = &checks["cumulative_hermite"];
    let keys = key_set(&checks);
    let [rate_a, rate_b] = [&check["rate_a_deg_per_unit"], &check["rate_b_deg_per_unit"]]
        .map(|v| Bivector::from_degrees(numbers(v)));
    for (t, expected) in at_times(check) {
        assert_close!(
            hermite(keys[1], rate_a, keys[2], rate_b, t),
            unit_rotor(expected),
            TOLERANCE,
            "at {t}"
        );
    }
}

#[test]
fn cumulative_bspline() {
    // Section 7: Kim, Kim & Shin 1995.
    let Some(checks) = method_checks() else { return };
    for (t, expected) in at_times(&checks["cumulative_bspline"]) {
        assert_close!(b_spline(key_set(&checks), t), unit_rotor(expected), TOLERANCE, "at {t}");
    }
}

#[test]
fn c2_spline() {
    // Section 8: Park & Ravani 1997; the values are scipy's RotationSpline.
    let Some(checks) = method_checks() else { return };
    let check = &checks["c2_spline"];
    let times: [f64; 4] = numbers(&check["times"]);
    let tolerance = number(&check["tolerance"]);
    let spline = RotationSpline::new(&times, &key_set(&checks), EndRates::Secant).expect("sound keys");
    for (t, rate) in times.into_iter().zip(list(&check["rates_at_keys_deg_s"])) {
        assert_close!(spline.rate(t).to_degrees(), numbers::<3>(rate), tolerance, "rate at {t}");
    }
    for (t, expected) in at_times(&check["values"]) {
        assert_close!(spline.at(t), unit_rotor(expected), tolerance, "at {t}");
    }
    let acceleration = spline.acceleration(1.25).to_degrees();
    assert_close!(acceleration, numbers::<3>(&check["acc_deg_s2_at_1.25"]), tolerance);
}

#[test]
fn bvh_zxy() {
    // Section 9: Shoemake 1994; the commonest order of BVH channels.
    let Some(checks) = method_checks() else { return };
    let check = &checks["bvh_zxy"];
    let [angles, mirror] =
        [&check["deg"], &check["mirror_triple"]].map(|v| numbers::<3>(v).map(f64::to_radians));
    let rotor = EulerOrder::ZXY.to_rotor(angles);
    assert_close!(rotor, unit_rotor(&check["quat"]), TOLERANCE);
    assert_close!(rotor.to_matrix(), matrix_of_rows(&check["matrix_rows"]), TOLERANCE);
    let root = DVec3::new(1.0, 2.0, 3.0);
    assert_close!(root + rotor.apply(10.0 * DVec3::Y), vector(&check["root_123_child_0_10_0"]), TOLERANCE);
    assert_close!(root + rotor.apply(10.0 * DVec3::Z), vector(&check["root_123_child_0_0_10"]), TOLERANCE);
    assert_close!(EulerOrder::ZXY.from_rotor(rotor, 0.0), angles, TOLERANCE);
    assert_close!(EulerOrder::ZXY.mirrored(angles), mirror, TOLERANCE);
    assert_close!(EulerOrder::ZXY.to_rotor(mirror), rotor, TOLERANCE);
    assert_close!(EulerOrder::ZXY.nearest_equal(mirror, angles), angles, TOLERANCE);
    // The same three channels, applied in the order x, y, z.
    let [z, x, y] = angles;
    let xyz: EulerOrder = "XYZ".parse().expect("a known order");
    let error_deg = xyz.to_rotor([x, y, z]).turn_to(rotor).to_degrees();
    assert_close!(error_deg, number(&check["read_as_xyz_error_deg"]), TOLERANCE);
}

#[test]
fn swing_twist() {
    // Section 10: Dobrowolski 2015.
    let Some(checks) = method_checks() else { return };
    let check = &checks["swing_twist"];
    let rotation = unit_rotor(&checks["rotor_map"]["quat"]);
    let split = SwingTwist::new(rotation, vector(&check["twist_axis"]));
    assert_close!(split.swing, unit_rotor(&check["swing"]), TOLERANCE);
    assert_close!(split.twist, unit_rotor(&check["twist"]), TOLERANCE);
    assert_close!(split.twist_rad.to_degrees(), number(&check["twist_deg"]), TOLERANCE);
    assert_close!(split.swing_rad().to_degrees(), number(&check["swing_deg"]), TOLERANCE);
    let other_order = split.twist.reverse() * rotation;
    assert_close!(other_order, unit_rotor(&check["other_order_swing"]), TOLERANCE);
}

#[test]
fn cos_product() {
    // Section 10: the cosine of half the whole is the product of those of swing and twist.
    let Some(checks) = method_checks() else { return };
    let check = &checks["cos_product"];
    let [swing_deg, twist_deg] = [&check["swing_deg"], &check["twist_deg"]].map(number);
    let rotation = turn(swing_deg, DVec3::new(3.0, 0.0, -4.0)) * turn(twist_deg, DVec3::Y);
    assert_close!(rotation.turn().to_degrees(), number(&check["total_deg"]), TOLERANCE);
    let split = SwingTwist::new(rotation, DVec3::Y);
    assert_close!(split.swing_rad().to_degrees(), swing_deg, TOLERANCE);
    assert_close!(split.twist_rad.to_degrees(), twist_deg, TOLERANCE);
    assert_close!(split.certainty, (0.5 * swing_deg.to_radians()).cos(), TOLERANCE);
}

#[test]
fn orientation_filter() {
    // Section 14: Lee & Shin 2002. About one axis it is the convolution of the angle.
    let Some(checks) = method_checks() else { return };
    let check = &checks["orientation_filter"];
    let kernel: [f64; 5] = numbers(&check["kernel"]);
    let rotors: Vec<Rotor> = list(&check["z_deg_in"]).iter().map(|deg| turn(number(deg), DVec3::Z)).collect();
    let found = convolve(&rotors, &kernel).expect("a sound kernel");
    assert_eq!(found.len(), rotors.len());
    let expected: [f64; 3] = numbers(&check["z_deg_out_frames_2_4"]);
    assert_close!([2, 3, 4].map(|i: usize| found[i].plane_angles().to_degrees()[2]), expected, TOLERANCE);
}

#[test]
fn orientation_filter_3d() {
    // Section 14: Lee & Shin 2002.
    let Some(checks) = method_checks() else { return };
    let check = &checks["orientation_filter_3d"];
    let degrees = [0.0, 10.0, 20.0, 33.0, 40.0, 50.0, 60.0];
    let rotors = degrees.map(|v| turn(v, DVec3::new(1.0, 2.0, 0.0)) * turn(3.0 * v, DVec3::Z));
    assert_close!(rotors[3], unit_rotor(&check["in_frame_3"]), TOLERANCE);
    let found = convolve(&rotors, &numbers::<3>(&check["kernel"])).expect("a sound kernel");
    assert_close!(found[3], unit_rotor(&check["out_frame_3"]), TOLERANCE);
    assert_close!(found[3].turn_to(rotors[3]).to_degrees(), number(&check["moved_deg"]), TOLERANCE);
}

#[test]
fn weighted_mean() {
    // Section 16: Markley, Cheng, Crassidis & Oshman 2007; Karcher 1977.
    let Some(checks) = method_checks() else { return };
    let check = &checks["weighted_mean"];
    let weighted: Vec<(Rotor, f64)> = list(&check["quats"])
        .iter()
        .zip(list(&check["weights"]))
        .map(|(quat, weight)| (unit_rotor(quat), number(weight)))
        .collect();
    let chordal = chordal_mean(&weighted).expect("sound weights").rotor;
    let geodesic = geodesic_mean(&weighted).expect("near together");
    assert_close!(chordal, unit_rotor(&check["eigen_mean"]), TOLERANCE);
    assert_close!(geodesic, unit_rotor(&check["karcher_mean"]), TOLERANCE);
    assert_close!(chordal.turn_to(geodesic).to_degrees(), number(&check["gap_deg"]), TOLERANCE);
}

#[test]
fn two_input_chordal_mean() {
    // Section 16: of two rotations with unequal weights, only the geodesic mean is slerp.
    let Some(checks) = method_checks() else { return };
    let check = &checks["two_input_chordal_mean"];
    let weights: [f64; 2] = numbers(&check["weights"]);
    let ends = [number(&check["a_deg"]), number(&check["b_deg"])].map(|deg| turn(deg, DVec3::Z));
    let weighted = [(ends[0], weights[0]), (ends[1], weights[1])];
    let chordal = chordal_mean(&weighted).expect("sound weights").rotor;
    let geodesic = geodesic_mean(&weighted).expect("near together");
    assert_close!(chordal.turn().to_degrees(), number(&check["chordal_deg"]), TOLERANCE);
    assert_close!(geodesic.turn().to_degrees(), number(&check["slerp_deg"]), TOLERANCE);
    assert_close!(slerp(ends[0], ends[1], weights[1]), geodesic, TOLERANCE);
}

#[test]
fn additive() {
    // Section 19: the difference taken on the body's side and on the parent's.
    let Some(checks) = method_checks() else { return };
    let check = &checks["additive"];
    let [reference, clip, base] = ["ref", "clip", "base"].map(|name| unit_rotor(&check[name]));
    let weight = number(&check["w"]);
    let body = base * (reference.reverse() * clip).pow(weight);
    let parent = (clip * reference.reverse()).pow(weight) * base;
    assert_close!(body, unit_rotor(&check["body_result"]), TOLERANCE);
    assert_close!(parent, unit_rotor(&check["parent_result"]), TOLERANCE);
    assert_close!(body.turn_to(parent).to_degrees(), number(&check["gap_deg"]), TOLERANCE);
}

#[test]
fn finite_difference() {
    // Section 23: body rate at a frame as the mean of the steps beside it, acceleration as their difference.
    let Some(checks) = method_checks() else { return };
    let check = &checks["finite_difference"];
    let (t, dt) = (number(&check["t"]), number(&check["dt"]));
    let at = |t: f64| {
        let swing = (std::f64::consts::TAU * t).sin() * 90.0;
        Axis::X.rotor(swing.to_radians()) * Axis::Z.rotor((45.0 * t).to_radians())
    };
    let rate = |from: f64, to: f64| (at(from).reverse() * at(to)).plane_angles() / dt;
    let (before, after) = (rate(t - dt, t), rate(t, t + dt));
    let tolerance = number(&check["tolerance"]);
    assert_close!(((before + after) * 0.5).to_degrees(), numbers::<3>(&check["body_rate_deg_s"]), tolerance);
    assert_close!(((after - before) / dt).to_degrees(), numbers::<3>(&check["body_acc_deg_s2"]), tolerance);
}

//! What holds for every rotor, at thousands of random ones that lean to the hard places.

use std::f64::consts::{FRAC_PI_2, PI, TAU};

use glam::{DMat3, DVec3};
use proptest::prelude::*;
use turnwright::rotor::{
    Axis, Bivector, EndRates, EulerOrder, RotationSpline, Rotor, SplineError, SwingTwist, chordal_mean,
    convolve, geodesic_mean, hermite, slerp, slerp_as_signed, squad, squad_inner,
};

use crate::strategies::{
    angle, euler_order, same_cases, tiny, two_rotors, two_vectors, unit_rotor, unit_vector,
};
use crate::support::{Distance, Tally, assert_close};

/// Radians, or parts of 1: some roundings of numbers near 1.
const ROUNDING: f64 = 3e-15;

/// The rotation matrix by the textbook (Rodrigues 1840), without any rotor.
fn matrix_about(axis: DVec3, angle: f64) -> DMat3 {
    let (sin, cos) = angle.sin_cos();
    let across = DMat3::from_cols(axis.cross(DVec3::X), axis.cross(DVec3::Y), axis.cross(DVec3::Z));
    DMat3::IDENTITY + across * sin + across * across * (1.0 - cos)
}

proptest! {
    #![proptest_config(same_cases(2000))]

    #[test]
    fn products_stay_unit([a, b] in two_rotors()) {
        assert_close!((a * b).norm(), 1.0, ROUNDING);
    }

    #[test]
    fn products_hang_together_as_they_should(a in unit_rotor(), b in unit_rotor(), c in unit_rotor()) {
        assert_close!((a * b) * c, a * (b * c), ROUNDING);
        assert_close!((a * b).reverse(), b.reverse() * a.reverse(), ROUNDING);
    }

    #[test]
    fn a_rotor_times_its_reverse_is_one(rotor in unit_rotor()) {
        for product in [rotor * rotor.reverse(), rotor.reverse() * rotor] {
            // All four parts, so that the sign is checked too.
            let parts = [product.s, product.yz, product.zx, product.xy];
            assert_close!(parts, [1.0, 0.0, 0.0, 0.0], ROUNDING);
        }
    }

    #[test]
    fn applying_keeps_lengths_and_handedness(rotor in unit_rotor(), u in unit_vector(), v in unit_vector()) {
        assert_close!(rotor.apply(u).length(), 1.0, ROUNDING);
        assert_close!(rotor.apply(u).dot(rotor.apply(v)), u.dot(v), ROUNDING);
        assert_close!(rotor.apply(u).cross(rotor.apply(v)), rotor.apply(u.cross(v)), 2.0 * ROUNDING);
    }

    #[test]
    fn exp_of_log_is_the_rotation(rotor in unit_rotor()) {
        let short = rotor.plane_angles();
        assert!(short.length() <= PI + ROUNDING, "{short:?}");
        assert_close!(Rotor::from_plane_angles(short), rotor, ROUNDING);
        let same = Rotor::from_plane_angles(rotor.plane_angles_as_signed());
        let away_from_minus_one = rotor.bivector() != Bivector::ZERO || rotor.s > 0.0;
        if away_from_minus_one {
            assert!(same.dot(rotor) > 0.5, "the sign is kept: {same:?}");
        }
        assert_close!(same, rotor, 2.0 * ROUNDING);
    }

    #[test]
    fn log_of_exp_keeps_all_digits(axis in unit_vector(), size in tiny()) {
        let angles = Bivector::from_axis(axis) * size;
        let back = Rotor::from_plane_angles(angles).plane_angles();
        assert!((back - angles).length() <= ROUNDING * angles.length(), "{back:?} for {angles:?}");
    }

    #[test]
    fn long_plane_angles_count_whole_turns(axis in unit_vector(), angle in angle(), turns in -3..=3_i32) {
        let long = Rotor::from_plane_angles(Bivector::from_axis(axis * (angle + TAU * f64::from(turns))));
        // A whole turn in f64 is not quite 2π, and the sum is rounded at 20.
        assert_close!(long, Rotor::from_plane_angles(Bivector::from_axis(axis * angle)), 8.0 * ROUNDING);
    }

    #[test]
    fn plane_angles_are_those_of_the_textbook_matrix(axis in unit_vector(), angle in angle(), v in unit_vector()) {
        let rotor = Rotor::from_plane_angles(Bivector::from_axis(axis * angle));
        assert_close!(rotor.to_matrix(), matrix_about(axis, angle), ROUNDING);
        assert_close!(rotor.apply(v), matrix_about(axis, angle) * v, ROUNDING);
    }

    #[test]
    fn matrices_agree_and_come_back([a, b] in two_rotors(), v in unit_vector()) {
        assert_close!((a * b).to_matrix(), a.to_matrix() * b.to_matrix(), 2.0 * ROUNDING);
        assert_close!(a.to_matrix() * v, a.apply(v), ROUNDING);
        assert_close!(Rotor::from_matrix(&a.to_matrix()), a, 2.0 * ROUNDING);
    }

    #[test]
    fn normalising_works_at_any_size(rotor in unit_rotor(), power in -1074..1000_i32) {
        let scaled = rotor.scale(2_f64.powi(power / 2)).scale(2_f64.powi(power - power / 2));
        // Below the normal numbers digits are lost before the normalising.
        let tolerance = 2_f64.powi(-1072 - power).clamp(ROUNDING, 10.0);
        let unit = scaled.try_normalize();
        assert_eq!(unit.is_none(), [scaled.s, scaled.yz, scaled.zx, scaled.xy] == [0.0; 4]);
        if let Some(unit) = unit {
            assert_close!(unit.norm(), 1.0, ROUNDING);
            assert_close!(unit, rotor, tolerance);
        }
    }

    #[test]
    fn turns_add_up_along_slerp([a, b] in two_rotors(), t in -0.5..1.5_f64) {
        let found = slerp(a, b, t);
        let whole = a.turn_to(b);
        assert_close!(found.norm(), 1.0, ROUNDING);
        // The turn from `a` grows with `t`; past half a turn the way back is shorter.
        let along = t.abs() * whole;
        assert_close!(a.turn_to(found), along.min(TAU - along), 2.0 * ROUNDING);
        assert_eq!(slerp(a, b, 0.0), a);
        assert_close!(slerp(a, b, 1.0), b, 0.0);
        // Either end may be the start, but at the exact half turn, where both ways are right.
        if a.dot(b).abs() > 1e-9 {
            assert_close!(slerp(b, a, 1.0 - t), found, 4.0 * ROUNDING);
        }
    }

    #[test]
    fn slerp_runs_on_into_its_ends([a, b] in two_rotors(), short in 1e-12..1e-6_f64) {
        // No step where the exact ends take over.
        let rate = a.turn_to(b);
        assert_close!(slerp(a, b, short).turn_to(a), rate * short, ROUNDING);
        assert_close!(slerp(a, b, 1.0 - short).turn_to(b), rate * short, 2.0 * ROUNDING);
    }

    #[test]
    fn the_long_way_is_the_rest_of_the_full_turn([a, b] in two_rotors()) {
        let short = b.aligned_to(a);
        let (half_short, half_long) = (slerp_as_signed(a, short, 0.5), slerp_as_signed(a, -short, 0.5));
        if a.turn_to(b) > 1e-9 {
            assert_close!(half_short.turn_to(half_long), PI, 1e-6);
        }
    }

    #[test]
    fn squad_meets_its_keys_and_stays_finite(a in unit_rotor(), [b, c] in two_rotors(), d in unit_rotor(), t in 0.0..=1.0_f64) {
        let (b, c, d) = (b.aligned_to(a), c.aligned_to(b.aligned_to(a)), d.aligned_to(c.aligned_to(b.aligned_to(a))));
        let (inner_b, inner_c) = (squad_inner(a, b, c), squad_inner(b, c, d));
        assert_close!(squad(b, inner_b, inner_c, c, 0.0), b, 0.0);
        assert_close!(squad(b, inner_b, inner_c, c, 1.0), c, 0.0);
        assert_close!(squad(b, inner_b, inner_c, c, t).norm(), 1.0, 2.0 * ROUNDING);
    }

    #[test]
    fn squad_of_an_even_turn_is_slerp(start in unit_rotor(), axis in unit_vector(), angle in -2.0..2.0_f64, t in 0.0..=1.0_f64) {
        let at = |k: f64| start * Rotor::from_plane_angles(Bivector::from_axis(axis) * (angle * k));
        let (inner_b, inner_c) = (squad_inner(at(0.0), at(1.0), at(2.0)), squad_inner(at(1.0), at(2.0), at(3.0)));
        assert_close!(squad(at(1.0), inner_b, inner_c, at(2.0), t), at(1.0 + t), 4.0 * ROUNDING);
    }

    #[test]
    fn between_takes_one_direction_to_the_other_the_short_way([from, to] in two_vectors()) {
        let (u, v) = (from / from.abs().max_element(), to / to.abs().max_element());
        let (u, v) = (u.normalize(), v.normalize());
        let rotor = Rotor::between(from, to);
        assert_close!(rotor.norm(), 1.0, ROUNDING);
        assert_close!(rotor.apply(u), v, ROUNDING);
        // Shortest: the whole turn is the angle between the two, measured without a rotor.
        let expected = 2.0 * (u - v).length().atan2((u + v).length());
        assert_close!(rotor.turn(), expected, ROUNDING);
    }

    #[test]
    fn swing_and_twist_make_up_the_turn(rotation in unit_rotor(), axis in unit_vector(), length in 1e-3..1e3_f64) {
        let split = SwingTwist::new(rotation, axis * length);
        assert_close!(split.swing * split.twist, rotation, ROUNDING);
        assert!(-PI < split.twist_rad && split.twist_rad <= PI, "{split:?}");
        let twist = Rotor::from_plane_angles(Bivector::from_axis(axis * split.twist_rad));
        assert_close!(twist, split.twist, ROUNDING);
        assert_close!(split.swing_rad(), 2.0 * split.certainty.min(1.0).acos(), 1e-7);
        if split.certainty > 0.0 {
            assert!(split.swing.s >= 0.0, "{split:?}");
            // The error in the twist's direction is one rounding over the certainty.
            assert_close!(split.swing.bivector().axis().dot(axis), 0.0, ROUNDING);
        }
        assert_close!(split.twist.apply(axis), axis, ROUNDING, "the twist leaves its axis alone");
    }

    #[test]
    fn a_tiny_twist_keeps_all_digits(axis in unit_vector(), size in tiny(), opposite in any::<bool>()) {
        let rotor = Rotor::from_plane_angles(Bivector::from_axis(axis * size));
        let twist_rad = SwingTwist::new(if opposite { -rotor } else { rotor }, axis).twist_rad;
        assert!((twist_rad - size).abs() <= ROUNDING * size.abs(), "{twist_rad} for {size}");
    }

    #[test]
    fn euler_angles_come_back_as_the_rotation(order in euler_order(), rotor in unit_rotor(), kept in angle()) {
        let [first, middle, last] = order.from_rotor(rotor, kept);
        assert_close!(order.to_rotor([first, middle, last]), rotor, 3.0 * ROUNDING, "{order}");
        assert!(first.abs() <= PI && last.abs() <= PI, "{order}: {first} {last}");
        let range = if order.is_proper() { 0.0..=PI } else { -FRAC_PI_2..=FRAC_PI_2 };
        assert!(range.contains(&middle), "{order}: {middle}");
    }

    #[test]
    fn euler_angles_come_back_as_angles(order in euler_order(), first in angle(), last in angle(), share in 0.001..0.999_f64) {
        let (low, high) = if order.is_proper() { (0.0, PI) } else { (-FRAC_PI_2, FRAC_PI_2) };
        let angles = [first, low + share * (high - low), last];
        let found = order.from_rotor(order.to_rotor(angles), 0.0);
        // First and last are blurred by one over the distance from the pole, and ±π are one angle.
        let blur = 1.0 / (share.min(1.0 - share) * PI);
        assert_close!(order.nearest_equal(found, angles), angles, ROUNDING * blur, "{order}");
        assert_close!(found[1], angles[1], 2.0 * ROUNDING, "{order}");
    }

    #[test]
    fn euler_angles_at_the_poles_keep_the_last_angle(order in euler_order(), first in angle(), last in angle(), upper in any::<bool>()) {
        let middle = match (order.is_proper(), upper) {
            (true, true) => PI,
            (true, false) => 0.0,
            (false, true) => FRAC_PI_2,
            (false, false) => -FRAC_PI_2,
        };
        let rotor = order.to_rotor([first, middle, last]);
        let found = order.from_rotor(rotor, last);
        assert_close!(order.nearest_equal(found, [first, middle, last]), [first, middle, last], 2.0 * ROUNDING, "{order}");
    }

    #[test]
    fn mirrored_and_nearest_angles_are_the_same_turn(
        order in euler_order(),
        angles in prop::array::uniform3(-10.0..10.0_f64),
        reference in prop::array::uniform3(-40.0..40.0_f64),
    ) {
        let rotor = order.to_rotor(angles);
        assert_close!(order.to_rotor(order.mirrored(angles)), rotor, 3.0 * ROUNDING, "{order}");
        let nearest = order.nearest_equal(angles, reference);
        // The tolerance is that of angles near 40.
        assert_close!(order.to_rotor(nearest), rotor, 20.0 * ROUNDING, "{order}");
        // No other triple that means the same is nearer.
        let cost = |triple: [f64; 3]| (0..3).map(|i| (triple[i] - reference[i]).powi(2)).sum::<f64>();
        for other in [nearest, order.mirrored(nearest)] {
            for shift in 0..27 {
                let turns = [shift % 3, shift / 3 % 3, shift / 9].map(|n| TAU * (f64::from(n) - 1.0));
                let triple = std::array::from_fn(|i| other[i] + turns[i]);
                assert!(cost(nearest) <= cost(triple) + 1e-9, "{order}: {triple:?} is nearer than {nearest:?}");
            }
        }
    }

    #[test]
    fn means_of_equal_rotations_are_that_rotation(rotor in unit_rotor(), weights in prop::collection::vec(0.01..10.0_f64, 1..6)) {
        let weighted: Vec<(Rotor, f64)> =
            weights.iter().enumerate().map(|(i, &weight)| (if i % 2 == 0 { rotor } else { -rotor }, weight)).collect();
        let chordal = chordal_mean(&weighted).expect("sound weights");
        assert_close!(chordal.rotor, rotor, 2.0 * ROUNDING);
        assert_close!(chordal.certainty, 1.0, ROUNDING);
        assert_close!(geodesic_mean(&weighted).expect("equal rotations"), rotor, 2.0 * ROUNDING);
    }

    #[test]
    fn the_geodesic_mean_of_two_is_slerp(a in unit_rotor(), axis in unit_vector(), angle in -2.5..2.5_f64, t in 0.0..=1.0_f64) {
        let b = a * Rotor::from_plane_angles(Bivector::from_axis(axis * angle));
        let mean = geodesic_mean(&[(a, 1.0 - t), (b, t)]).expect("less than half a turn apart");
        assert_close!(mean, slerp(a, b, t), 1e-13);
    }

    #[test]
    fn means_turn_with_their_inputs(by in unit_rotor(), steps in prop::collection::vec((unit_vector(), -0.5..0.5_f64, 0.1..1.0_f64), 2..6)) {
        let weighted: Vec<(Rotor, f64)> = steps
            .iter()
            .map(|&(axis, angle, weight)| (Rotor::from_plane_angles(Bivector::from_axis(axis * angle)), weight))
            .collect();
        let turned: Vec<(Rotor, f64)> = weighted.iter().map(|&(rotor, weight)| (by * rotor, weight)).collect();
        let chordal = |w: &[(Rotor, f64)]| chordal_mean(w).expect("sound weights").rotor;
        let geodesic = |w: &[(Rotor, f64)]| geodesic_mean(w).expect("near together");
        assert_close!(chordal(&turned), by * chordal(&weighted), 1e-13);
        assert_close!(geodesic(&turned), by * geodesic(&weighted), 1e-13);
    }

    #[test]
    fn filtering_knows_no_frame_and_no_direction_of_time(
        steps in prop::collection::vec((unit_vector(), -1.5..1.5_f64, any::<bool>()), 0..9),
        left in unit_rotor(),
        right in unit_rotor(),
    ) {
        let mut rotors = vec![Rotor::IDENTITY];
        for (axis, angle, opposite) in steps {
            let next = rotors[rotors.len() - 1] * Rotor::from_plane_angles(Bivector::from_axis(axis * angle));
            rotors.push(if opposite { -next } else { next });
        }
        let smooth = |rotors: &[Rotor]| convolve(rotors, &[0.0625, 0.25, 0.375, 0.25, 0.0625]).expect("a sound kernel");
        let found = smooth(&rotors);
        let turned: Vec<Rotor> = rotors.iter().map(|rotor| left * *rotor * right).collect();
        let backwards: Vec<Rotor> = rotors.iter().rev().copied().collect();
        let (turned, backwards) = (smooth(&turned), smooth(&backwards));
        for (i, rotor) in found.iter().enumerate() {
            assert_close!(turned[i], left * *rotor * right, 1e-14);
            assert_close!(backwards[rotors.len() - 1 - i], *rotor, 1e-14);
        }
    }

    #[test]
    fn hermite_meets_keys_and_rates(a in unit_rotor(), step in unit_rotor(), rates in prop::array::uniform2((unit_vector(), 0.0..1.0_f64))) {
        let b = a * step.pow(0.5);
        let [rate_a, rate_b] = rates.map(|(axis, rate)| Bivector::from_axis(axis * rate));
        let curve = |t: f64| hermite(a, rate_a, b, rate_b, t);
        assert_close!(curve(0.0), a, 0.0);
        assert_close!(curve(1.0), b, 3.0 * ROUNDING);
        let dt = 1e-6;
        let rate = |from: f64, to: f64| (curve(from).reverse() * curve(to)).plane_angles() / dt;
        assert_close!(rate(0.0, dt), rate_a, 1e-4);
        assert_close!(rate(1.0 - dt, 1.0), rate_b, 1e-4);
    }

    #[test]
    fn a_spline_settles_for_steps_up_to_170_degrees(
        steps in prop::collection::vec((unit_vector(), 0.0..2.967_f64, 0.05..1.0_f64), 1..14),
    ) {
        let (mut keys, mut times) = (vec![Rotor::IDENTITY], vec![0.0]);
        for (axis, angle, secs) in steps {
            keys.push(keys[keys.len() - 1] * Rotor::from_plane_angles(Bivector::from_axis(axis * angle)));
            times.push(times[times.len() - 1] + secs);
        }
        let spline = RotationSpline::new(&times, &keys, EndRates::Secant).expect("settled rates");
        assert!(times.iter().all(|&t| spline.acceleration(t).is_finite()));
    }

    #[test]
    fn a_spline_meets_its_keys_without_a_jump(
        start in unit_rotor(),
        steps in prop::collection::vec((unit_vector(), 0.0..1.5_f64, 0.1..2.0_f64, any::<bool>()), 1..8),
    ) {
        let (mut keys, mut times) = (vec![start], vec![-0.3]);
        for (axis, angle, secs, opposite) in steps {
            let next = keys[keys.len() - 1] * Rotor::from_plane_angles(Bivector::from_axis(axis * angle));
            keys.push(if opposite { -next } else { next });
            times.push(times[times.len() - 1] + secs);
        }
        let spline = RotationSpline::new(&times, &keys, EndRates::Secant).expect("sound keys");
        for (key, &t) in keys.iter().zip(&times) {
            assert_close!(spline.at(t), *key, 0.0);
            let near = 1e-9;
            assert_close!(spline.at(t - near), *key, 1e-6);
            assert!(spline.at(t - near).dot(spline.at(t + near)) > 0.9, "the sign does not jump");
            assert_close!(spline.rate(t - near), spline.rate(t + near), 1e-5);
            assert_close!(spline.acceleration(t - near), spline.acceleration(t + near), 1e-4);
        }
        // Rate and acceleration are those of the curve, half-way through the first segment.
        let (t, dt) = (0.5 * (times[0] + times[1]), 1e-4 * (times[1] - times[0]));
        let step = |from: f64, to: f64| (spline.at(from).reverse() * spline.at(to)).plane_angles() / dt;
        let (before, after) = (step(t - dt, t), step(t, t + dt));
        assert_close!((before + after) * 0.5, spline.rate(t), 1e-3 + 1e-3 * spline.rate(t).length());
        assert_close!((after - before) / dt, spline.acceleration(t), 1e-3 * (1.0 + spline.acceleration(t).length()) / (times[1] - times[0]).min(1.0));
    }
}

#[test]
fn euler_accuracy_toward_the_poles() {
    // Measured: the whole way from far off to exactly at both poles, in each of the twelve orders.
    for order in EulerOrder::ALL {
        let (low, high) = if order.is_proper() { (0.0, PI) } else { (-FRAC_PI_2, FRAC_PI_2) };
        let mut tally = Tally::new("euler");
        for step in 0..3_600 {
            let off = if step % 18 == 17 { 0.0 } else { 10_f64.powf(-f64::from(step % 18)) };
            let middle = if step % 2 == 0 { low + off } else { high - off };
            // Steps of the golden ratio spread over all angles.
            let outer = [0.618_033_988_749_895, 0.754_877_666_246_693];
            let [first, last] = outer.map(|ratio| (f64::from(step) * ratio).fract() * TAU - PI);
            let rotor = order.to_rotor([first, middle, last]);
            let back = order.to_rotor(order.from_rotor(rotor, 0.5));
            tally.check(
                &format!("{order} {off:e} rad from the pole"),
                back.distance_to(&rotor),
                3.0 * ROUNDING,
            );
        }
        tally.finish(3_600);
    }
}

#[test]
fn nothing_to_work_on_gives_no_turn() {
    let nan = Rotor::new(f64::NAN, 0.0, 0.0, 0.0);
    for rotor in [Rotor::new(0.0, 0.0, 0.0, 0.0), nan, Rotor::new(1.0, f64::INFINITY, 0.0, 0.0)] {
        assert_eq!(rotor.try_normalize(), None);
        assert_eq!(rotor.normalize(), Rotor::IDENTITY);
    }
    for vector in [DVec3::ZERO, DVec3::NAN, DVec3::new(f64::INFINITY, 0.0, 0.0)] {
        assert_eq!(Rotor::between(vector, DVec3::X), Rotor::IDENTITY);
        assert_eq!(Rotor::between(DVec3::X, vector), Rotor::IDENTITY);
    }
    assert_eq!(Rotor::from_matrix(&DMat3::ZERO), Rotor::IDENTITY);
    assert_eq!(Rotor::from_matrix(&DMat3::NAN), Rotor::IDENTITY);
    assert_eq!(SwingTwist::new(Rotor::IDENTITY, DVec3::ZERO).twist_rad, 0.0);
    assert_eq!(chordal_mean(&[]), None);
    assert_eq!(chordal_mean(&[(Rotor::IDENTITY, 0.0)]), None);
    assert_eq!(chordal_mean(&[(Rotor::IDENTITY, 1.0), (Rotor::IDENTITY, -1.0)]), None);
    assert_eq!(chordal_mean(&[(Rotor::IDENTITY, 2.0), (Axis::X.rotor(1.0), -1.0)]), None);
    assert_eq!(chordal_mean(&[(Rotor::new(0.0, 0.0, 0.0, 0.0), 1.0)]), None);
    assert_eq!(chordal_mean(&[(nan, 1.0)]), None);
    assert_eq!(geodesic_mean(&[(Rotor::IDENTITY, f64::NAN)]), None);
}

#[test]
fn a_spline_keeps_the_end_rates_it_is_given_and_holds_beyond() {
    let keys = [Rotor::IDENTITY, Axis::X.rotor(0.8), Axis::Y.rotor(-0.5)];
    let times = [1.0, 1.5, 3.0];
    let ends = [Bivector::new(0.3, -0.2, 0.1), Bivector::ZERO];
    let spline = RotationSpline::new(&times, &keys, EndRates::Given(ends[0], ends[1])).expect("sound keys");
    for (key, end, at_and_beyond) in
        [(keys[0], ends[0], [1.0, 0.5, -1e9]), (keys[2], ends[1], [3.0, 3.5, 1e9])]
    {
        for t in at_and_beyond {
            assert_close!(spline.at(t), key, 0.0, "at {t}");
            assert_close!(spline.rate(t), end, 1e-14, "at {t}");
        }
    }
}

#[test]
fn a_spline_says_what_is_wrong_with_its_keys() {
    let half_turn = Rotor::new(0.0, 0.0, 1.0, 0.0);
    let check = |times: &[f64], keys: &[Rotor], expected: &str| {
        let error = RotationSpline::new(times, keys, EndRates::Secant).expect_err(expected);
        assert_eq!(error.to_string(), expected);
    };
    let id = Rotor::IDENTITY;
    check(&[], &[], "expected at least 2 keys, found 0");
    check(&[0.0], &[id], "expected at least 2 keys, found 1");
    check(&[0.0, 1.0], &[id], "expected as many times as keys, found 2 times and 1 keys");
    check(&[0.0, 0.0], &[id, id], "expected the time of key 1 to be finite and above 0 s, found 0 s");
    check(&[0.0, f64::NAN], &[id, id], "expected the time of key 1 to be finite and above 0 s, found NaN s");
    check(&[0.0, 1.0], &[id, id.scale(2.0)], "expected key 1 to be a unit rotor, found length 2");
    check(
        &[0.0, 1.0],
        &[id, half_turn],
        "expected less than half a turn from key 0 to the next, found 3.141592653589793 rad",
    );
}

#[test]
fn a_spline_that_finds_no_rates_says_so() {
    // End rates far beyond what the keys need: a thousand radians per second against two.
    let keys = [Rotor::IDENTITY, Axis::X.rotor(2.0), Axis::Y.rotor(2.0), Axis::Z.rotor(-2.0)];
    let wild = EndRates::Given(Bivector::new(0.0, 1000.0, 0.0), Bivector::new(-1000.0, 0.0, 0.0));
    let error = RotationSpline::new(&[0.0, 1.0, 2.0, 3.0], &keys, wild).expect_err("no rates");
    assert!(matches!(error, SplineError::NotSettled { .. }), "{error}");
    assert!(
        error.to_string().starts_with("expected the rates at the keys to settle, they still change by "),
        "{error}"
    );
}

#[test]
fn filtering_moves_nothing_that_it_should_not() {
    let check = |rotors: &[Rotor], kernel: &[f64], expected: &[Rotor]| {
        let found = convolve(rotors, kernel).expect("a sound kernel");
        assert_eq!(found.len(), expected.len());
        for (found, expected) in found.iter().zip(expected) {
            assert_close!(*found, *expected, ROUNDING);
        }
    };
    let wide = [1.0 / 9.0; 9];
    let even_turn = [0.1, 0.2, 0.3, 0.4].map(|angle| Axis::X.rotor(angle));
    check(&[], &wide, &[]);
    check(&even_turn[..1], &wide, &even_turn[..1]);
    check(&even_turn, &[1.0], &even_turn);
    // The mirrored steps carry an even turn on beyond both ends.
    check(&even_turn, &wide, &even_turn);
    check(&[even_turn[0]; 3], &wide, &[even_turn[0]; 3]);
    // A kernel that takes the frame before delays by one, with the first step carried on before the first frame.
    let delayed = [0.0, 0.1, 0.2, 0.3].map(|angle| Axis::X.rotor(angle));
    check(&even_turn, &[1.0, 0.0, 0.0], &delayed);
}

#[test]
fn a_filter_says_what_is_wrong_with_its_kernel() {
    let check = |kernel: &[f64], expected: &str| {
        assert_eq!(convolve(&[Rotor::IDENTITY], kernel).expect_err(expected).to_string(), expected);
    };
    check(&[], "expected a kernel of odd length, found length 0");
    check(&[0.5, 0.5], "expected a kernel of odd length, found length 2");
    check(&[0.25, 0.25, 0.25], "expected a kernel with finite weights that add up to 1, found the sum 0.75");
    check(&[f64::NAN], "expected a kernel with finite weights that add up to 1, found the sum NaN");
}

#[test]
fn euler_orders_are_read_and_written() {
    for order in EulerOrder::ALL {
        assert_eq!(order.to_string().parse(), Ok(order));
        assert_eq!(order.to_string().to_lowercase().parse(), Ok(order));
    }
    for wrong in ["", "X", "XX", "XXY", "XYZX", "XYW", "ZXÝ"] {
        let error = wrong.parse::<EulerOrder>().expect_err("no order");
        assert_eq!(
            error.to_string(),
            format!("expected three of X, Y, Z with neighbours different, such as ZXY, found `{wrong}`")
        );
    }
}

//! Common practice: facts of the trade that stand in every textbook on geometric algebra or rotations, as tests.

use std::f64::consts::{FRAC_1_SQRT_2, FRAC_PI_2, PI};

use glam::{DQuat, DVec3};
use turnwright::rotor::{Axis, Bivector, EulerOrder, Rotor, nlerp, slerp};

use crate::support::assert_close;

/// A few roundings of numbers near 1.
const ROUNDING: f64 = 1e-15;

/// The planes yz, zx, xy as elements of the algebra.
const PLANES: [Rotor; 3] =
    [Rotor::new(0.0, 1.0, 0.0, 0.0), Rotor::new(0.0, 0.0, 1.0, 0.0), Rotor::new(0.0, 0.0, 0.0, 1.0)];

#[test]
fn two_reflections_turn_by_twice_the_angle_between_them() {
    // Common practice.
    let reflect = |v: DVec3, mirror: DVec3| v - 2.0 * v.dot(mirror) * mirror;
    for degrees in [1e-6_f64, 10.0, 45.0, 60.0, 89.999] {
        let angle = degrees.to_radians();
        let first = DVec3::new(2.0, -1.0, 0.5).normalize();
        let second = (first * angle.cos() + first.any_orthonormal_vector() * angle.sin()).normalize();
        let rotor = Rotor::product_of_vectors(second, first);
        assert_close!(rotor.turn(), 2.0 * angle, 1e-14, "{degrees} degrees between the mirrors");
        for v in [DVec3::X, DVec3::Y, DVec3::new(0.3, -2.0, 0.7)] {
            assert_close!(rotor.apply(v), reflect(reflect(v, first), second), 1e-14, "{v}");
        }
    }
}

#[test]
fn the_basis_planes_square_to_minus_one() {
    // Common practice.
    let minus_one = Rotor::new(-1.0, 0.0, 0.0, 0.0);
    for plane in PLANES {
        assert_eq!(plane * plane, minus_one);
    }
}

#[test]
fn the_basis_planes_multiply_in_the_other_order_than_the_quaternion_units() {
    // Common practice.
    let [b1, b2, b3] = PLANES;
    assert_eq!(b1 * b2 * b3, Rotor::IDENTITY);
    assert_eq!(b1 * b2, -b3);
    assert_eq!(b2 * b3, -b1);
    assert_eq!(b3 * b1, -b2);
    assert_eq!(b2 * b1, b3);
}

#[test]
fn the_basis_planes_are_products_of_the_basis_vectors() {
    // Common practice.
    let [e1, e2, e3] = [DVec3::X, DVec3::Y, DVec3::Z];
    assert_eq!([(e2, e3), (e3, e1), (e1, e2)].map(|(u, v)| Rotor::product_of_vectors(u, v)), PLANES);
    for e in [e1, e2, e3] {
        assert_eq!(Rotor::product_of_vectors(e, e), Rotor::IDENTITY, "a unit vector squares to 1");
    }
}

#[test]
fn swapping_the_two_vectors_turns_the_other_way() {
    // Common practice.
    let (u, v) = (DVec3::new(1.0, 2.0, -0.5), DVec3::new(0.3, -1.0, 4.0));
    assert_eq!(Bivector::outer(u, v), -Bivector::outer(v, u));
    assert_eq!(Rotor::product_of_vectors(u, v), Rotor::product_of_vectors(v, u).reverse());
    assert_close!(Rotor::between(u, v), Rotor::between(v, u).reverse(), ROUNDING);
}

#[test]
fn three_planes_in_space_and_one_in_the_plane() {
    // Common practice: n(n − 1)/2 pairs of axes.
    let axes = [DVec3::X, DVec3::Y, DVec3::Z];
    let planes = |axes: &[DVec3]| {
        let pairs = (0..axes.len()).flat_map(|i| (i + 1..axes.len()).map(move |j| (i, j)));
        let planes: Vec<Bivector> = pairs.map(|(i, j)| Bivector::outer(axes[i], axes[j])).collect();
        for (i, a) in planes.iter().enumerate() {
            for (j, b) in planes.iter().enumerate() {
                assert_close!(
                    a.dot(*b),
                    if i == j { 1.0 } else { 0.0 },
                    0.0,
                    "planes {i} and {j} are independent"
                );
            }
        }
        planes.len()
    };
    assert_eq!(planes(&axes), 3);
    assert_eq!(planes(&axes[..2]), 1);
    // Whatever two vectors of the plane xy are taken, nothing but xy comes out.
    let outer = Bivector::outer(DVec3::new(3.0, -1.0, 0.0), DVec3::new(0.5, 2.0, 0.0));
    assert_eq!(outer, Bivector::new(0.0, 0.0, 6.5));
}

#[test]
fn quarter_turns_have_the_right_sign_in_each_plane() {
    // Common practice. About z alone a wrong sign of y would pass.
    let h = FRAC_1_SQRT_2;
    let cases = [
        (Axis::X, [h, 0.0, 0.0, h], DVec3::X, DVec3::Y, DVec3::Z),
        (Axis::Y, [0.0, h, 0.0, h], DVec3::Y, DVec3::Z, DVec3::X),
        (Axis::Z, [0.0, 0.0, h, h], DVec3::Z, DVec3::X, DVec3::Y),
    ];
    for (axis, xyzw, square, from, to) in cases {
        let rotor = axis.rotor(FRAC_PI_2);
        assert_close!(rotor.to_xyzw(), xyzw, ROUNDING, "about {axis:?}");
        assert_close!(rotor.apply(from), to, ROUNDING, "about {axis:?}");
        assert_close!(rotor.apply(square), square, ROUNDING, "about {axis:?}");
        assert_close!(Rotor::from_plane_angles(Bivector::from_axis(square * FRAC_PI_2)), rotor, ROUNDING);
        assert_close!(Rotor::between(from, to), rotor, ROUNDING, "{from} to {to}");
        // glam is the outside party here.
        let outside = DQuat::from_axis_angle(square, FRAC_PI_2);
        assert_close!(rotor.to_xyzw(), outside.to_array(), ROUNDING, "about {axis:?}");
    }
}

#[test]
fn a_rotor_and_its_opposite_are_one_rotation() {
    // Common practice.
    let rotor = EulerOrder::ZXY.to_rotor([0.3, -1.1, 2.0]);
    let v = DVec3::new(1.0, -2.0, 0.5);
    assert_eq!(rotor.apply(v), (-rotor).apply(v));
    assert_eq!(rotor.to_matrix(), (-rotor).to_matrix());
    assert_eq!(rotor.turn_to(-rotor), 0.0);
    assert_eq!(rotor.plane_angles(), (-rotor).plane_angles());
    for t in [0.0, 0.3, 1.0] {
        let other = Axis::Y.rotor(0.7);
        assert_close!(slerp(rotor, -other, t), slerp(rotor, other, t), 0.0, "slerp at {t}");
        assert_close!(nlerp(rotor, -other, t), nlerp(rotor, other, t), 0.0, "nlerp at {t}");
    }
}

#[test]
fn the_right_factor_turns_first() {
    // Common practice.
    let (a, b) = (Axis::X.rotor(FRAC_PI_2), Axis::Y.rotor(FRAC_PI_2));
    let v = DVec3::Z;
    assert_close!((a * b).apply(v), a.apply(b.apply(v)), ROUNDING);
    assert_close!((a * b).apply(v), DVec3::X, ROUNDING, "z to x about y, and x stays about x");
    assert_close!((b * a).apply(v), -DVec3::Y, ROUNDING, "z to −y about x, and y stays about y");
    assert_close!((a * b).to_matrix(), a.to_matrix() * b.to_matrix(), ROUNDING);
}

#[test]
fn a_triangle_on_the_ball_turns_by_its_area() {
    // Common practice: carried along the edges of an octant without twist, a tangent comes back turned by its area, π/2.
    let corners = [DVec3::X, DVec3::Y, DVec3::Z];
    let carried = Rotor::between(corners[2], corners[0])
        * Rotor::between(corners[1], corners[2])
        * Rotor::between(corners[0], corners[1]);
    assert_close!(carried, Axis::X.rotor(FRAC_PI_2), ROUNDING);
}

#[test]
fn half_a_turn_about_each_axis_one_after_the_other_is_none() {
    // Common practice.
    let all = Axis::X.rotor(PI) * Axis::Y.rotor(PI) * Axis::Z.rotor(PI);
    assert_close!(all, Rotor::IDENTITY, ROUNDING);
}

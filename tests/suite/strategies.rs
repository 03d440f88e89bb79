//! Random values for the property tests, leaning to the hard places: next to nothing, half turns, exactly and nearly equal
//! or opposite, the poles of Euler angles.

use std::f64::consts::{FRAC_PI_2, PI};

use glam::DVec3;
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use turnwright::rotor::{Bivector, EulerOrder, Rotor};

/// So many cases, the same in every run, so that the same code gets the same verdict and a failure can be looked at again.
/// `PROPTEST_CASES` and `PROPTEST_RNG_SEED` search further by hand; what that finds is mended at its cause.
pub(crate) fn same_cases(cases: u32) -> ProptestConfig {
    let asked = ProptestConfig::default();
    ProptestConfig {
        cases: if std::env::var_os("PROPTEST_CASES").is_some() { asked.cases } else { cases },
        rng_seed: if asked.rng_seed == RngSeed::Random { RngSeed::Fixed(20) } else { asked.rng_seed },
        ..asked
    }
}

/// A unit vector: often an axis or nearly one, else anywhere.
pub(crate) fn unit_vector() -> impl Strategy<Value = DVec3> {
    let axis = prop_oneof![Just(DVec3::X), Just(DVec3::Y), Just(DVec3::Z)];
    let anywhere = prop::array::uniform3(-1.0..1.0_f64).prop_map(DVec3::from_array);
    let anywhere = anywhere
        .prop_filter_map("too short to have a direction", |v| (v.length() > 1e-3).then(|| v.normalize()));
    prop_oneof![
        1 => (axis.clone(), any::<bool>()).prop_map(|(axis, back)| if back { -axis } else { axis }),
        1 => (axis, tiny(), tiny()).prop_map(|(axis, a, b)| (axis + DVec3::new(a, b, a - b)).normalize()),
        4 => anywhere,
    ]
}

/// A number from 1e-300 to 1e-3 of either sign, all sizes alike, or zero.
pub(crate) fn tiny() -> impl Strategy<Value = f64> {
    prop_oneof![
        1 => Just(0.0),
        4 => (-300.0..-3.0_f64, any::<bool>()).prop_map(|(power, below)| {
            let size = 10_f64.powf(power);
            if below { -size } else { size }
        }),
        4 => (-18.0..-3.0_f64, any::<bool>()).prop_map(|(power, below)| {
            let size = 10_f64.powf(power);
            if below { -size } else { size }
        }),
    ]
}

/// An angle in −π to π radians, or a little beyond: often at or next to 0, ±π/2 or ±π.
pub(crate) fn angle() -> impl Strategy<Value = f64> {
    let special = prop_oneof![Just(0.0), Just(FRAC_PI_2), Just(-FRAC_PI_2), Just(PI), Just(-PI)];
    prop_oneof![
        1 => special.clone(),
        2 => (special, tiny()).prop_map(|(angle, off)| angle + off),
        3 => -PI..PI,
    ]
}

/// A unit rotor of either sign, its turn as [`angle`].
pub(crate) fn unit_rotor() -> impl Strategy<Value = Rotor> {
    (unit_vector(), angle(), any::<bool>()).prop_map(|(axis, angle, opposite)| {
        let rotor = Rotor::from_plane_angles(Bivector::from_axis(axis * angle));
        if opposite { -rotor } else { rotor }
    })
}

/// Two unit rotors: often equal, opposite, half a turn apart, or next to one of these.
pub(crate) fn two_rotors() -> impl Strategy<Value = [Rotor; 2]> {
    prop_oneof![
        (unit_rotor(), any::<bool>()).prop_map(|(a, opposite)| [a, if opposite { -a } else { a }]),
        [unit_rotor(), unit_rotor()].prop_map(|[a, step]| [a, a * step]),
        [unit_rotor(), unit_rotor()],
    ]
}

/// Two vectors that are not zero, of any lengths: often along each other, opposite, or next to that.
pub(crate) fn two_vectors() -> impl Strategy<Value = [DVec3; 2]> {
    let length = (-300.0..300.0_f64).prop_map(|power| 10_f64.powf(power));
    let near = (unit_vector(), unit_vector(), tiny(), any::<bool>()).prop_map(|(u, side, off, opposite)| {
        let v = u + side * off;
        [u, if opposite { -v } else { v }]
    });
    let pair = prop_oneof![near, [unit_vector(), unit_vector()]];
    (pair, length.clone(), length).prop_map(|([u, v], a, b)| [u * a, v * b])
}

/// One of the twelve orders.
pub(crate) fn euler_order() -> impl Strategy<Value = EulerOrder> {
    prop::sample::select(EulerOrder::ALL.to_vec())
}

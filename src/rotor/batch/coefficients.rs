//! Polynomials of the bulk kernels. Made by `fit_coefficients.py` beside this file; not to be edited by hand.
#![expect(clippy::unreadable_literal, reason = "nobody reads them, and a script writes them")]

use super::real::Quotient;

/// `sin √y / √y`, 0 ≤ y ≤ (π/2)²: factors of rising powers.
pub(super) const SINE_OVER_ANGLE_F64: [f64; 9] = [
    1.0,
    -0.16666666666666666,
    0.008333333333333316,
    -0.00019841269841254974,
    2.755731921916321e-06,
    -2.5052107616993125e-08,
    1.6058977312265895e-10,
    -7.643970290470771e-13,
    2.731444688085806e-15,
];

/// `sin √y / √y`, 0 ≤ y ≤ (π/2)²: factors of rising powers.
pub(super) const SINE_OVER_ANGLE_F32: [f32; 5] =
    [1.0, -0.16666666, 0.0083332425, -0.0001982274, 2.6347564e-06];

/// `cos √y`, 0 ≤ y ≤ (π/2)²: factors of rising powers.
pub(super) const COSINE_F64: [f64; 9] = [
    1.0,
    -0.5,
    0.04166666666666634,
    -0.0013888888888860709,
    2.4801587292446166e-05,
    -2.7557317767314736e-07,
    2.0876630867047524e-09,
    -1.1464689873732412e-11,
    4.627675835547813e-14,
];

/// `cos √y`, 0 ≤ y ≤ (π/2)²: factors of rising powers.
pub(super) const COSINE_F32: [f32; 6] = [1.0, -0.5, 0.04166666, -0.0013888652, 2.477458e-05, -2.6297516e-07];

/// `atan √y / √y`, 0 ≤ y ≤ tan²(π/8): factors of rising powers.
pub(super) const ARC_TANGENT_F64: [f64; 13] = [
    1.0,
    -0.3333333333333333,
    0.19999999999999804,
    -0.14285714285659828,
    0.11111111105155398,
    -0.0909090875349846,
    0.07692296374962261,
    -0.0666642488448313,
    0.05878928983403345,
    -0.052304541643613894,
    0.0455159273578562,
    -0.034570549512274305,
    0.01628574303651472,
];

/// `θ/(2 sin θ/2)` of `u = 1 − cos θ`, 0 ≤ u ≤ 1: factors of rising powers.
pub(super) const MIDDLE_RATE_F64: [f64; 6] = [
    1.0,
    0.08333516435921424,
    0.018659212103264843,
    0.0062749256449246334,
    0.00013734772811038222,
    0.002310913866974811,
];

/// `tan(α/4)/α` of `α²`, 0 to π²: factors of rising powers above the line.
pub(super) const QUARTER_TANGENT_ABOVE: [f64; 4] =
    [0.25, -0.002004455158941089, 2.740335121659926e-06, -4.5687412797391243e-10];

/// `tan(α/4)/α` of `α²`, 0 to π²: factors of rising powers below the line.
pub(super) const QUARTER_TANGENT_BELOW: [f64; 4] =
    [1.0, -0.02885115396909749, 9.1193714842523e-05, -5.0897117287761236e-08];

/// `θ²/(1 − d)` of `d = cos θ`, 0 ≤ d ≤ 1: factors of rising powers above the line, and below it all but the last, which is 1.
pub(super) const SQUARE_OVER_REST_F64: Quotient<f64, 7, 6> = Quotient {
    above: [
        3782.9580883901413,
        9170.712128223551,
        8030.071469148445,
        3080.109084186303,
        496.23752657660634,
        25.82378614251693,
        0.13387410424044138,
    ],
    below: [
        1533.1751647401782,
        4135.673714711858,
        4182.046581251605,
        1967.8273448914122,
        433.8853124173312,
        39.41486037351756,
    ],
};

/// `θ²/(1 − d)` of `d = cos θ`, 0 ≤ d ≤ 1: factors of rising powers above the line, and below it all but the last, which is 1.
pub(super) const SQUARE_OVER_REST_F32: Quotient<f32, 4, 3> =
    Quotient { above: [64.02327, 67.84206, 15.455492, 0.32054812], below: [25.947655, 34.58527, 12.287759] };

/// `θ/sin θ` of `d = cos θ`, 0 ≤ d ≤ 1: factors of rising powers above the line, and below it all but the last, which is 1.
pub(super) const ANGLE_OVER_SINE_F64: Quotient<f64, 7, 6> = Quotient {
    above: [
        857.6622334406472,
        2059.215576588245,
        1778.828411963824,
        668.4951207547354,
        104.02309897534343,
        5.016856209006433,
        0.014686386697541607,
    ],
    below: [
        546.0047358212563,
        1658.5347622535253,
        1915.29099360495,
        1047.3535539151553,
        274.4958853407625,
        30.576053382849427,
    ],
};

/// `θ/sin θ` of `d = cos θ`, 0 ≤ d ≤ 1: factors of rising powers above the line, and below it all but the last, which is 1.
pub(super) const ANGLE_OVER_SINE_F32: Quotient<f32, 4, 3> = Quotient {
    above: [17.325125, 17.854483, 3.8039958, 0.047282327],
    below: [11.029517, 18.38812, 8.613247],
};

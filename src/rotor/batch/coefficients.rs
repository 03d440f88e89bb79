//! Polynomials of the bulk kernels. Made by `fit_coefficients.py` beside this file; not to be edited by hand.
#![expect(clippy::unreadable_literal, reason = "nobody reads them, and a script writes them")]

use super::real::Quotient;

/// `sin √y / √y`, 0 ≤ y ≤ 0.6169: factors of rising powers.
pub(super) const SINE_OVER_ANGLE_F64: [f64; 7] = [
    1.0,
    -0.16666666666666666,
    0.008333333333330948,
    -0.00019841269836758557,
    2.7557316102543096e-06,
    -2.5051131843056034e-08,
    1.5918129154550544e-10,
];

/// `sin √y / √y`, 0 ≤ y ≤ 2.467: factors of rising powers.
pub(super) const SINE_OVER_ANGLE_F32: [f32; 5] =
    [1.0, -0.16666666, 0.0083332425, -0.0001982274, 2.6347564e-06];

/// `cos √y`, 0 ≤ y ≤ 0.6169: factors of rising powers.
pub(super) const COSINE_F64: [f64; 7] = [
    1.0,
    -0.49999999999999967,
    0.04166666666663093,
    -0.0013888888882127924,
    2.480158262333795e-05,
    -2.755585550901141e-07,
    2.066550465988738e-09,
];

/// `cos √y`, 0 ≤ y ≤ 2.467: factors of rising powers.
pub(super) const COSINE_F32: [f32; 6] = [1.0, -0.5, 0.04166666, -0.0013888652, 2.477458e-05, -2.6297516e-07];

/// `atan √y / √y`, 0 ≤ y ≤ 0.1716: factors of rising powers.
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

/// `θ/(2 sin θ/2)` of `u = 1 − cos θ`, 0 ≤ u ≤ 1.0: factors of rising powers.
pub(super) const MIDDLE_RATE_F64: [f64; 6] = [
    1.0,
    0.08333516435921424,
    0.018659212103264843,
    0.0062749256449246334,
    0.00013734772811038222,
    0.002310913866974811,
];

/// `θ/(2 sin θ/2)` of `v = 2 − 2 cos θ/2`, 0 ≤ v ≤ 0.5858: factors of rising powers.
pub(super) const ARC_OVER_CHORD_F64: [f64; 12] = [
    1.0,
    0.1666666666666667,
    0.03333333333331488,
    0.007142857144113382,
    0.0015873015540314253,
    0.00036075081122810104,
    8.324653925813563e-05,
    1.9442304068149153e-05,
    4.516913474516205e-06,
    1.1880654512373967e-06,
    1.324662609861103e-07,
    1.397673504600763e-07,
];

/// `θ/(2 sin θ/2)` of `v = 2 − 2 cos θ/2`, 0 ≤ v ≤ 0.5858: factors of rising powers.
pub(super) const ARC_OVER_CHORD_F32: [f32; 6] =
    [1.0, 0.16666669, 0.033331964, 0.0071613025, 0.0015019185, 0.0005157761];

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

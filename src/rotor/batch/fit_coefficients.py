"""Fits the polynomials of the bulk kernels and writes coefficients.rs beside this file.

    pip install mpmath
    python3 src/rotor/batch/fit_coefficients.py

Each is a Chebyshev fit in 60 digits, of the function without its value at 0, which stays exact. The error printed is
the largest of the polynomial itself, before its factors are rounded to the machine's numbers.
"""

import pathlib
import struct

import mpmath as mp

mp.mp.dps = 60


def square_over_rest(u):
    """θ²/u with u = 1 − cos θ: 2 at 0."""
    return mp.mpf(2) if u == 0 else mp.acos(1 - u) ** 2 / u


def angle_over_sine(u):
    """θ/sin θ with u = 1 − cos θ: 1 at 0."""
    return mp.mpf(1) if u == 0 else mp.acos(1 - u) / mp.sqrt(u * (2 - u))


def sine_over_angle(y):
    """sin √y/√y: 1 at 0."""
    return mp.mpf(1) if y == 0 else mp.sin(mp.sqrt(y)) / mp.sqrt(y)


def cosine(y):
    """cos √y: 1 at 0."""
    return mp.cos(mp.sqrt(y))


def arc_tangent(y):
    """atan √y/√y: 1 at 0."""
    return mp.mpf(1) if y == 0 else mp.atan(mp.sqrt(y)) / mp.sqrt(y)


QUARTER = (mp.pi / 2) ** 2
EIGHTH_TANGENT = mp.tan(mp.pi / 8) ** 2
# A hair beyond the range, so that rounding at its end stays inside.
HAIR = mp.mpf("1.000001")

# name, what it is, function, end of the range, degree for f64 and f32 (None: no f32 kernel needs it).
FITS = [
    ("SQUARE_OVER_REST", "`θ²/u` of `u = 1 − cos θ`, 0 ≤ u ≤ 1", square_over_rest, mp.mpf(1), 18, 8),
    ("ANGLE_OVER_SINE", "`θ/sin θ` of `u = 1 − cos θ`, 0 ≤ u ≤ 1", angle_over_sine, mp.mpf(1), 20, 9),
    ("SINE_OVER_ANGLE", "`sin √y / √y`, 0 ≤ y ≤ (π/2)²", sine_over_angle, QUARTER, 8, 4),
    ("COSINE", "`cos √y`, 0 ≤ y ≤ (π/2)²", cosine, QUARTER, 8, 5),
    ("ARC_TANGENT", "`atan √y / √y`, 0 ≤ y ≤ tan²(π/8)", arc_tangent, EIGHTH_TANGENT, 12, None),
]


def round_to(kind, value):
    number = float(value)
    return number if kind == "f64" else struct.unpack("f", struct.pack("f", number))[0]


def text(kind, value):
    """The shortest decimal that reads back as the same number of its kind."""
    number = round_to(kind, value)
    if kind == "f64":
        return repr(number)
    for digits in range(1, 12):
        shortest = f"{number:.{digits}g}"
        if round_to("f32", float(shortest)) == number:
            return repr(float(shortest))
    raise ValueError(value)


lines = [
    "//! Polynomials of the bulk kernels. Made by `fit_coefficients.py` beside this file; not to be edited by hand.",
    '#![expect(clippy::unreadable_literal, reason = "nobody reads them, and a script writes them")]',
    "",
]
for name, meaning, function, end, *degrees in FITS:
    at_zero = function(mp.mpf(0))
    for kind, degree in zip(("f64", "f32"), degrees):
        if degree is None:
            continue
        # Chebyshev fit of (f(y) − f(0))/y; near 0 its series by a tiny step, which 60 digits can bear.
        step = mp.mpf(10) ** -20
        rest = lambda y: (function(max(y, step)) - at_zero) / max(y, step)
        factors, error = mp.chebyfit(rest, [mp.mpf(0), end * HAIR], degree, error=True)
        print(f"{name} {kind}: degree {degree}, error {mp.nstr(error * end, 3)}")
        rising = [at_zero, *reversed(factors)]
        lines.append(f"/// {meaning}: factors of rising powers.")
        lines.append(f"pub(super) const {name}_{kind.upper()}: [{kind}; {degree + 1}] = [")
        lines.extend(f"    {text(kind, factor)}," for factor in rising)
        lines.append("];")
        lines.append("")

pathlib.Path(__file__).with_name("coefficients.rs").write_text("\n".join(lines[:-1]) + "\n")

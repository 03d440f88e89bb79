"""Fits the polynomials of the bulk kernels and writes coefficients.rs beside this file.

    pip install mpmath
    python3 src/rotor/batch/fit_coefficients.py

Each polynomial is a Chebyshev fit in 60 digits, of the function without its value at 0, which stays exact; each quotient meets
its function at the Chebyshev points. `SHORT_SINE` is the polynomial whose *sine* errs least (exchange of points, Remez 1934): where
the angle is small its factor may be rougher, as the angle multiplies it, and so one power less is enough where a single sine is asked, as in
exp; slerp adds two. The error printed is the largest of the fit itself, before its factors are rounded to the machine's numbers.

Why quotients of `d = cos θ` where the angle comes out of a cosine: 6 over 6 does what takes a polynomial of degree 18, its two halves don't
wait for each other, and all its factors are above 0, so that nothing cancels (in `1 − d` they alternate and lose two digits).
"""

import pathlib
import struct

import mpmath as mp

mp.mp.dps = 60


def square_over_rest(d):
    """θ²/(1 − d) with d = cos θ: 2 at d = 1."""
    return mp.mpf(2) if d == 1 else mp.acos(d) ** 2 / (1 - d)


def angle_over_sine(d):
    """θ/sin θ with d = cos θ: 1 at d = 1."""
    return mp.mpf(1) if d == 1 else mp.acos(d) / mp.sqrt(1 - d * d)


def sine_over_angle(y):
    """sin √y/√y: 1 at 0."""
    return mp.mpf(1) if y == 0 else mp.sin(mp.sqrt(y)) / mp.sqrt(y)


def cosine(y):
    """cos √y: 1 at 0."""
    return mp.cos(mp.sqrt(y))


def arc_tangent(y):
    """atan √y/√y: 1 at 0."""
    return mp.mpf(1) if y == 0 else mp.atan(mp.sqrt(y)) / mp.sqrt(y)


def middle_rate(u):
    """θ/(2 sin θ/2) with u = 1 − cos θ: 1 at 0."""
    angle = mp.acos(1 - u)
    return mp.mpf(1) if u == 0 else angle / (2 * mp.sin(angle / 2))


QUARTER = (mp.pi / 2) ** 2
EIGHTH_TANGENT = mp.tan(mp.pi / 8) ** 2
# A hair beyond the range, so that rounding at its end stays inside.
HAIR = mp.mpf("1.000001")

# name, what it is, function, end of the range, degree for f64 and f32 (None: no f32 kernel needs it).
FITS = [
    ("SINE_OVER_ANGLE", "`sin √y / √y`, 0 ≤ y ≤ (π/2)²", sine_over_angle, QUARTER, 8, 4),
    ("SHORT_SINE", "`sin √y / √y`, 0 ≤ y ≤ (π/2)², times `√y` within 1.1e-16", sine_over_angle, QUARTER, 7, None),
    ("COSINE", "`cos √y`, 0 ≤ y ≤ (π/2)²", cosine, QUARTER, 8, 5),
    ("ARC_TANGENT", "`atan √y / √y`, 0 ≤ y ≤ tan²(π/8)", arc_tangent, EIGHTH_TANGENT, 12, None),
    ("MIDDLE_RATE", "`θ/(2 sin θ/2)` of `u = 1 − cos θ`, 0 ≤ u ≤ 1", middle_rate, mp.mpf(1), 5, None),
]

# name, what it is, function, degree above and below for f64 and f32.
QUOTIENTS = [
    ("SQUARE_OVER_REST", "`θ²/(1 − d)` of `d = cos θ`, 0 ≤ d ≤ 1", square_over_rest, 6, 3),
    ("ANGLE_OVER_SINE", "`θ/sin θ` of `d = cos θ`, 0 ≤ d ≤ 1", angle_over_sine, 6, 3),
]


def chebyshev(function, end, degree):
    """Factors of rising powers of (f(y) − f(0))/y, and the largest error of f."""
    # Near 0 its series by a tiny step, which 60 digits can bear.
    step = mp.mpf(10) ** -20
    rest = lambda y: (function(max(y, step)) - function(mp.mpf(0))) / max(y, step)
    factors, error = mp.chebyfit(rest, [mp.mpf(0), end], degree, error=True)
    return factors[::-1], error * end


def least_sine(function, end, degree):
    """Factors of rising powers of (f(y) − 1)/y for f = sin √y/√y, with the error of √y·f, the sine, as small as can be, and that error."""
    weight = lambda y: y * mp.sqrt(y)
    grid = [end * (1 - mp.cos(mp.pi * i / 2000)) / 2 for i in range(1, 2001)]
    wanted = [(function(y) - 1) / y for y in grid]
    points = [(2000 * (2 * i + 1)) // (2 * degree + 2) for i in range(degree + 1)]
    while True:
        rows = [[grid[k] ** p for p in range(degree)] + [(-1) ** i / weight(grid[k])] for i, k in enumerate(points)]
        *factors, _ = mp.lu_solve(mp.matrix(rows), mp.matrix([wanted[k] for k in points]))
        errors = [(mp.polyval(factors[::-1], y) - r) * weight(y) for y, r in zip(grid, wanted)]
        # The largest error of each stretch of one sign. There are as many stretches as unknowns.
        stretches = [0]
        for k in range(1, len(grid)):
            if mp.sign(errors[k]) != mp.sign(errors[stretches[-1]]):
                stretches.append(k)
            elif abs(errors[k]) > abs(errors[stretches[-1]]):
                stretches[-1] = k
        if len(stretches) != degree + 1:
            raise ValueError(f"{len(stretches)} stretches for {degree + 1} unknowns")
        if stretches == points:
            return factors, max(abs(error) for error in errors)
        points = stretches


def quotient(function, degree):
    """Factors of rising powers above and below; the last one below is 1."""
    count = 2 * degree + 1
    points = [(1 - mp.cos(mp.pi * (2 * i + 1) / (2 * count))) / 2 for i in range(count)]
    rows = [
        [x**power for power in range(degree + 1)] + [-function(x) * x**power for power in range(degree)]
        for x in points
    ]
    solved = mp.lu_solve(mp.matrix(rows), mp.matrix([function(x) * x**degree for x in points]))
    above, below = list(solved[: degree + 1]), [*solved[degree + 1 :], mp.mpf(1)]
    value = lambda x: mp.polyval(above[::-1], x) / mp.polyval(below[::-1], x)
    error = max(abs(value(x) / function(x) - 1) for x in (mp.mpf(i) / 1000 for i in range(1001)))
    return above, below, error


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
    "use super::real::Quotient;",
    "",
]
for name, meaning, function, end, *degrees in FITS:
    at_zero = function(mp.mpf(0))
    for kind, degree in zip(("f64", "f32"), degrees):
        if degree is None:
            continue
        fit = least_sine if name == "SHORT_SINE" else chebyshev
        factors, error = fit(function, end * HAIR, degree)
        print(f"{name} {kind}: degree {degree}, error {mp.nstr(error, 3)}")
        rising = [at_zero, *factors]
        lines.append(f"/// {meaning}: factors of rising powers.")
        lines.append(f"pub(super) const {name}_{kind.upper()}: [{kind}; {degree + 1}] = [")
        lines.extend(f"    {text(kind, factor)}," for factor in rising)
        lines.append("];")
        lines.append("")

for name, meaning, function, *degrees in QUOTIENTS:
    for kind, degree in zip(("f64", "f32"), degrees):
        above, below, error = quotient(function, degree)
        print(f"{name} {kind}: {degree} over {degree}, error {mp.nstr(error, 3)}")
        lines.append(f"/// {meaning}: factors of rising powers above the line, and below it all but the last, which is 1.")
        lines.append(f"pub(super) const {name}_{kind.upper()}: Quotient<{kind}, {degree + 1}, {degree}> = Quotient {{")
        lines.append("    above: [")
        lines.extend(f"        {text(kind, factor)}," for factor in above)
        lines.append("    ],")
        lines.append("    below: [")
        lines.extend(f"        {text(kind, factor)}," for factor in below[:-1])
        lines.append("    ],")
        lines.append("};")
        lines.append("")

pathlib.Path(__file__).with_name("coefficients.rs").write_text("\n".join(lines[:-1]) + "\n")

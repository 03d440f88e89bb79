"""Fits the polynomials of the bulk kernels and writes coefficients.rs beside this file.

    pip install mpmath
    python3 src/rotor/batch/fit_coefficients.py

Each polynomial is a Chebyshev fit in 60 digits, of the function without its value at 0, which stays exact; each quotient meets
its function at the Chebyshev points. `QUARTER_TANGENT` is the quotient from which half the angle comes with the least error (exchange of points,
Remez 1934), both values at 0 kept exact: exp takes cosine and sine from it. The error printed is the largest of the fit itself, before its
factors are rounded to the machine's numbers.

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


def quarter_tangent(y):
    """tan(α/4)/α with y = α²: a quarter at 0."""
    return mp.mpf(1) / 4 if y == 0 else mp.tan(mp.sqrt(y) / 4) / mp.sqrt(y)


def least_half_angle(degree):
    """Factors of rising powers of a and b, 1/4 and 1 the first, with α·a/b the tangent of α/4 for α² from 0 to π², and the largest error of α/2 from it."""
    end = mp.pi**2 * HAIR
    grid = [end * (1 - mp.cos(mp.pi * i / 1500)) / 2 for i in range(1, 1501)]
    exact = [quarter_tangent(y) for y in grid]
    # An error by a share in the tangent of y is one of sin 2y times that share in 2y.
    weights = [mp.sin(mp.sqrt(y) / 2) for y in grid]
    points = [(1500 * (2 * i + 1)) // (4 * degree + 2) for i in range(2 * degree + 1)]
    level = mp.mpf(0)
    while True:
        # weight · (a/(f·b) − 1) = ±level, times b. The product of level and b is not linear: a few rounds about the level before.
        for _ in range(6):
            rows, wanted = [], []
            for i, k in enumerate(points):
                sign, share = (-1) ** i, weights[k] / exact[k]
                powers = [grid[k] ** power for power in range(1, degree + 1)]
                beside = weights[k] + sign * level
                rows.append([share * power for power in powers] + [-beside * power for power in powers] + [-sign])
                wanted.append(beside - share / 4)
            solved = mp.lu_solve(mp.matrix(rows), mp.matrix(wanted))
            level += solved[2 * degree]
        above = [mp.mpf(1) / 4, *solved[:degree]]
        below = [mp.mpf(1), *solved[degree : 2 * degree]]
        value = lambda y: mp.polyval(above[::-1], y) / mp.polyval(below[::-1], y)
        errors = [(value(y) / f - 1) * weight for y, f, weight in zip(grid, exact, weights)]
        # The largest error of each stretch of one sign. There are as many stretches as unknowns.
        stretches = [0]
        for k in range(1, len(grid)):
            if mp.sign(errors[k]) != mp.sign(errors[stretches[-1]]):
                stretches.append(k)
            elif abs(errors[k]) > abs(errors[stretches[-1]]):
                stretches[-1] = k
        if len(stretches) != 2 * degree + 1:
            raise ValueError(f"{len(stretches)} stretches for {2 * degree + 1} unknowns")
        if stretches == points:
            return above, below, max(abs(error) for error in errors)
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
        factors, error = chebyshev(function, end * HAIR, degree)
        print(f"{name} {kind}: degree {degree}, error {mp.nstr(error, 3)}")
        rising = [at_zero, *factors]
        lines.append(f"/// {meaning}: factors of rising powers.")
        lines.append(f"pub(super) const {name}_{kind.upper()}: [{kind}; {degree + 1}] = [")
        lines.extend(f"    {text(kind, factor)}," for factor in rising)
        lines.append("];")
        lines.append("")

*quarters, error = least_half_angle(3)
print(f"QUARTER_TANGENT f64: 3 over 3, error of half the angle {mp.nstr(error, 3)}")
for place, factors in zip(("above", "below"), quarters):
    lines.append(f"/// `tan(α/4)/α` of `α²`, 0 to π²: factors of rising powers {place} the line.")
    lines.append(f"pub(super) const QUARTER_TANGENT_{place.upper()}: [f64; {len(factors)}] = [")
    lines.extend(f"    {text('f64', factor)}," for factor in factors)
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

"""Makes path_reference.json: orientation, body rate and its change along paths through rotors, in 50 digits.

    pip install mpmath
    python3 tests/data/make_path_reference.py > tests/data/path_reference.json

The keys are exact numbers of the machine, made unit first. The curves are computed from their definitions (Shoemake 1987
for squad, Kim, Kim & Shin 1995 for the cumulative ones, with the basis by the recursion of Cox and de Boor and controls
at the mean of three knots, appendix C.5 of glTF 2.0 for the cubic); rates and accelerations by numeric derivatives of the four numbers at high precision.
Rotors are `s, yz, zx, xy`.
"""

import json
import random

import mpmath as mp

mp.mp.dps = 50
RANDOM = random.Random(20261202)


def unit(parts):
    size = mp.sqrt(sum(mp.mpf(part) ** 2 for part in parts))
    return [mp.mpf(part) / size for part in parts]


def product(a, b):
    (s, yz, zx, xy), (os, oyz, ozx, oxy) = a, b
    return [
        s * os - yz * oyz - zx * ozx - xy * oxy,
        s * oyz + yz * os - (zx * oxy - xy * ozx),
        s * ozx + zx * os - (xy * oyz - yz * oxy),
        s * oxy + xy * os - (yz * ozx - zx * oyz),
    ]


def reverse(a):
    return [a[0], -a[1], -a[2], -a[3]]


def dot(a, b):
    return sum(x * y for x, y in zip(a, b))


def aligned(a, b):
    return [-x for x in a] if dot(a, b) < 0 else a


def exp(angles):
    size = mp.sqrt(sum(a * a for a in angles))
    factor = -mp.mpf(1) / 2 if size == 0 else -mp.sin(size / 2) / size
    return [mp.cos(size / 2)] + [factor * a for a in angles]


def log(a):
    sine = mp.sqrt(sum(x * x for x in a[1:]))
    if sine == 0:
        return [mp.mpf(0)] * 3
    factor = -2 * mp.atan2(sine, a[0]) / sine
    return [factor * x for x in a[1:]]


def times(angles, factor):
    return [a * factor for a in angles]


def plus(*rows):
    return [sum(column) for column in zip(*rows)]


def slerp(a, b, t):
    return product(a, exp(times(log(product(reverse(a), b)), t)))


def squad(points, t):
    a, inner_a, inner_b, b = points
    return slerp(slerp(a, b, t), slerp(inner_a, inner_b, t), 2 * t * (1 - t))


def track_keys(keys):
    rows = [unit(key) for key in keys]
    for i in range(1, len(rows)):
        rows[i] = aligned(rows[i], rows[i - 1])
    return rows


def squad_track(secs, keys, t):
    """The parabola's rate at inner keys; at the ends the key is its own inner point."""
    i = max(k for k in range(len(secs) - 1) if secs[k] <= t)
    h = secs[i + 1] - secs[i]
    step = log(product(reverse(keys[i]), keys[i + 1]))

    def rate(k):
        before, after = secs[k] - secs[k - 1], secs[k + 1] - secs[k]
        mean_before = times(log(product(reverse(keys[k - 1]), keys[k])), 1 / before)
        mean_after = times(log(product(reverse(keys[k]), keys[k + 1])), 1 / after)
        return times(plus(times(mean_before, after), times(mean_after, before)), 1 / (before + after))

    inner_a, inner_b = keys[i], keys[i + 1]
    if i > 0:
        inner_a = product(keys[i], exp(times(plus(times(rate(i), h), times(step, -1)), mp.mpf(1) / 2)))
    if i + 2 < len(keys):
        inner_b = product(keys[i + 1], exp(times(plus(step, times(rate(i + 1), -h)), mp.mpf(1) / 2)))
    return squad([keys[i], inner_a, inner_b, keys[i + 1]], (t - secs[i]) / h)


def basis(knots, k, order, t):
    """Cox and de Boor; right-continuous."""
    if order == 1:
        return mp.mpf(1) if knots[k] <= t < knots[k + 1] else mp.mpf(0)
    left = (t - knots[k]) / (knots[k + order - 1] - knots[k]) * basis(knots, k, order - 1, t)
    right = (knots[k + order] - t) / (knots[k + order] - knots[k + 1]) * basis(knots, k + 1, order - 1, t)
    return left + right


def bspline_track(secs, keys, t, is_loop):
    n = len(secs) - 1
    h = [secs[i + 1] - secs[i] for i in range(n)]
    w = [log(product(reverse(keys[i]), keys[i + 1])) for i in range(n)]
    if is_loop:
        before, after = [h[(n - 3) % n], h[(n - 2) % n], h[n - 1]], [h[0], h[1 % n], h[2 % n]]
    else:
        before = [h[min(2, n - 1)], h[min(1, n - 1)], h[0]]
        after = [h[n - 1], h[max(n - 2, 0)], h[max(n - 3, 0)]]
    knots = [secs[0] - sum(before), secs[0] - before[1] - before[2], secs[0] - before[2]] + list(secs)
    for step in after:
        knots.append(knots[-1] + step)
    # Control j stands at the mean of knots[j + 1] to knots[j + 3]; its basis begins at knots[j].
    def on_arcs(t):
        if t < secs[0]:
            return product(keys[0], exp(times(w[n - 1], (t - secs[0]) / h[n - 1])))
        if t >= secs[n]:
            return product(keys[n], exp(times(w[0], (t - secs[n]) / h[0])))
        i = max(k for k in range(n) if secs[k] <= t)
        return product(keys[i], exp(times(w[i], (t - secs[i]) / h[i])))

    inner = [on_arcs((knots[k + 2] + knots[k + 3] + knots[k + 4]) / 3) for k in range(n + 1)]
    if is_loop:
        first = product(inner[0], product(reverse(inner[n]), inner[n - 1]))
        last = product(inner[n], product(reverse(inner[0]), inner[1]))
    else:
        first = product(inner[0], product(reverse(inner[1]), inner[0]))
        last = product(inner[n], product(reverse(inner[n - 1]), inner[n]))
    controls = [first] + inner + [last]
    turns = [log(product(reverse(a), b)) for a, b in zip(controls, controls[1:])]
    # The order of the basis is 4; the control of knots[j + 2] has the basis over knots j to j + 4.
    curve = controls[0]
    for j in range(1, len(controls)):
        share = sum(basis(knots, k, 4, t) for k in range(j, len(controls)))
        curve = product(curve, exp(times(turns[j - 1], share)))
    return curve


def hermite(a, rate_a, b, rate_b, t):
    first, last = times(rate_a, mp.mpf(1) / 3), times(rate_b, mp.mpf(1) / 3)
    middle = product(reverse(product(a, exp(first))), product(b, exp(times(last, -1))))
    middle = log(aligned(middle, [1, 0, 0, 0]))
    shares = [1 - (1 - t) ** 3, 3 * t**2 - 2 * t**3, t**3]
    curve = a
    for turn, share in zip([first, middle, last], shares):
        curve = product(curve, exp(times(turn, share)))
    return curve


def cubic(secs, keys, tangents, t):
    i = max(k for k in range(len(secs) - 1) if secs[k] <= t)
    h = secs[i + 1] - secs[i]
    u = (t - secs[i]) / h
    weights = [2 * u**3 - 3 * u**2 + 1, h * (u**3 - 2 * u**2 + u), 3 * u**2 - 2 * u**3, h * (u**3 - u**2)]
    rows = [keys[i], tangents[i][1], keys[i + 1], tangents[i + 1][0]]
    return unit([sum(w * mp.mpf(row[c]) for w, row in zip(weights, rows)) for c in range(4)])


def motion(curve, t):
    value = curve(t)
    first = [mp.diff(lambda x, c=c: curve(x)[c], t) for c in range(4)]
    second = [mp.diff(lambda x, c=c: curve(x)[c], t, 2) for c in range(4)]
    # dR/dt = −½ R rate; the square of the first derivative adds to the scalar part alone.
    rate = times(product(reverse(value), first)[1:], -2)
    acceleration = times(product(reverse(value), second)[1:], -2)
    return {
        "rotor": [float(x) for x in value],
        "rate": [float(x) for x in rate],
        "acceleration": [float(x) for x in acceleration],
    }


def random_turn(size):
    axis = unit([RANDOM.gauss(0, 1) for _ in range(3)] + [0])[:3]
    return [float(a * size) for a in axis]


def random_track(hard):
    count = 7
    secs, keys = [0.25], [unit([RANDOM.gauss(0, 1) for _ in range(4)])]
    for i in range(1, count):
        # Not so uneven that the pull of squad would have to be held back.
        secs.append(secs[-1] + RANDOM.choice([0.25, 0.375, 0.5]))
        size = RANDOM.uniform(0.1, 1.2)
        if hard and i == 3:
            size = 1e-9
        if hard and i == 4:
            size = 2.0
        keys.append(product(keys[-1], exp([mp.mpf(a) for a in random_turn(size)])))
    return secs, [[float(x) for x in key] for key in keys]


def main():
    cases = []
    for number in range(6):
        secs, keys = random_track(number % 2 == 1)
        sound = track_keys(keys)
        exact = [mp.mpf(s) for s in secs]
        tangents = [[[RANDOM.uniform(-0.6, 0.6) for _ in range(4)] for _ in range(2)] for _ in keys]
        # Away from the keys, where the second derivative may jump.
        at = [secs[i] + (secs[i + 1] - secs[i]) * RANDOM.choice([0.125, 0.375, 0.5, 0.8125]) for i in range(6)]
        curves = {
            "squad": lambda t: squad_track(exact, sound, t),
            "b-spline": lambda t: bspline_track(exact, sound, t, False),
            "b-spline loop": lambda t: bspline_track(exact, sound, t, True),
            # The four numbers as they are stored: no sign changes.
            "cubic": lambda t: cubic(exact, [[mp.mpf(x) for x in key] for key in keys], tangents, t),
        }
        for kind, curve in curves.items():
            samples = [{"t": t, **motion(curve, mp.mpf(t))} for t in at]
            case = {"kind": kind, "times": secs, "keys": keys, "samples": samples}
            if kind == "cubic":
                case["tangents"] = tangents
            cases.append(case)
        a, b = sound[0], sound[1]
        rates = [random_turn(RANDOM.uniform(0.1, 3.0)) for _ in range(2)]
        exact_rates = [[mp.mpf(x) for x in rate] for rate in rates]
        curve = lambda t: hermite(a, exact_rates[0], b, exact_rates[1], t)
        samples = [{"t": t, **motion(curve, mp.mpf(t))} for t in [0.125, 0.5, 0.75]]
        cases.append({"kind": "hermite", "keys": keys[:2], "rates": rates, "samples": samples})
    rows = ",\n".join(json.dumps(case) for case in cases)
    print('{"cases": [\n' + rows + "\n]}")


main()

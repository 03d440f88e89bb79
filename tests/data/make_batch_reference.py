"""Makes batch_reference.json: interpolations, exponentials and logarithms of rotors in 50 digits.

    pip install mpmath
    python3 tests/data/make_batch_reference.py > tests/data/batch_reference.json

The arguments are exact numbers of the machine, 64 or 32 bits wide; the values are computed from them with rotors made
unit first, and given as two numbers whose sum has some 32 digits. Rotors are `s, yz, zx, xy`.
"""

import json
import random
import struct

import mpmath as mp

mp.mp.dps = 50
RANDOM = random.Random(20261201)
EACH = 24
KINDS = ["random", "near equal", "near opposite", "exactly opposite"]


def to_kind(kind, number):
    number = float(number)
    return number if kind == "f64" else struct.unpack("f", struct.pack("f", number))[0]


def two(number):
    high = float(number)
    return [high, float(number - mp.mpf(high))]


def length(parts):
    return mp.sqrt(sum(mp.mpf(part) ** 2 for part in parts))


def unit(parts):
    size = length(parts)
    return [mp.mpf(part) / size for part in parts]


def random_unit():
    return unit([RANDOM.gauss(0, 1) for _ in range(4)])


def product(a, b):
    (s, yz, zx, xy), (os, oyz, ozx, oxy) = a, b
    return [
        s * os - yz * oyz - zx * ozx - xy * oxy,
        s * oyz + yz * os - (zx * oxy - xy * ozx),
        s * ozx + zx * os - (xy * oyz - yz * oxy),
        s * oxy + xy * os - (yz * ozx - zx * oyz),
    ]


def exponential(angles):
    half = length(angles) / 2
    factor = -mp.mpf(1) / 2 if half == 0 else -mp.sin(half) / half / 2
    return [mp.cos(half)] + [factor * mp.mpf(part) for part in angles]


def logarithm(rotor):
    rotor = unit(rotor)
    if rotor[0] < 0:
        rotor = [-part for part in rotor]
    sine = length(rotor[1:])
    factor = mp.mpf(-2) if sine == 0 else -2 * mp.atan2(sine, rotor[0]) / sine
    return [factor * part for part in rotor[1:]]


def slerp(a, b, t):
    a, b = unit(a), unit(b)
    if sum(x * y for x, y in zip(a, b)) < 0:
        b = [-part for part in b]
    step = logarithm(product([a[0], -a[1], -a[2], -a[3]], b))
    return product(a, exponential([t * part for part in step]))


def turn_of(kind):
    """The size of a turn in radians."""
    if kind == "random":
        return mp.mpf(RANDOM.uniform(0, 3.1))
    small = mp.mpf(10) ** RANDOM.uniform(-12, -2)
    return small if kind == "near equal" else mp.pi - small


def plane():
    parts = [RANDOM.gauss(0, 1) for _ in range(3)]
    size = length(parts)
    return [mp.mpf(part) / size for part in parts]


def pairs(kind, width):
    for _ in range(EACH):
        a = random_unit()
        if kind == "exactly opposite":
            # Parts that swap places: the products cancel to 0 exactly, whatever rounding did to the parts.
            a = [to_kind(width, part) for part in a]
            yield a, [-a[1], a[0], -a[3], a[2]]
        else:
            step = exponential([turn_of(kind) * part for part in plane()])
            b = product(a, step)
            sign = RANDOM.choice([-1, 1])
            yield [to_kind(width, part) for part in a], [to_kind(width, sign * part) for part in b]


found = {}
for width in ["f64", "f32"]:
    slerps, exps, logs = [], [], []
    for kind in KINDS:
        for a, b in pairs(kind, width):
            t = to_kind(width, RANDOM.choice([RANDOM.random(), RANDOM.random(), 0.0, 0.5, 1.0]))
            slerps.append([kind, a + b + [t], [two(part) for part in slerp(a, b, mp.mpf(t))]])
        for _ in range(EACH):
            # Near opposite means near a half turn here, and exactly opposite one beyond it.
            size = turn_of(kind) if kind != "exactly opposite" else mp.mpf(RANDOM.uniform(3.2, 40))
            angles = [to_kind(width, size * part) for part in plane()]
            exps.append([kind, angles, [two(part) for part in exponential(angles)]])
            if kind == "exactly opposite":
                rotor = [0.0] + [to_kind(width, part) for part in plane()]
            else:
                rotor = [to_kind(width, part) for part in exponential(angles)]
            logs.append([kind, rotor, [two(part) for part in logarithm(rotor)]])
    found[width] = {"slerp": slerps, "exp": exps, "log": logs}


def lines(cases):
    return "[\n" + ",\n".join(json.dumps(case, separators=(",", ":")) for case in cases) + "\n]"


widths = [
    f'"{width}":{{' + ",\n".join(f'"{name}":{lines(cases)}' for name, cases in kinds.items()) + "}"
    for width, kinds in found.items()
]
print("{" + ",\n".join(widths) + "}")

"""What scipy takes to build and to evaluate its RotationSpline: the peer of the group "C2 spline" of `cargo bench --bench rotor`.

    pip install scipy
    python3 tests/benches/scipy_spline.py

The same keys as there. Prints nanoseconds of processor time for each key and for each time asked for, the least of several runs.
"""

import time

import numpy as np
from scipy.spatial.transform import Rotation, RotationSpline

KEYS, TIMES = 1000, 100_000


def least(count, run):
    best = np.inf
    for _ in range(15):
        start = time.process_time()
        run()
        best = min(best, time.process_time() - start)
    return best / count * 1e9


key = np.arange(KEYS)
secs = key * 0.1 + (key % 3) * 0.02
vectors = np.column_stack([np.sin(0.4 * key), 0.7 * np.cos(0.53 * key), 0.4 * np.cos(0.31 * key)])
keys = Rotation.from_rotvec(vectors)
spline = RotationSpline(secs, keys)
asked = np.arange(TIMES) * (secs[-1] / TIMES)
print(f"build: {least(KEYS, lambda: RotationSpline(secs, keys)):.0f} ns a key")
print(f"evaluate: {least(TIMES, lambda: spline(asked)):.0f} ns a time")

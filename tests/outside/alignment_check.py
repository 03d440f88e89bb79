"""Holds what the test suite writes of time and ground alignment against scipy's minimiser and a plain table of its own.

usage: alignment_check.py FILE.json...   (written by the tests into target/tmp/blend-export)

Each file has pairs of point clouds with the move on the ground that was found for them, and a grid of distances with the cheapest
ways that were found through it: without a bound, with a bound on equal steps in a row, and within a band. The move is found again
by scipy.optimize.least_squares, the ways by tables over all cells, written apart from the program. Exits 1 when one differs.
"""

import json
import sys

import numpy as np
from scipy.optimize import least_squares

# The minimiser is not exact to the last digits: it takes slopes by differences.
TURN_RAD = 1e-6
PLACE_SHARE = 1e-6
WAY_SHARE = 1e-12


def moved(place, points):
    turn, x, z = place
    sin, cos = np.sin(turn), np.cos(turn)
    return np.stack(
        [points[:, 0] * cos + points[:, 2] * sin + x, points[:, 1], -points[:, 0] * sin + points[:, 2] * cos + z], axis=1
    )


def best_move(own, other, weights):
    size = np.abs(own).max() + np.abs(other).max()

    def residuals(place):
        turn, x, z = place
        return (np.sqrt(weights)[:, None] * (own - moved((turn, x * size, z * size), other))).ravel() / size

    # From several headings, so that no other hollow is taken for the deepest.
    tries = [
        least_squares(residuals, [start, 0.0, 0.0], jac="3-point", xtol=1e-15, ftol=1e-15, gtol=1e-15)
        for start in np.linspace(-np.pi, np.pi, 7)[:-1]
    ]
    best = min(tries, key=lambda found: found.cost)
    turn, x, z = best.x
    return (turn, x * size, z * size), 2 * best.cost * size**2 / weights.sum()


def cheapest(grid, most=None, is_allowed=lambda i, j: True):
    """The least sum over all ways from corner to corner; `most` bounds equal straight steps in a row."""
    rows, columns = grid.shape
    # kind 0 both, 1 right, 2 down; how many of that kind in a row, at most `most` (or just 1 where there is no bound).
    limit = most or 1
    table = {(0, 0): {(0, 0): grid[0, 0]}}
    for i in range(rows):
        for j in range(columns):
            if (i, j) == (0, 0) or not is_allowed(i, j):
                continue
            best = {}
            for kind, (di, dj) in ((0, (1, 1)), (1, (0, 1)), (2, (1, 0))):
                for (was, run), cost in table.get((i - di, j - dj), {}).items():
                    length = 0
                    if kind:
                        length = run + 1 if was == kind and run > 0 else 1
                        if most is None:
                            length = 1
                        elif length > limit:
                            continue
                    state = (kind, length)
                    best[state] = min(best.get(state, np.inf), cost + grid[i, j])
            table[i, j] = best
    ends = table.get((rows - 1, columns - 1), {})
    return min(ends.values(), default=np.inf)


def main():
    failed = False
    for path in sys.argv[1:]:
        with open(path, encoding="utf-8") as file:
            data = json.load(file)
        worst_turn = worst_place = 0.0
        for case in data["fits"]:
            own, other, weights = (np.array(case[name]) for name in ("own", "other", "weights"))
            place, mean = best_move(own, other, weights)
            size = np.abs(own).max()
            turned = (place[0] - case["turn_rad"] + np.pi) % (2 * np.pi) - np.pi
            worst_turn = max(worst_turn, abs(turned))
            # Where the points come to: the shift by itself depends on how far from the middle of the scene they are.
            apart = np.abs(moved(place, other) - moved((case["turn_rad"], case["x"], case["z"]), other)).max() / size
            worst_place = max(worst_place, apart, abs(mean - case["mean"]) / size**2)
        grid = np.array(data["distances"])
        rows, columns = grid.shape
        half = max(data["band"] * columns, 2)
        slope = (columns - 1) / (rows - 1)
        within = lambda i, j: abs(j - i * slope) <= half + 1e-12
        totals = {
            "free": cheapest(grid),
            "bounded": cheapest(grid, data["most"]),
            "banded": cheapest(grid, data["most"], within),
        }
        worst_way = max(abs(totals[name] - data[name]) / totals[name] for name in totals)
        bad = worst_turn > TURN_RAD or worst_place > PLACE_SHARE or worst_way > WAY_SHARE or not data["fits"]
        failed |= bad
        print(
            f"{'FAILED' if bad else 'ok    '} {path}: {len(data['fits'])} moves, turn {worst_turn:.1e} rad, place {worst_place:.1e}, "
            f"ways {', '.join(f'{name} {total:.6g}' for name, total in totals.items())} off by {worst_way:.1e}"
        )
    sys.exit(1 if failed or len(sys.argv) < 2 else 0)


main()

"""Compares what `turnwright blend` writes with scipy's slerp, means, powers of rotations and straight lines, and the place that a join sets
down at with that of scipy's minimiser.

usage: blend_check.py TURNWRIGHT FIRST.bvh SECOND.bvh   (two takes of one skeleton)

Reads the BVH files with the reader of bvh_check.py, which is apart from the program. Prints the largest difference of each form
of blend in degrees, exits 1 above tolerance.
"""

import os
import subprocess
import sys
import tempfile

import numpy as np
from scipy.optimize import least_squares
from scipy.spatial.transform import Rotation, Slerp

from bvh_check import locals_of, read

# Files keep six decimals of an angle.
TOLERANCE_DEG = 2e-5
TOLERANCE_PLACE = 2e-5


def local_at(clip, time):
    """Turns and places of all joints at a time: slerp and straight lines between frames, held at the end."""
    joints, step, values = clip
    frame = min(max(time / step, 0.0), len(values) - 1)
    low = int(np.floor(frame + 1e-9))
    share = frame - low
    a, b = locals_of(joints, values[low]), locals_of(joints, values[min(low + 1, len(values) - 1)])
    out = []
    for (turn_a, place_a), (turn_b, place_b) in zip(a, b):
        turn = between(turn_a, turn_b, share) if share > 1e-7 else turn_a
        out.append((turn, place_a + share * (place_b - place_a)))
    return out


def between(a, b, share):
    return Slerp([0, 1], Rotation.concatenate([a, b]))([share])[0]


def smooth(t):
    t = min(max(t, 0.0), 1.0)
    return t * t * (3 - 2 * t)


def apart(a, b):
    return np.degrees((a.inv() * b).magnitude())


def main():
    program, first_path, second_path = sys.argv[1:]
    first, second = read(first_path), read(second_path)
    step = first[1]
    lengths = [clip[1] * (len(clip[2]) - 1) for clip in (first, second)]
    end = min(lengths)
    probes = [0.0, 0.2, 0.5, 0.8, 1.0]

    def mixed(weight):
        def expected(time):
            w = weight(time)
            pairs = zip(local_at(first, time), local_at(second, time))
            return [(between(ta, tb, w), pa + w * (pb - pa)) for (ta, pa), (tb, pb) in pairs]

        return expected

    def layered(weight):
        def expected(time):
            rows = zip(local_at(first, time), local_at(second, time), local_at(second, 0.0))
            return [
                (ta * Rotation.from_rotvec(weight * (t0.inv() * tb).as_rotvec()), pa + weight * (pb - p0))
                for (ta, pa), (tb, pb), (t0, p0) in rows
            ]

        return expected

    cases = [
        ("mix 0.3", ["--mix", "0.3"], mixed(lambda _: 0.3), end),
        ("mix by a curve", ["--mix", "0.2:0,1.2:0.9,2:0.1"], mixed(curve([(0.2, 0.0), (1.2, 0.9), (2.0, 0.1)])), end),
        ("add 1.4", ["--add", "1.4"], layered(1.4), lengths[0]),
        ("add -0.5", ["--add", "-0.5"], layered(-0.5), lengths[0]),
    ]
    failed = False
    with tempfile.TemporaryDirectory() as folder:
        out = os.path.join(folder, "out.bvh")

        def run(arguments):
            command = [program, "blend", first_path, second_path, "-o", out, *arguments]
            subprocess.run(command, check=True, capture_output=True)
            made = read(out)
            os.remove(out)
            return made

        for name, arguments, expected, until in cases:
            made = run(arguments)
            worst = [0.0, 0.0]
            for share in probes:
                # On a frame of the result, which is one of the first clip.
                frame = int(share * until / step)
                rows = zip(made[0], expected(frame * step), locals_of(made[0], made[2][frame]))
                for joint, (turn, place), (own_turn, own_place) in rows:
                    worst[0] = max(worst[0], apart(turn, own_turn))
                    # A joint without channels for its place keeps the first skeleton's limb.
                    if len(joint["channels"]) == 6:
                        worst[1] = max(worst[1], float(np.abs(place - own_place).max()))
            failed |= tell(name, worst)

        # The mean of three clips: the third is a later part of the first.
        third_path = os.path.join(folder, "third.bvh")
        subprocess.run([program, "convert", first_path, "--from", "0.5", "-o", third_path], check=True, capture_output=True)
        third = read(third_path)
        for weights in ([1, 1, 1], [0.2, 0.5, 0.3], [3, 0, 1]):
            command = [program, "blend", first_path, second_path, third_path, "-o", out]
            subprocess.run([*command, "--mean", ",".join(map(str, weights))], check=True, capture_output=True)
            made = read(out)
            os.remove(out)
            until = min(end, third[1] * (len(third[2]) - 1))
            share = np.array(weights) / sum(weights)
            worst, spread = [0.0, 0.0], 0.0
            for probe in probes:
                frame = int(probe * until / step + 1e-6)
                rows = zip(*(local_at(clip, frame * step) for clip in (first, second, third)))
                for joint, given, (own_turn, own_place) in zip(made[0], rows, locals_of(made[0], made[2][frame])):
                    turns = Rotation.concatenate([turn for turn, _ in given])
                    chordal, mean = turns.mean(share), karcher(turns, share)
                    worst[0] = max(worst[0], apart(mean, own_turn))
                    spread = max(spread, apart(chordal, mean))
                    # Of all turns the mean is nearest: no farther than scipy's own, which minimises chords.
                    if squares(turns, share, own_turn) > squares(turns, share, chordal) + 1e-9:
                        worst[0] = np.inf
                    if len(joint["channels"]) == 6:
                        place = sum(part * at for part, (_, at) in zip(share, given))
                        worst[1] = max(worst[1], float(np.abs(place - own_place).max()))
            failed |= tell(f"mean {weights} (chordal up to {spread:.2f} degrees away)", worst)

        # A join: the first clip, then the second set down elsewhere, and between them slerp with a smooth step.
        overlap = 0.5
        made = run(["--join", str(overlap), "--no-plant-feet"])
        start = lengths[0] - overlap
        frames = int((lengths[0] + lengths[1] - overlap) / step + 1e-6) + 1
        failed |= len(made[2]) != frames
        worst, set_down = [0.0, 0.0], []
        for frame in range(0, len(made[2]), 17):
            time = frame * step
            own = locals_of(made[0], made[2][frame])
            w = smooth((time - start) / overlap)
            a, b = local_at(first, time), local_at(second, time - start)
            for joint, (turn, _) in enumerate(own):
                if joint == 0 and w > 0:
                    continue
                worst[0] = max(worst[0], apart(between(a[joint][0], b[joint][0], w), turn))
            if w == 0:
                worst[1] = max(worst[1], float(np.abs(a[0][1] - own[0][1]).max()))
            if w == 1:
                turned = own[0][0] * b[0][0].inv()
                set_down.append((turned, own[0][1] - turned.apply(b[0][1])))
        for turned, shift in set_down:
            # One turn about the vertical and one shift along the ground for all of the second clip.
            worst[0] = max(worst[0], apart(turned, set_down[0][0]))
            axis = turned.as_rotvec(degrees=True)
            worst[0] = max(worst[0], float(np.hypot(axis[0], axis[2])))
            worst[1] = max(worst[1], float(np.abs(shift - set_down[0][1]).max()) / 50, abs(float(shift[1])))
        turn, shift = best_move(first, second, start, overlap)
        worst[0] = max(worst[0], apart(set_down[0][0], turn))
        worst[1] = max(worst[1], float(np.abs(shift - set_down[0][1]).max()) / 50)
        failed |= tell("join, set down as the minimiser does", worst)
    sys.exit(1 if failed else 0)


def karcher(turns, share):
    """The mean of least squared angles, from scipy's chordal one on."""
    mean = turns.mean(share)
    for _ in range(200):
        step = share @ (mean.inv() * turns).as_rotvec()
        mean = mean * Rotation.from_rotvec(step)
        if np.linalg.norm(step) < 1e-14:
            break
    return mean


def squares(turns, share, at):
    return float(share @ (at.inv() * turns).magnitude() ** 2)


def poses_at(clip, time, skeleton):
    """How joints are turned and where they are with the limbs of another take's skeleton: a second clip comes onto the first one's."""
    world = []
    for joint, (turn, place) in zip(skeleton, local_at(clip, time)):
        if joint["parent"] is not None:
            place = joint["offset"]
            up_turn, up_place = world[joint["parent"]]
            turn, place = up_turn * turn, up_place + up_turn.apply(place)
        world.append((turn, place))
    return Rotation.concatenate([turn for turn, _ in world]), np.array([place for _, place in world])


def best_move(first, second, start, overlap):
    """The turn about the vertical that brings the turns of the second clip's joints nearest to the first's over the overlap, and then the shift
    along the ground that brings their places nearest, both by scipy's minimiser."""
    joints, step, _ = first
    lengths = [0.0 if joint["parent"] is None else float(np.linalg.norm(joint["offset"])) for joint in joints]
    parents = {joint["parent"] for joint in joints}
    weights = np.array([length if index in parents else 2 * length for index, length in enumerate(lengths)])
    chosen = np.sort(np.argsort(-weights, kind="stable")[:24])
    weights = weights[chosen]
    count = round(overlap / step) + 1
    at = [overlap * frame / (count - 1) for frame in range(count)]
    own = [poses_at(first, start + secs, joints) for secs in at]
    other = [poses_at(second, secs, joints) for secs in at]
    own_turns, other_turns = (np.concatenate([turns[chosen].as_matrix() for turns, _ in poses]) for poses in (own, other))
    own_places, other_places = (np.concatenate([places[chosen] for _, places in poses]) for poses in (own, other))
    roots = np.sqrt(np.tile(weights / weights.sum(), count))

    def turns_apart(turn):
        return (roots[:, None, None] * (own_turns - Rotation.from_euler("y", turn[0]).as_matrix() @ other_turns)).ravel()

    def fitted(residuals, begin):
        return least_squares(residuals, begin, jac="3-point", xtol=1e-15, ftol=1e-15, gtol=1e-15)

    turn = min((fitted(turns_apart, [begin]) for begin in (-2, 0, 2)), key=lambda found: found.cost).x[0]
    turned = Rotation.from_euler("y", turn)

    def places_apart(shift):
        return (roots[:, None] * (own_places - turned.apply(other_places) - [shift[0], 0.0, shift[1]])).ravel()

    x, z = fitted(places_apart, [0, 0]).x
    return turned, np.array([x, 0.0, z])


def curve(knots):
    def weight(time):
        if time <= knots[0][0]:
            return knots[0][1]
        for (from_, a), (to, b) in zip(knots, knots[1:]):
            if time <= to:
                s = smooth((time - from_) / (to - from_))
                return a * (1 - s) + b * s
        return knots[-1][1]

    return weight


def tell(name, worst):
    bad = worst[0] > TOLERANCE_DEG or worst[1] > TOLERANCE_PLACE
    print(f"{'FAILED' if bad else 'ok    '} {name}: {worst[0]:.2e} degrees, {worst[1]:.2e} of length")
    return bad


main()

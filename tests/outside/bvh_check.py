"""Compares `turnwright sample` on BVH files with a reader of its own on top of scipy's rotations.

usage: bvh_check.py TURNWRIGHT FILE...

The reader here is written apart from the program: it splits on white space, takes channels in their listed order, and
lets scipy (scipy.spatial.transform) do every rotation. Prints the largest difference per file, exits 1 above tolerance.
"""

import json
import subprocess
import sys

import numpy as np
from scipy.spatial.transform import Rotation, Slerp

ROTATION_DEG = 1e-4
POSITION_SHARE = 1e-8


def read(path):
    with open(path, encoding="utf-8", errors="surrogateescape") as file:
        text = file.read()
    head, motion = text.split("MOTION", 1)
    joints, stack, last = [], [], None
    lines = [line.strip() for line in head.replace("\r", "\n").split("\n") if line.strip()]
    for line in lines:
        words = line.split()
        if words[0] in ("ROOT", "JOINT"):
            last = {"name": line.split(None, 1)[1], "parent": stack[-1] if stack else None, "channels": []}
            joints.append(last)
            index = len(joints) - 1
        elif words[0] == "End":
            last = {"end": True}
            index = None
        elif words[0] == "{":
            stack.append(index)
        elif words[0] == "}":
            stack.pop()
        elif words[0] == "OFFSET" and "end" not in last:
            last["offset"] = np.array([float(word) for word in words[1:4]])
        elif words[0] == "CHANNELS":
            last["channels"] = words[2:]
    words = motion.split()
    frames = int(words[words.index("Frames:") + 1])
    at = words.index("Time:") + 1
    step = float(words[at])
    width = sum(len(joint["channels"]) for joint in joints)
    values = np.array([float(word) for word in words[at + 1 : at + 1 + frames * width]]).reshape(frames, width)
    return joints, step, values


def locals_of(joints, row):
    column, out = 0, []
    for joint in joints:
        place, order, angles = joint["offset"].copy(), "", []
        for channel in joint["channels"]:
            value, column = row[column], column + 1
            axis = channel[0].upper()
            if channel[1:].lower() == "position":
                place["XYZ".index(axis)] = value
            else:
                order += axis
                angles.append(value)
        turn = Rotation.from_euler(order, angles, degrees=True) if order else Rotation.identity()
        out.append((turn, place))
    return out


def world_at(joints, step, values, time):
    frame = min(max(time / step, 0.0), len(values) - 1)
    low = int(np.floor(frame + 1e-9))
    share = frame - low
    a = locals_of(joints, values[low])
    b = locals_of(joints, values[min(low + 1, len(values) - 1)])
    world = []
    for joint, (turn_a, place_a), (turn_b, place_b) in zip(joints, a, b):
        if share > 1e-7:
            turn = Slerp([0, 1], Rotation.concatenate([turn_a, turn_b]))([share])[0]
            place = place_a + share * (place_b - place_a)
        else:
            turn, place = turn_a, place_a
        if joint["parent"] is not None:
            up_turn, up_place = world[joint["parent"]]
            turn, place = up_turn * turn, up_place + up_turn.apply(place)
        world.append((turn, place))
    return world


def check(program, path):
    joints, step, values = read(path)
    last = len(values) - 1
    frames = sorted({0, 1, last // 3, last // 2, last - 1, last})
    times = [frame * step for frame in frames] + [(frame + 0.375) * step for frame in frames[:-1]]
    command = [program, "sample", path, "--world", "--format", "json", "--at", ",".join(repr(time) for time in times)]
    answer = json.loads(subprocess.run(command, check=True, capture_output=True, text=True).stdout)
    counted = [joint["name"] for joint in joints]
    worst_turn = worst_place = 0.0
    compared = 0
    for at, time in enumerate(times):
        world = world_at(joints, step, values, time)
        size = max(1.0, max(np.abs(place).max() for _, place in world))
        for number, (joint, (turn, place)) in enumerate(zip(joints, world)):
            name = joint["name"] if counted.count(joint["name"]) == 1 else f"{joint['name']}#{number}"
            own = answer["joints"][name]
            turned = (Rotation.from_quat(own["rotation"][at]).inv() * turn).magnitude()
            worst_turn = max(worst_turn, np.degrees(turned))
            worst_place = max(worst_place, np.abs(np.array(own["position"][at]) - place).max() / size)
            compared += 1
    extra = set(answer["joints"]) - {n if counted.count(n) == 1 else f"{n}#{i}" for i, n in enumerate(counted)}
    good = worst_turn <= ROTATION_DEG and worst_place <= POSITION_SHARE and compared > 0 and not extra
    print(f"{'ok  ' if good else 'FAIL'} {path}: {compared} joint-times, turn {worst_turn:.2e} deg, place {worst_place:.2e} of size"
          + (f", joints not in the file: {sorted(extra)}" if extra else ""))
    return good


if __name__ == "__main__":
    results = [check(sys.argv[1], path) for path in sys.argv[2:]]
    print(f"{sum(results)} passed, {len(results) - sum(results)} failed")
    sys.exit(0 if results and all(results) else 1)

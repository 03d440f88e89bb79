"""Makes bvh_reference.json: world places and turns of the outside BVH files, by scipy instead of our own code.

    python3 make_bvh_reference.py FOLDER_WITH_BVH > bvh_reference.json

Needs scipy (`Rotation.from_euler` with capital letters turns about moving axes). The parser is as plain as it can be
and knows only what these files have.
"""

import json
import pathlib
import sys

import numpy
import scipy
from scipy.spatial.transform import Rotation


def parse(text):
    """Joints as (name, parent, offset, channels, tips), frame time, rows."""
    head, motion = text.split("MOTION")
    words = head.split()
    joints, stack, at = [], [], 1
    while at < len(words):
        word = words[at]
        if word in ("ROOT", "JOINT"):
            parent = stack[-1] if stack else None
            joints.append({"name": words[at + 1], "parent": parent, "channels": [], "tips": 0})
            stack.append(len(joints) - 1)
            at += 3
        elif word == "End":
            joints[stack[-1]]["tips"] += 1
            at += 8  # End Site { OFFSET x y z }
        elif word == "OFFSET":
            joints[stack[-1]]["offset"] = numpy.array([float(w) for w in words[at + 1 : at + 4]])
            at += 4
        elif word == "CHANNELS":
            count = int(words[at + 1])
            joints[stack[-1]]["channels"] = words[at + 2 : at + 2 + count]
            at += 2 + count
        elif word == "}":
            stack.pop()
            at += 1
        else:
            raise ValueError(word)
    words = motion.split()
    assert words[0] == "Frames:" and words[2:4] == ["Frame", "Time:"]
    frames, seconds = int(words[1]), float(words[4])
    columns = sum(len(joint["channels"]) for joint in joints)
    rows = numpy.array([float(w) for w in words[5:]]).reshape(frames, columns)
    return joints, seconds, rows


def world(joints, row):
    """World place and turn of every joint."""
    places, turns, at = [], [], 0
    for joint in joints:
        place, axes, angles = joint["offset"].copy(), "", []
        for channel in joint["channels"]:
            axis = channel[0].upper()
            if channel[1:].lower() == "position":
                place["XYZ".index(axis)] = row[at]
            else:
                axes, angles = axes + axis, angles + [row[at]]
            at += 1
        turn = Rotation.from_euler(axes, angles, degrees=True) if axes else Rotation.identity()
        if joint["parent"] is not None:
            above = turns[joint["parent"]]
            place = places[joint["parent"]] + above.apply(place)
            turn = above * turn
        places.append(place)
        turns.append(turn)
    return places, turns


def main(folder):
    files = {}
    for path in sorted(pathlib.Path(folder).glob("*.bvh")):
        joints, seconds, rows = parse(path.read_text())
        chosen = sorted({0, 1, len(rows) // 3, len(rows) // 2, len(rows) - 1})
        poses = []
        for frame in chosen:
            places, turns = world(joints, rows[frame])
            poses.append(
                {
                    "frame": frame,
                    "places": [place.tolist() for place in places],
                    "turns_xyzw": [turn.as_quat().tolist() for turn in turns],
                }
            )
        files[path.name] = {
            "joints": [joint["name"] for joint in joints],
            "tips": sum(joint["tips"] for joint in joints),
            "frames": len(rows),
            "frame_secs": seconds,
            "poses": poses,
        }
    source = f"make_bvh_reference.py with scipy {scipy.__version__} from the files named; see SOURCES.md beside them"
    json.dump({"source": source, "files": files}, sys.stdout, separators=(",", ":"))
    print()


main(sys.argv[1])

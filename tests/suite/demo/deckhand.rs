//! A deckhand of the night ferry hauls in a mooring rope, hand over hand, and takes a step back. Centimetres.

use glam::DVec3;
use turnwright::rotor::Rotor;

use super::body::{Bone, Builder, Motion, Pose, bone, bump, ease, end_bone, mix, root_bone, wave, x, y, z};

const BONES: &[Bone] = &[
    root_bone("Hips", [0.0, 92.0, 0.0]),
    bone("Waist", 0, [0.0, 9.0, 0.0]),
    bone("Ribs", 1, [0.0, 12.0, 0.0]),
    bone("Chest", 2, [0.0, 12.0, 0.5]),
    bone("Neck", 3, [0.0, 19.0, -0.5]),
    end_bone("Head", 4, [0.0, 9.0, 1.5], [0.0, 19.0, 1.0]),
    bone("LeftCollar", 3, [3.0, 14.5, 1.5]),
    bone("LeftUpperArm", 6, [14.5, 0.5, -2.0]),
    bone("LeftForearm", 7, [28.5, 0.0, 0.0]),
    end_bone("LeftHand", 8, [25.5, 0.0, 0.0], [15.0, 0.0, 0.0]),
    bone("RightCollar", 3, [-3.0, 14.5, 1.5]),
    bone("RightUpperArm", 10, [-14.5, 0.5, -2.0]),
    bone("RightForearm", 11, [-28.5, 0.0, 0.0]),
    end_bone("RightHand", 12, [-25.5, 0.0, 0.0], [-15.0, 0.0, 0.0]),
    bone("LeftThigh", 0, [9.0, -4.0, 0.0]),
    bone("LeftShin", 14, [0.0, -43.0, 0.0]),
    bone("LeftFoot", 15, [0.0, -41.0, 0.0]),
    end_bone("LeftToes", 16, [0.0, -6.0, 13.0], [0.0, 0.0, 6.0]),
    bone("RightThigh", 0, [-9.0, -4.0, 0.0]),
    bone("RightShin", 18, [0.0, -43.0, 0.0]),
    bone("RightFoot", 19, [0.0, -41.0, 0.0]),
    end_bone("RightToes", 20, [0.0, -6.0, 13.0], [0.0, 0.0, 6.0]),
];

const RATE: f64 = 60.0;
const FRAMES: usize = 300;
/// Seconds from one grip of a hand to its next.
const PULL_SECS: f64 = 1.3;
/// Where the deckhand faces: nearly away from z, so that the stored heading crosses 180° again and again.
const HEADING_DEG: f64 = 178.0;

/// The motion without a fault.
pub(super) fn motion() -> Motion {
    let poses = (0..FRAMES).map(|frame| pose(frame as f64 / RATE)).collect();
    Motion { bones: BONES, rate: RATE, poses }
}

fn pose(t: f64) -> Pose {
    let pull = t / PULL_SECS;
    // The right foot goes back first, then the left; the body follows in between.
    let steps = [ease(t, 2.75, 3.35), ease(t, 2.0, 2.6)];
    let back = -26.0 * ease(t, 2.05, 3.3);
    let over_left = bump(t, 1.9, 2.75) - bump(t, 2.65, 3.5);

    let root = DVec3::new(
        1.8 * wave(pull) + 4.0 * over_left,
        88.0 + 1.2 * wave(2.0 * pull + 0.1) - 1.5 * ease(t, 1.7, 2.1) + 1.5 * ease(t, 3.3, 3.8),
        back - 3.0 + 2.6 * wave(2.0 * pull + 0.3) + 0.6 * wave(0.31 * t),
    );
    let mut body = Builder::new(BONES, root);
    let swing = -wave(pull + 0.25);
    body.turn(
        "Hips",
        y(6.0 * swing + 1.5 * wave(0.23 * t))
            * x(-5.0 + 2.5 * wave(2.0 * pull + 0.45))
            * z(1.6 * wave(pull + 0.1) + 2.0 * over_left),
    );
    for (share, name) in [(0.8, "Waist"), (1.0, "Ribs"), (1.2, "Chest")] {
        let lean = 4.5 + 2.2 * wave(2.0 * pull + 0.55);
        body.turn(name, y(6.5 * share * swing) * x(lean * share) * z(1.2 * wave(pull - 0.05)));
    }

    // The head keeps its eyes on the rope, and now and then on the quay.
    let gaze = y(4.0 * wave(0.4 * t) + 16.0 * bump(t, 3.6, 4.7)) * x(9.0 + 3.0 * wave(2.0 * pull + 0.6));
    let neck = (body.in_scene("Chest").reverse() * gaze).pow(0.4);
    body.turn("Neck", neck);
    body.turn_to("Head", gaze);

    for (side, phase, collar, names) in [
        (1.0, pull, "LeftCollar", ["LeftUpperArm", "LeftForearm", "LeftHand"]),
        (-1.0, pull + 0.5, "RightCollar", ["RightUpperArm", "RightForearm", "RightHand"]),
    ] {
        let u = phase.rem_euclid(1.0);
        // Three fifths of the time the hand pulls, then it lets go and reaches out again.
        let pulled = if u < 0.6 { ease(u, 0.0, 0.6) } else { 1.0 - ease(u, 0.6, 1.0) };
        let loose = bump(u, 0.6, 1.0);
        body.turn(collar, y(-side * mix(13.0, -7.0, pulled)) * z(side * (3.0 + 6.0 * loose)));
        let hand = DVec3::new(
            side * (4.5 + 8.0 * loose + 5.0 * pulled),
            mix(121.0, 104.0, pulled) + 10.0 * loose,
            back + mix(43.0, 11.0, pulled),
        );
        body.bend_arm(names, side, hand, DVec3::new(side * 0.75, -1.0, -0.35));
        // Fingers closed about the rope, opened on the way out.
        body.turn(names[2], z(-side * mix(4.0, 16.0, pulled)) * y(side * (10.0 - 22.0 * loose)));
    }

    for (side, stride, ahead, names) in [
        (1.0, steps[0], 21.0, ["LeftThigh", "LeftShin", "LeftFoot", "LeftToes"]),
        (-1.0, steps[1], -19.0, ["RightThigh", "RightShin", "RightFoot", "RightToes"]),
    ] {
        let [from, to] = if side > 0.0 { [2.75, 3.35] } else { [2.0, 2.6] };
        let lift = bump(t, from, to);
        let heel = 20.0 * bump(t, from - 0.12, to - 0.1) + 9.0 * f64::from(side < 0.0);
        let ankle = DVec3::new(side * 11.5, 6.6 + 8.0 * lift + 0.22 * heel, ahead - 26.0 * stride);
        body.bend_leg(names[0], names[1], names[2], ankle, DVec3::new(side * 0.22, 0.0, 1.0));
        body.turn_to(names[2], y(side * 13.0) * x(heel));
        body.turn(names[3], x(-heel * (1.0 - 0.7 * lift)));
    }

    let mut pose = body.finish();
    let heading: Rotor = y(HEADING_DEG);
    pose.root = heading.apply(pose.root);
    pose.turns[0] = heading * pose.turns[0];
    pose
}

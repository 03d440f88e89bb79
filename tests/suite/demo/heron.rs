//! A heron on the quay looks about, crouches and takes off. Metres.

use glam::DVec3;

use super::body::{Bone, Builder, Motion, Pose, bone, bump, ease, mix, root_bone, wave, x, y, z};

const BONES: &[Bone] = &[
    root_bone("Body", [0.0, 0.5, 0.0]),
    bone("NeckLow", 0, [0.0, 0.05, 0.17]),
    bone("NeckHigh", 1, [0.0, 0.19, 0.0]),
    bone("Head", 2, [0.0, 0.19, 0.0]),
    bone("Bill", 3, [0.0, -0.01, 0.17]),
    bone("Tail", 0, [0.0, 0.0, -0.22]),
    bone("LeftWing", 0, [0.07, 0.05, 0.08]),
    bone("LeftWingMid", 6, [0.24, 0.0, 0.0]),
    bone("LeftWingHand", 7, [0.28, 0.0, 0.0]),
    bone("LeftWingTip", 8, [0.31, 0.0, 0.0]),
    bone("RightWing", 0, [-0.07, 0.05, 0.08]),
    bone("RightWingMid", 10, [-0.24, 0.0, 0.0]),
    bone("RightWingHand", 11, [-0.28, 0.0, 0.0]),
    bone("RightWingTip", 12, [-0.31, 0.0, 0.0]),
    bone("LeftLeg", 0, [0.05, -0.06, -0.02]),
    bone("LeftTarsus", 14, [0.0, -0.23, 0.0]),
    bone("LeftToes", 15, [0.0, -0.25, 0.0]),
    bone("RightLeg", 0, [-0.05, -0.06, -0.02]),
    bone("RightTarsus", 17, [0.0, -0.23, 0.0]),
    bone("RightToes", 18, [0.0, -0.25, 0.0]),
];

const RATE: f64 = 60.0;
const FRAMES: usize = 271;
/// When the toes leave the quay.
const LEAVE_SECS: f64 = 1.5;
/// Wing beats per second.
const BEATS: f64 = 2.3;

/// The motion without a fault.
pub(super) fn motion() -> Motion {
    /// Steps a frame for adding up the speed.
    const FINE: usize = 8;
    let mut travelled = DVec3::ZERO;
    let mut poses = Vec::with_capacity(FRAMES);
    for frame in 0..FRAMES {
        poses.push(pose(frame as f64 / RATE, travelled));
        for step in 0..FINE {
            let t = (frame as f64 + (step as f64 + 0.5) / FINE as f64) / RATE;
            let speed = DVec3::new(
                -0.12 * ease(t, 2.6, 4.2),
                0.95 * ease(t, 1.32, 1.62) - 0.84 * ease(t, 1.62, 2.5),
                1.25 * ease(t, 1.35, 2.6),
            );
            travelled += speed / (RATE * FINE as f64);
        }
    }
    Motion { bones: BONES, rate: RATE, poses }
}

fn pose(t: f64, travelled: DVec3) -> Pose {
    let crouch = ease(t, 0.85, 1.3) - ease(t, 1.32, 1.52);
    let open = ease(t, 0.95, 1.4);
    let flight = ease(t, 1.4, 2.2);
    let beat = BEATS * (t - 1.36);
    let power = ease(t, 1.25, 1.55);

    let root = DVec3::new(
        0.012 * wave(0.5 * t) * (1.0 - flight),
        0.475 - 0.1 * crouch - 0.028 * power * wave(beat + 0.2),
        0.02 * crouch,
    );
    let mut bird = Builder::new(BONES, root + travelled);
    let pitch = mix(-34.0 + 14.0 * crouch, -11.0 + 3.0 * wave(beat + 0.1) * power, flight);
    bird.turn("Body", y(-5.0 * ease(t, 2.6, 4.2)) * z(-7.0 * bump(t, 2.5, 4.6)) * x(pitch));

    // The neck: a tall S while it stands, drawn in while it flies.
    bird.turn("NeckLow", x(mix(58.0 - 8.0 * wave(0.6 * t) + 20.0 * crouch, 40.0, flight)));
    bird.turn("NeckHigh", x(mix(-38.0 + 5.0 * wave(0.6 * t + 0.2), -92.0 + 4.0 * wave(beat + 0.35), flight)));
    let look = 38.0 * bump(t, 0.05, 0.8) - 20.0 * bump(t, 2.9, 4.1);
    bird.turn_to("Head", y(look) * x(mix(6.0 - 12.0 * crouch, 4.0, flight)));
    bird.turn("Tail", x(mix(12.0, -4.0 + 8.0 * wave(beat + 0.4) * power, flight)) * y(3.0 * wave(0.8 * t)));

    for (side, wing, mid, hand) in [
        (1.0, "LeftWing", "LeftWingMid", "LeftWingHand"),
        (-1.0, "RightWing", "RightWingMid", "RightWingHand"),
    ] {
        // Up for the first stroke, then beating; half drawn in on each way up.
        let lift = mix(-18.0, 44.0, open)
            + power * (mix(-44.0, -34.0, flight) + mix(52.0, 38.0, flight) * wave(beat + 0.25));
        let drawn = power * (0.5 + 0.5 * wave(beat + 0.02)) * 0.5;
        bird.turn(
            wing,
            z(side * lift)
                * y(side * mix(72.0, -4.0 + 22.0 * drawn, open))
                * x(mix(20.0, -8.0 + 16.0 * drawn, open)),
        );
        bird.turn(
            mid,
            y(side * mix(-148.0, -14.0 - 52.0 * drawn, open)) * z(side * 5.0 * power * wave(beat + 0.08)),
        );
        bird.turn(
            hand,
            y(side * mix(152.0, 20.0 + 60.0 * drawn, open)) * z(side * 9.0 * power * wave(beat + 0.02)),
        );
    }

    let trail = ease(t, LEAVE_SECS - 0.02, LEAVE_SECS + 0.85);
    for (side, leg, tarsus, toes) in
        [(1.0, "LeftLeg", "LeftTarsus", "LeftToes"), (-1.0, "RightLeg", "RightTarsus", "RightToes")]
    {
        // On the quay until it leaves; then behind the body, trailing.
        let stand = DVec3::new(side * 0.055, 0.0, 0.03 + 0.025 * side);
        let behind = root + travelled + DVec3::new(side * 0.04, -0.355 + 0.012 * wave(beat + 0.6), -0.36);
        let target = stand + (behind - stand) * trail;
        bird.bend_leg(leg, tarsus, toes, target, DVec3::new(side * 0.1, 0.35 * trail, -1.0));
        bird.turn_to(toes, y(side * 8.0) * x(mix(0.0, 75.0, trail)));
    }
    bird.finish()
}

//! The ferry's deck crane slews a load from the quay to the hold: a machine of five joints. Metres.

use glam::DVec3;

use super::body::{Bone, Builder, Motion, Pose, bone, bump, ease, root_bone, wave, x, y, z};

const BONES: &[Bone] = &[
    root_bone("Pedestal", [0.0, 0.0, 0.0]),
    bone("Slewing", 0, [0.0, 3.2, 0.0]),
    bone("Boom", 1, [0.0, 1.1, 0.7]),
    bone("Fall", 2, [0.0, 0.0, 8.5]),
    bone("Hook", 3, [0.0, -4.2, 0.0]),
];

const RATE: f64 = 25.0;
const FRAMES: usize = 201;

/// The motion without a fault.
pub(super) fn motion() -> Motion {
    let poses = (0..FRAMES).map(|frame| pose(frame as f64 / RATE)).collect();
    Motion { bones: BONES, rate: RATE, poses }
}

/// Heading in degrees, not brought to ±180.
pub(super) fn slew_deg(t: f64) -> f64 {
    24.0 + 196.0 * ease(t, 0.8, 6.4) - 7.0 * ease(t, 6.5, 7.7)
}

fn pose(t: f64) -> Pose {
    let mut crane = Builder::new(BONES, DVec3::ZERO);
    crane.turn("Pedestal", x(0.0));
    crane.turn("Slewing", y(slew_deg(t)));
    let luff = 34.0 + 21.0 * bump(t, 0.4, 7.2) - 6.0 * ease(t, 5.0, 7.6);
    crane.turn("Boom", x(-luff));
    // The fall hangs down and swings after the boom: outwards while it slews, sideways as it starts and stops.
    let outwards = 5.0 * bump(t, 1.2, 6.2) + 1.6 * wave(0.42 * t) * (1.0 - ease(t, 6.5, 8.0));
    let sideways = -6.0 * bump(t, 0.7, 3.2) + 6.5 * bump(t, 4.0, 6.9) - 2.5 * bump(t, 6.3, 7.8);
    crane.turn_to("Fall", crane.in_scene("Slewing") * x(-outwards) * z(sideways));
    // A deckhand gives the hook a push: once round, fast, and meant.
    crane.turn("Hook", y(15.0 * wave(0.12 * t) + 360.0 * ease(t, 3.0, 4.6)));
    crane.finish()
}

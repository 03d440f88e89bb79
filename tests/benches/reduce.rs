//! How long do the tools on curves take? `cargo bench --no-default-features --bench reduce` prints processor and wall time for
//! 60 joints × 10,000 frames (83 seconds at 120 a second) of waves with noise; with `--test` a short clip once.
#![expect(clippy::print_stdout, reason = "the numbers are what a bench is for")]

use std::sync::Arc;
use std::time::Instant;

use cpu_time::ProcessTime;
use turnwright::clip::{
    Clip, FrameGrid, JointTracks, ReduceOptions, RotationTrack, Smoothing, Times, reduced,
};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

const JOINTS: usize = 60;

fn main() {
    let is_test = std::env::args().any(|argument| argument == "--test");
    let clip = clip(if is_test { 400 } else { 10_000 });
    for bound_deg in [0.1_f64, 0.5, 2.0, 10.0] {
        let mut left = 0;
        measure(&format!("reduce within {bound_deg}"), || {
            left = reduced(&clip, &ReduceOptions::within(bound_deg.to_radians())).1.after;
        });
        println!("{:24} {left} keys left", "");
    }
    measure("smooth below 6 Hz", || {
        for joint in 0..JOINTS {
            let track = clip.rotation(joint).expect("every joint has one");
            std::hint::black_box(track.smoothed(&Smoothing::gaussian(6.0), &|_| 1.0));
        }
    });
}

fn measure(name: &str, mut work: impl FnMut()) {
    let (start, wall) = (ProcessTime::now(), Instant::now());
    work();
    println!(
        "{name:24} {:8.0} ms of processor time, {:8.0} ms",
        start.elapsed().as_secs_f64() * 1e3,
        wall.elapsed().as_secs_f64() * 1e3
    );
}

/// Waves of the speed of limbs, with the noise of a capture; the last ten joints stand still.
fn clip(frames: usize) -> Clip {
    let grid = FrameGrid { times: Times::Even { step_secs: 1.0 / 120.0, count: frames }, rate: 120.0 };
    let joints: Vec<Joint> = (0..JOINTS)
        .map(|number| Joint {
            name: format!("joint{number}"),
            number,
            parent: number.checked_sub(1),
            rest: Transform::IDENTITY,
            kind: JointKind::Joint,
            tips: vec![],
        })
        .collect();
    let mut noise = 1_u64;
    let mut small = || {
        noise = noise.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        ((noise >> 40) as f64 / f64::from(1 << 24) - 0.5) * 1e-3
    };
    let tracks = (0..JOINTS).map(|joint| {
        let size = if joint < JOINTS - 10 { 0.6 } else { 0.0 };
        let keys: Vec<Rotor> = (0..frames)
            .map(|frame| {
                let t = frame as f64 / 120.0 + joint as f64;
                let wave = Bivector::new((5.0 * t).sin(), 0.5 * (3.1 * t).cos(), 0.3 * (7.3 * t).sin());
                let jitter = Bivector::new(small(), small(), small());
                Rotor::from_plane_angles((wave + jitter) * size)
            })
            .collect();
        let rotation = Some(RotationTrack::from_rotors(grid.times.clone(), keys));
        Arc::new(JointTracks { rotation, ..JointTracks::default() })
    });
    Clip {
        name: "waves".to_owned(),
        skeleton: Arc::new(Skeleton::new(joints).expect("a chain")),
        joints: tracks.collect(),
        grid: grid.clone(),
        duration_secs: (frames - 1) as f64 / 120.0,
    }
}

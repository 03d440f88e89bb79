//! What does it cost to mix two clips, and to align them? `cargo bench --no-default-features --bench blend`.
//!
//! One thread, time of the processor. Mixing stands beside the sampling of both clips in the same run.

mod cpu_time;

use std::hint::black_box;
use std::sync::Arc;
use std::time::Duration;

use cpu_time::CpuTime;
use criterion::{criterion_group, criterion_main};
use glam::DVec3;
use turnwright::blend::{Mask, MixAlong, align, mix};
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times, VectorTrack};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::{Joint, Skeleton};

type Criterion = criterion::Criterion<CpuTime>;

const JOINTS: usize = 60;
const RATE: f64 = 60.0;

/// A tree of joints that swing to and fro at a pace of `pace`, on a walking root.
fn clip(frames: usize, pace: f64) -> Clip {
    let joint = |number: usize| {
        let parent = number.checked_sub(1).map(|before| before - before % 4);
        Joint::placed(&format!("J{number}"), number, parent, DVec3::new(0.1, 0.4, 0.02 * number as f64))
    };
    let times = Times::Even { step_secs: 1.0 / RATE, count: frames };
    let tracks = (0..JOINTS).map(|joint| {
        let turn = |frame: usize| {
            let (i, j) = (frame as f64 * 0.05 * pace, joint as f64);
            Rotor::from_plane_angles(Bivector::new(
                0.5 * (i + j).sin(),
                0.3 * (1.3 * i).cos(),
                0.4 * (0.7 * i + j).sin(),
            ))
        };
        let keys: Vec<Rotor> = (0..frames).map(turn).collect();
        let places = (joint == 0).then(|| {
            let place = |frame: usize| DVec3::new(0.0, 1.0, 0.02 * pace * frame as f64);
            VectorTrack::straight(times.clone(), (0..frames).map(place).collect::<Vec<_>>())
        });
        Arc::new(JointTracks {
            rotation: Some(RotationTrack::from_rotors(times.clone(), keys)),
            translation: places,
            scale: None,
        })
    });
    Clip {
        name: String::new(),
        joints: tracks.collect(),
        skeleton: Arc::new(Skeleton::new((0..JOINTS).map(joint).collect()).expect("parents come first")),
        duration_secs: (frames - 1) as f64 / RATE,
        grid: FrameGrid { times, rate: RATE },
    }
}

fn benches(criterion: &mut Criterion) {
    let (a, b) = (clip(2000, 1.0), clip(2000, 1.1));
    let mask = Mask::all(&a.skeleton);
    let times: Vec<f64> = a.grid.times.iter().collect();
    let mut group = criterion.benchmark_group("two clips of 60 joints and 2000 frames");
    group.sample_size(10).measurement_time(Duration::from_secs(3));
    group.bench_function("sample both", |bencher| {
        bencher.iter(|| {
            for clip in [&a, &b] {
                for joint in 0..JOINTS {
                    black_box(clip.rotations_at(joint, &times));
                }
            }
        });
    });
    group.bench_function("mix", |bencher| {
        bencher.iter(|| black_box(mix(&a, &b, &MixAlong::constant(0.4), &mask)));
    });
    group.finish();
    let (a, b) = (clip(10_000, 1.0), clip(10_000, 1.05));
    let mut group = criterion.benchmark_group("two clips of 60 joints and 10,000 frames");
    group.sample_size(10).measurement_time(Duration::from_secs(10));
    group.bench_function("align", |bencher| bencher.iter(|| black_box(align(&a, &b))));
    group.finish();
}

criterion_group! {
    name = all;
    config = criterion::Criterion::default().with_measurement(CpuTime);
    targets = benches
}
criterion_main!(all);

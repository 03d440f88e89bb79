//! How long does it take to play a clip at another rate, and to place its joints in the scene?
//!
//! `cargo bench --no-default-features --bench clip`. One thread, time of the processor, `f64`; the peer does the same work with `glam` and nothing
//! around it. Ours is the code that the commands run, from `Clip` to `Rotor`s and places.

mod cpu_time;

use std::hint::black_box;
use std::sync::Arc;
use std::time::Duration;

use cpu_time::CpuTime;
use criterion::{Throughput, criterion_group, criterion_main};
use glam::{DQuat, DVec3};
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

type Criterion = criterion::Criterion<CpuTime>;

const JOINTS: usize = 65;
const FRAMES: usize = 2000;
const RATE: f64 = 60.0;
/// As many times as the commands take at once.
const TIMES_AT_ONCE: usize = 256;

/// A tree of joints that all turn to and fro, each in its own way.
fn clip() -> Clip {
    let joint = |number: usize| Joint {
        name: format!("J{number}"),
        number,
        parent: number.checked_sub(1).map(|before| before - before % 4),
        rest: Transform::from_translation(DVec3::new(0.1, 0.4, 0.02 * number as f64)),
        kind: JointKind::Joint,
        tips: vec![],
    };
    let times = Times::Even { step_secs: 1.0 / RATE, count: FRAMES };
    let tracks = (0..JOINTS).map(|joint| {
        let turn = |frame: usize| {
            let (i, j) = (frame as f64 * 0.03, joint as f64);
            Rotor::from_plane_angles(Bivector::new((i + j).sin(), (1.3 * i).cos(), (0.7 * i + j).sin()))
        };
        let keys: Vec<Rotor> = (0..FRAMES).map(turn).collect();
        let rotation = Some(RotationTrack::from_rotors(times.clone(), keys));
        Arc::new(JointTracks { rotation, ..JointTracks::default() })
    });
    Clip {
        name: String::new(),
        joints: tracks.collect(),
        skeleton: Arc::new(Skeleton::new((0..JOINTS).map(joint).collect()).expect("parents come first")),
        duration_secs: (FRAMES - 1) as f64 / RATE,
        grid: FrameGrid { times, rate: RATE },
    }
}

/// The same numbers as `glam` keeps them: the keys of each joint in a row.
fn peer_keys(clip: &Clip) -> Vec<Vec<DQuat>> {
    let keys = |joint: usize| {
        let track = clip.rotation(joint).expect("every joint turns");
        track.keys.iter().map(|key| DQuat::from_array(key.to_xyzw())).collect()
    };
    (0..JOINTS).map(keys).collect()
}

fn peer_at(keys: &[DQuat], secs: f64) -> DQuat {
    let place = secs * RATE;
    let key = (place as usize).min(keys.len() - 2);
    keys[key].slerp(keys[key + 1], place - key as f64)
}

fn play(criterion: &mut Criterion) {
    let clip = clip();
    let times: Vec<f64> = (0..2 * FRAMES - 1).map(|frame| frame as f64 / (2.0 * RATE)).collect();
    let keys = peer_keys(&clip);
    let mut group = criterion.benchmark_group("60 to 120 frames a second");
    group.throughput(Throughput::Elements((JOINTS * times.len()) as u64)).sample_size(10);
    group.warm_up_time(Duration::from_millis(300)).measurement_time(Duration::from_secs(2));
    group.bench_function("ours", |bencher| {
        bencher.iter(|| {
            for joint in 0..JOINTS {
                black_box(clip.rotations_at(joint, black_box(&times)));
            }
        });
    });
    group.bench_function("ours, one by one", |bencher| {
        bencher.iter(|| {
            for joint in 0..JOINTS {
                let track = clip.rotation(joint).expect("every joint turns");
                black_box(times.iter().map(|&secs| track.at(secs)).collect::<Vec<_>>());
            }
        });
    });
    group.bench_function("glam", |bencher| {
        bencher.iter(|| {
            for keys in black_box(&keys) {
                black_box(times.iter().map(|&secs| peer_at(keys, secs)).collect::<Vec<_>>());
            }
        });
    });
    group.finish();
}

fn place(criterion: &mut Criterion) {
    let clip = clip();
    let times: Vec<f64> = (0..2 * FRAMES - 1).map(|frame| frame as f64 / (2.0 * RATE)).collect();
    let keys = peer_keys(&clip);
    let joints = clip.skeleton.joints();
    let mut group = criterion.benchmark_group("play and place in the scene");
    group.throughput(Throughput::Elements((JOINTS * times.len()) as u64)).sample_size(10);
    group.warm_up_time(Duration::from_millis(300)).measurement_time(Duration::from_secs(2));
    group.bench_function("ours", |bencher| {
        bencher.iter(|| {
            for times in black_box(&times).chunks(TIMES_AT_ONCE) {
                black_box(clip.worlds_at(times));
            }
        });
    });
    group.bench_function("ours, one by one", |bencher| {
        bencher.iter(|| {
            for &secs in black_box(&times) {
                black_box(clip.world_at(secs));
            }
        });
    });
    group.bench_function("glam", |bencher| {
        let mut world = vec![(DQuat::IDENTITY, DVec3::ZERO); JOINTS];
        bencher.iter(|| {
            for &secs in black_box(&times) {
                for (joint, own) in joints.iter().enumerate() {
                    let turn = peer_at(&keys[joint], secs);
                    world[joint] = match own.parent.map(|parent| world[parent]) {
                        Some((rotation, place)) => (rotation * turn, place + rotation * own.rest.translation),
                        None => (turn, own.rest.translation),
                    };
                }
                black_box(&mut world);
            }
        });
    });
    group.finish();
}

criterion_group! {
    name = benches;
    config = criterion::Criterion::default().with_measurement(CpuTime);
    targets = play, place
}
criterion_main!(benches);

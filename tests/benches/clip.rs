//! How long does it take to play a clip at another rate, and to place its joints in the scene?
//!
//! `cargo bench --no-default-features --bench clip`. One thread, time of the processor, `f64` but where it says `f32`; the peer does the same work with `glam`
//! and nothing around it. Ours is the code that the commands run, from `Clip` to `Rotor`s and places.

mod cpu_time;

use std::hint::black_box;
use std::sync::Arc;
use std::time::Duration;

use cpu_time::CpuTime;
use criterion::{Throughput, criterion_group, criterion_main};
use glam::{DQuat, DVec3, Quat, Vec3};
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times};
use turnwright::rotor::batch::{self, Bone, Level, Place, Real, TREE_ROWS, TREE_TILES, Turns};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

type Criterion = criterion::Criterion<CpuTime>;
type Group<'a> = criterion::BenchmarkGroup<'a, CpuTime>;

const JOINTS: usize = 65;
const FRAMES: usize = 2000;
const RATE: f64 = 60.0;
/// As many times as the commands take at once.
const TIMES_AT_ONCE: usize = 256;

fn place(joint: usize) -> DVec3 {
    DVec3::new(0.1, 0.4, 0.02 * joint as f64)
}

fn turn(frame: usize, joint: usize) -> Rotor {
    let (i, j) = (frame as f64 * 0.03, joint as f64);
    Rotor::from_plane_angles(Bivector::new((i + j).sin(), (1.3 * i).cos(), (0.7 * i + j).sin()))
}

/// A tree of joints that all turn to and fro, each in its own way.
fn clip() -> Clip {
    let joint = |number: usize| Joint {
        name: format!("J{number}"),
        number,
        parent: parent(number),
        rest: Transform::from_translation(place(number)),
        kind: JointKind::Joint,
        tips: vec![],
    };
    let times = Times::Even { step_secs: 1.0 / RATE, count: FRAMES };
    let tracks = (0..JOINTS).map(|joint| {
        let keys: Vec<Rotor> = (0..FRAMES).map(|frame| turn(frame, joint)).collect();
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
            let mut playing = clip.playing(black_box(&times), None);
            for joint in 0..JOINTS {
                black_box(playing.rotations(joint));
            }
        });
    });
    group.bench_function("ours, each joint by itself", |bencher| {
        bencher.iter(|| {
            for joint in 0..JOINTS {
                black_box(clip.rotations_at(joint, black_box(&times)));
            }
        });
    });
    group.bench_function("ours, keys made unit first", |bencher| {
        bencher.iter(|| {
            for joint in 0..JOINTS {
                let track = clip.rotation(joint).expect("every joint turns");
                let track = RotationTrack { keys: track.keys.to_vec().into(), ..track.clone() };
                black_box(track.at_all(black_box(&times)));
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

fn play_and_place(criterion: &mut Criterion) {
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

/// The joint's parent, which comes before it.
fn parent(joint: usize) -> Option<usize> {
    joint.checked_sub(1).map(|before| before - before % 4)
}

/// Forward kinematics alone, of 10,000 frames whose turns lie in memory. The frames in the scene are handed on and not kept, as where
/// whole clips are measured; `kept` writes all of them into memory.
fn kinematics<F: Real>(
    criterion: &mut Criterion,
    name: &str,
    narrowed: impl Fn(f64) -> F + Copy,
    glam: impl FnOnce(&mut Group<'_>),
) {
    let mut group = criterion.benchmark_group(format!("place in the scene {name}"));
    group.throughput(Throughput::Elements((JOINTS * KINEMATIC_FRAMES) as u64)).sample_size(20);
    group.warm_up_time(Duration::from_millis(300)).measurement_time(Duration::from_secs(2));
    let tile = |tile: usize| -> Vec<Turns<F>> {
        let of_joint = |joint: usize| {
            let mut columns = [[narrowed(0.0); TREE_ROWS]; 4];
            for row in 0..TREE_ROWS {
                let turn = turn(tile * TREE_ROWS + row, joint);
                for (column, part) in columns.iter_mut().zip([turn.s, turn.yz, turn.zx, turn.xy]) {
                    column[row] = narrowed(part);
                }
            }
            columns
        };
        (0..JOINTS).map(of_joint).collect()
    };
    let turns: Vec<Turns<F>> = (0..KINEMATIC_FRAMES / TREE_ROWS).flat_map(tile).collect();
    let bone = |joint: usize| Bone {
        parent: parent(joint),
        place: Place::Fixed(place(joint).to_array().map(narrowed)),
    };
    let bones: Vec<Bone<'_, F>> = (0..JOINTS).map(bone).collect();
    let calls = KINEMATIC_FRAMES / TREE_ROWS / TREE_TILES;
    let mut worlds = vec![[[[narrowed(0.0); TREE_ROWS]; 7]; TREE_TILES]; JOINTS * calls];
    let levels = Level::all().into_iter().map(|(name, level)| (format!("ours, {name}"), level, false));
    for (name, level, are_kept) in levels.chain([("ours, kept".to_owned(), Level::best(), true)]) {
        group.bench_function(name, |bencher| {
            bencher.iter(|| {
                for call in 0..calls {
                    let tile = |tile: usize| &black_box(&turns)[(tile * calls + call) * JOINTS..][..JOINTS];
                    let room = &mut worlds[if are_kept { call * JOINTS } else { 0 }..][..JOINTS];
                    batch::place_tree(level, &bones, std::array::from_fn(tile), room);
                    black_box(room);
                }
            });
        });
    }
    glam(&mut group);
    group.finish();
}

/// Whole calls of four tiles.
const KINEMATIC_FRAMES: usize = 10_016;

macro_rules! glam_kinematics {
    ($quat:ty, $vec:ty, $turn:expr, $place:expr) => {
        |group: &mut Group<'_>| {
            let frames = 0..KINEMATIC_FRAMES;
            let turns: Vec<$quat> =
                frames.flat_map(|frame| (0..JOINTS).map(move |joint| $turn(turn(frame, joint)))).collect();
            let places: Vec<$vec> = (0..JOINTS).map(|joint| $place(place(joint))).collect();
            let parents: Vec<Option<usize>> = (0..JOINTS).map(parent).collect();
            let mut worlds = vec![(<$quat>::IDENTITY, <$vec>::ZERO); turns.len()];
            for (name, are_kept) in [("glam", false), ("glam, kept", true)] {
                group.bench_function(name, |bencher| {
                    bencher.iter(|| {
                        for (frame, turns) in black_box(&turns).chunks_exact(JOINTS).enumerate() {
                            let world = &mut worlds[if are_kept { frame * JOINTS } else { 0 }..][..JOINTS];
                            for joint in 0..JOINTS {
                                world[joint] = match parents[joint].map(|parent| world[parent]) {
                                    Some((turn, at)) => (turn * turns[joint], at + turn * places[joint]),
                                    None => (turns[joint], places[joint]),
                                };
                            }
                            black_box(world);
                        }
                    });
                });
            }
        }
    };
}

fn kinematics_alone(criterion: &mut Criterion) {
    let narrow = |turn: Rotor| Quat::from_array(turn.to_xyzw().map(|part| part as f32));
    let wide = |turn: Rotor| DQuat::from_array(turn.to_xyzw());
    let glam = glam_kinematics!(Quat, Vec3, narrow, |place: DVec3| place.as_vec3());
    kinematics(criterion, "f32", |part| part as f32, glam);
    let glam = glam_kinematics!(DQuat, DVec3, wide, |place: DVec3| place);
    kinematics(criterion, "f64", |part| part, glam);
}

criterion_group! {
    name = benches;
    config = criterion::Criterion::default().with_measurement(CpuTime);
    targets = play, play_and_place, kinematics_alone
}
criterion_main!(benches);

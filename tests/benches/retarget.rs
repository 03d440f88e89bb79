//! What carrying a clip to another skeleton costs: 60 joints, 10,000 frames, with feet held. One iteration is one clip;
//! divided by 600,000 it is the time for a joint and frame.

mod cpu_time;

use std::hint::black_box;
use std::sync::Arc;

use criterion::{Criterion, criterion_group, criterion_main};
use glam::DVec3;
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times, VectorTrack};
use turnwright::retarget::{Figure, JointMap, Options, retarget};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use cpu_time::CpuTime;

const FRAMES: usize = 10_000;
const FPS: f64 = 60.0;

/// A person with `n_trunk` joints between hips and arms and five fingers of three joints on each hand: 60 joints with nine.
fn person(n_trunk: usize, height: f64) -> Skeleton {
    let mut joints: Vec<Joint> = Vec::new();
    let mut add = |name: String, parent: Option<usize>, offset: DVec3, tip: Option<DVec3>| {
        joints.push(Joint {
            name,
            number: joints.len(),
            parent,
            rest: Transform::from_translation(offset * height),
            kind: JointKind::Joint,
            tips: tip.map(|tip| tip * height).into_iter().collect(),
        });
        joints.len() - 1
    };
    let hips = add("Hips".to_owned(), None, DVec3::Y, None);
    let mut on = hips;
    for index in 0..n_trunk {
        on = add(format!("Spine{index}"), Some(on), DVec3::Y * (0.45 / n_trunk as f64), None);
    }
    let chest = on;
    let neck = add("Neck".to_owned(), Some(chest), DVec3::Y * 0.1, None);
    add("Head".to_owned(), Some(neck), DVec3::Y * 0.1, Some(DVec3::Y * 0.2));
    for (side, x) in [("Left", 1.0), ("Right", -1.0)] {
        let name = |part: &str| format!("{side}{part}");
        let shoulder = add(name("Shoulder"), Some(chest), DVec3::new(0.05 * x, 0.02, 0.0), None);
        let arm = add(name("Arm"), Some(shoulder), DVec3::X * (0.13 * x), None);
        let fore = add(name("ForeArm"), Some(arm), DVec3::new(0.28 * x, 0.0, -0.01), None);
        let hand = add(name("Hand"), Some(fore), DVec3::new(0.25 * x, 0.0, 0.01), None);
        for (index, finger) in ["Thumb", "Index", "Middle", "Ring", "Pinky"].iter().enumerate() {
            let mut on = hand;
            for bone in 1..=3 {
                let reach = if bone == 1 { 0.09 } else { 0.03 };
                let aside = if bone == 1 { 0.04 - 0.02 * index as f64 } else { 0.0 };
                let tip = (bone == 3).then_some(DVec3::X * (0.025 * x));
                on = add(
                    format!("{side}Hand{finger}{bone}"),
                    Some(on),
                    DVec3::new(reach * x, 0.0, aside),
                    tip,
                );
            }
        }
        let thigh = add(name("UpLeg"), Some(hips), DVec3::new(0.09 * x, -0.07, 0.0), None);
        let shin = add(name("Leg"), Some(thigh), DVec3::new(0.0, -0.42, 0.01), None);
        let foot = add(name("Foot"), Some(shin), DVec3::new(0.0, -0.42, -0.03), None);
        let toes = add(name("ToeBase"), Some(foot), DVec3::new(0.0, -0.07, 0.13), None);
        add(name("ToeEnd"), Some(toes), DVec3::Z * 0.07, None);
    }
    Skeleton::new(joints).expect("parents stand first")
}

/// Walks: legs swing, one foot after the other stands.
fn walk(skeleton: Skeleton) -> Clip {
    let times = Times::Even { step_secs: 1.0 / FPS, count: FRAMES };
    let secs = |i: usize| i as f64 / FPS;
    let nod = |angle: f64| Rotor::from_plane_angles(Bivector::from_axis(DVec3::X * angle));
    let joints = (0..skeleton.len())
        .map(|joint| {
            let name = skeleton.joints()[joint].name.as_str();
            let phase = if name.starts_with("Left") { 0.0 } else { std::f64::consts::PI };
            let turn = |i: usize| {
                let t = std::f64::consts::TAU * secs(i) + phase;
                match name.trim_start_matches("Left").trim_start_matches("Right") {
                    "UpLeg" => nod(-0.4 * t.sin()),
                    "Leg" => nod(0.6 * (t.cos().max(0.0))),
                    "Foot" => nod(0.2 * t.sin()),
                    "Arm" => nod(0.3 * t.sin()),
                    _ => Rotor::from_plane_angles(
                        Bivector::new(0.03, 0.02, 0.04) * (0.5 * t + joint as f64).sin(),
                    ),
                }
            };
            let place = |i: usize| DVec3::new(0.0, 0.97, 1.3 * secs(i));
            Arc::new(JointTracks {
                rotation: Some(RotationTrack::from_rotors(
                    times.clone(),
                    (0..FRAMES).map(turn).collect::<Vec<_>>(),
                )),
                translation: (joint == 0).then(|| {
                    VectorTrack::straight(times.clone(), (0..FRAMES).map(place).collect::<Vec<_>>())
                }),
                scale: None,
            })
        })
        .collect();
    let duration_secs = secs(FRAMES - 1);
    Clip {
        name: String::new(),
        skeleton: Arc::new(skeleton),
        joints,
        grid: FrameGrid { times, rate: FPS },
        duration_secs,
    }
}

fn carry(criterion: &mut Criterion<CpuTime>) {
    let clip = walk(person(9, 1.0));
    let source = Figure::new(&clip.skeleton);
    let target = Figure::new(&Arc::new(person(4, 87.0)));
    let map = JointMap::automatic(&source, &target);
    let mut group =
        criterion.benchmark_group(format!("retarget {} joints x {FRAMES} frames", clip.skeleton.len()));
    group.sample_size(10);
    for (name, plant_feet) in [("turns", false), ("with feet held", true)] {
        let options = Options { plant_feet, ..Options::bare() };
        group.bench_function(name, |bencher| {
            bencher.iter(|| black_box(retarget(&clip, &source, &target, &map, &options)));
        });
    }
    group.finish();
}

criterion_group! {
    name = benches;
    config = Criterion::default().with_measurement(CpuTime);
    targets = carry
}
criterion_main!(benches);

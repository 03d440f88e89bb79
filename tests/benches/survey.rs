//! How long does it take to find all snags of a long clip, against reading it? `cargo bench --no-default-features --bench survey` prints the
//! median processor time of several runs for 60 joints × 36,000 frames (5 minutes at 120 a second) of stored angles with noise
//! and faults, and the share of each kind; with `--test` a short clip is surveyed once.
#![expect(clippy::print_stdout, reason = "the numbers are what a bench is for")]

use std::sync::Arc;

use cpu_time::ProcessTime;
use turnwright::clip::{Clip, FileAngles, FrameGrid, JointTracks, RotationTrack, Times};
use turnwright::exchange::bvh;
use turnwright::mend::{SurveyOptions, survey};
use turnwright::rotor::{Axis, EulerOrder};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};
use turnwright::snag::{SnagKind, Unwatched};

const JOINTS: usize = 60;

fn main() {
    let is_test = std::env::args().any(|argument| argument == "--test");
    let (frames, runs) = if is_test { (600, 1) } else { (36_000, 3) };
    let clip = clip(frames);
    let text = bvh::from_clip(&clip).0;
    let reading = millis(runs, || {
        std::hint::black_box(bvh::read(&text, "bench").expect("what was written reads"));
    });
    println!("{:16} {reading:8.1} ms  the same clip as BVH, {} MB", "reading", text.len() >> 20);
    drop(text);
    measure("all by default", &clip, &SnagKind::defaults(), runs, reading);
    for kind in SnagKind::ALL {
        measure(kind.name(), &clip, &[kind], runs, reading);
    }
}

/// The median processor time of some runs, of all threads together, in ms.
fn millis(runs: usize, mut job: impl FnMut()) -> f64 {
    let mut millis: Vec<f64> = (0..runs)
        .map(|_| {
            let start = ProcessTime::now();
            job();
            start.elapsed().as_secs_f64() * 1e3
        })
        .collect();
    millis.sort_by(f64::total_cmp);
    millis[millis.len() / 2]
}

fn measure(name: &str, clip: &Clip, kinds: &[SnagKind], runs: usize, reading: f64) {
    let options = SurveyOptions { kinds: kinds.to_vec(), ..SurveyOptions::default() };
    let mut found = 0;
    let own = millis(runs, || {
        found = survey(clip, &options, &Unwatched).map_or(0, |survey| survey.snags.len());
    });
    println!("{name:16} {own:8.1} ms  {:.2} of reading  {found} snags", own / reading);
}

/// Waves with noise, and in every joint a spike, a half-turn and a heading that wraps.
fn clip(frames: usize) -> Clip {
    let times = Times::Even { step_secs: 1.0 / 120.0, count: frames };
    let mut noise = 1_u64;
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
    let tracks = (0..JOINTS).map(|joint| {
        let degrees: Vec<[f64; 3]> = (0..frames)
            .map(|frame| {
                let t = frame as f64 / 120.0 + joint as f64;
                let mut small = || {
                    noise = noise.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
                    ((noise >> 40) as f64 / f64::from(1 << 24) - 0.5) * 0.2
                };
                let turn = if frame % 9000 == 500 { 40.0 } else { 0.0 };
                let flip = if (200..260).contains(&(frame % 5000)) { 180.0 } else { 0.0 };
                let heading = 40.0 * t + small();
                let wrapped = heading - 360.0 * (heading / 360.0).round();
                [wrapped, 50.0 * (1.3 * t).sin() + small() + turn, 30.0 * (2.1 * t).cos() + small() + flip]
            })
            .collect();
        let angles = FileAngles {
            axes: EulerOrder::ZXY.axes().to_vec(),
            order: EulerOrder::ZXY,
            degrees: degrees.into(),
        };
        debug_assert_eq!(angles.axes[0], Axis::Z);
        let rotation = Some(RotationTrack::from_angles(times.clone(), angles));
        Arc::new(JointTracks { rotation, ..JointTracks::default() })
    });
    Clip {
        name: String::new(),
        joints: tracks.collect(),
        skeleton: Arc::new(Skeleton::new(joints).expect("each joint hangs on the one before")),
        grid: FrameGrid { times: times.clone(), rate: 120.0 },
        duration_secs: times.span().map_or(0.0, |(_, last)| last),
    }
}

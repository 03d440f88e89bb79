//! How long does it take to find all snags of a long clip, against reading it, and how much memory? `cargo bench
//! --no-default-features --bench survey` takes turns at reading and finding and prints the least processor time of several runs for
//! 60 joints × 36,000 frames (5 minutes at 120 a second) of stored angles with noise and faults in every joint, the share of each kind, how many
//! cores were busy, and the most memory beside the clip itself. `FRAMES=200000` measures the length that is asked for, `RATE=30` frames
//! that lie further apart, so that everything moves faster from one to the next, `RUNS=1` once; with `--test` a short clip is surveyed once.
#![expect(clippy::print_stdout, reason = "the numbers are what a bench is for")]

use std::fs::OpenOptions;
use std::io::Write as _;
use std::path::Path;
use std::sync::Arc;
use std::time::Instant;

use cpu_time::ProcessTime;
use glam::DVec3;
use turnwright::clip::{Clip, FileAngles, FrameGrid, JointTracks, RotationTrack, Times};
use turnwright::exchange::{bvh, disk};
use turnwright::limit::{LearnOptions, Limits, learned};
use turnwright::mend::{SurveyOptions, survey};
use turnwright::rotor::{Axis, EulerOrder};
use turnwright::skeleton::{Joint, Skeleton};
use turnwright::snag::{SnagKind, Unwatched};

const JOINTS: usize = 60;

fn main() {
    let is_test = std::env::args().any(|argument| argument == "--test");
    let given = |name: &str, usual: usize| {
        std::env::var(name).ok().and_then(|value| value.parse().ok()).unwrap_or(usual)
    };
    let (frames, runs) = if is_test { (600, 1) } else { (given("FRAMES", 36_000), given("RUNS", 5)) };
    let rate = given("RATE", 120) as f64;
    let clip = clip(frames, rate);
    let text = bvh::from_clip(&clip).0;
    // Learned from its first minute, as from a take that is known to be clean.
    let limits = Arc::new(learned(&self::clip(frames.min(7200), rate), &LearnOptions::default()));
    assert!(!limits.joints.is_empty(), "there are limits to be beyond");
    let named =
        |kinds: Vec<SnagKind>, limits: Option<&Arc<Limits>>| SurveyOptions { kinds, limits: limits.cloned() };
    let mut jobs = vec![
        ("all by default", named(SnagKind::defaults(), None)),
        ("all with limits", named(SnagKind::defaults(), Some(&limits))),
        ("every kind", named(SnagKind::ALL.to_vec(), Some(&limits))),
    ];
    jobs.extend(SnagKind::ALL.map(|kind| (kind.name(), named(vec![kind], Some(&limits)))));

    let mut reading = Spent::NONE;
    let mut found = vec![(Spent::NONE, 0); jobs.len()];
    for _ in 0..runs {
        reading = reading.least(spent(|| {
            std::hint::black_box(bvh::read(&text, "bench").expect("what was written reads"));
        }));
        for ((_, options), (own, snags)) in jobs.iter().zip(&mut found) {
            // A clip of its own: what the search remembers of the keys is part of its work.
            let fresh = fresh(&clip);
            *own = own.least(spent(|| {
                *snags = survey(&fresh, options, &Unwatched).map_or(0, |survey| survey.snags.len());
            }));
        }
    }
    println!("{frames} frames of {JOINTS} joints");
    println!("{:16} {:8.1} ms  the same clip as BVH, {} MB", "reading", reading.cpu, text.len() >> 20);
    for ((name, _), (own, snags)) in jobs.iter().zip(&found) {
        println!(
            "{name:16} {:8.1} ms  {:.2} of reading  {:.2} cores  {snags} snags",
            own.cpu,
            own.cpu / reading.cpu,
            own.cpu / own.wall
        );
    }
    drop(text);
    memory(&clip, &jobs[1].1);
}

/// What a job took, in ms.
#[derive(Clone, Copy)]
struct Spent {
    /// Of the processor, all threads together.
    cpu: f64,
    wall: f64,
}

impl Spent {
    const NONE: Self = Self { cpu: f64::INFINITY, wall: f64::INFINITY };

    fn least(self, other: Self) -> Self {
        if other.cpu < self.cpu { other } else { self }
    }
}

fn spent(mut job: impl FnMut()) -> Spent {
    let (start, began) = (ProcessTime::now(), Instant::now());
    job();
    let cpu = start.elapsed().as_secs_f64() * 1e3;
    Spent { cpu, wall: began.elapsed().as_secs_f64() * 1e3 }
}

/// The same clip with nothing worked out about its keys yet.
fn fresh(clip: &Clip) -> Clip {
    let joints = clip.joints.iter().map(|tracks| {
        let rotation = tracks
            .rotation
            .as_ref()
            .map(|track| RotationTrack { keys: track.keys.to_vec().into(), ..track.clone() });
        Arc::new(JointTracks { rotation, ..JointTracks::default() })
    });
    Clip { joints: joints.collect(), ..clip.clone() }
}

/// The most memory that a survey takes, beside that of the decoded clip: where the system tells.
fn memory(clip: &Clip, options: &SurveyOptions) {
    let status = |name: &str| -> Option<f64> {
        let text = String::from_utf8(disk::read(Path::new("/proc/self/status")).ok()?).ok()?;
        let line = text.lines().find(|line| line.starts_with(name))?;
        let kilobytes: f64 = line.split_whitespace().nth(1)?.parse().ok()?;
        Some(kilobytes / 1024.0)
    };
    // The peak so far is forgotten.
    let file = OpenOptions::new().write(true).open("/proc/self/clear_refs");
    if file.and_then(|mut file| file.write_all(b"5")).is_err() {
        return;
    }
    let Some(before) = status("VmRSS") else { return };
    let survey = survey(clip, options, &Unwatched);
    let Some(most) = status("VmHWM") else { return };
    std::hint::black_box(&survey);
    let keys: usize =
        clip.joints.iter().filter_map(|own| own.rotation.as_ref()).map(|own| own.keys.len()).sum();
    // A rotor and the file's three angles.
    let decoded = (keys * (4 + 3) * size_of::<f64>()) as f64 / f64::from(1 << 20);
    println!(
        "memory: the clip {decoded:.0} MB, {:.0} MB more while it is surveyed: {:.2} times the clip together",
        most - before,
        (decoded + most - before) / decoded
    );
}

/// Waves with noise, and in every joint a spike, a half-turn and a heading that wraps.
fn clip(frames: usize, rate: f64) -> Clip {
    let times = Times::Even { step_secs: 1.0 / rate, count: frames };
    let mut noise = 1_u64;
    let joints: Vec<Joint> = (0..JOINTS)
        // Its heading is the twist of its limb, so that there are limits of its swing to learn.
        .map(|number| Joint::placed(&format!("joint{number}"), number, number.checked_sub(1), DVec3::Z))
        .collect();
    let tracks = (0..JOINTS).map(|joint| {
        let degrees: Vec<[f64; 3]> = (0..frames)
            .map(|frame| {
                let t = frame as f64 / rate + joint as f64;
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
        grid: FrameGrid { times: times.clone(), rate },
        duration_secs: times.span().map_or(0.0, |(_, last)| last),
    }
}

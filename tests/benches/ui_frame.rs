//! How long does one frame of the window take? `cargo bench --bench ui_frame` (`FRAMES=36000` in front: that length alone): a window without a display, 60 joints, 36,000 and 432,000 frames
//! (5 minutes and an hour at 120 a second) in turn, while scrubbing, playing and dragging a key, at two sizes; and, over the first length, while
//! scrubbing and dragging a contact in the retarget sheet, with a figure of 60 joints that is smaller.
//!
//! Time of the processor: the interface and the tessellation on their thread, and half of the painting, which two threads
//! share in bands of rows. The split is printed. With `--test` a short clip is shown for a few frames.
#![expect(clippy::print_stdout, reason = "the numbers are what a bench is for")]

#[path = "cpu_time.rs"]
mod processor;

use std::f64::consts::TAU;
use std::fmt;
use std::path::Path;
use std::sync::Arc;
use std::time::{Duration, Instant};

use cpu_time::ThreadTime;
use criterion::Criterion;
use glam::DVec3;
use processor::CpuTime;
use turnwright::app::commands::{Action, CarryCommand, Command};
use turnwright::app::paint::Headless;
use turnwright::app::{Start, Window};
use turnwright::clip::{Clip, FootPart, FrameGrid, JointTracks, KeyChange, KeyEdit, RotationTrack, Times};
use turnwright::exchange::{OpenOptions, Source, bvh, open_bytes};
use turnwright::limit::{LearnOptions, learned};
use turnwright::retarget::FootContact;
use turnwright::rotor::{Bivector, Rotor};
use turnwright::scene::{Edit, KeysPass, PassId, PassStep, RetargetPass};
use turnwright::skeleton::roles::Side;
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

const RATE: f64 = 120.0;
const JOINTS: usize = 60;
/// The joint whose curves are looked at: one with a limit.
const CHOSEN: usize = 2;

/// A trunk, two arms with hands, two legs: 60 joints.
fn skeleton(size: f64) -> Skeleton {
    // Parent, and the way from it.
    let mut joints: Vec<(Option<usize>, DVec3)> = vec![(None, DVec3::new(0.0, 0.95, 0.0))];
    let chain = |joints: &mut Vec<(Option<usize>, DVec3)>, from: usize, steps: &[DVec3]| {
        let mut parent = from;
        for &step in steps {
            joints.push((Some(parent), step));
            parent = joints.len() - 1;
        }
        parent
    };
    let up = DVec3::new(0.0, 0.1, 0.0);
    let chest = chain(&mut joints, 0, &[up; 5]);
    chain(&mut joints, chest, &[up; 4]);
    for side in [1.0, -1.0] {
        let out = DVec3::new(0.26 * side, 0.0, 0.0);
        let hand = chain(&mut joints, chest, &[0.5 * out, 0.2 * out, out, out]);
        for finger in 0..5 {
            let step = DVec3::new(0.035 * side, 0.0, 0.02 * (f64::from(finger) - 2.0));
            chain(&mut joints, hand, &[step; 3]);
        }
        let down = DVec3::new(0.0, -0.42, 0.0);
        let front = DVec3::new(0.0, -0.05, 0.1);
        chain(&mut joints, 0, &[DVec3::new(0.1 * side, 0.0, 0.0), down, down, front, front, front]);
    }
    assert_eq!(joints.len(), JOINTS, "the count that the bench is about");
    let joint = |(number, (parent, place)): (usize, (Option<usize>, DVec3))| Joint {
        name: format!("Joint_of_the_figure_{number:02}"),
        number,
        parent,
        rest: Transform::from_translation(size * place),
        kind: JointKind::Joint,
        tips: vec![],
    };
    Skeleton::new(joints.into_iter().enumerate().map(joint).collect()).expect("parents come first")
}

/// Every joint swings to and fro; every twelfth of a second of the clip's joints is off for a frame somewhere.
fn clip(frames: usize, size: f64) -> Clip {
    let times = Times::Even { step_secs: 1.0 / RATE, count: frames };
    let tracks = (0..JOINTS).map(|joint| {
        let keys: Vec<Rotor> = (0..frames)
            .map(|frame| {
                let (t, j) = (frame as f64 / RATE, joint as f64);
                let spike = if (frame + 577 * joint) % 4500 == 2000 { 0.9 } else { 0.0 };
                Rotor::from_plane_angles(Bivector::new(
                    0.5 * (1.1 * t + j).sin() + spike,
                    0.3 * (0.7 * t + 0.3 * j).cos(),
                    0.4 * (TAU * 0.05 * t + j).sin(),
                ))
            })
            .collect();
        let rotation = Some(RotationTrack::from_rotors(times.clone(), keys));
        Arc::new(JointTracks { rotation, ..JointTracks::default() })
    });
    Clip {
        name: "long".to_owned(),
        joints: tracks.collect(),
        skeleton: Arc::new(skeleton(size)),
        duration_secs: (frames - 1) as f64 / RATE,
        grid: FrameGrid { times, rate: RATE },
    }
}

/// A file with that clip, as if it had been read.
fn source(name: &str, frames: usize, size: f64) -> Arc<Source> {
    let short = bvh::from_clip(&clip(2, size)).0;
    let mut source =
        open_bytes(Path::new(name), short, &OpenOptions::default()).expect("what was written reads");
    source.clips = vec![Arc::new(clip(frames, size))];
    Arc::new(source)
}

/// What a person does.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Doing {
    Scrubbing,
    Playing,
    DraggingKey,
    ScrubbingRetarget,
    DraggingContact,
}

/// Each length is measured in so many rounds of so many frames.
const ROUNDS: usize = 7;
const FRAMES_A_ROUND: usize = 40;

/// Frames of one length, round by round.
#[derive(Clone, Debug, Default)]
struct Tally {
    /// The middle frame of each round.
    middles: Vec<Cost>,
    frames: Vec<Duration>,
}

impl Tally {
    fn add(&mut self, mut round: Vec<Cost>) {
        round.sort_by_key(|cost| cost.sum());
        self.middles.push(round[round.len() / 2]);
        self.middles.sort_by_key(|cost| cost.sum());
        self.frames.extend(round.iter().map(|cost| cost.sum()));
        self.frames.sort();
    }

    /// Milliseconds of the middle frame of each round, rising.
    fn sums(&self) -> Vec<f64> {
        self.middles.iter().map(|cost| ms(cost.sum())).collect()
    }
}

impl fmt::Display for Tally {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (least, middle) = (self.middles[0], self.middles[self.middles.len() / 2]);
        write!(
            f,
            "least round {:.2} ms, middle {:.2} ms (ui {:.2}, tessellation {:.2}, painting {:.2} on one thread), 95 % within {:.2} ms",
            ms(least.sum()),
            ms(middle.sum()),
            ms(middle.ui),
            ms(middle.tessellation),
            ms(middle.painting),
            ms(self.frames[self.frames.len() * 95 / 100])
        )
    }
}

fn ms(time: Duration) -> f64 {
    time.as_secs_f64() * 1e3
}

struct Desk {
    headless: Headless,
    window: Window,
    frame: usize,
    duration_secs: f64,
    pass: PassId,
}

/// Where the time of some frames went.
#[derive(Clone, Copy, Debug, Default)]
struct Cost {
    ui: Duration,
    tessellation: Duration,
    /// All of it on one thread.
    painting: Duration,
}

impl Cost {
    fn sum(self) -> Duration {
        self.ui + self.tessellation + self.painting / 2
    }
}

impl Desk {
    fn new(sources: Vec<Arc<Source>>, size: [f32; 2]) -> Self {
        let size = egui::vec2(size[0], size[1]);
        let mut headless = Headless::new(size, 1.0, 1);
        let mut window = Window::new(headless.context(), Start::Empty);
        let clip = Arc::clone(&sources[0].clips[0]);
        window.show_sources(sources);
        window.ask(Command::CloseDialog);
        window.ask(Command::ChooseJoint(Some(CHOSEN)));
        // Their rooms are shaded behind the curves.
        let limits = learned(&self::clip(60 * RATE as usize, 1.0), &LearnOptions::default());
        assert!(!limits.joints.is_empty(), "there are limits to shade");
        assert!(limits.joints.contains_key(&CHOSEN), "its own among them");
        window.ask(Command::Edit(Edit::SetLimits { work: 0, limits: Some(Arc::new(limits)) }));
        let edits = vec![key_edit(&clip, 0.0)];
        window.ask(Command::Edit(Edit::AddPass { work: 0, step: KeysPass { edits }.into(), at: 0 }));
        rest(&mut headless, &mut window);
        let pass = window.bench().work().expect("a clip").passes[0].id;
        let duration_secs = clip.duration_secs;
        Self { headless, window, frame: 0, duration_secs, pass }
    }

    /// Carries the clip to the other figure, in the sheet for that.
    fn carry(&mut self) {
        self.window.ask(Command::Carry(CarryCommand::Onto(1)));
        rest(&mut self.headless, &mut self.window);
        assert!(self.window.bench().carry_made().is_some(), "it is carried whole");
    }

    /// Asks for what the person does in this frame.
    fn act(&mut self, doing: Doing) -> Vec<egui::Event> {
        self.frame += 1;
        let step = self.frame as f64;
        match doing {
            Doing::Scrubbing | Doing::ScrubbingRetarget => {
                let share = 0.5 + 0.45 * (step * 0.013).sin();
                self.window.ask(Command::Scrub(share * self.duration_secs));
            }
            Doing::Playing => {}
            Doing::DraggingKey => {
                let clip = Arc::clone(self.window.bench().source().expect("a clip"));
                let edits = vec![key_edit(&clip, 0.3 * (step * 0.05).sin())];
                let step: PassStep = KeysPass { edits }.into();
                self.window.ask(Command::PreviewPass(self.pass, Box::new(step)));
            }
            Doing::DraggingContact => {
                let (id, pass) = self.window.bench().carried_pass().expect("a retarget");
                let middle = 0.5 * self.duration_secs;
                let span_secs = [middle, middle + 0.5 + 0.3 * (step * 0.05).sin()];
                let contact = FootContact { side: Side::Left, part: FootPart::Heel, span_secs };
                let pass = RetargetPass { feet: Some(vec![contact]), ..pass };
                self.window.ask(Command::Carry(CarryCommand::Preview(id, Box::new(pass))));
            }
        }
        // The pointer moves as well: hovering is part of each frame.
        let x = 760.0 + 200.0 * (step as f32 * 0.02).sin();
        vec![egui::Event::PointerMoved(egui::pos2(x, 400.0))]
    }

    fn one(&mut self, doing: Doing) -> Cost {
        let events = self.act(doing);
        let start = ThreadTime::now();
        self.headless.frame(&mut self.window, events);
        let ui = start.elapsed();
        let start = ThreadTime::now();
        let meshes = self.headless.tessellate();
        let tessellation = start.elapsed();
        let start = ThreadTime::now();
        std::hint::black_box(self.headless.paint(&meshes));
        Cost { ui, tessellation, painting: start.elapsed() }
    }

    fn start(&mut self, doing: Doing) {
        let is_playing = self.window.bench().session.playback.is_playing;
        if is_playing != (doing == Doing::Playing) {
            self.window.ask(Command::Do(Action::Play));
        }
        for _ in 0..6 {
            self.one(doing);
        }
        assert_eq!(self.window.bench().session.playback.is_playing, doing == Doing::Playing);
    }
}

/// Goes on until nothing is on its way.
fn rest(headless: &mut Headless, window: &mut Window) {
    let start = Instant::now();
    loop {
        headless.frame(window, Vec::new());
        if !window.is_busy() && window.bench().curves.is_some() && !headless.wants_more() {
            break;
        }
        assert!(start.elapsed() < Duration::from_mins(20), "the window never comes to rest");
        std::thread::sleep(Duration::from_millis(5));
    }
}

/// The key in the middle of the chosen joint, turned a little more.
fn key_edit(clip: &Clip, by: f64) -> KeyEdit {
    let secs = clip.grid.time(clip.grid.count() / 2);
    let turn = Rotor::from_plane_angles(Bivector::new(0.2 + by, 0.1, 0.0));
    KeyEdit { joint: CHOSEN, change: KeyChange::Set(vec![(secs, turn)]) }
}

fn main() {
    let is_test = std::env::args().any(|argument| argument == "--test");
    let only = std::env::var("FRAMES").ok().and_then(|frames| frames.parse().ok());
    let lengths: Vec<usize> = match only {
        Some(frames) => vec![frames],
        None if is_test => vec![600],
        None => vec![36_000, 432_000],
    };
    let mut criterion: Criterion<CpuTime> =
        Criterion::default().with_measurement(CpuTime).configure_from_args();
    let sources: Vec<Vec<Arc<Source>>> = lengths
        .iter()
        .map(|&frames| vec![source("long.bvh", frames, 1.0), source("smaller.bvh", 2, 0.7)])
        .collect();
    let rounds = if is_test { 1 } else { ROUNDS };
    for size in [[1440.0, 900.0], [2560.0, 1440.0]] {
        let mut desks: Vec<Desk> = sources.iter().map(|own| Desk::new(own.clone(), size)).collect();
        for (desk, frames) in desks.iter().zip(&lengths) {
            println!("{frames} frames: {} snags", desk.window.bench().snags().len());
        }
        for doing in [
            Doing::Scrubbing,
            Doing::Playing,
            Doing::DraggingKey,
            Doing::ScrubbingRetarget,
            Doing::DraggingContact,
        ] {
            let is_on_bench = matches!(doing, Doing::Scrubbing | Doing::Playing | Doing::DraggingKey);
            let shown = if is_on_bench { desks.len() } else { 1 };
            if doing == Doing::ScrubbingRetarget {
                desks[0].carry();
            }
            let what = format!("{doing:?} {} × {}", size[0], size[1]);
            let mut tallies = vec![Tally::default(); shown];
            // In turn, so that what else the machine does meets all lengths alike.
            for _ in 0..rounds {
                for (desk, tally) in desks.iter_mut().zip(&mut tallies) {
                    desk.start(doing);
                    tally.add((0..FRAMES_A_ROUND).map(|_| desk.one(doing)).collect());
                }
            }
            for (tally, frames) in tallies.iter().zip(&lengths) {
                println!("{frames} frames, {what}: {tally}");
            }
            for (tally, frames) in tallies.iter().zip(&lengths).skip(1) {
                let [least, middle] =
                    [0, rounds / 2].map(|place| tally.sums()[place] / tallies[0].sums()[place]);
                println!(
                    "   {frames} over {}: {least:.2} of the time by the least rounds, {middle:.2} by the middle ones",
                    lengths[0]
                );
            }
            for (desk, frames) in desks.iter_mut().zip(&lengths).take(shown) {
                let mut group = criterion.benchmark_group(format!("{frames} frames"));
                group
                    .sample_size(10)
                    .warm_up_time(Duration::from_millis(200))
                    .measurement_time(Duration::from_secs(1));
                group.bench_function(&what, |bencher| {
                    bencher.iter_custom(|n| (0..n).map(|_| desk.one(doing).sum()).sum());
                });
                group.finish();
            }
        }
    }
    criterion.final_summary();
}

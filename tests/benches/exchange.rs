//! How fast are motion numbers read and written, and how long does a whole file take to open?
//!
//! `cargo bench --no-default-features --bench exchange` prints the median of many runs, in nanoseconds a number, with the
//! standard library on the same numbers in the same run; with `--test` everything runs once on little.
#![expect(clippy::print_stdout, reason = "the numbers are what a bench is for")]

use std::fmt::Write as _;
use std::hint::black_box;
use std::io::Write as _;
use std::path::Path;
use std::time::Instant;

use turnwright::exchange::decimal::{push_six_decimals, shorts};
use turnwright::exchange::{OpenOptions, bvh, gltf, open_bytes};

const JOINTS: usize = 60;

fn main() {
    let is_test = std::env::args().any(|argument| argument == "--test");
    let (frames, runs) = if is_test { (20, 1) } else { (6_000, 21) };
    let values = values(frames * (3 + 3 * JOINTS));
    let text = bvh_text(&values);
    let start = text.find("Frame Time: 0.008333333\n").expect("it was just written") + 23;
    let motion = &text.as_bytes()[start..];
    println!("{} numbers, {:.1} bytes each", values.len(), motion.len() as f64 / values.len() as f64);

    let mut own = Vec::with_capacity(values.len());
    let mut standard = Vec::with_capacity(values.len());
    let n = values.len();
    let [ours, std_parse] = medians(
        runs,
        n,
        [
            &mut || {
                own.clear();
                black_box(shorts(black_box(motion), 0, &mut own));
            },
            &mut || {
                standard.clear();
                let text = std::str::from_utf8(black_box(motion)).expect("ASCII");
                standard.extend(text.split_whitespace().map(|word| word.parse::<f64>().expect("a number")));
            },
        ],
    );
    assert!(own.iter().map(|v| v.to_bits()).eq(standard.iter().map(|v| v.to_bits())), "not bit-equal");
    report("read: ours", ours, "split_whitespace and str::parse", std_parse);

    let (mut bytes, mut standard) = (Vec::with_capacity(16 * n), Vec::with_capacity(16 * n));
    let [ours, std_write] = medians(
        runs,
        n,
        [
            &mut || {
                bytes.clear();
                for &value in black_box(&values) {
                    push_six_decimals(value, &mut bytes);
                    bytes.push(b' ');
                }
            },
            &mut || {
                standard.clear();
                for &value in black_box(&values) {
                    write!(standard, "{value:.6} ").expect("a Vec takes all");
                }
            },
        ],
    );
    assert!(bytes == standard, "not the same text");
    report("write: ours", ours, "{:.6}", std_write);

    let path = Path::new("bench.bvh");
    let file = text.as_bytes().to_vec();
    let [parse, read, open] = medians(
        runs,
        n,
        [
            &mut || {
                own.clear();
                black_box(shorts(black_box(motion), 0, &mut own));
            },
            &mut || drop(black_box(bvh::read(black_box(&file), "bench").expect("it reads"))),
            &mut || {
                drop(black_box(open_bytes(path, file.clone(), &OpenOptions::default()).expect("it opens")));
            },
        ],
    );
    report("bvh::read, turns made", read, "its numbers alone", parse);
    report("open_bytes, hash and copy of the bytes too", open, "its numbers alone", parse);
    report("open_bytes", open, "split_whitespace and str::parse of its numbers", std_parse);

    let (_, clip, _) = bvh::read(&file, "bench").expect("it reads");
    let glb = gltf::from_clip(&clip, "bench").expect("it is written").bytes;
    println!("a .glb of {:.1} MB:", glb.len() as f64 / 1e6);
    let [copy, read] = medians(
        runs,
        n,
        [&mut || drop(black_box(glb.clone())), &mut || {
            let no_files = |_: &str| Err(String::new());
            drop(black_box(gltf::read(black_box(&glb[..]), "bench", &no_files).expect("it reads")));
        }],
    );
    report("gltf::read", read, "one copy of the bytes", copy);
}

/// Angles and lengths with six decimals of their own.
fn values(n: usize) -> Vec<f64> {
    let mut noise = 1_u64;
    let mut next = || {
        noise = noise.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        let share = (noise >> 33) as f64 / (1_u64 << 31) as f64;
        let value = (share - 0.5) * 360.0;
        (value * 1e6).round() / 1e6
    };
    (0..n).map(|_| next()).collect()
}

fn bvh_text(values: &[f64]) -> String {
    let mut text = "HIERARCHY\n".to_owned();
    let channels = "Zrotation Xrotation Yrotation";
    for joint in 0..JOINTS {
        let (word, own) = match joint {
            0 => ("ROOT", format!("6 Xposition Yposition Zposition {channels}")),
            _ => ("JOINT", format!("3 {channels}")),
        };
        let _ = writeln!(text, "{word} joint{joint}\n{{\nOFFSET 0 10 0\nCHANNELS {own}");
    }
    text += "End Site\n{\nOFFSET 0 10 0\n}\n";
    text += &"}\n".repeat(JOINTS);
    let columns = 3 + 3 * JOINTS;
    let _ = write!(text, "MOTION\nFrames: {}\nFrame Time: 0.008333333\n", values.len() / columns);
    for row in values.chunks_exact(columns) {
        for (column, value) in row.iter().enumerate() {
            let gap = if column == 0 { "" } else { " " };
            let _ = write!(text, "{gap}{value:.6}");
        }
        text.push('\n');
    }
    text
}

/// Nanoseconds a number, of each task the median of its runs; the tasks take turns, so that a busy machine is fair.
fn medians<const N: usize>(runs: usize, numbers: usize, mut tasks: [&mut dyn FnMut(); N]) -> [f64; N] {
    let mut nanos = [const { Vec::new() }; N];
    for _ in 0..runs {
        for (task, nanos) in tasks.iter_mut().zip(&mut nanos) {
            let start = Instant::now();
            task();
            nanos.push(start.elapsed().as_secs_f64() * 1e9 / numbers as f64);
        }
    }
    nanos.map(|mut nanos| {
        nanos.sort_by(f64::total_cmp);
        nanos[nanos.len() / 2]
    })
}

fn report(what: &str, own: f64, peer: &str, other: f64) {
    println!("{what}: {own:.1} ns a number; {peer}: {other:.1} ns; ratio {:.2}", other / own);
}

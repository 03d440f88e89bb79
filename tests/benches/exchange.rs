//! How fast are motion numbers read and written, and how long does a whole file take to open?
//!
//! `cargo bench --no-default-features --bench exchange`. One thread, time of the processor, a number an element; the peer is
//! the standard library on the same numbers.

mod cpu_time;

use std::fmt::Write as _;
use std::hint::black_box;
use std::io::Write as _;
use std::path::Path;
use std::time::Duration;

use ::cpu_time::ThreadTime;
use cpu_time::CpuTime;
use criterion::{BatchSize, Throughput, criterion_group};
use turnwright::exchange::decimal::{push_six_decimals, shorts};
use turnwright::exchange::{OpenOptions, bvh, gltf, open_bytes};

type Criterion = criterion::Criterion<CpuTime>;

const JOINTS: usize = 60;
const FRAMES: usize = 6000;
const COLUMNS: usize = 3 + 3 * JOINTS;

/// Angles and lengths with six decimals of their own.
fn values() -> Vec<f64> {
    let mut noise = 1_u64;
    let mut next = || {
        noise = noise.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        let share = (noise >> 33) as f64 / (1_u64 << 31) as f64;
        let value = (share - 0.5) * 360.0;
        (value * 1e6).round() / 1e6
    };
    (0..FRAMES * COLUMNS).map(|_| next()).collect()
}

/// A file of these numbers, and where they begin in it.
fn bvh_text(values: &[f64]) -> (String, usize) {
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
    let _ = write!(text, "MOTION\nFrames: {}\nFrame Time: 0.008333333", values.len() / COLUMNS);
    let start = text.len();
    text.push('\n');
    for row in values.chunks_exact(COLUMNS) {
        for (column, value) in row.iter().enumerate() {
            let gap = if column == 0 { "" } else { " " };
            let _ = write!(text, "{gap}{value:.6}");
        }
        text.push('\n');
    }
    (text, start)
}

fn read(c: &mut Criterion) {
    let values = values();
    let (text, start) = bvh_text(&values);
    let motion = &text.as_bytes()[start..];
    let n = values.len();
    let (mut own, mut standard) = (Vec::with_capacity(n), Vec::with_capacity(n));
    let mut group = c.benchmark_group("read");
    group.throughput(Throughput::Elements(n as u64));
    group.bench_function("split_whitespace and str::parse", |b| {
        b.iter(|| {
            standard.clear();
            let text = std::str::from_utf8(black_box(motion)).expect("ASCII");
            standard.extend(text.split_whitespace().map(|word| word.parse::<f64>().expect("a number")));
        });
    });
    group.bench_function("its numbers", |b| {
        b.iter(|| {
            own.clear();
            black_box(shorts(black_box(motion), 0, usize::MAX, &mut own));
        });
    });
    // As whoever opens a file has to: nothing is there yet to put them into.
    group.bench_function("its numbers into a new list", |b| {
        let numbers = || {
            let mut values = Vec::with_capacity(n);
            shorts(black_box(motion), 0, usize::MAX, &mut values);
            values
        };
        b.iter_batched(|| (), |()| numbers(), BatchSize::PerIteration);
    });
    let is_whole = own.len() == standard.len();
    assert!(
        is_whole && own.iter().map(|v| v.to_bits()).eq(standard.iter().map(|v| v.to_bits())),
        "not bit-equal"
    );
    let file = text.as_bytes();
    group.bench_function("bvh::read", |b| {
        let read = |bytes: Vec<u8>| bvh::read(bytes, "bench").expect("it reads");
        b.iter_batched(|| file.to_vec(), read, BatchSize::PerIteration);
    });
    group.bench_function("open_bytes of a BVH file", |b| {
        let path = Path::new("bench.bvh");
        let open = |bytes: Vec<u8>| open_bytes(path, bytes, &OpenOptions::default()).expect("it opens");
        b.iter_batched(|| file.to_vec(), open, BatchSize::PerIteration);
    });
    group.finish();
}

fn write(c: &mut Criterion) {
    let values = values();
    let n = values.len();
    let (mut own, mut standard) = (Vec::with_capacity(16 * n), Vec::with_capacity(16 * n));
    let mut group = c.benchmark_group("write");
    group.throughput(Throughput::Elements(n as u64));
    group.bench_function("{:.6}", |b| {
        b.iter(|| {
            standard.clear();
            for &value in black_box(&values) {
                write!(standard, "{value:.6} ").expect("a Vec takes all");
            }
        });
    });
    group.bench_function("ours", |b| {
        b.iter(|| {
            own.clear();
            for &value in black_box(&values) {
                push_six_decimals(value, &mut own);
                own.push(b' ');
            }
        });
    });
    assert!(own == standard, "not the same text");
    group.finish();
}

/// What is opened of a GLB that is nearly all mesh.
fn glb(c: &mut Criterion) {
    let (text, _) = bvh_text(&values()[..200 * COLUMNS]);
    let (_, clip, _) = bvh::read(text.as_bytes(), "bench").expect("it reads");
    let small = gltf::from_clip(&clip, "bench").expect("it is written").bytes;
    let large = with_mesh(&small, 50 << 20);
    let mut group = c.benchmark_group("a .glb of 50 MB of mesh");
    group.throughput(Throughput::Bytes(large.len() as u64));
    group.bench_function("one copy of it", |b| {
        b.iter_batched(|| (), |()| black_box(&large).clone(), BatchSize::PerIteration);
    });
    let read = |bytes: Vec<u8>| gltf::read(bytes, "bench", &|_| Err(String::new())).expect("it reads");
    group.bench_function("gltf::read", |b| {
        b.iter_batched(|| large.clone(), read, BatchSize::PerIteration);
    });
    group.bench_function("gltf::read without the mesh", |b| {
        b.iter_batched(|| small.clone(), read, BatchSize::PerIteration);
    });
    group.finish();
}

/// A GLB with `n` more bytes in its binary chunk, as a view that no animation uses.
fn with_mesh(glb: &[u8], n: usize) -> Vec<u8> {
    let word = |at: usize| u32::from_le_bytes(*glb[at..].first_chunk().expect("four bytes")) as usize;
    let (json_len, bin_start) = (word(12), 20 + word(12));
    let mut json: serde_json::Value = serde_json::from_slice(&glb[20..20 + json_len]).expect("JSON");
    let old = word(bin_start);
    json["buffers"][0]["byteLength"] = (old + n).into();
    let view = serde_json::json!({ "buffer": 0, "byteOffset": old, "byteLength": n });
    json["bufferViews"].as_array_mut().expect("views").push(view);
    let mut text = json.to_string().into_bytes();
    text.resize(text.len().next_multiple_of(4), b' ');
    let mut large = Vec::with_capacity(28 + text.len() + old + n);
    large.extend_from_slice(b"glTF\x02\0\0\0");
    large.extend_from_slice(&((28 + text.len() + old + n) as u32).to_le_bytes());
    large.extend_from_slice(&(text.len() as u32).to_le_bytes());
    large.extend_from_slice(b"JSON");
    large.extend_from_slice(&text);
    large.extend_from_slice(&((old + n) as u32).to_le_bytes());
    large.extend_from_slice(b"BIN\0");
    large.extend_from_slice(&glb[bin_start + 8..bin_start + 8 + old]);
    large.resize(large.len() + n, 7);
    large
}

criterion_group! {
    name = benches;
    config = criterion::Criterion::default()
        .with_measurement(CpuTime)
        .sample_size(15)
        .warm_up_time(Duration::from_millis(300))
        .measurement_time(Duration::from_secs(3));
    targets = read, write, glb
}

/// The least processor time of each job a number, in nanoseconds; the jobs take turns, so that what else the machine does meets them
/// alike.
fn least_ns<const N: usize>(
    rounds: usize,
    numbers: usize,
    mut jobs: [&mut dyn FnMut() -> Duration; N],
) -> [f64; N] {
    let mut least = [Duration::MAX; N];
    for _ in 0..rounds {
        for (least, job) in least.iter_mut().zip(&mut jobs) {
            *least = job().min(*least);
        }
    }
    least.map(|time| time.as_nanos() as f64 / numbers as f64)
}

/// What the issue asks for, as ratios.
#[expect(clippy::print_stdout, reason = "a bench tells what it found")]
fn ratios(rounds: usize) {
    let values = values();
    let (text, start) = bvh_text(&values);
    let (file, motion, n) = (text.as_bytes(), &text.as_bytes()[start..], values.len());
    let timed = |job: &mut dyn FnMut()| {
        let start = ThreadTime::now();
        job();
        start.elapsed()
    };
    let (mut own, mut standard) = (Vec::with_capacity(n), Vec::with_capacity(n));
    let [by_standard, by_us, by_us_anew, read, open] = least_ns(
        rounds,
        n,
        [
            &mut || {
                timed(&mut || {
                    standard.clear();
                    let text = std::str::from_utf8(black_box(motion)).expect("ASCII");
                    standard
                        .extend(text.split_whitespace().map(|word| word.parse::<f64>().expect("a number")));
                })
            },
            &mut || {
                timed(&mut || {
                    own.clear();
                    black_box(shorts(black_box(motion), 0, usize::MAX, &mut own));
                })
            },
            &mut || {
                let mut made = Vec::new();
                timed(&mut || {
                    made = Vec::with_capacity(n);
                    shorts(black_box(motion), 0, usize::MAX, &mut made);
                })
            },
            &mut || {
                let (mut bytes, mut made) = (file.to_vec(), None);
                timed(&mut || made = bvh::read(std::mem::take(&mut bytes), "bench").ok())
            },
            &mut || {
                let (mut bytes, mut made) = (file.to_vec(), None);
                let options = OpenOptions::default();
                timed(&mut || {
                    made = open_bytes(Path::new("bench.bvh"), std::mem::take(&mut bytes), &options).ok();
                })
            },
        ],
    );
    let (mut own, mut standard) = (Vec::with_capacity(16 * n), Vec::with_capacity(16 * n));
    let [by_format, by_us_written] = least_ns(
        rounds,
        n,
        [
            &mut || {
                timed(&mut || {
                    standard.clear();
                    for &value in black_box(&values) {
                        write!(standard, "{value:.6} ").expect("a Vec takes all");
                    }
                })
            },
            &mut || {
                timed(&mut || {
                    own.clear();
                    for &value in black_box(&values) {
                        push_six_decimals(value, &mut own);
                        own.push(b' ');
                    }
                })
            },
        ],
    );
    println!(
        "ns a number, least of {rounds} rounds in which the jobs take turns, processor time of one thread"
    );
    println!(
        "read numbers: standard library {by_standard:.1}, ours {by_us:.1}: {:.2} (2.2 is asked)",
        by_standard / by_us
    );
    println!("  into a new list {by_us_anew:.1}");
    println!(
        "write six decimals: standard library {by_format:.1}, ours {by_us_written:.1}: {:.2} (6 is asked)",
        by_format / by_us_written
    );
    for (what, time) in [("bvh::read", read), ("open_bytes", open)] {
        println!(
            "{what} {time:.1}: {:.2} times its numbers, {:.2} into a new list, {:.2} by the standard library (2 is asked)",
            time / by_us,
            time / by_us_anew,
            time / by_standard
        );
    }
}

fn main() {
    let is_test = std::env::args().any(|argument| argument == "--test");
    ratios(if is_test { 1 } else { 25 });
    benches();
    criterion::Criterion::default().configure_from_args().final_summary();
}

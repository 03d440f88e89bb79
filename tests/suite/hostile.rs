//! A hundred thousand damaged files of every format: opened, written back, written into other formats, with no panic, no
//! hang and no memory beyond 8 times the file and 64 MB.
//!
//! The work runs in a process of its own, so that its memory is not that of the tests beside it, and a hang can be told.

use std::fmt::Write as _;
use std::io::Write as _;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::time::{Duration, Instant};

use serde_json::{Value, json};
use turnwright::clip::Clip;
use turnwright::exchange::csv::{CsvOptions, TimeUnit};
use turnwright::exchange::{Guard, OpenOptions, Source, csv, disk, encode, open_bytes, ron, write};
use turnwright::mend::{SurveyOptions, survey};
use turnwright::rotor::Rotor;
use turnwright::scene::{Evaluator, NoOthers};
use turnwright::snag::{SnagKind, Unwatched};

use crate::gltf_broken::{self, Dice};

/// Files that are made and opened.
const FILES: usize = 100_000;
/// Set in the process that does the work; holds the first file's number and the one after the last.
const TASK: &str = "TURNWRIGHT_HOSTILE_FILES";
/// Nothing of a few kilobytes may take this long, on a machine that is busy with much else.
const LONGEST: Duration = Duration::from_secs(20);
/// What any file may take beyond 8 times its own size.
const SPARE_BYTES: u64 = 64 << 20;

const BVH: &str = "HIERARCHY\nROOT Hips\n{\n\tOFFSET 0 90 0\n\tCHANNELS 6 Xposition Yposition Zposition Zrotation Xrotation Yrotation\n\
    \tJOINT Leg\n\t{\n\t\tOFFSET 10 -40 0\n\t\tCHANNELS 3 Zrotation Xrotation Yrotation\n\t\tEnd Site\n\t\t{\n\t\t\tOFFSET 0 -40 5\n\t\t}\n\t}\n}\n\
    MOTION\nFrames: 3\nFrame Time: 0.04\n1 2 3 10 20 30 -4 -5 -6\n1.5 2.5 3.5 11 21 31 -4.5 -5.5 -6.5\n1.6 2.6 3.6 12 22 32 -5 -6 -7\n";
const BVH_ODD: &str = "\u{feff}hierarchy\r\n# made by hand\r\nRoot two words {\r\nOFFSET 0,5 1,5 0\r\nCHANNELS 4 Yrotation Xposition Zrotation Yrotation\r\n\
    JOINT a { OFFSET 0 1 0 CHANNELS 1 Xrotation JOINT b { CHANNELS 0 } JOINT b { OFFSET 1 2 3 CHANNELS 2 XROTATION zposition End Site foot { OFFSET 0 0 1 } } } }\r\n\
    MOTION\r\nFrame  Time : 0,0333\r\nframes :2\r\n1,5-2,5 3 nan 5 1e-3 -,5\r\n4,25 5\r\n+6 1.#QNAN 8 -9 10\r\n";
const CSV: &str = "# joint hip parent - offset 0 1 0\n# joint leg parent hip offset 0 -0.5 0\n\
    time,hip.tx,hip.ty,hip.tz,hip.qw,hip.qx,hip.qy,hip.qz,leg.z,leg.x,leg.y,head.yz,head.zx,head.xy\n\
    0,1,2,3,1,0,0,0,10,20,30,0,0,90\n0.25,1.5,2,3,0.6,0,0.8,0,11,21,31,0,45,0\n1,2,2,3,0,-1,0,0,12,22,32,30,0,0\n";
const CSV_SENSOR: &str = "\"Time (s)\",W,X,Y,Z,\"battery, volts\"\r\n1000,1,0,0,0,3.3\r\n1010.5,0.6,0,0.8,0,\"3.2\"\r\n1012,,nan,0,1,3.2\r\n\
    1023,1,0,0,0,3\r\n1033.5,1,0,0.1,0,3\r\n1044,1,0,0,0.1,3\r\n";
const CSV_BONES: &str = "joint,parent,offset.x,offset.y,offset.z\nhip,,0,1,0\nleg,hip,0,-0.5,0\n";
const SCENE: &str = "(turnwright_scene: 1, sources: [(path: \"walk.bvh\", sha256: \"00\")], clips: [(source: 0, clip: 0, name: \"walk\", passes: [\
    (id: 4, on: true, step: Mend(kind: \"half-turn\", amount: 0.5, snags: [(joint: \"Leg\", joint_index: 1, keys: (1, 1), frames: (1, 1), seconds: (0.04, 0.04), \
    size_deg: 171.5, confidence: 0.75, remedy: TakeOut(0.0, 0.6, 0.0, 0.8), safe: true, text: \"Leg flips\")])), \
    (id: 5, on: true, step: Mend(kind: \"spike\", amount: 1.0, snags: [(joint: \"Hips\", joint_index: 0, keys: (1, 2), frames: (1, 2), seconds: (0.04, 0.08), \
    size_deg: 30.0, confidence: 1.0, remedy: Redraw, safe: true, text: \"x\"), (joint: \"Hips\", joint_index: 0, keys: (2, 2), frames: (2, 2), seconds: (0.08, 0.08), \
    size_deg: 360.0, confidence: 1.0, remedy: Unwrap(1, 0, -1), safe: true, text: \"y\")]))], \
    left: [(kind: \"wrap\", joint: \"Leg\", joint_index: 1, keys: (1, 2))])])\n";

/// A sound file from which damaged ones are made.
pub(crate) struct Seed {
    /// Its name; the extension gives the format.
    pub(crate) name: &'static str,
    pub(crate) bytes: Vec<u8>,
    /// The document of a text glTF, whose values are swapped as values.
    json: Option<Value>,
    /// Damaged files that are made of it, out of 100.
    share: usize,
}

pub(crate) fn seeds() -> Vec<Seed> {
    let text = |name, text: &str, share| Seed { name, bytes: text.as_bytes().to_vec(), json: None, share };
    let small = gltf_broken::small();
    let json = |name, document: Value, share| Seed {
        name,
        bytes: document.to_string().into_bytes(),
        json: Some(document),
        share,
    };
    vec![
        json("small.gltf", small.clone(), 17),
        json("forms.gltf", other_forms(small), 13),
        Seed { name: "small.glb", bytes: gltf_broken::small_glb(), json: None, share: 20 },
        text("usual.bvh", BVH, 12),
        text("odd.bvh", BVH_ODD, 10),
        text("kinds.csv", CSV, 9),
        text("sensor.csv", CSV_SENSOR, 6),
        text("bones.csv", CSV_BONES, 3),
        text("scene.ron", SCENE, 10),
    ]
}

/// Another document: whole-number and smooth keys, a node with a matrix, a pointer channel, things nobody knows.
fn other_forms(mut document: Value) -> Value {
    document["nodes"][0]["matrix"] = json!([0, 2, 0, 0, -2, 0, 0, 0, 0, 0, 2, 0, 5, 6, 7, 1]);
    document["skins"][0]["skeleton"] = json!(2);
    document["accessors"].as_array_mut().expect("a list").extend([
        json!({ "bufferView": 1, "componentType": 5122, "normalized": true, "count": 3, "type": "VEC4" }),
        json!({ "componentType": 5126, "count": 3, "type": "VEC4" }),
        json!({ "bufferView": 0, "componentType": 5126, "count": 1, "type": "SCALAR" }),
    ]);
    document["animations"] = json!([
        {
            "name": "walk",
            "channels": [
                { "sampler": 0, "target": { "node": 2, "path": "rotation" } },
                { "sampler": 1, "target": { "node": 1, "path": "rotation" } },
                { "sampler": 2, "target": { "node": 1, "path": "scale" } },
                { "sampler": 2, "target": { "path": "pointer", "extensions": { "KHR_animation_pointer": { "pointer": "/a" } } } },
            ],
            "samplers": [
                { "input": 0, "output": 3 },
                { "input": 5, "output": 1, "interpolation": "CUBICSPLINE" },
                { "input": 0, "output": 2, "interpolation": "LINEAR" },
            ],
        },
        {
            "channels": [{ "sampler": 0, "target": { "node": 0, "path": "rotation" } }],
            "samplers": [{ "input": 0, "output": 4, "extras": { "deep": [[[[{}]]]] } }],
        },
    ]);
    document
}

/// Numbers that a reader may trip over.
const NUMBERS: [&str; 22] = [
    "0",
    "-1",
    "1",
    "2",
    "255",
    "65536",
    "1000000",
    "100000000",
    "2147483648",
    "4000000000",
    "4294967295",
    "9007199254740993",
    "18446744073709551616",
    "1e9",
    "1e38",
    "1e300",
    "1e999",
    "-1e-320",
    "0.5",
    "1e-9",
    "NaN",
    "-inf",
];

/// Damages a file in one to four places. The same number makes the same file.
fn damaged(seed: &Seed, others: &[Seed], dice: &mut Dice) -> Vec<u8> {
    let mut bytes = match &seed.json {
        Some(document) if dice.below(2) == 0 => {
            let mut document = document.clone();
            for _ in 0..=dice.below(3) {
                swap_values(&mut document, dice);
            }
            document.to_string().into_bytes()
        }
        _ => seed.bytes.clone(),
    };
    for _ in 0..dice.below(4) {
        damage(&mut bytes, others, dice);
    }
    bytes
}

pub(crate) fn damage(bytes: &mut Vec<u8>, others: &[Seed], dice: &mut Dice) {
    if bytes.is_empty() {
        return;
    }
    let at = dice.below(bytes.len());
    let end = at + dice.below((bytes.len() - at).min(200)) + 1;
    match dice.below(14) {
        0 | 1 => bytes[at] ^= 1 << dice.below(8),
        2 => bytes[at] = dice.below(256) as u8,
        3 => bytes.truncate(at),
        4 => drop(bytes.drain(at..end)),
        // A part once more, or many times.
        5 => {
            let part = bytes[at..end].repeat(1 + dice.below(2) * dice.below(20));
            bytes.splice(end..end, part);
        }
        // A part of another file.
        6 => {
            let other = &others[dice.below(others.len())].bytes;
            let from = dice.below(other.len());
            let to = from + dice.below((other.len() - from).min(300));
            bytes.splice(at..end, other[from..to].iter().copied());
        }
        7 => {
            let other = dice.below(bytes.len());
            bytes.swap(at, other);
        }
        // Four bytes of a count, a length or a float.
        8 => {
            let word = [0_u32, 1, 0x7F80_0000, 0x7F7F_FFFF, 0x7FFF_FFFF, 0x8000_0000, 0xEE6B_2800, u32::MAX]
                [dice.below(8)];
            let at = at / 4 * 4;
            for (byte, new) in bytes.iter_mut().skip(at).zip(word.to_le_bytes()) {
                *byte = new;
            }
        }
        // The number at or after this place.
        _ => {
            let is_of_number = |byte: &u8| byte.is_ascii_digit() || matches!(byte, b'.' | b'-');
            let Some(start) = bytes[at..].iter().position(is_of_number).map(|offset| at + offset) else {
                return;
            };
            let length =
                bytes[start..].iter().position(|byte| !is_of_number(byte)).unwrap_or(bytes.len() - start);
            bytes.splice(start..start + length, NUMBERS[dice.below(NUMBERS.len())].bytes());
        }
    }
}

/// Puts one value of a JSON document in the place of another, or something else altogether.
fn swap_values(document: &mut Value, dice: &mut Dice) {
    let mut places = Vec::new();
    pointers(document, String::new(), &mut places);
    let target = places[dice.below(places.len())].clone();
    let new = match dice.below(4) {
        0 => [Value::Null, json!(true), json!([]), json!({}), json!(""), json!("../../x"), json!(-1)]
            [dice.below(7)]
        .clone(),
        1 => serde_json::from_str(NUMBERS[dice.below(16)]).unwrap_or(Value::Null),
        2 => json!(dice.below(6)),
        _ => document.pointer(&places[dice.below(places.len())]).cloned().unwrap_or(Value::Null),
    };
    if let Some(place) = document.pointer_mut(&target) {
        *place = new;
    }
}

fn pointers(value: &Value, own: String, places: &mut Vec<String>) {
    match value {
        Value::Array(items) => {
            for (index, item) in items.iter().enumerate() {
                pointers(item, format!("{own}/{index}"), places);
            }
        }
        Value::Object(members) => {
            for (key, item) in members {
                pointers(item, format!("{own}/{key}"), places);
            }
        }
        _ => {}
    }
    places.push(own);
}

/// The damaged file of a number.
fn file(seeds: &[Seed], number: usize) -> (&Seed, Vec<u8>) {
    let mut left = number % seeds.iter().map(|seed| seed.share).sum::<usize>();
    let is_it = |seed: &&Seed| left.checked_sub(seed.share).map(|rest| left = rest).is_none();
    let seed = seeds.iter().find(is_it).expect("the shares are all of it");
    let mut dice = Dice::new(number as u64);
    (seed, damaged(seed, seeds, &mut dice))
}

/// Opens a file, and does with it what the program does. Gives whether it could be read.
fn handle(seed: &Seed, bytes: &[u8], number: usize) -> bool {
    if seed.name == "scene.ron" {
        return handle_scene(bytes);
    }
    if seed.name == "bones.csv" {
        let Ok(bones) = csv::hierarchy(bytes) else { return false };
        let csv = CsvOptions { hierarchy: Some(bones), ..CsvOptions::default() };
        let header_and_rows = CSV.split_inclusive('\n').skip(2).collect::<String>();
        let path = Path::new("nowhere/kinds.csv");
        return open_bytes(path, header_and_rows.into_bytes(), &OpenOptions { csv, rest: None }).is_ok();
    }
    let path = Path::new("nowhere").join(seed.name);
    let time_unit = [None, Some(TimeUnit::Microseconds)][number % 2];
    let options = OpenOptions { csv: CsvOptions { time_unit, ..CsvOptions::default() }, rest: None };
    let Ok(source) = open_bytes(&path, bytes.to_vec(), &options) else { return false };
    let same = encode(&source, &source.clips, None, &path).expect("what was read can be written");
    assert!(same.bytes == bytes, "a file that nobody touched is given back as it was");
    // Changed, and read again.
    let results: Vec<Arc<Clip>> = source.clips.iter().map(|clip| Arc::new(changed(clip))).collect();
    if let Ok(written) = encode(&source, &results, None, &path) {
        let again = open_bytes(&path, written.bytes, &options);
        assert!(again.is_ok(), "what was written can be read: {again:?}");
    }
    convert(&source, number);
    true
}

/// The clip with another key in the middle of its first turning joint.
fn changed(clip: &Clip) -> Clip {
    let _ = clip.world_at(clip.duration_secs * 0.4);
    let Some(joint) = (0..clip.joints.len()).find(|&joint| clip.rotation(joint).is_some()) else {
        return clip.clone();
    };
    let Some(track) = clip.rotation(joint) else { return clip.clone() };
    let key = Rotor::from_xyzw([0.5, -0.5, 0.5, 0.5]);
    clip.with_rotation(joint, track.with_keys(&[(track.keys.len() / 2, key)]))
}

/// One of the other formats in turn.
fn convert(source: &Source, number: usize) {
    let target = PathBuf::from("nowhere/new").with_extension(["bvh", "csv", "glb", "gltf"][number / 100 % 4]);
    if let Ok(written) = encode(source, &source.clips, None, &target)
        && written.beside.is_none()
    {
        let again = open_bytes(&target, written.bytes, &OpenOptions::default());
        assert!(again.is_ok(), "what was written as {} can be read: {again:?}", target.display());
    }
}

fn handle_scene(bytes: &[u8]) -> bool {
    let Some(scene) =
        std::str::from_utf8(bytes).ok().and_then(|text| ron::from_text(Path::new("x.ron"), text).ok())
    else {
        return false;
    };
    let source =
        open_bytes(Path::new("usual.bvh"), BVH.into(), &OpenOptions::default()).expect("a sound file");
    for work in &scene.document.works {
        let _ = Evaluator::default().evaluate(&source.clips[0], &work.passes, &NoOthers);
    }
    true
}

/// Peak memory of this process in bytes; `None` where the system does not tell.
fn peak_bytes() -> Option<u64> {
    let status = String::from_utf8(disk::read(Path::new("/proc/self/status")).ok()?).ok()?;
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"))?;
    line.trim().strip_suffix("kB")?.trim().parse().ok().map(|kilobytes: u64| kilobytes << 10)
}

/// Makes and handles the files; panics at the first that fails.
#[expect(clippy::print_stdout, reason = "the parent process reads it")]
fn work(first: usize, last: usize) {
    let seeds = seeds();
    for seed in &seeds {
        assert!(handle(seed, &seed.bytes, 0), "{} itself can be read", seed.name);
    }
    let (current, done) = (AtomicUsize::new(first), AtomicUsize::new(0));
    let (mut n_read, mut n_failed) = (0_usize, 0_usize);
    std::thread::scope(|scope| {
        scope.spawn(|| {
            let (mut seen, mut since) = (usize::MAX, Instant::now());
            while done.load(Ordering::Relaxed) == 0 {
                let now = current.load(Ordering::Relaxed);
                if now != seen {
                    (seen, since) = (now, Instant::now());
                }
                if since.elapsed() > LONGEST {
                    println!("file {now} hangs");
                    std::process::abort();
                }
                std::thread::sleep(Duration::from_millis(20));
            }
        });
        let start_bytes = peak_bytes();
        for number in first..last {
            current.store(number, Ordering::Relaxed);
            let (seed, bytes) = file(&seeds, number);
            if let Ok(is_read) = catch_unwind(AssertUnwindSafe(|| handle(seed, &bytes, number))) {
                n_read += usize::from(is_read);
            } else {
                println!("file {number} of {} fails: {}", seed.name, String::from_utf8_lossy(&bytes));
                n_failed += 1;
                if n_failed > 3 {
                    break;
                }
            }
            if number % 8 == 0
                && let (Some(start), Some(peak)) = (start_bytes, peak_bytes())
                && peak - start > SPARE_BYTES
            {
                println!("by file {number} of {} {} MB are used", seed.name, (peak - start) >> 20);
                n_failed += 1;
                break;
            }
        }
        done.store(1, Ordering::Relaxed);
        let peak = peak_bytes().zip(start_bytes).map(|(peak, start)| (peak - start) >> 20);
        println!("{n_read} of {} could still be read, {peak:?} MB at most", last - first);
    });
    assert_eq!(n_failed, 0, "files failed");
    assert!(n_read * 20 > last - first, "too few are still readable to say anything: {n_read}");
}

/// What is to become of a large file.
#[derive(Clone, Copy, PartialEq)]
enum Fate {
    /// It is read or refused.
    Any,
    /// It is read, played, changed and written.
    Read,
    /// It is refused with these words.
    Refused(&'static str),
}

/// A large file that asks for more memory than it has bytes, made when it is its turn.
struct Large {
    /// Its name; the extension gives the format.
    name: &'static str,
    make: Box<dyn Fn() -> Vec<u8>>,
    fate: Fate,
}

/// Text, with a part in it that is repeated until it has its size.
fn repeated(size: usize, before: &str, part: &str, after: &str) -> Vec<u8> {
    let mut text = String::with_capacity(before.len() + size + part.len() + after.len());
    text.push_str(before);
    while text.len() < size {
        text.push_str(part);
    }
    text.push_str(after);
    text.into_bytes()
}

fn large_files() -> Vec<Large> {
    const SIZE: usize = 6 << 20;
    let hierarchy = BVH.split("MOTION").next().unwrap_or_default();
    let any = |name: &'static str, before: String, part: &'static str, after: &'static str| {
        let make = Box::new(move || repeated(SIZE, &before, part, after));
        Large { name, make, fate: Fate::Any }
    };
    let json = |name, before: &str, part, after| {
        any(name, format!("{{\"asset\":{{\"version\":\"2.0\"}},{before}"), part, after)
    };
    let text = |name, before: &str, part, after| any(name, before.to_owned(), part, after);
    let mut all = vec![
        json("children.gltf", "\"nodes\":[{\"children\":[", "0,", "0]}]}"),
        json("nodes.gltf", "\"nodes\":[", "{},", "{}]}"),
        json("animations.gltf", "\"nodes\":[{}],\"animations\":[", "{},", "{}]}"),
        json("accessors.gltf", "\"accessors\":[", "[],", "[]]}"),
        json("extras.gltf", "\"extras\":[", "0,", "0]}"),
        json("deep.gltf", "\"nodes\":", "[", "]"),
        json("deep_extras.gltf", "\"extras\":", "{\"a\":", "}"),
        json("text.gltf", "\"nodes\":[{\"name\":\"", "\\u00e9", "\"}]}"),
        text("joints.bvh", "HIERARCHY\nROOT a {", "JOINT b { OFFSET 0 0 0 ", ""),
        text("siblings.bvh", "HIERARCHY\nROOT a {", "JOINT b { OFFSET 0 0 0 }\n", "}"),
        text("channels.bvh", "HIERARCHY\nROOT a { CHANNELS 4000000000 ", "Xrotation ", "}"),
        any("frames.bvh", format!("{hierarchy}MOTION\nFrames: 4000000000\nFrame Time: 0.01\n"), "0.25 ", ""),
        text("comments.bvh", "HIERARCHY\n", "# x\n", ""),
        text("header.csv", "time", ",", "\n"),
        text("row.csv", "time,a.yz\n0", ",", "\n"),
        text("bones.csv", "", "# joint a parent b offset 0 0 0\n", "time,a.yz\n"),
        text("quotes.csv", "time,\"", "\"\"", "\n"),
        text("one_time.csv", "time,a.x\n", "0,1\n", ""),
        text("open.ron", "", "(", ""),
        text("list.ron", "(turnwright_scene: 1, sources: [", "(path: \"\", sha256: \"\"),", "], clips: [])"),
    ];
    // Numbers as short as numbers can be, in tens of megabytes.
    let cut = Fate::Refused("; cut the file into shorter ones");
    let turns = "Zrotation Xrotation Yrotation";
    let places = "Xposition Yposition Zposition Zrotation Xrotation Yrotation";
    let bvh = |name, channels: &'static str, numbers: &'static str, fate| {
        let make = Box::new(move || short_bvh(SHORT_SIZE, channels, numbers));
        Large { name, make, fate }
    };
    let csv = |name, columns: &'static str, numbers: &'static str, fate| {
        let make = Box::new(move || short_csv(columns, numbers));
        Large { name, make, fate }
    };
    let glb = |name, path: &'static str, component: usize, interpolation: &'static str, fate| {
        let make = Box::new(move || short_glb(path, component, interpolation));
        Large { name, make, fate }
    };
    let bytes = Fate::Refused(" MB of numbers in all animation");
    all.extend([
        bvh("three_turns.bvh", turns, "0 1 2 3 4 5 6 7 8 9 -1 ", Fate::Read),
        bvh("six_channels.bvh", places, "0 9 0 7 5 ", Fate::Read),
        bvh("two_turns.bvh", "Zrotation Xrotation", "0 1 2 3 4 ", Fate::Read),
        bvh("one_turn.bvh", "Yrotation", "0 1 2 3 4 .5 ", Fate::Read),
        bvh("one_place.bvh", "Zposition", "0 1 2 3 4 ", Fate::Read),
        bvh("fractions.bvh", turns, "0 1 2 3 4 5 6 7 8 9 .5 ", cut),
        csv("quaternions.csv", "qx qy qz qw", "0 1 2 3 4 ", Fate::Read),
        csv("three_turns.csv", "z x y", "0 1 2 3 4 ", Fate::Read),
        csv("one_turn.csv", "x", "0 1 2 3 4 .5 ", Fate::Read),
        csv("one_place.csv", "tz", "0 1 2 3 4 ", Fate::Read),
        csv("planes.csv", "yz zx xy", "0 1 2 3 4 ", cut),
        glb("bytes.glb", "rotation", 5120, "LINEAR", Fate::Read),
        glb("shorts.glb", "rotation", 5122, "LINEAR", Fate::Read),
        glb("cubic.glb", "rotation", 5126, "CUBICSPLINE", Fate::Read),
        glb("cubic_bytes.glb", "rotation", 5120, "CUBICSPLINE", bytes),
        glb("places_bytes.glb", "translation", 5120, "LINEAR", bytes),
    ]);
    all
}

/// Bytes of the files of short numbers.
const SHORT_SIZE: usize = 40 << 20;
/// Their joints, each below the one before.
const SHORT_JOINTS: usize = 61;

/// A motion file of such numbers, again and again, with these channels a joint.
fn short_bvh(size: usize, channels: &str, numbers: &str) -> Vec<u8> {
    let count = channels.split(' ').count();
    let mut text = "HIERARCHY\n".to_owned();
    for joint in 0..SHORT_JOINTS {
        let kind = if joint == 0 { "ROOT" } else { "JOINT" };
        text.extend([kind, &format!(" j{joint} {{ OFFSET 0 1 0 CHANNELS {count} {channels}\n")]);
    }
    text.push_str(&"}".repeat(SHORT_JOINTS));
    text.push_str("\nMOTION\nFrame Time: 0.01\n");
    let mut numbers = numbers.split_inclusive(' ').cycle();
    while text.len() < size {
        text.extend(numbers.by_ref().take(SHORT_JOINTS * count));
        text.push('\n');
    }
    text.into_bytes()
}

/// A table of such numbers, with these columns a joint.
fn short_csv(columns: &str, numbers: &str) -> Vec<u8> {
    let count = columns.split(' ').count();
    let mut text = "time".to_owned();
    for joint in 0..SHORT_JOINTS {
        text.extend(columns.split(' ').map(|column| format!(",j{joint}.{column}")));
    }
    let mut numbers = numbers.trim_end().split(' ').cycle();
    for row in 0.. {
        let _ = write!(text, "\n{row}");
        for number in numbers.by_ref().take(SHORT_JOINTS * count) {
            text.push(',');
            text.push_str(number);
        }
        if text.len() >= SHORT_SIZE {
            break;
        }
    }
    text.into_bytes()
}

/// A document whose joints all move by keys of the shortest kind, at the same times.
fn short_glb(path: &str, component: usize, interpolation: &str) -> Vec<u8> {
    let (components, kind) = if path == "rotation" { (4, "VEC4") } else { (3, "VEC3") };
    let per_key = if interpolation == "CUBICSPLINE" { 3 } else { 1 };
    let size = match component {
        5120 => 1,
        5122 => 2,
        _ => 4,
    };
    let key_bytes = components * per_key * size;
    let keys = (SHORT_SIZE / SHORT_JOINTS / key_bytes).next_multiple_of(4);
    let mut bin: Vec<u8> = (0..keys).flat_map(|key| (key as f32 * 0.01).to_le_bytes()).collect();
    let mut views = vec![json!({ "buffer": 0, "byteLength": bin.len() })];
    let last = f64::from((keys - 1) as f32 * 0.01);
    let mut accessors = vec![json!({
        "bufferView": 0, "componentType": 5126, "count": keys, "type": "SCALAR", "min": [0], "max": [last]
    })];
    let (mut nodes, mut channels, mut samplers) = (Vec::new(), Vec::new(), Vec::new());
    for joint in 0..SHORT_JOINTS {
        let one: Vec<u8> = match component {
            5120 => vec![0, 0, 100, 100],
            5122 => [0_i16, 0, 23_000, 23_000].into_iter().flat_map(i16::to_le_bytes).collect(),
            _ => [0.0_f32, 0.0, 0.6, 0.8].into_iter().flat_map(f32::to_le_bytes).collect(),
        };
        let start = bin.len();
        bin.extend(one.iter().cycle().take(keys * key_bytes));
        views.push(json!({ "buffer": 0, "byteOffset": start, "byteLength": bin.len() - start }));
        accessors.push(json!({
            "bufferView": joint + 1, "componentType": component, "normalized": component != 5126,
            "count": keys * per_key, "type": kind,
        }));
        channels.push(json!({ "sampler": joint, "target": { "node": joint, "path": path } }));
        samplers.push(json!({ "input": 0, "output": joint + 1, "interpolation": interpolation }));
        let children: Vec<usize> = (joint + 1..SHORT_JOINTS).take(1).collect();
        nodes.push(if children.is_empty() { json!({}) } else { json!({ "children": children }) });
    }
    let document = json!({
        "asset": { "version": "2.0" },
        "nodes": nodes,
        "animations": [{ "channels": channels, "samplers": samplers }],
        "accessors": accessors,
        "bufferViews": views,
        "buffers": [{ "byteLength": bin.len() }],
    });
    let mut text = document.to_string().into_bytes();
    text.resize(text.len().next_multiple_of(4), b' ');
    let word = |number: usize| (number as u32).to_le_bytes();
    let mut glb = Vec::with_capacity(28 + text.len() + bin.len());
    glb.extend_from_slice(b"glTF\x02\0\0\0");
    glb.extend(word(28 + text.len() + bin.len()));
    glb.extend(word(text.len()));
    glb.extend_from_slice(b"JSON");
    glb.extend(text);
    glb.extend(word(bin.len()));
    glb.extend_from_slice(b"BIN\0");
    glb.extend(bin);
    glb
}

/// Opens the large file of a number, alone in its process, and does with it what is done with clips.
#[expect(clippy::print_stdout, reason = "the parent process reads it")]
fn open_large(number: usize) {
    let Large { name, make, fate } = large_files().swap_remove(number);
    let bytes = make();
    let size = bytes.len() as u64;
    // 5 sets the peak back to what is used now.
    let reset = std::fs::OpenOptions::new().write(true).open("/proc/self/clear_refs");
    let is_reset = reset.and_then(|mut file| file.write_all(b"5")).is_ok();
    // The file itself is in memory by now, and counts.
    let start_bytes = peak_bytes().filter(|_| is_reset).map(|peak| peak - size);
    let used =
        || peak_bytes().zip(start_bytes).map_or(0.0, |(peak, start)| (peak - start) as f64 / size as f64);
    let started = Instant::now();
    let mut steps = Vec::new();
    let error = if Path::new(name).extension().is_some_and(|own| own == "ron") {
        let text = std::str::from_utf8(&bytes);
        let is_read = text.is_ok_and(|text| ron::from_text(Path::new(name), text).is_ok());
        (!is_read).then(|| "refused".to_owned())
    } else {
        match open_bytes(Path::new(name), bytes, &OpenOptions::default()) {
            Err(error) => Some(error.to_string()),
            Ok(source) => {
                steps.push(("open", used()));
                if fate == Fate::Read {
                    play(&source.clips[0]);
                    steps.push(("play", used()));
                    change_and_write(&source, name);
                    steps.push(("write", used()));
                }
                None
            }
        }
    };
    let told = error.clone().unwrap_or_default();
    steps.push(("all", used()));
    let times: Vec<String> = steps.iter().map(|(step, times)| format!("{step} {times:.1}")).collect();
    println!(
        "{name} is done: {} times its {} MB, {:.1} s {told:.90}",
        times.join(", "),
        size >> 20,
        started.elapsed().as_secs_f64()
    );
    match fate {
        Fate::Any => {}
        Fate::Read => assert!(error.is_none(), "{name}: {told}"),
        Fate::Refused(words) => assert!(told.contains(words), "{name}: {told}"),
    }
    let most = 8.0 + SPARE_BYTES as f64 / size as f64;
    assert!(used() <= most, "{name} took {:.2} times its size, at most {most:.2} are allowed", used());
    assert!(started.elapsed() < LONGEST * 3, "{name} took {:?}", started.elapsed());
}

/// A pose, and each joint at many times in turn.
fn play(clip: &Clip) {
    let _ = clip.world_at(0.123);
    let times: Vec<f64> = (0..300).map(|i| clip.duration_secs * f64::from(i) / 300.0).collect();
    for joint in 0..clip.joints.len() {
        assert_eq!(clip.rotations_at(joint, &times).len(), times.len());
    }
    let _ = clip.worlds_at(&times);
}

/// The clip with one key changed, put back into its file. (Other formats may take many digits for one.)
fn change_and_write(source: &Source, name: &str) {
    let folder = tempfile::tempdir().expect("a folder for it");
    let results = [Arc::new(changed(&source.clips[0]))];
    let written = write(source, &results, None, &folder.path().join(name), &Guard::default());
    assert!(written.is_ok(), "{name}: {written:?}");
}

/// Runs a test of this file again in a process of its own, with a task to do, and gives what it printed.
fn start_again(test: &str, task: &str) -> std::process::Child {
    Command::new(std::env::current_exe().expect("this program"))
        .args(["--exact", &format!("hostile::{test}"), "--nocapture"])
        .env("RUST_BACKTRACE", "0")
        .env(TASK, task)
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("this program starts again")
}

/// Waits for such a process, and gives the line that it printed with these words in it.
#[track_caller]
fn line_of(child: std::process::Child, words: &str) -> String {
    let output = child.wait_with_output().expect("it ends");
    let text = String::from_utf8_lossy(&output.stdout);
    assert!(output.status.success(), "{text}\n{}", String::from_utf8_lossy(&output.stderr));
    text.lines().find(|line| line.contains(words)).unwrap_or_else(|| panic!("not told: {text}")).to_owned()
}

#[test]
fn large_files_take_no_more_memory_than_eight_times_their_size_and_64_mb() {
    if let Ok(task) = std::env::var(TASK) {
        return open_large(task.parse().expect("a number"));
    }
    for number in 0..large_files().len() {
        let test = "large_files_take_no_more_memory_than_eight_times_their_size_and_64_mb";
        println!("{}", line_of(start_again(test, &number.to_string()), " is done: "));
    }
}

/// Searches, alone in its process, the largest file of one turn a joint that may be searched.
#[expect(clippy::print_stdout, reason = "the parent process reads it")]
fn search_largest() {
    // 67 bytes for each of its 2.2 bytes of text; from 2.8 MB on that is more than 8 times the file and 64 MB.
    let open = |size: usize| {
        let bytes = short_bvh(size, "Yrotation", "0 1 2 3 4 .5 ");
        open_bytes(Path::new("search.bvh"), bytes, &OpenOptions::default()).expect("it opens")
    };
    let first = (5..200).find(|&size| open(size << 19).check_search(0).is_err()).expect("one is refused");
    let told = open(first << 19).check_search(0).expect_err("as before").to_string();
    assert!(told.starts_with("search.bvh: clip search: expected a search that takes at most "), "{told}");
    assert!(told.contains("; cut it into shorter clips with convert --from and --to"), "{told}");
    // What was made so far is given back; the peak is set to what is used now.
    let reset = std::fs::OpenOptions::new().write(true).open("/proc/self/clear_refs");
    let is_reset = reset.and_then(|mut file| file.write_all(b"5")).is_ok();
    let start = peak_bytes().filter(|_| is_reset);
    let source = open((first - 1) << 19);
    let kinds = vec![SnagKind::BrokenValue, SnagKind::SignFlip, SnagKind::HalfTurn];
    let survey = survey(&source.clips[0], &SurveyOptions { kinds, limits: None }, &Unwatched)
        .expect("nobody stops it");
    let size = source.bytes().len() as u64;
    let used = peak_bytes().zip(start).map_or(0, |(peak, start)| peak - start);
    println!("searched {} MB with {} MB, {} snags", size >> 20, used >> 20, survey.snags.len());
    assert!(used <= 8 * size + SPARE_BYTES, "{used} bytes for {size}");
}

#[test]
fn a_search_that_would_take_more_than_its_file_may_ask_for_is_refused() {
    if std::env::var(TASK).is_ok() {
        return search_largest();
    }
    let test = "a_search_that_would_take_more_than_its_file_may_ask_for_is_refused";
    println!("{}", line_of(start_again(test, ""), "searched "));
    // A long capture of usual numbers may be searched.
    let usual =
        short_bvh(4 << 20, "Zrotation Xrotation Yrotation", "-12.345678 3.141593 170.000001 0.500000 ");
    let source = open_bytes(Path::new("usual.bvh"), usual, &OpenOptions::default()).expect("it opens");
    assert_eq!(source.check_search(0), Ok(()));
}

#[test]
fn a_hundred_thousand_damaged_files_do_no_harm() {
    if let Ok(task) = std::env::var(TASK) {
        let (first, last) = task.split_once("..").expect("two numbers");
        return work(first.parse().expect("a number"), last.parse().expect("a number"));
    }
    let started = Instant::now();
    let n_parts = std::thread::available_parallelism().map_or(1, usize::from).clamp(1, 4);
    let bounds = |part: usize| FILES * part / n_parts;
    let parts: Vec<_> = (0..n_parts)
        .map(|part| {
            let task = format!("{}..{}", bounds(part), bounds(part + 1));
            start_again("a_hundred_thousand_damaged_files_do_no_harm", &task)
        })
        .collect();
    for part in parts {
        println!("{}", line_of(part, "could still be read"));
    }
    println!("{FILES} files in {:.1} s", started.elapsed().as_secs_f64());
}

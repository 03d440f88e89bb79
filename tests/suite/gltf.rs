//! glTF and GLB, reading: every outside file opens with the counts of its sources page, and plays as the standard's
//! formulas say.

#![expect(clippy::unwrap_used, reason = "helpers of tests fail as tests do")]

use std::path::{Path, PathBuf};

use serde_json::Value;
use turnwright::clip::Clip;
use turnwright::exchange::{Note, disk, gltf};

use crate::support::{Tally, list, shared};

/// Opens a file with the files beside it at hand.
#[track_caller]
pub(crate) fn open(path: &Path) -> (gltf::Document, Vec<Clip>, Vec<Note>) {
    let folder = path.parent().unwrap().to_owned();
    let fetch = |file: &str| disk::read(&folder.join(file)).map_err(|error| error.to_string());
    let bytes = disk::read(path).unwrap();
    let name = path.file_name().unwrap().to_string_lossy();
    gltf::read(bytes, &name, &fetch).unwrap_or_else(|error| panic!("{}: {error}", path.display()))
}

/// All outside glTF files; none where the folder is missing.
pub(crate) fn outside_files() -> Vec<PathBuf> {
    let Some(folder) = shared("data/gltf") else { return Vec::new() };
    COUNTS.iter().map(|(file, ..)| folder.join(file)).collect()
}

/// A document taken apart without any code of the crate: its JSON, and the bytes of its buffers.
pub(crate) struct Raw {
    pub(crate) json: Value,
    pub(crate) buffers: Vec<Vec<u8>>,
}

impl Raw {
    #[track_caller]
    pub(crate) fn new(bytes: &[u8], fetch: &dyn Fn(&str) -> Vec<u8>) -> Self {
        use base64::Engine;
        let word = |at: usize| u32::from_le_bytes(bytes[at..at + 4].try_into().unwrap()) as usize;
        if bytes.starts_with(b"glTF") {
            let json_end = 20 + word(12);
            let json = serde_json::from_slice(&bytes[20..json_end]).unwrap();
            let rest = bytes.get(json_end + 8..).unwrap_or_default();
            let n_bytes = if rest.is_empty() { 0 } else { word(json_end) };
            return Self { json, buffers: vec![rest[..n_bytes].to_vec()] };
        }
        let json: Value = serde_json::from_slice(bytes).unwrap();
        let buffer = |buffer: &Value| {
            let uri = buffer["uri"].as_str().unwrap();
            match uri.split_once(";base64,") {
                Some((_, content)) => base64::engine::general_purpose::STANDARD.decode(content).unwrap(),
                None => fetch(uri),
            }
        };
        let buffers = list(&json["buffers"]).iter().map(buffer).collect();
        Self { json, buffers }
    }

    pub(crate) fn open(path: &Path) -> Self {
        Self::new(&disk::read(path).unwrap(), &|file| disk::read(&path.with_file_name(file)).unwrap())
    }

    /// The floats of an accessor, element after element; `None` where it holds integers.
    pub(crate) fn floats(&self, accessor: &Value) -> Option<Vec<f64>> {
        let accessor = &self.json["accessors"][whole(accessor)];
        let view = &self.json["bufferViews"][whole(&accessor["bufferView"])];
        let start = whole(&accessor["byteOffset"]) + whole(&view["byteOffset"]);
        let components = match accessor["type"].as_str().unwrap() {
            "SCALAR" => 1,
            "VEC3" => 3,
            "VEC4" => 4,
            other => panic!("{other}"),
        };
        if whole(&accessor["componentType"]) != 5126 {
            return None;
        }
        let bytes =
            &self.buffers[whole(&view["buffer"])][start..start + 4 * components * whole(&accessor["count"])];
        Some(bytes.chunks(4).map(|four| f64::from(f32::from_le_bytes(four.try_into().unwrap()))).collect())
    }
}

/// A whole number, 0 where it is missing.
pub(crate) fn whole(value: &Value) -> usize {
    value.as_u64().unwrap_or(0) as usize
}

/// File, joints, rate, and for each clip its name and its frames.
type Counts = (&'static str, usize, f64, &'static [(&'static str, usize)]);

/// The joints and clips are those of `data/SOURCES.md`; biped23 has one more, since its clips also move the node above
/// the root joint.
const COUNTS: [Counts; 19] = [
    ("SimpleSkin.gltf", 2, 2.0, &[("", 12)]),
    ("AnimatedTriangle.gltf", 1, 4.0, &[("", 5)]),
    ("RiggedSimple.glb", 2, 24.0, &[("", 51)]),
    ("RiggedFigure.glb", 19, 0.8, &[("", 2)]),
    ("Fox.glb", 24, 24.0, &[("Survey", 83), ("Walk", 18), ("Run", 29)]),
    ("Fox_gltfpack.glb", 24, 30.0, &[("Survey", 104), ("Walk", 23), ("Run", 36)]),
    (
        "biped23_movement_clips.glb",
        24,
        30.0,
        &[
            ("Rig_Medium|Jump_Full_Long", 72),
            ("Rig_Medium|Jump_Full_Short", 37),
            ("Rig_Medium|Jump_Idle", 34),
            ("Rig_Medium|Jump_Land", 22),
            ("Rig_Medium|Jump_Start", 20),
            ("Rig_Medium|Running_A", 26),
            ("Rig_Medium|Running_B", 26),
            ("Rig_Medium|T-Pose", 3),
            ("Rig_Medium|Walking_A", 34),
            ("Rig_Medium|Walking_B", 34),
            ("Rig_Medium|Walking_C", 50),
        ],
    ),
    (
        "wolf.glb",
        51,
        24.0,
        &[
            ("AnimalArmature|Attack", 33),
            ("AnimalArmature|Death", 26),
            ("AnimalArmature|Eating", 61),
            ("AnimalArmature|Gallop", 14),
            ("AnimalArmature|Gallop_Jump", 23),
            ("AnimalArmature|Idle", 81),
            ("AnimalArmature|Idle_2", 81),
            ("AnimalArmature|Idle_2_HeadLow", 97),
            ("AnimalArmature|Idle_HitReact_Left", 17),
            ("AnimalArmature|Idle_HitReact_Right", 17),
            ("AnimalArmature|Jump_ToIdle", 33),
            ("AnimalArmature|Walk", 26),
        ],
    ),
    (
        "wasp.glb",
        29,
        24.0,
        &[
            ("WaspArmature|Wasp_Attack", 19),
            ("WaspArmature|Wasp_Death", 19),
            ("WaspArmature|Wasp_Flying", 37),
        ],
    ),
    ("node_character.glb", 7, 30.0, &[("static", 2), ("idle", 21), ("walk", 14), ("jump", 16)]),
    (
        "InterpolationTest.glb",
        9,
        24.0,
        &[
            ("Step Scale", 41),
            ("Linear Scale", 41),
            ("CubicSpline Scale", 41),
            ("Step Rotation", 42),
            ("CubicSpline Rotation", 42),
            ("Linear Rotation", 42),
            ("Step Translation", 42),
            ("CubicSpline Translation", 5),
            ("Linear Translation", 5),
        ],
    ),
    ("assetgen/Animation_SamplerType_00.gltf", 1, 1.0, &[("", 5)]),
    ("assetgen/Animation_SamplerType_01.gltf", 1, 1.0, &[("", 5)]),
    ("assetgen/Animation_Skin_01.gltf", 2, 1.0, &[("", 3)]),
    ("assetgen/Animation_Skin_03.gltf", 2, 0.0, &[]),
    ("assetgen/Animation_Skin_07.gltf", 2, 1.0, &[("", 3)]),
    ("assetgen/Animation_NodeMisc_01.gltf", 1, 1.0, &[("", 6)]),
    ("assetgen/Animation_NodeMisc_05.gltf", 1, 1.0 / 6.0, &[("", 2)]),
    ("assetgen/Animation_Node_05.gltf", 1, 1.0, &[("", 5)]),
];

#[test]
fn every_outside_file_opens_with_the_counts_of_its_sources_page() {
    let Some(folder) = shared("data/gltf") else { return };
    for (file, joints, rate, clips) in COUNTS {
        let (document, found, notes) = open(&folder.join(file));
        assert_eq!(notes, [], "{file}");
        assert_eq!(document.skeleton().listed().count(), joints, "{file}: joints");
        let counts: Vec<(&str, usize)> =
            found.iter().map(|clip| (clip.name.as_str(), clip.grid.count())).collect();
        assert_eq!(counts, clips, "{file}: clips");
        // Two files have clips with a rate of their own: of two the keys stand evenly, and nothing tells of frames between.
        let odd = ["static", "CubicSpline Translation", "Linear Translation"];
        for clip in found.iter().filter(|clip| !odd.contains(&clip.name.as_str())) {
            assert!((clip.grid.rate - rate).abs() < 1e-6, "{file} {}: {}", clip.name, clip.grid.rate);
        }
    }
}

/// Appendix C of the standard, in plain arrays: the value of a sampler at a time.
fn play(raw: &Raw, sampler: &Value, is_rotation: bool, time: f64) -> Option<Vec<f64>> {
    let times = raw.floats(&sampler["input"])?;
    let values = raw.floats(&sampler["output"])?;
    let mode = sampler["interpolation"].as_str().unwrap_or("LINEAR");
    let size = if is_rotation { 4 } else { 3 };
    let element = |index: usize| &values[index * size..(index + 1) * size];
    let value = |key: usize| if mode == "CUBICSPLINE" { element(3 * key + 1) } else { element(key) };
    let last = times.len() - 1;
    let Some(next) = times.iter().position(|&own| own > time) else { return Some(value(last).to_vec()) };
    let Some(key) = next.checked_sub(1) else { return Some(value(0).to_vec()) };
    let secs = times[next] - times[key];
    let t = (time - times[key]) / secs;
    let (a, b) = (value(key), value(next));
    let mix = |wa: f64, wb: f64| a.iter().zip(b).map(|(a, b)| a * wa + b * wb).collect();
    Some(match mode {
        "STEP" => a.to_vec(),
        "CUBICSPLINE" => {
            let (out, into) = (element(3 * key + 2), element(3 * next));
            let (t2, t3) = (t * t, t * t * t);
            (0..size)
                .map(|i| {
                    (2.0 * t3 - 3.0 * t2 + 1.0) * a[i]
                        + secs * (t3 - 2.0 * t2 + t) * out[i]
                        + (-2.0 * t3 + 3.0 * t2) * b[i]
                        + secs * (t3 - t2) * into[i]
                })
                .collect()
        }
        _ if is_rotation => {
            let unit = |v: &[f64]| {
                let norm = v.iter().map(|x| x * x).sum::<f64>().sqrt();
                v.iter().map(|x| x / norm).collect::<Vec<f64>>()
            };
            let (a, b) = (unit(a), unit(b));
            let dot: f64 = a.iter().zip(&b).map(|(a, b)| a * b).sum();
            let (angle, sign) = (dot.abs().min(1.0).acos(), if dot < 0.0 { -1.0 } else { 1.0 });
            let (wa, wb) = if angle < 1e-6 {
                (1.0 - t, t)
            } else {
                ((angle * (1.0 - t)).sin() / angle.sin(), (angle * t).sin() / angle.sin())
            };
            a.iter().zip(&b).map(|(a, b)| a * wa + sign * b * wb).collect()
        }
        _ => mix(1.0 - t, t),
    })
}

/// The turn in radians between two quaternions, of any sign and length.
fn apart(a: &[f64], b: &[f64]) -> f64 {
    let norm = |v: &[f64]| v.iter().map(|x| x * x).sum::<f64>().sqrt();
    let (na, nb) = (norm(a), norm(b));
    let length =
        |sign: f64| a.iter().zip(b).map(|(a, b)| (a / na + sign * b / nb).powi(2)).sum::<f64>().sqrt();
    let (difference, sum) = (length(-1.0), length(1.0));
    4.0 * difference.min(sum).atan2(difference.max(sum))
}

#[test]
fn every_outside_file_plays_as_the_formulas_of_the_standard_say() {
    let files = outside_files();
    if files.is_empty() {
        return;
    }
    let mut turns = Tally::new("rotations, radians");
    let mut places = Tally::new("translations and scales, of the largest number");
    let (mut n_turns, mut n_places) = (0, 0);
    for path in files {
        let (_, clips, _) = open(&path);
        let raw = Raw::open(&path);
        let Some(animations) = raw.json["animations"].as_array() else { continue };
        for (clip, animation) in clips.iter().zip(animations) {
            for step in 0..=60 {
                let time = clip.duration_secs * 1.1 * f64::from(step) / 60.0 - 0.01;
                let pose = clip.local_at(time);
                for channel in list(&animation["channels"]) {
                    let node = whole(&channel["target"]["node"]);
                    let part = channel["target"]["path"].as_str().unwrap();
                    let sampler = &animation["samplers"][whole(&channel["sampler"])];
                    let joint = clip.skeleton.joints().iter().position(|joint| joint.number == node).unwrap();
                    let case = format!("{} {} node {node} {part} at {time}", path.display(), clip.name);
                    let Some(expected) = play(&raw, sampler, part == "rotation", time) else { continue };
                    if part == "rotation" {
                        turns.check(&case, apart(&pose[joint].rotation.to_xyzw(), &expected), 1e-9);
                        n_turns += 1;
                        continue;
                    }
                    let found = if part == "scale" { pose[joint].scale } else { pose[joint].translation };
                    let largest = expected.iter().fold(1.0_f64, |largest, x| largest.max(x.abs()));
                    let error = found.to_array().into_iter().zip(&expected).map(|(a, b)| (a - b).abs());
                    places.check(&case, error.fold(0.0, f64::max) / largest, 1e-15);
                    n_places += 1;
                }
            }
        }
    }
    assert!(n_turns > 40_000 && n_places > 20_000, "{n_turns} {n_places}");
    turns.finish(n_turns);
    places.finish(n_places);
}

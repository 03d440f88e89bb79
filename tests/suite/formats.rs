//! Files as the world has them, made here by a writer of its own that shares no code with the program: many clips and skins in
//! one document, every encoding of rotations, several orders in one BVH, odd spellings.

#![expect(clippy::unwrap_used, reason = "helpers of tests fail as tests do")]

use std::fmt::Write as _;
use std::path::Path;
use std::sync::Arc;

use base64::Engine;
use glam::{DMat3, DVec3};
use serde_json::{Value, json};
use turnwright::clip::Clip;
use turnwright::exchange::{OpenOptions, Source, bvh, disk, encode, gltf, open_bytes};
use turnwright::rotor::Rotor;

use crate::gltf_broken::Dice;
use crate::support::assert_close;

const CLIPS: usize = 76;
const SKINS: usize = 84;
const JOINTS: usize = 24;
const KEYS: usize = 5;

/// Bytes in one buffer, with views and accessors on them.
#[derive(Default)]
struct Store {
    bytes: Vec<u8>,
    views: Vec<Value>,
    accessors: Vec<Value>,
}

impl Store {
    /// The accessor of the times that all clips share.
    fn times(&mut self) -> usize {
        let secs: Vec<f32> = (0..KEYS).map(|key| key as f32 / 24.0).collect();
        let times = self.floats(&secs, "SCALAR", KEYS);
        self.accessors[times]["min"] = json!([0.0]);
        self.accessors[times]["max"] = json!([f64::from(secs[KEYS - 1])]);
        times
    }

    fn view(&mut self, bytes: &[u8], stride: Option<usize>) -> usize {
        self.bytes.resize(self.bytes.len().next_multiple_of(4), 0);
        let mut view = json!({ "buffer": 0, "byteOffset": self.bytes.len(), "byteLength": bytes.len() });
        if let Some(stride) = stride {
            view["byteStride"] = stride.into();
        }
        self.bytes.extend_from_slice(bytes);
        self.views.push(view);
        self.views.len() - 1
    }

    fn accessor(&mut self, accessor: Value) -> usize {
        self.accessors.push(accessor);
        self.accessors.len() - 1
    }

    fn floats(&mut self, numbers: &[f32], kind: &str, count: usize) -> usize {
        let bytes: Vec<u8> = numbers.iter().flat_map(|number| number.to_le_bytes()).collect();
        let view = self.view(&bytes, None);
        self.accessor(json!({ "bufferView": view, "componentType": 5126, "count": count, "type": kind }))
    }

    /// Rotations in one of the encodings, and the numbers that a reader has to find.
    fn rotations(&mut self, encoding: usize, keys: &[[f64; 4]]) -> (usize, Vec<[f64; 4]>) {
        let count = keys.len();
        let whole = |largest: f64| -> Vec<[i32; 4]> {
            keys.iter().map(|key| key.map(|number| (number * largest).round() as i32)).collect()
        };
        // The standard's table: c / largest, cut at −1.
        let found = |stored: &[[i32; 4]], largest: f64| -> Vec<[f64; 4]> {
            let one = |c: i32| f64::from((f64::from(c) / largest).max(-1.0) as f32);
            stored.iter().map(|key| key.map(one)).collect()
        };
        let integers = |store: &mut Self, code: u32, bytes: &[u8], stride: Option<usize>| {
            let view = store.view(bytes, stride);
            store.accessor(json!({
                "bufferView": view, "componentType": code, "normalized": true, "count": count, "type": "VEC4"
            }))
        };
        match encoding {
            0 => {
                let stored = whole(127.0);
                let bytes: Vec<u8> = stored.iter().flatten().map(|&c| c as i8 as u8).collect();
                (integers(self, 5120, &bytes, None), found(&stored, 127.0))
            }
            1 => {
                let stored = whole(255.0);
                let stored: Vec<[i32; 4]> = stored.iter().map(|key| key.map(|c| c.max(0))).collect();
                let bytes: Vec<u8> = stored.iter().flatten().map(|&c| c as u8).collect();
                (integers(self, 5121, &bytes, None), found(&stored, 255.0))
            }
            2 => {
                let stored = whole(32767.0);
                let bytes: Vec<u8> =
                    stored.iter().flatten().flat_map(|&c| (c as i16).to_le_bytes()).collect();
                (integers(self, 5122, &bytes, None), found(&stored, 32767.0))
            }
            3 => {
                let stored = whole(65535.0);
                let stored: Vec<[i32; 4]> = stored.iter().map(|key| key.map(|c| c.max(0))).collect();
                let bytes: Vec<u8> =
                    stored.iter().flatten().flat_map(|&c| (c as u16).to_le_bytes()).collect();
                (integers(self, 5123, &bytes, None), found(&stored, 65535.0))
            }
            4 => {
                // Interleaved: other data between the keys.
                let stored = whole(32767.0);
                let bytes: Vec<u8> = stored
                    .iter()
                    .flat_map(|key| {
                        let own = key.iter().flat_map(|&c| (c as i16).to_le_bytes());
                        own.chain([0xEE; 4]).collect::<Vec<u8>>()
                    })
                    .collect();
                (integers(self, 5122, &bytes, Some(12)), found(&stored, 32767.0))
            }
            5 => {
                // Sparse over zeros: only the keys that are listed have a value.
                let given: Vec<usize> = (0..count).filter(|key| key % 2 == 0).collect();
                let indices: Vec<u8> = given.iter().flat_map(|&key| (key as u16).to_le_bytes()).collect();
                let indices = self.view(&indices, None);
                let numbers = given.iter().flat_map(|&key| keys[key]).map(|number| number as f32);
                let values: Vec<u8> = numbers.flat_map(f32::to_le_bytes).collect();
                let values = self.view(&values, None);
                let accessor = self.accessor(json!({
                    "componentType": 5126, "count": count, "type": "VEC4",
                    "sparse": {
                        "count": given.len(),
                        "indices": { "bufferView": indices, "componentType": 5123 },
                        "values": { "bufferView": values },
                    },
                }));
                let stored = keys.iter().enumerate().map(|(key, own)| {
                    if key % 2 == 0 { own.map(|number| f64::from(number as f32)) } else { [0.0; 4] }
                });
                (accessor, stored.collect())
            }
            7 => {
                // Sparse over whole numbers: every other key is another than the view has.
                let stored = whole(32767.0);
                let short = |keys: Vec<[i32; 4]>| -> Vec<u8> {
                    keys.iter().flatten().flat_map(|&c| (c as i16).to_le_bytes()).collect()
                };
                let base: Vec<[i32; 4]> = (0..count).map(|key| stored[key / 2 * 2]).collect();
                let given: Vec<usize> = (0..count).filter(|key| key % 2 == 1).collect();
                let accessor = integers(self, 5122, &short(base), None);
                let indices: Vec<u8> = given.iter().map(|&key| key as u8).collect();
                let indices = self.view(&indices, None);
                let values = self.view(&short(given.iter().map(|&key| stored[key]).collect()), None);
                self.accessors[accessor]["sparse"] = json!({
                    "count": given.len(),
                    "indices": { "bufferView": indices, "componentType": 5121 },
                    "values": { "bufferView": values },
                });
                (accessor, found(&stored, 32767.0))
            }
            _ => {
                let numbers: Vec<f32> = keys.iter().flatten().map(|&number| number as f32).collect();
                let stored = keys.iter().map(|key| key.map(|number| f64::from(number as f32)));
                (self.floats(&numbers, "VEC4", count), stored.collect())
            }
        }
    }
}

/// Rotations x, y, z, w, one for each key.
fn thrown_turns(dice: &mut Dice) -> Vec<[f64; 4]> {
    let mut turn = || {
        let numbers: [f64; 4] = std::array::from_fn(|_| dice.below(1000) as f64 / 1000.0 + 0.01);
        let length = numbers.iter().map(|number| number * number).sum::<f64>().sqrt();
        numbers.map(|number| number / length)
    };
    (0..KEYS).map(|_| turn()).collect()
}

/// A document that other programs read too: 76 clips of a chain of joints that 84 skins share, in the encodings that they know,
/// and the rotations that each clip has for each joint.
fn plain_crowd() -> (Value, Vec<Vec<Vec<[f64; 4]>>>) {
    let mut dice = Dice::new(84);
    let mut store = Store::default();
    let times = store.times();
    let (mut animations, mut all) = (Vec::new(), Vec::new());
    for clip in 0..CLIPS {
        let (mut channels, mut samplers, mut keys_of) = (Vec::new(), Vec::new(), Vec::new());
        for joint in 0..JOINTS {
            let keys = thrown_turns(&mut dice);
            let (output, stored) = store.rotations([0, 1, 2, 3, 6, 7][(clip + joint) % 6], &keys);
            channels.push(json!({ "sampler": joint, "target": { "node": joint, "path": "rotation" } }));
            let interpolation = if joint % 4 == 3 { "STEP" } else { "LINEAR" };
            samplers.push(json!({ "input": times, "output": output, "interpolation": interpolation }));
            keys_of.push(stored);
        }
        animations
            .push(json!({ "name": format!("clip {clip}"), "channels": channels, "samplers": samplers }));
        all.push(keys_of);
    }
    let nodes: Vec<Value> = (0..JOINTS)
        .map(|joint| {
            let mut node = json!({ "name": format!("j{joint}"), "translation": [0.0, 0.5, 0.0] });
            if joint + 1 < JOINTS {
                node["children"] = json!([joint + 1]);
            }
            node
        })
        .collect();
    let skins: Vec<Value> =
        (0..SKINS).map(|skin| json!({ "joints": [skin % JOINTS, (skin + 1) % JOINTS] })).collect();
    let text = base64::engine::general_purpose::STANDARD.encode(&store.bytes);
    let document = json!({
        "asset": { "version": "2.0" },
        "scene": 0,
        "scenes": [{ "nodes": [0] }],
        "nodes": nodes,
        "skins": skins,
        "buffers": [{ "byteLength": store.bytes.len(), "uri": format!("data:application/octet-stream;base64,{text}") }],
        "bufferViews": store.views,
        "accessors": store.accessors,
        "animations": animations,
    });
    (document, all)
}

/// Under a joint whose size grows along one axis a turned one: CUBICSPLINE, STEP and LINEAR with times that begin late.
fn uneven() -> Value {
    let mut store = Store::default();
    let secs = [0.5_f32, 0.6, 1.0, 1.7, 1.71, 3.0];
    let count = secs.len();
    let times = store.floats(&secs, "SCALAR", count);
    store.accessors[times]["min"] = json!([0.5]);
    store.accessors[times]["max"] = json!([3.0]);
    let about_y =
        |degrees: f32| [0.0, (degrees.to_radians() / 2.0).sin(), 0.0, (degrees.to_radians() / 2.0).cos()];
    let keys: Vec<[f32; 4]> = [0.0, 40.0, 90.0, 20.0, 22.0, 170.0].map(about_y).to_vec();
    let ends = |key: usize| if key == 0 || key + 1 == count { 0.0 } else { 0.1 };
    let cubic: Vec<f32> = (0..count)
        .flat_map(|key| {
            let tangent = ends(key);
            [[0.0, tangent, 0.0, -tangent], keys[key], [0.0, tangent, tangent / 2.0, -tangent]].concat()
        })
        .collect();
    let held: Vec<f32> = keys
        .iter()
        .enumerate()
        .flat_map(|(key, own)| own.map(|part| if key % 2 == 0 { part } else { -part }))
        .collect();
    let places: Vec<f32> = (0..count).flat_map(|key| [key as f32, 1.0, (key * key) as f32 * 0.1]).collect();
    let sizes: Vec<f32> = (0..count).flat_map(|key| [1.0, 1.0 + key as f32 * 0.1, 1.0]).collect();
    let outputs = [
        store.floats(&cubic, "VEC4", 3 * count),
        store.floats(&held, "VEC4", count),
        store.floats(&places, "VEC3", count),
        store.floats(&sizes, "VEC3", count),
    ];
    let sampler = |index: usize, interpolation: &str| json!({ "input": times, "output": outputs[index], "interpolation": interpolation });
    let channel = |sampler: usize, node: usize, path: &str| json!({ "sampler": sampler, "target": { "node": node, "path": path } });
    let half = std::f64::consts::FRAC_1_SQRT_2;
    let text = base64::engine::general_purpose::STANDARD.encode(&store.bytes);
    json!({
        "asset": { "version": "2.0" },
        "scene": 0,
        "scenes": [{ "nodes": [0] }],
        "nodes": [
            { "name": "j0", "translation": [0, 2, 0], "children": [1] },
            { "name": "j1", "translation": [0, 1, 0], "children": [2] },
            { "name": "j2", "translation": [0, 1, 0], "children": [3] },
            { "name": "j3", "translation": [0, 1, 0], "rotation": [0, 0, half, half], "children": [4] },
            { "name": "j4", "translation": [0.3, 1, 0], "rotation": [0.28, 0, 0, 0.96] },
        ],
        "skins": [{ "joints": [0, 1, 2, 3, 4] }],
        "buffers": [{ "byteLength": store.bytes.len(), "uri": format!("data:application/octet-stream;base64,{text}") }],
        "bufferViews": store.views,
        "accessors": store.accessors,
        "animations": [{
            "channels": [
                channel(0, 0, "rotation"), channel(1, 1, "rotation"), channel(2, 1, "translation"), channel(3, 2, "scale"),
            ],
            "samplers": [
                sampler(0, "CUBICSPLINE"), sampler(1, "STEP"), sampler(2, "LINEAR"), sampler(3, "LINEAR"),
            ],
        }],
    })
}

/// Where `tests/outside/run.sh` looks for files that other programs shall play.
fn keep_for_outside(name: &str, bytes: &[u8]) {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("odd");
    disk::write(&folder.join(name), bytes).unwrap();
}

#[test]
fn a_crowd_that_others_read_too_has_the_keys_of_the_standards_table() {
    let (document, expected) = plain_crowd();
    let text = document.to_string();
    keep_for_outside("crowd.gltf", text.as_bytes());
    let source = opened("crowd.gltf", text.into_bytes());
    assert_eq!((source.clips.len(), source.clips[0].skeleton.listed().count()), (CLIPS, JOINTS));
    for (clip, expected) in source.clips.iter().zip(&expected) {
        for (joint, expected) in expected.iter().enumerate() {
            let track = clip.rotation(joint).unwrap();
            // One by one and all together.
            let single: Vec<[f64; 4]> = (0..KEYS).map(|key| track.keys.rotor(key).to_xyzw()).collect();
            let found: Vec<[f64; 4]> = track.keys.iter().map(|key| key.to_xyzw()).collect();
            assert_eq!((&found, &single), (expected, expected), "{} joint {joint}", clip.name);
        }
    }
}

/// A sheared joint has no one turn; what is told is the product of the turns above it, and places are those of the matrices.
/// Worked out for a size of (1, 1.4, 1) and a turn of 90 degrees about z below it: a point one along the turned joint's y, which
/// then lies along −x, is not drawn out, and one along its x, along y, is.
#[test]
fn below_an_uneven_size_places_are_drawn_out_and_turns_are_products() {
    let text = uneven().to_string();
    keep_for_outside("uneven.gltf", text.as_bytes());
    let source = opened("uneven.gltf", text.into_bytes());
    let clip = &source.clips[0];
    // The fifth key.
    let secs = f64::from(1.71_f32);
    let world = clip.world_at(secs);
    let local = clip.local_at(secs);
    let size = local[2].scale;
    assert!((size - DVec3::new(1.0, 1.4, 1.0)).length() < 1e-6, "{size}");
    let turn = world[2].rotation;
    // From j3 to j4: (0.3, 1, 0) turned by 90 degrees is (−1, 0.3, 0), drawn out (−1, 0.42, 0).
    let expected = world[3].position() + turn.apply(DVec3::new(-1.0, 0.42, 0.0));
    assert!(world[4].position().distance(expected) < 1e-6, "{} {expected}", world[4].position());
    let product = turn * local[3].rotation * local[4].rotation;
    assert!(world[4].rotation.turn_to(product) < 1e-12);
    // Before the first key its value is held, also of a held and a smooth track.
    assert_eq!(clip.local_at(0.0), clip.local_at(0.5));
}

/// A document of 76 clips and 84 skins, and the rotations that each clip has for each joint.
fn crowd() -> (Value, Vec<Vec<Vec<[f64; 4]>>>) {
    let mut dice = Dice::new(76);
    let mut store = Store::default();
    let times = store.times();
    let weights = store.floats(&[0.25; 2 * KEYS], "SCALAR", 2 * KEYS);
    let mut animations = Vec::new();
    let mut all = Vec::new();
    for clip in 0..CLIPS {
        let (mut channels, mut samplers, mut keys_of) = (Vec::new(), Vec::new(), Vec::new());
        for joint in 0..JOINTS {
            let keys = thrown_turns(&mut dice);
            let (output, stored) = store.rotations((clip + joint) % 7, &keys);
            channels.push(json!({ "sampler": joint, "target": { "node": joint, "path": "rotation" } }));
            samplers.push(json!({ "input": times, "output": output, "extras": { "of": joint } }));
            keys_of.push(stored);
        }
        samplers.push(json!({ "input": times, "output": weights, "interpolation": "LINEAR" }));
        channels.push(json!({ "sampler": JOINTS, "target": { "node": JOINTS, "path": "weights" } }));
        channels.push(json!({ "sampler": JOINTS, "target": {
            "path": "pointer",
            "extensions": { "KHR_animation_pointer": { "pointer": "/materials/0/alphaCutoff" } },
        }}));
        animations.push(json!({
            "name": if clip % 5 == 0 { "Walk".to_owned() } else { format!("Täke {clip} 走") },
            "channels": channels, "samplers": samplers, "extras": [clip, { "x": null }],
        }));
        all.push(keys_of);
    }
    // Names that repeat, that are missing, and that are not ASCII.
    let mut nodes: Vec<Value> = (0..JOINTS)
        .map(|joint| match joint % 4 {
            0 => json!({ "name": "bone" }),
            1 => json!({}),
            2 => json!({ "name": format!("Gelenk {joint} \u{00e4}骨") }),
            _ => json!({ "name": format!("j{joint}"), "translation": [0.0, 0.5, 0.0] }),
        })
        .collect();
    for (joint, node) in nodes.iter_mut().enumerate().take(JOINTS - 1) {
        node["children"] = json!([joint + 1]);
    }
    nodes.push(json!({ "mesh": 0, "skin": 0, "weights": [0.0, 1.0] }));
    let skins: Vec<Value> = (0..SKINS)
        .map(|skin| {
            let joints: Vec<usize> = (0..JOINTS).filter(|joint| (joint + skin) % 3 != 0).collect();
            // A wrong pointer: a leaf is nobody's root, and the last is no joint at all.
            json!({ "joints": joints, "skeleton": JOINTS - 1 + skin % 2, "name": format!("skin {skin}") })
        })
        .collect();
    let text = base64::engine::general_purpose::STANDARD.encode(&store.bytes);
    let document = json!({
        "asset": { "version": "2.0", "extras": { "made": "here" } },
        "extensionsUsed": ["KHR_mesh_quantization", "KHR_animation_pointer", "EXT_never_heard_of"],
        "extensionsRequired": ["KHR_mesh_quantization"],
        "nodes": nodes,
        "skins": skins,
        "meshes": [{ "primitives": [{ "attributes": {}, "targets": [{}, {}] }] }],
        "buffers": [{ "byteLength": store.bytes.len(), "uri": format!("data:application/gltf-buffer;base64,{text}") }],
        "bufferViews": store.views,
        "accessors": store.accessors,
        "animations": animations,
        "EXT_top": { "kept": [1.50, 1e3, "ä"] },
    });
    (document, all)
}

#[track_caller]
fn opened(name: &str, bytes: Vec<u8>) -> Source {
    open_bytes(Path::new(name), bytes, &OpenOptions::default()).unwrap_or_else(|error| panic!("{error}"))
}

#[test]
fn seventy_six_clips_and_eighty_four_skins_in_every_encoding() {
    let (document, expected) = crowd();
    let text = document.to_string();
    let source = opened("crowd.gltf", text.clone().into_bytes());
    assert_eq!((source.clips.len(), source.clips[0].skeleton.listed().count()), (CLIPS, JOINTS));
    for (clip, expected) in source.clips.iter().zip(&expected) {
        for (joint, expected) in expected.iter().enumerate() {
            let found: Vec<[f64; 4]> =
                clip.rotation(joint).unwrap().keys.iter().map(|key| key.to_xyzw()).collect();
            assert_eq!(found, *expected, "{} joint {joint}", clip.name);
        }
    }
    // What moves no joint is left alone, and told; required extensions about meshes are not.
    assert!(
        source.notes.iter().all(|note| !note.text.contains("KHR_mesh_quantization")),
        "{:?}",
        source.notes
    );
    let pointers = source.notes.iter().filter(|note| note.text.contains("KHR_animation_pointer")).count();
    assert_eq!(pointers, CLIPS);
    let labels: Vec<&str> = (0..5).map(|joint| source.clips[0].skeleton.label(joint)).collect();
    assert_eq!(labels, ["bone#0", "#1", "Gelenk 2 \u{00e4}骨", "j3", "bone#4"]);
    assert_eq!(source.find_clip("Täke 41 走"), Some(41));

    // One key of one joint in one clip.
    let (clip, joint) = (41, 5);
    let changed = Rotor::from_xyzw([0.5, 0.5, 0.5, 0.5]);
    let mut results = source.clips.clone();
    let track = results[clip].rotation(joint).unwrap().with_keys(&[(2, changed)]);
    results[clip] = Arc::new(results[clip].with_rotation(joint, track));
    let written = encode(&source, &results, None, Path::new("crowd.gltf")).unwrap();
    let before: Value = serde_json::from_str(&text).unwrap();
    let after: Value = serde_json::from_slice(&written.bytes).unwrap();
    // The document differs in one sampler, the new data and what says where it is.
    for (key, value) in before.as_object().unwrap() {
        match key.as_str() {
            "animations" => {
                for (index, old) in value.as_array().unwrap().iter().enumerate() {
                    let new = &after["animations"][index];
                    if index != clip {
                        assert_eq!(new, old);
                        continue;
                    }
                    assert_eq!(new["channels"], old["channels"]);
                    let samplers = old["samplers"].as_array().unwrap().iter().enumerate();
                    let unlike: Vec<usize> = samplers
                        .filter(|(at, old)| new["samplers"][*at] != **old)
                        .map(|(at, _)| at)
                        .collect();
                    assert_eq!(unlike, [joint]);
                    assert_eq!(new["samplers"][joint]["extras"], old["samplers"][joint]["extras"]);
                }
            }
            "accessors" | "bufferViews" => {
                let old = value.as_array().unwrap();
                assert_eq!(&after[key].as_array().unwrap()[..old.len()], &old[..]);
            }
            "buffers" => {
                let data = |buffers: &Value| {
                    let uri = buffers[0]["uri"].as_str().unwrap();
                    base64::engine::general_purpose::STANDARD.decode(uri.split_once(',').unwrap().1).unwrap()
                };
                let (old, new) = (data(value), data(&after[key]));
                assert!(new.starts_with(&old));
            }
            _ => assert_eq!(&after[key], value, "{key}"),
        }
    }
    // Untouched text stays text: numbers keep their spelling.
    assert!(String::from_utf8(written.bytes.clone()).unwrap().contains("\"kept\":[1.5,1000.0,\"ä\"]"));
    let again = opened("crowd.gltf", written.bytes);
    for (index, (found, meant)) in again.clips.iter().zip(&results).enumerate() {
        for joint in 0..JOINTS {
            let (a, b) = (found.rotation(joint).unwrap(), meant.rotation(joint).unwrap());
            assert!(a.changed_keys(b).is_empty(), "clip {index} joint {joint}");
        }
    }
}

/// A turn as a matrix, of column vectors.
fn about(axis: char, degrees: f64) -> DMat3 {
    let angle = degrees.to_radians();
    match axis {
        'X' => DMat3::from_rotation_x(angle),
        'Y' => DMat3::from_rotation_y(angle),
        _ => DMat3::from_rotation_z(angle),
    }
}

/// The joints of the mixed file: name, parent, OFFSET, channels.
const MIXED: [(&str, Option<usize>, [f64; 3], &str); 7] = [
    ("Hüfte links", None, [0.0, 90.0, 0.0], "Xposition Yposition Zposition Zrotation Xrotation Yrotation"),
    ("spine:1|a", Some(0), [0.0, 10.0, 1.0], "Xrotation Yrotation Zrotation"),
    ("arm", Some(1), [12.0, 0.0, 0.0], "YROTATION zrotation XRotation"),
    ("hand", Some(2), [25.0, 0.0, 0.0], "Zrotation Yrotation Xrotation Xposition Yposition Zposition"),
    ("finger", Some(3), [8.0, 0.0, 0.0], "Xrotation"),
    ("arm", Some(1), [-12.0, 0.0, 0.0], "Yrotation Xrotation"),
    ("twist", Some(5), [-25.0, 0.0, 0.0], "Zrotation Xrotation Zrotation"),
];

/// A file of five rotation orders with most of what files in the wild do, its numbers, and how many frames it claims to have.
fn mixed(frames: usize, claimed: usize, line_end: &str, columns_a_line: usize) -> (String, Vec<Vec<f64>>) {
    let mut dice = Dice::new(frames as u64);
    let mut text = format!("\u{feff}Hierarchy{line_end}# made by hand{line_end}");
    let mut open = Vec::new();
    for (joint, (name, parent, offset, channels)) in MIXED.into_iter().enumerate() {
        while open.len() > parent.map_or(0, |parent| open.iter().position(|&own| own == parent).unwrap() + 1)
        {
            open.pop();
            let _ = write!(text, "}}{line_end}");
        }
        let word = if parent.is_none() { "root" } else { "Joint" };
        let [x, y, z] = offset;
        let count = channels.split(' ').count();
        let _ = write!(
            text,
            "\t{word} {name} {line_end}\t{{{line_end}\tOFFSET\t{x:e} {y} {z}.{line_end}\tCHANNELS {count} {channels} {line_end}"
        );
        open.push(joint);
    }
    let _ = write!(text, "End site toe{line_end}{{{line_end}OFFSET 0 -3 .5{line_end}}}{line_end}");
    text.push_str(&format!("}}{line_end}").repeat(open.len()));
    let _ = write!(text, "motion{line_end}Frames :{claimed}{line_end}Frame Time:  8.333e-3{line_end}");
    let columns: usize = MIXED.iter().map(|joint| joint.3.split(' ').count()).sum();
    let mut rows = Vec::new();
    let mut in_line = 0;
    for _ in 0..frames {
        let mut row = Vec::new();
        for _ in 0..columns {
            let value = (dice.below(720_000) as f64 - 360_000.0) / 1000.0;
            let word = match dice.below(5) {
                0 => format!("{value:e}"),
                1 => format!("{value:+}"),
                2 => format!("{value:.6}"),
                _ => value.to_string(),
            };
            row.push(value);
            text.push_str(&word);
            in_line += 1;
            if in_line % columns_a_line == 0 {
                text.push_str(line_end);
            } else {
                text.push_str(if dice.below(3) == 0 { "\t" } else { " " });
            }
        }
        rows.push(row);
    }
    (text, rows)
}

#[test]
fn five_rotation_orders_in_one_bvh_with_odd_spelling_play_as_matrices_say() {
    let columns: usize = MIXED.iter().map(|joint| joint.3.split(' ').count()).sum();
    // CRLF and a row a line; CR and rows broken over lines; everything on one giant line.
    for (line_end, a_line) in [("\r\n", columns), ("\r", 5), ("\n", usize::MAX)] {
        for (frames, claimed) in [(7, 7), (7, 9), (7, 4)] {
            let (text, rows) = mixed(frames, claimed, line_end, a_line);
            let source = opened("mixed.bvh", text.clone().into_bytes());
            let clip = &source.clips[0];
            assert_eq!((clip.grid.count(), clip.skeleton.len()), (frames, MIXED.len()));
            let is_told = source.notes.iter().any(|note| note.text.contains("as `Frames:` says"));
            assert_eq!(is_told, frames != claimed, "{:?}", source.notes);
            assert_close!(clip.grid.time(1), 8.333e-3, 0.0);
            for (frame, row) in rows.iter().enumerate() {
                let mut world: Vec<(DMat3, DVec3)> = Vec::new();
                let mut numbers = row.iter().copied();
                for (_, parent, offset, channels) in MIXED {
                    let (mut turn, mut place) = (DMat3::IDENTITY, offset);
                    for channel in channels.split(' ').map(str::to_uppercase) {
                        let value = numbers.next().unwrap();
                        let axis = channel.chars().next().unwrap();
                        if channel.ends_with("POSITION") {
                            place["XYZ".find(axis).unwrap()] = value;
                        } else {
                            turn *= about(axis, value);
                        }
                    }
                    let (above, origin) =
                        parent.map_or((DMat3::IDENTITY, DVec3::ZERO), |parent| world[parent]);
                    world.push((above * turn, origin + above * DVec3::from_array(place)));
                }
                let found = clip.world_at(clip.grid.time(frame));
                for (joint, (turn, place)) in world.into_iter().enumerate() {
                    assert_close!(found[joint].position(), place, 1e-9 * place.length().max(1.0));
                    assert_close!(found[joint].rotation.to_matrix(), turn, 1e-12);
                }
            }
            // Nobody touched it.
            let same = encode(&source, &source.clips, None, Path::new("mixed.bvh")).unwrap();
            assert_eq!(same.bytes, text.as_bytes());
        }
    }
}

#[test]
fn an_edit_of_an_odd_bvh_changes_its_own_numbers_alone() {
    for (line_end, a_line) in [("\r\n", 24), ("\n", 5), ("\n", usize::MAX)] {
        let (text, _) = mixed(6, 6, line_end, a_line);
        let source = opened("mixed.bvh", text.clone().into_bytes());
        let clip = &source.clips[0];
        let joint = 2;
        let new = clip.rotation(joint).unwrap().with_angles(&[(3, [11.5, -22.25, 33.125])]);
        let results = vec![Arc::new(clip.with_rotation(joint, new))];
        let written = encode(&source, &results, None, Path::new("mixed.bvh")).unwrap();
        let written = String::from_utf8(written.bytes).unwrap();
        let words =
            |text: &str| -> Vec<String> { text.split([' ', '\t', '\r', '\n']).map(str::to_owned).collect() };
        let (old, new) = (words(&text), words(&written));
        assert_eq!(old.len(), new.len());
        let changed: Vec<&str> =
            old.iter().zip(&new).filter(|(a, b)| a != b).map(|(_, new)| new.as_str()).collect();
        assert_eq!(changed, ["11.500000", "-22.250000", "33.125000"]);
    }
}

/// Largest difference of a joint's turn between two clips at some times, in degrees.
fn apart(a: &Clip, b: &Clip, times: &[f64]) -> f64 {
    let mut most: f64 = 0.0;
    for &secs in times {
        let (one, other) = (a.world_at(secs), b.world_at(secs));
        for joint in a.skeleton.listed() {
            let twin = b.skeleton.find(a.skeleton.label(joint)).unwrap();
            most = most.max(one[joint].rotation.turn_to(other[twin].rotation).to_degrees());
        }
    }
    most
}

#[test]
fn a_part_of_a_bvh_and_another_rate_keep_its_head_and_its_numbers() {
    let (text, _) = mixed(9, 9, "\n", 24);
    let source = opened("mixed.bvh", text.clone().into_bytes());
    let clip = &source.clips[0];
    let step = clip.grid.time(1);
    let cut = Arc::new(turnwright::clip::cut(clip, 2.0 * step, 5.0 * step));
    let written = encode(&source, &[cut], None, Path::new("part.bvh")).unwrap();
    let written = String::from_utf8(written.bytes).unwrap();
    let (head, rows) = text.split_once("8.333e-3\n").unwrap();
    let kept: Vec<&str> = rows.lines().skip(2).take(4).collect();
    let (new_head, new_rows) = written.split_once("8.333e-3\n").unwrap();
    assert_eq!(new_head, head.replace("Frames :9", "Frames: 4").replace("Frame Time:  ", "Frame Time: "));
    for (new, old) in new_rows.lines().zip(&kept) {
        assert_eq!(new.split_whitespace().collect::<Vec<_>>(), old.split_whitespace().collect::<Vec<_>>());
    }
    // Twice the rate: the same joints and channels in the same order, and the same motion.
    let faster = Arc::new(turnwright::clip::resampled(clip, 2.0 / step, 0.0, clip.duration_secs));
    let written = encode(&source, &[faster], None, Path::new("fast.bvh")).unwrap();
    let (_, again, _) = bvh::read(&written.bytes, "fast").unwrap();
    assert_eq!(again.skeleton.joints(), clip.skeleton.joints());
    let times: Vec<f64> = (0..9).map(|frame| clip.grid.time(frame)).collect();
    assert!(apart(clip, &again, &times) < 2e-5, "{}", apart(clip, &again, &times));
}

#[test]
fn a_bvh_becomes_a_gltf_with_a_figure_and_comes_back_with_running_angles() {
    // Two and a half turns about y, and a swing past the middle angle's right angle.
    let mut text = "HIERARCHY\nROOT hip\n{\nOFFSET 0 1 0\nCHANNELS 6 Xposition Yposition Zposition Zrotation Xrotation Yrotation\n\
        JOINT knee\n{\nOFFSET 0 -0.5 0\nCHANNELS 3 Zrotation Xrotation Yrotation\nEnd Site\n{\nOFFSET 0 -0.5 0\n}\n}\n}\n\
        MOTION\nFrames: 91\nFrame Time: 0.04\n"
        .to_owned();
    let row = |frame: usize| -> [f64; 9] {
        let t = frame as f64;
        [0.01 * t, 1.0, 0.0, 5.0, 3.0, 10.0 * t, 20.0, 130.0 * (t * 0.035).sin(), -15.0]
    };
    for frame in 0..91 {
        let words: Vec<String> = row(frame).iter().map(|value| format!("{value:.6}")).collect();
        let _ = writeln!(text, "{}", words.join(" "));
    }
    let source = opened("turn.bvh", text.into_bytes());
    let mut times: Vec<f64> = (0..91).map(|frame| source.clips[0].grid.time(frame)).collect();
    times.extend((0..90).map(|frame| source.clips[0].grid.time(frame) + 0.013));
    let glb = encode(&source, &source.clips, None, Path::new("turn.glb")).unwrap();
    let again = opened("turn.glb", glb.bytes);
    assert!(apart(&source.clips[0], &again.clips[0], &times) < 1e-4);
    // Anybody's viewer has something to show: a mesh bound to the joints in view.
    let json: Value = {
        let length = u32::from_le_bytes(again.bytes()[12..16].try_into().unwrap()) as usize;
        serde_json::from_slice(&again.bytes()[20..20 + length]).unwrap()
    };
    let figure = json["nodes"].as_array().unwrap().iter().find(|node| node.get("mesh").is_some()).unwrap();
    assert!(figure.get("skin").is_some());
    let positions = &json["accessors"]
        [json["meshes"][0]["primitives"][0]["attributes"]["POSITION"].as_u64().unwrap() as usize];
    let height = positions["max"][1].as_f64().unwrap() - positions["min"][1].as_f64().unwrap();
    assert!((0.9..1.4).contains(&height), "from foot to hip a metre: {height}");
    // As text with a buffer beside it.
    let beside = encode(&source, &source.clips, None, Path::new("turn.gltf")).unwrap();
    let (name, bin) = beside.beside.unwrap();
    assert_eq!(name, "turn.bin");
    let fetch = |file: &str| if file == name { Ok(bin.clone()) } else { Err(file.to_owned()) };
    let (_, clips, _) = gltf::read(beside.bytes, "turn.gltf", &fetch).unwrap();
    assert!(apart(&source.clips[0], &clips[0], &times) < 1e-4);
    // Back again: whole turns run on, and no angle jumps though the middle one passes its right angle.
    let back = encode(&again, &again.clips, None, Path::new("back.bvh")).unwrap();
    let (_, clip, _) = bvh::read(&back.bytes, "back").unwrap();
    assert!(apart(&source.clips[0], &clip, &times[..91]) < 1e-4);
    for joint in 0..2 {
        let degrees = &clip.rotation(joint).unwrap().file_angles().unwrap().degrees;
        let step = degrees.windows(2).flat_map(|pair| (0..3).map(move |i| (pair[1][i] - pair[0][i]).abs()));
        assert!(step.fold(0.0, f64::max) < 15.0, "joint {joint}");
    }
    let turned = &clip.rotation(0).unwrap().file_angles().unwrap().degrees;
    assert_close!(turned[90][2] - turned[0][2], 900.0, 1e-3);
}

/// With rates of 0 at both keys a cubic goes by 3t² − 2t³ (glTF 2.0, C.5): at t = 0.2 it is at 0.104 of the chord, where even turns
/// are at 0.2 of the arc. In the middle both are at the same place.
#[test]
fn a_smooth_way_between_frames_is_told_where_a_format_has_even_turns_alone() {
    use base64::Engine;
    const DEGREES: f64 = 40.0;
    let (sine, cosine) = (0.5 * DEGREES).to_radians().sin_cos();
    let key = |x: f64, w: f64| [0.0, 0.0, 0.0, 0.0, x, 0.0, 0.0, w, 0.0, 0.0, 0.0, 0.0];
    let numbers = [[0.0, 1.0].as_slice(), &key(0.0, 1.0), &key(sine, cosine)].concat();
    let bin: Vec<u8> = numbers.iter().flat_map(|number| (*number as f32).to_le_bytes()).collect();
    let uri = format!("data:;base64,{}", base64::engine::general_purpose::STANDARD.encode(&bin));
    let document = json!({
        "asset": { "version": "2.0" },
        "nodes": [{ "name": "a" }],
        "buffers": [{ "byteLength": bin.len(), "uri": uri }],
        "bufferViews": [{ "buffer": 0, "byteLength": 8 }, { "buffer": 0, "byteOffset": 8, "byteLength": 96 }],
        "accessors": [
            { "bufferView": 0, "componentType": 5126, "count": 2, "type": "SCALAR", "min": [0], "max": [1] },
            { "bufferView": 1, "componentType": 5126, "count": 6, "type": "VEC4" },
        ],
        "animations": [{
            "channels": [{ "sampler": 0, "target": { "node": 0, "path": "rotation" } }],
            "samplers": [{ "input": 0, "output": 1, "interpolation": "CUBICSPLINE" }],
        }],
    });
    let source = opened("slow.gltf", document.to_string().into_bytes());
    let at = 0.104 * sine;
    let off = 0.2 * DEGREES - 2.0 * at.atan2(0.896 + 0.104 * cosine).to_degrees();
    for target in ["slow.bvh", "slow.csv"] {
        let encoded = encode(&source, &source.clips, None, Path::new(target)).unwrap();
        let told: Vec<String> = encoded.notes.iter().map(ToString::to_string).collect();
        let expected = format!("up to {off:.3} degrees off, at 0.2000 s");
        assert!(told.iter().any(|note| note.contains(&expected)), "{expected}: {told:?}");
    }
}

#[test]
fn end_sites_stay_end_sites_in_csv() {
    let text = "HIERARCHY ROOT a { OFFSET 0 1 0 CHANNELS 3 Zrotation Xrotation Yrotation JOINT b { OFFSET 1 2 3 CHANNELS 0 \
        End Site { OFFSET 0 4 5 } } JOINT a_tip0 { OFFSET 0 0 1 End Site { OFFSET 0 6 0 } } End Site { OFFSET 7 0 0 } }\n\
        MOTION\nFrames: 2\nFrame Time: 0.1\n1 2 3\n4 5 6\n";
    let source = opened("tips.bvh", text.as_bytes().to_vec());
    let csv = encode(&source, &source.clips, None, Path::new("tips.csv")).unwrap();
    let again = opened("tips.csv", csv.bytes);
    let (old, new) = (&source.clips[0].skeleton, &again.clips[0].skeleton);
    let shape = |skeleton: &turnwright::skeleton::Skeleton| -> Vec<(String, Option<usize>, Vec<DVec3>)> {
        let own = skeleton.joints().iter();
        own.map(|joint| (joint.name.clone(), joint.parent, joint.tips.clone())).collect()
    };
    assert_eq!(shape(new), shape(old));
}

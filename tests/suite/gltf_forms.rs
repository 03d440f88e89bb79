//! glTF and GLB, rare but right: encodings, node forms and channels that the outside files do not show.

#![expect(clippy::unwrap_used, reason = "helpers of tests fail as tests do")]

use glam::DVec3;
use serde_json::{Value, json};
use turnwright::clip::Clip;
use turnwright::exchange::{Note, gltf};
use turnwright::rotor::{Axis, Rotor};
use turnwright::skeleton::JointKind;

use crate::gltf_broken::{set_float, small};
use crate::support::assert_close;

#[track_caller]
fn read(document: &Value) -> (gltf::Document, Vec<Clip>, Vec<Note>) {
    let fetch = |file: &str| Err(format!("{file} was asked for"));
    gltf::read(document.to_string().into_bytes(), "form.gltf", &fetch).unwrap()
}

#[track_caller]
fn keys(clip: &Clip, label: &str) -> Vec<[f64; 4]> {
    let joint = clip.skeleton.find(label).unwrap();
    clip.rotation(joint).unwrap().keys.iter().map(|key| key.to_xyzw()).collect()
}

/// A document with one animated node whose rotations are the given bytes.
fn with_rotations(
    component: u32,
    normalized: bool,
    stride: Option<u32>,
    bytes: &[u8],
    n_keys: usize,
) -> Value {
    use base64::Engine;
    let times: Vec<u8> = (0..n_keys).flat_map(|key| (key as f32).to_le_bytes()).collect();
    let text = base64::engine::general_purpose::STANDARD_NO_PAD.encode([&times, bytes].concat());
    let mut view = json!({ "buffer": 0, "byteOffset": times.len(), "byteLength": bytes.len() });
    if let Some(stride) = stride {
        view["byteStride"] = stride.into();
    }
    json!({
        "asset": { "version": "2.0" },
        "nodes": [{ "name": "a" }],
        "buffers": [{ "byteLength": times.len() + bytes.len(), "uri": format!("data:;base64,{text}") }],
        "bufferViews": [{ "buffer": 0, "byteLength": times.len() }, view],
        "accessors": [
            { "bufferView": 0, "componentType": 5126, "count": n_keys, "type": "SCALAR" },
            { "bufferView": 1, "componentType": component, "normalized": normalized, "count": n_keys, "type": "VEC4" },
        ],
        "animations": [{
            "channels": [{ "sampler": 0, "target": { "node": 0, "path": "rotation" } }],
            "samplers": [{ "input": 0, "output": 1 }],
        }],
    })
}

#[test]
fn all_integer_encodings_of_rotations() {
    let check = |component: u32, bytes: &[u8], expected: &[[f32; 4]]| {
        let (_, clips, notes) = read(&with_rotations(component, true, None, bytes, expected.len()));
        assert_eq!(notes, []);
        let expected: Vec<[f64; 4]> = expected.iter().map(|key| key.map(f64::from)).collect();
        assert_eq!(keys(&clips[0], "a"), expected, "{component}");
    };
    check(5120, &[0, 127, 0x80, 0x81], &[[0.0, 1.0, -1.0, -1.0]]);
    check(5121, &[0, 51, 255, 204], &[[0.0, 0.2, 1.0, 0.8]]);
    check(5122, &[0, 0, 0xFF, 0x7F, 0x00, 0x80, 0x01, 0x80], &[[0.0, 1.0, -1.0, -1.0]]);
    check(5123, &[0, 0, 0xFF, 0xFF, 0x33, 0x33, 0xCC, 0xCC], &[[0.0, 1.0, 0.2, 0.8]]);
}

#[test]
fn a_stride_is_borne() {
    let bytes = [0, 0, 0, 127, 9, 9, 9, 9, 127, 0, 0, 0];
    let (_, clips, _) = read(&with_rotations(5120, true, Some(8), &bytes, 2));
    assert_eq!(keys(&clips[0], "a"), [[0.0, 0.0, 0.0, 1.0], [1.0, 0.0, 0.0, 0.0]]);
}

#[test]
fn sparse_values_replace_those_of_the_view() {
    let (document, clips, notes) = read(&small());
    assert_eq!(notes, []);
    let middle = [f64::from(0.6_f32), 0.0, 0.0, f64::from(0.8_f32)];
    assert_eq!(keys(&clips[0], "root"), [[0.0, 0.0, 1.0, 0.0], middle, [1.0, 0.0, 0.0, 0.0]]);

    // A change writes plain floats, and what was sparse keeps its values.
    let joint = clips[0].skeleton.find("root").unwrap();
    let track = clips[0].rotation(joint).unwrap().with_keys(&[(1, Rotor::IDENTITY)]);
    let after = clips[0].with_rotation(joint, track);
    let output = gltf::write(&document, &[(0, &clips[0], &after)], "x").unwrap();
    let (_, again, _) = gltf::read(&output.bytes, "x", &|_| Err(String::new())).unwrap();
    assert_eq!(again[0], after);
}

#[test]
fn sparse_values_over_zeros_and_zeros_alone() {
    let mut document = small();
    document["accessors"][1].as_object_mut().unwrap().remove("bufferView");
    let (_, clips, notes) = read(&document);
    assert_eq!(notes, []);
    assert_eq!(keys(&clips[0], "root")[1], [0.0; 4]);

    document["accessors"][1].as_object_mut().unwrap().remove("sparse");
    let (_, clips, notes) = read(&document);
    assert!(notes[0].text.contains("stands for zeros"), "{notes:?}");
    assert_eq!(clips[0].rotation(1).unwrap().at(0.3), Rotor::IDENTITY);
}

#[test]
fn values_that_are_not_numbers_are_kept_for_the_finder_and_given_back() {
    let mut document = small();
    document["accessors"][1].as_object_mut().unwrap().remove("sparse");
    set_float(&mut document, 7, f32::NAN);
    let (document, clips, _) = read(&document);
    let joint = clips[0].skeleton.find("root").unwrap();
    assert!(!clips[0].rotation(joint).unwrap().keys[1].is_finite());
    let copy = clips[0].with_rotation(joint, clips[0].rotation(joint).unwrap().clone());
    let output = gltf::write(&document, &[(0, &clips[0], &copy)], "x").unwrap();
    assert!(output.bin.is_none() && output.notes.is_empty());
    let again = gltf::read(&output.bytes, "x", &|_| Err(String::new())).unwrap().1;
    assert!(again[0].rotation(joint).unwrap().changed_keys(clips[0].rotation(joint).unwrap()).is_empty());
}

#[test]
fn numbers_in_any_spelling_and_a_byte_order_mark() {
    let text =
        small().to_string().replace("\"count\":3", "\"count\":3.0e0").replace("\"node\":1", "\"node\":10e-1");
    let bytes = [b"\xEF\xBB\xBF \n".as_slice(), text.as_bytes()].concat();
    let (_, clips, _) = gltf::read(bytes, "bom.gltf", &|_| Err(String::new())).unwrap();
    assert_eq!(clips[0].rotation(1).unwrap().keys.len(), 3);
}

#[test]
fn the_skeleton_holds_joints_and_what_carries_them() {
    let mut document = small();
    document["nodes"] = json!([
        { "name": "world", "scale": [2, 2, 2], "children": [4, 1, 5] },
        { "name": "between", "children": [2, 3] },
        { "name": "arm", "translation": [0, 1, 0] },
        { "name": "a mesh" },
        { "name": "arm", "rotation": [0, 0, 0, 0.5] },
        { "children": [6] },
        { "name": "camera" },
        { "name": "another tree" },
    ]);
    document["skins"] = json!([{ "joints": [2, 4], "skeleton": 7 }, { "joints": [4, 4] }]);
    document["animations"][0]["channels"][0]["target"]["node"] = json!(5);
    document["animations"][0]["channels"][1]["target"]["node"] = json!(2);
    let (document, clips, notes) = read(&document);
    assert_eq!(notes, []);
    let skeleton = document.skeleton();
    let found: Vec<(&str, JointKind, usize, Option<usize>)> = (0..skeleton.len())
        .map(|joint| {
            let own = &skeleton.joints()[joint];
            (skeleton.label(joint), own.kind, own.number, own.parent)
        })
        .collect();
    let expected = [
        ("world", JointKind::Carrier, 0, None),
        ("arm#4", JointKind::Joint, 4, Some(0)),
        ("between", JointKind::Carrier, 1, Some(0)),
        ("arm#2", JointKind::Joint, 2, Some(2)),
        ("#5", JointKind::Joint, 5, Some(0)),
    ];
    assert_eq!(found, expected);
    assert_eq!(skeleton.joints()[1].rest.rotation, Rotor::IDENTITY);
    // The first key is held before its time; ancestors scale what hangs below them.
    assert_eq!(clips[0].world_at(-1.0)[3].position(), DVec3::new(2.0, 4.0, 6.0));
}

#[test]
fn matrices_are_split_and_shear_is_told() {
    let turn = Axis::Z.rotor(0.5).to_matrix();
    let columns = [turn.x_axis * 2.0, turn.y_axis * 3.0, turn.z_axis * -4.0];
    let matrix: Vec<f64> =
        columns.iter().flat_map(|c| [c.x, c.y, c.z, 0.0]).chain([5.0, 6.0, 7.0, 1.0]).collect();
    let mut document = small();
    document["nodes"][0]["matrix"] = json!(matrix);
    let (read_document, _, notes) = read(&document);
    assert_eq!(notes, []);
    let rest = read_document.skeleton().joints()[0].rest;
    assert_close!(rest.translation, DVec3::new(5.0, 6.0, 7.0), 0.0);
    let again = rest.to_affine().matrix3.to_cols_array();
    assert_close!(again, glam::DMat3::from_cols(columns[0], columns[1], columns[2]).to_cols_array(), 1e-12);
    assert!(rest.scale.x < 0.0, "the reflection lies on one axis: {}", rest.scale);

    document["nodes"][0]["matrix"] = json!([1, 0, 0, 0, 0.5, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1]);
    let (_, _, notes) = read(&document);
    assert_eq!(notes[0].place, "nodes[0].matrix");
    assert!(notes[0].text.contains("found shear"));

    document["nodes"][0].as_object_mut().unwrap().remove("matrix");
    document["nodes"][2] = json!({ "matrix": [1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0, 0, 9, 0, 1] });
    let (_, _, notes) = read(&document);
    assert!(
        notes[0].to_string().starts_with("nodes[2].matrix: expected translation, rotation and scale"),
        "{notes:?}"
    );
}

#[test]
fn channels_of_other_things_are_left_alone_and_counted_in_time() {
    let mut document = small();
    let channels = document["animations"][0]["channels"].as_array_mut().unwrap();
    channels.push(json!({ "sampler": 2, "target": { "node": 1, "path": "weights" } }));
    channels.push(json!({ "sampler": 2, "target": { "path": "pointer", "extensions": {
        "KHR_animation_pointer": { "pointer": "/materials/0/pbrMetallicRoughness/roughnessFactor" },
    }}}));
    channels.push(json!({ "sampler": 0, "target": { "path": "rotation" } }));
    channels.push(json!({ "sampler": 0, "target": { "node": 1, "path": "colour" } }));
    channels.push(json!({ "sampler": 0, "target": { "node": 1, "path": "rotation" } }));
    // Played by weights and a pointer alone, up to 4 s.
    document["animations"][0]["samplers"].as_array_mut().unwrap().push(json!({ "input": 3, "output": 3 }));
    document["accessors"].as_array_mut().unwrap().push(
        json!({ "bufferView": 2, "byteOffset": 12, "componentType": 5126, "count": 1, "type": "SCALAR" }),
    );
    let (_, clips, notes) = read(&document);
    assert_eq!(clips[0].duration_secs, 4.0);
    assert_eq!(clips[0].skeleton.listed().count(), 2);
    let texts: Vec<&str> = notes.iter().map(|note| note.text.as_str()).collect();
    for expected in
        ["driven by KHR_animation_pointer", "without a node", "of an unknown path", "that repeat the target"]
    {
        assert!(texts.iter().any(|text| text.contains(&format!("1 channel(s) {expected}"))), "{texts:?}");
    }
}

#[test]
fn extensions_that_are_required_and_unknown_are_told() {
    let mut document = small();
    document["extensionsRequired"] = json!(["KHR_mesh_quantization", "ACME_unheard_of"]);
    let (_, clips, notes) = read(&document);
    assert_eq!(clips.len(), 1);
    assert_eq!(notes.len(), 1);
    assert!(notes[0].to_string().contains("`ACME_unheard_of` is not known here"));
}

#[test]
fn a_compressed_view_that_has_plain_data_too_is_read() {
    let mut document = small();
    document["extensionsUsed"] = json!(["EXT_meshopt_compression"]);
    document["bufferViews"][1]["extensions"] = json!({ "EXT_meshopt_compression": { "buffer": 0 } });
    let (_, clips, _) = read(&document);
    assert_eq!(clips[0].rotation(1).unwrap().keys.len(), 3);
}

#[test]
fn buffers_that_animation_does_not_need_are_not_opened() {
    let mut document = small();
    document["buffers"].as_array_mut().unwrap().push(json!({ "byteLength": 1000, "uri": "mesh%20data.bin" }));
    document["images"] = json!([{ "uri": "skin.png" }, { "uri": "../outside.png" }]);
    let (read_document, clips, notes) = read(&document);
    assert_eq!((clips.len(), notes.len()), (1, 0));
    assert_eq!(read_document.external_files(), ["mesh data.bin", "skin.png"]);
}

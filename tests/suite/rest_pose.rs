//! The pose that turns are measured from: which there are, which is taken, and that no choice changes how a clip plays.

#![expect(clippy::unwrap_used, reason = "helpers of tests fail as tests do")]

use std::path::Path;

use base64::Engine;
use glam::{DAffine3, DMat4, DQuat, DVec3};
use serde_json::{Value, json};
use turnwright::exchange::{OpenOptions, Source, bvh, open_bytes};
use turnwright::rotor::Rotor;
use turnwright::skeleton::RestChoice;

use crate::support::assert_close;

/// Where a joint is bound, in the mesh; of the size that the carrier gives it.
fn bound(turn: DQuat, place: DVec3) -> DAffine3 {
    DAffine3::from_scale_rotation_translation(DVec3::splat(2.0), turn, place)
}

/// `carrier` (turned and scaled) over `hip` over `between` (no joint) over `knee`; the nodes stand bent, the skins are bound
/// straight. One rotation channel on the hip. `skins` are lists of nodes with their binds.
fn figure(skins: &[(&[usize], &[DAffine3])]) -> Value {
    let mut bytes: Vec<u8> = [0.0_f32, 1.0].iter().flat_map(|secs| secs.to_le_bytes()).collect();
    let keys: [f32; 8] = [0.0, 0.0, 0.6, 0.8, 0.0, 0.0, 0.0, 1.0];
    bytes.extend(keys.iter().flat_map(|number| number.to_le_bytes()));
    let mut views = vec![
        json!({ "buffer": 0, "byteLength": 8 }),
        json!({ "buffer": 0, "byteOffset": 8, "byteLength": 32 }),
    ];
    let mut accessors = vec![
        json!({ "bufferView": 0, "componentType": 5126, "count": 2, "type": "SCALAR", "min": [0], "max": [1] }),
        json!({ "bufferView": 1, "componentType": 5126, "count": 2, "type": "VEC4" }),
    ];
    let mut listed = Vec::new();
    for (joints, binds) in skins {
        let mut skin = json!({ "joints": joints, "skeleton": 3 });
        if !binds.is_empty() {
            let start = bytes.len();
            for bind in *binds {
                let columns = DMat4::from(bind.inverse()).to_cols_array();
                bytes.extend(columns.iter().flat_map(|&number| (number as f32).to_le_bytes()));
            }
            views.push(json!({ "buffer": 0, "byteOffset": start, "byteLength": bytes.len() - start }));
            accessors.push(json!({
                "bufferView": views.len() - 1, "componentType": 5126, "count": binds.len(), "type": "MAT4"
            }));
            skin["inverseBindMatrices"] = json!(accessors.len() - 1);
        }
        listed.push(skin);
    }
    let text = base64::engine::general_purpose::STANDARD.encode(&bytes);
    json!({
        "asset": { "version": "2.0" },
        "scene": 0,
        "scenes": [{ "nodes": [0] }],
        "nodes": [
            { "name": "carrier", "children": [1], "scale": [2, 2, 2], "rotation": [0.6, 0, 0, 0.8] },
            { "name": "hip", "children": [2], "translation": [0, 1, 0], "rotation": [0, 0, 0.6, 0.8] },
            { "name": "between", "children": [3], "translation": [0, -0.5, 0] },
            { "name": "knee", "translation": [0, -0.5, 0], "rotation": [0, 0.6, 0, 0.8] },
        ],
        "skins": listed,
        "buffers": [{ "byteLength": bytes.len(), "uri": format!("data:;base64,{text}") }],
        "bufferViews": views,
        "accessors": accessors,
        "animations": [{
            "channels": [{ "sampler": 0, "target": { "node": 1, "path": "rotation" } }],
            "samplers": [{ "input": 0, "output": 1 }],
        }],
    })
}

/// A figure whose three rest poses all differ: hip and knee stand bent, are bound straight, and the clip begins with the hip's
/// first key. `hip_node` is how its node stands.
#[cfg(feature = "gui-tests")]
pub(crate) fn bent_figure(hip_node: [f64; 4]) -> Vec<u8> {
    let mut document = figure(&[(&[3, 1], &[bound(DQuat::IDENTITY, KNEE), bound(DQuat::IDENTITY, HIP)])]);
    document["nodes"][1]["rotation"] = json!(hip_node);
    document.to_string().into_bytes()
}

#[track_caller]
fn opened(document: &Value, rest: Option<RestChoice>) -> Source {
    let options = OpenOptions { rest, ..OpenOptions::default() };
    open_bytes(Path::new("figure.gltf"), document.to_string().into_bytes(), &options).unwrap()
}

const HIP: DVec3 = DVec3::new(0.25, 3.0, 0.5);
const KNEE: DVec3 = DVec3::new(0.25, 1.0, 0.5);

#[test]
fn skins_with_matrices_are_measured_from_their_bind_pose() {
    let turn = DQuat::from_rotation_y(0.3);
    let source = opened(&figure(&[(&[3, 1], &[bound(turn, KNEE), bound(DQuat::IDENTITY, HIP)])]), None);
    assert_eq!((source.rest, source.notes.len()), (RestChoice::Bind, 0));
    assert_eq!(source.rests, [RestChoice::Bind, RestChoice::Defaults, RestChoice::FirstFrame]);
    let skeleton = &source.clips[0].skeleton;
    assert_eq!(skeleton.rest_choice(), RestChoice::Bind);
    // Each joint stands where the matrices say, whatever is above and between.
    let world = skeleton.world(&skeleton.chosen_rest_pose());
    let [hip, knee] = ["hip", "knee"].map(|name| skeleton.find(name).unwrap());
    assert_close!(world[hip].position(), HIP, 1e-6);
    assert_close!(world[knee].position(), KNEE, 1e-6);
    let expected = Rotor::from_xyzw(turn.to_array());
    assert_close!(world[knee].rotation, expected, 1e-6);
    // A mesh in hundredths of the scene's lengths is bound in the same pose.
    let small = [bound(turn, KNEE), bound(DQuat::IDENTITY, HIP)];
    let small = small.map(|bind| DAffine3::from_scale(DVec3::splat(0.01)) * bind);
    let small = opened(&figure(&[(&[3, 1], &small)]), None);
    let same = small.clips[0].skeleton.chosen_rest_pose();
    let world = skeleton.world(&same);
    assert_close!(world[hip].position(), HIP, 1e-5);
    assert_close!(world[knee].position(), KNEE, 1e-5);
    // It plays as before: the knee has no channel and keeps the turn of its node.
    let defaults = source.with_rest(Some(RestChoice::Defaults)).unwrap();
    for secs in [0.0, 0.4, 1.0] {
        assert_eq!(source.clips[0].local_at(secs), defaults.clips[0].local_at(secs));
    }
    assert_eq!(defaults.clips[0].skeleton.chosen_rest_pose(), skeleton.rest_pose());
    // The first frame: the hip's key, all else as the nodes stand.
    let first = source.with_rest(Some(RestChoice::FirstFrame)).unwrap();
    let pose = first.clips[0].skeleton.chosen_rest_pose();
    assert_close!(pose[hip].rotation, Rotor::from_xyzw([0.0, 0.0, 0.6, 0.8]), 1e-7);
    assert_close!(pose[knee].rotation, Rotor::from_xyzw([0.0, 0.6, 0.0, 0.8]), 1e-12);
}

#[test]
fn the_pose_that_is_asked_for_is_the_zero_pose_of_a_new_bvh() {
    let binds = [bound(DQuat::IDENTITY, HIP), bound(DQuat::IDENTITY, KNEE)];
    let document = figure(&[(&[1, 3], &binds)]);
    let offset = |rest: Option<RestChoice>| {
        let source = opened(&document, rest);
        let (text, _) = bvh::from_clip(&source.clips[0]);
        let (_, clip, _) = bvh::read(&text, "new").unwrap();
        // Whatever the zero pose is, every joint is where it was.
        for secs in [0.0, 1.0] {
            let (was, is) = (source.clips[0].world_at(secs), clip.world_at(secs));
            for (name, joint) in [("hip", 0), ("knee", 1)] {
                let old = was[source.clips[0].skeleton.find(name).unwrap()].position();
                assert_close!(is[joint].position(), old, 1e-5, "{name} at {secs} measured from {rest:?}");
            }
        }
        clip.skeleton.joints()[1].rest.translation
    };
    assert_close!(offset(Some(RestChoice::Bind)), KNEE - HIP, 1e-5);
    // Below the bent nodes the knee hangs elsewhere; unasked the nodes are the rest, in one format as in the other.
    assert!(offset(None).distance(KNEE - HIP) > 0.5);
    assert_close!(offset(None), offset(Some(RestChoice::Defaults)), 0.0);
}

#[test]
fn joints_that_two_skins_bind_differently_take_the_first_and_it_is_told() {
    let straight = [bound(DQuat::IDENTITY, HIP), bound(DQuat::IDENTITY, KNEE)];
    // The same skin moved as a whole is the same bind.
    let moved = straight.map(|bind| DAffine3::from_translation(DVec3::new(5.0, 0.0, 1.0)) * bind);
    let source = opened(&figure(&[(&[1, 3], &straight), (&[1, 3], &moved)]), None);
    assert!(source.notes.is_empty(), "{:?}", source.notes);
    let bent = [straight[0], bound(DQuat::from_rotation_x(0.4), KNEE)];
    let source = opened(&figure(&[(&[1, 3], &straight), (&[1, 3], &bent), (&[1], &[])]), None);
    let notes: Vec<String> = source.notes.iter().map(ToString::to_string).collect();
    assert_eq!(
        notes,
        [
            "skins[1].inverseBindMatrices: expected the bind pose that skins[0] gives, found another for 1 joint(s), \
          `knee` first; that of skins[0] is used"
        ]
    );
    let skeleton = &source.clips[0].skeleton;
    let knee = skeleton.find("knee").unwrap();
    assert_close!(skeleton.world(&skeleton.chosen_rest_pose())[knee].rotation, Rotor::IDENTITY, 1e-6);
}

#[test]
fn without_matrices_the_nodes_are_the_rest_pose() {
    let source = opened(&figure(&[(&[1, 3], &[])]), None);
    assert_eq!(source.rest, RestChoice::Defaults);
    let asked = OpenOptions { rest: Some(RestChoice::Bind), ..OpenOptions::default() };
    let bytes = figure(&[(&[1, 3], &[])]).to_string().into_bytes();
    let error = open_bytes(Path::new("figure.gltf"), bytes, &asked).unwrap_err().to_string();
    assert_eq!(
        error,
        "figure.gltf: rest pose: expected defaults or first-frame, found bind; choose one of those"
    );
}

#[test]
fn matrices_that_can_not_be_read_are_told_and_the_clip_plays_all_the_same() {
    let mut document = figure(&[(&[1, 3], &[bound(DQuat::IDENTITY, HIP), bound(DQuat::IDENTITY, KNEE)])]);
    document["accessors"][2]["type"] = json!("VEC4");
    let source = opened(&document, None);
    assert_eq!(source.rest, RestChoice::Defaults);
    let note = source.notes[0].to_string();
    assert_eq!(note, "accessors[2].type: expected `MAT4`, found `VEC4`; the bind pose is not read");
    document["accessors"][2] = json!({ "componentType": 5126, "count": 2, "type": "MAT4" });
    // All zeros: no joint stands anywhere by them.
    assert_eq!(opened(&document, None).rest, RestChoice::Defaults);
}

#[test]
fn a_bvh_is_measured_from_its_zero_pose_or_from_its_first_frame() {
    let text = "HIERARCHY ROOT a { OFFSET 0 1 0 CHANNELS 3 Zrotation Xrotation Yrotation JOINT b { OFFSET 0 1 0 CHANNELS 1 \
        Xrotation } }\nMOTION\nFrames: 2\nFrame Time: 0.1\n90 0 0 30\n0 0 0 0\n";
    let open = |rest| {
        let options = OpenOptions { rest, ..OpenOptions::default() };
        open_bytes(Path::new("a.bvh"), text.as_bytes().to_vec(), &options).unwrap()
    };
    let source = open(None);
    assert_eq!(
        (source.rest, source.rests.as_slice()),
        (RestChoice::Defaults, &[RestChoice::Defaults, RestChoice::FirstFrame][..])
    );
    let first = open(Some(RestChoice::FirstFrame));
    let turn = first.clips[0].skeleton.chosen_rest(0).rotation;
    assert_close!(turn, Rotor::from_xyzw([0.0, 0.0, 0.5_f64.sqrt(), 0.5_f64.sqrt()]), 1e-12);
    assert_eq!(first.clips[0].local_at(0.1), source.clips[0].local_at(0.1));
}

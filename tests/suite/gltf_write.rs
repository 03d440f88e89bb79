//! glTF and GLB, writing: what was not changed stays byte for byte, what was changed is read back bit for bit, and
//! clips of other formats become files that play the same.

#![expect(clippy::unwrap_used, reason = "helpers of tests fail as tests do")]

use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use glam::DVec3;
use serde_json::{Value, json};
use turnwright::clip::{Clip, FrameGrid, JointTracks, PathKind, Paths, RotationTrack, Times, VectorTrack};
use turnwright::exchange::{disk, gltf};
use turnwright::rotor::{Axis, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::gltf::{Raw, open, outside_files, whole};
use crate::gltf_broken;
use crate::support::{assert_close, list};

/// Where written files go for the validator, and the list of them: source and result, one pair a line.
fn written_folder() -> PathBuf {
    Path::new(env!("CARGO_TARGET_TMPDIR")).join("gltf-written")
}

/// A rotor whose numbers are floats of 32 bits, as a file can hold them.
fn rounded(rotor: Rotor) -> Rotor {
    Rotor::from_xyzw(rotor.to_xyzw().map(|number| f64::from(number as f32)))
}

/// Reads a result back, with its buffer and the files beside the source at hand.
#[track_caller]
fn read_back(output: &gltf::Output, source: &Path) -> (gltf::Document, Vec<Clip>) {
    let fetch = |file: &str| match &output.bin {
        Some((name, bytes)) if name == file => Ok(bytes.clone()),
        _ => disk::read(&source.with_file_name(file)).map_err(|error| error.to_string()),
    };
    let (document, clips, _) = gltf::read(&output.bytes, "result", &fetch).unwrap();
    (document, clips)
}

#[track_caller]
fn raw_of(output: &gltf::Output, source: &Path) -> Raw {
    Raw::new(&output.bytes, &|file| match &output.bin {
        Some((name, bytes)) if name == file => bytes.clone(),
        _ => disk::read(&source.with_file_name(file)).unwrap(),
    })
}

/// The clip with one key of one joint turned a little further.
fn nudged(clip: &Clip, joint: usize, key: usize) -> Clip {
    let track = clip.rotation(joint).unwrap();
    let turned = rounded((track.sound_key(key) * Axis::X.rotor(0.05)).normalize());
    clip.with_rotation(joint, track.with_keys(&[(key, turned)]))
}

/// The first joint with a rotation track, and a key in its middle.
fn some_key(clip: &Clip) -> Option<(usize, usize)> {
    let joint = (0..clip.joints.len()).find(|&joint| clip.rotation(joint).is_some())?;
    Some((joint, clip.rotation(joint)?.keys.len() / 2))
}

fn n_bits_apart(a: &RotationTrack, b: &RotationTrack) -> usize {
    a.changed_keys(b).len() + usize::from(a.times != b.times) + usize::from(a.tangents != b.tangents)
}

#[test]
fn without_changes_every_outside_file_comes_back_byte_for_byte() {
    for path in outside_files() {
        let (document, clips, _) = open(&path);
        // Copies that share nothing: equality is told by numbers and not by address.
        let copies: Vec<Clip> = clips
            .iter()
            .map(|clip| Clip {
                joints: clip.joints.iter().map(|tracks| Arc::new(JointTracks::clone(tracks))).collect(),
                ..clip.clone()
            })
            .collect();
        let all: Vec<(usize, &Clip, &Clip)> =
            clips.iter().zip(&copies).enumerate().map(|(index, (a, b))| (index, a, b)).collect();
        let output = gltf::write(&document, &all, "copy").unwrap();
        assert!(output.bytes == disk::read(&path).unwrap(), "{}", path.display());
        assert_eq!(output.bin, None);
        assert_eq!(output.notes, []);
    }
}

#[test]
fn one_changed_key_changes_one_sampler_and_nothing_else() {
    let mut pairs = String::new();
    for path in outside_files() {
        let (document, clips, _) = open(&path);
        let changed = clips.iter().enumerate().rev().find_map(|(index, clip)| Some((index, some_key(clip)?)));
        let Some((index, (joint, key))) = changed else { continue };
        let after = nudged(&clips[index], joint, key);
        let stem = format!("{}-nudged", path.file_stem().unwrap().to_string_lossy());
        let output = gltf::write(&document, &[(index, &clips[index], &after)], &stem).unwrap();
        let name = path.display();

        // Read back: every clip is bit for bit what was intended.
        let (_, again) = read_back(&output, &path);
        for (number, clip) in again.iter().enumerate() {
            let intended = if number == index { &after } else { &clips[number] };
            assert_eq!(clip, intended, "{name} clip {number}");
        }
        assert_eq!(
            n_bits_apart(again[index].rotation(joint).unwrap(), clips[index].rotation(joint).unwrap()),
            1
        );

        // The document: old members equal, apart from the one sampler and the buffer's length and place.
        let (old, new) = (Raw::open(&path), raw_of(&output, &path));
        let grown: Vec<usize> =
            (0..old.buffers.len()).filter(|&at| new.buffers[at] != old.buffers[at]).collect();
        assert_eq!((grown.len(), new.buffers.len()), (1, old.buffers.len()), "{name}: buffers");
        let grown = grown[0];
        assert!(new.buffers[grown].starts_with(&old.buffers[grown]), "{name}: old bytes");
        let mut expected = old.json.clone();
        for (key, n_new) in [("accessors", 1), ("bufferViews", 1)] {
            let (old, new) = (list(&old.json[key]), list(&new.json[key]));
            assert_eq!(new.len(), old.len() + n_new, "{name} {key}");
            expected[key] = new.into();
            assert_eq!(new[..old.len()], *old, "{name} {key}");
        }
        expected["buffers"][grown]["byteLength"] = new.buffers[grown].len().into();
        if let Some(uri) = new.json["buffers"][grown].get("uri") {
            expected["buffers"][grown]["uri"] = uri.clone();
        }
        let differing: Vec<usize> = {
            let [a, b] = [&old, &new].map(|raw| list(&raw.json["animations"][index]["samplers"]));
            assert_eq!(a.len(), b.len());
            (0..a.len()).filter(|&at| a[at] != b[at]).collect()
        };
        assert_eq!(differing.len(), 1, "{name}");
        expected["animations"][index]["samplers"][differing[0]]["output"] =
            (list(&old.json["accessors"]).len()).into();
        assert!(new.json == expected, "{name}:\n{}\n{expected}", new.json);

        // For the validator.
        let folder = written_folder();
        let target = folder.join(format!("{stem}.{}", path.extension().unwrap().to_string_lossy()));
        disk::write(&target, &output.bytes).unwrap();
        if let Some((name, bytes)) = &output.bin {
            disk::write(&folder.join(name), bytes).unwrap();
        }
        for file in &output.external {
            let bytes = disk::read(&path.with_file_name("").join(file)).unwrap();
            disk::write(&folder.join(file), &bytes).unwrap();
        }
        writeln!(pairs, "{}\t{}", path.display(), target.display()).unwrap();
    }
    if !pairs.is_empty() {
        disk::write(&written_folder().join("pairs.tsv"), pairs.as_bytes()).unwrap();
    }
}

/// A GLB of the given document and data, put together here.
fn glb(json: &str, bin: &[u8], more: &[(u32, &[u8])]) -> Vec<u8> {
    let mut text = json.as_bytes().to_vec();
    text.resize(text.len().next_multiple_of(4), b' ');
    let mut body = Vec::new();
    for (kind, data) in [(0x4E4F_534A, text.as_slice()), (0x004E_4942, bin)].iter().chain(more) {
        body.extend((data.len() as u32).to_le_bytes());
        body.extend(kind.to_le_bytes());
        body.extend_from_slice(data);
    }
    let mut bytes = b"glTF\x02\0\0\0".to_vec();
    bytes.extend((12 + body.len() as u32).to_le_bytes());
    bytes.extend(body);
    bytes
}

fn floats(numbers: &[f32]) -> Vec<u8> {
    numbers.iter().flat_map(|number| number.to_le_bytes()).collect()
}

fn no_files(_: &str) -> Result<Vec<u8>, String> {
    Err("no files here".to_owned())
}

/// Two joints play one sampler; a third channel plays it by a pointer. Odd spelling, unknown members, repeated keys and an
/// unknown chunk are there to be kept.
const SHARED: &str = r#"{ "asset":{"version":"2.0","\u0065xtra":1.50E+1}, "nodes":[{"name":"a","children":[1]},{"matrix":
 [1,0,0,0, 0,1,0,0, 0,0,1,0, 3,0,0,1]}],
 "buffers":[{"byteLength":9,"byteLength":44,"extras":{"k":[ ]}}],
 "bufferViews":[{"buffer":0,"byteLength":12},{"buffer":0,"byteOffset":12,"byteLength":32}],
 "accessors":[ {"bufferView":0,"componentType":5126,"count":3e0,"type":"SCALAR","min":[0],"max":[1.0]} ,
   {"bufferView":1,"componentType":5126,"count":2,"type":"VEC4"},
   {"bufferView":0,"componentType":5126,"count":2,"type":"SCALAR","min":[0],"max":[0.5]} ],
 "zzz":[1.0,1e2,-0], "animations":[{"channels":[{"sampler":0,"target":{"node":0,"path":"rotation"}},
  {"sampler":0,"target":{"node":1,"path":"rotation"}}],"samplers":[{"input":2,"output":1,"extras":"s"}]}]}"#;

fn shared_sampler() -> Vec<u8> {
    let mut bin = floats(&[0.0, 0.5, 1.0]);
    bin.extend(floats(&[0.0, 0.0, 0.0, 1.0, 0.6, 0.0, 0.0, 0.8]));
    glb(SHARED, &bin, &[(0x1234_5678, b"keep")])
}

#[test]
fn a_shared_sampler_is_split_where_only_one_joint_changes() {
    let (document, clips, _) = gltf::read(shared_sampler(), "shared.glb", &no_files).unwrap();
    let after = nudged(&clips[0], 1, 1);
    let output = gltf::write(&document, &[(0, &clips[0], &after)], "x").unwrap();
    let (_, again, _) = gltf::read(&output.bytes, "again.glb", &no_files).unwrap();
    assert_eq!(again[0], after);
    let text = String::from_utf8_lossy(&output.bytes);
    // The text is the old one with insertions, spelling and all.
    let expected = SHARED
        .replace(r#""byteLength":44"#, r#""byteLength":76"#)
        .replace(r#""byteLength":32}"#, r#""byteLength":32},{"buffer":0,"byteOffset":44,"byteLength":32}"#)
        .replace(
            "\"max\":[0.5]}",
            "\"max\":[0.5]},\n   {\"bufferView\":2,\"componentType\":5126,\"count\":2,\"type\":\"VEC4\"}",
        )
        .replace(r#"{"sampler":0,"target":{"node":1"#, r#"{"sampler":1,"target":{"node":1"#)
        .replace(r#""extras":"s"}"#, r#""extras":"s"},{"input":2,"output":3,"extras":"s"}"#);
    assert!(text.contains(&expected), "{text}");
    assert!(output.bytes.ends_with(b"\x04\0\0\0\x78\x56\x34\x12keep"));
}

#[test]
fn a_shared_sampler_stays_shared_where_both_joints_change_alike() {
    let (document, clips, _) = gltf::read(shared_sampler(), "shared.glb", &no_files).unwrap();
    let after = nudged(&nudged(&clips[0], 0, 1), 1, 1);
    let output = gltf::write(&document, &[(0, &clips[0], &after)], "x").unwrap();
    let raw = Raw::new(&output.bytes, &|_| unreachable!());
    assert_eq!(list(&raw.json["animations"][0]["samplers"]).len(), 1);
    assert_eq!(list(&raw.json["accessors"]).len(), 4);
    let (_, again, _) = gltf::read(&output.bytes, "again.glb", &no_files).unwrap();
    assert_eq!(again[0], after);

    // And where they change unlike, each gets its own.
    let unlike = nudged(&nudged(&clips[0], 0, 0), 1, 1);
    let output = gltf::write(&document, &[(0, &clips[0], &unlike)], "x").unwrap();
    let (_, again, _) = gltf::read(&output.bytes, "again.glb", &no_files).unwrap();
    assert_eq!(again[0], unlike);
}

#[test]
fn changed_keys_follow_the_sign_of_the_key_before_and_others_stay() {
    let (document, clips) = gltf_broken::read(&gltf_broken::small_glb()).unwrap();
    let clip = &clips[0];
    let joint = (0..clip.joints.len()).find(|&joint| clip.rotation(joint).is_some()).unwrap();
    let track = clip.rotation(joint).unwrap();
    // The last stored key is opposite to what is put before it; it is not touched.
    let last = track.keys[2];
    let first = track.keys[0];
    let near_first = (first * Axis::X.rotor(0.1)).normalize().scale(-1.0);
    let after = clip.with_rotation(joint, track.with_keys(&[(1, near_first)]));
    let output = gltf::write(&document, &[(0, clip, &after)], "signs").unwrap();
    let (_, again) = gltf_broken::read(&output.bytes).unwrap();
    let keys = &again[0].rotation(joint).unwrap().keys;
    assert_eq!((keys[0], keys[2]), (first, last));
    assert_eq!(keys[1], rounded(near_first.scale(-1.0)));

    // New times: all keys are new, and run on with one sign.
    let secs = [0.0, 0.25, 0.5, 1.0];
    let turned = |angle: f64, sign: f64| Axis::Z.rotor(angle).scale(sign);
    let new = vec![turned(0.1, 1.0), turned(0.4, -1.0), turned(0.7, -1.0), turned(1.0, 1.0)];
    let track = RotationTrack::from_rotors(Times::Listed(secs.into()), new.clone());
    let after = clip.with_rotation(joint, RotationTrack { keys: new.into(), ..track });
    let output = gltf::write(&document, &[(0, clip, &after)], "signs").unwrap();
    let (_, again) = gltf_broken::read(&output.bytes).unwrap();
    let keys = &again[0].rotation(joint).unwrap().keys;
    assert!(keys.windows(2).all(|pair| pair[0].dot(pair[1]) > 0.9), "{keys:?}");
}

#[test]
fn new_times_new_tracks_and_other_paths_are_written() {
    let (document, clips, _) = gltf::read(shared_sampler(), "shared.glb", &no_files).unwrap();
    let keys: Vec<Rotor> = [0.0, 0.3, 0.9].map(|angle| rounded(Axis::Y.rotor(angle))).to_vec();
    let track = RotationTrack {
        paths: Paths::Every(PathKind::Hold),
        ..RotationTrack::from_rotors(Times::Listed([0.25, 0.5, 2.0].into()), keys)
    };
    let mut after = clips[0].with_rotation(0, track);
    let mut second = JointTracks::clone(&after.joints[1]);
    let times = Times::Listed([0.25, 0.5, 2.0].into());
    second.translation = Some(VectorTrack::straight(times, [DVec3::X, DVec3::Y, DVec3::Z].to_vec()));
    after.joints[1] = Arc::new(second);
    let output = gltf::write(&document, &[(0, &clips[0], &after)], "x").unwrap();
    let (_, again, _) = gltf::read(&output.bytes, "again.glb", &no_files).unwrap();
    assert_eq!(again[0].joints, after.joints);
    let raw = Raw::new(&output.bytes, &|_| unreachable!());
    // One input serves both; it states its ends, and the second node now has no matrix.
    let accessors = list(&raw.json["accessors"]);
    assert_eq!(accessors.len(), 6);
    assert!(accessors.iter().any(|own| own["min"] == json!([0.25]) && own["max"] == json!([2.0])));
    assert_eq!(raw.json["nodes"][1].get("matrix"), None);
    assert_eq!(raw.json["nodes"][1]["translation"], json!([3.0, 0.0, 0.0]));
    assert_eq!(
        raw.json["animations"][0]["channels"][2]["target"],
        json!({ "node": 1, "path": "translation" })
    );
}

#[test]
fn a_smooth_path_is_written_as_keys_that_follow_it() {
    let (document, clips, _) = gltf::read(shared_sampler(), "shared.glb", &no_files).unwrap();
    let keys: Vec<Rotor> = [0.0, 1.2, -0.4, 0.1, 0.3].map(|angle| rounded(Axis::Z.rotor(angle))).to_vec();
    let kinds = [PathKind::Squad, PathKind::Squad, PathKind::Hold, PathKind::Slerp];
    let smooth = RotationTrack {
        paths: Paths::Each(kinds.into()),
        ..RotationTrack::from_rotors(Times::Listed([0.0, 1.0, 1.5, 2.0, 3.0].into()), keys)
    };
    let after = clips[0].with_rotation(0, smooth.clone());
    let output = gltf::write(&document, &[(0, &clips[0], &after)], "x").unwrap();
    let (_, again, _) = gltf::read(&output.bytes, "again.glb", &no_files).unwrap();
    let written = again[0].rotation(0).unwrap();
    assert_eq!(written.paths, Paths::Every(PathKind::Cubic));
    for step in 0..=300 {
        let time = f64::from(step) / 100.0;
        assert_close!(written.at(time), smooth.at(time), 0.01_f64.to_radians(), "at {time}");
    }
    assert_eq!(output.notes, []);
}

#[test]
fn repeated_key_times_are_gone_from_a_sampler_that_changed() {
    let json = r#"{"asset":{"version":"2.0"},"nodes":[{}],"buffers":[{"byteLength":60}],
        "bufferViews":[{"buffer":0,"byteLength":12},{"buffer":0,"byteOffset":12,"byteLength":48}],
        "accessors":[{"bufferView":0,"componentType":5126,"count":3,"type":"SCALAR"},
            {"bufferView":1,"componentType":5126,"count":3,"type":"VEC4"}],
        "animations":[{"channels":[{"sampler":0,"target":{"node":0,"path":"rotation"}}],
            "samplers":[{"input":0,"output":1}]}]}"#;
    let mut bin = floats(&[0.5, 0.5, 1.0]);
    bin.extend(floats(&[0.0, 0.0, 0.0, 1.0, 0.6, 0.0, 0.0, 0.8, 0.0, 0.6, 0.0, 0.8]));
    let bytes = glb(json, &bin, &[]);
    let (document, clips, notes) = gltf::read(&bytes, "repeat.glb", &no_files).unwrap();
    assert!(notes[0].text.contains("found 1 repeated"), "{notes:?}");
    assert_eq!(&*clips[0].rotation(0).unwrap().times.iter().collect::<Vec<_>>(), [0.5, 1.0]);
    assert_eq!(clips[0].rotation(0).unwrap().keys[0].to_xyzw()[0], f64::from(0.6_f32));
    assert!(gltf::write(&document, &[(0, &clips[0], &clips[0])], "x").unwrap().bytes == bytes);
    let after = nudged(&clips[0], 0, 1);
    let output = gltf::write(&document, &[(0, &clips[0], &after)], "x").unwrap();
    let (_, again, notes) = gltf::read(&output.bytes, "again.glb", &no_files).unwrap();
    assert_eq!(notes, []);
    assert_eq!(again[0], after);
}

#[test]
fn every_outside_file_changes_its_form_and_plays_the_same() {
    let mut pairs = String::new();
    for path in outside_files() {
        let (document, clips, _) = open(&path);
        let other = match document.form() {
            gltf::Form::Glb => gltf::Form::Text,
            gltf::Form::Text => gltf::Form::Glb,
        };
        let changed = clips.iter().enumerate().find_map(|(index, clip)| Some((index, some_key(clip)?)));
        let after: Vec<Clip> = match changed {
            Some((index, (joint, key))) => {
                let nudge =
                    |(at, clip)| if at == index { nudged(clip, joint, key) } else { Clip::clone(clip) };
                clips.iter().enumerate().map(nudge).collect()
            }
            None => clips.clone(),
        };
        let edits: Vec<(usize, &Clip, &Clip)> =
            clips.iter().zip(&after).enumerate().map(|(index, (a, b))| (index, a, b)).collect();
        for (kind, edits) in [("same", &[][..]), ("nudged", &edits[..])] {
            let stem = format!("{}-{kind}-other-form", path.file_stem().unwrap().to_string_lossy());
            let output = gltf::write_as(&document, edits, &stem, other).unwrap();
            let (again, found) = read_back(&output, &path);
            assert_eq!(again.form(), other);
            assert!(
                found == if kind == "same" { clips.clone() } else { after.clone() },
                "{}",
                path.display()
            );
            let ending = if other == gltf::Form::Glb { "glb" } else { "gltf" };
            let folder = written_folder().join("form");
            let target = folder.join(format!("{stem}.{ending}"));
            disk::write(&target, &output.bytes).unwrap();
            if let Some((name, bytes)) = &output.bin {
                disk::write(&folder.join(name), bytes).unwrap();
            }
            for file in &output.external {
                let bytes = disk::read(&path.with_file_name("").join(file)).unwrap();
                disk::write(&folder.join(file), &bytes).unwrap();
            }
            writeln!(pairs, "{}\t{}", path.display(), target.display()).unwrap();
        }
    }
    if !pairs.is_empty() {
        disk::write(&written_folder().join("form-pairs.tsv"), pairs.as_bytes()).unwrap();
    }
}

#[test]
fn integers_become_floats_and_say_so() {
    let Some(path) = outside_files().into_iter().find(|path| path.ends_with("Fox_gltfpack.glb")) else {
        return;
    };
    let (document, clips, _) = open(&path);
    let (joint, key) = some_key(&clips[1]).unwrap();
    let output = gltf::write(&document, &[(1, &clips[1], &nudged(&clips[1], joint, key))], "fox").unwrap();
    assert!(output.notes[0].text.contains("1 sampler(s) of normalised integers"), "{:?}", output.notes);
}

#[test]
fn a_clip_of_another_document_is_refused() {
    let (document, clips, _) = gltf::read(shared_sampler(), "shared.glb", &no_files).unwrap();
    let mut other = clips[0].clone();
    other.joints.pop();
    let error = gltf::write(&document, &[(0, &clips[0], &other)], "x").unwrap_err();
    assert_eq!(error.to_string(), "animations[0]: expected 2 joints, found 1 in the clip");
    let error = gltf::write(&document, &[(7, &clips[0], &clips[0])], "x").unwrap_err();
    assert_eq!(error.to_string(), "animations: expected an animation below 1, found 7");
}

#[test]
fn a_text_document_takes_its_new_buffer_along() {
    let files = outside_files();
    let Some(path) = files.iter().find(|path| path.ends_with("assetgen/Animation_Node_05.gltf")) else {
        return;
    };
    let (document, clips, _) = open(path);
    let (joint, key) = some_key(&clips[0]).unwrap();
    let after = nudged(&clips[0], joint, key);
    let output = gltf::write(&document, &[(0, &clips[0], &after)], "My clip").unwrap();
    assert_eq!(output.bin.as_ref().unwrap().0, "My clip.bin");
    let raw = raw_of_uri(&output);
    assert_eq!(raw["buffers"][0]["uri"], "My%20clip.bin");
    assert_eq!(
        output.external,
        document
            .external_files()
            .into_iter()
            .filter(|file| file != "Animation_Node_05.bin")
            .collect::<Vec<_>>()
    );
    let (_, again) = read_back(&output, path);
    assert_eq!(again[0], after);
}

fn raw_of_uri(output: &gltf::Output) -> Value {
    serde_json::from_slice(&output.bytes).unwrap()
}

/// A small figure that moves: an arm of three joints with an end point, evenly timed, and one turn of 170 degrees.
fn arm() -> Clip {
    let joint = |name: &str, number, parent, offset, tips| Joint {
        name: name.to_owned(),
        number,
        parent,
        rest: Transform::from_translation(offset),
        kind: JointKind::Joint,
        tips,
    };
    let skeleton = Skeleton::new(vec![
        joint("root", 0, None, DVec3::new(1.0, 90.0, 2.0), vec![]),
        joint("arm", 1, Some(0), DVec3::new(0.0, 30.0, 0.0), vec![]),
        joint("hand", 2, Some(1), DVec3::new(25.0, 0.0, 1.0), vec![DVec3::new(10.0, 0.0, 0.0)]),
        joint("second root", 3, None, DVec3::new(-40.0, 0.0, 0.0), vec![]),
    ])
    .unwrap();
    let times = Times::Even { step_secs: 0.008_333, count: 200 };
    let turns: Vec<Rotor> = (0..200).map(|frame| Axis::Z.rotor(f64::from(frame) * 0.2)).collect();
    let mut flipped: Vec<Rotor> = (0..200).map(|frame| Axis::X.rotor(f64::from(frame) * 0.01)).collect();
    for key in &mut flipped[100..] {
        *key = *key * Axis::Y.rotor(170.0_f64.to_radians());
    }
    let places: Vec<DVec3> = (0..200).map(|frame| DVec3::new(f64::from(frame) * 0.5, 90.0, 0.0)).collect();
    let joints = vec![
        JointTracks {
            rotation: Some(RotationTrack::from_rotors(times.clone(), turns)),
            translation: Some(VectorTrack::straight(times.clone(), places)),
            scale: None,
        },
        JointTracks { rotation: Some(RotationTrack::from_rotors(times, flipped)), ..JointTracks::default() },
        JointTracks::default(),
        JointTracks::default(),
    ];
    Clip {
        name: String::new(),
        skeleton: Arc::new(skeleton),
        joints: joints.into_iter().map(Arc::new).collect(),
        grid: FrameGrid::even(1.0 / 0.008_333, 199.0 * 0.008_333),
        duration_secs: 199.0 * 0.008_333,
    }
}

#[test]
fn a_clip_of_another_format_becomes_a_file_that_plays_the_same() {
    let clip = arm();
    let output = gltf::from_clip(&clip, "arm").unwrap();
    assert!(output.notes[0].text.contains("expects metres"), "{:?}", output.notes);
    let (document, again, notes) = gltf::read(&output.bytes, "arm.glb", &no_files).unwrap();
    assert_eq!(notes, []);
    assert_eq!(again[0].name, "arm");
    assert_eq!(document.skeleton().listed().count(), 4);
    for step in 0..400 {
        let time = f64::from(step) * 0.004_3;
        let (a, b) = (clip.world_at(time), again[0].world_at(time));
        for (joint, own) in a.iter().enumerate() {
            let label = clip.skeleton.label(joint);
            let other = document.skeleton().find(label).unwrap();
            assert_close!(b[other].rotation, own.rotation, 2e-5, "{label} at {time}");
            assert_close!(b[other].position(), own.position(), 2e-3, "{label} at {time}");
        }
    }
    // Unit, of one sign, at most 120 degrees apart, times rising.
    for joint in 0..2 {
        let other = document.skeleton().find(clip.skeleton.label(joint)).unwrap();
        let track = again[0].rotation(other).unwrap();
        for key in 0..track.keys.len() {
            assert!((track.keys[key].norm() - 1.0).abs() < 1e-6);
            if key > 0 {
                assert!(track.times.at(key) > track.times.at(key - 1));
                assert!(track.keys[key].dot(track.keys[key - 1]) > 0.49, "{joint} {key}");
            }
        }
        assert_eq!(track.keys.len(), 200 + joint);
    }
    // What is visible follows joints of the skin, and the document is of our making.
    let raw = Raw::new(&output.bytes, &|_| unreachable!());
    assert_eq!(raw.json["asset"]["generator"], "Turnwright");
    assert_eq!(list(&raw.json["skins"][0]["joints"]).len(), 4);
    let primitive = &raw.json["meshes"][0]["primitives"][0];
    let n_indices = whole(&raw.json["accessors"][whole(&primitive["indices"])]["count"]);
    // Three limbs and a cube of twelve triangles each.
    assert_eq!(n_indices, 4 * 12 * 3);
    disk::write(&written_folder().join("new-arm.glb"), &output.bytes).unwrap();
}

#[test]
fn a_clip_without_joints_or_motion_becomes_a_valid_file_too() {
    let mut clip = arm();
    clip.joints = (0..4).map(|_| Arc::default()).collect();
    let output = gltf::from_clip(&clip, "still").unwrap();
    let (document, clips, _) = gltf::read(&output.bytes, "still.glb", &no_files).unwrap();
    assert_eq!((document.skeleton().listed().count(), clips.len()), (4, 0));
    disk::write(&written_folder().join("new-still.glb"), &output.bytes).unwrap();

    clip.skeleton = Arc::new(Skeleton::new(vec![]).unwrap());
    clip.joints.clear();
    let output = gltf::from_clip(&clip, "nothing").unwrap();
    let (document, clips, _) = gltf::read(&output.bytes, "nothing.glb", &no_files).unwrap();
    assert_eq!((document.skeleton().len(), clips.len()), (0, 0));
    disk::write(&written_folder().join("new-nothing.glb"), &output.bytes).unwrap();
}

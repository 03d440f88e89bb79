//! What each fuzz target does with its bytes: anything may be refused, nothing may panic, and what was read can be written
//! and read again. Each gives whether the bytes were read.
//!
//! The targets here run them under a fuzzing engine; the test suite runs them too (`tests/suite/fuzz.rs`), for as long as
//! `TURNWRIGHT_FUZZ_SECS` says.

use std::path::Path;
use std::sync::Arc;

use turnwright::clip::Clip;
use turnwright::exchange::decimal::{push_six_decimals, short, shorts};
use turnwright::exchange::{OpenOptions, csv, encode, open_bytes, ron};
use turnwright::rotor::Rotor;
use turnwright::skeleton::RestChoice;

/// BVH text.
pub(crate) fn bvh(bytes: &[u8]) -> bool {
    round_trip("any.bvh", bytes)
}

/// CSV clips, and CSV skeletons beside them.
pub(crate) fn csv(bytes: &[u8]) -> bool {
    let is_skeleton = csv::hierarchy(bytes).is_ok();
    round_trip("any.csv", bytes) || is_skeleton
}

/// glTF as text or in one binary file; the first bytes tell which.
pub(crate) fn gltf(bytes: &[u8]) -> bool {
    round_trip(if bytes.starts_with(b"glTF") { "any.glb" } else { "any.gltf" }, bytes)
}

/// Scene files: what can be read is saved, and reads again.
pub(crate) fn scene(bytes: &[u8]) -> bool {
    let Ok(text) = std::str::from_utf8(bytes) else { return false };
    let path = Path::new("nowhere/any.ron");
    let Ok(scene) = ron::from_text(path, text) else { return false };
    let saved =
        ron::to_text(path, &scene.document, &|_, _, joint| format!("#{joint}")).expect("a scene is saved");
    let again = ron::from_text(path, &saved).expect("what was saved can be read");
    assert_eq!(again.document.works.len(), scene.document.works.len());
    true
}

/// The fast reader and writer of numbers, against the standard library.
pub(crate) fn numbers(bytes: &[u8]) -> bool {
    let check = |text: &[u8], value: f64| {
        let text = std::str::from_utf8(text).expect("digits are ASCII");
        let standard: f64 = text.parse().expect("the standard library reads it too");
        assert_eq!(value.to_bits(), standard.to_bits(), "{text}");
    };
    let found = short(bytes);
    if let Some(found) = found {
        check(&bytes[..found.length], found.value);
    }
    let mut values = Vec::new();
    let stretch = shorts(bytes, 0, 1000, &mut values);
    let words = bytes[..stretch.end].split(|byte| matches!(byte, b' ' | b'\t' | b'\r' | b'\n'));
    let words: Vec<&[u8]> = words.filter(|word| !word.is_empty()).collect();
    assert_eq!(words.len(), values.len());
    words.iter().zip(&values).for_each(|(word, value)| check(word, *value));
    for eight in bytes.as_chunks::<8>().0 {
        let value = f64::from_le_bytes(*eight);
        let mut text = Vec::new();
        push_six_decimals(value, &mut text);
        let standard = format!("{value:.6}").to_lowercase();
        let standard = if standard == "-0.000000" { "0.000000" } else { &standard };
        assert_eq!(std::str::from_utf8(&text), Ok(standard));
    }
    found.is_some() || !values.is_empty()
}

/// What holds for the reader of every clip format, whatever the bytes are: what can be read is given back byte for byte
/// while nobody changes it, and reads again once a key was changed, and as every other format.
fn round_trip(name: &str, bytes: &[u8]) -> bool {
    let path = Path::new("nowhere").join(name);
    let options = OpenOptions::default();
    let Ok(source) = open_bytes(&path, bytes.to_vec(), &options) else { return false };
    let same = encode(&source, &source.clips, None, &path).expect("what was read can be written");
    assert!(same.bytes == bytes, "a file that nobody touched is given back as it was");
    let changed: Vec<Arc<Clip>> = source.clips.iter().map(|clip| Arc::new(changed(clip))).collect();
    if let Ok(written) = encode(&source, &changed, None, &path) {
        open_bytes(&path, written.bytes, &options).expect("what was written can be read");
    }
    for other in ["any.bvh", "any.csv", "any.glb"] {
        if let Ok(written) = encode(&source, &source.clips, None, Path::new(other)) {
            let again = open_bytes(Path::new(other), written.bytes, &options);
            assert!(again.is_ok(), "what was written as {other} can be read: {again:?}");
        }
    }
    for rest in RestChoice::ALL {
        let measured = source.with_rest(Some(rest));
        assert_eq!(measured.is_some(), source.rests.contains(&rest));
    }
    // A part of it, under the same head.
    let parts: Vec<Arc<Clip>> = source
        .clips
        .iter()
        .map(|clip| Arc::new(turnwright::clip::cut(clip, clip.duration_secs * 0.3, clip.duration_secs * 0.7)))
        .collect();
    if let Ok(written) = encode(&source, &parts, None, &path) {
        let again = open_bytes(&path, written.bytes, &options);
        assert!(again.is_ok(), "a part of it can be read: {again:?}");
    }
    true
}

/// The clip with another key in the middle of its first turning joint.
fn changed(clip: &Clip) -> Clip {
    let turning = (0..clip.joints.len()).find_map(|joint| clip.rotation(joint).map(|track| (joint, track)));
    let Some((joint, track)) = turning else { return clip.clone() };
    let key = Rotor::from_xyzw([0.5, -0.5, 0.5, 0.5]);
    clip.with_rotation(joint, track.with_keys(&[(track.keys.len() / 2, key)]))
}

//! What holds for the reader of every clip format, whatever the bytes are.

use std::path::Path;
use std::sync::Arc;

use turnwright::clip::Clip;
use turnwright::exchange::{OpenOptions, encode, open_bytes};
use turnwright::rotor::Rotor;

/// Opens `bytes` as a file of that name. What can be read is given back byte for byte while nobody changes it, and reads
/// again once a key was changed.
pub fn round_trip(name: &str, bytes: &[u8]) {
    let path = Path::new("nowhere").join(name);
    let options = OpenOptions::default();
    let Ok(source) = open_bytes(&path, bytes.to_vec(), &options) else { return };
    let same = encode(&source, &source.clips, None, &path).expect("what was read can be written");
    assert!(same.bytes == bytes, "a file that nobody touched is given back as it was");
    let changed: Vec<Arc<Clip>> = source.clips.iter().map(|clip| Arc::new(changed(clip))).collect();
    if let Ok(written) = encode(&source, &changed, None, &path) {
        open_bytes(&path, written.bytes, &options).expect("what was written can be read");
    }
}

/// The clip with another key in the middle of its first turning joint.
fn changed(clip: &Clip) -> Clip {
    let turning = (0..clip.joints.len()).find_map(|joint| clip.rotation(joint).map(|track| (joint, track)));
    let Some((joint, track)) = turning else { return clip.clone() };
    let key = Rotor::from_xyzw([0.5, -0.5, 0.5, 0.5]);
    clip.with_rotation(joint, track.with_keys(&[(track.keys.len() / 2, key)]))
}

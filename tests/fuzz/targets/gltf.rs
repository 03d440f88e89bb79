//! glTF as text or in one binary file; the first bytes tell which.
#![no_main]

mod round_trip;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    let name = if bytes.starts_with(b"glTF") { "any.glb" } else { "any.gltf" };
    round_trip::round_trip(name, bytes);
});

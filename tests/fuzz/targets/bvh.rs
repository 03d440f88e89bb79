//! See `bodies`.
#![no_main]

#[path = "../bodies.rs"]
#[expect(dead_code, reason = "a target has one of them")]
mod bodies;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    bodies::bvh(bytes);
});

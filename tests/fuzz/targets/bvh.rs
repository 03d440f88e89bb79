//! BVH text.
#![no_main]

mod round_trip;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| round_trip::round_trip("any.bvh", bytes));

//! CSV clips, and CSV skeletons beside them.
#![no_main]

mod round_trip;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    round_trip::round_trip("any.csv", bytes);
    let _ = turnwright::exchange::csv::hierarchy(bytes);
});

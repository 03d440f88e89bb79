//! The fast reader and writer of numbers, against the standard library.
#![no_main]

use turnwright::exchange::decimal::{push_six_decimals, short};

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    if let Some(found) = short(bytes) {
        let text = std::str::from_utf8(&bytes[..found.length]).expect("digits are ASCII");
        let standard: f64 = text.parse().expect("the standard library reads it too");
        assert_eq!(found.value.to_bits(), standard.to_bits(), "{text}");
    }
    let Some(eight) = bytes.first_chunk() else { return };
    let value = f64::from_le_bytes(*eight);
    let mut text = Vec::new();
    push_six_decimals(value, &mut text);
    let standard = format!("{value:.6}").to_lowercase();
    let standard = if standard == "-0.000000" { "0.000000" } else { &standard };
    assert_eq!(std::str::from_utf8(&text), Ok(standard));
});

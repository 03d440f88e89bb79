//! Short decimal numbers, read fast: nearly every number of a motion file is one.

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

/// Powers of ten up to the most decimals that are read here; all exact.
const POWERS: [f64; 16] =
    [1.0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15];

/// Whether a number can be a length or a size: finite, and small enough that the products of a few still are, as 32-bit
/// floats in part.
pub(super) fn is_measure(value: f64) -> bool {
    value.abs() <= 1e18
}

/// A number without exponent and of at most 15 digits, which fills bytes up to a blank or the end.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Short {
    /// Its value, the very one that the standard library reads.
    pub(super) value: f64,
    /// Bytes that it fills.
    pub(super) length: usize,
    /// Whether it has a decimal point.
    pub(super) has_point: bool,
}

/// The short number at the start of `bytes`; `None` where something else or a longer number stands.
///
/// Digits and power of ten are both exact as `f64`, so their quotient is the nearest number (Clinger 1990, "How to read
/// floating point numbers accurately").
pub(super) fn short(bytes: &[u8]) -> Option<Short> {
    let (is_negative, rest) = match bytes.split_first()? {
        (b'-', rest) => (true, rest),
        (b'+', rest) => (false, rest),
        _ => (false, bytes),
    };
    let mut whole = 0_u64;
    let (mut digits, mut decimals, mut has_point) = (0_usize, 0_usize, false);
    let mut length = bytes.len().saturating_sub(rest.len());
    for &byte in rest {
        match byte {
            b'0'..=b'9' => {
                whole = whole.wrapping_mul(10).wrapping_add(u64::from(byte & 0x0F));
                digits = digits.saturating_add(1);
                decimals = decimals.saturating_add(usize::from(has_point));
            }
            b'.' if !has_point => has_point = true,
            b' ' | b'\t' | b'\r' | b'\n' => break,
            _ => return None,
        }
        if digits > 15 {
            return None;
        }
        length = length.saturating_add(1);
    }
    if digits == 0 {
        return None;
    }
    let size = whole as f64 / POWERS.get(decimals)?;
    Some(Short { value: if is_negative { -size } else { size }, length, has_point })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_short_number_is_the_one_the_standard_library_reads() {
        let mut state = 0x1234_5678_9ABC_DEF1_u64;
        let mut below = |limit: u64| {
            state ^= state << 13;
            state ^= state >> 7;
            state ^= state << 17;
            state % limit
        };
        let mut read = 0;
        for _ in 0..200_000 {
            let digits = below(17) as usize;
            let mut text: String = (0..digits).map(|_| char::from(b'0' | below(10) as u8)).collect();
            if below(4) > 0 {
                text.insert(below((digits as u64).saturating_add(1)) as usize, '.');
            }
            text.insert_str(0, ["", "-", "+"].get(below(3) as usize).unwrap());
            let found = short(text.as_bytes());
            match text.parse::<f64>() {
                Ok(value) if digits <= 15 => {
                    let found = found.unwrap_or_else(|| panic!("{text} is not read"));
                    assert_eq!(found.value.to_bits(), value.to_bits(), "{text}");
                    assert_eq!((found.length, found.has_point), (text.len(), text.contains('.')), "{text}");
                    read += 1;
                }
                _ => assert_eq!(found, None, "{text}"),
            }
        }
        assert!(read > 100_000);
        assert_eq!(short(b"1.5 2").map(|found| found.length), Some(3));
        for text in ["1.5e3", "1,5", "1-2", "1.2.3", "nan", "", "-", ".", "1x"] {
            assert_eq!(short(text.as_bytes()), None, "{text}");
        }
    }
}

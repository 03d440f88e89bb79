//! Short decimal numbers, read and written fast: nearly every number of a motion file is one.
//!
//! What is read is the very number that the standard library reads, and what is written the very text of `{:.6}`.
//! Eight digits are taken at a time as the bytes of one 64-bit word (Lamport 1975, "Multiple byte processing with
//! full-word instructions").

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use std::io::Write as _;

/// Powers of ten up to the most decimals that are read here; all exact.
const POWERS: [f64; 16] =
    [1.0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15];
/// The same as whole numbers, for up to seven decimals.
const WHOLE_POWERS: [u64; 8] = [1, 10, 100, 1000, 10_000, 100_000, 1_000_000, 10_000_000];
/// The digit 0 in every byte.
const ZEROS: u64 = 0x3030_3030_3030_3030;

/// The text of every number of three digits, the first in the lowest byte.
static THREE_DIGITS: [u32; 1000] = three_digits();

#[expect(clippy::arithmetic_side_effects, clippy::indexing_slicing, reason = "reckoned when it is compiled")]
const fn three_digits() -> [u32; 1000] {
    let mut texts = [0; 1000];
    let mut number = 0;
    while number < 1000 {
        let n = number as u32;
        texts[number] = 0x30_3030 | (n / 100) | ((n / 10 % 10) << 8) | ((n % 10) << 16);
        number += 1;
    }
    texts
}

/// Whether a number can be a length or a size: finite, and small enough that the products of a few still are, as 32-bit
/// floats in part.
pub(super) fn is_measure(value: f64) -> bool {
    value.abs() <= 1e18
}

/// A number without exponent and of at most 15 digits, which fills bytes up to a blank or the end.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Short {
    /// Its value, the very one that the standard library reads.
    pub value: f64,
    /// Bytes that it fills.
    pub length: usize,
    /// Whether it has a decimal point.
    pub has_point: bool,
}

/// The short number at the start of `bytes`; `None` where something else or a longer number stands.
///
/// Digits and power of ten are both exact as `f64`, so their quotient is the nearest number (Clinger 1990, "How to read
/// floating point numbers accurately").
#[inline]
pub fn short(bytes: &[u8]) -> Option<Short> {
    quick(bytes).or_else(|| careful(bytes))
}

/// As [`short`], for at most seven digits on either side of the point, and eight bytes to read from each.
#[inline]
fn quick(bytes: &[u8]) -> Option<Short> {
    let is_negative = *bytes.first()? == b'-';
    let start = usize::from(is_negative);
    let (whole, n_whole) = digits(bytes, start)?;
    let mark = start.wrapping_add(n_whole);
    let has_point = *bytes.get(mark)? == b'.';
    let (units, n_part, end) = if has_point {
        let (part, n_part) = digits(bytes, mark.wrapping_add(1))?;
        let units = whole.wrapping_mul(*WHOLE_POWERS.get(n_part)?).wrapping_add(part);
        (units, n_part, mark.wrapping_add(n_part).wrapping_add(1))
    } else {
        (whole, 0, mark)
    };
    let ends = matches!(bytes.get(end), Some(b' ' | b'\t' | b'\r' | b'\n'));
    if !ends || n_whole == 8 || n_whole.wrapping_add(n_part) == 0 {
        return None;
    }
    let size = units as f64 / POWERS.get(n_part)?;
    let value = f64::from_bits(size.to_bits() | (u64::from(is_negative) << 63));
    Some(Short { value, length: end, has_point })
}

/// The digits at `at`, as a number, and how many there are; of eight or more the first eight. `None` where fewer than
/// eight bytes are left.
#[inline]
fn digits(bytes: &[u8], at: usize) -> Option<(u64, usize)> {
    let word = u64::from_le_bytes(*bytes.get(at..)?.first_chunk()?);
    // Digits become 0 to 9, and every other byte gets its highest bit; a carry reaches bytes behind it alone.
    let values = word ^ ZEROS;
    let others = (values | values.wrapping_add(0x7676_7676_7676_7676)) & 0x8080_8080_8080_8080;
    let bits = others.trailing_zeros() & !7;
    // To the end of the word, so that zeros stand before them; in two shifts, as one by 64 would be none.
    let right = values.wrapping_shl(60_u32.wrapping_sub(bits)).wrapping_shl(4);
    let pairs = right.wrapping_mul(10).wrapping_add(right >> 8);
    let odd = (pairs & 0x0000_00FF_0000_00FF).wrapping_mul(0x000F_4240_0000_0064);
    let even = ((pairs >> 16) & 0x0000_00FF_0000_00FF).wrapping_mul(0x0000_2710_0000_0001);
    Some((odd.wrapping_add(even) >> 32, (bits >> 3) as usize))
}

/// As [`short`], byte by byte.
fn careful(bytes: &[u8]) -> Option<Short> {
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

/// How far [`shorts`] came.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Stretch {
    /// Byte after the last number.
    pub end: usize,
    /// Whether any of them has a decimal point.
    pub has_point: bool,
}

/// Reads short numbers with blanks and line ends before each, from byte `from` on, until something else stands there or
/// `values` holds `most`.
pub fn shorts(bytes: &[u8], from: usize, most: usize, values: &mut Vec<f64>) -> Stretch {
    let mut stretch = Stretch { end: from, has_point: false };
    let wanted = most.saturating_sub(values.len());
    for _ in 0..wanted {
        let rest = bytes.get(stretch.end..).unwrap_or_default();
        // Nearly always one blank.
        let gap = match rest {
            [b' ', next, ..] if *next > b' ' => 1,
            _ => rest.iter().take_while(|byte| matches!(byte, b' ' | b'\t' | b'\r' | b'\n')).count(),
        };
        let Some(found) = rest.get(gap..).filter(|_| gap > 0).and_then(short) else { break };
        values.push(found.value);
        stretch.end = stretch.end.wrapping_add(gap).wrapping_add(found.length);
        stretch.has_point |= found.has_point;
    }
    stretch
}

/// Appends a number in fixed notation with six decimals: the text of `{:.6}`, but that zero has no sign and what is no
/// number is written in lower case.
#[inline]
pub fn push_six_decimals(value: f64, text: &mut Vec<u8>) {
    let scaled = value.abs() * 1e6;
    // Cut, not rounded; what is left is exact. Signed, as 64-bit processors turn floats into those in one step.
    let cut = scaled as i64;
    let left = scaled - cut as f64;
    // The product may be off by half of its last bit: where that decides, the long way is gone. Not a number is not below
    // anything.
    let is_sure = scaled < 99_999_999e6 && (left - 0.5).abs() > scaled * f64::EPSILON;
    let units = (cut as u64).wrapping_add(u64::from(left > 0.5));
    if !is_sure {
        push_slowly(value, text);
    } else if units < 1_000_000_000 {
        push_angle(value < 0.0 && units > 0, units as u32, text);
    } else {
        push_units(value < 0.0, units, text);
    }
}

/// Millionths below 1,000,000,000, as angles and lengths are: their digits three at a time from a table.
#[inline]
fn push_angle(is_negative: bool, units: u32, text: &mut Vec<u8>) {
    let three = |number: u32| THREE_DIGITS.get(number as usize).copied().unwrap_or_default();
    let (whole, part) = (units / 1_000_000, units % 1_000_000);
    let leading = u32::from(whole < 100).wrapping_add(u32::from(whole < 10));
    let sign = usize::from(is_negative);
    let point = sign.wrapping_add(3).wrapping_sub(leading as usize);
    let first = u64::from(three(whole)).wrapping_shr(leading.wrapping_mul(8));
    let last = u64::from(three(part / 1000)) << 8 | u64::from(three(part % 1000)) << 32;
    push_words(sign, first, point, last, text);
}

/// Millionths of at most eight digits before the point.
fn push_units(is_negative: bool, units: u64, text: &mut Vec<u8>) {
    let whole = eight_digits(units / 1_000_000);
    // One digit at least stays of the whole.
    let leading = (whole.trailing_zeros() >> 3).min(7);
    let first = (whole | ZEROS).wrapping_shr(leading.wrapping_mul(8));
    let part = (eight_digits((units % 1_000_000).wrapping_mul(100)) | ZEROS) & 0xFFFF_FFFF_FFFF;
    let sign = usize::from(is_negative);
    let point = sign.wrapping_add(8).wrapping_sub(leading as usize);
    push_words(sign, first, point, part << 8, text);
}

/// The text of the whole at `sign`, and that of a point and six decimals at `point`: words put over each other and over a
/// minus, and what is too many taken off again.
#[inline]
fn push_words(sign: usize, whole: u64, point: usize, part: u64, text: &mut Vec<u8>) {
    let start = text.len();
    text.extend_from_slice(&[b'-'; 24]);
    if let Some(own) = text.get_mut(start..).and_then(<[u8]>::first_chunk_mut::<24>) {
        put(own, sign, whole);
        put(own, point, u64::from(b'.') | part);
    }
    text.truncate(start.wrapping_add(point).wrapping_add(7));
}

/// Eight bytes at a place that is at most 16.
#[inline]
fn put(bytes: &mut [u8; 24], at: usize, word: u64) {
    if let Some(place) = bytes.get_mut(at..at.wrapping_add(8)) {
        place.copy_from_slice(&word.to_le_bytes());
    }
}

/// The eight digits of a number below 100,000,000, a byte each from 0 to 9, the first in the lowest byte.
#[inline]
fn eight_digits(number: u64) -> u64 {
    let (high, low) = (number / 10_000, number % 10_000);
    let fours = high | (low << 32);
    // Multiplying and shifting stands for dividing: exact for numbers this small.
    let hundreds = (fours.wrapping_mul(10_486) >> 20) & 0x0000_007F_0000_007F;
    let twos = hundreds | fours.wrapping_sub(hundreds.wrapping_mul(100)) << 16;
    let tens = (twos.wrapping_mul(103) >> 10) & 0x000F_000F_000F_000F;
    tens | twos.wrapping_sub(tens.wrapping_mul(10)) << 8
}

#[cold]
fn push_slowly(value: f64, text: &mut Vec<u8>) {
    let start = text.len();
    // Writing into a Vec can't fail.
    let _ = write!(text, "{value:.6}");
    let own = text.get_mut(start..).unwrap_or_default();
    own.make_ascii_lowercase();
    if own == b"-0.000000" {
        text.remove(start);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_short_number_is_the_one_the_standard_library_reads() {
        let mut state = 0x1234_5678_9ABC_DEF1_u64;
        let mut below = |limit: u64| random(&mut state) % limit;
        let mut read = 0;
        for _ in 0..200_000 {
            let digits = below(17) as usize;
            let mut text: String = (0..digits).map(|_| char::from(b'0' | below(10) as u8)).collect();
            if below(4) > 0 {
                text.insert(below((digits as u64).saturating_add(1)) as usize, '.');
            }
            text.insert_str(0, ["", "-", "+"].get(below(3) as usize).unwrap());
            let found = short(text.as_bytes());
            // With enough bytes behind it for the fast way.
            let longer = format!("{text} 1.25 -7.5 ");
            assert_eq!(
                short(longer.as_bytes()).map(|own| own.value.to_bits()),
                found.map(|own| own.value.to_bits())
            );
            assert_eq!(short(longer.as_bytes()).map(|own| own.length), found.map(|own| own.length), "{text}");
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
            let behind = format!("{text} 1.25 -7.5 ");
            assert_eq!(short(behind.as_bytes()), None, "{text}");
        }
    }

    fn random(state: &mut u64) -> u64 {
        *state ^= *state << 13;
        *state ^= *state >> 7;
        *state ^= *state << 17;
        *state
    }

    #[test]
    fn a_row_is_read_up_to_what_is_no_short_number() {
        let text = b"x 1.5 -2\r\n3\t.25 4 1e3 5";
        let mut values = Vec::new();
        assert_eq!(shorts(text, 1, usize::MAX, &mut values), Stretch { end: 17, has_point: true });
        assert_eq!(values, [1.5, -2.0, 3.0, 0.25, 4.0]);
        values.clear();
        assert_eq!(shorts(b"1 2", 0, 9, &mut values), Stretch { end: 0, has_point: false });
        assert_eq!(shorts(b" 1 2", 0, 9, &mut values), Stretch { end: 4, has_point: false });
        // No more than there is room for.
        assert_eq!(shorts(b" 1 2 3 4", 0, 4, &mut values), Stretch { end: 4, has_point: false });
        assert_eq!(values, [1.0, 2.0, 1.0, 2.0]);
    }

    #[test]
    fn six_decimals_are_those_of_the_standard_library() {
        let mut state = 0x2545_F491_4F6C_DD1D_u64;
        let (mut text, mut n) = (Vec::new(), 0);
        let mut check = |value: f64| {
            text.clear();
            text.push(b'<');
            push_six_decimals(value, &mut text);
            let standard = format!("<{value:.6}").to_lowercase();
            let standard = if standard == "<-0.000000" { "<0.000000" } else { &standard };
            assert_eq!(std::str::from_utf8(&text), Ok(standard), "{value:?}");
            n += 1;
        };
        for _ in 0..150_000 {
            let bits = random(&mut state);
            // Angles and lengths, anything at all, numbers with seven decimals, and exact ties.
            let share = (bits >> 11) as f64 / (1_u64 << 53) as f64 - 0.5;
            check(share * 720.0);
            check(f64::from_bits(bits));
            check((share * 4e9).round() / 1e7);
            check((share * 1e6).round() / 128.0);
            check(share * 10_f64.powi((bits % 24) as i32 - 8));
        }
        for value in
            [0.0_f64, 0.5, 1.0, 9.999_999_4, 9.999_999_5, 99_999_999.0, 1e8, 1e15, 1e300, 5e-7, 4.999e-7]
        {
            for value in [value, value.next_down(), value.next_up()] {
                check(value);
                check(-value);
            }
        }
        for value in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, f64::MIN_POSITIVE] {
            check(value);
        }
        assert!(n > 750_000);
    }
}

//! Arithmetic on packed pixels: `0xAARRGGBB`, premultiplied, gamma-space sRGB.
//!
//! egui's own renderers multiply and blend the stored (gamma-encoded) bytes, and so does this. Two channels share one
//! 32-bit word with eight bits of room above each, so one multiplication serves both.

use egui::Color32;

/// The two channels in the low halves of a pixel (red and blue, or after a shift alpha and green).
const PAIR: u32 = 0x00ff_00ff;
/// One half in the fixed-point steps of the pair, for rounding to nearest.
const HALF_PAIR: u32 = 0x0080_0080;
/// The bit above each channel of a pair, set when a sum leaves the range of a byte.
const CARRY_PAIR: u32 = 0x0100_0100;

/// Packs an egui colour.
pub(super) fn pack(color: Color32) -> u32 {
    let [red, green, blue, alpha] = color.to_array();
    u32::from_be_bytes([alpha, red, green, blue])
}

/// `pixel` as bytes in the order red, green, blue, alpha.
pub(super) fn unpack_rgba(pixel: u32) -> [u8; 4] {
    let [alpha, red, green, blue] = pixel.to_be_bytes();
    [red, green, blue, alpha]
}

/// Whether a pixel hides what is below it.
pub(super) fn is_opaque(pixel: u32) -> bool {
    pixel >= 0xff00_0000
}

/// `pair * factor / 255`, each channel rounded to nearest; exact for bytes.
fn scale_pair(pair: u32, factor: u32) -> u32 {
    let product = pair * factor + HALF_PAIR;
    ((product + ((product >> 8) & PAIR)) >> 8) & PAIR
}

/// All four channels times `factor` / 255.
pub(super) fn scale(pixel: u32, factor: u32) -> u32 {
    scale_pair(pixel & PAIR, factor) | (scale_pair((pixel >> 8) & PAIR, factor) << 8)
}

/// Two pixels multiplied channel by channel.
pub(super) fn multiply(a: u32, b: u32) -> u32 {
    if a == u32::MAX {
        return b;
    }
    if b == u32::MAX {
        return a;
    }
    let alpha = b >> 24;
    if b == alpha * 0x0101_0101 {
        // Coverage, as in every glyph: the four factors are one.
        return scale(a, alpha);
    }
    let channel = |shift: u32| {
        let product = ((a >> shift) & 0xff) * ((b >> shift) & 0xff) + 0x80;
        ((product + (product >> 8)) >> 8) << shift
    };
    channel(0) | channel(8) | channel(16) | channel(24)
}

/// Adds two pairs, each channel stopping at 255: egui's additive colours have more colour than alpha.
fn add_pair(a: u32, b: u32) -> u32 {
    let sum = a + b;
    let carry = sum & CARRY_PAIR;
    (sum | (carry - (carry >> 8))) & PAIR
}

/// `source` over `below`: `source + below * (1 - alpha)` (Porter and Duff, 1984), rounded to nearest.
pub(super) fn over(below: u32, source: u32) -> u32 {
    let rest = 255 - (source >> 24);
    let red_blue = add_pair(source & PAIR, scale_pair(below & PAIR, rest));
    let alpha_green = add_pair((source >> 8) & PAIR, scale_pair((below >> 8) & PAIR, rest));
    red_blue | (alpha_green << 8)
}

/// Mixes two pixels: `weight` 0 gives `a`, 256 gives `b`.
pub(super) fn mix(a: u32, b: u32, weight: u32) -> u32 {
    let pair = |a: u32, b: u32| (((a & PAIR) * (256 - weight) + (b & PAIR) * weight + HALF_PAIR) >> 8) & PAIR;
    pair(a, b) | (pair(a >> 8, b >> 8) << 8)
}

/// Draws one source pixel over a run of pixels.
pub(super) fn fill(run: &mut [u32], source: u32) {
    if is_opaque(source) {
        run.fill(source);
    } else if source != 0 {
        for below in run {
            *below = over(*below, source);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The formula in reals, rounded once.
    fn exact(value: f64) -> u32 {
        value.round() as u32
    }

    #[test]
    fn scaling_rounds_to_nearest_for_every_pair_of_bytes() {
        for value in 0..=255_u32 {
            for factor in 0..=255_u32 {
                let expected = exact(f64::from(value) * f64::from(factor) / 255.0);
                assert_eq!(scale(value * 0x0101_0101, factor), expected * 0x0101_0101);
                assert_eq!(multiply(value << 16 | 0xff, factor << 16 | 0x13) >> 16, expected);
            }
        }
    }

    #[test]
    fn over_follows_the_formula_for_every_alpha() {
        for alpha in 0..=255_u32 {
            for below in [0_u32, 1, 17, 128, 254, 255] {
                let color = alpha / 2;
                let source = alpha << 24 | color << 16 | alpha << 8;
                let result = over(0xff00_0000 | below << 16 | below << 8 | below, source);
                let rest = f64::from(below) * f64::from(255 - alpha) / 255.0;
                assert_eq!(result >> 24, 255);
                assert_eq!((result >> 16) & 0xff, color + exact(rest));
                assert_eq!((result >> 8) & 0xff, alpha + exact(rest));
                assert_eq!(result & 0xff, exact(rest));
            }
        }
    }

    #[test]
    fn additive_colours_stop_at_white() {
        assert_eq!(over(0xff80_8080, 0x00ff_4000), 0xffff_c080);
    }

    #[test]
    fn mixing_reaches_both_ends() {
        assert_eq!(mix(0x1234_5678, 0xffee_ddcc, 0), 0x1234_5678);
        assert_eq!(mix(0x1234_5678, 0xffee_ddcc, 256), 0xffee_ddcc);
        assert_eq!(mix(0xff00_0000, 0xffff_ffff, 128), 0xff80_8080);
    }
}

//! Marks: numbers that stand for what is drawn. Where they are the same, so is the picture.
//!
//! Two things that differ have the same one by chance, in one of 2^64 cases.

use super::area::Area;
use super::area::Corner;
use egui::epaint::Vertex;

/// Odd numbers with their bits well mixed: the fractions of the golden ratio and of the roots of 2, 3 and 5.
const GOLDEN: u64 = 0x9e37_79b9_7f4a_7c15;
const ROOT_OF_2: u64 = 0x6a09_e667_f3bc_c909;
const ROOT_OF_3: u64 = 0xbb67_ae85_84ca_a73b;
const ROOT_OF_5: u64 = 0x3c6e_f372_fe94_f82b;

/// Both halves of the product, so that each bit of it hangs on all bits of both.
fn folded(a: u64, b: u64) -> u64 {
    let product = u128::from(a) * u128::from(b);
    (product as u64) ^ (product >> 64) as u64
}

/// The mark of `mark`, and `next` after it.
pub(super) fn joined(mark: u64, next: u64) -> u64 {
    folded(mark ^ next ^ ROOT_OF_2, GOLDEN).wrapping_add(next.rotate_left(23))
}

/// A vertex, and the corner where it lies in the picture.
pub(super) fn of_vertex(vertex: Vertex, corner: Corner) -> u64 {
    let Vertex { uv, color, .. } = vertex;
    let uv = u64::from(uv.x.to_bits()) << 32 | u64::from(uv.y.to_bits());
    let color = u64::from(u32::from_ne_bytes(color.to_array()));
    folded(corner.bits() ^ ROOT_OF_3, folded(uv ^ ROOT_OF_5, GOLDEN) ^ color.wrapping_mul(ROOT_OF_2))
}

/// What the shapes of a mesh have in common: the texture as it is now, and where they may be drawn.
pub(super) fn of_layer(texture_version: u64, clip: Area) -> u64 {
    let Area { left, top, right, bottom } = clip;
    [left, top, right, bottom]
        .into_iter()
        .fold(texture_version, |mark, side| joined(mark, side.cast_unsigned()))
}

#[cfg(test)]
mod tests {
    use super::*;
    use egui::Color32;
    use egui::pos2;
    use std::collections::HashSet;

    /// All that differ in one number, by a little, and the order in which they come.
    #[test]
    fn what_differs_has_another_mark() {
        let mut seen = HashSet::new();
        for step in 0..40_u8 {
            let step_px = f32::from(step) / 256.0;
            for color in [Color32::from_gray(step), Color32::from_rgba_premultiplied(0, 0, 0, step)] {
                for (x, y) in [(step_px, 1.0), (1.0, step_px)] {
                    let place = pos2(x, y);
                    let vertex = |pos, uv| of_vertex(Vertex { pos, uv, color }, Corner::new(pos, 1.0));
                    seen.insert(vertex(place, pos2(0.5, 0.5)));
                    seen.insert(vertex(pos2(0.5, 0.5), place));
                }
            }
        }
        assert_eq!(seen.len(), 40 * 2 * 4);
        let marks: Vec<u64> = seen.into_iter().collect();
        let mut pairs = HashSet::new();
        for a in &marks {
            for b in &marks {
                pairs.insert(joined(joined(7, *a), *b));
            }
        }
        assert_eq!(pairs.len(), marks.len() * marks.len());
    }
}

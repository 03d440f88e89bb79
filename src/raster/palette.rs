//! Colours: the three planes, snags, selection, the two themes and the heat scale.
//!
//! Meaning never rests on colour alone: whoever draws with these also draws a letter, a mark or a dash.

/// A colour in sRGB with straight alpha.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Color {
    /// Red, 0..=255.
    pub r: u8,
    /// Green, 0..=255.
    pub g: u8,
    /// Blue, 0..=255.
    pub b: u8,
    /// Opacity, 0 (clear) ..= 255 (opaque).
    pub a: u8,
}

impl Color {
    /// Nothing at all.
    pub const TRANSPARENT: Self = Self { r: 0, g: 0, b: 0, a: 0 };

    /// An opaque colour from its six hexadecimal digits, `0xRRGGBB`.
    pub const fn rgb(hex: u32) -> Self {
        Self { r: (hex >> 16) as u8, g: (hex >> 8) as u8, b: hex as u8, a: 255 }
    }

    /// The same colour with opacity `alpha` in 0..=1.
    #[must_use]
    pub fn with_alpha(self, alpha: f32) -> Self {
        Self { a: (alpha.clamp(0.0, 1.0) * 255.0).round() as u8, ..self }
    }

    /// The colour `weight` (0..=1) of the way to `other`, channel by channel in sRGB.
    #[must_use]
    pub fn mix(self, other: Self, weight: f32) -> Self {
        let weight = weight.clamp(0.0, 1.0);
        let mix =
            |from: u8, to: u8| (f32::from(from) + (f32::from(to) - f32::from(from)) * weight).round() as u8;
        Self {
            r: mix(self.r, other.r),
            g: mix(self.g, other.g),
            b: mix(self.b, other.b),
            a: mix(self.a, other.a),
        }
    }

    /// Relative luminance in 0..=1 (WCAG 2.2, sRGB with the 0.04045 knee).
    pub fn luminance(self) -> f64 {
        let linear = |channel: u8| {
            let c = f64::from(channel) / 255.0;
            if c <= 0.040_45 { c / 12.92 } else { ((c + 0.055) / 1.055).powf(2.4) }
        };
        0.2126 * linear(self.r) + 0.7152 * linear(self.g) + 0.0722 * linear(self.b)
    }

    /// Contrast of two opaque colours, 1 (none) ..= 21 (black on white), after WCAG 2.2.
    pub fn contrast(self, other: Self) -> f64 {
        let (a, b) = (self.luminance(), other.luminance());
        (a.max(b) + 0.05) / (a.min(b) + 0.05)
    }

    /// Black or white, whichever reads better on this colour.
    #[must_use]
    pub fn readable_ink(self) -> Self {
        const INKS: [Color; 2] = [Color::rgb(0x00_00_00), Color::rgb(0xFF_FF_FF)];
        if self.contrast(INKS[0]) >= self.contrast(INKS[1]) { INKS[0] } else { INKS[1] }
    }

    /// The four premultiplied bytes an [`Image`](super::Image) stores.
    pub fn premultiplied(self) -> [u8; 4] {
        let scale = |channel: u8| ((u32::from(channel) * u32::from(self.a) + 127) / 255) as u8;
        [scale(self.r), scale(self.g), scale(self.b), self.a]
    }
}

/// Turns inside plane yz. Okabe and Ito (2008), "Color universal design".
pub const PLANE_YZ: Color = Color::rgb(0xE6_9F_00);
/// Turns inside plane zx. Okabe and Ito (2008).
pub const PLANE_ZX: Color = Color::rgb(0x56_B4_E9);
/// Turns inside plane xy. Okabe and Ito (2008).
pub const PLANE_XY: Color = Color::rgb(0x00_9E_73);
/// The three planes in the order of a rotor's parts: yz, zx, xy.
pub const PLANES: [Color; 3] = [PLANE_YZ, PLANE_ZX, PLANE_XY];
/// The letters written beside [`PLANES`].
pub const PLANE_NAMES: [&str; 3] = ["yz", "zx", "xy"];
/// A snag. Okabe and Ito (2008).
pub const SNAG: Color = Color::rgb(0xD5_5E_00);

/// Every colour a picture needs, for one kind of background.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Theme {
    /// Behind everything.
    pub background: Color,
    /// A little off the background: plates behind labels, plot areas.
    pub panel: Color,
    /// Ink for words and numbers.
    pub text: Color,
    /// Ink for less important words; still at least 4.5 : 1 on the background.
    pub text_faint: Color,
    /// Grid lines of floors and plots.
    pub grid: Color,
    /// Stronger grid lines, axes and the heading arrow.
    pub axis: Color,
    /// The result ("after").
    pub after: Color,
    /// The source ("before").
    pub before: Color,
    /// Neighbouring poses, dashed.
    pub ghost: Color,
    /// The chosen joint or key.
    pub selection: Color,
    /// Snag marks.
    pub snag: Color,
    /// The planes yz, zx, xy.
    pub planes: [Color; 3],
}

impl Theme {
    /// For a dark background.
    pub const DARK: Self = Self {
        background: Color::rgb(0x1B_1E_23),
        panel: Color::rgb(0x25_29_30),
        text: Color::rgb(0xE8_EA_ED),
        text_faint: Color::rgb(0xA7_AE_B8),
        grid: Color::rgb(0x3C_42_4C),
        axis: Color::rgb(0x7C_85_92),
        after: Color::rgb(0xC8_9B_D9),
        before: Color::rgb(0x9A_A0_A8),
        ghost: Color::rgb(0x7A_80_89),
        selection: Color::rgb(0xF0_E4_42),
        snag: SNAG,
        planes: PLANES,
    };

    /// For a light background.
    pub const LIGHT: Self = Self {
        background: Color::rgb(0xFA_FA_F8),
        panel: Color::rgb(0xEF_F0_EE),
        text: Color::rgb(0x1C_1F_24),
        text_faint: Color::rgb(0x59_60_6A),
        grid: Color::rgb(0xD3_D6_DA),
        axis: Color::rgb(0x7A_82_8D),
        after: Color::rgb(0xB7_7F_CC),
        before: Color::rgb(0x6C_72_7A),
        ghost: Color::rgb(0x93_99_A1),
        selection: Color::rgb(0x00_72_B2),
        snag: SNAG,
        planes: PLANES,
    };

    /// Whether the background is dark.
    pub fn is_dark(&self) -> bool {
        self.background.luminance() < 0.2
    }
}

/// Ten stops of cividis, a heat scale that reads alike with and without colour blindness: Nuñez, Anderton and Renslow
/// (2018), "Optimizing colormaps with consideration for color vision deficiency". Between stops it is almost straight.
const CIVIDIS: [u32; 10] = [
    0x00_20_4D, 0x00_33_6F, 0x39_48_6B, 0x57_5C_6D, 0x70_71_73, 0x8A_87_79, 0xA6_9D_75, 0xC4_B5_6C,
    0xE4_CF_5B, 0xFF_EA_46,
];

/// The heat colour of `value` in 0..=1, dark blue to yellow. Values outside are held at the ends; what is not a
/// number is a value nobody measured and gives mid grey with no place on the scale.
pub fn cividis(value: f32) -> Color {
    if value.is_nan() {
        return Color::rgb(0x80_80_80);
    }
    let place = value.clamp(0.0, 1.0) * (CIVIDIS.len() - 1) as f32;
    let stop = (place as usize).min(CIVIDIS.len() - 2);
    Color::rgb(CIVIDIS[stop]).mix(Color::rgb(CIVIDIS[stop + 1]), place - stop as f32)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cividis_meets_its_ends_and_rises_in_luminance() {
        assert_eq!(cividis(-1.0), Color::rgb(0x00_20_4D));
        assert_eq!(cividis(2.0), Color::rgb(0xFF_EA_46));
        let luminances: Vec<f64> = (0..=100).map(|i| cividis(i as f32 / 100.0).luminance()).collect();
        assert!(luminances.is_sorted(), "{luminances:?}");
        assert_eq!(cividis(f32::NAN), Color::rgb(0x80_80_80));
    }

    #[test]
    fn both_themes_can_be_read() {
        for theme in [Theme::DARK, Theme::LIGHT] {
            for (name, ink, wanted) in [
                ("text", theme.text, 12.0),
                ("faint text", theme.text_faint, 4.5),
                ("before", theme.before, 3.0),
                ("after", theme.after, 2.5),
                ("selection", theme.selection, 4.5),
                ("snag", theme.snag, 3.0),
            ] {
                for paper in [theme.background, theme.panel] {
                    let found = ink.contrast(paper);
                    assert!(found >= wanted, "{name}: {found:.2}");
                }
            }
        }
        assert!(Theme::DARK.is_dark() && !Theme::LIGHT.is_dark());
    }

    #[test]
    fn contrast_of_black_and_white_is_21() {
        let contrast = Color::rgb(0).contrast(Color::rgb(0xFF_FF_FF));
        assert!((contrast - 21.0).abs() < 1e-9, "{contrast}");
        assert_eq!(Color::rgb(0xFF_EA_46).readable_ink(), Color::rgb(0));
        assert_eq!(Color::rgb(0x00_20_4D).readable_ink(), Color::rgb(0xFF_FF_FF));
    }
}

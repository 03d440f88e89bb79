//! The preset's numbers, with the source of each.

use std::fmt;
use std::sync::LazyLock;

/// The three bands of one motion of one part of the body, each with its source.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Figure {
    /// The part: `upper_arm`, `trunk` as a whole …
    pub part: &'static str,
    /// The motion: `flexion`, `internal_rotation` …
    pub motion: &'static str,
    /// Comfort, limit and fault in degrees.
    pub degrees: [f64; 3],
    /// Where each of the three comes from; the first word is a key of [`sources`], or `ours`.
    pub sources: [&'static str; 3],
}

impl fmt::Display for Figure {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} {}:", self.part, self.motion)?;
        for ((band, degrees), source) in
            ["comfort", "limit", "fault"].iter().zip(self.degrees).zip(self.sources)
        {
            write!(f, " {band} {degrees}° ({source}){}", if *band == "fault" { "" } else { "," })?;
        }
        Ok(())
    }
}

/// What a segment of the spine contributes to the bend of the whole.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Segment {
    pub(super) is_neck: bool,
    /// Flexion and extension together, side bend to one side, rotation to one side: degrees.
    pub(super) degrees: [f64; 3],
}

static FIGURES: LazyLock<Vec<Figure>> = LazyLock::new(|| {
    let rows = rows(include_str!("../../../assets/limits/adult.csv"));
    rows.filter_map(|cells| {
        let [part, motion, comfort, comfort_source, limit, limit_source, fault, fault_source] =
            cells.try_into().ok()?;
        Some(Figure {
            part,
            motion,
            degrees: [comfort.parse().ok()?, limit.parse().ok()?, fault.parse().ok()?],
            sources: [comfort_source, limit_source, fault_source],
        })
    })
    .collect()
});

static SOURCES: LazyLock<Vec<(&'static str, &'static str)>> = LazyLock::new(|| {
    let rows = rows(include_str!("../../../assets/limits/sources.csv"));
    rows.filter_map(|cells| Some((*cells.first()?, *cells.get(1)?))).collect()
});

static SEGMENTS: LazyLock<Vec<Segment>> = LazyLock::new(|| {
    let rows = rows(include_str!("../../../assets/limits/spine_segments.csv"));
    rows.filter_map(|cells| {
        let [_, region, bend, side, turn, _] = cells.try_into().ok()?;
        let degrees = [bend.parse().ok()?, side.parse().ok()?, turn.parse().ok()?];
        Some(Segment { is_neck: region == "neck", degrees })
    })
    .collect()
});

/// All figures of the preset, in the order of its table. Thumbs stand in it too, though no joint is measured against them.
pub fn figures() -> &'static [Figure] {
    &FIGURES
}

/// The publications the figures come from: key and reference.
pub fn sources() -> &'static [(&'static str, &'static str)] {
    &SOURCES
}

/// Segments of the spine from the pelvis upwards.
pub(super) fn segments() -> &'static [Segment] {
    &SEGMENTS
}

/// The three bands of a motion in degrees; the table has it, as its test asserts.
pub(super) fn bands(part: &str, motion: &str) -> [f64; 3] {
    let own = FIGURES.iter().find(|figure| figure.part == part && figure.motion == motion);
    own.map_or([180.0; 3], |figure| figure.degrees)
}

/// The rows below the head of a table; cells may stand in quotes.
fn rows(text: &'static str) -> impl Iterator<Item = Vec<&'static str>> {
    text.lines().skip(1).map(|line| {
        let mut cells = Vec::new();
        let mut rest = line;
        loop {
            let (cell, after) = match rest.strip_prefix('"').and_then(|quoted| quoted.split_once('"')) {
                Some((cell, after)) => (cell, after.strip_prefix(',')),
                None => rest.split_once(',').map_or((rest, None), |(cell, after)| (cell, Some(after))),
            };
            cells.push(cell);
            match after {
                Some(after) => rest = after,
                None => break cells,
            }
        }
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_figure_is_printed_with_its_sources() {
        let knee =
            figures().iter().find(|figure| figure.part == "lower_leg" && figure.motion == "flexion").unwrap();
        assert_eq!(
            knee.to_string(),
            "lower_leg flexion: comfort 132° (ROACH1991 132), limit 145° (CDC2011 women 141.9 rounded up), fault 177° (BARTER1957 kneeling 159 + 2 SD 9)"
        );
    }

    #[test]
    fn every_row_is_read_and_every_number_has_a_source_that_is_listed() {
        assert_eq!(figures().len(), include_str!("../../../assets/limits/adult.csv").lines().count() - 1);
        assert_eq!(segments().len(), 25);
        for figure in figures() {
            let [comfort, limit, fault] = figure.degrees;
            assert!(0.0 <= comfort && comfort <= limit && limit <= fault && fault > 0.0, "{figure:?}");
            for source in figure.sources {
                let key = source.split([' ', ':']).next().unwrap_or_default();
                assert!(sources().iter().any(|(known, _)| *known == key), "{figure:?}");
            }
        }
    }
}

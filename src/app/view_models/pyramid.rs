//! A row of numbers with its smallest and largest at coarser and coarser steps, so that a long curve is drawn in the
//! time of a short one.

use std::ops::Range;

/// Values and, above them, levels of `[smallest, largest]`, each 8 times shorter. NaN is a gap.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Pyramid {
    values: Vec<f32>,
    levels: Vec<Vec<[f32; 2]>>,
}

const FACTOR: usize = 8;

/// Nothing yet: any value is smaller than the first and larger than the second.
const NOTHING: [f32; 2] = [f32::INFINITY, f32::NEG_INFINITY];

fn both([low, high]: [f32; 2], [other_low, other_high]: [f32; 2]) -> [f32; 2] {
    // `min` and `max` step over NaN.
    [low.min(other_low), high.max(other_high)]
}

impl Pyramid {
    /// Builds the levels.
    pub fn new(values: Vec<f32>) -> Self {
        let mut levels: Vec<Vec<[f32; 2]>> = Vec::new();
        let first = |chunk: &[f32]| chunk.iter().fold(NOTHING, |range, &value| both(range, [value, value]));
        if values.len() > FACTOR {
            levels.push(values.chunks(FACTOR).map(first).collect());
        }
        while let Some(top) = levels.last().filter(|top| top.len() > FACTOR) {
            let next =
                top.chunks(FACTOR).map(|chunk| chunk.iter().fold(NOTHING, |a, &b| both(a, b))).collect();
            levels.push(next);
        }
        Self { values, levels }
    }

    /// All values.
    pub fn values(&self) -> &[f32] {
        &self.values
    }

    /// How many values.
    pub fn len(&self) -> usize {
        self.values.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.values.is_empty()
    }

    /// Smallest and largest value of a range, cut to what there is; `None` when it holds no number. Looks at most at 14 numbers of each
    /// level, which there are a few of however long the range is.
    pub fn min_max(&self, range: Range<usize>) -> Option<[f32; 2]> {
        let (mut start, mut end) = (range.start, range.end.min(self.values.len()));
        let mut found = NOTHING;
        // Ragged ends at each level, then the level above for the whole blocks between.
        let mut level = 0;
        while start < end {
            let is_top = level >= self.levels.len();
            if is_top || end - start < 2 * FACTOR {
                return self.scan(level, start..end, found);
            }
            let whole_start = start.div_ceil(FACTOR) * FACTOR;
            let whole_end = end / FACTOR * FACTOR;
            found = self.fold(level, start..whole_start, found);
            found = self.fold(level, whole_end..end, found);
            (start, end) = (whole_start / FACTOR, whole_end / FACTOR);
            level += 1;
        }
        (found[0] <= found[1]).then_some(found)
    }

    fn scan(&self, level: usize, range: Range<usize>, found: [f32; 2]) -> Option<[f32; 2]> {
        let found = self.fold(level, range, found);
        (found[0] <= found[1]).then_some(found)
    }

    fn fold(&self, level: usize, range: Range<usize>, found: [f32; 2]) -> [f32; 2] {
        match level.checked_sub(1) {
            None => self.values[range].iter().fold(found, |all, &value| both(all, [value, value])),
            Some(above) => self.levels[above][range].iter().fold(found, |all, &pair| both(all, pair)),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_range_agrees_with_a_plain_scan() {
        let values: Vec<f32> =
            (0..1000_u32).map(|i| if i % 97 == 5 { f32::NAN } else { ((i * 7919) % 1013) as f32 }).collect();
        let pyramid = Pyramid::new(values.clone());
        for start in (0..1000).step_by(37) {
            for end in (start..=1003).step_by(29) {
                let plain = values[start..end.min(1000)]
                    .iter()
                    .fold(NOTHING, |range, &value| both(range, [value, value]));
                let expected = (plain[0] <= plain[1]).then_some(plain);
                assert_eq!(pyramid.min_max(start..end), expected, "{start}..{end}");
            }
        }
        assert_eq!(Pyramid::new(vec![f32::NAN]).min_max(0..1), None);
        assert_eq!(Pyramid::default().min_max(0..5), None);
    }
}

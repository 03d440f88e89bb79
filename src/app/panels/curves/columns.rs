//! What is drawn of a curve with more samples than pixels, kept from frame to frame. Looking a long curve over for each column of pixels reads
//! memory all over it, which no cache of the processor holds: of an hour at 120 frames a second a quarter of the interface's time.

use std::sync::Arc;

use egui::Rangef;

use super::super::super::view_models::{CurveSet, Pyramid, TimeWindow};
use super::super::super::widgets::TimeAxis;

/// A curve of a set.
#[derive(Clone, Debug)]
pub(crate) struct Curve<'a> {
    pub set: &'a Arc<CurveSet>,
    pub line: usize,
    /// The source's, else the one that is shown.
    pub is_source: bool,
}

impl Curve<'_> {
    /// Its numbers.
    pub(super) fn row(&self) -> &Pyramid {
        let line = &self.set.lines[self.line];
        if self.is_source { &line.before } else { line.shown() }
    }
}

/// Smallest and largest value of each column; `None` in a gap.
pub(crate) type Spans = Arc<Vec<Option<[f32; 2]>>>;

#[derive(Debug)]
struct Kept {
    set: Arc<CurveSet>,
    line: usize,
    is_source: bool,
    window: TimeWindow,
    span: Rangef,
    spans: Spans,
    is_used: bool,
}

/// The columns of the curves of the last frame.
#[derive(Debug, Default)]
pub(crate) struct Columns {
    kept: Vec<Kept>,
}

impl Columns {
    /// A frame begins: what the last one did not draw is forgotten.
    pub(super) fn begin(&mut self) {
        self.kept.retain_mut(|kept| std::mem::take(&mut kept.is_used));
    }

    /// The columns of a curve from the left end of the axis to its right end.
    pub(super) fn of(&mut self, curve: &Curve<'_>, axis: &TimeAxis) -> Spans {
        let is_it = |kept: &&mut Kept| {
            Arc::ptr_eq(&kept.set, curve.set)
                && (kept.line, kept.is_source) == (curve.line, curve.is_source)
                && (kept.window, kept.span) == (axis.window, axis.span)
        };
        if let Some(kept) = self.kept.iter_mut().find(is_it) {
            kept.is_used = true;
            return Arc::clone(&kept.spans);
        }
        let spans = Arc::new(looked_over(curve, axis));
        self.kept.push(Kept {
            set: Arc::clone(curve.set),
            line: curve.line,
            is_source: curve.is_source,
            window: axis.window,
            span: axis.span,
            spans: Arc::clone(&spans),
            is_used: true,
        });
        spans
    }
}

fn looked_over(curve: &Curve<'_>, axis: &TimeAxis) -> Vec<Option<[f32; 2]>> {
    let (row, times) = (curve.row(), &curve.set.times);
    let first = times.place(axis.window.start_secs).floor() as usize;
    let last = (times.place(axis.window.end_secs).ceil() as usize).min(row.len().saturating_sub(1));
    let columns = axis.span.span().max(1.0) as usize;
    let mut spans = Vec::with_capacity(columns);
    let mut from = first;
    for column in 0..columns {
        let right = axis.span.min + column as f32 + 1.0;
        let to = (times.place(axis.time(right)).ceil() as usize).clamp(from, last + 1);
        // One sample more, so that neighbouring columns meet.
        spans.push(row.min_max(from.saturating_sub(1)..to));
        from = to.max(from);
    }
    spans
}

#[cfg(test)]
mod tests {
    use super::super::super::super::view_models::{CurveLine, CurveView, SampleTimes};
    use super::*;
    use crate::clip::{FrameGrid, Times};

    fn set(scale: f32) -> Arc<CurveSet> {
        let times = Times::Even { step_secs: 0.01, count: 5001 };
        let values = (0..5001_u32).map(|i| scale * ((i * 7919) % 1013) as f32).collect();
        let line = CurveLine { name: "xy".into(), color: 2, before: Pyramid::new(values), after: None };
        Arc::new(CurveSet {
            joint: 0,
            view: CurveView::PlaneAngles,
            bands: Vec::new(),
            times: SampleTimes::new(&FrameGrid { times, rate: 100.0 }),
            lines: vec![line],
            unit: "°",
        })
    }

    #[test]
    fn columns_hold_all_samples_above_them_and_are_kept_until_something_changes() {
        let (one, other) = (set(1.0), set(2.0));
        let axis = |end_secs: f64| TimeAxis {
            span: Rangef::new(10.0, 110.0),
            window: TimeWindow { start_secs: 0.0, end_secs },
        };
        let of = |kept: &mut Columns, set: &Arc<CurveSet>, end_secs: f64| {
            kept.of(&Curve { set, line: 0, is_source: false }, &axis(end_secs))
        };
        let mut kept = Columns::default();
        kept.begin();
        let first = of(&mut kept, &one, 50.0);
        // A hundred columns of fifty samples, and the one before each.
        let values = one.lines[0].before.values();
        for column in [1_usize, 47, 99] {
            let samples = &values[50 * column..=50 * (column + 1)];
            let (low, high) = (
                samples.iter().copied().fold(f32::MAX, f32::min),
                samples.iter().copied().fold(0.0, f32::max),
            );
            let [found_low, found_high] = first[column].expect("numbers");
            // At an edge a sample belongs to either side.
            assert!(
                found_low >= low && found_high <= high && found_high - found_low > 0.9 * (high - low),
                "{column}"
            );
        }
        kept.begin();
        assert!(Arc::ptr_eq(&first, &of(&mut kept, &one, 50.0)), "nothing has changed");
        assert!(!Arc::ptr_eq(&first, &of(&mut kept, &one, 25.0)), "another stretch of time");
        let doubled = of(&mut kept, &other, 50.0);
        assert_eq!(doubled[47].map(|[low, _]| low), first[47].map(|[low, _]| 2.0 * low), "other numbers");
        kept.begin();
        kept.begin();
        assert!(!Arc::ptr_eq(&first, &of(&mut kept, &one, 50.0)), "what no frame draws is forgotten");
    }
}

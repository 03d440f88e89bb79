//! The stretch of time that the turn map and the curves show, and the ticks along it.

use crate::clip::FrameGrid;

/// A stretch of time on screen, in seconds. It always lies inside the clip and is never empty.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TimeWindow {
    /// Left edge.
    pub start_secs: f64,
    /// Right edge.
    pub end_secs: f64,
}

/// The shortest stretch shown, in frames.
const FEWEST_FRAMES: f64 = 4.0;

impl TimeWindow {
    /// All of a clip; a clip of one moment gets a second around it.
    pub fn whole(duration_secs: f64) -> Self {
        let end_secs = if duration_secs > 0.0 { duration_secs } else { 1.0 };
        Self { start_secs: 0.0, end_secs }
    }

    /// Its length in seconds.
    pub fn span(&self) -> f64 {
        self.end_secs - self.start_secs
    }

    /// Where a time lies: 0 at the left edge, 1 at the right.
    pub fn share(&self, time_secs: f64) -> f64 {
        (time_secs - self.start_secs) / self.span()
    }

    /// The time at a share of the width.
    pub fn time(&self, share: f64) -> f64 {
        self.start_secs + share * self.span()
    }

    /// Whether a time is shown.
    pub fn contains(&self, time_secs: f64) -> bool {
        (self.start_secs..=self.end_secs).contains(&time_secs)
    }

    /// `factor` times as long, with `at_secs` staying where it is.
    #[must_use]
    pub fn zoom(&self, factor: f64, at_secs: f64, duration_secs: f64, rate: f64) -> Self {
        let whole = Self::whole(duration_secs);
        let shortest = (FEWEST_FRAMES / rate.max(1e-6)).min(whole.span());
        let span = (self.span() * factor).clamp(shortest, whole.span());
        let start_secs = at_secs - self.share(at_secs) * span;
        Self { start_secs, end_secs: start_secs + span }.held_inside(whole)
    }

    /// Moved later by some seconds.
    #[must_use]
    pub fn pan(&self, by_secs: f64, duration_secs: f64) -> Self {
        Self { start_secs: self.start_secs + by_secs, end_secs: self.end_secs + by_secs }
            .held_inside(Self::whole(duration_secs))
    }

    /// Long enough to show a fault and the motion beside it.
    #[must_use]
    pub fn around(first_secs: f64, last_secs: f64, duration_secs: f64, rate: f64) -> Self {
        let whole = Self::whole(duration_secs);
        let run = last_secs - first_secs;
        let span = (run * 4.0).max(40.0 / rate.max(1e-6)).min(whole.span());
        let middle = f64::midpoint(first_secs, last_secs);
        Self { start_secs: middle - span / 2.0, end_secs: middle + span / 2.0 }.held_inside(whole)
    }

    /// The same length, moved as little as shows `time_secs`. While a clip plays the window turns over like a page.
    #[must_use]
    pub fn showing(&self, time_secs: f64, duration_secs: f64) -> Self {
        if self.contains(time_secs) {
            return *self;
        }
        let shift = if time_secs > self.end_secs {
            time_secs - self.start_secs - 0.05 * self.span()
        } else {
            time_secs - self.end_secs + 0.05 * self.span()
        };
        self.pan(shift, duration_secs)
    }

    /// The same stretch as far as there is such a time, else as near to it as the clip goes.
    #[must_use]
    pub fn within(&self, duration_secs: f64) -> Self {
        let whole = Self::whole(duration_secs);
        // The rest of a sum must not move a window that lies inside.
        if self.end_secs <= whole.end_secs { *self } else { self.held_inside(whole) }
    }

    fn held_inside(self, whole: Self) -> Self {
        let span = self.span().min(whole.span());
        let start_secs = self.start_secs.clamp(0.0, whole.end_secs - span);
        Self { start_secs, end_secs: start_secs + span }
    }
}

/// One mark of the ruler.
#[derive(Clone, Debug, PartialEq)]
pub struct Tick {
    /// Where.
    pub secs: f64,
    /// The words beside it, for the long ones: seconds, and the frame.
    pub label: Option<[String; 2]>,
}

/// Ticks of a ruler `width_px` wide, with room for a label at each labelled one.
pub fn ticks(window: TimeWindow, grid: &FrameGrid, width_px: f64) -> Vec<Tick> {
    const LABEL_PX: f64 = 92.0;
    if width_px < 1.0 || grid.count() == 0 {
        return Vec::new();
    }
    let secs_per_label = window.span() / (width_px / LABEL_PX).max(1.0);
    let (step, parts) = step_at_least(secs_per_label);
    let small = step / f64::from(parts);
    let first = (window.start_secs / small).ceil() as i64;
    let last = (window.end_secs / small + 1e-9).floor() as i64;
    (first..=last)
        .take(2000)
        .map(|index| {
            let secs = index as f64 * small;
            let is_long = index.rem_euclid(i64::from(parts)) == 0;
            let label = is_long.then(|| [short_seconds(secs, step), grid.frame(secs).to_string()]);
            Tick { secs, label }
        })
        .collect()
}

/// The smallest round step of at least `secs`, and into how many parts it is divided.
fn step_at_least(secs: f64) -> (f64, u8) {
    const MINUTES: [(f64, u8); 6] = [(60.0, 6), (120.0, 4), (300.0, 5), (600.0, 5), (1800.0, 6), (3600.0, 6)];
    if secs > 30.0 {
        return MINUTES.into_iter().find(|(step, _)| *step >= secs).unwrap_or((7200.0, 4));
    }
    let power = 10.0_f64.powf(secs.max(1e-6).log10().floor());
    [(1.0, 5), (2.0, 4), (5.0, 5), (10.0, 5)]
        .into_iter()
        .map(|(step, parts)| (step * power, parts))
        .find(|(step, _)| *step >= secs)
        .unwrap_or((10.0 * power, 5))
}

fn short_seconds(secs: f64, step: f64) -> String {
    if step >= 60.0 {
        return format!("{}:{:02}", (secs / 60.0).round() as i64, (secs % 60.0).round() as i64);
    }
    let decimals = (-(step.log10() + 1e-9).floor()).clamp(0.0, 4.0) as usize;
    format!("{secs:.decimals$} s")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn zoom_keeps_the_time_under_the_pointer_and_stays_inside() {
        let window = TimeWindow::whole(10.0).zoom(0.5, 4.0, 10.0, 30.0);
        assert!((window.share(4.0) - 0.4).abs() < 1e-12);
        assert!((window.span() - 5.0).abs() < 1e-12);
        assert_eq!(window.zoom(100.0, 4.0, 10.0, 30.0), TimeWindow::whole(10.0));
        assert_eq!(window.pan(100.0, 10.0).end_secs, 10.0);
        let close = (0..100).fold(window, |window, _| window.zoom(0.5, 4.0, 10.0, 30.0));
        assert!((close.span() - 4.0 / 30.0).abs() < 1e-9);
    }

    #[test]
    fn a_shorter_clip_draws_the_window_in() {
        let window = TimeWindow::whole(6.5);
        assert_eq!(window.within(2.5), TimeWindow::whole(2.5));
        assert_eq!(window.within(6.5), window);
        let near = TimeWindow { start_secs: 4.0, end_secs: 5.0 };
        assert_eq!(near.within(2.5), TimeWindow { start_secs: 1.5, end_secs: 2.5 });
        assert_eq!(near.within(10.0), near);
    }

    #[test]
    fn labels_are_round_and_far_enough_apart() {
        let grid = FrameGrid::even(120.0, 300.0);
        for (window, width) in
            [(TimeWindow::whole(300.0), 900.0), (TimeWindow { start_secs: 10.0, end_secs: 10.25 }, 500.0)]
        {
            let ticks = ticks(window, &grid, width);
            let labelled: Vec<f64> =
                ticks.iter().filter(|tick| tick.label.is_some()).map(|tick| tick.secs).collect();
            assert!(labelled.len() >= 2, "{window:?}");
            let apart_px = (labelled[1] - labelled[0]) / window.span() * width;
            assert!(apart_px >= 90.0, "{apart_px}");
        }
        let whole = ticks(TimeWindow::whole(300.0), &grid, 900.0);
        assert_eq!(whole[0].label, Some(["0:00".to_owned(), "0".to_owned()]));
        let near = ticks(TimeWindow::whole(2.0), &grid, 900.0);
        assert!(
            near.iter().any(|tick| tick.label == Some(["0.5 s".to_owned(), "60".to_owned()])),
            "{near:?}"
        );
    }

    #[test]
    fn playing_turns_the_page() {
        let window = TimeWindow { start_secs: 2.0, end_secs: 4.0 };
        assert_eq!(window.showing(3.0, 10.0), window);
        let next = window.showing(4.01, 10.0);
        assert!(next.contains(4.01) && (next.span() - 2.0).abs() < 1e-12);
    }
}

//! Values up a chart.

use egui::{Align2, FontId, Painter, Rangef, pos2};

use super::super::super::theme::Look;
use super::super::super::widgets::TimeAxis;

/// From values to points on screen.
#[derive(Clone, Copy, Debug)]
pub(super) struct ValueAxis {
    pub low: f64,
    pub high: f64,
    pub rows: Rangef,
}

impl ValueAxis {
    /// From the lowest value shown to the highest.
    pub(super) const fn new([low, high]: [f64; 2], rows: Rangef) -> Self {
        Self { low, high, rows }
    }

    /// The value at a height on screen.
    pub(super) fn value(&self, y: f32) -> f64 {
        self.low + self.per_point() * f64::from(self.rows.max - y)
    }

    /// So much a point on screen is.
    pub(super) fn per_point(&self) -> f64 {
        (self.high - self.low) / f64::from(self.rows.span()).max(1.0)
    }

    /// Where a value is on screen.
    pub(super) fn y(&self, value: f64) -> f32 {
        let share = (value - self.low) / (self.high - self.low);
        self.rows.max - (share * f64::from(self.rows.span())) as f32
    }

    /// Round values about 34 points apart.
    fn ticks(&self) -> Vec<f64> {
        let wanted = (self.high - self.low) / (f64::from(self.rows.span()) / 34.0).max(1.0);
        let power = 10.0_f64.powf(wanted.log10().floor());
        // 45 and 90 divide the circle: they come before the plain decimal steps where they fit.
        let circle = [15.0, 30.0, 45.0, 90.0, 180.0, 360.0, 720.0];
        let decimal = [1.0, 2.0, 5.0, 10.0].map(|step| step * power);
        let step = if wanted > 10.0 && wanted <= 720.0 {
            circle.into_iter().find(|step| *step >= wanted)
        } else {
            decimal.into_iter().find(|step| *step >= wanted)
        };
        let step = step.unwrap_or(10.0 * power);
        let first = (self.low / step).ceil() as i64;
        let last = (self.high / step).floor() as i64;
        (first..=last).take(64).map(|index| index as f64 * step).collect()
    }

    /// Lines and numbers.
    pub(super) fn grid_ui(&self, painter: &Painter, look: &Look, axis: &TimeAxis, unit: &str) {
        let font = FontId::proportional(11.5);
        let ticks = self.ticks();
        let step = ticks.windows(2).map(|pair| pair[1] - pair[0]).next().unwrap_or(1.0);
        let decimals = (-(step.log10() + 1e-9).floor()).clamp(0.0, 4.0) as usize;
        for value in ticks {
            let y = self.y(value);
            let color = if value == 0.0 { look.axis } else { look.grid };
            painter.hline(axis.span, y, (1.0, color));
            let words = format!("{value:.decimals$}{unit}");
            painter.text(pos2(axis.span.min - 6.0, y), Align2::RIGHT_CENTER, words, font.clone(), look.faint);
        }
    }
}

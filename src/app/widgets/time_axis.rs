//! Time across a chart: one mapping for the turn map and the curves, and the gestures they share.

use egui::{Color32, Painter, PointerButton, Rangef, Rect, Response, Ui};

use super::super::commands::Command;
use super::super::theme::Look;
use super::super::view_models::{TimeWindow, ticks};
use crate::clip::Clip;

/// Maps seconds to points on screen and back.
#[derive(Clone, Copy, Debug)]
pub(crate) struct TimeAxis {
    /// Left and right end on screen.
    pub span: Rangef,
    /// The stretch of time between them.
    pub window: TimeWindow,
}

impl TimeAxis {
    /// Where a time is on screen.
    pub(crate) fn x(&self, time_secs: f64) -> f32 {
        self.span.min + (self.window.share(time_secs) * f64::from(self.span.span())) as f32
    }

    /// The time at a place on screen.
    pub(crate) fn time(&self, x: f32) -> f64 {
        self.window.time(f64::from((x - self.span.min) / self.span.span().max(1.0)))
    }
}

/// Vertical lines at the ruler's labelled ticks.
pub(crate) fn vertical_grid(painter: &Painter, axis: &TimeAxis, clip: &Clip, rows: Rangef, color: Color32) {
    for tick in ticks(axis.window, &clip.grid, f64::from(axis.span.span())) {
        if tick.label.is_some() {
            painter.vline(axis.x(tick.secs), rows, (1.0, color));
        }
    }
}

/// The line at the time that is shown.
pub(crate) fn playhead(painter: &Painter, look: &Look, axis: &TimeAxis, time_secs: f64, rows: Rangef) {
    if axis.window.contains(time_secs) {
        let x = axis.x(time_secs);
        painter.vline(x, rows, (3.0, look.background.gamma_multiply(0.6)));
        painter.vline(x, rows, (1.5, look.text));
    }
}

/// A click whose press and release both came since the last frame: it never shows as a button held down.
pub(crate) fn is_quick_click(ui: &Ui, response: &Response) -> bool {
    response.clicked() && ui.input(|input| input.pointer.primary_pressed())
}

/// The gestures of every chart over time: dragging scrubs, the middle button or Shift pans, the wheel zooms.
pub(crate) fn scrub_and_zoom(
    ui: &Ui,
    response: &Response,
    area: Rect,
    axis: &TimeAxis,
    clip: &Clip,
    wheel_zooms: bool,
    out: &mut Vec<Command>,
) {
    scrub_or_pan(ui, response, axis, clip, out);
    zoom_time(ui, response, area, axis, clip, wheel_zooms, out);
}

/// Dragging scrubs, with the middle button or Shift it pans.
pub(crate) fn scrub_or_pan(
    ui: &Ui,
    response: &Response,
    axis: &TimeAxis,
    clip: &Clip,
    out: &mut Vec<Command>,
) {
    let shift = ui.input(|input| input.modifiers.shift);
    let pans =
        response.dragged_by(PointerButton::Middle) || (response.dragged_by(PointerButton::Primary) && shift);
    if pans {
        let secs = -f64::from(response.drag_delta().x / axis.span.span().max(1.0)) * axis.window.span();
        out.push(Command::ShowTime(axis.window.pan(secs, clip.duration_secs)));
    } else if (response.is_pointer_button_down_on() && ui.input(|input| input.pointer.primary_down())
        || is_quick_click(ui, response))
        && !shift
        && let Some(pointer) = response.interact_pointer_pos()
    {
        out.push(Command::Scrub(axis.time(pointer.x)));
    }
}

/// The wheel zooms, sideways or with Shift it pans.
pub(crate) fn zoom_time(
    ui: &Ui,
    response: &Response,
    area: Rect,
    axis: &TimeAxis,
    clip: &Clip,
    wheel_zooms: bool,
    out: &mut Vec<Command>,
) {
    let (duration, rate) = (clip.duration_secs, clip.grid.rate);
    let shift = ui.input(|input| input.modifiers.shift);
    let Some(pointer) = response.hover_pos().filter(|pointer| area.contains(*pointer)) else { return };
    let (wheel, zoom) = ui.input(|input| (input.smooth_scroll_delta, input.zoom_delta()));
    let mut window = axis.window;
    let at = axis.time(pointer.x);
    if zoom != 1.0 {
        window = window.zoom(1.0 / f64::from(zoom), at, duration, rate);
    }
    if wheel_zooms && wheel.y != 0.0 && !shift {
        window = window.zoom((-f64::from(wheel.y) / 200.0).exp(), at, duration, rate);
    }
    let sideways = if shift && wheel_zooms { wheel.x + wheel.y } else { wheel.x };
    if sideways != 0.0 {
        let secs = -f64::from(sideways / axis.span.span().max(1.0)) * window.span();
        window = window.pan(secs, duration);
    }
    if window != axis.window {
        out.push(Command::ShowTime(window));
    }
}

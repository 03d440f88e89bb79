//! The pointer on the chart: what a press takes hold of, and what a drag of it does.

use egui::{
    CursorIcon, Key, Painter, PointerButton, Pos2, Rect, Response, Shape, Stroke, StrokeKind, Ui, Vec2, pos2,
};

use super::super::super::commands::{Command, CurveCommand};
use super::super::super::theme::Look;
use super::super::super::view_models::{Grip, KeyChoice, KeyDrag, on_frame};
use super::super::super::widgets::{is_quick_click, scrub_or_pan, zoom_time};
use super::super::Scope;
use super::chart::Chart;
use crate::clip::{Push, PushFrame};
use crate::rotor::Bivector;

/// So far the pointer goes before a press is a drag.
const DRAG_FROM: f32 = 4.0;
/// With Shift held a drag goes this share of its way.
const FINE: f32 = 0.1;
/// A drag this much more across than up is meant across, and the other way round.
const PLAIN: f32 = 2.5;

/// What a press has taken hold of.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Hold {
    /// The ground: scrubs.
    Ground,
    /// The ground, with Ctrl held: a box of keys.
    Box,
    /// The numbers on the left.
    Gutter,
    /// A key.
    Pip(Grip),
    /// A curve between two keys that can be told apart.
    Segment(Grip, [f64; 2]),
    /// A curve with a key at each frame.
    Dense(Grip),
    /// The lane of keys: a stretch of time.
    Lane,
    /// The chosen keys in the lane.
    Chosen(Grip),
    /// A bracket: the time that stays, and the one that goes along.
    Bracket(f64, f64),
}

/// Which ways a drag goes.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Way {
    Time,
    Value,
    Both,
}

/// A press on the chart, from down to up.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct CurvePress {
    hold: Hold,
    origin: Pos2,
    last: Pos2,
    /// How far it was taken, fine parts of the way counted less.
    by: Vec2,
    is_drag: bool,
    adds: bool,
    way: Way,
    /// The values from bottom to top when it began: a chart that fitted them anew would run away under the hand.
    bounds: [f64; 2],
}

/// What the pointer is over while nothing is held.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Hover {
    dense: Option<Grip>,
}

/// Takes in the pointer.
pub(super) fn hand_ui(ui: &Ui, response: &Response, chart: &Chart<'_>, scope: &mut Scope<'_>) -> Hover {
    let (pressed, down, modifiers, pointer) = ui.input(|input| {
        (
            input.pointer.primary_pressed(),
            input.pointer.primary_down(),
            input.modifiers,
            input.pointer.latest_pos(),
        )
    });
    let pans = response.dragged_by(PointerButton::Middle);
    if pans {
        scrub_or_pan(ui, response, &chart.axis, chart.clip, scope.out);
    }
    let quick = is_quick_click(ui, response);
    if pressed && (response.is_pointer_button_down_on() || quick) {
        let at = ui.input(|input| input.pointer.press_origin()).or(response.interact_pointer_pos());
        if let Some(at) = at {
            let hold = hold_at(chart, at, modifiers.command);
            scope.pictures.curve_press = Some(CurvePress {
                hold,
                origin: at,
                last: at,
                by: Vec2::ZERO,
                is_drag: false,
                adds: modifiers.shift,
                way: Way::Both,
                bounds: [chart.values.low, chart.values.high],
            });
        }
    }
    if let Some(mut press) = scope.pictures.curve_press {
        if ui.input(|input| input.key_pressed(Key::Escape)) {
            scope.out.push(Command::Curve(CurveCommand::GiveUp));
            scope.pictures.curve_press = None;
        } else {
            let at = pointer.unwrap_or(press.last);
            let was_drag = press.is_drag;
            press.go_on(at, modifiers.shift);
            if press.is_drag && !was_drag {
                press.settle_hold(chart);
            }
            if matches!(press.hold, Hold::Ground) {
                scrub_or_pan(ui, response, &chart.axis, chart.clip, scope.out);
            }
            let is_over = !down || quick;
            if press.is_drag {
                drag(chart, &press, is_over, scope);
            } else if is_over {
                click(chart, &press, scope);
            }
            scope.pictures.curve_press = (!is_over).then_some(press);
        }
        ui.set_cursor_icon_of(press.hold);
        wheel(ui, response, chart, scope, true);
        return Hover::default();
    }
    let mut hover = Hover::default();
    if let Some(at) = response.hover_pos() {
        let hold = hold_at(chart, at, modifiers.command);
        ui.set_cursor_icon_of(hold);
        if let Hold::Dense(grip) = hold {
            hover.dense = Some(grip);
        }
    }
    if response.double_clicked() && response.hover_pos().is_some_and(|at| at.x < chart.plot.left()) {
        scope.out.push(Command::Curve(CurveCommand::ShowValues(None)));
    }
    wheel(ui, response, chart, scope, false);
    hover
}

trait Cursor {
    fn set_cursor_icon_of(&self, hold: Hold);
}

impl Cursor for Ui {
    fn set_cursor_icon_of(&self, hold: Hold) {
        let icon = match hold {
            Hold::Ground | Hold::Lane => return,
            Hold::Box => CursorIcon::Crosshair,
            Hold::Gutter | Hold::Dense(_) => CursorIcon::ResizeVertical,
            Hold::Pip(_) | Hold::Chosen(_) => CursorIcon::Grab,
            Hold::Segment(..) => CursorIcon::PointingHand,
            Hold::Bracket(..) => CursorIcon::ResizeHorizontal,
        };
        self.ctx().set_cursor_icon(icon);
    }
}

fn hold_at(chart: &Chart<'_>, at: Pos2, command: bool) -> Hold {
    if at.x < chart.plot.left() - 4.0 {
        return Hold::Gutter;
    }
    if at.y >= chart.lane.top() - 2.0 {
        if let Some([first, last]) = chart.choice.span() {
            let [left, right] = [chart.axis.x(first), chart.axis.x(last)];
            if last > first && (at.x - left).abs() <= 5.0 {
                return Hold::Bracket(last, first);
            }
            if last > first && (at.x - right).abs() <= 5.0 {
                return Hold::Bracket(first, last);
            }
            if (left - 3.0..=right + 3.0).contains(&at.x)
                && let Some(grip) = nearest_chosen(chart, chart.axis.time(at.x))
            {
                return Hold::Chosen(grip);
            }
        }
        return Hold::Lane;
    }
    if chart.is_source_alone {
        return Hold::Ground;
    }
    if let Some(grip) = chart.pip_at(at) {
        return Hold::Pip(grip);
    }
    if command {
        return Hold::Box;
    }
    if let Some(grip) = chart.curve_at(at) {
        if chart.is_dense(grip.joint, grip.secs) {
            let secs = on_frame(&chart.clip.grid, grip.secs).min(chart.clip.duration_secs);
            return Hold::Dense(Grip { secs, ..grip });
        }
        if let Some(span) = chart.segment(grip.joint, grip.secs)
            && chart.keys(grip.joint).is_some()
        {
            return Hold::Segment(grip, span);
        }
    }
    Hold::Ground
}

/// The chosen key nearest to a time.
fn nearest_chosen(chart: &Chart<'_>, secs: f64) -> Option<Grip> {
    let nearest = |(joint, times): (usize, &[f64])| {
        let after = times.partition_point(|&own| own < secs);
        let near =
            [after.checked_sub(1), Some(after)].into_iter().flatten().filter_map(|place| times.get(place));
        let best = near.copied().min_by(|a, b| (a - secs).abs().total_cmp(&(b - secs).abs()))?;
        Some(Grip { joint, secs: best, line: 0 })
    };
    let all = chart.choice.rows().filter_map(nearest);
    all.min_by(|a, b| (a.secs - secs).abs().total_cmp(&(b.secs - secs).abs()))
}

impl CurvePress {
    /// The values to be shown while it lasts.
    pub(super) fn held_values(&self) -> Option<[f64; 2]> {
        (self.hold != Hold::Gutter).then_some(self.bounds)
    }

    fn go_on(&mut self, at: Pos2, is_fine: bool) {
        let step = at - self.last;
        self.last = at;
        self.by += if is_fine { step * FINE } else { step };
        let way = at - self.origin;
        if self.is_drag || way.length() < DRAG_FROM {
            return;
        }
        self.is_drag = true;
        self.way = if way.x.abs() > PLAIN * way.y.abs() {
            Way::Time
        } else if way.y.abs() > PLAIN * way.x.abs() {
            Way::Value
        } else {
            Way::Both
        };
    }

    /// What a press has hold of shows when it becomes a drag.
    fn settle_hold(&mut self, chart: &Chart<'_>) {
        // One key of captured motion moved by itself would be a spike: only keys that were chosen before are moved.
        if let Hold::Pip(grip) = self.hold
            && chart.is_dense(grip.joint, grip.secs)
            && !chart.choice.has(grip.joint, grip.secs)
        {
            self.hold = Hold::Dense(grip);
        }
        // Captured curves lie everywhere: who drags across scrubs.
        if matches!(self.hold, Hold::Dense(_)) && self.way == Way::Time {
            self.hold = Hold::Ground;
        }
    }

    /// How far it was taken: seconds, and units of the curve.
    fn taken(&self, chart: &Chart<'_>) -> (f64, f64) {
        let axis = &chart.axis;
        let secs = f64::from(self.by.x / axis.span.span().max(1.0)) * axis.window.span();
        let up = -f64::from(self.by.y) * chart.values.per_point();
        match self.way {
            Way::Time => (secs, 0.0),
            Way::Value => (0.0, up),
            Way::Both => (secs, up),
        }
    }
}

fn drag(chart: &Chart<'_>, press: &CurvePress, is_over: bool, scope: &mut Scope<'_>) {
    let (by_secs, by_deg) = press.taken(chart);
    let is_first = scope.bench.curve_hand.base.is_none();
    let mut ask = |command: CurveCommand| scope.out.push(Command::Curve(command));
    let end = |drag: KeyDrag| if is_over { CurveCommand::Settle(drag) } else { CurveCommand::Try(drag) };
    match press.hold {
        Hold::Ground => {}
        Hold::Box => {
            if is_over {
                let found = chart.keys_in(Rect::from_two_pos(press.origin, press.last));
                ask(CurveCommand::Choose(joined(chart.choice, found, press.adds)));
            }
        }
        Hold::Lane => {
            if is_over {
                let [start, end] = [press.origin.x.min(press.last.x), press.origin.x.max(press.last.x)];
                let found = chart.keys_from(chart.axis.time(start), chart.axis.time(end));
                ask(CurveCommand::Choose(joined(chart.choice, found, press.adds)));
            }
        }
        Hold::Gutter => {
            let up = f64::from(press.by.y) * chart.values.per_point();
            // From where they were when it began: the way is all of it so far.
            ask(CurveCommand::ShowValues(Some(press.bounds.map(|value| value + up))));
        }
        Hold::Pip(grip) => {
            if is_first && !chart.choice.has(grip.joint, grip.secs) {
                let key = KeyChoice::one(grip.joint, grip.secs);
                ask(CurveCommand::Choose(joined(chart.choice, key, press.adds)));
            }
            if is_first {
                ask(CurveCommand::ChooseLine(grip.line));
            }
            ask(end(KeyDrag::Move { grip, by_secs, by_deg }));
        }
        Hold::Segment(grip, span) => {
            if is_first {
                let mut keys = KeyChoice::default();
                keys.add(grip.joint, span);
                ask(CurveCommand::Choose(joined(chart.choice, keys, press.adds)));
                ask(CurveCommand::ChooseLine(grip.line));
            }
            ask(end(KeyDrag::Move { grip: Grip { secs: span[0], ..grip }, by_secs, by_deg }));
        }
        Hold::Dense(grip) => {
            if is_first {
                ask(CurveCommand::ChooseLine(grip.line));
            }
            // The whole way counts, not only its part up and down.
            let by_deg = -f64::from(press.by.y) * chart.values.per_point();
            let reach_secs = scope.bench.session.falloff_secs;
            ask(end(KeyDrag::Push { grip, by_deg, reach_secs }));
        }
        Hold::Chosen(grip) => ask(end(KeyDrag::Move { grip, by_secs, by_deg: 0.0 })),
        Hold::Bracket(about_secs, secs) => {
            let far = secs - about_secs;
            let least = far.signum() / chart.clip.grid.rate.max(1e-6);
            let to = far + f64::from(press.by.x / chart.axis.span.span().max(1.0)) * chart.axis.window.span();
            let to = if to * far <= least * far { least } else { to };
            ask(end(KeyDrag::Scale { about_secs, factor: to / far }));
        }
    }
}

fn joined(known: &KeyChoice, found: KeyChoice, adds: bool) -> KeyChoice {
    if !adds {
        return found;
    }
    let mut all = known.clone();
    all.add_all(&found);
    all
}

fn click(chart: &Chart<'_>, press: &CurvePress, scope: &mut Scope<'_>) {
    let mut ask = |command: CurveCommand| scope.out.push(Command::Curve(command));
    match press.hold {
        Hold::Pip(grip) => {
            let mut choice = if press.adds { chart.choice.clone() } else { KeyChoice::default() };
            choice.toggle(grip.joint, grip.secs);
            ask(CurveCommand::Choose(choice));
            ask(CurveCommand::ChooseSegment(None));
            ask(CurveCommand::ChooseLine(grip.line));
        }
        Hold::Segment(grip, [start, _]) => {
            ask(CurveCommand::Choose(KeyChoice::default()));
            ask(CurveCommand::ChooseSegment(Some((grip.joint, start))));
            ask(CurveCommand::ChooseLine(grip.line));
        }
        Hold::Dense(grip) => {
            ask(CurveCommand::ChooseLine(grip.line));
            scope.out.push(Command::Scrub(grip.secs));
        }
        Hold::Ground | Hold::Lane | Hold::Box => {
            if !press.adds && (!chart.choice.is_empty() || scope.bench.session.curves.segment.is_some()) {
                ask(CurveCommand::Choose(KeyChoice::default()));
                ask(CurveCommand::ChooseSegment(None));
            }
        }
        Hold::Gutter | Hold::Chosen(_) | Hold::Bracket(..) => {}
    }
}

/// The wheel zooms time, over the numbers on the left values, with Alt or during a push its reach.
fn wheel(ui: &Ui, response: &Response, chart: &Chart<'_>, scope: &mut Scope<'_>, is_held: bool) {
    let Some(at) = response.hover_pos().or(ui.input(|input| input.pointer.latest_pos()).filter(|_| is_held))
    else {
        return;
    };
    let (delta, alt) = ui.input(|input| (input.smooth_scroll_delta, input.modifiers.alt));
    let pushes = matches!(scope.pictures.curve_press, Some(CurvePress { hold: Hold::Dense(_), .. }));
    if alt || pushes {
        let turned = delta.x + delta.y;
        if turned != 0.0 {
            let secs = scope.bench.session.falloff_secs * (f64::from(turned) / 240.0).exp();
            scope.out.push(Command::Curve(CurveCommand::SetFalloff(secs)));
        }
    } else if at.x < chart.plot.left() - 4.0 {
        if delta.y != 0.0 {
            let factor = (-f64::from(delta.y) / 200.0).exp();
            let middle = chart.values.value(at.y);
            let bounds =
                [chart.values.low, chart.values.high].map(|value| middle + (value - middle) * factor);
            scope.out.push(Command::Curve(CurveCommand::ShowValues(Some(bounds))));
        }
    } else if !is_held {
        zoom_time(ui, response, chart.area, &chart.axis, chart.clip, true, scope.out);
    }
}

/// What a gesture shows of itself: the box, the stretch of time, the reach of a push.
pub(super) fn gesture_ui(ui: &Ui, chart: &Chart<'_>, scope: &Scope<'_>, hover: &Hover) {
    let look = scope.look;
    let painter = ui.painter_at(chart.area);
    let reach_secs = scope.bench.session.falloff_secs;
    if let Some(grip) = hover.dense {
        reach_ui(&painter, &look, chart, grip.secs, reach_secs, false);
    }
    if let Some(KeyDrag::Push { grip, reach_secs, .. }) = scope.bench.curve_hand.drag() {
        reach_ui(&painter, &look, chart, grip.secs, reach_secs, true);
    }
    let Some(press) = scope.pictures.curve_press.filter(|press| press.is_drag) else { return };
    let bounds = match press.hold {
        Hold::Box => Rect::from_two_pos(press.origin, press.last).intersect(chart.plot.expand(4.0)),
        Hold::Lane => Rect::from_two_pos(
            pos2(press.origin.x, chart.lane.top() + 1.0),
            pos2(press.last.x, chart.lane.bottom() - 1.0),
        )
        .intersect(chart.lane),
        _ => return,
    };
    painter.rect_filled(bounds, 0.0, look.selection.gamma_multiply(0.16));
    painter.rect_stroke(bounds, 0.0, Stroke::new(1.0, look.selection), StrokeKind::Inside);
}

/// How far a push reaches and how it fades: its share as a hill on the ground of the chart.
fn reach_ui(painter: &Painter, look: &Look, chart: &Chart<'_>, secs: f64, reach_secs: f64, is_held: bool) {
    let push = Push { joint: 0, center_secs: secs, reach_secs, turn: Bivector::ZERO, frame: PushFrame::Own };
    let plot = chart.plot;
    let height = if is_held { plot.height() * 0.30 } else { plot.height() * 0.16 };
    let [left, right] = [secs - reach_secs, secs + reach_secs].map(|secs| chart.axis.x(secs));
    let left_end = left.max(plot.left());
    let right_end = right.min(plot.right());
    if right_end <= left_end {
        return;
    }
    let columns = ((right_end - left_end) / 2.0).ceil().max(2.0) as usize;
    let fill = look.selection.gamma_multiply(if is_held { 0.20 } else { 0.12 });
    let mut mesh = egui::Mesh::default();
    let mut ridge = Vec::with_capacity(columns + 1);
    for column in 0..=columns {
        let x = left_end + (right_end - left_end) * column as f32 / columns as f32;
        let y = plot.bottom() - height * push.share(chart.axis.time(x)) as f32;
        if let Some(&Pos2 { x: before, .. }) = ridge.last() {
            let cell = Rect::from_min_max(pos2(before, y), pos2(x, plot.bottom()));
            mesh.add_colored_rect(cell, fill);
        }
        ridge.push(pos2(x, y));
    }
    painter.add(Shape::mesh(mesh));
    painter.add(Shape::line(ridge, Stroke::new(1.2, look.selection)));
    for x in [left, right].into_iter().filter(|x| plot.x_range().contains(*x)) {
        painter.vline(x, egui::Rangef::new(plot.bottom() - 7.0, plot.bottom()), (1.5, look.selection));
    }
    if is_held {
        let words = format!("reaches {reach_secs:.2} s");
        let at = pos2(chart.axis.x(secs).clamp(plot.left() + 50.0, plot.right() - 50.0), plot.bottom() - 4.0);
        painter.text(at, egui::Align2::CENTER_BOTTOM, words, egui::FontId::proportional(11.5), look.text);
    }
}

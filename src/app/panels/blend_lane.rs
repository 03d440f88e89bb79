//! The blend lane: the clips over the result's time, and how much of the second is taken when.

use std::sync::Arc;

use egui::{
    Align2, CursorIcon, EventFilter, FontId, Key, Painter, Rangef, Rect, Response, Role, Sense, Shape,
    Stroke, StrokeKind, Ui, WidgetInfo, pos2, vec2,
};

use super::super::commands::{Action, Command};
use super::super::theme::{GUTTER_WIDTH, INSET, Look, TIME_MARGIN};
use super::super::view_models::{
    BlendFacts, BlendKind, FaintFigure, LaneBars, held_place, knots_of, lane_bars, seconds, weight_at,
    with_knot, with_knot_at, without_knot,
};
use super::super::widgets::{TimeAxis, focus_ring, hint, playhead, read_out, scrub_and_zoom, segment, strip};
use super::Scope;
use super::blend_form::{clip_title, kind_ui};
use super::blend_mean::mean_lane_ui;
use super::blend_picture::picture_ui;
use crate::blend::JoinPlace;
use crate::clip::Clip;
use crate::scene::{BlendForm, BlendPass, Edit, PassId};

const BAR: f32 = 19.0;
const PIP: f32 = 5.0;

/// The blend that the lane shows, and everything about it that the parts of the panel need.
pub(super) struct Lane {
    /// Which pass.
    pub(super) id: PassId,
    /// With the parameters that are being dragged.
    pub(super) pass: BlendPass,
    /// What is known of it.
    pub(super) facts: Option<Arc<BlendFacts>>,
    /// Lengths of the two clips, seconds.
    pub(super) lengths: [f64; 2],
    /// Frames a second of the first clip.
    pub(super) rate: f64,
}

impl Lane {
    /// Of what is looked at.
    pub(super) fn of(scope: &Scope<'_>) -> Option<Self> {
        let (id, pass) = scope.bench.shown_blend()?;
        let first = scope.bench.clip_before(id).or(scope.bench.source())?;
        let facts = scope.bench.blend_facts().cloned();
        let known = facts.as_ref().map(|facts| facts.second.duration_secs);
        let given = || {
            let project = scope.bench.project.as_ref()?;
            Some(project.result_clip(project.document().work_on(pass.other)?)?.duration_secs)
        };
        let second = known.or_else(given).unwrap_or(0.0);
        let (lengths, rate) = ([first.duration_secs, second], first.grid.rate.max(1e-6));
        Some(Self { id, pass, facts, lengths, rate })
    }

    /// Shows another form while it is dragged.
    pub(super) fn preview(&self, form: BlendForm, scope: &mut Scope<'_>) {
        let step = BlendPass { form, ..self.pass.clone() }.into();
        scope.out.push(Command::PreviewPass(self.id, Box::new(step)));
    }

    /// Keeps another form.
    pub(super) fn commit(&self, form: BlendForm, scope: &mut Scope<'_>) {
        let step = BlendPass { form, ..self.pass.clone() }.into();
        let work = scope.bench.session.work;
        scope.out.push(Command::Edit(Edit::ChangePass { work, pass: self.id, step }));
    }

    /// On a frame of the first clip.
    pub(super) fn on_frame(&self, secs: f64) -> f64 {
        (secs * self.rate).round() / self.rate
    }

    /// A place that begins on frames, within both clips.
    pub(super) fn placed(&self, place: JoinPlace) -> BlendForm {
        let on_frames = JoinPlace {
            first_secs: self.on_frame(place.first_secs),
            second_secs: self.on_frame(place.second_secs),
            ..place
        };
        BlendForm::Join(held_place(on_frames, self.lengths))
    }

    /// A time of the first clip as one of the result.
    fn result_secs(&self, first_secs: f64) -> f64 {
        self.facts.as_ref().map_or(first_secs, |facts| facts.result_secs(first_secs))
    }

    fn first_secs(&self, result_secs: f64) -> f64 {
        self.facts.as_ref().map_or(result_secs, |facts| facts.first_secs(result_secs))
    }
}

/// The panel.
pub(crate) fn blend_lane_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let Some(lane) = Lane::of(scope) else { return };
    let kind = BlendKind::of(&lane.pass.form);
    strip(ui, "Blend", |ui| {
        segment(ui, "Hide", Action::BlendLane, scope.now, scope.out);
        segment(ui, "Figures", Action::BlendClips, scope.now, scope.out);
        ui.add_space(10.0);
        // Laid out from the right.
        for other in BlendKind::ALL.into_iter().rev() {
            if kind_ui(ui, other, kind == other, &scope.look) && kind != other {
                lane.commit(other.form(lane.lengths[0], lane.lengths[1]), scope);
            }
        }
    });
    let Some(clip) = scope.bench.result().cloned() else {
        hint(ui, "No clip");
        return;
    };
    let area = ui.available_rect_before_wrap();
    if area.width() < GUTTER_WIDTH + 60.0 || area.height() < 2.0 * BAR + 20.0 {
        return;
    }
    let axis = TimeAxis {
        span: Rangef::new(area.left() + GUTTER_WIDTH, area.right() - TIME_MARGIN),
        window: scope.bench.session.window,
    };
    if let Some(problem) = problem(scope) {
        ui.painter().text(
            pos2(axis.span.min + 4.0, area.center().y),
            Align2::LEFT_CENTER,
            &problem,
            FontId::proportional(13.0),
            scope.look.error,
        );
        let response = ui.interact(area, ui.scope_id().with("problem"), Sense::hover());
        response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &problem));
        return;
    }
    let over_time = Rect::from_x_y_ranges(axis.span, area.y_range());
    // Below everything else: what is dragged beside a knot or a bar scrubs, as in the other charts over time.
    let ground = ui.interact(over_time, ui.scope_id().with("blend ground"), Sense::click_and_drag());
    ground.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, "Blend lane"));
    let rows = Rows::of(area);
    let bars = lane_bars(&lane.pass.form, lane.lengths, clip.duration_secs);
    let painter = ui.painter_at(over_time.expand2(vec2(PIP, 0.0)));
    let is_mean = kind == BlendKind::Mean;
    if is_mean {
        mean_lane_ui(ui, &lane, &bars, area, &axis, &painter, scope);
    } else {
        draw_bars(&painter, &lane, &bars, &rows, &axis, scope);
        draw_weights(&painter, &lane, &rows, &axis, &scope.look);
    }
    let new_knot = ground.double_clicked() && matches!(lane.pass.form, BlendForm::Mix { .. });
    if new_knot && let Some(pointer) = ground.interact_pointer_pos() {
        let secs = lane.first_secs(axis.time(pointer.x)).clamp(0.0, lane.lengths[0]);
        let secs = lane.on_frame(secs);
        lane.commit(with_knot_at(&lane.pass.form, secs, weight_at(&lane.pass.form, secs)), scope);
    } else {
        scrub_and_zoom(ui, &ground, over_time, &axis, &clip, true, scope.out);
    }
    match &lane.pass.form {
        BlendForm::Join(place) => join_handles(ui, &lane, *place, &bars, &rows, &axis, scope),
        BlendForm::Mix { .. } | BlendForm::Add { .. } => knots_ui(ui, &lane, &rows, &axis, &painter, scope),
        BlendForm::Mean { .. } => {}
    }
    playhead(&painter, &scope.look, &axis, scope.bench.session.playback.playhead_secs, area.y_range());
    let gutter = Rect::from_min_max(area.min, pos2(axis.span.min, area.bottom()));
    match kind {
        BlendKind::Join => picture_ui(ui, gutter.shrink(INSET * 0.5), &lane, scope),
        BlendKind::Mix | BlendKind::Add => scale_ui(ui.painter(), gutter, &lane, &rows, &scope.look),
        BlendKind::Mean => {}
    }
    hovered(ui, &ground, area, &lane, &axis, &clip, scope);
    ui.allocate_rect(area, Sense::hover());
}

/// Why there is no blend, in the words of the pass.
fn problem(scope: &Scope<'_>) -> Option<String> {
    let (id, pass) = scope.bench.shown_blend()?;
    let own = scope.bench.work()?.pass(id)?;
    if !own.on {
        return Some("This blend is switched off".to_owned());
    }
    let known = scope.bench.blend.as_ref().filter(|known| known.key.pass == pass);
    known.and_then(|known| known.facts.as_ref().err().cloned())
}

/// Where things stand from top to bottom.
struct Rows {
    first: Rangef,
    weights: Rangef,
    second: Rangef,
}

impl Rows {
    fn of(area: Rect) -> Self {
        let (top, bottom) = (area.top() + 4.0, area.bottom() - 4.0);
        Self {
            first: Rangef::new(top, top + BAR),
            weights: Rangef::new(top + BAR + 8.0, bottom - BAR - 8.0),
            second: Rangef::new(bottom - BAR, bottom),
        }
    }

    /// Where a weight is on screen: 0 beside the first clip's bar and 1 beside the second's; of a layer more is higher.
    fn y(&self, form: &BlendForm, weight: f64) -> f32 {
        let (_, [least, most]) = knots_of(form);
        let share = ((weight - least) / (most - least)) as f32;
        match form {
            BlendForm::Add { .. } => self.weights.max - share * self.weights.span(),
            _ => self.weights.min + share * self.weights.span(),
        }
    }

    fn weight(&self, form: &BlendForm, y: f32) -> f64 {
        let (_, [least, most]) = knots_of(form);
        let share = f64::from((y - self.weights.min) / self.weights.span().max(1.0));
        match form {
            BlendForm::Add { .. } => most - share * (most - least),
            _ => least + share * (most - least),
        }
    }
}

fn bar_rect(secs: [f64; 2], y: Rangef, axis: &TimeAxis) -> Rect {
    Rect::from_x_y_ranges(Rangef::new(axis.x(secs[0]), axis.x(secs[1])), y)
}

fn draw_bars(
    painter: &Painter,
    lane: &Lane,
    bars: &LaneBars,
    rows: &Rows,
    axis: &TimeAxis,
    scope: &Scope<'_>,
) {
    let look = &scope.look;
    if let Some(overlap) = bars.overlap {
        let between = Rect::from_x_y_ranges(
            Rangef::new(axis.x(overlap[0]), axis.x(overlap[1])),
            Rangef::new(rows.first.min, rows.second.max),
        );
        painter.rect_filled(between, 0.0, look.hover);
        for x in [between.left(), between.right()] {
            let ends = [pos2(x, between.top()), pos2(x, between.bottom())];
            painter.extend(Shape::dashed_line(&ends, Stroke::new(1.0, look.axis), 4.0, 3.0));
        }
    }
    let first = scope.bench.work().map_or_else(String::new, |work| work.name.clone());
    let carried = lane.facts.as_ref().is_some_and(|facts| facts.is_carried);
    let second = clip_title(scope, lane.pass.other) + if carried { ", carried over" } else { "" };
    for (letter, name, secs, y, fill) in [
        ('A', first, bars.first, rows.first, look.before),
        ('B', second, bars.second, rows.second, look.after),
    ] {
        clip_bar(painter, (letter, &name), secs, y, fill, axis, look);
    }
}

/// The bar of a clip with its letter and name, as far as there is room for them.
pub(super) fn clip_bar(
    painter: &Painter,
    (letter, name): (char, &str),
    secs: [f64; 2],
    y: Rangef,
    fill: egui::Color32,
    axis: &TimeAxis,
    look: &Look,
) {
    let bar = bar_rect(secs, y, axis);
    painter.rect(bar, 3.0, fill.gamma_multiply(0.30), Stroke::new(1.0, fill), StrokeKind::Inside);
    let visible = bar.intersect(painter.clip_rect()).shrink2(vec2(6.0, 0.0));
    if visible.width() < 14.0 {
        return;
    }
    let mut job = egui::text::LayoutJob::simple_singleline(
        format!("{letter}  {name}"),
        FontId::proportional(12.5),
        look.text,
    );
    job.wrap = egui::text::TextWrapping::truncate_at_width(visible.width());
    let galley = painter.layout_job(job);
    let at = pos2(visible.left(), visible.center().y - galley.size().y / 2.0);
    painter.galley(at, galley, look.text);
}

/// The curve of weights, as it is at every other pixel.
fn draw_weights(painter: &Painter, lane: &Lane, rows: &Rows, axis: &TimeAxis, look: &Look) {
    let form = &lane.pass.form;
    let (_, [least, most]) = knots_of(form);
    for weight in [least, 0.0, 1.0, most] {
        painter.hline(axis.span, rows.y(form, weight), (1.0, look.grid));
    }
    let count = (axis.span.span() / 2.0).max(1.0) as usize;
    let points = (0..=count).map(|step| {
        let x = axis.span.min + axis.span.span() * step as f32 / count as f32;
        let weight = weight_at(form, lane.first_secs(axis.time(x)));
        pos2(x, rows.y(form, weight.clamp(least, most)))
    });
    painter.add(Shape::line(points.collect(), Stroke::new(1.8, look.after)));
}

/// What the heights of the weights mean.
fn scale_ui(painter: &Painter, gutter: Rect, lane: &Lane, rows: &Rows, look: &Look) {
    let font = FontId::proportional(11.5);
    let form = &lane.pass.form;
    let (_, [least, most]) = knots_of(form);
    for weight in [least, 0.0, 1.0, most] {
        let at = pos2(gutter.right() - 6.0, rows.y(form, weight));
        let words = format!("{:.0} %", 100.0 * weight);
        painter.text(at, Align2::RIGHT_CENTER, words, font.clone(), look.faint);
    }
    let at = pos2(gutter.left() + INSET, rows.weights.center());
    painter.text(at, Align2::LEFT_CENTER, "share of B", font, look.faint);
}

/// The keyboard is for this part while it has it.
fn lock_arrows(ui: &Ui, response: &Response) -> bool {
    if !response.has_focus() {
        return false;
    }
    let filter = EventFilter { horizontal_arrows: true, vertical_arrows: true, ..EventFilter::default() };
    ui.memory_mut(|memory| memory.set_focus_lock_filter(response.id, filter));
    true
}

/// How often the arrows were pressed: to the right less to the left, and up less down.
fn arrows(ui: &Ui) -> [f64; 2] {
    ui.input_mut(|input| {
        let mut count = |key: Key| input.count_and_consume_key(egui::Modifiers::NONE, key) as f64;
        [count(Key::ArrowRight) - count(Key::ArrowLeft), count(Key::ArrowUp) - count(Key::ArrowDown)]
    })
}

/// The bar of the second clip and the end of the overlap, to be dragged.
fn join_handles(
    ui: &mut Ui,
    lane: &Lane,
    place: JoinPlace,
    bars: &LaneBars,
    rows: &Rows,
    axis: &TimeAxis,
    scope: &mut Scope<'_>,
) {
    let shown = Rect::from_x_y_ranges(axis.span, Rangef::new(rows.first.min, rows.second.max));
    let bar = bar_rect(bars.second, rows.second, axis).intersect(shown);
    let response = ui.interact(bar, ui.scope_id().with("second bar"), Sense::click_and_drag());
    response.widget_info(|| {
        let words = format!("Second clip begins at {}", seconds(place.first_secs));
        WidgetInfo::labeled(Role::Slider, true, words)
    });
    focus_ring(ui, &response);
    if response.hovered() || response.dragged() {
        ui.ctx().set_cursor_icon(CursorIcon::ResizeHorizontal);
    }
    let trims = ui.input(|input| input.modifiers.shift);
    let slid = |from: JoinPlace, by: f64| {
        if trims {
            JoinPlace { second_secs: from.second_secs - by, ..from }
        } else {
            JoinPlace { first_secs: from.first_secs + by, ..from }
        }
    };
    drag_place(ui, &response, lane, place, axis, &slid, scope);
    if lock_arrows(ui, &response) {
        let [across, up] = arrows(ui);
        if across != 0.0 || up != 0.0 {
            let moved = JoinPlace {
                first_secs: place.first_secs + across / lane.rate,
                second_secs: place.second_secs + up / lane.rate,
                ..place
            };
            lane.commit(lane.placed(moved), scope);
        }
    }
    response.on_hover_text(
        "Drag to let B begin earlier or later; with Shift, to begin elsewhere in B. Arrows: a frame; up and down: in B",
    );

    let Some([_, end]) = bars.overlap else { return };
    let x = axis.x(end);
    if !axis.span.expand(4.0).contains(x) {
        return;
    }
    let grip = Rect::from_x_y_ranges(Rangef::new(x - 6.0, x + 6.0), rows.weights);
    let response = ui.interact(grip, ui.scope_id().with("overlap end"), Sense::click_and_drag());
    response.widget_info(|| {
        WidgetInfo::labeled(Role::Slider, true, format!("Overlap of {}", seconds(place.overlap_secs)))
    });
    let mark = Rect::from_center_size(pos2(x, rows.weights.center()), vec2(6.0, 18.0));
    let fill = if response.hovered() || response.dragged() { scope.look.selection } else { scope.look.axis };
    ui.painter().rect_filled(mark, 3.0, fill);
    focus_ring(ui, &response);
    if response.hovered() || response.dragged() {
        ui.ctx().set_cursor_icon(CursorIcon::ResizeHorizontal);
    }
    let widened = |from: JoinPlace, by: f64| {
        let most = (lane.lengths[0] - from.first_secs).min(lane.lengths[1] - from.second_secs);
        let wanted = lane.on_frame(from.overlap_secs + by).max(1.0 / lane.rate);
        JoinPlace { overlap_secs: wanted.min(most), ..from }
    };
    drag_place(ui, &response, lane, place, axis, &widened, scope);
    if lock_arrows(ui, &response) {
        let [across, _] = arrows(ui);
        if across != 0.0 {
            lane.commit(lane.placed(widened(place, across / lane.rate)), scope);
        }
    }
    response.on_hover_text("How long both clips are seen. Drag, or press the arrows");
}

/// Drags a place from where it was when the drag began; letting go is one step of the history.
fn drag_place(
    ui: &Ui,
    response: &Response,
    lane: &Lane,
    place: JoinPlace,
    axis: &TimeAxis,
    moved: &dyn Fn(JoinPlace, f64) -> JoinPlace,
    scope: &mut Scope<'_>,
) {
    let id = response.id.with("from");
    let pointer = response.interact_pointer_pos().map(|pointer| pointer.x);
    if response.drag_started()
        && let Some(x) = ui.input(|input| input.pointer.press_origin()).map(|origin| origin.x).or(pointer)
    {
        ui.data_mut(|data| data.insert_temp(id, (place, axis.time(x))));
        response.request_focus();
    }
    let Some((from, start)) = ui.data(|data| data.get_temp::<(JoinPlace, f64)>(id)) else { return };
    let Some(x) = pointer else { return };
    let form = lane.placed(moved(from, axis.time(x) - start));
    if response.drag_stopped() {
        ui.data_mut(|data| data.remove::<(JoinPlace, f64)>(id));
        lane.commit(form, scope);
    } else if response.dragged() && form != lane.pass.form {
        lane.preview(form, scope);
    }
}

/// The knots of the weight curve: dragged with the pointer, moved with the arrows, taken out with Delete.
fn knots_ui(
    ui: &mut Ui,
    lane: &Lane,
    rows: &Rows,
    axis: &TimeAxis,
    painter: &Painter,
    scope: &mut Scope<'_>,
) {
    let form = &lane.pass.form;
    let (knots, _) = knots_of(form);
    let is_only = knots.len() == 1;
    for (index, &[secs, weight]) in knots.iter().enumerate() {
        // The only weight stands for all time: its handle is in the middle of what is seen.
        let x = if is_only { axis.span.center() } else { axis.x(lane.result_secs(secs)) };
        if !axis.span.expand(PIP).contains(x) {
            continue;
        }
        let middle = pos2(x, rows.y(form, weight));
        let grip = Rect::from_center_size(middle, vec2(18.0, 18.0));
        let response = ui.interact(grip, ui.scope_id().with(("knot", index)), Sense::click_and_drag());
        let words = if is_only {
            format!("Weight {:.0} %", 100.0 * weight)
        } else {
            format!("Weight {} of {}: {:.0} % at {}", index + 1, knots.len(), 100.0 * weight, seconds(secs))
        };
        response.widget_info(|| WidgetInfo::labeled(Role::Slider, true, &words));
        let is_chosen = response.hovered() || response.dragged() || response.has_focus();
        if is_chosen {
            painter.circle_stroke(middle, PIP + 3.0, (1.5, scope.look.selection));
        }
        painter.circle(middle, PIP, scope.look.after, (1.5, scope.look.background));
        if response.dragged() || response.drag_stopped() {
            if let Some(pointer) = response.interact_pointer_pos() {
                let secs = lane.on_frame(lane.first_secs(axis.time(pointer.x)));
                let to = [secs, (rows.weight(form, pointer.y) * 100.0).round() / 100.0];
                let moved = with_knot(form, index, to, lane.lengths[0]);
                if response.drag_stopped() {
                    lane.commit(moved, scope);
                } else if moved != *form {
                    lane.preview(moved, scope);
                }
            }
            ui.ctx().set_cursor_icon(CursorIcon::Grabbing);
        } else if lock_arrows(ui, &response) {
            let [across, up] = arrows(ui);
            let toward = if matches!(form, BlendForm::Add { .. }) { up } else { -up };
            let gone = ui.input_mut(|input| {
                input.consume_key(egui::Modifiers::NONE, Key::Delete)
                    || input.consume_key(egui::Modifiers::NONE, Key::Backspace)
            });
            if gone {
                lane.commit(without_knot(form, index), scope);
            } else if across != 0.0 || toward != 0.0 {
                let to = [secs + across / lane.rate, weight + 0.05 * toward];
                lane.commit(with_knot(form, index, to, lane.lengths[0]), scope);
            }
        }
        if response.clicked() {
            response.request_focus();
        }
        if response.secondary_clicked() {
            lane.commit(without_knot(form, index), scope);
        }
        response.on_hover_text(if is_only && matches!(form, BlendForm::Mix { .. }) {
            format!("{words}. Drag up or down; a double click elsewhere in the lane makes a curve of it")
        } else {
            format!("{words}. Drag, or press the arrows; Delete takes it out")
        });
    }
}

/// What is under the pointer.
fn hovered(
    ui: &Ui,
    ground: &Response,
    area: Rect,
    lane: &Lane,
    axis: &TimeAxis,
    clip: &Clip,
    scope: &Scope<'_>,
) {
    let Some(pointer) = ground.hover_pos().filter(|_| !ground.dragged()) else { return };
    let secs = axis.time(pointer.x);
    let frame = clip.grid.frame(secs);
    let weight = weight_at(&lane.pass.form, lane.first_secs(secs));
    let share = (format!("share of B {:.0} %", 100.0 * weight), scope.look.text);
    let mut lines = vec![(format!("{} frame {frame}", seconds(secs)), scope.look.faint)];
    if !matches!(lane.pass.form, BlendForm::Mean { .. }) {
        lines.push(share);
    }
    read_out(ui.painter(), &scope.look, pointer, area, &lines);
}

/// The clips of the blend at the time that is shown, for the skeleton view.
pub(crate) fn blend_figures(scope: &Scope<'_>, result: &Clip) -> Vec<FaintFigure> {
    let blend = &scope.bench.session.blend;
    if !blend.shows_clips || !blend.shows_lane {
        return Vec::new();
    }
    let (Some((id, pass)), Some(facts)) = (scope.bench.shown_blend(), scope.bench.blend_facts()) else {
        return Vec::new();
    };
    let is_on = scope.bench.work().and_then(|work| work.pass(id)).is_some_and(|pass| pass.on);
    if !is_on {
        return Vec::new();
    }
    let secs = scope.bench.session.playback.playhead_secs;
    facts.figures(&pass.form, result, secs)
}

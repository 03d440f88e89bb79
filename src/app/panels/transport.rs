//! Play, step, scrub, loop and speed; and what is being worked at.

use egui::{Align2, CursorIcon, FontId, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use super::super::commands::{Action, Command};
use super::super::jobs::Slot;
use super::super::theme::INSET;
use super::super::view_models::{SnagState, rate_text, seconds};
use super::super::widgets::{Icon, icon_button, is_quick_click};
use super::Scope;

/// The bar along the bottom.
pub(crate) fn transport_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let look = scope.look;
    ui.painter().rect_filled(ui.max_rect(), 0.0, look.panel);
    let clip = scope.bench.result().cloned();
    let frame = egui::Frame::NONE.inner_margin(egui::Margin { left: 8, right: 8, top: 5, bottom: 5 });
    frame.show(ui, |ui| {
        ui.horizontal(|ui| {
            ui.spacing_mut().item_spacing.x = 2.0;
            icon_button(ui, Icon::First, Action::First, scope.now, scope.out);
            icon_button(ui, Icon::StepBack, Action::StepBack, scope.now, scope.out);
            let play = if scope.now.is_playing { Icon::Pause } else { Icon::Play };
            icon_button(ui, play, Action::Play, scope.now, scope.out);
            icon_button(ui, Icon::StepForward, Action::StepForward, scope.now, scope.out);
            icon_button(ui, Icon::Last, Action::Last, scope.now, scope.out);
            ui.add_space(6.0);
            icon_button(ui, Icon::Loop, Action::Loop, scope.now, scope.out);
            ui.add_space(6.0);
            speed_ui(ui, scope);
            ui.add_space(8.0);
            let Some(clip) = &clip else { return };
            let now = scope.bench.session.playback.playhead_secs;
            let frame = clip.grid.frame(now);
            let last = clip.grid.count().saturating_sub(1);
            let words = format!("{}  /  {}", seconds(now), seconds(clip.duration_secs));
            let longest = format!("{0}  /  {0}", seconds(clip.duration_secs));
            number_label(ui, scope, &words, &longest);
            let (words, longest) = (format!("frame {frame} / {last}"), format!("frame {last} / {last}"));
            number_label(ui, scope, &words, &longest);
            let rate = rate_text(&clip.grid);
            ui.label(egui::RichText::new(rate).size(12.0).color(look.faint))
                .on_hover_text(format!("{} frames a second in the file", clip.grid.rate));
            ui.with_layout(egui::Layout::right_to_left(egui::Align::Center), |ui| status_ui(ui, scope));
        });
        ui.add_space(1.0);
        match &clip {
            Some(clip) => scrub_bar(ui, scope, clip),
            None => {
                ui.allocate_space(vec2(ui.available_width(), 24.0));
            }
        }
    });
}

/// Numbers that change, in the room that the longest of them takes, so that nothing beside them moves.
fn number_label(ui: &mut Ui, scope: &Scope<'_>, words: &str, longest: &str) {
    let font = FontId::monospace(12.0);
    let width = ui.painter().layout_no_wrap(longest.to_owned(), font, scope.look.text).size().x + 18.0;
    let (bounds, response) = ui.allocate_exact_size(vec2(width, 20.0), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, words));
    ui.painter().text(
        bounds.left_center(),
        Align2::LEFT_CENTER,
        words,
        FontId::monospace(12.0),
        scope.look.text,
    );
}

fn speed_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let mut speed = scope.bench.session.playback.speed;
    let drag = egui::DragValue::new(&mut speed)
        .range(0.1..=4.0)
        .speed(0.01)
        .fixed_decimals(2)
        .prefix("× ")
        .update_while_editing(false);
    let response = ui.add_enabled(scope.now.has_clip, drag);
    response.widget_info(|| WidgetInfo::slider(scope.now.has_clip, speed, "Speed"));
    if response.on_hover_text("Speed of play, 0.1 to 4 times. Drag, or click and type").changed() {
        scope.out.push(Command::SetSpeed(speed));
    }
}

/// Long work: what, how far, and a way to stop it.
fn status_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let look = scope.look;
    let shown = scope.running.iter().find(|(slot, _)| {
        matches!(slot, Slot::Open | Slot::Survey | Slot::Export | Slot::Save | Slot::Relocate | Slot::Heat)
    });
    let Some((slot, share)) = shown else { return };
    let (button, response) = ui.allocate_exact_size(vec2(22.0, 20.0), Sense::click());
    let label = format!("Stop: {}", slot.label());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, &label));
    if response.hovered() {
        ui.painter().rect_filled(button, 4.0, look.chosen);
    }
    super::super::widgets::paint_icon(ui.painter(), button.shrink(4.0), Icon::Close, look.text);
    if response.on_hover_text(label).clicked() {
        scope.out.push(Command::Cancel(*slot));
    }
    let (bar, response) = ui.allocate_exact_size(vec2(120.0, 6.0), Sense::hover());
    let share = share.unwrap_or(0.0);
    response.widget_info(|| WidgetInfo::labeled(Role::ProgressIndicator, true, slot.label()));
    ui.painter().rect_filled(bar, 3.0, look.line);
    let done = Rect::from_min_size(bar.min, vec2(bar.width() * share.max(0.03), bar.height()));
    ui.painter().rect_filled(done, 3.0, look.text);
    ui.add_space(4.0);
    ui.label(egui::RichText::new(slot.label()).size(12.5).color(look.text));
}

/// All of the clip from left to right, whatever the charts show: playhead, loop range, snags.
fn scrub_bar(ui: &mut Ui, scope: &mut Scope<'_>, clip: &crate::clip::Clip) {
    let look = scope.look;
    let (bounds, response) =
        ui.allocate_exact_size(vec2(ui.available_width(), 26.0), Sense::click_and_drag());
    let playback = scope.bench.session.playback.clone();
    let now = playback.playhead_secs;
    response.widget_info(|| WidgetInfo::slider(true, now, "Scrub bar"));
    let duration = clip.duration_secs.max(1e-9);
    let rail = Rect::from_min_max(bounds.min + vec2(INSET, 9.0), bounds.max - vec2(INSET, 9.0));
    let x = |time: f64| rail.left() + (time / duration) as f32 * rail.width();
    let painter = ui.painter();
    painter.rect_filled(rail, 4.0, look.line);
    let (start, end) = playback.bounds(clip.duration_secs);
    let played =
        Rect::from_x_y_ranges(x(start)..=x(now).clamp(x(start), x(end).max(x(start))), rail.y_range());
    painter.rect_filled(played, 4.0, look.axis);
    // The stretch that the charts show, as a bracket below.
    let window = scope.bench.session.window;
    if window.span() < 0.999 * duration {
        let y = rail.bottom() + 4.0;
        painter.hline(x(window.start_secs)..=x(window.end_secs), y, (1.5, look.faint));
        for time in [window.start_secs, window.end_secs] {
            painter.vline(x(time), y - 3.0..=y, (1.5, look.faint));
        }
    }
    let mut last = [f32::NEG_INFINITY; 2];
    for (snag, &state) in scope.bench.snags().iter().zip(scope.states.iter()) {
        let at = x(f64::midpoint(snag.first_secs, snag.last_secs));
        let lane = usize::from(state != SnagState::Open);
        if at - last[lane] >= 2.0 {
            let color = if lane == 0 { look.snag } else { look.axis };
            painter.vline(at, rail.top() - 6.0..=rail.top() - 1.0, (1.5, color));
            last[lane] = at;
        }
    }
    if let Some((from, to)) = playback.range {
        for (place, time) in [from, to].into_iter().enumerate() {
            let handle = Rect::from_center_size(pos2(x(time), rail.center().y), vec2(9.0, 18.0));
            let label = ["Loop start", "Loop end"][place];
            let own = ui.interact(handle.expand(2.0), ui.scope_id().with(label), Sense::drag());
            own.widget_info(|| WidgetInfo::slider(true, time, label));
            let inward = if place == 0 { 1.0 } else { -1.0 };
            let edge = handle.center().x;
            ui.painter().vline(edge, handle.y_range(), (2.0, look.text));
            for y in [handle.top(), handle.bottom()] {
                ui.painter().hline(
                    edge.min(edge + 5.0 * inward)..=edge.max(edge + 5.0 * inward),
                    y,
                    (2.0, look.text),
                );
            }
            if let Some(pointer) = own.interact_pointer_pos().filter(|_| own.dragged()) {
                let time =
                    (f64::from((pointer.x - rail.left()) / rail.width()) * duration).clamp(0.0, duration);
                let range = if place == 0 { (time.min(to), to) } else { (from, time.max(from)) };
                scope.out.push(Command::SetLoopRange(Some(range)));
            }
            own.on_hover_cursor(CursorIcon::ResizeHorizontal);
        }
    }
    let knob = pos2(x(now), rail.center().y);
    ui.painter().circle(knob, 6.5, look.text, (2.0, look.panel));
    if let Some(pointer) = response
        .interact_pointer_pos()
        .filter(|_| response.is_pointer_button_down_on() || is_quick_click(ui, &response))
    {
        let time = f64::from((pointer.x - rail.left()) / rail.width()) * duration;
        scope.out.push(Command::Scrub(time));
    }
    if let Some(pointer) = response.hover_pos() {
        let time = (f64::from((pointer.x - rail.left()) / rail.width()) * duration).clamp(0.0, duration);
        let words = format!("{}  frame {}", seconds(time), clip.grid.frame(time));
        let layer =
            ui.ctx().layer_painter(egui::LayerId::new(egui::Order::Tooltip, ui.scope_id().with("scrub")));
        let above = pos2(pointer.x - 60.0, bounds.top() - 34.0);
        super::super::widgets::read_out(&layer, &look, above, ui.ctx().content_rect(), &[(words, look.text)]);
    }
}

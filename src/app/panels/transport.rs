//! Play, step, scrub, loop and speed; and what is being worked at.

use egui::{Align2, CursorIcon, FontId, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use super::super::commands::{Action, Command, TimeCommand};
use super::super::jobs::Slot;
use super::super::theme::INSET;
use super::super::view_models::{SnagState, clock, rate_text, seconds};
use super::super::widgets::{Icon, icon_button, is_quick_click};
use super::Scope;
use crate::scene::{Edit, MarkerChange};

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
            icon_button(ui, Icon::Marker, Action::AddMarker, scope.now, scope.out);
            ui.add_space(6.0);
            speed_ui(ui, scope);
            ui.add_space(8.0);
            let Some(clip) = &clip else { return };
            let now = scope.bench.session.playback.playhead_secs;
            let frame = clip.grid.frame(now);
            let last = clip.grid.count().saturating_sub(1);
            let whole = clock(clip.duration_secs, clip.duration_secs);
            let words = format!("{}  /  {whole}", clock(now, clip.duration_secs));
            let longest = format!("{whole}  /  {whole}");
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
        matches!(
            slot,
            Slot::Open
                | Slot::Survey
                | Slot::Export
                | Slot::Save
                | Slot::Relocate
                | Slot::Limits
                | Slot::Heat
        )
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

/// The keys of the chosen joint as ticks on the rail, one for each pixel at most: where there are more the rail is full.
fn key_marks(painter: &egui::Painter, rail: Rect, clip: &crate::clip::Clip, scope: &Scope<'_>) {
    let Some(track) = scope.bench.session.joint.and_then(|joint| clip.rotation(joint)) else { return };
    let duration = clip.duration_secs.max(1e-9);
    let (count, width) = (track.times.len(), rail.width().max(1.0));
    let ink = scope.look.faint;
    if count as f32 > 0.5 * width {
        // A key on each frame or nearly so: a line says it, in the time of one.
        let (first, last) = (track.times.at(0), track.times.at(count - 1));
        let x = |secs: f64| rail.left() + (secs / duration) as f32 * width;
        painter.hline(x(first)..=x(last), rail.bottom() - 1.0, (2.0, ink));
        return;
    }
    for secs in track.times.iter() {
        let x = rail.left() + (secs / duration) as f32 * width;
        painter.vline(x, rail.bottom() - 3.5..=rail.bottom(), (1.0, ink));
    }
}

/// A marker's name is left out where there is less room for it, points.
const LEAST_NAME: f32 = 12.0;

/// Named moments as flags above the rail: a click jumps there, a drag moves one, a double click renames it.
fn markers_ui(ui: &Ui, rail: Rect, clip: &crate::clip::Clip, scope: &mut Scope<'_>) {
    let look = scope.look;
    let markers = scope.bench.work().map(|work| work.markers.clone()).unwrap_or_default();
    let duration = clip.duration_secs.max(1e-9);
    let work = scope.bench.session.work;
    let place_of = |secs: f64| rail.left() + ((secs / duration) as f32).clamp(0.0, 1.0) * rail.width();
    for (at, marker) in markers.iter().enumerate() {
        let id = ui.scope_id().with(("marker", at));
        let moved: Option<f64> = ui.ctx().data(|data| data.get_temp(id));
        let secs = moved.unwrap_or(marker.secs);
        let x = place_of(secs);
        let flag = Rect::from_min_size(pos2(x - 1.0, rail.top() - 9.0), vec2(9.0, 9.0));
        let response = ui.interact(flag.expand(2.0), id, Sense::click_and_drag());
        response.widget_info(|| {
            WidgetInfo::labeled(Role::Button, true, format!("Marker {}, {}", marker.name, seconds(secs)))
        });
        let painter = ui.painter();
        painter.vline(x, flag.top()..=rail.bottom(), (1.5, look.text));
        let points =
            vec![flag.left_top(), pos2(flag.right(), flag.top() + 3.0), pos2(flag.left(), flag.top() + 6.0)];
        painter.add(egui::Shape::convex_polygon(points, look.text, egui::Stroke::NONE));
        // The name, as far as the next flag leaves room for it.
        let left = flag.right() + 1.0;
        let ends = markers.iter().map(|other| place_of(other.secs)).filter(|&other| other > x);
        let room = ends.fold(rail.right() + INSET, |end, other| end.min(other - 4.0)) - left;
        if room > LEAST_NAME {
            let mut job = egui::text::LayoutJob::single_section(
                marker.name.clone(),
                egui::TextFormat::simple(FontId::proportional(10.5), look.text),
            );
            job.wrap = egui::text::TextWrapping::truncate_at_width(room);
            let galley = painter.layout_job(job);
            let place = pos2(left, flag.top() - 4.0);
            let plate = Rect::from_min_size(place, galley.size()).expand2(vec2(2.0, 0.0));
            painter.rect_filled(plate, 2.0, look.panel);
            painter.galley(place, galley, look.text);
        }
        let response = response.on_hover_text(format!("{}, {}", marker.name, seconds(secs)));
        super::super::widgets::focus_ring(ui, &response);
        if response.dragged()
            && let Some(pointer) = response.interact_pointer_pos()
        {
            let time = f64::from((pointer.x - rail.left()) / rail.width()).clamp(0.0, 1.0) * duration;
            let time = clip.grid.time(clip.grid.frame(time));
            ui.ctx().data_mut(|data| data.insert_temp(id, time));
        }
        if response.drag_stopped() {
            ui.ctx().data_mut(|data| data.remove::<f64>(id));
            if let Some(secs) = moved {
                let change = MarkerChange::Move { at, secs };
                scope.out.push(Command::Edit(Edit::ChangeMarkers { work, change }));
            }
        } else if response.double_clicked() {
            scope.out.push(Command::Time(TimeCommand::AskMarkerName(at)));
        } else if response.clicked() {
            scope.out.push(Command::Scrub(marker.secs));
        }
        response.context_menu(|ui| {
            if ui.button("Rename…").clicked() {
                scope.out.push(Command::Time(TimeCommand::AskMarkerName(at)));
                ui.close();
            }
            if ui.button("Remove").clicked() {
                let change = MarkerChange::Remove { at };
                scope.out.push(Command::Edit(Edit::ChangeMarkers { work, change }));
                ui.close();
            }
        });
    }
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
    let rail = Rect::from_min_max(bounds.min + vec2(INSET, 11.0), bounds.max - vec2(INSET, 7.0));
    // A loop or a choice may still end where the clip did before it became shorter.
    let x = |time: f64| rail.left() + (time / duration).clamp(0.0, 1.0) as f32 * rail.width();
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
    if let Some([from, to]) = scope.bench.session.choice.span_secs {
        let span = Rect::from_x_y_ranges(x(from)..=x(to), rail.top() - 1.0..=rail.bottom() + 1.0);
        painter.rect_stroke(span, 2.0, (1.0, look.selection), egui::StrokeKind::Outside);
    }
    key_marks(painter, rail, clip, scope);
    // One stroke for each two points at most. Snags come by their starts, so their middles do not rise.
    let mut has_stroke = vec![[false; 2]; (rail.width() / 2.0) as usize + 1];
    for (snag, &state) in scope.bench.snags().iter().zip(scope.states.iter()) {
        let at = x(f64::midpoint(snag.first_secs, snag.last_secs));
        let lane = usize::from(state != SnagState::Open);
        let Some(cell) = has_stroke.get_mut(((at - rail.left()) / 2.0).max(0.0) as usize) else { continue };
        if !std::mem::replace(&mut cell[lane], true) {
            let color = if lane == 0 { look.snag } else { look.axis };
            painter.vline(at, rail.top() - 6.0..=rail.top() - 1.0, (1.5, color));
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
    markers_ui(ui, rail, clip, scope);
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

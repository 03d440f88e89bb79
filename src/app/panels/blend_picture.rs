//! The distance picture of a join: how far the poses of both clips are apart, for every place of one in the other.

use std::sync::Arc;

use egui::{
    Align2, Color32, ColorImage, EventFilter, FontId, Key, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2,
};

use super::super::theme::{Look, color32};
use super::super::view_models::seconds;
use super::super::widgets::{focus_ring, read_out};
use super::Scope;
use super::blend_lane::Lane;
use crate::blend::{DistancePicture, JoinPlace};
use crate::raster::cividis;
use crate::scene::BlendForm;

/// What the picture hangs on.
#[derive(Clone, Debug)]
pub(crate) struct DistanceKey {
    /// The numbers.
    pub picture: Arc<DistancePicture>,
}

impl PartialEq for DistanceKey {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.picture, &other.picture)
    }
}

/// The first clip's time goes across, the second's down; bright is near. A click chooses the place.
pub(super) fn picture_ui(ui: &mut Ui, room: Rect, lane: &Lane, scope: &mut Scope<'_>) {
    let BlendForm::Join(place) = lane.pass.form else { return };
    let Some(facts) = lane.facts.clone() else { return };
    let Some((_, picture)) = &facts.distances else { return };
    let side = (room.width() - 12.0).min(room.height() - 12.0);
    if side < 24.0 || picture.distances.is_empty() {
        return;
    }
    let look = scope.look;
    let bounds = Rect::from_min_size(
        pos2(room.right() - side - 4.0, room.top() + (room.height() - side) / 2.0 + 5.0),
        vec2(side, side),
    );
    let response = ui.interact(bounds, ui.scope_id().with("distance picture"), Sense::click_and_drag());
    response.widget_info(|| {
        let at = format!("{} of A, {} of B", seconds(place.first_secs), seconds(place.second_secs));
        WidgetInfo::labeled(Role::Canvas, true, format!("Distance picture: {at}"))
    });
    let key = DistanceKey { picture: Arc::clone(picture) };
    let texture = scope.pictures.distances.show(ui.ctx(), "distance picture", key, |key| image(&key.picture));
    let whole = Rect::from_min_max(pos2(0.0, 0.0), pos2(1.0, 1.0));
    ui.painter().image(texture, bounds, whole, Color32::WHITE);
    ui.painter().rect_stroke(bounds, 0.0, (1.0, look.line), egui::StrokeKind::Outside);
    let font = FontId::proportional(10.5);
    ui.painter().text(
        bounds.center_top() - vec2(0.0, 1.0),
        Align2::CENTER_BOTTOM,
        "A across",
        font.clone(),
        look.faint,
    );
    ui.painter().text(bounds.left_center() - vec2(3.0, 0.0), Align2::RIGHT_CENTER, "B", font, look.faint);

    let spans = [&picture.first_secs, &picture.second_secs].map(|secs| secs.last().copied().unwrap_or(0.0));
    let point = |place: JoinPlace| {
        let share = |secs: f64, span: f64| if span > 0.0 { (secs / span) as f32 } else { 0.5 };
        bounds.min
            + vec2(share(place.first_secs, spans[0]), share(place.second_secs, spans[1]))
                .clamp(vec2(0.0, 0.0), vec2(1.0, 1.0))
                * side
    };
    for (number, (best, _)) in facts.places.iter().enumerate() {
        // Whole within the picture, also at its edge.
        let at = bounds.shrink(6.0).clamp(point(*best));
        ui.painter().circle(at, 5.5, Color32::from_black_alpha(150), (1.0, Color32::WHITE));
        ui.painter().text(at, Align2::CENTER_CENTER, number + 1, FontId::proportional(9.0), Color32::WHITE);
    }
    cross(ui, point(place), bounds, &look);
    focus_ring(ui, &response);

    let place_at = |x: f32, y: f32| {
        let share = |value: f32| f64::from((value / side).clamp(0.0, 1.0));
        JoinPlace {
            first_secs: share(x - bounds.left()) * spans[0],
            second_secs: share(y - bounds.top()) * spans[1],
            ..place
        }
    };
    if let Some(pointer) = response.interact_pointer_pos() {
        let form = lane.placed(place_at(pointer.x, pointer.y));
        if response.clicked() || response.drag_stopped() {
            lane.commit(form, scope);
        } else if response.dragged() && form != lane.pass.form {
            lane.preview(form, scope);
        }
    }
    if response.clicked() {
        response.request_focus();
    }
    if response.has_focus() {
        let filter = EventFilter { horizontal_arrows: true, vertical_arrows: true, ..EventFilter::default() };
        ui.memory_mut(|memory| memory.set_focus_lock_filter(response.id, filter));
        let [across, down] = ui.input_mut(|input| {
            let mut count = |key: Key| input.count_and_consume_key(egui::Modifiers::NONE, key) as f64;
            [count(Key::ArrowRight) - count(Key::ArrowLeft), count(Key::ArrowDown) - count(Key::ArrowUp)]
        });
        if across != 0.0 || down != 0.0 {
            let moved = JoinPlace {
                first_secs: place.first_secs + across / lane.rate,
                second_secs: place.second_secs + down / lane.rate,
                ..place
            };
            lane.commit(lane.placed(moved), scope);
        }
    }
    if let Some(pointer) = response.hover_pos().filter(|_| !response.dragged()) {
        let under = place_at(pointer.x, pointer.y);
        let cell = |secs: f64, all: &[f64]| {
            all.partition_point(|&own| own <= secs).saturating_sub(1).min(all.len().saturating_sub(1))
        };
        let (row, column) =
            (cell(under.first_secs, &picture.first_secs), cell(under.second_secs, &picture.second_secs));
        let lines = [
            (format!("A {}  B {}", seconds(under.first_secs), seconds(under.second_secs)), look.text),
            (format!("poses {:.3} apart", picture.at(row, column)), look.faint),
            ("click: begin the overlap here".to_owned(), look.faint),
        ];
        let screen = ui.ctx().content_rect();
        let layer = egui::LayerId::new(egui::Order::Tooltip, response.id);
        read_out(&ui.ctx().layer_painter(layer), &look, pointer, screen, &lines);
    }
}

/// A cross over the whole picture, thin, with a ring at its middle.
fn cross(ui: &Ui, at: egui::Pos2, bounds: Rect, look: &Look) {
    let painter = ui.painter_at(bounds.expand(6.0));
    let dark = (2.5, Color32::from_black_alpha(120));
    for line in [dark, (1.0, Color32::WHITE)] {
        painter.hline(bounds.x_range(), at.y, line);
        painter.vline(at.x, bounds.y_range(), line);
    }
    painter.circle_stroke(at, 4.0, (2.0, look.selection));
}

/// Bright is near, by the rank of the distance's root: what is near is told apart best.
fn image(picture: &DistancePicture) -> ColorImage {
    let (columns, rows) = (picture.first_secs.len(), picture.second_secs.len());
    let least = picture.distances.iter().copied().fold(f64::INFINITY, f64::min);
    let most = picture.distances.iter().copied().fold(0.0, f64::max);
    let mut image = ColorImage::filled([columns, rows], Color32::BLACK);
    for y in 0..rows {
        for x in 0..columns {
            let span = (most - least).max(f64::MIN_POSITIVE);
            let share = ((picture.at(x, y) - least) / span).sqrt();
            image.pixels[y * columns + x] = color32(cividis(1.0 - share as f32));
        }
    }
    image
}

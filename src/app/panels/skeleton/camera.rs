//! What the pointer does to the camera.

use egui::{PointerButton, Rect, Ui};
use glam::DVec2;

use crate::raster::Camera;

/// The camera after this frame's gestures: dragging circles, the middle button or Shift moves, the wheel comes nearer.
pub(super) fn moved(
    ui: &Ui,
    response: &egui::Response,
    camera: Camera,
    [width, height]: [usize; 2],
    bounds: Rect,
) -> Camera {
    let mut camera = camera;
    let scale = f64::from(ui.pixels_per_point());
    let (shift, wheel, pinch) =
        ui.input(|input| (input.modifiers.shift, input.smooth_scroll_delta, input.zoom_delta()));
    let drag = response.drag_delta();
    let (dx, dy) = (f64::from(drag.x), f64::from(drag.y));
    let slides =
        response.dragged_by(PointerButton::Middle) || (response.dragged_by(PointerButton::Primary) && shift);
    if slides {
        camera.pan(dx * scale, dy * scale, width, height);
    } else if response.dragged_by(PointerButton::Primary) || response.dragged_by(PointerButton::Secondary) {
        camera.orbit(-dx * 0.008, dy * 0.008);
    }
    if let Some(pointer) = response.hover_pos() {
        let factor = (-f64::from(wheel.y + wheel.x) / 240.0).exp() / f64::from(pinch);
        if factor != 1.0 {
            let from_corner = (pointer - bounds.min) * ui.pixels_per_point();
            camera.zoom_at(factor, DVec2::new(from_corner.x.into(), from_corner.y.into()), width, height);
        }
    }
    camera
}

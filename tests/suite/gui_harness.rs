//! The whole window without a display, for tests that drive it. No tests of its own.

use egui_kittest::Harness;
use turnwright::app::paint::CpuRenderer;
use turnwright::app::{Screen as _, Start, Window};

/// A window of this size in points, opened on `start`: all its work is done at once, our own painter draws it.
pub(crate) fn window_harness<'a>(size: [f32; 2], start: Start) -> Harness<'a, Option<Window>> {
    Harness::builder().with_size(size).renderer(CpuRenderer::new(2)).build_ui_state(
        move |ui, window: &mut Option<Window>| {
            let window = window.get_or_insert_with(|| Window::unthreaded(ui.ctx(), start.clone()));
            window.logic(ui.ctx());
            window.ui(ui);
        },
        None,
    )
}

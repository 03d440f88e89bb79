//! Two ways to put a screen into a window.
//!
//! `glow` draws through a graphics driver. `cpu` draws with our own painter and needs none; it is several times
//! faster than a graphics driver that itself runs on the processor. The first is tried where the machine has a graphics
//! device, the second takes over when that fails. `TURNWRIGHT_RUNNER=cpu` or `=gl` in the environment forces one.

mod cpu;
mod device;
mod glow;
mod start;

pub use start::StartError;
pub(super) use start::need_display;

use crate::app::Screen;
use crate::app::settings::Placement;
use start::Choice;
use start::Progress;

/// Opens a window, shows the screen in it, and returns when the window is closed.
///
/// `screen` is called once, when the window exists.
///
/// # Errors
/// When no window can be opened. After a failed try with the graphics driver this process may be replaced by a new one
/// with the same arguments, so call this before reading input or starting work.
pub fn run(screen: impl FnOnce(&egui::Context) -> Box<dyn Screen>) -> Result<(), StartError> {
    run_at(Placement::default(), screen)
}

/// As [`run`], with the window where it was before.
///
/// # Errors
/// As [`run`].
pub fn run_at(
    place: Placement,
    screen: impl FnOnce(&egui::Context) -> Box<dyn Screen>,
) -> Result<(), StartError> {
    let choice = Choice::from_environment()?;
    need_display()?;
    let progress = Progress::default();
    match choice {
        Choice::Cpu => start::guard(&progress, || cpu::run(place, screen, &progress)),
        Choice::Gl => start::guard(&progress, || glow::run(place, screen, &progress, glow::Software::Accept)),
        Choice::Best if !device::is_present() => {
            start::guard(&progress, || cpu::run(place, screen, &progress))
        }
        Choice::Best => {
            match start::guard(&progress, || glow::run(place, screen, &progress, glow::Software::Refuse)) {
                // One process can have one event loop only, and a failed driver leaves much behind.
                Err(_) if !progress.has_screen() => start::restart_with_cpu(),
                result => result,
            }
        }
    }
}

/// The window before its first frame, the same for both runners.
fn window(place: Placement) -> egui::ViewportBuilder {
    let builder = match place.position {
        Some(position) => egui::ViewportBuilder::default().with_position(position),
        None => egui::ViewportBuilder::default(),
    };
    builder
        .with_title("Turnwright")
        .with_app_id("turnwright")
        .with_inner_size(place.size.unwrap_or([1440.0, 900.0]))
        .with_min_inner_size([640.0, 400.0])
        .with_icon(egui::IconData::default())
}

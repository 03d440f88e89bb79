//! The window drawn through a graphics driver.

use super::device::DriverName;
use super::start;
use super::start::Progress;
use super::start::StartError;
use crate::app::Screen;
use crate::app::settings::Placement;
use egui::ViewportCommand;

/// What to do with a driver that runs on the processor.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Software {
    /// Use it.
    Accept,
    /// Fail, so that the CPU runner takes over.
    Refuse,
}

/// Opens the window and returns when it is closed.
pub(super) fn run(
    place: Placement,
    screen: impl FnOnce(&egui::Context) -> Box<dyn Screen>,
    progress: &Progress,
    software: Software,
) -> Result<(), StartError> {
    let options = eframe::NativeOptions {
        viewport: super::window(place),
        renderer: eframe::Renderer::Glow,
        // Without it the picture is the painter's, pixel for pixel.
        dithering: false,
        ..Default::default()
    };
    DriverName::listen();
    let result = eframe::run_native(
        "turnwright",
        options,
        Box::new(|creation| {
            if DriverName::is_software() && software == Software::Refuse {
                return Err("the graphics driver runs on the processor".into());
            }
            progress.screen_begins();
            let screen = screen(&creation.egui_ctx);
            Ok(Box::new(Host { screen, title: String::new(), is_closing: false }))
        }),
    );
    result.map_err(|error| match error {
        eframe::Error::WinitEventLoop(_) => start::no_event_loop(),
        _ => StartError::Refused { reason: "the graphics driver does not work".to_owned() },
    })
}

/// Shows a screen as an `eframe` app.
struct Host {
    screen: Box<dyn Screen>,
    title: String,
    /// The screen has agreed to close.
    is_closing: bool,
}

impl eframe::App for Host {
    fn logic(&mut self, ctx: &egui::Context, _frame: &mut eframe::Frame) {
        self.screen.logic(ctx);
        if ctx.input(|input| input.viewport().close_requested()) && !self.is_closing {
            self.is_closing = self.screen.close_requested();
            if !self.is_closing {
                ctx.send_viewport_cmd(ViewportCommand::CancelClose);
            }
        }
    }

    fn ui(&mut self, ui: &mut egui::Ui, _frame: &mut eframe::Frame) {
        self.screen.ui(ui);
        let title = self.screen.title();
        if title != self.title {
            ui.ctx().send_viewport_cmd(ViewportCommand::Title(title.clone()));
            self.title = title;
        }
        if self.screen.should_close() && !self.is_closing {
            self.is_closing = true;
            ui.ctx().send_viewport_cmd(ViewportCommand::Close);
        }
    }

    fn clear_color(&self, visuals: &egui::Visuals) -> [f32; 4] {
        visuals.panel_fill.to_normalized_gamma_f32()
    }
}

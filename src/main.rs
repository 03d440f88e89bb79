//! Carries out a command, or opens the window.

use std::path::PathBuf;
use std::process::ExitCode;

use turnwright::cli::{self, Outcome};

fn main() -> ExitCode {
    match cli::run(std::env::args_os()) {
        Outcome::Done(code) => ExitCode::from(code),
        Outcome::OpenWindow(files) => match open_window(files) {
            Ok(()) => ExitCode::SUCCESS,
            Err(error) => cli::window_failed(&error),
        },
    }
}

#[cfg(feature = "gui")]
fn open_window(_files: Vec<PathBuf>) -> Result<(), turnwright::app::StartError> {
    turnwright::app::run(|_ctx| Box::new(Welcome))
}

#[cfg(not(feature = "gui"))]
fn open_window(_files: Vec<PathBuf>) -> Result<(), &'static str> {
    Err(
        "this build has no window; commands that work without one: demo, snags, mend, convert, sample, picture, proof",
    )
}

/// A window that says what it is.
#[cfg(feature = "gui")]
struct Welcome;

#[cfg(feature = "gui")]
impl turnwright::app::Screen for Welcome {
    fn ui(&mut self, ui: &mut egui::Ui) {
        egui::CentralPanel::default().show(ui, |ui| {
            ui.heading("Turnwright");
            ui.label("Drop a clip here.");
        });
    }

    fn title(&self) -> String {
        "Turnwright".to_owned()
    }
}

//! Starts the window.

use std::process::ExitCode;

fn main() -> ExitCode {
    match open_window() {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            #[expect(clippy::print_stderr, reason = "the one line that says why no window opened")]
            {
                eprintln!("turnwright: {error}");
            }
            ExitCode::from(2)
        }
    }
}

#[cfg(feature = "gui")]
fn open_window() -> Result<(), turnwright::app::StartError> {
    turnwright::app::run(|_ctx| Box::new(Welcome))
}

#[cfg(not(feature = "gui"))]
fn open_window() -> Result<(), &'static str> {
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

//! Carries out a command, or opens the window.

use std::path::PathBuf;
use std::process::ExitCode;

use turnwright::cli::{self, Outcome, WindowPicture};

fn main() -> ExitCode {
    match cli::run(std::env::args_os()) {
        Outcome::Done(code) => ExitCode::from(code),
        Outcome::OpenWindow(files) => match open_window(&files) {
            Ok(()) => ExitCode::SUCCESS,
            Err(error) => cli::window_failed(&error),
        },
        Outcome::DrawWindow(wanted) => draw_window(&wanted),
    }
}

#[cfg(feature = "gui")]
fn open_window(files: &[PathBuf]) -> Result<(), turnwright::app::StartError> {
    turnwright::app::open(turnwright::app::Start::of_arguments(files))
}

#[cfg(feature = "gui")]
fn draw_window(wanted: &WindowPicture) -> ExitCode {
    use turnwright::app::commands::Command;
    use turnwright::app::paint::{Headless, default_threads};
    use turnwright::app::{Start, Window};

    let [width, height] = wanted.size.map(|side| side as f32);
    let mut headless = Headless::new(egui::vec2(width, height), 1.0, default_threads());
    let start = Start::of_arguments(&[PathBuf::from(&wanted.clip)]);
    let mut window = Window::unthreaded(headless.context(), start);
    headless.settle(&mut window);
    if let Some(secs) = wanted.at_secs {
        window.ask(Command::Scrub(secs));
        headless.settle(&mut window);
    }
    cli::write_window_picture(&headless.picture(), wanted)
}

/// What a build without the window says instead.
#[cfg(not(feature = "gui"))]
const NO_WINDOW: &str = "this build has no window; commands that work without one: demo, snags, mend, convert, sample, picture, proof";

#[cfg(not(feature = "gui"))]
fn open_window(_files: &[PathBuf]) -> Result<(), &'static str> {
    Err(NO_WINDOW)
}

#[cfg(not(feature = "gui"))]
fn draw_window(_wanted: &WindowPicture) -> ExitCode {
    cli::window_failed(&NO_WINDOW)
}

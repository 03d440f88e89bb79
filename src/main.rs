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
fn open_window(files: Vec<PathBuf>) -> Result<(), turnwright::app::StartError> {
    turnwright::app::open(turnwright::app::Start::of_arguments(&files))
}

#[cfg(not(feature = "gui"))]
fn open_window(_files: Vec<PathBuf>) -> Result<(), &'static str> {
    Err(
        "this build has no window; commands that work without one: demo, snags, mend, convert, sample, picture, proof",
    )
}

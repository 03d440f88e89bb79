//! The command line: what is typed becomes checked arguments, a command does the work, the output layer prints.
//!
//! The commands hold no logic of their own: they call what the window calls.

mod args;
mod commands;
mod error;
mod input;
mod limits;
mod numbers;
mod output;
mod progress;
mod targets;

use std::ffi::OsString;
use std::path::PathBuf;
use std::process::ExitCode;

use clap::Parser;

use crate::raster::Image;

use args::{Arguments, Command};
pub use error::CliError;
use output::Output;

/// What is left to do after the command line was read.
#[derive(Debug, PartialEq)]
pub enum Outcome {
    /// Nothing: the process ends with this code.
    Done(u8),
    /// Open the window on these files; without any, on the demo scene.
    OpenWindow(Vec<PathBuf>),
    /// Draw the window, and give the picture to [`write_window_picture`].
    DrawWindow(WindowPicture),
}

/// A picture of the window that is wanted.
#[derive(Clone, Debug, PartialEq)]
pub struct WindowPicture {
    /// The clip or scene that is open in it, as the user named it.
    pub clip: String,
    /// Where the playhead is to stand, seconds.
    pub at_secs: Option<f64>,
    /// Width and height in pixels.
    pub size: [usize; 2],
    /// The PNG file to write.
    pub output: PathBuf,
}

/// All was well, or `mend` mended.
const DONE: u8 = 0;
/// `snags` found some.
const FOUND: u8 = 1;
/// The run failed.
const FAILED: u8 = 2;

/// Reads the arguments (the program's name first) and carries out the command they name. Data goes to stdout,
/// everything else to stderr.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> Outcome {
    let mut output = Output::of_process();
    let arguments = match Arguments::try_parse_from(arguments) {
        Ok(arguments) => arguments,
        Err(error) => return Outcome::Done(answer_to(&error, &mut output)),
    };
    let done = match arguments.command {
        None => return open_window(arguments.files, &mut output),
        Some(Command::Demo(own)) => commands::demo::run(&own, &mut output),
        Some(Command::Snags(own)) => commands::snags::run(&own, &mut output),
        Some(Command::Mend(own)) => commands::mend::run(&own, &mut output),
        Some(Command::Blend(own)) => commands::blend::run(&own, &mut output),
        Some(Command::Retarget(own)) => commands::retarget::run(&own, &mut output),
        Some(Command::Convert(own)) => commands::convert::run(&own, &mut output),
        Some(Command::Sample(own)) => commands::sample::run(&own, &mut output),
        Some(Command::Proof(own)) => commands::proof::run(&own, &mut output),
        Some(Command::Picture(own)) if own.window => match commands::picture::checked(&own, &mut output) {
            Ok(_) => {
                let at_secs = own.at.and_then(|at| at.first().copied());
                let picture = WindowPicture { clip: own.clip, at_secs, size: own.size, output: own.output };
                return Outcome::DrawWindow(picture);
            }
            Err(error) => Err(error),
        },
        Some(Command::Picture(own)) => commands::picture::run(&own, &mut output),
    };
    let done = done.and_then(|code| output.flush().map(|()| code).map_err(CliError::Output));
    Outcome::Done(match done {
        Ok(code) => code,
        // Whoever reads has read enough: `turnwright snags … | head`.
        Err(CliError::Output(error)) if error.kind() == std::io::ErrorKind::BrokenPipe => DONE,
        Err(error) => {
            output.error(&error);
            FAILED
        }
    })
}

/// Says in one line on stderr why the window did not open or could not be drawn, and gives the code to end with.
pub fn window_failed(reason: &dyn std::fmt::Display) -> ExitCode {
    Output::of_process().error(reason);
    ExitCode::from(FAILED)
}

/// Writes a picture of the window to the file that was named, and gives the code to end with.
pub fn write_window_picture(image: &Image, wanted: &WindowPicture) -> ExitCode {
    let mut output = Output::of_process();
    match commands::picture::write_image(image, &wanted.output, &mut output) {
        Ok(()) => ExitCode::from(DONE),
        Err(error) => {
            output.error(&error);
            ExitCode::from(FAILED)
        }
    }
}

/// Files to open have to exist before a window is opened for them.
fn open_window(files: Vec<PathBuf>, output: &mut Output) -> Outcome {
    match files.iter().find_map(|file| input::no_file_to_open(file)) {
        None => Outcome::OpenWindow(files),
        Some(error) => {
            output.error(&error);
            Outcome::Done(FAILED)
        }
    }
}

/// Help and version are data; a slip is one line.
fn answer_to(error: &clap::Error, output: &mut Output) -> u8 {
    let text = error.render().to_string();
    if !error.use_stderr() {
        // A closed pipe is all that can go wrong here, and then nobody listens.
        let _ = output.text(&text).and_then(|()| output.flush());
        return DONE;
    }
    let is_said = |line: &&str| !line.is_empty() && !line.starts_with("For more information");
    let lines = text.lines().map(str::trim).take_while(|line| !line.starts_with("Usage:")).filter(is_said);
    let said = lines.collect::<Vec<_>>().join(" ").replace(" tip: ", "; ");
    let said = said.strip_prefix("error: ").unwrap_or(&said);
    output.error(&format!("{said}; see turnwright --help"));
    FAILED
}

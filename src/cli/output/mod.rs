//! The only place that prints. Data on stdout, everything else on stderr, one line for each thing to say.

pub(super) mod json;
pub(super) mod text;

use std::fmt::Display;
use std::io::{self, BufWriter, Write};
use std::path::Path;

use crate::exchange::Note;

/// Where a command prints.
pub(super) struct Output {
    data: Box<dyn Write>,
    talk: Box<dyn Write>,
}

/// The most notes told of one file; a broken file can have one for each of its lines.
const MOST_NOTES: usize = 6;

impl Output {
    /// Stdout and stderr of this process.
    pub(super) fn of_process() -> Self {
        Self { data: Box::new(BufWriter::new(io::stdout())), talk: Box::new(io::stderr()) }
    }

    /// Data as it is.
    pub(super) fn text(&mut self, text: &str) -> io::Result<()> {
        self.data.write_all(text.as_bytes())
    }

    /// A line of data.
    pub(super) fn line(&mut self, line: impl Display) -> io::Result<()> {
        writeln!(self.data, "{line}")
    }

    /// Sends what is waiting.
    pub(super) fn flush(&mut self) -> io::Result<()> {
        self.data.flush()
    }

    /// The line that says why the run failed.
    pub(super) fn error(&mut self, error: &(impl Display + ?Sized)) {
        self.say(&format!("turnwright: {error}"));
    }

    /// A line that tells of something odd in a file.
    pub(super) fn note(&mut self, path: &Path, note: &str) {
        self.say(&format!("turnwright: note: {}: {note}", path.display()));
    }

    /// What a reader or writer told about a file.
    pub(super) fn notes(&mut self, path: &Path, notes: &[Note]) {
        for note in notes.iter().take(MOST_NOTES) {
            self.note(path, &note.to_string());
        }
        if notes.len() > MOST_NOTES {
            self.note(path, &format!("{} more notes of this kind", notes.len() - MOST_NOTES));
        }
    }

    /// A line for the person at the terminal, on stderr, after the data that is waiting.
    pub(super) fn say(&mut self, line: &str) {
        // With both on one terminal, what was said first stands first. Nobody is left to tell when stderr is closed.
        let _ = self.data.flush();
        let _ = writeln!(self.talk, "{}", line.replace(['\n', '\r'], " "));
    }
}

//! How far long work is, on one line that a person at the terminal sees and that goes when the work is done.

use std::io::{IsTerminal, Write};
use std::sync::Mutex;
use std::time::{Duration, Instant};

use crate::snag::Progress;

/// Work shorter than this is told nothing about.
const PATIENCE: Duration = Duration::from_millis(500);
/// Time between two lines.
const PAUSE: Duration = Duration::from_millis(100);

/// Tells on stderr how far the work is, if a terminal is there.
pub(super) struct ProgressLine {
    what: String,
    state: Option<Mutex<State>>,
}

struct State {
    started: Instant,
    last: Option<Instant>,
}

impl ProgressLine {
    /// For work called `what`.
    pub(super) fn new(what: impl Into<String>) -> Self {
        let watched = std::io::stderr().is_terminal();
        let state = watched.then(|| Mutex::new(State { started: Instant::now(), last: None }));
        Self { what: what.into(), state }
    }
}

impl Progress for ProgressLine {
    fn report(&self, done: usize, total: usize) -> bool {
        // A line that another thread is writing just now is as good as ours.
        if let Some(mut state) = self.state.as_ref().and_then(|state| state.try_lock().ok()) {
            let now = Instant::now();
            let is_due = state.last.is_none_or(|last| now - last >= PAUSE);
            if now - state.started >= PATIENCE && is_due {
                state.last = Some(now);
                let percent = 100 * done / total.max(1);
                let _ = write!(std::io::stderr(), "\r{} {percent} %\u{1b}[K", self.what);
            }
        }
        true
    }
}

impl Drop for ProgressLine {
    fn drop(&mut self) {
        let told =
            self.state.as_ref().and_then(|state| state.lock().ok()).is_some_and(|state| state.last.is_some());
        if told {
            let _ = write!(std::io::stderr(), "\r\u{1b}[K");
        }
    }
}

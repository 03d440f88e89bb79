//! What can go wrong before there is a window, said in plain words.

use std::panic::AssertUnwindSafe;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;
use std::sync::atomic::Ordering;

/// The environment variable that forces a runner.
const RUNNER_VARIABLE: &str = "TURNWRIGHT_RUNNER";

/// Why no window opened.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum StartError {
    /// Neither an X11 nor a Wayland display is named in the environment.
    #[error(
        "no display to open a window on; commands that work without one: demo, snags, mend, convert, sample, picture, \
         proof"
    )]
    NoDisplay,
    /// A display is named, but cannot be reached.
    #[error(
        "the display {display} does not answer, or a library to talk to it is missing (on X11 libX11, libXcursor and \
         libXi); commands that work without a display: demo, snags, mend, convert, sample, picture, proof"
    )]
    Unreachable {
        /// Its name, as in `DISPLAY` or `WAYLAND_DISPLAY`.
        display: String,
    },
    /// A system library that every window needs is missing.
    #[error("cannot open a window: the system library {library} is missing; install it, or use the commands")]
    MissingLibrary {
        /// File name of the library.
        library: String,
    },
    /// The display refused the window.
    #[error("cannot open a window: {reason}")]
    Refused {
        /// What was tried.
        reason: String,
    },
    /// The environment asks for a runner that does not exist.
    #[error("the environment variable TURNWRIGHT_RUNNER is \"{found}\", expected cpu or gl")]
    UnknownRunner {
        /// What it says.
        found: String,
    },
}

/// Which runner the environment asks for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Choice {
    Best,
    Cpu,
    Gl,
}

impl Choice {
    pub(super) fn from_environment() -> Result<Self, StartError> {
        std::env::var_os(RUNNER_VARIABLE)
            .map_or(Ok(Self::Best), |value| Self::parse(&value.to_string_lossy()))
    }

    fn parse(value: &str) -> Result<Self, StartError> {
        match value {
            "" => Ok(Self::Best),
            "cpu" => Ok(Self::Cpu),
            "gl" => Ok(Self::Gl),
            _ => Err(StartError::UnknownRunner { found: value.to_owned() }),
        }
    }
}

/// Whether this system names its display in the environment.
const DISPLAY_IS_NAMED: bool = cfg!(all(unix, not(target_vendor = "apple"), not(target_os = "android")));

/// The variables that name a display, the one that is tried first in front.
const DISPLAY_VARIABLES: [&str; 3] = ["WAYLAND_DISPLAY", "WAYLAND_SOCKET", "DISPLAY"];

fn display_name() -> Option<String> {
    let value = |name: &&str| std::env::var(name).ok().filter(|value| !value.is_empty());
    DISPLAY_VARIABLES.iter().find_map(value)
}

/// Refuses early where no display is named.
pub(in super::super) fn need_display() -> Result<(), StartError> {
    if DISPLAY_IS_NAMED && display_name().is_none() { Err(StartError::NoDisplay) } else { Ok(()) }
}

/// The error for an event loop that could not be made. winit's own text holds places in its source.
pub(super) fn no_event_loop() -> StartError {
    match display_name() {
        Some(display) if DISPLAY_IS_NAMED => StartError::Unreachable { display },
        _ => StartError::Refused { reason: "the desktop does not answer".to_owned() },
    }
}

/// How far the start has come.
#[derive(Debug, Default)]
pub(super) struct Progress {
    /// Shared with the panic hook.
    has_screen: Arc<AtomicBool>,
}

impl Progress {
    /// The window exists and the screen is about to be made: from here on a panic is ours.
    pub(super) fn screen_begins(&self) {
        self.has_screen.store(true, Ordering::Relaxed);
    }

    pub(super) fn has_screen(&self) -> bool {
        self.has_screen.load(Ordering::Relaxed)
    }
}

/// Runs `start`; a panic before the screen exists becomes an error, without a word on stderr. winit panics when a system
/// library is missing.
pub(super) fn guard(
    progress: &Progress,
    start: impl FnOnce() -> Result<(), StartError>,
) -> Result<(), StartError> {
    let has_screen = Arc::clone(&progress.has_screen);
    let is_over = Arc::new(AtomicBool::new(false));
    let is_over_for_hook = Arc::clone(&is_over);
    let usual_hook = std::panic::take_hook();
    std::panic::set_hook(Box::new(move |info| {
        if has_screen.load(Ordering::Relaxed) || is_over_for_hook.load(Ordering::Relaxed) {
            usual_hook(info);
        }
    }));
    let result = std::panic::catch_unwind(AssertUnwindSafe(start));
    is_over.store(true, Ordering::Relaxed);
    match result {
        Ok(result) => result,
        Err(payload) if progress.has_screen() => std::panic::resume_unwind(payload),
        Err(payload) => {
            let text = payload.downcast_ref::<String>().map(String::as_str);
            Err(from_panic(text.or_else(|| payload.downcast_ref::<&str>().copied()).unwrap_or("")))
        }
    }
}

/// The error for a panic inside a window library.
fn from_panic(text: &str) -> StartError {
    let library = text.split_whitespace().find(|word| word.starts_with("lib") && word.contains(".so"));
    match library {
        Some(library) => {
            let library = library.trim_end_matches(['.', ',', ':', '!']).to_owned();
            StartError::MissingLibrary { library }
        }
        None => StartError::Refused { reason: "the window library stopped".to_owned() },
    }
}

/// Starts this program again, with the same arguments and the CPU runner.
pub(super) fn restart_with_cpu() -> Result<(), StartError> {
    let refused = |_| StartError::Refused { reason: "the program cannot start itself again".to_owned() };
    let mut arguments = std::env::args_os();
    let own_name = arguments.next();
    let mut command = std::process::Command::new(std::env::current_exe().map_err(refused)?);
    command.args(arguments).env(RUNNER_VARIABLE, "cpu");
    #[cfg(unix)]
    {
        use std::os::unix::process::CommandExt;
        if let Some(own_name) = own_name {
            command.arg0(own_name);
        }
        Err(refused(command.exec()))
    }
    #[cfg(not(unix))]
    {
        drop(own_name);
        let status = command.status().map_err(refused)?;
        let reason = || format!("the second try ended with {status}");
        if status.success() { Ok(()) } else { Err(StartError::Refused { reason: reason() }) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_environment_names_a_runner_or_nothing() {
        assert_eq!(Choice::parse("cpu"), Ok(Choice::Cpu));
        assert_eq!(Choice::parse("gl"), Ok(Choice::Gl));
        assert_eq!(Choice::parse(""), Ok(Choice::Best));
        let error = Choice::parse("vulkan").unwrap_err();
        assert_eq!(
            error.to_string(),
            "the environment variable TURNWRIGHT_RUNNER is \"vulkan\", expected cpu or gl"
        );
    }

    #[test]
    fn a_missing_library_is_named() {
        let error = from_panic("Library libxkbcommon-x11.so could not be loaded.");
        assert_eq!(error, StartError::MissingLibrary { library: "libxkbcommon-x11.so".to_owned() });
        let error = from_panic("index out of bounds");
        assert_eq!(error.to_string(), "cannot open a window: the window library stopped");
    }

    #[test]
    fn a_panic_before_the_screen_is_an_error_and_after_it_stays_a_panic() {
        let error =
            guard(&Progress::default(), || panic!("Library libX.so could not be loaded.")).unwrap_err();
        assert_eq!(error, StartError::MissingLibrary { library: "libX.so".to_owned() });
        let late = std::panic::catch_unwind(|| {
            let progress = Progress::default();
            guard(&progress, || {
                progress.screen_begins();
                std::panic::resume_unwind(Box::new("late"))
            })
        });
        assert_eq!(late.unwrap_err().downcast_ref::<&str>(), Some(&"late"));
    }
}

//! The window. Nothing below this folder knows egui.
//!
//! | file | what is there |
//! |---|---|
//! | `window` | the [`Window`]: what is open, and one frame of it |
//! | `logic` | what happens between frames: answers of jobs, and what panels asked for |
//! | `commands` | everything a person can ask for, in one table |
//! | `bench`, `session` | what is open and worked out; what is looked at |
//! | `blend_state` | the blend that is looked at |
//! | `settings` | what is remembered from one run to the next: keys, sizes of areas, hints |
//! | `help` | what each snag kind and each pass is, with pictures made from tiny clips |
//! | `jobs`, `file_picker` | work on other threads |
//! | `places` | which files are written, and the question before one is replaced |
//! | `view_models` | what panels show, as plain data without egui |
//! | `panels`, `widgets`, `pictures`, `theme` | how it looks |
//! | `paint`, `runners`, `screen` | how a window comes onto the display, with a graphics driver or without |

pub mod bench;
pub mod blend_state;
pub mod carry_state;
pub mod commands;
mod curve_hand;
mod file_picker;
pub mod help;
mod jobs;
mod logic;
pub mod paint;
mod panels;
mod pictures;
mod places;
pub mod runners;
mod screen;
pub mod session;
pub mod settings;
mod theme;
pub mod view_models;
mod widgets;
mod window;

pub use runners::StartError;
pub use runners::run;
pub use screen::Screen;
use settings::SettingsFile;
pub use window::{Start, Window};

/// Opens the window and returns when it is closed.
///
/// # Errors
/// As [`run`].
pub fn open(start: Start) -> Result<(), StartError> {
    // Without a display nothing of the user's is touched.
    runners::need_display()?;
    let file = SettingsFile::of_user();
    let read = file.as_ref().map(SettingsFile::read);
    let place = read.iter().flatten().map(|settings| settings.window).next().unwrap_or_default();
    runners::run_at(place, |ctx| {
        let mut window = Window::new(ctx, start);
        if let (Some(file), Some(read)) = (file, read) {
            window.remember(ctx, file, read);
        }
        Box::new(window)
    })
}

//! What is asked of the settings.

use egui::KeyboardShortcut;

use super::super::settings::{Divider, Hint};
use super::Action;

/// A wish about what is remembered from one run to the next.
#[derive(Clone, Debug, PartialEq)]
pub enum SettingsCommand {
    /// Move a divider to this share of the window; `None`: to where it usually is.
    Divide(Divider, Option<f32>),
    /// The hint of an area has been read.
    ReadHint(Hint),
    /// Give an action other keys, or none. Whoever has them loses them.
    SetKeys(Action, Option<KeyboardShortcut>),
    /// All actions have the keys of the table again.
    UsualKeys,
    /// Forget which files were open.
    ForgetRecent,
}

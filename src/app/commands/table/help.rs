//! The menu *Help*: what explains the program.

use egui::Key;

use super::super::Action as A;
use super::{ALWAYS, Entry, entry, plain, shift};

/// Its entries, from top to bottom.
pub(super) const ENTRIES: &[Entry] = &[
    entry(
        A::Explain,
        "Snags and passes",
        "What each kind of snag and each pass is, with a picture",
        Some(shift(Key::F1)),
        ALWAYS,
    ),
    entry(A::ShowHints, "Show hints again", "The hint in each area, as on the first day", None, ALWAYS),
    entry(
        A::Shortcuts,
        "Shortcuts",
        "All actions and their keys, which can be changed",
        Some(plain(Key::F1)),
        ALWAYS,
    ),
    entry(A::WhatsNew, "What's new", "What has changed from version to version", None, ALWAYS),
    entry(A::About, "About Turnwright", "Version, licences and cautions", None, ALWAYS),
];

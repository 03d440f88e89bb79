//! What has been typed into a sheet.

use std::collections::BTreeMap;
use std::path::PathBuf;

use egui::KeyboardShortcut;

use super::super::super::commands::Action;
use super::super::super::help::Subject;
use super::super::super::pictures::Picture;
use super::super::super::settings::Conflict;
use super::super::super::view_models::{BlendKind, Memo};
use crate::exchange::csv::TimeUnit;
use crate::exchange::disk;
use crate::scene::ClipRef;

/// What has been typed.
#[derive(Debug, Default)]
pub(crate) struct Form {
    /// The path.
    pub path: String,
    /// What was wrong with it.
    pub error: Option<String>,
    /// A path whose file, or one beside it, is there already, and the question whether it may be replaced.
    pub(super) replaces: Option<Replaces>,
    /// Whether a proof sheet is written beside an export.
    pub has_proof: bool,
    /// Words looked for in the list of keys.
    pub search: String,
    /// The action that new keys are being pressed for.
    pub capturing: Option<Action>,
    /// Keys that were pressed for an action, and why it can't have them just so.
    pub conflict: Option<(Action, KeyboardShortcut, Conflict)>,
    /// Pictures of explanations.
    pub(super) pictures: BTreeMap<Subject, Picture<([usize; 2], bool)>>,
    /// Which columns hold the time, and w, x, y, z.
    pub columns: [usize; 5],
    /// The unit of the time column; without it what the header says, else seconds.
    pub time_unit: Option<TimeUnit>,
    /// The second clip of a blend.
    pub second: Option<ClipRef>,
    /// How it is to be blended in.
    pub blend: Option<BlendKind>,
    /// What lies in the folder of the path.
    pub(super) listing: Memo<PathBuf, Result<Vec<disk::Entry>, String>>,
    /// The field has been given the keyboard.
    pub(super) has_focus: bool,
}

/// A question before something is replaced.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Replaces {
    /// Where to write.
    pub path: PathBuf,
    /// The question.
    pub words: String,
    /// It has just come up.
    pub is_new: bool,
}

impl Form {
    /// Another path than before: what was said about that one no longer holds.
    pub(crate) fn name(&mut self, path: impl Into<String>) {
        self.path = path.into();
        self.error = None;
        self.replaces = None;
    }

    /// Tells what was wrong; the field that it was typed into gets the keyboard again.
    pub(crate) fn fail(&mut self, error: impl Into<String>) {
        self.error = Some(error.into());
        self.has_focus = false;
    }

    /// A new question about a path.
    pub(crate) fn with_path(path: impl Into<String>) -> Self {
        Self { path: path.into(), ..Self::default() }
    }

    /// A guess at what the columns are: by their names, else the first five in order.
    pub(crate) fn with_columns(names: &[String]) -> Self {
        let like = |wanted: &[&str]| {
            names.iter().position(|name| {
                let name = name.to_lowercase();
                wanted.iter().any(|word| {
                    name == *word
                        || name.ends_with(&format!("_{word}"))
                        || name.ends_with(&format!(".{word}"))
                })
            })
        };
        let guesses = [
            like(&["time", "t", "timestamp", "time_s", "ms", "us"]),
            like(&["w", "qw", "q0"]),
            like(&["x", "qx", "q1"]),
            like(&["y", "qy", "q2"]),
            like(&["z", "qz", "q3"]),
        ];
        let mut columns = [0, 1, 2, 3, 4];
        for (column, guess) in columns.iter_mut().zip(guesses) {
            *column = guess.unwrap_or(*column);
        }
        Self { columns, ..Self::default() }
    }
}

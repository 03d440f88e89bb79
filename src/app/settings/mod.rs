//! What the window remembers from one run to the next: keys, sizes of areas, light or dark, hints that were read.
//!
//! Kept in one file of the user's configuration folder. A file that can't be understood is set aside and told of; the window then
//! begins as on the first day. Windows without a display, pictures and tests have no file unless they name one.

mod file;
mod hint;
mod keymap;
mod layout;

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};

pub use file::{SettingsFile, UnreadSettings};
pub use hint::Hint;
pub(super) use keymap::change as change_keys;
pub use keymap::{Conflict, Keymap, keys_text, parse_keys};
pub use layout::{Areas, Divider, Layout};

/// What is remembered. Every field has a value for when a file does not name it, so that older files go on to be read.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Settings {
    /// Dark on light.
    pub light: bool,
    /// Times the desktop's own scale, 1 to 3.
    pub zoom: f32,
    /// What the curves show, by its label.
    pub curve_view: String,
    /// Sizes of the areas.
    pub layout: Layout,
    /// Where the window was.
    pub window: Placement,
    /// Keys that were changed: by the action's name, `None` for none at all.
    pub keys: BTreeMap<String, Option<String>>,
    /// Hints that were put away.
    pub hints_read: BTreeSet<Hint>,
    /// Files that were open, the last one first.
    pub recent: Vec<PathBuf>,
}

/// Where a window is on the desktop, in points.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Placement {
    /// Width and height of its inside.
    pub size: Option<[f32; 2]>,
    /// Its left top corner.
    pub position: Option<[f32; 2]>,
}

impl Default for Settings {
    fn default() -> Self {
        Self {
            light: false,
            zoom: 1.0,
            curve_view: String::new(),
            layout: Layout::default(),
            window: Placement::default(),
            keys: BTreeMap::new(),
            hints_read: BTreeSet::new(),
            recent: Vec::new(),
        }
    }
}

/// The most files that are remembered.
const MOST_RECENT: usize = 10;

/// The zoom steps of the menu, in percent of the desktop's own scale.
pub const ZOOM_PERCENT: [u32; 5] = [100, 125, 150, 200, 300];

impl Settings {
    /// For windows that nobody looks at for the first time: all hints count as read.
    pub fn without_hints() -> Self {
        Self { hints_read: Hint::ALL.into_iter().collect(), ..Self::default() }
    }

    /// Puts a file on top of the recent ones. What is no file, such as the demo, is left out.
    pub fn remember_file(&mut self, path: &Path) {
        let Ok(path) = std::path::absolute(path) else { return };
        if !path.is_file() || self.recent.first() == Some(&path) {
            return;
        }
        self.recent.retain(|known| *known != path);
        self.recent.insert(0, path);
        self.recent.truncate(MOST_RECENT);
    }

    /// The same, with values brought into their ranges: a file may say anything.
    #[must_use]
    pub fn sound(mut self) -> Self {
        self.zoom = if self.zoom.is_finite() { self.zoom.clamp(1.0, 3.0) } else { 1.0 };
        let is_size = |size: &[f32; 2]| size.iter().all(|side| (100.0..20_000.0).contains(side));
        self.window.size = self.window.size.filter(is_size);
        let is_place = |place: &[f32; 2]| place.iter().all(|at| at.abs() < 50_000.0);
        self.window.position = self.window.position.filter(is_place);
        self.layout = self.layout.sound();
        self.recent.truncate(MOST_RECENT);
        self
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn whatever_a_file_says_is_brought_into_range() {
        let text = "(zoom: NaN, window: (size: Some((0, 1e9)), position: Some((1e30, 0))), layout: (space: Some(-3), map: Some(inf)))";
        let settings: Settings = ron::from_str(text).unwrap();
        let settings = settings.sound();
        assert_eq!(settings.zoom, 1.0);
        assert_eq!(settings.window, Placement::default());
        assert_eq!(settings.layout, Layout::default());
    }

    #[test]
    fn the_last_file_is_on_top_and_stands_once() {
        let folder = tempfile::tempdir().unwrap();
        let files: Vec<PathBuf> = (0..12).map(|i| folder.path().join(format!("{i}.bvh"))).collect();
        let mut settings = Settings::default();
        for file in &files {
            crate::exchange::disk::write(file, b"x").unwrap();
            settings.remember_file(file);
        }
        settings.remember_file(&files[5]);
        settings.remember_file(Path::new("no such file.bvh"));
        assert_eq!(settings.recent.len(), MOST_RECENT);
        assert_eq!(settings.recent[..2], [files[5].clone(), files[11].clone()]);
    }
}

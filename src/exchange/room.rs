//! Whether a search stays within the memory that a file of its size may ask for.

use std::path::PathBuf;

use super::source::Source;

/// Bytes of memory that a file may ask for with each of its own, and beyond.
const MOST_TIMES: usize = 8;
const SPARE_BYTES: usize = 64 << 20;

/// What a search holds of a turn's key: its rotor, its file's own triple, and a bit more (65 to 70 bytes measured on files of
/// one-digit numbers, 2026-12-02).
const TURN_BYTES: usize = 72;
/// Of a place's key: its vector, twice where it is mended.
const PLACE_BYTES: usize = 48;

/// A clip whose keys take so few bytes of its file that a search, which holds all of them at once, would take many times its size.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error(
    "{path}: clip {label}: expected a search that takes at most {most_mb} MB in a file of this size, found {keys} keys, which take {found_mb} MB; cut it into shorter clips with convert --from and --to, and search those",
    path = path.display()
)]
pub struct SearchTooLarge {
    /// The file.
    pub path: PathBuf,
    /// The clip.
    pub label: String,
    /// Keys of all its joints.
    pub keys: usize,
    /// What they take.
    pub found_mb: usize,
    /// What they may take.
    pub most_mb: usize,
}

impl Source {
    /// Whether a clip may be searched.
    ///
    /// # Errors
    /// When that would take more than 8 times its file and 64 MB.
    pub fn check_search(&self, index: usize) -> Result<(), SearchTooLarge> {
        let Some(clip) = self.clips.get(index) else { return Ok(()) };
        let turns: usize =
            clip.joints.iter().filter_map(|own| own.rotation.as_ref()).map(|own| own.keys.len()).sum();
        let places: usize =
            clip.joints.iter().filter_map(|own| own.translation.as_ref()).map(|own| own.keys.len()).sum();
        let file = self.bytes().len();
        let most = MOST_TIMES.saturating_mul(file).saturating_add(SPARE_BYTES);
        let keys = turns.saturating_mul(TURN_BYTES).saturating_add(places.saturating_mul(PLACE_BYTES));
        let found = keys.saturating_add(file);
        if found <= most {
            return Ok(());
        }
        Err(SearchTooLarge {
            path: self.path.clone(),
            label: self.clip_label(index),
            keys: turns + places,
            found_mb: found >> 20,
            most_mb: most >> 20,
        })
    }
}

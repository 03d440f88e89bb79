//! Joint maps kept for pairs of skeletons, so that a person's corrections are there for the next clip.
//!
//! One file for each pair in a folder of the person's settings: its name is the two fingerprints, its text that of
//! [`write_map`]. Files may be copied, mended by hand, and thrown away.

use std::path::{Path, PathBuf};

use crate::retarget::{Figure, JointMap, MapError, MapRow, fingerprint, read_map, write_map};

use super::disk::{self, DiskError};

/// Names another folder for kept maps; empty for none at all.
pub const FOLDER_VARIABLE: &str = "TURNWRIGHT_MAPS";

/// A kept map that can't be used.
#[derive(Debug, thiserror::Error)]
pub enum KeptMapError {
    /// The file can't be read or written.
    #[error(transparent)]
    Disk(#[from] DiskError),
    /// The file's text does not fit.
    #[error("{path}: {source}", path = path.display())]
    Map {
        /// The file.
        path: PathBuf,
        /// What and where.
        source: MapError,
    },
}

/// The folder for kept maps: what [`FOLDER_VARIABLE`] says, else `turnwright/maps` among the person's settings. `None` where there is no
/// such place.
pub fn folder() -> Option<PathBuf> {
    let named = |name: &str| std::env::var_os(name).filter(|value| !value.is_empty()).map(PathBuf::from);
    if std::env::var_os(FOLDER_VARIABLE).is_some() {
        return named(FOLDER_VARIABLE);
    }
    let home = || named("HOME");
    let settings = if cfg!(windows) {
        named("APPDATA")
    } else if cfg!(target_os = "macos") {
        home().map(|home| home.join("Library").join("Application Support"))
    } else {
        named("XDG_CONFIG_HOME").or_else(|| home().map(|home| home.join(".config")))
    };
    settings.map(|settings| settings.join("turnwright").join("maps"))
}

/// The file for a pair of skeletons in a folder.
pub fn file_for(folder: &Path, source: &Figure, target: &Figure) -> PathBuf {
    folder.join(format!("{}-{}.csv", fingerprint(&source.skeleton), fingerprint(&target.skeleton)))
}

/// The corrections kept for a pair of skeletons, and their file; `None` where none are kept.
///
/// # Errors
/// When the file is there but can't be read.
pub fn kept(
    folder: &Path,
    source: &Figure,
    target: &Figure,
) -> Result<Option<(PathBuf, Vec<MapRow>)>, KeptMapError> {
    let path = file_for(folder, source, target);
    if !path.is_file() {
        return Ok(None);
    }
    let text = String::from_utf8_lossy(&disk::read(&path)?).into_owned();
    match read_map(&text, &source.skeleton, &target.skeleton) {
        Ok(rows) => Ok(Some((path, rows))),
        Err(source) => Err(KeptMapError::Map { path, source }),
    }
}

/// Keeps a map for its pair of skeletons. Gives the file.
///
/// # Errors
/// When it can't be written.
pub fn keep(
    folder: &Path,
    map: &JointMap,
    source: &Figure,
    target: &Figure,
) -> Result<PathBuf, KeptMapError> {
    let path = file_for(folder, source, target);
    disk::write(&path, write_map(map, source, target).as_bytes())?;
    Ok(path)
}

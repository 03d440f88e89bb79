//! The only place that touches files: bounded reads, atomic writes.

use std::fs::File;
use std::io::{self, Read, Write};
use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};

/// Largest file that is read, in bytes: an hour of 240 frames a second with 100 joints as BVH text, twice over.
pub const MAX_FILE_BYTES: u64 = 4 << 30;

/// Why a file could not be read or written.
#[derive(Debug, thiserror::Error)]
pub enum DiskError {
    /// The system refused.
    #[error("{path}: cannot {verb}: {source}", path = path.display())]
    Io {
        /// The file.
        path: PathBuf,
        /// `read` or `write`.
        verb: &'static str,
        /// What the system said.
        source: io::Error,
    },
    /// A folder where a file was expected.
    #[error("{path}: expected a file, found a folder", path = .0.display())]
    Folder(PathBuf),
    /// More than is ever read.
    #[error("{path}: expected at most {MAX_FILE_BYTES} bytes, found {found}", path = path.display())]
    TooLarge {
        /// The file.
        path: PathBuf,
        /// Its size.
        found: u64,
    },
}

/// All bytes of a file.
///
/// # Errors
/// When it is missing, a folder, larger than [`MAX_FILE_BYTES`], or the system refuses.
pub fn read(path: &Path) -> Result<Vec<u8>, DiskError> {
    let failed = |source| DiskError::Io { path: path.to_owned(), verb: "read", source };
    let file = File::open(path).map_err(failed)?;
    let metadata = file.metadata().map_err(failed)?;
    if metadata.is_dir() {
        return Err(DiskError::Folder(path.to_owned()));
    }
    let found = metadata.len();
    if found > MAX_FILE_BYTES {
        return Err(DiskError::TooLarge { path: path.to_owned(), found });
    }
    let mut bytes = Vec::with_capacity(found as usize);
    // A device or a growing file tells no true size: the bound holds for what is read as well.
    file.take(MAX_FILE_BYTES + 1).read_to_end(&mut bytes).map_err(failed)?;
    if bytes.len() as u64 > MAX_FILE_BYTES {
        return Err(DiskError::TooLarge { path: path.to_owned(), found: bytes.len() as u64 });
    }
    Ok(bytes)
}

/// Whether two paths lead to one file that exists: by whatever folders and symbolic links, or as two names of the same
/// content (hard links).
pub fn is_same_file(a: &Path, b: &Path) -> bool {
    let by_path = matches!((a.canonicalize(), b.canonicalize()), (Ok(a), Ok(b)) if a == b);
    by_path || is_hard_link(a, b)
}

#[cfg(unix)]
fn is_hard_link(a: &Path, b: &Path) -> bool {
    use std::os::unix::fs::MetadataExt;
    let place = |path: &Path| std::fs::metadata(path).map(|file| (file.dev(), file.ino()));
    matches!((place(a), place(b)), (Ok(a), Ok(b)) if a == b)
}

/// Other systems tell no number of a file.
#[cfg(not(unix))]
fn is_hard_link(_a: &Path, _b: &Path) -> bool {
    false
}

/// One thing in a folder.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Entry {
    /// `false` sorts before `true`: folders come first.
    is_file: bool,
    /// Its name.
    pub name: String,
}

impl Entry {
    /// Whether it is a folder.
    pub fn is_folder(&self) -> bool {
        !self.is_file
    }
}

/// The most entries of a folder that are told.
const MOST_ENTRIES: usize = 5000;

/// What lies in a folder: folders first, then files, by name. Of a very large folder only a part.
///
/// # Errors
/// When it is missing, no folder, or the system refuses.
pub fn entries(folder: &Path) -> Result<Vec<Entry>, DiskError> {
    let failed = |source| DiskError::Io { path: folder.to_owned(), verb: "read", source };
    let mut found: Vec<Entry> = std::fs::read_dir(folder)
        .map_err(failed)?
        .take(MOST_ENTRIES)
        .flatten()
        .map(|entry| Entry {
            is_file: !entry.path().is_dir(),
            name: entry.file_name().to_string_lossy().into_owned(),
        })
        .collect();
    found.sort();
    Ok(found)
}

/// Puts `bytes` in place of a file's content at one stroke: written beside it first, then renamed over it.
/// Missing folders on the way are made.
///
/// # Errors
/// When the target is a folder or the system refuses; the old content then stays.
pub fn write(path: &Path, bytes: &[u8]) -> Result<(), DiskError> {
    write_with(path, |out| out.write_all(bytes))
}

/// As [`write()`], of what `put` gives out piece by piece: a long text need not be at hand as a whole.
///
/// # Errors
/// As [`write()`], or when `put` fails.
pub fn write_with<T>(path: &Path, put: impl FnOnce(&mut dyn Write) -> io::Result<T>) -> Result<T, DiskError> {
    if path.is_dir() {
        return Err(DiskError::Folder(path.to_owned()));
    }
    let failed = |source| DiskError::Io { path: path.to_owned(), verb: "write", source };
    let folder = match path.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    };
    std::fs::create_dir_all(folder).map_err(failed)?;
    // The error's own words name the temporary file, which says nothing to whoever chose the target.
    let plain = |error: io::Error| failed(io::Error::from(error.kind()));
    let mut file = tempfile::Builder::new().prefix(".turnwright-").tempfile_in(folder).map_err(plain)?;
    let told = put(&mut file).map_err(plain)?;
    file.as_file().sync_all().map_err(failed)?;
    let permissions =
        std::fs::metadata(path).map_or_else(|_| new_file_permissions(), |old| Some(old.permissions()));
    if let Some(permissions) = permissions {
        file.as_file().set_permissions(permissions).map_err(failed)?;
    }
    file.persist(path).map_err(|error| failed(error.error))?;
    Ok(told)
}

/// A temporary file is private; a result is meant to be read by whom the folder's owner lets.
#[cfg(unix)]
#[expect(clippy::unnecessary_wraps, reason = "other systems have nothing to set")]
fn new_file_permissions() -> Option<std::fs::Permissions> {
    use std::os::unix::fs::PermissionsExt;
    Some(std::fs::Permissions::from_mode(0o644))
}

#[cfg(not(unix))]
fn new_file_permissions() -> Option<std::fs::Permissions> {
    None
}

/// The SHA-256 of some bytes in hexadecimal: how a scene knows its source again.
pub fn hash(bytes: &[u8]) -> String {
    use std::fmt::Write as _;
    Sha256::digest(bytes).iter().fold(String::with_capacity(64), |mut text, byte| {
        // Writing into a String can't fail.
        let _ = write!(text, "{byte:02x}");
        text
    })
}

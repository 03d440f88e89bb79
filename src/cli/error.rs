//! Why a command failed: one line that names the file, the place, what was expected and found, and what to do.

use std::io;
use std::path::PathBuf;

use crate::blend::BlendError;
use crate::exchange::advice::with_advice;
use crate::exchange::{self, WriteError, disk, ron};
use crate::mend::MendError;
use crate::proof::ProofError;
use crate::raster::ImageError;
use crate::retarget::{ContactError, MapError, RetargetError};
use crate::snag::Cancelled;

/// Anything that ends a command.
#[derive(Debug, thiserror::Error)]
pub enum CliError {
    /// A clip file that can't be read.
    #[error("{}", .0.told())]
    Open(#[from] exchange::OpenError),
    /// A clip that is too large to be searched.
    #[error(transparent)]
    Search(#[from] exchange::SearchTooLarge),
    /// A scene that can't be read.
    #[error("{}", .0.told())]
    Scene(#[from] ron::SceneError),
    /// A result that can't be written.
    #[error("{}", with_advice(&.0.to_string(), "choose another place with -o"))]
    Write(#[from] WriteError),
    /// A sheet or picture that can't be written.
    #[error("{}", with_advice(&.0.to_string(), "choose another place with -o"))]
    Disk(#[from] disk::DiskError),
    /// A file without a clip.
    #[error("{path}: animations: expected at least one clip, found none; choose a file with an animation", path = path.display())]
    NoClip {
        /// The file.
        path: PathBuf,
    },
    /// Limits that can't be read, or are of another skeleton.
    #[error("{}", with_advice(&.0.to_string(), "put it right there"))]
    Limits(#[from] exchange::limits::LimitsError),
    /// A clip that the file does not have.
    #[error("{path}: clip: expected one of {known}, found `{found}`; write {path}#NAME or {path}#INDEX", path = path.display())]
    NoSuchClip {
        /// The file.
        path: PathBuf,
        /// Names of its clips.
        known: String,
        /// What was asked for.
        found: String,
    },
    /// Two clips that have nothing to compare.
    #[error("{path}: {source}; compare a clip with one made from it", path = path.display())]
    Proof {
        /// The file after.
        path: PathBuf,
        /// Why.
        source: ProofError,
    },
    /// A mend that does not fit its clip.
    #[error("{path}: {source}; please report this", path = path.display())]
    Mend {
        /// The file.
        path: PathBuf,
        /// Why.
        source: MendError,
    },
    /// Two clips that can't be blended.
    #[error("{}", with_advice(&format!("{} and {}: {source}", .first.display(), .second.display()), "choose another"))]
    Blend {
        /// The first clip's file.
        first: PathBuf,
        /// The second clip's file.
        second: PathBuf,
        /// Why.
        source: BlendError,
    },
    /// A joint map that can't be read.
    #[error("{}", with_advice(&format!("{}: {source}", .path.display()), "see what --save-map writes"))]
    Map {
        /// The file.
        path: PathBuf,
        /// What and where.
        source: MapError,
    },
    /// A file of contacts that can't be read.
    #[error("{}", with_advice(&format!("{}: {source}", .path.display()), "see what --save-contacts writes"))]
    Contacts {
        /// The file.
        path: PathBuf,
        /// What and where.
        source: ContactError,
    },
    /// A kept joint map that can't be used.
    #[error("{}", with_advice(&.0.to_string(), "throw that file away, or go on with --no-kept-map"))]
    KeptMap(#[from] exchange::joint_maps::KeptMapError),
    /// A clip that can't be carried over.
    #[error("{}", with_advice(&format!("{}: {source}", .path.display()), "give a map with --map"))]
    Retarget {
        /// The target's file.
        path: PathBuf,
        /// Why.
        source: RetargetError,
    },
    /// A clip of another body that is to be blended and can't be carried over.
    #[error(
        "{path}: is of another body than the first clip: {}; carry it over with retarget and a joint map first",
        without_advice(&.source.to_string()),
        path = path.display()
    )]
    Carry {
        /// The clip's file.
        path: PathBuf,
        /// Why.
        source: RetargetError,
    },
    /// A picture that can't be made.
    #[error("{path}: {source}; choose another size with --size", path = path.display())]
    Picture {
        /// The file.
        path: PathBuf,
        /// Why.
        source: ImageError,
    },
    /// An argument that makes no sense by itself or with the clip.
    #[error("{place}: expected {expected}, found {found}; {advice}")]
    Argument {
        /// Which argument, or which file and argument.
        place: String,
        /// What would do.
        expected: String,
        /// What was there.
        found: String,
        /// What to do.
        advice: &'static str,
    },
    /// Some of several files failed; each has had its line.
    #[error("{failed} of {total} files failed; see the lines above")]
    Some {
        /// How many failed.
        failed: usize,
        /// Of how many.
        total: usize,
    },
    /// The work was stopped.
    #[error(transparent)]
    Cancelled(#[from] Cancelled),
    /// The output could not be printed.
    #[error("standard output: cannot write: {0}; check where it goes")]
    Output(#[source] io::Error),
}

impl From<io::Error> for CliError {
    fn from(error: io::Error) -> Self {
        Self::Output(error)
    }
}

/// A message without the advice it ends with: what helps elsewhere may not help here.
fn without_advice(message: &str) -> &str {
    message.split_once("; ").map_or(message, |(what, _)| what)
}

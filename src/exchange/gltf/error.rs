//! Why a glTF file could not be read or written.

/// What stopped the work, and where in the document.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("{place}: {kind}")]
pub struct GltfError {
    /// A JSON path such as `accessors[12].bufferView`, or `GLB header`, or `JSON line 3 column 7`.
    pub place: String,
    /// What was expected and what was found there.
    pub kind: GltfErrorKind,
}

/// The kinds of trouble.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum GltfErrorKind {
    /// Something else stands there than the standard says.
    #[error("expected {expected}, found {found}")]
    Unlike {
        /// What the standard, or the rest of the file, asks for.
        expected: String,
        /// What is there.
        found: String,
    },
    /// A file that the document refers to could not be had.
    #[error("cannot read `{path}`: {reason}")]
    File {
        /// Its path relative to the document.
        path: String,
        /// What the caller's `fetch` said.
        reason: String,
    },
    /// Animation data in a form that is not read.
    #[error(
        "animation data compressed by {0} is not read; expected plain numbers, so re-export it without compression"
    )]
    Compressed(String),
}

impl GltfError {
    /// Something else than expected.
    pub(super) fn unlike(
        place: impl Into<String>,
        expected: impl Into<String>,
        found: impl Into<String>,
    ) -> Self {
        let kind = GltfErrorKind::Unlike { expected: expected.into(), found: found.into() };
        Self { place: place.into(), kind }
    }
}

//! Why a text is no CSV clip.

use std::fmt;

use crate::exchange::text_file::NotUtf16;

/// What is wrong, and where. The message says what was expected and what was found.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct CsvError {
    /// 1-based line.
    pub line: u32,
    /// Name of the column, where there is one.
    pub column: Option<String>,
    /// What is wrong.
    pub kind: CsvErrorKind,
}

/// What can be wrong with a CSV clip.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum CsvErrorKind {
    /// Something else stands there.
    #[error("expected {expected}, found {found}")]
    Unexpected {
        /// What may stand there.
        expected: String,
        /// What does.
        found: String,
    },
    /// Joints beyond any skeleton.
    #[error("expected at most {limit} joints, found more")]
    TooManyJoints {
        /// The most that is read.
        limit: usize,
    },
    /// The tracks would take far more memory than the text.
    #[error(
        "expected motion that takes at most {most_mb} MB in a file of this size, found more; cut the file into shorter ones"
    )]
    TooManyNumbers {
        /// The most that is made of such a file.
        most_mb: usize,
    },
    /// Places in the text no longer fit their numbers.
    #[error("expected a file below 4 GiB, found {0} bytes")]
    TooLarge(usize),
}

impl CsvError {
    /// Something else than `expected` stands on a line.
    pub(super) fn unexpected(line: u32, expected: impl Into<String>, found: impl Into<String>) -> Self {
        let kind = CsvErrorKind::Unexpected { expected: expected.into(), found: found.into() };
        Self { line, column: None, kind }
    }

    /// The same in a column.
    pub(super) fn in_column(self, column: &str) -> Self {
        Self { column: Some(column.to_owned()), ..self }
    }
}

impl From<NotUtf16> for CsvError {
    fn from(NotUtf16 { line, found, .. }: NotUtf16) -> Self {
        Self::unexpected(line, NotUtf16::EXPECTED, found)
    }
}

impl fmt::Display for CsvError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "line {}", self.line)?;
        if let Some(column) = &self.column {
            write!(f, ", column {column}")?;
        }
        write!(f, ": {}", self.kind)
    }
}

impl std::error::Error for CsvError {}

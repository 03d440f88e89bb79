//! Why a text is no BVH file.

use std::fmt;

/// What is wrong, and where. The message says what was expected and what was found.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct BvhError {
    /// 1-based line; CRLF, LF and CR each end one.
    pub line: u32,
    /// 1-based column in characters.
    pub column: u32,
    /// 0-based frame, in the motion part.
    pub frame: Option<usize>,
    /// Name of the joint that the place belongs to.
    pub joint: Option<String>,
    /// What is wrong.
    pub kind: BvhErrorKind,
}

/// What can be wrong with a BVH file.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum BvhErrorKind {
    /// Something else stands there.
    #[error("expected {expected}, found {found}")]
    Unexpected {
        /// What may stand there.
        expected: String,
        /// What does, in quotes and shortened where it is long.
        found: String,
    },
    /// Joints within joints without end.
    #[error("expected at most {limit} joints one inside the other, found more")]
    TooDeep {
        /// The most that is read.
        limit: usize,
    },
    /// More joints than any skeleton has.
    #[error("expected at most {limit} joints, found more")]
    TooManyJoints {
        /// The most that is read.
        limit: usize,
    },
    /// A comma could be a decimal mark here or a separator there.
    #[error("expected one decimal mark in the whole file, found points and the comma of `{0}`")]
    TwoDecimalMarks(String),
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

impl fmt::Display for BvhError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "line {}, column {}", self.line, self.column)?;
        if let Some(frame) = self.frame {
            write!(f, ", frame {frame}")?;
        }
        if let Some(joint) = &self.joint {
            write!(f, ", joint {joint}")?;
        }
        write!(f, ": {}", self.kind)
    }
}

impl std::error::Error for BvhError {}

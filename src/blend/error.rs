//! Why two clips can't be blended.

/// Clips or settings that do not go together.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum BlendError {
    /// The skeletons are not the same.
    #[error(
        "expected two clips of one skeleton, found {missing} of {count} joints without a partner, the first `{joint}`; \
         carry one clip over with retarget first"
    )]
    OtherSkeleton {
        /// Joints of the first clip that the second lacks.
        missing: usize,
        /// Joints of the first clip.
        count: usize,
        /// The first of them.
        joint: String,
    },
    /// A clip has no frames.
    #[error("expected a clip with frames, found none in `{0}`")]
    NoFrames(String),
    /// The overlap does not fit in both clips.
    #[error(
        "expected an overlap above 0 and at most {most_secs:.3} s, the shorter clip, found {found_secs} s"
    )]
    Overlap {
        /// The longest overlap there can be.
        most_secs: f64,
        /// What was asked for.
        found_secs: f64,
    },
    /// A clip of a single pose has no time to overlap in.
    #[error("expected two clips with at least two frames each to join, found one frame in `{0}`")]
    OneFrame(String),
    /// The overlap is not too long, but lies beyond an end.
    #[error(
        "expected an overlap of {overlap_secs} s within both clips, found it to begin at {} s of {:.3} s of the first and at {} s of {:.3} s of \
         the second", .begins_secs[0], .lengths_secs[0], .begins_secs[1], .lengths_secs[1]
    )]
    Place {
        /// How long it is.
        overlap_secs: f64,
        /// Where it begins in each clip.
        begins_secs: [f64; 2],
        /// How long each clip is.
        lengths_secs: [f64; 2],
    },
    /// No part of the clip is so long.
    #[error(
        "expected a loop above 0 and at most {most_secs:.3} s long, the clip's length, found {found_secs} s"
    )]
    LoopLength {
        /// The clip's length.
        most_secs: f64,
        /// What was asked for.
        found_secs: f64,
    },
    /// A weight out of its range.
    #[error("expected a weight {expected}, found {found}")]
    Weight {
        /// The range in words.
        expected: &'static str,
        /// What was asked for.
        found: f64,
    },
    /// A weight curve without knots, or with knots out of order.
    #[error("expected knots of a weight curve at rising seconds, found {found}")]
    Knots {
        /// What is wrong.
        found: String,
    },
    /// A joint that is not there.
    #[error("expected a joint of the first clip, such as {there}, found `{found}`")]
    NoSuchJoint {
        /// What was asked for.
        found: String,
        /// Labels of joints that are there, those that are written nearly so where there are such.
        there: String,
    },
    /// No way through the grid keeps the bounds on pace.
    #[error(
        "expected clips whose paces differ at most {most}-fold, found {rows} and {columns} frames to align; \
         cut or resample one of them first"
    )]
    TooUnlike {
        /// The largest ratio of paces.
        most: usize,
        /// Frames of the first.
        rows: usize,
        /// Frames of the second.
        columns: usize,
    },
}

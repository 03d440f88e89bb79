//! What carrying a clip over came to, in numbers.

use std::collections::BTreeMap;

use crate::skeleton::Skeleton;

/// How far a limb of the target points from where the source's does.
#[derive(Clone, Debug, PartialEq)]
pub struct DirectionError {
    /// The target's joint.
    pub joint: usize,
    /// The mean over the frames, in radians.
    pub mean_rad: f64,
    /// The largest, in radians, and its frame.
    pub worst_rad: f64,
    /// The frame of it.
    pub worst_frame: usize,
}

/// The largest change that holding feet or hands, or limits, made.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LargestCorrection {
    /// The target's joint.
    pub joint: usize,
    /// The change of its turn, in radians.
    pub by_rad: f64,
    /// The frame.
    pub frame: usize,
}

/// How a joint of the result keeps to its limit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LimitUse {
    /// The target's joint.
    pub joint: usize,
    /// The largest use of the limit, 1 at it.
    pub most_use: f64,
    /// Frames beyond the limit before joints were brought within it.
    pub beyond_before: usize,
    /// How far beyond at most, in radians.
    pub most_beyond_before_rad: f64,
    /// Frames beyond the limit in the result.
    pub beyond: usize,
    /// How far beyond at most, in radians.
    pub most_beyond_rad: f64,
}

/// Something that could not be met.
#[derive(Clone, Debug, PartialEq)]
pub struct Missed {
    /// What, in words.
    pub what: String,
    /// The target's joint.
    pub joint: usize,
    /// The frame in which it is worst.
    pub frame: usize,
    /// How much is missing, in the target's lengths.
    pub by: f64,
}

impl Missed {
    /// One line for people: what, where, when and by how much.
    pub fn sentence(&self, target: &Skeleton) -> String {
        format!(
            "not met: {} ({}, frame {}, by {:.4})",
            self.what,
            target.label(self.joint),
            self.frame,
            self.by
        )
    }
}

/// What carrying a clip over came to.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Report {
    /// Target lengths as multiples of source lengths.
    pub scale: f64,
    /// Height at which the source stands, of its ankles or without feet of its lowest point, in its lengths.
    pub source_level: Option<f64>,
    /// Target joints that are driven, of all that are listed.
    pub driven: [usize; 2],
    /// Arms and legs: how far they point from where the source's do.
    pub directions: Vec<DirectionError>,
    /// The largest of these before feet were held, in radians.
    pub unheld_direction_rad: f64,
    /// How far the hips were moved so that legs reach the ground, at most, in the target's lengths.
    pub hips_shift: f64,
    /// Hands, feet and head against the hips, as shares of the target's height: mean and largest difference to the source's, scaled
    /// by the legs. Other proportions show here.
    pub tips: Vec<(usize, [f64; 2])>,
    /// Sums of the movements of planted feet along the ground, before and after holding them, in the target's lengths.
    pub slide: Option<[f64; 2]>,
    /// The farthest a planted foot gets from its place, before and after.
    pub drift: Option<[f64; 2]>,
    /// How many spans with a planted foot were found.
    pub n_plants: usize,
    /// The largest change that holding feet and hands made.
    pub largest_correction: Option<LargestCorrection>,
    /// How joints keep to the limits that were asked for; without any, a human figure to the preset for adults, which is measured only.
    pub limits: Vec<LimitUse>,
    /// What these limits are called; empty without any.
    pub limits_title: String,
    /// The largest change that limits made.
    pub largest_clamp: Option<LargestCorrection>,
    /// The deepest that a point of a foot lies below the ground between plants, before feet were lifted there and after, in the target's
    /// lengths.
    pub deepest_dip: Option<[f64; 2]>,
    /// What could not be met.
    pub missed: Vec<Missed>,
    /// What is worth telling, a sentence each.
    pub notes: Vec<String>,
}

impl Report {
    /// Takes the largest of some changes of joints, in radians and with their frames, where it is larger than what is known.
    pub(super) fn note_changes(&mut self, changes: &BTreeMap<usize, (f64, usize)>) {
        let own = changes.iter().map(|(&joint, &(by_rad, frame))| LargestCorrection { joint, by_rad, frame });
        let most = own.chain(self.largest_correction).max_by(|a, b| a.by_rad.total_cmp(&b.by_rad));
        self.largest_correction = most;
    }

    /// The largest direction error of all, in radians.
    pub fn worst_direction_rad(&self) -> f64 {
        self.directions.iter().map(|error| error.worst_rad).fold(0.0, f64::max)
    }
}

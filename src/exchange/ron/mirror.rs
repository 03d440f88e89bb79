//! The scene as it stands in the file. Apart from the document, so that the program may change and old files still read.

use serde::{Deserialize, Serialize};

/// The newest version this program knows. 1 holds mends alone; 2 all other passes too. A scene is written in the oldest
/// version that holds it, so that an older program opens what it can.
pub(super) const VERSION: u32 = 2;

/// The first thing that is read: does this version know the rest?
#[derive(Deserialize)]
pub(super) struct Head {
    pub(super) turnwright_scene: u32,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Saved {
    /// The version.
    pub(super) turnwright_scene: u32,
    pub(super) sources: Vec<Source>,
    pub(super) clips: Vec<ClipWork>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Source {
    /// From the scene's own folder, with `/` between.
    pub(super) path: String,
    pub(super) sha256: String,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ClipWork {
    pub(super) source: usize,
    pub(super) clip: usize,
    pub(super) name: String,
    #[serde(default)]
    pub(super) passes: Vec<Pass>,
    #[serde(default)]
    pub(super) left: Vec<Left>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Pass {
    pub(super) id: u64,
    pub(super) on: bool,
    /// Numbers and labels of the joints that the step names by number, since numbers change when a file is written anew.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub(super) joints: Vec<(usize, String)>,
    pub(super) step: Step,
}

#[derive(Serialize, Deserialize)]
pub(super) enum Step {
    Mend { kind: String, amount: f64, snags: Vec<Snag> },
    Resample { rate: f64 },
}

impl Step {
    /// The oldest version that knows it.
    pub(super) fn version(&self) -> u32 {
        if matches!(self, Self::Mend { .. }) { 1 } else { 2 }
    }
}

/// A snag with all that its mend needs, so that a scene plays the same wherever it is opened.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Snag {
    pub(super) joint: String,
    pub(super) joint_index: usize,
    /// First and last.
    pub(super) keys: (usize, usize),
    pub(super) frames: (usize, usize),
    pub(super) seconds: (f64, f64),
    pub(super) size_deg: f64,
    pub(super) confidence: f64,
    pub(super) remedy: Remedy,
    pub(super) safe: bool,
    pub(super) text: String,
}

#[derive(Serialize, Deserialize)]
pub(super) enum Remedy {
    Normalise,
    Negate,
    /// Whole turns of the first, second and third angle.
    Unwrap(i32, i32, i32),
    NearestAngles,
    Redraw,
    ShortWay,
    /// Scalar, yz, zx, xy.
    TakeOut(f64, f64, f64, f64),
    /// The same, on the parent's side.
    TakeOutAbove(f64, f64, f64, f64),
    Ask,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Left {
    pub(super) kind: String,
    pub(super) joint: String,
    pub(super) joint_index: usize,
    pub(super) keys: (usize, usize),
}

//! The scene as it stands in the file. Apart from the document, so that the program may change and old files still read.

use serde::{Deserialize, Serialize};

pub(super) use super::super::limits::mirror::Joint as JointLimit;

/// The newest version this program knows. 1 holds mends alone; 2 all other passes too; 3 markers, what else is looked for, means of clips, and what
/// a retarget holds and measures from. A scene is written in the oldest
/// version that holds it, so that an older program opens what it can.
pub(super) const VERSION: u32 = 3;

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
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) columns: Option<String>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) time_unit: Option<String>,
    /// From the scene's own folder, as `path`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) skeleton: Option<String>,
    /// `bind`, `defaults` or `first-frame`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) rest: Option<String>,
}

impl Source {
    /// The oldest version that knows it.
    pub(super) fn version(&self) -> u32 {
        let said = [&self.columns, &self.time_unit, &self.skeleton, &self.rest];
        if said.iter().all(|own| own.is_none()) { 1 } else { 2 }
    }
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
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) limits: Option<Limits>,
    /// `loop` and `slide`.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub(super) search: Vec<String>,
    /// Seconds and name of each marker.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub(super) markers: Vec<(f64, String)>,
}

impl ClipWork {
    /// The oldest version that knows it, its passes aside.
    pub(super) fn version(&self) -> u32 {
        match (self.search.is_empty() && self.markers.is_empty(), &self.limits) {
            (false, _) => 3,
            (true, Some(_)) => 2,
            (true, None) => 1,
        }
    }
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Limits {
    pub(super) title: String,
    /// Number and label of each joint, and its limit.
    pub(super) joints: Vec<(usize, String, JointLimit)>,
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
    Mend {
        kind: String,
        amount: f64,
        snags: Vec<Snag>,
    },
    Resample {
        rate: f64,
    },
    Blend(Blend),
    Smooth {
        scope: Scope,
        kernel: String,
        cutoff_hz: f64,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        most_deg: Option<f64>,
        amount: f64,
        with_places: bool,
        #[serde(default, skip_serializing_if = "Vec::is_empty")]
        masks: Vec<Scope>,
    },
    Retarget {
        /// Index of the source whose skeleton is meant.
        onto: usize,
        #[serde(default, skip_serializing_if = "Vec::is_empty")]
        rows: Vec<(Option<String>, Option<String>)>,
        plant_feet: bool,
        /// Of source and target.
        #[serde(default, skip_serializing_if = "are_plain")]
        rests: (RestPick, RestPick),
        #[serde(default, skip_serializing_if = "are_none")]
        roots: (Option<String>, Option<String>),
        #[serde(default, skip_serializing_if = "Option::is_none")]
        feet: Option<Vec<FootContact>>,
        #[serde(default, skip_serializing_if = "Vec::is_empty")]
        hands: Vec<HandHold>,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        limits: Option<KeptLimits>,
    },
    Push {
        pushes: Vec<Push>,
    },
    Keys {
        edits: Vec<KeyEdit>,
    },
    Reduce {
        scope: Scope,
        bound_deg: f64,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        tip_bound: Option<f64>,
        #[serde(default, skip_serializing_if = "Vec::is_empty")]
        keep_seconds: Vec<f64>,
    },
    Limits(LimitsPass),
    Loop {
        /// First and last second of the part that is the loop; the whole clip without.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        part: Option<(f64, f64)>,
        /// How the seam is closed; open without.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        close: Option<Closing>,
        rounds: usize,
    },
}

#[derive(Serialize, Deserialize)]
pub(super) enum Closing {
    BySize,
    Spread,
    Window,
}

/// The fields of [`Step::Retarget`].
pub(super) struct Retarget {
    pub(super) onto: usize,
    pub(super) rows: Vec<(Option<String>, Option<String>)>,
    pub(super) plant_feet: bool,
    pub(super) rests: (RestPick, RestPick),
    pub(super) roots: (Option<String>, Option<String>),
    pub(super) feet: Option<Vec<FootContact>>,
    pub(super) hands: Vec<HandHold>,
    pub(super) limits: Option<KeptLimits>,
}

/// Which pose counts as rest.
#[derive(Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RestPick {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) frame_seconds: Option<f64>,
    #[serde(default)]
    pub(super) straightened: bool,
}

/// A time in which a foot stands.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct FootContact {
    pub(super) side: String,
    pub(super) part: String,
    pub(super) seconds: (f64, f64),
}

/// A time in which a hand is held.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct HandHold {
    pub(super) side: String,
    pub(super) seconds: (f64, f64),
    pub(super) at: HoldAt,
}

#[derive(Serialize, Deserialize)]
pub(super) enum HoldAt {
    Still,
    /// In the target's scene.
    Place(f64, f64, f64),
    OtherHand,
}

#[derive(Serialize, Deserialize)]
pub(super) enum KeptLimits {
    Adult,
    Given(Limits),
    OfSource(Limits),
}

fn are_plain(rests: &(RestPick, RestPick)) -> bool {
    *rests == Default::default()
}

fn are_none(roots: &(Option<String>, Option<String>)) -> bool {
    roots.0.is_none() && roots.1.is_none()
}

/// Another clip blended in.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Blend {
    /// Index of its source, and of the clip in it.
    pub(super) other: (usize, usize),
    pub(super) form: BlendForm,
    /// Factor of each joint by number; all in full without.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) joints: Option<Vec<(usize, f64)>>,
    pub(super) holds_feet: bool,
}

#[derive(Serialize, Deserialize)]
pub(super) enum BlendForm {
    /// Seconds in this clip and in the other at which the overlap begins, and how long it is.
    Join {
        first: f64,
        second: f64,
        overlap: f64,
    },
    Mix {
        /// Seconds and weight of each knot.
        weight: Vec<(f64, f64)>,
        aligned: bool,
        root: RootFrom,
    },
    Add {
        weight: f64,
        reference: Reference,
        side: Side,
    },
    Mean {
        /// Weights of this clip and of the other.
        weights: (f64, f64),
        /// Source, clip and weight of each further one.
        #[serde(default, skip_serializing_if = "Vec::is_empty")]
        more: Vec<(usize, usize, f64)>,
        aligned: bool,
    },
}

#[derive(Serialize, Deserialize)]
pub(super) enum RootFrom {
    Both,
    First,
    Second,
}

#[derive(Serialize, Deserialize)]
pub(super) enum Reference {
    First,
    Rest,
    Mean,
}

#[derive(Serialize, Deserialize)]
pub(super) enum Side {
    Body,
    Parent,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Push {
    pub(super) joint: usize,
    pub(super) center: f64,
    pub(super) reach: f64,
    /// yz, zx, xy in degrees.
    pub(super) plane_angles: (f64, f64, f64),
    pub(super) frame: String,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct KeyEdit {
    pub(super) joint: usize,
    pub(super) change: KeyChange,
}

/// Of a rotor: scalar, yz, zx, xy.
pub(super) type Parts = (f64, f64, f64, f64);

/// Seconds first, then what they get.
#[derive(Serialize, Deserialize)]
pub(super) enum KeyChange {
    Insert(Vec<(f64, Option<Parts>)>),
    Set(Vec<(f64, Parts)>),
    Move(Vec<(f64, f64)>),
    Delete(Vec<f64>),
    Path(Vec<f64>, String),
    Space(Vec<f64>, Spacing),
    /// Whole turns, and the plane they are in where it is not that of the short way.
    Turn(Vec<f64>, i32, Option<(f64, f64, f64)>),
}

#[derive(Serialize, Deserialize)]
pub(super) enum Spacing {
    Even,
    EaseIn,
    EaseOut,
    EaseBoth,
    /// Two handles: share of the time, share of the way.
    Own((f64, f64), (f64, f64)),
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct LimitsPass {
    pub(super) limits: Limits,
    pub(super) clamp: Clamp,
    pub(super) amount: f64,
    pub(super) scope: Scope,
}

#[derive(Serialize, Deserialize)]
pub(super) enum Clamp {
    Soft,
    Hard,
    HardNearest,
}

/// Where a pass acts. What is left out means everywhere.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Scope {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) joints: Option<Vec<usize>>,
    /// First and last.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(super) seconds: Option<(f64, f64)>,
    #[serde(default, skip_serializing_if = "is_zero")]
    pub(super) fade_seconds: f64,
}

#[expect(clippy::trivially_copy_pass_by_ref, reason = "serde hands over a reference")]
fn is_zero(number: &f64) -> bool {
    *number == 0.0
}

impl Step {
    /// The oldest version that knows it.
    pub(super) fn version(&self) -> u32 {
        /// The kinds of snag that version 1 knows.
        const KINDS: [&str; 7] =
            ["broken-value", "sign-flip", "wrap", "mirrored-angles", "long-way", "half-turn", "spike"];
        match self {
            Self::Mend { kind, .. } if KINDS.contains(&kind.as_str()) => 1,
            Self::Retarget { rests, roots, feet, hands, limits, .. } => {
                let is_plain = are_plain(rests) && are_none(roots) && feet.is_none();
                if is_plain && hands.is_empty() && limits.is_none() { 2 } else { 3 }
            }
            Self::Blend(Blend { form: BlendForm::Mean { .. }, .. }) => 3,
            _ => 2,
        }
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
    FromOthers,
    /// Radians of noise, and of sound motion; keys.
    Smooth(f64, f64, usize),
    ShortWay,
    /// Scalar, yz, zx, xy.
    TakeOut(f64, f64, f64, f64),
    /// The same, on the parent's side.
    TakeOutAbove(f64, f64, f64, f64),
    /// Softly, to this limit.
    Clamp(JointLimit),
    Ask,
    CloseLoop {
        /// Whether the difference is brought in near the seam alone.
        window: bool,
        #[serde(default)]
        first: usize,
        first_again: bool,
        with_rate: bool,
    },
    Hold {
        /// Upper joint, lower joint, end.
        limb: (usize, usize, usize),
        /// In the end's frame.
        end_point: (f64, f64, f64),
        heel: (usize, (f64, f64, f64)),
        ball: (usize, (f64, f64, f64)),
        /// First and last frame that they are down.
        heel_frames: Option<(usize, usize)>,
        ball_frames: Option<(usize, usize)>,
        /// Free frames before and after.
        free: (usize, usize),
    },
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Left {
    pub(super) kind: String,
    pub(super) joint: String,
    pub(super) joint_index: usize,
    pub(super) keys: (usize, usize),
}

//! What a proof sheet tells, before it takes a form.

use crate::exchange::Source;
use crate::limit::Keeping;
use crate::snag::{Snag, SnagKind};

use super::curves::JointCurves;
use super::measure::Measurement;
use super::passes::{MendFacts, PassFacts};

/// The caution that stands on every sheet.
pub const CAUTION: &str = "Exported curves that drive a machine need that machine's own limits and guarding, local \
                           safety codes and a licensed or qualified person.";

/// One of the two files.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct FileFacts {
    /// Its path as it was given.
    pub file: String,
    /// Its format: `BVH`.
    pub format: String,
    /// Its size in bytes.
    pub bytes: usize,
    /// How many clips it holds.
    pub clips: usize,
    /// SHA-256 of its bytes, hexadecimal.
    pub sha256: String,
}

impl FileFacts {
    /// Of a file as it was read.
    pub fn of(source: &Source) -> Self {
        Self {
            file: source.path.display().to_string(),
            format: source.format.to_string(),
            bytes: source.bytes().len(),
            clips: source.clips.len(),
            sha256: source.sha256().to_owned(),
        }
    }
}

/// A snag that was found, and whether it is still there.
#[derive(Clone, Debug, PartialEq)]
pub struct FoundSnag {
    /// Its kind.
    pub kind: SnagKind,
    /// Label of its joint.
    pub joint: String,
    /// First and last frame.
    pub frames: [usize; 2],
    /// Time of both, seconds.
    pub secs: [f64; 2],
    /// Its size, radians.
    pub size_rad: f64,
    /// How sure it is a fault, 0 to 1.
    pub confidence: f64,
    /// What its mend does, in a word or two.
    pub mend: &'static str,
    /// Whether the mend may be made unasked.
    pub safe: bool,
    /// Whether a person said it is meant.
    pub meant: bool,
    /// A plain sentence.
    pub text: String,
    /// Whether the clip after is free of it.
    pub gone: bool,
}

/// A picture to stand on the sheet, as PNG bytes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SheetPicture {
    /// Heading.
    pub title: String,
    /// What it shows.
    pub caption: String,
    /// For a light page and for print.
    pub light_png: Vec<u8>,
    /// For a dark page.
    pub dark_png: Vec<u8>,
}

/// How one joint kept to its limit before and after.
#[derive(Clone, Debug, PartialEq)]
pub struct LimitRow {
    /// Its label.
    pub joint: String,
    /// In the clip before.
    pub before: Keeping,
    /// In the clip after; `None` where the joint is gone, or rests otherwise.
    pub after: Option<Keeping>,
}

/// How the joints kept to their limits.
#[derive(Clone, Debug, PartialEq)]
pub struct LimitsProof {
    /// What the limits are called.
    pub title: String,
    /// One for each joint that has a limit and keys.
    pub rows: Vec<LimitRow>,
}

/// What changed in one clip.
#[derive(Clone, Debug, PartialEq)]
pub struct ClipProof {
    /// Its name, or `#INDEX` without one.
    pub label: String,
    /// Its index in the file before.
    pub index: usize,
    /// What changed.
    pub measurement: Measurement,
    /// The passes that ran, in order; empty where nobody knows.
    pub passes: Vec<PassFacts>,
    /// Snags of the clip before.
    pub found: Vec<FoundSnag>,
    /// Snags of the clip after that were not in the clip before.
    pub new: Vec<FoundSnag>,
    /// How the joints kept to their limits, where there were any to hold them against.
    pub limits: Option<LimitsProof>,
    /// Curves of the joints that changed most.
    pub curves: Vec<JointCurves>,
    /// Pictures.
    pub pictures: Vec<SheetPicture>,
}

/// A proof sheet.
#[derive(Clone, Debug, PartialEq)]
pub struct Sheet {
    /// The file before.
    pub before: FileFacts,
    /// The file after, as it lies on the disk.
    pub after: FileFacts,
    /// One for each clip compared.
    pub clips: Vec<ClipProof>,
    /// What the readers of both files told.
    pub notes: Vec<String>,
    /// The clips after are a scene's results, worked out and not read from a file that was written.
    pub is_computed: bool,
}

impl FoundSnag {
    /// From a snag of a joint with this label, not known to be gone.
    pub fn new(snag: &Snag, label: &str, meant: bool) -> Self {
        Self {
            kind: snag.kind,
            joint: label.to_owned(),
            frames: [snag.first_frame, snag.last_frame],
            secs: [snag.first_secs, snag.last_secs],
            size_rad: snag.size_rad,
            confidence: snag.confidence,
            mend: snag.remedy.name(),
            safe: snag.safe,
            meant,
            text: snag.text.clone(),
            gone: false,
        }
    }

    /// `gone`, `meant` or `left`, of a snag of the clip before.
    pub const fn state(&self) -> &'static str {
        match (self.gone, self.meant) {
            (true, _) => "gone",
            (false, true) => "meant",
            (false, false) => "left",
        }
    }

    /// Whether another is of the same kind and joint and shares a frame with this one.
    pub fn meets(&self, other: &Self) -> bool {
        self.kind == other.kind
            && self.joint == other.joint
            && self.frames[0] <= other.frames[1]
            && other.frames[0] <= self.frames[1]
    }
}

impl ClipProof {
    /// Puts measurement and snags together. A snag before is gone when none after meets it.
    pub fn new(
        label: String,
        index: usize,
        measurement: Measurement,
        mut before: Vec<FoundSnag>,
        after: Vec<FoundSnag>,
    ) -> Self {
        for snag in &mut before {
            snag.gone = !after.iter().any(|other| other.meets(snag));
        }
        let new = after.into_iter().filter(|snag| !before.iter().any(|other| other.meets(snag))).collect();
        Self {
            label,
            index,
            measurement,
            passes: Vec::new(),
            found: before,
            new,
            limits: None,
            curves: Vec::new(),
            pictures: Vec::new(),
        }
    }

    /// How many snags are still there and not meant.
    pub fn left(&self) -> usize {
        self.found.iter().filter(|snag| snag.state() == "left").count()
    }

    /// How many snags are still there and meant.
    pub fn meant(&self) -> usize {
        self.found.iter().filter(|snag| snag.state() == "meant").count()
    }

    /// What was done about a snag of the clip before, where one of the passes mended it.
    pub fn mend_of(&self, snag: &FoundSnag) -> Option<&MendFacts> {
        let all = self.passes.iter().flat_map(|pass| &pass.mends);
        all.into_iter()
            .find(|mend| mend.kind == snag.kind && mend.joint == snag.joint && mend.frames == snag.frames)
    }

    /// How many snags are gone.
    pub fn gone(&self) -> usize {
        self.found.iter().filter(|snag| snag.gone).count()
    }
}

impl Sheet {
    /// The largest change of any joint in any clip, radians.
    pub fn max_change_rad(&self) -> f64 {
        self.clips.iter().map(|clip| clip.measurement.max_change_rad()).fold(0.0, f64::max)
    }
}

//! Files of joint limits: CSV for the simple case, RON for all of it.
//!
//! CSV: `joint,swing_deg,twist_min_deg,twist_max_deg`, a cone about the rest pose and a twist about the limb; an empty cell sets no
//! limit. RON: every side, stated zero and axes, comfort and fault band. Degrees.

mod error;
pub(in crate::exchange) mod mirror;
mod table;

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use serde::Deserialize;

use crate::limit::{Limits, limb_direction};
use crate::skeleton::Skeleton;

use super::disk;
pub use error::LimitsError;

/// Limits by the names of joints, as a file has them.
#[derive(Clone, Debug, PartialEq)]
pub struct LimitsFile {
    /// Where it is; serves for messages.
    pub path: PathBuf,
    /// What the limits are called.
    pub title: String,
    /// The joint's name, the line it stands on, and its limit.
    joints: Vec<(String, usize, mirror::Joint)>,
}

/// Reads a file of limits: `.csv` or `.ron`.
///
/// # Errors
/// When it can't be read or is no file of limits; names line and joint.
pub fn read(path: &Path) -> Result<LimitsFile, LimitsError> {
    let bytes = disk::read(path)?;
    let text = std::str::from_utf8(&bytes)
        .map_err(|error| LimitsError::NoText { path: path.to_owned(), at: error.valid_up_to() })?;
    from_text(path, text)
}

/// Reads limits from text that is already here; the ending of `path` tells the form.
///
/// # Errors
/// As [`read`], but for the disk.
pub fn from_text(path: &Path, text: &str) -> Result<LimitsFile, LimitsError> {
    let ending = path.extension().map(|ending| ending.to_string_lossy().to_lowercase());
    match ending.as_deref() {
        Some("csv") => Ok(LimitsFile {
            path: path.to_owned(),
            title: title_of(path),
            joints: table::joints(path, text)?,
        }),
        Some("ron") => from_ron(path, text),
        other => Err(LimitsError::NoForm {
            path: path.to_owned(),
            found: other.map_or_else(|| "no ending".to_owned(), |other| format!(".{other}")),
        }),
    }
}

fn title_of(path: &Path) -> String {
    path.file_name().map(|name| name.to_string_lossy().into_owned()).unwrap_or_default()
}

/// The first thing that is read: does this version know the rest?
#[derive(Deserialize)]
struct Head {
    turnwright_limits: u32,
}

fn options() -> ron::Options {
    ron::Options::default().with_default_extension(ron::extensions::Extensions::IMPLICIT_SOME)
}

fn from_ron(path: &Path, text: &str) -> Result<LimitsFile, LimitsError> {
    let syntax = |error: ron::error::SpannedError| LimitsError::Line {
        path: path.to_owned(),
        line: error.span.start.line,
        joint: joint_before(text, error.span.start.line),
        expected: "joint limits".to_owned(),
        found: error.code.to_string(),
    };
    let head: Head = options().from_str(text).map_err(syntax)?;
    if head.turnwright_limits > mirror::VERSION {
        return Err(LimitsError::TooNew {
            path: path.to_owned(),
            known: mirror::VERSION,
            found: head.turnwright_limits,
        });
    }
    let saved: mirror::Saved = options().from_str(text).map_err(syntax)?;
    let line_of = |label: &str| {
        let quoted = format!("{label:?}");
        text.lines().position(|line| line.trim_start().starts_with(&quoted)).map_or(1, |line| line + 1)
    };
    let joints =
        saved.joints.into_iter().map(|(label, joint)| (label.clone(), line_of(&label), joint)).collect();
    let title = if saved.title.is_empty() { title_of(path) } else { saved.title };
    let file = LimitsFile { path: path.to_owned(), title, joints };
    file.check()?;
    Ok(file)
}

/// The joint whose entry a line lies in: the last name in quotes that begins a line up to it.
fn joint_before(text: &str, line: usize) -> Option<String> {
    let names = text.lines().take(line).filter_map(|line| {
        let (name, rest) = line.trim_start().strip_prefix('"')?.split_once('"')?;
        rest.trim_start().starts_with(':').then(|| name.to_owned())
    });
    names.last()
}

impl LimitsFile {
    /// Whether each limit makes sense by itself, whatever the skeleton.
    fn check(&self) -> Result<(), LimitsError> {
        let any = mirror::Defaults { zero: crate::rotor::Rotor::IDENTITY, limb: Some(glam::DVec3::Y) };
        self.joints.iter().try_for_each(|own| self.limit_of(own, &any).map(|_| ()))
    }

    fn limit_of(
        &self,
        (label, line, joint): &(String, usize, mirror::Joint),
        defaults: &mirror::Defaults,
    ) -> Result<crate::limit::JointLimit, LimitsError> {
        joint.limit(defaults).map_err(|[expected, found]| LimitsError::Line {
            path: self.path.clone(),
            line: *line,
            joint: Some(label.clone()),
            expected,
            found,
        })
    }

    /// Limits by name of joints that are known by number: what [`write()`] would write. `path` serves for messages.
    pub fn of(path: &Path, limits: &Limits, label: &dyn Fn(usize) -> String) -> Self {
        let joints =
            limits.joints.iter().map(|(&joint, limit)| (label(joint), 1, mirror::Joint::of(limit))).collect();
        Self { path: path.to_owned(), title: limits.title.clone(), joints }
    }

    /// Names of the joints, in the order of the file.
    pub fn joints(&self) -> impl Iterator<Item = &str> {
        self.joints.iter().map(|(label, ..)| label.as_str())
    }

    /// The limits for a skeleton, and the names it has no joint for.
    ///
    /// # Errors
    /// When the skeleton has none of the joints, or a joint has no limb to twist about and the file states no axis.
    pub fn fit(&self, skeleton: &Skeleton) -> Result<(Limits, Vec<String>), LimitsError> {
        let mut limits = Limits { title: self.title.clone(), joints: BTreeMap::new() };
        let mut missing = Vec::new();
        for own in &self.joints {
            let Some(joint) = skeleton.find(&own.0) else {
                missing.push(own.0.clone());
                continue;
            };
            let defaults = mirror::Defaults {
                zero: skeleton.joints()[joint].rest.rotation,
                limb: limb_direction(skeleton, joint),
            };
            limits.joints.insert(joint, self.limit_of(own, &defaults)?);
        }
        if limits.is_empty() && !missing.is_empty() {
            let found = missing.iter().take(8).map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ");
            return Err(LimitsError::NoJoint { path: self.path.clone(), found });
        }
        Ok((limits, missing))
    }
}

/// Writes limits as RON at one stroke; `label` names a joint.
///
/// # Errors
/// When the system refuses; the old file then stays.
pub fn write(path: &Path, limits: &Limits, label: &dyn Fn(usize) -> String) -> Result<(), LimitsError> {
    Ok(disk::write(path, to_ron(path, limits, label)?.as_bytes())?)
}

/// The text that [`write()`] writes; `path` serves for messages.
///
/// # Errors
/// When a value can't be said in RON.
pub fn to_ron(path: &Path, limits: &Limits, label: &dyn Fn(usize) -> String) -> Result<String, LimitsError> {
    let saved = mirror::Saved {
        turnwright_limits: mirror::VERSION,
        title: limits.title.clone(),
        joints: limits
            .joints
            .iter()
            .map(|(&joint, limit)| (label(joint), mirror::Joint::of(limit)))
            .collect(),
    };
    let pretty = ron::ser::PrettyConfig::new().depth_limit(3).struct_names(false).new_line("\n");
    let text = options()
        .to_string_pretty(&saved, pretty)
        .map_err(|error| LimitsError::Encode { path: path.to_owned(), what: error.to_string() })?;
    Ok(text + "\n")
}

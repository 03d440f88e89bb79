//! `--limits`: which limits to hold the joints against.

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::str::FromStr;
use std::sync::Arc;

use crate::exchange::limits::{LimitsFile, read};
use crate::exchange::{self, ClipAddress, OpenOptions};
use crate::limit::{LearnOptions, Limits, adult, learned};
use crate::skeleton::Skeleton;
use crate::snag::SnagKind;

use super::error::CliError;
use super::input::Input;
use super::output::Output;

/// What was typed after `--limits`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum LimitsName {
    /// The preset for adult human figures.
    Adult,
    /// A file of limits, or a clip to learn them from.
    File(PathBuf),
}

impl FromStr for LimitsName {
    type Err = std::convert::Infallible;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        Ok(if text == "adult" { Self::Adult } else { Self::File(PathBuf::from(text)) })
    }
}

/// Whether a name is that of a clip, to learn limits from. A `.csv` or `.ron` holds limits themselves.
fn is_clip(path: &Path) -> bool {
    let path = ClipAddress::parse(&path.to_string_lossy()).path;
    let ending = path.extension().map(|ending| ending.to_string_lossy().to_lowercase());
    matches!(ending.as_deref(), Some("bvh" | "gltf" | "glb"))
}

/// The limits that the first or named clip of a file keeps.
fn learned_from(path: &Path) -> Result<LimitsFile, CliError> {
    let address = ClipAddress::parse(&path.to_string_lossy());
    let source = exchange::open(&address.path, &OpenOptions::default())?;
    let index = address.clip.as_ref().map_or(Some(0), |name| source.find_clip(name));
    let clip = index.and_then(|index| source.clips.get(index));
    let Some(clip) = clip else { return Err(CliError::NoClip { path: path.to_owned() }) };
    let mut limits = learned(clip, &LearnOptions::default());
    limits.title = format!("learned from {}", path.file_name().unwrap_or_default().to_string_lossy());
    Ok(LimitsFile::of(path, &limits, &|joint| clip.skeleton.label(joint).to_owned()))
}

/// Limits that are ready to be fitted to clips.
#[derive(Debug)]
pub(super) enum LimitsSource {
    /// None were asked for: those of a scene's clip are used.
    OfScene,
    /// The preset.
    Adult,
    /// A file that was read.
    File(LimitsFile),
}

impl LimitsSource {
    /// Reads the file, where it is one.
    pub(super) fn open(name: Option<&LimitsName>) -> Result<Self, CliError> {
        Ok(match name {
            None => Self::OfScene,
            Some(LimitsName::Adult) => Self::Adult,
            Some(LimitsName::File(path)) => {
                Self::File(if is_clip(path) { learned_from(path)? } else { read(path)? })
            }
        })
    }

    /// The limits for each clip of an input. Says in a line on stderr why there are none, or which joints a file names in vain.
    pub(super) fn fit(
        &self,
        input: &Input,
        output: &mut Output,
    ) -> Result<Vec<Option<Arc<Limits>>>, CliError> {
        let mut limits = vec![None; input.results.len()];
        let mut told = BTreeSet::new();
        for &index in &input.chosen {
            let clip = &input.results[index];
            limits[index] = match self {
                Self::OfScene => input.limits[index].clone(),
                Self::Adult => match adult::limits_for(clip) {
                    Ok(adult) => Some(Arc::new(adult.limits)),
                    Err(why) => {
                        let why = why.to_string();
                        if told.insert(why.clone()) {
                            output.note(&input.source.path, &why);
                        }
                        None
                    }
                },
                Self::File(file) => {
                    let (limits, missing) = file.fit(&clip.skeleton)?;
                    if !missing.is_empty() {
                        let names =
                            missing.iter().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ");
                        let note = format!("{} has no joint {names}; left out", input.source.path.display());
                        if told.insert(note.clone()) {
                            output.note(&file.path, &note);
                        }
                    }
                    Some(Arc::new(limits))
                }
            };
        }
        Ok(limits)
    }

    /// The limits of a file for another skeleton than that of an input; `None` for the preset.
    pub(super) fn for_skeleton(
        &self,
        skeleton: &Skeleton,
        output: &mut Output,
    ) -> Result<Option<Arc<Limits>>, CliError> {
        let Self::File(file) = self else { return Ok(None) };
        let (limits, missing) = file.fit(skeleton)?;
        if !missing.is_empty() {
            let names = missing.iter().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ");
            output.note(&file.path, &format!("the target has no joint {names}; left out"));
        }
        Ok(Some(Arc::new(limits)))
    }

    /// Kinds that were named and need limits, where there are none at all.
    pub(super) fn check(
        &self,
        kinds: Option<&[SnagKind]>,
        limits: &[Option<Arc<Limits>>],
    ) -> Result<(), CliError> {
        let is_asked = kinds.is_some_and(|kinds| kinds.contains(&SnagKind::PastLimit));
        if is_asked && matches!(self, Self::OfScene) && limits.iter().all(Option::is_none) {
            return Err(CliError::Argument {
                place: "--kinds past-limit".to_owned(),
                expected: "limits to hold the joints against".to_owned(),
                found: "none".to_owned(),
                advice: "add --limits FILE or --limits adult",
            });
        }
        Ok(())
    }
}

//! Opens what the command line names: clips by address, and scenes with their passes applied.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::clip::Clip;
use crate::exchange::{self, ClipAddress, OpenOptions, Source, disk, ron};
use crate::limit::Limits;
use crate::proof::{PassFacts, passes_run};
use crate::scene::{Document, Evaluation, Library, Loaded, Pass, SnagMark};

use super::error::CliError;
use super::output::Output;

/// A source file with the clips that the passes of a scene make of its own; without a scene these are the same.
#[derive(Debug)]
pub(super) struct Input {
    /// What the user named: the clip file or the scene.
    pub(super) path: PathBuf,
    /// The clip file.
    pub(super) source: Source,
    /// A result for each clip of the source.
    pub(super) results: Vec<Arc<Clip>>,
    /// The limits that a scene has for each clip of the source.
    pub(super) limits: Vec<Option<Arc<Limits>>>,
    /// For each clip of the source the work that a scene has for it.
    pub(super) works: Vec<Option<Work>>,
    /// Indices of the clips that are meant.
    pub(super) chosen: Vec<usize>,
    /// Whether the user named one of several clips.
    pub(super) is_named: bool,
}

/// What a scene does to one clip.
#[derive(Debug)]
pub(super) struct Work {
    /// Its passes.
    pub(super) passes: Vec<Pass>,
    /// What they did.
    pub(super) evaluation: Evaluation,
    /// Snags that are left as they are.
    pub(super) left: Vec<SnagMark>,
    /// The limits that its proof is held against.
    pub(super) limits_held: Option<Arc<Limits>>,
}

impl Work {
    /// What each pass did, for a sheet.
    pub(super) fn passes_run(&self) -> Vec<PassFacts> {
        passes_run(&self.passes, &self.evaluation)
    }
}

impl Input {
    /// The first clip that is meant.
    pub(super) fn first(&self) -> usize {
        self.chosen.first().copied().unwrap_or(0)
    }

    /// The clip that is meant when there may be only one.
    pub(super) fn clip(&self) -> &Arc<Clip> {
        &self.results[self.first()]
    }

    /// Files that must not be written over.
    pub(super) fn files(&self) -> Vec<PathBuf> {
        vec![self.path.clone(), self.source.path.clone()]
    }
}

/// Opens what `text` names: a clip file gives one input, a scene one for each of its sources that has work.
///
/// What was odd but no error is told on stderr.
pub(super) fn open(text: &str, options: &OpenOptions, output: &mut Output) -> Result<Vec<Input>, CliError> {
    let address = ClipAddress::parse(text);
    if address.path.is_dir() {
        return Err(exchange::OpenError::Disk(disk::DiskError::Folder(address.path)).into());
    }
    let inputs = if is_scene(&address.path) {
        open_scene(&address, options, output)?
    } else {
        vec![open_clips(&address, options)?]
    };
    for input in &inputs {
        output.notes(&input.source.path, &input.source.notes);
    }
    Ok(inputs)
}

/// As [`open`], where one clip is wanted: the first that is meant.
pub(super) fn open_one(text: &str, options: &OpenOptions, output: &mut Output) -> Result<Input, CliError> {
    let mut inputs = open(text, options, output)?;
    // `open` gives at least one.
    Ok(inputs.swap_remove(0))
}

/// Opens a clip file that this program has just written; its name is taken as it is. What was written from a table of another make
/// has that one's columns still: it is read with the `options` of its source.
pub(super) fn read_back(path: &Path, options: &OpenOptions, output: &mut Output) -> Result<Input, CliError> {
    let address = ClipAddress { path: path.to_owned(), clip: None };
    let input = open_clips(&address, options)?;
    output.notes(path, &input.source.notes);
    Ok(input)
}

/// Whether a path names a scene.
pub(super) fn is_scene(path: &Path) -> bool {
    path.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("ron"))
}

fn open_clips(address: &ClipAddress, options: &OpenOptions) -> Result<Input, CliError> {
    let source = exchange::open(&address.path, options)?;
    let count = source.clips.len();
    if count == 0 {
        return Err(CliError::NoClip { path: address.path.clone() });
    }
    let chosen = match &address.clip {
        None => (0..count).collect(),
        Some(found) => {
            let index = source.find_clip(found).ok_or_else(|| {
                let labels: Vec<String> = (0..count).map(|index| source.clip_label(index)).collect();
                CliError::NoSuchClip {
                    path: address.path.clone(),
                    known: listed(&labels),
                    found: found.clone(),
                }
            })?;
            vec![index]
        }
    };
    Ok(Input {
        path: address.path.clone(),
        results: source.clips.clone(),
        limits: vec![None; count],
        works: std::iter::repeat_with(|| None).take(count).collect(),
        source,
        chosen,
        is_named: address.clip.is_some(),
    })
}

fn open_scene(
    address: &ClipAddress,
    options: &OpenOptions,
    output: &mut Output,
) -> Result<Vec<Input>, CliError> {
    let mut scene = ron::read(&address.path)?;
    let mut sources = Vec::new();
    for reference in &scene.document.sources {
        let source = exchange::open(&reference.path, &options.or_as_remembered(&reference.reading))?;
        if source.sha256() != reference.sha256 {
            output.note(&reference.path, "has changed since the scene was saved; its passes may not fit");
        }
        sources.push(source);
    }
    let library = |document: &Document| {
        Library::new(
            Arc::new(document.clone()),
            sources
                .iter()
                .map(|source| Some(Loaded { clips: source.clips.clone(), skeleton: source.skeleton() }))
                .collect(),
        )
    };
    let unfitted = library(&scene.document);
    for work in 0..scene.document.works.len() {
        let Some(original) = unfitted.source_clip(work) else { continue };
        for label in scene.fit(work, &original.skeleton, &unfitted) {
            let text = format!("joint `{label}` is no longer there; what names it is left out");
            output.note(&address.path, &text);
        }
    }
    let library = library(&scene.document);
    let mut inputs = Vec::new();
    for (index, source) in sources.into_iter().enumerate() {
        let mut results = source.clips.clone();
        let mut limits = vec![None; results.len()];
        let mut works: Vec<Option<Work>> = std::iter::repeat_with(|| None).take(results.len()).collect();
        let mut chosen = Vec::new();
        for (work, own) in scene.document.works.iter().enumerate() {
            if own.source != index {
                continue;
            }
            let Some(evaluation) = library.evaluate(work) else { continue };
            for problem in evaluation.stages.iter().filter_map(|stage| stage.problem.as_ref()) {
                output.note(&address.path, &format!("{problem}; the pass is left out"));
            }
            // Behind a pass that leads to another skeleton they would fit other joints.
            if Arc::ptr_eq(&evaluation.result.skeleton, &source.clips[own.clip].skeleton) {
                limits[own.clip].clone_from(&own.limits);
            }
            results[own.clip] = evaluation.result.clone();
            works[own.clip] = Some(Work {
                passes: own.passes.clone(),
                evaluation,
                left: own.left.clone(),
                limits_held: own.limits_held(),
            });
            let is_meant = address.clip.as_ref().is_none_or(|wanted| {
                *wanted == own.name || *wanted == source.clip_label(own.clip) || *wanted == work.to_string()
            });
            if is_meant {
                chosen.push(own.clip);
            }
        }
        if !chosen.is_empty() {
            let is_named = address.clip.is_some();
            inputs.push(Input {
                path: address.path.clone(),
                source,
                results,
                limits,
                works,
                chosen,
                is_named,
            });
        }
    }
    if inputs.is_empty() {
        let path = address.path.clone();
        return Err(match &address.clip {
            Some(found) => {
                let names: Vec<String> = scene.document.works.iter().map(|work| work.name.clone()).collect();
                CliError::NoSuchClip { path, known: listed(&names), found: found.clone() }
            }
            None => CliError::NoClip { path },
        });
    }
    Ok(inputs)
}

/// A few names, and how many more there are.
fn listed(names: &[String]) -> String {
    const MOST: usize = 12;
    let shown: Vec<String> = names.iter().take(MOST).map(|name| format!("`{name}`")).collect();
    let more = names.len().saturating_sub(MOST);
    if more == 0 { shown.join(", ") } else { format!("{} and {more} more", shown.join(", ")) }
}

/// The error for a file that the window is to open and that is not there.
pub(super) fn no_file_to_open(path: &Path) -> Option<CliError> {
    if path.exists() {
        return None;
    }
    let text = path.to_string_lossy();
    let address = ClipAddress::parse(&text);
    if address.path.exists() {
        return None;
    }
    let is_word = text.chars().all(|letter| letter.is_ascii_lowercase());
    let (expected, found, advice) = if is_word {
        (
            "a file or one of demo, snags, mend, blend, retarget, convert, sample, proof, picture",
            "neither",
            "see turnwright --help",
        )
    } else {
        ("a file that exists", "none", "check its name and folder")
    };
    Some(CliError::Argument {
        place: text.into_owned(),
        expected: expected.to_owned(),
        found: found.to_owned(),
        advice,
    })
}

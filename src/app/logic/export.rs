//! Exporting: the passes run to the end, the file written, and its proof sheet measured on the file as it is read back.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::super::jobs::{Slot, Watch};
use super::super::places::sheet_file;
use super::super::view_models::{Changes, changes};
use super::super::window::Window;
use super::answers::Answer;
use crate::exchange::{self, Guard, OpenOptions, Source, WriteError, disk};
use crate::proof::{self, Pair, sheet_html};
use crate::scene::{ClipWork, Evaluation};
use crate::snag::Progress as _;

/// What an export wrote.
#[derive(Debug)]
pub(crate) struct Exported {
    /// The file.
    pub path: PathBuf,
    /// A file beside it.
    pub beside: Option<PathBuf>,
    /// Its proof sheet.
    pub proof: Option<PathBuf>,
    /// What changed, in a sentence.
    pub summary: String,
    /// What is worth telling.
    pub notes: Vec<String>,
}

/// One clip of the file that is written, the work on it and what its passes made of it.
struct Done {
    work: ClipWork,
    evaluation: Evaluation,
}

impl Window {
    /// Writes the clips of the file on show, and beside them a proof sheet if one is wanted.
    pub(super) fn export_to(&mut self, path: PathBuf, has_proof: bool) {
        let Some((source, index)) = self.chosen_source() else { return };
        let Some(project) = &self.bench.project else { return };
        let document = Arc::clone(project.document());
        let choice = self.bench.work().map(|work| work.clip);
        let library = project.library();
        let inputs: Vec<PathBuf> = document.sources.iter().map(|source| source.path.clone()).collect();
        self.jobs.submit(Slot::Export, move |watch| {
            let mut results = source.clips.clone();
            let mut all = Changes::default();
            let mut done: Vec<Done> = Vec::new();
            let works = document.works.iter().enumerate().filter(|(_, work)| work.source == index);
            for (place, (number, work)) in works.enumerate() {
                if !watch.report(place, results.len() + 1) {
                    return None;
                }
                let Some(clip) = source.clips.get(work.clip) else { continue };
                let Some(evaluation) = library.evaluate(number) else { continue };
                all = all.and(&changes(clip, &evaluation.result));
                results[work.clip] = evaluation.result.clone();
                done.push(Done { work: work.clone(), evaluation });
            }
            let guard = Guard { inputs, force: false };
            let written = match exchange::write(&source, &results, choice, &path, &guard) {
                Ok(written) => written,
                Err(error) => return Some(Answer::Exported(Err(not_written(&error)))),
            };
            let mut notes: Vec<String> = written.notes.iter().map(ToString::to_string).collect();
            let sheet = has_proof.then(|| prove(&source, &done, choice, &written.path, &guard, watch));
            let proof = match sheet {
                Some(Ok(path)) => Some(path),
                Some(Err(why)) => {
                    notes.push(format!("There is no proof sheet: {why}"));
                    None
                }
                None => None,
            };
            Some(Answer::Exported(Ok(Box::new(Exported {
                path: written.path,
                beside: written.beside,
                proof,
                summary: all.sentence(),
                notes,
            }))))
        });
    }
}

/// Why a file was not written, in the words of the window.
pub(super) fn not_written(error: &WriteError) -> String {
    match error {
        WriteError::WouldReplaceInput { path } => format!(
            "{}: expected another file than the source, found the source itself, which is never changed; choose another name",
            path.display()
        ),
        other => other.to_string(),
    }
}

/// Reads the written file and measures it against its source.
fn prove(
    source: &Source,
    done: &[Done],
    choice: Option<usize>,
    written: &Path,
    guard: &Guard,
    watch: &Watch,
) -> Result<PathBuf, String> {
    let options = OpenOptions::default().or_as_remembered(&source.reading);
    let after = exchange::open(written, &options).map_err(|error| error.to_string())?;
    let holds_all = after.clips.len() == source.clips.len();
    let pairs = done.iter().filter_map(|Done { work, evaluation }| {
        let place = if holds_all { Some(work.clip) } else { (choice == Some(work.clip)).then_some(0) };
        Some(Pair {
            label: source.clip_label(work.clip),
            index: work.clip,
            before: source.clips.get(work.clip)?.clone(),
            after: after.clips.get(place?)?.clone(),
            kinds: work.search.kinds(),
            limits: work.limits_held(),
            passes: proof::passes_run(&work.passes, evaluation),
            meant: work.left.clone(),
        })
    });
    let sheet =
        proof::sheet([source, &after], pairs.collect(), true, watch).map_err(|error| error.to_string())?;
    let path = sheet_file(written);
    guard.check(&path).map_err(|error| not_written(&error))?;
    disk::write(&path, sheet_html(&sheet).as_bytes()).map_err(|error| error.to_string())?;
    Ok(path)
}

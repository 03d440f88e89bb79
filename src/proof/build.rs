//! The sheet of a file that was written, from that file as it was read back.

use std::sync::Arc;

use crate::clip::Clip;
use crate::exchange::Source;
use crate::limit::Limits;
use crate::scene::SnagMark;
use crate::snag::{Progress, SnagKind};

use super::compare::{Looked, compare_with};
use super::error::ProofError;
use super::passes::PassFacts;
use super::sheet::{FileFacts, Sheet};

/// One clip of a sheet: what came in, what was written, and what is known of the work between.
#[derive(Clone, Debug)]
pub struct Pair {
    /// Its name, or `#INDEX` without one.
    pub label: String,
    /// Its index in the file before.
    pub index: usize,
    /// As it came in.
    pub before: Arc<Clip>,
    /// As it was read back.
    pub after: Arc<Clip>,
    /// The kinds of snag that are looked for in both.
    pub kinds: Vec<SnagKind>,
    /// The limits of the clip before, against which both are held.
    pub limits: Option<Arc<Limits>>,
    /// What ran between the two, in order; empty where nobody knows.
    pub passes: Vec<PassFacts>,
    /// Snags that a person said are meant.
    pub meant: Vec<SnagMark>,
}

/// Measures clips of `after` against those of `before`; with pictures for a page.
///
/// # Errors
/// When two have no joint in common, a picture cannot be made, or `progress` stops the work.
pub fn sheet(
    [before, after]: [&Source; 2],
    pairs: Vec<Pair>,
    has_pictures: bool,
    progress: &dyn Progress,
) -> Result<Sheet, ProofError> {
    let clips = pairs
        .into_iter()
        .map(|pair| {
            let looked = Looked { kinds: &pair.kinds, limits: pair.limits.as_ref(), meant: &pair.meant };
            let mut clip =
                compare_with(&pair.before, &pair.after, pair.label, pair.index, &looked, progress)?;
            clip.passes = pair.passes;
            if has_pictures {
                clip.draw(&pair.before, &pair.after)?;
            }
            Ok(clip)
        })
        .collect::<Result<Vec<_>, ProofError>>()?;
    let notes = [before, after]
        .into_iter()
        .flat_map(|source| source.notes.iter().map(move |note| format!("{}: {note}", source.path.display())));
    Ok(Sheet {
        before: FileFacts::of(before),
        after: FileFacts::of(after),
        clips,
        notes: notes.collect(),
        is_computed: false,
    })
}

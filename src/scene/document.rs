//! The document: which files, which clips, which passes. Small, so that undo can keep many of them.

use std::path::PathBuf;

use crate::snag::{Snag, SnagKind};

use super::pass::{MendPass, Pass, PassId, PassStep, SnagMark};

/// A file the document was made from.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SourceRef {
    /// Where it is.
    pub path: PathBuf,
    /// SHA-256 of its bytes in hexadecimal: tells when the file is no longer the same.
    pub sha256: String,
}

/// What is done to one clip of a source.
#[derive(Clone, Debug, PartialEq)]
pub struct ClipWork {
    /// Index of the source in the document.
    pub source: usize,
    /// Index of the clip in that source.
    pub clip: usize,
    /// The clip's name, to be told when the file no longer has it.
    pub name: String,
    /// The steps, in order.
    pub passes: Vec<Pass>,
    /// Snags the user looked at and leaves as they are.
    pub left: Vec<SnagMark>,
}

/// Everything a scene file holds, and everything undo brings back.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Document {
    /// The files.
    pub sources: Vec<SourceRef>,
    /// The clips that are worked on: one for each clip of the sources.
    pub works: Vec<ClipWork>,
}

impl ClipWork {
    /// Work on a clip that nothing has been done to.
    pub fn new(source: usize, clip: usize, name: impl Into<String>) -> Self {
        Self { source, clip, name: name.into(), passes: Vec::new(), left: Vec::new() }
    }

    /// The pass that mends this kind.
    pub fn mend_pass(&self, kind: SnagKind) -> Option<&MendPass> {
        self.passes.iter().find_map(|pass| match &pass.step {
            PassStep::Mend(mend) => (mend.kind == kind).then_some(mend),
        })
    }

    /// Whether a pass mends this snag, switched on or not.
    pub fn mends(&self, mark: SnagMark) -> bool {
        self.mend_pass(mark.kind).is_some_and(|pass| pass.snags.iter().any(|snag| SnagMark::of(snag) == mark))
    }

    /// Whether the user leaves this snag as it is.
    pub fn leaves(&self, mark: SnagMark) -> bool {
        self.left.contains(&mark)
    }

    /// Adds snags to the pass of their kind. New passes stand in mending order before all later kinds.
    pub(super) fn add_mends(&mut self, snags: &[Snag]) {
        for snag in snags {
            let mark = SnagMark::of(snag);
            self.left.retain(|&left| left != mark);
            if self.mends(mark) {
                continue;
            }
            let own = self.passes.iter_mut().find_map(|pass| match &mut pass.step {
                PassStep::Mend(mend) => (mend.kind == snag.kind).then_some(mend),
            });
            if let Some(pass) = own {
                pass.snags.push(snag.clone());
                continue;
            }
            let id = PassId(self.passes.iter().map(|pass| pass.id.0 + 1).max().unwrap_or(0));
            let later = |pass: &Pass| match &pass.step {
                PassStep::Mend(mend) => mend.kind > snag.kind,
            };
            let place = self.passes.iter().position(later).unwrap_or(self.passes.len());
            let step = PassStep::Mend(MendPass::new(snag.kind, vec![snag.clone()]));
            self.passes.insert(place, Pass { id, on: true, step });
        }
    }

    /// Takes snags out of their passes; passes left empty go.
    pub(super) fn remove_mends(&mut self, marks: &[SnagMark]) {
        for pass in &mut self.passes {
            match &mut pass.step {
                PassStep::Mend(mend) => mend.snags.retain(|snag| !marks.contains(&SnagMark::of(snag))),
            }
        }
        self.passes.retain(|pass| match &pass.step {
            PassStep::Mend(mend) => !mend.snags.is_empty(),
        });
    }
}

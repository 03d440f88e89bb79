//! The document: which files, which clips, which passes. Small, so that undo can keep many of them.

use std::collections::BTreeSet;
use std::path::PathBuf;
use std::sync::Arc;

use crate::limit::Limits;
use crate::skeleton::RestChoice;
use crate::snag::{Snag, SnagKind};

use super::marker::Marker;
use super::pass::{ClipRef, MendPass, Need, Pass, PassId, PassStep, SnagMark};

/// A file the document was made from.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SourceRef {
    /// Where it is.
    pub path: PathBuf,
    /// SHA-256 of its bytes in hexadecimal: tells when the file is no longer the same.
    pub sha256: String,
    /// How it is read, where it does not say so itself.
    pub reading: Reading,
}

/// What a person said about a file that does not say it itself.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Reading {
    /// Column names of a CSV file of another make, as they are typed on the command line.
    pub columns: Option<String>,
    /// The unit of its times: `s`, `ms` or `us`.
    pub time_unit: Option<String>,
    /// A file that has the skeleton of a CSV file without one.
    pub skeleton: Option<PathBuf>,
    /// The pose that turns are measured from; by rule where nobody chose.
    pub rest: Option<RestChoice>,
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
    /// The limits its joints are held against when snags are looked for.
    pub limits: Option<Arc<Limits>>,
    /// What else is looked for.
    pub search: SearchChoice,
    /// Named moments, in the order of their times.
    pub markers: Vec<Marker>,
}

/// What is looked for beside the kinds that concern every clip.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct SearchChoice {
    /// The clip is a loop: its end has to meet its start.
    pub is_loop: bool,
    /// Planted feet must not slide.
    pub finds_slides: bool,
}

impl SearchChoice {
    /// The kinds that are looked for.
    pub fn kinds(self) -> Vec<SnagKind> {
        let more = [(self.is_loop, SnagKind::Seam), (self.finds_slides, SnagKind::Slide)];
        let more = more.into_iter().filter(|(on, _)| *on).map(|(_, kind)| kind);
        SnagKind::defaults().into_iter().chain(more).collect()
    }
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
        Self {
            source,
            clip,
            name: name.into(),
            passes: Vec::new(),
            left: Vec::new(),
            limits: None,
            search: SearchChoice::default(),
            markers: Vec::new(),
        }
    }

    /// The pass that mends this kind.
    pub fn mend_pass(&self, kind: SnagKind) -> Option<&MendPass> {
        self.passes.iter().filter_map(|pass| pass.step.as_mend()).find(|mend| mend.kind == kind)
    }

    /// The limits that a proof holds the source and the result against: those of the search, else those that its last limits pass
    /// brings it within, unless that pass is one for another skeleton's joints.
    pub fn limits_held(&self) -> Option<Arc<Limits>> {
        let on_own_skeleton = self.passes.iter().filter(|pass| pass.on).map(|pass| &pass.step);
        let on_own_skeleton = on_own_skeleton.take_while(|step| !matches!(step, PassStep::Retarget(_)));
        let of_pass = |step: &PassStep| match step {
            PassStep::Limits(pass) => Some(pass.limits.clone()),
            _ => None,
        };
        self.limits.clone().or_else(|| on_own_skeleton.filter_map(of_pass).last())
    }

    /// All snags that a pass mends, switched on or not.
    pub fn mended(&self) -> impl Iterator<Item = &Snag> {
        self.passes.iter().filter_map(|pass| pass.step.as_mend()).flat_map(|mend| &mend.snags)
    }

    /// The id that the next new pass gets.
    pub fn next_pass_id(&self) -> PassId {
        PassId(self.passes.iter().map(|pass| pass.id.0.saturating_add(1)).max().unwrap_or(0))
    }

    /// The pass of that id.
    pub fn pass(&self, id: PassId) -> Option<&Pass> {
        self.passes.iter().find(|pass| pass.id == id)
    }

    /// Whether a pass mends this snag, switched on or not.
    pub fn mends(&self, mark: SnagMark) -> bool {
        self.mend_pass(mark.kind).is_some_and(|pass| pass.snags.iter().any(|snag| SnagMark::of(snag) == mark))
    }

    /// Whether the user leaves this snag as it is.
    pub fn leaves(&self, mark: SnagMark) -> bool {
        self.left.contains(&mark)
    }

    /// Adds snags to the pass of their kind. New passes stand in mending order before all later kinds, and before all
    /// passes that are no mends, which see the clip mended.
    pub(super) fn add_mends(&mut self, snags: &[Snag]) {
        for snag in snags {
            let mark = SnagMark::of(snag);
            self.left.retain(|&left| left != mark);
            if self.mends(mark) {
                continue;
            }
            let mut passes = self.passes.iter_mut().filter_map(|pass| pass.step.as_mend_mut());
            if let Some(own) = passes.find(|mend| mend.kind == snag.kind) {
                own.snags.push(snag.clone());
                continue;
            }
            let id = self.next_pass_id();
            let later = |pass: &Pass| pass.step.as_mend().is_none_or(|mend| mend.kind > snag.kind);
            let place = self.passes.iter().position(later).unwrap_or(self.passes.len());
            let step = MendPass::new(snag.kind, vec![snag.clone()]).into();
            self.passes.insert(place, Pass { id, on: true, step });
        }
    }

    /// Takes snags out of their passes; passes left empty go.
    pub(super) fn remove_mends(&mut self, marks: &[SnagMark]) {
        for mend in self.passes.iter_mut().filter_map(|pass| pass.step.as_mend_mut()) {
            mend.snags.retain(|snag| !marks.contains(&SnagMark::of(snag)));
        }
        self.passes.retain(|pass| pass.step.as_mend().is_none_or(|mend| !mend.snags.is_empty()));
    }
}

impl Document {
    /// The work on a clip.
    pub fn work_on(&self, clip: ClipRef) -> Option<usize> {
        self.works.iter().position(|work| work.source == clip.source && work.clip == clip.clip)
    }

    /// The sources whose skeletons the passes of `work` need, and those of the works behind it.
    pub fn skeletons_behind(&self, work: usize) -> BTreeSet<usize> {
        let works = self.leans_on(work).into_iter().chain([work]).filter_map(|work| self.works.get(work));
        let passes = works.flat_map(|work| &work.passes);
        passes.filter_map(needed_skeleton).collect()
    }

    /// Gives the joints of a source other numbers wherever passes, limits and snags name them. `now` gives a joint's new number;
    /// what names one that is gone is taken out.
    pub(super) fn renumber_joints(&mut self, source: usize, now: &dyn Fn(usize) -> Option<usize>) {
        for work in &mut self.works {
            // Behind a retarget numbers are those of the target.
            let mut is_meant = work.source == source;
            if is_meant {
                work.left.retain_mut(|mark| now(mark.joint).map(|joint| mark.joint = joint).is_some());
                work.limits = work.limits.take().map(|limits| Arc::new(limits.renumbered(now)));
            }
            for pass in &mut work.passes {
                if is_meant {
                    pass.step.kind_mut().renumber(now);
                }
                if let Some(onto) = needed_skeleton(pass).filter(|_| pass.on) {
                    is_meant = onto == source;
                }
            }
        }
    }

    /// The works whose results the passes of `work` need, and what those need in turn, in rising order. A work that is
    /// among its own needs leans on itself, and so has no result that could be told.
    pub fn leans_on(&self, work: usize) -> BTreeSet<usize> {
        let mut found = BTreeSet::new();
        let mut open = vec![work];
        while let Some(next) = open.pop() {
            let passes = self.works.get(next).map_or(&[][..], |work| &work.passes);
            for need in passes.iter().flat_map(|pass| pass.step.kind().needs()) {
                if let Need::Clip(clip) = need
                    && let Some(other) = self.work_on(clip)
                    && found.insert(other)
                {
                    open.push(other);
                }
            }
        }
        found
    }
}

/// The source that a pass carries its clip to the skeleton of.
fn needed_skeleton(pass: &Pass) -> Option<usize> {
    pass.step.kind().needs().into_iter().find_map(|need| match need {
        Need::Skeleton(source) => Some(source),
        Need::Clip(_) => None,
    })
}

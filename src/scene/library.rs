//! What is open: sources and the results of their passes, so that passes of one clip may ask for another.

use std::sync::{Arc, Mutex, PoisonError};

use crate::clip::Clip;
use crate::skeleton::Skeleton;

use super::document::Document;
use super::evaluate::{Evaluation, Evaluator};
use super::pass::{ClipRef, Others, Pass};

/// A source that is open.
#[derive(Clone, Debug, Default)]
pub struct Loaded {
    /// Its clips as read.
    pub clips: Vec<Arc<Clip>>,
    /// Its skeleton, also where it has no clip.
    pub skeleton: Option<Arc<Skeleton>>,
}

impl Loaded {
    /// A source whose skeleton is that of its first clip.
    pub fn of_clips(clips: Vec<Arc<Clip>>) -> Self {
        let skeleton = clips.first().map(|clip| Arc::clone(&clip.skeleton));
        Self { clips, skeleton }
    }
}

/// A document together with its open sources.
#[derive(Clone, Debug, Default)]
pub struct Library {
    document: Arc<Document>,
    sources: Vec<Option<Loaded>>,
    evaluators: Vec<Arc<Mutex<Evaluator>>>,
}

impl Library {
    /// A document and its sources in order; `None` for one that is not open.
    pub fn new(document: Arc<Document>, sources: Vec<Option<Loaded>>) -> Self {
        let evaluators = document.works.iter().map(|_| Arc::default()).collect();
        Self { document, sources, evaluators }
    }

    /// With evaluators that are kept elsewhere, one for each of the document's works, so that what they remember outlasts
    /// this library.
    #[must_use]
    pub fn with_evaluators(self, evaluators: Vec<Arc<Mutex<Evaluator>>>) -> Self {
        Self { evaluators, ..self }
    }

    /// The document.
    pub fn document(&self) -> &Arc<Document> {
        &self.document
    }

    /// The clip of a work as read.
    pub fn source_clip(&self, work: usize) -> Option<&Arc<Clip>> {
        let work = self.document.works.get(work)?;
        self.sources.get(work.source)?.as_ref()?.clips.get(work.clip)
    }

    /// The result of a work's own passes. `None` when its source is not open.
    pub fn evaluate(&self, work: usize) -> Option<Evaluation> {
        self.evaluate_with(work, &self.document.works.get(work)?.passes)
    }

    /// The result of a work with other passes than its own: with parameters that are being dragged.
    pub fn evaluate_with(&self, work: usize, passes: &[Pass]) -> Option<Evaluation> {
        let source = self.source_clip(work)?;
        let evaluator = self.evaluators.get(work)?;
        let mut evaluator = evaluator.lock().unwrap_or_else(PoisonError::into_inner);
        Some(evaluator.evaluate(source, passes, &Asked { library: self, by: Some(work) }))
    }

    /// The skeleton that each pass of a work gets. `None` when its source is not open.
    pub fn skeletons(&self, work: usize) -> Option<Vec<Arc<Skeleton>>> {
        let mut now = Arc::clone(&self.source_clip(work)?.skeleton);
        let mut found = Vec::new();
        for pass in &self.document.works.get(work)?.passes {
            found.push(Arc::clone(&now));
            if pass.on
                && let Some(next) = pass.step.kind().skeleton_after(self)
            {
                now = next;
            }
        }
        Some(found)
    }
}

impl Others for Library {
    fn clip(&self, clip: ClipRef) -> Option<Arc<Clip>> {
        Asked { library: self, by: None }.clip(clip)
    }

    fn skeleton(&self, source: usize) -> Option<Arc<Skeleton>> {
        self.sources.get(source)?.as_ref()?.skeleton.clone()
    }
}

/// The library as the passes of one work see it.
struct Asked<'a> {
    library: &'a Library,
    /// The work whose passes are being run, and whose evaluator is therefore taken.
    by: Option<usize>,
}

impl Others for Asked<'_> {
    fn clip(&self, clip: ClipRef) -> Option<Arc<Clip>> {
        let library = self.library;
        let Some(work) = library.document.work_on(clip) else {
            return library.sources.get(clip.source)?.as_ref()?.clips.get(clip.clip).cloned();
        };
        // Asking in a circle would wait for itself.
        let behind = library.document.leans_on(work);
        if Some(work) == self.by || behind.contains(&work) || self.by.is_some_and(|by| behind.contains(&by)) {
            return None;
        }
        library.evaluate(work).map(|evaluation| evaluation.result)
    }

    fn skeleton(&self, source: usize) -> Option<Arc<Skeleton>> {
        self.library.skeleton(source)
    }
}

#[cfg(test)]
mod tests {
    use super::super::document::ClipWork;
    use super::super::pass::{PassId, ResamplePass};
    use super::*;
    use crate::clip::FrameGrid;

    fn clip(secs: f64) -> Arc<Clip> {
        Arc::new(Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new(vec![]).unwrap()),
            joints: vec![],
            grid: FrameGrid::even(25.0, secs),
            duration_secs: secs,
        })
    }

    #[test]
    fn other_clips_are_seen_as_their_own_passes_leave_them() {
        let mut document = Document { sources: vec![], works: vec![ClipWork::new(0, 1, "run")] };
        let step = ResamplePass { rate: 50.0 }.into();
        document.works[0].passes.push(Pass { id: PassId(0), on: true, step });
        let sources = vec![Some(Loaded::of_clips(vec![clip(1.0), clip(2.0)])), None];
        let library = Library::new(Arc::new(document), sources);
        let frames = |source, clip| library.clip(ClipRef { source, clip }).map(|clip| clip.grid.count());
        assert_eq!([frames(0, 0), frames(0, 1), frames(0, 2)], [Some(26), Some(101), None]);
        assert_eq!([frames(1, 0), frames(2, 0)], [None, None]);
        assert!(library.skeleton(0).is_some() && library.skeleton(1).is_none());
        let [once, again] = [0, 0].map(|work| library.evaluate(work).unwrap().result);
        assert!(Arc::ptr_eq(&once, &again), "what has not changed is not run again");
        // Whoever runs the passes of a clip gets nothing of that clip itself.
        assert!(Asked { library: &library, by: Some(0) }.clip(ClipRef { source: 0, clip: 1 }).is_none());
    }
}

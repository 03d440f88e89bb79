//! Undo and redo: documents kept whole, since they are small and share what is large.

use std::sync::Arc;

use super::document::Document;
use super::edit::{Edit, EditError};

/// Tells apart every document that ever was current; never used twice.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Revision(pub u64);

/// One step of the history.
#[derive(Clone, Debug)]
pub struct Step {
    /// What made it.
    pub label: String,
    /// Which it is.
    pub revision: Revision,
    /// The document as it then was.
    pub document: Arc<Document>,
}

/// The most steps that are kept; older ones go.
const MOST_STEPS: usize = 1000;

/// The documents there were, and which is current.
#[derive(Clone, Debug)]
pub struct History {
    steps: Vec<Step>,
    current: usize,
    saved: Option<Revision>,
    next: u64,
    /// The stroke that made the current step, while it may still go on.
    stroke: Option<u64>,
}

impl History {
    /// Begins with a document that counts as saved.
    pub fn new(document: Document) -> Self {
        let revision = Revision(0);
        let step = Step { label: "Open".to_owned(), revision, document: Arc::new(document) };
        Self { steps: vec![step], current: 0, saved: Some(revision), next: 1, stroke: None }
    }

    /// The current document.
    pub fn document(&self) -> &Arc<Document> {
        &self.steps[self.current].document
    }

    /// The current revision.
    pub fn revision(&self) -> Revision {
        self.steps[self.current].revision
    }

    /// All steps, oldest first, and the index of the current one.
    pub fn steps(&self) -> (&[Step], usize) {
        (&self.steps, self.current)
    }

    /// Applies an edit. What had been undone is gone; an edit that changes nothing makes no step.
    ///
    /// # Errors
    /// When the edit does not fit; nothing changes then.
    pub fn commit(&mut self, edit: &Edit) -> Result<(), EditError> {
        self.stroke = None;
        let document = edit.apply(self.document())?;
        let label = edit.label_in(self.document());
        if document == **self.document() {
            return Ok(());
        }
        self.steps.truncate(self.current + 1);
        let revision = self.new_revision();
        self.steps.push(Step { label, revision, document: Arc::new(document) });
        if self.steps.len() > MOST_STEPS {
            self.steps.remove(0);
        }
        self.current = self.steps.len() - 1;
        Ok(())
    }

    /// As [`History::commit`], for one of many edits of one stroke (an arrow key held down, a wheel turned): as long as
    /// nothing else is committed, undone or saved between, they are one step. `stroke` tells strokes apart.
    ///
    /// # Errors
    /// As [`History::commit`].
    pub fn commit_stroke(&mut self, edit: &Edit, stroke: u64) -> Result<(), EditError> {
        if self.stroke != Some(stroke) || self.current + 1 != self.steps.len() {
            let before = self.revision();
            self.commit(edit)?;
            self.stroke = (before != self.revision()).then_some(stroke);
            return Ok(());
        }
        let document = Arc::new(edit.apply(self.document())?);
        let revision = self.new_revision();
        let label = edit.label_in(self.document());
        self.steps[self.current] = Step { label, revision, document };
        Ok(())
    }

    fn new_revision(&mut self) -> Revision {
        self.next += 1;
        Revision(self.next - 1)
    }

    /// What undo would take back.
    pub fn undo_label(&self) -> Option<&str> {
        (self.current > 0).then(|| self.steps[self.current].label.as_str())
    }

    /// What redo would bring back.
    pub fn redo_label(&self) -> Option<&str> {
        self.steps.get(self.current + 1).map(|step| step.label.as_str())
    }

    /// One step back; gives whether there was one.
    pub fn undo(&mut self) -> bool {
        let can = self.current > 0;
        self.stroke = None;
        self.current -= usize::from(can);
        can
    }

    /// One step forward; gives whether there was one.
    pub fn redo(&mut self) -> bool {
        let can = self.current + 1 < self.steps.len();
        self.stroke = None;
        self.current += usize::from(can);
        can
    }

    /// Whether the current document differs from the one last saved.
    pub fn is_unsaved(&self) -> bool {
        self.saved != Some(self.revision())
    }

    /// The current document has just been saved.
    pub fn mark_saved(&mut self) {
        self.saved = Some(self.revision());
        self.stroke = None;
    }
}

#[cfg(test)]
mod tests {
    use super::super::document::{ClipWork, Document};
    use super::super::pass::{MendPass, PassId};
    use super::*;
    use crate::snag::SnagKind;

    #[test]
    fn steps_call_passes_by_their_titles() {
        let mut history =
            History::new(Document { sources: vec![], works: vec![ClipWork::new(0, 0, "walk")] });
        for kind in [SnagKind::Spike, SnagKind::Jitter] {
            let step = MendPass::new(kind, vec![]).into();
            history.commit(&Edit::AddPass { work: 0, step, at: 9 }).unwrap();
        }
        for (edit, label) in [
            (Edit::SwitchPass { work: 0, pass: PassId(1), on: false }, "Switch off: Mend jitter (0 snags)"),
            (Edit::SwitchPass { work: 0, pass: PassId(1), on: true }, "Switch on: Mend jitter (0 snags)"),
            (Edit::MovePass { work: 0, pass: PassId(1), to: 0 }, "Move up: Mend jitter (0 snags)"),
            (Edit::MovePass { work: 0, pass: PassId(1), to: 1 }, "Move down: Mend jitter (0 snags)"),
            (
                Edit::SetAmount { work: 0, pass: PassId(0), amount: 0.5 },
                "Set amount to 50 %: Mend spike (0 snags)",
            ),
            (Edit::RemovePass { work: 0, pass: PassId(0) }, "Remove: Mend spike (0 snags)"),
        ] {
            history.commit(&edit).unwrap();
            assert_eq!(history.undo_label(), Some(label));
        }
    }

    #[test]
    fn a_stroke_is_one_step_until_something_else_happens() {
        let work = ClipWork::new(0, 0, "walk");
        let mut history = History::new(Document { sources: vec![], works: vec![work] });
        let step = MendPass::new(SnagKind::Spike, vec![]).into();
        history.commit(&Edit::AddPass { work: 0, step, at: 9 }).unwrap();
        let set = |amount| Edit::SetAmount { work: 0, pass: PassId(0), amount };
        let amount = |history: &History| history.document().works[0].passes[0].step.kind().amount();
        for (amount, stroke) in [(0.9, 1), (0.8, 1), (0.7, 1), (0.6, 2), (0.5, 2)] {
            history.commit_stroke(&set(amount), stroke).unwrap();
        }
        assert_eq!(history.steps().0.len(), 4);
        history.undo();
        assert_eq!(amount(&history), Some(0.7));
        history.redo();
        assert_eq!(amount(&history), Some(0.5));
        // A stroke that was left by an undo does not go on.
        history.commit_stroke(&set(0.4), 2).unwrap();
        assert_eq!(history.steps().0.len(), 5);
        assert!(history.commit(&set(1.5)).is_err());
    }
}

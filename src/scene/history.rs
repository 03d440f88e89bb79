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
}

impl History {
    /// Begins with a document that counts as saved.
    pub fn new(document: Document) -> Self {
        let revision = Revision(0);
        let step = Step { label: "Open".to_owned(), revision, document: Arc::new(document) };
        Self { steps: vec![step], current: 0, saved: Some(revision), next: 1 }
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
        let document = edit.apply(self.document())?;
        if document == **self.document() {
            return Ok(());
        }
        self.steps.truncate(self.current + 1);
        let revision = Revision(self.next);
        self.next += 1;
        self.steps.push(Step { label: edit.label(), revision, document: Arc::new(document) });
        if self.steps.len() > MOST_STEPS {
            self.steps.remove(0);
        }
        self.current = self.steps.len() - 1;
        Ok(())
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
        self.current -= usize::from(can);
        can
    }

    /// One step forward; gives whether there was one.
    pub fn redo(&mut self) -> bool {
        let can = self.current + 1 < self.steps.len();
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
    }
}

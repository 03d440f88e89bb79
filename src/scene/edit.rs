//! Edits: the only door to a changed document. Plain data, applied purely.

use std::sync::Arc;

use crate::limit::Limits;
use crate::skeleton::RestChoice;
use crate::snag::Snag;

use super::document::{ClipWork, Document, SearchChoice, SourceRef};
use super::marker::MarkerChange;
use super::pass::{Pass, PassId, PassStep, Scope, SnagMark};

/// One change of a document. `work` is the index of a clip's work.
#[derive(Clone, Debug, PartialEq)]
pub enum Edit {
    /// Mend these snags.
    Mend {
        /// Of which clip.
        work: usize,
        /// Which.
        snags: Vec<Snag>,
    },
    /// Mend these no longer.
    Unmend {
        /// Of which clip.
        work: usize,
        /// Which.
        marks: Vec<SnagMark>,
    },
    /// Leave these as they are: they are meant, or not worth it.
    Leave {
        /// Of which clip.
        work: usize,
        /// Which.
        marks: Vec<SnagMark>,
    },
    /// Leave these no longer.
    Reconsider {
        /// Of which clip.
        work: usize,
        /// Which.
        marks: Vec<SnagMark>,
    },
    /// Switch a pass on or off.
    SwitchPass {
        /// Of which clip.
        work: usize,
        /// Which.
        pass: PassId,
        /// On or off.
        on: bool,
    },
    /// Put a new pass into the list. Its id is the work's [`ClipWork::next_pass_id`] of before.
    AddPass {
        /// Of which clip.
        work: usize,
        /// What it does.
        step: PassStep,
        /// Its index; the end when larger.
        at: usize,
    },
    /// Give a pass other parameters. While they are dragged the window shows a preview and commits this on letting go;
    /// whatever can't know the end of a stroke commits with [`History::commit_stroke`](super::History::commit_stroke).
    ChangePass {
        /// Of which clip.
        work: usize,
        /// Which.
        pass: PassId,
        /// What it does from now on.
        step: PassStep,
    },
    /// Let a pass act elsewhere.
    SetScope {
        /// Of which clip.
        work: usize,
        /// Which.
        pass: PassId,
        /// Where.
        scope: Scope,
    },
    /// Take so much of a pass's change, 0 to 1.
    SetAmount {
        /// Of which clip.
        work: usize,
        /// Which.
        pass: PassId,
        /// How much.
        amount: f64,
    },
    /// Put a pass at another place in the list.
    MovePass {
        /// Of which clip.
        work: usize,
        /// Which.
        pass: PassId,
        /// Its new index; the end when larger.
        to: usize,
    },
    /// Take a pass out of the list.
    RemovePass {
        /// Of which clip.
        work: usize,
        /// Which.
        pass: PassId,
    },
    /// Hold the joints against these limits when snags are looked for, or against none.
    SetLimits {
        /// Of which clip.
        work: usize,
        /// Which.
        limits: Option<Arc<Limits>>,
    },
    /// What is looked for beside the kinds that concern every clip.
    SetSearch {
        /// Of which clip.
        work: usize,
        /// What.
        search: SearchChoice,
    },
    /// Add, rename, move or remove a marker.
    ChangeMarkers {
        /// Of which clip.
        work: usize,
        /// How.
        change: MarkerChange,
    },
    /// The source is to be found elsewhere, or has changed and is accepted.
    Relocate {
        /// Which source.
        source: usize,
        /// Where it is now.
        to: SourceRef,
        /// The numbers that its joints have from now on, by those so far; `None` for one that is gone. Empty where all keep theirs.
        joints: Vec<Option<usize>>,
    },
    /// Another file, and work on each of its clips, after those that are there.
    AddSource {
        /// The file.
        source: SourceRef,
        /// The names of its clips.
        clips: Vec<String>,
    },
    /// Measure turns from another rest pose.
    ChooseRest {
        /// Of which source.
        source: usize,
        /// Which; `None` for the one the rule gives.
        rest: Option<RestChoice>,
    },
    /// Several edits that are one step for a person, in this order.
    Together {
        /// What the history calls it.
        label: String,
        /// The edits; each is applied to what the one before it left.
        edits: Vec<Self>,
    },
}

/// An edit that does not fit the document.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum EditError {
    /// No such clip.
    #[error("expected one of {count} clips, found number {work}")]
    NoSuchWork {
        /// What was asked for.
        work: usize,
        /// How many there are.
        count: usize,
    },
    /// No such pass.
    #[error("expected one of {count} passes, found id {id}", id = pass.0)]
    NoSuchPass {
        /// What was asked for.
        pass: PassId,
        /// How many there are.
        count: usize,
    },
    /// No such source.
    #[error("expected one of {count} sources, found number {source_index}")]
    NoSuchSource {
        /// What was asked for.
        source_index: usize,
        /// How many there are.
        count: usize,
    },
    /// A pass that is taken whole or not at all.
    #[error("expected a pass that can be taken in part, found {title}")]
    NoAmount {
        /// The pass.
        title: String,
    },
    /// A pass that acts where it acts.
    #[error("expected a pass that can act on a part of the clip, found {title}")]
    NoScope {
        /// The pass.
        title: String,
    },
    /// The clip would need its own result.
    #[error("expected passes that need other clips only, found one that needs `{name}` itself in the end")]
    Circle {
        /// The clip.
        name: String,
    },
    /// No such marker, or one at no time.
    #[error("expected one of {count} markers at a time in seconds, found another")]
    NoSuchMarker {
        /// How many there are.
        count: usize,
    },
    /// An amount outside its range.
    #[error("expected an amount from 0 to 1, found {0}")]
    Amount(f64),
}

impl Edit {
    /// What the history calls it, when it is applied to `before`: as [`Edit::label`], and a pass that it only has the number of is
    /// called by its title.
    pub fn label_in(&self, before: &Document) -> String {
        let titled = |work: usize, pass: PassId| {
            let passes = &before.works.get(work)?.passes;
            let place = place_of(passes, pass).ok()?;
            Some((place, passes[place].step.title()))
        };
        let words = match self {
            Self::SwitchPass { work, pass, on } => titled(*work, *pass)
                .map(|(_, title)| format!("Switch {}: {title}", if *on { "on" } else { "off" })),
            Self::MovePass { work, pass, to } => titled(*work, *pass)
                .map(|(place, title)| format!("Move {}: {title}", if *to < place { "up" } else { "down" })),
            Self::RemovePass { work, pass } => {
                titled(*work, *pass).map(|(_, title)| format!("Remove: {title}"))
            }
            Self::SetScope { work, pass, .. } => {
                titled(*work, *pass).map(|(_, title)| format!("Set where it acts: {title}"))
            }
            Self::SetAmount { work, pass, amount } => titled(*work, *pass)
                .map(|(_, title)| format!("Set amount to {:.0} %: {title}", amount * 100.0)),
            _ => None,
        };
        words.unwrap_or_else(|| self.label())
    }

    /// What it does, for people, whatever document it is applied to.
    pub fn label(&self) -> String {
        let counted =
            |verb: &str, count: usize| format!("{verb} {count} snag{}", if count == 1 { "" } else { "s" });
        match self {
            Self::Mend { snags, .. } => match snags.as_slice() {
                [only] => format!("Mend {} at frame {}", only.kind, only.first_frame),
                several => counted("Mend", several.len()),
            },
            Self::Unmend { marks, .. } => counted("Take back", marks.len()),
            Self::Leave { marks, .. } => counted("Leave", marks.len()),
            Self::Reconsider { marks, .. } => counted("Reconsider", marks.len()),
            Self::SwitchPass { on: true, .. } => "Switch on a pass".to_owned(),
            Self::SwitchPass { on: false, .. } => "Switch off a pass".to_owned(),
            Self::AddPass { step, .. } => format!("Add pass: {}", step.title()),
            Self::ChangePass { step, .. } => format!("Change pass: {}", step.title()),
            Self::SetScope { .. } => "Set where a pass acts".to_owned(),
            Self::SetAmount { amount, .. } => format!("Set amount to {:.0} %", amount * 100.0),
            Self::MovePass { .. } => "Move a pass".to_owned(),
            Self::RemovePass { .. } => "Remove a pass".to_owned(),
            Self::SetLimits { limits: Some(limits), .. } => format!("Set limits: {}", limits.title),
            Self::SetLimits { limits: None, .. } => "Set no limits".to_owned(),
            Self::SetSearch { search, .. } => match (search.is_loop, search.finds_slides) {
                (false, false) => "Look for the usual snags".to_owned(),
                (true, false) => "Look for the loop's seam too".to_owned(),
                (false, true) => "Look for sliding feet too".to_owned(),
                (true, true) => "Look for seam and sliding feet too".to_owned(),
            },
            Self::ChangeMarkers { change, .. } => change.label(),
            Self::Relocate { .. } => "Relocate source".to_owned(),
            Self::AddSource { source, .. } => {
                let name = source.path.file_name().unwrap_or_default().to_string_lossy().into_owned();
                format!("Add file: {name}")
            }
            Self::ChooseRest { rest: Some(rest), .. } => format!("Rest pose: {}", rest.title()),
            Self::ChooseRest { rest: None, .. } => "Rest pose by rule".to_owned(),
            Self::Together { label, .. } => label.clone(),
        }
    }

    /// The document after this edit.
    ///
    /// # Errors
    /// When the edit names a clip, pass or source that is not there, an amount outside its range, or a clip's own result among what it
    /// needs.
    pub fn apply(&self, document: &Document) -> Result<Document, EditError> {
        let mut next = document.clone();
        match self {
            Self::Mend { work, snags } => work_at(&mut next, *work)?.add_mends(snags),
            Self::Unmend { work, marks } => work_at(&mut next, *work)?.remove_mends(marks),
            Self::Leave { work, marks } => {
                let work = work_at(&mut next, *work)?;
                work.remove_mends(marks);
                let new: Vec<_> = marks.iter().copied().filter(|&mark| !work.leaves(mark)).collect();
                work.left.extend(new);
            }
            Self::Reconsider { work, marks } => {
                work_at(&mut next, *work)?.left.retain(|mark| !marks.contains(mark));
            }
            Self::SwitchPass { work, pass, on } => {
                let passes = &mut work_at(&mut next, *work)?.passes;
                let place = place_of(passes, *pass)?;
                passes[place].on = *on;
            }
            Self::AddPass { work, step, at } => {
                let own = work_at(&mut next, *work)?;
                let place = (*at).min(own.passes.len());
                let id = own.next_pass_id();
                own.passes.insert(place, Pass { id, on: true, step: step.clone() });
                check_circle(&next, *work)?;
            }
            Self::ChangePass { work, pass, step } => {
                let passes = &mut work_at(&mut next, *work)?.passes;
                let place = place_of(passes, *pass)?;
                passes[place].step = step.clone();
                check_circle(&next, *work)?;
            }
            Self::SetScope { work, pass, scope } => {
                let passes = &mut work_at(&mut next, *work)?.passes;
                let place = place_of(passes, *pass)?;
                let title = passes[place].step.title();
                let own = passes[place].step.kind_mut().scope_mut();
                *own.ok_or(EditError::NoScope { title })? = scope.clone();
            }
            Self::SetAmount { work, pass, amount } => {
                if !(0.0..=1.0).contains(amount) {
                    return Err(EditError::Amount(*amount));
                }
                let passes = &mut work_at(&mut next, *work)?.passes;
                let place = place_of(passes, *pass)?;
                let step = &mut passes[place].step;
                if step.kind().amount().is_none() {
                    return Err(EditError::NoAmount { title: step.title() });
                }
                step.kind_mut().set_amount(*amount);
            }
            Self::MovePass { work, pass, to } => {
                let passes = &mut work_at(&mut next, *work)?.passes;
                let moved = passes.remove(place_of(passes, *pass)?);
                passes.insert((*to).min(passes.len()), moved);
            }
            Self::RemovePass { work, pass } => {
                let passes = &mut work_at(&mut next, *work)?.passes;
                passes.remove(place_of(passes, *pass)?);
            }
            Self::SetLimits { work, limits } => work_at(&mut next, *work)?.limits.clone_from(limits),
            Self::SetSearch { work, search } => work_at(&mut next, *work)?.search = *search,
            Self::ChangeMarkers { work, change } => {
                let own = work_at(&mut next, *work)?;
                let count = own.markers.len();
                own.markers = change.applied(&own.markers).ok_or(EditError::NoSuchMarker { count })?;
            }
            Self::AddSource { source, clips } => {
                let index = next.sources.len();
                next.sources.push(source.clone());
                let works = clips.iter().enumerate();
                next.works.extend(works.map(|(clip, name)| ClipWork::new(index, clip, name.as_str())));
            }
            Self::ChooseRest { source, rest } => {
                let count = next.sources.len();
                let error = EditError::NoSuchSource { source_index: *source, count };
                next.sources.get_mut(*source).ok_or(error)?.reading.rest = *rest;
            }
            Self::Relocate { source, to, joints } => {
                let count = next.sources.len();
                let error = EditError::NoSuchSource { source_index: *source, count };
                *next.sources.get_mut(*source).ok_or(error)? = to.clone();
                if !joints.is_empty() {
                    next.renumber_joints(*source, &|joint| joints.get(joint).copied().flatten());
                }
            }
            Self::Together { edits, .. } => {
                for edit in edits {
                    next = edit.apply(&next)?;
                }
            }
        }
        Ok(next)
    }
}

fn check_circle(document: &Document, work: usize) -> Result<(), EditError> {
    if document.leans_on(work).contains(&work) {
        let name = document.works[work].name.clone();
        return Err(EditError::Circle { name });
    }
    Ok(())
}

fn work_at(document: &mut Document, work: usize) -> Result<&mut ClipWork, EditError> {
    let count = document.works.len();
    document.works.get_mut(work).ok_or(EditError::NoSuchWork { work, count })
}

fn place_of(passes: &[Pass], pass: PassId) -> Result<usize, EditError> {
    let error = EditError::NoSuchPass { pass, count: passes.len() };
    passes.iter().position(|own| own.id == pass).ok_or(error)
}

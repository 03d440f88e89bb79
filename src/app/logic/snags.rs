//! Snags: going from one to the next, and deciding about them.

use super::super::jobs::Slot;
use super::super::panels::Message;
use super::super::view_models::TimeWindow;
use super::super::window::Window;
use crate::scene::{Edit, SnagMark};
use crate::snag::Snag;

impl Window {
    /// Chooses a snag and its joint, moves the playhead to it and brings it to the middle of the charts.
    pub(super) fn go_to_snag(&mut self, index: usize) {
        let Some(snag) = self.bench.snags().get(index).cloned() else { return };
        let Some(clip) = self.bench.source() else { return };
        let window = TimeWindow::around(snag.first_secs, snag.last_secs, clip.duration_secs, clip.grid.rate);
        let joint = self.bench.shown_joint(snag.joint);
        let session = &mut self.bench.session;
        session.snag = Some(SnagMark::of(&snag));
        session.joint = joint;
        session.window = window;
        session.show_curves_of_snag(snag.kind);
        session.playback.is_playing = false;
        self.pictures.scroll_to_joint = joint;
        self.pictures.scroll_to_snag = true;
        self.scrub(snag.first_secs);
    }

    /// The next or the previous of those that the table lists, in its order.
    pub(super) fn step_snag(&mut self, forward: bool) {
        let rows = self.bench.snag_rows();
        let mark = self.bench.session.snag;
        let snags = self.bench.snags();
        let place = rows.iter().position(|row| Some(SnagMark::of(&snags[row.index])) == mark);
        let next = match place {
            None if forward => 0,
            None => rows.len().saturating_sub(1),
            Some(place) if forward => (place + 1) % rows.len(),
            Some(place) => (place + rows.len() - 1) % rows.len(),
        };
        if let Some(index) = rows.get(next).map(|row| row.index) {
            self.go_to_snag(index);
        }
    }

    fn mend(&mut self, snags: Vec<Snag>) {
        if !snags.is_empty() {
            let work = self.bench.session.work;
            self.edit(&Edit::Mend { work, snags });
        }
    }

    pub(super) fn mend_chosen(&mut self) {
        let snags = self.bench.chosen_snag().cloned().into_iter().collect();
        self.mend(snags);
    }

    pub(super) fn mend_kind(&mut self) {
        let Some(kind) = self.bench.chosen_snag().map(|snag| snag.kind) else { return };
        let snags = self.bench.open_snags(|snag| snag.kind == kind);
        if snags.is_empty() {
            self.tell(Message::note(format!("No {kind} is open any more")));
        }
        self.mend(snags);
    }

    pub(super) fn mend_safe(&mut self) {
        let snags = self.bench.safe_open_snags();
        self.mend(snags);
    }

    pub(super) fn take_back(&mut self) {
        let Some(mark) = self.bench.chosen_snag().map(SnagMark::of) else { return };
        let work = self.bench.session.work;
        self.edit(&Edit::Unmend { work, marks: vec![mark] });
    }

    pub(super) fn leave_or_reconsider(&mut self) {
        let Some(mark) = self.bench.chosen_snag().map(SnagMark::of) else { return };
        let is_left = self.bench.work().is_some_and(|work| work.leaves(mark));
        let work = self.bench.session.work;
        let marks = vec![mark];
        self.edit(&if is_left { Edit::Reconsider { work, marks } } else { Edit::Leave { work, marks } });
    }

    pub(super) fn find_again(&mut self) {
        let work = self.bench.session.work;
        self.jobs.cancel(Slot::Survey);
        self.asked.survey = None;
        if let Some(findings) = self.bench.project.as_mut().and_then(|project| project.findings.get_mut(work))
        {
            findings.snags = None;
            findings.searched = None;
            findings.search_is_stopped = false;
        }
    }

    /// Stops a job by hand.
    pub(super) fn stop(&mut self, slot: Slot) {
        self.jobs.cancel(slot);
        let work = self.bench.session.work;
        let searched = self.bench.work().map(super::super::bench::Searched::of);
        if slot == Slot::Survey
            && let Some(findings) =
                self.bench.project.as_mut().and_then(|project| project.findings.get_mut(work))
        {
            findings.search_is_stopped = true;
            findings.searched = searched;
        }
        self.tell(Message::note(format!("{}: stopped", slot.label())));
    }
}

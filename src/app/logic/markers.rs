//! Named moments: added at the playhead, renamed, removed, jumped to.

use super::super::panels::{Dialog, Form};
use super::super::window::Window;
use crate::scene::{Edit, Marker, MarkerChange};

impl Window {
    fn change_markers(&mut self, change: MarkerChange) {
        let work = self.bench.session.work;
        self.edit(&Edit::ChangeMarkers { work, change });
    }

    pub(super) fn add_marker(&mut self) {
        let Some(work) = self.bench.work() else { return };
        let secs = self.bench.session.playback.playhead_secs;
        // The smallest number that no marker bears yet.
        let name = (1..=work.markers.len() + 1)
            .map(|number| format!("Marker {number}"))
            .find(|name| work.markers.iter().all(|marker| marker.name != *name))
            .unwrap_or_default();
        self.change_markers(MarkerChange::Add(Marker { secs, name }));
    }

    /// The marker at the playhead, else the last before it, else the first.
    fn marker_here(&self) -> Option<usize> {
        let (work, clip) = (self.bench.work()?, self.bench.result()?);
        let now = self.bench.session.playback.playhead_secs + 0.5 / clip.grid.rate.max(1e-6);
        let before = work.markers.iter().rposition(|marker| marker.secs <= now);
        before.or((!work.markers.is_empty()).then_some(0))
    }

    pub(super) fn ask_marker_name(&mut self, at: usize) {
        let name = self.bench.work().and_then(|work| work.markers.get(at)).map(|marker| marker.name.clone());
        let Some(name) = name else { return };
        self.form = Form::with_path(name);
        self.dialog = Some(Dialog::MarkerName(at));
    }

    pub(super) fn ask_marker_name_here(&mut self) {
        if let Some(at) = self.marker_here() {
            self.ask_marker_name(at);
        }
    }

    pub(super) fn name_marker(&mut self, at: usize, name: &str) {
        let name = name.trim().to_owned();
        if !name.is_empty() {
            self.change_markers(MarkerChange::Rename { at, name });
        }
        self.dialog = None;
    }

    pub(super) fn remove_marker_here(&mut self) {
        if let Some(at) = self.marker_here() {
            self.change_markers(MarkerChange::Remove { at });
        }
    }

    pub(super) fn step_marker(&mut self, forward: bool) {
        let (Some(work), Some(clip)) = (self.bench.work(), self.bench.result()) else { return };
        let now = self.bench.session.playback.playhead_secs;
        let near = 0.5 / clip.grid.rate.max(1e-6);
        let mut times = work.markers.iter().map(|marker| marker.secs);
        let found = if forward {
            times.find(|&secs| secs > now + near)
        } else {
            times.take_while(|&secs| secs < now - near).last()
        };
        if let Some(secs) = found {
            self.bench.session.playback.is_playing = false;
            self.scrub(secs);
        }
    }
}

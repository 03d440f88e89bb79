//! Time: playing, scrubbing, stepping, loops, and which stretch is on screen.

use super::super::commands::Action;
use super::super::session::SPEEDS;
use super::super::view_models::TimeWindow;
use super::super::window::Window;

impl Window {
    /// Moves the playhead onto the frame nearest to a time.
    pub(in super::super) fn scrub(&mut self, secs: f64) {
        let Some(clip) = self.bench.result() else { return };
        let secs = clip.grid.time(clip.grid.frame(secs));
        let duration = clip.duration_secs;
        let session = &mut self.bench.session;
        session.playback.playhead_secs = secs.clamp(0.0, duration.max(0.0));
        session.window = session.window.showing(session.playback.playhead_secs, duration);
    }

    /// Keeps the playhead and the stretch of time on screen inside the result, which undo or a pass may have made shorter: what no clip
    /// has must not be drawn.
    pub(in super::super) fn stay_in_time(&mut self) {
        let Some(duration) = self.bench.result().map(|clip| clip.duration_secs) else { return };
        let session = &mut self.bench.session;
        session.window = session.window.within(duration);
        session.playback.playhead_secs = session.playback.playhead_secs.clamp(0.0, duration.max(0.0));
    }

    pub(super) fn play_or_pause(&mut self) {
        let Some(duration) = self.bench.result().map(|clip| clip.duration_secs) else { return };
        let playback = &mut self.bench.session.playback;
        playback.is_playing ^= true;
        let (start, end) = playback.bounds(duration);
        if playback.is_playing && !(start..end).contains(&playback.playhead_secs) {
            playback.playhead_secs = start;
        }
    }

    pub(super) fn step_frame(&mut self, forward: bool) {
        let Some(clip) = self.bench.result() else { return };
        let frame = clip.grid.frame(self.bench.session.playback.playhead_secs);
        let last = clip.grid.count().saturating_sub(1);
        let next = if forward { (frame + 1).min(last) } else { frame.saturating_sub(1) };
        let secs = clip.grid.time(next);
        self.bench.session.playback.is_playing = false;
        self.scrub(secs);
    }

    pub(super) fn step_key(&mut self, forward: bool) {
        let (Some(clip), Some(joint)) = (self.bench.result(), self.bench.session.joint) else { return };
        let Some(track) = clip.rotation(joint) else { return };
        let now = self.bench.session.playback.playhead_secs;
        // Keys need not lie on frames, while the playhead does: half a frame counts as being there.
        let near = 0.5 / clip.grid.rate.max(1e-6);
        let found = if forward {
            track.times.iter().find(|&time| time > now + near)
        } else {
            track.times.iter().take_while(|&time| time < now - near).last()
        };
        if let Some(secs) = found {
            self.bench.session.playback.is_playing = false;
            self.scrub(secs);
        }
    }

    pub(super) fn go_to_end(&mut self, last: bool) {
        let Some(duration) = self.bench.result().map(|clip| clip.duration_secs) else { return };
        self.scrub(if last { duration } else { 0.0 });
    }

    pub(super) fn set_loop_range(&mut self, range: Option<(f64, f64)>) {
        let Some(clip) = self.bench.result() else { return };
        let on_frame = |secs: f64| clip.grid.time(clip.grid.frame(secs));
        let range = range.map(|(from, to)| (on_frame(from.min(to)), on_frame(from.max(to))));
        let playback = &mut self.bench.session.playback;
        playback.range = range.filter(|(from, to)| to > from);
        playback.only_choice = false;
    }

    pub(super) fn loop_here(&mut self, is_end: bool) {
        let Some(duration) = self.bench.result().map(|clip| clip.duration_secs) else { return };
        let playback = &self.bench.session.playback;
        let (from, to) = playback.range.unwrap_or((0.0, duration));
        let now = playback.playhead_secs;
        let range = if is_end {
            (if now > from { from } else { 0.0 }, now)
        } else {
            (now, if now < to { to } else { duration })
        };
        self.bench.session.playback.is_looping = true;
        self.set_loop_range(Some(range));
    }

    pub(super) fn step_speed(&mut self, faster: bool) {
        let speed = &mut self.bench.session.playback.speed;
        let next = if faster {
            SPEEDS.into_iter().find(|&step| step > *speed + 1e-9)
        } else {
            SPEEDS.into_iter().rev().find(|&step| step < *speed - 1e-9)
        };
        *speed = next.unwrap_or(*speed);
    }

    pub(super) fn zoom_time(&mut self, action: Action) {
        let Some(clip) = self.bench.result() else { return };
        let (duration, rate) = (clip.duration_secs, clip.grid.rate);
        let session = &mut self.bench.session;
        let now = session.playback.playhead_secs;
        let at = if session.window.contains(now) { now } else { session.window.time(0.5) };
        session.window = match action {
            Action::NearerTime => session.window.zoom(0.5, at, duration, rate),
            Action::FartherTime => session.window.zoom(2.0, at, duration, rate),
            _ => TimeWindow::whole(duration),
        };
    }
}

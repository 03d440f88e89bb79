//! What is chosen to work on: joints and a stretch of time.

use std::collections::BTreeSet;

use super::super::commands::TimeCommand;
use super::super::panels::Message;
use super::super::view_models::{TimeChoice, TimeWindow, limb_starts};
use super::super::window::Window;
use super::limits::LimitsFrom;

impl Window {
    /// Does what a panel over time asked for.
    pub(super) fn run_time(&mut self, command: TimeCommand) {
        match command {
            TimeCommand::Choose(choice) => self.choose(choice),
            TimeCommand::ReadLimits(path) => self.work_out_limits(LimitsFrom::File(path)),
            TimeCommand::AddPass(offer) => self.add_pass(offer),
            TimeCommand::OpenPass(pass) => self.open_pass(pass),
            TimeCommand::NameMarker(at, name) => self.name_marker(at, &name),
            TimeCommand::AskMarkerName(at) => self.ask_marker_name(at),
        }
    }

    /// Chooses joints and a stretch of time; the ends go onto frames, and a stretch without length is none.
    pub(super) fn choose(&mut self, choice: TimeChoice) {
        let Some(clip) = self.bench.result() else { return };
        let on_frame = |secs: f64| clip.grid.time(clip.grid.frame(secs));
        let span_secs = choice.span_secs.map(|[from, to]| [on_frame(from.min(to)), on_frame(from.max(to))]);
        let span_secs = span_secs.filter(|[from, to]| to > from);
        let count = clip.skeleton.len();
        let joints = choice.joints.map(|joints| joints.into_iter().filter(|&joint| joint < count).collect());
        let joints = joints.filter(|joints: &Vec<usize>| !joints.is_empty());
        let session = &mut self.bench.session;
        session.choice = TimeChoice { joints, span_secs };
        if session.playback.only_choice {
            session.playback.range = span_secs.map(|[from, to]| (from, to));
            session.playback.only_choice = span_secs.is_some();
        }
    }

    /// One end of the stretch comes to the playhead, the other stays, or is the clip's.
    pub(super) fn choose_from_playhead(&mut self, is_end: bool) {
        let Some(duration) = self.bench.result().map(|clip| clip.duration_secs) else { return };
        let session = &self.bench.session;
        let now = session.playback.playhead_secs;
        let [from, to] = session.choice.span_secs.unwrap_or([0.0, duration]);
        let span = if is_end {
            [if now > from { from } else { 0.0 }, now]
        } else {
            [now, if now < to { to } else { duration }]
        };
        let choice = TimeChoice { span_secs: Some(span), ..session.choice.clone() };
        self.choose(choice);
    }

    /// The chosen joint with all that hangs on it.
    pub(super) fn choose_limb(&mut self) {
        let (Some(clip), Some(joint)) = (self.bench.result(), self.bench.session.joint) else { return };
        if joint >= clip.skeleton.len() {
            return;
        }
        let mut open = vec![joint];
        let mut found = Vec::new();
        while let Some(next) = open.pop() {
            found.push(next);
            open.extend(clip.skeleton.children(next));
        }
        let span_secs = self.bench.session.choice.span_secs;
        self.choose(TimeChoice { span_secs, ..TimeChoice::of_joints(found) });
    }

    /// Folds every limb to one row, or shows all joints.
    pub(super) fn fold_limbs(&mut self, folds: bool) {
        let Some(clip) = self.bench.result() else { return };
        let folded = if folds {
            let Some(roles) = self.bench.roles_of(&clip.skeleton) else {
                let words = "It is not yet known which joints make a limb: in a moment";
                self.tell(Message::done(words.to_owned()));
                return;
            };
            limb_starts(&clip.skeleton, roles)
        } else {
            BTreeSet::new()
        };
        self.bench.session.folded = folded;
    }

    /// Plays the chosen stretch alone, or all again.
    pub(super) fn play_choice(&mut self) {
        let session = &mut self.bench.session;
        let span = session.choice.span_secs.filter(|_| !session.playback.only_choice);
        session.playback.only_choice = span.is_some();
        session.playback.range = span.map(|[from, to]| (from, to));
        if let Some([from, _]) = span {
            session.playback.is_looping = true;
            self.scrub(from);
        }
    }

    /// Brings the chosen stretch to the whole width.
    pub(super) fn show_choice(&mut self) {
        let Some(clip) = self.bench.result() else { return };
        let session = &self.bench.session;
        let Some([from, to]) = session.choice.span_secs else { return };
        let (duration, rate) = (clip.duration_secs, clip.grid.rate);
        let margin = 0.04 * (to - from);
        let window = TimeWindow { start_secs: from - margin, end_secs: to + margin };
        // A zoom by 1 holds it inside the clip and above the shortest stretch.
        let middle = f64::midpoint(from, to);
        self.bench.session.window = window.zoom(1.0, middle, duration, rate);
    }
}

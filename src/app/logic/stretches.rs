//! Paths, spacings and meant turns: what they are given to, and the edits that give them.

use super::super::panels::Message;
use super::super::view_models::{KeyBase, KeyChoice, Stretch, counted, shaped_rows, stretches};
use super::super::window::Window;
use super::curves::has_rows;
use crate::clip::{KeyChange, KeyEdit, MeantTurn, PathKind, RotationTrack, Spacing};

/// Told where a path or a spacing would change nothing.
const NOTHING_TO_SHAPE: &str = "There is no segment here that a path could shape. It needs two keys with frames between them; \
                                where a key stands at each frame, choose a stretch of keys first: by a drag along the lane below \
                                the curves";

impl Window {
    pub(super) fn choose_segment_here(&mut self) {
        let Some(clip) = self.bench.result().cloned() else { return };
        let Some(joint) = self.bench.session.joint else { return };
        let now = self.bench.session.playback.playhead_secs;
        let track = clip.rotation(joint).filter(|track| !track.times.is_empty());
        let fits =
            |track: &RotationTrack, start: f64| !stretches(joint, track, &clip.grid, &[start]).is_empty();
        let start = track.and_then(|track| segment_at(track, now).filter(|&start| fits(track, start)));
        // A file's rows stay, whatever was made of them: there the whole stretch is what a segment is elsewhere.
        let rows = track.filter(|_| start.is_none()).and_then(|track| {
            let shaped = shaped_rows(&clip, self.bench.last_key_edits());
            let is_here =
                |own: &Stretch| own.joint == joint && (own.start_secs..=own.end_secs(track)).contains(&now);
            shaped.into_iter().find(is_here).map(|own| own.keys(track))
        });
        match rows {
            Some(keys) => self.choose_keys(keys),
            None if start.is_none() => self.tell(Message::note(NOTHING_TO_SHAPE.to_owned())),
            None => {}
        }
        self.bench.session.curves.segment = start.map(|secs| (joint, secs));
        self.bench.curve_hand.serial += 1;
    }

    /// What a path, a spacing or turns are meant for: the chosen segment, else what lies between the chosen keys, else the segments that the
    /// playhead is in, and in captured motion the chosen stretch of time.
    fn meant_stretches(&self, base: &KeyBase) -> Vec<Stretch> {
        let session = &self.bench.session;
        let of = |joint: usize, times: &[f64]| {
            let track = base.clip.rotation(joint).filter(|track| !track.times.is_empty());
            track.map_or_else(Vec::new, |track| stretches(joint, track, &base.clip.grid, times))
        };
        if let Some((joint, secs)) = session.curves.segment {
            return of(joint, &[secs]);
        }
        if !session.curves.keys.is_empty() {
            return session.curves.keys.rows().flat_map(|(joint, times)| of(joint, times)).collect();
        }
        let now = session.playback.playhead_secs;
        let here = |joint: usize| {
            let Some(track) = base.clip.rotation(joint) else { return Vec::new() };
            let own = segment_at(track, now).map_or_else(Vec::new, |start| of(joint, &[start]));
            match self.chosen_span().filter(|_| own.is_empty()) {
                Some([from, to]) => {
                    let within = |secs: &f64| (from - 1e-9..=to + 1e-9).contains(secs);
                    of(joint, &track.times.iter().filter(within).collect::<Vec<f64>>())
                }
                None => own,
            }
        };
        session.joints().into_iter().flat_map(here).collect()
    }

    /// Changes what is meant, as one step; `change` gets a segment's path and turns.
    fn change_segments(
        &mut self,
        label: &str,
        change: impl Fn(Vec<f64>, PathKind, MeantTurn) -> Option<KeyChange>,
    ) {
        let Some(base) = self.key_base() else { return };
        let meant = self.meant_stretches(&base);
        // Once the keys have given way the same stretch is shaped on, whatever rows the file keeps.
        let known = self.bench.last_key_edits().to_vec();
        let is_free = known.iter().all(|edit| !matches!(edit.change, KeyChange::Move(_)));
        let goes_on = is_free && meant.iter().all(|own| own.is_known(&known));
        let known = if goes_on { known } else { Vec::new() };
        let mut edits: Vec<KeyEdit> = Vec::new();
        for own in &meant {
            let Some(track) = base.clip.rotation(own.joint) else { continue };
            let (kind, turn) = own.path_and_turn(track, &known);
            let Some(change) = change(vec![own.start_secs], kind, turn) else { continue };
            edits.extend(own.clearing().filter(|_| !goes_on));
            edits.push(KeyEdit { joint: own.joint, change });
        }
        if edits.is_empty() {
            self.tell(Message::note(NOTHING_TO_SHAPE.to_owned()));
            return;
        }
        let gone: usize = meant.iter().map(|own| own.gone_secs.len()).sum();
        let label = if gone == 0 {
            label.to_owned()
        } else {
            format!("{label}, over {}", counted(gone + 2 * meant.len(), "key"))
        };
        self.commit_keys(&base, edits, label);
        self.choose_shaped(&base, &meant);
    }

    /// Where keys have given way the segment that is left is chosen, so that its spacing can be drawn; rows of a file stay, and stay
    /// chosen.
    fn choose_shaped(&mut self, base: &KeyBase, meant: &[Stretch]) {
        let is_row_track =
            |own: &Stretch| base.clip.rotation(own.joint).is_some_and(|track| has_rows(&base.clip, track));
        if let [only] = meant
            && !only.gone_secs.is_empty()
            && !is_row_track(only)
        {
            self.bench.session.curves.keys = KeyChoice::default();
            self.bench.session.curves.segment = Some((only.joint, only.start_secs));
        }
    }

    pub(super) fn set_path(&mut self, kind: PathKind) {
        self.change_segments(&format!("Path: {}", kind.name()), |starts, _, _| {
            Some(KeyChange::Path(starts, kind))
        });
    }

    pub(super) fn set_spacing(&mut self, spacing: Spacing) {
        let label = format!("Spacing: {}", spacing_name(spacing));
        self.change_segments(&label, |starts, _, _| Some(KeyChange::Space(starts, spacing)));
    }

    pub(super) fn set_turns(&mut self, label: &str, change: impl Fn(i32) -> i32) {
        self.change_segments(label, |starts, kind, own| {
            let whole = change(own.whole());
            let turn = match own.plane() {
                Some(plane) => MeantTurn::in_plane(whole, plane),
                None => MeantTurn::new(whole),
            };
            Some(KeyChange::Turn(starts, turn.ok().filter(|_| kind.takes_turns())?))
        });
    }
}

/// The first key's time of the segment that a time lies in; the last segment at the end.
fn segment_at(track: &RotationTrack, secs: f64) -> Option<f64> {
    let last = track.keys.len().checked_sub(2)?;
    let key = (0..=last).rev().find(|&key| track.times.at(key) <= secs + 1e-9);
    Some(track.times.at(key.unwrap_or(0)))
}

/// The word for a spacing.
fn spacing_name(spacing: Spacing) -> &'static str {
    match spacing {
        Spacing::Even => "even",
        Spacing::EaseIn => "ease in",
        Spacing::EaseOut => "ease out",
        Spacing::EaseBoth => "ease in and out",
        Spacing::Own(_) => "own handles",
    }
}

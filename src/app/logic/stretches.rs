//! Paths, spacings and meant turns: what they are given to, and the edits that give them.

use super::super::panels::Message;
use super::super::view_models::{KeyBase, KeyChoice, Stretch, counted, one_stretch, segments, shaped_rows};
use super::super::window::Window;
use super::curves::has_rows;
use crate::clip::{Clip, KeyChange, KeyEdit, MeantTurn, PathKind, RotationTrack, Spacing};

/// Told where a path or a spacing would change nothing.
const NOTHING_TO_SHAPE: &str = "There is no segment here that this could shape. It needs two keys with frames between them; where a \
                                key stands at each frame, choose a stretch of keys (by a drag along the lane below the curves) and \
                                make one segment of it first: menu Keys";
/// Told where no key could give way.
const NOTHING_BETWEEN: &str =
    "One segment is made of three chosen keys or more: those between the first and the last give way";

impl Window {
    pub(super) fn choose_segment_here(&mut self) {
        let Some(clip) = self.bench.result().cloned() else { return };
        let Some(joint) = self.bench.session.joint else { return };
        let now = self.bench.session.playback.playhead_secs;
        let track = clip.rotation(joint).filter(|track| !track.times.is_empty());
        let fits = |track: &RotationTrack, start: f64| {
            segments(joint, track, &[start]).iter().any(|own| own.has_room(track, &clip.grid))
        };
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
            None => self.choose_keys(KeyChoice::default()),
        }
        if start.is_none() && self.bench.session.curves.keys.is_empty() {
            self.tell(Message::note(NOTHING_TO_SHAPE.to_owned()));
        }
        self.bench.session.curves.segment = start.map(|secs| (joint, secs));
    }

    /// What a path, a spacing or turns are meant for: the chosen segment, else what lies between the chosen keys, else the segments that the
    /// playhead is in, and in captured motion the chosen stretch of time. All keys stay.
    fn meant_stretches(&self, base: &KeyBase) -> Vec<Stretch> {
        let session = &self.bench.session;
        let of = |joint: usize, times: &[f64]| {
            let track = base.clip.rotation(joint).filter(|track| !track.times.is_empty());
            track.map_or_else(Vec::new, |track| segments(joint, track, times))
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
            let mut own = segment_at(track, now).map_or_else(Vec::new, |start| of(joint, &[start]));
            own.retain(|own| own.has_room(track, &base.clip.grid));
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

    /// Changes what is meant, as one step; `change` gets a segment's path and turns. A path may lie between any two keys, what is about pace and
    /// turns needs room.
    fn change_segments(
        &mut self,
        label: &str,
        needs_room: bool,
        change: impl Fn(Vec<f64>, PathKind, MeantTurn) -> Option<KeyChange>,
    ) {
        let Some(base) = self.key_base() else { return };
        let known = self.bench.last_key_edits().to_vec();
        let mut meant = self.meant_stretches(&base);
        // A file's rows stay: between two of them nothing is kept, and what can be shaped is what was made one segment before.
        let is_of_rows = |joint: usize| is_row_track(&base.clip, joint);
        meant.retain(|own| {
            let track = base.clip.rotation(own.joint);
            let has_room = track.is_some_and(|track| own.has_room(track, &base.clip.grid));
            !is_of_rows(own.joint) && (has_room || !needs_room)
        });
        meant.extend(shaped_rows(&base.clip, &known).into_iter().filter(|own| {
            let track = base.clip.rotation(own.joint).filter(|_| is_of_rows(own.joint));
            track.is_some_and(|track| own.is_chosen(track, &base.choice))
        }));
        let mut edits: Vec<KeyEdit> = Vec::new();
        for own in &meant {
            let Some(track) = base.clip.rotation(own.joint) else { continue };
            let (kind, turn) = own.path_and_turn(track, &known);
            let Some(change) = change(vec![own.start_secs], kind, turn) else { continue };
            add_edit(&mut edits, KeyEdit { joint: own.joint, change });
        }
        if edits.is_empty() {
            self.tell(Message::note(NOTHING_TO_SHAPE.to_owned()));
            return;
        }
        self.commit_keys(&base, edits, label.to_owned());
    }

    /// Makes one segment of what lies between the first and the last chosen key of each joint: the keys between give way.
    pub(super) fn make_one_segment(&mut self) {
        let Some(base) = self.key_base() else { return };
        let made: Vec<Stretch> = base
            .choice
            .rows()
            .filter_map(|(joint, times)| one_stretch(joint, base.clip.rotation(joint)?, times))
            .collect();
        let edits: Vec<KeyEdit> = made.iter().map(Stretch::clearing).collect();
        if edits.is_empty() {
            self.tell(Message::note(NOTHING_BETWEEN.to_owned()));
            return;
        }
        let gone: usize = made.iter().map(|own| own.gone_secs.len()).sum();
        self.commit_keys(
            &base,
            edits,
            format!("One segment, over {}", counted(gone + 2 * made.len(), "key")),
        );
        self.choose_made(&base, &made);
    }

    /// Where keys have given way the segment that is left is chosen, so that its spacing can be drawn; of several the keys at their ends. Rows
    /// of a file stay, and stay chosen.
    fn choose_made(&mut self, base: &KeyBase, made: &[Stretch]) {
        let mut keys = KeyChoice::default();
        for own in made {
            let Some(track) = base.clip.rotation(own.joint) else { continue };
            if is_row_track(&base.clip, own.joint) {
                keys.add_all(&own.keys(track));
            } else {
                keys.add(own.joint, [own.start_secs, own.end_secs(track)]);
            }
        }
        match made {
            [only] if !is_row_track(&base.clip, only.joint) => {
                self.choose_keys(KeyChoice::default());
                self.bench.session.curves.segment = Some((only.joint, only.start_secs));
            }
            _ => self.choose_keys(keys),
        }
    }

    pub(super) fn set_path(&mut self, kind: PathKind) {
        self.change_segments(&format!("Path: {}", kind.name()), false, |starts, _, _| {
            Some(KeyChange::Path(starts, kind))
        });
    }

    pub(super) fn set_spacing(&mut self, spacing: Spacing) {
        let label = format!("Spacing: {}", spacing_name(spacing));
        self.change_segments(&label, true, |starts, _, _| Some(KeyChange::Space(starts, spacing)));
    }

    pub(super) fn set_turns(&mut self, label: &str, change: impl Fn(i32) -> i32) {
        self.change_segments(label, true, |starts, kind, own| {
            let whole = change(own.whole());
            let turn = match own.plane() {
                Some(plane) => MeantTurn::in_plane(whole, plane),
                None => MeantTurn::new(whole),
            };
            Some(KeyChange::Turn(starts, turn.ok().filter(|_| kind.takes_turns())?))
        });
    }
}

/// Whether a joint's track keeps the rows of a file.
fn is_row_track(clip: &Clip, joint: usize) -> bool {
    clip.rotation(joint).is_some_and(|track| has_rows(clip, track))
}

/// Adds an edit, to the last one where it says the same of other segments of the joint.
fn add_edit(edits: &mut Vec<KeyEdit>, new: KeyEdit) {
    let last = edits.last_mut().filter(|last| last.joint == new.joint);
    let all = match (last.map(|last| &mut last.change), &new.change) {
        (Some(KeyChange::Path(all, own)), KeyChange::Path(_, kind)) if own == kind => Some(all),
        (Some(KeyChange::Space(all, own)), KeyChange::Space(_, spacing)) if own == spacing => Some(all),
        (Some(KeyChange::Turn(all, own)), KeyChange::Turn(_, turn)) if own == turn => Some(all),
        _ => None,
    };
    match (all, new.change) {
        (
            Some(all),
            KeyChange::Path(starts, _) | KeyChange::Space(starts, _) | KeyChange::Turn(starts, _),
        ) => all.extend(starts),
        (_, change) => edits.push(KeyEdit { joint: new.joint, change }),
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

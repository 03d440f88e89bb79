//! The rows of the snag table.

use std::collections::BTreeSet;

use crate::clip::Clip;
use crate::scene::{ClipWork, SnagMark};
use crate::snag::{Snag, SnagKind};

use super::words::{degrees, frames_text};

/// What has been decided about a snag.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum SnagState {
    /// Nothing yet.
    Open,
    /// A pass mends it.
    Mended,
    /// It is meant, or not worth it.
    Left,
}

impl SnagState {
    /// The word in the table.
    pub const fn word(self) -> &'static str {
        match self {
            Self::Open => "open",
            Self::Mended => "mended",
            Self::Left => "left",
        }
    }
}

/// What has been decided about each snag, in their order.
pub fn snag_states(snags: &[Snag], work: &ClipWork) -> Vec<SnagState> {
    let mended: BTreeSet<SnagMark> = work.mended().map(SnagMark::of).collect();
    let left: BTreeSet<SnagMark> = work.left.iter().copied().collect();
    let state = |snag: &Snag| match SnagMark::of(snag) {
        mark if mended.contains(&mark) => SnagState::Mended,
        mark if left.contains(&mark) => SnagState::Left,
        _ => SnagState::Open,
    };
    snags.iter().map(state).collect()
}

/// What the table is ordered by.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum SnagOrder {
    /// From the start of the clip to its end.
    #[default]
    Time,
    /// By the skeleton.
    Joint,
    /// By kind.
    Kind,
    /// The largest first.
    Size,
    /// The surest first.
    Confidence,
    /// Open first.
    State,
}

/// Which snags the table shows.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct SnagFilter {
    /// Only this kind.
    pub kind: Option<SnagKind>,
    /// Only open ones.
    pub only_open: bool,
    /// Only the chosen joint's.
    pub joint: Option<usize>,
    /// Only those of at least so many degrees; what has no size passes.
    pub least_deg: u16,
}

/// One row of the table.
#[derive(Clone, Debug, PartialEq)]
pub struct SnagRow {
    /// Index in the survey's list.
    pub index: usize,
    /// The mark on the map.
    pub letter: char,
    /// The kind's name.
    pub kind: SnagKind,
    /// The joint's label.
    pub joint: String,
    /// One frame or a run.
    pub frames: String,
    /// Degrees; empty where the kind has no size.
    pub size: String,
    /// Percent.
    pub confidence: String,
    /// What has been decided.
    pub state: SnagState,
    /// Whether its mend may be applied unasked.
    pub safe: bool,
    /// The finding in words.
    pub text: String,
}

/// The rows to show, in order.
pub fn snag_rows(
    clip: &Clip,
    snags: &[Snag],
    states: &[SnagState],
    filter: &SnagFilter,
    order: SnagOrder,
) -> Vec<SnagRow> {
    let wanted = |state: SnagState, snag: &Snag| {
        filter.kind.is_none_or(|kind| kind == snag.kind)
            && filter.joint.is_none_or(|joint| joint == snag.joint)
            && !(snag.size_rad.is_finite() && snag.size_rad.to_degrees() < f64::from(filter.least_deg))
            && (!filter.only_open || state == SnagState::Open)
    };
    let mut kept: Vec<(usize, SnagState, &Snag)> = snags
        .iter()
        .zip(states)
        .enumerate()
        .map(|(index, (snag, &state))| (index, state, snag))
        .filter(|(_, state, snag)| wanted(*state, snag))
        .collect();
    // Stable, so that equals stay in the order in which they were found.
    kept.sort_by(|(_, state_a, a), (_, state_b, b)| {
        let by_time = a.first_frame.cmp(&b.first_frame).then(a.joint.cmp(&b.joint));
        match order {
            SnagOrder::Time => by_time,
            SnagOrder::Joint => a.joint.cmp(&b.joint).then(by_time),
            SnagOrder::Kind => a.kind.cmp(&b.kind).then(by_time),
            SnagOrder::Size => b.size_rad.total_cmp(&a.size_rad).then(by_time),
            SnagOrder::Confidence => b.confidence.total_cmp(&a.confidence).then(by_time),
            SnagOrder::State => state_a.cmp(state_b).then(by_time),
        }
    });
    kept.into_iter()
        .map(|(index, state, snag)| SnagRow {
            index,
            letter: snag.kind.letter(),
            kind: snag.kind,
            joint: clip.skeleton.label(snag.joint).to_owned(),
            frames: frames_text(snag.first_frame, snag.last_frame),
            size: if snag.size_rad.is_finite() { degrees(snag.size_rad.to_degrees()) } else { String::new() },
            confidence: format!("{:.0} %", snag.confidence * 100.0),
            state,
            safe: snag.safe,
            text: snag.text.clone(),
        })
        .collect()
}

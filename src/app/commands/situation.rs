//! What decides which entries of the table can be done.

use super::super::session::SpaceHabits;
use super::super::view_models::{CurveView, HeatKind};
use crate::scene::SearchChoice;

/// What decides whether an action can be done and whether it is on.
#[derive(Clone, Debug, Default, PartialEq)]
#[expect(clippy::struct_excessive_bools, reason = "plain facts, each asked for by its own name")]
pub struct Situation {
    /// A document is open.
    pub has_document: bool,
    /// A clip with its source is there.
    pub has_clip: bool,
    /// The document has several clips.
    pub has_several_clips: bool,
    /// A source is missing or not the one that was saved.
    pub has_trouble: bool,
    /// The clip is a table whose skeleton can be taken from another file.
    pub has_table: bool,
    /// What undo would take back.
    pub undo: Option<String>,
    /// What redo would bring back.
    pub redo: Option<String>,
    /// A joint is chosen.
    pub has_joint: bool,
    /// How many snags there are.
    pub snags: usize,
    /// How many open ones may be mended unasked.
    pub safe_snags: usize,
    /// A snag is chosen.
    pub has_snag: bool,
    /// The chosen snag is mended.
    pub snag_is_mended: bool,
    /// The chosen snag is left.
    pub snag_is_left: bool,
    /// Snags are being looked for.
    pub is_finding: bool,
    /// The clip plays.
    pub is_playing: bool,
    /// Play starts over at the end.
    pub is_looping: bool,
    /// Only a part is played.
    pub has_loop_range: bool,
    /// The mend of the chosen snag is shown before it is accepted.
    pub looks: bool,
    /// Joints or a stretch of time are chosen to work on.
    pub has_choice: bool,
    /// A stretch of time is chosen.
    pub has_chosen_span: bool,
    /// Only the choice is played.
    pub plays_choice: bool,
    /// The camera goes with the figure.
    pub follows: bool,
    /// The camera shows depth in parallel.
    pub is_parallel: bool,
    /// The source is drawn as well.
    pub shows_before: bool,
    /// The source is drawn instead of the result.
    pub shows_source_alone: bool,
    /// The window is light.
    pub is_light: bool,
    /// The turn map has the worst joint on top.
    pub worst_first: bool,
    /// How many markers there are.
    pub markers: usize,
    /// The limits that snags are looked for with: their title.
    pub limits: Option<String>,
    /// What else is looked for.
    pub search: SearchChoice,
    /// The retarget sheet is open.
    pub carries: bool,
    /// What the curves show.
    pub curve_view: Option<CurveView>,
    /// How many keys are chosen.
    pub chosen_keys: usize,
    /// A segment is chosen.
    pub has_segment: bool,
    /// Keys were copied that fit the skeleton on show.
    pub can_paste: bool,
    /// Moved keys come to stand on frames.
    pub snaps_to_frames: bool,
    /// What the turn map shows.
    pub heat_kind: Option<HeatKind>,
    /// A pass blends another clip in.
    pub has_blend: bool,
    /// The blend lane is shown.
    pub shows_blend_lane: bool,
    /// The two clips of a blend are drawn as faint figures.
    pub shows_blend_clips: bool,
    /// How the skeleton view is set.
    pub space: SpaceHabits,
    /// The skeleton view exchanges left and right.
    pub is_mirrored: bool,
}

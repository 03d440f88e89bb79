//! What a person is looking at: selection, playhead, camera, which curves. Not part of the document, not undone.

mod curves;

use std::collections::BTreeSet;

use crate::clip::Clip;
use crate::raster::Camera;
use crate::scene::{PassId, SnagMark};
use crate::snag::SnagKind;

mod space;

pub use space::{Disc, FALLOFF_SECS, SpaceHabits, TurnPlanes, USUAL_FALLOFF_SECS, other_falloff};

use super::blend_state::BlendHabits;
use super::carry_state::CarryHabits;
use super::view_models::{CurveView, HeatKind, SnagFilter, SnagOrder, TimeChoice, TimeWindow};

pub use curves::CurveHabits;

/// The speeds that the menu steps through.
pub const SPEEDS: [f64; 7] = [0.1, 0.25, 0.5, 1.0, 1.5, 2.0, 4.0];

/// Where play stands.
#[derive(Clone, Debug, PartialEq)]
pub struct Playback {
    /// The time shown, seconds.
    pub playhead_secs: f64,
    /// Whether it moves.
    pub is_playing: bool,
    /// Whether it starts over at the end.
    pub is_looping: bool,
    /// Only this part is played.
    pub range: Option<(f64, f64)>,
    /// That part is the choice, and goes with it.
    pub only_choice: bool,
    /// Times the true speed, 0.1 to 4.
    pub speed: f64,
}

impl Default for Playback {
    fn default() -> Self {
        Self {
            playhead_secs: 0.0,
            is_playing: false,
            is_looping: true,
            range: None,
            only_choice: false,
            speed: 1.0,
        }
    }
}

impl Playback {
    /// The part that is played, of a clip this long.
    pub fn bounds(&self, duration_secs: f64) -> (f64, f64) {
        let (start, end) = self.range.unwrap_or((0.0, duration_secs));
        (start.clamp(0.0, duration_secs), end.clamp(0.0, duration_secs))
    }

    /// Moves on by so much time of the wall clock.
    pub fn advance(&mut self, wall_secs: f64, duration_secs: f64) {
        if !self.is_playing {
            return;
        }
        let (start, end) = self.bounds(duration_secs);
        let next = self.playhead_secs + wall_secs * self.speed;
        self.playhead_secs = if next < end {
            next.max(start)
        } else if self.is_looping && end > start {
            start + (next - start) % (end - start)
        } else {
            self.is_playing = false;
            end
        };
    }
}

/// Why the camera is brought to the figure.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Fit {
    /// A clip has come: also choose whether to follow.
    Arrive,
    /// It was asked for.
    Again,
    /// It was asked for the chosen joint alone.
    Joint,
}

/// What is looked at, and how.
#[derive(Clone, Debug, PartialEq)]
#[expect(clippy::struct_excessive_bools, reason = "independent switches, each with its own menu entry")]
pub struct Session {
    /// Which clip of the document.
    pub work: usize,
    /// The chosen joint.
    pub joint: Option<usize>,
    /// Further chosen joints, in the order in which they were added.
    pub more_joints: Vec<usize>,
    /// The chosen snag.
    pub snag: Option<SnagMark>,
    /// Where play stands.
    pub playback: Playback,
    /// The stretch of time on screen.
    pub window: TimeWindow,
    /// The joints and the stretch of time that tools and new passes act on.
    pub choice: TimeChoice,
    /// What the curves show.
    pub curve_view: CurveView,
    /// What they showed before a snag that is seen in the file's own numbers alone was chosen; `None`: nothing else since.
    pub view_before_snag: Option<CurveView>,
    /// How the curves are set, and what is chosen on them.
    pub curves: CurveHabits,
    /// What the turn map shows.
    pub heat_kind: HeatKind,
    /// Whether its hottest row is on top.
    pub worst_first: bool,
    /// How the skeleton view is set.
    pub space: SpaceHabits,
    /// Seconds from a soft push to where nothing is left of it, to either side. One number for all that push: the discs of
    /// the skeleton view and the curves.
    pub falloff_secs: f64,
    /// From where the figure is seen.
    pub camera: Camera,
    /// What the camera is to be fitted to, once the size of the view is known.
    pub fit: Option<Fit>,
    /// Whether it goes along with the figure.
    pub follows: bool,
    /// Whether the source is drawn as well.
    pub shows_before: bool,
    /// Whether the source is drawn instead, until switched off.
    pub source_alone: bool,
    /// Whether the keys that show the source alone are held.
    pub source_held: bool,
    /// Joints whose children are hidden.
    pub folded: BTreeSet<usize>,
    /// Which snags are listed.
    pub filter: SnagFilter,
    /// In which order.
    pub order: SnagOrder,
    /// The pass whose form is open.
    pub open_pass: Option<PassId>,
    /// Whether the mend of the chosen snag is shown before it is accepted.
    pub looks: bool,
    /// How the blend lane is set.
    pub blend: BlendHabits,
    /// How the retarget sheet is looked at.
    pub carry: CarryHabits,
}

impl Default for Session {
    fn default() -> Self {
        Self {
            work: 0,
            joint: None,
            more_joints: Vec::new(),
            snag: None,
            playback: Playback::default(),
            window: TimeWindow::whole(1.0),
            choice: TimeChoice::default(),
            curve_view: CurveView::PlaneAngles,
            view_before_snag: None,
            curves: CurveHabits::default(),
            heat_kind: HeatKind::TurnRate,
            worst_first: false,
            space: SpaceHabits::default(),
            falloff_secs: USUAL_FALLOFF_SECS,
            camera: Camera::default(),
            fit: Some(Fit::Arrive),
            follows: true,
            shows_before: true,
            source_alone: false,
            source_held: false,
            folded: BTreeSet::new(),
            filter: SnagFilter::default(),
            order: SnagOrder::default(),
            open_pass: None,
            looks: false,
            blend: BlendHabits::default(),
            carry: CarryHabits::default(),
        }
    }
}

impl Session {
    /// All chosen joints: first the one that was chosen last by itself, then the further ones.
    pub fn joints(&self) -> Vec<usize> {
        let more = self.more_joints.iter().copied().filter(|&joint| Some(joint) != self.joint);
        self.joint.into_iter().chain(more).collect()
    }

    /// Whether a joint is among the chosen ones.
    pub fn has_joint(&self, joint: usize) -> bool {
        self.joint == Some(joint) || self.more_joints.contains(&joint)
    }

    /// Whether only the source is to be seen now.
    pub fn shows_source_alone(&self) -> bool {
        self.source_alone || self.source_held
    }

    /// Shows a view of the curves that was asked for.
    pub fn show_curves(&mut self, view: CurveView) {
        self.curve_view = view;
        self.view_before_snag = None;
    }

    /// The view of the curves that a person asked for last.
    pub fn usual_view(&self) -> CurveView {
        self.view_before_snag.unwrap_or(self.curve_view)
    }

    /// Shows the view in which a snag is seen: the file's own numbers, if it is in them alone. With the next snag that any view shows the
    /// view comes back that was there before.
    pub fn show_curves_of_snag(&mut self, kind: SnagKind) {
        if !kind.keeps_pose() {
            self.curve_view = self.view_before_snag.take().unwrap_or(self.curve_view);
        } else if self.curve_view != CurveView::FileNumbers {
            self.view_before_snag = Some(std::mem::replace(&mut self.curve_view, CurveView::FileNumbers));
            // The range of values that was looked at is one of other numbers.
            self.curves.values = None;
        }
    }

    /// Turns to another clip. Habits (views, colours, speed) stay; what belongs to the clip starts anew.
    pub fn turn_to(&mut self, work: usize, clip: Option<&Clip>) {
        *self = Self {
            work,
            joint: clip.and_then(first_moving_joint),
            window: TimeWindow::whole(clip.map_or(1.0, |clip| clip.duration_secs)),
            playback: Playback {
                is_looping: self.playback.is_looping,
                speed: self.playback.speed,
                ..Playback::default()
            },
            curve_view: self.usual_view(),
            curves: self.curves.without_choice(),
            heat_kind: self.heat_kind,
            worst_first: self.worst_first,
            space: self.space.clone(),
            falloff_secs: self.falloff_secs,
            camera: Camera {
                lens: self.camera.lens,
                is_mirrored: self.camera.is_mirrored,
                ..Camera::default()
            },
            shows_before: self.shows_before,
            order: self.order,
            looks: self.looks,
            blend: self.blend.for_another_clip(),
            ..Self::default()
        };
    }
}

/// The first listed joint that turns, so that curves and numbers have something to show at once.
fn first_moving_joint(clip: &Clip) -> Option<usize> {
    let moves = |&joint: &usize| {
        clip.rotation(joint).is_some_and(|track| {
            let first = track.keys.first().copied().unwrap_or_default();
            track.keys.iter().any(|key| key.is_finite() && first.turn_to(*key) > 1e-3)
        })
    };
    clip.skeleton.listed().find(moves).or_else(|| clip.skeleton.listed().next())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_snag_in_stored_numbers_alone_shows_them_until_the_next_other_snag() {
        let mut session = Session { curve_view: CurveView::SwingTwist, ..Session::default() };
        session.show_curves_of_snag(SnagKind::Wrap);
        assert_eq!(session.curve_view, CurveView::FileNumbers);
        session.show_curves_of_snag(SnagKind::SignFlip);
        assert_eq!(session.curve_view, CurveView::FileNumbers);
        session.show_curves_of_snag(SnagKind::Spike);
        assert_eq!(session.curve_view, CurveView::SwingTwist, "the view from before");
        // What a person asked for stays.
        session.show_curves_of_snag(SnagKind::MirroredAngles);
        session.show_curves(CurveView::FileNumbers);
        session.show_curves_of_snag(SnagKind::Spike);
        assert_eq!(session.curve_view, CurveView::FileNumbers);
    }

    #[test]
    fn play_loops_inside_its_range_and_else_stops_at_the_end() {
        let mut playback =
            Playback { is_playing: true, range: Some((1.0, 2.0)), speed: 2.0, ..Playback::default() };
        playback.advance(0.1, 10.0);
        assert_eq!(playback.playhead_secs, 1.0);
        playback.advance(0.6, 10.0);
        assert!((playback.playhead_secs - 1.2).abs() < 1e-12);
        playback.is_looping = false;
        playback.advance(1.0, 10.0);
        assert_eq!((playback.playhead_secs, playback.is_playing), (2.0, false));
    }
}

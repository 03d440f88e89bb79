//! What is asked for in the skeleton view: turns by hand, and how they behave.

use std::sync::Arc;

use super::super::commands::{SpaceAction, SpaceCommand};
use super::super::session::{Disc, FALLOFF_SECS, Fit, SpaceHabits, other_falloff};
use super::super::view_models::{HandTurns, hand_edit, step_turn};
use super::super::window::Window;
use crate::clip::Clip;
use crate::scene::Edit;

impl Window {
    pub(super) fn run_space(&mut self, command: SpaceCommand) {
        let session = &mut self.bench.session;
        match command {
            SpaceCommand::Try(turns, base) => self.try_turns(&turns, &base),
            SpaceCommand::Turn(turns, base) => self.turn_by_hand(&turns, &base),
            SpaceCommand::GiveUp => self.bench.trial = None,
            SpaceCommand::Step(disc, steps) => self.step_disc(disc, steps),
            SpaceCommand::SetFalloff(secs) => {
                session.falloff_secs = secs.clamp(FALLOFF_SECS[0], FALLOFF_SECS[1]);
            }
            SpaceCommand::SetStep(degrees) => session.space.step_deg = degrees.clamp(0.01, 180.0),
            SpaceCommand::SetNeighbours(frames) => {
                let [least, most] = SpaceHabits::NEIGHBOUR_FRAMES;
                session.space.neighbour_frames = frames.clamp(least, most);
            }
            SpaceCommand::SetPlanes(planes) => session.space.planes = planes,
        }
    }

    pub(super) fn act_in_space(&mut self, action: SpaceAction) {
        let session = &mut self.bench.session;
        let space = &mut session.space;
        match action {
            SpaceAction::Arm(disc) => {
                space.disc = disc;
                space.shows_discs = true;
            }
            SpaceAction::TurnBack | SpaceAction::TurnOn => {
                let disc = space.disc;
                self.step_disc(disc, if action == SpaceAction::TurnOn { 1.0 } else { -1.0 });
            }
            SpaceAction::SmallerStep | SpaceAction::LargerStep => {
                space.step_deg = space.other_step(action == SpaceAction::LargerStep);
            }
            SpaceAction::Planes(planes) => space.planes = planes,
            SpaceAction::ShorterFalloff | SpaceAction::LongerFalloff => {
                let longer = action == SpaceAction::LongerFalloff;
                session.falloff_secs = other_falloff(session.falloff_secs, longer);
            }
            SpaceAction::FitJoint => session.fit = Some(Fit::Joint),
            SpaceAction::Mirror => session.camera.is_mirrored ^= true,
            SpaceAction::Discs => space.shows_discs ^= true,
            SpaceAction::Path => space.shows_path ^= true,
            SpaceAction::Neighbours => space.shows_neighbours ^= true,
            SpaceAction::Reach => space.shows_reach ^= true,
            SpaceAction::Names => space.shows_names ^= true,
            SpaceAction::Floor => space.shows_floor ^= true,
        }
    }

    /// The edit that turns by hand come to.
    fn edit_of(&self, turns: &HandTurns, base: &Clip) -> Option<Edit> {
        let work = self.bench.work()?;
        Some(hand_edit(self.bench.session.work, work, base, turns, self.bench.session.falloff_secs))
    }

    fn try_turns(&mut self, turns: &HandTurns, base: &Arc<Clip>) {
        self.bench.session.playback.is_playing = false;
        let (Some(edit), Some(project)) = (self.edit_of(turns, base), &self.bench.project) else { return };
        // What does not fit is told when it is let go.
        let Ok(mut document) = edit.apply(project.document()) else { return };
        let work = self.bench.session.work;
        if work < document.works.len() {
            self.bench.trial = Some(std::mem::take(&mut document.works[work].passes));
        }
    }

    fn turn_by_hand(&mut self, turns: &HandTurns, base: &Arc<Clip>) {
        if let Some(edit) = self.edit_of(turns, base) {
            self.edit(&edit);
        }
    }

    /// Turns the chosen joint by a number of steps. Steps that follow each other are one step of the history.
    fn step_disc(&mut self, disc: Disc, steps: f64) {
        let session = &self.bench.session;
        let (Some(joint), Some(clip)) = (session.joint, self.bench.result().cloned()) else { return };
        let Some(work) = self.bench.work() else { return };
        let at_secs = session.playback.playhead_secs;
        let angle_rad = (steps * session.space.step_deg).to_radians();
        let Some(turns) = step_turn(work, &clip, joint, at_secs, disc, session.space.planes, angle_rad)
        else {
            return;
        };
        let Some(edit) = self.edit_of(&turns, &clip) else { return };
        self.bench.session.playback.is_playing = false;
        self.bench.preview = None;
        self.bench.trial = None;
        let Some(project) = &mut self.bench.project else { return };
        let stroke = STROKE ^ ((joint as u64) << 20) ^ at_secs.to_bits() ^ ((disc as u64) << 16);
        if let Err(error) = project.history.commit_stroke(&edit, stroke) {
            self.tell(super::super::panels::Message::error(format!("{}: {error}", edit.label())));
        }
    }
}

/// Tells the strokes of this area from those of others.
const STROKE: u64 = 0x5350_4143_4500_0000;

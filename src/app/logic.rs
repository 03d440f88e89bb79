//! What happens between frames: the answers of jobs are taken in, what panels asked for is done, new work is ordered.

mod answers;
mod blend;
mod carry;
mod curves;
mod export;
mod files;
mod limits;
mod markers;
mod orders;
mod passes;
mod playing;
mod settings;
mod snags;
mod space;
mod stretches;
mod time;

use egui::Context;

use super::commands::{Action, Command, CurveAction, Offer};
use super::panels::{Dialog, Form, Message, Then};
use super::session::Fit;
use super::settings::Layout;
use super::view_models::{CurveView, HeatKind, TimeChoice};
use super::window::Window;
use crate::raster::{Lens, StraightView};
use crate::scene::{ClipWork, Edit, LoopPass};

use limits::LimitsFrom;

pub(crate) use answers::Answer;
pub(crate) use carry::retarget_in;
pub(crate) use orders::Asked;
pub(crate) use settings::Memory;

impl Window {
    /// Does everything that was asked for.
    pub(super) fn run_commands(&mut self, ctx: &Context) {
        // A command may ask for more.
        for _ in 0..8 {
            if self.commands.is_empty() {
                return;
            }
            for command in std::mem::take(&mut self.commands) {
                self.run(command, ctx);
            }
        }
    }

    fn run(&mut self, command: Command, ctx: &Context) {
        match command {
            Command::Do(action) => self.act(action, ctx),
            Command::Edit(edit) => self.edit(&edit),
            Command::ShowClip(work) => self.show_clip(work),
            Command::ChooseJoint(joint) => self.choose_joint(joint),
            Command::ChooseAlso(joint) => self.choose_also(joint),
            Command::Curve(command) => {
                self.run_curve(command);
                ctx.request_repaint();
            }
            Command::ChooseSnag(index) => self.go_to_snag(index),
            Command::Scrub(secs) => self.scrub(secs),
            Command::ShowTime(window) => self.bench.session.window = window,
            Command::SetLoopRange(range) => self.set_loop_range(range),
            Command::SetSpeed(speed) => self.bench.session.playback.speed = speed.clamp(0.1, 4.0),
            Command::SetFilter(filter) => self.bench.session.filter = filter,
            Command::SetOrder(order) => self.bench.session.order = order,
            Command::Fold(joint) => {
                let folded = &mut self.bench.session.folded;
                if !folded.remove(&joint) {
                    folded.insert(joint);
                }
            }
            Command::PreviewPass(pass, step) => self.bench.preview = Some((pass, *step)),
            Command::GoToStep(step) => self.go_to_step(step),
            Command::Dismiss(index) => {
                if index < self.messages.len() {
                    self.messages.remove(index);
                }
            }
            Command::UnfoldMessage(index) => {
                if let Some(message) = self.messages.get_mut(index) {
                    message.is_unfolded ^= true;
                }
            }
            Command::SetCamera(camera) => self.bench.session.camera = camera,
            Command::FigureIsFitted { camera, follows } => {
                self.bench.session.camera = camera;
                self.bench.session.follows = follows;
                self.bench.session.fit = None;
            }
            Command::HoverJoint(joint) => self.pictures.hovered = Some(joint),
            Command::OpenFiles(paths) => self.open_or_ask(Then::Open(paths)),
            Command::OpenTable(path, columns, unit) => self.open_table(path, columns, unit),
            Command::SaveTo(path) => self.save_to(path),
            Command::ExportTo { path, has_proof } => self.export_to(path, has_proof),
            Command::RelocateTo(source, path) => self.relocate_to(source, path),
            Command::UseSkeleton(path) => self.use_skeleton(path),
            Command::ChooseRest(rest) => {
                if let Some(source) = self.bench.work().map(|work| work.source) {
                    self.edit(&Edit::ChooseRest { source, rest: Some(rest) });
                }
            }
            Command::Browse(purpose) => self.browse(purpose, ctx),
            Command::CloseDialog => {
                self.dialog = None;
                self.after_save = None;
                self.discarded = None;
            }
            Command::SaveAndGoOn => self.save_and_go_on(),
            Command::DiscardAndGoOn => self.discard_and_go_on(ctx),
            Command::Cancel(slot) => self.stop(slot),
            Command::Settings(command) => self.run_settings(&command, ctx),
            Command::Time(command) => self.run_time(command),
            Command::Blend(command) => self.run_blend(command),
            Command::Carry(command) => self.run_carry(command),
            Command::Space(command) => self.run_space(command),
        }
    }

    fn act(&mut self, action: Action, ctx: &Context) {
        use Action as A;
        let now = self.situation();
        if !(action.entry().is_available)(&now) {
            return;
        }
        match action {
            A::Open => self.open_or_ask(Then::AskForFiles),
            A::OpenPath => self.open_or_ask(Then::AskForPath),
            A::OpenDemo => self.open_or_ask(Then::OpenDemo),
            A::ChooseClip => self.show_dialog(Dialog::ChooseClip),
            A::Save => self.save(),
            A::SaveAs => self.ask_where_to_save(),
            A::Export => self.ask_where_to_export(),
            A::Relocate => self.ask_for_source(),
            A::TableSkeleton => self.ask_for_skeleton(),
            A::Quit => {
                if super::Screen::close_requested(self) {
                    self.should_close = true;
                }
            }
            A::Undo | A::Redo => self.step_history(action == A::Redo),
            A::History => self.show_dialog(Dialog::History),
            A::AddResample => self.add_pass(Offer::Resample),
            A::AddLimits => self.add_pass(Offer::Limits),
            A::AddSmooth => self.add_pass(Offer::Smooth),
            A::AddReduce => self.add_pass(Offer::Reduce),
            A::Fit => self.bench.session.fit = Some(Fit::Again),
            A::Follow => {
                self.bench.session.follows ^= true;
                self.bench.session.fit = Some(Fit::Again);
            }
            A::Parallel => {
                let lens = &mut self.bench.session.camera.lens;
                *lens = if *lens == Lens::Perspective { Lens::Orthographic } else { Lens::Perspective };
            }
            A::LookXy => self.bench.session.camera.look_straight(StraightView::Xy),
            A::LookZx => self.bench.session.camera.look_straight(StraightView::Zx),
            A::LookYz => self.bench.session.camera.look_straight(StraightView::Yz),
            A::LookXyBack => self.bench.session.camera.look_straight(StraightView::XyBack),
            A::LookZxBack => self.bench.session.camera.look_straight(StraightView::ZxBack),
            A::LookYzBack => self.bench.session.camera.look_straight(StraightView::YzBack),
            A::PlaneAngles => self.bench.session.show_curves(CurveView::PlaneAngles),
            A::SwingTwist => self.bench.session.show_curves(CurveView::SwingTwist),
            A::FileNumbers => self.bench.session.show_curves(CurveView::FileNumbers),
            A::TurnRate => self.bench.session.show_curves(CurveView::TurnRate),
            A::HeatTurnRate => self.bench.session.heat_kind = HeatKind::TurnRate,
            A::HeatChange => self.bench.session.heat_kind = HeatKind::Change,
            A::WorstFirst => self.bench.session.worst_first ^= true,
            A::HeatLimitUse => self.bench.session.heat_kind = HeatKind::LimitUse,
            A::FoldLimbs | A::UnfoldLimbs => self.fold_limbs(action == A::FoldLimbs),
            A::WholeTime | A::NearerTime | A::FartherTime => self.zoom_time(action),
            A::ShowBefore => self.bench.session.shows_before ^= true,
            A::SourceAlone => self.bench.session.source_alone ^= true,
            A::Light => self.switch_light(ctx),
            A::PreviousJoint | A::NextJoint => self.step_joint(action == A::NextJoint),
            A::FindAgain => self.find_again(),
            A::StopFinding => self.stop(super::jobs::Slot::Survey),
            A::PreviousSnag | A::NextSnag => self.step_snag(action == A::NextSnag),
            A::Mend => self.mend_chosen(),
            A::MendKind => self.mend_kind(),
            A::MendSafe => self.mend_safe(),
            A::TakeBack => self.take_back(),
            A::Leave => self.leave_or_reconsider(),
            A::LookAtMend => self.bench.session.looks ^= true,
            A::NoLimits => self.set_no_limits(),
            A::AdultLimits => self.work_out_limits(LimitsFrom::Adult),
            A::LearnLimits => self.work_out_limits(LimitsFrom::Clip),
            A::LimitsFile => self.ask_for_limits(),
            A::IsLoop | A::FindSlides => self.switch_search(action == A::IsLoop),
            A::Curve(action) => {
                if matches!(action, CurveAction::Copy | CurveAction::Cut) {
                    ctx.copy_text(self.copied_text());
                }
                self.act_on_curves(action);
            }
            A::Play => self.play_or_pause(),
            A::StepBack | A::StepForward => self.step_frame(action == A::StepForward),
            A::PreviousKey | A::NextKey => self.step_key(action == A::NextKey),
            A::First | A::Last => self.go_to_end(action == A::Last),
            A::Loop => self.bench.session.playback.is_looping ^= true,
            A::LoopFrom | A::LoopTo => self.loop_here(action == A::LoopTo),
            A::LoopAll => self.set_loop_range(None),
            A::Slower | A::Faster => self.step_speed(action == A::Faster),
            A::ChooseFrom | A::ChooseTo => self.choose_from_playhead(action == A::ChooseTo),
            A::ChooseLimb => self.choose_limb(),
            A::ChooseAll => self.choose(TimeChoice::default()),
            A::PlayChoice => self.play_choice(),
            A::ShowChoice => self.show_choice(),
            A::AddMarker => self.add_marker(),
            A::RenameMarker => self.ask_marker_name_here(),
            A::RemoveMarker => self.remove_marker_here(),
            A::PreviousMarker | A::NextMarker => self.step_marker(action == A::NextMarker),
            A::Larger | A::Smaller | A::UsualSize => self.zoom_window(action, ctx),
            A::UsualLayout => self.memory.settings.layout = Layout::default(),
            A::ShowHints => self.memory.settings.hints_read.clear(),
            A::Explain => self.show_dialog(Dialog::Help),
            A::Shortcuts => self.show_dialog(Dialog::Shortcuts),
            A::WhatsNew => self.show_dialog(Dialog::WhatsNew),
            A::About => self.show_dialog(Dialog::About),
            A::BlendIn => self.show_dialog(Dialog::Blend),
            A::MakeLoop => {
                let (work, step) = (self.bench.session.work, LoopPass::default().into());
                let pass = self.bench.work().map(ClipWork::next_pass_id);
                self.edit(&Edit::AddPass { work, step, at: usize::MAX });
                self.open_pass(pass);
            }
            A::BlendLane => self.bench.session.blend.shows_lane ^= true,
            A::BlendClips => self.bench.session.blend.shows_clips ^= true,
            A::Retarget => self.retarget(),
            A::Space(action) => self.act_in_space(action),
        }
    }

    pub(super) fn situation(&mut self) -> super::commands::Situation {
        let is_finding = self.jobs.is_running(super::jobs::Slot::Survey);
        self.bench.situation(is_finding, self.is_light)
    }

    pub(super) fn show_dialog(&mut self, dialog: Dialog) {
        self.form = Form::default();
        self.dialog = Some(dialog);
    }

    /// Tells something. A message that is there already is not told twice.
    pub(super) fn tell(&mut self, message: Message) {
        /// Older ones than this go by themselves.
        const MOST: usize = 8;
        self.messages.retain(|known| !known.tells_same(&message));
        self.messages.push(message);
        if self.messages.len() > MOST {
            self.messages.remove(0);
        }
    }

    /// Changes the document.
    pub(super) fn edit(&mut self, edit: &Edit) {
        self.bench.preview = None;
        self.bench.trial = None;
        self.bench.curve_hand.let_go();
        let Some(project) = &mut self.bench.project else { return };
        if let Err(error) = project.history.commit(edit) {
            self.tell(Message::error(format!("{}: {error}", edit.label())));
        }
        self.follow_document();
    }

    /// Brings the open files in line with what the document says of them.
    fn follow_document(&mut self) {
        let chosen = self.chosen_label();
        let Some(project) = &mut self.bench.project else { return };
        let others = project.follow_readings();
        let is_shown = self.bench.work().is_some_and(|work| others.contains(&work.source));
        if !others.is_empty() {
            self.asked.survey = None;
        }
        if is_shown {
            self.show_other_joints(chosen.map(|(_, label)| label));
        }
    }

    fn step_history(&mut self, forward: bool) {
        let Some(project) = &mut self.bench.project else { return };
        if forward {
            project.history.redo();
        } else {
            project.history.undo();
        }
        self.bench.preview = None;
        self.bench.trial = None;
        self.bench.curve_hand.let_go();
        self.follow_document();
    }

    fn go_to_step(&mut self, step: usize) {
        let Some(project) = &mut self.bench.project else { return };
        while project.history.steps().1 > step && project.history.undo() {}
        while project.history.steps().1 < step && project.history.redo() {}
        self.bench.preview = None;
        self.bench.trial = None;
        self.bench.curve_hand.let_go();
        self.follow_document();
    }

    fn switch_light(&mut self, ctx: &Context) {
        self.is_light ^= true;
        ctx.set_theme(if self.is_light { egui::ThemePreference::Light } else { egui::ThemePreference::Dark });
    }

    fn show_clip(&mut self, work: usize) {
        let Some(project) = &self.bench.project else { return };
        if work >= project.document().works.len() || work == self.bench.session.work {
            return;
        }
        let clip = project.source_clip(work).cloned();
        self.bench.session.turn_to(work, clip.as_deref());
        self.bench.preview = None;
        self.bench.trial = None;
        self.bench.curve_hand.let_go();
    }

    pub(super) fn choose_joint(&mut self, joint: Option<usize>) {
        let session = &mut self.bench.session;
        if session.joint != joint || !session.more_joints.is_empty() {
            session.curves = session.curves.without_choice();
            self.bench.curve_hand.let_go();
        }
        session.joint = joint;
        session.more_joints.clear();
        if session.filter.joint.is_some() {
            session.filter.joint = joint;
        }
        self.pictures.scroll_to_joint = joint;
    }

    /// Goes up or down in the list of joints.
    fn step_joint(&mut self, down: bool) {
        let Some(clip) = self.bench.result() else { return };
        let listed: Vec<usize> = clip.skeleton.listed().collect();
        let place = self.bench.session.joint.and_then(|joint| listed.iter().position(|&own| own == joint));
        let next = match place {
            None => 0,
            Some(place) if down => (place + 1).min(listed.len().saturating_sub(1)),
            Some(place) => place.saturating_sub(1),
        };
        if let Some(&joint) = listed.get(next) {
            self.choose_joint(Some(joint));
        }
    }
}

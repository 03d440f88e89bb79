//! Edits on the rotation curves: gestures, the menu *Keys*, and what is typed.

use std::fmt::Write as _;
use std::sync::Arc;

use super::super::bench::FromClips;
use super::super::commands::{CurveAction, CurveCommand};
use super::super::curve_hand::ShownStroke;
use super::super::panels::Message;
use super::super::view_models::{
    CurveKey, CurveSet, Grip, KeyBase, KeyChoice, KeyDrag, Stroke, counted, fitted_values, key_at,
    local_curves, with_more, with_more_pushes, with_shaping,
};
use super::super::window::Window;
use crate::clip::{
    Clip, CopiedKeys, KeyChange, KeyEdit, NewKey, PathKind, RotationTrack, Smoothing, Spacing, Stored,
};
use crate::scene::{ClipWork, Edit, KeysPass, PassStep, PushPass, ReducePass, Scope, SmoothPass};
use crate::skeleton::Mirror;

/// The shortest and the longest reach of a push, seconds.
const REACH_SECS: [f64; 2] = [0.02, 30.0];
/// So much a key on the keyboard turns, degrees.
const STEP_DEG: f64 = 1.0;
/// Tells the strokes of this area from those of others.
const STROKE: u64 = 0x4355_5256_0000_0000;

impl Window {
    pub(super) fn run_curve(&mut self, command: CurveCommand) {
        let session = &mut self.bench.session;
        match command {
            CurveCommand::Choose(keys) => self.choose_keys(keys),
            CurveCommand::ChooseSegment(segment) => {
                session.curves.segment = segment;
                if segment.is_some() {
                    session.curves.keys = KeyChoice::default();
                }
                self.bench.curve_hand.serial += 1;
            }
            CurveCommand::ChooseLine(line) => session.curves.line = line,
            CurveCommand::Try(drag) => self.try_drag(drag),
            CurveCommand::Settle(drag) => self.settle_drag(&drag),
            CurveCommand::GiveUp => {
                self.bench.trial = None;
                self.bench.curve_hand.let_go();
            }
            CurveCommand::SetPath(kind) => self.set_path(kind),
            CurveCommand::SetSpacing(spacing) => self.set_spacing(spacing),
            CurveCommand::ShowValues(values) => {
                session.curves.values = values.filter(|[low, high]| high - low > 1e-6 && (high - low) < 1e7);
            }
            CurveCommand::SetFalloff(secs) => {
                session.falloff_secs = secs.clamp(REACH_SECS[0], REACH_SECS[1]);
            }
            CurveCommand::SetSmoothing(hertz) => session.curves.smooth_hz = hertz.clamp(0.05, 1000.0),
            CurveCommand::SetReduction(degrees) => session.curves.reduce_deg = degrees.clamp(0.0, 45.0),
        }
    }

    pub(super) fn act_on_curves(&mut self, action: CurveAction) {
        use CurveAction as C;
        match action {
            C::Add => self.add_keys(),
            C::Delete => self.delete_keys("Delete"),
            C::Cut => {
                self.copy_keys();
                self.delete_keys("Cut");
            }
            C::Copy => self.copy_keys(),
            C::Paste | C::PasteMirrored => self.paste_keys(action == C::PasteMirrored),
            C::ChooseAll => self.choose_within([f64::NEG_INFINITY, f64::INFINITY]),
            C::ChooseNone => self.choose_keys(KeyChoice::default()),
            C::ChooseHere => self.choose_here(),
            C::ChooseRange => {
                if let Some(span) = self.chosen_span() {
                    self.choose_within(span);
                }
            }
            C::ChooseSegment => self.choose_segment_here(),
            C::OneSegment => self.make_one_segment(),
            C::MoreAbove | C::MoreBelow => self.add_neighbour(action == C::MoreBelow),
            C::NextLine => {
                let count = self.bench.curve_sets().first().map_or(1, |set| set.lines.len().clamp(1, 3));
                let line = &mut self.bench.session.curves.line;
                *line = (*line + 1) % count;
            }
            C::Earlier | C::Later => self.nudge_time(action == C::Later),
            C::Up | C::Down => self.nudge_value(if action == C::Up { STEP_DEG } else { -STEP_DEG }),
            C::Tighter | C::Looser => self.nudge_scale(action == C::Looser),
            C::Hold => self.set_path(PathKind::Hold),
            C::Slerp => self.set_path(PathKind::Slerp),
            C::Squad => self.set_path(PathKind::Squad),
            C::Spline => self.set_path(PathKind::Spline),
            C::BSpline => self.set_path(PathKind::BSpline),
            C::Even => self.set_spacing(Spacing::Even),
            C::EaseIn => self.set_spacing(Spacing::EaseIn),
            C::EaseOut => self.set_spacing(Spacing::EaseOut),
            C::EaseBoth => self.set_spacing(Spacing::EaseBoth),
            // The other way round from a turn and `n` more is the one that has `n + 1` whole turns the other way.
            C::OtherWay => self.set_turns("Go the other way round", |whole| -1 - whole),
            C::TurnMore => self.set_turns("One turn more", |whole| whole + 1),
            C::TurnLess => self.set_turns("One turn less", |whole| whole - 1),
            C::Smooth => self.smooth_range(),
            C::Reduce => self.reduce_range(),
            C::Snap => self.bench.session.curves.snaps_to_frames ^= true,
            C::FitValues => self.bench.session.curves.values = None,
            C::NearerValues => self.zoom_values(0.5, 0.0),
            C::FartherValues => self.zoom_values(2.0, 0.0),
            C::ValuesUp => self.zoom_values(1.0, 0.25),
            C::ValuesDown => self.zoom_values(1.0, -0.25),
        }
    }

    /// Chooses keys; a segment that was chosen before is let go, for one thing is chosen at a time.
    pub(super) fn choose_keys(&mut self, keys: KeyChoice) {
        self.bench.session.curves.keys = keys;
        self.bench.session.curves.segment = None;
        self.bench.curve_hand.serial += 1;
    }

    /// The result of the document as it is, run at once where the worker has not come to it yet: what a hand does next builds
    /// on what it did before.
    fn settled_result(&mut self) -> Option<Arc<Clip>> {
        let work = self.bench.session.work;
        let passes = self.bench.work()?.passes.clone();
        let project = self.bench.project.as_ref()?;
        if let Some(known) = self.bench.findings().and_then(|findings| findings.came_of(&passes)) {
            return Some(Arc::clone(&known.evaluation.result));
        }
        if passes.is_empty() {
            return self.bench.source().cloned();
        }
        Some(project.library().evaluate_with(work, &passes)?.result)
    }

    pub(super) fn key_base(&mut self) -> Option<KeyBase> {
        let clip = self.settled_result()?;
        // Numbers of an older result would undo what was done since.
        let of_now = |curves: &&FromClips<CurveKey, Arc<CurveSet>>| {
            curves.result.same_joint(&clip, curves.parameters.joint)
        };
        let known = self.bench.curves.iter().chain(&self.bench.more_curves).filter(of_now);
        let view = self.bench.session.curve_view;
        let of_view = known.filter(|curves| curves.parameters.view == view);
        let sets = of_view.map(|curves| Arc::clone(&curves.value)).collect();
        let limits = self.bench.limits().cloned();
        let session = &self.bench.session;
        Some(KeyBase {
            clip,
            sets,
            view,
            limits,
            choice: session.curves.keys.clone(),
            snaps_to_frames: session.curves.snaps_to_frames,
        })
    }

    fn try_drag(&mut self, drag: KeyDrag) {
        if self.bench.curve_hand.base.is_none() {
            self.bench.session.playback.is_playing = false;
            self.bench.trial = None;
            self.bench.curve_hand.base = self.key_base();
        }
        let Some(base) = self.bench.curve_hand.base.clone() else { return };
        let (stroke, choice) = base.stroke(&drag);
        self.show_stroke(&base, stroke, Some(drag), choice, true);
    }

    fn settle_drag(&mut self, drag: &KeyDrag) {
        let Some(base) = self.bench.curve_hand.base.take().or_else(|| self.key_base()) else { return };
        let (stroke, choice) = base.stroke(drag);
        let count = counted(base.choice.len(), "key");
        let label = match drag {
            KeyDrag::Move { by_secs, by_deg, .. } if *by_deg == 0.0 => {
                format!("Move {count} by {by_secs:+.3} s")
            }
            KeyDrag::Move { by_deg, .. } => format!("Turn {count} by {by_deg:+.1}°"),
            KeyDrag::Scale { factor, .. } => format!("Draw {count} to {:.0} % of their time", factor * 100.0),
            KeyDrag::Space { .. } => "Spacing of a segment".to_owned(),
            KeyDrag::Push { by_deg, grip, .. } => {
                format!("Push {} by {by_deg:+.1}°", base.clip.skeleton.label(grip.joint))
            }
        };
        self.commit_stroke(&base, stroke, choice, label, None);
    }

    /// Shows what a stroke does: its surroundings on the curves at once, all of it as soon as it is worked out.
    fn show_stroke(
        &mut self,
        base: &KeyBase,
        stroke: Stroke,
        drag: Option<KeyDrag>,
        choice: KeyChoice,
        is_trial: bool,
    ) {
        let seen = match &stroke {
            Stroke::Keys(edits) => Stroke::Keys(with_shaping(&base.clip, self.bench.last_key_edits(), edits)),
            Stroke::Pushes(_) => stroke.clone(),
        };
        let local = |joint: usize| {
            let known = base.sets.iter().find(|set| set.joint == joint);
            local_curves(&base.clip, &self.bench.curve_key(joint), &seen, known.map(|set| &**set))
        };
        let shown = self.bench.session.joints();
        let locals = stroke.joints().into_iter().filter(|joint| shown.contains(joint)).filter_map(local);
        let locals = locals.collect();
        if is_trial && let Some(work) = self.bench.work() {
            let edit = edit_of(self.bench.session.work, work, &base.clip, &stroke);
            let document = self.bench.project.as_ref().map(|project| Arc::clone(project.document()));
            let tried = document.and_then(|document| edit.apply(&document).ok());
            // What does not fit is told when it is let go.
            self.bench.trial =
                tried.map(|mut tried| std::mem::take(&mut tried.works[self.bench.session.work].passes));
        }
        self.bench.curve_hand.shown = Some(ShownStroke { stroke, drag, choice, locals });
    }

    /// Does a stroke, as one step of the history; with `run` it goes on with the strokes of that number.
    fn commit_stroke(
        &mut self,
        base: &KeyBase,
        stroke: Stroke,
        choice: KeyChoice,
        label: String,
        run: Option<u64>,
    ) {
        self.bench.trial = None;
        self.bench.preview = None;
        let work = self.bench.session.work;
        let Some(own) = self.bench.work() else { return };
        if stroke.is_empty() {
            self.bench.curve_hand.shown = None;
            return;
        }
        let edit = Edit::Together { label, edits: vec![edit_of(work, own, &base.clip, &stroke)] };
        let Some(project) = &mut self.bench.project else { return };
        let done = match run {
            Some(run) => {
                project.history.commit_stroke(&edit, STROKE ^ (self.bench.curve_hand.serial << 8) ^ run)
            }
            None => project.history.commit(&edit),
        };
        if let Err(error) = done {
            self.tell(Message::error(format!("{}: {error}", edit.label())));
            self.bench.curve_hand.let_go();
            return;
        }
        self.bench.session.curves.keys = choice.clone();
        if run.is_none() {
            self.bench.curve_hand.serial += 1;
        }
        self.show_stroke(base, stroke, None, choice, false);
    }

    pub(super) fn commit_keys(&mut self, base: &KeyBase, edits: Vec<KeyEdit>, label: String) {
        let choice = base.choice.clone();
        self.commit_stroke(base, Stroke::Keys(edits), choice, label, None);
    }

    /// Takes away what is drawn in front once the worker has drawn it all.
    pub(in super::super) fn settle_curves(&mut self) {
        if self.bench.curve_hand.shown.is_none() || self.bench.curve_hand.base.is_some() {
            return;
        }
        let passes = self.bench.work().map(|work| &work.passes);
        let known = self.bench.findings().and_then(|findings| findings.evaluated.as_ref());
        let is_evaluated = known.zip(passes).is_some_and(|(known, passes)| known.passes == *passes);
        let result = self.bench.result();
        let is_drawn =
            |curves: &FromClips<_, _>| result.is_some_and(|result| Arc::ptr_eq(&curves.result, result));
        if is_evaluated && self.bench.curves.as_ref().is_none_or(is_drawn) {
            self.bench.curve_hand.shown = None;
        }
    }

    fn add_keys(&mut self) {
        let Some(base) = self.key_base() else { return };
        let secs = self.bench.session.playback.playhead_secs;
        let (mut edits, mut choice) = (Vec::new(), KeyChoice::default());
        for joint in self.bench.session.joints() {
            choice.add(joint, [secs]);
            let near = 0.25 / base.clip.grid.rate.max(1e-6);
            let has_one = base.clip.rotation(joint).is_some_and(|track| {
                !track.times.is_empty() && (track.times.at(track.times.nearest(secs)) - secs).abs() <= near
            });
            if !has_one {
                edits.push(KeyEdit { joint, change: KeyChange::Insert(vec![NewKey { secs, rotor: None }]) });
            }
        }
        if edits.is_empty() {
            self.tell(Message::note("There is a key at the playhead already".to_owned()));
            self.choose_keys(choice);
            return;
        }
        let label = format!("Add {}", counted(edits.len(), "key"));
        self.commit_stroke(&base, Stroke::Keys(edits), choice, label, None);
    }

    fn delete_keys(&mut self, verb: &str) {
        let Some(base) = self.key_base() else { return };
        let edit =
            |(joint, times): (usize, &[f64])| KeyEdit { joint, change: KeyChange::Delete(times.to_vec()) };
        let edits: Vec<KeyEdit> = base.choice.rows().map(edit).collect();
        let label = format!("{verb} {}", counted(base.choice.len(), "key"));
        self.commit_stroke(&base, Stroke::Keys(edits), KeyChoice::default(), label, None);
    }

    fn copy_keys(&mut self) {
        let Some(base) = self.key_base() else { return };
        let keys = if base.choice.is_empty() {
            let now = self.bench.session.playback.playhead_secs;
            CopiedKeys::of_pose(&base.clip, now, &self.bench.session.joints())
        } else {
            let row = |(joint, times): (usize, &[f64])| {
                let track = base.clip.rotation(joint)?;
                Some((joint, times.iter().filter_map(|&secs| key_at(track, secs)).collect()))
            };
            let rows: Vec<(usize, Vec<usize>)> = base.choice.rows().filter_map(row).collect();
            CopiedKeys::of(&base.clip, &rows)
        };
        self.bench.curve_hand.copy(&base.clip, keys);
    }

    fn paste_keys(&mut self, mirrored: bool) {
        let Some(base) = self.key_base() else { return };
        let Some(keys) = self.bench.curve_hand.copied_for(&base.clip).cloned() else { return };
        let keys = if mirrored {
            let Some(mirror) = Mirror::of(&base.clip.skeleton) else {
                let words = "Nothing in this skeleton stands opposite of anything: keys can't be mirrored";
                self.tell(Message::error(words.to_owned()));
                return;
            };
            keys.mirrored(&mirror)
        } else {
            keys
        };
        let edits = keys.pasted_at(self.bench.session.playback.playhead_secs);
        let mut choice = KeyChoice::default();
        for edit in &edits {
            if let KeyChange::Insert(new) = &edit.change {
                choice.add(edit.joint, new.iter().map(|key| key.secs));
            }
        }
        // What was put down is to be seen.
        let joints: Vec<usize> = choice.rows().map(|(joint, _)| joint).collect();
        let session = &mut self.bench.session;
        if !joints.iter().all(|&joint| session.has_joint(joint)) {
            session.joint = joints.first().copied();
            session.more_joints = joints.get(1..).unwrap_or_default().to_vec();
        }
        let label =
            format!("Paste {}{}", counted(choice.len(), "key"), if mirrored { " mirrored" } else { "" });
        self.commit_stroke(&base, Stroke::Keys(edits), choice, label, None);
    }

    /// The text that goes to the desktop's clipboard with copied keys, so that a table program can take them as well.
    pub(in super::super) fn copied_text(&self) -> String {
        let Some(clip) = self.bench.result() else { return String::new() };
        let mut text = String::from("joint,time_s,yz,zx,xy\n");
        for (joint, times) in self.bench.session.curves.keys.rows() {
            let Some(track) = clip.rotation(joint) else { continue };
            for key in times.iter().filter_map(|&secs| key_at(track, secs)).take(10_000) {
                let [yz, zx, xy] = track.sound_key(key).plane_angles().to_degrees();
                let (label, secs) = (clip.skeleton.label(joint), track.times.at(key));
                // Writing to a string does not fail.
                let _ = writeln!(text, "{label},{secs:.6},{yz:.6},{zx:.6},{xy:.6}");
            }
        }
        text
    }

    fn choose_within(&mut self, [from, to]: [f64; 2]) {
        let Some(clip) = self.bench.result().cloned() else { return };
        let mut choice = KeyChoice::default();
        for joint in self.bench.session.joints() {
            if let Some(track) = clip.rotation(joint) {
                choice.add(joint, track.times.iter().filter(|secs| (from - 1e-9..=to + 1e-9).contains(secs)));
            }
        }
        self.choose_keys(choice);
    }

    fn choose_here(&mut self) {
        let Some(clip) = self.bench.result().cloned() else { return };
        let now = self.bench.session.playback.playhead_secs;
        let near = 0.5 / clip.grid.rate.max(1e-6);
        let mut choice = self.bench.session.curves.keys.clone();
        for joint in self.bench.session.joints() {
            let Some(track) = clip.rotation(joint).filter(|track| !track.times.is_empty()) else { continue };
            let secs = track.times.at(track.times.nearest(now));
            if (secs - now).abs() <= near {
                choice.toggle(joint, secs);
            }
        }
        self.choose_keys(choice);
    }

    fn add_neighbour(&mut self, below: bool) {
        let Some(clip) = self.bench.result() else { return };
        let listed: Vec<usize> = clip.skeleton.listed().collect();
        let session = &self.bench.session;
        let last = session.more_joints.last().copied().or(session.joint);
        let Some(place) = last.and_then(|joint| listed.iter().position(|&own| own == joint)) else { return };
        let places: Box<dyn Iterator<Item = usize>> =
            if below { Box::new(place + 1..listed.len()) } else { Box::new((0..place).rev()) };
        if let Some(next) = places.map(|place| listed[place]).find(|&joint| !session.has_joint(joint)) {
            self.choose_also(next);
        }
    }

    /// Adds a joint to the chosen ones, or takes it out.
    pub(super) fn choose_also(&mut self, joint: usize) {
        /// More joints than these can't be told apart on one chart.
        const MOST: usize = 8;
        let session = &mut self.bench.session;
        if session.joint.is_none() {
            session.joint = Some(joint);
        } else if session.joint == Some(joint) {
            // The first of the further ones takes its place; one joint stays.
            if !session.more_joints.is_empty() {
                session.joint = Some(session.more_joints.remove(0));
            }
        } else if session.more_joints.contains(&joint) {
            session.more_joints.retain(|&own| own != joint);
        } else if session.more_joints.len() + 1 < MOST {
            session.more_joints.push(joint);
        } else {
            self.tell(Message::note(format!("At most {MOST} joints can be chosen at once")));
        }
        self.bench.curve_hand.let_go();
    }

    fn nudge_time(&mut self, later: bool) {
        let Some(base) = self.key_base() else { return };
        let Some((joint, secs)) =
            base.choice.rows().find_map(|(joint, times)| Some((joint, *times.first()?)))
        else {
            return;
        };
        let step = 1.0 / base.clip.grid.rate.max(1e-6);
        let drag = KeyDrag::Move {
            grip: Grip { joint, secs, line: 0 },
            by_secs: if later { step } else { -step },
            by_deg: 0.0,
        };
        let (stroke, choice) = base.stroke(&drag);
        let label = format!("Move {}", counted(base.choice.len(), "key"));
        self.commit_stroke(&base, stroke, choice, label, Some(1));
    }

    fn nudge_value(&mut self, by_deg: f64) {
        let Some(base) = self.key_base() else { return };
        let session = &self.bench.session;
        let (line, now, reach_secs) =
            (session.curves.line, session.playback.playhead_secs, session.falloff_secs);
        let first = base.choice.rows().find_map(|(joint, times)| Some((joint, *times.first()?)));
        let drag = match (first, session.joint) {
            (Some((joint, secs)), _) => {
                KeyDrag::Move { grip: Grip { joint, secs, line }, by_secs: 0.0, by_deg }
            }
            (None, Some(joint)) => {
                KeyDrag::Push { grip: Grip { joint, secs: now, line }, by_deg, reach_secs }
            }
            (None, None) => return,
        };
        if !base.measure(self.bench.session.joint.unwrap_or_default()).can_move() {
            self.tell(Message::note(
                "These curves can't be moved: look at plane angles, or swing and twist".to_owned(),
            ));
            return;
        }
        let (stroke, choice) = base.stroke(&drag);
        let what = match &stroke {
            Stroke::Keys(_) => format!("Turn {}", counted(base.choice.len(), "key")),
            Stroke::Pushes(_) => "Push by a key".to_owned(),
        };
        self.commit_stroke(&base, stroke, choice, what, Some(2));
    }

    fn nudge_scale(&mut self, out: bool) {
        let Some(base) = self.key_base() else { return };
        let Some([first, last]) = base.choice.span().filter(|[first, last]| last > first) else { return };
        let step = 1.0 / base.clip.grid.rate.max(1e-6);
        let wanted = last + if out { step } else { -step };
        if wanted <= first {
            return;
        }
        let drag = KeyDrag::Scale { about_secs: first, factor: (wanted - first) / (last - first) };
        let (stroke, choice) = base.stroke(&drag);
        let label =
            format!("Draw {} {}", counted(base.choice.len(), "key"), if out { "out" } else { "together" });
        self.commit_stroke(&base, stroke, choice, label, Some(3));
    }

    /// Where smoothing and reduction act: over the chosen keys, else over the chosen stretch of time or the loop, else everywhere; on
    /// the chosen joints.
    fn range_scope(&self) -> Scope {
        let session = &self.bench.session;
        let chosen = session.curves.keys.span().filter(|[first, last]| last > first);
        let span_secs = chosen.or_else(|| self.chosen_span());
        Scope { span_secs, ..Scope::of_joints(session.joints()) }
    }

    /// The chosen stretch of time, else the loop.
    pub(super) fn chosen_span(&self) -> Option<[f64; 2]> {
        let session = &self.bench.session;
        session.choice.span_secs.or(session.playback.range.map(|(from, to)| [from, to]))
    }

    fn smooth_range(&mut self) {
        let scope = self.range_scope();
        // It sets in over a period of what it takes out, or over a quarter of a short range.
        let hertz = self.bench.session.curves.smooth_hz;
        let fade_secs = scope.span_secs.map_or(0.0, |[from, to]| (1.0 / hertz).min((to - from) / 4.0));
        let scope = Scope { fade_secs, ..scope };
        self.put_pass(SmoothPass { scope, ..SmoothPass::new(Smoothing::gaussian(hertz)) }.into());
    }

    fn reduce_range(&mut self) {
        let bound_rad = self.bench.session.curves.reduce_deg.to_radians();
        self.put_pass(ReducePass { scope: self.range_scope(), ..ReducePass::within(bound_rad) }.into());
    }

    fn zoom_values(&mut self, factor: f64, up: f64) {
        let session = &self.bench.session;
        let sets = self.bench.curve_sets();
        let Some([low, high]) = session.curves.values.or_else(|| fitted_values(&sets, session.window)) else {
            return;
        };
        let (middle, span) = (f64::midpoint(low, high), (high - low) * factor);
        let middle = middle + up * (high - low);
        self.run_curve(CurveCommand::ShowValues(Some([middle - span / 2.0, middle + span / 2.0])));
    }
}

/// The edit of the document that does a stroke: more for the last pass, where that is one of the kind, else a new pass behind all
/// others, which works on what was seen.
fn edit_of(work: usize, own: &ClipWork, base: &Clip, stroke: &Stroke) -> Edit {
    let last = own.passes.last().filter(|pass| pass.on);
    let new = |step: PassStep| Edit::AddPass { work, step, at: usize::MAX };
    match stroke {
        Stroke::Keys(edits) => match last.map(|pass| (pass.id, &pass.step)) {
            Some((pass, PassStep::Keys(known))) if goes_on(base, &known.edits, edits) => {
                let step = KeysPass { edits: with_more(&known.edits, edits) }.into();
                Edit::ChangePass { work, pass, step }
            }
            _ => new(KeysPass { edits: edits.clone() }.into()),
        },
        Stroke::Pushes(pushes) => match last.map(|pass| (pass.id, &pass.step)) {
            Some((pass, PassStep::Push(known))) => {
                let pushes = with_more_pushes(&known.pushes, pushes);
                Edit::ChangePass { work, pass, step: PushPass { pushes }.into() }
            }
            _ => new(PushPass { pushes: pushes.clone() }.into()),
        },
    }
}

/// Whether a joint's track keeps the rows of a file, one for each frame.
pub(super) fn has_rows(clip: &Clip, track: &RotationTrack) -> bool {
    track.stored != Stored::Rotors && track.keys.len() >= clip.grid.count()
}

/// Whether edits can follow others in one pass. A track of a file's rows keeps a row for each frame whatever its keys were moved to:
/// what was moved or taken away in one pass is a row again for the next. A path, a spacing and turns between keys that stay can
/// follow what was taken away.
fn goes_on(base: &Clip, known: &[KeyEdit], more: &[KeyEdit]) -> bool {
    let stands_against = |own: &KeyEdit, edit: &KeyEdit| match (&own.change, &edit.change) {
        (
            KeyChange::Delete(gone),
            KeyChange::Path(starts, _) | KeyChange::Space(starts, _) | KeyChange::Turn(starts, _),
        ) => starts.iter().any(|start| gone.contains(start)),
        (KeyChange::Delete(_) | KeyChange::Move(_), _) => true,
        _ => false,
    };
    !more.iter().any(|edit| {
        base.rotation(edit.joint).is_some_and(|track| has_rows(base, track))
            && known.iter().any(|own| own.joint == edit.joint && stands_against(own, edit))
    })
}

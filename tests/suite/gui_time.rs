//! The turn map, the timeline, the passes and the list of snags, driven by accessible labels; what is asserted is document and session.

use std::path::Path;

use egui::{Event, Modifiers, Pos2};
use egui_kittest::Harness;
use egui_kittest::kittest::Queryable as _;
use turnwright::app::commands::{Action, Command, Offer, TimeCommand};
use turnwright::app::view_models::{HeatKind, SnagFilter, TimeChoice, snag_rows, snag_states};
use turnwright::app::{Start, Window};
use turnwright::exchange::ClipAddress;
use turnwright::scene::{ClipWork, PassStep, SmoothPass};
use turnwright::snag::SnagKind;

use crate::support;

use crate::gui_harness::window_harness;

struct Bench<'a>(Harness<'a, Option<Window>>);

impl Bench<'_> {
    fn open(start: Start) -> Self {
        Self::of_size(start, [1440.0, 1700.0], false)
    }

    fn of_size(start: Start, size: [f32; 2], is_light: bool) -> Self {
        let harness = window_harness(size, start);
        let mut bench = Self(harness);
        bench.run();
        if is_light {
            bench.act(Action::Light);
        }
        bench
    }

    fn run(&mut self) {
        self.0.run_steps(4);
    }

    fn window(&self) -> &Window {
        self.0.state().as_ref().expect("the window is made in the first frame")
    }

    fn work(&self) -> &ClipWork {
        self.window().bench().work().expect("a clip")
    }

    fn choice(&self) -> &TimeChoice {
        &self.window().bench().session.choice
    }

    fn ask(&mut self, command: Command) {
        self.0.state_mut().as_mut().expect("a window").ask(command);
        self.run();
    }

    fn act(&mut self, action: Action) {
        self.ask(Command::Do(action));
    }

    #[track_caller]
    fn click(&mut self, label: &str) {
        self.0.get_by_label(label).click();
        self.run();
    }

    fn drag(&mut self, from: Pos2, to: Pos2, modifiers: Modifiers) {
        self.0.event(Event::ModifiersChanged(modifiers));
        self.0.hover_at(from);
        self.0.step();
        self.0.drag_at(from);
        self.0.step();
        for share in [0.5, 1.0] {
            self.0.hover_at(from.lerp(to, share));
            self.0.step();
        }
        self.0.drop_at(to);
        self.0.step();
        self.0.event(Event::ModifiersChanged(Modifiers::NONE));
        self.run();
    }

    fn steps(&self) -> usize {
        self.window().bench().project.as_ref().expect("a project").history.steps().1
    }

    fn titles(&self) -> Vec<String> {
        self.work().passes.iter().map(|pass| pass.step.title()).collect()
    }

    fn smooth(&self) -> &SmoothPass {
        let own = self.work().passes.iter().find_map(|pass| match &pass.step {
            PassStep::Smooth(own) => Some(own),
            _ => None,
        });
        own.expect("a pass that smooths")
    }
}

fn of_file(path: &Path) -> Start {
    Start::Files(vec![ClipAddress { path: path.to_owned(), clip: None }])
}

#[test]
fn a_drag_over_the_map_chooses_where_a_new_pass_acts() {
    let mut bench = Bench::open(Start::Demo);
    let before = bench.window().bench().session.playback.playhead_secs;
    let rows = bench.0.get_by_label("Turn map rows").rect();
    let (from, to) = (rows.left_top() + egui::vec2(60.0, 24.0), rows.left_top() + egui::vec2(200.0, 56.0));
    bench.drag(from, to, Modifiers::COMMAND);
    let choice = bench.choice().clone();
    let joints = choice.joints.clone().expect("joints are chosen");
    let [first, last] = choice.span_secs.expect("a stretch is chosen");
    assert!(joints.len() >= 2, "{joints:?}");
    let window = bench.window().bench().session.window;
    let expected = window.time(f64::from(60.0 / rows.width()));
    assert!((first - expected).abs() < 0.05 && last > first + 0.1, "{first} to {last}, expected {expected}");
    assert_eq!(bench.window().bench().session.playback.playhead_secs, before, "choosing does not scrub");

    bench.act(Action::AddSmooth);
    let scope = bench.smooth().scope.clone();
    assert_eq!((scope.joints, scope.span_secs), (Some(joints.clone()), Some([first, last])));
    assert!(scope.fade_secs > 0.0);
    let bench_ = bench.window().bench();
    let (source, result) = (bench_.source().unwrap(), bench_.result().unwrap());
    for joint in source.skeleton.listed() {
        if !joints.contains(&joint) {
            assert!(source.same_joint(result, joint), "{}", source.skeleton.label(joint));
        }
    }
    bench.act(Action::ChooseAll);
    bench.click("Act on everything");
    assert!(bench.smooth().scope.joints.is_none() && bench.smooth().scope.span_secs.is_none());
}

#[test]
fn the_choice_goes_by_keys_as_well_and_can_be_played_alone() {
    let mut bench = Bench::open(Start::Demo);
    bench.ask(Command::Scrub(0.5));
    bench.0.key_press_modifiers(Modifiers::ALT, egui::Key::OpenBracket);
    bench.run();
    bench.ask(Command::Scrub(1.0));
    bench.0.key_press_modifiers(Modifiers::ALT, egui::Key::CloseBracket);
    bench.run();
    let [first, last] = bench.choice().span_secs.expect("a stretch is chosen");
    assert!((first - 0.5).abs() < 0.02 && (last - 1.0).abs() < 0.02, "{first} to {last}");
    bench.act(Action::PlayChoice);
    let playback = bench.window().bench().session.playback.clone();
    assert_eq!(playback.range, Some((first, last)));
    assert_eq!(playback.playhead_secs, first);
    // The loop goes with the choice.
    bench.ask(Command::Time(TimeCommand::Choose(TimeChoice::default().between(0.2, 0.4))));
    let range = bench.window().bench().session.playback.range.expect("a loop");
    assert!((range.0 - 0.2).abs() < 0.02 && (range.1 - 0.4).abs() < 0.02, "{range:?}");
    bench.act(Action::PlayChoice);
    assert_eq!(bench.window().bench().session.playback.range, None);
    bench.act(Action::ChooseLimb);
    let joint = bench.window().bench().session.joint.expect("a joint");
    assert!(bench.choice().joints.as_ref().is_some_and(|joints| joints.contains(&joint)));
}

#[test]
fn new_passes_stand_in_their_order_and_a_dragged_number_is_one_step() {
    let mut bench = Bench::open(Start::Demo);
    for offer in [Offer::Reduce, Offer::Smooth, Offer::Resample] {
        bench.ask(Command::Time(TimeCommand::AddPass(offer)));
    }
    let titles = bench.titles();
    let begins: Vec<&str> = titles.iter().map(|title| title.split(' ').next().unwrap_or("")).collect();
    assert_eq!(begins, ["Resample", "Smooth", "Reduce"]);

    let smooth = bench.work().passes[1].id;
    bench.ask(Command::Time(TimeCommand::OpenPass(Some(smooth))));
    let cutoff = bench.smooth().smoothing.cutoff_hz;
    let steps = bench.steps();
    let middle = bench.0.get_by_label("Cut-off").rect().center();
    bench.0.hover_at(middle);
    bench.0.step();
    bench.0.drag_at(middle);
    bench.0.step();
    for away in [-20.0, -40.0] {
        bench.0.hover_at(middle + egui::vec2(away, 0.0));
        bench.0.step();
        bench.0.step();
    }
    assert_eq!(bench.smooth().smoothing.cutoff_hz, cutoff, "nothing is recorded while it is dragged");
    assert!(bench.window().bench().preview.is_some(), "what it would give is shown");
    bench.0.drop_at(middle + egui::vec2(-40.0, 0.0));
    bench.run();
    assert!(bench.smooth().smoothing.cutoff_hz < cutoff - 0.5, "{}", bench.smooth().smoothing.cutoff_hz);
    assert_eq!(bench.steps(), steps + 1);
    bench.act(Action::Undo);
    assert_eq!(bench.smooth().smoothing.cutoff_hz, cutoff);
    bench.click("Kernel: average");
    assert_eq!(bench.smooth().smoothing.kernel, turnwright::clip::Kernel::Box);
}

#[test]
fn limbs_fold_to_one_row_and_open_again() {
    let mut bench = Bench::open(Start::Demo);
    let joints = bench.window().bench().source().unwrap().skeleton.listed().count();
    bench.act(Action::FoldLimbs);
    let folded = bench.window().bench().session.folded.clone();
    assert!(!folded.is_empty());
    let rows = bench.0.get_all_by_label_contains("Map row ").count();
    assert!(rows < joints, "{rows} rows of {joints} joints");
    let first = *folded.iter().next().unwrap();
    let name = bench.window().bench().source().unwrap().skeleton.label(first).to_owned();
    bench.click(&format!("Unfold {name} in the map"));
    assert!(!bench.window().bench().session.folded.contains(&first));
    bench.act(Action::UnfoldLimbs);
    assert!(bench.window().bench().session.folded.is_empty());
}

#[test]
fn a_mend_is_looked_at_before_it_is_accepted() {
    let mut bench = Bench::open(Start::Demo);
    let index = bench.window().bench().snags().iter().position(|snag| snag.kind == SnagKind::HalfTurn);
    let index = index.expect("the demo has a half turn");
    bench.ask(Command::ChooseSnag(index));
    let joint = bench.window().bench().snags()[index].joint;
    let differs = |bench: &Bench<'_>| {
        let own = bench.window().bench();
        !own.source().unwrap().same_joint(own.result().unwrap(), joint)
    };
    assert!(!differs(&bench));
    bench.click("Look at mend");
    assert!(differs(&bench), "the figure and the curves show the mend");
    assert!(bench.work().passes.is_empty(), "nothing is accepted yet");
    assert_eq!(bench.steps(), 0);
    bench.click("Mend");
    assert!(differs(&bench) && bench.work().passes.len() == 1);
    bench.act(Action::Undo);
    bench.click("Look at mend");
    assert!(!differs(&bench), "what was looked at is gone");
}

#[test]
fn what_is_looked_for_is_part_of_the_scene_and_looked_for_anew() {
    let Some(path) = support::shared("data/bvh/cmu_05_06_dance.bvh") else { return };
    let mut bench = Bench::open(of_file(&path));
    let usual = bench.window().bench().snags().len();
    bench.act(Action::IsLoop);
    assert!(bench.work().search.is_loop);
    let has = |bench: &Bench<'_>, kind| bench.window().bench().snags().iter().any(|snag| snag.kind == kind);
    assert!(has(&bench, SnagKind::Seam), "a dance is no loop");
    bench.act(Action::Undo);
    assert!(!has(&bench, SnagKind::Seam));
    assert_eq!(bench.window().bench().snags().len(), usual);
    bench.act(Action::AdultLimits);
    assert_eq!(bench.work().limits.as_ref().map(|limits| limits.title.as_str()), Some("adult"));
    let searched = bench.window().bench().findings().unwrap().searched.clone().expect("searched");
    assert_eq!(searched.limits, bench.work().limits);
    bench.act(Action::LearnLimits);
    assert_eq!(bench.work().limits.as_ref().unwrap().title, "learned from this clip");
    bench.act(Action::HeatLimitUse);
    let heat = bench.window().bench().heat.as_ref().expect("a map").value.clone();
    assert_eq!(heat.kind, HeatKind::LimitUse);
    assert!(heat.limits.as_ref().is_some_and(|(_, is_preset)| !is_preset));
    bench.act(Action::NoLimits);
    assert!(bench.work().limits.is_none());
    let heat = bench.window().bench().heat.as_ref().expect("a map").value.clone();
    assert!(
        heat.limits.as_ref().is_some_and(|(_, is_preset)| *is_preset),
        "the preset stands in, and says so"
    );
    bench.act(Action::AddLimits);
    assert!(
        bench.titles().iter().any(|title| title.starts_with("Soft limits adult")),
        "{:?}",
        bench.titles()
    );
}

#[test]
fn markers_are_added_named_jumped_to_and_undone() {
    let mut bench = Bench::open(Start::Demo);
    for secs in [1.0, 0.4] {
        bench.ask(Command::Scrub(secs));
        bench.click("Add marker");
    }
    let names = |bench: &Bench<'_>| -> Vec<String> {
        bench.work().markers.iter().map(|marker| marker.name.clone()).collect()
    };
    assert_eq!(names(&bench), ["Marker 2", "Marker 1"], "in the order of their times");
    bench.ask(Command::Time(TimeCommand::AskMarkerName(0)));
    bench.0.get_by_label("Name").focus();
    bench.run();
    bench.0.key_press_modifiers(Modifiers::COMMAND, egui::Key::A);
    bench.0.get_by_label("Name").type_text("left foot down");
    bench.run();
    bench.click("Rename");
    assert_eq!(names(&bench), ["left foot down", "Marker 1"]);
    bench.act(Action::First);
    bench.act(Action::NextMarker);
    assert!((bench.window().bench().session.playback.playhead_secs - 0.4).abs() < 0.02);
    bench.act(Action::NextMarker);
    assert!((bench.window().bench().session.playback.playhead_secs - 1.0).abs() < 0.02);
    bench.act(Action::RemoveMarker);
    assert_eq!(names(&bench), ["left foot down"]);
    bench.act(Action::Undo);
    assert_eq!(names(&bench).len(), 2);
    bench.0.get_by_label_contains("Marker Marker 1,").click();
    bench.run();
    assert!((bench.window().bench().session.playback.playhead_secs - 1.0).abs() < 0.02);
}

#[test]
fn the_list_of_snags_is_filtered_by_size() {
    let mut bench = Bench::open(Start::Demo);
    bench.ask(Command::SetFilter(SnagFilter { least_deg: 90, ..SnagFilter::default() }));
    let own = bench.window().bench();
    let (snags, session) = (own.snags(), &own.session);
    let states = snag_states(snags, bench.work());
    let rows = snag_rows(own.source().unwrap(), snags, &states, &session.filter, session.order);
    let small = snags.iter().filter(|snag| snag.size_rad.to_degrees() < 90.0).count();
    assert!(
        small > 0 && small < snags.len(),
        "the demo has large and small snags: {small} of {}",
        snags.len()
    );
    assert_eq!(rows.len(), snags.len() - small);
    assert_eq!(bench.0.get_all_by_label_contains("Snag ").count(), rows.len());
    bench.0.get_by_label("Least size");
}

//! The turn map, the timeline, the passes and the list of snags, driven by accessible labels; what is asserted is document and session.

use std::path::Path;
use std::sync::Arc;

use egui::{Event, Modifiers};
use egui_kittest::kittest::{NodeT as _, Queryable as _};
use turnwright::app::Start;
use turnwright::app::commands::{Action, Command, Offer, TimeCommand};
use turnwright::app::view_models::{HeatKind, SnagFilter, TimeChoice, snag_rows, snag_states};
use turnwright::clip::{Push, PushFrame};
use turnwright::exchange::{ClipAddress, disk};
use turnwright::limit::{Interval, JointLimit, Limits, Range, SwingLimit};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::scene::{ClipWork, Edit, PassStep, PushPass, SmoothPass};
use turnwright::snag::SnagKind;

use crate::support;

use crate::gui_harness::Bench;

impl Bench<'_> {
    fn work(&self) -> &ClipWork {
        self.window().bench().work().expect("a clip")
    }

    fn choice(&self) -> &TimeChoice {
        &self.window().bench().session.choice
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

/// A window so high that all lists have room.
fn tall(start: Start) -> Bench<'static> {
    Bench::of_size(start, [1440.0, 1700.0])
}

fn of_file(path: &Path) -> Start {
    Start::Files(vec![ClipAddress { path: path.to_owned(), clip: None }])
}

#[test]
fn a_drag_over_the_map_chooses_where_a_new_pass_acts() {
    let mut bench = tall(Start::Demo);
    let before = bench.window().bench().session.playback.playhead_secs;
    let rows = bench.0.get_by_label("Turn map rows").rect();
    let (from, to) = (rows.left_top() + egui::vec2(60.0, 24.0), rows.left_top() + egui::vec2(200.0, 56.0));
    bench.drag(&[from, to], Modifiers::COMMAND);
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
    let mut bench = tall(Start::Demo);
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
    let mut bench = tall(Start::Demo);
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
    let mut bench = tall(Start::Demo);
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
    let mut bench = tall(Start::Demo);
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
    let mut bench = tall(of_file(&path));
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
    let mut bench = tall(Start::Demo);
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
    // A drag moves one, as one step; past another they change places.
    let (rail, steps) = (bench.0.get_by_label("Scrub bar").rect(), bench.steps());
    let flag = bench.0.get_by_label_contains("Marker left foot down,").rect().center();
    bench.drag(&[flag, egui::pos2(rail.center().x, flag.y)], Modifiers::NONE);
    assert_eq!(
        (bench.steps(), names(&bench)),
        (steps + 1, vec!["Marker 1".to_owned(), "left foot down".to_owned()])
    );
    let half = 0.5 * bench.window().bench().result().expect("a clip").duration_secs;
    let moved = bench.work().markers[1].secs;
    assert!((moved - half).abs() < 0.03, "{moved} of {half}");
}

#[test]
fn the_list_of_snags_is_filtered_by_size() {
    let mut bench = tall(Start::Demo);
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

#[test]
fn keys_that_come_in_one_frame_are_done_in_order_and_each_as_often() {
    let mut bench = tall(Start::Demo);
    let key =
        |key, modifiers| Event::Key { key, physical_key: None, pressed: true, repeat: false, modifiers };
    let right = || key(egui::Key::ArrowRight, Modifiers::NONE);
    for event in [
        right(),
        right(),
        key(egui::Key::OpenBracket, Modifiers::ALT),
        right(),
        right(),
        right(),
        key(egui::Key::CloseBracket, Modifiers::ALT),
        right(),
    ] {
        bench.0.input_mut().events.push(event);
    }
    bench.run();
    let grid = bench.window().bench().source().unwrap().grid.clone();
    assert_eq!(bench.choice().span_secs.map(|span| span.map(|secs| grid.frame(secs))), Some([2, 5]));
    assert_eq!(grid.frame(bench.window().bench().session.playback.playhead_secs), 6);
}

#[test]
fn the_timeline_goes_by_keys_to_keys_snags_loops_and_speeds() {
    let mut bench = tall(Start::Demo);
    let frame = |bench: &Bench<'_>| {
        let own = bench.window().bench();
        own.result().unwrap().grid.frame(own.session.playback.playhead_secs)
    };
    // A capture has a key at each frame.
    bench.press(Modifiers::COMMAND, egui::Key::ArrowRight);
    bench.press(Modifiers::COMMAND, egui::Key::ArrowRight);
    bench.press(Modifiers::COMMAND, egui::Key::ArrowLeft);
    assert_eq!(frame(&bench), 1);
    let chosen = |bench: &Bench<'_>| bench.window().bench().chosen_snag().cloned();
    bench.press(Modifiers::NONE, egui::Key::F8);
    let first = chosen(&bench).expect("a snag");
    bench.press(Modifiers::NONE, egui::Key::F8);
    let second = chosen(&bench).expect("a snag");
    assert_ne!(first, second);
    assert_eq!(frame(&bench), second.first_frame, "the playhead goes along");
    bench.press(Modifiers::SHIFT, egui::Key::F8);
    assert_eq!(chosen(&bench), Some(first));
    for (start, key) in [(10, egui::Key::OpenBracket), (20, egui::Key::CloseBracket)] {
        let secs = bench.window().bench().result().unwrap().grid.time(start);
        bench.ask(Command::Scrub(secs));
        bench.press(Modifiers::COMMAND, key);
    }
    let grid = bench.window().bench().result().unwrap().grid.clone();
    let range = bench.window().bench().session.playback.range.expect("a loop");
    assert_eq!((grid.frame(range.0), grid.frame(range.1)), (10, 20));
    let speed = |bench: &Bench<'_>| bench.window().bench().session.playback.speed;
    for _ in 0..9 {
        bench.press(Modifiers::COMMAND, egui::Key::Comma);
    }
    assert_eq!(speed(&bench), 0.1);
    for _ in 0..9 {
        bench.press(Modifiers::COMMAND, egui::Key::Period);
    }
    assert_eq!(speed(&bench), 4.0);
    bench.press(Modifiers::COMMAND, egui::Key::Backslash);
    assert_eq!(bench.window().bench().session.playback.range, None);
}

#[test]
fn the_map_is_ordered_by_its_worst_row_and_coloured_by_what_is_asked() {
    let mut bench = tall(Start::Demo);
    let row = |bench: &Bench<'_>, name: &str| bench.0.get_by_label(&format!("Map row {name}")).rect().top();
    bench.press(Modifiers::ALT, egui::Key::Num7);
    let source = bench.window().bench().source().unwrap().clone();
    // The fastest turn from frame to frame, joint by joint, straight from the keys.
    let fastest = |joint: usize| {
        let at = |frame| source.rotation(joint).map(|track| track.at(source.grid.time(frame)));
        let step = |frame: usize| Some(at(frame - 1)?.turn_to(at(frame)?));
        (1..source.grid.count()).filter_map(step).fold(0.0, f64::max)
    };
    let worst = source.skeleton.listed().max_by(|&a, &b| fastest(a).total_cmp(&fastest(b))).unwrap();
    let name = source.skeleton.label(worst).to_owned();
    let rows = source.skeleton.listed().map(|joint| row(&bench, source.skeleton.label(joint)));
    assert_eq!(row(&bench, &name), rows.fold(f32::INFINITY, f32::min), "{name} is on top");
    let kind = |bench: &Bench<'_>| bench.window().bench().heat.as_ref().unwrap().value.kind;
    for (key, expected) in [
        (egui::Key::Num6, HeatKind::Change),
        (egui::Key::Num8, HeatKind::LimitUse),
        (egui::Key::Num5, HeatKind::TurnRate),
    ] {
        bench.press(Modifiers::ALT, key);
        assert_eq!(kind(&bench), expected);
    }
}

#[test]
fn the_history_names_each_step_and_goes_to_any() {
    let mut bench = tall(Start::Demo);
    bench.act(Action::AddSmooth);
    let title = bench.titles()[0].clone();
    bench.click(&format!("Pass {title}"));
    assert!(!bench.work().passes[0].on);
    bench.click(&format!("Remove: {title}"));
    assert!(bench.work().passes.is_empty());
    bench.act(Action::History);
    bench.0.get_by_label(&format!("Remove: {title}"));
    bench.click(&format!("Switch off: {title}"));
    assert!(!bench.work().passes[0].on);
    bench.click(&format!("Add pass: {title}"));
    assert!(bench.work().passes[0].on);
    bench.click("Open");
    assert_eq!((bench.work().passes.len(), bench.steps()), (0, 0));
}

/// The turn of a joint of a BVH file at a frame as a matrix, from the numbers of the file alone, and how its channels are named: every
/// `Xrotation` turns about the x axis, the first named one outermost.
fn turn_in_file(text: &str, joint: &str, frame: usize) -> glam::DMat3 {
    let (mut own, mut channels, mut before) = (String::new(), Vec::new(), 0);
    for line in text.lines() {
        let words: Vec<&str> = line.split_whitespace().collect();
        match words.as_slice() {
            ["ROOT" | "JOINT", name] => (*name).clone_into(&mut own),
            ["CHANNELS", _, names @ ..] if own == joint => {
                channels = names.iter().map(|name| (*name).to_owned()).collect();
                break;
            }
            ["CHANNELS", count, ..] => before += count.parse::<usize>().expect("a count"),
            _ => {}
        }
    }
    let rows = text.lines().skip_while(|line| !line.starts_with("Frame Time")).skip(1);
    let row = rows.filter(|line| !line.trim().is_empty()).nth(frame).expect("a row for each frame");
    let numbers: Vec<f64> =
        row.split_whitespace().skip(before).map(|word| word.parse().expect("a number")).collect();
    channels.iter().zip(numbers).fold(glam::DMat3::IDENTITY, |turn, (channel, degrees)| {
        turn * match channel.as_str() {
            "Xrotation" => glam::DMat3::from_rotation_x(degrees.to_radians()),
            "Yrotation" => glam::DMat3::from_rotation_y(degrees.to_radians()),
            "Zrotation" => glam::DMat3::from_rotation_z(degrees.to_radians()),
            _ => glam::DMat3::IDENTITY,
        }
    })
}

/// The angle between two turns in degrees, by the trace of the matrix that leads from one to the other.
fn degrees_between(from: glam::DMat3, to: glam::DMat3) -> f64 {
    let between = from.transpose() * to;
    let trace = between.x_axis.x + between.y_axis.y + between.z_axis.z;
    (0.5 * (trace - 1.0)).clamp(-1.0, 1.0).acos().to_degrees()
}

/// What the map tells when the pointer rests on a joint's row at a time.
fn told_on_the_map(bench: &mut Bench<'_>, row: &str, secs: f64) -> String {
    // The row comes into view.
    let joint = bench.window().bench().source().expect("a clip").skeleton.find(row);
    bench.ask(Command::ChooseJoint(joint));
    let rows = bench.0.get_by_label("Turn map rows").rect();
    let row = bench.0.get_by_label(&format!("Map row {row}")).rect();
    let share = bench.window().bench().session.window.share(secs);
    bench.0.hover_at(egui::pos2(rows.left() + rows.width() * share as f32, row.center().y));
    bench.run();
    bench.0.get_by_label("Turn map rows").accesskit_node().value().unwrap_or_default()
}

/// Compared with the numbers of the file, multiplied out here.
#[test]
fn the_map_tells_what_lies_under_the_pointer() {
    let Some(path) = support::shared("data/bvh/cmu_02_01_walk.bvh") else { return };
    let text = String::from_utf8(disk::read(&path).unwrap()).unwrap();
    let mut bench = tall(of_file(&path));
    let clip = bench.window().bench().source().unwrap().clone();
    let joint = clip.skeleton.find("LeftForeArm").expect("an arm");
    for frame in [40_usize, 171, 300] {
        let secs = clip.grid.time(frame);
        let [before, now] = [frame - 1, frame].map(|frame| turn_in_file(&text, "LeftForeArm", frame));
        let rate = degrees_between(before, now) / (secs - clip.grid.time(frame - 1));
        let told = told_on_the_map(&mut bench, "LeftForeArm", secs);
        let place = format!("LeftForeArm, {secs:.3} s  frame {frame}, ");
        let own = told.strip_prefix(&place).unwrap_or_else(|| panic!("{told}"));
        let own: f64 = own.split(' ').next().unwrap().parse().unwrap();
        assert!(own > 1.0 && (own - rate).abs() < 0.51 + 0.02 * rate, "{told}, expected {rate:.1}");
    }
    // What was changed by ten degrees is told so, whatever it was before.
    let middle = clip.grid.time(171);
    let push = Push {
        joint,
        center_secs: middle,
        reach_secs: 0.5,
        turn: Bivector::new(0.0, 10_f64.to_radians(), 0.0),
        frame: PushFrame::Own,
    };
    let step = PushPass { pushes: vec![push] }.into();
    bench.ask(Command::Edit(Edit::AddPass { work: 0, step, at: 0 }));
    bench.act(Action::HeatChange);
    let told = told_on_the_map(&mut bench, "LeftForeArm", middle);
    assert!(told.ends_with("frame 171, 10.0° from the source"), "{told}");
    let told = told_on_the_map(&mut bench, "LeftForeArm", clip.grid.time(300));
    assert!(told.ends_with("frame 300, 0° from the source"), "{told}");
    bench.undo();

    // A cone of half a right angle about the rest pose: the limb's way off its rest direction is what it uses.
    let limb = clip.skeleton.joints()[clip.skeleton.children(joint)[0]].rest.translation.normalize();
    let half = 45_f64.to_radians();
    let range =
        Range { swing: SwingLimit::Cone { half_rad: half }, twist: Interval::from_degrees(-170.0, 170.0) };
    let limit = JointLimit::new(Rotor::IDENTITY, limb, limb.any_orthonormal_vector(), range);
    let limits = Limits { title: "test".to_owned(), joints: [(joint, limit)].into() };
    bench.ask(Command::Edit(Edit::SetLimits { work: 0, limits: Some(Arc::new(limits)) }));
    bench.act(Action::HeatLimitUse);
    let told = told_on_the_map(&mut bench, "LeftForeArm", middle);
    let swing = (turn_in_file(&text, "LeftForeArm", 171) * limb).angle_between(limb);
    let own = told.split("frame 171, ").nth(1).and_then(|words| words.strip_suffix(" % of its limit"));
    let own: f64 = own.unwrap_or_else(|| panic!("{told}")).parse().unwrap();
    // Colours are kept in steps of a few percent.
    assert!(
        (own - 100.0 * swing / half).abs() < 0.06 * own + 1.0,
        "{told}, expected {}",
        100.0 * swing / half
    );
    let told = told_on_the_map(&mut bench, "RightForeArm", middle);
    assert!(told.ends_with("no limit"), "{told}");

    // A folded row tells its hottest joint, a mark the snag under it.
    bench.act(Action::FoldLimbs);
    let folded: Vec<usize> = bench.window().bench().session.folded.iter().copied().collect();
    let told = told_on_the_map(&mut bench, clip.skeleton.label(folded[0]), middle);
    assert!(told.contains("(hottest of "), "{told}");
    let mut bench = tall(Start::Demo);
    bench.ask(Command::ChooseSnag(0));
    let snag = bench.window().bench().snags()[0].clone();
    let name = bench.window().bench().source().unwrap().skeleton.label(snag.joint).to_owned();
    let told = told_on_the_map(&mut bench, &name, snag.first_secs.midpoint(snag.last_secs));
    assert!(told.ends_with(&format!(", {} {}, open", snag.kind.letter(), snag.kind)), "{told}");
}

/// A triple that is mirrored to the end of the clip has its middle behind spikes that start later: each keeps its letter.
#[test]
fn a_long_snag_leaves_those_within_it_their_marks() {
    let Some(path) = support::shared("data/bvh/cmu_05_06_dance.bvh") else { return };
    let mut bench = tall(of_file(&path));
    let joint = bench.window().bench().source().unwrap().skeleton.find("RightUpLeg");
    let found: Vec<_> =
        bench.window().bench().snags().iter().filter(|snag| Some(snag.joint) == joint).cloned().collect();
    let long = found.iter().find(|snag| snag.last_frame - snag.first_frame > 400).expect("a long one");
    let middle = |snag: &turnwright::snag::Snag| f64::midpoint(snag.first_secs, snag.last_secs);
    let within: Vec<_> = found
        .iter()
        .filter(|snag| snag.first_secs > long.first_secs + 0.3 && middle(snag) < middle(long) - 0.3)
        .collect();
    assert!(within.len() >= 3, "{} lie within it", within.len());
    // Where letters would lie on each other the one farther left stands for both.
    let apart = |snag: &turnwright::snag::Snag| {
        let is_clear = |off: f64| !(-0.2..=0.0).contains(&off);
        within.iter().all(|other| *other == snag || is_clear(middle(other) - middle(snag)))
    };
    let apart: Vec<_> = within.iter().filter(|snag| apart(snag)).collect();
    assert!(apart.len() >= 2, "{} stand by themselves", apart.len());
    for snag in apart {
        let told = told_on_the_map(&mut bench, "RightUpLeg", middle(snag));
        assert!(
            told.ends_with(&format!(", {} {}, open", snag.kind.letter(), snag.kind)),
            "{told}: {}",
            snag.text
        );
    }
}

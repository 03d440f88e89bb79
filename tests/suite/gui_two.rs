//! Two clips in the window: a blend made, dragged, masked, undone and saved; loops. What is asserted is the document.

use std::path::PathBuf;

use egui::accesskit::Role;
use egui::{Key, Modifiers, Pos2};
use egui_kittest::kittest::Queryable as _;
use turnwright::app::Start;
use turnwright::app::commands::{Action, BlendCommand, Command};
use turnwright::app::view_models::{BlendKind, TimeWindow};
use turnwright::blend::{JoinPlace, RootFrom};
use turnwright::exchange::ClipAddress;
use turnwright::scene::{BlendForm, BlendPass, ClipRef, Edit, LoopPass, PassStep};
use turnwright::skeleton::RestChoice;

use crate::gui_harness::Bench;
use crate::support::shared;

impl Bench<'_> {
    #[track_caller]
    fn place(&self, beginning: &str) -> Pos2 {
        let node = self.0.get_all_by_label_contains(beginning).next().expect("a widget with that label");
        node.rect().center()
    }

    #[track_caller]
    fn blend(&self) -> BlendPass {
        match self.passes().as_slice() {
            [.., PassStep::Blend(blend)] => blend.clone(),
            other => panic!("expected a blend last, found {other:?}"),
        }
    }

    #[track_caller]
    fn place_of_join(&self) -> JoinPlace {
        match self.blend().form {
            BlendForm::Join(place) => place,
            other => panic!("expected a join, found {other:?}"),
        }
    }

    fn length(&self) -> f64 {
        self.window().bench().result().map_or(0.0, |clip| clip.duration_secs)
    }
}

fn open(path: PathBuf, clip: Option<&str>) -> Bench<'static> {
    Bench::open(Start::Files(vec![ClipAddress { path, clip: clip.map(str::to_owned) }]))
}

fn fox() -> Option<Bench<'static>> {
    Some(open(shared("data/gltf/Fox.glb")?, Some("Walk")))
}

fn clip_joint(bench: &Bench<'_>, label: &str) -> usize {
    let clip = bench.window().bench().source().expect("a clip");
    clip.skeleton.find(label).expect("a joint with that label")
}

const RUN: ClipRef = ClipRef { source: 0, clip: 2 };

#[test]
fn what_undo_makes_shorter_is_not_drawn_beyond_its_end() {
    let Some(mut bench) = fox() else { return };
    let walk = bench.length();
    bench.ask(Command::Blend(BlendCommand::Add(RUN, BlendKind::Join)));
    let joined = bench.length();
    let session = |bench: &Bench<'_>| bench.window().bench().session.clone();
    assert!(joined > walk + 0.2);
    assert_eq!(session(&bench).window, TimeWindow::whole(joined), "all of it is shown");
    bench.ask(Command::Scrub(joined));
    bench.undo();
    assert_eq!(bench.length(), walk);
    assert_eq!(session(&bench).window, TimeWindow::whole(walk));
    assert_eq!(session(&bench).playback.playhead_secs, walk);
    // What was looked at more closely stays as large, and comes back to where there is something.
    bench.press(Modifiers::COMMAND | Modifiers::SHIFT, Key::Z);
    assert_eq!(session(&bench).window, TimeWindow::whole(joined));
    bench.ask(Command::ShowTime(TimeWindow { start_secs: joined - 0.2, end_secs: joined }));
    bench.undo();
    let window = session(&bench).window;
    assert!((window.span() - 0.2).abs() < 1e-9 && (window.end_secs - walk).abs() < 1e-9, "{window:?}");
}

#[test]
fn a_clip_is_joined_from_the_menu_and_its_place_is_dragged_and_clicked() {
    let Some(mut bench) = fox() else { return };
    let walk = bench.length();
    bench.0.key_press_modifiers(Modifiers::COMMAND, Key::U);
    bench.run();
    bench.click("Second clip Run");
    bench.click("Blend");
    let first = bench.place_of_join();
    let run = bench.window().bench().project.as_ref().unwrap().source_clip(2).unwrap().duration_secs;
    assert_eq!(bench.blend().other, RUN);
    assert!((first.first_secs + first.overlap_secs - walk).abs() < 1e-9, "{first:?}");
    assert!((bench.length() - (walk + run - first.overlap_secs)).abs() < 0.05, "{}", bench.length());
    assert_eq!(bench.steps(), 1);

    // The bar of the second clip: earlier by some points, in one step, shown on the way.
    let from = bench.place("Second clip begins at");
    let previews = bench.drag(&[from, from - egui::vec2(60.0, 0.0)], Modifiers::NONE);
    assert!(previews >= 2, "{previews} frames showed it while it was dragged");
    assert_eq!(bench.steps(), 2, "a drag is one step");
    assert!(bench.window().bench().preview.is_none());
    let dragged = bench.place_of_join();
    assert!(dragged.first_secs < first.first_secs - 0.02, "{dragged:?}");
    assert_eq!(dragged.overlap_secs, first.overlap_secs);
    let on_frames = dragged.first_secs * 24.0;
    assert!((on_frames - on_frames.round()).abs() < 1e-6, "{dragged:?}");

    // The distance picture: a click at its middle.
    let middle = bench.place("Distance picture");
    bench.0.hover_at(middle);
    bench.0.step();
    bench.0.drag_at(middle);
    bench.0.drop_at(middle);
    bench.run();
    let clicked = bench.place_of_join();
    let expected = 0.5 * (run - clicked.overlap_secs);
    assert!((clicked.second_secs - expected).abs() < 0.06, "{clicked:?}, expected {expected}");
    assert_eq!(bench.steps(), 3);

    // The curves show the result as far as it goes, and the source as far as that does.
    bench.ask(Command::ChooseJoint(Some(clip_joint(&bench, "b_Neck_04"))));
    let curves = bench.window().bench().curve_sets().remove(0);
    let end = curves.times.time(curves.times.len() - 1);
    assert!((end - bench.length()).abs() < 0.05, "{end} of {}", bench.length());
    let line = &curves.lines[0];
    let number =
        |row: &turnwright::app::view_models::Pyramid, secs| curves.times.value(row.values(), secs).unwrap();
    let after = line.after.as_ref().unwrap();
    assert!(number(after, end).is_finite() && number(&line.before, 0.9 * walk).is_finite());
    assert!(number(&line.before, walk + 0.1).is_nan());

    // The best place is proposed and taken.
    bench.click("Best place 1");
    let best = bench.place_of_join();
    let facts = bench.window().bench().blend_facts().unwrap().clone();
    assert!((best.first_secs - facts.places[0].0.first_secs).abs() < 0.03, "{best:?}");
    assert!(facts.places[0].1 <= facts.places.last().unwrap().1);
    for _ in 0..4 {
        bench.undo();
    }
    assert!(bench.passes().is_empty());
    assert_eq!(bench.length(), walk);
}

#[test]
fn a_weight_becomes_a_curve_and_its_knots_obey_pointer_and_keys() {
    let Some(mut bench) = fox() else { return };
    bench.ask(Command::Blend(BlendCommand::Add(RUN, BlendKind::Mix)));
    let weight = |bench: &Bench<'_>| match bench.blend().form {
        BlendForm::Mix { weight, .. } => weight.knots,
        other => panic!("expected a mix, found {other:?}"),
    };
    assert_eq!(weight(&bench), [[0.0, 0.5]]);
    let from = bench.place("Weight 50 %");
    let previews = bench.drag(&[from, from + egui::vec2(30.0, -12.0)], Modifiers::NONE);
    assert!(previews >= 2);
    let dragged = weight(&bench);
    assert!(dragged.len() == 1 && dragged[0][0] == 0.0 && dragged[0][1] < 0.45, "{dragged:?}");

    // Knots at two times; the lane's curve has them in order.
    for secs in [0.1, 0.4] {
        bench.ask(Command::Scrub(secs));
        bench.click("Knot at playhead");
    }
    let knots = weight(&bench);
    assert_eq!(knots.len(), 3, "{knots:?}");
    assert!(knots.windows(2).all(|pair| pair[0][0] < pair[1][0]), "{knots:?}");
    let last = bench.place("Weight 3 of 3");
    bench.drag(&[last, last + egui::vec2(0.0, 200.0)], Modifiers::NONE);
    assert_eq!(weight(&bench)[2][1], 1.0, "held within its range");
    let steps = bench.steps();
    bench.0.get_all_by_label_contains("Weight 3 of 3").next().unwrap().focus();
    bench.run();
    bench.0.key_press(Key::ArrowUp);
    bench.run();
    assert!((weight(&bench)[2][1] - 0.95).abs() < 1e-9, "{:?}", weight(&bench));
    bench.0.key_press(Key::Delete);
    bench.run();
    assert_eq!(weight(&bench).len(), 2);
    assert_eq!(bench.steps(), steps + 2);

    // Whose way on the ground: a choice of every mix.
    for (label, root) in [("B", RootFrom::Second), ("A", RootFrom::First), ("both", RootFrom::Both)] {
        bench.0.get_by_role_and_label(Role::RadioButton, label).scroll_to_me();
        bench.run();
        bench.0.get_by_role_and_label(Role::RadioButton, label).click();
        bench.run();
        let form = bench.blend().form;
        assert!(
            matches!(form, BlendForm::Mix { root: own, is_aligned: false, .. } if own == root),
            "{label}: {form:?}"
        );
    }

    // In step, the result has a length between both.
    bench.click("In step");
    let [a, b] = [1, 2].map(|clip| {
        bench.window().bench().project.as_ref().unwrap().source_clip(clip).unwrap().duration_secs
    });
    assert!(bench.length() > a.min(b) - 0.05 && bench.length() < a.max(b) + 0.05, "{}", bench.length());
    assert!(bench.window().bench().blend_facts().unwrap().stops.is_some());
    // The faint figures are there at every time without a panic.
    for share in [0.0, 0.3, 1.0] {
        let secs = share * bench.length();
        bench.ask(Command::Scrub(secs));
    }
    bench.click("Keep planted feet");
    assert!(!bench.blend().holds_feet);
}

#[test]
fn a_layer_takes_a_limb_with_a_soft_edge() {
    let Some(mut bench) = fox() else { return };
    bench.ask(Command::Blend(BlendCommand::Add(RUN, BlendKind::Add)));
    let clip = bench.window().bench().source().unwrap().clone();
    let joint = clip.skeleton.find("b_Tail01_012").unwrap();
    bench.ask(Command::ChooseJoint(Some(joint)));
    bench.ask(Command::Blend(BlendCommand::SetSoft(2)));
    bench.click("Mask: only the chosen limb");
    let joints = bench.blend().joints.unwrap();
    let full = joints.iter().filter(|&&(_, factor)| factor == 1.0).count();
    let soft = joints.iter().filter(|&&(_, factor)| factor > 0.0 && factor < 1.0).count();
    assert_eq!((full, soft), (3, 2), "{joints:?}");
    let result = bench.window().bench().result().unwrap().clone();
    let head = clip.skeleton.find("b_Head_05").unwrap();
    assert!(result.same_joint(&clip, head) && !result.same_joint(&clip, joint));
    bench.click("All joints");
    assert_eq!(bench.blend().joints, None);
}

#[test]
fn a_second_clip_of_another_body_comes_from_a_file_and_is_carried_over() {
    let (Some(walk), Some(biped)) =
        (shared("data/bvh/cmu_02_01_walk.bvh"), shared("data/gltf/biped23_movement_clips.glb"))
    else {
        return;
    };
    let mut bench = open(walk, None);
    bench.ask(Command::Blend(BlendCommand::AskForFile(None)));
    bench.ask(Command::Blend(BlendCommand::OpenFile(biped.clone())));
    let document = bench.window().bench().project.as_ref().unwrap().document().clone();
    assert_eq!((document.sources.len(), document.works.len()), (2, 12));
    assert_eq!(document.sources[1].path, biped);
    // The sheet asks on, with the new clip chosen.
    bench.click("Blend");
    assert_eq!(bench.blend().other, ClipRef { source: 1, clip: 0 });
    let facts = bench.window().bench().blend_facts().unwrap().clone();
    assert!(facts.is_carried);
    let result = bench.window().bench().result().unwrap().clone();
    assert!(result.duration_secs > facts.first.duration_secs);
    assert!(result.has_skeleton_of(&facts.first));
    // Both steps can be undone, and the file can come once more.
    bench.undo();
    bench.undo();
    assert_eq!(bench.window().bench().project.as_ref().unwrap().document().sources.len(), 1);
    bench.ask(Command::Blend(BlendCommand::OpenFile(biped)));
    assert_eq!(bench.window().bench().project.as_ref().unwrap().document().works.len(), 12);
}

#[test]
fn a_loop_finds_its_part_and_is_repeated() {
    let Some(path) = shared("data/bvh/cmu_02_01_walk.bvh") else { return };
    let mut bench = open(path, None);
    let length = bench.length();
    bench.ask(Command::Do(Action::MakeLoop));
    let own = |bench: &Bench<'_>| match bench.passes().as_slice() {
        [PassStep::Loop(own)] => own.clone(),
        other => panic!("expected a loop, found {other:?}"),
    };
    assert_eq!(own(&bench), LoopPass::default());
    bench.click("Find the best part");
    let [from, to] = own(&bench).part_secs.expect("a part");
    assert!(from < to && to - from >= 0.29 * length, "{from} {to}");
    assert!((bench.length() - (to - from)).abs() < 0.05);
    bench.click("spread");
    assert_eq!(own(&bench).close, Some(turnwright::scene::Closing::Spread));
    bench.click("Whole clip");
    assert_eq!(own(&bench).part_secs, None);
    bench.undo();
    bench.undo();
    bench.undo();
    assert_eq!(own(&bench), LoopPass::default());
}

#[test]
fn the_lane_can_be_hidden_and_a_blend_that_does_not_fit_says_why() {
    let Some(mut bench) = fox() else { return };
    assert!(bench.0.query_by_label("Blend lane").is_none(), "no lane without a blend");
    bench.ask(Command::Blend(BlendCommand::Add(RUN, BlendKind::Join)));
    assert!(bench.0.get_all_by_label("Blend lane").next().is_some());
    bench.ask(Command::Do(Action::BlendLane));
    assert!(bench.0.query_all_by_label_contains("Distance picture").next().is_none());
    bench.ask(Command::Do(Action::BlendLane));
    assert!(bench.0.query_all_by_label_contains("Distance picture").next().is_some());
    // Switched off, the lane says so.
    bench.0.get_all_by_label_contains("Pass Join").next().unwrap().click();
    bench.run();
    bench.0.get_by_label("This blend is switched off");
}

#[test]
fn the_lane_is_made_higher_by_its_divider() {
    let Some(mut bench) = fox() else { return };
    assert!(bench.0.query_by_label("Divider below blend lane").is_none());
    bench.ask(Command::Blend(BlendCommand::Add(RUN, BlendKind::Mix)));
    let line = |bench: &Bench<'_>| bench.0.get_by_label("Divider below blend lane").rect().center();
    let curves = |bench: &Bench<'_>| bench.0.get_by_label("Rotation curves chart").rect().top();
    let (from, top) = (line(&bench), curves(&bench));
    bench.drag(&[from, from + egui::vec2(0.0, 30.0)], Modifiers::NONE);
    assert!((line(&bench).y - from.y - 30.0).abs() < 2.0, "{from:?} {:?}", line(&bench));
    assert!((curves(&bench) - top - 30.0).abs() < 2.0, "{top} {}", curves(&bench));
    bench.0.get_by_label("Divider below blend lane").focus();
    bench.run();
    bench.0.key_press(Key::ArrowUp);
    bench.run();
    assert!((line(&bench).y - from.y - 14.0).abs() < 2.0, "{from:?} {:?}", line(&bench));
    assert_eq!(bench.steps(), 1, "areas are no work on the clip");
}

#[test]
fn a_mean_takes_further_clips_with_weights_of_their_own() {
    let Some(mut bench) = fox() else { return };
    bench.ask(Command::Blend(BlendCommand::Add(RUN, BlendKind::Mean)));
    let mean = |bench: &Bench<'_>| match bench.blend().form {
        BlendForm::Mean { weights, more, is_aligned } => (weights, more, is_aligned),
        other => panic!("expected a mean, found {other:?}"),
    };
    assert_eq!(mean(&bench), ([1.0, 1.0], vec![], false));
    // In the lane each clip has a bar and its weight beside it, to drag.
    let from = bench.place("Weight of B in the mean");
    let previews = bench.drag(&[from, from + egui::vec2(50.0, 0.0)], Modifiers::NONE);
    assert!(previews >= 2, "{previews} frames showed it while it was dragged");
    let ([own, other], ..) = mean(&bench);
    assert!(own == 1.0 && other > 1.2, "{own} {other}");
    assert_eq!(bench.steps(), 2, "a drag is one step");

    // One clip more, from those that are open.
    let combo = |bench: &Bench<'_>| {
        let combo = bench.0.get_by_role_and_label(Role::ComboBox, "Add a clip to the mean");
        combo.scroll_to_me();
        combo.rect().center()
    };
    combo(&bench);
    bench.run();
    let at = combo(&bench);
    bench.drag(&[at], Modifiers::NONE);
    bench.0.get_all_by_label("Survey").last().unwrap().click();
    bench.run();
    let survey = ClipRef { source: 0, clip: 0 };
    assert_eq!(mean(&bench).1, [(survey, 1.0)]);
    bench.click("Equal weights");
    assert_eq!(mean(&bench).0, [1.0, 1.0]);
    let clips: Vec<_> = [1, 2, 0]
        .map(|clip| bench.window().bench().project.as_ref().unwrap().source_clip(clip).unwrap().clone())
        .into();
    let mask = turnwright::blend::Mask::all(&clips[0].skeleton);
    let all: Vec<_> = clips.iter().map(|clip| (&**clip, 1.0)).collect();
    bench.click("Keep planted feet");
    let expected = turnwright::blend::mix_many(&all, &mask).unwrap();
    assert_eq!(**bench.window().bench().result().unwrap(), expected);
    // In step all three are as long as their mean, and the three figures have their letters.
    bench.click("In step");
    let lengths: f64 = clips.iter().map(|clip| clip.duration_secs).sum::<f64>() / 3.0;
    assert!((bench.length() - lengths).abs() <= 1.0 / 24.0, "{} of {lengths}", bench.length());
    let facts = bench.window().bench().blend_facts().unwrap().clone();
    let result = bench.window().bench().result().unwrap().clone();
    let figures = facts.figures(&bench.blend().form, &result, 0.5 * lengths);
    assert_eq!(figures.iter().map(|figure| figure.letter).collect::<String>(), "ABC");
    // The second goes: the further one takes its place.
    bench.click("Take clip B out of the mean");
    assert_eq!((bench.blend().other, mean(&bench).1), (survey, vec![]));
    while bench.steps() > 0 {
        bench.undo();
    }
    assert!(bench.passes().is_empty());
}

#[test]
fn another_rest_pose_of_the_clip_that_is_blended_in_is_followed() {
    let Some(path) = shared("data/gltf/Fox.glb") else { return };
    let folder = tempfile::tempdir().unwrap();
    let other = folder.path().join("other.glb");
    std::fs::copy(&path, &other).unwrap();
    let mut bench = open(path, Some("Walk"));
    bench.ask(Command::Blend(BlendCommand::AskForFile(None)));
    bench.ask(Command::Blend(BlendCommand::OpenFile(other)));
    let run = ClipRef { source: 1, clip: 2 };
    bench.ask(Command::Blend(BlendCommand::Add(run, BlendKind::Add)));
    bench.click("rest pose");
    let result = |bench: &Bench<'_>| bench.window().bench().result().unwrap().clone();
    let before = result(&bench);
    // A layer beyond rest: with another rest pose of the layer's file it is another layer.
    bench.ask(Command::Edit(Edit::ChooseRest { source: 1, rest: Some(RestChoice::FirstFrame) }));
    let after = result(&bench);
    assert_ne!(before, after);
    bench.undo();
    assert_eq!(before, result(&bench));
}

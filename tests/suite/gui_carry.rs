//! The retarget sheet driven by accessible labels: a captured walk onto a game figure. What is asserted is the document.

use std::path::{Path, PathBuf};

use egui_kittest::kittest::Queryable as _;
use turnwright::app::Start;
use turnwright::app::commands::{Action, CarryCommand, CarrySheet, Command};
use turnwright::app::view_models::{CarryState, Stage};
use turnwright::exchange::{ClipAddress, OpenOptions, disk, open};
use turnwright::retarget::{HoldAt, KeptLimits};
use turnwright::scene::{Edit, PassId, RetargetPass};
use turnwright::skeleton::RestChoice;

use crate::gui_harness::Bench;
use crate::support::shared;

impl Bench<'_> {
    #[track_caller]
    fn pass(&self) -> (PassId, RetargetPass) {
        self.window().bench().carried_pass().expect("a retarget")
    }
}

fn open_clip(clip: &Path, size: [f32; 2]) -> Bench<'static> {
    Bench::of_size(Start::Files(vec![ClipAddress { path: clip.to_owned(), clip: None }]), size)
}

fn files() -> Option<(PathBuf, PathBuf)> {
    Some((shared("data/bvh/walk01.bvh")?, shared("data/gltf/biped23_movement_clips.glb")?))
}

#[test]
fn a_walk_is_carried_onto_a_figure_changed_and_exported() {
    let Some((walk, figure)) = files() else { return };
    let folder = tempfile::tempdir().expect("a folder");
    let mut sheet = open_clip(&walk, [1440.0, 900.0]);
    sheet.ask(Command::Do(Action::Retarget));
    sheet.0.get_by_label("Use this file");
    sheet.ask(Command::Carry(CarryCommand::OpenOnto(figure.clone())));
    let (_, pass) = sheet.pass();
    assert_eq!((pass.onto, pass.plant_feet, pass.rows.len()), (1, true, 0), "{}", sheet.messages());
    let document = sheet.window().bench().project.as_ref().expect("a project").document().clone();
    assert!(document.sources.len() == 2 && document.works.len() > 2);
    sheet.0.get_by_label("Source figure");
    sheet.0.get_by_label("Target figure");
    assert!(sheet.0.get_all_by_label_contains("joints driven").next().is_some(), "the report is there");
    let before = sheet.steps();

    // A row is chosen, kept at rest, and taken back in one step.
    sheet.click_beginning("Map head from");
    let row = sheet.window().bench().session.carry.row.expect("a row");
    sheet.click("Keep at rest");
    assert_eq!(sheet.pass().1.rows, [(None, Some("head".to_owned()))]);
    let facts = sheet.window().bench().carry.as_ref().expect("work").facts.clone().expect("facts");
    let own = facts.rows.iter().find(|own| own.target == row).expect("the row");
    assert_eq!(own.state, CarryState::KeptAtRest);
    assert_eq!(sheet.steps(), before + 1);
    // Another joint from the list.
    sheet.click("Source joint that drives head");
    sheet.click("Neck");
    assert_eq!(sheet.pass().1.rows, [(Some("Neck".to_owned()), Some("head".to_owned()))]);
    sheet.undo();
    sheet.undo();
    assert!(sheet.pass().1.rows.is_empty());
    assert_eq!(sheet.steps(), before);

    // Rest poses and limits: one step each.
    sheet.click("Rest poses");
    sheet.click("Target rest straightened");
    assert!(sheet.pass().1.rests[1].is_straightened && !sheet.pass().1.rests[0].is_straightened);
    sheet.click("Source rests as in a frame");
    assert_eq!(sheet.pass().1.rests[0].frame_secs, Some(0.0));
    sheet.click("Within adult limits");
    assert_eq!(sheet.pass().1.limits, Some(KeptLimits::Adult));
    assert!(sheet.0.get_all_by_label_contains("Limits adult").next().is_some(), "their use is in the report");
    assert_eq!(sheet.steps(), before + 3);

    // A hand at the other hand, then at the point where it is.
    sheet.ask(Command::Scrub(1.0));
    sheet.click("Lane Left hand");
    sheet.click("New: Left hand");
    assert_eq!(sheet.pass().1.hands.len(), 1);
    sheet.click("Hold at the other hand");
    assert_eq!(sheet.pass().1.hands[0].at, HoldAt::OtherHand);
    sheet.click("Hold at a point");
    assert!(matches!(sheet.pass().1.hands[0].at, HoldAt::Place(place) if place.length() > 0.1));
    sheet.click("Take away");
    assert!(sheet.pass().1.hands.is_empty());

    // The result goes into a copy of the figure's file.
    sheet.ask(Command::Carry(CarryCommand::Ask(CarrySheet::Export)));
    let path = folder.path().join("carried.glb");
    sheet.0.get_by_label("Proof sheet beside it");
    sheet.ask(Command::Carry(CarryCommand::Export { path: path.clone(), has_proof: true }));
    assert!(sheet.messages().contains("Exported carried.glb and carried-proof.html"), "{}", sheet.messages());
    let name = figure.file_name().expect("a name").to_string_lossy().into_owned();
    let page = disk::read(&folder.path().join("carried-proof.html")).expect("the sheet is there");
    assert!(String::from_utf8_lossy(&page).contains(&name));
    let [own, made] = [&figure, &path].map(|path| open(path, &OpenOptions::default()).expect("it opens"));
    assert_eq!(made.clips.len(), own.clips.len() + 1);

    sheet.click("Back to the bench");
    sheet.0.get_by_label("Turn map rows");
    // The list of passes calls the file by its name.
    sheet.0.get_by_label(&format!("Pass Retarget onto {name}"));
}

/// How much of the skeleton view's height the result takes at a time, and that all of it lies inside.
#[track_caller]
fn height_in_view(bench: &mut Bench<'_>, share_of_time: f64) -> f64 {
    let secs = bench.window().bench().result().expect("a result").duration_secs * share_of_time;
    bench.ask(Command::Scrub(secs));
    let bounds = bench.0.get_by_label("Skeleton view").rect();
    let own = bench.window().bench();
    let (clip, session) = (own.result().expect("a result"), &own.session);
    let secs = session.playback.playhead_secs;
    let mut camera = session.camera;
    if session.follows {
        camera.target += Stage::new(clip).gone(clip, secs);
    }
    let view = camera.view(bounds.width() as usize, bounds.height() as usize);
    let world = clip.world_at(secs);
    let pixels: Vec<_> = clip
        .skeleton
        .listed()
        .map(|joint| view.project(world[joint].position()).expect("it lies before the camera").pixel)
        .collect();
    for pixel in &pixels {
        let is_inside = (0.0..f64::from(bounds.width())).contains(&pixel.x)
            && (0.0..f64::from(bounds.height())).contains(&pixel.y);
        assert!(is_inside, "{pixel} at {secs} s, in {bounds}");
    }
    let ys = || pixels.iter().map(|pixel| pixel.y);
    (ys().fold(f64::MIN, f64::max) - ys().fold(f64::MAX, f64::min)) / f64::from(bounds.height())
}

#[track_caller]
fn check_is_in_view(bench: &mut Bench<'_>) {
    for share in [0.0, 0.5, 1.0] {
        let height = height_in_view(bench, share);
        assert!(height > 0.3, "the figure takes {height} of the view's height");
    }
}

/// The walk is in centimetres, the figure in metres, and above its hips stands a joint that never moves.
#[test]
fn the_skeleton_view_is_fitted_to_the_carried_figure_and_follows_it() {
    let Some((walk, figure)) = files() else { return };
    let folder = tempfile::tempdir().expect("a folder");
    let scene = folder.path().join("carried.ron");
    let mut bench = open_clip(&walk, [1440.0, 900.0]);
    check_is_in_view(&mut bench);
    bench.ask(Command::Carry(CarryCommand::OpenOnto(figure.clone())));
    bench.click("Back to the bench");
    assert!(bench.window().bench().session.follows, "it walks");
    let result = bench.window().bench().result().expect("a result").clone();
    let root = Stage::new(&result).root.expect("a root");
    assert_eq!(result.skeleton.label(root), "hips");
    check_is_in_view(&mut bench);
    bench.ask(Command::SaveTo(scene.clone()));
    bench.undo();
    assert!(bench.passes().is_empty());
    check_is_in_view(&mut bench);
    // As it is opened again.
    check_is_in_view(&mut open_clip(&scene, [1440.0, 900.0]));
    // The other way round.
    let address = ClipAddress { path: figure, clip: Some("0".to_owned()) };
    let mut bench = Bench::of_size(Start::Files(vec![address]), [1440.0, 900.0]);
    check_is_in_view(&mut bench);
    bench.ask(Command::Carry(CarryCommand::OpenOnto(walk)));
    bench.click("Back to the bench");
    check_is_in_view(&mut bench);
}

#[test]
fn a_contact_that_is_dragged_is_one_step() {
    let Some((walk, figure)) = files() else { return };
    let mut sheet = open_clip(&walk, [1440.0, 900.0]);
    sheet.ask(Command::Carry(CarryCommand::OpenOnto(figure)));
    let before = sheet.steps();
    let found =
        sheet.window().bench().carry.as_ref().expect("work").facts.clone().expect("facts").found.clone();
    let bars: Vec<egui::Rect> =
        sheet.0.get_all_by_label_contains(" found from ").map(|node| node.rect()).collect();
    assert_eq!(bars.len(), found.len());
    // The end of the longest bar, to the right.
    let longest =
        bars.iter().copied().reduce(|a, b| if b.width() > a.width() { b } else { a }).expect("a bar");
    let from = egui::pos2(longest.right() - 4.0, longest.center().y);
    let to = from + egui::vec2(-30.0, 0.0);
    sheet.0.hover_at(from);
    sheet.0.step();
    sheet.0.drag_at(from);
    sheet.0.step();
    sheet.0.hover_at(from + egui::vec2(-12.0, 0.0));
    sheet.0.step();
    assert!(sheet.window().bench().preview.is_some(), "it is shown while it is dragged");
    assert_eq!(sheet.steps(), before);
    sheet.0.hover_at(to);
    sheet.0.step();
    sheet.0.drop_at(to);
    sheet.run();
    let said = sheet.pass().1.feet.expect("the contacts stand in the pass now");
    let changed: Vec<_> = said.iter().zip(&found).filter(|(own, found)| own != found).collect();
    let [(own, was)] = changed.as_slice() else { panic!("{changed:?}") };
    assert!(own.span_secs[0] == was.span_secs[0] && own.span_secs[1] < was.span_secs[1], "{own:?} {was:?}");
    assert_eq!(sheet.steps(), before + 1);
    sheet.click("Feet as found");
    assert!(sheet.pass().1.feet.is_none());

    // By keyboard: a bar that has the focus moves by a frame, and Delete takes it away.
    sheet.0.get_all_by_label_contains(" found from ").next().expect("a bar").focus();
    sheet.run();
    sheet.0.key_press(egui::Key::ArrowRight);
    sheet.run();
    let moved = sheet.pass().1.feet.expect("said");
    assert_ne!(moved, found);
    sheet.0.key_press(egui::Key::Delete);
    sheet.run();
    assert_eq!(sheet.pass().1.feet.expect("said").len(), found.len() - 1);
}

#[test]
fn a_map_is_saved_loaded_and_what_is_wrong_is_told_in_the_sheet() {
    let Some((walk, figure)) = files() else { return };
    let folder = tempfile::tempdir().expect("a folder");
    let mut sheet = open_clip(&walk, [1280.0, 720.0]);
    sheet.ask(Command::Do(Action::Retarget));
    sheet.ask(Command::Carry(CarryCommand::OpenOnto(folder.path().join("missing.glb"))));
    assert!(sheet.0.get_all_by_label_contains("missing.glb").next().is_some());
    sheet.ask(Command::Carry(CarryCommand::OpenOnto(figure)));
    // In the smallest window nothing of the settings hides behind the report.
    let report = sheet.0.get_by_label("Report").rect();
    for label in ["Another file…", "Forget corrections", "Export onto the target's file…"] {
        let rect = sheet.0.get_by_label(label).rect();
        assert!(rect.bottom() <= report.top() && rect.right() <= report.right(), "{label}: {rect} {report}");
    }
    let path = folder.path().join("map.csv");
    sheet.click("Save map…");
    sheet.ask(Command::Carry(CarryCommand::SaveMap(path.clone())));
    let text = String::from_utf8(disk::read(&path).expect("it is written")).expect("text");
    assert!(text.contains("source,target,confidence,reason") && text.lines().count() > 15, "{text}");
    disk::write(&path, b"source,target\n,head\n").expect("it writes");
    sheet.click("Load map…");
    sheet.0.get_by_label("Load a joint map");
    sheet.ask(Command::Carry(CarryCommand::LoadMap(path.clone())));
    assert_eq!(sheet.pass().1.rows, [(None, Some("head".to_owned()))]);
    sheet.click("Forget corrections");
    assert!(sheet.pass().1.rows.is_empty());
    disk::write(&path, b"source,target\nNose,head\n").expect("it writes");
    sheet.click("Load map…");
    sheet.ask(Command::Carry(CarryCommand::LoadMap(path)));
    assert!(sheet.0.get_all_by_label_contains("found `Nose`").next().is_some());
}

#[test]
fn an_animal_gets_questions_and_no_arms() {
    let (Some(walk), Some(fox)) = (shared("data/bvh/walk01.bvh"), shared("data/gltf/Fox.glb")) else {
        return;
    };
    let mut sheet = open_clip(&walk, [1280.0, 720.0]);
    sheet.ask(Command::Carry(CarryCommand::OpenOnto(fox)));
    let facts = sheet.window().bench().carry.as_ref().expect("work").facts.clone().expect("facts");
    assert!(facts.rows.iter().any(|row| row.is_question), "{:?}", facts.rows);
    assert!(!facts.setting.map.doubts.is_empty());
    sheet.click_beginning("Questions (");
    assert!(sheet.window().bench().session.carry.questions_only);
    assert!(sheet.0.get_all_by_label_contains("to be looked at").next().is_some());
}

#[test]
fn another_rest_pose_of_the_target_carries_anew_on_the_bench_and_in_the_sheet() {
    let Some((walk, figure)) = files() else { return };
    let mut sheet = open_clip(&walk, [1280.0, 720.0]);
    sheet.ask(Command::Carry(CarryCommand::OpenOnto(figure)));
    sheet.click("Back to the bench");
    let result = |sheet: &Bench<'_>| sheet.window().bench().result().expect("a result").clone();
    let before = result(&sheet);
    // The first frame of its first clip, in which limbs point elsewhere than at rest.
    sheet.ask(Command::Edit(Edit::ChooseRest { source: 1, rest: Some(RestChoice::FirstFrame) }));
    let after = result(&sheet);
    let arm = after.skeleton.find("lowerarm.l").expect("the joint");
    assert_eq!(after.skeleton.rest_choice(), RestChoice::FirstFrame);
    let turn = before.local_at(1.0)[arm].rotation.turn_to(after.local_at(1.0)[arm].rotation);
    assert!(turn.to_degrees() > 0.1, "{}", turn.to_degrees());
    sheet.undo();
    let back = result(&sheet);
    assert!(back.local_at(1.0) == before.local_at(1.0));
}

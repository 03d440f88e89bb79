//! What the window asks and tells about files: before one is replaced, before work is lost, where one cannot be read, and what an export
//! will write.

use std::path::{Path, PathBuf};

use egui::accesskit::Role;
use egui::{Event, Key, Modifiers, PointerButton};
use egui_kittest::kittest::{NodeT as _, Queryable as _};
use turnwright::app::Start;
use turnwright::app::commands::{Action, Command, Offer, TimeCommand};
use turnwright::app::view_models::changes;
use turnwright::exchange::{ClipAddress, OpenOptions, disk, open};
use turnwright::scene::{Edit, PassStep, SnagMark};
use turnwright::snag::SnagKind;

use crate::gui_harness::Bench;

/// The clip of the demo in a folder, under this name.
fn clip_file(folder: &Path, name: &str) -> PathBuf {
    let path = folder.join(name);
    disk::write(&path, turnwright::demo::SCENES[0].clip_bytes).expect("a folder to write to");
    path
}

fn start_of(path: &Path) -> Start {
    Start::Files(vec![ClipAddress { path: path.to_owned(), clip: None }])
}

/// Types a path into the field of the dialog in place of what stands there, and presses Enter.
fn enter_path(bench: &mut Bench<'_>, path: &Path) {
    bench.0.get_by_role(Role::TextInput).focus();
    bench.run();
    bench.press(Modifiers::COMMAND, Key::A);
    bench.0.get_by_role(Role::TextInput).type_text(&path.display().to_string());
    bench.run();
    bench.press(Modifiers::NONE, Key::Enter);
}

fn double_click(bench: &mut Bench<'_>, label: &str) {
    let pos = bench.0.get_by_label(label).rect().center();
    bench.0.event(Event::PointerMoved(pos));
    for pressed in [true, false, true, false] {
        let (button, modifiers) = (PointerButton::Primary, Modifiers::NONE);
        bench.0.event(Event::PointerButton { pos, button, pressed, modifiers });
    }
    bench.run();
}

fn field(bench: &Bench<'_>) -> (String, bool) {
    let node = bench.0.get_by_role(Role::TextInput);
    let node = node.accesskit_node();
    (node.value().unwrap_or_default(), node.is_focused())
}

fn bytes(path: &Path) -> Vec<u8> {
    disk::read(path).expect("the file is there")
}

#[test]
fn saving_over_another_scene_asks_first() {
    let folder = tempfile::tempdir().unwrap();
    let mut bench = Bench::of_file(&clip_file(folder.path(), "walk.bvh"));
    let other = folder.path().join("crane.ron");
    disk::write(&other, b"another scene").unwrap();
    bench.act(Action::MendSafe);

    // A double click in the list names the file, and no more.
    bench.act(Action::SaveAs);
    bench.0.get_by_role(Role::TextInput).focus();
    bench.run();
    bench.press(Modifiers::COMMAND, Key::A);
    bench.0.get_by_role(Role::TextInput).type_text(&format!("{}/", folder.path().display()));
    bench.run();
    double_click(&mut bench, "crane.ron");
    assert_eq!(field(&bench).0, other.display().to_string());
    assert_eq!(bytes(&other), b"another scene");

    // The ending may be left out. Enter asks, and a second Enter goes back to the name.
    let question = "crane.ron exists. Replace it?";
    enter_path(&mut bench, &folder.path().join("crane"));
    bench.0.get_by_label(question);
    assert!(bench.0.get_by_label("Choose another name").accesskit_node().is_focused());
    bench.press(Modifiers::NONE, Key::Enter);
    assert!(bench.0.query_by_label(question).is_none());
    assert!(field(&bench).1, "the name can be typed anew");
    assert_eq!(bytes(&other), b"another scene");

    bench.press(Modifiers::NONE, Key::Enter);
    bench.0.get_by_label(question);
    bench.click("Replace");
    assert_ne!(bytes(&other), b"another scene");
    assert!(!turnwright::app::Screen::title(bench.window()).starts_with('*'), "{}", bench.messages());

    // From here on it is the document's own scene.
    bench.act(Action::Undo);
    bench.act(Action::SaveAs);
    enter_path(&mut bench, &other);
    assert!(bench.0.query_by_label(question).is_none());
    assert!(!turnwright::app::Screen::title(bench.window()).starts_with('*'), "{}", bench.messages());
    bench.act(Action::Redo);
    bench.act(Action::Save);
    assert!(!turnwright::app::Screen::title(bench.window()).starts_with('*'), "{}", bench.messages());
}

#[test]
fn exporting_over_a_file_asks_each_time_and_names_the_sheet_as_well() {
    let folder = tempfile::tempdir().unwrap();
    let source = clip_file(folder.path(), "walk.bvh");
    let mut bench = Bench::of_file(&source);
    bench.act(Action::MendSafe);
    let other = folder.path().join("mine.csv");
    disk::write(&other, b"mine").unwrap();
    bench.act(Action::Export);
    enter_path(&mut bench, &other);
    bench.0.get_by_label("mine.csv exists. Replace it?");
    assert_eq!(bytes(&other), b"mine");
    bench.click("Replace");
    assert_ne!(bytes(&other), b"mine", "{}", bench.messages());

    bench.act(Action::Export);
    enter_path(&mut bench, &other);
    bench.0.get_by_label("mine.csv and mine-proof.html exist. Replace them?");
    // Another choice is another question.
    bench.click("Proof sheet beside it");
    bench.click("Export");
    bench.0.get_by_label("mine.csv exists. Replace it?");
    bench.press(Modifiers::NONE, Key::Escape);

    // The source is refused and not asked about.
    bench.act(Action::Export);
    enter_path(&mut bench, &source);
    assert!(bench.0.query_by_label_contains("Replace").is_none());
    assert!(bench.0.query_by_label_contains("which is never changed; choose another name").is_some());
    assert!(field(&bench).1);
}

#[test]
fn work_is_asked_about_once_before_a_path_is_typed() {
    let folder = tempfile::tempdir().unwrap();
    let mut bench = Bench::of_file(&clip_file(folder.path(), "walk.bvh"));
    let next = clip_file(folder.path(), "next.bvh");
    let name = |bench: &Bench<'_>| bench.window().bench().project.as_ref().unwrap().name();
    bench.act(Action::MendSafe);

    // Whoever cancels keeps the document, and is asked again the next time.
    bench.act(Action::OpenPath);
    bench.click("Discard");
    bench.click("Cancel");
    bench.ask(Command::OpenFiles(vec![next.clone()]));
    bench.0.get_by_label("Save your work?");
    bench.click("Cancel");

    bench.act(Action::OpenPath);
    bench.click("Discard");
    enter_path(&mut bench, &next);
    assert!(bench.0.query_by_label("Save your work?").is_none());
    assert_eq!(name(&bench), "next.bvh");

    // A document that was changed in between is asked about.
    bench.act(Action::MendSafe);
    bench.act(Action::OpenPath);
    bench.click("Discard");
    let pass = bench.window().bench().work().unwrap().passes[0].id;
    bench.ask(Command::Edit(Edit::SwitchPass { work: 0, pass, on: false }));
    enter_path(&mut bench, &folder.path().join("walk.bvh"));
    bench.0.get_by_label("Save your work?");
    assert_eq!(name(&bench), "next.bvh");
}

#[test]
fn a_file_that_cannot_be_opened_is_told_in_the_dialog_with_what_to_do() {
    let folder = tempfile::tempdir().unwrap();
    let torn = folder.path().join("torn.bvh");
    disk::write(&torn, b"HIERARCHY\nROOT hip\n{\n  OFFSET 0 0\n").unwrap();
    let scene = folder.path().join("torn.ron");
    disk::write(&scene, b"").unwrap();
    let mut bench = Bench::open(Start::Empty);
    bench.act(Action::OpenPath);
    let advice = [
        (torn, "put it right there, or export the clip anew"),
        (folder.path().join("none.bvh"), "check its name and folder"),
        (scene, "save it anew from the window"),
    ];
    for (path, advice) in advice {
        enter_path(&mut bench, &path);
        let told = bench.0.get_by_label_contains(advice);
        let words = told.accesskit_node().value().or_else(|| told.accesskit_node().label());
        assert!(words.unwrap().contains(&path.display().to_string()));
        assert!(field(&bench).1, "the field has the keyboard again");
        assert_eq!(bench.messages(), "");
    }
}

#[test]
fn each_odd_thing_of_a_file_can_be_read() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("odd.bvh");
    let text = "HIERARCHY\nROOT hip\n{\nOFFSET 0 0 0\nCHANNELS 3 Zrotation Xrotation Yrotation\nEnd Site\n{\nOFFSET 0 1 0\n}\n}\n\
        MOTION\nFrames: 9\nFrame Time: 0.04\n0 0 0\n1 0 0\n2 0 0\n3 0\n";
    disk::write(&path, text.as_bytes()).unwrap();
    let notes = open(&path, &OpenOptions::default()).unwrap().notes.clone();
    assert_eq!(notes.len(), 2);
    let mut bench = Bench::of_file(&path);
    assert!(bench.messages().contains("2 things are odd"), "{}", bench.messages());
    let second = notes[1].to_string();
    assert!(bench.0.query_by_label_contains(&second).is_none());
    bench.click("Show all");
    bench.0.get_by_label_contains(&second);
    bench.click("Show less");
    assert!(bench.0.query_by_label_contains(&second).is_none());
}

/// The first snag of this kind on this joint.
fn snag_of(bench: &Bench<'_>, kind: SnagKind, joint: &str) -> usize {
    let bench = bench.window().bench();
    let clip = bench.source().expect("a clip");
    let joint = clip.skeleton.find(joint).expect("a joint of the demo");
    let found = bench.snags().iter().position(|snag| snag.kind == kind && snag.joint == joint);
    found.expect("a snag of the demo")
}

#[test]
fn a_mend_that_is_only_looked_at_is_in_no_number() {
    let mut bench = Bench::open(Start::Demo);
    let (left, mended) =
        (snag_of(&bench, SnagKind::Spike, "LeftHand"), snag_of(&bench, SnagKind::Spike, "Head"));
    bench.act(Action::LookAtMend);
    bench.ask(Command::ChooseSnag(left));
    let hand = bench.window().bench().snags()[left].joint;
    let is_shown_mended = |bench: &Bench<'_>| {
        let bench = bench.window().bench();
        !bench.source().unwrap().same_joint(bench.result().unwrap(), hand)
    };
    assert!(is_shown_mended(&bench));
    bench.0.get_by_label_contains("Shown mended, not accepted yet");
    bench.act(Action::Export);
    bench.0.get_by_label("Nothing is changed");
    bench.ask(Command::CloseDialog);

    // What is left is shown as it is.
    bench.act(Action::Leave);
    assert!(!is_shown_mended(&bench), "a snag that is left is not shown mended");
    bench.act(Action::Leave);
    assert!(is_shown_mended(&bench));

    // The other spike is mended while this one is looked at.
    let snag = bench.window().bench().snags()[mended].clone();
    bench.ask(Command::Edit(Edit::Mend { work: 0, snags: vec![snag] }));
    assert!(is_shown_mended(&bench));
    let told = bench.window().bench().to_be_written().expect("passes that were run").changes.clone();
    assert_eq!((told.joints, told.largest_joint.as_deref()), (1, Some("Head")));
    let shown = changes(bench.window().bench().source().unwrap(), bench.window().bench().result().unwrap());
    assert_eq!(shown.joints, 2, "both are seen");
    // The list of passes, and the dialog over it.
    assert_eq!(bench.0.query_all_by_label(&told.sentence()).count(), 1);
    bench.act(Action::Export);
    assert_eq!(bench.0.query_all_by_label(&told.sentence()).count(), 2);
    assert!(bench.0.query_by_label_contains("2 joints").is_none());
    bench.ask(Command::CloseDialog);

    // Accepted it counts.
    bench.act(Action::Mend);
    assert_eq!(bench.window().bench().to_be_written().unwrap().changes.joints, 2);
    let mark = SnagMark::of(&bench.window().bench().snags()[left]);
    assert!(bench.window().bench().work().unwrap().mends(mark));
}

#[test]
fn the_export_sheet_lists_every_pass_and_nothing_stands_on_anything() {
    let folder = tempfile::tempdir().unwrap();
    let path = clip_file(folder.path(), "walk.bvh");
    for size in [[1440.0, 900.0], [1000.0, 600.0], [720.0, 450.0]] {
        let mut bench = Bench::of_size(start_of(&path), size);
        let snags = bench.window().bench().snags().to_vec();
        bench.ask(Command::Edit(Edit::Mend { work: 0, snags }));
        for offer in [Offer::Smooth, Offer::Limits, Offer::Reduce] {
            bench.ask(Command::Time(TimeCommand::AddPass(offer)));
        }
        let titles: Vec<String> = bench.passes().iter().map(PassStep::title).collect();
        assert!(titles.len() >= 8, "{titles:?}");
        bench.act(Action::Export);
        for title in &titles {
            let beginning = format!("{title}: ");
            let rows = bench.0.query_all_by_label_contains(&beginning);
            let words = |row: &egui_kittest::Node<'_>| {
                let row = row.accesskit_node();
                row.value().or_else(|| row.label()).unwrap_or_default()
            };
            let rows = rows.filter(|row| words(row).starts_with(&beginning));
            assert!(rows.count() >= 1, "{title} is not listed at {size:?}");
        }
        let rect = |label: &str| bench.0.get_by_label(label).rect();
        let below = [
            rect("The same format: everything but the changed curves stays as it is in your file"),
            rect("Proof sheet beside it"),
            rect("Export"),
        ];
        let field = bench.0.get_by_role(Role::TextInput).rect();
        for pair in [&[field][..], &below[..]].concat().windows(2) {
            assert!(pair[0].bottom() <= pair[1].top() + 0.5, "{pair:?} at {size:?}");
        }
        assert!(below[2].bottom() <= size[1], "{:?} at {size:?}", below[2]);
    }
}

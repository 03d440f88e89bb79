//! The list of snags by keyboard and by its filters, what a scene remembers of it, and a long search that is stopped.

use std::time::{Duration, Instant};

use egui::{Key, Modifiers};
use egui_kittest::Harness;
use egui_kittest::kittest::{NodeT as _, Queryable as _};
use turnwright::app::commands::Command;
use turnwright::app::paint::CpuRenderer;
use turnwright::app::view_models::{SnagState, snag_states};
use turnwright::app::{Screen as _, Start, Window};
use turnwright::exchange::{ClipAddress, disk};
use turnwright::scene::SnagMark;
use turnwright::snag::Snag;

use crate::gui_harness::window_harness;
use crate::support::shared;

struct Bench<'a>(Harness<'a, Option<Window>>);

impl Bench<'_> {
    fn open(start: Start) -> Self {
        let mut bench = Self(window_harness([1600.0, 1300.0], start));
        bench.0.run_steps(4);
        bench
    }

    fn window(&self) -> &Window {
        self.0.state().as_ref().expect("the window is made in the first frame")
    }

    fn ask(&mut self, command: Command) {
        self.0.state_mut().as_mut().expect("a window").ask(command);
        self.0.run_steps(4);
    }

    #[track_caller]
    fn click(&mut self, label: &str) {
        self.0.get_by_label(label).click();
        self.0.run_steps(4);
    }

    fn press(&mut self, modifiers: Modifiers, key: Key) {
        self.0.key_press_modifiers(modifiers, key);
        self.0.run_steps(4);
    }

    fn snags(&self) -> Vec<Snag> {
        self.window().bench().snags().to_vec()
    }

    fn states(&self) -> Vec<SnagState> {
        snag_states(self.window().bench().snags(), self.window().bench().work().expect("a clip"))
    }

    /// The labels of the rows that the table lists.
    fn rows(&self) -> Vec<String> {
        let nodes = self.0.get_all_by_label_contains("Snag ");
        nodes.filter_map(|node| node.accesskit_node().label()).collect()
    }
}

fn chosen(bench: &Bench<'_>) -> SnagMark {
    SnagMark::of(bench.window().bench().chosen_snag().expect("a chosen snag"))
}

#[test]
fn keys_go_from_snag_to_snag_round_the_list_and_back() {
    let mut bench = Bench::open(Start::Demo);
    let marks: Vec<SnagMark> = bench.snags().iter().map(SnagMark::of).collect();
    assert!(marks.len() > 3);
    assert!(bench.window().bench().chosen_snag().is_none());
    for mark in marks.iter().chain(&marks[..1]) {
        bench.press(Modifiers::NONE, Key::F8);
        assert_eq!(chosen(&bench), *mark);
        let session = &bench.window().bench().session;
        let snag = bench.window().bench().chosen_snag().expect("a chosen snag");
        assert!((session.playback.playhead_secs - snag.first_secs).abs() < 1e-9, "the playhead goes along");
        assert_eq!(session.joint, Some(mark.joint));
    }
    bench.press(Modifiers::SHIFT, Key::F8);
    assert_eq!(chosen(&bench), marks[marks.len() - 1]);
    assert!(bench.window().bench().work().expect("a clip").passes.is_empty(), "looking changes nothing");
}

#[test]
fn the_list_is_filtered_by_kind_and_by_joint_and_keys_stay_within_it() {
    let mut bench = Bench::open(Start::Demo);
    let snags = bench.snags();
    let kind = snags[1].kind;
    let of_kind: Vec<&Snag> = snags.iter().filter(|snag| snag.kind == kind).collect();
    assert!(of_kind.len() < snags.len());
    bench.click("Kinds shown");
    bench.click(&format!("{} {kind} ({})", kind.letter(), of_kind.len()));
    assert_eq!(bench.rows().len(), of_kind.len());
    assert!(bench.rows().iter().all(|row| row.starts_with(&format!("Snag {kind}, "))), "{:?}", bench.rows());
    for snag in of_kind.iter().chain(&of_kind[..1]) {
        bench.press(Modifiers::NONE, Key::F8);
        assert_eq!(chosen(&bench), SnagMark::of(snag));
    }
    bench.click("Kinds shown");
    bench.click("All kinds");
    bench.click("This joint");
    let joint = bench.window().bench().session.joint.expect("the chosen snag's joint");
    let of_joint = snags.iter().filter(|snag| snag.joint == joint).count();
    assert!(of_joint < snags.len());
    assert_eq!(bench.rows().len(), of_joint);
}

#[test]
fn what_is_meant_is_remembered_by_the_scene_and_left_by_every_stroke() {
    let folder = tempfile::tempdir().unwrap();
    let own = turnwright::demo::SCENES[0];
    let path = folder.path().join(own.clip_file);
    disk::write(&path, own.clip_bytes).unwrap();
    let start =
        |path: &std::path::Path| Start::Files(vec![ClipAddress { path: path.to_owned(), clip: None }]);
    let mut bench = Bench::open(start(&path));
    let index = bench.snags().iter().position(|snag| snag.safe).expect("a safe one");
    bench.ask(Command::ChooseSnag(index));
    let meant = chosen(&bench);
    bench.click("Leave");
    assert_eq!(bench.window().bench().work().unwrap().left, [meant]);
    bench.press(Modifiers::COMMAND, Key::M);
    let states = bench.states();
    assert_eq!(states[index], SnagState::Left, "mending all safe ones leaves what is meant");
    let is_kept = |(snag, state): (&Snag, &SnagState)| !snag.safe || *state != SnagState::Open;
    assert!(bench.snags().iter().zip(&states).all(is_kept));
    let scene = folder.path().join("night.ron");
    bench.ask(Command::SaveTo(scene.clone()));

    let again = Bench::open(start(&scene));
    assert_eq!(again.window().bench().work().unwrap().left, [meant]);
    assert_eq!(again.states(), states);
}

/// With threads, as it is for a person: the search of a long clip shows how far it is, and a key stops it.
#[test]
fn a_long_search_shows_its_progress_and_is_stopped_by_key() {
    let Some(dance) = shared("data/bvh/cmu_05_06_dance.bvh") else { return };
    // The dance many times over: a search that lasts.
    let text = String::from_utf8(disk::read(&dance).unwrap()).unwrap();
    let head = text.find("Frames:").expect("a BVH file");
    let rows = text[head..].lines().skip(2).collect::<Vec<_>>();
    let times = text[head..].lines().nth(1).expect("its frame time");
    let rounds = 12;
    let body = format!("{}\n", rows.join("\n")).repeat(rounds);
    let long = format!("{}Frames: {}\n{times}\n{body}", &text[..head], rows.len() * rounds);
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("long.bvh");
    disk::write(&path, long.as_bytes()).unwrap();

    let start = Start::Files(vec![ClipAddress { path, clip: None }]);
    let harness =
        Harness::builder().with_size([1600.0, 1300.0]).renderer(CpuRenderer::new(1)).build_ui_state(
            move |ui, window: &mut Option<Window>| {
                let window = window.get_or_insert_with(|| Window::new(ui.ctx(), start.clone()));
                window.logic(ui.ctx());
                window.ui(ui);
            },
            None,
        );
    let mut bench = Bench(harness);
    let began = Instant::now();
    let wait = |bench: &mut Bench<'_>, what: &str, is_there: &dyn Fn(&Bench<'_>) -> bool| {
        while !is_there(bench) {
            assert!(began.elapsed() < Duration::from_mins(5), "{what} never came");
            bench.0.step();
            std::thread::sleep(Duration::from_millis(2));
        }
    };
    let is_finding = |bench: &Bench<'_>| bench.0.query_by_label("Stop: Finding snags").is_some();
    wait(&mut bench, "the search", &is_finding);
    let title = |bench: &Bench<'_>| bench.window().title().clone();
    let before = title(&bench);
    bench.0.key_press_modifiers(Modifiers::SHIFT, Key::F5);
    wait(&mut bench, "the end of the search", &|bench| !is_finding(bench));
    let findings = bench.window().bench().findings().expect("a clip");
    assert!(findings.snags.is_none() && findings.search_is_stopped);
    assert!(bench.window().messages().any(|words| words == "Finding snags: stopped"));
    assert_eq!(title(&bench), before, "the document is as it was");
    // It stays stopped until it is asked for.
    for _ in 0..20 {
        bench.0.step();
    }
    assert!(!is_finding(&bench));
    bench.0.key_press(Key::F5);
    wait(&mut bench, "the search again", &is_finding);
}

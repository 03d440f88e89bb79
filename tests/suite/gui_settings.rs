//! What the window remembers: keys, areas, hints, light, zoom, files. Each window here has a settings file of its own.

use std::path::{Path, PathBuf};

use egui::{Key, Modifiers, vec2};
use egui_kittest::Harness;
use egui_kittest::kittest::{NodeT as _, Queryable as _};
use turnwright::app::commands::Action;
use turnwright::app::paint::CpuRenderer;
use turnwright::app::settings::{Hint, Settings, SettingsFile};
use turnwright::app::view_models::CurveView;
use turnwright::app::{Screen as _, Start, Window};
use turnwright::exchange::disk;

use crate::gui_harness::Bench;

/// A window that remembers in `file`.
fn remembering(file: &Path, start: Start) -> Bench<'static> {
    let file = SettingsFile::at(file);
    let harness = Harness::builder().with_size([1440.0, 900.0]).renderer(CpuRenderer::new(2)).build_ui_state(
        move |ui, window: &mut Option<Window>| {
            let window = window.get_or_insert_with(|| {
                let mut window = Window::unthreaded(ui.ctx(), start.clone());
                window.remember(ui.ctx(), file.clone(), file.read());
                window
            });
            window.logic(ui.ctx());
            window.ui(ui);
        },
        None,
    );
    let mut bench = Bench(harness);
    bench.run();
    bench
}

fn read(file: &Path) -> Settings {
    SettingsFile::at(file).read().expect("a sound file")
}

/// A file as the desktop drops it.
#[derive(Debug)]
struct Dropped(PathBuf);

impl egui::DroppedFile for Dropped {
    fn path(&self) -> &Path {
        &self.0
    }

    fn bytes(&self) -> Result<Vec<u8>, String> {
        disk::read(&self.0).map_err(|error| error.to_string())
    }
}

fn demo_file(folder: &Path, name: &str) -> PathBuf {
    let path = folder.join(name);
    disk::write(&path, turnwright::demo::SCENES[0].clip_bytes).expect("a folder to write to");
    path
}

#[test]
fn a_window_opens_as_it_was_left() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("settings.ron");
    let mut desk = remembering(&file, Start::Demo);
    desk.act(Action::Light);
    desk.act(Action::SwingTwist);
    desk.act(Action::Larger);
    desk.click("Got it: hint of Snags");
    let known = read(&file);
    assert!(known.light && (known.zoom - 1.25).abs() < 1e-6 && known.hints_read.contains(&Hint::Snags));

    let desk = remembering(&file, Start::Demo);
    let ctx = &desk.0.ctx;
    assert!(!ctx.global_style().visuals.dark_mode, "light again");
    assert!((ctx.zoom_factor() - 1.25).abs() < 1e-6);
    assert_eq!(desk.window().bench().session.curve_view, CurveView::SwingTwist);
    assert!(desk.0.query_by_label("Got it: hint of Snags").is_none(), "a hint is read once");
    assert!(desk.0.query_by_label("Got it: hint of Passes").is_some());
}

#[test]
fn a_window_without_a_file_shows_no_hints_until_asked_and_writes_nothing() {
    let mut desk = Bench::open(Start::Demo);
    assert!(desk.0.query_all_by_label_contains("Got it").next().is_none());
    desk.act(Action::ShowHints);
    assert_eq!(desk.0.query_all_by_label_contains("Got it: hint of").count(), Hint::ALL.len());
    for hint in Hint::ALL {
        desk.click(&format!("Got it: hint of {}", hint.area()));
    }
    assert!(desk.0.query_all_by_label_contains("Got it").next().is_none());
}

#[test]
fn a_damaged_file_is_told_of_and_kept_aside() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("settings.ron");
    disk::write(&file, b"(light: maybe").unwrap();
    let desk = remembering(&file, Start::Empty);
    let told: Vec<&str> = desk.window().messages().collect();
    assert!(told.iter().any(|text| text.contains("settings.ron.damaged")), "{told:?}");
    assert_eq!(disk::read(&folder.path().join("settings.ron.damaged")).unwrap(), b"(light: maybe");
}

#[test]
fn keys_are_changed_conflicts_are_told_and_the_usual_ones_come_back() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("settings.ron");
    let mut desk = remembering(&file, Start::Demo);
    desk.press(Modifiers::NONE, Key::F1);
    let keys_of = |desk: &Bench<'_>, label: &str| {
        let label = format!("Keys of {label}: ");
        let node = desk.0.get_all_by_label_contains(&label).next().expect("a row").accesskit_node().label();
        node.expect("a label").trim_start_matches(&label).to_owned()
    };
    assert_eq!(keys_of(&desk, "Loop"), "Ctrl+L");
    desk.click("Keys of Loop: Ctrl+L");
    desk.press(Modifiers::NONE, Key::F9);
    assert_eq!(keys_of(&desk, "Loop"), "F9");
    // Somebody else's keys are not taken without being asked.
    desk.click("Keys of Loop: F9");
    desk.press(Modifiers::COMMAND, Key::G);
    assert_eq!(keys_of(&desk, "Loop"), "F9");
    assert_eq!(keys_of(&desk, "Show source as well"), "Ctrl+G");
    desk.click("Give them to Loop");
    assert_eq!(keys_of(&desk, "Loop"), "Ctrl+G");
    assert_eq!(keys_of(&desk, "Show source as well"), "none");
    // Keys are taken away, and the usual ones come back, by the buttons beside them.
    desk.click("Usual keys for Show source as well: Ctrl+G");
    assert_eq!([keys_of(&desk, "Show source as well"), keys_of(&desk, "Loop")], ["Ctrl+G", "none"]);
    desk.click("No keys for Show source as well");
    assert_eq!(keys_of(&desk, "Show source as well"), "none");
    desk.click("Keys of Loop: none");
    desk.press(Modifiers::COMMAND, Key::G);
    // A bare letter is for typing.
    desk.click("Keys of Loop: Ctrl+G");
    desk.press(Modifiers::NONE, Key::K);
    assert_eq!(keys_of(&desk, "Loop"), "Ctrl+G");
    // Escape leaves keys, and the sheet, as they are.
    desk.click("Keys of Loop: Ctrl+G");
    desk.press(Modifiers::NONE, Key::Escape);
    assert_eq!(keys_of(&desk, "Loop"), "Ctrl+G");
    desk.click("Close");

    let loops = |desk: &Bench<'_>| desk.window().bench().session.playback.is_looping;
    let before = loops(&desk);
    desk.press(Modifiers::COMMAND, Key::L);
    assert_eq!(loops(&desk), before, "the old keys do nothing");
    desk.press(Modifiers::COMMAND, Key::G);
    assert_ne!(loops(&desk), before, "the new ones do");

    // The next run knows them; then all are as usual.
    let mut desk = remembering(&file, Start::Demo);
    let before = loops(&desk);
    desk.press(Modifiers::COMMAND, Key::G);
    assert_ne!(loops(&desk), before);
    desk.act(Action::Shortcuts);
    desk.click("Usual keys for all");
    assert_eq!(keys_of(&desk, "Loop"), "Ctrl+L");
    assert!(read(&file).keys.is_empty());
}

#[test]
fn dividers_are_dragged_stepped_with_arrows_and_set_back() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("settings.ron");
    let mut desk = remembering(&file, Start::Demo);
    let width = |desk: &Bench<'_>| desk.0.get_by_label("Skeleton view").rect().width();
    let before = width(&desk);
    let line = desk.0.get_by_label("Divider between skeleton and charts").rect().center();
    desk.0.hover_at(line);
    desk.0.step();
    desk.0.drag_at(line);
    desk.0.step();
    desk.0.hover_at(line + vec2(120.0, 0.0));
    desk.0.step();
    desk.0.drop_at(line + vec2(120.0, 0.0));
    desk.run();
    assert!((width(&desk) - before - 120.0).abs() < 3.0, "{before} to {}", width(&desk));
    let share = read(&file).layout.space.expect("the share is kept");
    assert!(share > 0.35);

    let mut desk = remembering(&file, Start::Demo);
    assert!((width(&desk) - before - 120.0).abs() < 3.0, "the next run has the same areas");
    desk.0.get_by_label("Divider between skeleton and charts").focus();
    desk.run();
    let before = width(&desk);
    desk.press(Modifiers::NONE, Key::ArrowLeft);
    assert!((before - width(&desk) - 16.0).abs() < 2.0, "{before} to {}", width(&desk));
    desk.act(Action::UsualLayout);
    assert_eq!(read(&file).layout, turnwright::app::settings::Layout::default());
}

#[test]
fn files_that_were_open_are_in_the_menu_and_dropped_files_open() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("settings.ron");
    let (first, second) =
        (demo_file(folder.path(), "first walk.bvh"), demo_file(folder.path(), "second.bvh"));
    let mut desk = remembering(&file, Start::Demo);
    for path in [&first, &second] {
        desk.0.input_mut().dropped_files.push(std::sync::Arc::new(Dropped(path.clone())));
        desk.run();
        let name = path.file_name().unwrap().to_string_lossy().into_owned();
        assert_eq!(desk.window().bench().project.as_ref().unwrap().name(), name);
    }
    assert_eq!(read(&file).recent, [second.clone(), first.clone()]);

    let mut desk = remembering(&file, Start::Empty);
    desk.click("File");
    desk.0.get_by_label_contains("Open recent").hover();
    desk.run();
    desk.click("first walk.bvh");
    assert_eq!(desk.window().bench().project.as_ref().unwrap().name(), "first walk.bvh");
    assert_eq!(read(&file).recent, [first, second]);
}

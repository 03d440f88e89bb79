//! The real program in a real window: an X display without a screen, driven by mouse and keyboard.

use std::cell::RefCell;
use std::time::Duration;

use turnwright::app::settings::{Settings, SettingsFile};
use turnwright::exchange::disk;

use crate::display::{Desk, count, display, missing_tool};

#[test]
fn a_clip_is_cleaned_up_with_mouse_and_keyboard() {
    if missing_tool().is_some() {
        return;
    }
    let (_server, display) = display().expect("a display starts");
    let desk = Desk { display, program: RefCell::new(None) };
    let folder = tempfile::tempdir().unwrap();
    let scene = turnwright::demo::SCENES[0];
    let clip = folder.path().join(scene.clip_file);
    disk::write(&clip, scene.clip_bytes).unwrap();
    // Nothing of whoever runs this is read or written.
    let settings = folder.path().join("settings.ron");
    SettingsFile::at(&settings).write(&Settings::without_hints()).unwrap();
    desk.start(&[&clip], &settings);
    let window = desk.window("deckhand.bvh - Turnwright");
    desk.focus(&window);
    desk.tool(&["windowmove", &window, "0", "0"]);

    // The figure, the heat of the map and the marks of snags are there, once they have been worked out.
    let snag = |[r, g, b]: [u8; 3]| r > 190 && (70..115).contains(&g) && b < 40;
    let open =
        desk.wait("marks of snags", || Some(desk.picture()).filter(|picture| count(picture, snag) > 400));
    let violet = |[r, g, b]: [u8; 3]| r > 120 && b > 130 && i32::from(r) - i32::from(g) > 25;
    assert!(count(&open, violet) > 4000, "{} pixels of the figure", count(&open, violet));

    // The keyboard mends all that is safe; the title says that there is unsaved work.
    // Pressing it again does no harm, and the first press may come before the window knows of its focus.
    desk.wait("unsaved work in the title", || {
        desk.focus(&window);
        desk.press("ctrl+m");
        std::thread::sleep(Duration::from_millis(500));
        desk.tool(&["getwindowname", &window]).starts_with("* deckhand.bvh").then_some(())
    });
    let mended = desk.wait("fewer open marks", || {
        Some(desk.picture()).filter(|picture| 2 * count(picture, snag) < count(&open, snag))
    });

    // The mouse goes to the middle of the scrub bar: its knob, light on dark, comes there, and the figure moves.
    let middle = 882 * 1440 + 720;
    assert!(mended[middle][0] < 160, "the knob is still at the left end");
    desk.tool(&["mousemove", "--sync", "720", "882", "click", "1"]);
    desk.wait("the knob in the middle", || (desk.picture()[middle][0] > 210).then_some(()));

    // Undo, redo, save under the name that is offered, quit.
    desk.press("ctrl+z");
    desk.window("^deckhand.bvh - Turnwright");
    desk.press("ctrl+shift+z");
    desk.window(r"^\* deckhand.bvh - Turnwright");
    desk.press("ctrl+s");
    let saved = folder.path().join("deckhand.ron");
    desk.wait("the saved scene", || {
        // The sheet may take a moment to appear; without it the key means nothing.
        std::thread::sleep(Duration::from_millis(800));
        desk.press("Return");
        std::thread::sleep(Duration::from_millis(300));
        saved.is_file().then_some(())
    });
    desk.window("^deckhand.ron - Turnwright");
    desk.press("ctrl+q");
    let status = desk.end();
    assert!(status.success(), "{status}");
    assert_eq!(disk::read(&clip).unwrap(), scene.clip_bytes, "the source is never changed");
}

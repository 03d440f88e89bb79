//! A whole clean-up in a real window: a captured dance is opened, its snags are looked at and mended, a pass is changed, undone and redone, the
//! scene is saved, closed, opened again and exported. Pictures of each stage are kept in `target/window-session`.

use std::cell::RefCell;
use std::path::{Path, PathBuf};

use turnwright::app::settings::{Settings, SettingsFile};
use turnwright::exchange::{OpenOptions, disk, open, ron};

use crate::display::{Desk, count, display, missing_tool};
use crate::support::shared;

fn pictures() -> PathBuf {
    let target = Path::new(env!("CARGO_TARGET_TMPDIR")).parent().expect("it lies in the target folder");
    target.join("window-session")
}

#[test]
fn a_captured_dance_is_cleaned_up_from_opening_to_export() {
    let Some(dance) = shared("data/bvh/cmu_05_06_dance.bvh") else { return };
    if missing_tool().is_some() {
        return;
    }
    let (_server, display) = display().expect("a display starts");
    let desk = Desk { display, program: RefCell::new(None) };
    let folder = tempfile::tempdir().unwrap();
    let clip = folder.path().join("dance.bvh");
    let bytes = disk::read(&dance).unwrap();
    disk::write(&clip, &bytes).unwrap();
    let settings = folder.path().join("settings.ron");
    SettingsFile::at(&settings).write(&Settings::without_hints()).unwrap();
    let keep = |name: &str| desk.keep_picture(&pictures().join(format!("{name}.png")));

    // Open: the marks of snags appear.
    desk.start(&[&clip], &settings);
    let window = desk.window("dance.bvh - Turnwright");
    desk.focus(&window);
    desk.tool(&["windowmove", &window, "0", "0"]);
    let snag = |[r, g, b]: [u8; 3]| r > 190 && (70..115).contains(&g) && b < 40;
    let chosen = |[r, g, b]: [u8; 3]| r > 220 && g > 210 && (40..100).contains(&b);
    let marks =
        desk.wait("marks of snags", || Some(count(&desk.picture(), snag)).filter(|&marks| marks > 200));
    keep("1 opened");

    // Jump to a snag: it is ringed in the colour of the choice.
    let before = count(&desk.picture(), chosen);
    desk.press_until(&window, "F8", "a chosen snag", || {
        (count(&desk.picture(), chosen) > before + 100).then_some(())
    });
    keep("2 a snag is chosen");

    // Mend it. When it is mended the key does nothing more, so pressing it again does no harm.
    let is_unsaved = || desk.title(&window).starts_with("* ").then_some(());
    desk.press_until(&window, "ctrl+Return", "unsaved work", is_unsaved);
    keep("3 mended");
    // Mend all that needs no judgement: fewer open marks.
    let few = desk.press_until(&window, "ctrl+m", "fewer marks", || {
        Some(count(&desk.picture(), snag)).filter(|&now| 4 * now < 3 * marks)
    });
    keep("4 all safe ones mended");

    // Undo and redo, both steps, told by the title. Past the ends the keys do nothing.
    let is_clean = || (!desk.title(&window).starts_with("* ")).then_some(());
    desk.press_until(&window, "ctrl+z", "nothing unsaved", is_clean);
    // The ring of the chosen one covers a few of their pixels.
    desk.wait("all marks again", || (10 * count(&desk.picture(), snag) >= 9 * marks).then_some(()));
    keep("5 undone");
    desk.press_until(&window, "ctrl+shift+z", "unsaved work again", is_unsaved);
    desk.press_until(&window, "ctrl+shift+z", "fewer marks again", || {
        (count(&desk.picture(), snag) <= few + 40).then_some(())
    });

    // Save under the name that is offered, close.
    let scene = folder.path().join("dance.ron");
    desk.press("ctrl+s");
    desk.press_until(&window, "Return", "the saved scene", || scene.is_file().then_some(()));
    desk.window("^dance.ron - Turnwright");
    keep("6 saved");
    desk.press("ctrl+q");
    assert!(desk.end().success());
    let kept = ron::read(&scene).unwrap().document;
    assert!(!kept.works[0].passes.is_empty(), "the mends are in the scene");
    assert!(
        SettingsFile::at(&settings).read().unwrap().recent.iter().any(|path| path.ends_with("dance.ron"))
    );

    // Open the scene: the mended marks are as they were. Export under the name that is offered.
    desk.start(&[&scene], &settings);
    let window = desk.window("^dance.ron - Turnwright");
    desk.focus(&window);
    desk.wait("fewer marks than at first", || {
        let now = count(&desk.picture(), snag);
        (now > 0 && now < marks).then_some(())
    });
    keep("7 opened again");
    let exported = folder.path().join("dance_mended.bvh");
    desk.wait("the exported clip", || {
        if exported.is_file() {
            return Some(());
        }
        desk.focus(&window);
        // Where the sheet is open already this key means nothing.
        desk.press("ctrl+e");
        std::thread::sleep(std::time::Duration::from_secs(1));
        desk.press("Return");
        std::thread::sleep(std::time::Duration::from_secs(1));
        None
    });
    keep("8 exported");
    desk.press("ctrl+q");
    assert!(desk.end().success());

    // What was asked for has happened, and nothing else: the result opens and differs only in mended joints.
    assert_eq!(disk::read(&clip).unwrap(), bytes, "the source is never changed");
    let [source, result] =
        [&clip, &exported].map(|path| open(path, &OpenOptions::default()).unwrap().clips[0].clone());
    let mended: Vec<usize> = kept.works[0]
        .passes
        .iter()
        .filter_map(|pass| pass.step.as_mend())
        .flat_map(|pass| pass.snags.iter().map(|snag| snag.joint))
        .collect();
    let keys = |clip: &turnwright::clip::Clip, joint| clip.rotation(joint).map(|track| track.keys.to_vec());
    let mut changed = 0;
    for joint in 0..source.joints.len() {
        let is_same = keys(&source, joint) == keys(&result, joint);
        assert!(is_same || mended.contains(&joint), "joint {joint} has no mend and is changed");
        changed += usize::from(
            !is_same
                || source.rotation(joint).map(|track| &track.stored)
                    != result.rotation(joint).map(|track| &track.stored),
        );
    }
    assert!(changed > 0, "something was mended");
}

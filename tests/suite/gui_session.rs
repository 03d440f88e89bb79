//! A whole clean-up in a real window: a captured dance is opened, its snags are looked at and mended, a curve is pushed softly, a stretch gets
//! another path; this is undone and redone, saved, closed, opened again and exported. Pictures of each stage are kept in
//! `target/window-session`.
//!
//! What the window has done is read from the scene that it saves: keys that have reached it are dealt with in order, so that what
//! was asked for before saving is in the file. Whatever is waited for is a state.

use std::cell::RefCell;
use std::path::{Path, PathBuf};

use turnwright::app::settings::{Settings, SettingsFile};
use turnwright::clip::{Clip, KeyChange, PathKind};
use turnwright::exchange::{OpenOptions, disk, open, ron};
use turnwright::scene::{ClipWork, PassStep};

use crate::display::{Desk, count, display, missing_tool};
use crate::support::shared;

fn pictures() -> PathBuf {
    let target = Path::new(env!("CARGO_TARGET_TMPDIR")).parent().expect("it lies in the target folder");
    target.join("window-session")
}

/// The window and the scene that it saves to.
struct Session {
    desk: Desk,
    window: String,
    scene: PathBuf,
    /// The picture that was kept last.
    kept: RefCell<Vec<[u8; 3]>>,
}

impl Session {
    /// Keeps a picture of the stage once the window shows another than the last one kept, and nothing moves any more: titles and saved files
    /// come before the window is painted.
    fn keep(&self, name: &str) {
        let another = self.desk.wait("another picture that stands still", || {
            let own = self.desk.picture();
            (own != *self.kept.borrow() && own == self.desk.picture()).then_some(own)
        });
        self.kept.replace(another);
        self.desk.keep_picture(&pictures().join(format!("{name}.png")));
    }

    fn is_unsaved(&self) -> bool {
        self.desk.title(&self.window).starts_with("* ")
    }

    /// Presses keys once, one after the other.
    fn press(&self, keys: &[&str]) {
        self.desk.focus(&self.window);
        for key in keys {
            self.desk.press(key);
        }
    }

    /// Whether a sheet lies over the window: it dims the bar of menus, which nothing else does.
    fn has_sheet(&self) -> bool {
        /// Amid the bar, where no word stands, in a window 1440 pixels wide.
        const BAR: usize = 10 * 1440 + 720;
        self.desk.picture()[BAR].iter().map(|&part| u32::from(part)).sum::<u32>() < 100
    }

    /// Opens a sheet and accepts the path it offers, until there is a file. A sheet whose button has to wait for work in the background
    /// passes Return over: it is closed and opened again.
    #[track_caller]
    fn accept_path(&self, key: &str, file: &Path) {
        self.desk.wait("the file", || {
            self.desk.press_until(&self.window, key, "a sheet", || self.has_sheet().then_some(()));
            self.keep(&format!("sheet of {key}"));
            self.press(&["Return"]);
            let pressed = std::time::Instant::now();
            while pressed.elapsed().as_secs() < 5 {
                if file.is_file() {
                    return Some(());
                }
                std::thread::sleep(std::time::Duration::from_millis(100));
            }
            self.press(&["Escape"]);
            None
        });
        // Where the file came late the last key was for a sheet that is gone.
        self.desk.press_until(&self.window, "Escape", "no sheet", || (!self.has_sheet()).then_some(()));
    }

    /// Saves what is unsaved and gives what was saved.
    #[track_caller]
    fn saved(&self) -> ClipWork {
        self.desk.wait("unsaved work", || self.is_unsaved().then_some(()));
        self.press(&["ctrl+s"]);
        self.desk.wait("nothing unsaved", || (!self.is_unsaved()).then_some(()));
        self.work()
    }

    #[track_caller]
    fn work(&self) -> ClipWork {
        ron::read(&self.scene).expect("a scene").document.works[0].clone()
    }

    /// Asks to quit until the program has ended by itself: where a sheet still goes the first wish is not heard.
    #[track_caller]
    fn quit(&self) {
        self.desk.press_until_end("ctrl+q");
    }
}

/// Names of the kinds of passes.
fn kinds(work: &ClipWork) -> Vec<&'static str> {
    let name = |step: &PassStep| match step {
        PassStep::Mend(_) => "mend",
        PassStep::Push(_) => "push",
        PassStep::Keys(_) => "keys",
        _ => "another",
    };
    let mut names: Vec<&str> = work.passes.iter().map(|pass| name(&pass.step)).collect();
    names.dedup();
    names
}

/// How many snags are mended.
fn mended_snags(work: &ClipWork) -> usize {
    work.passes.iter().filter_map(|pass| pass.step.as_mend()).map(|pass| pass.snags.len()).sum()
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

    // Open: the marks of snags appear.
    desk.start(&[&clip], &settings);
    let window = desk.window("dance.bvh - Turnwright");
    desk.focus(&window);
    desk.tool(&["windowmove", &window, "0", "0"]);
    let mut session =
        Session { desk, window, scene: folder.path().join("dance.ron"), kept: RefCell::default() };
    let desk = &session.desk;
    let snag = |[r, g, b]: [u8; 3]| r > 190 && (70..115).contains(&g) && b < 40;
    let chosen = |[r, g, b]: [u8; 3]| r > 220 && g > 210 && (40..100).contains(&b);
    desk.wait("marks of snags", || (count(&desk.picture(), snag) > 200).then_some(()));
    session.keep("1 opened");

    // Jump to a snag: it is ringed in the colour of the choice.
    let before = count(&desk.picture(), chosen);
    desk.press_until(&session.window, "F8", "a chosen snag", || {
        (count(&desk.picture(), chosen) > before + 100).then_some(())
    });
    session.keep("2 a snag is chosen");

    // Mend it. Where it is mended already this key does nothing.
    desk.press_until(&session.window, "ctrl+Return", "unsaved work", || session.is_unsaved().then_some(()));
    session.keep("3 mended");

    // Save under the name that is offered; from here on the scene tells what has been done.
    session.accept_path("ctrl+s", &session.scene);
    desk.window("^dance.ron - Turnwright");
    assert_eq!((kinds(&session.work()), mended_snags(&session.work())), (vec!["mend"], 1));

    // Mend all that needs no judgement.
    session.press(&["ctrl+m"]);
    let mended = session.saved();
    session.keep("4 all safe ones mended");
    assert_eq!(kinds(&mended), ["mend"]);
    assert!(mended_snags(&mended) > 5, "{}", mended_snags(&mended));

    // Push the chosen joint's curve softly at the playhead, five degrees up.
    session.press(&["ctrl+alt+Up"; 5]);
    let pushed = session.saved();
    session.keep("5 pushed softly");
    assert_eq!(kinds(&pushed), ["mend", "push"]);
    let Some(PassStep::Push(push)) = pushed.passes.last().map(|pass| &pass.step) else { panic!("a push") };
    let [push] = push.pushes.as_slice() else { panic!("one push: {push:?}") };
    // A degree of one plane angle turns by a degree at most.
    assert!((1.0..5.1).contains(&push.turn.length().to_degrees()), "{push:?}");

    // Choose a stretch of its keys, make it one segment and let a smooth path lead over it, coming to a standstill.
    let forward = ["Right"; 16];
    session.press(&[&["alt+bracketleft"][..], &forward, &["alt+bracketright"]].concat());
    session.press(&["ctrl+alt+a", "alt+shift+m", "alt+shift+q", "alt+shift+o"]);
    let shaped = session.saved();
    session.keep("6 another path");
    assert_eq!(kinds(&shaped), ["mend", "push", "keys"]);
    let Some(PassStep::Keys(keys)) = shaped.passes.last().map(|pass| &pass.step) else { panic!("keys") };
    let changes: Vec<&KeyChange> = keys.edits.iter().map(|edit| &edit.change).collect();
    let [KeyChange::Delete(gone), KeyChange::Path(starts, PathKind::Squad), KeyChange::Space(..)] =
        changes[..]
    else {
        panic!("{changes:?}")
    };
    assert_eq!((gone.len(), starts.len()), (15, 1));

    // Undo spacing, path, segment and push, redo them. Redone, the document is again the one that was saved, and the title says so.
    session.press(&["ctrl+z"; 4]);
    desk.wait("unsaved work", || session.is_unsaved().then_some(()));
    session.keep("7 undone");
    session.press(&["ctrl+shift+z"; 4]);
    desk.wait("nothing unsaved", || (!session.is_unsaved()).then_some(()));
    // The first of five keys that pushed made a step, the others went on with it.
    session.press(&["ctrl+z"; 4]);
    assert_eq!(session.saved(), mended);
    session.press(&["ctrl+shift+z"; 4]);
    assert_eq!(session.saved(), shaped);
    session.keep("8 redone and saved");

    session.quit();
    let kept = session.work();
    assert_eq!(kept, shaped);
    assert!(
        SettingsFile::at(&settings).read().unwrap().recent.iter().any(|path| path.ends_with("dance.ron"))
    );

    // Open the scene. Export under the name that is offered.
    session.desk.start(&[&session.scene], &settings);
    session.window = session.desk.window("^dance.ron - Turnwright");
    let desk = &session.desk;
    desk.focus(&session.window);
    desk.tool(&["windowmove", &session.window, "0", "0"]);
    desk.wait("marks of what is left open", || (count(&desk.picture(), snag) > 20).then_some(()));
    session.keep("9 opened again");
    let exported = folder.path().join("dance_mended.bvh");
    session.accept_path("ctrl+e", &exported);
    session.keep("10 exported");
    session.quit();

    // What was asked for has happened, and nothing else.
    assert_eq!(disk::read(&clip).unwrap(), bytes, "the source is never changed");
    let [source, result] =
        [&clip, &exported].map(|path| open(path, &OpenOptions::default()).unwrap().clips[0].clone());
    assert_only_named_joints_differ(&kept, &source, &result);
    let turned = |clip: &Clip, secs: f64| clip.rotation(push.joint).unwrap().at(secs);
    let middle = source.grid.time(source.grid.frame(f64::midpoint(starts[0], gone[14])));
    for (secs, what) in [(push.center_secs, "pushed"), (middle, "led over")] {
        let by = turned(&source, secs).turn_to(turned(&result, secs)).to_degrees();
        assert!(by > 0.01, "{what} at {secs} by {by}°");
    }
}

/// Joints that no pass names have the very numbers of the source.
fn assert_only_named_joints_differ(work: &ClipWork, source: &Clip, result: &Clip) {
    let named: Vec<usize> = work
        .passes
        .iter()
        .flat_map(|pass| -> Vec<usize> {
            match &pass.step {
                PassStep::Mend(own) => own.snags.iter().map(|snag| snag.joint).collect(),
                PassStep::Push(own) => own.pushes.iter().map(|push| push.joint).collect(),
                PassStep::Keys(own) => own.edits.iter().map(|edit| edit.joint).collect(),
                _ => Vec::new(),
            }
        })
        .collect();
    let numbers =
        |clip: &Clip, joint| clip.rotation(joint).map(|track| (track.keys.to_vec(), track.stored.clone()));
    let differs = |&joint: &usize| numbers(source, joint) != numbers(result, joint);
    let changed: Vec<usize> = (0..source.joints.len()).filter(differs).collect();
    assert!(!changed.is_empty(), "something was mended");
    assert!(changed.iter().all(|joint| named.contains(joint)), "{changed:?} of {named:?}");
}

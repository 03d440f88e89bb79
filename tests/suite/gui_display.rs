//! The real program in a real window: an X display without a screen, driven by mouse and keyboard.

use std::cell::RefCell;
use std::io::{BufRead as _, BufReader};
use std::path::Path;
use std::process::{Child, Command, ExitStatus, Stdio};
use std::time::{Duration, Instant};

use turnwright::exchange::disk;

/// A process that is stopped when the test is over, however it ends.
struct Running(Child);

impl Drop for Running {
    fn drop(&mut self) {
        let _ = self.0.kill();
        let _ = self.0.wait();
    }
}

/// An X display of its own, and its name.
fn display() -> Option<(Running, String)> {
    let mut server = Command::new("Xvfb")
        // Without -noreset the server starts anew when its last client leaves, and drops whoever is just connecting:
        // each look by a short-lived tool would be a chance for the program to lose its display.
        .args(["-displayfd", "1", "-screen", "0", "1440x900x24", "-nolisten", "tcp", "-noreset"])
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .ok()?;
    let output = server.stdout.take()?;
    let server = Running(server);
    let mut line = String::new();
    BufReader::new(output).read_line(&mut line).ok()?;
    let number = line.trim();
    (!number.is_empty()).then(|| (server, format!(":{number}")))
}

struct Desk {
    display: String,
    /// The program under test, once it runs: waiting for one that has ended is no use.
    program: RefCell<Option<Running>>,
}

impl Desk {
    /// Runs `xdotool` and gives what it says.
    fn tool(&self, words: &[&str]) -> String {
        let output =
            Command::new("xdotool").args(words).env("DISPLAY", &self.display).output().expect("xdotool runs");
        String::from_utf8_lossy(&output.stdout).trim().to_owned()
    }

    /// Waits until the display has a window whose title says so; its id.
    #[track_caller]
    fn window(&self, title: &str) -> String {
        self.wait(title, || {
            let found = self.tool(&["search", "--name", title]);
            found.lines().next().map(str::to_owned)
        })
    }

    /// Gives the window the keyboard and sees that it has it. A window that is not yet shown does not take it.
    #[track_caller]
    fn focus(&self, window: &str) {
        self.wait("keyboard focus", || {
            self.tool(&["windowfocus", window]);
            (self.tool(&["getwindowfocus", "-f"]) == window).then_some(())
        });
    }

    /// Presses a key as a keyboard does: whoever has the focus gets it.
    fn press(&self, key: &str) {
        self.tool(&["key", key]);
    }

    /// Waits for something; a busy machine may take its time.
    #[track_caller]
    fn wait<T>(&self, what: &str, mut look: impl FnMut() -> Option<T>) -> T {
        let start = Instant::now();
        loop {
            if let Some(found) = look() {
                return found;
            }
            let ended = self.ended();
            assert!(ended.is_none(), "no `{what}`: the program ended with {ended:?}");
            if start.elapsed() > Duration::from_mins(2) {
                let shown = self.tool(&["search", "--name", ".", "getwindowname", "%@"]);
                panic!("no `{what}` on display {}; windows there: {shown:?}", self.display);
            }
            std::thread::sleep(Duration::from_millis(150));
        }
    }

    /// How the program ended, if it has.
    fn ended(&self) -> Option<ExitStatus> {
        self.program
            .borrow_mut()
            .as_mut()
            .and_then(|program| program.0.try_wait().expect("a child can be asked"))
    }

    /// What is on the display: red, green, blue of each pixel.
    fn picture(&self) -> Vec<[u8; 3]> {
        let output = Command::new("import")
            .args(["-window", "root", "-depth", "8", "png:-"])
            .env("DISPLAY", &self.display)
            .output()
            .expect("import runs");
        let folder = Path::new(env!("CARGO_TARGET_TMPDIR"));
        disk::write(&folder.join("window.png"), &output.stdout).expect("the picture is kept");
        let mut decoder = png::Decoder::new(std::io::Cursor::new(&output.stdout));
        decoder.set_transformations(png::Transformations::EXPAND | png::Transformations::STRIP_16);
        let mut reader = decoder.read_info().expect("import writes PNG");
        let mut bytes = vec![0; reader.output_buffer_size().expect("a small picture")];
        let info = reader.next_frame(&mut bytes).expect("import writes PNG");
        let samples = info.color_type.samples();
        bytes[..info.buffer_size()]
            .chunks_exact(samples)
            .map(|pixel| [pixel[0], pixel[1], pixel[2]])
            .collect()
    }
}

fn count(picture: &[[u8; 3]], wanted: impl Fn([u8; 3]) -> bool) -> usize {
    picture.iter().filter(|&&pixel| wanted(pixel)).count()
}

#[test]
fn a_clip_is_cleaned_up_with_mouse_and_keyboard() {
    let missing = ["Xvfb", "xdotool", "import"].into_iter().find(|tool| {
        Command::new(tool).arg("-version").stdout(Stdio::null()).stderr(Stdio::null()).status().is_err()
    });
    if let Some(tool) = missing {
        assert!(std::env::var_os("CI").is_none(), "CI needs {tool}");
        println!("skipped: {tool} is not on this machine");
        return;
    }
    let (_server, display) = display().expect("a display starts");
    let desk = Desk { display, program: RefCell::new(None) };
    let folder = tempfile::tempdir().unwrap();
    let scene = turnwright::demo::SCENES[0];
    let clip = folder.path().join(scene.clip_file);
    disk::write(&clip, scene.clip_bytes).unwrap();
    let program = Command::new(env!("CARGO_BIN_EXE_turnwright"))
        .arg(&clip)
        .env("DISPLAY", &desk.display)
        .env("TURNWRIGHT_RUNNER", "cpu")
        .env_remove("WAYLAND_DISPLAY")
        .env_remove("WAYLAND_SOCKET")
        .spawn()
        .unwrap();
    desk.program.replace(Some(Running(program)));
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
    let mut program = desk.program.take().expect("it was started");
    let status = desk.wait("the end of the program", || program.0.try_wait().unwrap());
    assert!(status.success(), "{status}");
    assert_eq!(disk::read(&clip).unwrap(), scene.clip_bytes, "the source is never changed");
}

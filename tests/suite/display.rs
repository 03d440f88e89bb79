//! A display without a screen, and the real program on it, driven by mouse and keyboard as a person drives it.
//!
//! Whatever is waited for is a state, never a time: a busy machine may be slow.

use std::cell::RefCell;
use std::io::{BufRead as _, BufReader};
use std::path::Path;
use std::process::{Child, Command, ExitStatus, Stdio};
use std::time::{Duration, Instant};

use turnwright::exchange::disk;

/// A process that is stopped when the test is over, however it ends.
pub(crate) struct Running(pub(crate) Child);

impl Drop for Running {
    fn drop(&mut self) {
        let _ = self.0.kill();
        let _ = self.0.wait();
    }
}

/// An X display of its own, and its name.
pub(crate) fn display() -> Option<(Running, String)> {
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

pub(crate) struct Desk {
    pub(crate) display: String,
    /// The program under test, once it runs: waiting for one that has ended is no use.
    pub(crate) program: RefCell<Option<Running>>,
}

impl Desk {
    /// Runs `xdotool` and gives what it says.
    pub(crate) fn tool(&self, words: &[&str]) -> String {
        let output =
            Command::new("xdotool").args(words).env("DISPLAY", &self.display).output().expect("xdotool runs");
        String::from_utf8_lossy(&output.stdout).trim().to_owned()
    }

    /// Waits until the display has a window whose title says so; its id.
    #[track_caller]
    pub(crate) fn window(&self, title: &str) -> String {
        self.wait(title, || {
            let found = self.tool(&["search", "--name", title]);
            found.lines().next().map(str::to_owned)
        })
    }

    /// Gives the window the keyboard and sees that it has it. A window that is not yet shown does not take it.
    #[track_caller]
    pub(crate) fn focus(&self, window: &str) {
        self.wait("keyboard focus", || {
            self.tool(&["windowfocus", window]);
            (self.tool(&["getwindowfocus", "-f"]) == window).then_some(())
        });
    }

    /// Presses a key as a keyboard does: whoever has the focus gets it.
    pub(crate) fn press(&self, key: &str) {
        self.tool(&["key", key]);
    }

    /// Waits for something; a busy machine may take its time.
    #[track_caller]
    pub(crate) fn wait<T>(&self, what: &str, mut look: impl FnMut() -> Option<T>) -> T {
        let start = Instant::now();
        loop {
            if let Some(found) = look() {
                return found;
            }
            let ended = self.ended();
            assert!(ended.is_none(), "no `{what}`: the program ended with {ended:?}");
            if start.elapsed() > Duration::from_mins(5) {
                let shown = self.tool(&["search", "--name", ".", "getwindowname", "%@"]);
                panic!("no `{what}` on display {}; windows there: {shown:?}", self.display);
            }
            std::thread::sleep(Duration::from_millis(150));
        }
    }

    /// Starts the program with these arguments and its own runner, as if for the first time on this machine.
    pub(crate) fn start(&self, arguments: &[&Path], settings: &Path) {
        let program = Command::new(env!("CARGO_BIN_EXE_turnwright"))
            .args(arguments)
            .env("DISPLAY", &self.display)
            .env("TURNWRIGHT_RUNNER", "cpu")
            .env("TURNWRIGHT_SETTINGS", settings)
            .env_remove("WAYLAND_DISPLAY")
            .env_remove("WAYLAND_SOCKET")
            .spawn()
            .expect("the program starts");
        self.program.replace(Some(Running(program)));
    }

    /// Waits until the program has ended by itself.
    #[track_caller]
    pub(crate) fn end(&self) -> ExitStatus {
        let mut program = self.program.take().expect("it was started");
        self.wait("the end of the program", || program.0.try_wait().expect("a child can be asked"))
    }

    /// Presses a key again and again until the program has ended by itself, and sees that it ended well.
    #[track_caller]
    pub(crate) fn press_until_end(&self, key: &str) {
        let mut program = self.program.take().expect("it was started");
        let ended = self.wait("the end of the program", || {
            self.press(key);
            let pressed = Instant::now();
            while pressed.elapsed() < Duration::from_secs(4) {
                if let Some(status) = program.0.try_wait().expect("a child can be asked") {
                    return Some(status);
                }
                std::thread::sleep(Duration::from_millis(100));
            }
            None
        });
        assert!(ended.success(), "{ended}");
    }

    /// Presses a key again and again until something is so: the first press may come before the window listens. Only for keys
    /// that do no harm when pressed twice.
    #[track_caller]
    pub(crate) fn press_until<T>(
        &self,
        window: &str,
        key: &str,
        what: &str,
        look: impl Fn() -> Option<T>,
    ) -> T {
        self.wait(what, || {
            if let Some(found) = look() {
                return Some(found);
            }
            self.focus(window);
            self.press(key);
            let pressed = Instant::now();
            while pressed.elapsed() < Duration::from_secs(4) {
                if let Some(found) = look() {
                    return Some(found);
                }
                std::thread::sleep(Duration::from_millis(200));
            }
            None
        })
    }

    /// The title of a window.
    pub(crate) fn title(&self, window: &str) -> String {
        self.tool(&["getwindowname", window])
    }

    /// Keeps what is on the display as a picture for people.
    pub(crate) fn keep_picture(&self, path: &Path) {
        let output = Command::new("import")
            .args(["-window", "root", "-depth", "8", "png:-"])
            .env("DISPLAY", &self.display)
            .output()
            .expect("import runs");
        disk::write(path, &output.stdout).expect("the picture is kept");
    }

    /// How the program ended, if it has.
    fn ended(&self) -> Option<ExitStatus> {
        self.program
            .borrow_mut()
            .as_mut()
            .and_then(|program| program.0.try_wait().expect("a child can be asked"))
    }

    /// What is on the display: red, green, blue of each pixel.
    pub(crate) fn picture(&self) -> Vec<[u8; 3]> {
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

/// A tool that driving a window needs and that is not here; where `CI` is set that is a failure.
#[expect(clippy::print_stdout, reason = "the runner shows it beside the test that was skipped")]
pub(crate) fn missing_tool() -> Option<&'static str> {
    let missing = ["Xvfb", "xdotool", "import"].into_iter().find(|tool| {
        Command::new(tool).arg("-version").stdout(Stdio::null()).stderr(Stdio::null()).status().is_err()
    });
    if let Some(tool) = missing {
        assert!(std::env::var_os("CI").is_none(), "CI needs {tool}");
        println!("skipped: {tool} is not on this machine");
    }
    missing
}

/// How many pixels are as wanted.
pub(crate) fn count(picture: &[[u8; 3]], wanted: impl Fn([u8; 3]) -> bool) -> usize {
    picture.iter().filter(|&&pixel| wanted(pixel)).count()
}

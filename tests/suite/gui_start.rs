//! The real program where no window can open.

use std::process::Command;

/// Runs the program with the given environment in place of a display; its exit code and stderr.
fn run(environment: &[(&str, &str)]) -> (Option<i32>, String) {
    let mut command = Command::new(env!("CARGO_BIN_EXE_turnwright"));
    for name in ["DISPLAY", "WAYLAND_DISPLAY", "WAYLAND_SOCKET", "TURNWRIGHT_RUNNER"] {
        command.env_remove(name);
    }
    // Nothing of whoever runs this is read.
    command.env("TURNWRIGHT_SETTINGS", "");
    let output = command.envs(environment.iter().copied()).output().expect("the program runs");
    assert!(output.stdout.is_empty(), "data on stdout: {:?}", output.stdout);
    (output.status.code(), String::from_utf8(output.stderr).expect("messages are UTF-8"))
}

/// Exit code 2 and one line that holds `expected`, without traces of a panic or of anybody's source files.
#[track_caller]
fn check(environment: &[(&str, &str)], expected: &str) {
    let (code, stderr) = run(environment);
    assert_eq!(code, Some(2), "{stderr}");
    assert_eq!(stderr.trim_end().lines().count(), 1, "{stderr}");
    assert!(stderr.starts_with("turnwright: ") && stderr.contains(expected), "{stderr}");
    assert!(!stderr.contains("panic") && !stderr.contains(".rs"), "{stderr}");
}

#[test]
fn without_a_display_one_sentence_says_what_works() {
    let commands = "commands that work without one: demo, snags, mend, convert, sample, picture, proof";
    check(&[], &format!("no display to open a window on; {commands}"));
    check(&[("TURNWRIGHT_RUNNER", "cpu")], "no display");
    check(&[("TURNWRIGHT_RUNNER", "gl")], "no display");
}

#[test]
fn a_display_that_does_not_answer_is_named() {
    check(&[("DISPLAY", ":7654"), ("TURNWRIGHT_RUNNER", "cpu")], "display :7654");
    check(&[("DISPLAY", ":7654"), ("TURNWRIGHT_RUNNER", "gl")], "display :7654");
    check(&[("WAYLAND_DISPLAY", "no-such-socket"), ("XDG_RUNTIME_DIR", "/")], "display no-such-socket");
}

#[test]
fn an_unknown_runner_is_refused() {
    check(&[("DISPLAY", ":7654"), ("TURNWRIGHT_RUNNER", "fast")], "expected cpu or gl");
}

//! The real program, run with arguments: what it prints, how it ends, what it writes.

#![expect(clippy::unwrap_used, reason = "the helpers of a test fail as the test does")]

use std::collections::BTreeSet;
use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

use serde_json::Value;
use tempfile::TempDir;
use turnwright::exchange::{disk, joint_maps};

use crate::support::{assert_close, list, number, numbers, shared};

/// How a run of the program ended.
struct Run {
    code: i32,
    stdout: String,
    stderr: String,
}

impl Run {
    /// The objects it printed, one a line.
    fn json_lines(&self) -> Vec<Value> {
        self.stdout.lines().map(|line| serde_json::from_str(line).expect("each line is an object")).collect()
    }

    #[track_caller]
    fn expect(self, code: i32) -> Self {
        assert_eq!(self.code, code, "stdout:\n{}\nstderr:\n{}", self.stdout, self.stderr);
        assert!(!self.stderr.contains("panicked"), "{}", self.stderr);
        self
    }
}

fn program() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_turnwright"));
    for display in ["DISPLAY", "WAYLAND_DISPLAY", "WAYLAND_SOCKET"] {
        command.env_remove(display);
    }
    command
}

/// A folder to work in, with copies of the demo clips and their clean originals (`clean-…`).
struct Bench {
    folder: TempDir,
}

impl Bench {
    fn new() -> Self {
        let bench = Self { folder: tempfile::tempdir().unwrap() };
        for name in ["deckhand.bvh", "heron.glb", "crane.csv"] {
            bench.copy(&crate_file("demo-scenes").join(name), name);
            bench.copy(&crate_file("tests/data/demo_clean").join(name), &format!("clean-{name}"));
        }
        for name in ["deckhand.ron", "heron.ron", "crane.ron"] {
            bench.copy(&crate_file("demo-scenes").join(name), name);
        }
        bench
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn copy(&self, from: &Path, name: &str) {
        self.write(name, &disk::read(from).unwrap());
    }

    fn write(&self, name: &str, bytes: &[u8]) {
        disk::write(&self.path(name), bytes).unwrap();
    }

    fn read(&self, name: &str) -> Vec<u8> {
        disk::read(&self.path(name)).unwrap()
    }

    fn text(&self, name: &str) -> String {
        String::from_utf8(self.read(name)).unwrap()
    }

    /// Runs the program in this folder; words are split at blanks.
    fn run(&self, arguments: &str) -> Run {
        self.run_words(&arguments.split_whitespace().collect::<Vec<_>>())
    }

    fn run_words(&self, arguments: &[&str]) -> Run {
        let maps = self.folder.path().join("kept-maps");
        let mut program = program();
        program.args(arguments).current_dir(self.folder.path()).env(joint_maps::FOLDER_VARIABLE, maps);
        let output = program.output().unwrap();
        Run {
            code: output.status.code().expect("the program ended by itself"),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }

    fn names(&self, folder: &str) -> BTreeSet<String> {
        let entries = std::fs::read_dir(self.path(folder)).unwrap();
        entries.map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect()
    }
}

fn crate_file(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

fn keys(value: &Value) -> BTreeSet<&str> {
    value.as_object().expect("an object").keys().map(String::as_str).collect()
}

const CLIP_KEYS: [&str; 6] = ["clip", "index", "joints", "frames", "rate", "snags"];
const SNAG_KEYS: [&str; 10] = [
    "kind",
    "joint",
    "first_frame",
    "last_frame",
    "first_time",
    "last_time",
    "size_deg",
    "mend",
    "safe",
    "text",
];

#[test]
fn the_demo_does_the_main_job_without_a_display() {
    let bench = Bench::new();
    let run = bench.run("demo -o out").expect(0);
    for name in ["deckhand", "heron", "crane"] {
        for made in [".png", "-mended.glb", "-mended.bvh", "-proof.html", "-proof.json", ".ron"] {
            assert!(
                bench.names("out").contains(&format!("{name}{made}")),
                "{name}{made}: {:?}",
                bench.names("out")
            );
        }
    }
    for kind in turnwright::snag::SnagKind::ALL.iter().take(7) {
        assert!(run.stdout.contains(kind.name()), "{kind} is named");
    }
    assert!(run.stdout.contains("Everything is in out"), "{}", run.stdout);
    // How to see it, in one line, is the last that is said.
    assert!(run.stderr.lines().last().unwrap().contains("turnwright out/deckhand.ron"), "{}", run.stderr);
    for name in [
        "deckhand-mended.bvh",
        "deckhand-mended.glb",
        "heron-mended.glb",
        "heron-mended.bvh",
        "crane-mended.csv",
    ] {
        let again = bench.run(&format!("snags out/{name}")).expect(0);
        assert!(again.stdout.contains("no snags"), "{}", again.stdout);
    }
    // Once more into the same folder: it is all replaced.
    bench.run("demo -o out").expect(0);
}

#[test]
fn snags_as_json_have_the_stated_fields() {
    let bench = Bench::new();
    let run = bench.run("snags --json deckhand.bvh heron.glb crane.csv").expect(1);
    let clips = run.json_lines();
    assert_eq!(clips.len(), 3);
    for clip in &clips {
        assert_eq!(keys(clip), BTreeSet::from(CLIP_KEYS));
        for snag in list(&clip["snags"]) {
            assert_eq!(keys(snag), BTreeSet::from(SNAG_KEYS));
        }
    }
    assert_eq!(
        (&clips[0]["joints"], &clips[0]["frames"], &clips[0]["index"]),
        (&22.into(), &300.into(), &0.into())
    );
    assert_close!(number(&clips[0]["rate"]), 60.0, 1e-3);
    let flip = list(&clips[0]["snags"])
        .iter()
        .find(|snag| snag["kind"] == "half-turn" && snag["joint"] == "RightThigh")
        .expect("the planted half turn");
    assert_eq!((&flip["first_frame"], &flip["last_frame"]), (&206.into(), &219.into()));
    assert_close!(number(&flip["first_time"]), 206.0 / 60.0, 1e-6);
    assert_close!(number(&flip["size_deg"]), 180.0, 1.0);

    let clean = bench.run("snags --json clean-deckhand.bvh clean-heron.glb clean-crane.csv").expect(0);
    let clips = clean.json_lines();
    assert_eq!(clips.len(), 3, "a clip without snags has its line too");
    assert!(clips.iter().all(|clip| list(&clip["snags"]).is_empty()), "{}", clean.stdout);
}

#[test]
fn kinds_can_be_chosen() {
    let bench = Bench::new();
    let run = bench.run("snags --json --kinds wrap,spike deckhand.bvh").expect(1);
    let found: BTreeSet<String> = list(&run.json_lines()[0]["snags"])
        .iter()
        .map(|snag| snag["kind"].as_str().unwrap().to_owned())
        .collect();
    assert_eq!(found, BTreeSet::from(["wrap".to_owned(), "spike".to_owned()]));
    bench.run("snags --kinds sign-flip clean-heron.glb").expect(0);
}

#[test]
fn one_bad_file_does_not_hide_the_others() {
    let bench = Bench::new();
    let run = bench.run("snags --json missing.bvh heron.glb").expect(2);
    assert_eq!(run.json_lines().len(), 1);
    assert!(run.stderr.contains("missing.bvh"), "{}", run.stderr);
}

#[test]
fn a_clip_is_named_by_name_or_index() {
    let Some(fox) = shared("data/gltf/Fox.glb") else { return };
    let bench = Bench::new();
    bench.copy(&fox, "fox.glb");
    let labels = |arguments: &str| -> Vec<(String, u64)> {
        let run = bench.run(arguments);
        assert!(run.code < 2, "{}", run.stderr);
        let of = |clip: &Value| (clip["clip"].as_str().unwrap().to_owned(), clip["index"].as_u64().unwrap());
        run.json_lines().iter().map(of).collect()
    };
    let [survey, walk, run] =
        [("Survey", 0), ("Walk", 1), ("Run", 2)].map(|(name, index)| (name.to_owned(), index));
    assert_eq!(labels("snags --json fox.glb"), [survey, walk.clone(), run.clone()]);
    assert_eq!(labels("snags --json fox.glb#Walk"), [walk]);
    assert_eq!(labels("snags --json fox.glb#2"), [run]);
    let wrong = bench.run("snags fox.glb#Trot").expect(2);
    assert!(
        wrong.stderr.contains("expected one of `Survey`, `Walk`, `Run`, found `Trot`"),
        "{}",
        wrong.stderr
    );
}

#[test]
fn mending_bvh_changes_the_numbers_of_the_snags_and_no_others() {
    let bench = Bench::new();
    let run = bench.run("mend --json deckhand.bvh -o mended.bvh").expect(0);
    let clip = &run.json_lines()[0];
    let expected: BTreeSet<&str> =
        CLIP_KEYS.into_iter().chain(["mended", "left", "max_change_deg"]).collect();
    assert_eq!(keys(clip), expected);
    for snag in list(&clip["snags"]) {
        let expected: BTreeSet<&str> =
            SNAG_KEYS.into_iter().chain(["mended", "left", "change_deg", "change_length"]).collect();
        assert_eq!(keys(snag), expected);
        assert_eq!(snag["mended"], true);
        // What no pose changes by moves no limb.
        assert!(number(&snag["change_length"]) >= 0.0);
        assert!(number(&snag["change_deg"]) > 0.0 || number(&snag["change_length"]) == 0.0, "{snag}");
    }
    assert!(list(&clip["snags"]).iter().any(|snag| number(&snag["change_length"]) > 0.0));
    assert_close!(number(&clip["max_change_deg"]), 180.0, 1.0);

    let (before, after) = (bench.text("deckhand.bvh"), bench.text("mended.bvh"));
    let head = |text: &str| text.split("Frame Time").next().unwrap().to_owned();
    assert_eq!(head(&before), head(&after));
    let rows = |text: &str| -> Vec<Vec<String>> {
        let rows = text.lines().skip_while(|line| !line.starts_with("Frame Time")).skip(1);
        rows.map(|row| row.split_whitespace().map(str::to_owned).collect()).collect()
    };
    let (before, after) = (rows(&before), rows(&after));
    assert_eq!((before.len(), after.len()), (300, 300));
    // Columns of the joints with snags, three each: hips, neck, head, left hand, right forearm, thigh and foot.
    let with_snags = [0, 4, 5, 9, 12, 18, 20];
    let mut changed = 0;
    for (frame, (before, after)) in before.iter().zip(&after).enumerate() {
        assert_eq!(before.len(), after.len());
        for (column, (before, after)) in before.iter().zip(after).enumerate() {
            if before != after {
                changed += 1;
                let joint = (column - 3) / 3;
                assert!(column >= 3 && with_snags.contains(&joint), "frame {frame}, column {column}");
            }
        }
        if (60..90).contains(&frame) {
            assert_eq!(before, after, "frame {frame} has no snag");
        }
    }
    assert!(changed > 100, "{changed}");
}

#[test]
fn an_input_is_replaced_only_by_force() {
    let bench = Bench::new();
    let before = bench.read("deckhand.bvh");
    for arguments in [
        "mend deckhand.bvh -o deckhand.bvh",
        "mend deckhand.bvh -o .",
        "mend deckhand.bvh -o ./",
        "convert deckhand.bvh -o ./deckhand.bvh",
        "mend deckhand.ron -o deckhand.bvh",
        "mend deckhand.bvh heron.glb -o .",
    ] {
        let run = bench.run(arguments).expect(2);
        assert!(run.stderr.contains("--force"), "{arguments}: {}", run.stderr);
        assert!(bench.read("deckhand.bvh") == before, "{arguments} has changed its input");
    }
    bench.run("mend deckhand.bvh -o deckhand.bvh --force").expect(0);
    assert!(bench.read("deckhand.bvh") != before);
    // Another file that is there already is replaced.
    bench.write("old.bvh", b"something else");
    bench.run("mend clean-deckhand.bvh -o old.bvh").expect(0);
    assert!(
        bench.read("old.bvh") == bench.read("clean-deckhand.bvh"),
        "nothing to mend, so not a byte is changed"
    );
}

#[test]
fn several_clips_are_mended_into_a_folder_with_a_sheet_each() {
    let bench = Bench::new();
    bench.run("mend deckhand.bvh heron.glb -o new/mended --proof new/proof.json").expect(0);
    assert_eq!(
        bench.names("new/mended"),
        BTreeSet::from(["deckhand.bvh".to_owned(), "heron.glb".to_owned()])
    );
    let sheet: Value = serde_json::from_str(&bench.text("new/heron-proof.json")).unwrap();
    assert!(number(&sheet["max_change_deg"]) > 100.0, "the long way is taken out");
    bench.run("snags new/mended/heron.glb").expect(0);
}

#[test]
fn mending_leaves_what_is_skipped() {
    let bench = Bench::new();
    bench.run("mend heron.glb -o mended.glb --skip sign-flip,spike").expect(0);
    let run = bench.run("snags --json mended.glb").expect(1);
    let lines = run.json_lines();
    let found: BTreeSet<&str> =
        list(&lines[0]["snags"]).iter().map(|snag| snag["kind"].as_str().unwrap()).collect();
    assert_eq!(found, BTreeSet::from(["sign-flip", "spike"]));
}

/// Root at (1, 2, 3), turned by 30, −40 and 65 degrees about z, x and y; a child 10 above it.
const SMALL_BVH: &[u8] = b"HIERARCHY
ROOT root
{
  OFFSET 0 0 0
  CHANNELS 6 Xposition Yposition Zposition Zrotation Xrotation Yrotation
  JOINT arm
  {
    OFFSET 0 10 0
    CHANNELS 3 Zrotation Xrotation Yrotation
    End Site
    {
      OFFSET 0 1 0
    }
  }
}
MOTION
Frames: 2
Frame Time: 0.5
1 2 3 30 -40 65 0 0 0
1 2 3 30 -40 65 90 0 0
";

#[test]
fn sampled_bvh_stands_where_the_worked_example_says() {
    let bench = Bench::new();
    bench.write("small.bvh", SMALL_BVH);
    let run = bench.run("sample small.bvh --at 0,0.25 --world").expect(0);
    let sample: Value = serde_json::from_str(&run.stdout).unwrap();
    assert_eq!(keys(&sample), BTreeSet::from(["times", "joints"]));
    assert_eq!(keys(&sample["joints"]), BTreeSet::from(["root", "arm"]), "no End Sites");
    // reference values of `bvh_zxy`: made with scipy.
    let root = &sample["joints"]["root"];
    let turn: [f64; 4] = numbers(&root["rotation"][0]);
    assert_close!(turn, [-0.409_304_757_995, 0.413_034_416_967, 0.027_615_955_500, 0.813_086_431_129], 1e-11);
    let arm: [f64; 3] = numbers(&sample["joints"]["arm"]["position"][0]);
    assert_close!(arm, [-2.830_222_216, 8.634_139_482, -3.427_876_097], 1e-8);

    // Between frames: slerp, so half of 90 degrees about z.
    let local = bench.run("sample small.bvh --at 0.25").expect(0);
    let local: Value = serde_json::from_str(&local.stdout).unwrap();
    let eighth = std::f64::consts::FRAC_PI_8;
    let turn: [f64; 4] = numbers(&local["joints"]["arm"]["rotation"][0]);
    assert_close!(turn, [0.0, 0.0, eighth.sin(), eighth.cos()], 1e-14);
    assert_close!(numbers::<3>(&local["joints"]["arm"]["position"][0]), [0.0, 10.0, 0.0], 0.0);
    let held = bench.run("sample small.bvh --at 0.25 --path hold").expect(0);
    let held: Value = serde_json::from_str(&held.stdout).unwrap();
    assert_close!(numbers::<4>(&held["joints"]["arm"]["rotation"][0]), [0.0, 0.0, 0.0, 1.0], 1e-15);
}

#[test]
fn a_rate_gives_every_time_up_to_the_end() {
    let bench = Bench::new();
    bench.write("small.bvh", SMALL_BVH);
    let run = bench.run("sample small.bvh --rate 10 --format csv").expect(0);
    let rows: Vec<&str> = run.stdout.lines().collect();
    assert_eq!(
        rows[0],
        "time,root.qx,root.qy,root.qz,root.qw,root.tx,root.ty,root.tz,arm.qx,arm.qy,arm.qz,arm.qw,arm.tx,arm.ty,arm.tz"
    );
    let times: Vec<&str> = rows[1..].iter().map(|row| row.split(',').next().unwrap()).collect();
    assert_eq!(times, ["0", "0.1", "0.2", "0.3", "0.4", "0.5"]);
    for path in ["slerp", "squad", "spline", "hold"] {
        let run = bench.run(&format!("sample small.bvh --at 0.5 --path {path}")).expect(0);
        let sample: Value = serde_json::from_str(&run.stdout).unwrap();
        let turn: [f64; 4] = numbers(&sample["joints"]["arm"]["rotation"][0]);
        let half = std::f64::consts::FRAC_1_SQRT_2;
        assert_close!(turn, [0.0, 0.0, half, half], 1e-12, "every path goes through the keys: {path}");
    }
}

#[test]
fn sampled_gltf_turns_as_the_file_says() {
    let Some(triangle) = shared("data/gltf/AnimatedTriangle.gltf") else { return };
    let bench = Bench::new();
    bench.copy(&triangle, "triangle.gltf");
    let run = bench.run("sample triangle.gltf --at 0,0.125,0.25,0.875,5").expect(0);
    let sample: Value = serde_json::from_str(&run.stdout).unwrap();
    let (name, joint) = sample["joints"].as_object().unwrap().iter().next().unwrap();
    assert_eq!(name, "#0", "a node without a name has its number");
    // Quarter turns about z at quarter seconds; the last key is held.
    for (index, degrees) in [0.0, 45.0, 90.0, 315.0, 360.0_f64].into_iter().enumerate() {
        let [x, y, z, w]: [f64; 4] = numbers(&joint["rotation"][index]);
        let found = 2.0 * z.atan2(w).to_degrees();
        let apart = (found - degrees).rem_euclid(360.0);
        assert!(apart.min(360.0 - apart) < 1e-4, "{found} at {index}");
        assert_close!([x, y], [0.0, 0.0], 1e-7);
    }
}

#[test]
fn an_untouched_conversion_within_a_format_is_the_same_file() {
    let bench = Bench::new();
    for name in ["deckhand.bvh", "heron.glb", "crane.csv"] {
        let (_, ending) = name.split_once('.').unwrap();
        bench.run(&format!("convert {name} -o same.{ending}")).expect(0);
        assert!(bench.read(name) == bench.read(&format!("same.{ending}")), "{name}");
    }
}

#[test]
fn poses_survive_the_way_through_other_formats() {
    let bench = Bench::new();
    for (name, ways) in [
        ("clean-deckhand.bvh", ["glb", "csv", "gltf"]),
        ("clean-heron.glb", ["bvh", "csv", "gltf"]),
        ("clean-crane.csv", ["glb", "bvh", "gltf"]),
    ] {
        for ending in ways {
            bench.run(&format!("convert {name} -o there.{ending}")).expect(0);
            bench.run(&format!("proof {name} there.{ending} -o sheet.json")).expect(0);
            let sheet: Value = serde_json::from_str(&bench.text("sheet.json")).unwrap();
            let change = number(&sheet["max_change_deg"]);
            // A curve with few keys becomes one with a key at each frame.
            let allowed = if name == "clean-heron.glb" && ending != "gltf" { 0.05 } else { 0.001 };
            assert!(change < allowed, "{name} to {ending}: {change} degrees");
        }
    }
}

#[test]
fn a_part_at_another_rate_begins_at_zero() {
    let bench = Bench::new();
    bench.run("convert clean-deckhand.bvh -o part.bvh --rate 30 --from 1 --to 2").expect(0);
    let text = bench.text("part.bvh");
    assert!(text.contains("Frames: 31\n"), "{}", text.lines().find(|line| line.contains("Frames")).unwrap());
    let at = |file: &str, secs: &str| -> Value {
        serde_json::from_str(&bench.run(&format!("sample {file} --at {secs}")).expect(0).stdout).unwrap()
    };
    let (whole, part) = (at("clean-deckhand.bvh", "1.5"), at("part.bvh", "0.5"));
    for (name, joint) in whole["joints"].as_object().unwrap() {
        let [whole, part]: [[f64; 4]; 2] =
            [numbers(&joint["rotation"][0]), numbers(&part["joints"][name]["rotation"][0])];
        let dot: f64 = whole.iter().zip(part).map(|(a, b)| a * b).sum();
        assert!(dot.abs() > 1.0 - 1e-9, "{name}");
    }
    bench.run("convert clean-heron.glb -o part.glb --from 1.01 --to 3.02").expect(0);
    let whole = at("clean-heron.glb", "2.0");
    let part = at("part.glb", "0.99");
    for (name, joint) in whole["joints"].as_object().unwrap() {
        let [whole, part]: [[f64; 4]; 2] =
            [numbers(&joint["rotation"][0]), numbers(&part["joints"][name]["rotation"][0])];
        let dot: f64 = whole.iter().zip(part).map(|(a, b)| a * b).sum();
        assert!(dot.abs() > 1.0 - 1e-6, "{name}: {dot}");
    }
}

#[test]
fn a_picture_has_its_size_and_shows_the_figure() {
    let bench = Bench::new();
    for (arguments, size) in [
        ("picture deckhand.bvh -o p.png --size 640x360", (640, 360)),
        ("picture heron.glb -o p.png --at 0,2.5 --size 300x500", (300, 500)),
        ("picture crane.ron -o p.png", (1600, 900)),
        ("picture crane.csv -o p.png --at 3 --size 16x16", (16, 16)),
    ] {
        bench.run(arguments).expect(0);
        let bytes = bench.read("p.png");
        let mut reader = png::Decoder::new(std::io::Cursor::new(&bytes)).read_info().unwrap();
        let mut pixels = vec![0; reader.output_buffer_size().unwrap()];
        let frame = reader.next_frame(&mut pixels).unwrap();
        assert_eq!((frame.width, frame.height), size, "{arguments}");
        if size.0 > 100 {
            let colors: BTreeSet<&[u8]> = pixels[..frame.buffer_size()].chunks(3).collect();
            assert!(colors.len() > 50, "{arguments}: {} colours", colors.len());
        }
    }
}

#[test]
fn a_scene_is_opened_with_its_passes() {
    use turnwright::exchange::{self, OpenOptions, ron};
    use turnwright::mend::{SurveyOptions, survey};
    use turnwright::scene::Edit;
    use turnwright::snag::Unwatched;

    let bench = Bench::new();
    // Mend everything, as the window does, and save.
    let path = bench.path("deckhand.ron");
    let document = ron::read(&path).unwrap().document;
    let source = exchange::open(&bench.path("deckhand.bvh"), &OpenOptions::default()).unwrap();
    let found = survey(&source.clips[0], &SurveyOptions::default(), &Unwatched).unwrap();
    let mended = Edit::Mend { work: 0, snags: found.snags }.apply(&document).unwrap();
    let label = |_: usize, _: usize, joint: usize| source.clips[0].skeleton.label(joint).to_owned();
    ron::write(&path, &mended, &label).unwrap();

    bench.run("snags deckhand.bvh").expect(1);
    bench.run("snags deckhand.ron").expect(0);
    let sample = |file: &str| bench.run(&format!("sample {file} --at 3.5")).expect(0).stdout;
    assert_ne!(sample("deckhand.ron"), sample("deckhand.bvh"), "the half turn is taken out");
    bench.run("convert deckhand.ron -o result.bvh").expect(0);
    bench.run("snags result.bvh").expect(0);

    bench.write("deckhand.bvh", SMALL_BVH);
    let changed = bench.run("snags deckhand.ron");
    assert!(changed.stderr.contains("has changed since the scene was saved"), "{}", changed.stderr);
    std::fs::remove_file(bench.path("deckhand.bvh")).unwrap();
    let gone = bench.run("snags deckhand.ron").expect(2);
    assert!(gone.stderr.contains("deckhand.bvh"), "{}", gone.stderr);
}

#[test]
fn keys_are_reduced_into_formats_that_can_hold_them() {
    let Some(fox) = shared("data/gltf/Fox.glb") else { return };
    let bench = Bench::new();
    bench.copy(&fox, "fox.glb");
    let told = bench.run("convert fox.glb -o few.glb --reduce 0.5").expect(0).stderr;
    assert_eq!(told.matches(" keys left").count(), 3, "every clip of a glTF file: {told}");
    bench.run("convert fox.glb#Run -o few.csv --reduce 2").expect(0);
    bench.run("proof fox.glb few.glb -o few.json").expect(0);
    let sheet: Value = serde_json::from_slice(&bench.read("few.json")).unwrap();
    let change = sheet["clips"][0]["max_change_deg"].as_f64().unwrap();
    assert!(change > 0.05 && change <= 0.5, "{change}");
    let refused = bench.run("convert fox.glb -o few.bvh --reduce 0.5").expect(2).stderr;
    assert!(refused.contains("--reduce: expected a format whose keys may be apart"), "{refused}");
    let refused = bench.run("convert fox.glb -o few.glb --reduce 90").expect(2).stderr;
    assert!(refused.contains("degrees above 0 and up to 45"), "{refused}");
}

/// Each slip gives one line that says where, what was expected and found; nothing on stdout, nothing written.
#[test]
fn slips_are_told_in_one_line() {
    let bench = Bench::new();
    bench.write("empty.bvh", b"");
    bench.write("empty.glb", b"");
    bench.write("empty.csv", b"");
    bench.write("empty.ron", b"");
    bench.write("text.glb", b"HIERARCHY");
    bench.write("notes.txt", b"hello");
    bench.write("bare.gltf", br#"{"asset": {"version": "2.0"}}"#);
    bench.write(
        "still.gltf",
        br#"{"asset": {"version": "2.0"}, "animations": [{"channels": [], "samplers": []}]}"#,
    );
    std::fs::create_dir(bench.path("folder")).unwrap();
    std::fs::create_dir(bench.path("folder.bvh")).unwrap();
    let before = bench.names(".");
    for (arguments, expected) in [
        ("snags missing.bvh", "missing.bvh: cannot read"),
        ("snags folder", "folder: expected a file, found a folder"),
        ("snags folder.bvh", "folder.bvh: expected a file, found a folder"),
        ("snags notes.txt", "expected .gltf, .glb, .bvh, .csv or .ron, found .txt"),
        ("snags empty.bvh", "empty.bvh: "),
        ("snags empty.glb", "empty.glb: "),
        ("snags empty.csv", "empty.csv: "),
        ("snags empty.ron", "empty.ron: line 1, column 1: expected a Turnwright scene"),
        ("snags text.glb", "text.glb: "),
        ("snags bare.gltf", "bare.gltf: animations: expected at least one clip, found none"),
        ("snags", "required arguments were not provided"),
        ("snags --kinds wobble crane.csv", "expected a snag kind"),
        ("snags heron.glb#Landing", "expected one of `Take-off`, found `Landing`"),
        ("mend crane.csv", "--output"),
        (
            "mend crane.csv -o out.txt",
            "expected a folder, or a file that ends in .gltf, .glb, .bvh or .csv, found .txt",
        ),
        ("mend crane.csv heron.glb -o out.glb", "expected a folder for 2 files, found one file"),
        (
            "mend crane.csv -o folder.bvh/x.csv --proof sheet.pdf",
            "expected a sheet that ends in .html or .json, found .pdf",
        ),
        ("mend crane.csv -o crane.csv/x.csv", "cannot write"),
        ("convert crane.csv -o out.txt", "found .txt"),
        ("convert crane.csv -o folder.bvh", "folder.bvh: expected a file, found a folder"),
        ("convert still.gltf -o x.bvh", "x.bvh: skeleton: expected joints to write, found none"),
        ("convert still.gltf -o x.csv", "x.csv: skeleton: expected joints to write, found none"),
        ("convert crane.csv -o x.csv --rate 0", "--rate: expected frames per second above 0, found 0"),
        ("convert crane.csv -o x.csv --rate nan", "found NaN"),
        ("convert crane.csv -o x.csv --rate 1e12", "--rate: expected a rate that gives at most"),
        (
            "convert crane.csv -o x.csv --from 99",
            "--from: expected a second within the clip, from 0 to 8.000, found 99",
        ),
        ("convert crane.csv -o x.csv --from 3 --to 2", "--to: expected a second from 3 on, found 2"),
        ("sample crane.csv", "--at"),
        ("sample crane.csv --at 1 --rate 5", "cannot be used with"),
        ("sample crane.csv --at soon", "invalid value 'soon'"),
        ("sample crane.csv --at inf", "--at: expected seconds, found inf"),
        ("sample crane.csv --rate -5", "--rate: expected frames per second above 0, found -5"),
        ("sample crane.csv --rate -inf", "--rate: expected frames per second above 0, found -inf"),
        ("sample crane.csv --rate fast", "for '--rate <FPS>': expected a number such as 0.5, found `fast`"),
        (
            "convert crane.csv -o x.csv --from -1",
            "--from: expected a second within the clip, from 0 to 8.000, found -1",
        ),
        ("convert crane.csv -o x.csv --to -1", "--to: expected a second from 0 on, found -1"),
        (
            "convert crane.csv -o x.csv --reduce -1",
            "--reduce: expected degrees above 0 and up to 45, found -1",
        ),
        (
            "convert crane.csv -o x.csv --repeat -3",
            "for '--repeat <N>': expected a whole number, 0 or more, found `-3`",
        ),
        ("convert crane.csv -o x.csv --repeat 2.5", "found `2.5`"),
        ("convert crane.csv -o x.csv --find-loop -1", "--find-loop: expected"),
        ("convert crane.csv -o x.csv --find-loop nan", "--find-loop: expected"),
        ("blend crane.csv crane.csv -o x.csv --join -1", "found -1"),
        ("blend crane.csv crane.csv -o x.csv --add -inf", "found -inf"),
        ("blend crane.csv crane.csv -o x.csv --mean 1,-1", "found"),
        ("blend crane.csv crane.csv -o x.csv --mix 0 --limbs a --soft -1", "found `-1`"),
        (
            "retarget deckhand.bvh --onto deckhand.bvh -o x.bvh --rest-at -1",
            "--rest-at: expected a second within the clip, from 0 to",
        ),
        (
            "retarget deckhand.bvh --onto deckhand.bvh -o x.bvh --onto-rest-at nan",
            "--onto-rest-at: expected a second within the clip",
        ),
        ("picture crane.csv -o x.png --size -5x5", "found `-5x5`"),
        ("sample crane.csv --rate 1e300", "--rate: expected a rate that gives at most"),
        ("sample crane.csv --at 1 --path zigzag", "invalid value 'zigzag'"),
        ("sample crane.csv --at 1 --format xml", "invalid value 'xml'"),
        ("proof crane.csv heron.glb -o x.html", "no joint name in both"),
        ("proof crane.csv crane.csv -o x.pdf", "found .pdf"),
        ("proof crane.csv", "AFTER"),
        ("picture crane.csv -o x.jpg", "expected a picture that ends in .png, found .jpg"),
        ("picture crane.csv -o x.png --size 10", "expected width x height"),
        ("picture crane.csv -o x.png --size 99999x5", "found `99999x5`"),
        ("picture crane.csv -o x.png --at nan", "found NaN"),
        ("--nonsense", "unexpected argument '--nonsense'"),
        ("wobble", "expected a file or one of demo, snags, mend"),
        ("missing.bvh", "missing.bvh: expected a file that exists"),
    ] {
        let run = bench.run(arguments).expect(2);
        assert_eq!(run.stdout, "", "{arguments}");
        let errors: Vec<&str> = run.stderr.lines().filter(|line| !line.contains(": note: ")).collect();
        assert_eq!(errors.len(), 1, "{arguments}: {}", run.stderr);
        assert!(errors[0].starts_with("turnwright: "), "{arguments}: {}", errors[0]);
        assert!(errors[0].contains(expected), "{arguments}: {}", errors[0]);
        // What to do stands behind a semicolon.
        assert!(errors[0].contains("; "), "{arguments}: {}", errors[0]);
    }
    assert_eq!(bench.names("."), before, "nothing was written");
}

#[test]
fn help_and_version_are_data() {
    let bench = Bench::new();
    let help = bench.run("--help").expect(0);
    for command in ["demo", "snags", "mend", "convert", "sample", "proof", "picture"] {
        assert!(help.stdout.contains(command));
        let own = bench.run(&format!("{command} --help")).expect(0);
        assert!(own.stdout.contains("Usage: turnwright"), "{}", own.stdout);
    }
    for command in ["demo", "mend", "proof"] {
        let help = bench.run(&format!("{command} --help")).expect(0);
        let words = help.stdout.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(words.contains("licensed or qualified person"), "{words}");
    }
    let version = bench.run("--version").expect(0);
    assert_eq!(version.stdout.trim(), format!("turnwright {}", env!("CARGO_PKG_VERSION")));
}

#[test]
fn a_reader_that_stops_reading_is_no_failure() {
    let bench = Bench::new();
    let mut child = program()
        .args(["sample", "deckhand.bvh", "--rate", "600"])
        .current_dir(bench.folder.path())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    // Far more than a pipe holds is to come.
    drop(child.stdout.take());
    let ended = child.wait_with_output().unwrap();
    let stderr = String::from_utf8(ended.stderr).unwrap();
    assert_eq!(ended.status.code(), Some(0), "{stderr}");
    assert!(!stderr.contains("panicked"), "{stderr}");
}

#[test]
fn columns_of_another_make_can_be_named() {
    let bench = Bench::new();
    // A quarter turn about y over 500 ms.
    bench.write(
        "sensor.csv",
        b"stamp,real,i,j,k\n0,1,0,0,0\n250,0.92388,0,0.38268,0\n500,0.70711,0,0.70711,0\n",
    );
    let unnamed = bench.run("sample sensor.csv --at 0.5").expect(2);
    assert!(unnamed.stderr.contains("sensor.csv: line 1"), "{}", unnamed.stderr);
    let named = "--columns time=stamp,w=real,x=i,y=j,z=k --time-unit ms";
    let run = bench.run(&format!("sample sensor.csv --at 0.5 {named}")).expect(0);
    let sample: Value = serde_json::from_str(&run.stdout).unwrap();
    let (_, joint) = sample["joints"].as_object().unwrap().iter().next().unwrap();
    let half = std::f64::consts::FRAC_1_SQRT_2;
    assert_close!(numbers::<4>(&joint["rotation"][0]), [0.0, half, 0.0, half], 1e-5);
    // What is mended is read back for its sheet as it was read before: here a sign that flips, at 250 and 750 ms.
    let mut rows = "stamp,real,i,j,k\n".to_owned();
    for row in 0..40 {
        let (sine, cosine) = (0.02 * f64::from(row)).sin_cos();
        let sign = if (10..30).contains(&row) { -1.0 } else { 1.0 };
        let _ = writeln!(rows, "{},{:.6},0,{:.6},0", 25 * row, sign * cosine, sign * sine);
    }
    bench.write("flip.csv", rows.as_bytes());
    bench.run(&format!("mend flip.csv -o mended.csv --proof sheet.json {named}")).expect(0);
    let sheet: Value = serde_json::from_slice(&bench.read("sheet.json")).unwrap();
    assert!(number(&sheet["max_change_deg"]) < 1e-6, "{sheet}");
    assert!(bench.run(&format!("snags mended.csv {named}")).expect(0).stdout.contains("no snags"));
    let wrong = bench.run("snags sensor.csv --time-unit hours").expect(2);
    assert!(wrong.stderr.contains("expected s, ms or us, found `hours`"), "{}", wrong.stderr);
}

#[test]
fn a_table_takes_its_skeleton_from_another_clip() {
    let bench = Bench::new();
    let bvh = "HIERARCHY\nROOT hip { OFFSET 0 0 0 CHANNELS 3 Zrotation Xrotation Yrotation\n\
        JOINT knee { OFFSET 0 -2 0 CHANNELS 3 Zrotation Xrotation Yrotation\nEnd Site { OFFSET 0 -1 0 } } }\n\
        MOTION\nFrames: 1\nFrame Time: 0.1\n0 0 0 0 0 0\n";
    bench.write("figure.bvh", bvh.as_bytes());
    // A quarter turn of the hip about z takes the knee to the side.
    bench.write("turns.csv", b"time,hip.z,knee.z\n0,90,0\n1,90,30\n");
    bench.write("bones.csv", b"joint,parent,offset.x,offset.y,offset.z\nhip,,0,0,0\nknee,hip,0,-2,0\n");
    let place = |options: &str| {
        let run = bench.run(&format!("sample turns.csv --world --at 0 {options}")).expect(0);
        let sample: Value = serde_json::from_str(&run.stdout).unwrap();
        numbers::<3>(&sample["joints"]["knee"]["position"][0])
    };
    assert_close!(place(""), [0.0, 0.0, 0.0], 1e-12);
    assert_close!(place("--skeleton figure.bvh"), [2.0, 0.0, 0.0], 1e-12);
    assert_close!(place("--skeleton bones.csv"), [2.0, 0.0, 0.0], 1e-12);
    // A new file of it has the skeleton, a glTF made of that too; its own lines come first.
    bench.run("convert turns.csv -o turns.glb --skeleton figure.bvh").expect(0);
    bench.run("convert turns.glb -o own.csv").expect(0);
    let run = bench.run("sample own.csv --world --at 0 --skeleton missing.bvh").expect(0);
    let sample: Value = serde_json::from_str(&run.stdout).unwrap();
    assert_close!(numbers::<3>(&sample["joints"]["knee"]["position"][0]), [2.0, 0.0, 0.0], 1e-6);
    let missing = bench.run("sample turns.csv --at 0 --skeleton missing.bvh").expect(2);
    assert!(missing.stderr.contains("missing.bvh: cannot read"), "{}", missing.stderr);
    bench.write("empty.gltf", b"{\"asset\":{\"version\":\"2.0\"}}");
    let empty = bench.run("sample turns.csv --at 0 --skeleton empty.gltf").expect(2);
    assert!(empty.stderr.contains("expected a clip or table with joints, found none"), "{}", empty.stderr);
}

#[cfg(feature = "gui")]
#[test]
fn the_window_is_drawn_without_a_display() {
    let bench = Bench::new();
    bench.run("picture deckhand.ron --window -o window.png --size 1200x800 --at 3.5").expect(0);
    let bytes = bench.read("window.png");
    let mut reader = png::Decoder::new(std::io::Cursor::new(&bytes)).read_info().unwrap();
    let mut pixels = vec![0; reader.output_buffer_size().unwrap()];
    let frame = reader.next_frame(&mut pixels).unwrap();
    assert_eq!((frame.width, frame.height), (1200, 800));
    let colors: BTreeSet<&[u8]> = pixels[..frame.buffer_size()].chunks(3).collect();
    assert!(colors.len() > 500, "{} colours", colors.len());
}

#[test]
fn a_clip_is_carried_into_the_file_of_another_figure() {
    let (Some(walk), Some(figure)) =
        (shared("data/bvh/walk01.bvh"), shared("data/gltf/biped23_movement_clips.glb"))
    else {
        return;
    };
    let bench = Bench::new();
    let (walk, figure) = (walk.display().to_string(), figure.display().to_string());
    let first = format!(
        "retarget {walk} --onto {figure} -o out.glb --plant-feet --save-map map.csv --proof sheet.json"
    );
    let run = bench.run(&first).expect(0);
    assert!(run.stdout.is_empty() && run.stderr.contains("spans with a planted foot"), "{}", run.stderr);

    // One animation more; meshes, skins, nodes and the other animations stay to the letter.
    let json = |bytes: &[u8]| -> Value {
        let length = u32::from_le_bytes(bytes[12..16].try_into().unwrap()) as usize;
        serde_json::from_slice(&bytes[20..20 + length]).unwrap()
    };
    let (before, after) = (json(&disk::read(Path::new(&figure)).unwrap()), json(&bench.read("out.glb")));
    for member in ["meshes", "skins", "nodes", "scenes", "materials"] {
        assert_eq!(before.get(member), after.get(member), "{member}");
    }
    let animations = |value: &Value| value["animations"].as_array().unwrap().clone();
    let (old, new) = (animations(&before), animations(&after));
    assert_eq!(new[..old.len()], old[..]);
    assert_eq!((new.len(), new[old.len()]["name"].as_str()), (old.len() + 1, Some("walk01")));

    let sheet: Value = serde_json::from_slice(&bench.read("sheet.json")).unwrap();
    assert!(sheet["max_direction_error_before_holding_deg"].as_f64().unwrap() < 1e-3, "{sheet}");
    assert!(
        sheet["slide_after"].as_f64().unwrap() < 0.3 * sheet["slide_before"].as_f64().unwrap(),
        "{sheet}"
    );

    // The map that was written gives the same again; one that keeps a joint at rest does not.
    let again = format!("retarget {walk} --onto {figure} -o again.glb --plant-feet --map map.csv");
    bench.run(&again).expect(0);
    assert_eq!(bench.read("out.glb"), bench.read("again.glb"));
    bench.write("rest.csv", b"source,target\n,head\n");
    bench.run(&format!("retarget {walk} --onto {figure} -o rest.glb --map rest.csv")).expect(0);
    bench.write("wrong.csv", b"source,target\nNose,head\n");
    let wrong = bench.run(&format!("retarget {walk} --onto {figure} -o wrong.glb --map wrong.csv")).expect(2);
    assert!(
        wrong.stderr.contains("wrong.csv: line 2: expected a joint of the source, found `Nose`"),
        "{}",
        wrong.stderr
    );

    // And into the hierarchy of a BVH: its head stays.
    bench.run(&format!("retarget {figure}#1 --onto {walk} -o back.bvh")).expect(0);
    let head = |bytes: &[u8]| String::from_utf8_lossy(bytes).split("MOTION").next().unwrap().to_owned();
    assert_eq!(head(&disk::read(Path::new(&walk)).unwrap()), head(&bench.read("back.bvh")));
}

#[test]
fn a_retarget_keeps_maps_contacts_limits_and_rest_poses_as_it_is_told() {
    let (Some(walk), Some(figure)) =
        (shared("data/bvh/walk01.bvh"), shared("data/gltf/biped23_movement_clips.glb"))
    else {
        return;
    };
    let bench = Bench::new();
    let base = format!("retarget {} --onto {}", walk.display(), figure.display());
    let sheet = |name: &str| -> Value { serde_json::from_slice(&bench.read(name)).unwrap() };

    // Contacts are written, changed and read; hands are held.
    bench.run(&format!("{base} -o a.glb --plant-feet --save-contacts found.csv --proof a.json")).expect(0);
    let found = bench.text("found.csv");
    let n_found = found.lines().count() - 1;
    assert!(n_found > 3 && sheet("a.json")["planted_spans"].as_u64() == Some(n_found as u64), "{found}");
    let fewer: Vec<&str> = found.lines().take(n_found).chain(["left,hand,0.5,1.5,still"]).collect();
    bench.write("fewer.csv", fewer.join("\n").as_bytes());
    bench.run(&format!("{base} -o b.glb --contacts fewer.csv --proof b.json")).expect(0);
    assert_eq!(sheet("b.json")["planted_spans"].as_u64(), Some(n_found as u64 - 1));
    bench.write("wrong.csv", b"side,part,first_s,last_s\nleft,knee,0,1\n");
    let wrong = bench.run(&format!("{base} -o c.glb --contacts wrong.csv")).expect(2);
    assert!(
        wrong.stderr.contains("wrong.csv: line 2: expected heel, ball or hand, found `knee`"),
        "{}",
        wrong.stderr
    );

    // Limits are kept, and their use is in the proof.
    bench.run(&format!("{base} -o d.glb --plant-feet --limits adult --proof d.json")).expect(0);
    let used = sheet("d.json")["limit_use"].as_array().unwrap().clone();
    assert!(used.len() > 8 && used.iter().all(|own| own["frames_beyond"] == 0), "{used:?}");

    // A kept map is used for the next clip of the same two skeletons, and told.
    bench.write("rest.csv", b"source,target\n,head\n");
    bench.run(&format!("{base} -o e.glb --map rest.csv --keep-map")).expect(0);
    let again = bench.run(&format!("{base} -o f.glb")).expect(0);
    assert!(again.stderr.contains("was kept for these two skeletons"), "{}", again.stderr);
    assert_eq!(bench.read("e.glb"), bench.read("f.glb"));
    bench.run(&format!("{base} -o g.glb --no-kept-map")).expect(0);
    assert_ne!(bench.read("e.glb"), bench.read("g.glb"));

    // Rest poses and figures.
    let rest = bench.run(&format!("{base} -o h.glb --no-kept-map --straighten both --rest-at 0")).expect(0);
    assert!(rest.stderr.contains("joints driven"), "{}", rest.stderr);
    assert_ne!(bench.read("g.glb"), bench.read("h.glb"));
    let wrong = bench.run(&format!("{base} -o i.glb --onto-root Nose")).expect(2);
    assert!(wrong.stderr.contains("--onto-root Nose: expected a joint of"), "{}", wrong.stderr);
}

#[test]
fn blends_take_curves_and_carry_other_bodies_over() {
    let bench = Bench::new();
    bench.run("blend clean-deckhand.bvh deckhand.bvh --mix 0.5:0,1:1 -o curve.bvh").expect(0);
    let rows = |name: &str| -> Vec<String> {
        let text = bench.text(name);
        let (_, motion) = text.split_once("Frame Time:").unwrap();
        motion.lines().skip(1).map(|row| row.trim().to_owned()).filter(|row| !row.is_empty()).collect()
    };
    let (own, made) = (rows("clean-deckhand.bvh"), rows("curve.bvh"));
    assert_eq!(own.len(), made.len());
    // Up to the first knot the first clip, as text.
    assert_eq!(own[..10], made[..10]);
    for (weights, words) in [
        ("1:0,0.5:1", "expected knots of a weight curve at rising seconds, found 0.5 after 1"),
        ("0:0,1:2", "from 0 to 1"),
        ("soft", "expected a weight such as 0.5"),
    ] {
        let error =
            bench.run(&format!("blend clean-deckhand.bvh deckhand.bvh --mix {weights} -o no.bvh")).expect(2);
        assert!(error.stderr.contains(words), "{}", error.stderr);
    }
    let error = bench.run("blend clean-deckhand.bvh deckhand.bvh --add 1 --plant-feet -o no.bvh").expect(2);
    assert!(error.stderr.contains("--plant-feet"), "{}", error.stderr);

    // A layer that was measured from its mean, and one composed in the parents' frames, are others.
    for more in ["", "--reference mean", "--side parent"] {
        bench
            .run(&format!("blend clean-deckhand.bvh deckhand.bvh --add 0.7 {more} -o add{}.bvh", more.len()))
            .expect(0);
    }
    let [plain, mean, parent] = [0, 16, 13].map(|length: usize| rows(&format!("add{length}.bvh")));
    assert!(plain != mean && plain != parent && mean != parent);
    bench.run("blend clean-deckhand.bvh deckhand.bvh --join 0.4 --find-place -o place.bvh").expect(0);
    let error = bench.run("blend clean-deckhand.bvh deckhand.bvh --mix 0.4 --find-place -o no.bvh").expect(2);
    assert!(error.stderr.contains("--find-place"), "{}", error.stderr);

    let (Some(walk), Some(biped)) =
        (shared("data/bvh/cmu_02_01_walk.bvh"), shared("data/gltf/biped23_movement_clips.glb"))
    else {
        return;
    };
    bench.copy(&walk, "walk.bvh");
    bench.copy(&biped, "biped.glb");
    let run = bench.run("blend walk.bvh biped.glb#5 --join 0.3 -o both.bvh").expect(0);
    assert!(run.stderr.contains("carried over"), "{}", run.stderr);
    // A machine has no joint that a walker's could drive.
    let error = bench.run("blend walk.bvh crane.csv --join 0.3 -o no.bvh");
    assert!(error.code == 2 && error.stderr.contains("crane.csv"), "{} {}", error.code, error.stderr);
}

#[test]
fn a_blend_of_many_takes_a_weight_for_each_and_a_mix_the_way_that_was_asked_for() {
    let bench = Bench::new();
    bench.run("convert clean-deckhand.bvh --from 0.3 -o later.bvh").expect(0);
    let many = "blend clean-deckhand.bvh deckhand.bvh later.bvh";
    let run = bench.run(&format!("{many} --mean 1,1,2 -o many.bvh")).expect(0);
    assert_eq!(run.stderr.matches(" s and ").count(), 2, "{}", run.stderr);
    // Only the ratio matters.
    bench.run(&format!("{many} --mean 0.25,0.25,0.5 -o same.bvh")).expect(0);
    assert_eq!(bench.read("many.bvh"), bench.read("same.bvh"));
    bench.run(&format!("{many} --mean 2,1,1 -o other.bvh")).expect(0);
    assert_ne!(bench.read("many.bvh"), bench.read("other.bvh"));
    // No weight but the first's: the first clip, as text.
    bench.run("blend clean-deckhand.bvh deckhand.bvh --mean 1,0 -o first.bvh").expect(0);
    assert_eq!(bench.read("first.bvh"), bench.read("clean-deckhand.bvh"));
    for (arguments, words) in [
        ("--mean 1,1", "--mean: expected 3 weights, one for A and one for each B, found 2"),
        ("--mix 0.5", "B: expected one clip with --join, --mix and --add, found 2; use --mean"),
        ("--mean 0,0,0", "above 0 for at least one clip, found 0"),
        ("--mean 1,-1,1", "of at least 0, found -1"),
        ("--mean 1,1,1 --root a", "--root"),
        ("--mean 1,1,1 --mix 0.5", "--mix"),
        ("--join -0.5 --align", "--align"),
        ("--mean 1,1,1 --soft 2", "--limbs"),
        ("--mean 1,1,1 --joints Chest=2", "from 0 to 1 for a joint of a mask, found 2"),
    ] {
        let error = bench.run(&format!("{many} {arguments} -o no.bvh")).expect(2);
        assert!(error.stderr.contains(words), "{arguments}: {}", error.stderr);
    }

    let (Some(walk), Some(dance)) =
        (shared("data/bvh/cmu_02_01_walk.bvh"), shared("data/bvh/cmu_05_06_dance.bvh"))
    else {
        return;
    };
    bench.copy(&walk, "walk.bvh");
    bench.copy(&dance, "dance.bvh");
    // Frame by frame they pass half a turn of each other, and the program says where; a mean in step has all facing alike.
    let run = bench.run("blend walk.bvh dance.bvh --mean 1,1 -o plain.bvh").expect(0);
    assert!(run.stderr.contains("`Hips` turns by 17") && run.stderr.contains("--align"), "{}", run.stderr);
    bench.run("convert dance.bvh --from 1 --to 4 -o later.bvh").expect(0);
    let run = bench.run("blend walk.bvh dance.bvh later.bvh --mean 1,1,1 --align -o step.bvh").expect(0);
    assert!(!run.stderr.contains("half a turn") && run.stderr.contains("became 4.4"), "{}", run.stderr);
    // Masks: a limb with a soft edge, and shares of single joints.
    let soft = |more: &str| {
        bench.run(&format!("blend walk.bvh dance.bvh --mix 0.8 {more} -o soft.bvh --force")).expect(0);
        bench.read("soft.bvh")
    };
    let by_hand =
        soft("--joints LeftShoulder=0.5,LeftArm,LeftForeArm,LeftHand,LThumb,LeftFingerBase,LeftHandIndex1");
    assert_eq!(soft("--limbs LeftArm --soft 1"), by_hand);
    assert_eq!(soft("--limbs LeftArm --joints LeftShoulder=0.5"), by_hand);
    assert_ne!(soft("--limbs LeftArm=0.5 --soft 1"), by_hand);
    let error = bench.run("blend walk.bvh dance.bvh --mix 0.8 --limbs left_arm -o no.bvh").expect(2);
    assert!(error.stderr.contains("such as `LeftArm`, found `left_arm`"), "{}", error.stderr);
    let first_row = |name: &str| -> Vec<f64> {
        let text = bench.text(name);
        let (_, motion) = text.split_once("Frame Time:").unwrap();
        motion.lines().nth(200).unwrap().split_whitespace().map(|word| word.parse().unwrap()).collect()
    };
    for root in ["both", "a", "b"] {
        bench.run(&format!("blend walk.bvh dance.bvh --mix 0.5 --root {root} -o {root}.bvh")).expect(0);
    }
    let [both, a, b, walk, dance] = ["both.bvh", "a.bvh", "b.bvh", "walk.bvh", "dance.bvh"].map(first_row);
    // The root's place along x and z; its height is mixed whoever's way it goes.
    // The two files' frames lie a few microseconds apart.
    for at in [0, 2] {
        assert!(
            (a[at] - walk[at]).abs() < 0.01 && (b[at] - dance[at]).abs() < 0.01,
            "{:?} {:?}",
            &a[..3],
            &b[..3]
        );
        assert!((both[at] - f64::midpoint(walk[at], dance[at])).abs() < 0.01, "{:?}", &both[..3]);
    }
    assert!((a[1] - both[1]).abs() < 1e-4 && (b[1] - both[1]).abs() < 1e-4, "{:?} {:?}", &a[..3], &b[..3]);
}

#[test]
fn a_loop_is_found_closed_and_repeated() {
    let bench = Bench::new();
    let frames = |name: &str| -> usize {
        let text = bench.text(name);
        let line = text.lines().find(|line| line.starts_with("Frames:")).unwrap();
        line["Frames:".len()..].trim().parse().unwrap()
    };
    let run =
        bench.run("convert clean-deckhand.bvh --find-loop 0.8 --close-loop --repeat 3 -o loop.bvh").expect(0);
    assert!(run.stderr.contains("poses") && run.stderr.contains("apart"), "{}", run.stderr);
    bench.run("convert clean-deckhand.bvh --find-loop 0.8 --close-loop=spread -o once.bvh").expect(0);
    assert_eq!(frames("loop.bvh"), 3 * (frames("once.bvh") - 1) + 1);
    bench.run("convert clean-deckhand.bvh --repeat 1 -o same.bvh").expect(0);
    assert_eq!(bench.read("same.bvh"), bench.read("clean-deckhand.bvh"));
    for (arguments, words) in [
        ("--repeat 0", "--repeat: expected 1 to 1000, found 0"),
        ("--find-loop 900", "--find-loop: expected a loop above 0 and at most"),
        ("--find-loop 1 --from 0.5", "--from"),
    ] {
        let error = bench.run(&format!("convert clean-deckhand.bvh {arguments} -o no.bvh")).expect(2);
        assert!(error.stderr.contains(words), "{}", error.stderr);
    }
}

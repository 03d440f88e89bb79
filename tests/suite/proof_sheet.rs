//! Every figure of a proof sheet against another way to it: the texts of both files compared number by number, poses by matrices from the
//! files' own angles, and what the commands print.
#![expect(clippy::unwrap_used, reason = "a helper fails its test")]

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::process::Command;

use glam::{DMat3, DVec3};
use serde_json::Value;
use turnwright::exchange::disk;

use crate::support::{assert_close, number, shared};

/// A BVH file as its text says: no rotor, no track.
struct Plain {
    names: Vec<String>,
    parents: Vec<Option<usize>>,
    offsets: Vec<DVec3>,
    channels: Vec<Vec<String>>,
    /// End sites: the joint and the offset from it.
    ends: Vec<(usize, DVec3)>,
    step_secs: f64,
    /// Rows of words as they stand there.
    rows: Vec<Vec<String>>,
}

impl Plain {
    fn read(path: &Path) -> Self {
        let text = String::from_utf8(disk::read(path).unwrap()).unwrap();
        let mut plain = Self {
            names: vec![],
            parents: vec![],
            offsets: vec![],
            channels: vec![],
            ends: vec![],
            step_secs: 0.0,
            rows: vec![],
        };
        let mut open: Vec<Option<usize>> = Vec::new();
        let mut is_end = false;
        for line in text.lines() {
            let words: Vec<&str> = line.split_whitespace().collect();
            let numbers =
                || words[1..].iter().filter_map(|word| word.parse::<f64>().ok()).collect::<Vec<f64>>();
            match words.first().copied() {
                Some("ROOT" | "JOINT") => {
                    plain.names.push(words[1].to_owned());
                    plain.parents.push(open.iter().rev().find_map(|joint| *joint));
                    plain.offsets.push(DVec3::ZERO);
                    plain.channels.push(vec![]);
                    is_end = false;
                }
                Some("End") => is_end = true,
                Some("{") => open.push((!is_end).then(|| plain.names.len() - 1)),
                Some("}") => {
                    open.pop();
                    is_end = false;
                }
                Some("OFFSET") => {
                    let offset = DVec3::from_slice(&numbers());
                    let joint = open.iter().rev().find_map(|joint| *joint).unwrap();
                    if is_end { plain.ends.push((joint, offset)) } else { plain.offsets[joint] = offset }
                }
                Some("CHANNELS") => {
                    *plain.channels.last_mut().unwrap() =
                        words[2..].iter().map(|&word| word.to_owned()).collect();
                }
                Some("Frame") => plain.step_secs = numbers()[0],
                Some(first) if first.parse::<f64>().is_ok() || first == "nan" => {
                    plain.rows.push(words.iter().map(|&word| word.to_owned()).collect());
                }
                _ => {}
            }
        }
        plain
    }

    /// Where the words of a joint begin in a row.
    fn start(&self, joint: usize) -> usize {
        self.channels[..joint].iter().map(Vec::len).sum()
    }

    fn words(&self, joint: usize, frame: usize) -> &[String] {
        let start = self.start(joint);
        &self.rows[frame][start..start + self.channels[joint].len()]
    }

    /// Turn relative to the parent, and place in it.
    fn local(&self, joint: usize, frame: usize) -> (DMat3, DVec3) {
        let (mut turn, mut place) = (DMat3::IDENTITY, self.offsets[joint]);
        for (channel, word) in self.channels[joint].iter().zip(self.words(joint, frame)) {
            let value: f64 = word.parse().unwrap();
            let rad = value.to_radians();
            match channel.as_str() {
                "Xrotation" => turn *= DMat3::from_rotation_x(rad),
                "Yrotation" => turn *= DMat3::from_rotation_y(rad),
                "Zrotation" => turn *= DMat3::from_rotation_z(rad),
                "Xposition" => place.x = value,
                "Yposition" => place.y = value,
                _ => place.z = value,
            }
        }
        (turn, place)
    }

    /// The places of the end sites at a frame.
    fn ends_at(&self, frame: usize) -> Vec<DVec3> {
        let mut worlds: Vec<(DMat3, DVec3)> = Vec::new();
        for joint in 0..self.names.len() {
            let (turn, place) = self.local(joint, frame);
            worlds.push(match self.parents[joint] {
                Some(parent) => {
                    let (above, at): (DMat3, DVec3) = worlds[parent];
                    (above * turn, at + above * place)
                }
                None => (turn, place),
            });
        }
        self.ends.iter().map(|&(joint, offset)| worlds[joint].1 + worlds[joint].0 * offset).collect()
    }
}

/// The turn of a rotation matrix as a vector along its axis, radians.
fn turn_vector(matrix: DMat3) -> DVec3 {
    let twice_sine = DVec3::new(
        matrix.y_axis.z - matrix.z_axis.y,
        matrix.z_axis.x - matrix.x_axis.z,
        matrix.x_axis.y - matrix.y_axis.x,
    );
    let twice_cosine = matrix.x_axis.x + matrix.y_axis.y + matrix.z_axis.z - 1.0;
    let angle = twice_sine.length().atan2(twice_cosine);
    twice_sine.normalize_or_zero() * angle
}

fn turned_deg(a: DMat3, b: DMat3) -> f64 {
    turn_vector(a.transpose() * b).length().to_degrees()
}

/// A capture mended by the program, both files and what was told of it.
struct Mended {
    _folder: tempfile::TempDir,
    before: PathBuf,
    after: PathBuf,
    told: Value,
    sheet: Value,
    page: String,
}

fn text(path: &Path) -> String {
    String::from_utf8(disk::read(path).unwrap()).unwrap()
}

/// The one object that a command prints.
fn run(folder: &Path, arguments: &[&str]) -> Option<Value> {
    let output = Command::new(env!("CARGO_BIN_EXE_turnwright"))
        .args(arguments)
        .current_dir(folder)
        .env("TURNWRIGHT_SETTINGS", "")
        .output()
        .unwrap();
    let wrong = String::from_utf8_lossy(&output.stderr).into_owned();
    assert!(output.status.code().is_some_and(|code| code < 2), "{arguments:?}: {wrong}");
    let printed = String::from_utf8(output.stdout).unwrap();
    printed.lines().next().map(|line| serde_json::from_str(line).unwrap())
}

fn mended(file: &str) -> Option<Mended> {
    let bytes = disk::read(&shared(&format!("data/bvh/{file}"))?).unwrap();
    let folder = tempfile::tempdir().unwrap();
    let before = folder.path().join(file);
    disk::write(&before, &bytes).unwrap();
    let base = ["mend", file, "-o", "out.bvh", "--limits", "adult", "--json", "--proof"];
    let told = run(folder.path(), &[&base[..], &["sheet.json"]].concat()).unwrap();
    run(folder.path(), &[&base[..], &["sheet.html"]].concat());
    let sheet = serde_json::from_str(&text(&folder.path().join("sheet.json"))).unwrap();
    let page = text(&folder.path().join("sheet.html"));
    let after = folder.path().join("out.bvh");
    Some(Mended { _folder: folder, before, after, told, sheet, page })
}

fn rows<'a>(value: &'a Value, name: &str) -> &'a Vec<Value> {
    value[name].as_array().unwrap_or_else(|| panic!("{name} is a list"))
}

fn count(value: &Value) -> usize {
    usize::try_from(value.as_u64().unwrap()).unwrap()
}

#[test]
fn every_figure_of_the_sheet_of_a_mended_capture_is_what_the_two_files_say() {
    for file in ["zxy_19joints_30fps.bvh", "mixed_order_6ch.bvh"] {
        let Some(own) = mended(file) else { return };
        let (before, after) = (Plain::read(&own.before), Plain::read(&own.after));
        what_came_in(&own, &before);
        what_was_found_and_done(&own);
        untouched(&own, &before, &after);
        changes(&own, &before, &after);
        limits(&own);
        pictures(&own);
    }
}

fn what_came_in(own: &Mended, before: &Plain) {
    let (sheet, clip) = (&own.sheet, &own.sheet["clips"][0]);
    for (side, path) in [("before", &own.before), ("after", &own.after)] {
        let bytes = disk::read(path).unwrap();
        assert_eq!(sheet[side]["sha256"], disk::hash(&bytes), "{side}");
        assert_eq!((&sheet[side]["bytes"], &sheet[side]["format"]), (&bytes.len().into(), &"BVH".into()));
        assert!(own.page.contains(&disk::hash(&bytes)), "{side}");
    }
    assert_eq!(sheet["after_is_read_back"], true);
    let (joints, frames) = (before.names.len(), before.rows.len());
    assert_eq!((count(&clip["joints_compared"]), count(&clip["frames"])), (joints, frames));
    assert_close!(number(&clip["rate"]), 1.0 / before.step_secs, 0.01);
    // Tracks of turns: each joint whose channels turn it.
    let turning =
        before.channels.iter().filter(|own| own.iter().any(|name| name.ends_with("rotation"))).count();
    assert_eq!(count(&clip["keys_before"]), turning * frames);
    assert_eq!(count(&clip["stored_before"]["file_angles"]), turning);
    assert!(own.page.contains("as the file’s own angles"));
}

fn what_was_found_and_done(own: &Mended) {
    let (told, found) = (rows(&own.told, "snags"), rows(&own.sheet, "snags"));
    assert!(!told.is_empty());
    let state = |snag: &Value, state: &str| snag["state"] == state;
    assert_eq!(found.iter().filter(|snag| !state(snag, "new")).count(), told.len());
    let passes = rows(&own.sheet, "passes");
    let mut mends: BTreeMap<(String, String, u64), &Value> = BTreeMap::new();
    let mut order = Vec::new();
    for pass in passes {
        assert_eq!(pass["numbers"][0]["name"], "snags");
        let own_mends = rows(pass, "mends");
        assert_eq!(pass["numbers"][0]["value"], own_mends.len() as f64, "{pass}");
        order.push(own_mends[0]["kind"].as_str().unwrap().parse::<turnwright::snag::SnagKind>().unwrap());
        for mend in own_mends {
            let name = |key: &str| mend[key].as_str().unwrap().to_owned();
            mends.insert((name("kind"), name("joint"), mend["first_frame"].as_u64().unwrap()), mend);
        }
        assert!(own.page.contains(pass["pass"].as_str().unwrap()), "{}", pass["pass"]);
    }
    assert!(order.is_sorted(), "each kind is mended on what the kinds before it left: {order:?}");
    for snag in told {
        let name = |key: &str| snag[key].as_str().unwrap().to_owned();
        let mend = mends.remove(&(name("kind"), name("joint"), snag["first_frame"].as_u64().unwrap()));
        assert_eq!(mend.is_some(), snag["mended"].as_bool().unwrap(), "{snag}");
        assert!(found.iter().any(|own| own["text"] == snag["text"]), "{snag}");
        let Some(mend) = mend else { continue };
        // Both tell of the same mend; where a later one has a part in the same keys the pass tells its own alone.
        assert_close!(number(&mend["change_deg"]), number(&snag["change_deg"]), 1e-6, "{snag}");
        assert_eq!(mend["mend"], snag["mend"]);
    }
    assert!(mends.is_empty(), "{mends:?}");
    let clip = &own.sheet["clips"][0];
    for (key, wanted) in [("snags_gone", "gone"), ("snags_left", "left"), ("snags_new", "new")] {
        let counted = found.iter().filter(|snag| state(snag, wanted)).count();
        assert_eq!(count(&clip[key]), counted, "{key}");
        assert_eq!(own.page.matches(&format!("<td class=\"{wanted}\">")).count(), counted, "{wanted}");
    }
    assert!(own.page.contains("<h3>Passes that ran</h3>") && own.page.contains("<h3>What was found</h3>"));
}

/// Untouched is what stands there in the same letters.
fn untouched(own: &Mended, before: &Plain, after: &Plain) {
    let frames = before.rows.len();
    let mut whole = 0;
    for (joint, row) in rows(&own.sheet, "joints").iter().enumerate() {
        assert_eq!(row["joint"], before.names[joint].as_str());
        let changed = (0..frames).filter(|&frame| before.words(joint, frame) != after.words(joint, frame));
        let changed = changed.count();
        assert_eq!(row["untouched"], changed == 0, "{row}");
        assert_eq!(count(&row["keys_changed"]), changed, "{row}");
        whole += usize::from(changed == 0);
    }
    let same = before.rows.iter().zip(&after.rows).filter(|(a, b)| a == b).count();
    let clip = &own.sheet["clips"][0];
    assert_eq!(count(&clip["joints_untouched"]), whole);
    assert_eq!(count(&clip["frames_untouched"]), same);
    assert!(own.page.contains(&format!("<dd>{same} of {frames}</dd>")));
}

/// Degrees of joints, lengths of limb ends, rates and jerk.
fn changes(own: &Mended, before: &Plain, after: &Plain) {
    let (frames, step) = (before.rows.len(), before.step_secs);
    let is_frame = |secs: f64| (secs / step - (secs / step).round()).abs() < 0.01;
    let mut compared = 0;
    for (joint, row) in rows(&own.sheet, "joints").iter().enumerate() {
        let turns = [before, after]
            .map(|plain| -> Vec<DMat3> { (0..frames).map(|frame| plain.local(joint, frame).0).collect() });
        let change: Vec<f64> = turns[0].iter().zip(&turns[1]).map(|(a, b)| turned_deg(*a, *b)).collect();
        let most = change.iter().copied().fold(0.0, f64::max);
        let told = number(&row["max_change_deg"]);
        // Middles between frames are looked at too: they may be farther.
        assert!(told > most - 1e-5, "{row}: {most}");
        if is_frame(number(&row["max_change_time"])) {
            assert_close!(told, most, 1e-5, "{row}");
            compared += usize::from(most > 0.1);
        }
        let mean = change.iter().sum::<f64>() / frames as f64;
        assert!((number(&row["mean_change_deg"]) - mean).abs() < 0.02 + 0.05 * mean, "{row}: {mean}");
        for (side, key) in ["before", "after"].into_iter().enumerate() {
            let rates: Vec<DVec3> = turns[side]
                .windows(2)
                .map(|pair| turn_vector(pair[0].transpose() * pair[1]) / step)
                .collect();
            let fastest = rates.iter().map(|rate| rate.length()).fold(0.0, f64::max).to_degrees();
            let jerk = rates.windows(3).map(|three| (three[2] - 2.0 * three[1] + three[0]) / (step * step));
            let jerk = jerk.map(DVec3::length).fold(0.0, f64::max).to_degrees();
            let close = |told: f64, own: f64| (told - own).abs() <= 1e-4 * own.abs() + 1e-3;
            let key = |what: &str, unit: &str| format!("{what}_{key}_deg_per_{unit}");
            let told = number(&row[key("fastest", "s")]);
            assert!(close(told, fastest), "{row}: {fastest}");
            let told = number(&row[key("max_jerk", "s3")]);
            assert!(close(told, jerk), "{row}: {jerk}");
        }
    }
    assert!(compared > 0, "some joint changed most at a frame");

    let mut farthest = vec![0.0_f64; before.ends.len()];
    let mut sums = vec![0.0; before.ends.len()];
    for frame in 0..frames {
        for (end, (a, b)) in before.ends_at(frame).into_iter().zip(after.ends_at(frame)).enumerate() {
            farthest[end] = farthest[end].max(a.distance(b));
            sums[end] += a.distance(b);
        }
    }
    let tips = rows(&own.sheet, "tips");
    assert_eq!(tips.len(), before.ends.len());
    for (tip, ((most, sum), (joint, _))) in tips.iter().zip(farthest.iter().zip(&sums).zip(&before.ends)) {
        assert_eq!(tip["joint"], before.names[*joint].as_str());
        let told = number(&tip["max_change"]);
        assert!(told > most - 1e-6, "{tip}: {most}");
        if is_frame(number(&tip["max_change_time"])) {
            assert_close!(told, *most, 1e-6, "{tip}");
        }
        let mean = sum / frames as f64;
        assert!((number(&tip["mean_change"]) - mean).abs() < 0.01 + 0.05 * mean, "{tip}: {mean}");
    }
    assert!(own.page.contains("<h3>Ends of limbs</h3>"));
}

/// The frames told as past-limit are those that the snags of that kind cover.
fn limits(own: &Mended) {
    let limits = rows(&own.sheet, "limits");
    assert!(limits.len() > 10);
    for row in limits {
        assert_eq!((&row["limits"], &row["joint"].is_string()), (&"adult".into(), &true));
        let told = rows(&own.told, "snags").iter();
        let has_snag = told.clone().any(|snag| snag["kind"] == "past-limit" && snag["joint"] == row["joint"]);
        if has_snag {
            // Other mends go before: a fault that they take away is no matter of limits any more.
            assert!(count(&row["frames_past_limit_before"]) > 0, "{row}");
        }
        for side in ["before", "after"] {
            assert!(
                count(&row[format!("frames_past_limit_{side}")])
                    <= count(&row[format!("frames_beyond_limit_{side}")])
                    || row[format!("frames_beyond_limit_{side}")].is_null(),
                "{row}"
            );
        }
    }
    assert!(own.page.contains("Limits before and after: adult"));
}

/// Turn maps, curves and the strip, each for light and dark, inside the page.
fn pictures(own: &Mended) {
    let page = &own.page;
    for title in ["Turn maps", "Where it changed most"] {
        let at = page.find(&format!("<h3>{title}</h3>")).unwrap_or_else(|| panic!("{title}"));
        let figure = &page[at..at + page[at..].find("</figure>").unwrap()];
        assert_eq!(figure.matches("data:image/png;base64,").count(), 2, "{title}");
        assert!(figure.contains("prefers-color-scheme: dark") && figure.contains(" alt=\""), "{title}");
    }
    let changed =
        rows(&own.sheet, "joints").iter().filter(|row| number(&row["max_change_deg"]) > 1e-3).count();
    assert_eq!(page.matches("<figure class=\"curve\">").count(), changed.min(6));
    for outside in ["http:", "https:", "<link", "<script", "url(", "@import", "file:"] {
        assert!(!page.contains(outside), "{outside}");
    }
    assert!(page.contains("@media print") && page.contains("prefers-color-scheme: dark"));
}

/// What is measured is the file: a number that is changed in it by another hand shows.
#[test]
fn a_sheet_tells_what_stands_in_the_written_file() {
    let Some(walk) = shared("data/bvh/cmu_02_01_walk.bvh") else { return };
    let folder = tempfile::tempdir().unwrap();
    let before = text(&walk);
    disk::write(&folder.path().join("walk.bvh"), before.as_bytes()).unwrap();
    // Ten degrees more about one axis of one joint at frame 20.
    let plain = Plain::read(&walk);
    let joint = plain.names.iter().position(|name| name == "LeftArm").unwrap();
    let at = plain.start(joint) + plain.channels[joint].len() - 1;
    let mut lines: Vec<String> = before.lines().map(str::to_owned).collect();
    let first = lines.iter().position(|line| line.starts_with("Frame Time")).unwrap() + 1;
    let mut words: Vec<String> = lines[first + 20].split_whitespace().map(str::to_owned).collect();
    words[at] = (words[at].parse::<f64>().unwrap() + 10.0).to_string();
    lines[first + 20] = words.join(" ");
    disk::write(&folder.path().join("touched.bvh"), lines.join("\n").as_bytes()).unwrap();
    run(folder.path(), &["proof", "walk.bvh", "touched.bvh", "-o", "sheet.json"]);
    let sheet: Value = serde_json::from_str(&text(&folder.path().join("sheet.json"))).unwrap();
    assert_close!(number(&sheet["max_change_deg"]), 10.0, 1e-9);
    assert_eq!(
        (&sheet["max_change_joint"], sheet["passes"].as_array().map(Vec::len)),
        (&"LeftArm".into(), Some(0))
    );
    let clip = &sheet["clips"][0];
    assert_eq!(count(&clip["frames_untouched"]) + 1, plain.rows.len());
    assert_eq!(count(&clip["joints_untouched"]) + 1, plain.names.len());
}

/// The passes of a scene are told with their numbers, what came in is the file and not what passes made of it, and what is meant is told.
#[test]
fn the_passes_of_a_scene_are_on_the_sheet_with_their_numbers() {
    use std::sync::Arc;
    use turnwright::clip::Smoothing;
    use turnwright::exchange::{OpenOptions, open, ron};
    use turnwright::mend::{SurveyOptions, survey};
    use turnwright::scene::{ClipWork, Document, Edit, SmoothPass, SnagMark, SourceRef};
    use turnwright::snag::Unwatched;

    let folder = tempfile::tempdir().unwrap();
    let demo = turnwright::demo::SCENES[0];
    let path = folder.path().join(demo.clip_file);
    disk::write(&path, demo.clip_bytes).unwrap();
    let source = open(&path, &OpenOptions::default()).unwrap();
    let clip = Arc::clone(&source.clips[0]);
    let snags = survey(&clip, &SurveyOptions::default(), &Unwatched).unwrap().snags;
    let meant = snags.iter().find(|snag| snag.safe).unwrap();
    let reference = SourceRef { path, sha256: source.sha256().to_owned(), reading: source.reading.clone() };
    let document = Document {
        sources: vec![reference],
        works: vec![ClipWork { left: vec![SnagMark::of(meant)], ..ClipWork::new(0, 0, clip.name.clone()) }],
    };
    let smooth = SmoothPass { amount: 0.5, ..SmoothPass::new(Smoothing::gaussian(6.0)) };
    let document = Edit::AddPass { work: 0, at: 0, step: smooth.into() }.apply(&document).unwrap();
    let label = |_: usize, _: usize, joint: usize| clip.skeleton.label(joint).to_owned();
    ron::write(&folder.path().join("night.ron"), &document, &label).unwrap();

    run(
        folder.path(),
        &["mend", "night.ron", "-o", "out.bvh", "--kinds", "spike", "--json", "--proof", "sheet.json"],
    );
    let sheet: Value = serde_json::from_str(&text(&folder.path().join("sheet.json"))).unwrap();
    let first = &rows(&sheet, "passes")[0];
    assert_eq!(first["pass"], "Smooth below 6 Hz");
    let numbers: Vec<(&str, f64, &str)> = rows(first, "numbers")
        .iter()
        .map(|own| (own["name"].as_str().unwrap(), number(&own["value"]), own["unit"].as_str().unwrap()))
        .collect();
    assert_eq!(numbers, [("cut-off", 6.0, "Hz"), ("amount", 50.0, "%")]);
    assert!(number(&first["change_deg"]) > 0.1);
    assert_eq!(sheet["before"]["sha256"], disk::hash(demo.clip_bytes));
    // Found are the snags of what came in.
    let found = rows(&sheet, "snags");
    assert_eq!(found.iter().filter(|snag| snag["state"] != "new").count(), snags.len());
    let own = found.iter().find(|snag| snag["text"] == meant.text.as_str()).unwrap();
    assert!(own["state"] == "meant" || own["state"] == "gone", "{own}");
}

//! `demo`: the main job on the demo scenes, from embedded bytes to proof sheets.

use std::path::{Path, PathBuf};
use std::process::Command;
use std::sync::Arc;

use crate::cli::DONE;
use crate::cli::args::DemoArgs;
use crate::cli::error::CliError;
use crate::cli::input;
use crate::cli::output::text::ClipReport;
use crate::cli::output::{Output, text};
use crate::clip::Clip;
use crate::demo::{DemoScene, SCENES};
use crate::exchange::{self, Guard, OpenOptions, disk};
use crate::proof::{Pair, Sheet};
use crate::raster::spread_times;
use crate::snag::SnagKind;

use super::mend::{Choice, mend_clip, mends_run};
use super::picture;
use super::proof::{SheetFormat, sheet_of, write};

/// Size of the pictures, pixels.
const PICTURE_SIZE: [usize; 2] = [1600, 900];
/// Moments on a picture: those that changed most, filled up with evenly spread ones.
const MOMENTS: usize = 8;
/// Moments closer than this show the same, seconds.
const LEAST_GAP_SECS: f64 = 0.12;

/// Writes everything into one folder, tells what was found, and opens the window if it can.
pub(crate) fn run(args: &DemoArgs, output: &mut Output) -> Result<u8, CliError> {
    for scene in &SCENES {
        do_scene(scene, &args.output, output)?;
    }
    output.line(format_args!("Everything is in {}", args.output.display()))?;
    show(&args.output.join(SCENES[0].scene_file), output);
    Ok(DONE)
}

fn do_scene(scene: &DemoScene, folder: &Path, output: &mut Output) -> Result<(), CliError> {
    output.line(scene.about)?;
    let clip_path = folder.join(scene.clip_file);
    disk::write(&clip_path, scene.clip_bytes)?;
    disk::write(&folder.join(scene.scene_file), scene.scene_bytes)?;

    let mut input = input::read_back(&clip_path, &OpenOptions::default(), output)?;
    let before = input.clip().clone();
    let (mended, snags, mends) = mend_clip(&clip_path, &before, None, &Choice::safe(), &[])?;
    let label = input.source.clip_label(0);
    let report = ClipReport {
        path: &clip_path,
        label: &label,
        index: 0,
        clip: &before,
        snags: &snags,
        mends: Some(&mends),
    };
    text::clip(output, &report)?;

    let guard = Guard { inputs: input.files(), force: false };
    let results = [mended.clone()];
    // In its own format last: the sheet is measured on that file, where numbers can be compared bit for bit.
    let own = input.source.format.extension();
    let mut extensions = vec!["glb", "bvh"];
    extensions.retain(|&extension| extension != own);
    extensions.push(own);
    let mut written = PathBuf::new();
    for extension in extensions {
        written = folder.join(format!("{}-mended.{extension}", scene.name));
        let told = exchange::write(&input.source, &results, None, &written, &guard)?;
        output.notes(&written, &told.notes);
        output.say(&format!("wrote {}", written.display()));
    }
    let after = input::read_back(&written, &OpenOptions::default(), output)?;
    let pair = Pair {
        label,
        index: 0,
        before: before.clone(),
        after: after.clip().clone(),
        kinds: SnagKind::defaults(),
        limits: None,
        passes: mends_run(&before, &snags, &mends),
        meant: Vec::new(),
    };
    let sheet = sheet_of(&input.source, &after.source, vec![pair], SheetFormat::Html)?;
    for (extension, format) in [("html", SheetFormat::Html), ("json", SheetFormat::Json)] {
        write(&sheet, &folder.join(format!("{}-proof.{extension}", scene.name)), format, output)?;
    }
    let times = moments(&sheet, &before);
    input.results = vec![mended];
    picture::write(&input, &times, PICTURE_SIZE, &folder.join(format!("{}.png", scene.name)), output)
}

/// The moments of the largest changes, and others spread over the clip, in order.
fn moments(sheet: &Sheet, clip: &Arc<Clip>) -> Vec<f64> {
    let mut joints: Vec<_> = sheet.clips.iter().flat_map(|clip| &clip.measurement.joints).collect();
    joints.sort_by(|a, b| b.change.value.total_cmp(&a.change.value));
    let changed = joints.iter().filter(|joint| joint.change.value > 0.01).map(|joint| joint.change.at_secs);
    let mut chosen: Vec<f64> = Vec::with_capacity(MOMENTS);
    let mut choose = |times: &mut dyn Iterator<Item = f64>, most: usize| {
        for secs in times {
            let is_new = chosen.iter().all(|other| (other - secs).abs() >= LEAST_GAP_SECS);
            if is_new && chosen.len() < most {
                chosen.push(secs);
            }
        }
        chosen.len()
    };
    let taken = choose(&mut changed.into_iter(), MOMENTS / 2);
    choose(&mut spread_times(clip, MOMENTS - taken).into_iter(), MOMENTS);
    chosen.sort_by(f64::total_cmp);
    chosen
}

/// Opens the window on a scene and waits for it, or says how.
///
/// In a process of its own: a window that fails with the graphics driver starts its process anew, and the demo is not to
/// run twice.
fn show(scene: &Path, output: &mut Output) {
    let how = format!("turnwright {}", scene.display());
    if !cfg!(feature = "gui") {
        output.say(&format!("This build has no window; one that has it opens with: {how}"));
    } else if !display_is_named() {
        output.say(&format!("There is no display here; where there is one, the window opens with: {how}"));
    } else {
        let window = std::env::current_exe().and_then(|program| Command::new(program).arg(scene).status());
        if !window.is_ok_and(|status| status.success()) {
            output.say(&format!("The window did not open; try again with: {how}"));
        }
    }
}

/// Whether there is a display to try. Only some systems name theirs in the environment.
fn display_is_named() -> bool {
    let names_displays = cfg!(all(unix, not(target_vendor = "apple"), not(target_os = "android")));
    let is_set = |name: &str| std::env::var_os(name).is_some_and(|value| !value.is_empty());
    !names_displays || ["WAYLAND_DISPLAY", "WAYLAND_SOCKET", "DISPLAY"].iter().any(|name| is_set(name))
}

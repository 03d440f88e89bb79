//! Layers point down only: a lower folder never names a higher one, and egui stays in the window.

use std::fs;
use std::path::{Path, PathBuf};

use turnwright::exchange::disk;

/// Lowest first.
const LAYERS: [&str; 15] = [
    "rotor", "skeleton", "clip", "limit", "snag", "mend", "blend", "retarget", "scene", "exchange", "raster",
    "proof", "demo", "cli", "app",
];

fn each_source_line(folder: &Path, seen: &mut dyn FnMut(&str, &str)) -> usize {
    let mut lines = 0;
    let entries = fs::read_dir(folder).unwrap_or_else(|error| panic!("{}: {error}", folder.display()));
    let mut paths: Vec<PathBuf> =
        entries.map(|entry| entry.expect("a folder lists its files").path()).collect();
    paths.sort();
    for path in paths {
        if path.is_dir() {
            lines += each_source_line(&path, seen);
        } else if path.extension().is_some_and(|extension| extension == "rs") {
            for (number, line) in text(&path).lines().enumerate() {
                lines += 1;
                seen(&format!("{}:{}", path.display(), number + 1), line);
            }
        }
    }
    lines
}

fn text(path: &Path) -> String {
    let bytes = disk::read(path).expect("a source file can be read");
    String::from_utf8(bytes).expect("a source file is text")
}

/// Whether a line of code names a module of the crate: `crate::cli`, but not `crate::clip`.
fn names(code: &str, module: &str) -> bool {
    code.match_indices(&format!("crate::{module}")).any(|(at, found)| {
        let next = code[at + found.len()..].chars().next();
        next.is_none_or(|next| !next.is_alphanumeric() && next != '_')
    })
}

#[test]
fn a_lower_layer_never_names_a_higher_one() {
    let src = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut wrong = Vec::new();
    for (rank, layer) in LAYERS.iter().enumerate() {
        let lines = each_source_line(&src.join(layer), &mut |place, line| {
            let code = line.trim_start();
            if code.starts_with("//") {
                return;
            }
            if code.contains("use crate::{") {
                wrong.push(format!("{place}: one `use crate::module::…` for each module"));
            }
            for higher in &LAYERS[rank + 1..] {
                // `cli` and `app` stand side by side on top: the command that opens the window may name it.
                if names(code, higher) && (*layer, *higher) != ("cli", "app") {
                    wrong.push(format!("{place}: `{layer}` reaches up into `{higher}`"));
                }
            }
            if *layer != "app" && ["egui::", "eframe::", "winit::"].iter().any(|name| code.contains(name)) {
                wrong.push(format!("{place}: only `app` knows the window libraries"));
            }
        });
        assert!(lines > 0, "layer `{layer}` has no source under src/, is the list out of date?");
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn every_folder_of_the_crate_is_a_layer() {
    let src = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut folders: Vec<String> = fs::read_dir(src)
        .unwrap()
        .map(|entry| entry.unwrap())
        .filter(|entry| entry.path().is_dir())
        .map(|entry| entry.file_name().into_string().unwrap())
        .collect();
    folders.sort();
    let mut layers = LAYERS.map(str::to_owned).to_vec();
    layers.sort();
    assert_eq!(folders, layers);
}

//! Where results go: one file, or a folder with a file for each input.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use crate::exchange::Format;

use super::error::CliError;

/// A target for each of `sources`: `output` itself for one, else files of the sources' names in the folder `output`.
///
/// A name with one of our extensions is a file, everything else and every folder that exists is a folder.
pub(super) fn targets(output: &Path, sources: &[&Path]) -> Result<Vec<PathBuf>, CliError> {
    let is_file = !output.is_dir() && Format::of(output).is_ok();
    if is_file {
        if sources.len() > 1 {
            return Err(CliError::Argument {
                place: format!("-o {}", output.display()),
                expected: format!("a folder for {} files", sources.len()),
                found: "one file".to_owned(),
                advice: "name a folder",
            });
        }
        return Ok(vec![output.to_owned()]);
    }
    let ends_as_folder = output.to_string_lossy().ends_with(['/', std::path::MAIN_SEPARATOR]);
    if !output.is_dir()
        && !ends_as_folder
        && let Some(extension) = output.extension()
    {
        return Err(CliError::Argument {
            place: format!("-o {}", output.display()),
            expected: "a folder, or a file that ends in .gltf, .glb, .bvh or .csv".to_owned(),
            found: format!(".{}", extension.to_string_lossy()),
            advice: "choose another name",
        });
    }
    let mut taken: BTreeMap<PathBuf, &Path> = BTreeMap::new();
    let mut targets = Vec::with_capacity(sources.len());
    for source in sources {
        let target = output.join(source.file_name().unwrap_or_default());
        if let Some(first) = taken.insert(target.clone(), source) {
            return Err(CliError::Argument {
                place: source.display().to_string(),
                expected: "inputs with different file names for one folder".to_owned(),
                found: format!("the name of {} again", first.display()),
                advice: "mend them in two runs",
            });
        }
        targets.push(target);
    }
    Ok(targets)
}

/// The sheet of one of several files: its name before that of the sheet, `walk-proof.html` for `proof.html`.
pub(super) fn beside(sheet: &Path, source: &Path, count: usize) -> PathBuf {
    if count == 1 {
        return sheet.to_owned();
    }
    let stem = source.file_stem().unwrap_or_default().to_string_lossy();
    let name = sheet.file_name().unwrap_or_default().to_string_lossy();
    sheet.with_file_name(format!("{stem}-{name}"))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn check(output: &str, sources: &[&str], expected: Result<&[&str], &str>) {
        let sources: Vec<&Path> = sources.iter().map(Path::new).collect();
        let found = targets(Path::new(output), &sources);
        match expected {
            Ok(expected) => {
                let expected: Vec<PathBuf> = expected.iter().map(PathBuf::from).collect();
                assert_eq!(found.unwrap(), expected);
            }
            Err(part) => {
                let error = found.unwrap_err().to_string();
                assert!(error.contains(part), "{error}");
            }
        }
    }

    #[test]
    fn one_file_or_a_folder_of_files() {
        check("out.bvh", &["a/x.bvh"], Ok(&["out.bvh"]));
        check("out", &["a/x.bvh"], Ok(&["out/x.bvh"]));
        check("out", &["a/x.bvh", "a/y.glb"], Ok(&["out/x.bvh", "out/y.glb"]));
        check("out.v2/", &["a/x.bvh"], Ok(&["out.v2/x.bvh"]));
        check("out.bvh", &["a/x.bvh", "a/y.bvh"], Err("expected a folder for 2 files"));
        check("out", &["a/x.bvh", "b/x.bvh"], Err("expected inputs with different file names"));
        check("out.txt", &["a/x.bvh"], Err("found .txt"));
    }
}

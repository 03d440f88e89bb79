//! Which files a save or an export writes, and what is asked where some are there already.

use std::path::{Path, PathBuf};

use crate::exchange::disk;

use super::bench::{Project, file_name};

/// Whether a path is that of a scene.
pub(crate) fn is_scene(path: &Path) -> bool {
    path.extension().is_some_and(|ending| ending.eq_ignore_ascii_case("ron"))
}

/// Where a scene is saved when this path was typed.
pub(crate) fn scene_file(typed: PathBuf) -> PathBuf {
    if is_scene(&typed) { typed } else { typed.with_added_extension("ron") }
}

/// Where the proof sheet of a written file lies: `walk-proof.html` beside `walk.bvh`.
pub(crate) fn sheet_file(written: &Path) -> PathBuf {
    let stem = written.file_stem().map_or_else(|| "clip".into(), |stem| stem.to_string_lossy());
    written.with_file_name(format!("{stem}-proof.html"))
}

/// The file itself, the buffer that a glTF text may have beside it, and the proof sheet.
pub(crate) fn export_files(path: &Path, has_proof: bool) -> Vec<PathBuf> {
    let has_buffer = path.extension().is_some_and(|ending| ending.eq_ignore_ascii_case("gltf"));
    let buffer = has_buffer.then(|| path.with_extension("bin"));
    let sheet = has_proof.then(|| sheet_file(path));
    std::iter::once(path.to_owned()).chain(buffer).chain(sheet).collect()
}

/// The question before files are replaced; none where all are new.
pub(crate) fn replace_question(files: &[PathBuf]) -> Option<String> {
    let names: Vec<String> = files.iter().filter(|path| path.is_file()).map(|path| file_name(path)).collect();
    match names.as_slice() {
        [] => None,
        [only] => Some(format!("{only} exists. Replace it?")),
        [more @ .., last] => Some(format!("{} and {last} exist. Replace them?", more.join(", "))),
    }
}

/// Whether a path leads to the scene that the document was opened from or saved to last.
pub(crate) fn is_own_scene(project: Option<&Project>, path: &Path) -> bool {
    let own = project.and_then(|project| project.scene_path.as_deref());
    own.is_some_and(|own| disk::is_same_file(own, path))
}

/// Whether a path leads to a file that the document works on: such a one is never written, whatever is answered.
pub(crate) fn is_source(project: Option<&Project>, path: &Path) -> bool {
    let sources = project.map_or(&[][..], |project| project.document().sources.as_slice());
    sources.iter().any(|source| disk::is_same_file(&source.path, path))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_question_names_the_files_that_are_there() {
        let folder = tempfile::tempdir().unwrap();
        let path = |name: &str| folder.path().join(name);
        let files = export_files(&path("walk.gltf"), true);
        assert_eq!(files, [path("walk.gltf"), path("walk.bin"), path("walk-proof.html")]);
        assert_eq!(replace_question(&files), None);
        disk::write(&path("walk-proof.html"), b"x").unwrap();
        assert_eq!(replace_question(&files).unwrap(), "walk-proof.html exists. Replace it?");
        disk::write(&path("walk.gltf"), b"x").unwrap();
        let words = "walk.gltf and walk-proof.html exist. Replace them?";
        assert_eq!(replace_question(&files).unwrap(), words);
        assert_eq!(replace_question(&export_files(&path("walk.bvh"), false)), None);
        assert_eq!(scene_file(path("walk")), path("walk.ron"));
        assert_eq!(scene_file(path("walk.RON")), path("walk.RON"));
    }
}

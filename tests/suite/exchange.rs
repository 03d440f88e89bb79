//! Files as a whole: every outside file opens, comes back unchanged when nothing was edited, and carries its poses into
//! every other format.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use turnwright::clip::{Clip, Times};
use turnwright::exchange::{
    Encoded, Format, Guard, Note, OpenOptions, Source, disk, encode, open, open_bytes, write,
};

use crate::support::shared;

/// The clip files of one folder of the outside data, in order.
fn clip_files(folder: &str) -> Vec<PathBuf> {
    let Some(folder) = shared(folder) else { return Vec::new() };
    let entries = std::fs::read_dir(folder).expect("a folder").map(|entry| entry.expect("an entry").path());
    let mut files: Vec<PathBuf> = entries.filter(|path| Format::of(path).is_ok()).collect();
    files.sort();
    files
}

fn all_files() -> Vec<PathBuf> {
    let folders = ["data/bvh", "data/csv", "data/gltf", "data/gltf/assetgen"];
    let files: Vec<PathBuf> = folders.into_iter().flat_map(clip_files).collect();
    // These two hold places and a skeleton: there is no turn in them to read.
    files
        .into_iter()
        .filter(|path| !path.ends_with("walk01_pos.csv") && !path.ends_with("walk01_hierarchy.csv"))
        .collect()
}

fn opened(path: &Path) -> Source {
    open(path, &OpenOptions::default()).unwrap_or_else(|error| panic!("{error}"))
}

/// The largest turn in degrees, and the largest distance as a share of the figure, between two clips' joints of the same
/// label, in the scene, at up to 41 frames.
fn difference(a: &Clip, b: &Clip, by_frame: bool) -> (f64, f64) {
    let shared: Vec<(usize, usize)> = a
        .skeleton
        .listed()
        .filter_map(|joint| Some((joint, b.skeleton.find(a.skeleton.label(joint))?)))
        .collect();
    assert_eq!(shared.len(), a.skeleton.listed().count(), "every joint is found again");
    let count = a.grid.count();
    let steps = count.min(40);
    let (rest_a, rest_b) =
        (a.skeleton.world(&a.skeleton.rest_pose()), b.skeleton.world(&b.skeleton.rest_pose()));
    let (mut turn, mut place) = (0.0_f64, 0.0_f64);
    for step in 0..=steps {
        let frame = (count - 1) * step / steps.max(1);
        let time_b = if by_frame { b.grid.time(frame) } else { a.grid.time(frame) };
        let (world_a, world_b) = (a.world_at(a.grid.time(frame)), b.world_at(time_b));
        let size = shared.iter().map(|&(joint, _)| world_a[joint].position().length()).fold(1e-9, f64::max);
        for &(own, others) in &shared {
            // BVH joints stand parallel to the world at rest: what is kept is the turn away from rest.
            let away_a = world_a[own].rotation * rest_a[own].rotation.reverse();
            let away_b = world_b[others].rotation * rest_b[others].rotation.reverse();
            turn = turn.max(away_a.turn_to(away_b));
            place = place.max(world_a[own].position().distance(world_b[others].position()) / size);
        }
    }
    (turn.to_degrees(), place)
}

#[test]
fn every_outside_file_opens() {
    let files = all_files();
    for path in &files {
        let source = opened(path);
        // This one has a skin and no animation; a reader gives no clip and the caller decides.
        assert_eq!(source.clips.is_empty(), path.ends_with("Animation_Skin_03.gltf"), "{}", path.display());
        for clip in &source.clips {
            assert!(clip.skeleton.listed().count() > 0 && clip.grid.count() > 0, "{}", path.display());
            for world in clip.world_at(0.37 * clip.duration_secs) {
                assert!(
                    world.scene_from_joint.is_finite() && world.rotation.is_finite(),
                    "{}",
                    path.display()
                );
            }
        }
    }
}

#[test]
fn what_holds_no_turns_is_told_so() {
    for name in ["data/csv/walk01_pos.csv", "data/csv/walk01_hierarchy.csv"] {
        let Some(path) = shared(name) else { return };
        let error = open(&path, &OpenOptions::default()).unwrap_err().to_string();
        assert!(error.contains("expected") && error.contains("found") && error.contains(name), "{error}");
    }
}

#[test]
fn an_unedited_file_comes_back_byte_for_byte() {
    for path in all_files() {
        let source = opened(&path);
        let Encoded { bytes, .. } = encode(&source, &source.clips, None, &path).unwrap();
        if source.format == Format::Gltf {
            // Its buffer is named after the target; here target and source are the same.
            let again = open_bytes(&path, bytes, &OpenOptions::default()).unwrap();
            assert_eq!(again.clips, source.clips, "{}", path.display());
        } else {
            assert!(bytes == disk::read(&path).unwrap(), "{} comes back changed", path.display());
        }
    }
}

#[test]
fn poses_survive_the_way_into_every_other_format() {
    for path in all_files() {
        let source = opened(&path);
        let Some(clip) = source.clips.first() else { continue };
        // Its own format gives the very file back, as another test shows.
        for format in Format::ALL.into_iter().filter(|&format| format != source.format) {
            let target = Path::new("written").with_extension(format.extension());
            let encoded = encode(&source, &source.clips, Some(0), &target).unwrap();
            let folder = tempfile::tempdir().unwrap();
            if let Some((name, bytes)) = &encoded.beside {
                disk::write(&folder.path().join(name), bytes).unwrap();
            }
            let at = folder.path().join(&target);
            let back =
                open_bytes(&at, encoded.bytes, &OpenOptions::default()).unwrap_or_else(|e| panic!("{e}"));
            let back: &Arc<Clip> = &back.clips[0];
            // Rows that begin late are moved, and told to be: their times can't be compared.
            let uneven = format == Format::Bvh && matches!(clip.grid.times, Times::Listed(_));
            let told = |note: &Note| note.to_string().contains("moved to begin at 0");
            if uneven && encoded.notes.iter().any(told) {
                continue;
            }
            // Rows whose times are rounded become frames that are evenly apart.
            let (turn, place) = difference(clip, back, format == Format::Bvh);
            // BVH holds six decimals, glTF 32-bit floats; animated or mirrored scales are told as lost.
            let scaled = clip.joints.iter().any(|tracks| tracks.scale.is_some());
            if !(scaled && format == Format::Bvh) {
                assert!(
                    turn < 1e-3 && place < 1e-4,
                    "{} as {format}: {turn} degrees, {place} of the figure",
                    path.display()
                );
            }
        }
    }
}

#[test]
fn an_input_is_not_overwritten_unasked() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("walk.bvh");
    let Some(walk) = shared("data/bvh/rotation_first_root.bvh") else { return };
    disk::write(&path, &disk::read(&walk).unwrap()).unwrap();
    let source = opened(&path);
    // The same file by another way.
    let detour = folder.path().join("x/../walk.bvh");
    std::fs::create_dir(folder.path().join("x")).unwrap();
    // The same content under another name.
    let link = folder.path().join("link.bvh");
    std::fs::hard_link(&path, &link).unwrap();
    let targets: &[&PathBuf] = if cfg!(unix) { &[&path, &detour, &link] } else { &[&path, &detour] };
    for target in targets {
        let error = write(&source, &source.clips, None, target, &Guard::of(&path)).unwrap_err().to_string();
        assert!(error.contains("found the input itself"), "{error}");
    }
    let forced = Guard { force: true, ..Guard::of(&path) };
    write(&source, &source.clips, None, &path, &forced).unwrap();
    assert!(std::fs::read_dir(folder.path()).unwrap().count() == 3, "no temporary file is left");
}

#[test]
fn pictures_that_a_file_refers_to_go_along() {
    let Some(path) = shared("data/gltf/node_character.glb") else { return };
    let folder = tempfile::tempdir().unwrap();
    let source = opened(&path);
    let written =
        write(&source, &source.clips, None, &folder.path().join("out.glb"), &Guard::of(&path)).unwrap();
    assert!(folder.path().join("Textures/colormap.png").exists());
    assert!(
        written.notes.iter().any(|note| note.to_string().contains("copied along")),
        "{:?}",
        written.notes
    );
}

#[test]
fn a_name_of_another_format_is_told_with_the_right_one() {
    let check = |name: &str, bytes: &[u8], expected: &str| {
        let error = open_bytes(Path::new(name), bytes.to_vec(), &OpenOptions::default()).unwrap_err();
        assert_eq!(error.to_string(), format!("{name}: content: expected {expected}"));
    };
    let bvh = "\u{feff}hierarchy\r\nROOT a { OFFSET 0 0 0 CHANNELS 0 }";
    check("a.glb", bvh.as_bytes(), "GLB, as the name says, found BVH; rename it to end in .bvh");
    check("a.csv", bvh.as_bytes(), "CSV, as the name says, found BVH; rename it to end in .bvh");
    check("a.bvh", b"glTF\x02\0\0\0", "BVH, as the name says, found GLB; rename it to end in .glb");
    check("a.csv", b" { \"asset\": {} }", "CSV, as the name says, found glTF; rename it to end in .gltf");
    // Either kind of glTF reads under either name, as other programs do it, and a table may begin with any word.
    for (name, bytes) in [
        ("a.glb", &b"{\"asset\":{\"version\":\"2.0\"}}"[..]),
        ("hierarchy.csv", b"hierarchy,time,a.x\n0,0,1\n"),
    ] {
        let opened = open_bytes(Path::new(name), bytes.to_vec(), &OpenOptions::default());
        assert!(opened.is_ok(), "{name}: {opened:?}");
    }
}
